"""Light at surfaces and within clear bodies: Fresnel's equations, bare metals, Beer-Lambert absorption, plates.

Source of the formulas: Born and Wolf, Principles of Optics (1.5.2 Fresnel, 14.2 metals; 7.6 for the sum over a plate's
inner reflections, without interference).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ..contract import F64
from .grid import on_grid, table

METALS = ("aluminium", "chromium", "copper", "copper_zinc", "gold", "iron", "nickel", "silver", "titanium")


def fresnel(cosine: ArrayLike, index: ArrayLike) -> tuple[F64, F64]:
    """Reflectances perpendicular and parallel to the plane of incidence, for light from air onto a body.

    `cosine` of the angle of incidence, 0 .. 1; `index` real for a clear body, below 1 for light that leaves one, n + ik
    for a metal. They broadcast. Beyond the critical angle all is reflected.
    """
    across = np.asarray(cosine, np.float64).astype(np.complex128)
    n = np.asarray(index, np.complex128)
    along = np.sqrt(n * n - (1.0 - across * across))
    s = (across - along) / (across + along)
    p = (n * n * across - along) / (n * n * across + along)
    return np.abs(s) ** 2, np.abs(p) ** 2


def normal_reflectance(index: ArrayLike) -> F64:
    """Reflectance at normal incidence of an index n or n + ik."""
    n = np.asarray(index, np.complex128)
    return np.asarray(np.abs((n - 1.0) / (n + 1.0)) ** 2)


def diffuse_reflectance(index: float, n_nodes: int = 48) -> float:
    """Share of even light from a half-space that the surface of a clear body reflects, by Gauss-Legendre quadrature."""
    nodes, weights = np.polynomial.legendre.leggauss(n_nodes)
    cosine = (nodes + 1.0) / 2.0
    s, p = fresnel(cosine, index)
    return float(weights @ ((s + p) * cosine)) / 2.0


def metal_index(name: str) -> NDArray[np.complex128]:
    """The refractive index n + ik of a bare metal of `METALS`, (471,) complex128, linear between measured points."""
    if name not in METALS:
        raise KeyError(name)
    _, rows = table(f"metal_{name}")
    parts = on_grid(rows[:, 0], rows[:, 1:])
    return np.asarray(parts[:, 0] + 1j * parts[:, 1])


def absorption_of(transmittance: F64, thickness: float) -> F64:
    """Absorption coefficient (n,), 1/mm, of a body whose inner transmittance (n,) at `thickness` mm is known.

    What lets through nothing is taken to let through a millionth.
    """
    return np.asarray(-np.log(np.clip(transmittance, 1e-6, 1.0)) / thickness)


def inner_transmittance(absorption: F64, length: float) -> F64:
    """Share of light left after `length` mm within a body (Beer-Lambert), its surfaces apart."""
    return np.asarray(np.exp(-absorption * length))


def plate(index: float, absorption: F64, thickness: float, cosine: float = 1.0) -> tuple[F64, F64]:
    """Reflectance and transmittance (n,) of a plane plate in air, both polarisations and all inner reflections counted.

    `thickness` mm; `cosine` of the angle of incidence.
    """
    inside = np.sqrt(1.0 - (1.0 - cosine**2) / index**2)
    left = inner_transmittance(absorption, thickness / inside)
    sums = np.zeros((2, len(left)))
    for r in fresnel(cosine, index):
        through = (1.0 - r) ** 2 * left / (1.0 - (r * left) ** 2)
        sums += np.stack([r + r * left * through, through]) / 2.0
    return sums[0], sums[1]

"""How materials answer light, as rows of numbers for the kernels.

The surface: Lambert reflection, and above it microfacets with the GGX distribution, height-correlated Smith masking
(Walter, Marschner, Li and Torrance 2007, equations 20, 23, 33, 34; Heitz 2014, equation 99) and Schlick's Fresnel term
(Schlick 1994). What the microfacets reflect the Lambert layer does not get: it is dimmed by 1 minus their
directional albedo, so that no surface gives back more than it receives from a uniform surround.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..contract import F32, F64, Lighting, Material, Projection

DEGREE = 6  # of the polynomials in n.v that stand for the directional albedo
ROW = 8 + 2 * (DEGREE + 1)
LEAST_ALPHA = 0.01  # a smoother surface would show the point that a directional light is

# The surround that ambient light stands for: radiance 1 + CONTRAST * s(d . axis), s(t) = t / sqrt(t^2 + width^2), whose
# mean over all directions is 1. The width grows with the roughness that blurs it.
CONTRAST, SHARPEST = 0.65, 0.12


def material_rows(materials: Sequence[Material]) -> F32:
    """Rows (n, ROW) float32: colour 3, normal reflectance 3, alpha squared, width of the surround, albedo A and B."""
    table = np.zeros((len(materials), ROW), np.float32)
    for row, material in enumerate(materials):
        alpha = max(material.roughness**2, LEAST_ALPHA)
        width = SHARPEST + alpha
        scale, bias = albedo(alpha)
        table[row] = (*material.colour, *material.normal_reflectance, alpha**2, width, *scale, *bias)
    return table


def albedo(alpha: float) -> tuple[F64, F64]:
    """Polynomials in n.v, (DEGREE + 1,) lowest power first: albedo = A(n.v) * normal reflectance + B(n.v).

    Integrated over visible normals (Heitz 2018) on a fixed grid and fitted by least squares, weighted toward grazing
    sight where they bend most. Cost: about 40 000 evaluations.
    """
    cosines = (np.arange(48) + 0.5) / 48
    first = (np.arange(24) + 0.5) / 24
    u, v = (grid.ravel() for grid in np.meshgrid(first, first))
    values = np.array([_albedo_at(alpha, cosine, u, v) for cosine in cosines])
    powers = np.vander(cosines, DEGREE + 1, increasing=True)
    fitted = np.linalg.lstsq(powers, values, rcond=None)[0]
    return fitted[:, 0], fitted[:, 1]


def _albedo_at(alpha: float, cosine: float, u: F64, v: F64) -> tuple[float, float]:
    """Albedo of an ideal mirror coat less its Schlick share, and that share, seen at one angle."""
    view = np.array([np.sqrt(1.0 - cosine**2), 0.0, cosine])
    half = _visible_normals(view, alpha, u, v)
    across = np.maximum(half @ view, 0.0)
    light = 2.0 * across * half[:, 2] - cosine
    is_up = light > 0.0
    l2, v2, a2 = np.maximum(light, 1e-9) ** 2, cosine**2, alpha**2
    lambda_l = (np.sqrt(1.0 + a2 * (1.0 / l2 - 1.0)) - 1.0) / 2.0
    lambda_v = (np.sqrt(1.0 + a2 * (1.0 / v2 - 1.0)) - 1.0) / 2.0
    weight = np.where(is_up, (1.0 + lambda_v) / (1.0 + lambda_v + lambda_l), 0.0)
    schlick = (1.0 - across) ** 5
    return float(np.mean(weight * (1.0 - schlick))), float(np.mean(weight * schlick))


def _visible_normals(view: F64, alpha: float, u: F64, v: F64) -> F64:
    """Microfacet normals seen from `view`, (k,3), for numbers u, v in 0..1 (Heitz 2018, listing 1)."""
    stretched = np.array([alpha * view[0], alpha * view[1], view[2]])
    stretched /= np.linalg.norm(stretched)
    across = np.array([0.0, 1.0, 0.0]) if stretched[2] > 0.9999 else np.cross([0.0, 0.0, 1.0], stretched)
    across = across / np.linalg.norm(across)
    along = np.cross(stretched, across)
    radius, angle = np.sqrt(u), 2.0 * np.pi * v
    x, y = radius * np.cos(angle), radius * np.sin(angle)
    share = 0.5 * (1.0 + stretched[2])
    y = (1.0 - share) * np.sqrt(1.0 - x**2) + share * y
    z = np.sqrt(np.maximum(0.0, 1.0 - x**2 - y**2))
    normal = x[:, None] * across + y[:, None] * along + z[:, None] * stretched
    normal *= (alpha, alpha, 1.0)
    return np.asarray(normal / np.linalg.norm(normal, axis=1, keepdims=True))


def light_rows(lighting: Lighting) -> tuple[F32, F32, F32]:
    """Directional lights and lamps, rows (k,6) float32 of vector and power, and the sum of ambient power (3,).

    The exposure is multiplied in. Lamp vectors are world mm, their power is at 1 m.
    """
    sums = {"directional": [], "lamp": [], "ambient": [np.zeros(6)]}  # type: dict[str, list[F64]]
    for light in lighting.lights:
        sums[light.kind].append(np.array([*light.vector, *(p * lighting.exposure for p in light.power)]))
    far, near = (np.array(sums[kind], np.float32).reshape(-1, 6) for kind in ("directional", "lamp"))
    return far, near, np.sum(sums["ambient"], axis=0)[3:].astype(np.float32)


def surround_axis(projection: Projection) -> F32:
    """World direction the surround is brightest in: the upper left, toward the viewer, of every picture."""
    right, up, sight = (np.array(v) for v in (projection.right, projection.up, projection.sight))
    return np.asarray((up - right - sight) / np.sqrt(3.0), np.float32)

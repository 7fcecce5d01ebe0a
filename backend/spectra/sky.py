"""Luminance and colour of the sky: the fifteen skies of CIE S 011 (ISO 15469), and the clear sky of Preetham 1999.

Angles in degrees. A direction of the sky is its angle from the zenith and its angle from the sun. These say how light
is spread over the sky; how much of it there is, and its spectrum as a whole, says `air.diffuse_skylight`.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike

from ..contract import F64

GRADATION = ((4.0, -0.7), (1.1, -0.8), (0.0, -1.0), (-1.0, -0.55), (-1.0, -0.32), (-1.0, -0.15))
INDICATRIX = (
    (0.0, -1.0, 0.0), (2.0, -1.5, 0.15), (5.0, -2.5, 0.30), (10.0, -3.0, 0.45), (16.0, -3.0, 0.30), (24.0, -2.8, 0.15),
)  # fmt: skip
TYPES = (
    (1, 1), (1, 2), (2, 1), (2, 2), (3, 1), (3, 2), (3, 3), (3, 4),
    (4, 2), (4, 3), (4, 4), (5, 4), (5, 5), (6, 5), (6, 6),
)  # fmt: skip
"""Gradation and indicatrix of the skies 1 to 15, each from 1."""

OVERCAST, CLEAR = 1, 12

CLEAR_FROM = 2.0
"""Least turbidity that the clear sky was fitted for; its upper end is 10."""

# Preetham 1999, appendix A.2: rows A to E as (factor of turbidity, constant), for Y, x, y.
_SHAPES = (
    ((0.1787, -1.4630), (-0.3554, 0.4275), (-0.0227, 5.3251), (0.1206, -2.5771), (-0.0670, 0.3703)),
    ((-0.0193, -0.2592), (-0.0665, 0.0008), (-0.0004, 0.2125), (-0.0641, -0.8989), (-0.0033, 0.0452)),
    ((-0.0167, -0.2608), (-0.0950, 0.0092), (-0.0079, 0.2102), (-0.0441, -1.6537), (-0.0109, 0.0529)),
)
_ZENITH_X = (
    (0.00166, -0.00375, 0.00209, 0.0), (-0.02903, 0.06377, -0.03202, 0.00394), (0.11693, -0.21196, 0.06052, 0.25886),
)  # fmt: skip
_ZENITH_Y = (
    (0.00275, -0.00610, 0.00317, 0.0), (-0.04214, 0.08970, -0.04153, 0.00516), (0.15346, -0.26756, 0.06670, 0.26688),
)  # fmt: skip


def relative_luminance(sky_type: int, zenith_angle: ArrayLike, sun_angle: ArrayLike, sun_zenith_angle: float) -> F64:
    """Luminance of a CIE sky, 1 to 15, as a multiple of that of its zenith. Angles broadcast; the horizon is 90 deg."""
    gradation, indicatrix = TYPES[sky_type - 1]
    a, b = GRADATION[gradation - 1]
    c, d, e = INDICATRIX[indicatrix - 1]
    cosine = np.maximum(np.cos(np.radians(np.asarray(zenith_angle, np.float64))), 1e-9)
    away, sun = np.radians(np.asarray(sun_angle, np.float64)), np.radians(sun_zenith_angle)

    def scattered(angle: F64 | float) -> F64:
        return np.asarray(1.0 + c * (np.exp(d * angle) - np.exp(d * np.pi / 2)) + e * np.cos(angle) ** 2)

    return np.asarray(scattered(away) * (1.0 + a * np.exp(b / cosine)) / (scattered(sun) * (1.0 + a * np.exp(b))))


def moon_spencer(zenith_angle: ArrayLike) -> F64:
    """The older overcast sky of the CIE, (1 + 2 sin elevation) / 3 of its zenith (Moon and Spencer 1942)."""
    return np.asarray((1.0 + 2.0 * np.cos(np.radians(np.asarray(zenith_angle, np.float64)))) / 3.0)


def clear_zenith(turbidity: float, sun_zenith_angle: float) -> tuple[float, float, float]:
    """Luminance in kcd/m2 and x, y of the zenith (Preetham 1999, A.2)."""
    sun = np.radians(sun_zenith_angle)
    height = (4.0 / 9.0 - turbidity / 120.0) * (np.pi - 2.0 * sun)
    luminance = (4.0453 * turbidity - 4.9710) * np.tan(height) - 0.2155 * turbidity + 2.4192
    hazes, suns = np.array([turbidity**2, turbidity, 1.0]), np.array([sun**3, sun**2, sun, 1.0])
    return float(luminance), float(hazes @ np.array(_ZENITH_X) @ suns), float(hazes @ np.array(_ZENITH_Y) @ suns)


def clear_sky(turbidity: float, zenith_angle: ArrayLike, sun_angle: ArrayLike, sun_zenith_angle: float) -> F64:
    """Luminance in kcd/m2, x and y (..., 3) of the clear sky (Preetham 1999). The two arrays have one shape."""
    cosine = np.maximum(np.cos(np.radians(np.asarray(zenith_angle, np.float64))), 1e-9)
    away, sun = np.radians(np.asarray(sun_angle, np.float64)), np.radians(sun_zenith_angle)
    found = []
    for at_zenith, rows in zip(clear_zenith(turbidity, sun_zenith_angle), _SHAPES, strict=True):
        a, b, c, d, e = (factor * turbidity + constant for factor, constant in rows)
        shape = (1.0 + a * np.exp(b / cosine)) * (1.0 + c * np.exp(d * away) + e * np.cos(away) ** 2)
        middle = (1.0 + a * np.exp(b)) * (1.0 + c * np.exp(d * sun) + e * np.cos(sun) ** 2)
        found.append(at_zenith * shape / middle)
    return np.stack(found, axis=-1)


def over_the_sky(seen: Callable[[F64, F64], F64], sun_zenith_angle: float, n: int = 48) -> F64:
    """The integral of seen(zenith angle, angle from the sun) times the cosine: what a level plane receives of the sky.

    `seen` takes two arrays (k,) and returns (k,) or (k, channels). Gauss-Legendre across, an even rule around: 2 n^2
    directions.
    """
    nodes, weights = np.polynomial.legendre.leggauss(n)
    zenith, around = np.meshgrid((nodes + 1.0) * np.pi / 4, (np.arange(2 * n) + 0.5) * np.pi / n, indexing="ij")
    sun = np.radians(sun_zenith_angle)
    cosine = np.cos(zenith) * np.cos(sun) + np.sin(zenith) * np.sin(sun) * np.cos(around)
    values = seen(np.degrees(zenith).ravel(), np.degrees(np.arccos(np.clip(cosine, -1.0, 1.0))).ravel())
    share = (weights[:, None] * (np.pi / 4) * (np.pi / n) * np.sin(zenith) * np.cos(zenith)).ravel()
    return np.asarray(np.tensordot(share, values, axes=1))

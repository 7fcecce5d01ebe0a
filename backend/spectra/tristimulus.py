"""From spectra to tristimulus values, chromaticities, and linear RGB as it looks at home in a given white.

Chromatic adaptation is the linear one of CAT16 (Li et al. 2017; CIE 248), complete: what has the chromaticity of the
white becomes neutral. Colours outside the gamut of sRGB keep their luminance and move toward its grey, in
linear light, until no channel is negative.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from ..colour import luminance
from ..contract import F64
from .grid import table

LUMENS = 683.002
"""Lumens in a watt at 555.016 nm: the luminous efficacy K_m of CIE 15."""

PRIMARIES = ((0.64, 0.33), (0.30, 0.60), (0.15, 0.06))
WHITE = (0.3127, 0.3290)
"""Chromaticities of sRGB (IEC 61966-2-1)."""

CAT16 = ((0.401288, 0.650173, -0.051461), (-0.250268, 1.204414, 0.045854), (-0.002079, 0.048952, 0.953127))


def observer() -> F64:
    """The colour-matching functions of the CIE 1931 observer, (471, 3) float64. Cost: reads a small file."""
    return np.ascontiguousarray(table("observer")[1][:, 1:])


def xyz_of(spectra: F64, matching: F64) -> F64:
    """Tristimulus sums (..., 3) of spectra (..., 471), not scaled."""
    return np.asarray(spectra @ matching)


def illuminance_of(spectrum: F64, matching: F64) -> float:
    """Lux of a spectral irradiance (471,) in W m-2 nm-1."""
    return LUMENS * float(spectrum @ matching[:, 1])


def chromaticity_of(xyz: ArrayLike) -> F64:
    """Return x, y (..., 2) of tristimulus values (..., 3)."""
    values = np.asarray(xyz, np.float64)
    return np.asarray(values[..., :2] / values.sum(axis=-1, keepdims=True))


def white_xyz(x: float, y: float) -> F64:
    """Tristimulus values (3,) of a chromaticity at Y = 1."""
    return np.array([x / y, 1.0, (1.0 - x - y) / y])


def xyz_to_rgb() -> F64:
    """The matrix (3, 3) from tristimulus values to linear sRGB, from its primaries and white, not rounded."""
    columns = np.stack([white_xyz(*primary) for primary in PRIMARIES], axis=1)
    return np.linalg.inv(columns * np.linalg.solve(columns, white_xyz(*WHITE)))


def adaptation(white: F64, to: F64) -> F64:
    """The matrix (3, 3) that takes tristimulus values seen in `white` to those that look the same in the white `to`."""
    cones = np.array(CAT16)
    return np.asarray(np.linalg.solve(cones, (cones @ to / (cones @ white))[:, None] * cones))


def rgb_under(white: F64) -> F64:
    """The matrix (3, 3) from tristimulus values to linear RGB in which `white` (3,), at Y = 1, is (1, 1, 1)."""
    return np.asarray(xyz_to_rgb() @ adaptation(white / white[1], white_xyz(*WHITE)))


def pair_colours(sources: F64, surfaces: F64, matching: F64, to_rgb: F64) -> F64:
    """Linear RGB (l, m, 3) of what surfaces (m, 471) send back of sources (l, 471), each of luminance 1.

    The product of source, reflectance and observer is summed for every pair; nothing is clipped.
    """
    weights = sources[:, :, None] * matching / (sources @ matching[:, 1])[:, None, None]
    return np.asarray(np.einsum("mw,lwk->lmk", surfaces, weights @ to_rgb.T))


def pair_colour(source: F64, surface: F64, matching: F64, to_rgb: F64) -> F64:
    """Linear RGB (3,) of what one surface (471,) sends back of a source (471,) of luminance 1."""
    return np.asarray(pair_colours(source[None], surface[None], matching, to_rgb)[0, 0])


def source_colour(source: F64, matching: F64, to_rgb: F64) -> F64:
    """Linear RGB (3,) of a source (471,) of luminance 1."""
    return np.asarray(to_rgb @ (source @ matching) / (source @ matching[:, 1]))


def into_gamut(colour: ArrayLike, ceiling: float = np.inf) -> F64:
    """Linear RGB (..., 3) moved toward the grey of its own luminance until every channel lies in 0 .. ceiling.

    Luminance is kept; one above the ceiling becomes grey at the ceiling, a negative one black.
    """
    rgb = np.asarray(colour, np.float64)
    grey = np.clip(luminance(rgb), 0.0, ceiling)[..., None]
    away = rgb - grey
    with np.errstate(divide="ignore", invalid="ignore"):
        low = np.where(away < 0, -grey / away, np.inf).min(axis=-1, keepdims=True)
        high = np.where(away > 0, (ceiling - grey) / away, np.inf).min(axis=-1, keepdims=True)
    share = np.minimum(1.0, np.minimum(low, high))
    return np.asarray(np.clip(grey + share * away, 0.0, ceiling))

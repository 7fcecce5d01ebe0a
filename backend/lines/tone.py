"""How dark a part is at points of the page, for shading by marks of two values."""

from __future__ import annotations

import numpy as np

from ..colour import LUMINANCE
from ..contract import F64, I32, Light, Lighting
from .model import View

_SQUARE_METRE = 1e6


def darkness(view: View, faces: I32, xy: F64, lighting: Lighting) -> F64:
    """Return (k,) 0 to 1 for view faces (k,) seen at page points (k,2) mm: 1 less the root of the light reflected.

    The surface counts as white and matt, so that a tone says how a face lies to the light and not what it is made of.
    The root stands for the eye's answer; it is chosen because it is rounded alike on every machine. No shadows.
    """
    share = _shares(view.points[view.faces[faces], :2], xy)
    normals = _weighted(share, view.corner_normals[faces].astype(np.float64))
    normals /= np.sqrt(np.maximum(_dots(normals, normals), 1e-300))[:, None]
    normals *= np.where(view.facing[faces] < 0, -1.0, 1.0)[:, None]
    places = _weighted(share, view.world[view.faces[faces]])
    light = sum((_irradiance(light, places, normals) for light in lighting.lights), np.zeros(len(faces)))
    return np.asarray(1.0 - np.sqrt(np.clip(lighting.exposure * light, 0.0, 1.0)))


def _irradiance(light: Light, places: F64, normals: F64) -> F64:
    """Luminance (k,) of a white matt surface, 1 for paper white."""
    power = sum(weight * value for weight, value in zip(LUMINANCE, light.power, strict=True))
    if light.kind == "ambient":
        return np.full(len(places), power)
    toward = np.broadcast_to(np.asarray(light.vector), places.shape)
    if light.kind == "directional":
        return np.asarray(power * np.maximum(_dots(normals, toward), 0.0))
    toward = toward - places
    square = np.maximum(_dots(toward, toward), 1e-300)
    return np.asarray(power * _SQUARE_METRE * np.maximum(_dots(normals, toward), 0.0) / (square * np.sqrt(square)))


def _shares(corners: F64, xy: F64) -> F64:
    """Weights (k,3) of the corners (k,3,2) of triangles at points (k,2), even where a triangle has no area."""
    x, y = corners[..., 0] - xy[:, None, 0], corners[..., 1] - xy[:, None, 1]
    after, before = [1, 2, 0], [2, 0, 1]
    weight = np.abs(x[:, after] * y[:, before] - x[:, before] * y[:, after])
    total = weight[:, 0] + weight[:, 1] + weight[:, 2]
    return np.where(total[:, None] > 0.0, weight / np.where(total > 0.0, total, 1.0)[:, None], 1.0 / 3.0)


def _weighted(share: F64, values: F64) -> F64:
    """Sums (k,3) of values (k,3,3) at three corners; spelt out, as matrix products differ between machines."""
    return np.asarray(
        share[:, 0, None] * values[:, 0] + share[:, 1, None] * values[:, 1] + share[:, 2, None] * values[:, 2]
    )


def _dots(a: F64, b: F64) -> F64:
    return np.asarray(a[:, 0] * b[:, 0] + a[:, 1] * b[:, 1] + a[:, 2] * b[:, 2])

"""Colour numbers: linear light with the sRGB primaries, its 8-bit encoding, luminance.

Source: IEC 61966-2-1:1999 (transfer function, break points, the luminance row of the RGB to XYZ matrix).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from .contract import F32, F64, U8

SLOPE, OFFSET, EXPONENT = 12.92, 0.055, 2.4
BREAK_ENCODED, BREAK_LINEAR = 0.04045, 0.0031308
LUMINANCE = (0.2126, 0.7152, 0.0722)
WHITE = (255, 255, 255)


def encode(linear: ArrayLike) -> F64:
    """Linear light 0..1 to sRGB 0..1, any shape; values outside are clamped first."""
    light = np.clip(np.asarray(linear, np.float64), 0.0, 1.0)
    curve = (1.0 + OFFSET) * light ** (1.0 / EXPONENT) - OFFSET
    return np.asarray(np.where(light <= BREAK_LINEAR, SLOPE * light, curve))


def decode(encoded: ArrayLike) -> F64:
    """Turn sRGB 0..1 into linear light 0..1, any shape."""
    value = np.asarray(encoded, np.float64)
    curve = ((np.maximum(value, 0.0) + OFFSET) / (1.0 + OFFSET)) ** EXPONENT
    return np.asarray(np.where(value <= BREAK_ENCODED, value / SLOPE, curve))


def to_bytes(linear: ArrayLike) -> U8:
    """Linear light to 8-bit sRGB, to the nearest level, halves up."""
    return np.asarray(np.floor(encode(linear) * 255.0 + 0.5), np.uint8)


def from_bytes(levels: NDArray[np.uint8] | tuple[int, ...]) -> F64:
    """8-bit sRGB to linear light."""
    return decode(np.asarray(levels, np.float64) / 255.0)


def luminance(linear: ArrayLike) -> F64:
    """Luminance Y of linear RGB (..., 3), 1 for white."""
    return np.asarray(np.asarray(linear, np.float64) @ np.array(LUMINANCE))


def thresholds() -> F32:
    """Return (257,) float32: entry k is the least linear light whose nearest level is k; entry 256 is above all light.

    A level found by them equals `to_bytes` of the same float32 value.
    """
    levels = np.arange(257)
    edges = decode((levels - 0.5) / 255.0).astype(np.float32)
    while (low := to_bytes(edges[1:256]) < levels[1:256]).any():
        edges[1:256][low] = np.nextafter(edges[1:256][low], np.float32(2))
    while (high := to_bytes(np.nextafter(edges[1:256], np.float32(0))) >= levels[1:256]).any():
        edges[1:256][high] = np.nextafter(edges[1:256][high], np.float32(0))
    edges[0], edges[256] = 0.0, np.inf
    return edges


def first_guess(edges: F32, n_steps: int) -> U8:
    """Return (n_steps + 1,) uint8: the level of the light k / n_steps, to start a search in `edges` from."""
    light = np.arange(n_steps + 1, dtype=np.float32) / np.float32(n_steps)
    return (np.searchsorted(edges, light, side="right") - 1).astype(np.uint8)

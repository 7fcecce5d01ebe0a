"""8-bit levels and linear light: rounding, limits and the tables the rasteriser encodes with."""

from __future__ import annotations

import numpy as np
from platewright.backend import colour


def test_every_level_survives_decoding_and_encoding() -> None:
    levels = np.arange(256, dtype=np.uint8)
    assert (colour.to_bytes(colour.from_bytes(levels)) == levels).all()


def test_light_outside_is_clamped() -> None:
    assert colour.to_bytes([-1.0, 0.0, 1.0, 7.0]).tolist() == [0, 0, 255, 255]


def test_thresholds_give_the_nearest_level() -> None:
    edges = colour.thresholds()
    light = np.random.default_rng(3).random(50_000).astype(np.float32) ** 3
    found = np.searchsorted(edges, light, side="right") - 1
    assert (found == colour.to_bytes(light)).all()
    assert (np.diff(edges[:256]) > 0).all() and np.isinf(edges[256])


def test_the_first_guess_is_never_above() -> None:
    edges = colour.thresholds()
    guess = colour.first_guess(edges, 4096)
    light = np.random.default_rng(4).random(50_000).astype(np.float32)
    assert (guess[(light * np.float32(4096)).astype(int)] <= colour.to_bytes(light)).all()


def test_luminance_of_white_is_one() -> None:
    assert abs(float(colour.luminance((1.0, 1.0, 1.0))) - 1.0) < 1e-15

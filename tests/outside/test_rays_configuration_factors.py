"""What points see of sky, sun and panels against closed forms of configuration factors.

Formulas: Howell, "A catalog of radiation heat transfer configuration factors", by catalogue number; Siegel and Howell,
"Thermal radiation heat transfer". Occlusion of a point by a surface is the configuration factor to it.
"""

from __future__ import annotations

from math import atan, cos, log, pi, radians, sqrt

import numpy as np
import pytest
from platewright.backend.contract import F64, I32
from platewright.backend.rays import bvh, sampling, seeing

NOTHING = bvh.build(np.zeros((0, 3)), np.zeros((0, 3), np.int32))


def opposed(a: float, b: float, c: float) -> float:
    """C-11: identical, parallel, directly opposed rectangles a x b, c apart."""
    x, y = a / c, b / c
    p, q = sqrt(1 + x * x), sqrt(1 + y * y)
    return (2 / (pi * x * y)) * (
        log(p * q / sqrt(1 + x * x + y * y)) + x * q * atan(x / q) + y * p * atan(y / p) - x * atan(x) - y * atan(y)
    )


def perpendicular(height: float, width: float) -> float:
    """C-14: from a rectangle 1 x width to one height x 1 at right angles along their common edge of length 1."""
    h, w = height, width
    s = sqrt(h * h + w * w)
    a, b, c = (1 + w * w) * (1 + h * h), 1 + w * w + h * h, w * w + h * h
    logs = log(a / b) + w * w * log(w * w * b / ((1 + w * w) * c)) + h * h * log(h * h * b / ((1 + h * h) * c))
    return (w * atan(1 / w) + h * atan(1 / h) - s * atan(1 / s) + logs / 4) / (pi * w)


def above_corner(a: float, b: float, c: float) -> float:
    """B-3: from an element to a parallel rectangle a x b at c whose corner stands on its normal."""
    x, y = a / c, b / c
    p, q = sqrt(1 + x * x), sqrt(1 + y * y)
    return (x / p * atan(y / p) + y / q * atan(x / q)) / (2 * pi)


def rectangle(corner: tuple, u: tuple, v: tuple) -> tuple[F64, I32]:
    c, u, v = (np.array(part, float) for part in (corner, u, v))
    return np.array([c, c + u, c + u + v, c + v]), np.array([[0, 1, 2], [0, 2, 3]], np.int32)


def disc(radius: float, height: float, n: int = 2000) -> tuple[F64, I32]:
    angle = 2 * pi * np.arange(n) / n
    rim = np.column_stack([radius * np.cos(angle), radius * np.sin(angle), np.full(n, height)])
    k = np.arange(n)
    return np.vstack([rim, [[0, 0, height]]]), np.column_stack([k, (k + 1) % n, np.full(n, n)]).astype(np.int32)


def keys(n: int, seed: int = 0) -> np.ndarray:
    return sampling.keys_of(np.arange(n), np.full(n, seed))


def plate(n: int, height: float = 1.0) -> F64:
    """Points spread evenly over the plate (0, 0) .. (1, height) of the xy plane."""
    at = sampling.points(np.array([77], np.uint32), 0, n)[0]
    return np.column_stack([at[:, 0], height * at[:, 1], np.zeros(n)])


def up(n: int) -> F64:
    return np.tile([0.0, 0.0, 1.0], (n, 1))


def hidden(scene: tuple[F64, I32], points: F64, normals: F64, most: int = 256) -> float:
    seen = seeing.sky_seen(bvh.build(*scene), points, normals, keys(len(points)), error=0.0, most=most)
    return float(1.0 - seen.fraction.mean())


def test_the_closed_forms_are_right() -> None:
    """Published values: Siegel and Howell's worked example 0.4756; by symmetry a cube's six sides sum to 1."""
    assert opposed(1, 1.5, 0.5) == pytest.approx(0.4756, abs=5e-5)
    assert opposed(1, 1, 1) + 4 * perpendicular(1, 1) == pytest.approx(1.0, abs=1e-12)
    assert perpendicular(1, 2) * 2 == pytest.approx(perpendicular(2, 1), abs=1e-12)


@pytest.mark.parametrize("gap", [0.5, 1.0, 2.0])
def test_parallel_squares(gap: float) -> None:
    points = plate(1024)
    assert hidden(rectangle((0, 0, gap), (1, 0, 0), (0, 1, 0)), points, up(1024)) == pytest.approx(
        opposed(1, 1, gap), rel=5e-3
    )


@pytest.mark.parametrize("height", [0.5, 1.0, 2.0])
def test_perpendicular_rectangles(height: float) -> None:
    points = plate(2048)
    assert hidden(rectangle((0, 0, 0), (1, 0, 0), (0, 0, height)), points, up(2048)) == pytest.approx(
        perpendicular(height, 1.0), rel=5e-3
    )


@pytest.mark.parametrize(("radius", "height"), [(1.0, 1.0), (1.0, 2.0), (3.0, 1.0)])
def test_a_coaxial_disc_over_an_element(radius: float, height: float) -> None:
    points = np.zeros((16, 3))
    expected = radius**2 / (radius**2 + height**2)
    assert hidden(disc(radius, height), points, up(16), 1024) == pytest.approx(expected, rel=5e-3)


def test_the_foot_of_a_wall_sees_half_the_sky() -> None:
    """A wall without end hides half of it; this one ends a thousand times as far off as the point is near."""
    wall = rectangle((-1000, 0, 0), (2000, 0, 0), (0, 0, 1000))
    assert hidden(wall, np.tile([0.0, 1.0, 0.0], (16, 1)), up(16), 1024) == pytest.approx(0.5, rel=5e-3)


PANEL = seeing.LuminousPanel((0.0, 0.0, 1.0), (0.0, 1.0, 0.0), (1.0, 0.0, 0.0))  # bright downwards


@pytest.mark.parametrize("size", [0.5, 1.0, 3.0])
def test_a_panel_over_an_element(size: float) -> None:
    panel = seeing.LuminousPanel((0.0, 0.0, 1.0), (0.0, size, 0.0), (size, 0.0, 0.0))
    seen = seeing.light_seen(NOTHING, np.zeros((8, 3)), up(8), panel, keys(8), error=0.0)
    assert (seen.fraction == 1.0).all()
    assert np.abs(seen.factor / above_corner(size, size, 1.0) - 1.0).max() < 5e-3


def test_a_panel_turned_away_gives_nothing() -> None:
    back = seeing.LuminousPanel(PANEL.corner, PANEL.along, PANEL.across)
    assert seeing.light_seen(NOTHING, np.zeros((2, 3)), up(2), back, keys(2)).factor.max() == 0.0
    assert seeing.light_seen(NOTHING, np.zeros((2, 3)), -up(2), PANEL, keys(2)).factor.max() == 0.0


def screened() -> bvh.Tree:
    """A screen half way up that hides what is at x < 0.3 of `PANEL` from the origin."""
    return bvh.build(*rectangle((-5, -5, 0.5), (5.15, 0, 0), (0, 10, 0)))


def test_part_of_a_panel_behind_a_screen() -> None:
    seen = seeing.light_seen(screened(), np.zeros((8, 3)), up(8), PANEL, keys(8), error=0.0)
    whole, part = above_corner(1, 1, 1), above_corner(1, 1, 1) - above_corner(0.3, 1, 1)
    assert np.abs(seen.factor / part - 1.0).max() < 5e-3
    assert np.abs(seen.fraction / (part / whole) - 1.0).max() < 5e-3


def test_half_a_sun_behind_an_edge() -> None:
    """A disc cut by a line through its middle, and by one off it by half its radius: 0.5 and 0.8044988905 of it."""
    sun = seeing.Distant((0.0, 0.0, 1.0), seeing.SUN_DIAMETER)
    tangent = np.tan(radians(seeing.SUN_DIAMETER / 2))
    for aside, expected in ((0.0, 0.5), (0.5, 1 - (pi / 3 - sqrt(3) / 4) / pi)):
        tree = bvh.build(*rectangle((-900, -500, 100), (900 - 100 * tangent * aside, 0, 0), (0, 1000, 0)))
        seen = seeing.light_seen(tree, np.zeros((32, 3)), up(32), sun, keys(32), error=0.0)
        assert seen.fraction.mean() == pytest.approx(expected, rel=5e-3)


def test_a_distant_point_is_seen_or_not() -> None:
    wall, points = (
        bvh.build(*rectangle((0, -5, 0), (0, 10, 0), (0, 0, 1))),
        np.array([[-0.9, 0, 0], [-1.1, 0, 0], [1, 0, 0]]),
    )
    seen = seeing.light_seen(wall, points, up(3), seeing.Distant((sqrt(0.5), 0.0, sqrt(0.5))), keys(3))
    assert seen.fraction.tolist() == [0.0, 1.0, 1.0]
    assert (seen.samples == 1).all() and (seen.error == 0.0).all()
    assert seen.factor == pytest.approx(np.array([0.0, sqrt(0.5), sqrt(0.5)]), abs=1e-12)


def test_a_sun_aslant_shines_by_the_cosine() -> None:
    direction = (0.0, np.sin(radians(60)), cos(radians(60)))
    seen = seeing.light_seen(NOTHING, np.zeros((4, 3)), up(4), seeing.Distant(direction), keys(4))
    assert seen.factor == pytest.approx(0.5, abs=1e-12)
    assert seen.fraction == pytest.approx(1.0)


def errors(kind: str, most: int) -> tuple[float, float]:
    """Root mean square of the true errors and of the stated ones, over many keys."""
    n, zero, z = 400, np.zeros((400, 3)), up(400)
    if kind == "sky":
        tree, expected = bvh.build(*rectangle((0, 0, 1), (1, 0, 0), (0, 1, 0))), 1.0 - above_corner(1, 1, 1)
        seen = seeing.sky_seen(tree, zero, z, keys(n, 5), error=0.0, most=most)
    else:
        expected = 1.0 - above_corner(0.3, 1, 1) / above_corner(1, 1, 1)
        seen = seeing.light_seen(screened(), zero, z, PANEL, keys(n, 5), error=0.0, most=most)
    assert (seen.samples == most).all()
    return float(np.sqrt(np.mean((seen.fraction - expected) ** 2))), float(np.sqrt(np.mean(seen.error**2)))


@pytest.mark.parametrize("kind", ["sky", "panel"])
def test_the_error_falls_as_it_should(kind: str) -> None:
    """Scrambled nets: n^-0.75 for a region with any smooth rim, n^-0.5 is chance (Owen 1997; He and Wang 2015)."""
    few, many = errors(kind, 64), errors(kind, 1024)
    order = np.log(few[0] / many[0]) / np.log(16.0)
    assert 0.62 < order < 1.6
    for true, stated in (few, many):
        assert true < stated < 6.0 * true


def test_samples_stop_at_the_error_asked_for() -> None:
    tree = bvh.build(*rectangle((0, 0, 1), (1, 0, 0), (0, 1, 0)))
    points = np.column_stack([np.linspace(-40, 3, 300), np.full(300, 0.5), np.zeros(300)])
    seen = seeing.sky_seen(tree, points, up(300), keys(300), error=0.02)
    assert (seen.error <= 0.02).all()
    assert len(np.unique(seen.samples)) > 1
    exact = seeing.sky_seen(tree, points, up(300), keys(300, 9), error=0.0, most=4096)
    assert np.sqrt(np.mean((seen.fraction - exact.fraction) ** 2)) < 0.02

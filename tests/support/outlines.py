"""Short ways to write outlines in tests."""

from __future__ import annotations

import math

from platewright.compiler.solids.plane import Corner, with_corners
from platewright.compiler.solids.recipe import ArcTo, EllipseTo, LineTo, Loop, Outline, Point2, SplineTo

HALF_DISC = Loop((0.0, -5.0), (ArcTo((0.0, 5.0), (0.0, 0.0), True), LineTo((0.0, -5.0))))


def polygon(*points: Point2) -> Loop:
    """Straight stretches, the last one closing the loop."""
    return Loop(points[0], tuple(LineTo(point) for point in (*points[1:], points[0])))


def rectangle(width: float, height: float) -> Loop:
    x, y = width / 2, height / 2
    return polygon((-x, -y), (x, -y), (x, y), (-x, y))


def circle(x: float, y: float, r: float) -> Loop:
    return Loop((x + r, y), (ArcTo((x + r, y), (x, y), True),))


def ellipse(a: float, b: float, x: float = 0.0, y: float = 0.0, turn: float = 0.0) -> Loop:
    """By its half axes."""
    t = math.radians(turn)
    start = (x + a * math.cos(t), y + a * math.sin(t))
    return Loop(start, (EllipseTo(start, (x, y), (a, b), turn, True),))


def closed_spline(*points: Point2) -> Loop:
    return Loop(points[0], (SplineTo((*points[1:], points[0])),))


def rounded(loop: Loop, radius: float) -> Loop:
    """Every corner of a polygon rounded."""
    return with_corners(loop, [Corner("rounded", radius)] * len(loop.stretches))


def plain(loop: Loop, *holes: Loop) -> Outline:
    return Outline(loop, holes)

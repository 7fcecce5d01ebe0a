"""Paths and bodies along them that several tests use, and the volume of a shell."""

from __future__ import annotations

import math

import numpy as np
from platewright.compiler.solids.recipe import (
    ArcTo,
    LineTo,
    Loop,
    Outline,
    Point3,
    SpaceArcTo,
    SpaceLineTo,
    SpacePath,
    SpaceSplineTo,
)
from platewright.compiler.solids.shell import Shell
from platewright.compiler.solids.spine import PathFlaw, Trace, length_of, trace

STRIP = Outline(Loop((-3.0, -2.0), (LineTo((3.0, -2.0)), LineTo((3.0, 2.0)), LineTo((-3.0, 2.0)))))
SQUARE = Outline(Loop((-30.0, -30.0), (LineTo((30.0, -30.0)), LineTo((30.0, 30.0)), LineTo((-30.0, 30.0)))))


def circle(radius: float, x: float = 0.0, y: float = 0.0) -> Outline:
    return Outline(Loop((x + radius, y), (ArcTo((x + radius, y), (x, y), True),)))


def bent(*points: Point3, radius: float = 0.0, closed: bool = False) -> SpacePath:
    """Straight stretches with one bend radius at the points between."""
    inner = [SpaceLineTo(point, radius) for point in points[1:-1]]
    return SpacePath(points[0], (*inner, SpaceLineTo(points[-1], radius if closed else 0.0)))


HOSE = bent(
    (0.0, 0.0, 0.0),
    (0.0, 0.0, 100.0),
    (100.0, 0.0, 100.0),
    (100.0, 80.0, 100.0),
    (100.0, 80.0, 0.0),
    (200.0, 80.0, 0.0),
    (200.0, 0.0, 50.0),
    (300.0, 0.0, 50.0),
    radius=22.0,
)
LOOP = bent(
    (0.0, 0.0, 0.0),
    (100.0, 0.0, 0.0),
    (100.0, 80.0, 0.0),
    (0.0, 80.0, 50.0),
    (0.0, 0.0, 0.0),
    radius=15.0,
    closed=True,
)
MIXED = SpacePath(
    (0.0, 0.0, 0.0),
    (
        SpaceLineTo((0.0, 0.0, 60.0)),
        SpaceSplineTo(((20.0, 0.0, 80.0), (40.0, 30.0, 60.0))),
        SpaceLineTo((60.0, 30.0, 60.0)),
        SpaceArcTo((60.0 + 20.0 * math.sqrt(0.5), 30.0, 80.0 - 20.0 * math.sqrt(0.5)), (80.0, 30.0, 80.0)),
        SpaceLineTo((80.0, 30.0, 120.0)),
    ),
)


def ring_path(n: int = 12) -> SpacePath:
    """A closed wavy curve, one periodic spline."""
    points = tuple(
        (
            50.0 * math.cos(a) * (1.0 + 0.2 * math.cos(3.0 * a)),
            50.0 * math.sin(a),
            10.0 * math.sin(2.0 * a),
        )
        for a in (math.tau * k / n for k in range(n))
    )
    return SpacePath(points[0], (SpaceSplineTo((*points[1:], points[0])),))


def traced(path: SpacePath) -> Trace:
    found = trace(path)
    assert isinstance(found, Trace), found
    return found


def flaw(path: SpacePath) -> PathFlaw:
    found = trace(path)
    assert isinstance(found, PathFlaw)
    return found


def path_length(path: SpacePath) -> float:
    return sum(map(length_of, traced(path).stretches))


def volume(shell: Shell) -> float:
    """By the divergence theorem, mm3."""
    a, b, c = (shell.vertices[shell.faces[:, k]] for k in range(3))
    return float((a * np.cross(b, c)).sum() / 6.0)

"""Solids with flat faces: block, wedge, prism, pyramid, and the extrusion of outlines."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise

import manifold3d
import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from ..trigonometry import cos_deg, sin_deg
from .curve import Curve
from .outline import Polyline
from .recipe import Block, Prism, Pyramid, Wedge
from .revolve import disc
from .shell import Shell, shell
from .surfaces import cross, free, plane, surfaces

F64 = NDArray[np.float64]


Facets = tuple[F64, Sequence[Sequence[int]]]
"""Corners (n,3) and the rows of them that go round each plane face, counter-clockwise from outside."""


def facets(shape: Block | Wedge | Prism | Pyramid) -> Facets:
    """Corners and faces of a solid with flat faces."""
    if isinstance(shape, Block):
        x, y, z = shape.size
        return _between(_rectangle(-x / 2, x / 2, y), _rectangle(-x / 2, x / 2, y), z)
    if isinstance(shape, Wedge):
        return _wedge(shape)
    base = regular_polygon(shape.sides, shape.across)
    if isinstance(shape, Prism):
        return _between(base, base, shape.length)
    if shape.top > 0.0:
        return _between(base, regular_polygon(shape.sides, shape.top), shape.length)
    n = shape.sides
    vertices = np.concatenate((_lifted(base, 0.0), [[0.0, 0.0, shape.length]]))
    return vertices, (tuple(range(n - 1, -1, -1)), *((k, (k + 1) % n, n) for k in range(n)))


def _wedge(shape: Wedge) -> Facets:
    x, y, z = shape.size
    base = _rectangle(-x / 2, x / 2, y)
    if shape.top_length > 0.0:
        return _between(base, _rectangle(-x / 2, shape.top_length - x / 2, y), z)
    ridge = np.array([[-x / 2, -y / 2, z], [-x / 2, y / 2, z]])
    vertices = np.concatenate((_lifted(base, 0.0), ridge))
    return vertices, ((3, 2, 1, 0), (0, 1, 4), (1, 2, 5, 4), (2, 3, 5), (3, 0, 4, 5))


def regular_polygon(sides: int, across: float) -> F64:
    """Corners (n,2) counter-clockwise round the inscribed circle of diameter `across`, the first side facing -y."""
    if sides < 3:
        raise ValueError(f"{sides} sides")
    reach = across / 2 / cos_deg(180.0 / sides)
    angles = [(360.0 * k - 180.0) / sides - 90.0 for k in range(sides)]
    return np.array([(reach * cos_deg(angle), reach * sin_deg(angle)) for angle in angles])


def polyhedron(vertices: F64, polygons: Sequence[Sequence[int]]) -> Shell:
    """Plane convex faces, counter-clockwise from outside, one patch each."""
    pieces, rows = [], []
    for k, polygon in enumerate(polygons):
        corners = np.array(polygon)
        pieces.append((corners[disc(len(corners))[:, ::-1]], k))
        rows.append((PatchKind.PLANE, _plane(vertices[corners]), 0.0, False))
    return shell(vertices, pieces, surfaces(rows))


def extrude(loops: list[Polyline], length: float) -> Shell:
    """Raise closed plane loops, the material on their left, from z = 0 to `length`: 2k walls and two caps of
    k - 2 + 2h triangles for k points and h holes.
    """
    points = np.concatenate([loop.points for loop in loops])
    n = len(points)
    vertices = np.concatenate((_lifted(points, 0.0), _lifted(points, length)))
    cap = manifold3d.triangulate([loop.points for loop in loops]).astype(np.int64)
    pieces = [(cap[:, ::-1], 0), (cap + n, 1)]
    rows = [
        (PatchKind.PLANE, plane((0.0, 0.0, 0.0), (0.0, 0.0, -1.0), (1.0, 0.0, 0.0)), 0.0, False),
        (PatchKind.PLANE, plane((0.0, 0.0, length), (0.0, 0.0, 1.0), (1.0, 0.0, 0.0)), 0.0, False),
    ]
    normals = [np.zeros((2 * len(cap), 3, 3))]
    first = 0
    for loop in loops:
        k = len(loop.points)
        outward = np.stack((loop.tangents[..., 1], -loop.tangents[..., 0], np.zeros((k, 2))), axis=2)
        here = first + np.arange(k)
        then = first + (np.arange(k) + 1) % k
        # Rows of one curve stand together, so the walls can be cut where the curve changes.
        starts = np.flatnonzero(np.concatenate(([True], loop.curve[1:] != loop.curve[:-1], [True])))
        for low, high in pairwise(starts):
            a, b = here[low:high], then[low:high]
            pieces.append((np.concatenate((np.stack((a, b, b + n), 1), np.stack((a, b + n, a + n), 1))), len(rows)))
            normals.append(np.concatenate((outward[low:high][:, [0, 1, 1]], outward[low:high][:, [0, 1, 0]])))
            rows.append(wall(loop.curves[loop.curve[low]]))
        first += k
    is_free = any(row[0] == PatchKind.FREE for row in rows)
    return shell(vertices, pieces, surfaces(rows), np.concatenate(normals) if is_free else None)


def wall(curve: Curve) -> tuple[PatchKind, F64, float, bool]:
    """The surface over one stretch of an outline in the xy plane, the material on its left."""
    if curve.is_free:
        return free()
    if curve.radius:
        (x, y), r = curve.centre, curve.radius
        affine = np.array([[r, 0.0, 0.0, x], [0.0, r, 0.0, y], [0.0, 0.0, 1.0, 0.0]])
        return PatchKind.CYLINDER, affine, 0.0, not curve.left
    along = np.array([curve.end[0] - curve.start[0], curve.end[1] - curve.start[1], 0.0])
    along /= np.hypot(along[0], along[1])
    return PatchKind.PLANE, plane((*curve.start, 0.0), (along[1], -along[0], 0.0), along.tolist()), 0.0, False


def _between(base: F64, top: F64, height: float) -> Facets:
    n = len(base)
    sides = [(k, (k + 1) % n, n + (k + 1) % n, n + k) for k in range(n)]
    vertices = np.concatenate((_lifted(base, 0.0), _lifted(top, height)))
    return vertices, (tuple(range(n - 1, -1, -1)), tuple(range(n, 2 * n)), *sides)


def _rectangle(low: float, high: float, across: float) -> F64:
    return np.array([[low, -across / 2], [high, -across / 2], [high, across / 2], [low, across / 2]])


def _lifted(points: F64, height: float) -> F64:
    return np.column_stack((points, np.full(len(points), height)))


def _plane(corners: F64) -> F64:
    """By Newell's sum, which holds for corners that are not quite in one plane; x along the longest side."""
    points: list[list[float]] = corners.tolist()
    total = [0.0, 0.0, 0.0]
    longest, along = -1.0, [1.0, 0.0, 0.0]
    for a, b in zip(points, points[1:] + points[:1], strict=True):
        total = [t + c for t, c in zip(total, cross(a, b), strict=True)]
        side = [q - p for p, q in zip(a, b, strict=True)]
        # A margin, so that rounding does not choose between equal sides.
        if math.hypot(*side) > longest * (1.0 + 1e-9):
            longest, along = math.hypot(*side), side
    normal = [t / math.hypot(*total) for t in total]
    slope = sum(a * n for a, n in zip(along, normal, strict=True))
    along = [a - slope * n for a, n in zip(along, normal, strict=True)]
    return plane(points[0], normal, [a / math.hypot(*along) for a in along])

"""Boxes of recipes without tessellation, for fitting views before anything is built."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from ..trigonometry import cos_deg, sin_deg
from . import sheets, stack
from .along import ALONG, box_points
from .ladder import COARSEST, FACTS_SHARE, first_at_most
from .outline import extent, oriented
from .polyhedra import regular_polygon
from .recipe import (
    Affine,
    Bellows,
    Block,
    Cone,
    Cylinder,
    Edged,
    Ellipsoid,
    Envelope,
    Extrude,
    ParametricSurface,
    Point2,
    Point3,
    Primitive,
    Prism,
    Pyramid,
    Recipe,
    Relief,
    Revolve,
    Sphere,
    Spring,
    Thread,
    Torus,
    Wedge,
)
from .tessellate import rise
from .thread import plain

F64 = NDArray[np.float64]
_Box = tuple[F64, F64]
_STEP = 15.0
"""Degrees between the points that stand for a circular way."""


def bounds(recipe: Recipe) -> tuple[Point3, Point3]:
    """The corners (low, high), mm, of a box round the solid: the boxes of what is added, less what `keep` leaves out.

    Exact for one primitive whose placement keeps the axes apart; for round ones however they are turned. Cuts do not
    shrink it. An empty recipe gives a point at the origin.
    """
    box = _of_recipe(recipe, {})
    if box is None:
        return (0.0, 0.0, 0.0), (0.0, 0.0, 0.0)
    (x0, y0, z0), (x1, y1, z1) = box[0].tolist(), box[1].tolist()
    return (x0, y0, z0), (x1, y1, z1)


def facts_rung(recipe: Recipe) -> float:
    """The rung at which every fact about the part is measured: it follows from the size of the part alone."""
    low, high = bounds(recipe)
    size = max(b - a for a, b in zip(low, high, strict=True))
    return first_at_most(size / FACTS_SHARE) if size > 0.0 else COARSEST


def _of_recipe(recipe: Recipe, known: dict[int, _Box | None]) -> _Box | None:
    if id(recipe) in known:
        return known[id(recipe)]
    box: _Box | None = None
    for step in recipe.steps:
        if step.operation == "cut":
            continue
        new: _Box | None = None
        for placed in step.placed:
            for placement in placed.placements:
                new = _union(new, _of_placed(placed.shape, placement, placed.centred, known))
        if step.operation == "add":
            box = _union(box, new)
        elif box is not None:
            box = None if new is None else _common(box, new)
    known[id(recipe)] = box
    return box


def _of_placed(
    shape: Primitive | Recipe, placement: Affine, centred: bool, known: dict[int, _Box | None]
) -> _Box | None:
    linear, shift = np.array(placement)[:, :3], np.array(placement)[:, 3]
    if isinstance(shape, Recipe):
        inner = _of_recipe(shape, known)
        return None if inner is None else _turned_box(inner, linear, shift)
    balls, points = _hull(shape)
    low, high = np.full(3, np.inf), np.full(3, -np.inf)
    lift = np.array([0.0, 0.0, -rise(shape) / 2 if centred else 0.0])
    for centre, axes in balls:
        middle = linear @ (centre + lift) + shift
        # The reach of an ellipsoid (or disc) with these axes along a direction d is |A^T d|; a sum of bodies adds.
        reach = sum(np.sqrt(((linear * axis) ** 2).sum(axis=1)) for axis in axes)
        low, high = np.minimum(low, middle - reach), np.maximum(high, middle + reach)
    if len(points):
        moved = (points + lift) @ linear.T + shift
        low, high = np.minimum(low, moved.min(axis=0)), np.maximum(high, moved.max(axis=0))
    return low + 0.0, high + 0.0


def _hull(shape: Primitive) -> tuple[list[tuple[F64, F64]], F64]:
    """Sums of ellipsoids (centre, half axes (k,3)) and points whose hull has the shape's box under affine maps."""
    none = np.zeros((0, 3))
    if isinstance(shape, Edged):
        return _hull(shape.shape)
    if isinstance(shape, Relief | ParametricSurface):
        return [], _box_corners(*sheets.bounds(shape))
    if isinstance(shape, Envelope):
        boxes = [_of_placed(each.shape, at, each.centred, {}) for each in shape.placed for at in each.placements]
        return [], np.concatenate([_box_corners(*box) for box in boxes if box is not None])
    if isinstance(shape, Thread):
        # A real one reaches over its major diameter, whether or not it is internal.
        shape = Cylinder(shape.major, shape.length) if shape.real else plain(shape)
    if isinstance(shape, Sphere):
        return [(np.zeros(3), np.full((1, 3), shape.diameter / 2))], none
    if isinstance(shape, Ellipsoid):
        return [(np.zeros(3), np.array([shape.axes]) / 2)], none
    if isinstance(shape, Cylinder | Cone):
        top = shape.top if isinstance(shape, Cone) else shape.diameter
        return [_disc(shape.diameter / 2, 0.0), _disc(top / 2, shape.length)], none
    if isinstance(shape, Torus):
        ring, r = shape.diameter / 2, shape.tube / 2
        return [(np.zeros(3), np.array([[ring, ring, 0.0], [r, r, r]]))], none
    if isinstance(shape, Extrude) and (shape.taper or shape.twist):
        return _of_stack(shape)
    if isinstance(shape, Revolve):
        low, high = extent(oriented(shape.outline.outer, True))
        if shape.angle < 360.0:
            return [], _sector(low, high, shape.angle)
        return [_disc(high[0], low[1]), _disc(high[0], high[1])], none
    if isinstance(shape, Spring | Bellows):
        across = shape.diameter + (shape.wire if isinstance(shape, Spring) else 0.0)
        return [_disc(across / 2, 0.0), _disc(across / 2, shape.length)], none
    if isinstance(shape, ALONG):
        return [], box_points(shape)
    return [], _corners(shape)


def _corners(shape: Block | Wedge | Prism | Pyramid | Extrude) -> F64:
    if isinstance(shape, Block):
        x, y, z = shape.size
        return _levels(np.array([[-x, -y], [x, -y], [x, y], [-x, y]]) / 2, z)
    if isinstance(shape, Wedge):
        x, y, z = shape.size
        base = np.array([[-x, -y], [x, -y], [x, y], [-x, y]]) / 2
        top = np.array([[-x / 2, -y / 2], [shape.top_length - x / 2, -y / 2]])
        top = np.concatenate((top, top * (1.0, -1.0)))
        return np.concatenate((_at(base, 0.0), _at(top, z)))
    if isinstance(shape, Prism):
        return _levels(regular_polygon(shape.sides, shape.across), shape.length)
    if isinstance(shape, Pyramid):
        top = regular_polygon(shape.sides, shape.top) if shape.top > 0.0 else np.zeros((1, 2))
        base = regular_polygon(shape.sides, shape.across)
        return np.concatenate((_at(base, 0.0), _at(top, shape.length)))
    low, high = extent(oriented(shape.outline.outer, True))
    return _levels(np.array([[low[0], low[1]], [high[0], low[1]], [high[0], high[1]], [low[0], high[1]]]), shape.length)


def _of_stack(shape: Extrude) -> tuple[list[tuple[F64, F64]], F64]:
    """A tapered extrusion by its two ends; a twisted one by the ways of their corners, beyond a turn by circles."""
    base, top = stack.reach(shape)
    if not shape.twist:
        return [], np.concatenate((_at(base, 0.0), _at(top, shape.length)))
    if abs(shape.twist) >= 360.0:
        ends = ((base, 0.0), (top, shape.length))
        return [_disc(float(np.hypot(*box.T).max()), height) for box, height in ends], np.zeros((0, 3))
    points = []
    steps = math.ceil(abs(shape.twist) / _STEP)
    for k in range(2 * steps + 1):
        # Between two points of a circle lies the place where their tangents cross.
        far = 1.0 / cos_deg(shape.twist / (2 * steps)) if k % 2 else 1.0
        c, s = (far * f(shape.twist * k / (2 * steps)) for f in (cos_deg, sin_deg))
        corners = np.concatenate((base, top)) @ np.array(((c, s), (-s, c)))
        low, high = (shape.length * m / steps for m in (k // 2, (k + 1) // 2))
        points += [_at(corners, low), _at(corners, high)]
    return [], np.concatenate(points)


def _sector(low: Point2, high: Point2, angle: float) -> F64:
    """Points round part of a turn: the ends, the quarter marks, and where the tangents of these cross."""
    marks = sorted({0.0, angle, *(quarter for quarter in (90.0, 180.0, 270.0) if quarter < angle)})
    corners = [(r * cos_deg(a), r * sin_deg(a)) for a in (0.0, angle) for r in (low[0], high[0])]
    corners += [(high[0] * cos_deg(a), high[0] * sin_deg(a)) for a in marks]
    for a, b in pairwise(marks):
        far, middle = high[0] / cos_deg((b - a) / 2.0), (a + b) / 2.0
        corners.append((far * cos_deg(middle), far * sin_deg(middle)))
    points = np.array(corners)
    return np.concatenate((_at(points, low[1]), _at(points, high[1])))


def _box_corners(low: F64, high: F64) -> F64:
    return np.array([(x, y, z) for x in (low[0], high[0]) for y in (low[1], high[1]) for z in (low[2], high[2])])


def _disc(radius: float, height: float) -> tuple[F64, F64]:
    return np.array([0.0, 0.0, height]), np.array([[radius, radius, 0.0]])


def _levels(points: F64, height: float) -> F64:
    return np.concatenate((_at(points, 0.0), _at(points, height)))


def _at(points: F64, height: float) -> F64:
    return np.column_stack((points, np.full(len(points), height)))


def _turned_box(box: _Box, linear: F64, shift: F64) -> _Box:
    middle = linear @ ((box[0] + box[1]) / 2) + shift
    reach = np.abs(linear) @ ((box[1] - box[0]) / 2)
    return middle - reach, middle + reach


def _union(one: _Box | None, other: _Box | None) -> _Box | None:
    if one is None or other is None:
        return one if other is None else other
    return np.minimum(one[0], other[0]), np.maximum(one[1], other[1])


def _common(one: _Box, other: _Box) -> _Box | None:
    low, high = np.maximum(one[0], other[0]), np.minimum(one[1], other[1])
    return (low, high) if (low <= high).all() else None

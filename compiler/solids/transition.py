"""Solids that pass from one outline into another.

Between convex outlines it is their common envelope, what a sheet wrapped round both forms: two points are joined where
the outlines run in one direction, and the cut at the share t of the length is the sum of the outlines scaled by 1 - t
and t, so the volume is L/3 (A + M + B) with the mixed area M (Minkowski). Other outlines are joined at equal shares of
their lengths, counted from where each leaves its foremost point along +x.
"""

from __future__ import annotations

import math

import manifold3d
import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from .crossing import crossing
from .outline import OutlineFlaw, Polyline, extent, faults, flatten, oriented
from .polyhedra import extrude
from .recipe import ArcTo, Cone, Outline, Transition
from .shell import Shell, shell
from .spine import spelled
from .surfaces import free, plane, surfaces

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]

_CREASE = math.radians(1.0)
COARSE_PARTS = 200.0
"""Transitions between outlines that are not convex are judged at the outline's size over this as chord error."""


def transition_flaws(shape: Transition) -> tuple[OutlineFlaw, ...]:
    """The first mistake of either outline; holes, which have no partner, are one."""
    for outline in (shape.lower, shape.upper):
        wrong = faults(outline, False)
        if wrong:
            return wrong
        if outline.holes:
            sentence = "an outline with holes cannot pass into another"
            return (OutlineFlaw("hole-without-partner", sentence, "cut the hole by a transition of its own"),)
    return () if as_extrusion(shape) else _self_cut(shape)


def _self_cut(shape: Transition) -> tuple[OutlineFlaw, ...]:
    """A flaw where triangles between the outlines cross; none between convex outlines. The ends cannot cross: they are
    the outlines, and all between lies between their planes.
    """
    (x0, y0), (x1, y1) = extent(oriented(shape.lower.outer, True))
    rung = max(x1 - x0, y1 - y0) / COARSE_PARTS
    lower, upper = _outer(shape.lower, rung), _outer(shape.upper, rung)
    if _is_convex(lower) and _is_convex(upper):
        return ()
    made = _joined(lower, upper, _shares(lower), _shares(upper), shape.length)
    met = crossing(made.vertices, made.faces[: len(lower.points) + len(upper.points)])
    if met is None:
        return ()
    sentence = f"the transition would cut itself near {spelled(met)}"
    return (OutlineFlaw("cuts-itself", sentence, "turn one of the outlines, or go by an outline between them"),)


def as_extrusion(shape: Transition) -> bool:
    """Whether both outlines are one."""
    return shape.lower == shape.upper


def as_cone(shape: Transition) -> tuple[Cone, tuple[float, float]] | None:
    """The cone between two circles with one axis, and where it stands."""
    circles = []
    for outline in (shape.lower, shape.upper):
        first = outline.outer.stretches[0]
        if len(outline.outer.stretches) > 1 or not isinstance(first, ArcTo) or first.end != outline.outer.start:
            return None
        circles.append((first.centre, math.dist(first.centre, first.end)))
    (centre, radius), (other, top) = circles
    return (Cone(2 * radius, 2 * top, shape.length), centre) if centre == other else None


def transition(shape: Transition, rung: float) -> Shell:
    """The shell of a transition at a chord error; its joins have n + m triangles for outlines of n and m chords."""
    if as_extrusion(shape):
        return extrude(flatten(shape.lower, rung), shape.length)
    lower, upper = _outer(shape.lower, rung), _outer(shape.upper, rung)
    if _is_convex(lower) and _is_convex(upper):
        one, other = _directions(lower), _directions(upper)
    else:
        one, other = _shares(lower), _shares(upper)
    return _joined(lower, upper, one, other, shape.length)


def _outer(outline: Outline, rung: float) -> Polyline:
    return flatten(outline, rung)[0]


def _is_convex(loop: Polyline) -> bool:
    edge = np.roll(loop.points, -1, axis=0) - loop.points
    turn = edge[:, 0] * np.roll(edge[:, 1], -1) - edge[:, 1] * np.roll(edge[:, 0], -1)
    length = np.hypot(edge[:, 0], edge[:, 1])
    return bool((turn >= -1e-9 * length * np.roll(length, -1)).all())


def _directions(loop: Polyline) -> F64:
    """The direction of every chord, radians rising from the first at or behind -pi/2, where a loop faces -y."""
    edge = np.roll(loop.points, -1, axis=0) - loop.points
    angle = np.arctan2(edge[:, 1], edge[:, 0])
    whole: F64 = np.where(angle < -1e-9, angle + math.tau, angle)
    return whole


def _shares(loop: Polyline) -> F64:
    """The middle of every chord as a share of the loop, counted from its foremost point along +x."""
    edge = np.roll(loop.points, -1, axis=0) - loop.points
    length = np.hypot(edge[:, 0], edge[:, 1])
    start = int(np.argmax(loop.points[:, 0] - 1e-9 * np.abs(loop.points[:, 1])))
    middle = np.cumsum(length) - length / 2
    shares: F64 = ((middle - (np.cumsum(length) - length)[start]) / length.sum()) % 1.0
    return shares


def _joined(lower: Polyline, upper: Polyline, one: F64, other: F64, length: float) -> Shell:
    """Triangles in the order of the chords' places `one` (n,) and `other` (m,): each chord with the point of the other
    loop that the chords before it have reached.
    """
    n = len(one)
    vertices = np.concatenate((_at(lower.points, 0.0), _at(upper.points, length)))
    order = _order(one, other)
    a = int(order[order < n][0])
    b = int(order[order >= n][0])
    faces, normals = [], []
    for chord in order.tolist():
        loop, k = (lower, chord) if chord < n else (upper, chord - n)
        then = (k + 1) % len(loop.points) + (0 if chord < n else n)
        apex = b if chord < n else a
        ends, at_apex = _chord_normals(loop.tangents[k], vertices[[chord, then]], vertices[apex])
        if chord < n:
            faces.append((chord, then, apex))
            normals.append((ends[0], ends[1], at_apex))
            a = then
        else:
            faces.append((chord, apex, then))
            normals.append((ends[0], at_apex, ends[1]))
            b = then
    straight = [loop.curves[row].is_line for loop in (lower, upper) for row in loop.curve.tolist()]
    return _shell(vertices, np.array(faces), np.array(normals), np.array(straight)[order], (lower, upper, length))


def _order(one: F64, other: F64) -> NDArray[np.intp]:
    """Chords of both loops, those of the second counted on, in the order of their places."""
    places = np.concatenate((one, other))
    # A millionth of a turn apart is together, so that rounding does not order chords that run in one direction.
    return np.lexsort((np.arange(len(places)) >= len(one), np.round(places, 6)))


def _chord_normals(tangents: F64, ends: F64, apex: F64) -> tuple[F64, F64]:
    """Outward normals (2,3) at the ends of a chord and (3,) at its apex: square to the outline and to the ruling."""
    outward = np.stack((tangents[:, 1], -tangents[:, 0]), axis=1)
    rise = apex[2] - ends[0, 2]
    slope = (outward * (ends[:, :2] - apex[:2])).sum(axis=1) / rise
    found = np.column_stack((outward, slope))
    found /= np.sqrt((found**2).sum(axis=1))[:, None]
    middle = found.sum(axis=0)
    return found, middle / math.sqrt(float(middle @ middle))


def _shell(
    vertices: F64, faces: I64, normals: F64, straight: NDArray[np.bool_], form: tuple[Polyline, Polyline, float]
) -> Shell:
    """Flat triangles on straight stretches, free surfaces elsewhere, a new one behind every crease; and two caps."""
    lower, upper, length = form
    rows: list[tuple[PatchKind, F64, float, bool]] = []
    pieces: list[tuple[I64, int]] = []
    # Ends of the chord and apex among the corners of each triangle.
    far = np.where(faces[:, 0] < len(lower.points), 1, 2)
    row = np.arange(len(faces))
    first, last = normals[:, 0], normals[row, far]
    turn = _between(first, last)
    step = _between(np.roll(last, 1, axis=0), first)
    # Smooth where the normal does not jump by more than chords do; a free surface that leaves a flat one leaves with
    # its normal, at its apex too.
    smooth = step <= _CREASE + turn + np.roll(turn, 1)
    leaves = np.roll(straight, 1) & smooth
    normals[row[leaves], 3 - far[leaves]] = first[leaves]
    arrives = np.roll(straight & smooth, -1) & ~leaves
    normals[row[arrives], 3 - far[arrives]] = last[arrives]
    for k, (face, is_flat) in enumerate(zip(faces, straight.tolist(), strict=True)):
        if is_flat:
            p, q, r = vertices[face]
            across = np.cross(q - p, r - p)
            along = (q - p) / math.dist(p, q)
            rows.append((PatchKind.PLANE, plane(p.tolist(), _unit(across), along.tolist()), 0.0, False))
        elif k == 0 or straight[k - 1] or not smooth[k]:
            rows.append(free())
        pieces.append((face[None], len(rows) - 1))
    n, m = len(lower.points), len(upper.points)
    for cap, height, up in ((_cap(lower)[:, ::-1], 0.0, -1.0), (_cap(upper) + n, length, 1.0)):
        pieces.append((cap, len(rows)))
        rows.append((PatchKind.PLANE, plane((0.0, 0.0, height), (0.0, 0.0, up), (1.0, 0.0, 0.0)), 0.0, False))
    every = np.concatenate((normals, np.zeros((n - 2 + m - 2, 3, 3))))
    return shell(vertices, pieces, surfaces(rows), every)


def _between(one: F64, other: F64) -> F64:
    """Angles (k,) between unit vectors, radians."""
    angles: F64 = 2.0 * np.arcsin(np.minimum(np.sqrt(((one - other) ** 2).sum(axis=1)) / 2.0, 1.0))
    return angles


def _cap(loop: Polyline) -> I64:
    triangles: I64 = manifold3d.triangulate([loop.points]).astype(np.int64)
    return triangles


def _at(points: F64, height: float) -> F64:
    return np.column_stack((points, np.full(len(points), height)))


def _unit(vector: F64) -> list[float]:
    unit: list[float] = (vector / math.sqrt(float(vector @ vector))).tolist()
    return unit

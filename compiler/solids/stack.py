"""Outlines raised with walls that lean, turn, or end in rounded and chamfered rims.

A profile in (inset, height) says how far the outline has moved into its material at every height: a vertical line for
a plain wall, a leaning one for a taper, an arc or a short line for a rim. Lines keep plane and cylindrical walls, arcs
cylinders, cones and tori; splines, ellipses and all that twists are free surfaces with exact normals.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import manifold3d
import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from ..trigonometry import cos_deg, sin_deg, tan_deg
from .curve import Curve, count_chords, divided, end_tangents, full_turn, points_at, shares_of, unit
from .ladder import divisions
from .outline import OutlineFlaw, Polyline, contact, extent, inside, oriented
from .plane import Corner, PlaneFlaw, cornered, inset, is_smooth
from .recipe import Extrude
from .revolve import strip
from .shell import Shell, shell
from .surfaces import free, plane, surfaces, upright

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]
_Row = tuple[PatchKind, F64, float, bool]
_NEAR = 1e-9
_MOST_STEPS = 256
_TURN = 30.0
"""Degrees that one level of a twist turns at most."""


@dataclass(frozen=True, eq=False, slots=True)
class _Level:
    """One height: inset and height in mm, the angle turned in degrees, the direction (2,) of the profile in
    (inset, height) below and above it, the row of the profile's curve above it.
    """

    inset: float
    height: float
    angle: float
    below: F64
    above: F64
    stage: int


def profile(shape: Extrude, rim: Corner | None) -> list[Curve]:
    """The curves of the wall from bottom to top in (inset, height). Raises PlaneFlaw for a rim that does not fit."""
    top = shape.length * tan_deg(shape.taper)
    far = max(0.0, top) + 10.0 * shape.length + (10.0 * rim.size if rim else 0.0)
    corners = ((0.0, 0.0), (top, shape.length), (far, shape.length), (far, 0.0))
    curves = [Curve(a, b) for a, b in zip(corners, (*corners[1:], corners[0]), strict=True)]
    return list(cornered(curves, [rim, rim, None, None]))[:-3]


def loops_of(shape: Extrude) -> list[tuple[Curve, ...]]:
    """The loops of the outline, material on the left."""
    return [oriented(loop, k == 0) for k, loop in enumerate((shape.outline.outer, *shape.outline.holes))]


def check(shape: Extrude, rim: Corner | None) -> None:
    """Raise PlaneFlaw unless the outline bears the insets of its wall."""
    wall = profile(shape, rim)
    # The arc of a rim may bulge further than its ends.
    insets = {end[0] for curve in wall for end in (curve.start, curve.end, *extent((curve,)))}
    for distance in sorted(insets - {0.0}):
        lines = []
        for k, loop in enumerate(loops_of(shape)):
            curves = inset(loop, distance)
            pieces = [_moved(curve, np.linspace(0.0, 1.0, count_chords(curve, 0.0) + 1), distance) for curve in curves]
            for curve, (points, tangents) in zip(loop, pieces, strict=True):
                if curve.is_free and ((np.diff(points, axis=0) * tangents[:-1]).sum(axis=1) <= 0.0).any():
                    raise PlaneFlaw("parallel-crosses-itself", f"a curve bends more sharply than {distance:.6g} mm")
            ring = np.concatenate([points[:-1] for points, _ in pieces])
            lines.append(_polygon(ring))
            if (_polygon_area(ring) > 0.0) != (k == 0):
                raise PlaneFlaw("parallel-vanishes", f"nothing is left of the outline {distance:.6g} mm inside it")
        touch = contact(lines)
        if touch is not None:
            where = f"({touch[0]:.6g} mm, {touch[1]:.6g} mm)"
            raise PlaneFlaw(
                "parallel-crosses-itself", f"{distance:.6g} mm inside it the outline crosses itself at {where}"
            )
        if any(not inside(line.points[0], lines[0].points) for line in lines[1:]):
            raise PlaneFlaw("parallel-vanishes", f"nothing is left of the outline {distance:.6g} mm inside it")


def taper_flaws(shape: Extrude) -> tuple[OutlineFlaw, ...]:
    """What is wrong with the taper of an extrusion whose outline is right."""
    try:
        check(shape, None)
    except PlaneFlaw as flaw:
        sentence = f"a taper of {shape.taper:.6g} deg does not fit: {flaw.sentence}"
        return (OutlineFlaw("taper-too-large", sentence, "lessen the taper or the length"),)
    return ()


def count_triangles(shape: Extrude, rim: Corner | None, rung: float) -> int:
    """Triangles of `stack` at most, for an outline that `check` has passed."""
    levels = _levels(shape, rim, rung)
    turn = _turn_of(levels)
    insets = [level.inset for level in levels]
    total = 0
    for loop in loops_of(shape):
        # An arc grows or shrinks steadily with the inset, so its division is largest at one of the ends.
        sizes = [_divisions(loop, distance, rung, turn) for distance in (min(insets), max(insets))]
        total += sum(map(max, *sizes)) * (2 * (len(levels) - 1) + 4)
    return total


def reach(shape: Extrude) -> tuple[F64, F64]:
    """Corners (4,2) of boxes round the outline at the bottom and at the top, before any twist."""
    boxes = []
    for distance in (0.0, shape.length * tan_deg(shape.taper)):
        try:
            curves = inset(loops_of(shape)[0], distance) if distance else loops_of(shape)[0]
        except PlaneFlaw:
            curves = loops_of(shape)[0]
        (x0, y0), (x1, y1) = extent(curves)
        # Splines and ellipses stay where they are in `inset`.
        grow = max(0.0, -distance) if any(curve.is_free for curve in curves) else 0.0
        x0, y0, x1, y1 = x0 - grow, y0 - grow, x1 + grow, y1 + grow
        boxes.append(np.array([[x0, y0], [x1, y0], [x1, y1], [x0, y1]]))
    return boxes[0], boxes[1]


def stack(shape: Extrude, rim: Corner | None, rung: float) -> Shell:
    """The closed shell of an extrusion with taper, twist or rims, for an outline that `check` has passed."""
    rung = _fine_enough(shape, rim, rung)
    wall = profile(shape, rim)
    levels = _levels(shape, rim, rung)
    turn = _turn_of(levels)
    vertices: list[F64] = []
    pieces: list[tuple[I64, int]] = []
    normals: list[F64] = []
    rows: list[_Row] = []
    bottoms: list[tuple[F64, I64]] = []
    tops: list[tuple[F64, I64]] = []
    n_vertices = 0
    for loop in loops_of(shape):
        rings = [_ring(loop, level, rung, turn) for level in levels]
        first_row = len(rows)
        rows += [_surface(curve, stage, shape.twist != 0.0) for stage in wall for curve in loop]
        start = n_vertices
        starts = []
        for ring, level in zip(rings, levels, strict=True):
            starts.append(start)
            start += len(ring.points)
            vertices.append(_raised(ring.points, level))
        n_vertices = start
        for k in range(len(levels) - 1):
            for c in range(len(loop)):
                row = first_row + levels[k].stage * len(loop) + c
                faces = strip(rings[k].shares[c], rings[k + 1].shares[c])
                low, high = rings[k].index(c) + starts[k], rings[k + 1].index(c) + starts[k + 1]
                pieces.append((np.concatenate((low, high))[faces], row))
                is_free = rows[row][0] == PatchKind.FREE
                corner = _band_normals(rings[k : k + 2], levels[k : k + 2], c, shape)[faces] if is_free else None
                normals.append(np.zeros((len(faces), 3, 3)) if corner is None else corner)
        bottoms.append((rings[0].points, starts[0] + np.arange(len(rings[0].points))))
        tops.append((rings[-1].points, starts[-1] + np.arange(len(rings[-1].points))))
    for ends, height, up in ((bottoms, 0.0, -1.0), (tops, shape.length, 1.0)):
        cap = manifold3d.triangulate([points for points, _ in ends]).astype(np.int64)
        cap = np.concatenate([rows_ for _, rows_ in ends])[cap if up > 0.0 else cap[:, ::-1]]
        pieces.append((cap, len(rows)))
        normals.append(np.zeros((len(cap), 3, 3)))
        rows.append((PatchKind.PLANE, plane((0.0, 0.0, height), (0.0, 0.0, up), (1.0, 0.0, 0.0)), 0.0, False))
    is_free = any(row[0] == PatchKind.FREE for row in rows)
    return shell(np.concatenate(vertices), pieces, surfaces(rows), np.concatenate(normals) if is_free else None)


def _fine_enough(shape: Extrude, rim: Corner | None, rung: float) -> float:
    """The rung, or a finer one where coarse chords of the loops would touch each other at one of the ends."""
    loops = loops_of(shape)
    if len(loops) == 1 and all(curve.is_line for curve in loops[0]):
        return rung
    for _ in range(3):
        levels = _levels(shape, rim, rung)
        turn = _turn_of(levels)
        ends = [[_ring(loop, level, rung, turn).points for loop in loops] for level in (levels[0], levels[-1])]
        if all(contact([_polygon(ring) for ring in rings]) is None for rings in ends):
            break
        rung /= 4.0
    return rung


@dataclass(frozen=True, eq=False, slots=True)
class _Ring:
    """One loop at one level, before it turns: points (k,2); for each curve the row of its first point, and shares and
    tangents of its points with its end.
    """

    points: F64
    first: list[int]
    shares: list[F64]
    tangents: list[F64]

    def index(self, c: int) -> I64:
        """Rows of the points of a curve with its end."""
        return (self.first[c] + np.arange(len(self.shares[c]))) % len(self.points)


def _levels(shape: Extrude, rim: Corner | None, rung: float) -> list[_Level]:
    wall = profile(shape, rim)
    levels: list[_Level] = []
    steps = _twist_steps(shape, rung)
    for stage, curve in enumerate(wall):
        points, tangents = divided(curve, rung)
        n = _corner_steps(shape, curve, rung) if curve.is_line else len(points)
        if steps or n > len(points):
            n = max(n, math.ceil(steps * abs(curve.end[1] - curve.start[1]) / shape.length))
            points, tangents = points_at(curve, np.arange(n + 1) / n)
            points = points[:-1]
        for k, (distance, height) in enumerate(points.tolist()):
            below = levels[-1].above if k == 0 and levels else tangents[k]
            if k == 0 and stage:
                below = end_tangents(wall[stage - 1])[1]
            levels.append(_Level(distance, height, shape.twist * height / shape.length, below, tangents[k], stage))
    distance, height = wall[-1].end
    last = end_tangents(wall[-1])[1]
    levels.append(_Level(distance, shape.length, shape.twist, last, last, len(wall)))
    return levels


def _corner_steps(shape: Extrude, stage: Curve, rung: float) -> int:
    """Levels of a leaning wall: where an arc meets its neighbour in a corner, the edge between their walls is bent."""
    low, high = stage.start[0], stage.end[0]
    bent = [loop for loop in loops_of(shape) if any(curve.radius for curve in loop) and len(loop) > 1]
    n = 1
    while bent and low != high and n < _MOST_STEPS:
        marks = [low + (high - low) * k / (2 * n) for k in range(2 * n + 1)]
        off = 0.0
        for loop in bent:
            starts = np.array([[curve.start for curve in inset(loop, mark)] for mark in marks])
            middle = (starts[:-1:2] + starts[2::2]) / 2.0 - starts[1::2]
            off = max(off, float(np.hypot(middle[..., 0], middle[..., 1]).max()))
        if off <= rung:
            break
        n *= 2
    return n


def _twist_steps(shape: Extrude, rung: float) -> int:
    if shape.twist == 0.0:
        return 0
    reach = max(
        math.hypot(*corner)
        for box in (extent(loops_of(shape)[0]),)
        for corner in ((box[0][0], box[0][1]), (box[1][0], box[1][1]), (box[0][0], box[1][1]), (box[1][0], box[0][1]))
    )
    return max(
        math.ceil(divisions(max(reach, rung), rung) * abs(shape.twist) / 360.0), math.ceil(abs(shape.twist) / _TURN), 1
    )


def _turn_of(levels: Sequence[_Level]) -> float:
    """The angle between two levels at most, radians."""
    return max(math.radians(abs(b.angle - a.angle)) for a, b in pairwise(levels))


def _division(
    curves: Sequence[Curve], moved: Sequence[Curve], c: int, distance: float, rung: float, turn: float
) -> tuple[F64, F64, F64]:
    """Shares (k,), points (k,2) and tangents (k,2) of a curve at one level, its end included.

    Circles, and arcs whose ends are smooth, are divided at the marks of their own circle, as cylinders are.
    """
    curve, level = curves[c], moved[c]
    if curve.radius and not turn:
        if len(curves) == 1:
            points, tangents = full_turn(level, rung)
            return np.arange(len(tangents)) / len(points), np.concatenate((points, points[:1])), tangents
        if is_smooth(curves[c - 1], curve) and is_smooth(curve, curves[(c + 1) % len(curves)]):
            points, tangents = divided(level, rung)
            whole = np.concatenate((points, np.array([level.end])))
            return np.append(shares_of(level, points), 1.0), whole, tangents
    n = 1 if curve.is_line and not turn else count_chords(level, rung)
    if turn:
        # A twisted face is off by a quarter of its length times its turn where it is split in two.
        n = max(n, math.ceil(_length(level) * turn / (4.0 * rung)))
    shares = np.arange(n + 1) / n
    points, tangents = _moved(level, shares, distance)
    if not level.is_free:
        points[0] = level.start
    return shares, points, tangents


def _length(curve: Curve) -> float:
    points, _ = points_at(curve, np.linspace(0.0, 1.0, 33 if not curve.is_line else 2))
    return float(np.hypot(*np.diff(points, axis=0).T).sum())


def _divisions(loop: tuple[Curve, ...], distance: float, rung: float, turn: float) -> list[int]:
    """Chords of each curve of a loop at an inset."""
    moved = inset(loop, distance) if distance else loop
    return [len(_division(loop, moved, c, distance, rung, turn)[0]) - 1 for c in range(len(loop))]


def _ring(loop: tuple[Curve, ...], level: _Level, rung: float, turn: float) -> _Ring:
    moved = inset(loop, level.inset) if level.inset else loop
    pieces = [_division(loop, moved, c, level.inset, rung, turn) for c in range(len(loop))]
    sizes = [len(shares) - 1 for shares, _, _ in pieces]
    first = np.cumsum([0, *sizes[:-1]]).tolist()
    points = np.concatenate([points[:-1] for _, points, _ in pieces])
    return _Ring(points, first, [shares for shares, _, _ in pieces], [tangents for _, _, tangents in pieces])


def _moved(curve: Curve, shares: F64, distance: float) -> tuple[F64, F64]:
    """Points and tangents of a curve that `inset` gave; splines and ellipses are moved here."""
    points, tangents = points_at(curve, shares)
    if curve.is_free:
        points = points + distance * np.stack((-tangents[:, 1], tangents[:, 0]), axis=1)
    return points, tangents


def _raised(points: F64, level: _Level) -> F64:
    c, s = cos_deg(level.angle), sin_deg(level.angle)
    x, y = points[:, 0], points[:, 1]
    return np.column_stack((c * x - s * y, s * x + c * y, np.full(len(x), level.height)))


def _band_normals(rings: Sequence[_Ring], levels: Sequence[_Level], c: int, shape: Extrude) -> F64:
    """Normals (k,3) at the points of one curve at one level and then at the next."""
    ends = []
    for ring, level, way in zip(rings, levels, (levels[0].above, levels[1].below), strict=True):
        points, tangents = ring.points[ring.index(c)], ring.tangents[c]
        ends.append(_normals(points, tangents, way, level.angle, math.radians(shape.twist) / shape.length))
    return np.concatenate(ends)


def _normals(points: F64, tangents: F64, way: F64, angle: float, twist: float) -> F64:
    """Outward unit normals (k,3): the curve's tangent t times the way up, -d n + z up + the turn about the axis."""
    inward, up = way.tolist()
    t = np.column_stack((tangents, np.zeros(len(tangents))))
    x = -tangents[:, 1] * inward - twist * up * points[:, 1]
    y = tangents[:, 0] * inward + twist * up * points[:, 0]
    found = np.cross(t, np.column_stack((x, y, np.full(len(x), up))))
    found /= np.sqrt((found**2).sum(axis=1))[:, None]
    c, s = cos_deg(angle), sin_deg(angle)
    return np.column_stack((c * found[:, 0] - s * found[:, 1], s * found[:, 0] + c * found[:, 1], found[:, 2]))


def _surface(curve: Curve, stage: Curve, is_twisted: bool) -> _Row:
    if curve.is_free or is_twisted:
        return free()
    if curve.is_line:
        tx, ty = end_tangents(curve)[0].tolist()
        outward = (ty, -tx)
        if stage.is_line:
            d, z = end_tangents(stage)[0].tolist()
            (x, y), (inward, height) = curve.start, stage.start
            origin = (x - inward * outward[0], y - inward * outward[1], height)
            return PatchKind.PLANE, plane(origin, (outward[0] * z, outward[1] * z, d), (tx, ty, 0.0)), 0.0, False
        r, (inward, height) = stage.radius, stage.centre
        x, y = curve.start[0] - inward * outward[0], curve.start[1] - inward * outward[1]
        affine = np.array([[r * outward[0], 0.0, -tx, x], [r * outward[1], 0.0, -ty, y], [0.0, r, 0.0, height]])
        return PatchKind.CYLINDER, affine, 0.0, False
    sign = 1.0 if curve.left else -1.0
    x, y = curve.centre
    if not stage.is_line:
        r, (inward, height) = stage.radius, stage.centre
        return PatchKind.TORUS, upright(r, r, (x, y, height)), (curve.radius - sign * inward) / r, False
    (d1, z1), (d2, z2) = stage.start, stage.end
    r1, r2 = curve.radius - sign * d1, curve.radius - sign * d2
    if abs(r2 - r1) <= _NEAR * max(r1, r2):
        affine = np.array([[r1, 0.0, 0.0, x], [0.0, r1, 0.0, y], [0.0, 0.0, 1.0, 0.0]])
        return PatchKind.CYLINDER, affine, 0.0, not curve.left
    apex = z1 - r1 * (z2 - z1) / (r2 - r1)
    r, z = (r1, z1) if r1 > r2 else (r2, z2)
    return PatchKind.CONE, upright(r, z - apex, (x, y, apex)), 0.0, not curve.left


def _polygon_area(points: F64) -> float:
    after = np.roll(points, -1, axis=0)
    return float((points[:, 0] * after[:, 1] - after[:, 0] * points[:, 1]).sum()) / 2.0


def _polygon(points: F64) -> Polyline:
    after = np.roll(points, -1, axis=0)
    along = unit(after - points)
    return Polyline(points, np.arange(len(points), dtype=np.int32), (), np.stack((along, along), axis=1))

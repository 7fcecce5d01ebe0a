"""Plane outlines: one winding, stretches to points, and the mistakes that an outline can hold.

Stretches become `Curve`s that run round the material with it on their left: the outer loop counter-clockwise,
holes clockwise.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from .cubic import bezier_pieces
from .curve import Curve, area_beside, divided, full_turn, reached, reverse
from .curve import count_chords as count_curve_chords
from .curve import sweep as sweep
from .flaw import SolidError
from .recipe import ArcTo, BezierTo, EllipseTo, Loop, Outline, Point2, SplineTo, Stretch

F64 = NDArray[np.float64]

MAX_STRETCHES = 20_000
"""Limit named `stretches`: lines and arcs of one outline."""
_NEAR = 1e-9


@dataclass(frozen=True, eq=False, slots=True)
class Polyline:
    """A closed polygon: points (k,2) float64; curve (k,) int32, the row of `curves` that point k to k+1 runs along;
    tangents (k,2,2) float64, the unit tangents of that curve at both ends of the chord.
    """

    points: F64
    curve: NDArray[np.int32]
    curves: tuple[Curve, ...]
    tangents: F64


@dataclass(frozen=True, slots=True)
class OutlineFlaw:
    """A mistake of the outline, before its line in the source is known."""

    code: str
    sentence: str
    hint: str


def flatten(outline: Outline, rung: float) -> list[Polyline]:
    """Outer loop first, then the holes, at a chord error; finer where coarse chords would touch each other."""
    loops = [oriented(loop, k == 0) for k, loop in enumerate((outline.outer, *outline.holes))]
    for chord_error in (rung, rung / 4.0, rung / 16.0, rung / 64.0, 0.0):
        lines = [polyline(curves, chord_error) for curves in loops]
        if (len(loops) == 1 and len(loops[0]) == 1 and not loops[0][0].pieces) or contact(lines) is None:
            return lines
    raise SolidError("an outline that touches itself was not refused")


def closed(loop: Loop) -> tuple[Curve, ...]:
    """The loop's stretches as written, closed, none of no length."""
    return tuple(_curves(loop))


def oriented(loop: Loop, counter_clockwise: bool) -> tuple[Curve, ...]:
    """The loop's stretches, closed, in the winding asked for; none of no length, collinear lines joined."""
    curves = _joined(_curves(loop))
    if (area(curves) > 0.0) == counter_clockwise:
        return curves
    return tuple(reverse(c) for c in reversed(curves))


def area(curves: tuple[Curve, ...]) -> float:
    """Signed area of a closed loop, mm2, exact for every kind of stretch."""
    return sum(area_beside(curve) for curve in curves)


def extent(curves: tuple[Curve, ...]) -> tuple[Point2, Point2]:
    """The exact box (low, high) of a closed loop; two points at the origin for an empty one."""
    points = [point for curve in curves for point in reached(curve)] or [(0.0, 0.0)]
    across, up = [p[0] for p in points], [p[1] for p in points]
    return (min(across), min(up)), (max(across), max(up))


def count_chords(curves: tuple[Curve, ...], rung: float) -> int:
    """Points of `polyline` at most."""
    return sum(count_curve_chords(curve, rung) for curve in curves)


def polyline(curves: tuple[Curve, ...], rung: float) -> Polyline:
    """Chords of at most `rung` of error, 0 for 1/100 000 of each radius; a circle alone starts at its own zero mark."""
    if len(curves) == 1 and not curves[0].pieces:
        pieces = [full_turn(curves[0], rung)]
    else:
        pieces = [divided(curve, rung) for curve in curves]
    rows = np.repeat(np.arange(len(curves), dtype=np.int32), [len(points) for points, _ in pieces])
    tangents = np.concatenate([np.stack((along[:-1], along[1:]), axis=1) for _, along in pieces])
    return Polyline(np.concatenate([points for points, _ in pieces]), rows, curves, tangents)


def faults(outline: Outline, turned: bool) -> tuple[OutlineFlaw, ...]:
    """What is wrong with an outline, the first of its kinds only. `turned`: it will be revolved.

    Judged on chords of 1/100 000 of each radius, never on those of a figure. Cost: n log n of the chords for
    outlines as they are drawn.
    """
    loops = (outline.outer, *outline.holes)
    if sum(_count(stretch) for loop in loops for stretch in loop.stretches) > MAX_STRETCHES:
        sentence = f"the outline has more than {MAX_STRETCHES} stretches, the limit named `stretches`"
        return (OutlineFlaw("too-large", sentence, "draw it with fewer lines and arcs"),)
    curves = [oriented(loop, k == 0) for k, loop in enumerate(loops)]
    size = max(1e-12, max(abs(x) for loop in curves for corner in extent(loop) for x in corner))
    for loop in curves:
        # Lobes of a crossing loop may cancel; only what lies on one line encloses nothing.
        if abs(area(loop)) <= _NEAR * size * size and _is_on_a_line(loop, size):
            return (OutlineFlaw("no-area", "the outline encloses no area", "give it points that go round something"),)
    lines = [polyline(loop, 0.0) for loop in curves]
    touch = contact(lines)
    if touch is not None:
        where = f"({touch[0]:.6g} mm, {touch[1]:.6g} mm)"
        sentence = f"the outline crosses or touches itself at {where}"
        return (OutlineFlaw("outline-crosses-itself", sentence, "let its stretches meet only end to end"),)
    for k in range(1, len(lines)):
        if not inside(lines[k].points[0], lines[0].points):
            sentence = f"hole {k} of the outline lies outside it"
            return (OutlineFlaw("hole-outside", sentence, "move the hole inside the outer loop"),)
        if any(inside(lines[k].points[0], lines[j].points) for j in range(1, len(lines)) if j != k):
            sentence = f"hole {k} of the outline lies in another hole"
            return (OutlineFlaw("hole-outside", sentence, "leave out the inner hole"),)
    least = float(min(line.points[:, 0].min() for line in lines))
    if turned and least < -_NEAR * size:
        sentence = f"the outline to be revolved reaches a radius of {least:.6g} mm; none may be negative"
        return (OutlineFlaw("negative-radius", sentence, "keep the outline on one side of the axis"),)
    return ()


def _count(stretch: Stretch) -> int:
    return len(stretch.points) if isinstance(stretch, SplineTo | BezierTo) else 1


def _is_on_a_line(loop: tuple[Curve, ...], size: float) -> bool:
    if any(curve.radius or curve.is_free for curve in loop):
        return False
    points = np.array([curve.start for curve in loop]).reshape(-1, 2)
    away = points - points[:1]
    far = away[np.argmax((away**2).sum(axis=1))] if len(away) else np.zeros(2)
    return bool((np.abs(away[:, 0] * far[1] - away[:, 1] * far[0]) <= _NEAR * size * size).all())


def inside(point: F64, polygon: F64) -> bool:
    """Whether a point lies within a polygon (k,2), by the parity of crossings to the right."""
    x, y = polygon[:, 0], polygon[:, 1]
    x2, y2 = np.roll(x, -1), np.roll(y, -1)
    spans = (y > point[1]) != (y2 > point[1])
    crossing = x + (point[1] - y) * (x2 - x) / np.where(y2 == y, 1.0, y2 - y)
    return bool(np.count_nonzero(spans & (crossing > point[0])) % 2)


def contact(lines: list[Polyline]) -> Point2 | None:
    """Where two chords meet that are not neighbours, or where neighbours fold back; None if nowhere.

    Pairs are found by a sweep in x, in blocks of a fixed size.
    """
    start = np.concatenate([line.points for line in lines])
    end = np.concatenate([np.roll(line.points, -1, axis=0) for line in lines])
    following = np.concatenate([_following(lines, k) for k in range(len(lines))])
    near = _NEAR * max(1e-12, float(np.abs(start).max()))
    low, high = np.minimum(start, end) - near, np.maximum(start, end) + near
    order = np.argsort(low[:, 0], kind="stable")
    reach = np.searchsorted(low[order, 0], high[order, 0], side="right")
    counts = np.maximum(reach - np.arange(len(order)) - 1, 0)
    block = 0
    while block < len(order):
        ends = np.cumsum(counts[block:])
        stop = block + max(1, int(np.searchsorted(ends, 1_000_000, side="right")))
        some = counts[block:stop]
        first = np.repeat(np.arange(block, stop), some)
        second = first + 1 + np.arange(len(first)) - np.repeat(np.cumsum(some) - some, some)
        i, j = order[first], order[second]
        close = (low[i, 1] <= high[j, 1]) & (low[j, 1] <= high[i, 1])
        met = _meeting(start, end, following, i[close], j[close], near)
        if met is not None:
            return met
        block = stop
    return None


def _following(lines: list[Polyline], k: int) -> NDArray[np.intp]:
    before = sum(len(line.points) for line in lines[:k])
    n = len(lines[k].points)
    return before + (np.arange(n) + 1) % n


def _meeting(
    start: F64, end: F64, following: NDArray[np.intp], i: NDArray[np.intp], j: NDArray[np.intp], near: float
) -> Point2 | None:
    a, b, c, d = start[i], end[i], start[j], end[j]
    then, before = following[i] == j, following[j] == i
    # Ends that neighbours share by right do not count; the far ends must still keep clear of the other chord.
    gaps = np.stack(
        (
            np.where(before, np.inf, _gap(a, c, d)),
            np.where(then, np.inf, _gap(b, c, d)),
            np.where(then, np.inf, _gap(c, a, b)),
            np.where(before, np.inf, _gap(d, a, b)),
        )
    )
    crossing = (_side(a, b, c) * _side(a, b, d) < 0.0) & (_side(c, d, a) * _side(c, d, b) < 0.0) & ~then & ~before
    bad = np.flatnonzero(crossing | (gaps.min(axis=0) <= near))
    if not len(bad):
        return None
    k = int(bad[0])
    if crossing[k]:
        share = _side(c[k], d[k], a[k]) / (_side(c[k], d[k], a[k]) - _side(c[k], d[k], b[k]))
        point = a[k] + share * (b[k] - a[k])
    else:
        point = (a, b, c, d)[int(gaps[:, k].argmin())][k]
    return (float(point[0]) + 0.0, float(point[1]) + 0.0)


def _side(a: F64, b: F64, p: F64) -> F64:
    turn: F64 = (b[..., 0] - a[..., 0]) * (p[..., 1] - a[..., 1]) - (b[..., 1] - a[..., 1]) * (p[..., 0] - a[..., 0])
    return turn


def _gap(p: F64, a: F64, b: F64) -> F64:
    along = b - a
    length = (along**2).sum(axis=1)
    share = np.clip(((p - a) * along).sum(axis=1) / np.where(length == 0.0, 1.0, length), 0.0, 1.0)
    off = p - a - share[:, None] * along
    gap: F64 = np.hypot(off[:, 0], off[:, 1])
    return gap


def _curves(loop: Loop) -> list[Curve]:
    curves, at = [], loop.start
    for stretch in loop.stretches:
        if isinstance(stretch, SplineTo):
            curves.append(_spline(at, stretch))
        elif isinstance(stretch, BezierTo):
            knots = (at, *stretch.points)
            ends = zip(knots[:-1:3], knots[1::3], knots[2::3], knots[3::3], strict=True)
            pieces = tuple((a, b, c, d) for a, b, c, d in ends)
            curves.append(Curve(at, stretch.end, pieces=pieces))
        elif isinstance(stretch, EllipseTo):
            oval = (*stretch.axes, stretch.turn)
            curves.append(Curve(at, stretch.end, stretch.centre, 0.0, stretch.left, oval))
        elif isinstance(stretch, ArcTo):
            radius = math.dist(at, stretch.centre)
            if abs(math.dist(stretch.end, stretch.centre) - radius) > 1e-6 * max(radius, 1e-3) or not radius > 0.0:
                raise SolidError(f"arc from {at} to {stretch.end}: its ends differ in radius about {stretch.centre}")
            curves.append(Curve(at, stretch.end, stretch.centre, radius, stretch.left))
        elif math.dist(at, stretch.end) > _NEAR:
            curves.append(Curve(at, stretch.end))
        else:
            continue
        at = stretch.end
    if math.dist(at, loop.start) > _NEAR:
        curves.append(Curve(at, loop.start))
    elif curves:
        curves[-1] = replace(curves[-1], end=loop.start)
    return curves


def _spline(start: Point2, stretch: SplineTo) -> Curve:
    control = bezier_pieces((start, *stretch.points), stretch.tangent, stretch.end_tangent).tolist()
    pieces = tuple(((a[0], a[1]), (b[0], b[1]), (c[0], c[1]), (d[0], d[1])) for a, b, c, d in control)
    return Curve(start, stretch.end, pieces=pieces)


def _joined(curves: list[Curve]) -> tuple[Curve, ...]:
    joined: list[Curve] = []
    for curve in curves:
        if joined and _straight_on(joined[-1], curve):
            joined[-1] = Curve(joined[-1].start, curve.end)
        else:
            joined.append(curve)
    if len(joined) > 3 and _straight_on(joined[-1], joined[0]):
        joined[0] = Curve(joined.pop().start, joined[0].end)
    return tuple(joined)


def _straight_on(one: Curve, other: Curve) -> bool:
    if not (one.is_line and other.is_line):
        return False
    ax, ay = one.end[0] - one.start[0], one.end[1] - one.start[1]
    bx, by = other.end[0] - other.start[0], other.end[1] - other.start[1]
    return abs(ax * by - ay * bx) <= 1e-12 * math.hypot(ax, ay) * math.hypot(bx, by) and ax * bx + ay * by > 0.0

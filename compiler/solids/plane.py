"""Operations on plane outlines: corners rounded and chamfered, mirrored, ringed and parallel outlines.

Lines stay lines and arcs stay arcs. A loop here is a closed row of `Curve`s, the corner k at the start of curve k.
What a loop cannot take is a `PlaneFlaw` with the place.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from msgspec import structs
from numpy.typing import NDArray

from ..trigonometry import cos_deg, sin_deg
from .cubic import bezier_pieces
from .curve import Curve, angle, divided, end_tangents, fraction_points, sweep, unit
from .outline import Polyline, area, closed, contact, oriented, polyline
from .recipe import ArcTo, BezierTo, EllipseTo, LineTo, Loop, Outline, Point2, SplineTo, Stretch

F64 = NDArray[np.float64]

_SMOOTH = 1e-6
"""Two stretches whose directions differ by less than this many radians meet without a corner."""
_NEAR = 1e-9
FREE_SHARE = 1e-6
"""A parallel of a spline or an ellipse is a spline within this part of its size."""


@dataclass(frozen=True, slots=True)
class Corner:
    """How a corner is made: `size` is the radius, or the length taken off either side."""

    kind: Literal["rounded", "chamfered"]
    size: float


class PlaneFlaw(ValueError):
    """What a loop cannot take: a sentence, and the number of the corner or -1."""

    def __init__(self, code: str, sentence: str, corner: int = -1) -> None:
        super().__init__(sentence)
        self.code, self.sentence, self.corner = code, sentence, corner


def with_corners(loop: Loop, corners: Sequence[Corner | None]) -> Loop:
    """A loop whose stretches close it, with its corners made, one entry for the start of each stretch.

    Raises PlaneFlaw.
    """
    made = cornered(closed(loop), corners)
    # Splines and ellipses are never trimmed: they stay as written.
    written = iter([stretch for stretch in loop.stretches if isinstance(stretch, SplineTo | EllipseTo)])
    return Loop(made[0].start, tuple(next(written) if curve.is_free else _stretch(curve) for curve in made))


def loop_of(curves: Sequence[Curve]) -> Loop:
    """The loop that a closed row of curves is; splines by the directions of their ends."""
    return Loop(curves[0].start, tuple(_stretch(curve) for curve in curves))


def turn_at(before: Curve, after: Curve) -> float:
    """The angle by which the way turns from one stretch to the next, radians, left positive."""
    (ax, ay), (bx, by) = end_tangents(before)[1].tolist(), end_tangents(after)[0].tolist()
    return math.atan2(ax * by - ay * bx, ax * bx + ay * by)


def is_smooth(before: Curve, after: Curve) -> bool:
    """Whether two stretches meet without a corner."""
    return abs(turn_at(before, after)) <= _SMOOTH


def cornered(curves: Sequence[Curve], corners: Sequence[Corner | None]) -> tuple[Curve, ...]:
    """The loop with its corners made, one entry a corner. Raises PlaneFlaw for one that does not fit."""
    n = len(curves)
    trimmed = list(curves)
    joints: dict[int, Curve] = {}
    for k, corner in enumerate(corners):
        if corner is None:
            continue
        before, after = curves[k - 1], curves[k]
        if n < 2 or is_smooth(before, after):
            raise PlaneFlaw("no-corner", "there is no corner here to make: the stretches meet smoothly", k)
        if before.is_free or after.is_free:
            sentence = f"a corner can be {corner.kind} between lines and arcs, and one of these is a curve"
            raise PlaneFlaw("no-corner", sentence, k)
        joint = _rounding(before, after, corner.size) if corner.kind == "rounded" else None
        if corner.kind == "chamfered":
            joint = Curve(along(reverse_of(before), corner.size), along(after, corner.size))
        if joint is None:
            raise PlaneFlaw("corner-too-large", f"{_sized(corner)} does not fit this corner", k)
        joints[k] = joint
        trimmed[k - 1] = replace(trimmed[k - 1], end=joint.start)
        trimmed[k] = replace(trimmed[k], start=joint.end)
    found: list[Curve] = []
    for k, curve in enumerate(trimmed):
        if k in joints:
            found.append(joints[k])
        after_k = (k + 1) % n
        if (k in joints or after_k in joints) and not _is_left(curves[k], curve):
            at = k if k in joints else after_k
            made = corners[at]
            assert made is not None
            sentence = (
                f"{_sized(made)} does not fit here: the stretch beside it, {_length(curves[k]):.6g} mm, is too short"
            )
            raise PlaneFlaw("corner-too-large", sentence, at)
        if math.dist(curve.start, curve.end) > _NEAR or _length(curve) > _NEAR * 10:
            found.append(curve)
    return tuple(found)


def all_corners(curves: Sequence[Curve], corner: Corner, only: Literal["all", "left"] = "all") -> list[Corner | None]:
    """The same for every corner between lines and arcs, or only for those where the way turns left."""
    found: list[Corner | None] = []
    for k in range(len(curves)):
        turn = turn_at(curves[k - 1], curves[k]) if len(curves) > 1 else 0.0
        wanted = abs(turn) > _SMOOTH and (only == "all" or turn > 0.0)
        wanted &= not (curves[k - 1].is_free or curves[k].is_free)
        found.append(corner if wanted else None)
    return found


def mirrored(stretches: Sequence[Stretch], start: Point2, axis: Literal["x", "y"]) -> tuple[Stretch, ...]:
    """The mirror image of a way across the line where x or y is 0, run backwards: from its end to its start."""

    def over(point: Point2) -> Point2:
        return (0.0 - point[0], point[1]) if axis == "x" else (point[0], 0.0 - point[1])

    ends = [start, *(stretch.end for stretch in stretches)]
    found: list[Stretch] = []
    for k in range(len(stretches) - 1, -1, -1):
        stretch, end = stretches[k], over(ends[k])
        match stretch:
            case ArcTo():
                # Mirrored and run backwards, a way turns as it did.
                found.append(ArcTo(end, over(stretch.centre), stretch.left))
            case EllipseTo():
                turn = 180.0 - stretch.turn if axis == "x" else -stretch.turn
                found.append(EllipseTo(end, over(stretch.centre), stretch.axes, turn, stretch.left))
            case SplineTo():
                points = tuple(over(point) for point in reversed((ends[k], *stretch.points[:-1])))
                # A tangent run backwards: over(-t).
                first, last = (
                    None if t is None else over((0.0 - t[0], 0.0 - t[1]))
                    for t in (stretch.end_tangent, stretch.tangent)
                )
                found.append(SplineTo(points, first, last))
            case BezierTo():
                found.append(BezierTo(tuple(over(point) for point in reversed((ends[k], *stretch.points[:-1])))))
            case _:
                found.append(LineTo(end))
    return tuple(found)


def turned(stretches: Sequence[Stretch], degrees: float) -> tuple[Stretch, ...]:
    """A way turned about the origin."""
    return tuple(_turned(stretch, degrees) for stretch in stretches)


def ending_at(stretch: Stretch, end: Point2) -> Stretch:
    """The stretch with its end set to a point that differs by rounding alone."""
    if isinstance(stretch, SplineTo | BezierTo):
        return structs.replace(stretch, points=(*stretch.points[:-1], end))
    return structs.replace(stretch, end=end)


def turn_point(point: Point2, degrees: float) -> Point2:
    """A point turned about the origin."""
    c, s = cos_deg(degrees), sin_deg(degrees)
    return (c * point[0] - s * point[1] + 0.0, s * point[0] + c * point[1] + 0.0)


def parallel(outline: Outline, distance: float) -> Outline:
    """The outline at a distance, mm, into its material; below 0 out of it, where corners become arcs.

    Every point of the result lies at that distance from the outline. Arcs that shrink to nothing leave a corner.
    Raises PlaneFlaw if the result crosses itself, or nothing is left of a loop or a straight stretch.
    """
    loops = [oriented(loop, k == 0) for k, loop in enumerate((outline.outer, *outline.holes))]
    moved = [_parallel(curves, distance) for curves in loops]
    lines: list[Polyline] = []
    for k, (curves, before) in enumerate(zip(moved, loops, strict=True)):
        if (area(curves) > 0.0) != (k == 0) or area(curves) * area(before) <= 0.0:
            raise PlaneFlaw("parallel-vanishes", f"nothing is left of the outline at {abs(distance):.6g} mm")
        lines.append(polyline(curves, 0.0))
    touch = contact(lines)
    if touch is not None:
        where = f"({touch[0]:.6g} mm, {touch[1]:.6g} mm)"
        raise PlaneFlaw("parallel-crosses-itself", f"at {abs(distance):.6g} mm the outline crosses itself at {where}")
    outer, *holes = (loop_of(curves) for curves in moved)
    return Outline(outer, tuple(holes))


def inset(curves: Sequence[Curve], distance: float) -> tuple[Curve, ...]:
    """The loop moved to its left by a distance, mm, or right if below 0, curve for curve: corners stay corners.

    Splines and ellipses stay as they are and are moved along their normals by the caller; they must meet their
    neighbours smoothly. Raises PlaneFlaw where a stretch vanishes.
    """
    n = len(curves)
    moved = [curve if curve.is_free else _moved(curve, distance) for curve in curves]
    if any(each is None for each in moved):
        raise PlaneFlaw("parallel-vanishes", f"an arc of the outline has no larger radius than {abs(distance):.6g} mm")
    offset = [each for each in moved if each is not None]
    if n == 1:
        return tuple(offset)
    found = list(offset)
    for k in range(n):
        before, after = curves[k - 1], curves[k]
        if before.is_free or after.is_free:
            if not is_smooth(before, after):
                raise PlaneFlaw("no-corner", f"a curve meets its neighbour in a corner at {_place(after.start)}", k)
            continue
        point = _joint(before, after, offset[k - 1], offset[k], distance)
        if point is None:
            raise PlaneFlaw("parallel-vanishes", f"nothing is left of the corner at {_place(after.start)}", k)
        found[k - 1], found[k] = replace(found[k - 1], end=point), replace(found[k], start=point)
    for k, (old, new) in enumerate(zip(curves, found, strict=True)):
        if not new.is_free and not _keeps_way(old, new):
            raise PlaneFlaw("parallel-vanishes", f"nothing is left of the stretch from {_place(old.start)}", k)
    return tuple(found)


def along(curve: Curve, length: float) -> Point2:
    """The point of a line or an arc at a length from its start."""
    (x, y), (dx, dy) = curve.start, end_tangents(curve)[0].tolist()
    if curve.is_line:
        return (x + length * dx, y + length * dy)
    turn = length / curve.radius * (1.0 if curve.left else -1.0)
    c, s = math.cos(turn), math.sin(turn)
    px, py = x - curve.centre[0], y - curve.centre[1]
    return (curve.centre[0] + c * px - s * py, curve.centre[1] + s * px + c * py)


def reverse_of(curve: Curve) -> Curve:
    """A line or an arc run backwards."""
    return replace(curve, start=curve.end, end=curve.start, left=not curve.left)


def _stretch(curve: Curve) -> Stretch:
    if curve.radius:
        return ArcTo(curve.end, curve.centre, curve.left)
    if curve.oval:
        return EllipseTo(curve.end, curve.centre, curve.oval[:2], curve.oval[2], curve.left)
    if curve.pieces:
        return BezierTo(tuple(point for piece in curve.pieces for point in piece[1:]))
    return LineTo(curve.end)


def _turned(stretch: Stretch, degrees: float) -> Stretch:
    def over(point: Point2) -> Point2:
        return turn_point(point, degrees)

    match stretch:
        case ArcTo():
            return ArcTo(over(stretch.end), over(stretch.centre), stretch.left)
        case EllipseTo():
            return EllipseTo(
                over(stretch.end), over(stretch.centre), stretch.axes, stretch.turn + degrees, stretch.left
            )
        case SplineTo():
            tangents = [None if t is None else over(t) for t in (stretch.tangent, stretch.end_tangent)]
            return SplineTo(tuple(over(point) for point in stretch.points), *tangents)
        case BezierTo():
            return BezierTo(tuple(over(point) for point in stretch.points))
    return LineTo(over(stretch.end))


def _rounding(before: Curve, after: Curve, radius: float) -> Curve | None:
    left = turn_at(before, after) > 0.0
    distance = radius if left else -radius
    one, other = _moved(before, distance), _moved(after, distance)
    if one is None or other is None:
        return None
    centre = _joint(before, after, one, other, distance)
    if centre is None:
        return None
    return Curve(_foot(before, centre), _foot(after, centre), centre, radius, left)


def _foot(curve: Curve, point: Point2) -> Point2:
    if curve.is_line:
        dx, dy = end_tangents(curve)[0].tolist()
        share = (point[0] - curve.start[0]) * dx + (point[1] - curve.start[1]) * dy
        return (curve.start[0] + share * dx, curve.start[1] + share * dy)
    x, y = point[0] - curve.centre[0], point[1] - curve.centre[1]
    far = curve.radius / math.hypot(x, y)
    return (curve.centre[0] + far * x, curve.centre[1] + far * y)


def _moved(curve: Curve, distance: float) -> Curve | None:
    """A line or an arc moved to its left; None for an arc that shrinks to nothing."""
    if curve.is_line:
        dx, dy = end_tangents(curve)[0].tolist()
        x, y = -dy * distance, dx * distance
        return Curve((curve.start[0] + x, curve.start[1] + y), (curve.end[0] + x, curve.end[1] + y))
    radius = curve.radius - distance if curve.left else curve.radius + distance
    if radius <= _NEAR * curve.radius:
        return None

    def over(point: Point2) -> Point2:
        (x, y), share = curve.centre, radius / curve.radius
        return (x + share * (point[0] - x), y + share * (point[1] - y))

    return replace(curve, start=over(curve.start), end=over(curve.end), radius=radius)


def _joint(before: Curve, after: Curve, one: Curve, other: Curve, distance: float) -> Point2 | None:
    """Where two moved stretches meet, nearest to where their tangents would."""
    if is_smooth(before, after):
        return other.start
    (ax, ay), (bx, by) = end_tangents(before)[1].tolist(), end_tangents(after)[0].tolist()
    (x, y), share = after.start, distance / max(1.0 + ax * bx + ay * by, 1e-12)
    guess = (x - share * (ay + by), y + share * (ax + bx))
    points = _crossings(one, other)
    return min(points, key=lambda point: math.dist(point, guess), default=None)


def _crossings(one: Curve, other: Curve) -> list[Point2]:
    """Where the whole lines or circles of two stretches cross."""
    if one.is_line and other.is_line:
        (ax, ay), (bx, by) = end_tangents(one)[0].tolist(), end_tangents(other)[0].tolist()
        cross = ax * by - ay * bx
        if abs(cross) <= 1e-12:
            return []
        share = ((other.start[0] - one.start[0]) * by - (other.start[1] - one.start[1]) * bx) / cross
        return [(one.start[0] + share * ax, one.start[1] + share * ay)]
    if other.is_line:
        return _crossings(other, one)
    (x, y), r = other.centre, other.radius
    if one.is_line:
        dx, dy = end_tangents(one)[0].tolist()
        share = (x - one.start[0]) * dx + (y - one.start[1]) * dy
        foot = (one.start[0] + share * dx, one.start[1] + share * dy)
        half = r * r - (foot[0] - x) ** 2 - (foot[1] - y) ** 2
    else:
        dx, dy = one.centre[0] - x, one.centre[1] - y
        apart = math.hypot(dx, dy)
        if apart <= _NEAR * r:
            return []
        share = (apart * apart + r * r - one.radius**2) / (2.0 * apart)
        foot = (x + share * dx / apart, y + share * dy / apart)
        half = r * r - share * share
        dx, dy = -dy / apart, dx / apart
    if half < -_NEAR * r * r:
        return []
    reach = math.sqrt(max(half, 0.0))
    return [(foot[0] + sign * reach * dx, foot[1] + sign * reach * dy) for sign in (1.0, -1.0)]


def _keeps_way(old: Curve, new: Curve) -> bool:
    """Whether a moved and trimmed stretch still runs the way it did."""
    if old.is_line:
        step = np.array(new.end) - new.start
        return float(step @ end_tangents(old)[0]) > _NEAR * _length(old)
    sign = 1.0 if old.left else -1.0
    first = _short(sign * (angle(new, new.start) - angle(old, old.start)))
    last = _short(sign * (angle(new, new.end) - angle(old, old.end)))
    return _NEAR < sweep(old) - first + last < math.tau - _NEAR


def _is_left(old: Curve, new: Curve) -> bool:
    """Whether anything, or exactly nothing, is left of a stretch trimmed at its ends."""
    if old.is_line:
        return float((np.array(new.end) - new.start) @ end_tangents(old)[0]) >= -_NEAR * _length(old)
    if old.is_free:
        return True
    sign, whole = (1.0 if old.left else -1.0), sweep(old)
    first = (sign * (angle(old, new.start) - angle(old, old.start))) % math.tau
    last = (sign * (angle(old, old.end) - angle(old, new.end))) % math.tau
    first, last = (0.0 if t > math.tau - _NEAR else t for t in (first, last))
    return first + last <= whole + _NEAR


def _short(turn: float) -> float:
    return math.remainder(turn, math.tau)


def _length(curve: Curve) -> float:
    if curve.is_line:
        return math.dist(curve.start, curve.end)
    return curve.radius * sweep(curve) if curve.radius else math.inf


def _parallel(curves: tuple[Curve, ...], distance: float) -> tuple[Curve, ...]:
    kept = [curve for curve in curves if curve.is_free or _moved(curve, distance) is not None]
    if not kept:
        raise PlaneFlaw("parallel-vanishes", f"nothing is left of the outline at {abs(distance):.6g} mm")
    offset = [_free_moved(curve, distance) if curve.is_free else _moved(curve, distance) for curve in kept]
    found: list[Curve] = [curve for curve in offset if curve is not None]
    if len(kept) == 1:
        return tuple(found) if len(curves) == 1 else _gone(distance)
    arcs: dict[int, Curve] = {}
    for k in range(len(kept)):
        before, after = kept[k - 1], kept[k]
        gap = math.dist(found[k - 1].end, found[k].start)
        if before.end == after.start and is_smooth(before, after):
            found[k - 1] = replace(found[k - 1], end=found[k].start)
            continue
        if before.end == after.start and turn_at(before, after) * distance < 0.0 and gap > _NEAR:
            arcs[k] = Curve(found[k - 1].end, found[k].start, after.start, abs(distance), distance < 0.0)
            continue
        if before.is_free or after.is_free:
            sentence = f"a curve meets its neighbour in an inner corner at {_place(after.start)}"
            raise PlaneFlaw("no-corner", sentence)
        middle = ((before.end[0] + after.start[0]) / 2.0, (before.end[1] + after.start[1]) / 2.0)
        points = _crossings(found[k - 1], found[k])
        guess = _joint(before, after, found[k - 1], found[k], distance) if before.end == after.start else None
        point = guess or min(points, key=lambda each: math.dist(each, middle), default=None)
        if point is None:
            _gone(distance)
        else:
            found[k - 1], found[k] = replace(found[k - 1], end=point), replace(found[k], start=point)
    for old, new in zip(kept, found, strict=True):
        if not new.is_free and not _keeps_way(old, new):
            sentence = f"nothing is left of the stretch from {_place(old.start)} at {abs(distance):.6g} mm"
            raise PlaneFlaw("parallel-vanishes", sentence)
    return tuple(curve for k, each in enumerate(found) for curve in ([arcs[k], each] if k in arcs else [each]))


def _gone(distance: float) -> tuple[Curve, ...]:
    raise PlaneFlaw("parallel-vanishes", f"nothing is left of the outline at {abs(distance):.6g} mm")


def _free_moved(curve: Curve, distance: float) -> Curve:
    """The spline through points moved along the normals, closer and closer until it lies within `FREE_SHARE`."""
    whole = curve.start == curve.end
    points, _ = divided(curve, 0.0)
    size = float(np.ptp(points, axis=0).max())
    n = max(8, len(curve.pieces))
    while True:
        even, tangents = fraction_points(curve, 2 * n)
        base = np.concatenate((even, [curve.end]))
        moved = base + distance * np.stack((-tangents[:, 1], tangents[:, 0]), axis=1)
        steps, before = np.diff(moved, axis=0), np.diff(base, axis=0)
        if ((steps * before).sum(axis=1) <= 0.0).any():
            place = tuple(base[int(np.argmin((steps * before).sum(axis=1)))].tolist())
            sentence = f"the curve bends more sharply than {abs(distance):.6g} mm near {_place((place[0], place[1]))}"
            raise PlaneFlaw("parallel-crosses-itself", sentence)
        if whole:
            moved[-1] = moved[0]
        knots = moved[::2]
        first = None if whole else unit(tangents[0]).tolist()
        last = None if whole else unit(tangents[-1]).tolist()
        control = bezier_pieces(knots.tolist(), first, last)
        middles = (control[:, 0] + 3.0 * control[:, 1] + 3.0 * control[:, 2] + control[:, 3]) / 8.0
        off = middles - moved[1::2]
        side = tangents[1::2]
        # Only what lies across the way is an error of the shape.
        if np.abs(off[:, 0] * side[:, 1] - off[:, 1] * side[:, 0]).max() <= FREE_SHARE * size or n > 4000:
            pieces = tuple(tuple((float(x), float(y)) for x, y in piece) for piece in control.tolist())
            start, end = (float(moved[0, 0]), float(moved[0, 1])), (float(moved[-1, 0]), float(moved[-1, 1]))
            return Curve(start, end, pieces=pieces)  # type: ignore[arg-type]
        n *= 2


def _sized(corner: Corner) -> str:
    return f"a radius of {corner.size:.6g} mm" if corner.kind == "rounded" else f"a chamfer of {corner.size:.6g} mm"


def _place(point: Point2) -> str:
    x, y = (round(value, 9) + 0.0 for value in point)
    return f"({x:.6g} mm, {y:.6g} mm)"

"""Curves in space: the stretches of a path as exact curves, their mistakes, and their lengths.

A path becomes a chain of `Line`, `Arc`, `Spline` and `Coil`. Each has a parameter of its own from 0 to `reach_of`:
the length of a line, the angle of an arc or coil, the chord length of a spline.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from ..trigonometry import cos_deg, sin_deg
from .recipe import Helix, Point3, SpaceArcTo, SpaceLineTo, SpacePath, SpaceSplineTo

F64 = NDArray[np.float64]

MAX_PATH_POINTS = 20_000
"""Limit named `stretches`: points of one path."""
SMOOTH_WITHIN = 0.1
"""Two stretches whose directions differ by at most this many degrees where they meet pass smoothly into each other."""
_NEAR = 1e-9
_GAUSS = 16
_ENOUGH = 1e-12


@dataclass(frozen=True, eq=False, slots=True)
class Line:
    """From `start` to `end`."""

    start: F64
    end: F64


@dataclass(frozen=True, eq=False, slots=True)
class Arc:
    """From `centre` + radius x, turning from unit x toward unit y by `angle` radians."""

    centre: F64
    x: F64
    y: F64
    radius: float
    angle: float


@dataclass(frozen=True, eq=False, slots=True)
class Spline:
    """A piecewise cubic by its knots (n,), points (n,3) and slopes (n,3) there."""

    knots: F64
    points: F64
    slopes: F64


@dataclass(frozen=True, eq=False, slots=True)
class Coil:
    """A helix about z from (radius, 0, lift): `rise` mm a radian, `angle` radians, `hand` 1 for right, -1 for left."""

    radius: float
    rise: float
    angle: float
    hand: float
    lift: float = 0.0


Stretch = Line | Arc | Spline | Coil


@dataclass(frozen=True, eq=False, slots=True)
class Trace:
    """A path as curves; `source` has for each the row of `SpacePath.stretches` that it comes from."""

    stretches: tuple[Stretch, ...]
    source: tuple[int, ...]
    is_closed: bool


@dataclass(frozen=True, slots=True)
class PathFlaw:
    """A mistake of a path, at row `stretch` of its stretches."""

    code: str
    stretch: int
    sentence: str
    hint: str


class _Unfit(Exception):
    def __init__(self, code: str, stretch: int, sentence: str, hint: str) -> None:
        self.flaw = PathFlaw(code, stretch, sentence, hint)


def trace(path: SpacePath) -> Trace | PathFlaw:
    """The curves of a path, or the first mistake in it: `no-length`, `no-arc`, `bend-does-not-fit`, `path-turns-back`,
    `path-has-corner`, `open-path`, `too-large`. Cost: linear.
    """
    try:
        return _traced(path)
    except _Unfit as unfit:
        return unfit.flaw


def reach_of(stretch: Stretch) -> float:
    """The last value of a stretch's parameter."""
    match stretch:
        case Line():
            return length_of(stretch)
        case Arc() | Coil():
            return stretch.angle
        case Spline():
            return float(stretch.knots[-1])


def length_of(stretch: Stretch) -> float:
    """Length in mm: closed forms, and for a spline Gauss-Legendre quadrature, halved until it stays."""
    match stretch:
        case Line():
            return math.dist(stretch.start, stretch.end)
        case Arc():
            return stretch.radius * stretch.angle
        case Coil():
            return math.hypot(stretch.radius, stretch.rise) * stretch.angle
        case Spline():
            return _spline_length(stretch)


def position(stretch: Stretch, at: F64) -> F64:
    """Points (k,3) at parameters (k,)."""
    match stretch:
        case Line():
            return stretch.start + (at / reach_of(stretch))[:, None] * (stretch.end - stretch.start)
        case Arc():
            c, s = _turned(at)
            return stretch.centre + stretch.radius * (c[:, None] * stretch.x + s[:, None] * stretch.y)
        case Coil():
            c, s = _turned(at)
            r = stretch.radius
            return np.column_stack((r * c, stretch.hand * r * s, stretch.lift + stretch.rise * at))
        case Spline():
            return _hermite(stretch, at, 0)


def derivative(stretch: Stretch, at: F64, order: int) -> F64:
    """First or second derivative (k,3) by the stretch's own parameter."""
    match stretch:
        case Line():
            unit = (stretch.end - stretch.start) / reach_of(stretch)
            return np.tile(unit if order == 1 else np.zeros(3), (len(at), 1))
        case Arc():
            c, s = _turned(at)
            if order == 1:
                return stretch.radius * (c[:, None] * stretch.y - s[:, None] * stretch.x)
            return -stretch.radius * (c[:, None] * stretch.x + s[:, None] * stretch.y)
        case Coil():
            (c, s), r, hand = _turned(at), stretch.radius, stretch.hand
            if order == 1:
                return np.column_stack((-r * s, hand * r * c, np.full(len(at), stretch.rise)))
            return np.column_stack((-r * c, -hand * r * s, np.zeros(len(at))))
        case Spline():
            return _hermite(stretch, at, order)


def tangent(stretch: Stretch, at: F64) -> F64:
    """Unit tangents (k,3)."""
    first = derivative(stretch, at, 1)
    unit: F64 = first / np.maximum(np.sqrt((first**2).sum(axis=1)), 1e-300)[:, None]
    return unit


def curvature(stretch: Stretch, at: F64) -> F64:
    """Curvature vectors (k,3), 1/mm, toward the centre of curvature."""
    first, second = derivative(stretch, at, 1), derivative(stretch, at, 2)
    speed = np.maximum((first**2).sum(axis=1), 1e-300)[:, None]
    along = (first * second).sum(axis=1)[:, None]
    vectors: F64 = (second - along / speed * first) / speed
    return vectors


def spline(points: F64, first: F64 | None = None, last: F64 | None = None, periodic: bool = False) -> Spline:
    """The interpolating C2 cubic with chord-length knots; natural at an end, or along the unit tangent given.

    Periodic: `points` end where they start. The tridiagonal system for the slopes is that of de Boor, A Practical Guide
    to Splines (1978), chapter IV, solved by elimination. Cost: linear.
    """
    h = np.sqrt((np.diff(points, axis=0) ** 2).sum(axis=1))
    d = np.diff(points, axis=0) / h[:, None]
    knots = np.concatenate(([0.0], np.cumsum(h)))
    if periodic:
        before, d_before = np.roll(h, 1), np.roll(d, 1, axis=0)
        right = 3.0 * (h[:, None] * d_before + before[:, None] * d)
        slopes = _cyclic(h, 2.0 * (h + before), before, right)
        return Spline(knots, points, np.concatenate((slopes, slopes[:1])))
    n = len(points)
    low, middle, high, right = np.zeros(n), np.ones(n), np.zeros(n), np.zeros((n, 3))
    low[1:-1], high[1:-1] = h[1:], h[:-1]
    middle[1:-1] = 2.0 * (h[1:] + h[:-1])
    right[1:-1] = 3.0 * (h[1:, None] * d[:-1] + h[:-1, None] * d[1:])
    if first is None:
        middle[0], high[0], right[0] = 2.0, 1.0, 3.0 * d[0]
    else:
        right[0] = first
    if last is None:
        middle[-1], low[-1], right[-1] = 2.0, 1.0, 3.0 * d[-1]
    else:
        right[-1] = last
    return Spline(knots, points, _tridiagonal(low, middle, high, right))


def spelled(point: F64) -> str:
    """A place as messages give it."""
    x, y, z = (f"{round(float(value), 3) + 0.0:.6g} mm" for value in point)
    return f"({x}, {y}, {z})"


def _traced(path: SpacePath) -> Trace:
    if len(path.stretches) == 1 and isinstance(path.stretches[0], Helix):
        return Trace((_coil(path.stretches[0]),), (0,), False)
    ends = _ends(path)
    is_closed = math.dist(ends[0], ends[-1]) <= _NEAR
    trims = _trims(path, ends, is_closed)
    stretches, source = _placed(path, ends, trims, is_closed)
    found = Trace(tuple(_splined(path, ends, stretches, source, is_closed)), tuple(source), is_closed)
    _require_smooth(found)
    return found


def _coil(helix: Helix) -> Coil:
    turn = -1.0 if helix.left else 1.0
    return Coil(helix.diameter / 2, helix.pitch / math.tau, math.tau * helix.turns, turn)


def _ends(path: SpacePath) -> list[F64]:
    """The points between stretches."""
    n_points = sum(len(s.points) if isinstance(s, SpaceSplineTo) else 1 for s in path.stretches)
    if n_points > MAX_PATH_POINTS:
        sentence = f"the path has more than {MAX_PATH_POINTS} points, the limit named `stretches`"
        raise _Unfit("too-large", 0, sentence, "draw it with fewer points")
    if not path.stretches:
        raise _Unfit("open-path", 0, "the path leads nowhere", "give it a stretch, such as `to (0, 0, 50 mm)`")
    ends = [np.array(path.start)]
    for row, stretch in enumerate(path.stretches):
        here: list[Point3] = [(float(ends[-1][0]), float(ends[-1][1]), float(ends[-1][2]))]
        match stretch:
            case Helix():
                raise _Unfit("open-path", row, "a helix is a whole path; nothing can stand beside it", "")
            case SpaceLineTo():
                here.append(stretch.end)
            case SpaceArcTo():
                here.extend((stretch.through, stretch.end))
            case SpaceSplineTo():
                here.extend(stretch.points)
        for a, b in pairwise(here):
            if math.dist(a, b) <= _NEAR:
                place = spelled(np.array(b))
                raise _Unfit("no-length", row, f"this stretch stands still at {place}", "leave the point out")
        ends.append(np.array(here[-1]))
    return ends


def _trims(path: SpacePath, ends: list[F64], is_closed: bool) -> dict[int, tuple[float, F64, F64]]:
    """For each bend by the row of its stretch: what it takes of the straight stretches it joins, their directions.

    Raises _Unfit for a bend that does not fit.
    """
    n = len(path.stretches)
    trims: dict[int, tuple[float, F64, F64]] = {}
    for row, stretch in enumerate(path.stretches):
        if not isinstance(stretch, SpaceLineTo) or stretch.bend == 0.0:
            continue
        following = (row + 1) % n
        if (following == 0 and not is_closed) or not isinstance(path.stretches[following], SpaceLineTo):
            hint = "leave the bend out; a curve takes over the direction of the stretch before it"
            raise _Unfit("bend-does-not-fit", row, "no straight stretch follows to bend into", hint)
        before, after = _unit(ends[row + 1] - ends[row]), _unit(ends[following + 1] - ends[following])
        if math.degrees(_angle(before, after)) > 180.0 - SMOOTH_WITHIN:
            raise _turns_back(row, ends[row + 1])
        trims[row] = stretch.bend * math.tan(_angle(before, after) / 2), before, after
    for row, stretch in enumerate(path.stretches):
        if not isinstance(stretch, SpaceLineTo):
            continue
        length = math.dist(ends[row], ends[row + 1])
        begin = trims[(row - 1) % n][0] if (row - 1) % n in trims and (row > 0 or is_closed) else 0.0
        end = trims[row][0] if row in trims else 0.0
        if begin + end > length * (1.0 + _NEAR):
            at = row if end > 0.0 else (row - 1) % n
            bend = path.stretches[at]
            assert isinstance(bend, SpaceLineTo)
            sentence = (
                f"the bend of radius {bend.bend:.6g} mm at {spelled(ends[at + 1])} does not fit: "
                f"bends take {begin + end:.6g} mm of a straight stretch of {length:.6g} mm"
            )
            raise _Unfit("bend-does-not-fit", at, sentence, "make the bend tighter or the stretch longer")
    return trims


def _placed(
    path: SpacePath, ends: list[F64], trims: dict[int, tuple[float, F64, F64]], is_closed: bool
) -> tuple[list[Stretch | None], list[int]]:
    """Lines, bends and arcs in order; None where a spline is to come."""
    n = len(path.stretches)
    stretches: list[Stretch | None] = []
    source: list[int] = []
    for row, stretch in enumerate(path.stretches):
        a, b = ends[row], ends[row + 1]
        if isinstance(stretch, SpaceSplineTo):
            stretches.append(None)
            source.append(row)
        elif isinstance(stretch, SpaceArcTo):
            stretches.append(_arc(a, np.array(stretch.through), b, row))
            source.append(row)
        elif isinstance(stretch, SpaceLineTo):
            length, way = math.dist(a, b), _unit(b - a)
            previous = (row - 1) % n
            begin = trims[previous][0] if previous in trims and (row > 0 or is_closed) else 0.0
            end = trims[row][0] if row in trims else 0.0
            if length - begin - end > _NEAR * length:
                stretches.append(Line(a + begin * way, b - end * way if end else b))
                source.append(row)
            if end > 0.0:
                stretches.append(_bend(b, stretch.bend, *trims[row]))
                source.append(row)
    return stretches, source


def _bend(corner: F64, radius: float, trim: float, before: F64, after: F64) -> Arc:
    inward = _unit(after - (after @ before) * before)
    start = corner - trim * before
    return Arc(start + radius * inward, -inward, before, radius, _angle(before, after))


def _arc(a: F64, through: F64, b: F64, row: int) -> Arc:
    """The arc through three points: its centre from the perpendicular bisectors, in their plane."""
    u, v = through - a, b - a
    normal = np.cross(u, v)
    square = float(normal @ normal)
    if square <= 1e-24 * float(u @ u) * float(v @ v) or math.dist(a, b) <= _NEAR:
        raise _Unfit("no-arc", row, "the three points lie on one line, so no arc passes through them", "write `to`")
    centre = a + (float(u @ u) * np.cross(v, normal) + float(v @ v) * np.cross(normal, u)) / (2.0 * square)
    radius = math.dist(a, centre)
    x = (a - centre) / radius
    y = np.cross(_unit(normal), x)
    toward = b - centre
    angle = math.atan2(float(toward @ y), float(toward @ x)) % math.tau
    return Arc(centre, x, y, radius, angle)


def _splined(
    path: SpacePath, ends: list[F64], stretches: list[Stretch | None], source: list[int], is_closed: bool
) -> list[Stretch]:
    """The stretches with their splines, which take over the directions of what they join."""
    done = list(stretches)
    n = len(done)
    for k, row in enumerate(source):
        if done[k] is not None:
            continue
        written = path.stretches[row]
        assert isinstance(written, SpaceSplineTo)
        points = np.array([ends[row], *written.points])
        if n == 1 and is_closed and len(points) > 3:
            done[k] = spline(points, periodic=True)
            continue
        before = done[k - 1] if n > 1 and (k > 0 or is_closed) else None
        after = done[(k + 1) % n] if n > 1 and (k + 1 < n or is_closed) else None
        first = tangent(before, np.array([reach_of(before)]))[0] if before is not None else None
        last = tangent(after, np.zeros(1))[0] if after is not None else None
        done[k] = spline(points, first, last)
    return [each for each in done if each is not None]


def _require_smooth(found: Trace) -> None:
    n = len(found.stretches)
    for k in range(n if found.is_closed else n - 1):
        one, other = found.stretches[k], found.stretches[(k + 1) % n]
        end = np.array([reach_of(one)])
        angle = math.degrees(_angle(tangent(one, end)[0], tangent(other, np.zeros(1))[0]))
        place = position(one, end)[0]
        if angle > 180.0 - SMOOTH_WITHIN:
            raise _turns_back(found.source[k], place)
        if angle > SMOOTH_WITHIN and not (isinstance(one, Line) and isinstance(other, Line)):
            sentence = f"the path turns a corner of {angle:.3g} deg at {spelled(place)}, where a curve begins or ends"
            hint = "let the stretches meet in one direction, or put a straight stretch with a bend between them"
            raise _Unfit("path-has-corner", found.source[k], sentence, hint)


def _turns_back(row: int, place: F64) -> _Unfit:
    return _Unfit("path-turns-back", row, f"the path turns back on itself at {spelled(place)}", "move the next point")


def _unit(vector: F64) -> F64:
    unit: F64 = vector / math.sqrt(float(vector @ vector))
    return unit


def _angle(a: F64, b: F64) -> float:
    """Between unit vectors, radians, accurate near 0 and pi (Kahan)."""
    return 2.0 * math.atan2(math.dist(a, b), math.dist(a, -b))


def _turned(at: F64) -> tuple[F64, F64]:
    angles = np.degrees(at).tolist()
    return np.array([cos_deg(a) for a in angles]), np.array([sin_deg(a) for a in angles])


def _hermite(curve: Spline, at: F64, order: int) -> F64:
    """The cubic of each span and its derivatives by the knots' parameter."""
    span = np.searchsorted(curve.knots, at, side="right").clip(1, len(curve.knots) - 1) - 1
    h = (curve.knots[span + 1] - curve.knots[span])[:, None]
    t = (at - curve.knots[span])[:, None] / h
    p, q = curve.points[span], curve.points[span + 1]
    m, w = curve.slopes[span] * h, curve.slopes[span + 1] * h
    b = 3.0 * (q - p) - 2.0 * m - w
    c = 2.0 * (p - q) + m + w
    if order == 0:
        value: F64 = p + t * (m + t * (b + t * c))
    elif order == 1:
        value = (m + t * (2.0 * b + 3.0 * t * c)) / h
    else:
        value = (2.0 * b + 6.0 * t * c) / h**2
    return value


def _spline_length(curve: Spline) -> float:
    nodes, weights = np.polynomial.legendre.leggauss(_GAUSS)
    length, before = 0.0, -1.0
    for halving in range(8):
        if abs(length - before) <= _ENOUGH * length:
            break
        before = length
        share = np.arange(2**halving) / 2**halving
        h = np.diff(curve.knots)[:, None] / 2**halving
        starts = (curve.knots[:-1, None] + np.diff(curve.knots)[:, None] * share).ravel()
        at = (starts[:, None] + np.repeat(h.ravel(), 2**halving)[:, None] * (nodes + 1.0) / 2.0).ravel()
        speed = np.sqrt((_hermite(curve, at, 1) ** 2).sum(axis=1)).reshape(-1, _GAUSS)
        length = float(((speed * weights).sum(axis=1) * np.repeat(h.ravel(), 2**halving) / 2.0).sum())
    return length


def _tridiagonal(low: F64, middle: F64, high: F64, right: F64) -> F64:
    """Solve low[i] x[i-1] + middle[i] x[i] + high[i] x[i+1] = right[i] for a diagonally dominant system."""
    n = len(middle)
    above, value = np.zeros(n), np.zeros_like(right)
    for i in range(n):
        pivot = middle[i] - (low[i] * above[i - 1] if i else 0.0)
        above[i] = high[i] / pivot
        value[i] = (right[i] - (low[i] * value[i - 1] if i else 0.0)) / pivot
    for i in range(n - 2, -1, -1):
        value[i] -= above[i] * value[i + 1]
    return value


def _cyclic(low: F64, middle: F64, high: F64, right: F64) -> F64:
    """As `_tridiagonal` with low[0] at x[-1] and high[-1] at x[0], by the formula of Sherman and Morrison."""
    gamma = -middle[0]
    changed = middle.copy()
    changed[0] -= gamma
    changed[-1] -= high[-1] * low[0] / gamma
    u = np.zeros((len(middle), 1))
    u[0], u[-1] = gamma, high[-1]
    inner_low, inner_high = low.copy(), high.copy()
    inner_low[0] = inner_high[-1] = 0.0
    x, y = _tridiagonal(inner_low, changed, inner_high, right), _tridiagonal(inner_low, changed, inner_high, u)
    factor = (x[0] + low[0] / gamma * x[-1]) / (1.0 + y[0] + low[0] / gamma * y[-1])
    solved: F64 = x - y * factor
    return solved

"""Chains of points written as straight lines, arcs of circles and ellipses, and cubic Bezier curves.

What is written passes every point within `ERROR` mm; between two points it keeps within `BULGE` mm of their chord, for
the points stand on the true curve and the chords within it. Sums are spelled out in the order of the points, so the
result does not depend on a library of linear algebra.
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import F64
from ..drawing import Arc, Cubics, Lines, Path, Piece

I64: TypeAlias = NDArray[np.int64]
Bools: TypeAlias = NDArray[np.bool_]

ERROR = 0.005
"""How far, in mm, what is written may lie from a point of the chain."""
BULGE = 0.03
"""How far, in mm, it may lie from the chord of two: above the 0.02 mm of the ladder of chord errors."""

LINE, ARC, CUBIC = 0, 1, 2
_FIT = 0.002  # mm by which points may lie off a circle or ellipse: the ends of arcs then keep within ERROR
_STRAIGHT = 0.001  # mm by which points may lie off a straight line
_LONG = 5.0  # mm: a shorter straight stretch of a smooth run is not told from its curve
_STEEP = 0.5  # cosine of the greatest turn of a smooth run at a point
_ARC_TURN = np.pi / 4  # least turn of a circle that is only a stretch of a run
_ELLIPSE_TURN = np.pi / 2  # the same for an ellipse, which fits nearly any short stretch
_MOST_TURN = np.radians(100.0)  # longer arcs are written as several: toward half a turn their ends fix them badly
_FLATTEST = 0.05  # mm: an ellipse with a shorter half axis stays a polygon
_FIRST, _LAST, _RING = 1, 2, 4  # the first or last point is a free end of the chain; the run is a ring
_SPARE = 1.5e-4  # mm by which half axes of half ellipses are written short: SVG 1.1 F.6.6 stretches them to fit


def paths_of(points: F64, first: I64, is_closed: Bools, curve: I64) -> tuple[tuple[Path, ...], F64]:
    """Write chains as paths: a path for each, and their lengths (c,) in mm.

    points (m,2) mm of all chains, those of chain c from first[c] to first[c+1]; a closed one does not repeat its first
    point. curve (m,) is the number of the smooth curve that the segment after each point belongs to, -1 for none:
    between two segments of one curve a sharper bend still counts as smooth. A closed chain that is a circle or an
    ellipse is two arcs that begin at its long axis. The free ends of an open chain may be put on the arc that the other
    points lie on, if they are not farther from it than BULGE: they were cut off a chord.
    Sources: circle by Kasa 1976; ellipse by least squares with trace 1 (Gander, Golub and Strebel 1994); cubics by
    Schneider 1990. Cost: linear for lines, circles and ellipses, n log n for others.
    """
    if len(first) < 2:
        return (), np.zeros(0)
    begin, row, kind, number, length = _fit(points, first, is_closed, curve)
    return tuple(_paths(begin, row, kind, number, is_closed)), length


def _paths(begin: F64, row: I64, kind: I64, number: F64, is_closed: Bools) -> list[Path]:
    starts = [(x, y) for x, y in begin.tolist()]
    change = np.flatnonzero(np.diff(kind) != 0) + 1
    cuts = np.unique(np.concatenate([row, change, np.flatnonzero(kind == ARC), np.flatnonzero(kind == ARC) + 1]))
    where = np.searchsorted(cuts, row).tolist()
    limits, kinds = cuts.tolist(), kind.take(cuts[:-1]).tolist()
    paths = []
    for chain, start in enumerate(starts):
        pieces = tuple(
            _piece(kinds[k], number[limits[k] : limits[k + 1]]) for k in range(where[chain], where[chain + 1])
        )
        paths.append(Path(start, pieces, bool(is_closed[chain])))
    return paths


def _piece(kind: int, rows: F64) -> Piece:
    if kind == LINE:
        return Lines(rows[:, :2])
    if kind == CUBIC:
        return Cubics(np.concatenate([rows[:, 2:6], rows[:, :2]], axis=1).reshape(-1, 2))
    x, y, long, short, turn, is_large, is_clockwise = rows[0].tolist()
    return Arc((long, short), turn, bool(is_large), bool(is_clockwise), (x, y))


@kernel
def _fit(points: F64, first: I64, is_closed: Bools, curve: I64) -> tuple[F64, I64, I64, F64, F64]:
    """For each chain its start and length, and the rows of its pieces; for each piece its kind and numbers."""
    n_chains = len(first) - 1
    room = len(points) + 4 * n_chains + 8
    begin, length, row = np.empty((n_chains, 2)), np.zeros(n_chains), np.zeros(n_chains + 1, np.int64)
    kind, number = np.empty(room, np.int64), np.zeros((room, 7))
    longest = 0
    for chain in range(n_chains):
        longest = max(longest, first[chain + 1] - first[chain])
    p, corner = np.empty((longest + 2, 2)), np.empty(longest + 2, np.int64)
    for chain in range(n_chains):
        low, count, closed = first[chain], first[chain + 1] - first[chain], is_closed[chain]
        shift = 0
        while closed and shift < count and _is_smooth_at(points, curve, low, count, shift):
            shift += 1
        is_smooth_ring = closed and shift == count
        n_corners = 0
        for k in range(count + 1 if closed else count):
            place = (k + shift) % count
            p[k, 0], p[k, 1] = points[low + place, 0], points[low + place, 1]
            is_end = k == 0 or k == (count if closed else count - 1)
            if is_end or not _is_smooth_at(points, curve, low, count, place):
                corner[n_corners] = k
                n_corners += 1
        begin[chain, 0], begin[chain, 1] = p[0, 0], p[0, 1]
        at = row[chain]
        is_whole = False
        if is_smooth_ring:
            shape = _ellipse_of(p, corner[0], corner[1], _RING * closed)
            is_whole = shape[0] > 0 and abs(abs(shape[6]) - 2 * np.pi) < 1e-6
        if is_whole:
            at = _whole(shape, begin[chain], kind, number, at)
        else:
            for k in range(n_corners - 1):
                free = _RING * is_smooth_ring
                if not closed:
                    free += _FIRST * (k == 0) + _LAST * (k == n_corners - 2)
                at = _run(p, corner[k], corner[k + 1], free, begin[chain], kind, number, at)
        length[chain] = _length(begin[chain], kind, number, row[chain], at)
        row[chain + 1] = at
    at = row[n_chains]
    return begin, row, kind[:at], number[:at], length


@inner
def _is_smooth_at(points: F64, curve: I64, low: int, count: int, place: int) -> bool:
    return _is_smooth(points, curve, low + (place + count - 1) % count, low + place, low + (place + 1) % count)


@inner
def _is_smooth(points: F64, curve: I64, before: int, here: int, after: int) -> bool:
    """Whether a curve through three points may keep within BULGE of both chords."""
    ax, ay = points[here, 0] - points[before, 0], points[here, 1] - points[before, 1]
    bx, by = points[after, 0] - points[here, 0], points[after, 1] - points[here, 1]
    a, b = np.sqrt(ax * ax + ay * ay), np.sqrt(bx * bx + by * by)
    cosine, sine = (ax * bx + ay * by) / (a * b), abs(ax * by - ay * bx) / (a * b)
    if cosine < 0 or before == after:
        return False
    same = curve[before] >= 0 and curve[before] == curve[here]
    bulge = max(a, b) ** 2 * sine / (1 + cosine) / (2 * (a + b))
    return bool(bulge <= BULGE and (cosine >= _STEEP or same))


@inner
def _run(p: F64, left: int, right: int, free: int, begin: F64, kind: I64, number: F64, at: int) -> int:
    """Write a run without corners."""
    if right == left + 1 or _is_straight(p, left, right):
        return _put_line(p, right, kind, number, at)
    shape = _ellipse_of(p, left, right, free & (_FIRST | _LAST))
    if shape[0] > 0:
        return _put_arcs(p, left, right, free, shape, begin, kind, number, at)
    position, waiting = left, left
    while position < right:
        reach, shape[0] = position, 0.0
        if right - position >= 6:
            reach, shape = _arc_reach(p, position, right, _ends(free, left, right, position, right))
        is_arc = shape[0] > 0
        if is_arc:
            is_arc = abs(shape[6]) >= (_ARC_TURN if shape[2] == shape[3] else _ELLIPSE_TURN)
        stop = position if is_arc else _straight_reach(p, position, right)
        if is_arc or stop > position:
            at = _put_cubics(p, left, right, waiting, position, free, kind, number, at)
            if is_arc:
                ends = _ends(free, left, right, position, reach)
                at = _put_arcs(p, position, reach, ends, shape, begin, kind, number, at)
                position = reach
            else:
                at = _put_line(p, stop, kind, number, at)
                position = stop
            waiting = position
        else:
            position = min(right, max(position + 1, (position + reach) // 2))
    return _put_cubics(p, left, right, waiting, right, free, kind, number, at)


@inner
def _ends(free: int, left: int, right: int, begin: int, stop: int) -> int:
    """Which ends of a stretch of the run left to right are free."""
    return (free & _FIRST if begin == left else 0) | (free & _LAST if stop == right else 0)


@inner
def _put_line(p: F64, end: int, kind: I64, number: F64, at: int) -> int:
    kind[at], number[at, 0], number[at, 1] = LINE, p[end, 0], p[end, 1]
    return at + 1


@inner
def _is_straight(p: F64, left: int, right: int) -> bool:
    dx, dy = p[right, 0] - p[left, 0], p[right, 1] - p[left, 1]
    length = np.sqrt(dx * dx + dy * dy)
    if length == 0:
        return False
    before = 0.0
    for k in range(left + 1, right):
        x, y = p[k, 0] - p[left, 0], p[k, 1] - p[left, 1]
        along = (x * dx + y * dy) / length
        if abs(x * dy - y * dx) > _STRAIGHT * length or along <= before or along >= length:
            return False
        before = along
    return True


@inner
def _straight_reach(p: F64, left: int, right: int) -> int:
    """The last point of a long straight stretch from `left`, or `left` if there is none."""
    reach, step = left, 2
    while left + step <= right and _is_straight(p, left, left + step):
        reach, step = left + step, step * 2
    if reach == left:
        return left
    while step > 1:
        step //= 2
        if reach + step <= right and _is_straight(p, left, reach + step):
            reach += step
    dx, dy = p[reach, 0] - p[left, 0], p[reach, 1] - p[left, 1]
    return reach if dx * dx + dy * dy >= _LONG * _LONG else left


@inner
def _arc_reach(p: F64, left: int, right: int, free: int) -> tuple[int, F64]:
    """The last point of the longest circle, else ellipse, that begins at `left`, and its shape."""
    best, best_shape = left, np.zeros(7)
    step = 6 + (best - left)
    while True:
        stop = min(left + step, right)
        shape = _ellipse_of(p, left, stop, _ends(free, left, right, left, stop))
        if shape[0] == 0:
            break
        best, best_shape = stop, shape
        if stop == right:
            return best, best_shape
        step *= 2
    if best == left:
        return best, best_shape
    while step > 1:
        step //= 2
        stop = min(best + step, right)
        shape = _ellipse_of(p, left, stop, _ends(free, left, right, left, stop))
        if shape[0] > 0:
            best, best_shape = stop, shape
    return best, best_shape


@inner
def _ellipse_of(p: F64, left: int, right: int, free: int) -> F64:
    """The circle or ellipse that points left to right lie on, else all but free ends, or zeros for none.

    Seven numbers: 1, centre x, half axis, other half axis, centre y, turn of the first axis in radians, sweep from
    the first to the last point, positive when clockwise on the page.
    """
    high = right - (free & _RING) // _RING
    shape = np.zeros(7)
    # A loop, as numba would compile what is called once more for every number written out.
    for spare in range(2 if free & (_FIRST | _LAST) else 1):
        first, last = left + spare * (free & _FIRST), high - spare * (free & _LAST) // _LAST
        shape = _ellipse_by(p, left, right, first, last, spare)
        if shape[0] > 0:
            break
    return shape


@inner
def _ellipse_by(p: F64, left: int, right: int, low: int, high: int, spare: int) -> F64:
    """The shape of the points low to high, if those left to right do not contradict it.

    One point more than fixes the shape must bear it out, and `spare` more.
    """
    none = np.zeros(7)
    count = high - low + 1
    if count < 4 + spare:
        return none
    mid_x, mid_y, size = 0.0, 0.0, 0.0
    for k in range(low, high + 1):
        mid_x += p[k, 0]
        mid_y += p[k, 1]
    mid_x, mid_y = mid_x / count, mid_y / count
    for k in range(low, high + 1):
        size = max(size, abs(p[k, 0] - mid_x), abs(p[k, 1] - mid_y))
    if size < 0.02:
        return none
    m, v = np.zeros((5, 5)), np.zeros(5)
    f = np.empty(5)
    for n_unknown in (3, 5):
        if n_unknown == 5 and count < 6 + spare:
            return none
        for i in range(5):
            v[i] = 0.0
            for j in range(5):
                m[i, j] = 0.0
        for k in range(low, high + 1):
            x, y = (p[k, 0] - mid_x) / size, (p[k, 1] - mid_y) / size
            f[0], f[1], f[2], f[3], f[4] = x, y, 1.0, x * y, x * x - y * y
            half = (x * x + y * y) / 2
            for i in range(n_unknown):
                v[i] -= f[i] * half
                for j in range(n_unknown):
                    m[i, j] += f[i] * f[j]
        if not _solve(m, v, n_unknown):
            continue
        shape = _shape(v, n_unknown, mid_x, mid_y, size)
        if shape[0] > 0 and _passes(p, left, right, low, high, shape):
            return shape
    return none


@inner
def _solve(m: F64, v: F64, n: int) -> bool:
    """Solve n equations in place by elimination with pivots; False if they are singular."""
    for k in range(n):
        pivot = k
        for i in range(k + 1, n):
            if abs(m[i, k]) > abs(m[pivot, k]):
                pivot = i
        if abs(m[pivot, k]) < 1e-13:
            return False
        if pivot != k:
            for j in range(n):
                m[k, j], m[pivot, j] = m[pivot, j], m[k, j]
            v[k], v[pivot] = v[pivot], v[k]
        for i in range(k + 1, n):
            factor = m[i, k] / m[k, k]
            for j in range(k, n):
                m[i, j] -= factor * m[k, j]
            v[i] -= factor * v[k]
    for k in range(n - 1, -1, -1):
        for j in range(k + 1, n):
            v[k] -= m[k, j] * v[j]
        v[k] /= m[k, k]
    return True


@inner
def _shape(v: F64, n_unknown: int, mid_x: float, mid_y: float, size: float) -> F64:
    """Centre, half axes and turn of (x2 + y2)/2 + v4 (x2 - y2) + v3 x y + v0 x + v1 y + v2 = 0, or zeros."""
    none = np.zeros(7)
    skew, cross = (v[4], v[3]) if n_unknown == 5 else (0.0, 0.0)
    a, c, b = 1 + 2 * skew, 1 - 2 * skew, cross
    determinant = a * c - b * b
    if determinant <= 1e-12:
        return none
    x, y = (-v[0] * c + v[1] * b) / determinant, (-v[1] * a + v[0] * b) / determinant
    rest = -(v[2] + (v[0] * x + v[1] * y) / 2)
    spread = np.sqrt(skew * skew + cross * cross / 4)
    if rest <= 0 or spread >= 0.5:
        return none
    long, short = np.sqrt(rest / (0.5 - spread)) * size, np.sqrt(rest / (0.5 + spread)) * size
    if short < _FLATTEST or long > 1e5:
        return none
    turn = 0.0
    if n_unknown == 5:
        turn = 0.5 * np.arctan2(cross, 2 * skew) + np.pi / 2
    return np.array([1.0, x * size + mid_x, long, short, y * size + mid_y, turn, 0.0])


@inner
def _angle(shape: F64, x: float, y: float) -> float:
    """The angle of a point in the ellipse's own measure."""
    cosine, sine = np.cos(shape[5]), np.sin(shape[5])
    dx, dy = x - shape[1], y - shape[4]
    angle: float = np.arctan2((dy * cosine - dx * sine) / shape[3], (dx * cosine + dy * sine) / shape[2])
    return angle


@inner
def _passes(p: F64, left: int, right: int, low: int, high: int, shape: F64) -> bool:
    """Whether the shape passes all points, in order and never far from a chord; its sweep is written into it."""
    cosine, sine = np.cos(shape[5]), np.sin(shape[5])
    long, short = shape[2], shape[3]
    sweep, before_u, before_w = 0.0, 0.0, 0.0
    first_away, last_away, first_bulge, last_bulge = 0.0, 0.0, 0.0, 0.0
    for k in range(left, right + 1):
        dx, dy = p[k, 0] - shape[1], p[k, 1] - shape[4]
        u, w = (dx * cosine + dy * sine) / long, (dy * cosine - dx * sine) / short
        value = u * u + w * w
        slope = 2 * np.sqrt(u * u / (long * long) + w * w / (short * short))
        # Distance to first order (Sampson 1982); exact enough as the half axes are at least ten times the tolerance.
        if slope == 0 or value - 1 > _FIT * slope or (1 - value > _FIT * slope and low <= k <= high):
            return False
        if k == left:
            first_away = (1 - value) / slope
        last_away = (1 - value) / slope
        if k > left:
            step = np.arctan2(before_u * w - before_w * u, before_u * u + before_w * w)
            mid_u, mid_w = (before_u + u) / 2, (before_w + w) / 2
            share = np.sqrt(mid_u * mid_u + mid_w * mid_w)
            bulge = (1 / share - 1) * np.sqrt((mid_u * long) ** 2 + (mid_w * short) ** 2)
            if step * sweep < 0 or step == 0 or abs(step) > 2 or bulge > BULGE:
                return False
            sweep += step
            if k == low + 1:
                first_bulge = bulge
            if k == high:
                last_bulge = bulge
        before_u, before_w = u, w
    # A free end may lie within, where a chord like its neighbour runs.
    if first_away > 1.5 * first_bulge + _FIT or last_away > 1.5 * last_bulge + _FIT:
        return False
    shape[6] = sweep
    return abs(sweep) < 2 * np.pi + 1e-6


@inner
def _whole(shape: F64, begin: F64, kind: I64, number: F64, at: int) -> int:
    """A whole circle or ellipse as two arcs from one end of its long axis, the leftmost or else upper one."""
    dx, dy = shape[2] * np.cos(shape[5]), shape[2] * np.sin(shape[5])
    if dx < -1e-9 or (abs(dx) <= 1e-9 and dy < 0):
        dx, dy = -dx, -dy
    begin[0], begin[1] = shape[1] - dx, shape[4] - dy
    share = 1 - _SPARE / shape[2]
    for half in range(2):
        kind[at] = ARC
        number[at, 0] = shape[1] + dx if half == 0 else begin[0]
        number[at, 1] = shape[4] + dy if half == 0 else begin[1]
        number[at, 2], number[at, 3], number[at, 4] = shape[2] * share, shape[3] * share, _degrees(shape[5])
        number[at, 5], number[at, 6] = 0.0, 1.0
        at += 1
    return at


@inner
def _degrees(turn: float) -> float:
    """An angle of an axis in degrees from -90, not included, to 90."""
    degrees = turn * 180 / np.pi
    while degrees > 90:
        degrees -= 180
    while degrees <= -90:
        degrees += 180
    return degrees


@inner
def _put_arcs(p: F64, left: int, right: int, free: int, shape: F64, begin: F64, kind: I64, number: F64, at: int) -> int:
    """Arcs from point left to point right; a free end goes onto the shape."""
    cosine, sine = np.cos(shape[5]), np.sin(shape[5])
    start = _angle(shape, p[left, 0], p[left, 1])
    count = max(1, int(np.ceil(abs(shape[6]) / _MOST_TURN)))
    for k in range(1 - (free & _FIRST), count + 1):
        angle = start + shape[6] * k / count
        u, w = shape[2] * np.cos(angle), shape[3] * np.sin(angle)
        x, y = shape[1] + u * cosine - w * sine, shape[4] + u * sine + w * cosine
        if k == 0:
            begin[0], begin[1] = x, y
            continue
        if k == count and free & _LAST == 0:
            x, y = p[right, 0], p[right, 1]
        kind[at] = ARC
        number[at, 0], number[at, 1], number[at, 2], number[at, 3] = x, y, shape[2], shape[3]
        number[at, 4], number[at, 5], number[at, 6] = _degrees(shape[5]), 0.0, 1.0 if shape[6] > 0 else 0.0
        at += 1
    return at


@inner
def _direction(p: F64, left: int, right: int, k: int, free: int) -> tuple[float, float]:
    """The unit tangent at point k of a run: that of the circle through it and its neighbours."""
    middle = k
    if free & _RING == 0:
        middle = min(max(k, left + 1), right - 1)
    before = middle - 1 if middle > left else right - 1
    after = middle + 1 if middle < right else left + 1
    ax, ay = p[middle, 0] - p[before, 0], p[middle, 1] - p[before, 1]
    bx, by = p[after, 0] - p[middle, 0], p[after, 1] - p[middle, 1]
    a, b = np.sqrt(ax * ax + ay * ay), np.sqrt(bx * bx + by * by)
    x, y = ax / a * b + bx / b * a, ay / a * b + by / b * a
    size = np.sqrt(x * x + y * y)
    x, y = x / size, y / size
    if k < middle:
        along = (x * ax + y * ay) / (a * a)
        x, y = 2 * along * ax - x, 2 * along * ay - y
    elif k > middle:
        along = (x * bx + y * by) / (b * b)
        x, y = 2 * along * bx - x, 2 * along * by - y
    return x, y


@inner
def _put_cubics(
    p: F64, left: int, right: int, begin: int, stop: int, free: int, kind: I64, number: F64, at: int
) -> int:
    """Cubics through points begin to stop of the run left to right, halved where one does not do (Schneider 1990)."""
    if begin == stop:
        return at
    ends = np.empty(64, np.int64)
    ends[0], top = stop, 1
    handles = np.empty(4)
    while top > 0:
        end = ends[top - 1]
        if end - begin == 1 and right - left == 1:
            at = _put_line(p, end, kind, number, at)
            begin, top = end, top - 1
            continue
        ax, ay = _direction(p, left, right, begin, free)
        bx, by = _direction(p, left, right, end, free)
        worst = _cubic(p, begin, end, ax, ay, bx, by, handles)
        if worst < 0:
            kind[at] = CUBIC
            number[at, 0], number[at, 1] = p[end, 0], p[end, 1]
            for k in range(4):
                number[at, 2 + k] = handles[k]
            at, begin, top = at + 1, end, top - 1
        elif end - begin == 1:
            at = _put_line(p, end, kind, number, at)
            begin, top = end, top - 1
        else:
            # The middle half keeps the pieces from becoming many, and the stack from growing past its end.
            quarter = (end - begin) // 4
            ends[top] = min(max(worst, begin + max(1, quarter)), end - max(1, quarter))
            top += 1
    return at


@inner
def _cubic(p: F64, begin: int, end: int, ax: float, ay: float, bx: float, by: float, handles: F64) -> int:
    """Fit one cubic with the unit end tangents a and b into `handles`: -1 if it keeps its error, else the worst point.

    The points' places on it are set anew four times, each by one step of Newton's method.
    """
    count = end - begin + 1
    place = np.zeros(count)
    for k in range(1, count):
        dx, dy = p[begin + k, 0] - p[begin + k - 1, 0], p[begin + k, 1] - p[begin + k - 1, 1]
        place[k] = place[k - 1] + np.sqrt(dx * dx + dy * dy)
    total = place[count - 1]
    for k in range(count):
        place[k] /= total
    x0, y0, x3, y3 = p[begin, 0], p[begin, 1], p[end, 0], p[end, 1]
    worst = begin + count // 2
    for _ in range(5):
        aa, ab, bb, va, vb = 0.0, 0.0, 0.0, 0.0, 0.0
        for k in range(1, count - 1):
            t = place[k]
            s = 1 - t
            w0, w1, w2, w3 = s * s * s, 3 * s * s * t, 3 * s * t * t, t * t * t
            rx, ry = (
                p[begin + k, 0] - x0 * (w0 + w1) - x3 * (w2 + w3),
                p[begin + k, 1] - y0 * (w0 + w1) - y3 * (w2 + w3),
            )
            aa += w1 * w1
            bb += w2 * w2
            ab -= w1 * w2 * (ax * bx + ay * by)
            va += w1 * (ax * rx + ay * ry)
            vb -= w2 * (bx * rx + by * ry)
        determinant = aa * bb - ab * ab
        first, second = total / 3, total / 3
        if determinant > 1e-9:
            first, second = (va * bb - vb * ab) / determinant, (vb * aa - va * ab) / determinant
            if min(first, second) < 0.05 * total or max(first, second) > total:
                first, second = total / 3, total / 3
        x1, y1, x2, y2 = x0 + first * ax, y0 + first * ay, x3 - second * bx, y3 - second * by
        greatest = 0.0
        for k in range(1, count - 1):
            t = place[k]
            s = 1 - t
            dx = s * s * s * x0 + 3 * s * s * t * x1 + 3 * s * t * t * x2 + t * t * t * x3 - p[begin + k, 0]
            dy = s * s * s * y0 + 3 * s * s * t * y1 + 3 * s * t * t * y2 + t * t * t * y3 - p[begin + k, 1]
            if dx * dx + dy * dy > greatest:
                greatest, worst = dx * dx + dy * dy, begin + k
            tx = 3 * (s * s * (x1 - x0) + 2 * s * t * (x2 - x1) + t * t * (x3 - x2))
            ty = 3 * (s * s * (y1 - y0) + 2 * s * t * (y2 - y1) + t * t * (y3 - y2))
            cx = 6 * (s * (x2 - 2 * x1 + x0) + t * (x3 - 2 * x2 + x1))
            cy = 6 * (s * (y2 - 2 * y1 + y0) + t * (y3 - 2 * y2 + y1))
            slope = tx * tx + ty * ty + dx * cx + dy * cy
            if slope > 0:
                place[k] = min(max(t - (dx * tx + dy * ty) / slope, 0.0), 1.0)
        if greatest <= (0.8 * ERROR) ** 2:
            handles[0], handles[1], handles[2], handles[3] = x1, y1, x2, y2
            return _strays(p, begin, place, x1, y1, x2, y2)
        if greatest > 400 * ERROR * ERROR:
            break
    return worst


@inner
def _strays(p: F64, begin: int, place: F64, x1: float, y1: float, x2: float, y2: float) -> int:
    """-1 if the cubic keeps near the chords of the points that stand at the places, else the point before the worst."""
    end = begin + len(place) - 1
    for k in range(len(place) - 1):
        i = begin + k
        dx, dy = p[i + 1, 0] - p[i, 0], p[i + 1, 1] - p[i, 1]
        for quarter in range(1, 4):
            t = place[k] + quarter / 4 * (place[k + 1] - place[k])
            s = 1 - t
            x = s * s * s * p[begin, 0] + 3 * s * s * t * x1 + 3 * s * t * t * x2 + t * t * t * p[end, 0] - p[i, 0]
            y = s * s * s * p[begin, 1] + 3 * s * s * t * y1 + 3 * s * t * t * y2 + t * t * t * p[end, 1] - p[i, 1]
            along = min(max((x * dx + y * dy) / (dx * dx + dy * dy), 0.0), 1.0)
            x, y = x - along * dx, y - along * dy
            if x * x + y * y > BULGE * BULGE or place[k + 1] <= place[k]:
                return max(i, begin + 1)
    return -1


@inner
def _length(begin: F64, kind: I64, number: F64, low: int, high: int) -> float:
    """Length of a path; curves by the rule of Simpson."""
    total, x, y = 0.0, begin[0], begin[1]
    for row in range(low, high):
        ex, ey = number[row, 0], number[row, 1]
        if kind[row] == LINE:
            total += np.sqrt((ex - x) ** 2 + (ey - y) ** 2)
        elif kind[row] == CUBIC:
            x1, y1, x2, y2 = number[row, 2], number[row, 3], number[row, 4], number[row, 5]
            for k in range(17):
                t = k / 16
                s = 1 - t
                dx = 3 * (s * s * (x1 - x) + 2 * s * t * (x2 - x1) + t * t * (ex - x2))
                dy = 3 * (s * s * (y1 - y) + 2 * s * t * (y2 - y1) + t * t * (ey - y2))
                weight = 1.0 if k == 0 or k == 16 else (4.0 if k % 2 else 2.0)
                total += weight / 48 * np.sqrt(dx * dx + dy * dy)
        else:
            total += _arc_length(number[row], x, y)
        x, y = ex, ey
    return total


@inner
def _arc_length(number: F64, x: float, y: float) -> float:
    long, short, turn = number[2], number[3], number[4] * np.pi / 180
    cosine, sine = np.cos(turn), np.sin(turn)
    dx, dy = number[0] - x, number[1] - y
    u, w = (dx * cosine + dy * sine) / long, (dy * cosine - dx * sine) / short
    half = np.sqrt(u * u + w * w) / 2
    if half > 1:
        long, short, half = long * half, short * half, 1.0
    # On the unit circle the arc spans 2 asin(half) about the direction square to its chord.
    spread = np.arcsin(half)
    middle = np.arctan2(w, u) + (-np.pi / 2 if number[6] > 0 else np.pi / 2)
    total = 0.0
    for k in range(33):
        angle = middle - spread + 2 * spread * k / 32
        speed = np.sqrt((long * np.sin(angle)) ** 2 + (short * np.cos(angle)) ** 2)
        weight = 1.0 if k == 0 or k == 32 else (4.0 if k % 2 else 2.0)
        total += weight * 2 * spread / 96 * speed
    return total

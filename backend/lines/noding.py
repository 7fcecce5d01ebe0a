"""Ends that are one point, and points that lie on segments: what joining needs to know of segments in the plane.

The results do not depend on the order of the input. Kernels run in one thread; points are mm on the page.
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import F64
from .segments import fixed

I64: TypeAlias = NDArray[np.int64]

_BITS = 11  # bits sorted in one pass
_MOST_CELLS = 1 << 30  # cells along one side of the page, so that the number of a cell fits 64 bits


def sorted_rows(keys: I64) -> I64:
    """The rows of `keys` (n,) int64, none negative, in rising order, equal ones as they stand. Cost: linear."""
    return _sorted_rows(np.ascontiguousarray(keys))


def snapped(xy: F64, joint: float) -> tuple[I64, F64]:
    """Make one point of ends that lie nearer than about `joint` mm: (n,) numbers of points, (k,2) the points.

    Ends in one square of half a joint go to the first of them by x, then y; those of a square go on to the nearest
    point not farther than a joint. No end moves farther than 1.71 joints. Points are numbered by rows of squares from
    the top, then from the left. Squares lie at multiples of their size from the page's corner, so that what is drawn
    elsewhere moves nothing. Cost: linear.
    """
    if not len(xy):
        return np.zeros(0, np.int64), np.zeros((0, 2))
    size = max(joint / 2, float(np.abs(xy).max()) / _MOST_CELLS * 2)
    keys, width = _squares(xy, size)
    order = _sorted_rows(keys)
    return _snap(keys, order, xy, width, (2 * size) ** 2)


def near(points: F64, start: F64, end: F64, reach: float, ends: I64 | None = None) -> tuple[I64, I64]:
    """All pairs of a segment and a point not farther than `reach` mm from it: rows of segments, rows of points.

    points (p,2), start and end (s,2) float64; `ends` (s,2) are rows of points that belong to the segment and are not
    told. Pairs come by segment, then by point. The points stand in upright columns of about as many points as there
    are columns, each from the top down, so that a crowd in one place costs no more than an even field. Cost: for a
    segment about log p in each column it passes, and what is found.
    """
    if not len(points) or not len(start):
        return np.zeros(0, np.int64), np.zeros(0, np.int64)
    if ends is None:
        ends = np.full((len(start), 2), -1)
    start, end, ends = fixed(start), fixed(end), fixed(ends)
    bounds = _bounds(points)
    down = _sorted_rows(_levels(points, reach))
    first, order, along = _columns(points, down, bounds)
    room = 2 * len(start) + 64
    while True:
        found = np.empty((room, 2), np.int64)
        needed = _find(bounds, first, order, along, start, end, ends, reach, found)
        if needed <= room:
            break
        room = needed
    found = found[:needed]
    found = found[np.lexsort((found[:, 1], found[:, 0]))]
    return found[:, 0], found[:, 1]


def split(ends: I64, points: F64, reach: float) -> tuple[I64, I64]:
    """Cut segments where they begin and cease to lie one on the other: (m,2) rows of points, (m,) rows of `ends`.

    ends (s,2) are rows of `points` (k,2), which must be different for each segment. Two segments lie one on the other
    where neither leaves the other by more than `reach` mm; there they become the same pair of points. Where lines only
    meet or cross they stay whole. Cost: that of `near`.
    """
    segment, point = near(points, points.take(ends[:, 0], 0), points.take(ends[:, 1], 0), reach, ends)
    is_cut = _lie_along(ends, points, reach, segment, point)
    segment, point = segment[is_cut], point[is_cut]
    if not len(segment):
        return ends, np.arange(len(ends))
    start = points[ends[segment, 0]]
    along = _dot(points[point] - start, points[ends[segment, 1]] - start)
    is_touched = np.zeros(len(ends), bool)
    is_touched[segment] = True
    touched, whole = np.flatnonzero(is_touched), np.flatnonzero(~is_touched)
    of = np.concatenate([touched, segment, touched])
    at = np.concatenate([ends[touched, 0], point, ends[touched, 1]])
    place = np.concatenate([np.full(len(touched), -np.inf), along, np.full(len(touched), np.inf)])
    order = np.lexsort((at, place, of))
    of, at = of[order], at[order]
    goes_on = of[1:] == of[:-1]
    parts = np.column_stack([at[:-1], at[1:]])[goes_on]
    return np.concatenate([ends.take(whole, 0), parts]), np.concatenate([whole, of[:-1][goes_on]])


def ends_at(ends: I64, n_points: int) -> tuple[I64, I64]:
    """Which ends stand at each point: those of point k are rows first[k] to first[k+1] of the second array.

    An end is 2 s or 2 s + 1 for the first or second end of segment s. Cost: linear.
    """
    return _ends_at(fixed(ends), n_points)


def _lie_along(ends: I64, points: F64, reach: float, segment: I64, point: I64) -> NDArray[np.bool_]:
    """Of pairs of a segment and a point on it: whether a segment that ends in the point runs on along the first."""
    first, at = _ends_at(fixed(ends), len(points))
    count = first[point + 1] - first[point]
    pair = np.repeat(np.arange(len(point)), count)
    other = at[np.arange(len(pair)) - np.repeat(np.cumsum(count) - count, count) + first[point][pair]] >> 1
    here, mine = point[pair], ends.take(segment[pair], 0)
    far = ends.take(other, 0).sum(axis=1) - here
    start, stop, far_xy, here_xy = (points.take(row, 0) for row in (mine[:, 0], mine[:, 1], far, here))
    along = stop - start
    is_forward = _dot(far_xy - here_xy, along) > 0
    mine_end = np.where(is_forward[:, None], stop, start)
    is_beyond = np.where(is_forward, _dot(far_xy - stop, along) > 0, _dot(far_xy - start, along) < 0)
    away = np.where(is_beyond, _distance(mine_end, here_xy, far_xy), _distance(far_xy, start, stop))
    result = np.zeros(len(point), bool)
    result[pair[(away <= reach) & (other != segment[pair])]] = True
    return result


def _bounds(points: F64) -> F64:
    """The x between columns: one column for about as many points as there are columns."""
    n_columns = max(1, min(int(len(points) ** 0.5), 2048))
    sample = np.sort(points[:: max(1, len(points) // (16 * n_columns)), 0])
    return sample[:: max(1, len(sample) // n_columns)][1:].copy()


def _dot(a: F64, b: F64) -> F64:
    return a[:, 0] * b[:, 0] + a[:, 1] * b[:, 1]


def _distance(points: F64, start: F64, end: F64) -> F64:
    """Distance of each point from the segment of the same row."""
    along = end - start
    place = np.clip(_dot(points - start, along) / np.maximum(_dot(along, along), 1e-300), 0.0, 1.0)
    away = points - start - place[:, None] * along
    return np.sqrt(_dot(away, away))


@kernel
def _sorted_rows(keys: I64) -> I64:
    n = len(keys)
    rows, spare = np.arange(n), np.empty(n, np.int64)
    most = np.int64(0)
    for key in keys:
        most = max(most, key)
    shift = 0
    while most >> shift > 0:
        place = np.zeros((1 << _BITS) + 1, np.int64)
        for k in range(n):
            place[((keys[k] >> shift) & ((1 << _BITS) - 1)) + 1] += 1
        for k in range(1 << _BITS):
            place[k + 1] += place[k]
        for row in rows:
            digit = (keys[row] >> shift) & ((1 << _BITS) - 1)
            spare[place[digit]] = row
            place[digit] += 1
        rows, spare = spare, rows
        shift += _BITS
    return rows


@kernel
def _squares(xy: F64, size: float) -> tuple[I64, int]:
    """The number of each point's square, row by row with two empty ones at both ends, and the squares in a row."""
    n = len(xy)
    column, row = np.empty(n, np.int64), np.empty(n, np.int64)
    for k in range(n):
        column[k], row[k] = np.int64(np.floor(xy[k, 0] / size)), np.int64(np.floor(xy[k, 1] / size))
    left, top = column.min(), row.min()
    width = column.max() - left + 5
    for k in range(n):
        row[k] = (row[k] - top) * width + column[k] - left + 2
    return row, width


@kernel
def _snap(keys: I64, order: I64, xy: F64, width: int, reach: float) -> tuple[I64, F64]:
    """`order` sorts `keys`; `reach` is squared. A square is compared with those before it within two rows."""
    n = len(keys)
    cell_of, cell_key, cell_xy = np.empty(n, np.int64), np.empty(n, np.int64), np.empty((n, 2))
    n_cells = 0
    for row in order:
        x, y = xy[row, 0], xy[row, 1]
        c = n_cells - 1
        if c < 0 or keys[row] != cell_key[c]:
            c = n_cells
            cell_key[c], cell_xy[c, 0], cell_xy[c, 1] = keys[row], x, y
            n_cells += 1
        elif x < cell_xy[c, 0] or (x == cell_xy[c, 0] and y < cell_xy[c, 1]):
            cell_xy[c, 0], cell_xy[c, 1] = x, y
        cell_of[row] = c
    number, points = np.empty(n_cells, np.int64), np.empty((n_cells, 2))
    is_home = np.zeros(n_cells, np.bool_)
    begin = np.zeros(3, np.int64)
    n_points = 0
    for c in range(n_cells):
        x, y = cell_xy[c]
        nearest, best_distance = -1, reach
        for up in range(2, -1, -1):
            low = cell_key[c] - up * width - 2
            while cell_key[begin[up]] < low:
                begin[up] += 1
            other = begin[up]
            while other < c and cell_key[other] <= low + 4:
                if is_home[other]:
                    dx, dy = cell_xy[other, 0] - x, cell_xy[other, 1] - y
                    if dx * dx + dy * dy < best_distance:
                        nearest, best_distance = other, dx * dx + dy * dy
                other += 1
        if nearest >= 0:
            number[c] = number[nearest]
        else:
            is_home[c], number[c] = True, n_points
            points[n_points, 0], points[n_points, 1] = x, y
            n_points += 1
    for k in range(n):
        cell_of[k] = number[cell_of[k]]
    return cell_of, points[:n_points].copy()


@kernel
def _ends_at(ends: I64, n_points: int) -> tuple[I64, I64]:
    first, at = np.zeros(n_points + 2, np.int64), np.empty(2 * len(ends), np.int64)
    for s in range(len(ends)):
        first[ends[s, 0] + 2] += 1
        first[ends[s, 1] + 2] += 1
    for k in range(n_points + 1):
        first[k + 1] += first[k]
    for s in range(len(ends)):
        for side in range(2):
            place = first[ends[s, side] + 1]
            at[place] = 2 * s + side
            first[ends[s, side] + 1] = place + 1
    return first[: n_points + 1].copy(), at


@kernel
def _levels(points: F64, height: float) -> I64:
    """The number of the level stripe of that height each point lies in, from the top."""
    levels = np.empty(len(points), np.int64)
    for k in range(len(points)):
        levels[k] = np.int64(np.floor(points[k, 1] / height))
    least = levels.min()
    for k in range(len(points)):
        levels[k] -= least
    return levels


@inner
def _column(bounds: F64, x: float) -> int:
    low, count = 0, len(bounds)
    while count > 0:
        half = count >> 1
        if bounds[low + half] <= x:
            low += half + 1
            count -= half + 1
        else:
            count = half
    return low


@kernel
def _columns(points: F64, down: I64, bounds: F64) -> tuple[I64, I64, F64]:
    """Where each column begins, the points' rows column by column in the order `down`, and the points so."""
    n = len(points)
    column = np.empty(n, np.int64)
    first = np.zeros(len(bounds) + 3, np.int64)
    for k in range(n):
        column[k] = _column(bounds, points[k, 0])
        first[column[k] + 2] += 1
    for k in range(len(bounds) + 2):
        first[k + 1] += first[k]
    order, along = np.empty(n, np.int64), np.empty((n, 2))
    for row in down:
        place = first[column[row] + 1]
        order[place], along[place, 0], along[place, 1] = row, points[row, 0], points[row, 1]
        first[column[row] + 1] = place + 1
    return first[: len(bounds) + 2].copy(), order, along


@kernel
def _find(
    bounds: F64, first: I64, order: I64, along: F64, start: F64, end: F64, ends: I64, reach: float, found: I64
) -> int:
    """Write pairs to `found` as far as they fit; the number of all. Points of a column are in order to a reach."""
    n_found = 0
    for s in range(len(start)):
        ax, ay = start[s]
        dx, dy = end[s, 0] - ax, end[s, 1] - ay
        length = dx * dx + dy * dy
        low_x, high_x = min(ax, ax + dx) - reach, max(ax, ax + dx) + reach
        low_y, high_y = min(ay, ay + dy) - 2 * reach, max(ay, ay + dy) + 2 * reach
        slope = abs(dy / dx) if abs(dx) > 1e-9 * abs(dy) else 0.0
        column = _column(bounds, low_x)
        while column <= len(bounds) and (column == 0 or bounds[column - 1] <= high_x):
            upper, lower = low_y, high_y
            if slope > 0:
                left = max(low_x, bounds[column - 1]) if column > 0 else low_x
                right = min(high_x, bounds[column]) if column < len(bounds) else high_x
                begin, stop = (left - reach - ax) / dx * dy + ay, (right + reach - ax) / dx * dy + ay
                upper = max(upper, min(begin, stop) - 2 * reach)
                lower = min(lower, max(begin, stop) + 2 * reach)
            row, count = first[column], first[column + 1] - first[column]
            last = row + count
            while count > 0:
                half = count >> 1
                if along[row + half, 1] < upper:
                    row += half + 1
                    count -= half + 1
                else:
                    count = half
            while row < last and along[row, 1] <= lower:
                px, py = along[row, 0] - ax, along[row, 1] - ay
                across = px * dy - py * dx
                if (across * across <= reach * reach * length or length == 0) and not (
                    order[row] == ends[s, 0] or order[row] == ends[s, 1]
                ):
                    place = min(max((px * dx + py * dy) / length, 0.0), 1.0) if length > 0 else 0.0
                    qx, qy = px - place * dx, py - place * dy
                    if qx * qx + qy * qy <= reach * reach:
                        if n_found < len(found):
                            found[n_found, 0], found[n_found, 1] = s, order[row]
                        n_found += 1
                row += 1
            column += 1
    return n_found

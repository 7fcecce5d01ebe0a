"""Kernels that turn paths into edges: curves into chords, strokes into the outline of their ink, all cut to clips.

The outline of a stroke winds the same way everywhere, so that the nonzero rule fills exactly the union of its pieces,
however often the line runs over itself. Lengths are pixels. Ends and joins are those of ISO 32000-1, 8.4.3.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import F64, I32, U8

I64 = NDArray[np.int64]

LINE, CUBIC = 0, 1
ROUND, FLAT, EVEN_ODD, NONZERO = 0, 1, 2, 3

CHORD_ERROR = 1.0 / 128.0
"""Pixels by which a chord may stray from its curve, and twice that by which one strays from a round end or join.

On a round end chords leave out as much as they add, so that a pixel there is wrong by about a level of 8 bits.
"""

MITRE_LIMIT = 4.0
"""Longest mitre as a multiple of the width; beyond it a join is cut off. The value that SVG 1.1 starts from."""

MOST_CHORDS = 4096.0
SAME = 1e-6
"""Pixels within which two points of a path are one."""

COMPASS = ((1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0))

LEVEL = 0.01
"""Pixels by which the ends of a straight segment may differ and still count as level or upright."""


@inner
def _with_room(rows: F64, used: int, more: int) -> F64:
    """`rows`, or a larger copy that has room for `more` rows after `used`."""
    if used + more <= len(rows):
        return rows
    n_columns = rows.shape[1]
    larger = np.empty((2 * (used + more), n_columns))
    for row in range(used):
        for column in range(n_columns):
            larger[row, column] = rows[row, column]
    return larger


@inner
def _n_chords(points: F64, row: int, x: float, y: float, scale: float) -> int:
    """Chords that a cubic from (x, y) pixels, its other points from `row` on, needs by its second derivative."""
    x1, y1 = points[row, 0] * scale, points[row, 1] * scale
    x2, y2 = points[row + 1, 0] * scale, points[row + 1, 1] * scale
    x3, y3 = points[row + 2, 0] * scale, points[row + 2, 1] * scale
    bend_a = (x - 2.0 * x1 + x2) * (x - 2.0 * x1 + x2) + (y - 2.0 * y1 + y2) * (y - 2.0 * y1 + y2)
    bend_b = (x1 - 2.0 * x2 + x3) * (x1 - 2.0 * x2 + x3) + (y1 - 2.0 * y2 + y3) * (y1 - 2.0 * y2 + y3)
    wanted = np.sqrt(0.75 * np.sqrt(max(bend_a, bend_b)) / CHORD_ERROR)
    return max(1, int(np.ceil(min(wanted, MOST_CHORDS))))


@inner
def _add_point(line: F64, used: int, x: float, y: float, is_straight: float) -> int:
    if used > 0 and abs(x - line[used - 1, 0]) + abs(y - line[used - 1, 1]) <= SAME:
        return used
    line[used, 0], line[used, 1], line[used, 2] = x, y, is_straight
    return used + 1


@inner
def _chords(codes: U8, points: F64, first: int, last: int, scale: float, line: F64) -> tuple[F64, int]:
    """Flatten points[first:last] into rows (x, y, is_straight) of `line`; a row's flag is that of the chord to it."""
    used = 0
    row = first
    while row < last:
        if codes[row] != CUBIC:
            line = _with_room(line, used, 1)
            used = _add_point(line, used, points[row, 0] * scale, points[row, 1] * scale, 1.0)
            row += 1
            continue
        x0, y0 = points[row - 1, 0] * scale, points[row - 1, 1] * scale
        x1, y1 = points[row, 0] * scale, points[row, 1] * scale
        x2, y2 = points[row + 1, 0] * scale, points[row + 1, 1] * scale
        x3, y3 = points[row + 2, 0] * scale, points[row + 2, 1] * scale
        n = _n_chords(points, row, x0, y0, scale)
        line = _with_room(line, used, n)
        for step in range(1, n):
            t = step / n
            u = 1.0 - t
            a, b, c, d = u * u * u, 3.0 * u * u * t, 3.0 * u * t * t, t * t * t
            used = _add_point(line, used, a * x0 + b * x1 + c * x2 + d * x3, a * y0 + b * y1 + c * y2 + d * y3, 0.0)
        used = _add_point(line, used, x3, y3, 0.0)
        row += 3
    return line, used


@inner
def _on_grid(value: float, n_pixels: int) -> float:
    """The middle nearest to `value` at which a line `n_pixels` wide has its sides between pixels."""
    # The nudge keeps values that differ by rounding alone on one side of a half.
    if n_pixels % 2 == 1:
        return float(np.floor(value + 1e-4)) + 0.5
    return float(np.floor(value + 0.5 + 1e-4))


@inner
def _snap(line: F64, n: int, is_closed: bool, n_pixels: int) -> int:
    """Move level and upright straight segments so that their sides lie between pixels; merge points that meet."""
    for k in range(n if is_closed else n - 1):
        after = k + 1 if k + 1 < n else 0
        if line[after, 2] == 0.0:
            continue
        dx, dy = abs(line[after, 0] - line[k, 0]), abs(line[after, 1] - line[k, 1])
        if dy <= LEVEL < dx:
            line[k, 1] = _on_grid(line[k, 1], n_pixels)
            line[after, 1] = line[k, 1]
        elif dx <= LEVEL < dy:
            line[k, 0] = _on_grid(line[k, 0], n_pixels)
            line[after, 0] = line[k, 0]
    kept = 0
    for k in range(n):
        kept = _add_point(line, kept, line[k, 0], line[k, 1], line[k, 2])
    return kept


@inner
def _steps(r: float, cosine: float) -> int:
    """Equal chords, a power of two, for an arc of radius r whose angle has this cosine."""
    n = 1
    while n < 1024:
        half = np.sqrt(max(0.0, (1.0 + cosine) / 2.0))
        if r * (1.0 - half) <= 2.0 * CHORD_ERROR:
            break
        cosine = half
        n *= 2
    return n


@inner
def _sweep(ring: F64, used: int, x: float, y: float, r: float, ax: float, ay: float, bx: float, by: float) -> int:
    """Append the arc about (x, y) from unit vector a, left out, to b, less than a half turn away, by halving."""
    n = _steps(r, ax * bx + ay * by)
    ring[used + n - 1, 0], ring[used + n - 1, 1] = bx, by
    step = n
    while step > 1:
        for k in range(0, n, step):
            x0, y0 = (ax, ay) if k == 0 else (ring[used + k - 1, 0], ring[used + k - 1, 1])
            x0, y0 = x0 + ring[used + k + step - 1, 0], y0 + ring[used + k + step - 1, 1]
            length = np.sqrt(x0 * x0 + y0 * y0)
            middle = used + k + step // 2 - 1
            ring[middle, 0], ring[middle, 1] = x0 / length, y0 / length
        step //= 2
    # A chord lies inside its arc by two thirds of its sagitta in the mean.
    cosine = ax * ring[used, 0] + ay * ring[used, 1]
    fuller = r + r * (1.0 - np.sqrt(max(0.0, (1.0 + cosine) / 2.0))) * (2.0 / 3.0)
    for k in range(used, used + n):
        reach = fuller if k < used + n - 1 else r
        ring[k, 0], ring[k, 1] = x + reach * ring[k, 0], y + reach * ring[k, 1]
    return used + n


@inner
def _put(ring: F64, used: int, x: float, y: float) -> int:
    ring[used, 0], ring[used, 1] = x, y
    return used + 1


@inner
def _corner(
    ring: F64,
    used: int,
    x: float,
    y: float,
    r: float,
    is_round: bool,
    cross: float,
    dot: float,
    reach: float,
    ax: float,
    ay: float,
    bx: float,
    by: float,
) -> int:
    """Append the side to the right hand of travel (y down) where unit direction a turns into b at (x, y).

    cross, dot: of a and b; reach: the shorter of the two segments.
    """
    k = r / (1.0 + dot) if dot > -1.0 else np.inf
    stretch = np.sqrt(2.0 / (1.0 + dot)) if dot > -1.0 else np.inf
    if dot > 0.0 and r * (stretch - 1.0) < CHORD_ERROR / 2.0 and k * abs(cross) < reach:
        return _put(ring, used, x - k * (ay + by), y + k * (ax + bx))
    used = _put(ring, used, x - r * ay, y + r * ax)
    if cross > 0.0:
        used = _put(ring, used, x, y)
    elif is_round:
        mx, my = (-ay - by, ax + bx) if dot > 0.0 else (ax - bx, ay - by)
        length = np.sqrt(mx * mx + my * my)
        mx, my = mx / length, my / length
        used = _sweep(ring, used, x, y, r, -ay, ax, mx, my)
        return _sweep(ring, used, x, y, r, mx, my, -by, bx)
    elif stretch <= MITRE_LIMIT:
        used = _put(ring, used, x - k * (ay + by), y + k * (ax + bx))
    return _put(ring, used, x - r * by, y + r * bx)


@inner
def _side(line: F64, n: int, is_closed: bool, is_back: bool, r: float, is_round: bool, ring: F64, used: int) -> int:
    """Append the side of a stroke to the right hand of travel, y down, and the end it runs into; travel may go back."""
    first, step = (n - 1, -1) if is_back else (0, 1)
    ax, ay, a_length = 0.0, 0.0, 0.0
    for place in range(-1 if is_closed else 0, n if is_closed else n - 1):
        here, after = first + step * place, first + step * (place + 1)
        here, after = (here + n) % n, (after + n) % n
        bx, by = line[after, 0] - line[here, 0], line[after, 1] - line[here, 1]
        b_length = np.sqrt(bx * bx + by * by)
        bx, by = bx / b_length, by / b_length
        x, y = line[here, 0], line[here, 1]
        if place >= 1 or (is_closed and place == 0):
            cross, dot = ax * by - ay * bx, ax * bx + ay * by
            reach = min(a_length, b_length)
            used = _corner(ring, used, x, y, r, is_round, cross, dot, reach, ax, ay, bx, by)
        elif place == 0:
            used = _put(ring, used, x - r * by, y + r * bx)
        ax, ay, a_length = bx, by, b_length
    if is_closed:
        return used
    last = first + step * (n - 1)
    x, y = line[last, 0], line[last, 1]
    used = _put(ring, used, x - r * ay, y + r * ax)
    if is_round:
        used = _sweep(ring, used, x, y, r, -ay, ax, ax, ay)
        used = _sweep(ring, used, x, y, r, ax, ay, ay, -ax)
    return used


@inner
def _cut(ring: F64, used: int, clips: F64, first: int, last: int) -> tuple[F64, int]:
    """Cut a ring to a convex polygon (Sutherland and Hodgman 1974). Sides along the rim may be run twice: no matter."""
    area = 0.0
    for k in range(first, last):
        after = k + 1 if k + 1 < last else first
        area += clips[k, 0] * clips[after, 1] - clips[k, 1] * clips[after, 0]
    sign = 1.0 if area > 0.0 else -1.0
    for k in range(first, last):
        to = k + 1 if k + 1 < last else first
        ax, ay = clips[k, 0], clips[k, 1]
        dx, dy = sign * (clips[to, 0] - ax), sign * (clips[to, 1] - ay)
        kept = np.empty((2 * used + 2, 2))
        n = 0
        for row in range(used):
            after = row + 1 if row + 1 < used else 0
            x, y, x2, y2 = ring[row, 0], ring[row, 1], ring[after, 0], ring[after, 1]
            here, there = dx * (y - ay) - dy * (x - ax), dx * (y2 - ay) - dy * (x2 - ax)
            if here >= 0.0:
                n = _put(kept, n, x, y)
            if (here > 0.0 and there < 0.0) or (here < 0.0 and there > 0.0):
                share = here / (here - there)
                n = _put(kept, n, x + share * (x2 - x), y + share * (y2 - y))
        ring, used = kept, n
    return ring, used


@inner
def _emit(edges: F64, n_edges: int, ring: F64, used: int, clips: F64, first: int, last: int) -> tuple[F64, int]:
    """Append the sides of a closed ring as (x0, y0, x1, y1), level ones left out, cut to clips[first:last] if any."""
    if last > first and used > 0:
        ring, used = _cut(ring, used, clips, first, last)
    edges = _with_room(edges, n_edges, used)
    for k in range(used):
        after = k + 1 if k + 1 < used else 0
        if ring[k, 1] != ring[after, 1]:
            edges[n_edges, 0], edges[n_edges, 1] = ring[k, 0], ring[k, 1]
            edges[n_edges, 2], edges[n_edges, 3] = ring[after, 0], ring[after, 1]
            n_edges += 1
    return edges, n_edges


@kernel
def edges_of(
    codes: U8,
    points: F64,
    path_points: I64,
    path_closed: U8,
    mark_paths: I64,
    mark_kind: U8,
    mark_width: F64,
    mark_clip: I32,
    clips: F64,
    clip_points: I64,
    scale: float,
    is_snapped: bool,
) -> tuple[F64, I64]:
    """Edges (n,4) float64 in pixels, and for m marks the rows (m+1,) where those of each begin.

    points (p,2) mm with codes (p,): LINE an end of a straight segment, CUBIC a control point or end of a curve; path k
    owns rows path_points[k] to path_points[k+1], the first being its start; mark k owns paths mark_paths[k] to
    mark_paths[k+1]. mark_width (m,) mm for ROUND and FLAT strokes. mark_clip (m,) row of a convex clip polygon, whose
    points are clips[clip_points[k]:clip_points[k+1]] in pixels, or -1. `scale` is pixels a mm. With `is_snapped` widths
    are whole pixels and level and upright segments lie on the grid.
    """
    edges, line, ring = np.empty((1024, 4)), np.empty((256, 3)), np.empty((256, 2))
    n_edges = 0
    mark_edges = np.zeros(len(mark_kind) + 1, np.int64)
    for mark in range(len(mark_kind)):
        clip = mark_clip[mark]
        first, last = (clip_points[clip], clip_points[clip + 1]) if clip >= 0 else (0, 0)
        is_stroke, is_round = mark_kind[mark] <= FLAT, mark_kind[mark] == ROUND
        n_pixels = max(1, int(np.floor(mark_width[mark] * scale + 0.5)))
        r = n_pixels / 2.0 if is_snapped else mark_width[mark] * scale / 2.0
        n_round = 2 * _steps(r, 0.0) + 4
        for path in range(mark_paths[mark], mark_paths[mark + 1]):
            is_closed = path_closed[path] != 0
            line, n = _chords(codes, points, path_points[path], path_points[path + 1], scale, line)
            if is_closed and n > 1 and abs(line[n - 1, 0] - line[0, 0]) + abs(line[n - 1, 1] - line[0, 1]) <= SAME:
                line[0, 2] = line[n - 1, 2]
                n -= 1
            ring = _with_room(ring, 0, 2 * (n + 2) * n_round)
            if not is_stroke:
                for k in range(n):
                    ring[k, 0], ring[k, 1] = line[k, 0], line[k, 1]
                edges, n_edges = _emit(edges, n_edges, ring, n, clips, first, last)
                continue
            if is_snapped:
                n = _snap(line, n, is_closed, n_pixels)
            is_closed = is_closed and n > 2
            used = 0
            if n == 1 and is_round:
                used = _put(ring, used, line[0, 0] + r, line[0, 1])
                for turn in range(4):
                    ax, ay = COMPASS[turn]
                    used = _sweep(ring, used, line[0, 0], line[0, 1], r, ax, ay, -ay, ax)
            elif n > 1:
                used = _side(line, n, is_closed, False, r, is_round, ring, used)
                if is_closed:
                    edges, n_edges = _emit(edges, n_edges, ring, used, clips, first, last)
                    used = 0
                used = _side(line, n, is_closed, True, r, is_round, ring, used)
            edges, n_edges = _emit(edges, n_edges, ring, used, clips, first, last)
        mark_edges[mark + 1] = n_edges
    return edges[:n_edges].copy(), mark_edges

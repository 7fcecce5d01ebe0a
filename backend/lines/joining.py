"""Pieces of lines joined into chains: each line once, whole, and written with as few curves as it needs.

Ends nearer than a joint are one point; where lines lie one on the other the one that takes precedence stays; pieces of
one class and part run on through the points where two of them meet. No point of a line moves farther than two joints,
and none of `fitting.ERROR` more when curves are written. The result does not depend on the order of the input.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from ..compiled import kernel
from ..contract import F64, LineClass, PatchKind, Style
from ..drawing import Path
from .crossings import goes_on
from .fitting import paths_of
from .imaginary import spaced
from .model import CLASSES, Candidates, Pieces, Tolerance, View, number_of
from .noding import ends_at, near, snapped, sorted_rows, split
from .shade import is_away_from_light

I64: TypeAlias = NDArray[np.int64]
Bools: TypeAlias = NDArray[np.bool_]

PRECEDENCE = (
    LineClass.SECTION_OUTLINE,
    LineClass.VISIBLE_OUTLINE,
    LineClass.THREAD_CREST,
    LineClass.VISIBLE_EDGE,
    LineClass.THREAD_ROOT,
    LineClass.REVOLVED_SECTION,
    LineClass.PART_SEEN_THROUGH,
    LineClass.IMAGINARY_INTERSECTION,
    LineClass.BREAK_LINE,
    LineClass.HIDDEN_OUTLINE,
    LineClass.HIDDEN_EDGE,
    LineClass.CUTTING_PLANE,
    LineClass.CENTRE_LINE,
    LineClass.ADJACENT_PART,
    LineClass.EXTREME_POSITION,
    LineClass.DETAIL_FRAME,
    LineClass.TRACE_LINE,
    LineClass.HATCHING,
    LineClass.SHADING,
    LineClass.LEADER,
    LineClass.DIMENSION,
    LineClass.EXTENSION,
)
"""Which of two lines stays where they coincide, the first first: visible lines, hidden ones, cutting planes, centre
lines, others (the order of ISO 128 from memory; among visible lines the wider one, common practice)."""

HIDDEN_AS = {
    LineClass.VISIBLE_OUTLINE: LineClass.HIDDEN_OUTLINE,
    LineClass.SECTION_OUTLINE: LineClass.HIDDEN_OUTLINE,
    LineClass.VISIBLE_EDGE: LineClass.HIDDEN_EDGE,
    LineClass.THREAD_CREST: LineClass.HIDDEN_EDGE,
    LineClass.THREAD_ROOT: LineClass.HIDDEN_EDGE,
    LineClass.HIDDEN_OUTLINE: LineClass.HIDDEN_OUTLINE,
    LineClass.HIDDEN_EDGE: LineClass.HIDDEN_EDGE,
}
"""The class of what is hidden of a line; hidden stretches of other classes are never drawn. Hidden threads are dashed
for crest and root alike (ISO 6410-1, from memory)."""

_SOLID = PRECEDENCE[:5]  # visible lines of the things themselves
_STRAIGHT = 0.97  # cosine: two lines run on through a point where more meet if they turn less than 14 degrees
_ON_CURVE = 0.5  # the same for two pieces of one smooth curve
_BEHIND = 10.0  # depth tolerances by which a line must be nearer for another to pass behind it


@dataclass(frozen=True, eq=False, slots=True)
class Chain:
    """One line of a drawing, from end to end.

    `path` is mm on the page; `node` a row of the geometry's nodes or -1; `length` mm. `is_shaded` tells an outline on
    the side away from the light. `is_behind` tells of both ends whether the line goes on behind a nearer one there.
    """

    path: Path
    line_class: LineClass
    node: int
    is_visible: bool
    length: float
    is_shaded: bool = False
    is_behind: tuple[bool, bool] = (False, False)


@dataclass(frozen=True, eq=False, slots=True)
class _Lines:
    """Segments between points of the page, each line once.

    points (k,2); ends (s,2) rows of points, the lesser first; row (s,) the piece each comes from; line_class, node,
    curve (s,); is_visible, is_shaded (s,).
    """

    points: F64
    ends: I64
    row: I64
    line_class: I64
    node: I64
    curve: I64
    is_visible: Bools
    is_shaded: Bools


@dataclass(frozen=True, eq=False, slots=True)
class _Walks:
    """Lines strung up: point (m,) rows of points of all chains, first (c+1,), curve (m,) of the segment after each
    point, segment (c,) one of each chain's lines, is_closed (c,)."""

    point: I64
    first: I64
    curve: I64
    segment: I64
    is_closed: Bools


def chains_of(
    pieces: Pieces,
    candidates: Candidates,
    tolerance: Tolerance,
    style: Style,
    *,
    view: View | None = None,
    rank: I64 | None = None,
) -> tuple[Chain, ...]:
    """Join pieces into chains, in the order of `PRECEDENCE`, then of parts, then from the top of the page.

    With `view` edges of curved surfaces are known to be smooth however short they are, and outlines learn their side
    for shade lines. `rank` (n_nodes,) orders parts where two give the same line; without it their rows do.
    Open chains shorter than `tolerance.shortest_mm` that join nothing are left out. Cost: linear, about 0.6
    microseconds a piece.
    """
    lines = _united(pieces, candidates, tolerance, style, view, rank)
    if not len(lines.ends):
        return ()
    walks, is_free = _strung(lines, rank)
    length = _lengths(lines.points[walks.point], walks)
    walks = _taken(walks, ~(is_free & (length < tolerance.shortest_mm)))
    behind = np.zeros((len(walks.segment), 2), bool)
    if style.gap > 0:
        is_cut = goes_on(pieces, candidates, _curves(candidates, view))
        behind = _behind(lines, walks, pieces, is_cut, tolerance, style, view)
    points, first, curve, closed, source = _with_imaginary_spaced(lines, walks)
    paths, lengths = paths_of(points, first, closed, curve)
    segment = walks.segment[source]
    names = [CLASSES[k] for k in lines.line_class[segment].tolist()]
    return tuple(
        Chain(path, name, node, visible, length, shaded, (start, end))
        for path, name, node, visible, length, shaded, (start, end) in zip(
            paths,
            names,
            lines.node[segment].tolist(),
            lines.is_visible[segment].tolist(),
            lengths.tolist(),
            lines.is_shaded[segment].tolist(),
            behind[source].tolist(),
            strict=True,
        )
    )


def _united(
    pieces: Pieces, candidates: Candidates, tolerance: Tolerance, style: Style, view: View | None, rank: I64 | None
) -> _Lines:
    row, line_class = _drawn(pieces, candidates, style)
    segment = pieces.segment.take(row)
    ends_xy = np.concatenate([pieces.start.take(row, 0)[:, :2], pieces.end.take(row, 0)[:, :2]])
    number, points = snapped(ends_xy, tolerance.joint_mm)
    ends = number.reshape(2, -1).T
    is_long = ends[:, 0] != ends[:, 1]
    ends, source = split(np.ascontiguousarray(ends[is_long]), points, tolerance.joint_mm)
    source = np.flatnonzero(is_long).take(source)
    segment, line_class = segment.take(source), line_class.take(source)
    node = candidates.node.take(segment).astype(np.int64)
    curve = _curves(candidates, view).take(segment)
    least, most = ends.min(axis=1), ends.max(axis=1)
    weight = (_precedence(line_class) * (_rank(node, rank).max(initial=0) + 1) + _rank(node, rank)) * 2 + (curve < 0)
    order = sorted_rows(weight)
    key = least * len(points) + most
    order = order.take(sorted_rows(key.take(order)))
    sorted_key = key.take(order)
    one = order[np.concatenate([[True], sorted_key[1:] != sorted_key[:-1]])[: len(order)]]
    shaded = np.zeros(len(one), bool)
    if style.shade_lines and view is not None:
        is_outline = line_class[one] == number_of(LineClass.VISIBLE_OUTLINE)
        shaded[is_outline] = is_away_from_light(view, candidates, segment[one[is_outline]])
    return _Lines(
        points,
        np.column_stack([least[one], most[one]]),
        row[source[one]],
        line_class[one],
        node[one],
        curve[one],
        pieces.is_visible[row[source[one]]],
        shaded,
    )


def _drawn(pieces: Pieces, candidates: Candidates, style: Style) -> tuple[I64, I64]:
    """Rows of the pieces that are drawn, and the class each is drawn in."""
    hidden = np.full(len(CLASSES), -1)
    for seen, unseen in HIDDEN_AS.items():
        hidden[number_of(seen)] = number_of(unseen)
    line_class = candidates.line_class.take(pieces.segment).astype(np.int64)
    line_class = np.where(pieces.is_visible, line_class, hidden[line_class] if style.hidden else -1)
    if not style.tangent:
        line_class[line_class == number_of(LineClass.IMAGINARY_INTERSECTION)] = -1
    row = np.flatnonzero((line_class >= 0) & candidates.is_drawn.take(pieces.segment))
    return row, line_class.take(row)


def _precedence(line_class: I64) -> I64:
    order = np.array([PRECEDENCE.index(name) for name in CLASSES])
    return order.take(line_class)


def _rank(node: I64, rank: I64 | None) -> I64:
    """Numbers from 0 that order parts, 0 for none."""
    if rank is None:
        return node + 1
    return np.concatenate([[0], np.asarray(rank, np.int64) + 1]).take(node + 1)


def _curves(candidates: Candidates, view: View | None) -> I64:
    """The smooth curve each candidate belongs to, -1 for none: its chain, else the pair of surfaces that meet in it.

    Two planes meet in a straight line, which needs none.
    """
    chain = candidates.chain.astype(np.int64)
    if view is None:
        return chain
    patch = np.sort(view.face_patch.take(np.maximum(candidates.faces, 0)).astype(np.int64), axis=1)
    kind = view.geometry.patches.kind.take(patch)
    is_curved = (candidates.faces >= 0).all(axis=1) & (kind != PatchKind.PLANE).any(axis=1)
    pair = patch[:, 0] * len(view.geometry.patches.kind) + patch[:, 1] + chain.max(initial=-1) + 1
    return np.where(chain >= 0, chain, np.where(is_curved, pair, -1))


def _strung(lines: _Lines, rank: I64 | None) -> tuple[_Walks, Bools]:
    """Chains of lines in canonical order, and which of them join nothing."""
    order = _precedence(lines.line_class) * 4 + lines.is_visible * 2 + lines.is_shaded
    parts = _rank(lines.node, rank)
    group = order * (parts.max(initial=0) + 1) + parts
    first_end, at = ends_at(lines.ends, len(lines.points))
    mate = _mates(lines.ends, lines.points, first_end, at, group, lines.curve)
    point, curve, first, segment, closed = _walk(lines.ends, mate, lines.curve)
    walks = _Walks(point, first, curve, segment, closed)
    met = np.diff(first_end).take(point)
    n_segments = np.diff(first) - ~closed
    is_free = np.add.reduceat(met, first[:-1]) == 2 * n_segments
    by_group = sorted_rows(group.take(segment))
    return _taken(walks, by_group), is_free[by_group]


def _taken(walks: _Walks, which: NDArray[np.generic]) -> _Walks:
    """Chosen chains, by rows or by a mask."""
    rows = np.arange(len(walks.segment))[which]
    count = np.diff(walks.first).take(rows)
    first = np.concatenate([[0], np.cumsum(count)])
    at = np.arange(first[-1]) - np.repeat(first[:-1] - walks.first.take(rows), count)
    return _Walks(
        walks.point.take(at), first, walks.curve.take(at), walks.segment.take(rows), walks.is_closed.take(rows)
    )


def _lengths(xy: F64, walks: _Walks) -> F64:
    after = np.arange(1, len(xy) + 1)
    last = walks.first[1:] - 1
    after[last] = np.where(walks.is_closed, walks.first[:-1], last)
    step = xy.take(after, 0) - xy
    return np.add.reduceat(np.sqrt(step[:, 0] * step[:, 0] + step[:, 1] * step[:, 1]), walks.first[:-1])


def _with_imaginary_spaced(lines: _Lines, walks: _Walks) -> tuple[F64, I64, I64, Bools, I64]:
    """Points, first, curve, is_closed of all chains, imaginary lines kept clear of others; the walk each comes from."""
    number = number_of(LineClass.IMAGINARY_INTERSECTION)
    is_imaginary = lines.line_class.take(walks.segment) == number
    source = np.arange(len(walks.segment))
    if not is_imaginary.any():
        return lines.points.take(walks.point, 0), walks.first, walks.curve, walks.is_closed, source
    rows = np.flatnonzero(is_imaginary)
    loose = _taken(walks, rows)
    is_solid = lines.is_visible & np.isin(lines.line_class, [number_of(name) for name in _SOLID])
    solid = lines.points[lines.ends[is_solid]]
    kept = spaced(lines.points.take(loose.point, 0), loose.first, loose.is_closed, solid[:, 0], solid[:, 1])
    before, after = (_taken(walks, part) for part in (source < rows[0], source > rows[-1]))
    curve = np.concatenate(
        [np.full(len(stretch), walks.curve[walks.first[rows[row]]]) for row, stretch in kept] or [np.zeros(0)]
    )
    counts = [np.diff(before.first), np.array([len(stretch) for _, stretch in kept]), np.diff(after.first)]
    return (
        np.concatenate([lines.points[before.point], *(stretch for _, stretch in kept), lines.points[after.point]]),
        np.concatenate([[0], np.cumsum(np.concatenate(counts))]).astype(np.int64),
        np.concatenate([before.curve, curve, after.curve]).astype(np.int64),
        np.concatenate([before.is_closed, np.zeros(len(kept), bool), after.is_closed]),
        np.concatenate([source[: rows[0]], rows[[row for row, _ in kept]], source[rows[-1] + 1 :]]).astype(np.int64),
    )


def _behind(
    lines: _Lines, walks: _Walks, pieces: Pieces, is_cut: Bools, tolerance: Tolerance, style: Style, view: View | None
) -> Bools:
    """Of both ends of each chain: whether it goes on hidden there behind a visible line that is nearer.

    Depth of central projection is -1/distance, so a difference of distance there is one of depth over depth squared.
    """
    last = walks.first[1:] - 1
    ends = np.concatenate([walks.point[walks.first[:-1]], walks.point[last]])
    xy = lines.points.take(ends, 0)
    is_seen = np.flatnonzero(lines.is_visible)
    start, end = lines.points[lines.ends[is_seen, 0]], lines.points[lines.ends[is_seen, 1]]
    line, here = near(xy, start, end, style.narrow / 2)
    own = np.concatenate([walks.segment, walks.segment]).take(here)
    depth = _end_depth(lines, pieces, is_cut, ends, walks)
    other = _depth_at(pieces, lines.row.take(is_seen.take(line)), xy.take(here, 0))
    allowed = np.full(len(here), _BEHIND * tolerance.depth_mm)
    if view is not None and view.projection.kind == "central":
        allowed = allowed * depth.take(here) ** 2
    is_nearer = (other < depth.take(here) - allowed) & (is_seen.take(line) != own)
    result = np.zeros(len(ends), bool)
    result[here[is_nearer]] = True
    result &= ~np.isnan(depth)
    return result.reshape(2, -1).T & ~walks.is_closed[:, None]


def _end_depth(lines: _Lines, pieces: Pieces, is_cut: Bools, ends: I64, walks: _Walks) -> F64:
    """Depth of the lines at the ends of chains that go on hidden, NaN for other ends."""
    segment = _end_segments(lines, walks)
    row = lines.row.take(segment)
    xy = lines.points.take(ends, 0)
    from_start = ((pieces.start.take(row, 0)[:, :2] - xy) ** 2).sum(axis=1)
    from_end = ((pieces.end.take(row, 0)[:, :2] - xy) ** 2).sum(axis=1)
    at_end = from_end < from_start
    depth = np.where(at_end, pieces.end[row, 2], pieces.start[row, 2])
    return np.where(is_cut[row, at_end.astype(np.int64)], depth, np.nan)


def _end_segments(lines: _Lines, walks: _Walks) -> I64:
    """The first and last segment of each chain, all first ones before all last ones."""
    key = lines.ends[:, 0] * len(lines.points) + lines.ends[:, 1]
    last = walks.first[1:] - 1
    a = np.concatenate([walks.point[walks.first[:-1]], walks.point[last]])
    b = np.concatenate([walks.point[walks.first[:-1] + 1], walks.point[last - 1]])
    rows: I64 = np.searchsorted(key, np.minimum(a, b) * len(lines.points) + np.maximum(a, b))
    return rows


def _depth_at(pieces: Pieces, row: I64, xy: F64) -> F64:
    """Depth of pieces at the places nearest to points of the page."""
    start, along = pieces.start.take(row, 0), pieces.end.take(row, 0) - pieces.start.take(row, 0)
    away = xy - start[:, :2]
    square = np.maximum(along[:, 0] ** 2 + along[:, 1] ** 2, 1e-300)
    place = np.clip((away[:, 0] * along[:, 0] + away[:, 1] * along[:, 1]) / square, 0.0, 1.0)
    depth: F64 = start[:, 2] + place * along[:, 2]
    return depth


@kernel
def _mates(ends: I64, points: F64, first: I64, at: I64, group: I64, curve: I64) -> I64:
    """The end that each end goes on to, or -1: the only other of its group, else the straightest."""
    mate = np.full(2 * len(ends), -1)
    for k in range(len(points)):
        low, high = first[k], first[k + 1]
        for i in range(low, high):
            n_same, other = 0, i
            for j in range(low, high):
                if j != i and group[at[j] >> 1] == group[at[i] >> 1]:
                    n_same += 1
                    other = j
                    if n_same > 1:
                        break
            if n_same == 1:
                mate[at[i]] = at[other]
        if high - low < 3 or high - low > 64:
            continue
        while True:
            best, one, two = _STRAIGHT, -1, -1
            for i in range(low, high):
                for j in range(i + 1, high):
                    a, b = at[i], at[j]
                    if mate[a] >= 0 or mate[b] >= 0 or group[a >> 1] != group[b >> 1]:
                        continue
                    p, q = ends[a >> 1, 1 - (a & 1)], ends[b >> 1, 1 - (b & 1)]
                    ax, ay = points[k, 0] - points[p, 0], points[k, 1] - points[p, 1]
                    bx, by = points[q, 0] - points[k, 0], points[q, 1] - points[k, 1]
                    cosine = (ax * bx + ay * by) / np.sqrt((ax * ax + ay * ay) * (bx * bx + by * by))
                    if curve[a >> 1] >= 0 and curve[a >> 1] == curve[b >> 1] and cosine > _ON_CURVE:
                        cosine += 2
                    if cosine > best:
                        best, one, two = cosine, a, b
            if one < 0:
                break
            mate[one], mate[two] = two, one
    return mate


@kernel
def _walk(ends: I64, mate: I64, curve: I64) -> tuple[I64, I64, I64, I64, Bools]:
    """Follow mates: points, curves after them, first point and first segment of each chain, whether it is closed.

    Open chains come first, from the end whose segment is the lower; closed ones begin at their lowest segment.
    """
    n = len(ends)
    point, after = np.empty(2 * n, np.int64), np.full(2 * n, -1)
    first, segment = np.zeros(n + 1, np.int64), np.empty(n, np.int64)
    closed, is_done = np.zeros(n, np.bool_), np.zeros(n, np.bool_)
    n_chains, n_points = 0, 0
    for is_ring in range(2):
        for begin in range(2 * n):
            if is_done[begin >> 1] or (is_ring == 0 and mate[begin] >= 0):
                continue
            segment[n_chains] = begin >> 1
            end = begin
            while True:
                point[n_points], after[n_points] = ends[end >> 1, end & 1], curve[end >> 1]
                n_points += 1
                is_done[end >> 1] = True
                far = end ^ 1
                end = mate[far]
                if end < 0 or end == begin:
                    break
            if is_ring == 0:
                point[n_points] = ends[far >> 1, far & 1]
                n_points += 1
            closed[n_chains] = is_ring == 1
            n_chains += 1
            first[n_chains] = n_points
    return point[:n_points], after[:n_points], first[: n_chains + 1], segment[:n_chains], closed[:n_chains]

"""Paths measured by their length: where their corners are, and any stretch of them as a path of its own.

Arcs stay arcs and cubics stay cubics; only their length is found by steps.
"""

from __future__ import annotations

import math
from bisect import bisect_right
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from ..contract import F64
from ..drawing import Arc, Cubics, Lines, Path, Piece, Point

CORNER = math.cos(math.radians(20.0))
"""Cosine of the least turn that makes a corner."""
_POINT = 1e-9  # mm: a shorter part has no direction
_STEPS = 256  # steps in which a cubic or a quarter of an ellipse is measured: right to 0.001 mm in ordinary ones


@dataclass(frozen=True, slots=True)
class _Segment:
    start: Point
    end: Point


@dataclass(frozen=True, slots=True)
class _Sweep:
    """An arc by its centre: from angle `begin` over `sweep` radians in the measure of the ellipse."""

    centre: Point
    half_axes: tuple[float, float]
    turn: float
    begin: float
    sweep: float

    def at(self, share: float) -> Point:
        cosine, sine = math.cos(math.radians(self.turn)), math.sin(math.radians(self.turn))
        angle = self.begin + self.sweep * share
        u, v = self.half_axes[0] * math.cos(angle), self.half_axes[1] * math.sin(angle)
        return self.centre[0] + u * cosine - v * sine, self.centre[1] + u * sine + v * cosine


@dataclass(frozen=True, eq=False, slots=True)
class _Bezier:
    points: F64  # (4,2)

    def at(self, share: float) -> Point:
        a, b, c, d = self.points.tolist()
        s, t = 1 - share, share
        w = (s * s * s, 3 * s * s * t, 3 * s * t * t, t * t * t)
        x, y = (w[0] * a[k] + w[1] * b[k] + w[2] * c[k] + w[3] * d[k] for k in (0, 1))
        return x, y


_Part: TypeAlias = _Segment | _Sweep | _Bezier


@dataclass(frozen=True, eq=False, slots=True)
class Track:
    """A measured path: its parts, where each begins by length, tables of length over the parts, where corners are.

    `corners` are lengths from the start, 0 and the whole length not among them; `is_corner_at_start` is for closed
    paths.
    """

    parts: tuple[_Part, ...]
    begins: tuple[float, ...]
    tables: tuple[F64 | None, ...]
    length: float
    corners: tuple[float, ...]
    is_closed: bool
    is_corner_at_start: bool

    def stretch(self, low: float, high: float) -> Path:
        """The path between two lengths, low less than high; a closed one may be gone round over its start."""
        if self.is_closed and low < 0:
            low, high = low + self.length, high + self.length
        if self.is_closed and high > self.length + 1e-9:
            if low >= self.length:
                return self.stretch(low - self.length, high - self.length)
            first, second = self.stretch(low, self.length), self.stretch(0.0, high - self.length)
            return Path(first.start, _merged(first.pieces + second.pieces))
        pieces: list[Piece] = []
        start: Point | None = None
        k = max(0, bisect_right(self.begins, low) - 1)
        while k < len(self.parts) and (self.begins[k] < high or start is None):
            end = self.begins[k + 1] if k + 1 < len(self.parts) else self.length
            if end > low or k == len(self.parts) - 1:
                a, b = self._share(k, low), self._share(k, high)
                if start is None:
                    start = _at(self.parts[k], a)
                if b > a:
                    pieces.append(_piece(self.parts[k], a, b))
            k += 1
        assert start is not None
        return Path(start, _merged(tuple(pieces)))

    def _share(self, k: int, place: float) -> float:
        """The parameter of part k at a length of the whole path, from 0 to 1."""
        end = self.begins[k + 1] if k + 1 < len(self.parts) else self.length
        size = end - self.begins[k]
        along = min(max(place - self.begins[k], 0.0), size)
        table = self.tables[k]
        if table is None:
            return along / size
        row = min(max(int(np.searchsorted(table, along, side="right")) - 1, 0), len(table) - 2)
        before, after = float(table[row]), float(table[row + 1])
        return (row + (along - before) / (after - before)) / (len(table) - 1)


def track_of(path: Path) -> Track:
    """Measure a path. Cost: linear in its pieces."""
    measured = [(part, table, _size(part, table)) for part in _parts(path) for table in (_table(part),)]
    long = [row for row in measured if row[2] > _POINT]
    parts, tables, sizes = [row[0] for row in long], [row[1] for row in long], [row[2] for row in long]
    begins = [0.0]
    for size in sizes:
        begins.append(begins[-1] + size)
    turns = [_leaves(a, b) for a, b in zip(parts, parts[1:] + parts[:1], strict=True)]
    corners = tuple(place for place, is_corner in zip(begins[1:-1], turns[:-1], strict=False) if is_corner)
    at_start = bool(parts) and path.is_closed and turns[-1]
    return Track(tuple(parts), tuple(begins[:-1]), tuple(tables), begins[-1], corners, path.is_closed, at_start)


def _parts(path: Path) -> list[_Part]:
    parts: list[_Part] = []
    here = path.start
    for piece in path.pieces:
        match piece:
            case Lines(points):
                for x, y in points.tolist():
                    parts.append(_Segment(here, (x, y)))
                    here = (x, y)
            case Arc():
                if piece.end != here:  # such an arc is left out (SVG 1.1, F.6.2)
                    parts.append(_sweep(here, piece))
                here = piece.end
            case Cubics(points):
                for rows in points.reshape(-1, 3, 2):
                    parts.append(_Bezier(np.concatenate([np.array([here]), rows])))
                    here = (float(rows[2, 0]), float(rows[2, 1]))
    if path.is_closed and here != path.start:
        parts.append(_Segment(here, path.start))
    return parts


def _sweep(start: Point, arc: Arc) -> _Sweep:
    """Centre and angles of an arc from its ends (SVG 1.1, F.6.5); half axes too short are stretched (F.6.6)."""
    cosine, sine = math.cos(math.radians(arc.turn)), math.sin(math.radians(arc.turn))
    dx, dy = (arc.end[0] - start[0]) / 2, (arc.end[1] - start[1]) / 2
    long, short = arc.half_axes
    u, v = (dx * cosine + dy * sine) / long, (dy * cosine - dx * sine) / short
    square = u * u + v * v
    if square > 1:
        stretch = math.sqrt(square)
        long, short, u, v, square = long * stretch, short * stretch, u / stretch, v / stretch, 1.0
    away = math.sqrt(1 / square - 1)
    if arc.is_large == arc.is_clockwise:
        away = -away
    centre_u, centre_v = u - away * v, v + away * u
    begin, end = math.atan2(-centre_v, -centre_u), math.atan2(2 * v - centre_v, 2 * u - centre_u)
    sweep = end - begin
    if arc.is_clockwise and sweep < 0:
        sweep += 2 * math.pi
    elif not arc.is_clockwise and sweep > 0:
        sweep -= 2 * math.pi
    x, y = centre_u * long, centre_v * short
    centre = start[0] + x * cosine - y * sine, start[1] + x * sine + y * cosine
    return _Sweep(centre, (long, short), arc.turn, begin, sweep)


def _at(part: _Part, share: float) -> Point:
    if isinstance(part, _Segment):
        (ax, ay), (bx, by) = part.start, part.end
        return ax + (bx - ax) * share, ay + (by - ay) * share
    return part.at(share)


def _piece(part: _Part, low: float, high: float) -> Piece:
    """A part from one parameter to another; a cubic by de Casteljau's construction."""
    if isinstance(part, _Segment):
        return Lines(np.array([_at(part, high)]))
    if isinstance(part, _Sweep):
        sweep = part.sweep * (high - low)
        return Arc(part.half_axes, part.turn, abs(sweep) > math.pi, sweep > 0, part.at(high))
    points = part.points
    points = _halved(points, high)[0]
    return Cubics(_halved(points, low / high)[1][1:])


def _halved(points: F64, share: float) -> tuple[F64, F64]:
    rows = [points]
    while len(rows[-1]) > 1:
        rows.append(rows[-1][:-1] * (1 - share) + rows[-1][1:] * share)
    return np.array([row[0] for row in rows]), np.array([row[-1] for row in reversed(rows)])


def _table(part: _Part) -> F64 | None:
    """Length up to equal steps of the parameter, None where the two go together."""
    if isinstance(part, _Segment) or (isinstance(part, _Sweep) and part.half_axes[0] == part.half_axes[1]):
        return None
    points = _sampled(part)
    step = np.diff(points, axis=0)
    return np.concatenate([[0.0], np.cumsum(np.sqrt(step[:, 0] ** 2 + step[:, 1] ** 2))])


def _sampled(part: _Sweep | _Bezier) -> F64:
    """Points of a curve at equal steps of its parameter; of an arc in its own axes."""
    if isinstance(part, _Sweep):
        quarters = max(1, math.ceil(abs(part.sweep) / (math.pi / 2)))
        angle = part.begin + part.sweep * np.linspace(0.0, 1.0, quarters * _STEPS + 1)
        return np.column_stack([part.half_axes[0] * np.cos(angle), part.half_axes[1] * np.sin(angle)])
    t = np.linspace(0.0, 1.0, _STEPS + 1)[:, None]
    s = 1 - t
    a, b, c, d = part.points
    points: F64 = s * s * s * a + 3 * s * s * t * b + 3 * s * t * t * c + t * t * t * d
    return points


def _size(part: _Part, table: F64 | None) -> float:
    if table is not None:
        return float(table[-1])
    if isinstance(part, _Segment):
        return math.hypot(part.end[0] - part.start[0], part.end[1] - part.start[1])
    assert isinstance(part, _Sweep)
    return part.half_axes[0] * abs(part.sweep)


def _leaves(before: _Part, after: _Part) -> bool:
    """Whether a part goes off from the one before it at a corner."""
    ax, ay = _direction(before, is_end=True)
    bx, by = _direction(after, is_end=False)
    return ax * bx + ay * by < CORNER * math.hypot(ax, ay) * math.hypot(bx, by)


def _direction(part: _Part, is_end: bool) -> Point:
    low, high = (1 - 1e-4, 1.0) if is_end else (0.0, 1e-4)
    (ax, ay), (bx, by) = _at(part, low), _at(part, high)
    return bx - ax, by - ay


def _merged(pieces: tuple[Piece, ...]) -> tuple[Piece, ...]:
    """Neighbours of one kind in one piece."""
    merged: list[Piece] = []
    for piece in pieces:
        last = merged[-1] if merged else None
        if isinstance(piece, Lines) and isinstance(last, Lines):
            merged[-1] = Lines(np.concatenate([last.points, piece.points]))
        elif isinstance(piece, Cubics) and isinstance(last, Cubics):
            merged[-1] = Cubics(np.concatenate([last.points, piece.points]))
        else:
            merged.append(piece)
    return tuple(merged)

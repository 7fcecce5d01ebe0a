"""Exploded views: how far every placed thing is moved, and the lines that trace the way it came."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from msgspec import Struct
from platewright.backend.contract import F64, U8, Emphasis, Geometry, LineClass, SpaceCurve

from .flatten import moved as placed_point
from .graph import Assembly, Entry, Point
from .solids.recipe import Affine

PARALLEL = 1e-6
"""An axis lies along a way where the sine of the angle between them is below this."""

_NEAR_MM = 1e3
"""Feet are compared in metres to six decimals: to a thousandth of a millimetre."""


class Move(Struct, frozen=True):
    """One thing moved by itself, besides what moves with all that holds it.

    `row` and `parent` are rows of the tree, `way` is in world mm. `through` are world points, before the move, of those
    marks of the thing whose axes lie along the way.
    """

    row: int
    parent: int
    way: Point
    through: tuple[Point, ...] = ()


class Explosion(Struct, frozen=True, eq=False):
    """How an exploded figure moves its subject.

    `shifts` (n,3) float64 are world mm for each entry of the walked tree, nested ones added, `rows` its rows by path;
    `moves` are those of which each adds to what holds it.
    """

    shifts: F64
    moves: tuple[Move, ...]
    rows: dict[str, int]

    def carry(self, point: Point, path: str) -> Point:
        """Where a point of what goes by a path comes to."""
        x, y, z = (float(a + b) for a, b in zip(point, self.shifts[self.rows[path]], strict=True))
        return (x, y, z)


def explode(entries: Sequence[Entry], factor: float) -> Explosion:
    """Move everything by `factor` times its `explodes`. Cost: linear in the entries."""
    shifts = np.zeros((len(entries), 3))
    ways = [_ways(entry, factor) for entry in entries]
    moves: list[Move] = []
    for row, entry in enumerate(entries[1:], 1):
        way = next(ways[entry.parent])
        shifts[row] = shifts[entry.parent] + way
        if any(way):
            moves.append(Move(row, entry.parent, way, tuple(_marked(entry, way))))
    return Explosion(shifts, tuple(moves), {entry.path: row for row, entry in enumerate(entries)})


def _ways(entry: Entry, factor: float) -> Iterator[Point]:
    """World moves of what an assembly places, in the order of a walk."""
    if not isinstance(entry.thing, Assembly):
        return
    for occurrence in entry.thing.occurrences:
        for vector in occurrence.explodes:
            x, y, z = _turned(entry.placement, vector)
            yield (factor * x, factor * y, factor * z)


def _marked(entry: Entry, way: Point) -> Iterator[Point]:
    for mark in entry.thing.marks:
        if mark.axis is not None and _is_along(np.array(_turned(entry.placement, mark.axis)), np.array(way)):
            yield placed_point(entry.placement, mark.point)


def _turned(placement: Affine, vector: Point) -> Point:
    x, y, z = (row[0] * vector[0] + row[1] * vector[1] + row[2] * vector[2] for row in placement)
    return (x, y, z)


def moved(geometry: Geometry, shifts: F64) -> F64:
    """World vertices (n,3) with every node's shift added."""
    counts = [node.vertex_range[1] - node.vertex_range[0] for node in geometry.nodes]
    return np.asarray(geometry.vertices + np.repeat(shifts, counts, axis=0))


def trace_lines(explosion: Explosion, geometry: Geometry, emphasis: U8 | None) -> tuple[SpaceCurve, ...]:
    """The way each moved thing came, where it now stands: from where it sat to where it is.

    A line runs through every mark of the thing that has an axis along the way; where there is none, along the axis
    through its origin, or through its middle where that axis misses it, between the ends that lie behind in the motion.
    What is hidden, or cut away, has none. Lines that lie on each other become one.
    """
    found: list[tuple[int, F64, F64]] = []
    last = _last_below(geometry)
    for move in explosion.moves:
        if emphasis is not None and emphasis[move.row] == Emphasis.HIDE:
            continue
        span = geometry.nodes[move.row].vertex_range[0], geometry.nodes[last[move.row]].vertex_range[1]
        own = geometry.vertices[span[0] : span[1]]
        if not len(own):
            continue
        way = np.array(move.way)
        for start in _starts(geometry, move, own, way / np.sqrt(float(way @ way))):
            foot = start + explosion.shifts[move.parent]
            found.append((move.row, foot, foot + way))
    return tuple(SpaceCurve(np.stack((start, end)), LineClass.TRACE_LINE, node) for node, start, end in _joined(found))


def _last_below(geometry: Geometry) -> list[int]:
    """For each node the last row of it and all below it; rows below a node follow it without a gap."""
    last = list(range(len(geometry.nodes)))
    for row in range(len(last) - 1, 0, -1):
        parent = geometry.nodes[row].parent
        last[parent] = max(last[parent], last[row])
    return last


def _starts(geometry: Geometry, move: Move, own: F64, along: F64) -> list[F64]:
    """Where the traces of one thing begin before it is moved: world points."""
    node = geometry.nodes[move.row]
    if move.through:
        return [np.array(point) for point in move.through]
    behind = float((own @ along).min())
    low, high = own.min(axis=0), own.max(axis=0)
    for through in (node.placement[:3, 3], (low + high) / 2):
        foot = through + (behind - float(through @ along)) * along
        if _passes(foot, along, low, high):
            return [foot]
    return [foot]


def _is_along(axis: F64, along: F64) -> bool:
    across = np.cross(axis, along)
    return float(across @ across) < PARALLEL**2 * float(axis @ axis) * float(along @ along)


def _passes(through: F64, along: F64, low: F64, high: F64) -> bool:
    """Whether a line meets a box (slabs), with a little room."""
    enters, leaves = -np.inf, np.inf
    room = 1e-9 * (1.0 + float(np.abs(high - low).max()))
    for k in range(3):
        if abs(along[k]) < 1e-12:
            if not low[k] - room <= through[k] <= high[k] + room:
                return False
            continue
        first, second = (low[k] - room - through[k]) / along[k], (high[k] + room - through[k]) / along[k]
        enters, leaves = max(enters, min(first, second)), min(leaves, max(first, second))
    return bool(enters <= leaves)


def _joined(lines: Sequence[tuple[int, F64, F64]]) -> list[tuple[int, F64, F64]]:
    """Lines of which those that overlap on one straight line have become one, under the first of their nodes."""
    groups: dict[tuple[float, ...], list[tuple[float, float, int]]] = {}
    origins: dict[tuple[float, ...], tuple[F64, F64]] = {}
    for node, start, end in lines:
        way = end - start
        along = way / np.sqrt(float(way @ way))
        if tuple(along) < tuple(-along):
            along = -along
        foot = start - float(start @ along) * along
        key = tuple(float(each) + 0.0 for each in np.round(np.concatenate((along, foot / _NEAR_MM)), 6))
        origins.setdefault(key, (foot, along))
        a, b = sorted((float(start @ along), float(end @ along)))
        groups.setdefault(key, []).append((a, b, node))
    found: list[tuple[int, F64, F64]] = []
    for key, stretches in groups.items():
        foot, along = origins[key]
        for low, high, node in _union(stretches):
            found.append((node, foot + low * along, foot + high * along))
    return sorted(found, key=lambda line: line[0])


def _union(stretches: list[tuple[float, float, int]]) -> Iterator[tuple[float, float, int]]:
    merged: list[tuple[float, float, int]] = []
    for low, high, node in sorted(stretches):
        if merged and low <= merged[-1][1] + 1e-9:
            before = merged.pop()
            merged.append((before[0], max(before[1], high), min(before[2], node)))
        else:
            merged.append((low, high, node))
    yield from merged

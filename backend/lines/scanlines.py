"""Stretches of equally spaced parallel lines inside polygons, by the even-odd rule."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from ..contract import F64

I64 = NDArray[np.int64]


def stretches(
    rings: Sequence[F64], holes: Sequence[F64], angle: float, pitch: float, offset: float = 0.0
) -> tuple[I64, F64]:
    """Return what of lines at `angle` degrees (45 rises to the right) lies inside the rings and in none of the holes.

    The lines are `pitch` apart, line 0 `offset` from the page's left top corner; positions therefore do not depend on
    the polygons. Returns row (s,) int64 and ends (s,4) float64, x0 y0 x1 y1 in mm. For the rest see `spans`.
    """
    turn = math.radians(angle)
    along, across = np.array([math.cos(turn), -math.sin(turn)]), np.array([math.sin(turn), math.cos(turn)])
    low, high = rings[0].min(axis=0), rings[0].max(axis=0)
    near = [ring for ring in holes if (ring.max(axis=0) > low).all() and (ring.min(axis=0) < high).all()]

    def turned(ring: F64) -> F64:
        # Sums spelt out, as matrix products differ between machines.
        return np.stack([ring[:, 0] * axis[0] + ring[:, 1] * axis[1] for axis in (along, across)], axis=1)

    row, start, end = spans([turned(ring) for ring in rings], [turned(ring) for ring in near], pitch, offset)
    height = (offset + row * pitch)[:, None] * across
    return row, np.concatenate([start[:, None] * along + height, end[:, None] * along + height], axis=1)


def spans(rings: Sequence[F64], holes: Sequence[F64], pitch: float, offset: float) -> tuple[I64, F64, F64]:
    """Return where lines y = offset + row * pitch lie inside the rings taken together and in none of the holes.

    rings, holes: closed polygons (k,2) float64, x along the lines; the rings count by the even-odd rule, each hole
    alone. Returns row (s,) int64, ascending, and start, end (s,) float64 along x. A side holds its lower end and not
    its upper one, so that a line through a corner is crossed once. Cost: linear in the crossings, and their sorting.
    """
    found = [_crossings(ring, pitch, offset, k) for k, ring in ((0, ring) for ring in rings)]
    found += [_crossings(ring, pitch, offset, 1 + k) for k, ring in enumerate(holes)]
    row, x, of = (np.concatenate(columns) for columns in zip(*found, strict=True))
    order = np.lexsort((of, x, row))
    row, x, of = row[order], x[order], of[order]
    inside = _parity(of == 0)
    n_holes_inside = sum((_parity(of == 1 + k).astype(np.int64) for k in range(len(holes))), np.zeros(len(row)))
    kept = np.flatnonzero((inside & (n_holes_inside == 0))[:-1] & (row[:-1] == row[1:]))
    return row[kept], x[kept], x[kept + 1]


def _parity(is_counted: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Whether an odd number of the counted crossings stand at or before each one in its row.

    A closed polygon is crossed an even number of times by a line, so the count may run on through the rows.
    """
    return np.asarray(np.cumsum(is_counted) % 2 == 1)


def _crossings(ring: F64, pitch: float, offset: float, of: int) -> tuple[I64, F64, I64]:
    """Rows and places along them at which a ring is crossed."""
    following = np.roll(ring, -1, axis=0)
    is_down = following[:, 1] < ring[:, 1]
    low, high = np.where(is_down[:, None], following, ring), np.where(is_down[:, None], ring, following)
    first = np.ceil((low[:, 1] - offset) / pitch).astype(np.int64)
    count = np.ceil((high[:, 1] - offset) / pitch).astype(np.int64) - first
    side = np.repeat(np.arange(len(ring)), count)
    row = np.arange(len(side)) - np.repeat(np.cumsum(count) - count, count) + first[side]
    share = (offset + row * pitch - low[side, 1]) / (high[side, 1] - low[side, 1])
    x = low[side, 0] + (high[side, 0] - low[side, 0]) * np.clip(share, 0.0, 1.0)
    return row, x, np.full(len(row), of, np.int64)

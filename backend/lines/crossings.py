"""Where a line goes on unseen after its visible end: there it passes behind what ends it."""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from .model import Candidates, Pieces

I64: TypeAlias = NDArray[np.int64]
Bools: TypeAlias = NDArray[np.bool_]

_RUN = 0.3  # mm: a line that is hidden for less than this does not pass behind anything, it ends there


def goes_on(pieces: Pieces, candidates: Candidates, curve: I64) -> Bools:
    """Of both ends of each piece (p,2): whether the line goes on hidden there for long.

    That is by a hidden piece of some length of the same candidate, or by a short one that another hidden piece of the
    same smooth curve follows, as `curve` (s,) numbers them. Cost: linear, but for the sorting of hidden ends.
    """
    segment = pieces.segment.astype(np.int64)
    along = (pieces.end - pieces.start)[:, :2]
    is_long = along[:, 0] ** 2 + along[:, 1] ** 2 >= _RUN * _RUN
    is_hidden = ~pieces.is_visible
    result = np.zeros((len(segment), 2), bool)
    shared = _shared(pieces, candidates, curve)
    for side, step in ((0, -1), (1, 1)):
        after = np.clip(np.arange(len(segment)) + step, 0, len(segment) - 1)
        is_next = (segment.take(after) == segment) & is_hidden.take(after) & (after != np.arange(len(segment)))
        follows = is_hidden.take(after) & (curve.take(segment.take(after)) == curve.take(segment))
        follows &= curve.take(segment) >= 0
        on = is_long | (_touches(pieces, side) & (follows | shared[:, side]))
        result[:, side] = is_next & on.take(after)
    return result


def _touches(pieces: Pieces, side: int) -> Bools:
    """Whether pieces reach that end of their candidate."""
    return pieces.span[:, 1] >= 1 if side else pieces.span[:, 0] <= 0


def _shared(pieces: Pieces, candidates: Candidates, curve: I64) -> Bools:
    """Whether another hidden piece of the same curve reaches the vertex at each end of each piece."""
    vertex = candidates.vertices.take(pieces.segment, 0).astype(np.int64)
    own = curve.take(pieces.segment)[:, None]
    key = vertex * (curve.max(initial=0) + 1) + own
    reaches = np.column_stack([_touches(pieces, 0), _touches(pieces, 1)]) & (vertex >= 0) & (own >= 0)
    reaches &= ~pieces.is_visible[:, None]
    values, counts = np.unique(key[reaches], return_counts=True)
    often = values[counts > 1]
    place = np.minimum(np.searchsorted(often, key), max(len(often) - 1, 0))
    if not len(often):
        return np.zeros(key.shape, bool)
    result: Bools = reaches & (often[place] == key)
    return result

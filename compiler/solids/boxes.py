"""Which boxes meet: a tree of boxes held against itself, level by level."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]
Mask = NDArray[np.bool_]

_LEAF = 8
_BLOCK = 200_000
"""Pairs judged together."""


def meeting(low: F64, high: F64) -> Iterator[tuple[I64, I64]]:
    """Blocks of pairs (k,), (k,) of rows of boxes, corners low and high (n,3), that meet or touch; each pair once.

    Cost: of the order of n log n and the pairs found, for boxes that are not all in one place.
    """
    order = _in_space((low + high) / 2.0)
    low, high = low[order], high[order]
    pairs = _runs(low, high, None)
    assert pairs is not None
    for one, other in _within(low, high, pairs):
        yield order[one], order[other]


def meeting_at_most(low: F64, high: F64, most: int) -> tuple[I64, I64] | None:
    """All pairs as `meeting` finds them; None where about `most` are too few to hold them."""
    order = _in_space((low + high) / 2.0)
    low, high = low[order], high[order]
    pairs = _runs(low, high, most)
    found: list[tuple[I64, I64]] = []
    for one, other in _within(low, high, pairs) if pairs is not None else ():
        found.append((order[one], order[other]))
        most -= len(one)
        if most < 0:
            return None
    if pairs is None:
        return None
    none = np.zeros(0, np.int64)
    return np.concatenate([none, *(one for one, _ in found)]), np.concatenate([none, *(other for _, other in found)])


def _runs(low: F64, high: F64, most: int | None) -> I64 | None:
    """Pairs (k,2) of runs of `_LEAF` boxes that meet; None where more than `most` would have to be kept."""
    leaves = 1 << (max(0, len(low) - 1) // _LEAF).bit_length()
    levels = [_boxes(low, high, leaves)]
    while len(levels[-1][0]) > 1:
        levels.append((levels[-1][0].reshape(-1, 2, 3).min(axis=1), levels[-1][1].reshape(-1, 2, 3).max(axis=1)))
    pairs = np.zeros((1, 2), np.int64)
    for level_low, level_high in levels[-2::-1]:
        first, second = pairs[:, 0], pairs[:, 1]
        pairs = np.concatenate([np.stack((2 * first + i, 2 * second + j), 1) for i in (0, 1) for j in (0, 1)])
        pairs = pairs[pairs[:, 0] <= pairs[:, 1]]
        pairs = pairs[_overlap(level_low, level_high, pairs[:, 0], pairs[:, 1])]
        if most is not None and len(pairs) > most:
            return None
    return pairs


def _within(low: F64, high: F64, pairs: I64) -> Iterator[tuple[I64, I64]]:
    """The boxes that meet in pairs of runs, block by block."""
    i, j = (each.ravel() for each in np.meshgrid(np.arange(_LEAF), np.arange(_LEAF), indexing="ij"))
    step = max(1, _BLOCK // len(i))
    for start in range(0, len(pairs), step):
        some = pairs[start : start + step] * _LEAF
        one, other = (some[:, :1] + i).ravel(), (some[:, 1:] + j).ravel()
        there = (one < other) & (other < len(low))
        one, other = one[there], other[there]
        meet = _overlap(low, high, one, other)
        yield one[meet], other[meet]


def _in_space(middle: F64) -> I64:
    """Rows of points (n,3) in the order of a curve that fills space (Morton), so that neighbours stay together."""
    low, size = middle.min(axis=0), float(np.ptp(middle, axis=0).max())
    cell = ((middle - low) / (size if size > 0.0 else 1.0) * 1023.0).astype(np.int64)
    code = np.zeros(len(cell), np.int64)
    for bit in range(10):
        for axis in range(3):
            code |= ((cell[:, axis] >> bit) & 1) << (3 * bit + axis)
    return np.argsort(code, kind="stable")


def _boxes(low: F64, high: F64, leaves: int) -> tuple[F64, F64]:
    """Boxes of runs of `_LEAF` boxes; empty ones, which meet nothing, to fill up."""
    lows, highs = np.full((leaves * _LEAF, 3), np.inf), np.full((leaves * _LEAF, 3), -np.inf)
    lows[: len(low)], highs[: len(high)] = low, high
    return lows.reshape(leaves, _LEAF, 3).min(axis=1), highs.reshape(leaves, _LEAF, 3).max(axis=1)


def _overlap(low: F64, high: F64, one: I64, other: I64) -> Mask:
    meets = np.ones(len(one), np.bool_)
    for axis in range(3):
        below, above = low[:, axis], high[:, axis]
        meets &= (below[one] <= above[other]) & (below[other] <= above[one])
    return meets

"""Flush faces: heights that differ by rounding alone are made one, so that flush shapes touch.

0.1 + 0.2 and 0.3 differ in the last digit, and two solids with such a gap between them would not join. Of every plane
square to an axis of the frame the height is compared with those of the others; heights within `TOGETHER` of the size
of the part become one number, a decimal of six places if there is one among them.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from .surfaces import Surfaces

F64 = NDArray[np.float64]

TOGETHER = 1e-14
"""Heights are one if they differ by less than this part of the largest coordinate, 45 units in the last place."""
_SQUARE = 1e-14


def axis_planes(surfaces: Surfaces) -> F64:
    """Normal and a point, (k,6), of every plane among the surfaces, whichever way it looks."""
    affine = surfaces.affine[surfaces.kind == PatchKind.PLANE]
    normal = np.cross(affine[:, :, 0], affine[:, :, 1])
    return np.concatenate((normal, affine[:, :, 3]), axis=1)


def placed_heights(planes: F64, placements: F64) -> tuple[F64, NDArray[np.int64], NDArray[np.bool_]]:
    """Planes (k,6) under placements (n,3,4): heights (n,k) mm, the axis (n,k) that each is square to or -1, and
    whether it is square without any residue (n,k).
    """
    linear, shift = placements[:, None, :, :3], placements[:, None, :, 3]
    # Normals turn with the cofactors: the cross products of the rows.
    cofactor = np.cross(np.roll(linear, -1, axis=2), np.roll(linear, -2, axis=2))
    normal = (cofactor * planes[None, :, None, :3]).sum(axis=3)
    normal /= np.maximum(np.abs(normal).max(axis=2, keepdims=True), 1e-300)
    axis = np.abs(normal).argmax(axis=2)
    off = np.abs(normal)
    np.put_along_axis(off, axis[..., None], 0.0, axis=2)
    residue = off.max(axis=2, initial=0.0)
    x, y, z = (planes[None, :, None, k] for k in (3, 4, 5))
    point = linear[..., 0] * x + linear[..., 1] * y + linear[..., 2] * z + shift
    heights = np.take_along_axis(point, axis[..., None], axis=2)[..., 0]
    return heights, np.where(residue <= _SQUARE, axis, -1), residue == 0.0


class Levels:
    """The heights in use along each axis of one frame, those that differ by rounding made one."""

    def __init__(self, groups: Sequence[tuple[F64, F64]]) -> None:
        """`groups` are planes (k,6) and the placements (n,3,4) of the body that has them. Cost: a sort of heights."""
        self._found = [placed_heights(planes, placements) for planes, placements in groups]
        largest = [np.abs(heights[axis >= 0]).max(initial=0.0) for heights, axis, _ in self._found]
        self._tolerance = TOGETHER * max(largest, default=0.0)
        self._by_axis = [
            self._together(np.concatenate([h[axis == k] for h, axis, _ in self._found] or [np.zeros(0)]))
            for k in range(3)
        ]

    def to_correct(self, group: int) -> NDArray[np.bool_]:
        """Which placements (n,) of a group put a plane beside its level."""
        heights, axis, exact = self._found[group]
        wrong = (axis >= 0) & ~exact
        for k in range(3):
            wrong |= (axis == k) & (self._nearest(k, heights) != heights)
        return np.asarray(wrong.any(axis=1))

    def correct(self, points: F64) -> F64:
        """Points (n,3) with every coordinate that is a rounding error off a level set to it."""
        return np.column_stack([self._nearest(k, points[:, k]) for k in range(3)])

    def planes(self) -> F64:
        """One plane (k,6) for every level, for the frame outside."""
        rows = [np.concatenate((np.eye(3)[k], np.eye(3)[k] * h)) for k in range(3) for h in self._by_axis[k]]
        return np.array(rows).reshape(-1, 6)

    def _together(self, heights: F64) -> F64:
        ordered = np.unique(heights)
        if not len(ordered):
            return ordered
        starts = np.flatnonzero(np.diff(ordered, prepend=-np.inf) > self._tolerance)
        decimal = np.round(ordered, 6) + 0.0
        near = np.abs(decimal - ordered) <= self._tolerance
        levels = ordered[starts]
        cluster = np.cumsum(np.diff(ordered, prepend=-np.inf) > self._tolerance) - 1
        levels[cluster[near]] = decimal[near]
        return levels

    def _nearest(self, axis: int, values: F64) -> F64:
        levels = self._by_axis[axis]
        if not len(levels):
            return values
        above = (
            np.searchsorted(levels, values).clip(1, len(levels) - 1) if len(levels) > 1 else np.zeros(values.shape, int)
        )
        best = levels[above]
        if len(levels) > 1:
            below = levels[above - 1]
            best = np.where(np.abs(values - below) < np.abs(values - best), below, best)
        # Twice the tolerance, because a level may be a decimal outside its cluster.
        return np.where(np.abs(values - best) <= 2.0 * self._tolerance, best, values)

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
    """Planes (k,6), each under a placement (k,3,4): heights (k,) mm, the axis (k,) that each is square to or -1, and
    whether it is square without any residue (k,).
    """
    n = [planes[:, k] for k in range(3)]
    # Normals turn with the cofactors: the cross products of the rows.
    a = [[placements[:, i, k] for k in range(3)] for i in range(3)]
    normal = np.empty((len(planes), 3))
    point = np.empty((len(planes), 3))
    for i in range(3):
        b, c = a[(i + 1) % 3], a[(i + 2) % 3]
        x, y, z = (b[(k + 1) % 3] * c[(k + 2) % 3] - b[(k + 2) % 3] * c[(k + 1) % 3] for k in range(3))
        normal[:, i] = x * n[0] + y * n[1] + z * n[2]
        point[:, i] = a[i][0] * planes[:, 3] + a[i][1] * planes[:, 4] + a[i][2] * planes[:, 5] + placements[:, i, 3]
    off = np.abs(normal)
    off /= np.maximum(off.max(axis=1, initial=0.0), 1e-300)[:, None]
    axis = off.argmax(axis=1)
    here = np.arange(len(planes))
    off[here, axis] = 0.0
    residue = off.max(axis=1, initial=0.0)
    return point[here, axis], np.where(residue <= _SQUARE, axis, -1), residue == 0.0


class Levels:
    """The heights in use along each axis of one frame, those that differ by rounding made one."""

    def __init__(self, groups: Sequence[tuple[F64, F64]]) -> None:
        """`groups` are planes (k,6) and the placements (n,3,4) of the body that has them. Cost: a sort of heights."""
        self._shapes = [(len(placements), len(planes)) for planes, placements in groups]
        self._starts = [0]
        for n, k in self._shapes:
            self._starts.append(self._starts[-1] + n * k)
        planes = [np.tile(planes, (len(placements), 1)) for planes, placements in groups]
        placed = [placements.repeat(len(planes), axis=0) for planes, placements in groups]
        heights, axis, exact = placed_heights(
            np.concatenate([np.zeros((0, 6)), *planes]), np.concatenate([np.zeros((0, 3, 4)), *placed])
        )
        self._tolerance = TOGETHER * float(np.abs(heights[axis >= 0]).max(initial=0.0))
        self._by_axis = [self._together(heights[axis == k]) for k in range(3)]
        self._is_off = (axis >= 0) & ~exact
        for k in range(3):
            self._is_off |= (axis == k) & (self._nearest(k, heights) != heights)

    def to_correct(self, group: int) -> NDArray[np.bool_]:
        """Which placements (n,) of a group put a plane beside its level."""
        is_off = self._is_off[self._starts[group] : self._starts[group + 1]]
        return np.asarray(is_off.reshape(self._shapes[group]).any(axis=1))

    def correct(self, points: F64) -> F64:
        """Points (n,3) with every coordinate that is a rounding error off a level set to it."""
        return np.column_stack([self._nearest(k, points[:, k]) for k in range(3)])

    def planes(self) -> F64:
        """One plane (k,6) for every level, for the frame outside."""
        rows = [np.concatenate((np.eye(3)[k], np.eye(3)[k] * h)) for k in range(3) for h in self._by_axis[k]]
        return np.array(rows).reshape(-1, 6)

    def _together(self, heights: F64) -> F64:
        ordered = np.sort(heights)
        is_start = np.ones(len(ordered), np.bool_)
        is_start[1:] = ordered[1:] - ordered[:-1] > self._tolerance
        decimal = np.round(ordered, 6) + 0.0
        near = np.abs(decimal - ordered) <= self._tolerance
        levels = ordered[is_start]
        cluster = np.cumsum(is_start) - 1
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

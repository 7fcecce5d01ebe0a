"""Where the wall of a cylinder, or a face cut along its axis, is really there: holes, cuts and ends left out."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..contract import F64, I32
from .model import Bools, View
from .segments import dot

_TOUCH = 1e-9


@dataclass(frozen=True, eq=False, slots=True)
class Wall:
    """Triangles near an axis: corners (f,3,3) mm from `origin`, heights (f,3) along the unit `axis`."""

    origin: F64
    axis: F64
    corners: F64
    heights: F64


def wall(view: View, faces: I32, origin: F64, axis: F64) -> Wall:
    """The triangles of view faces, seen from a point on an axis."""
    corners = view.world[view.faces[faces]] - origin
    return Wall(origin, axis, corners, dot(corners, axis))


def along_wall(of: Wall, direction: F64) -> F64:
    """Stretches (k,2) of heights at which a wall stands in a direction, a unit vector across its axis; in order."""
    beside = dot(of.corners, np.cross(of.axis, direction))
    return _stretches(beside, of.heights, dot(of.corners, direction))


def along_face(of: Wall, across: F64, offset: float) -> F64:
    """Stretches (k,2) of heights at which a flat face along the axis is crossed by the line beside it at `offset` mm in
    the unit direction `across`, in order.
    """
    beside = dot(of.corners, across) - offset
    return _stretches(beside, of.heights, np.ones_like(beside))


def _stretches(beside: F64, heights: F64, ahead: F64) -> F64:
    """Where triangles are crossed by the plane beside = 0, ahead of the axis, as heights, joined where they touch."""
    if not len(beside):
        return np.empty((0, 2))
    size = max(float(np.abs(beside).max()), float(np.abs(heights).max()))
    beside = np.where(np.abs(beside) <= _TOUCH * size, 0.0, beside)
    is_out = beside >= 0.0
    n_out = is_out.sum(axis=1)
    rows = np.flatnonzero((n_out == 1) | (n_out == 2))
    odd = np.argmax(is_out[rows] == (n_out[rows] == 1)[:, None], axis=1)
    found, front = [], np.zeros(len(rows))
    for step in (1, 2):
        other = (odd + step) % 3
        share = beside[rows, odd] / (beside[rows, odd] - beside[rows, other])
        found.append(heights[rows, odd] + share * (heights[rows, other] - heights[rows, odd]))
        front += ahead[rows, odd] + share * (ahead[rows, other] - ahead[rows, odd])
    ends = np.sort(np.stack(found, axis=1), axis=1)[front > 0.0]
    return joined_stretches(ends[ends[:, 1] - ends[:, 0] > _TOUCH * size], 1e-6 * size)


def joined_stretches(stretches: F64, gap: float) -> F64:
    """The union of stretches (k,2), those no further apart than `gap` as one, in order."""
    if not len(stretches):
        return stretches
    ordered = stretches[np.lexsort((stretches[:, 1], stretches[:, 0]))]
    reach = np.maximum.accumulate(ordered[:, 1])
    first = np.concatenate(([True], ordered[1:, 0] > reach[:-1] + gap))
    last = np.append(np.flatnonzero(first)[1:], len(ordered)) - 1
    return np.stack((ordered[first, 0], reach[last]), axis=1)


def is_covered(of: Wall, directions: F64, low: float, high: float) -> Bools:
    """Whether a wall stands anywhere between two heights in each of the directions (k,3) across its axis."""
    x = directions[0]
    y = np.cross(of.axis, x)
    angle = np.arctan2(dot(of.corners, y), dot(of.corners, x))
    spread = np.remainder(angle - angle[:, :1] + np.pi, 2.0 * np.pi) - np.pi
    least, greatest = spread.min(axis=1) - _TOUCH, spread.max(axis=1) + _TOUCH
    is_there = (of.heights.min(axis=1) <= high) & (of.heights.max(axis=1) >= low)
    asked = np.arctan2(dot(directions, y), dot(directions, x))
    off = np.remainder(asked[:, None] - angle[None, :, 0] + np.pi, 2.0 * np.pi) - np.pi
    return np.asarray(((off >= least) & (off <= greatest) & is_there).any(axis=1))

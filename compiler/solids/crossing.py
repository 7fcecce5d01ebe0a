"""Whether a surface of triangles crosses or touches itself: every pair whose boxes meet, judged by separating axes.

Two convex bodies are apart exactly where the projections on one of finitely many axes are: for triangles the two
normals, the nine products of their sides and, in one plane, the normals of the sides within it (Gottschalk, Lin and
Manocha 1996, for boxes; the same argument on the faces of the Minkowski difference). Triangles that share a corner
are judged by the side opposite to it, those that share a side by whether one is folded onto the other.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from .boxes import meeting

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]
Mask = NDArray[np.bool_]

_TOUCH = 1e-9
"""Of the size of the whole: nearer than this is touching."""
_PARALLEL = 1e-10
_FOLDED = 1e-10


def crossing(vertices: F64, faces: NDArray[np.integer]) -> F64 | None:
    """A point (3,) near where triangles (m,3) of vertices (n,3) meet that are no neighbours, None where none do.

    Cost: of the order of m log m for surfaces that do not lie on each other throughout.
    """
    rows = np.asarray(faces, np.int64)
    corners = np.asarray(vertices, np.float64)[rows]
    near = _TOUCH * float(np.ptp(corners.reshape(-1, 3), axis=0).max())
    for one, other in meeting(corners.min(axis=1), corners.max(axis=1) + near):
        met = _met(corners, rows, one, other, near)
        if met.any():
            a, b = corners[one[met][0]], corners[other[met][0]]
            low, high = np.maximum(a.min(axis=0), b.min(axis=0)), np.minimum(a.max(axis=0), b.max(axis=0))
            return np.asarray((low + high) / 2.0)
    return None


def _met(corners: F64, rows: I64, one: I64, other: I64, near: float) -> Mask:
    """Which pairs (k,) of triangles meet elsewhere than in what they share."""
    same = rows[one][:, :, None] == rows[other][:, None, :]
    shared = same.reshape(-1, 9) @ np.ones(9, np.int64)
    met = np.zeros(len(one), np.bool_)
    apart = np.flatnonzero(shared == 0)
    met[apart] = ~_separate(corners[one[apart]], corners[other[apart]], near)
    by_corner = np.flatnonzero(shared == 1)
    for a, b, which in ((one, other, same.any(axis=2)), (other, one, same.any(axis=1))):
        at = which[by_corner].argmax(axis=1)
        opposite = np.stack([corners[a[by_corner], (at + k) % 3] for k in (1, 2)], axis=1)
        met[by_corner] |= ~_separate(opposite, corners[b[by_corner]], near)
    by_side = np.flatnonzero(shared == 2)
    turn = (_unit(_normal(corners[one[by_side]])) * _unit(_normal(corners[other[by_side]]))).sum(axis=1)
    met[by_side] = turn < _FOLDED - 1.0
    return met


def _separate(a: F64, b: F64, near: float) -> Mask:
    """Which sides or triangles (k,2 or 3,3) lie further than `near` from triangles (k,3,3) on one of the axes."""
    sides = [a[:, 1] - a[:, 0]] if a.shape[1] == 2 else [a[:, (k + 1) % 3] - a[:, k] for k in range(3)]
    others = [b[:, (k + 1) % 3] - b[:, k] for k in range(3)]
    normal = _normal(b)
    axes = [normal, *(np.cross(normal, side) for side in (*others, *sides))]
    if a.shape[1] == 3:
        own = _normal(a)
        axes += [own, *(np.cross(own, side) for side in sides)]
    axes += [_product(side, other) for side in sides for other in others]
    apart = np.zeros(len(a), np.bool_)
    for axis in axes:
        left = np.flatnonzero(~apart)
        if not len(left):
            break
        direction = _unit(axis[left])
        on_a, on_b = (np.einsum("kci,ki->ck", each[left], direction) for each in (a, b))
        gap = np.maximum(on_a.min(axis=0) - on_b.max(axis=0), on_b.min(axis=0) - on_a.max(axis=0))
        apart[left] = gap > near
    return apart


def _normal(triangles: F64) -> F64:
    return np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])


def _product(side: F64, other: F64) -> F64:
    """Products square to both; zero, an axis that separates nothing, where they are parallel."""
    product = np.cross(side, other)
    limit = _PARALLEL**2 * (side**2).sum(axis=1) * (other**2).sum(axis=1)
    return np.where(((product**2).sum(axis=1) > limit)[:, None], product, 0.0)


def _unit(vectors: F64) -> F64:
    length = np.sqrt((vectors**2).sum(axis=1))[:, None]
    return np.asarray(np.divide(vectors, length, out=np.zeros_like(vectors), where=length > 0.0))

"""Which sides of triangles meet, and which triangles hang together."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

F64 = NDArray[np.float64]
I32 = NDArray[np.int32]
I64 = NDArray[np.int64]

SPECK = 1e-9
"""A closed surface whose volume over its area is less than this part of the size of the solid is a rounding error."""


def paired_sides(faces: I32, n_vertices: int) -> tuple[I64, I64, bool]:
    """Sides that meet, as 3·face + corner: (k,) and (k,), each pair once; and whether the faces close, every
    directed side occurring once and its reverse once. A side with no mate, or with several, is in no pair.

    Cost: a sort of the sides; half of that where the faces close.
    """
    start = faces.ravel().astype(np.int64)
    end = faces.take((1, 2, 0), axis=1).ravel().astype(np.int64)
    rising = start < end
    up, down = np.flatnonzero(rising), np.flatnonzero(~rising)
    bits = len(start).bit_length()
    if len(up) == len(down) and (n_vertices * n_vertices) << bits < 1 << 63:
        # Key and side in one number: values are sorted several times faster than places.
        one = np.sort(((start[up] * n_vertices + end[up]) << bits) | up)
        other = np.sort(((end[down] * n_vertices + start[down]) << bits) | down)
        key = one >> bits
        if np.array_equal(key, other >> bits) and bool((key[1:] != key[:-1]).all()):
            side = (1 << bits) - 1
            return one & side, other & side, len(faces) > 0
    return _paired_where_open(start, end, rising, n_vertices)


def _paired_where_open(start: I64, end: I64, rising: NDArray[np.bool_], n_vertices: int) -> tuple[I64, I64, bool]:
    undirected = np.minimum(start, end) * n_vertices + np.maximum(start, end)
    order = np.argsort(undirected, kind="stable")
    ordered = undirected[order]
    forward = rising[order]
    first = np.flatnonzero(ordered[1:] == ordered[:-1])
    alone = np.ones(len(first), np.bool_)
    alone[1:] &= first[1:] != first[:-1] + 1
    alone[:-1] &= first[1:] != first[:-1] + 1
    first = first[alone & (forward[first] != forward[first + 1])]
    return order[first], order[first + 1], bool(len(start) > 0 and 2 * len(first) == len(start))


def components(faces: NDArray[np.integer], n_vertices: int) -> NDArray[np.int64]:
    """Label (m,) of the connected surface that each face belongs to, numbered by first face.

    Labels sink along sides to the least vertex, with pointer jumping: O(m log n).
    """
    label = np.arange(n_vertices)
    start = faces.ravel().astype(np.int64)
    end = faces[:, [1, 2, 0]].ravel().astype(np.int64)
    while True:
        low = np.minimum(label[start], label[end])
        before = label.copy()
        np.minimum.at(label, label[start], low)
        np.minimum.at(label, label[end], low)
        while not np.array_equal(label, label[label]):
            label = label[label]
        if np.array_equal(label, before):
            break
    return first_seen(label[faces[:, 0]], n_vertices)[0]


def first_seen(numbers: NDArray[np.integer], n: int) -> tuple[I64, I64]:
    """Numbers (m,) below n renumbered (m,) from 0 in the order in which they first occur, and which of the old (k,)
    those are.
    """
    first = np.full(n, len(numbers))
    # Of several values for one place the last one stays.
    first[numbers[::-1]] = np.arange(len(numbers) - 1, -1, -1)
    old = np.flatnonzero(first < len(numbers))
    old = old[np.argsort(first[old])]
    new = np.empty(n, np.int64)
    new[old] = np.arange(len(old))
    return new[numbers], old


def without_specks(vertices: F64, faces: I32) -> NDArray[np.bool_]:
    """Which faces (m,) belong to surfaces that enclose more than rounding does."""
    label = components(faces, len(vertices))
    a, b, c = (vertices[faces[:, k]] - vertices.mean(axis=0) for k in range(3))
    volume = np.bincount(label, (a * np.cross(b, c)).sum(axis=1)) / 6.0
    area = np.bincount(label, np.sqrt((np.cross(b - a, c - a) ** 2).sum(axis=1))) / 2.0
    size = float(np.ptp(vertices, axis=0).max())
    return np.asarray((np.abs(volume) > SPECK * size * area)[label])


def in_use(vertices: F64, faces: I32) -> tuple[F64, I32]:
    """Vertices and faces without the vertices that no face has, the order kept."""
    used = np.zeros(len(vertices), np.bool_)
    used[faces] = True
    if used.all():
        return vertices, faces
    return vertices[used], (np.cumsum(used, dtype=np.int32) - np.int32(1))[faces]

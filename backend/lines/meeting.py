"""Triangles of two parts that cross: a tree of boxes for each part, and the segment in which two triangles meet.

A vertex within `near` mm of a plane counts as on it, and what lies on a plane counts as outside. So parts that only
touch, or lie flush, never cross, while one that is cut through along its own edges still does. A segment no longer than
`near` is none.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import F64, I32, U8

LEAF = 4
"""Triangles in a leaf of a tree."""


@kernel
def node_boxes(world: F64, faces: I32, face_node: I32, n_nodes: int) -> F64:
    """Boxes (n,6) of nodes, world mm: least x, y, z, then greatest; turned inside out for a node without faces."""
    boxes = np.empty((n_nodes, 6))
    boxes[:, :3], boxes[:, 3:] = np.inf, -np.inf
    for f in range(len(faces)):
        box = boxes[face_node[f]]
        for k in range(3):
            for axis in range(3):
                value = world[faces[f, k], axis]
                box[axis] = min(box[axis], value)
                box[axis + 3] = max(box[axis + 3], value)
    return boxes


@kernel
def codes(world: F64, faces: I32, rows: I32, box: F64) -> NDArray[np.uint64]:
    """Places (k,) of the faces `rows` on a Morton curve through the box: neighbours in space are near in it."""
    result = np.empty(len(rows), np.uint64)
    for i in range(len(rows)):
        code = np.uint64(0)
        for axis in range(3):
            middle = 0.0
            for k in range(3):
                middle += world[faces[rows[i], k], axis]
            extent = box[axis + 3] - box[axis]
            share = 0.0 if extent <= 0.0 else (middle / 3.0 - box[axis]) / extent
            cell = np.uint64(min(1023.0, max(0.0, share * 1024.0)))
            for bit in range(10):
                code |= ((cell >> np.uint64(bit)) & np.uint64(1)) << np.uint64(3 * bit + axis)
        result[i] = code
    return result


@kernel
def tree(world: F64, faces: I32, rows: I32, boxes: F64) -> None:
    """Fill `boxes` (2p,6), a heap: its root is row 1, and its leaves from row p on hold LEAF faces of `rows` each."""
    p = len(boxes) // 2
    boxes[:, :3], boxes[:, 3:] = np.inf, -np.inf
    for i in range(len(rows)):
        box = boxes[p + i // LEAF]
        for k in range(3):
            for axis in range(3):
                value = world[faces[rows[i], k], axis]
                box[axis] = min(box[axis], value)
                box[axis + 3] = max(box[axis + 3], value)
    for i in range(p - 1, 0, -1):
        for axis in range(3):
            boxes[i, axis] = min(boxes[2 * i, axis], boxes[2 * i + 1, axis])
            boxes[i, axis + 3] = max(boxes[2 * i, axis + 3], boxes[2 * i + 1, axis + 3])


@inner
def _normal(world: F64, faces: I32, f: int, is_plane: bool, plane_normal: F64, result: F64) -> bool:
    """Unit normal of a face: of a plane patch that of the patch, so that slivers of one plane agree."""
    if is_plane:
        for axis in range(3):
            result[axis] = plane_normal[axis]
        return True
    a, b, c = faces[f, 0], faces[f, 1], faces[f, 2]
    ux, uy, uz = world[b, 0] - world[a, 0], world[b, 1] - world[a, 1], world[b, 2] - world[a, 2]
    vx, vy, vz = world[c, 0] - world[a, 0], world[c, 1] - world[a, 1], world[c, 2] - world[a, 2]
    x, y, z = uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx
    size = np.sqrt(x * x + y * y + z * z)
    if size == 0.0:
        return False
    result[0], result[1], result[2] = x / size, y / size, z / size
    return True


@inner
def _straddles(world: F64, faces: I32, f: int, g: int, normal: F64, near: float, height: F64) -> bool:
    """Whether face f lies on both sides of the plane of face g; fills the heights (3,) of its corners above it."""
    a = faces[g, 0]
    n_out = 0
    for k in range(3):
        p = faces[f, k]
        x, y, z = world[p, 0] - world[a, 0], world[p, 1] - world[a, 1], world[p, 2] - world[a, 2]
        value = x * normal[0] + y * normal[1] + z * normal[2]
        if abs(value) <= near:
            value = 0.0
        height[k] = value
        if value >= 0.0:
            n_out += 1
    return n_out == 1 or n_out == 2


@inner
def _through_plane(world: F64, faces: I32, f: int, height: F64, points: F64, keys: I32) -> None:
    """The two points (2,3) where sides of face f pass through a plane, and the vertices (2,2) of those sides.

    Worked out from the vertex of the lower row, so that the face beyond finds the same bits.
    """
    n_out = 0
    for k in range(3):
        n_out += 1 if height[k] >= 0.0 else 0
    odd = 0
    for k in range(3):
        if (height[k] >= 0.0) == (n_out == 1):
            odd = k
    for i in range(2):
        other = (odd + 1 + i) % 3
        a, b = odd, other
        if faces[f, a] > faces[f, b]:
            a, b = b, a
        low, high = faces[f, a], faces[f, b]
        if height[a] == 0.0:
            high = low
        elif height[b] == 0.0:
            low = high
        share = 0.0 if low == high else height[a] / (height[a] - height[b])
        for axis in range(3):
            points[i, axis] = world[low, axis] + share * (world[high, axis] - world[low, axis])
        keys[i, 0], keys[i, 1] = low, high


@inner
def _meet(world: F64, faces: I32, f: int, g: int, normals: F64, near: float, heights: F64, ends: F64, keys: I32) -> int:
    """The segment in which faces f and g cross, each of which straddles the plane of the other: which two of the four
    points `ends` (4,3) it runs between, as a number 4 * first + second, or -1. Points 0 and 1 are on sides of f, 2 and
    3 on sides of g; `keys` (4,2) are those sides.
    """
    a, b = normals[0], normals[1]
    x, y, z = a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]
    size = np.sqrt(x * x + y * y + z * z)
    if size < 1e-12:
        return -1
    _through_plane(world, faces, f, heights[0], ends[:2], keys[:2])
    _through_plane(world, faces, g, heights[1], ends[2:], keys[2:])
    base = faces[f, 0]
    place = np.empty(4)
    for i in range(4):
        u, v, w = ends[i, 0] - world[base, 0], ends[i, 1] - world[base, 1], ends[i, 2] - world[base, 2]
        place[i] = (x * u + y * v + z * w) / size
    first = 0 if place[0] <= place[1] else 1
    last = 1 - first
    low = 2 if place[2] <= place[3] else 3
    high = 5 - low
    if place[low] > place[first]:
        first = low
    if place[high] < place[last]:
        last = high
    if place[last] - place[first] <= near:
        return -1
    return 4 * first + last


@kernel
def crossings(
    world: F64,
    faces: I32,
    face_patch: I32,
    kinds: U8,
    frames: F64,
    pairs: I32,
    boxes: F64,
    nears: F64,
    rows: I32,
    row_start: I32,
    trees: F64,
    tree_start: I32,
    hit_faces: I32,
    hit_points: F64,
    hit_keys: I32,
) -> int:
    """Segments in which the faces of pairs of nodes cross; returns how many, of which as many are written as fit.

    pairs (k,2): node asking, node whose tree is asked; boxes (k,6) what they share; nears (k,) mm; rows: faces by node,
    from row_start[node] on; trees (t,6): heaps of `tree`, that of a node from tree_start[node] on. hit_faces (c,2),
    hit_points (c,2,3) world, hit_keys (c,2,3): the vertices of a side, and the face it passes through.
    """
    n = 0
    stack = np.empty(64, np.int32)
    box, normals, heights = np.empty(6), np.empty((2, 3)), np.empty((2, 3))
    ends, keys = np.empty((4, 3)), np.empty((4, 2), np.int32)
    for i in range(len(pairs)):
        asking, asked = pairs[i, 0], pairs[i, 1]
        near = nears[i]
        heap = trees[tree_start[asked] : tree_start[asked + 1]]
        leaves = len(heap) // 2
        first, last = row_start[asked], row_start[asked + 1]
        for r in range(row_start[asking], row_start[asking + 1]):
            f = rows[r]
            is_apart = False
            for axis in range(3):
                p, q, s = world[faces[f, 0], axis], world[faces[f, 1], axis], world[faces[f, 2], axis]
                box[axis], box[axis + 3] = min(p, min(q, s)), max(p, max(q, s))
                is_apart |= box[axis] > boxes[i, axis + 3] or box[axis + 3] < boxes[i, axis]
            if is_apart:
                continue
            if not _normal(world, faces, f, kinds[face_patch[f]] == 0, frames[face_patch[f], 3], normals[0]):
                continue
            stack[0] = 1
            depth = 1
            while depth > 0:
                depth -= 1
                at = stack[depth]
                is_apart = False
                for axis in range(3):
                    is_apart |= box[axis] > heap[at, axis + 3] or box[axis + 3] < heap[at, axis]
                if is_apart:
                    continue
                if at < leaves:
                    stack[depth], stack[depth + 1] = 2 * at + 1, 2 * at
                    depth += 2
                    continue
                for r2 in range(first + (at - leaves) * LEAF, min(last, first + (at - leaves + 1) * LEAF)):
                    g = rows[r2]
                    pg = face_patch[g]
                    # The cheaper test first: most triangles that come near lie on one side of this one's plane.
                    if not _straddles(world, faces, g, f, normals[0], near, heights[1]):
                        continue
                    if not _normal(world, faces, g, kinds[pg] == 0, frames[pg, 3], normals[1]):
                        continue
                    if not _straddles(world, faces, f, g, normals[1], near, heights[0]):
                        continue
                    run = _meet(world, faces, f, g, normals, near, heights, ends, keys)
                    if run < 0:
                        continue
                    if n < len(hit_faces):
                        hit_faces[n, 0], hit_faces[n, 1] = f, g
                        for side in range(2):
                            end = run // 4 if side == 0 else run % 4
                            for axis in range(3):
                                hit_points[n, side, axis] = ends[end, axis]
                            hit_keys[n, side, 0], hit_keys[n, side, 1] = keys[end, 0], keys[end, 1]
                            hit_keys[n, side, 2] = g if end < 2 else f
                    n += 1
    return n

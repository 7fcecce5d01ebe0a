"""Lines in which parts penetrate each other."""

from __future__ import annotations

import os
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..contract import F64, I32, LineClass
from .chaining import walked
from .flush import is_flush
from .meeting import LEAF, codes, crossings, node_boxes, tree
from .model import Bools, Candidates, View
from .segments import candidates, fixed, none, to_view

NEAR = 2.5e-7
"""Of how far two parts stand from the middle of all: closer than this to a plane is on it. Single precision's worth."""
_CAPACITY = 1 << 14
_BATCH = 1 << 22


def penetrations_of(view: View, threads: int | None = None) -> Candidates:
    """Lines in which the surfaces of two parts cross, class visible-edge; `node` is the smaller row, `faces` both.

    Segments of one line share a chain. Parts that touch or lie flush have none, nor have surfaces that are offsets of
    each other, such as a pin and its hole, whatever their facets do. The result does not depend on the number of
    threads, nor, but for order and direction, on that of the parts. Cost: one pass over all faces, then a tree over
    each larger part of two whose boxes overlap, and the faces within the overlap.
    """
    world, faces = fixed(view.world), fixed(view.faces)
    boxes = node_boxes(world, faces, fixed(view.face_node), len(view.geometry.nodes))
    pairs, nears = _pairs(boxes)
    if not len(pairs):
        return none()
    hits = _hits(view, boxes, _asked(view, pairs), nears, threads or os.cpu_count() or 1)
    if not len(hits.faces):
        return none()
    hits = hits.take(np.flatnonzero(~is_flush(view, hits.faces, hits.points, float(nears.max()))))
    if not len(hits.faces):
        return none()
    joints = _joined_ends(_joints(hits.keys, len(view.points), len(view.faces)), hits.points, 4.0 * float(nears.max()))
    _, first = np.unique(joints, return_index=True)
    points = np.empty((int(joints.max()) + 1, 3))
    points[joints.ravel()[first]] = hits.points.reshape(-1, 3)[first]
    rows = np.flatnonzero(joints[:, 0] != joints[:, 1])
    order, turned, chain = walked(fixed(joints[rows]), len(points))
    rows = rows[order]
    return _candidates(view, _Hits(hits.faces[rows], points[joints[rows]], hits.keys[rows]), turned, chain)


@dataclass(frozen=True, eq=False, slots=True)
class _Hits:
    """Segments of faces that cross: faces (k,2), points (k,2,3) world, keys (k,2,3); see `meeting.crossings`."""

    faces: I32
    points: F64
    keys: I32

    def take(self, rows: NDArray[np.integer]) -> _Hits:
        return _Hits(self.faces[rows], self.points[rows], self.keys[rows])


def _pairs(boxes: F64) -> tuple[I32, F64]:
    """Rows (k,2) of nodes whose boxes share a volume, the smaller first, in order; and what counts as near (k,) mm."""
    full = np.flatnonzero(boxes[:, 0] <= boxes[:, 3])
    if len(full) < 2:
        return np.empty((0, 2), np.int32), np.empty(0)
    low, high = boxes[full, :3].min(axis=0), boxes[full, 3:].max(axis=0)
    middle = 0.5 * (low + high)
    far = np.maximum(np.abs(boxes[:, :3] - middle), np.abs(boxes[:, 3:] - middle)).max(axis=1)
    full = full[np.argsort(boxes[full, 0], kind="stable")]
    reach = np.searchsorted(boxes[full, 0], boxes[full, 3], side="right")
    counts = np.maximum(reach - np.arange(len(full)) - 1, 0)
    if not counts.any():
        return np.empty((0, 2), np.int32), np.empty(0)
    found = []
    # In batches, for where many parts lie one above the other.
    cuts = np.searchsorted(np.cumsum(counts), np.arange(_BATCH, int(counts.sum()) + _BATCH, _BATCH), side="left") + 1
    for start, stop in zip(np.concatenate(([0], cuts[:-1])), cuts, strict=True):
        n = counts[start:stop]
        a = np.repeat(np.arange(start, start + len(n)), n)
        b = a + 1 + np.arange(len(a)) - np.repeat(np.cumsum(n) - n, n)
        one, two = full[a], full[b]
        near = NEAR * np.maximum(far[one], far[two])
        depth = np.minimum(boxes[one, 3:], boxes[two, 3:]) - np.maximum(boxes[one, :3], boxes[two, :3])
        kept = (depth > near[:, None]).all(axis=1)
        found.append(np.column_stack((np.minimum(one, two), np.maximum(one, two)))[kept])
    pairs = np.concatenate(found)
    pairs = pairs[np.lexsort((pairs[:, 1], pairs[:, 0]))].astype(np.int32)
    return pairs, NEAR * far[pairs].max(axis=1)


def _asked(view: View, pairs: I32) -> I32:
    """The pairs with the node of more faces second: its tree is asked for each face of the other."""
    count = np.bincount(view.face_node, minlength=len(view.geometry.nodes))
    is_turned = count[pairs[:, 0]] > count[pairs[:, 1]]
    return np.where(is_turned[:, None], pairs[:, ::-1], pairs)


def _hits(view: View, boxes: F64, pairs: I32, nears: F64, threads: int) -> _Hits:
    """All segments, in the order of the pairs."""
    world, faces = fixed(view.world), fixed(view.faces)
    n_nodes = len(view.geometry.nodes)
    rows = np.argsort(view.face_node, kind="stable").astype(np.int32)
    row_start = np.searchsorted(view.face_node[rows], np.arange(n_nodes + 1)).astype(np.int32)
    tree_start = _tree_starts(np.diff(row_start), pairs)
    trees = np.empty((int(tree_start[-1]), 6))

    def planted(node: int) -> None:
        own = rows[row_start[node] : row_start[node + 1]]
        own[:] = own[np.argsort(codes(world, faces, fixed(own), fixed(boxes[node])), kind="stable")]
        tree(world, faces, fixed(own), trees[tree_start[node] : tree_start[node + 1]])

    one, two = boxes[pairs[:, 0]], boxes[pairs[:, 1]]
    shared = np.hstack((np.maximum(one[:, :3], two[:, :3]), np.minimum(one[:, 3:], two[:, 3:])))
    patches = view.geometry.patches

    def crossed(some: slice) -> _Hits:
        capacity = _CAPACITY
        while True:
            hits = _Hits(
                np.empty((capacity, 2), np.int32), np.empty((capacity, 2, 3)), np.empty((capacity, 2, 3), np.int32)
            )
            n = crossings(
                world, faces, fixed(view.face_patch), fixed(patches.kind), fixed(patches.frame), fixed(pairs[some]),
                fixed(shared[some]), fixed(nears[some]), fixed(rows), fixed(row_start), fixed(trees),
                fixed(tree_start), hits.faces, hits.points, hits.keys,
            )  # fmt: skip
            if n <= capacity:
                return hits.take(np.arange(n, dtype=np.int32))
            capacity = n

    step = max(1, -(-len(pairs) // (4 * threads)))
    with ThreadPoolExecutor(threads) as pool:
        list(pool.map(planted, np.unique(pairs[:, 1])))
        found = list(pool.map(crossed, [slice(k, k + step) for k in range(0, len(pairs), step)]))
    return _Hits(*(np.concatenate([getattr(hits, name) for hits in found]) for name in ("faces", "points", "keys")))


def _tree_starts(counts: I32, pairs: I32) -> I32:
    """Where the tree of each node that is asked begins (n+1,): twice a power of two of leaves each."""
    sizes = np.zeros(len(counts) + 1, np.int64)
    for node in np.unique(pairs[:, 1]):
        leaves = -(-int(counts[node]) // LEAF)
        sizes[node + 1] = 2 << max(0, (leaves - 1).bit_length())
    return np.cumsum(sizes).astype(np.int32)


def _joints(keys: I32, n_points: int, n_faces: int) -> I32:
    """A number for each end (k,2), the same where the same side passes through the same face."""
    low, high, face = (keys[:, :, k].ravel().astype(np.int64) for k in range(3))
    _, side = np.unique(low * n_points + high, return_inverse=True)
    _, joint = np.unique(side * n_faces + face, return_inverse=True)
    return np.ascontiguousarray(joint.reshape(-1, 2), np.int32)


def _joined_ends(joints: I32, points: F64, tolerance: float) -> I32:
    """Joints (k,2) in which loose ends that lie together are one: where sides cross sides, keys alone may miss it."""
    count = np.bincount(joints.ravel())
    loose = np.flatnonzero(count[joints.ravel()] == 1)
    at = points.reshape(-1, 3)[loose]
    # Along a direction that no drawing is made to, so that few lie side by side in it.
    place = 0.547 * at[:, 0] + 0.619 * at[:, 1] + 0.563 * at[:, 2]
    order = np.argsort(place, kind="stable")
    loose, at, place = loose[order], at[order], place[order]
    same = np.arange(len(count))
    names = joints.ravel()[loose]
    for step in range(1, len(loose)):
        side_by_side = np.flatnonzero(place[step:] - place[:-step] <= tolerance)
        if not len(side_by_side):
            break
        away = np.abs(at[side_by_side] - at[side_by_side + step]).max(axis=1)
        for k in side_by_side[away <= tolerance]:
            same[names[k + step]] = same[names[k]]
    return np.ascontiguousarray(same[joints], np.int32)


def _candidates(view: View, hits: _Hits, turned: Bools, chain: I32) -> Candidates:
    points = np.where(turned[:, None, None], hits.points[:, ::-1], hits.points)
    keys = np.where(turned[:, None, None], hits.keys[:, ::-1], hits.keys)
    vertices = np.where(keys[:, :, 0] == keys[:, :, 1], keys[:, :, 0], -1)
    nodes = view.face_node[hits.faces]
    seen = []
    for k in range(2):
        end = to_view(view.projection, points[:, k])
        rows = np.flatnonzero(vertices[:, k] >= 0)
        end[rows] = view.points[vertices[rows, k]]
        seen.append(end)
    is_second = nodes[:, 0] > nodes[:, 1]
    faces = np.where(is_second[:, None], hits.faces[:, ::-1], hits.faces)
    return candidates(
        seen[0], seen[1], LineClass.VISIBLE_EDGE, node=nodes.min(axis=1), chain=chain, faces=faces, vertices=vertices
    )

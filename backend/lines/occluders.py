"""What hides lines: the triangles toward the viewer, in a tree over the page."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..contract import F32, F64, I32
from .block import WIDE
from .model import View
from .tree import bounds, fill_levels, fill_triangles, in_order, morton_codes
from .view import in_blocks

_PAD = 1e-4  # mm on paper: boxes reach further than any triangle with its tolerance does


@dataclass(frozen=True, eq=False, slots=True)
class Occluders:
    """Triangles that hide, in Morton order, and the boxes of an implicit tree over them (see `tree`).

    boxes (q,5,8) float32, starts (levels + 1,) int32, corners (k,9) float64 view points, labels (k,6) int32: three
    vertices, view face, node, patch. rank (n_nodes,) int32: order of the nodes' paths, by which ties are decided.
    """

    boxes: F32
    starts: I32
    corners: F64
    labels: I32
    rank: I32

    def __len__(self) -> int:
        return len(self.labels)


def occluders_of(view: View, threads: int | None = None) -> Occluders:
    """The occluders of a view: front faces, of open parts both sides; faces of ghosts, for their own part only.

    Cost: one sort of the faces by Morton code; about 0.13 kB a triangle.
    """
    rank = _ranks(view)
    is_open = np.array([not node.closed for node in view.geometry.nodes], np.bool_)
    chosen = np.flatnonzero((view.facing > 0) | ((view.facing < 0) & is_open[view.face_node])).astype(np.int32)
    n = len(chosen)
    box = np.array([np.inf, np.inf, -np.inf, -np.inf])
    bounds(view.points, view.faces, chosen, box)
    code = np.empty(n, np.uint64)

    def encode(begin: int, end: int) -> None:
        morton_codes(view.points, view.faces, chosen, box, begin, end, code)

    in_blocks(encode, n, threads)
    order = in_order(code, chosen)
    starts = _levels(n)
    corners, labels = np.empty((n, 9)), np.empty((n, 6), np.int32)
    boxes = np.empty((int(starts[-1]), 5, WIDE), np.float32)
    boxes[:, (0, 1, 4)], boxes[:, (2, 3)] = np.inf, -np.inf

    def fill(begin: int, end: int) -> None:
        fill_triangles(
            view.points, view.faces, view.face_node, view.face_patch, view.facing, view.is_occluder, order, _PAD,
            begin, end, boxes, corners, labels,
        )  # fmt: skip

    in_blocks(fill, n, threads)
    fill_levels(boxes, starts)
    return Occluders(boxes, starts, corners, labels, rank)


def _levels(n: int) -> I32:
    """First block of each level of a tree over n boxes, and the number of all blocks."""
    starts = [0]
    while True:
        n = max(1, (n + WIDE - 1) // WIDE)
        starts.append(starts[-1] + n)
        if n == 1:
            return np.array(starts, np.int32)


def _ranks(view: View) -> I32:
    nodes = view.geometry.nodes
    order = sorted(range(len(nodes)), key=lambda row: (nodes[row].path, row))
    rank = np.empty(len(nodes), np.int32)
    rank[order] = np.arange(len(nodes), dtype=np.int32)
    return rank

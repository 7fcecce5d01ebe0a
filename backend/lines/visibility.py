"""Which stretches of lines are seen."""

from __future__ import annotations

import numpy as np

from ..contract import F64, I32, U8, LineClass
from .clip import HIDDEN, NORMAL, PLAIN, cut_segments
from .model import Candidates, Pieces, View, number_of
from .occluders import Occluders as Occluders
from .occluders import occluders_of
from .tree import STACK
from .view import in_blocks

_BLOCK = 512


def cut(view: View, candidates: Candidates, threads: int | None = None, occluders: Occluders | None = None) -> Pieces:
    """Cut candidates where they pass behind a surface.

    Exact up to `view.tolerance`, in central and parallel projection alike. A line that lies in a surface is seen, from
    every viewpoint: so is the seam of flush parts. Candidates of a hidden class come as one hidden piece, plain ones as
    one seen piece. The result does not depend on the number of threads. `occluders` are those of the view if they are
    known already. Cost: O(log n) and the triangles before it for each segment.
    """
    tree = occluders_of(view, threads) if occluders is None else occluders
    treat, parts = _treatment(candidates), _parts(view, candidates)
    is_central = view.projection.kind == "central"

    def work(begin: int, end: int) -> tuple[I32, F64]:
        stack, room = np.empty((STACK, 2), np.int32), 4 * (end - begin) + 64
        while True:
            spans, label, span = np.empty((room, 2)), np.empty((room, 2), np.int32), np.empty((room, 2))
            n = cut_segments(
                tree.boxes, tree.starts, tree.corners, tree.labels, candidates.start, candidates.end, candidates.faces,
                parts, candidates.patch, candidates.allowance, treat, view.tolerance.depth_mm,
                view.tolerance.sideways_mm, is_central, begin, end, stack, spans, label, span,
            )  # fmt: skip
            if n >= 0:
                return label[:n], span[:n]
            room *= 4

    found = in_blocks(work, len(candidates), threads, _BLOCK)
    if not found:
        nothing = np.empty((0, 3))
        return Pieces(np.empty(0, np.int32), np.empty((0, 2)), np.empty(0, np.bool_), nothing, nothing)
    label, span = np.concatenate([each[0] for each in found]), np.concatenate([each[1] for each in found])
    segment = np.ascontiguousarray(label[:, 0])
    start, end = candidates.start[segment], candidates.end[segment]
    return Pieces(
        segment,
        span,
        label[:, 1] != 0,
        between(start, end, span[:, 0]),
        between(start, end, span[:, 1]),
    )


def between(start: F64, end: F64, share: F64) -> F64:
    """Points (p,3) at shares (p,) of the way from start to end, exactly the ends at 0 and 1."""
    points = start + (end - start) * share[:, None]
    is_last = share == 1.0
    points[is_last] = end[is_last]
    return points


def _parts(view: View, candidates: Candidates) -> I32:
    """The two parts (s,2) whose faces meet in each candidate; its own twice where they are of one part."""
    of_face = np.append(view.face_node, -1)
    own = np.where(candidates.faces >= 0, of_face[candidates.faces], candidates.node[:, None])
    other = np.where(own[:, 0] != candidates.node, own[:, 0], own[:, 1])
    return np.ascontiguousarray(np.stack([candidates.node, other], axis=1), np.int32)


def _treatment(candidates: Candidates) -> U8:
    treat = np.where(candidates.is_plain, PLAIN, NORMAL).astype(np.uint8)
    for line_class in (LineClass.HIDDEN_EDGE, LineClass.HIDDEN_OUTLINE):
        treat[candidates.line_class == number_of(line_class)] = HIDDEN
    return treat

"""Lines that lie on sides of triangles: sharp edges, borders, tangent edges, rims of sections, mesh contours."""

from __future__ import annotations

import math

import numpy as np

from ..contract import F64, I32, U8, Style
from .model import Candidates, View
from .sides import judge_sides, string
from .view import in_blocks

_CLOSING = 128
_BLOCK = 1 << 15
_APART = 1 << 30  # keeps what only closes regions out of the chains of lines


def edges_of(view: View, style: Style, threads: int | None = None) -> Candidates:
    """Segments along sides of triangles that may be drawn, rims strung together.

    An edge is a side between two patches whose normals, taken from the surfaces themselves, differ by at least
    `style.sharp_angle`, or any such side where only one of the two is seen. Dropped here by an exact local test: edges
    of closed parts with no face toward the viewer, and hollow ones with only one. With `style.hidden` those come with
    the class HIDDEN_EDGE instead. Sides inside a smooth patch where it turns away, and tangent ones, come undrawn: they
    close regions. A segment runs with the winding of `faces[:, 0]`, unless it is turned about to run along its chain.
    Cost: one pass over the triangles.
    """
    side, code = _judged(view, style, threads)
    face, corner = side // 3, side % 3
    ends = np.stack([view.faces[face, corner], view.faces[face, (corner + 1) % 3]], axis=1)
    other = view.neighbour[face, corner]
    patch = view.face_patch[face]
    across = np.where(other >= 0, view.face_patch[other], -1).astype(np.int32)
    low, high = np.minimum(patch, across), np.maximum(patch, across)
    high = np.where(code < _CLOSING, high, high + _APART).astype(np.int32)
    order, backward, chain = string(ends, low, high, len(view.points))
    ends = ends[order]
    ends[backward] = ends[backward, ::-1]
    return _candidates(view, ends, code[order], face[order], other[order], chain)


def _judged(view: View, style: Style, threads: int | None) -> tuple[I32, U8]:
    origin = view.geometry.face_origin[view.face_row]
    is_open = np.array([not node.closed for node in view.geometry.nodes], np.bool_)
    is_level = np.ones(len(view.geometry.patches.kind), np.bool_)
    is_level[view.face_patch[view.facing != 0]] = False
    cosine = np.float32(math.cos(math.radians(style.sharp_angle)))

    def judge(begin: int, end: int) -> tuple[I32, U8]:
        side, code = np.empty(3 * (end - begin), np.int32), np.empty(3 * (end - begin), np.uint8)
        n = judge_sides(
            view.points, view.world, view.faces, view.neighbour, view.facing, view.edge_kind, view.corner_normals,
            view.face_patch, view.face_node, origin, is_open, is_level, cosine, style.tangent, style.hidden, begin, end,
            side, code,
        )  # fmt: skip
        return side[:n], code[:n]

    found = in_blocks(judge, len(view.faces), threads, _BLOCK)
    if not found:
        return np.empty(0, np.int32), np.empty(0, np.uint8)
    return np.concatenate([side for side, _ in found]), np.concatenate([code for _, code in found])


def _candidates(view: View, ends: I32, code: U8, face: I32, other: I32, chain: I32) -> Candidates:
    n = len(ends)
    is_drawn = code < _CLOSING
    start: F64 = view.points[ends[:, 0]]
    end: F64 = view.points[ends[:, 1]]
    return Candidates(
        start=start,
        end=end,
        line_class=np.where(is_drawn, code, code - _CLOSING).astype(np.uint8),
        node=view.face_node[face],
        chain=chain,
        faces=np.stack([face, other], axis=1),
        vertices=ends,
        patch=np.full(n, -1, np.int32),
        allowance=np.zeros(n),
        is_drawn=is_drawn,
        is_plain=np.zeros(n, np.bool_),
    )

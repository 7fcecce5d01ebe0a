"""Kernels that judge the sides of triangles, and string the segments of one rim together."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import I32, EdgeKind, FaceOrigin, LineClass
from .model import number_of

_INSIDE, _TANGENT, _SHARP = int(EdgeKind.INSIDE), int(EdgeKind.TANGENT), int(EdgeKind.SHARP)
_BORDER = int(EdgeKind.BORDER)
_CAP, _BREAK, _STEP = int(FaceOrigin.SECTION_CAP), int(FaceOrigin.BREAK), int(FaceOrigin.STEP)
_OUTLINE, _EDGE = number_of(LineClass.VISIBLE_OUTLINE), number_of(LineClass.VISIBLE_EDGE)
_HIDDEN = number_of(LineClass.HIDDEN_EDGE)
_IMAGINARY = number_of(LineClass.IMAGINARY_INTERSECTION)
_SECTION, _BREAK_LINE = number_of(LineClass.SECTION_OUTLINE), number_of(LineClass.BREAK_LINE)
_NONE = -1
_CLOSING = 128  # added to a line class: the segment is not drawn

SHORTEST = 1e-5
"""mm on paper: an edge shorter than this is seen end-on and is no line."""
_MOST_AT_A_POINT = 64  # more ends than this at a vertex are not strung together


@kernel
def judge_sides(
    points: Any, world: Any, faces: Any, neighbour: Any, facing: Any, edge_kind: Any, normals: Any, face_patch: Any,
    face_node: Any, origin: Any, is_open: Any, is_level: Any, cosine: Any, with_tangent: bool, with_hidden: bool,
    begin: int, end: int, side: Any, line_class: Any,
) -> int:  # fmt: skip
    """Write sides of the triangles begin .. end that may be lines; returns their number, 3 a triangle at most.

    side (k,) int32: 3 face + corner; line_class (k,) uint8.
    origin (m,) uint8 `FaceOrigin` of the view's faces; is_level (p,) bool: patches seen edge-on throughout; cosine: of
    the least angle between the normals at an edge. Every side is judged once, at its first triangle. `_CLOSING` is
    added to the class of a side that only closes regions.
    """
    n = 0
    for f in range(begin, end):
        for k in range(3):
            g = neighbour[f, k]
            kind = edge_kind[f, k]
            if g >= 0 and (g < f or (kind == _INSIDE and facing[f] == facing[g])):
                continue
            if g < 0 and kind != _BORDER:
                continue
            j = (k + 1) % 3
            a, b = faces[f, k], faces[f, j]
            if abs(points[a, 0] - points[b, 0]) + abs(points[a, 1] - points[b, 1]) < SHORTEST:
                continue
            if g < 0:
                found = _OUTLINE
            else:
                i = 0
                while faces[g, i] != b:
                    i += 1
                if faces[g, (i + 1) % 3] != a:
                    continue
                found = _judged(
                    world, faces, facing, normals, face_patch, origin, is_open[face_node[f]], is_level, kind, cosine,
                    with_tangent, with_hidden, f, k, j, g, i, a, b,
                )  # fmt: skip
            if found >= 0:
                side[n] = 3 * f + k
                line_class[n] = found
                n += 1
    return n


@inner
def _judged(
    world: Any, faces: Any, facing: Any, normals: Any, face_patch: Any, origin: Any, is_open: Any, is_level: Any,
    kind: Any, cosine: Any, with_tangent: bool, with_hidden: bool, f: Any, k: Any, j: Any, g: Any, i: Any, a: Any,
    b: Any,
) -> int:  # fmt: skip
    """Class of the side from a (corner k of f, i + 1 of g) to b (corner j of f, i of g), or `_NONE`."""
    sees_f = facing[f] > 0 or (is_open and facing[f] != 0)
    sees_g = facing[g] > 0 or (is_open and facing[g] != 0)
    is_contour = facing[f] != facing[g] if is_open else sees_f != sees_g
    h = (i + 1) % 3
    nx, ny, nz = normals[f, k, 0], normals[f, k, 1], normals[f, k, 2]
    mx, my, mz = normals[g, h, 0], normals[g, h, 1], normals[g, h, 2]
    ux, uy, uz = nx + normals[f, j, 0], ny + normals[f, j, 1], nz + normals[f, j, 2]
    vx, vy, vz = mx + normals[g, i, 0], my + normals[g, i, 1], mz + normals[g, i, 2]
    if is_contour and not is_open:
        if kind == _SHARP:
            ex, ey, ez = world[b, 0] - world[a, 0], world[b, 1] - world[a, 1], world[b, 2] - world[a, 2]
            turn = (uy * vz - uz * vy) * ex + (uz * vx - ux * vz) * ey + (ux * vy - uy * vx) * ez
            is_concave = turn < 0.0
        elif sees_f:
            is_concave = _height(world, faces, f, faces[g, (i + 2) % 3]) > 0.0
        else:
            is_concave = _height(world, faces, g, faces[f, (k + 2) % 3]) > 0.0
    else:
        is_concave = False
    is_one_sharp = kind == _SHARP and (
        ux * vx + uy * vy + uz * vz <= cosine * np.sqrt((ux * ux + uy * uy + uz * uz) * (vx * vx + vy * vy + vz * vz))
    )
    if is_concave or not (sees_f or sees_g):
        # Risers and broken faces are where the drawing is cut, not edges of the thing.
        is_made_up = origin[f] == _STEP or origin[g] == _STEP or origin[f] == _BREAK or origin[g] == _BREAK
        return _HIDDEN if with_hidden and is_one_sharp and not is_made_up else _NONE
    if kind == _INSIDE:
        return _OUTLINE + _CLOSING if is_contour else _NONE
    if origin[f] != origin[g]:
        if origin[f] == _STEP or origin[g] == _STEP:
            return _OUTLINE + _CLOSING if is_contour else _NONE
        if origin[f] == _BREAK or origin[g] == _BREAK:
            return _BREAK_LINE
        if (origin[f] == _CAP and sees_f) or (origin[g] == _CAP and sees_g):
            return _SECTION
    if is_contour:
        is_flat_on = kind == _TANGENT and (is_level[face_patch[f]] or is_level[face_patch[g]])
        return _OUTLINE if kind == _SHARP or is_flat_on else _OUTLINE + _CLOSING
    if is_one_sharp:
        return _EDGE
    return _IMAGINARY if kind == _TANGENT and with_tangent else _NONE


@inner
def _height(world: Any, faces: Any, f: Any, apex: Any) -> Any:
    """How far a vertex stands before the plane of face f, times twice the area of f."""
    a, b, c = faces[f, 0], faces[f, 1], faces[f, 2]
    ux, uy, uz = world[b, 0] - world[a, 0], world[b, 1] - world[a, 1], world[b, 2] - world[a, 2]
    vx, vy, vz = world[c, 0] - world[a, 0], world[c, 1] - world[a, 1], world[c, 2] - world[a, 2]
    wx, wy, wz = world[apex, 0] - world[a, 0], world[apex, 1] - world[a, 1], world[apex, 2] - world[a, 2]
    return wx * (uy * vz - uz * vy) + wy * (uz * vx - ux * vz) + wz * (ux * vy - uy * vx)


def string(ends: I32, low: I32, high: I32, n_vertices: int) -> tuple[I32, NDArray[np.bool_], I32]:
    """Order (s,) int32 of segments, which of them run backwards (s,) bool, and their chains (s,) int32 or -1.

    ends (s,2) int32 are vertices; segments are of one chain if low and high (s,) int32 agree and exactly two such end
    at a vertex. Chains come in the order of their first segments, and start at a loose end where they have one.
    """
    n = len(ends)
    first, after = np.full(n_vertices, -1, np.int32), np.empty(2 * n, np.int32)
    joined, used = np.full(2 * n, -1, np.int32), np.zeros(n, np.bool_)
    order, backward, chain = np.empty(n, np.int32), np.empty(n, np.bool_), np.empty(n, np.int32)
    _string(ends, low, high, first, after, joined, used, order, backward, chain)
    return order, backward, chain


@kernel
def _string(
    ends: Any, low: Any, high: Any, first: Any, after: Any, joined: Any, used: Any, order: Any, backward: Any,
    chain: Any,
) -> None:  # fmt: skip
    n = len(ends)
    for q in range(2 * n - 1, -1, -1):
        v = ends[q >> 1, q & 1]
        after[q] = first[v]
        first[v] = q
    for v in range(len(first)):
        count = 0
        q = first[v]
        while q >= 0:
            count += 1
            q = after[q]
        if count < 2 or count > _MOST_AT_A_POINT:
            continue
        q = first[v]
        while q >= 0:
            mate, n_mates = -1, 0
            r = first[v]
            while r >= 0:
                if r != q and low[r >> 1] == low[q >> 1] and high[r >> 1] == high[q >> 1]:
                    mate, n_mates = r, n_mates + 1
                r = after[r]
            if n_mates == 1:
                joined[q] = mate
            q = after[q]
    n_placed, n_chains = 0, 0
    for s in range(n):
        if used[s]:
            continue
        # Go back to the loose end, or once round.
        at, way = s, 0
        while joined[2 * at + way] >= 0:
            q = joined[2 * at + way]
            if q >> 1 == s:
                at, way = s, 0
                break
            at, way = q >> 1, 1 - (q & 1)
        begin = n_placed
        while not used[at]:
            used[at] = True
            order[n_placed], backward[n_placed], chain[n_placed] = at, way == 1, n_chains
            n_placed += 1
            q = joined[2 * at + 1 - way]
            if q < 0:
                break
            at, way = q >> 1, q & 1
        if n_placed - begin == 1:
            chain[begin] = -1
        else:
            n_chains += 1

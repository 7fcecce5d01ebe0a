"""Where parts lie flush, and the crossings of their triangles are no lines."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..contract import F64, I32, PatchKind
from .model import Bools, View
from .segments import dot, length, shifts

_SAME = 1e-9
"""Two surfaces within this angle and this part of their size are one."""
_SAGITTA = 0.25
"""Of a chord's square over the radius, twice the most that two chord polygons of one circle stand apart."""


def is_flush(view: View, faces: I32, points: F64, near: float) -> Bools:
    """Whether segments (k,2,3), in which faces (k,2) of two parts cross, are no lines of penetration.

    They are none on surfaces that are offsets of each other, such as a pin and its hole: only their facets cross. Nor
    where patches p and r cross and the part of r ends r at a patch on the very surface of p, as where a pin leaves its
    hole: that edge is drawn as an edge, once. Cost: some patches of both parts for each pair of patches that cross.
    """
    result = np.zeros(len(faces), np.bool_)
    sides = view.face_patch[faces].astype(np.int64)
    shift, faces_of = shifts(view), _FacesOf(view, faces)
    _, of_pair = np.unique(sides[:, 0] * len(view.geometry.patches.kind) + sides[:, 1], return_inverse=True)
    order = np.argsort(of_pair, kind="stable")
    for rows in np.split(order, np.flatnonzero(np.diff(of_pair[order])) + 1):
        first, middle = int(rows[0]), points[rows].mean(axis=1)
        one, two = view.face_node[faces[first]]
        off = shift[two] - shift[one]
        a, b = (int(patch) for patch in sides[first])
        alone = np.array((b,), np.int32)
        if _is_offset(view, a, alone, _gap(view, a, alone, off), near)[0]:
            result[rows] = True
            continue
        for p, r, node, way in ((a, b, two, off), (b, a, one, -off)):
            some = _patches_of(view, int(node))
            for q in some[_is_same(view, p, some, _gap(view, p, some, way), near)]:
                edges = _shared_sides(view, faces_of.patch(r), faces_of.patch(int(q)))
                result[rows] |= _is_along(view, edges, middle, _slack(view, p), near)
    return result


class _FacesOf:
    """The faces of patches of the nodes that faces (k,2) belong to."""

    def __init__(self, view: View, faces: I32) -> None:
        is_asked = np.zeros(len(view.geometry.nodes), np.bool_)
        is_asked[view.face_node[faces]] = True
        rows = np.flatnonzero(is_asked[view.face_node])
        order = np.argsort(view.face_patch[rows], kind="stable")
        self._faces = view.faces[rows[order]]
        counts = np.bincount(view.face_patch[rows], minlength=len(view.geometry.patches.kind))
        self._starts = np.concatenate(([0], np.cumsum(counts)))

    def patch(self, patch: int) -> I32:
        """Triangles (m,3) of one patch."""
        return self._faces[self._starts[patch] : self._starts[patch + 1]]


def _patches_of(view: View, node: int) -> I32:
    start, mesh = int(view.geometry.patch_start[node]), view.geometry.nodes[node].mesh
    return np.arange(start, start + len(view.geometry.meshes[mesh].patches.kind), dtype=np.int32)


@dataclass(frozen=True, eq=False, slots=True)
class _Gap:
    """From a patch to others: along its axis, beside it, in all (k,) mm; whether they are of one kind and parallel."""

    along: F64
    beside: F64
    far: F64
    is_alike: Bools


def _gap(view: View, patch: int, some: I32, shift: F64) -> _Gap:
    patches = view.geometry.patches
    frame, own = patches.frame[some], patches.frame[patch]
    origin = frame[:, 0] + shift - own[0]
    along = dot(origin, own[3])
    kind = patches.kind[patch]
    is_parallel = 1.0 - np.abs(dot(frame[:, 3], own[3])) <= _SAME
    is_alike = (patches.kind[some] == kind) & (kind != PatchKind.FREE) & (is_parallel | (kind == PatchKind.SPHERE))
    return _Gap(along, length(origin - along[:, None] * own[3]), length(origin), is_alike)


def _close(view: View, patch: int, gap: _Gap, near: float) -> F64:
    return np.asarray(near + _SAME * (gap.far + view.geometry.patches.size[patch, 0]))


def _is_offset(view: View, patch: int, some: I32, gap: _Gap, near: float) -> Bools:
    """Parallel planes, coaxial cylinders, concentric spheres, cones of one angle round one axis, tori of one circle."""
    patches, close = view.geometry.patches, _close(view, patch, gap, near)
    kind = patches.kind[patch]
    is_first_size = np.abs(patches.size[some, 0] - patches.size[patch, 0]) <= close
    is_turned = dot(patches.frame[some, 3], patches.frame[patch, 3]) < 0.0
    if kind == PatchKind.PLANE:
        return gap.is_alike
    if kind == PatchKind.CYLINDER:
        return np.asarray(gap.is_alike & (gap.beside <= close))
    if kind == PatchKind.CONE:
        return np.asarray(gap.is_alike & (gap.beside <= close) & is_first_size & ~is_turned)
    is_placed = gap.is_alike & (gap.far <= close)
    return np.asarray(is_placed if kind == PatchKind.SPHERE else is_placed & is_first_size)


def _is_same(view: View, patch: int, some: I32, gap: _Gap, near: float) -> Bools:
    """Patches on the very surface of another, whichever side of it is solid."""
    patches, close = view.geometry.patches, _close(view, patch, gap, near)
    kind = patches.kind[patch]
    is_sized = np.abs(patches.size[some] - patches.size[patch]).max(axis=1) <= close
    is_level = np.abs(gap.along) <= close if kind in (PatchKind.PLANE, PatchKind.CONE) else True
    return np.asarray(_is_offset(view, patch, some, gap, near) & is_sized & is_level)


def _slack(view: View, patch: int) -> float:
    """Share of a chord's square by which chords may leave a patch: `_SAGITTA` over its radius."""
    size = view.geometry.patches.size[patch]
    kind = view.geometry.patches.kind[patch]
    if kind in (PatchKind.PLANE, PatchKind.CONE):
        return 0.0 if kind == PatchKind.PLANE else _SAGITTA
    return _SAGITTA / float(size[1] if kind == PatchKind.TORUS else size[0])


def _is_along(view: View, edges: I32, middle: F64, slack: float, near: float) -> Bools:
    """Whether points (k,3) lie on sides (n,2), within what chords leave."""
    if not len(edges):
        return np.zeros(len(middle), np.bool_)
    start, along = view.world[edges[:, 0]], view.world[edges[:, 1]] - view.world[edges[:, 0]]
    square = dot(along, along)
    away = middle[:, None] - start
    share = np.clip(dot(away, along[None]) / np.where(square > 0.0, square, 1.0), 0.0, 1.0)
    off = length(away - share[:, :, None] * along)
    return np.asarray((off <= 4.0 * near + slack * square).any(axis=1))


def _shared_sides(view: View, faces: I32, others: I32) -> I32:
    """Sides (k,2) in which triangles (m,3) of two patches meet."""
    own, its = _sides(faces), _sides(others)
    key, other = (sides[:, 0].astype(np.int64) * len(view.points) + sides[:, 1] for sides in (own, its))
    return own[np.isin(key, other)]


def _sides(faces: I32) -> I32:
    """All sides (3m,2) of triangles, the vertex of the lower row first."""
    sides = np.concatenate([faces[:, [k, (k + 1) % 3]] for k in range(3)])
    return np.sort(sides, axis=1)

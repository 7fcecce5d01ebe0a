"""From triangles that know their surfaces to the contract's mesh: patches, edge kinds, exact normals."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import EdgeKind, FaceOrigin, Mesh, PatchKind

from .flaw import SolidError
from .surfaces import SAME_SURFACE, Surfaces, describe, normals, plane_normals
from .topology import paired_sides

F64 = NDArray[np.float64]
I32 = NDArray[np.int32]
F32 = NDArray[np.float32]
I64 = NDArray[np.int64]

TANGENT_WITHIN = 0.1
"""Two patches whose normals differ by at most this many degrees along an edge are tangent: an author who rounds a
tangent point to a thousandth of the radius stays within it."""


def finish(
    key: str,
    vertices: F64,
    faces: I32,
    face_surface: I32,
    face_source: I32,
    surfaces: Surfaces,
    free_normals: F64 | None = None,
) -> Mesh:
    """Assemble a mesh.

    vertices (n,3); faces (m,3); face_surface (m,) row of `surfaces`, which are outward; face_source (m,);
    free_normals (m,3,3) for the faces of FREE surfaces. Neighbouring patches on one surface become one patch, numbered
    in the order of their first triangles. Cost: one sort of the 3m sides.
    """
    row, surfaces = _in_use(face_surface, surfaces)
    one, other, closed = paired_sides(faces, len(vertices))
    met = np.flatnonzero(row[one // 3] != row[other // 3])
    one_met, other_met = one[met], other[met]
    row, surfaces = _merge(row, surfaces, one_met // 3, other_met // 3, float(np.abs(vertices).max(initial=0.0)))
    corner = _corner_normals(vertices, faces, row, surfaces)
    free = np.flatnonzero(surfaces.kind[row] == PatchKind.FREE)
    if len(free):
        if free_normals is None:
            raise SolidError("a free surface without normals")
        corner[free] = _kept_normals(vertices[faces[free]], free_normals[free])
    return Mesh(
        key=key,
        vertices=vertices,
        faces=faces,
        corner_normals=corner,
        face_patch=row,
        face_origin=np.full(len(faces), FaceOrigin.SURFACE, np.uint8),
        face_source=face_source,
        edge_kind=edge_kinds(row, (one, other), closed, (one_met, other_met), corner),
        patches=describe(surfaces),
        closed=closed,
    )


def _in_use(face_surface: I32, surfaces: Surfaces) -> tuple[I32, Surfaces]:
    used = np.zeros(len(surfaces), np.bool_)
    used[face_surface] = True
    number = np.cumsum(used, dtype=np.int32) - np.int32(1)
    return number[face_surface], surfaces.take(np.flatnonzero(used))


def _merge(row: I32, surfaces: Surfaces, face: I64, neighbour: I64, size: float) -> tuple[I32, Surfaces]:
    """Join neighbouring patches on one surface; renumber by first triangle."""
    n = len(surfaces)
    one, other = row[face].astype(np.int64), row[neighbour].astype(np.int64)
    pairs = np.unique(np.minimum(one, other) * n + np.maximum(one, other))
    low, high = pairs // n, pairs % n
    same = _same(surfaces, low, high, size)
    root = np.arange(n)
    for a, b in zip(low[same].tolist(), high[same].tolist(), strict=True):
        a, b = _root(root, a), _root(root, b)
        root[max(a, b)] = min(a, b)
    for k in range(n):
        root[k] = root[root[k]]
    row = root[row].astype(np.int32)
    first = np.full(n, len(row))
    np.minimum.at(first, row, np.arange(len(row)))
    kept = np.argsort(first, kind="stable")[: np.count_nonzero(first < len(row))]
    number = np.empty(n, np.int32)
    number[kept] = np.arange(len(kept), dtype=np.int32)
    return number[row], surfaces.take(kept)


def _root(root: NDArray[np.intp], k: int) -> int:
    while root[k] != k:
        root[k] = root[root[k]]
        k = int(root[k])
    return k


def _same(surfaces: Surfaces, one: NDArray[np.int64], other: NDArray[np.int64], size: float) -> NDArray[np.bool_]:
    """Whether two rows are the same surface with the solid on the same side. Skew (free) surfaces never are."""
    same = surfaces.kind[one] == surfaces.kind[other]
    near = SAME_SURFACE * max(size, 1e-12)
    flat = np.flatnonzero(same & (surfaces.kind[one] == PatchKind.PLANE))
    curved = np.flatnonzero(same & (surfaces.kind[one] != PatchKind.PLANE))
    if len(flat):
        a, b = surfaces.take(one[flat]), surfaces.take(other[flat])
        z = plane_normals(a)
        apart = b.affine[:, :, 3] - a.affine[:, :, 3]
        turned = np.abs(z - plane_normals(b)).max(axis=1)
        same[flat] = (turned <= SAME_SURFACE) & (np.abs((apart * z).sum(axis=1)) <= near)
    if len(curved):
        same[curved] = _same_curved(surfaces, one[curved], other[curved], near)
    return np.asarray(same)


def _same_curved(
    surfaces: Surfaces, one: NDArray[np.int64], other: NDArray[np.int64], near: float
) -> NDArray[np.bool_]:
    a, b = describe(surfaces.take(one)), describe(surfaces.take(other))
    z, apart = a.frame[:, 3], b.frame[:, 0] - a.frame[:, 0]
    along = (apart * z).sum(axis=1)[:, None]
    # A cylinder's origin may slide along its axis; the other kinds have one origin. A sphere has no axis.
    apart = np.where((a.kind == PatchKind.CYLINDER)[:, None], apart - along * z, apart)
    turned = np.abs(z - b.frame[:, 3]).max(axis=1)
    reversed_axis = np.abs(z + b.frame[:, 3]).max(axis=1)
    turned = np.where(a.kind == PatchKind.CONE, turned, np.minimum(turned, reversed_axis))
    parallel = (turned <= SAME_SURFACE) | (a.kind == PatchKind.SPHERE)
    same = (a.kind == b.kind) & (a.kind != PatchKind.FREE) & (a.inward == b.inward) & parallel
    same &= (np.abs(apart).max(axis=1) <= near) & (np.abs(a.size - b.size).max(axis=1) <= near)
    return np.asarray(same)


def _corner_normals(vertices: F64, faces: I32, row: I32, surfaces: Surfaces) -> F32:
    """Exact normals (m,3,3). Where a surface has none, the normal at the middle of the triangle, else its own."""
    flat_rows = surfaces.kind == PatchKind.PLANE
    flat = flat_rows[row]
    corner = np.empty((len(faces), 3, 3), np.float32)
    if flat.any():
        every = np.zeros((len(surfaces), 3), np.float32)
        every[flat_rows] = plane_normals(surfaces.take(np.flatnonzero(flat_rows)))
        corner[:] = every[row][:, None]
    curved = np.flatnonzero(~flat & (surfaces.kind != PatchKind.FREE)[row])
    if not len(curved):
        return corner
    # Most vertices lie on one curved patch and are worked out once; those on several, again for each corner.
    used, of_row = faces[curved], row[curved]
    vertex_row = np.full(len(vertices), -1, np.int32)
    vertex_row[used] = of_row[:, None]
    known = np.flatnonzero(vertex_row >= 0)
    at_vertex = np.empty((len(vertices), 3), np.float32)
    at_vertex[known] = normals(surfaces, vertex_row[known], vertices[known])
    some = at_vertex[used]
    face, k = np.nonzero(vertex_row[used] != of_row[:, None])
    some[face, k] = normals(surfaces, of_row[face], vertices[used[face, k]])
    if np.isin(surfaces.kind, (PatchKind.CONE, PatchKind.TORUS)).any():
        face, k = np.nonzero((some == 0.0).all(axis=2))
        some[face, k] = _middle_normals(vertices[used[face]], of_row[face], surfaces)
    corner[curved] = some
    return corner


def _kept_normals(triangles: F64, normals: F64) -> F64:
    """Normals (k,3,3) as unit vectors, those of the triangle where none is kept."""
    own = np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])
    found = np.where((normals == 0.0).all(axis=2)[:, :, None], own[:, None], normals)
    length = np.sqrt((found**2).sum(axis=2))[:, :, None]
    return np.where(length > 0.0, found / np.where(length > 0.0, length, 1.0), (0.0, 0.0, 1.0))


def _middle_normals(triangles: F64, row: I32, surfaces: Surfaces) -> F64:
    normal = normals(surfaces, row, triangles.mean(axis=1))
    own = np.cross(triangles[:, 1] - triangles[:, 0], triangles[:, 2] - triangles[:, 0])
    length = np.sqrt((own**2).sum(axis=1))[:, None]
    own = np.where(length > 0.0, own / np.where(length > 0.0, length, 1.0), (0.0, 0.0, 1.0))
    return np.where((normal == 0.0).all(axis=1)[:, None], own, normal)


def edge_kinds(
    row: I32, paired: tuple[I64, I64], closed: bool, met: tuple[I64, I64], corner: F32
) -> NDArray[np.uint8]:
    """Kinds (m,3): `paired` are all sides that have a mate, `met` those where two patches met before merging."""
    kind = np.full(3 * len(row), EdgeKind.INSIDE if closed else EdgeKind.BORDER, np.uint8)
    if not closed:
        kind[np.concatenate(paired)] = EdgeKind.INSIDE
    apart = row[met[0] // 3] != row[met[1] // 3]
    one, other = met[0][apart], met[1][apart]
    face, k, face2, k2 = one // 3, one % 3, other // 3, other % 3
    # A side's far end is the near end of its mate.
    near = (corner[face, k].astype(np.float64) * corner[face2, (k2 + 1) % 3]).sum(axis=1)
    far = (corner[face, (k + 1) % 3].astype(np.float64) * corner[face2, k2]).sum(axis=1)
    tangent = np.minimum(near, far) >= np.cos(np.radians(TANGENT_WITHIN))
    kind[one] = kind[other] = np.where(tangent, EdgeKind.TANGENT, EdgeKind.SHARP)
    return kind.reshape(-1, 3)

"""From triangles that know their surfaces to the contract's mesh: patches, edge kinds, exact normals."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import EdgeKind, FaceOrigin, Mesh, PatchKind

from .flaw import SolidError
from .surfaces import SAME_SURFACE, Surfaces, describe, normals, plane_normals
from .topology import first_seen, paired_sides

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
    met = np.flatnonzero(row.take(one // 3) != row.take(other // 3))
    one_met, other_met = one.take(met), other.take(met)
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
    if used.all():
        return face_surface, surfaces
    number = np.cumsum(used, dtype=np.int32) - np.int32(1)
    return number[face_surface], surfaces.take(np.flatnonzero(used))


def _merge(row: I32, surfaces: Surfaces, face: I64, neighbour: I64, size: float) -> tuple[I32, Surfaces]:
    """Join neighbouring patches on one surface; renumber by first triangle."""
    n = len(surfaces)
    one, other = row[face].astype(np.int64), row[neighbour].astype(np.int64)
    pairs = np.sort(np.minimum(one, other) * n + np.maximum(one, other))
    pairs = pairs[np.flatnonzero(np.diff(pairs, prepend=-1))]
    low, high = pairs // n, pairs % n
    same = np.flatnonzero(_same(surfaces, low, high, size))
    if len(same):
        row = _joined(n, low[same], high[same])[row]
    number, kept = first_seen(row, n)
    return number.astype(np.int32), surfaces.take(kept)


def _joined(n: int, low: I64, high: I64) -> I32:
    """For each of n the least that it is joined to by pairs (k,) and (k,)."""
    root = np.arange(n, dtype=np.int32)
    for a, b in zip(low.tolist(), high.tolist(), strict=True):
        a, b = _root(root, a), _root(root, b)
        root[max(a, b)] = min(a, b)
    for k in range(n):
        root[k] = root[root[k]]
    return root


def _root(root: I32, k: int) -> int:
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
    flat = np.flatnonzero(surfaces.kind == PatchKind.PLANE)
    curved = np.flatnonzero(((surfaces.kind != PatchKind.PLANE) & (surfaces.kind != PatchKind.FREE))[row])
    # One row for every surface, then one for every vertex: most vertices lie on one curved patch and are worked out
    # once; those on several, again for each corner.
    table = np.zeros((len(surfaces) + len(vertices), 3), np.float32)
    table[flat] = plane_normals(surfaces.take(flat))
    at = np.repeat(row, 3)
    if not len(curved):
        return table.take(at, axis=0).reshape(-1, 3, 3)
    used, of_row = faces.take(curved, axis=0).ravel(), np.repeat(row[curved], 3)
    vertex_row = np.full(len(vertices), -1, np.int32)
    vertex_row[used] = of_row
    known = np.flatnonzero(vertex_row >= 0)
    table[len(surfaces) + known] = normals(surfaces, vertex_row[known], vertices.take(known, axis=0))
    at.reshape(-1, 3)[curved] = used.reshape(-1, 3) + np.int32(len(surfaces))
    corner = table.take(at, axis=0).reshape(-1, 3, 3)
    again = np.flatnonzero(vertex_row.take(used) != of_row)
    if len(again):
        corner[curved[again // 3], again % 3] = normals(surfaces, of_row[again], vertices[used[again]])
    if ((surfaces.kind == PatchKind.CONE) | (surfaces.kind == PatchKind.TORUS)).any():
        face, k = np.nonzero((corner[curved] == 0.0).all(axis=2))
        if len(face):
            face = curved[face]
            corner[face, k] = _middle_normals(vertices[faces[face]], row[face], surfaces)
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


def edge_kinds(row: I32, paired: tuple[I64, I64], closed: bool, met: tuple[I64, I64], corner: F32) -> NDArray[np.uint8]:
    """Kinds (m,3): `paired` are all sides that have a mate, `met` those where two patches met before merging."""
    kind = np.full(3 * len(row), EdgeKind.INSIDE if closed else EdgeKind.BORDER, np.uint8)
    if not closed:
        kind[np.concatenate(paired)] = EdgeKind.INSIDE
    apart = np.flatnonzero(row.take(met[0] // 3) != row.take(met[1] // 3))
    one, other = met[0].take(apart), met[1].take(apart)
    # A side's far end is the near end of its mate.
    at_side = corner.reshape(-1, 3)
    near = _dot(at_side.take(one, axis=0), at_side.take(_next(other), axis=0))
    far = _dot(at_side.take(_next(one), axis=0), at_side.take(other, axis=0))
    tangent = np.minimum(near, far) >= np.cos(np.radians(TANGENT_WITHIN))
    kind[one] = kind[other] = np.where(tangent, EdgeKind.TANGENT, EdgeKind.SHARP)
    return kind.reshape(-1, 3)


def _next(side: I64) -> I64:
    """The side of the same triangle that begins where each (k,) ends."""
    return np.where(side % 3 == 2, side - 2, side + 1)


def _dot(a: F32, b: F32) -> F64:
    product = a.astype(np.float64) * b
    total: F64 = product[:, 0] + product[:, 1] + product[:, 2]
    return total

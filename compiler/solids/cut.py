"""Cutting a finished mesh open for a section: what a cutter takes away, and the faces it leaves.

A cutter is a straight prism; a half space is one that reaches past everything. Cutting works on the triangles of the
mesh, so what stays keeps its patches, sources and normals, and only the faces of the cut are new.
"""

from __future__ import annotations

import hashlib
from dataclasses import dataclass

import manifold3d
import numpy as np
from manifold3d import Manifold
from numpy.typing import NDArray
from platewright.backend.contract import F32, F64, I32, FaceOrigin, Mesh, Patches, PatchKind

from .finish import edge_kinds
from .topology import paired_sides
from .transform import heights

CUT_VERSION = 1
"""Part of the key of every cut mesh; changes when the same cut gives other triangles."""


@dataclass(frozen=True, slots=True)
class Cutter:
    """A prism that takes material away.

    `profile` are the corners (u, v) of a simple polygon, counter-clockwise; `origin` and the unit axes `u`, `v` place
    it; it reaches along w = u x v from `low` to `high`. Side k runs from corner k to corner k+1. `origins` say what the
    faces are that the cut leaves: one `FaceOrigin` for each side, then those of the ends at `low` and at `high`.
    """

    profile: tuple[tuple[float, float], ...]
    origin: tuple[float, float, float]
    u: tuple[float, float, float]
    v: tuple[float, float, float]
    low: float
    high: float
    origins: tuple[int, ...]

    @property
    def key(self) -> str:
        """The cutter's content as text."""
        return repr((self.profile, self.origin, self.u, self.v, self.low, self.high, self.origins))


def cut_mesh(mesh: Mesh, placement: F64, cutter: Cutter) -> Mesh | None:
    """What a cutter, given in the world, leaves of a mesh placed by `placement` (4,4); None if nothing is left.

    The mesh itself comes back where the cutter misses it. The mesh must be closed (ValueError). Faces of the cut have
    the patch of their plane, one for each side of the cutter that cuts. Cost: one boolean of the mesh and a prism.
    """
    if not mesh.closed:
        raise ValueError("an open mesh cannot be cut")
    prism, frames = _prism(cutter, placement)
    if not _meets(mesh.vertices, prism):
        return mesh
    number = Manifold.reserve_ids(2)
    solid = _imported(mesh.vertices, mesh.faces, np.arange(len(mesh.faces)), number)
    tool = _imported(*prism, number + 1)
    result = solid - tool
    if result.is_empty():
        return None
    after = result.to_mesh64()
    source, is_cut, vertices, faces = _read(after, number)
    if not is_cut.any() and len(faces) == len(mesh.faces):
        return mesh
    key = hashlib.sha256(f"{CUT_VERSION} {mesh.key} {placement.tobytes().hex()} {cutter.key}".encode()).hexdigest()
    return _assembled(mesh, key, vertices, faces, source, is_cut, frames, cutter)


def half_space(normal: tuple[float, float, float], offset: float, middle: F64, reach: float) -> Cutter:
    """The cutter that takes all of a ball with `middle` (3,) and radius `reach` that lies beyond a plane.

    The plane holds the points x with x . normal = offset; the unit `normal` points into what goes.
    """
    u = _square_to(normal)
    off = offset - float(sum(a * b for a, b in zip(normal, middle, strict=True)))
    x, y, z = (float(middle[k] + normal[k] * off) for k in range(3))
    wide, deep = 2.0 * reach, 2.0 * reach + abs(off)
    profile = ((-wide, 0.0), (wide, 0.0), (wide, deep), (-wide, deep))
    cap, rest = int(FaceOrigin.SECTION_CAP), int(FaceOrigin.BREAK)
    # w = u x normal; its direction does not matter, the prism reaches as far both ways.
    return Cutter(profile, (x, y, z), u, normal, -wide, wide, (cap, rest, rest, rest, rest, rest))


def _square_to(normal: tuple[float, float, float]) -> tuple[float, float, float]:
    """A unit vector square to a unit vector."""
    x, y, z = normal
    least = min(range(3), key=lambda k: abs(normal[k]))
    other = [float(k == least) for k in range(3)]
    a, b, c = y * other[2] - z * other[1], z * other[0] - x * other[2], x * other[1] - y * other[0]
    size = (a * a + b * b + c * c) ** 0.5
    return (a / size, b / size, c / size)


def _prism(cutter: Cutter, placement: F64) -> tuple[tuple[F64, I32, I32], F64]:
    """The cutter in the mesh's frame: vertices, faces, the row of each face's side; and frames (k,4,3) of its faces as
    they bound what is left: origin, x, y, z with z out of the material.
    """
    profile = np.array(cutter.profile, np.float64)
    n = len(profile)
    u, v, origin = (np.array(each, np.float64) for each in (cutter.u, cutter.v, cutter.origin))
    w = np.array((u[1] * v[2] - u[2] * v[1], u[2] * v[0] - u[0] * v[2], u[0] * v[1] - u[1] * v[0]))
    flat = origin + profile[:, :1] * u + profile[:, 1:] * v
    world = np.concatenate((flat + cutter.low * w, flat + cutter.high * w))
    linear = np.ascontiguousarray(placement[:3, :3])
    inverse, determinant = _inverse(linear)
    vertices = _times(inverse, world - placement[:3, 3])
    following = np.roll(np.arange(n), -1)
    walls = np.stack(
        (
            np.stack((np.arange(n), following, following + n), axis=1),
            np.stack((np.arange(n), following + n, np.arange(n) + n), axis=1),
        ),
        axis=1,
    ).reshape(-1, 3)
    lid = np.asarray(manifold3d.triangulate([profile]), np.int64)
    faces = np.concatenate((walls, lid[:, ::-1], lid + n)).astype(np.int32)
    sides = np.concatenate((np.repeat(np.arange(n), 2), np.full(len(lid), n), np.full(len(lid), n + 1))).astype(
        np.int32
    )
    if determinant < 0.0:
        faces = np.ascontiguousarray(faces[:, ::-1])
    way = profile[following] - profile
    way = way / np.sqrt((way**2).sum(axis=1))[:, None]
    x_axes = np.concatenate((way[:, :1] * u + way[:, 1:] * v, [u], [u]))
    # Out of the material is into the cutter: left of a side, up from its lower end.
    z_axes = np.concatenate((-way[:, 1:] * u + way[:, :1] * v, [w], [-w]))
    origins = np.concatenate((flat, [flat[0] + cutter.low * w], [flat[0] + cutter.high * w]))
    frames = np.stack(
        (_times(inverse, origins - placement[:3, 3]), _units(inverse, x_axes), np.zeros_like(x_axes), z_axes), axis=1
    )
    # Normals go by the transpose of the map from the mesh to the world.
    z_local = _times(linear.T, z_axes)
    frames[:, 3] = z_local / np.sqrt((z_local**2).sum(axis=1))[:, None]
    frames[:, 2] = np.cross(frames[:, 3], frames[:, 1])
    return (vertices, faces, sides), frames


def _inverse(matrix: F64) -> tuple[F64, float]:
    """The inverse of a (3,3) matrix by its cofactors, and its determinant."""
    a, b, c = matrix
    rows = (np.cross(b, c), np.cross(c, a), np.cross(a, b))
    determinant = float(a[0] * rows[0][0] + a[1] * rows[0][1] + a[2] * rows[0][2])
    return np.stack(rows, axis=1) / determinant, determinant


def _times(matrix: F64, points: F64) -> F64:
    """(3,3) times points (n,3), sums spelt out so that their order is the same everywhere."""
    x, y, z = points[:, 0:1], points[:, 1:2], points[:, 2:3]
    return np.asarray(matrix[:, 0] * x + matrix[:, 1] * y + matrix[:, 2] * z)


def _units(matrix: F64, vectors: F64) -> F64:
    found = _times(matrix, vectors)
    return np.asarray(found / np.sqrt((found**2).sum(axis=1))[:, None])


def _meets(vertices: F64, prism: tuple[F64, I32, I32]) -> bool:
    """Whether the boxes meet, and no face of the (convex hull of the) prism has all the vertices outside."""
    corners, faces, _ = prism
    if (vertices.max(axis=0) < corners.min(axis=0)).any() or (vertices.min(axis=0) > corners.max(axis=0)).any():
        return False
    a, b, c = corners[faces[:, 0]], corners[faces[:, 1]], corners[faces[:, 2]]
    normal = np.cross(b - a, c - a)
    for k in range(len(faces)):
        ours = (heights(vertices, normal[k]) - heights(a[k : k + 1], normal[k])).min()
        theirs = (heights(corners, normal[k]) - heights(a[k : k + 1], normal[k])).max()
        # The face separates the two only where it bounds the whole prism.
        if ours >= 0.0 and theirs <= 1e-9 * abs(normal[k]).max():
            return False
    return True


def _imported(vertices: F64, faces: I32, face_id: NDArray[np.integer], number: int) -> Manifold:
    mesh = manifold3d.Mesh64(
        vert_properties=np.ascontiguousarray(vertices),
        tri_verts=faces.astype(np.uint64),
        run_index=np.array([0, faces.size], np.uint64),
        run_original_id=np.array([number], np.uint32),
        face_id=np.asarray(face_id, np.uint64),
    )
    manifold = Manifold(mesh)
    if manifold.status() != manifold3d.Error.NoError:
        raise ValueError(f"a closed mesh that the kernel refuses: {manifold.status()}")
    return manifold


def _read(after: manifold3d.Mesh64, number: int) -> tuple[I32, NDArray[np.bool_], F64, I32]:
    """For every triangle the row it comes from, whether it is one of the cut; vertices; faces."""
    starts = np.array(after.run_index, np.int64) // 3
    lengths = starts[1:] - starts[:-1]
    is_cut = np.repeat(np.array(after.run_original_id, np.int64) != number, lengths)
    vertices = np.ascontiguousarray(after.vert_properties[:, :3]) + 0.0
    faces = np.array(after.tri_verts, np.int32).reshape(-1, 3)
    source = np.array(after.face_id, np.int32)
    # Runs come back in the order the kernel likes; ours first, in the order of the mesh.
    order = np.lexsort((source, is_cut))
    return source[order], is_cut[order], vertices, faces[order]


def _assembled(
    mesh: Mesh,
    key: str,
    vertices: F64,
    faces: I32,
    source: I32,
    is_cut: NDArray[np.bool_],
    frames: F64,
    cutter: Cutter,
) -> Mesh:
    n_patches = len(mesh.patches.kind)
    kept, new = np.flatnonzero(~is_cut), np.flatnonzero(is_cut)
    used = np.flatnonzero(np.bincount(source[new], minlength=len(frames)))
    row_of_side = np.full(len(frames), -1, np.int32)
    row_of_side[used] = n_patches + np.arange(len(used), dtype=np.int32)
    patch = np.empty(len(faces), np.int32)
    patch[kept], patch[new] = mesh.face_patch[source[kept]], row_of_side[source[new]]
    origin = np.empty(len(faces), np.uint8)
    origin[kept] = mesh.face_origin[source[kept]]
    origin[new] = np.array(cutter.origins, np.uint8)[source[new]]
    corner = np.empty((len(faces), 3, 3), np.float32)
    corner[kept] = _carried(mesh, vertices[faces[kept]], source[kept])
    corner[new] = frames[source[new], 3][:, None]
    face_source = np.full(len(faces), -1, np.int32)
    face_source[kept] = mesh.face_source[source[kept]]
    patches = Patches(
        np.concatenate((mesh.patches.kind, np.full(len(used), PatchKind.PLANE, np.uint8))),
        np.concatenate((mesh.patches.frame, frames[used])),
        np.concatenate((mesh.patches.size, np.zeros((len(used), 2)))),
        np.concatenate((mesh.patches.inward, np.zeros(len(used), np.bool_))),
    )
    one, other, closed = paired_sides(faces, len(vertices))
    apart = np.flatnonzero(patch[one // 3] != patch[other // 3])
    kinds = edge_kinds(patch, (one, other), closed, (one[apart], other[apart]), corner)
    return Mesh(key, vertices, faces, corner, patch, origin, face_source, kinds, patches, closed)


def _carried(mesh: Mesh, triangles: F64, source: I32) -> F32:
    """Corner normals of triangles (k,3,3) that are pieces of the mesh's triangles `source`, by their place in them."""
    whole = mesh.vertices[mesh.faces[source]]
    normals = mesh.corner_normals[source].astype(np.float64)
    is_flat = (mesh.corner_normals[source] == mesh.corner_normals[source][:, :1]).all(axis=(1, 2))
    a, ab, ac = whole[:, None, 0], whole[:, None, 1] - whole[:, None, 0], whole[:, None, 2] - whole[:, None, 0]
    ap = triangles - a
    d00, d01, d11 = (ab * ab).sum(axis=2), (ab * ac).sum(axis=2), (ac * ac).sum(axis=2)
    d20, d21 = (ap * ab).sum(axis=2), (ap * ac).sum(axis=2)
    area = d00 * d11 - d01 * d01
    area = np.where(area > 0.0, area, 1.0)
    v, w = (d11 * d20 - d01 * d21) / area, (d00 * d21 - d01 * d20) / area
    v, w = v.clip(0.0, 1.0)[..., None], w.clip(0.0, 1.0)[..., None]
    mixed = normals[:, None, 0] * (1.0 - v - w) + normals[:, None, 1] * v + normals[:, None, 2] * w
    mixed = np.where(is_flat[:, None, None], normals[:, :1], mixed)
    length = np.sqrt((mixed**2).sum(axis=2))[..., None]
    return np.asarray(mixed / np.where(length > 0.0, length, 1.0), np.float32)

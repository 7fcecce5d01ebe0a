"""Triangles of a view cut at a plane before the eye (central projection)."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ..contract import F32, F64, I32, U8, EdgeKind

NEAR = 0.01
"""mm: nothing nearer to the plane of the projection centre is drawn."""


@dataclass(frozen=True, eq=False, slots=True)
class Triangles:
    """What a view is made of before it is mapped: world (n,3), faces (m,3), corner normals (m,3,3), kinds of sides
    (m,3), rows (m,) of the geometry's faces or None for all in order, neighbours (m,3)."""

    world: F64
    faces: I32
    corner_normals: F32
    edge_kind: U8
    row: I32 | None
    neighbour: I32

    def with_neighbour(self, neighbour: I32) -> Triangles:
        """The same with other neighbours."""
        return replace(self, neighbour=neighbour)


def cut_near(mesh: Triangles, weight: F64) -> Triangles:
    """Keep what lies at least `NEAR` before the plane of the projection centre.

    weight (n,) is W of every vertex. A triangle that crosses becomes one or two; both triangles at a side get the same
    new point. The cut itself and the diagonal are no edges. Neighbours are left to be found anew. Cost: the crossing
    triangles.
    """
    inside = weight >= NEAR
    n_inside = inside[mesh.faces].sum(axis=1)
    whole = np.flatnonzero(n_inside == 3)
    pieces = [_Pieces(mesh.faces[whole], mesh.corner_normals[whole], mesh.edge_kind[whole], whole)]
    world = mesh.world
    crossing = np.flatnonzero((n_inside == 1) | (n_inside == 2))
    if len(crossing):
        added = _Points(mesh.world, weight)
        pieces.extend(_cut(mesh, int(face), inside, added) for face in crossing)
        world = np.concatenate([mesh.world, np.array(added.points).reshape(-1, 3)])
    from_face = np.concatenate([piece.face for piece in pieces]).astype(np.int32)
    return Triangles(
        world,
        np.concatenate([piece.faces for piece in pieces]).astype(np.int32),
        np.concatenate([piece.normals for piece in pieces]).astype(np.float32),
        np.concatenate([piece.kinds for piece in pieces]).astype(np.uint8),
        from_face if mesh.row is None else mesh.row[from_face],
        mesh.neighbour,
    )


@dataclass(frozen=True, eq=False, slots=True)
class _Pieces:
    faces: I32
    normals: F32
    kinds: U8
    face: np.ndarray[tuple[int, ...], np.dtype[np.int64]]


class _Points:
    """New points on sides, one for each side, reckoned from its inner to its outer end."""

    def __init__(self, world: F64, weight: F64) -> None:
        self.world, self.weight = world, weight
        self.points: list[F64] = []
        self.of_side: dict[tuple[int, int], int] = {}

    def at(self, inner: int, outer: int) -> tuple[int, float]:
        """Row of the point where a side crosses, and how far along from its inner end."""
        share = float((self.weight[inner] - NEAR) / (self.weight[inner] - self.weight[outer]))
        key = (inner, outer)
        if key not in self.of_side:
            self.of_side[key] = len(self.world) + len(self.points)
            self.points.append(self.world[inner] + share * (self.world[outer] - self.world[inner]))
        return self.of_side[key], share


def _cut(mesh: Triangles, face: int, inside: np.ndarray[tuple[int, ...], np.dtype[np.bool_]], new: _Points) -> _Pieces:
    corners, normals, kinds = mesh.faces[face], mesh.corner_normals[face], mesh.edge_kind[face]
    rows: list[int] = []
    turned: list[F32] = []
    along: list[int] = []  # kind of the side that leaves each point of the outline
    for k in range(3):
        j = (k + 1) % 3
        a, b = int(corners[k]), int(corners[j])
        if inside[a]:
            rows.append(a)
            turned.append(normals[k])
            along.append(int(kinds[k]))
        if inside[a] != inside[b]:
            (inner, outer), (near, far) = ((a, b), (k, j)) if inside[a] else ((b, a), (j, k))
            row, share = new.at(inner, outer)
            rows.append(row)
            turned.append((normals[near] + np.float32(share) * (normals[far] - normals[near])).astype(np.float32))
            along.append(int(EdgeKind.INSIDE) if inside[a] else int(kinds[k]))
    faces = [(0, i, i + 1) for i in range(1, len(rows) - 1)]
    inner_side = int(EdgeKind.INSIDE)
    last = len(rows) - 1
    return _Pieces(
        np.array([[rows[i] for i in each] for each in faces], np.int32),
        np.array([[turned[i] for i in each] for each in faces], np.float32),
        np.array(
            [
                [along[0] if i == 1 else inner_side, along[i], along[last] if j == last else inner_side]
                for _, i, j in faces
            ],
            np.uint8,
        ),
        np.full(len(faces), face, np.int64),
    )

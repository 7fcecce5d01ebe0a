"""The convex hull of points as a solid: plane faces as they are, and round stretches as one smooth surface each.

The hull is the boolean kernel's. Facets that turn at a side by no more than those of the round shapes inside do belong
to one round stretch; where they turn by more, they meet in an edge. Flat shapes have no round stretches.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from manifold3d import Manifold
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from .flaw import SolidError
from .shell import Shell, shell
from .surfaces import plane, surfaces
from .topology import paired_sides

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]

_FLAT = 1e-9
_SLACK = 1.25
"""Of the turn between facets of the shapes inside, that of the hull's may be larger."""


def largest_turn(inside: Shell) -> float:
    """The largest angle in degrees by which neighbouring facets of one curved surface turn; 0 where all are flat."""
    one, other, _ = paired_sides(inside.faces, len(inside.vertices))
    one, other = one // 3, other // 3
    row = inside.face_surface
    same = (row[one] == row[other]) & (inside.surfaces.kind[row[one]] != PatchKind.PLANE)
    own = _own_normals(inside.vertices, inside.faces)
    turn = (own[one[same]] * own[other[same]]).sum(axis=1)
    return float(np.degrees(np.arccos(np.clip(turn.min(), -1.0, 1.0)))) if len(turn) else 0.0


def envelope(points: Sequence[F64], turn_inside: float) -> Shell:
    """The convex hull of all points, each (n,3), of shapes whose facets turn by so many degrees at most.

    SolidError if it has no volume.
    """
    hull = Manifold.hull_points(np.unique(np.round(np.concatenate(points), 12) + 0.0, axis=0))
    if hull.is_empty() or hull.volume() <= 0.0:
        raise SolidError("an envelope without volume")
    mesh = hull.to_mesh64()
    vertices, faces = np.asarray(mesh.vert_properties)[:, :3], np.asarray(mesh.tri_verts).astype(np.int64)
    a, b = vertices[faces[:, 0]], vertices[faces[:, 1]]
    own = _own_normals(vertices, faces)
    one, other, _ = paired_sides(faces.astype(np.int32), len(vertices))
    turn = (own[one // 3] * own[other // 3]).sum(axis=1)
    flat = _groups(len(faces), one[turn >= 1.0 - _FLAT] // 3, other[turn >= 1.0 - _FLAT] // 3)
    smooth = turn >= min(1.0 - _FLAT, float(np.cos(np.radians(_SLACK * turn_inside))))
    round_ones = _groups(len(faces), one[smooth] // 3, other[smooth] // 3)
    pieces: list[tuple[I64, int]] = []
    rows: list[tuple[PatchKind, F64, float, bool]] = []
    normals = []
    for group in range(int(round_ones.max()) + 1):
        here = np.flatnonzero(round_ones == group)
        is_plane = len(np.unique(flat[here])) == 1
        pieces.append((faces[here], len(rows)))
        if is_plane:
            first = here[0]
            along = (b - a)[first] / np.sqrt(((b - a)[first] ** 2).sum())
            rows.append((PatchKind.PLANE, plane(a[first].tolist(), own[first].tolist(), along.tolist()), 0.0, False))
            normals.append(np.zeros((len(here), 3, 3)))
        else:
            rows.append((PatchKind.FREE, np.eye(3, 4), 0.0, False))
            normals.append(_smooth(vertices, faces[here], own[here]))
    return shell(vertices, pieces, surfaces(rows), np.concatenate(normals))


def _own_normals(vertices: F64, faces: NDArray[np.integer]) -> F64:
    """Unit normals (m,3) of triangles."""
    a, b, c = (vertices[faces[:, k]] for k in range(3))
    own = np.cross(b - a, c - a)
    length = np.sqrt((own**2).sum(axis=1))
    return np.asarray(own / np.where(length > 0.0, length, 1.0)[:, None])


def _groups(n: int, one: I64, other: I64) -> I64:
    """Labels (n,) of what hangs together by pairs, from 0 in the order of first members."""
    label = np.arange(n)
    while True:
        low = np.minimum(label[one], label[other])
        before = label.copy()
        np.minimum.at(label, one, low)
        np.minimum.at(label, other, low)
        label = label[label]
        if np.array_equal(label, before):
            return np.asarray(np.unique(label, return_inverse=True)[1])


def _smooth(vertices: F64, faces: I64, own: F64) -> F64:
    """Normals (m,3,3) at corners, the mean of those of the group's triangles there, weighed by their angles."""
    total = np.zeros_like(vertices)
    for k in range(3):
        here = vertices[faces[:, k]]
        ahead, back = vertices[faces[:, (k + 1) % 3]] - here, vertices[faces[:, (k + 2) % 3]] - here
        lengths = np.sqrt((ahead**2).sum(axis=1) * (back**2).sum(axis=1))
        angle = np.arccos(np.clip((ahead * back).sum(axis=1) / lengths, -1.0, 1.0))
        np.add.at(total, faces[:, k], angle[:, None] * own)
    length = np.sqrt((total**2).sum(axis=1))
    total /= np.where(length > 0.0, length, 1.0)[:, None]
    return np.asarray(total[faces])

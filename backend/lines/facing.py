"""Kernels of one view: points to the page, and which triangles face the viewer."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..compiled import inner, kernel

EDGE_ON = 1e-5
"""A surface is seen edge-on where the sine of the angle between it and the sight is below this.

A face 100 mm long on paper is then at most 1 µm wide. Rounding of vertices to float32 tilts a facet 1 mm wide at
100 mm from the origin by about as much.
"""


@kernel
def map_points(world: Any, matrix: Any, begin: int, end: int, points: Any, weight: Any) -> float:
    """Page points of world points begin .. end, their weights W, and the least W. Sums run from left to right."""
    least = np.inf
    for v in range(begin, end):
        x, y, z = world[v, 0], world[v, 1], world[v, 2]
        w = matrix[3, 0] * x + matrix[3, 1] * y + matrix[3, 2] * z + matrix[3, 3]
        weight[v] = w
        least = min(least, w)
        for k in range(3):
            points[v, k] = (matrix[k, 0] * x + matrix[k, 1] * y + matrix[k, 2] * z + matrix[k, 3]) / w
    return least


@kernel
def tilt_faces(
    world: Any, faces: Any, face_patch: Any, is_planar: Any, eye: Any, begin: int, end: int,
    facing: Any, normals: Any, moments: Any,
) -> None:  # fmt: skip
    """Facing of the triangles begin .. end of smooth patches; of planar ones the sums that decide for the patch.

    eye (4,): the projection centre and 1, or the unit direction toward the viewer and 0. normals, moments (p,4): twice
    the area vector of each planar patch, and its centre times the weight in the last column.
    """
    for t in range(begin, end):
        a, b, c = faces[t, 0], faces[t, 1], faces[t, 2]
        ax, ay, az = world[a, 0], world[a, 1], world[a, 2]
        ux, uy, uz = world[b, 0] - ax, world[b, 1] - ay, world[b, 2] - az
        vx, vy, vz = world[c, 0] - ax, world[c, 1] - ay, world[c, 2] - az
        nx, ny, nz = uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx
        size = np.sqrt(nx * nx + ny * ny + nz * nz)
        patch = face_patch[t]
        if is_planar[patch]:
            normals[patch, 0] += nx
            normals[patch, 1] += ny
            normals[patch, 2] += nz
            moments[patch, 0] += size * (ax + (ux + vx) / 3.0)
            moments[patch, 1] += size * (ay + (uy + vy) / 3.0)
            moments[patch, 2] += size * (az + (uz + vz) / 3.0)
            moments[patch, 3] += size
        else:
            facing[t] = _facing(nx, ny, nz, size, ax, ay, az, eye)


@inner
def _facing(nx: Any, ny: Any, nz: Any, size: Any, px: Any, py: Any, pz: Any, eye: Any) -> int:
    dx, dy, dz = eye[0] - eye[3] * px, eye[1] - eye[3] * py, eye[2] - eye[3] * pz
    sine = nx * dx + ny * dy + nz * dz
    limit = EDGE_ON * size * np.sqrt(dx * dx + dy * dy + dz * dz)
    if sine > limit:
        return 1
    return -1 if sine < -limit else 0


@kernel
def face_patches(normals: Any, moments: Any, eye: Any, found: Any) -> None:
    """Facing (p,) int8 of the planar patches from their sums; others stay as they are."""
    for p in range(len(normals)):
        weight = moments[p, 3]
        if weight > 0.0:
            nx, ny, nz = normals[p, 0], normals[p, 1], normals[p, 2]
            size = np.sqrt(nx * nx + ny * ny + nz * nz)
            x, y, z = moments[p, 0] / weight, moments[p, 1] / weight, moments[p, 2] / weight
            found[p] = _facing(nx, ny, nz, size, x, y, z, eye)


@kernel
def settle(
    face_patch: Any, face_node: Any, is_planar: Any, patch_facing: Any, is_open: Any, is_ghost: Any,
    begin: int, end: int, facing: Any, is_occluder: Any,
) -> None:  # fmt: skip
    """Give triangles of planar patches the facing of the patch, and tell which triangles hide what is behind them."""
    for t in range(begin, end):
        if is_planar[face_patch[t]]:
            facing[t] = patch_facing[face_patch[t]]
        node = face_node[t]
        is_seen = facing[t] > 0 or (is_open[node] and facing[t] != 0)
        is_occluder[t] = is_seen and not is_ghost[node]

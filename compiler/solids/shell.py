"""The closed surface of one primitive in its own frame, before any placement or boolean."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from .surfaces import Surfaces
from .topology import in_use


@dataclass(frozen=True, eq=False, slots=True)
class Shell:
    """vertices (n,3) float64 mm; faces (m,3) int32, counter-clockwise from outside; face_surface (m,) int32 row of
    `surfaces`. Closed: every directed edge once and its reverse once.
    normals (m,3,3) float64, unit and outward at the corners of faces on FREE surfaces, which have no equation to
    take them from; None where there are no such faces.
    """

    vertices: NDArray[np.float64]
    faces: NDArray[np.int32]
    face_surface: NDArray[np.int32]
    surfaces: Surfaces
    normals: NDArray[np.float64] | None = None


def shell(
    vertices: NDArray[np.float64],
    pieces: Sequence[tuple[NDArray[np.integer], int]],
    surfaces: Surfaces,
    normals: NDArray[np.float64] | None = None,
) -> Shell:
    """From vertices and pieces, each the triangles (k,3) of one surface; vertices without triangles are left out.

    `normals` (m,3,3) are those of all triangles in the order of the pieces, read where a surface is FREE.
    """
    faces = np.concatenate([triangles for triangles, _ in pieces]).astype(np.int32)
    vertices, faces = in_use(vertices, faces)
    rows = np.repeat([row for _, row in pieces], [len(triangles) for triangles, _ in pieces]).astype(np.int32)
    return Shell(np.ascontiguousarray(vertices, np.float64) + 0.0, faces, rows, surfaces, normals)

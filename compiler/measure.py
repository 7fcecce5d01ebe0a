"""Measures of triangle meshes: volume, area, centroid, inertia, bounds, pieces, closedness, distances.

Every function takes vertices (n,3) float64 in mm and faces (m,3) integers, counter-clockwise from outside, in any
frame. Volumes, centroids and inertia mean something only for closed surfaces. Sums run over signed tetrahedra from
the middle of the box (divergence theorem), which keeps them accurate far from the origin.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from functools import cached_property

import manifold3d
import numpy as np
from numpy.typing import NDArray

from .solids.topology import components, paired_sides

F64 = NDArray[np.float64]
Faces = NDArray[np.integer]
_SAMPLE = 256


def volume(vertices: F64, faces: Faces) -> float:
    """Enclosed volume in mm3, negative if the faces look inward."""
    return float(_tetrahedra(_shifted(vertices), faces)[1].sum()) / 6.0


def area(vertices: F64, faces: Faces) -> float:
    """Surface area in mm2."""
    a, b, c = (vertices[faces[:, k]] for k in range(3))
    return float(np.sqrt((np.cross(b - a, c - a) ** 2).sum(axis=1)).sum()) / 2.0


def centroid(vertices: F64, faces: Faces) -> tuple[float, float, float]:
    """Centre of volume in mm. ValueError if the volume is zero."""
    corners, six_volumes = _tetrahedra(_shifted(vertices), faces)
    total = six_volumes.sum()
    if total == 0.0:
        raise ValueError("no volume, no centroid")
    # A tetrahedron's centre is a quarter of the sum of its corners; the fourth is the middle of the box.
    centre = (corners.sum(axis=1) * six_volumes[:, None]).sum(axis=0) / (4.0 * total) + _middle(vertices)
    x, y, z = centre.tolist()
    return (x, y, z)


def inertia(vertices: F64, faces: Faces) -> F64:
    """Inertia tensor (3,3) about the centroid at unit density, mm5: the integral of |r|² E - r rᵀ.

    From the second moments of tetrahedra with one corner at the origin, 6V/120 (sum of v vᵀ + s sᵀ), s the sum of the
    corners (the simplex moment formula), moved to the centroid by the parallel-axis theorem.
    """
    corners, six_volumes = _tetrahedra(_shifted(vertices), faces)
    centre = np.array(centroid(vertices, faces)) - _middle(vertices)
    total = corners.sum(axis=1)
    moment = np.einsum("m,mki,mkj->ij", six_volumes, corners, corners)
    moment += np.einsum("m,mi,mj->ij", six_volumes, total, total)
    moment = moment / 120.0 - six_volumes.sum() / 6.0 * np.outer(centre, centre)
    return np.asarray(np.trace(moment) * np.eye(3) - moment)


def bounds(vertices: F64) -> tuple[tuple[float, float, float], tuple[float, float, float]]:
    """Low and high corners of the box. ValueError without vertices."""
    (x0, y0, z0), (x1, y1, z1) = vertices.min(axis=0).tolist(), vertices.max(axis=0).tolist()
    return (x0, y0, z0), (x1, y1, z1)


def is_closed(faces: Faces, n_vertices: int) -> bool:
    """Whether every directed side occurs once and its reverse once."""
    return paired_sides(faces.astype(np.int32), n_vertices)[2]


def count_pieces(vertices: F64, faces: Faces) -> int:
    """Solids that hang together: connected closed surfaces of positive volume (a cavity's is negative)."""
    if not len(faces):
        return 0
    _, six_volumes = _tetrahedra(_shifted(vertices), faces)
    return int(np.count_nonzero(np.bincount(components(faces, len(vertices)), six_volumes) > 0.0))


def distance(one: tuple[float, float, float], other: tuple[float, float, float]) -> float:
    """Between two points, mm."""
    return math.dist(one, other)


def clearance(vertices: F64, faces: Faces, other_vertices: F64, other_faces: Faces) -> float:
    """Least distance in mm between two closed solids in one frame; 0 if they touch or overlap.

    ValueError if either is not closed. Cost grows with the triangles that lie nearer to the other solid than the
    first few vertices do.
    """
    return least_clearance([Body(vertices, faces)], [Body(other_vertices, other_faces)])


class Body:
    """A closed solid whose distances are asked for, perhaps more than once: what they are worked out from is kept."""

    def __init__(self, vertices: F64, faces: Faces) -> None:
        self.vertices, self.faces = vertices, faces

    @cached_property
    def box(self) -> F64:
        """The box (2,3)."""
        return np.array((self.vertices.min(axis=0), self.vertices.max(axis=0)))

    @cached_property
    def some(self) -> F64:
        """A few of the vertices."""
        return self.vertices[:: max(1, len(self.vertices) // _SAMPLE)]

    @cached_property
    def solid(self) -> manifold3d.Manifold:
        """As the boolean kernel has it. ValueError if it is not closed."""
        mesh = manifold3d.Mesh64(np.ascontiguousarray(self.vertices), np.ascontiguousarray(self.faces, np.uint64))
        solid = manifold3d.Manifold(mesh)
        if solid.status() != manifold3d.Error.NoError:
            raise ValueError(f"not a closed solid: {solid.status().name}")
        return solid


def least_clearance(ones: Sequence[Body], others: Sequence[Body]) -> float:
    """Least distance in mm between any of some closed solids and any of others, as `clearance`.

    Pairs are taken by the distance of their boxes, nearest first, and only while that is less than the least found.
    """
    boxes, other_boxes = (np.array([body.box for body in each]) for each in (ones, others))
    apart = np.maximum(boxes[:, None, 0] - other_boxes[None, :, 1], other_boxes[None, :, 0] - boxes[:, None, 1])
    gaps = np.sqrt((np.maximum(apart, 0.0) ** 2).sum(axis=2))
    least = math.inf
    for pair in np.argsort(gaps, axis=None, kind="stable"):
        row, column = (int(each) for each in np.unravel_index(pair, gaps.shape))
        if gaps[row, column] >= least or least == 0.0:
            break
        one, other = ones[row], others[column]
        reach = float(np.sqrt(((one.some[:, None] - other.some[None]) ** 2).sum(axis=2).min()))
        reach = min(reach, least) * (1.0 + 1e-9) + 1e-9
        least = min(least, float(one.solid.min_gap(other.solid, reach)))
    return least


def _middle(vertices: F64) -> F64:
    return np.asarray((vertices.min(axis=0) + vertices.max(axis=0)) / 2.0)


def _shifted(vertices: F64) -> F64:
    return np.asarray(vertices - _middle(vertices)) if len(vertices) else vertices


def _tetrahedra(vertices: F64, faces: Faces) -> tuple[F64, F64]:
    """Corners (m,3,3) and six times the signed volume (m,)."""
    corners = vertices[faces]
    six = (corners[:, 0] * np.cross(corners[:, 1], corners[:, 2])).sum(axis=1)
    return corners, six

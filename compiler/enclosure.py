"""Whether a point stands inside a solid."""

from __future__ import annotations

from collections.abc import Collection

import numpy as np
from platewright.backend.contract import F64, Geometry

_TOWARD = np.array((0.5257311121191336, 0.8506508083520399, 0.0034906514))
"""A direction that no edge of ordinary parts lies along."""


def enclosing(geometry: Geometry, point: tuple[float, float, float], passed_over: Collection[int] = ()) -> int | None:
    """The row of the first closed node that a world point lies inside, None for none; some rows are passed over.

    Counts the triangles that a ray from the point passes through. Cost: a pass over the triangles of the parts whose
    boxes hold the point.
    """
    at = np.array(point)
    for row, node in enumerate(geometry.nodes):
        first, last = node.vertex_range
        if row in passed_over or node.mesh < 0 or not node.closed or first == last:
            continue
        vertices = geometry.vertices[first:last]
        if (at < vertices.min(axis=0)).any() or (at > vertices.max(axis=0)).any():
            continue
        corners = geometry.vertices[geometry.faces[node.face_range[0] : node.face_range[1]]] - at
        if _crossings(corners) % 2:
            return row
    return None


def _crossings(corners: F64) -> int:
    """Triangles (m,3,3) that the ray from the origin along `_TOWARD` meets (Möller and Trumbore 1997)."""
    a, one, other = corners[:, 0], corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    p = np.cross(_TOWARD, other)
    area = (one * p).sum(axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        u = -(a * p).sum(axis=1) / area
        q = np.cross(-a, one)
        v = (q * _TOWARD).sum(axis=1) / area
        t = (other * q).sum(axis=1) / area
        return int(np.count_nonzero((u >= 0) & (v >= 0) & (u + v < 1) & (t > 0)))

"""Which triangles meet at a side: found once for a geometry, whatever it is seen from."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from ..contract import I32, Geometry
from .compiled import kernel


@dataclass(frozen=True, eq=False, slots=True)
class Topology:
    """neighbour (m,3) int32: the face across the side from corner k to corner k+1, or -1."""

    neighbour: I32


def topology_of(geometry: Geometry) -> Topology:
    """The topology of a geometry. Cost: a few passes over its triangles; keep it beside the geometry."""
    return Topology(neighbours(geometry.faces, len(geometry.vertices)))


@kernel
def neighbours(faces: Any, n_vertices: int) -> Any:
    """The face across each side (m,3) int32, or -1: two sides meet that join the same vertices the other way round.

    Sides are put in buckets by their smaller vertex. Of several that could meet, the first free one in order of faces
    is taken.
    """
    m = len(faces)
    first = np.zeros(n_vertices + 1, np.int32)
    for t in range(m):
        for k in range(3):
            first[min(faces[t, k], faces[t, (k + 1) % 3]) + 1] += 1
    for v in range(n_vertices):
        first[v + 1] += first[v]
    place = first[:-1].copy()
    other = np.empty(3 * m, np.int32)
    side = np.empty(3 * m, np.int32)
    found = np.full((m, 3), -1, np.int32)
    for t in range(m):
        for k in range(3):
            a, b = faces[t, k], faces[t, (k + 1) % 3]
            low, high = min(a, b), max(a, b)
            signed = high if a < b else -1 - high
            is_met = False
            for q in range(first[low], place[low]):
                if other[q] == -1 - signed:
                    u = side[q] // 3
                    found[t, k] = u
                    found[u, side[q] - 3 * u] = t
                    place[low] -= 1
                    other[q], side[q] = other[place[low]], side[place[low]]
                    is_met = True
                    break
            if not is_met:
                other[place[low]], side[place[low]] = signed, 3 * t + k
                place[low] += 1
    return found

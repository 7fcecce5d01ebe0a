"""Which triangles meet at a side: found once for a geometry, whatever it is seen from."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from ..compiled import kernel
from ..contract import I32, Geometry


@dataclass(frozen=True, eq=False, slots=True)
class Topology:
    """neighbour (m,3) int32: the face across the side from corner k to corner k+1, or -1."""

    neighbour: I32


def topology_of(geometry: Geometry) -> Topology:
    """The topology of a geometry. Cost: a few passes over its triangles; keep it beside the geometry."""
    return Topology(neighbours(geometry.faces, len(geometry.vertices)))


def neighbours(faces: I32, n_vertices: int) -> I32:
    """The face across each side (m,3) int32, or -1: two sides meet that join the same vertices the other way round.

    Of several that could meet, the first free one in order of faces is taken.
    """
    found = np.full((len(faces), 3), -1, np.int32)
    first, place = np.zeros(n_vertices + 1, np.int32), np.empty(n_vertices + 1, np.int32)
    _match(faces, first, place, np.empty((3 * len(faces), 2), np.int32), found)
    return found


@kernel
def _match(faces: Any, first: Any, place: Any, waiting: Any, found: Any) -> None:
    """Put sides in buckets by their smaller vertex, and match each with one that waits there.

    first, place (n+1,) int32: zeros, and scratch; waiting (3m,2) int32: other end (negative if it runs down) and side.
    """
    for t in range(len(faces)):
        for k in range(3):
            first[min(faces[t, k], faces[t, (k + 1) % 3]) + 1] += 1
    for v in range(len(first) - 1):
        first[v + 1] += first[v]
        place[v] = first[v]
    for t in range(len(faces)):
        for k in range(3):
            a, b = faces[t, k], faces[t, (k + 1) % 3]
            low, high = min(a, b), max(a, b)
            signed = high if a < b else -1 - high
            last = place[low]
            is_met = False
            for q in range(first[low], last):
                if waiting[q, 0] == -1 - signed:
                    side = waiting[q, 1]
                    found[t, k] = side // 3
                    found[side // 3, side % 3] = t
                    waiting[q, 0], waiting[q, 1] = waiting[last - 1, 0], waiting[last - 1, 1]
                    place[low] = last - 1
                    is_met = True
                    break
            if not is_met:
                waiting[last, 0], waiting[last, 1] = signed, 3 * t + k
                place[low] = last + 1

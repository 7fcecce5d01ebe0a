"""Questions about what is seen, for leaders, trace lines, dimensions and regions."""

from __future__ import annotations

import numpy as np

from ..contract import F64, I32, Projection
from .model import Candidates, View
from .near import NEAR
from .occluders import Occluders
from .probe import foremost
from .tree import STACK
from .view import in_blocks
from .visibility import cut

_BLOCK = 4096


def page_points(projection: Projection, points: F64) -> tuple[F64, F64]:
    """View points (k,3) and weights W (k,) of world points (k,3) in mm; those with W below `NEAR` are not in view."""
    matrix = projection.world_to_page
    x, y, z = points[:, 0], points[:, 1], points[:, 2]
    rows = [matrix[k, 0] * x + matrix[k, 1] * y + matrix[k, 2] * z + matrix[k, 3] for k in range(4)]
    weight = np.where(rows[3] >= NEAR, rows[3], 1.0)
    return np.stack([rows[k] / weight for k in range(3)], axis=1), rows[3]


def seen_intervals(
    view: View, occluders: Occluders, points: F64, node: int = -1, threads: int | None = None
) -> tuple[F64, ...]:
    """Which stretches of a space curve are seen: for each of its k-1 segments (n,2) float64, from 0 to 1 in the world.

    points (k,3) float64 world mm. `node` is the part the curve lies on, -1 for none: its faces do not reach beyond
    their sides for it. What lies less than `near.NEAR` before the eye is not seen. Cost: that of `cut`.
    """
    mapped, weight = page_points(view.projection, points)
    first, last = _before_the_eye(weight)
    ends = np.arange(len(points) - 1)
    share = np.stack([first, last], axis=1)
    at = points[ends, None] + share[..., None] * (points[ends + 1, None] - points[ends, None])
    start, end = (page_points(view.projection, at[:, k]) for k in (0, 1))
    exact = (first == 0.0)[:, None], (last == 1.0)[:, None]
    rows = np.flatnonzero(last > first)
    candidates = _segments(
        np.where(exact[0], mapped[:-1], start[0])[rows], np.where(exact[1], mapped[1:], end[0])[rows], node
    )
    pieces = cut(view, candidates, threads, occluders)
    seen = pieces.is_visible
    segment = rows[pieces.segment[seen]]
    inner = _in_world(pieces.span[seen], start[1][segment], end[1][segment])
    spans = first[segment, None] + inner * (last - first)[segment, None]
    return tuple(np.split(spans, np.searchsorted(segment, np.arange(1, len(points) - 1)))) if len(points) > 1 else ()


def hiders(view: View, occluders: Occluders, points: F64, threads: int | None = None) -> tuple[I32, F64]:
    """Which part hides each of the world points (k,3), -1 for none, and how many mm it stands before it.

    The part named is the foremost; the distance is along the sight (central: along the principal axis). A point less
    than `view.tolerance.depth_mm` behind a surface is seen. Cost: O(log n) a point.
    """
    mapped, _ = page_points(view.projection, points)
    row, depth = _foremost(view, occluders, mapped, threads)
    is_hidden = row >= 0
    safe = np.where(is_hidden, row, 0)
    node = occluders.labels[safe, 4] if len(occluders) else np.zeros(len(row), np.int32)
    distance = np.zeros(len(row))
    distance[is_hidden] = _along(view, mapped[is_hidden, 2]) - _along(view, depth[is_hidden])
    return np.where(is_hidden, node, -1).astype(np.int32), distance


def front_face(view: View, occluders: Occluders, xy: F64, threads: int | None = None) -> I32:
    """The view face seen at each of the page points (k,2) in mm, or -1.

    Where faces of several parts lie in one place, within the tolerance, the part whose path sorts first is seen, in
    every view. Ghosts are not seen. Cost: O(log n) a point.
    """
    points = np.column_stack([xy, np.full(len(xy), np.inf)])
    row, _ = _foremost(view, occluders, points, threads)
    face = occluders.labels[np.maximum(row, 0), 3] if len(occluders) else np.zeros(len(row), np.int32)
    return np.where(row >= 0, face, -1).astype(np.int32)


def _foremost(view: View, occluders: Occluders, points: F64, threads: int | None) -> tuple[I32, F64]:
    row, depth = np.full(len(points), -1, np.int32), np.zeros(len(points))
    is_central, slack = view.projection.kind == "central", view.tolerance.depth_mm

    def probe(begin: int, end: int) -> None:
        foremost(
            occluders.boxes, occluders.starts, occluders.corners, occluders.labels, occluders.rank, points, slack,
            is_central, begin, end, np.empty((STACK, 2), np.int32), row, depth,
        )  # fmt: skip

    in_blocks(probe, len(points), threads, _BLOCK)
    return row, depth


def _along(view: View, depth: F64) -> F64:
    """Mm along the sight for depths."""
    return -1.0 / depth if view.projection.kind == "central" else depth


def _before_the_eye(weight: F64) -> tuple[F64, F64]:
    """From where to where (k-1,) each segment has a weight of at least `NEAR`; to 0 where it has none."""
    here, there = weight[:-1], weight[1:]
    slope = np.where(here != there, there - here, 1.0)
    crossing = (NEAR - here) / slope
    first = np.where(here >= NEAR, 0.0, crossing)
    last = np.where(there >= NEAR, 1.0, crossing)
    return first, np.where((here < NEAR) & (there < NEAR), 0.0, last)


def _in_world(span: F64, start: F64, end: F64) -> F64:
    """Shares of a segment in the world for shares (p,2) of it on the page, from the weights at its ends."""
    along, against = span * start[:, None], (1.0 - span) * end[:, None]
    return np.asarray(along / (along + against))


def _segments(start: F64, end: F64, node: int) -> Candidates:
    n = len(start)
    none = np.full((n, 2), -1, np.int32)
    return Candidates(
        start=start,
        end=end,
        line_class=np.zeros(n, np.uint8),
        node=np.full(n, node, np.int32),
        chain=none[:, 0],
        faces=none,
        vertices=none,
        patch=none[:, 0],
        allowance=np.zeros(n),
        is_drawn=np.ones(n, np.bool_),
        is_plain=np.zeros(n, np.bool_),
    )

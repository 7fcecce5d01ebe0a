"""Kernel that finds the foremost triangle at points of the page."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..compiled import inner, kernel
from .block import WIDE, lowest, meet
from .tree import rounded_down


@kernel
def foremost(
    boxes: Any, starts: Any, corners: Any, labels: Any, rank: Any, points: Any, slack: Any, is_central: bool,
    begin: int, last: int, stack: Any, found: Any, depth: Any,
) -> None:  # fmt: skip
    """Row of the foremost occluder over each of the points begin .. last, or -1, and its depth there.

    points (k,3): only triangles that stand before the third by more than `slack` mm count (infinity for all). Among
    those within `slack` of the foremost the node first by rank is taken, then the triangle first by face. stack
    (STACK,2) int32 is scratch.
    """
    top_level = len(starts) - 2
    for i in range(begin, last):
        x, y, far = points[i, 0], points[i, 1], points[i, 2]
        if far < np.inf:
            far -= slack * far * far if is_central else slack
        left, top, right, bottom = rounded_down(x), rounded_down(y), -rounded_down(-x), -rounded_down(-y)
        nearest, best = far, -1
        for is_choice in range(2):
            if is_choice == 1:
                if best < 0:
                    break
                nearest = min(far, depth[i] + (slack * depth[i] * depth[i] if is_central else slack))
            stack[0, 0], stack[0, 1] = starts[top_level], top_level
            height = 1
            while height > 0:
                height -= 1
                q, level = stack[height, 0], stack[height, 1]
                limit = -rounded_down(-nearest) if nearest < np.inf else np.float32(np.inf)
                met = meet(boxes, q, left, top, right, bottom, limit)
                while met != 0:
                    k = lowest(met)
                    met &= met - 1
                    r = WIDE * (q - starts[level]) + k
                    if level > 0:
                        stack[height, 0], stack[height, 1] = starts[level - 1] + r, level - 1
                        height += 1
                        continue
                    if labels[r, 5] < 0:
                        continue
                    z = _depth_at(corners, labels, r, x, y)
                    if is_choice == 0:
                        if z < nearest:
                            nearest, best = z, r
                            depth[i] = z
                    elif z <= nearest:
                        mine, its = rank[labels[r, 4]], rank[labels[best, 4]]
                        if mine < its or (mine == its and labels[r, 3] < labels[best, 3]):
                            best = r
        found[i] = best


@inner
def _depth_at(c: Any, labels: Any, r: int, x: Any, y: Any) -> Any:
    """Depth of triangle r at a point of the page, infinity outside of it; its sides belong to it."""
    total, sum_of_depths = 0.0, 0.0
    for k in range(3):
        a, b = 3 * ((k + 1) % 3), 3 * ((k + 2) % 3)
        if labels[r, (k + 1) % 3] > labels[r, (k + 2) % 3]:
            a, b = b, a
        area = (c[r, b + 1] - c[r, a + 1]) * (x - c[r, a]) - (c[r, b] - c[r, a]) * (y - c[r, a + 1])
        if a != 3 * ((k + 1) % 3):
            area = -area
        if area < 0.0:
            return np.inf
        total += area
        sum_of_depths += area * c[r, 3 * k + 2]
    return sum_of_depths / total if total > 0.0 else np.inf

"""Kernels of exact visibility: the stretch of a segment that one triangle hides, and the union of all.

A point of a segment is hidden by a triangle that it lies inside of on the page and behind of in depth. Both are linear
along the segment, also in central projection with depth -1/distance, so the stretch is an interval whose ends are
quotients of a few signed areas (Appel 1967 for the idea of clipping edges by faces; Pineda 1988 for edge functions).
Areas are always reckoned from the lower vertex of a side to the higher, so the two triangles at a side get values that
are opposite to the last bit, and no line slips between them.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from ..compiled import inner, kernel
from .block import WIDE, lowest, meet
from .tree import rounded_down

NORMAL, PLAIN, HIDDEN = 0, 1, 2
"""Ways to treat a segment: look for what hides it, draw it whole, take it as hidden."""

_NO = 1.0, 0.0
_SPECK = (
    1e-4  # mm on paper: hidden stretches shorter than this, and gaps between them shorter than twice this, are none
)


@inner
def hidden_by(
    c: Any, labels: Any, r: int, x0: Any, y0: Any, z0: Any, x1: Any, y1: Any, z1: Any, slack: Any, reach: Any,
    is_central: bool,
) -> Any:  # fmt: skip
    """The stretch (from, to) of a segment that triangle r hides; from >= to if none.

    slack: mm of depth by which the line may lie behind and still be seen; reach: about how many mm on paper the
    triangle hides beyond its sides, 0 for the line's own part. The area over a side is reckoned from its lower vertex,
    and is exactly 0 where the segment ends in a corner. A line exactly along a side belongs to one of the two triangles
    at it (the top-left rule). Depth is taken from the plane of the triangle as it is, however far it reaches; where it
    reaches beyond its sides, the slope over twice that is allowed as well, so that a flush neighbour stays seen.
    """
    low, high = 0.0, 1.0
    behind0, behind1 = 0.0, 0.0
    za = c[r, 2]
    for k in range(3):
        i, j = (k + 1) % 3, (k + 2) % 3
        ux, uy = c[r, 3 * j] - c[r, 3 * i], c[r, 3 * j + 1] - c[r, 3 * i + 1]
        v = 3 * i if labels[r, i] < labels[r, j] else 3 * j
        f0 = uy * (x0 - c[r, v]) - ux * (y0 - c[r, v + 1])
        f1 = uy * (x1 - c[r, v]) - ux * (y1 - c[r, v + 1])
        rise = c[r, 3 * k + 2] - za
        behind0 += f0 * rise
        behind1 += f1 * rise
        beyond = reach * (abs(ux) + abs(uy))
        f0 += beyond
        f1 += beyond
        if f0 <= 0.0 and f1 <= 0.0:
            if f0 < 0.0 or f1 < 0.0 or not (uy < 0.0 or (uy == 0.0 and ux > 0.0)):
                return _NO
        elif f0 < 0.0:
            low = max(low, f0 / (f0 - f1))
        elif f1 < 0.0:
            high = min(high, f0 / (f0 - f1))
    if low >= high:
        return _NO
    ux, uy, uz = c[r, 3] - c[r, 0], c[r, 4] - c[r, 1], c[r, 5] - za
    vx, vy, vz = c[r, 6] - c[r, 0], c[r, 7] - c[r, 1], c[r, 8] - za
    area = uy * vx - ux * vy
    if not area > 0.0:
        return _NO
    p, q = uz * vy - vz * uy, vz * ux - uz * vx
    allowed = 2.0 * reach * np.sqrt(p * p + q * q) if reach > 0.0 else 0.0
    behind0, behind1 = (z0 - za) * area - behind0, (z1 - za) * area - behind1
    z = z0 + (z1 - z0) * low
    g0 = behind0 + (behind1 - behind0) * low - allowed - (slack * z * z if is_central else slack) * area
    z = z0 + (z1 - z0) * high
    g1 = behind0 + (behind1 - behind0) * high - allowed - (slack * z * z if is_central else slack) * area
    if g0 <= 0.0 and g1 <= 0.0:
        return _NO
    if g1 < 0.0:
        high = low + (high - low) * (g0 / (g0 - g1))
    elif g0 < 0.0:
        low = low + (high - low) * (g0 / (g0 - g1))
    return low, high


@inner
def _add(spans: Any, n: int, low: Any, high: Any, gap: Any) -> int:
    """Put low .. high among n sorted stretches, joining those nearer than `gap`; there is room for one more."""
    i = 0
    while i < n and spans[i, 1] < low - gap:
        i += 1
    j = i
    while j < n and spans[j, 0] <= high + gap:
        low, high = min(low, spans[j, 0]), max(high, spans[j, 1])
        j += 1
    if j == i:
        for k in range(n, i, -1):
            spans[k, 0], spans[k, 1] = spans[k - 1, 0], spans[k - 1, 1]
    elif j > i + 1:
        for k in range(j, n):
            spans[k - (j - i - 1), 0], spans[k - (j - i - 1), 1] = spans[k, 0], spans[k, 1]
    spans[i, 0], spans[i, 1] = low, high
    return n + 1 - (j - i)


@inner
def _is_beside(boxes: Any, q: int, k: int, x0: Any, y0: Any, dx: Any, dy: Any) -> bool:
    """Whether box k of block q lies wholly on one side of the line through (x0, y0) along (dx, dy)."""
    left, top, right, bottom = boxes[q, 0, k], boxes[q, 1, k], boxes[q, 2, k], boxes[q, 3, k]
    across = dx * (top + bottom - 2.0 * y0) - dy * (left + right - 2.0 * x0)
    return bool(abs(across) > abs(dy) * (right - left) + abs(dx) * (bottom - top))


@kernel
def cut_segments(
    boxes: Any, starts: Any, corners: Any, labels: Any, start: Any, end: Any, faces: Any, parts: Any, patch: Any,
    allowance: Any, treat: Any, depth_mm: Any, sideways_mm: Any, is_central: bool, begin: int, last: int,
    stack: Any, spans: Any, label: Any, span: Any,
) -> int:  # fmt: skip
    """Pieces of the segments begin .. last in their order; returns their number, or -1 if there is not enough room.

    parts (s,2) int32 are the parts a segment belongs to, which hide no further than they reach; the same twice for one.
    Written are label (p,2) int32: segment, and 1 if seen; span (p,2) float64. stack (STACK,2) int32 and spans (k,2) are
    scratch.
    """
    n, top_level = 0, len(starts) - 2
    for s in range(begin, last):
        x0, y0, z0 = start[s, 0], start[s, 1], start[s, 2]
        x1, y1, z1 = end[s, 0], end[s, 1], end[s, 2]
        length = np.sqrt((x1 - x0) * (x1 - x0) + (y1 - y0) * (y1 - y0))
        gap = 2.0 * _SPECK / length if length > 8.0 * _SPECK else 0.25
        n_hidden, height = 0, 0
        if treat[s] == HIDDEN:
            spans[0, 0], spans[0, 1] = 0.0, 1.0
            n_hidden = 1
        elif treat[s] == NORMAL:
            stack[0, 0], stack[0, 1] = starts[top_level], top_level
            height = 1
        left, top = rounded_down(min(x0, x1)), rounded_down(min(y0, y1))
        right, bottom = -rounded_down(-max(x0, x1)), -rounded_down(-max(y0, y1))
        far = -rounded_down(-max(z0, z1))
        while height > 0:
            height -= 1
            q, level = stack[height, 0], stack[height, 1]
            met = meet(boxes, q, left, top, right, bottom, far)
            while met != 0:
                k = lowest(met)
                met &= met - 1
                if _is_beside(boxes, q, k, x0, y0, x1 - x0, y1 - y0):
                    continue
                r = WIDE * (q - starts[level]) + k
                if level > 0:
                    stack[height, 0], stack[height, 1] = starts[level - 1] + r, level - 1
                    height += 1
                    continue
                if labels[r, 3] == faces[s, 0] or labels[r, 3] == faces[s, 1]:
                    continue
                slack, reach = depth_mm, 0.0
                of_patch = labels[r, 5]
                if labels[r, 4] != parts[s, 0] and labels[r, 4] != parts[s, 1]:
                    if of_patch < 0:
                        continue
                    reach = sideways_mm
                elif patch[s] >= 0 and (of_patch == patch[s] or of_patch == -1 - patch[s]):
                    slack = depth_mm + allowance[s]
                low, high = hidden_by(corners, labels, r, x0, y0, z0, x1, y1, z1, slack, reach, is_central)
                if low < high:
                    if n_hidden == len(spans):
                        return -1
                    n_hidden = _add(spans, n_hidden, low, high, gap)
                    if n_hidden == 1 and spans[0, 0] <= 0.0 and spans[0, 1] >= 1.0:
                        height = 0
                        break
        if n + 2 * n_hidden + 1 > len(span):
            return -1
        at = 0.0
        for k in range(n_hidden + 1):
            low, high = (spans[k, 0], spans[k, 1]) if k < n_hidden else (1.0, 1.0)
            if k < n_hidden:
                if high - low < 0.5 * gap:
                    continue
                low, high = (0.0 if low < gap else low), (1.0 if high > 1.0 - gap else high)
            if low > at:
                label[n, 0], label[n, 1], span[n, 0], span[n, 1] = s, 1, at, low
                n += 1
            if high > low:
                label[n, 0], label[n, 1], span[n, 0], span[n, 1] = s, 0, low, high
                n += 1
            at = high
    return n

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

from .compiled import kernel

NORMAL, PLAIN, HIDDEN = 0, 1, 2
"""Ways to treat a segment: look for what hides it, draw it whole, take it as hidden."""

_NO = 1.0, 0.0
_STACK = 64
_ROUNDING = 1e-9  # of a segment's length
_SPECK = (
    1e-4  # mm on paper: hidden stretches shorter than this, and gaps between them shorter than twice this, are none
)


@kernel
def _area(ax: Any, ay: Any, bx: Any, by: Any, px: Any, py: Any, is_rising: Any) -> Any:
    """Twice the signed area of (a, b, p), positive where p is on the inner side of a side a-b."""
    if is_rising:
        return (by - ay) * (px - ax) - (bx - ax) * (py - ay)
    return -((ay - by) * (px - bx) - (ax - bx) * (py - by))


@kernel
def _owns(ax: Any, ay: Any, bx: Any, by: Any) -> Any:
    """Whether points exactly on the side a-b belong to the triangle: true for one of the two triangles at it."""
    return by < ay or (by == ay and bx > ax)


@kernel
def hidden_by(
    c: Any, r: int, va: Any, vb: Any, vc: Any, v0: Any, v1: Any, x0: Any, y0: Any, z0: Any, x1: Any, y1: Any, z1: Any,
    slack: Any, reach: Any, is_central: bool,
) -> Any:  # fmt: skip
    """The stretch (from, to) of a segment that triangle r hides; from >= to if none.

    c (k,9) corners; va, vb, vc their vertices; v0, v1 those of the segment or -1. slack: mm of depth by which the line
    may lie behind and still be seen; reach: mm on paper by which the triangle hides beyond its sides.
    """
    a0, b0, c0 = va == v0, vb == v0, vc == v0
    a1, b1, c1 = va == v1, vb == v1, vc == v1
    if (a0 or b0 or c0) and (a1 or b1 or c1):
        return _NO
    ax, ay, bx, by, cx, cy = c[r, 0], c[r, 1], c[r, 3], c[r, 4], c[r, 6], c[r, 7]
    la = reach * (abs(cx - bx) + abs(cy - by))
    fa0 = 0.0 if b0 or c0 else _area(bx, by, cx, cy, x0, y0, vb < vc)
    fa1 = 0.0 if b1 or c1 else _area(bx, by, cx, cy, x1, y1, vb < vc)
    if max(fa0, fa1) < -la or (reach == 0.0 and fa0 <= 0.0 and fa1 <= 0.0 and not (fa0 == 0.0 and fa1 == 0.0)):
        return _NO
    lb = reach * (abs(ax - cx) + abs(ay - cy))
    fb0 = 0.0 if c0 or a0 else _area(cx, cy, ax, ay, x0, y0, vc < va)
    fb1 = 0.0 if c1 or a1 else _area(cx, cy, ax, ay, x1, y1, vc < va)
    if max(fb0, fb1) < -lb or (reach == 0.0 and fb0 <= 0.0 and fb1 <= 0.0 and not (fb0 == 0.0 and fb1 == 0.0)):
        return _NO
    lc = reach * (abs(bx - ax) + abs(by - ay))
    fc0 = 0.0 if a0 or b0 else _area(ax, ay, bx, by, x0, y0, va < vb)
    fc1 = 0.0 if a1 or b1 else _area(ax, ay, bx, by, x1, y1, va < vb)
    if max(fc0, fc1) < -lc or (reach == 0.0 and fc0 <= 0.0 and fc1 <= 0.0 and not (fc0 == 0.0 and fc1 == 0.0)):
        return _NO
    if reach == 0.0:
        if (fa0 == 0.0 and fa1 == 0.0 and not _owns(bx, by, cx, cy)) or (
            fb0 == 0.0 and fb1 == 0.0 and not _owns(cx, cy, ax, ay)
        ):
            return _NO
        if fc0 == 0.0 and fc1 == 0.0 and not _owns(ax, ay, bx, by):
            return _NO
        da, db, dc = 0.0, 0.0, 0.0
    else:
        da = reach * np.sqrt((cx - bx) * (cx - bx) + (cy - by) * (cy - by))
        db = reach * np.sqrt((ax - cx) * (ax - cx) + (ay - cy) * (ay - cy))
        dc = reach * np.sqrt((bx - ax) * (bx - ax) + (by - ay) * (by - ay))
    low, high = 0.0, 1.0
    for k in range(3):
        if k == 0:
            f0, f1 = fa0 + da, fa1 + da
        elif k == 1:
            f0, f1 = fb0 + db, fb1 + db
        else:
            f0, f1 = fc0 + dc, fc1 + dc
        if f0 < 0.0:
            if f1 <= 0.0:
                return _NO
            low = max(low, f0 / (f0 - f1))
        elif f1 < 0.0:
            if f0 <= 0.0:
                return _NO
            high = min(high, f0 / (f0 - f1))
    if low >= high:
        return _NO
    return _behind(
        c, r, low, high, fa0, fa1, fb0, fb1, fc0, fc1, z0, z1, slack, reach, is_central
    )  # fmt: skip


@kernel
def _behind(
    c: Any, r: int, low: Any, high: Any, fa0: Any, fa1: Any, fb0: Any, fb1: Any, fc0: Any, fc1: Any, z0: Any, z1: Any,
    slack: Any, reach: Any, is_central: bool,
) -> Any:  # fmt: skip
    """What of low .. high lies behind the plane of the triangle, by more than the slack.

    Depth is taken from the plane of the triangle as it is, however far it reaches; where it reaches beyond its sides,
    the plane's slope over twice that is allowed as well, so that a flush neighbour stays seen.
    """
    za, zb, zc = c[r, 2], c[r, 5], c[r, 8]
    extra = 0.0
    if reach > 0.0:
        ux, uy, uz = c[r, 3] - c[r, 0], c[r, 4] - c[r, 1], zb - za
        vx, vy, vz = c[r, 6] - c[r, 0], c[r, 7] - c[r, 1], zc - za
        area = abs(ux * vy - uy * vx)
        p, q = uz * vy - vz * uy, vz * ux - uz * vx
        extra = 2.0 * reach * np.sqrt(p * p + q * q) / area if area > 0.0 else np.inf
    wa, wb, wc = fa0 + (fa1 - fa0) * low, fb0 + (fb1 - fb0) * low, fc0 + (fc1 - fc0) * low
    total = wa + wb + wc
    if not total > 0.0:
        return _NO
    z = z0 + (z1 - z0) * low
    g0 = z - (wa * za + wb * zb + wc * zc) / total - extra - (slack * z * z if is_central else slack)
    wa, wb, wc = fa0 + (fa1 - fa0) * high, fb0 + (fb1 - fb0) * high, fc0 + (fc1 - fc0) * high
    total = wa + wb + wc
    if not total > 0.0:
        return _NO
    z = z0 + (z1 - z0) * high
    g1 = z - (wa * za + wb * zb + wc * zc) / total - extra - (slack * z * z if is_central else slack)
    if g0 > 0.0:
        if g1 < 0.0:
            high = low + (high - low) * (g0 / (g0 - g1))
        return low, high
    if g1 > 0.0:
        if g0 < 0.0:
            low = low + (high - low) * (g0 / (g0 - g1))
        return low, high
    return _NO


@kernel
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


@kernel
def _wider(rows: Any, room: int) -> Any:
    """The rows (n,2) with room for more."""
    wider = np.empty((room, 2), rows.dtype)
    for k in range(len(rows)):
        wider[k, 0], wider[k, 1] = rows[k, 0], rows[k, 1]
    return wider


@kernel
def cut_segments(
    boxes: Any, corners: Any, labels: Any, n_leaves: int, start: Any, end: Any, vertices: Any, faces: Any, node: Any,
    patch: Any, allowance: Any, treat: Any, depth_mm: Any, sideways_mm: Any, is_central: bool, begin: int, last: int,
) -> Any:  # fmt: skip
    """Pieces of the segments begin .. last in their order: segment and 1 if seen (p,2) int32, span (p,2) float64."""
    span = np.empty((2 * (last - begin) + 64, 2))
    label = np.empty((len(span), 2), np.int32)
    spans = np.empty((64, 2))
    stack = np.empty(_STACK, np.int32)
    n_triangles = len(labels)
    n = 0
    for s in range(begin, last):
        x0, y0, z0 = start[s, 0], start[s, 1], start[s, 2]
        x1, y1, z1 = end[s, 0], end[s, 1], end[s, 2]
        dx, dy = x1 - x0, y1 - y0
        length = np.sqrt(dx * dx + dy * dy)
        gap = 2.0 * _SPECK / length if length > 8.0 * _SPECK else 0.25
        n_hidden = 0
        if treat[s] == HIDDEN:
            spans[0, 0], spans[0, 1] = 0.0, 1.0
            n_hidden = 1
        elif treat[s] == NORMAL and n_leaves > 0:
            v0, v1 = vertices[s, 0], vertices[s, 1]
            left, right, top, bottom = min(x0, x1), max(x0, x1), min(y0, y1), max(y0, y1)
            far = max(z0, z1)
            stack[0] = 0
            height = 1
            while height > 0:
                height -= 1
                q = stack[height]
                if (
                    boxes[q, 0] > right or boxes[q, 2] < left or boxes[q, 1] > bottom or boxes[q, 3] < top
                    or boxes[q, 4] >= far
                ):  # fmt: skip
                    continue
                mx, my = 0.5 * (boxes[q, 0] + boxes[q, 2]) - x0, 0.5 * (boxes[q, 1] + boxes[q, 3]) - y0
                hx, hy = 0.5 * (boxes[q, 2] - boxes[q, 0]), 0.5 * (boxes[q, 3] - boxes[q, 1])
                if abs(dx * my - dy * mx) > abs(dy) * hx + abs(dx) * hy:
                    continue
                if q < n_leaves - 1:
                    a, b = 2 * q + 1, 2 * q + 2
                    if boxes[a, 4] < boxes[b, 4]:
                        a, b = b, a
                    stack[height], stack[height + 1] = a, b  # the nearer one first
                    height += 2
                    continue
                leaf = q - n_leaves + 1
                for r in range(leaf * n_triangles // n_leaves, (leaf + 1) * n_triangles // n_leaves):
                    face = labels[r, 3]
                    if face == faces[s, 0] or face == faces[s, 1]:
                        continue
                    if min(corners[r, 2], min(corners[r, 5], corners[r, 8])) >= far:
                        continue
                    slack, reach = depth_mm, 0.0
                    of_patch = labels[r, 5]
                    if labels[r, 4] != node[s]:
                        if of_patch < 0:
                            continue
                        reach = sideways_mm
                    elif patch[s] >= 0 and (of_patch == patch[s] or of_patch == -1 - patch[s]):
                        slack = depth_mm + allowance[s]
                    low, high = hidden_by(
                        corners, r, labels[r, 0], labels[r, 1], labels[r, 2], v0, v1, x0, y0, z0, x1, y1, z1, slack,
                        reach, is_central,
                    )  # fmt: skip
                    if low < high:
                        if n_hidden == len(spans):
                            spans = _wider(spans, 2 * n_hidden)
                        n_hidden = _add(spans, n_hidden, low, high, gap)
                        if n_hidden == 1 and spans[0, 0] <= 0.0 and spans[0, 1] >= 1.0:
                            height = 0
                            break
        if n + 2 * n_hidden + 1 > len(span):
            span = _wider(span, 2 * (n + 2 * n_hidden + 1))
            label = _wider(label, len(span))
        at = 0.0
        for k in range(n_hidden + 1):
            low, high = (spans[k, 0], spans[k, 1]) if k < n_hidden else (1.0, 1.0)
            if k < n_hidden:
                if high - low < 0.5 * gap:
                    continue
                low, high = (0.0 if low < _ROUNDING else low), (1.0 if high > 1.0 - _ROUNDING else high)
            if low > at:
                label[n, 0], label[n, 1], span[n, 0], span[n, 1] = s, 1, at, low
                n += 1
            if high > low:
                label[n, 0], label[n, 1], span[n, 0], span[n, 1] = s, 0, low, high
                n += 1
            at = high
    return label[:n].copy(), span[:n].copy()

"""Kernels that build a subtree: binned surface area heuristic (Wald 2007), straight to nodes of eight children.

A box is eight float32: least x, y, z, 0, negative greatest x, y, z, 0, so that widening takes minima alone. `rows` is
flat, the box of one triangle after the other; ranges of it are split by swapping boxes, and `chosen` with them.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from ..compiled import inner, kernel
from .lanes import BLOCK, EMPTY, LEAF, LINKS, NODE, WIDE, widen, widen_middles

BINS = 16
DEEPEST = 64  # splits below which ranges are simply halved: a tree is at most this and 31 halvings deep
STACK = 7 * (DEEPEST + 31) + WIDE  # a walk holds at most seven nodes a level and the eight it opens
RANGE = 16  # numbers that describe a range: its box, and the box of its triangles' middles, doubled
SCRATCH = 25 * BINS + 8  # numbers that `split` needs room for
_FAR, _ZERO = np.float32(3e38), np.float32(0.0)
FEW = 64  # triangles from which on down all three axes are tried, with half as many bins


@kernel
def enclose(points: Any, faces: Any, pad: Any, begin: int, end: int, rows: Any, chosen: Any, span: Any) -> None:
    """Write the padded boxes and numbers of faces begin .. end; widen span (RANGE,) by them."""
    for t in range(begin, end):
        a, b, c = faces[t, 0], faces[t, 1], faces[t, 2]
        for k in range(3):
            p, q, r = points[a, k], points[b, k], points[c, k]
            rows[8 * t + k] = min(p, min(q, r)) - pad
            rows[8 * t + 4 + k] = -max(p, max(q, r)) - pad
        rows[8 * t + 3] = rows[8 * t + 7] = np.float32(0.0)
        chosen[t] = t
        widen(span, 0, rows, t)
        widen_middles(span, 8, rows, t)


@inner
def half_area(box: Any, at: int) -> Any:
    """Half the surface of the box at box[at]."""
    x, y, z = -box[at + 4] - box[at], -box[at + 5] - box[at + 1], -box[at + 6] - box[at + 2]
    return x * y + y * z + z * x


@inner
def _clear(box: Any, begin: int, end: int) -> None:
    for k in range(begin, end):
        box[k] = _FAR


@inner
def _halve(rows: Any, low: int, high: int, left: Any, right: Any) -> int:
    middle = (low + high) >> 1
    for i in range(low, middle):
        widen(left, 0, rows, i)
        widen_middles(left, 8, rows, i)
    for i in range(middle, high):
        widen(right, 0, rows, i)
        widen_middles(right, 8, rows, i)
    return middle


@inner
def _best_bin(scratch: Any, at: int, bins: int, counts: Any, first: int, n: int) -> Any:
    """The last bin of the left side where areas times leaves are least, or -1, and that least.

    The boxes of the bins stand at scratch[at], their counts at counts[first].
    """
    side, costs = 24 * BINS, 24 * BINS + 8
    _clear(scratch, side, side + 8)
    total = 0
    for j in range(bins - 1, 0, -1):
        widen(scratch, side, scratch, at // 8 + j)
        total += counts[first + j]
        scratch[costs + j] = half_area(scratch, side) * np.float32((total + LEAF - 1) >> 2) if total > 0 else _ZERO
    _clear(scratch, side, side + 8)
    best, least, total = -1, _FAR, 0
    for j in range(bins - 1):
        widen(scratch, side, scratch, at // 8 + j)
        total += counts[first + j]
        if total == 0 or total == n:
            continue
        cost = half_area(scratch, side) * np.float32((total + LEAF - 1) >> 2) + scratch[costs + j + 1]
        if cost < least:
            best, least = j, cost
    return best, least


@kernel
def split(
    rows: Any, chosen: Any, low: int, high: int, depth: int, span: Any, left: Any, right: Any, scratch: Any, counts: Any
) -> int:
    """Order triangles low .. high into two sides; returns where the second starts and describes both.

    span, left, right (RANGE,) float32; scratch (SCRATCH,) float32, counts (3*BINS,) int32.
    """
    _clear(left, 0, RANGE)
    _clear(right, 0, RANGE)
    if depth >= DEEPEST:
        return _halve(rows, low, high, left, right)
    bins = BINS if high - low > FEW else BINS // 2
    full = np.float32(bins) * np.float32(0.99999)
    sx, sy, sz = -span[12] - span[8], -span[13] - span[9], -span[14] - span[10]
    kx = full / sx if sx > np.float32(1e-30) else np.float32(0.0)
    ky = full / sy if sy > np.float32(1e-30) else np.float32(0.0)
    kz = full / sz if sz > np.float32(1e-30) else np.float32(0.0)
    axis = 0 if sx >= max(sy, sz) else (1 if sy >= sz else 2)
    _clear(scratch, 0, 8 * (2 * BINS + bins))
    counts[:] = 0
    if high - low > FEW:
        start, scale = span[8 + axis], (kx if axis == 0 else (ky if axis == 1 else kz))
        for i in range(low, high):
            j = BINS * axis + int((rows[8 * i + axis] - rows[8 * i + 4 + axis] - start) * scale)
            widen(scratch, 8 * j, rows, i)
            counts[j] += 1
    else:
        for i in range(low, high):
            jx = int((rows[8 * i] - rows[8 * i + 4] - span[8]) * kx)
            jy = int((rows[8 * i + 1] - rows[8 * i + 5] - span[9]) * ky) + BINS
            jz = int((rows[8 * i + 2] - rows[8 * i + 6] - span[10]) * kz) + 2 * BINS
            widen(scratch, 8 * jx, rows, i)
            widen(scratch, 8 * jy, rows, i)
            widen(scratch, 8 * jz, rows, i)
            counts[jx] += 1
            counts[jy] += 1
            counts[jz] += 1
    first, last, least = axis, -1, _FAR
    for k in range(3):
        if bins < BINS or k == first:
            at, cost = _best_bin(scratch, 8 * BINS * k, bins, counts, BINS * k, high - low)
            if at >= 0 and cost < least:
                axis, last, least = k, at, cost
    if last < 0:
        return _halve(rows, low, high, left, right)
    start, scale = span[8 + axis], (kx if axis == 0 else (ky if axis == 1 else kz))
    i, end = low, high
    while i < end:
        j = int((rows[8 * i + axis] - rows[8 * i + 4 + axis] - start) * scale)
        if j <= last:
            widen_middles(left, 8, rows, i)
            i += 1
        else:
            widen_middles(right, 8, rows, i)
            end -= 1
            for k in range(8):
                rows[8 * i + k], rows[8 * end + k] = rows[8 * end + k], rows[8 * i + k]
            chosen[i], chosen[end] = chosen[end], chosen[i]
    for j in range(last + 1):
        widen(left, 0, scratch, BINS * axis + j)
    for j in range(last + 1, bins):
        widen(right, 0, scratch, BINS * axis + j)
    return i


@kernel
def write_child(nodes: Any, node: int, lane: int, box: Any, at: int) -> None:
    """Put the box at box[at] into a lane of a node."""
    for k in range(3):
        nodes[node * NODE + 2 * WIDE * k + lane] = box[at + k]
        nodes[node * NODE + 2 * WIDE * k + WIDE + lane] = -box[at + 4 + k]


@inner
def _write_leaf(corners: Any, numbers: Any, leaf: int, points: Any, faces: Any, chosen: Any, low: int, n: int) -> None:
    for i in range(LEAF):
        t = chosen[low + i] if i < n else -1
        numbers[leaf * LEAF + i] = t
        for k in range(3):
            for axis in range(3):
                value = points[faces[t, k], axis] if t >= 0 else np.float32(np.nan)
                corners[leaf * BLOCK + LEAF * (3 * k + axis) + i] = value


@inner
def _halvings(rows: Any, chosen: Any, low: int, high: int, depth: int, whole: Any) -> Any:
    """A tree of two children a node, parents first: boxes (n*8,) float32, sides (n,2) int32.

    Sides are the two children's numbers, or of a leaf -1 less its first triangle's place and how many it has.
    """
    boxes, sides = np.empty(16 * (high - low), np.float32), np.empty((2 * (high - low), 2), np.int32)
    waiting, of_waiting = np.empty((STACK, 4), np.int64), np.empty((STACK, RANGE), np.float32)
    span, left, right = np.empty(RANGE, np.float32), np.empty(RANGE, np.float32), np.empty(RANGE, np.float32)
    scratch, counts = np.empty(SCRATCH, np.float32), np.empty(3 * BINS, np.int32)
    waiting[0, 0], waiting[0, 1], waiting[0, 2], waiting[0, 3] = low, high, depth, 0
    of_waiting[0] = whole
    boxes[:8] = whole[:8]
    n_waiting, n = 1, 1
    while n_waiting > 0:
        n_waiting -= 1
        begin, end, deep, node = (
            waiting[n_waiting, 0], waiting[n_waiting, 1], waiting[n_waiting, 2], waiting[n_waiting, 3]
        )  # fmt: skip
        if end - begin <= LEAF:
            sides[node, 0], sides[node, 1] = -1 - begin, end - begin
            continue
        for k in range(RANGE):
            span[k] = of_waiting[n_waiting, k]
        middle = split(rows, chosen, begin, end, deep, span, left, right, scratch, counts)
        sides[node, 0], sides[node, 1] = n, n + 1
        for k in range(8):
            boxes[8 * n + k], boxes[8 * n + 8 + k] = left[k], right[k]
        for k in range(RANGE):
            of_waiting[n_waiting, k], of_waiting[n_waiting + 1, k] = right[k], left[k]
        waiting[n_waiting, 0], waiting[n_waiting, 1] = middle, end
        waiting[n_waiting + 1, 0], waiting[n_waiting + 1, 1] = begin, middle
        waiting[n_waiting, 2], waiting[n_waiting, 3] = deep + 1, n + 1
        waiting[n_waiting + 1, 2], waiting[n_waiting + 1, 3] = deep + 1, n
        n_waiting, n = n_waiting + 2, n + 2
    return boxes[: 8 * n], sides[:n]


@inner
def _plan(boxes: Any, sides: Any) -> Any:
    """How to take eight children a node so that the nodes' areas sum to least (Ylitie, Karras and Laine 2017).

    Of each node, shares (n,9) int8: entry i says how many of i children its first side gets, 0 where it is cheaper to
    do with one child less; with one child it stands as a node of its own, whose eight are shared by entry 8.
    """
    costs, shares = np.zeros((len(sides), WIDE), np.float32), np.zeros((len(sides), WIDE + 1), np.int8)
    for node in range(len(sides) - 1, -1, -1):
        p, q = sides[node, 0], sides[node, 1]
        if p < 0:
            continue
        for i in range(2, WIDE + 1):
            best, share = _FAR, 0
            for k in range(1, i):
                cost = costs[p, k] + costs[q, i - k]
                if cost < best:
                    best, share = cost, k
            shares[node, i] = share
            if i < WIDE:
                costs[node, i] = best
            else:
                costs[node, 1] = best + half_area(boxes, 8 * node)
        for i in range(2, WIDE):
            if costs[node, i - 1] <= costs[node, i]:
                costs[node, i], shares[node, i] = costs[node, i - 1], 0
    return shares


@inner
def _share(sides: Any, shares: Any, node: int, opened: Any, waiting: Any) -> int:
    """Write the up to eight children that the plan gives a node to opened (WIDE,); returns how many."""
    if sides[node, 0] < 0:
        opened[0] = node
        return 1
    n, n_waiting = 0, 1
    waiting[0, 0], waiting[0, 1] = node, WIDE
    while n_waiting > 0:
        n_waiting -= 1
        one, slots = waiting[n_waiting, 0], waiting[n_waiting, 1]
        while slots > 1 and sides[one, 0] >= 0 and shares[one, slots] == 0:
            slots -= 1
        if slots == 1 or sides[one, 0] < 0:
            opened[n] = one
            n += 1
            continue
        share = shares[one, slots]
        waiting[n_waiting, 0], waiting[n_waiting, 1] = sides[one, 1], slots - share
        waiting[n_waiting + 1, 0], waiting[n_waiting + 1, 1] = sides[one, 0], share
        n_waiting += 2
    return n


@kernel
def grow(points: Any, faces: Any, rows: Any, chosen: Any, low: int, high: int, depth: int, whole: Any) -> Any:
    """Build the subtree over triangles low .. high, described by whole (RANGE,).

    Returns nodes (n*NODE,) float32, corners (m*BLOCK,) float32, numbers (m*LEAF,) int32. Node 0 is the root.
    """
    boxes, sides = _halvings(rows, chosen, low, high, depth, whole)
    shares = _plan(boxes, sides)
    most = (len(sides) + 1) // 2
    nodes, corners, numbers = (
        np.empty(NODE * most, np.float32), np.empty(BLOCK * most, np.float32), np.empty(LEAF * most, np.int32)
    )  # fmt: skip
    links = nodes.view(np.int32)
    waiting, opened, sharing = (
        np.empty((STACK, 2), np.int64),
        np.empty(WIDE, np.int64),
        np.empty((2 * WIDE, 2), np.int64),
    )
    waiting[0, 0], waiting[0, 1] = 0, 0
    n_waiting, n_nodes, n_leaves = 1, 1, 0
    while n_waiting > 0:
        n_waiting -= 1
        node = waiting[n_waiting, 1]
        n_opened = _share(sides, shares, waiting[n_waiting, 0], opened, sharing)
        for k in range(NODE):
            nodes[node * NODE + k] = _FAR if (k // WIDE) % 2 == 0 else -_FAR
        for lane in range(WIDE):
            if lane >= n_opened:
                links[node * NODE + LINKS + lane] = EMPTY
                continue
            one = opened[lane]
            write_child(nodes, node, lane, boxes, 8 * one)
            if sides[one, 0] < 0:
                _write_leaf(corners, numbers, n_leaves, points, faces, chosen, -1 - sides[one, 0], sides[one, 1])
                n_leaves += 1
                links[node * NODE + LINKS + lane] = -n_leaves
            else:
                links[node * NODE + LINKS + lane] = n_nodes
                waiting[n_waiting, 0], waiting[n_waiting, 1] = one, n_nodes
                n_waiting, n_nodes = n_waiting + 1, n_nodes + 1
    return nodes[: NODE * n_nodes], corners[: BLOCK * n_leaves], numbers[: LEAF * n_leaves]


@kernel
def join(nodes: Any, subtree: Any, node: int, leaf: int) -> None:
    """Copy the nodes of a subtree to where its root is `node` and its first leaf is `leaf`."""
    links, from_links = nodes.view(np.int32), subtree.view(np.int32)
    for k in range(len(subtree) // NODE):
        for j in range(NODE):
            nodes[NODE * (node + k) + j] = subtree[NODE * k + j]
        for lane in range(LINKS, LINKS + WIDE):
            link = from_links[NODE * k + lane]
            if link != EMPTY:
                links[NODE * (node + k) + lane] = link + node if link >= 0 else link - leaf

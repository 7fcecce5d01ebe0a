"""Kernels of the tree over projected triangles: Morton order (Morton 1966) and an implicit tree of boxes, eight a
block.

Block q holds eight boxes side by side. The first level has a box for every triangle in Morton order, each further
level one for every block of the level below, and the last level is one block, the root. A walk tests a block at once.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import I32
from .block import WIDE

STACK = 128  # a walk holds at most seven blocks a level, and there are at most eleven levels
_BITS = 22  # of each coordinate in a Morton code
_RADIX = 11


@kernel
def bounds(points: Any, faces: Any, chosen: Any, found: Any) -> None:
    """Widen least x, y and greatest x, y (4,) by the middles of the boxes of the chosen faces."""
    for i in range(len(chosen)):
        a, b, c = faces[chosen[i], 0], faces[chosen[i], 1], faces[chosen[i], 2]
        for k in range(2):
            p, q, r = points[a, k], points[b, k], points[c, k]
            middle = 0.5 * (min(p, min(q, r)) + max(p, max(q, r)))
            found[k] = min(found[k], middle)
            found[2 + k] = max(found[2 + k], middle)


@kernel
def morton_codes(points: Any, faces: Any, chosen: Any, box: Any, begin: int, end: int, code: Any) -> None:
    """Morton codes (k,) uint64 of the chosen faces begin .. end."""
    size = max(box[2] - box[0], box[3] - box[1])
    scale = ((1 << _BITS) - 1) / size if size > 0.0 else 0.0
    for i in range(begin, end):
        a, b, c = faces[chosen[i], 0], faces[chosen[i], 1], faces[chosen[i], 2]
        interleaved = np.uint64(0)
        for k in range(2):
            p, q, r = points[a, k], points[b, k], points[c, k]
            middle = 0.5 * (min(p, min(q, r)) + max(p, max(q, r)))
            m = np.uint64((middle - box[k]) * scale)
            m = (m | (m << np.uint64(16))) & np.uint64(0x0000FFFF0000FFFF)
            m = (m | (m << np.uint64(8))) & np.uint64(0x00FF00FF00FF00FF)
            m = (m | (m << np.uint64(4))) & np.uint64(0x0F0F0F0F0F0F0F0F)
            m = (m | (m << np.uint64(2))) & np.uint64(0x3333333333333333)
            m = (m | (m << np.uint64(1))) & np.uint64(0x5555555555555555)
            interleaved |= m << np.uint64(k)
        code[i] = interleaved


def in_order(code: NDArray[np.uint64], chosen: I32) -> I32:
    """The chosen faces in rising order of their codes (overwritten), equal ones as they were."""
    n_passes = (2 * _BITS + _RADIX - 1) // _RADIX  # an even number, so that the result ends where it began
    count = np.zeros((n_passes, (1 << _RADIX) + 1), np.int32)
    faces = chosen.copy()
    _sort(code, np.empty_like(code), faces, np.empty_like(faces), count)
    return faces


@kernel
def _sort(codes: Any, spare_codes: Any, faces: Any, spare: Any, count: Any) -> None:
    """Radix sort, least significant digit first."""
    n = len(codes)
    mask = np.uint64((1 << _RADIX) - 1)
    for i in range(n):
        for p in range(len(count)):
            count[p, ((codes[i] >> np.uint64(_RADIX * p)) & mask) + np.uint64(1)] += 1
    for p in range(len(count)):
        for d in range(1 << _RADIX):
            count[p, d + 1] += count[p, d]
        for i in range(n):
            digit = (codes[i] >> np.uint64(_RADIX * p)) & mask
            q = count[p, digit]
            count[p, digit] = q + 1
            spare_codes[q], spare[q] = codes[i], faces[i]
        codes, spare_codes = spare_codes, codes
        faces, spare = spare, faces


@kernel
def fill_triangles(
    points: Any, faces: Any, face_node: Any, face_patch: Any, facing: Any, is_occluder: Any, order: Any, pad: Any,
    begin: int, end: int, boxes: Any, corners: Any, labels: Any,
) -> None:  # fmt: skip
    """Triangles begin .. end of the order side by side, and their boxes.

    boxes (q,5,8) float32: least x, y, greatest x, y, least depth, rounded outward. corners (k,9): x, y, depth of three
    corners that turn left on the page (y down: against the clock as printed). labels (k,6) int32: their vertices,
    face, node, and patch, the patch as -1 - patch where the triangle hides only its own part.
    """
    for i in range(begin, end):
        t = order[i]
        left, top, right, bottom, near = np.inf, np.inf, -np.inf, -np.inf, np.inf
        for k in range(3):
            # A triangle seen from its back is turned over.
            v = faces[t, k] if facing[t] > 0 else faces[t, 2 - k]
            labels[i, k] = v
            x, y, z = points[v, 0], points[v, 1], points[v, 2]
            corners[i, 3 * k], corners[i, 3 * k + 1], corners[i, 3 * k + 2] = x, y, z
            left, right = min(left, x), max(right, x)
            top, bottom = min(top, y), max(bottom, y)
            near = min(near, z)
        labels[i, 3], labels[i, 4] = t, face_node[t]
        labels[i, 5] = face_patch[t] if is_occluder[t] else -1 - face_patch[t]
        q, k = i // WIDE, i % WIDE
        boxes[q, 0, k], boxes[q, 1, k] = rounded_down(left - pad), rounded_down(top - pad)
        boxes[q, 2, k], boxes[q, 3, k] = -rounded_down(-right - pad), -rounded_down(-bottom - pad)
        boxes[q, 4, k] = rounded_down(near)


@inner
def rounded_down(value: Any) -> Any:
    """A float32 not above a float64."""
    return np.float32(value - abs(value) * 1.2e-7)


@kernel
def fill_levels(boxes: Any, starts: Any) -> None:
    """Boxes of the blocks of all further levels. starts (levels + 1,): the first block of each level."""
    for level in range(1, len(starts) - 1):
        for i in range(starts[level - 1], starts[level]):
            q, k = starts[level] + (i - starts[level - 1]) // WIDE, (i - starts[level - 1]) % WIDE
            for side in range(5):
                found = boxes[i, side, 0]
                for j in range(1, WIDE):
                    other = boxes[i, side, j]
                    found = max(found, other) if side == 2 or side == 3 else min(found, other)
                boxes[q, side, k] = found

"""One tile: which face each sample shows, and how deep.

Coverage is exact. Edge functions of the snapped corners are integers, and the top-left rule gives a sample that
lies on a shared edge to one of the two triangles (Pineda 1988). Edges are evaluated on a lattice of 1/16 px that holds
every sample. A block of 8 x 8 px is passed over when it lies outside an edge or behind its farthest sample.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from ..compiled import inner
from .bins import TILE
from .block import LANES, cover_1, cover_4

_LONG = 1 << 22  # 1/256 px: a triangle this long may overflow 32 bits outside single blocks
_OUTERMOST = np.float32(np.inf)


@inner
def _edge(ax: Any, ay: Any, bx: Any, by: Any) -> Any:
    """Edge function E = a x + b y + c in lattice units, at least 0 inside; the top-left rule is in c."""
    a, b = ay - by, bx - ax
    c = -(a * ax + b * ay)
    if not (a > 0 or (a == 0 and b > 0)):
        c -= 1
    return a, b, c >> 4


@inner
def _cover(
    samples: int, depth: Any, face: Any, o: int, e: Any, a: Any, b: Any, z: Any, zx: Any, zy: Any, t: Any
) -> None:
    e0, e1, e2 = np.int32(e[0]), np.int32(e[1]), np.int32(e[2])
    if samples == 4:
        cover_4(depth, face, o, e0, e1, e2, a[0], a[1], a[2], b[0], b[1], b[2], np.float32(z), zx, zy, t)
    else:
        cover_1(depth, face, o, e0, e1, e2, a[0], a[1], a[2], b[0], b[1], b[2], np.float32(z), zx, zy, t)


@inner
def raster_tile(
    faces: Any, pieces: Any, piece_face: Any, x: Any, y: Any, z: Any, face_patch: Any, patch_plane: Any, planes: Any,
    entries: Any, begin: int, end: int, left: Any, top: Any, columns: Any, rows: Any, corner: Any,
    samples: Any, depth: Any, face: Any, farthest: Any,
) -> None:  # fmt: skip
    """Draw entries begin .. end into the tile whose first pixel is (left, top) of the window.

    depth, face (32*32*samples,) float32, int32: cleared here to infinity and -1. farthest (16,) float32: scratch, the
    depth behind which each 8 x 8 block is full.
    """
    depth[:] = _OUTERMOST
    face[:] = -1
    farthest[:] = _OUTERMOST
    step = LANES // samples
    last_x, last_y = min(TILE, columns - left) - 1, min(TILE, rows - top) - 1
    shift_x, shift_y = np.int64(left) * 256, np.int64(top) * 256
    for q in range(begin, end):
        t = entries[q]
        if t < len(faces):
            v0, v1, v2 = faces[t, 0], faces[t, 1], faces[t, 2]
        else:
            v0, v1, v2 = pieces[t - len(faces), 0], pieces[t - len(faces), 1], pieces[t - len(faces), 2]
            t = piece_face[t - len(faces)]
        tag = np.int32(t)
        ax, ay = np.int64(x[v0]) - shift_x, np.int64(y[v0]) - shift_y
        bx, by = np.int64(x[v1]) - shift_x, np.int64(y[v1]) - shift_y
        cx, cy = np.int64(x[v2]) - shift_x, np.int64(y[v2]) - shift_y
        za, zb, zc = np.float64(z[v0]), np.float64(z[v1]), np.float64(z[v2])
        area = (bx - ax) * (cy - ay) - (cx - ax) * (by - ay)
        if area < 0:
            bx, cx, by, cy, zb, zc, area = cx, bx, cy, by, zc, zb, -area
        x0: Any = min(ax, min(bx, cx))
        x1: Any = max(ax, max(bx, cx))
        y0: Any = min(ay, min(by, cy))
        y1: Any = max(ay, max(by, cy))
        is_long = (x1 - x0) + (y1 - y0) >= _LONG
        if samples == 4:
            x0, x1, y0, y1 = (x0 + 31) >> 8, (x1 - 32) >> 8, (y0 + 31) >> 8, (y1 - 32) >> 8
        else:
            x0, x1, y0, y1 = (x0 + 127) >> 8, (x1 - 128) >> 8, (y0 + 127) >> 8, (y1 - 128) >> 8
        x0, x1, y0, y1 = max(x0, 0), min(x1, last_x), max(y0, 0), min(y1, last_y)
        a0, b0, c0 = _edge(ax, ay, bx, by)
        a1, b1, c1 = _edge(bx, by, cx, cy)
        a2, b2, c2 = _edge(cx, cy, ax, ay)
        # Pass over a triangle outside this tile's share of its box; drop edges that hold all over it.
        west, east, north, south = x0 * 16, x1 * 16 + 16, y0 * 16, y1 * 16 + 16
        if (
            c0 + max(a0 * west, a0 * east) + max(b0 * north, b0 * south) < 0
            or c1 + max(a1 * west, a1 * east) + max(b1 * north, b1 * south) < 0
            or c2 + max(a2 * west, a2 * east) + max(b2 * north, b2 * south) < 0
        ):
            continue
        # Blocks reach beyond the box to the next multiple of 8 px.
        west, east, north, south = (x0 & ~7) * 16, ((x1 | 7) + 1) * 16, (y0 & ~7) * 16, ((y1 | 7) + 1) * 16
        if c0 + min(a0 * west, a0 * east) + min(b0 * north, b0 * south) >= 0:
            a0, b0, c0 = 0, 0, 0
        if c1 + min(a1 * west, a1 * east) + min(b1 * north, b1 * south) >= 0:
            a1, b1, c1 = 0, 0, 0
        if c2 + min(a2 * west, a2 * east) + min(b2 * north, b2 * south) >= 0:
            a2, b2, c2 = 0, 0, 0
        plane = patch_plane[face_patch[t]] if len(planes) else -1
        if plane >= 0:
            gx, gy = planes[plane, 0] / 16.0, planes[plane, 1] / 16.0
            z0 = planes[plane, 2] + planes[plane, 0] * (corner[0] + left) + planes[plane, 1] * (corner[1] + top)
            nearest = -_OUTERMOST
        else:
            share = 16.0 / area
            gx = ((zb - za) * (cy - ay) - (zc - za) * (by - ay)) * share
            gy = ((zc - za) * (bx - ax) - (zb - za) * (cx - ax)) * share
            z0 = za - (gx * ax + gy * ay) * (1.0 / 16.0)
            nearest = np.float32(min(za, min(zb, zc)))
        zx, zy = np.float32(gx), np.float32(gy)
        a = (np.int32(a0), np.int32(a1), np.int32(a2))
        b = (np.int32(b0), np.int32(b1), np.int32(b2))
        if x1 - x0 < 8 and y1 - y0 < 8 and not is_long:
            first, last = x0 // step, x1 // step
            for row in range(y0, y1 + 1):
                for block in range(first, last + 1):
                    west, north = block * step * 16, row * 16
                    e = (c0 + a0 * west + b0 * north, c1 + a1 * west + b1 * north, c2 + a2 * west + b2 * north)
                    o = row * (TILE * samples) + block * LANES
                    _cover(samples, depth, face, o, e, a, b, z0 + gx * west + gy * north, zx, zy, tag)
            continue
        for block_y in range(y0 >> 3, (y1 >> 3) + 1):
            for block_x in range(x0 >> 3, (x1 >> 3) + 1):
                behind = farthest[block_y * 4 + block_x]
                if nearest >= behind:
                    continue
                west, north = block_x * 128, block_y * 128
                k0, k1, k2 = c0 + a0 * west + b0 * north, c1 + a1 * west + b1 * north, c2 + a2 * west + b2 * north
                if (
                    k0 + max(a0 * 128, 0) + max(b0 * 128, 0) < 0
                    or k1 + max(a1 * 128, 0) + max(b1 * 128, 0) < 0
                    or k2 + max(a2 * 128, 0) + max(b2 * 128, 0) < 0
                ):
                    continue
                kz = z0 + gx * west + gy * north
                if np.float32(kz + min(gx * 128.0, 0.0) + min(gy * 128.0, 0.0)) >= behind:
                    continue
                # An edge that holds all over the block is dropped: what is left crosses it and fits 32 bits.
                f0 = k0 + min(a0 * 128, 0) + min(b0 * 128, 0) >= 0
                f1 = k1 + min(a1 * 128, 0) + min(b1 * 128, 0) >= 0
                f2 = k2 + min(a2 * 128, 0) + min(b2 * 128, 0) >= 0
                p0, q0, k0 = (0, 0, 0) if f0 else (a0, b0, k0)
                p1, q1, k1 = (0, 0, 0) if f1 else (a1, b1, k1)
                p2, q2, k2 = (0, 0, 0) if f2 else (a2, b2, k2)
                if f0 and f1 and f2:
                    farthest[block_y * 4 + block_x] = min(
                        behind, np.float32(kz + max(gx * 128.0, 0.0) + max(gy * 128.0, 0.0))
                    )
                ba = (np.int32(p0), np.int32(p1), np.int32(p2))
                bb = (np.int32(q0), np.int32(q1), np.int32(q2))
                for row in range(8):
                    o = (block_y * 8 + row) * (TILE * samples) + block_x * 8 * samples
                    for block in range(8 // step):
                        sl, su = block * step * 16, row * 16
                        e = (k0 + p0 * sl + q0 * su, k1 + p1 * sl + q1 * su, k2 + p2 * sl + q2 * su)
                        zz = z0 + gx * (west + sl) + gy * (north + su)
                        _cover(samples, depth, face, o + block * LANES, e, ba, bb, zz, zx, zy, tag)

"""Vertices to pixels, and the clipping of triangles that reach behind the eye or far off the page.

Pixel coordinates are snapped to 1/256 px on the page's own grid, then counted from the window's corner, so a
picture does not depend on how it is cut into windows or bands.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from ..compiled import kernel

SUBPIXELS = 256
NEAR = 0.01  # mm: nothing nearer to the plane of the projection centre is drawn
GUARD = 15_990.0  # px from the window's middle to the guard band's edge, so that a triangle spans at most 31 980


@kernel
def project(
    points: Any, to_pixel: Any, spans: Any, first: Any, shifts: Any, corner: Any, middle: Any,
    begin: int, end: int, x: Any, y: Any, depth: Any, outside: Any,
) -> int:  # fmt: skip
    """Project positions begin .. end of the run of all shown vertices; returns how many lie outside.

    Writes x, y (n,) int32 in 1/256 px from the window's corner, depth (n,) float32, outside (n,) uint8: 1 where
    a vertex is nearer than `NEAR` or beyond the guard band.
    """
    n_outside = 0
    for s in range(len(spans)):
        low, high = max(begin, first[s]), min(end, first[s + 1])
        if low >= high:
            continue
        sx, sy, sz, sw = shifts[spans[s, 4], 0], shifts[spans[s, 4], 1], shifts[spans[s, 4], 2], shifts[spans[s, 4], 3]
        a0, a1, a2, a3 = to_pixel[0, 0], to_pixel[0, 1], to_pixel[0, 2], to_pixel[0, 3] + sx
        b0, b1, b2, b3 = to_pixel[1, 0], to_pixel[1, 1], to_pixel[1, 2], to_pixel[1, 3] + sy
        c0, c1, c2, c3 = to_pixel[2, 0], to_pixel[2, 1], to_pixel[2, 2], to_pixel[2, 3] + sz
        d0, d1, d2, d3 = to_pixel[3, 0], to_pixel[3, 1], to_pixel[3, 2], to_pixel[3, 3] + sw
        for v in range(spans[s, 0] + low - first[s], spans[s, 0] + high - first[s]):
            px, py, pz = points[v, 0], points[v, 1], points[v, 2]
            w = d0 * px + d1 * py + d2 * pz + d3
            inverse = 1.0 / (w if w >= NEAR else 1.0)
            column = (a0 * px + a1 * py + a2 * pz + a3) * inverse
            row = (b0 * px + b1 * py + b2 * pz + b3) * inverse
            is_out = w < NEAR or abs(column - middle[0]) > GUARD or abs(row - middle[1]) > GUARD
            outside[v] = is_out
            n_outside += is_out
            x[v] = 0 if is_out else np.int32(math.floor(column * SUBPIXELS + 0.5) - corner[0] * SUBPIXELS)
            y[v] = 0 if is_out else np.int32(math.floor(row * SUBPIXELS + 0.5) - corner[1] * SUBPIXELS)
            depth[v] = np.float32((c0 * px + c1 * py + c2 * pz + c3) * inverse)
    return n_outside


@kernel
def count_outside(faces: Any, spans: Any, outside: Any) -> int:
    """Triangles with a corner outside, that `clip` must look at."""
    count = 0
    for s in range(len(spans)):
        for t in range(spans[s, 2], spans[s, 3]):
            count += (outside[faces[t, 0]] | outside[faces[t, 1]] | outside[faces[t, 2]]) != 0
    return count


@kernel
def clip(
    points: Any, faces: Any, to_pixel: Any, spans: Any, first: Any, shifts: Any, corner: Any, middle: Any,
    outside: Any, n_triangles: int,
) -> Any:  # fmt: skip
    """Clip those triangles to the near plane and the guard band (Sutherland and Hodgman 1974).

    Returns x, y, depth of the new vertices, the pieces (k,3) int32 numbered from len(points), the face (k,) of each
    and its position (k,) in the run of all shown faces, rising. A cut edge is always computed from its inner to its
    outer end, so both triangles at the edge get the same point.
    """
    x, y = np.empty(n_triangles * 8, np.int32), np.empty(n_triangles * 8, np.int32)
    depth = np.empty(n_triangles * 8, np.float32)
    pieces, piece_face = np.empty((n_triangles * 6, 3), np.int32), np.empty(n_triangles * 6, np.int32)
    piece_position = np.empty(n_triangles * 6, np.int64)
    polygon, cut = np.empty((16, 4)), np.empty((16, 4))
    bounds = np.zeros((5, 4))
    bounds[0, 2], bounds[0, 3] = 0.0, 1.0
    for side in range(2):
        bounds[1 + 2 * side, side], bounds[1 + 2 * side, 3] = -1.0, middle[side] + GUARD
        bounds[2 + 2 * side, side], bounds[2 + 2 * side, 3] = 1.0, GUARD - middle[side]
    n_vertices, n_pieces = 0, 0
    for s in range(len(spans)):
        for t in range(spans[s, 2], spans[s, 3]):
            if not (outside[faces[t, 0]] | outside[faces[t, 1]] | outside[faces[t, 2]]):
                continue
            n = 3
            for j in range(3):
                for r in range(4):
                    value = to_pixel[r, 3] + shifts[spans[s, 4], r]
                    for k in range(3):
                        value += to_pixel[r, k] * points[faces[t, j], k]
                    polygon[j, r] = value
            for side in range(5):
                n_cut = 0
                for j in range(n):
                    a, b = polygon[j], polygon[(j + 1) % n]
                    da, db = -NEAR if side == 0 else 0.0, -NEAR if side == 0 else 0.0
                    for r in range(4):
                        da += bounds[side, r] * a[r]
                        db += bounds[side, r] * b[r]
                    if da >= 0.0:
                        cut[n_cut] = a
                        n_cut += 1
                    if (da >= 0.0) != (db >= 0.0):
                        inner, outer = (a, b) if da >= 0.0 else (b, a)
                        share = da / (da - db) if da >= 0.0 else db / (db - da)
                        for r in range(4):
                            cut[n_cut, r] = inner[r] + share * (outer[r] - inner[r])
                        n_cut += 1
                polygon, cut = cut, polygon
                n = n_cut
                if n < 3:
                    break
            if n < 3:
                continue
            for j in range(n):
                inverse = 1.0 / polygon[j, 3]
                column = min(max(polygon[j, 0] * inverse, middle[0] - GUARD), middle[0] + GUARD)
                row = min(max(polygon[j, 1] * inverse, middle[1] - GUARD), middle[1] + GUARD)
                x[n_vertices + j] = np.int32(math.floor(column * SUBPIXELS + 0.5) - corner[0] * SUBPIXELS)
                y[n_vertices + j] = np.int32(math.floor(row * SUBPIXELS + 0.5) - corner[1] * SUBPIXELS)
                depth[n_vertices + j] = np.float32(polygon[j, 2] * inverse)
            for j in range(1, n - 1):
                pieces[n_pieces, 0] = len(points) + n_vertices
                pieces[n_pieces, 1] = len(points) + n_vertices + j
                pieces[n_pieces, 2] = len(points) + n_vertices + j + 1
                piece_face[n_pieces] = t
                piece_position[n_pieces] = first[s] + t - spans[s, 2]
                n_pieces += 1
            n_vertices += n
    kept = slice(0, n_pieces)
    new = slice(0, n_vertices)
    return x[new], y[new], depth[new], pieces[kept], piece_face[kept], piece_position[kept]

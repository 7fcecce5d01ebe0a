"""From the faces seen in a tile to its pixels: gather jobs, light them, resolve the samples, encode.

Each face seen in a pixel is shaded once, at the pixel's centre held inside the face, and counts by its number of
samples. Attributes are interpolated by homogeneous edge functions (Olano and Greer 1997), which are
perspective-correct, need no clipping and serve both projections. Colours are clamped to 0..1 face by face,
averaged in linear light and encoded as sRGB to the nearest of 256 levels.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from ..compiled import fast_inner, inner
from .bins import TILE
from .light import BLOCK, RESULT, WIDTH, light_blocks

# Blocks are lit after the row of pixels that fills ENOUGH of them, to stay in the nearest cache; a row adds at most one
# block for each of its samples.
ENOUGH = 16
N_BLOCKS = ENOUGH + 4 * TILE
_ZERO, _ONE, _HALF = np.float32(0), np.float32(1), np.float32(0.5)
_RESULT = RESULT * WIDTH


@fast_inner
def _deposit(jobs: Any, fills: Any, n_blocks: int, pixel: Any, share: Any, light: Any) -> None:
    """Clamp the shaded jobs and add them to their pixels."""
    for block in range(n_blocks):
        for k in range(fills[block]):
            o = block * BLOCK + _RESULT + k
            p, w = pixel[block * WIDTH + k], share[block * WIDTH + k]
            for channel in range(3):
                value = jobs[o + channel * WIDTH]
                value = value if value > _ZERO else _ZERO
                light[p * 3 + channel] += w * (value if value < _ONE else _ONE)


@fast_inner
def shade_tile(
    face: Any, left: int, top: int, width: int, height: int, samples: int,
    points: Any, faces: Any, normals: Any, face_node: Any, node_shift: Any, node_move: Any, node_material: Any,
    node_open: Any, to_pixel: Any, sight: Any, materials: Any, far: Any, near: Any, ambient: Any, axis: Any,
    jobs: Any, pixel: Any, share: Any, block_material: Any, fills: Any, open_block: Any, light: Any,
) -> bool:  # fmt: skip
    """Shade one tile of `face` (32*32*samples,) whose first pixel is page pixel (left, top).

    light (32*32*3,) float32 gets linear RGB over white. sight (3,3) float64: direction toward the eye, of any length,
    is sight @ (x, y, 1) in page pixels. The rest is scratch. False if nothing is seen.
    """
    weight = _ONE / np.float32(samples)
    light[:] = _ZERO
    v0, v1 = np.float32(0), np.float32(0)
    sight_x, sight_y, sight_0 = np.empty(3, np.float32), np.empty(3, np.float32), np.empty(3, np.float32)
    for r in range(3):
        sight_x[r], sight_y[r] = np.float32(sight[r, 0]), np.float32(sight[r, 1])
        sight_0[r] = np.float32(sight[r, 0] * left + sight[r, 1] * top + sight[r, 2])
    sx0, sx1, sx2, sy0, sy1, sy2 = sight_x[0], sight_x[1], sight_x[2], sight_y[0], sight_y[1], sight_y[2]
    s00, s01, s02 = sight_0[0], sight_0[1], sight_0[2]
    has_lamps = near.shape[1] > 0
    corner = np.empty((3, 3))
    place = np.zeros((3, 3), np.float32)
    n_blocks, last, is_seen, material = 0, -1, False, 0
    x0 = x1 = x2 = y0 = y1 = y2 = c0 = c1 = c2 = _ZERO
    n00 = n01 = n02 = n10 = n11 = n12 = n20 = n21 = n22 = _ZERO
    sign = _ONE
    for y in range(height):
        v1 = np.float32(y) + _HALF
        for x in range(width):
            p = y * TILE + x
            o = p * samples
            v0 = np.float32(x) + _HALF
            done, empty = 0, 0
            is_uniform = samples == 1 or (face[o] == face[o + 1] and face[o] == face[o + 2] and face[o] == face[o + 3])
            for s in range(1 if is_uniform else samples):
                if (done >> s) & 1:
                    continue
                t = face[o + s]
                count = 1
                if is_uniform:
                    count = samples
                else:
                    for other in range(s + 1, samples):
                        if face[o + other] == t:
                            count += 1
                            done |= 1 << other
                if t < 0:
                    empty += count
                    continue
                if t != last:
                    last = t
                    node = face_node[t]
                    material = node_material[node]
                    for j in range(3):
                        v = faces[t, j]
                        px, py, pz = points[v, 0], points[v, 1], points[v, 2]
                        w = to_pixel[3, 0] * px + to_pixel[3, 1] * py + to_pixel[3, 2] * pz + to_pixel[3, 3]
                        w += node_shift[node, 3]
                        for r in range(2):
                            value = to_pixel[r, 0] * px + to_pixel[r, 1] * py + to_pixel[r, 2] * pz + to_pixel[r, 3]
                            corner[j, r] = value + node_shift[node, r] - (left if r == 0 else top) * w
                        corner[j, 2] = w
                        if has_lamps:
                            for r in range(3):
                                place[j, r] = np.float32(points[v, r] + node_move[node, r])
                    ax, ay, aw = corner[0, 0], corner[0, 1], corner[0, 2]
                    bx, by, bw = corner[1, 0], corner[1, 1], corner[1, 2]
                    cx, cy, cw = corner[2, 0], corner[2, 1], corner[2, 2]
                    qx0, qy0, q0 = by * cw - bw * cy, bw * cx - bx * cw, bx * cy - by * cx
                    qx1, qy1, q1 = cy * aw - cw * ay, cw * ax - cx * aw, cx * ay - cy * ax
                    qx2, qy2, q2 = ay * bw - aw * by, aw * bx - ax * bw, ax * by - ay * bx
                    # Page y runs down, so a triangle that faces the viewer has a negative determinant.
                    det = ax * qx0 + ay * qy0 + aw * q0
                    size = 1.0 / det if det != 0.0 else 0.0
                    size *= max(aw, max(bw, cw))
                    x0, y0, c0 = np.float32(qx0 * size), np.float32(qy0 * size), np.float32(q0 * size)
                    x1, y1, c1 = np.float32(qx1 * size), np.float32(qy1 * size), np.float32(q1 * size)
                    x2, y2, c2 = np.float32(qx2 * size), np.float32(qy2 * size), np.float32(q2 * size)
                    sign = -_ONE if det > 0.0 and node_open[node] else _ONE
                    n00, n01, n02 = normals[t, 0, 0], normals[t, 0, 1], normals[t, 0, 2]
                    n10, n11, n12 = normals[t, 1, 0], normals[t, 1, 1], normals[t, 1, 2]
                    n20, n21, n22 = normals[t, 2, 0], normals[t, 2, 1], normals[t, 2, 2]
                w0, w1, w2 = x0 * v0 + y0 * v1 + c0, x1 * v0 + y1 * v1 + c1, x2 * v0 + y2 * v1 + c2
                w0 = w0 if w0 > _ZERO else _ZERO
                w1 = w1 if w1 > _ZERO else _ZERO
                w2 = w2 if w2 > _ZERO else _ZERO
                if w0 + w1 + w2 <= _ZERO:  # the centre lies beyond the horizon of a face seen edge on
                    w0, w1, w2 = _ONE, _ONE, _ONE
                # The mask says to the compiler that no index is negative.
                slot = open_block[material] & 0xFFFF
                if slot & 15 == 0:
                    block_material[n_blocks] = material
                    slot = n_blocks * WIDTH
                    n_blocks += 1
                block, k = slot >> 4, slot & 15
                open_block[material] = slot + 1
                fills[block] = k + 1
                j = block * BLOCK + k
                jobs[j] = sign * (w0 * n00 + w1 * n10 + w2 * n20)
                jobs[j + 16] = sign * (w0 * n01 + w1 * n11 + w2 * n21)
                jobs[j + 32] = sign * (w0 * n02 + w1 * n12 + w2 * n22)
                jobs[j + 48] = sx0 * v0 + sy0 * v1 + s00
                jobs[j + 64] = sx1 * v0 + sy1 * v1 + s01
                jobs[j + 80] = sx2 * v0 + sy2 * v1 + s02
                if has_lamps:
                    total = _ONE / (w0 + w1 + w2 + np.float32(1e-30))
                    for r in range(3):
                        value = w0 * place[0, r] + w1 * place[1, r] + w2 * place[2, r]
                        jobs[j + 96 + 16 * r] = value * total
                pixel[slot] = p
                share[slot] = np.float32(count) * weight
                is_seen = True
            if empty:
                white = np.float32(empty) * weight
                light[p * 3] += white
                light[p * 3 + 1] += white
                light[p * 3 + 2] += white
        if n_blocks >= ENOUGH or y == height - 1:
            light_blocks(jobs, block_material, n_blocks, materials, far, near, ambient, axis)
            _deposit(jobs, fills, n_blocks, pixel, share, light)
            for block in range(n_blocks):
                open_block[block_material[block]] = 0
            n_blocks = 0
    return is_seen


@inner
def encode_tile(
    light: Any, width: int, height: int, image: Any, row: int, column: int, edges: Any, guess: Any, steps: Any
) -> None:
    """Write the tile's linear light into image (rows, columns, 3) uint8 from (row, column) on, as sRGB."""
    for y in range(height):
        for x in range(width):
            for channel in range(3):
                value = light[(y * TILE + x) * 3 + channel]
                level = np.int64(guess[np.int64(value * steps)])
                while value >= edges[level + 1]:
                    level += 1
                image[row + y, column + x, channel] = level

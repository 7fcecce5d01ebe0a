"""Shading of blocks of 16 jobs, one job being a pixel of one face. `reflectance` names the formulas.

A block holds jobs of one material, field after field, each 16 float32 long: normal 3, toward the eye 3, world place 3,
then scratch and the result. The loops over 16 compile to vector code.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from ..compiled import fast_inner
from .reflectance import CONTRAST, DEGREE

WIDTH = 16
NORMAL, VIEW, PLACE, COSINE, MASK, RESULT, LEFT = 0, 3, 6, 9, 10, 11, 14
FIELDS = 17
BLOCK = FIELDS * WIDTH

_ZERO, _ONE, _TWO, _HALF = np.float32(0), np.float32(1), np.float32(2), np.float32(0.5)
_TINY, _LEAST_COSINE, _AWAY = np.float32(1e-20), np.float32(1e-3), np.float32(-0.2)
_CONTRAST = np.float32(CONTRAST)
_SQUARE_METRE = np.float32(1e6)
_B = 5 + DEGREE + 1


@fast_inner
def _begin(jobs: Any, m: Any, ambient: Any, axis: Any) -> None:
    """Unit normals and directions; start the result with what the surround gives."""
    f0, f1, f2, a2, width = m[0], m[1], m[2], m[3], m[4]
    p0, p1, p2, p3, p4, p5, p6 = m[5], m[6], m[7], m[8], m[9], m[10], m[11]
    q0, q1, q2, q3, q4, q5, q6 = m[_B], m[_B + 1], m[_B + 2], m[_B + 3], m[_B + 4], m[_B + 5], m[_B + 6]
    r0, r1, r2, s0, s1, s2 = ambient[3], ambient[4], ambient[5], ambient[6], ambient[7], ambient[8]
    e0, e1, e2, ax, ay, az = ambient[9], ambient[10], ambient[11], axis[0], axis[1], axis[2]
    rest, spread = _ONE - a2, width * width
    for i in range(WIDTH):
        x, y, z = jobs[i], jobs[i + 16], jobs[i + 32]
        vx, vy, vz = jobs[i + 48], jobs[i + 64], jobs[i + 80]
        s = _ONE / math.sqrt(vx * vx + vy * vy + vz * vz + _TINY)
        vx, vy, vz = vx * s, vy * s, vz * s
        s = _ONE / math.sqrt(x * x + y * y + z * z + _TINY)
        cosine = (x * vx + y * vy + z * vz) * s
        s = s if cosine > _AWAY else -s
        x, y, z = x * s, y * s, z * s
        cosine = abs(cosine) if cosine <= _AWAY else cosine
        c = cosine if cosine > _LEAST_COSINE else _LEAST_COSINE
        c = c if c < _ONE else _ONE
        jobs[i], jobs[i + 16], jobs[i + 32] = x, y, z
        jobs[i + 48], jobs[i + 64], jobs[i + 80] = vx, vy, vz
        jobs[i + 144] = c
        jobs[i + 160] = math.sqrt(c * c * rest + a2)
        scale = p0 + c * (p1 + c * (p2 + c * (p3 + c * (p4 + c * (p5 + c * p6)))))
        bias = q0 + c * (q1 + c * (q2 + c * (q3 + c * (q4 + c * (q5 + c * q6)))))
        t = _TWO * cosine * (x * ax + y * ay + z * az) - (vx * ax + vy * ay + vz * az)
        seen = _ONE + _CONTRAST * t / math.sqrt(t * t + spread)
        left0, left1, left2 = _ONE - f0 * scale - bias, _ONE - f1 * scale - bias, _ONE - f2 * scale - bias
        jobs[i + 224], jobs[i + 240], jobs[i + 256] = left0, left1, left2
        even = _ONE + _CONTRAST * (x * ax + y * ay + z * az)
        jobs[i + 176] = r0 * left0 * even + (s0 * scale + e0 * bias) * seen
        jobs[i + 192] = r1 * left1 * even + (s1 * scale + e1 * bias) * seen
        jobs[i + 208] = r2 * left2 * even + (s2 * scale + e2 * bias) * seen


@fast_inner
def _reflected(
    x: Any, y: Any, z: Any, vx: Any, vy: Any, vz: Any, cosine: Any, mask: Any, lx: Any, ly: Any, lz: Any, a2: Any
) -> Any:
    """Of a light from the unit direction l: n.l, and pi times the microfacets' answer, its Schlick share apart."""
    n = x * lx + y * ly + z * lz
    n = n if n > _ZERO else _ZERO
    # The half vector h = (l + v) / |l + v| has |l + v|^2 = 2 + 2 l.v, n.h = (n.l + n.v) / |l + v|, v.h = |l + v| / 2.
    square = _TWO + _TWO * (vx * lx + vy * ly + vz * lz)
    square = square if square > _TINY else _TINY
    total = n + cosine
    lobe = square - total * total * (_ONE - a2)
    least = a2 * square
    lobe = lobe if lobe > least else least
    masks = n * mask + cosine * math.sqrt(n * n * (_ONE - a2) + a2)
    shine = _HALF * a2 * square * square * n / (lobe * lobe * masks + _TINY)
    miss = _ONE - _HALF * math.sqrt(square)
    miss = miss if miss > _ZERO else _ZERO
    fresnel = miss * miss
    grazing = shine * fresnel * fresnel * miss
    return n, shine - grazing, grazing


@fast_inner
def _add_far(jobs: Any, m: Any, light: Any) -> None:
    """Add a directional light, a row of `reflectance.light_rows`."""
    a2 = m[3]
    lx, ly, lz, r0, r1, r2 = light[0], light[1], light[2], light[3], light[4], light[5]
    f0, f1, f2, k0, k1, k2 = light[6], light[7], light[8], light[9], light[10], light[11]
    for i in range(WIDTH):
        n, shine, grazing = _reflected(
            jobs[i], jobs[i + 16], jobs[i + 32], jobs[i + 48], jobs[i + 64], jobs[i + 80], jobs[i + 144], jobs[i + 160],
            lx, ly, lz, a2,
        )  # fmt: skip
        jobs[i + 176] += r0 * jobs[i + 224] * n + f0 * shine + k0 * grazing
        jobs[i + 192] += r1 * jobs[i + 240] * n + f1 * shine + k1 * grazing
        jobs[i + 208] += r2 * jobs[i + 256] * n + f2 * shine + k2 * grazing


@fast_inner
def _add_near(jobs: Any, m: Any, light: Any) -> None:
    """Add a lamp, a row of `reflectance.light_rows`; its light falls with the square of the distance."""
    a2 = m[3]
    px, py, pz, r0, r1, r2 = light[0], light[1], light[2], light[3], light[4], light[5]
    f0, f1, f2, k0, k1, k2 = light[6], light[7], light[8], light[9], light[10], light[11]
    for i in range(WIDTH):
        lx, ly, lz = px - jobs[i + 96], py - jobs[i + 112], pz - jobs[i + 128]
        square = lx * lx + ly * ly + lz * lz + _TINY
        s = _ONE / math.sqrt(square)
        power = _SQUARE_METRE / square
        n, shine, grazing = _reflected(
            jobs[i], jobs[i + 16], jobs[i + 32], jobs[i + 48], jobs[i + 64], jobs[i + 80], jobs[i + 144], jobs[i + 160],
            lx * s, ly * s, lz * s, a2,
        )  # fmt: skip
        jobs[i + 176] += power * (r0 * jobs[i + 224] * n + f0 * shine + k0 * grazing)
        jobs[i + 192] += power * (r1 * jobs[i + 240] * n + f1 * shine + k1 * grazing)
        jobs[i + 208] += power * (r2 * jobs[i + 256] * n + f2 * shine + k2 * grazing)


@fast_inner
def light_blocks(
    jobs: Any, block_material: Any, n_blocks: int, materials: Any, far: Any, near: Any, ambient: Any, axis: Any
) -> None:
    """Shade blocks 0 .. n_blocks: the fields from RESULT on become linear RGB, not yet clamped."""
    for block in range(n_blocks):
        block_jobs = jobs[block * BLOCK : (block + 1) * BLOCK]
        row = block_material[block]
        material = materials[row]
        _begin(block_jobs, material, ambient[row], axis)
        for k in range(far.shape[1]):
            _add_far(block_jobs, material, far[row, k])
        for k in range(near.shape[1]):
            _add_near(block_jobs, material, near[row, k])

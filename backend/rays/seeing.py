"""How much of a source a point sees past the parts: the sun, the sky, a luminous panel.

Points are sampled a run at a time until the spread says that the mean is good enough. Every run is of points that
fill their square evenly (`sampling`), so errors fall nearly as 1/n where the shadow's edge is smooth and as 1/n^0.75
where it is any line (Owen 1997), faster than the 1/n^0.5 of chance.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import radians, tan
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import F64
from .blocks import in_blocks
from .bvh import Tree
from .lanes import WIDE
from .sampling import point
from .splitting import STACK
from .tracing import FACE_PAD, approach, arrays, walk

SUN_DIAMETER = 0.533  # degrees: the sun's mean apparent diameter, 1.392e6 km at 1.496e8 km
LEAST, MOST = 16, 1024  # samples a point
_BLOCK = 256  # points at a time
_DISC, _PANEL, _SKY = 0, 1, 2


@dataclass(frozen=True, slots=True)
class Distant:
    """A disc infinitely far off: the unit direction toward its middle, its apparent diameter in degrees, 0 for none."""

    direction: tuple[float, float, float]
    diameter: float = 0.0


@dataclass(frozen=True, slots=True)
class LuminousPanel:
    """A rectangle, equally bright from everywhere on the side to which `across` x `along` points; world mm."""

    corner: tuple[float, float, float]
    across: tuple[float, float, float]
    along: tuple[float, float, float]


@dataclass(frozen=True, eq=False, slots=True)
class Seen:
    """What points see.

    fraction (n,) float64, 0 .. 1: the part of the irradiance with nothing in the way that arrives, 0 where none could.
    factor (n,) float64: the configuration factor from the point to what it sees; for a distant source the mean cosine
    over what it sees of the disc. error (n,) float64: a standard error of `fraction`, from four runs of the samples;
    it is on the safe side since the four together fill the square more evenly than each; never below half a
    sample's weight, but for a distant point, which is exact. samples (n,) int32: how many were cast.
    """

    fraction: F64
    factor: F64
    error: F64
    samples: NDArray[np.int32]


def light_seen(
    tree: Tree, points: F64, normals: F64, light: Distant | LuminousPanel, keys: NDArray[np.uint32],
    error: float = 0.01, most: int = MOST, threads: int | None = None,
) -> Seen:  # fmt: skip
    """How much of a light points (n,3) float64 mm with unit normals (n,3) see; keys (n,) uint32 from `sampling`.

    Samples are doubled from 16 on until the error of a point is at most `error`, or there are `most` (a power of two).
    `normals` are those of the surface itself. The same bytes whatever `threads` and whatever other points are asked.
    """
    if isinstance(light, Distant):
        source = np.array([*_frame(light.direction), tan(radians(light.diameter) / 2), 0.0, 0.0])
        if light.diameter == 0.0:
            most = 1
        return _seen(tree, points, normals, _DISC, source, np.inf, keys, error, most, threads)
    source = np.array([*light.corner, *light.across, *light.along, *np.zeros(3)], np.float64)
    return _seen(tree, points, normals, _PANEL, source, np.inf, keys, error, most, threads)


def sky_seen(
    tree: Tree, points: F64, normals: F64, keys: NDArray[np.uint32], reach: float = np.inf,
    error: float = 0.01, most: int = MOST, threads: int | None = None,
) -> Seen:  # fmt: skip
    """How much of an evenly bright surround points see, weighted by the cosine to their normals: ambient occlusion.

    Parts farther off than `reach` mm hide nothing. Otherwise as `light_seen`; 1 - fraction is the sum of the
    configuration factors to the parts in sight.
    """
    return _seen(tree, points, normals, _SKY, np.zeros(12), reach, keys, error, most, threads)


def _seen(
    tree: Tree, points: F64, normals: F64, kind: int, source: F64, reach: float, keys: NDArray[np.uint32],
    error: float, most: int, threads: int | None,
) -> Seen:  # fmt: skip
    n = len(points)
    seen = Seen(np.zeros(n), np.zeros(n), np.zeros(n), np.zeros(n, np.int32))
    start, up, names = (np.ascontiguousarray(array) for array in (points, normals, keys))
    skin = tree.skin

    def work(begin: int, end: int) -> None:
        see_points(
            *arrays(tree), start, up, names, kind, source, float(reach), skin, float(error), most, begin, end,
            seen.fraction, seen.factor, seen.error, seen.samples,
        )  # fmt: skip

    in_blocks(work, n, _BLOCK, threads)
    return seen


def _frame(direction: tuple[float, float, float]) -> F64:
    """A unit direction and two unit vectors square to it and to each other (9,)."""
    z = np.asarray(direction, np.float64) / np.linalg.norm(direction)
    x = np.cross(z, (1.0, 0.0, 0.0) if abs(z[0]) < 0.7 else (0.0, 1.0, 0.0))
    x /= np.linalg.norm(x)
    return np.concatenate([z, x, np.cross(z, x)])


@inner
def disc(a: Any, b: Any) -> Any:
    """A point of the unit disc, evenly, from one of the unit square (Shirley and Chiu 1997)."""
    a, b = 2.0 * a - 1.0, 2.0 * b - 1.0
    if a == 0.0 and b == 0.0:
        return 0.0, 0.0
    if abs(a) > abs(b):
        radius, angle = a, np.pi / 4.0 * (b / a)
    else:
        radius, angle = b, np.pi / 2.0 - np.pi / 4.0 * (a / b)
    return radius * np.cos(angle), radius * np.sin(angle)


@inner
def _sample(kind: int, source: Any, x: Any, y: Any, z: Any, nx: Any, ny: Any, nz: Any, a: Any, b: Any) -> Any:
    """Unit direction of a sample, its weight, and how far off the source is there.

    The mean of the weights is the factor with nothing in the way.
    """
    if kind == _PANEL:
        tx, ty, tz = (
            source[0] + a * source[3] + b * source[6] - x, source[1] + a * source[4] + b * source[7] - y,
            source[2] + a * source[5] + b * source[8] - z,
        )  # fmt: skip
        px, py, pz = (
            source[4] * source[8] - source[5] * source[7], source[5] * source[6] - source[3] * source[8],
            source[3] * source[7] - source[4] * source[6],
        )  # fmt: skip
        square = tx * tx + ty * ty + tz * tz
        if not square > 0.0:
            return 0.0, 0.0, 1.0, 0.0, 0.0
        far = np.sqrt(square)
        here, there = tx * nx + ty * ny + tz * nz, -(tx * px + ty * py + tz * pz)
        return tx / far, ty / far, tz / far, max(here, 0.0) * max(there, 0.0) / (np.pi * square * square), far
    u, v = disc(a, b)
    if kind == _DISC:
        u, v = u * source[9], v * source[9]
        dx, dy, dz = (
            source[0] + u * source[3] + v * source[6], source[1] + u * source[4] + v * source[7],
            source[2] + u * source[5] + v * source[8],
        )  # fmt: skip
        size = 1.0 / np.sqrt(dx * dx + dy * dy + dz * dz)
        dx, dy, dz = dx * size, dy * size, dz * size
        return dx, dy, dz, max(dx * nx + dy * ny + dz * nz, 0.0), np.inf
    # A frame about the normal (Duff and others 2017); the disc below the hemisphere gives the cosine's weight.
    sign = 1.0 if nz >= 0.0 else -1.0
    p = -1.0 / (sign + nz)
    q = nx * ny * p
    w = np.sqrt(max(1.0 - u * u - v * v, 0.0))
    dx = u * (1.0 + sign * nx * nx * p) + v * q + w * nx
    dy = u * (sign * q) + v * (sign + ny * ny * p) + w * ny
    return dx, dy, u * (-sign * nx) - v * ny + w * nz, 1.0, np.inf


@kernel
def see_points(
    nodes: Any, links: Any, corners: Any, numbers: Any, frame: Any, points: Any, normals: Any, keys: Any,
    kind: int, source: Any, reach: Any, skin: Any, error: Any, most: int, begin: int, end: int,
    fraction: Any, factor: Any, spread: Any, samples: Any,
) -> None:  # fmt: skip
    """Write what points begin .. end see."""
    stack, entered, near = np.empty(STACK, np.int32), np.empty(STACK, np.float32), np.empty(WIDE, np.float32)
    found, open_run, seen_run = np.empty(2), np.empty(4), np.empty(4)
    pad = frame[9] * FACE_PAD
    for i in range(begin, end):
        nx, ny, nz = normals[i, 0], normals[i, 1], normals[i, 2]
        x, y, z = points[i, 0] + skin * nx, points[i, 1] + skin * ny, points[i, 2] + skin * nz
        n, wanted = 0, min(most, LEAST)
        whole = part = deviation = 0.0
        while True:
            # Sums of the four runs of this stage; earlier stages are the first half of the sum.
            open_run[:] = 0.0
            seen_run[:] = 0.0
            stage = wanted - n
            for k in range(n, wanted):
                a, b = point(keys[i], k)
                if most == 1:
                    a = b = 0.5
                dx, dy, dz, weight, far = _sample(kind, source, x, y, z, nx, ny, nz, a, b)
                if weight <= 0.0:
                    continue
                run = (k - n) * 4 // stage
                open_run[run] += weight
                within = min(reach, far - 2.0 * skin)
                start = approach(frame, x, y, z, dx, dy, dz, within) if len(nodes) > 0 else -1.0
                if start >= 0.0:
                    px, py, pz = x + start * dx - frame[6], y + start * dy - frame[7], z + start * dz - frame[8]
                    ray = (
                        np.float32(px), np.float32(py), np.float32(pz), np.float32(dx), np.float32(dy), np.float32(dz)
                    )  # fmt: skip
                    if walk(
                        nodes, links, corners, numbers, pad, ray, np.float32(within - start), True,
                        stack, entered, near, found,
                    ) >= 0:  # fmt: skip
                        continue
                seen_run[run] += weight
            n = wanted
            stage_whole = open_run[0] + open_run[1] + open_run[2] + open_run[3]
            stage_part = seen_run[0] + seen_run[1] + seen_run[2] + seen_run[3]
            whole, part = whole + stage_whole, part + stage_part
            if whole <= 0.0 or most == 1:
                break
            # Standard error of a ratio of sums over the runs, for all samples so far.
            ratio, squares = part / whole, 0.0
            for run in range(4):
                squares += (seen_run[run] - ratio * open_run[run]) ** 2
            deviation = np.sqrt(squares / 12.0) / max(stage_whole / 4.0, 1e-300) * np.sqrt(stage / n)
            deviation = max(deviation, 0.5 / n)
            if deviation <= error or n >= most:
                break
            wanted = 2 * n
        fraction[i] = part / whole if whole > 0.0 else 0.0
        factor[i] = part / n
        spread[i], samples[i] = deviation, n

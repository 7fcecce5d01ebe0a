"""Rays against a hierarchy: what each meets first, and whether it meets anything.

Directions are unit vectors. Rays are first carried forward, in float64, to the model's box, and from there on walk in
float32 counted from the model's middle: however far off they start, what is rounded stays in proportion to the model.
Which triangle a ray meets is decided by signs that are never wrong for the rounded corners; how far off it is computed
in float64 from the rounded corners. Of triangles met at the same float32 distance the lowest row wins, so neither the
tree's shape nor the order of the walk can show.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import F32, F64, I32
from .blocks import in_blocks
from .bvh import Tree
from .lanes import BLOCK, LEAF, LINKS, NODE, WIDE, enter, fetch, lowest, pierce
from .splitting import STACK

FACE_PAD = 2.0**-22  # of the model's radius: a hit is held within its triangle's box and this
_FIRST = np.int32(2**31 - 1)
_PARALLEL = 1e-18
_BLOCK = 1 << 13  # rays at a time


@dataclass(frozen=True, eq=False, slots=True)
class Hits:
    """What rays met first.

    face (n,) int32: row of the face, -1 for none; distance (n,) float64: mm along the ray, infinite for none;
    barycentric (n,2) float32: weights of the second and third corner.
    """

    face: I32
    distance: F64
    barycentric: F32


def nearest(
    tree: Tree, origins: F64, directions: F64, reach: float | F64 = np.inf, threads: int | None = None
) -> Hits:  # fmt: skip
    """The first face that each ray meets beyond its origin and within `reach` mm: one number, or (n,) float64.

    origins, directions (n,3) float64, world mm and unit vectors. Distances are good to 1e-7 of the model's radius
    where the ray is not nearly along the face. A ray that starts on a surface may meet it: start it `tree.skin` off.
    The same bytes whatever `threads`.
    """
    n = len(origins)
    hits = Hits(np.full(n, -1, np.int32), np.full(n, np.inf), np.zeros((n, 2), np.float32))
    start, way, far = np.ascontiguousarray(origins), np.ascontiguousarray(directions), _reaches(reach, n)

    def work(begin: int, end: int) -> None:
        trace_nearest(*arrays(tree), start, way, far, begin, end, hits.face, hits.distance, hits.barycentric)

    if len(tree.nodes):
        in_blocks(work, n, _BLOCK, threads)
    return hits


def is_stopped(
    tree: Tree, origins: F64, directions: F64, reach: float | F64 = np.inf, threads: int | None = None
) -> NDArray[np.bool_]:  # fmt: skip
    """Whether each ray meets any face within its reach: (n,) bool, exactly where `nearest` finds one."""
    n = len(origins)
    stopped = np.zeros(n, np.bool_)
    start, way, far = np.ascontiguousarray(origins), np.ascontiguousarray(directions), _reaches(reach, n)

    def work(begin: int, end: int) -> None:
        trace_any(*arrays(tree), start, way, far, begin, end, stopped)

    if len(tree.nodes):
        in_blocks(work, n, _BLOCK, threads)
    return stopped


def _reaches(reach: float | F64, n: int) -> F64:
    return np.ascontiguousarray(np.broadcast_to(np.asarray(reach, np.float64), (n,)))


def arrays(tree: Tree) -> tuple[F32, I32, F32, I32, F64]:
    """The tree as kernels take it: its arrays, and low, high, centre, radius (10,) float64."""
    frame = np.array([*tree.low, *tree.high, *tree.centre, tree.radius])
    return tree.nodes, tree.nodes.view(np.int32), tree.corners, tree.numbers, frame


@inner
def _slab(least: Any, greatest: Any, origin: Any, direction: Any, low: Any, high: Any) -> Any:
    """Cut the stretch low .. high of a ray down to where it is between two planes across an axis."""
    inverse = 1.0 / (direction if abs(direction) > _PARALLEL else _PARALLEL)
    p, q = (least - origin) * inverse, (greatest - origin) * inverse
    if p > q:
        p, q = q, p
    return (p if p > low else low), (q if q < high else high)


@inner
def approach(frame: Any, ox: Any, oy: Any, oz: Any, dx: Any, dy: Any, dz: Any, reach: Any) -> Any:
    """How far in mm a ray can be carried forward without passing anything: -1 if it meets nothing within reach."""
    pad = 1e-3 * frame[9]
    low, high = _slab(frame[0] - pad, frame[3] + pad, ox, dx, 0.0, reach)
    low, high = _slab(frame[1] - pad, frame[4] + pad, oy, dy, low, high)
    low, high = _slab(frame[2] - pad, frame[5] + pad, oz, dz, low, high)
    return low if low <= high else -1.0


@inner
def _corner(corners: Any, at: int) -> Any:
    return np.float64(corners[at]), np.float64(corners[at + LEAF]), np.float64(corners[at + 2 * LEAF])


@inner
def meeting(corners: Any, at: int, pad: Any, ox: Any, oy: Any, oz: Any, dx: Any, dy: Any, dz: Any) -> Any:
    """How far along a ray the plane of the triangle at corners[at] is, held within the triangle's box; -1 for nowhere.

    Held, since rounding can carry a hit on a triangle seen edge-on far along the ray: then it would depend on the tree
    whether it is found.
    """
    ax, ay, az = _corner(corners, at)
    bx, by, bz = _corner(corners, at + 3 * LEAF)
    cx, cy, cz = _corner(corners, at + 6 * LEAF)
    ux, uy, uz, vx, vy, vz = bx - ax, by - ay, bz - az, cx - ax, cy - ay, cz - az
    nx, ny, nz = uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx
    slope = nx * dx + ny * dy + nz * dz
    if slope == 0.0:
        return -1.0
    t = (nx * (ax - ox) + ny * (ay - oy) + nz * (az - oz)) / slope
    x, y, z = ox + t * dx, oy + t * dy, oz + t * dz
    left, right = min(ax, min(bx, cx)) - pad, max(ax, max(bx, cx)) + pad
    front, rear = min(ay, min(by, cy)) - pad, max(ay, max(by, cy)) + pad
    bottom, top = min(az, min(bz, cz)) - pad, max(az, max(bz, cz)) + pad
    if left <= x <= right and front <= y <= rear and bottom <= z <= top:
        return t
    low, high = _slab(left, right, ox, dx, -np.inf, np.inf)
    low, high = _slab(front, rear, oy, dy, low, high)
    low, high = _slab(bottom, top, oz, dz, low, high)
    return min(max(t, low), high) if low <= high else -1.0


@inner
def _weights(corners: Any, at: int, x: Any, y: Any, z: Any) -> Any:
    """Weights of the second and third corner of the point of the triangle's plane nearest to (x, y, z)."""
    ax, ay, az = _corner(corners, at)
    bx, by, bz = _corner(corners, at + 3 * LEAF)
    cx, cy, cz = _corner(corners, at + 6 * LEAF)
    bx, by, bz, cx, cy, cz, x, y, z = bx - ax, by - ay, bz - az, cx - ax, cy - ay, cz - az, x - ax, y - ay, z - az
    bb, bc, cc = bx * bx + by * by + bz * bz, bx * cx + by * cy + bz * cz, cx * cx + cy * cy + cz * cz
    pb, pc = x * bx + y * by + z * bz, x * cx + y * cy + z * cz
    area = bb * cc - bc * bc
    if not area > 0.0:
        return 0.0, 0.0
    second = min(max((cc * pb - bc * pc) / area, 0.0), 1.0)
    return second, min(max((bb * pc - bc * pb) / area, 0.0), 1.0 - second)


@inner
def across(ox: Any, oy: Any, oz: Any, dx: Any, dy: Any, dz: Any) -> Any:
    """A ray as `pierce` takes it: places of the axes in a corner, the origin along them, the slopes."""
    if abs(dx) > abs(dy) and abs(dx) > abs(dz):
        return LEAF, 2 * LEAF, 0, oy, oz, ox, dy / dx, dz / dx
    if abs(dy) > abs(dz):
        return 2 * LEAF, 0, LEAF, oz, ox, oy, dz / dy, dx / dy
    return 0, LEAF, 2 * LEAF, ox, oy, oz, dx / dz, dy / dz


@inner
def walk(
    nodes: Any, links: Any, corners: Any, numbers: Any, pad: Any, ray: Any, reach: Any, is_any: bool,
    stack: Any, entered: Any, near: Any, found: Any,
) -> Any:  # fmt: skip
    """Row of the first face along the ray or -1; with is_any the row of any face that it meets.

    ray: origin and direction, six float32 from the middle; stack (STACK,) int32, entered (STACK,) float32 and near
    (WIDE,) float32 are scratch; found (2,) float64 receives distance and the place of the triangle in corners.
    """
    ox, oy, oz, dx, dy, dz = ray
    tiny, one = np.float32(_PARALLEL), np.float32(1.0)
    ix = one / (dx if abs(dx) > tiny else tiny)
    iy = one / (dy if abs(dy) > tiny else tiny)
    iz = one / (dz if abs(dz) > tiny else tiny)
    sx, sy, sz = WIDE if ix < 0 else 0, WIDE if iy < 0 else 0, WIDE if iz < 0 else 0
    px, py, pz = ox * ix, oy * iy, oz * iz
    u, v, w, ou, ov, ow, su, sv = across(ox, oy, oz, dx, dy, dz)
    ex, ey, ez, fx, fy, fz = (
        np.float64(ox), np.float64(oy), np.float64(oz), np.float64(dx), np.float64(dy), np.float64(dz)
    )  # fmt: skip
    best, node, n_waiting = _FIRST, 0, 0
    while True:
        if node >= 0:
            met = enter(nodes, near, node * NODE, sx, sy, sz, px, py, pz, ix, iy, iz, reach)
            if met != 0:
                lane = lowest(met)
                met &= met - 1
                if met == 0:
                    node = links[node * NODE + LINKS + lane]
                    continue
                if is_any:
                    following = links[node * NODE + LINKS + lane]
                    while met != 0:
                        lane = lowest(met)
                        met &= met - 1
                        link = links[node * NODE + LINKS + lane]
                        if link >= 0:
                            fetch(nodes, link * NODE)
                        else:
                            fetch(corners, (-1 - link) * BLOCK)
                        stack[n_waiting], entered[n_waiting] = link, near[lane]
                        n_waiting += 1
                    node = following
                    continue
                following, nearer = links[node * NODE + LINKS + lane], near[lane]
                base = n_waiting
                while met != 0:
                    lane = lowest(met)
                    met &= met - 1
                    link, at = links[node * NODE + LINKS + lane], near[lane]
                    if link >= 0:
                        fetch(nodes, link * NODE)
                    else:
                        fetch(corners, (-1 - link) * BLOCK)
                    if at < nearer:
                        link, at, following, nearer = following, nearer, link, at
                    k = n_waiting
                    while k > base and entered[k - 1] < at:
                        stack[k], entered[k] = stack[k - 1], entered[k - 1]
                        k -= 1
                    stack[k], entered[k] = link, at
                    n_waiting += 1
                node = following
                continue
        else:
            leaf = -1 - node
            met = pierce(corners, leaf * BLOCK, u, v, w, ou, ov, ow, su, sv)
            while met != 0:
                lane = lowest(met)
                met &= met - 1
                t = meeting(corners, leaf * BLOCK + lane, pad, ex, ey, ez, fx, fy, fz)
                if t <= 0.0:
                    continue
                short, row = np.float32(t), numbers[leaf * LEAF + lane]
                if short < reach or (short == reach and row < best):
                    reach, best = short, row
                    found[0], found[1] = t, leaf * BLOCK + lane
                    if is_any:
                        return best
        while n_waiting > 0 and entered[n_waiting - 1] > reach:
            n_waiting -= 1
        if n_waiting == 0:
            return best if best != _FIRST else np.int32(-1)
        n_waiting -= 1
        node = stack[n_waiting]


@inner
def _cast(
    nodes: Any, links: Any, corners: Any, numbers: Any, frame: Any, origins: Any, directions: Any, reaches: Any, i: Any,
    is_any: bool, stack: Any, entered: Any, near: Any, found: Any,
) -> tuple[Any, Any, Any, Any, Any]:  # fmt: skip
    """Row that ray i meets or -1, how far along it the model begins, and where that is in the model's own frame."""
    ox, oy, oz = origins[i, 0], origins[i, 1], origins[i, 2]
    dx, dy, dz = directions[i, 0], directions[i, 1], directions[i, 2]
    start = approach(frame, ox, oy, oz, dx, dy, dz, reaches[i])
    x, y, z = ox + start * dx - frame[6], oy + start * dy - frame[7], oz + start * dz - frame[8]
    if start < 0.0:
        return np.int32(-1), start, x, y, z
    ray = (np.float32(x), np.float32(y), np.float32(z), np.float32(dx), np.float32(dy), np.float32(dz))
    row = walk(
        nodes, links, corners, numbers, frame[9] * FACE_PAD, ray, np.float32(reaches[i] - start), is_any,
        stack, entered, near, found,
    )  # fmt: skip
    return row, start, x, y, z


@kernel
def trace_nearest(
    nodes: Any, links: Any, corners: Any, numbers: Any, frame: Any, origins: Any, directions: Any, reaches: Any,
    begin: int, end: int, face: Any, distance: Any, barycentric: Any,
) -> None:  # fmt: skip
    """Write what rays begin .. end meet first; nothing is written for those that meet nothing."""
    stack, entered, near = np.empty(STACK, np.int32), np.empty(STACK, np.float32), np.empty(WIDE, np.float32)
    found = np.empty(2)
    for i in range(begin, end):
        row, start, x, y, z = _cast(
            nodes, links, corners, numbers, frame, origins, directions, reaches, i, False, stack, entered, near,
            found,
        )  # fmt: skip
        if row >= 0:
            t = found[0]
            face[i], distance[i] = row, start + t
            dx, dy, dz = directions[i, 0], directions[i, 1], directions[i, 2]
            second, third = _weights(corners, int(found[1]), x + t * dx, y + t * dy, z + t * dz)
            barycentric[i, 0], barycentric[i, 1] = second, third


@kernel
def trace_any(
    nodes: Any, links: Any, corners: Any, numbers: Any, frame: Any, origins: Any, directions: Any, reaches: Any,
    begin: int, end: int, stopped: Any,
) -> None:  # fmt: skip
    """Write whether rays begin .. end meet anything."""
    stack, entered, near = np.empty(STACK, np.int32), np.empty(STACK, np.float32), np.empty(WIDE, np.float32)
    found = np.empty(2)
    for i in range(begin, end):
        row, _, _, _, _ = _cast(
            nodes, links, corners, numbers, frame, origins, directions, reaches, i, True, stack, entered, near,
            found,
        )  # fmt: skip
        stopped[i] = row >= 0

"""Solids under a function, and sheets along a parametric surface: grids divided by curvature.

Between a surface and the triangles of a cell lies at most an eighth of what its second derivatives make of the cell's
sides, (|f_uu| a² + 2 |f_uv| a b + |f_vv| b²) / 8, the bound of linear interpolation. Derivatives are sampled on a fixed
grid first; then the grid is refined until the middles of its cells and sides lie within the chord error, or until that
no longer helps, as at a step of the function.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from .crossing import crossing
from .fields import values
from .flaw import SolidError
from .outline import OutlineFlaw
from .recipe import Grid, ParametricSurface, Relief
from .shell import Shell, shell
from .spine import spelled
from .surfaces import plane, surfaces

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]
Surface = Callable[[F64, F64], F64]
"""Points (...,3) at parameters (...) from 0 to 1."""

PROBES = 65
"""Samples a side on which flaws, boxes and derivatives are judged."""
MOST_CELLS = 512
"""Cells a side; a function that would need more is coarser than the chord error asks."""
_LINES = 32
"""Along which a sheet is looked at for folds, each at the steps of its finest division."""
_JUDGED = 30_000
"""Triangles on which a sheet is judged at most."""
CLOSES = 1e-9
"""Of its size: opposite ends of a surface that are nearer than this are one."""
_STEP = 1e-5
"""Of the parameters' ranges, for derivatives."""


def surface_of(shape: Relief | ParametricSurface) -> Surface:
    """The upper surface of a relief, the middle surface of a sheet."""
    if isinstance(shape, Relief):
        (wide, deep), height = shape.size, shape.height

        def top(u: F64, v: F64) -> F64:
            x, y = (u - 0.5) * wide, (v - 0.5) * deep
            return np.stack((x, y, values(height, x, y)), axis=-1)

        return top
    (u0, u1), (v0, v1), point = shape.u, shape.v, shape.point

    def middle(u: F64, v: F64) -> F64:
        a, b = u0 + u * (u1 - u0), v0 + v * (v1 - v0)
        return np.stack([values(each, a, b) for each in point], axis=-1)

    return middle


def sheet_flaws(shape: Relief | ParametricSurface) -> tuple[OutlineFlaw, ...]:
    """What can be wrong with a function, judged on a fixed grid."""
    points = _grid(surface_of(shape), PROBES - 1, PROBES - 1)
    wrong = _value_flaws(shape, points)
    if wrong or isinstance(shape, Relief):
        return wrong
    normals = _normals(shape, PROBES - 1, PROBES - 1)
    if (normals == 0.0).all(axis=-1).any():
        sentence = "this surface has a point, or a line, without a direction: its sides shrink to nothing there"
        return (OutlineFlaw("no-value", sentence, "leave a small gap around it"),)
    size = float(np.ptp(points.reshape(-1, 3), axis=0).max())
    for ends, sides in (
        ((points[:, 0], points[:, -1]), (normals[:, 0], normals[:, -1])),
        ((points[0], points[-1]), (normals[0], normals[-1])),
    ):
        if np.abs(ends[0] - ends[1]).max() <= CLOSES * size and (sides[0] * sides[1]).sum(axis=-1).min() < 0.0:
            sentence = "this surface closes on itself turned over, so that it has no two sides"
            return (OutlineFlaw("no-value", sentence, "leave a small gap where it would close"),)
    return _cut_flaws(shape, size)


def _cut_flaws(shape: ParametricSurface, size: float) -> tuple[OutlineFlaw, ...]:
    """Where a sheet of a size would cut itself: by its own bends, or further on."""
    for n, m in ((MOST_CELLS, _LINES), (_LINES, MOST_CELLS)):
        fine = _grid(surface_of(shape), n, m)
        wrong = _value_flaws(shape, fine)
        if wrong:
            return wrong
        fold = _fold(fine, _normals(shape, n, m), shape.thickness)
        if fold is not None:
            sentence = (
                f"this sheet would cut itself near {spelled(fold)}, where it bends tighter than half its thickness"
            )
            return (OutlineFlaw("cuts-itself", sentence, "make it thinner, or the bend wider"),)
    met = _crossing(shape, size)
    if met is not None:
        sentence = f"this sheet would cut itself near {spelled(met)}, where far stretches of it meet"
        return (OutlineFlaw("cuts-itself", sentence, "make it thinner, or lead it further round"),)
    return ()


def finer_flaws(shape: Relief | ParametricSurface, rung: float) -> tuple[OutlineFlaw, ...]:
    """What is wrong with the function where triangles at `rung` mm lie, and not at the samples of `sheet_flaws`."""
    if _value_flaws(shape, _grid(surface_of(shape), PROBES - 1, PROBES - 1)):
        return ()
    n, m, _ = _divisions(shape, rung)
    return _value_flaws(shape, _grid(surface_of(shape), 2 * n, 2 * m))


def _value_flaws(shape: Relief | ParametricSurface, points: F64) -> tuple[OutlineFlaw, ...]:
    if not np.isfinite(points).all():
        sentence = "the function of this surface has no value everywhere in its ranges"
        return (OutlineFlaw("no-value", sentence, "keep clear of divisions by 0 and of roots below 0"),)
    low = np.unravel_index(int(points[..., 2].argmin()), points.shape[:2])
    x, y, z = points[low].tolist()
    if z > 0.0 or not isinstance(shape, Relief):
        return ()
    sentence = f"the relief sinks to {z:.6g} mm at ({x:.6g} mm, {y:.6g} mm); it stands on z = 0 and must stay above"
    return (OutlineFlaw("no-wall", sentence, "add a constant height"),)


def _crossing(shape: ParametricSurface, size: float) -> F64 | None:
    """Where the sides and rims of a sheet cross, at a chord error that follows from its size and thickness.

    None where its function has no value at so fine a division, which `finer_flaws` says where it matters.
    """
    n, m, _ = _divisions(shape, min(size / 200.0, shape.thickness / 4.0))
    over = max(1.0, math.sqrt(4.0 * n * m / _JUDGED))
    made = _sheet(shape, math.ceil(n / over), math.ceil(m / over))
    return crossing(made.vertices, made.faces) if np.isfinite(made.vertices).all() else None


def strays(shape: Relief | ParametricSurface, rung: float) -> float:
    """How far the triangles at a chord error of `rung` mm lie from the function: more than it where `MOST_CELLS` are
    too few, or a step or an edge of the function leaves no number enough.
    """
    return _divisions(shape, rung)[2]


def count_triangles(shape: Relief | ParametricSurface, rung: float) -> int:
    """At most, once it has no flaws."""
    n, m, _ = _divisions(shape, rung)
    return 2 * n * m * 2 + 4 * (n + m)


def bounds(shape: Relief | ParametricSurface) -> tuple[F64, F64]:
    """Corners (low, high) of a box round the solid, by samples and what may lie between them."""
    n = max(PROBES - 1, *_knots(shape))
    points = _grid(surface_of(shape), n, n)
    between = sum(np.abs(np.diff(points, 2, axis=k)).max(axis=(0, 1)) for k in (0, 1)) / 4.0
    low, high = points.min(axis=(0, 1)) - between, points.max(axis=(0, 1)) + between
    if isinstance(shape, Relief):
        half = np.array(shape.size) / 2
        return np.array([-half[0], -half[1], 0.0]), np.array([half[0], half[1], high[2]])
    return low - shape.thickness / 2, high + shape.thickness / 2


def sheet(shape: Relief | ParametricSurface, rung: float) -> Shell:
    """The closed solid at a chord error of `rung` mm: FREE above (and below), planes or FREE round the rim."""
    n, m, _ = _divisions(shape, rung)
    return _relief(shape, n, m) if isinstance(shape, Relief) else _sheet(shape, n, m)


def _grid(surface: Surface, n: int, m: int) -> F64:
    """Points (m+1,n+1,3) at n by m cells."""
    u, v = np.meshgrid(np.arange(n + 1) / n, np.arange(m + 1) / m)
    return surface(u, v)


def _normals(shape: Relief | ParametricSurface, n: int, m: int) -> F64:
    """Unit normals (m+1,n+1,3), from differences of the function; zero where there is none."""
    surface = surface_of(shape)
    u, v = np.meshgrid(np.arange(n + 1) / n, np.arange(m + 1) / m)
    slopes = []
    for du, dv in ((_STEP, 0.0), (0.0, _STEP)):
        ahead = surface(np.minimum(u + du, 1.0), np.minimum(v + dv, 1.0))
        slopes.append(ahead - surface(np.maximum(u - du, 0.0), np.maximum(v - dv, 0.0)))
    normal = np.cross(slopes[0], slopes[1])
    length = np.sqrt((normal**2).sum(axis=-1))
    sides = np.sqrt((slopes[0] ** 2).sum(axis=-1) * (slopes[1] ** 2).sum(axis=-1))
    there = length > 1e-7 * sides.max()
    return np.where(there[..., None], normal / np.where(there, length, 1.0)[..., None], 0.0)


def _fold(points: F64, normals: F64, thickness: float) -> F64 | None:
    """Where a cell turns over as it is moved out by half the thickness, on either side; None if nowhere."""
    for side in (-0.5, 0.5):
        moved = points + side * thickness * normals
        for axis in (0, 1):
            forward = (np.diff(moved, axis=axis) * np.diff(points, axis=axis)).sum(axis=-1)
            if (forward <= 0.0).any():
                return np.asarray(points[np.unravel_index(int(forward.argmin()), forward.shape)])
    return None


def _knots(shape: Relief | ParametricSurface) -> tuple[int, int]:
    """Cells that a table has of its own, which the division keeps."""
    if isinstance(shape, Relief) and isinstance(shape.height, Grid):
        return len(shape.height.x) - 1, len(shape.height.y) - 1
    return 1, 1


def _divisions(shape: Relief | ParametricSurface, rung: float) -> tuple[int, int, float]:
    """Cells along u and v, and how far from the function their triangles are."""
    knots = _knots(shape)
    if knots != (1, 1):
        return (*knots, 0.0)
    surface, swell = surface_of(shape), 1.0
    points = _grid(surface, PROBES - 1, PROBES - 1)
    if not np.isfinite(points).all():
        return 1, 1, 0.0
    uu, vv = (float(np.sqrt((np.diff(points, 2, axis=k) ** 2).sum(axis=-1)).max()) * (PROBES - 1) ** 2 for k in (1, 0))
    uv = float(np.sqrt((np.diff(np.diff(points, axis=0), axis=1) ** 2).sum(axis=-1)).max()) * (PROBES - 1) ** 2
    # A third of the error for each of the three terms.
    n, m = (max(1.0, math.sqrt(3.0 * second / (8.0 * rung))) for second in (uu, vv))
    lacking = 3.0 * 2.0 * uv / (8.0 * rung) / (n * m)
    if lacking > 1.0:
        n, m = n * math.sqrt(lacking), m * math.sqrt(lacking)
    before = math.inf
    while True:
        cells = min(MOST_CELLS, math.ceil(n * swell)), min(MOST_CELLS, math.ceil(m * swell))
        off = _off(surface, *cells)
        if off <= rung or off > 0.9 * before or min(cells) >= MOST_CELLS:
            return (*cells, off)
        before, swell = off, swell * 1.4


def _off(surface: Surface, n: int, m: int) -> float:
    """How far the surface is from its triangles, at the middles of cells and of their sides."""
    fine = _grid(surface, 2 * n, 2 * m)
    a, b, c, d = fine[:-1:2, :-1:2], fine[:-1:2, 2::2], fine[2::2, 2::2], fine[2::2, :-1:2]
    middles = (
        (fine[1::2, 1::2], (a + c) / 2),
        (fine[:-1:2, 1::2], (a + b) / 2),
        (fine[1::2, :-1:2], (a + d) / 2),
    )
    return max(float(np.sqrt(((one - other) ** 2).sum(axis=-1)).max()) for one, other in middles)


def _cells(n: int, m: int) -> I64:
    """Triangles (2nm,3) of a grid of vertices (m+1,n+1), counter-clockwise with u to the right and v up."""
    at = np.arange((n + 1) * (m + 1)).reshape(m + 1, n + 1)
    a, b, c, d = at[:-1, :-1].ravel(), at[:-1, 1:].ravel(), at[1:, 1:].ravel(), at[1:, :-1].ravel()
    return np.concatenate((np.stack((a, b, c), 1), np.stack((a, c, d), 1)))


def _rims(n: int, m: int) -> list[I64]:
    """Vertices along the four sides of a grid, counter-clockwise: v = 0, u = 1, v = 1, u = 0."""
    at = np.arange((n + 1) * (m + 1)).reshape(m + 1, n + 1)
    return [at[0], at[:, -1], at[-1, ::-1], at[::-1, 0]]


def _relief(shape: Relief, n: int, m: int) -> Shell:
    top = _positions(shape, n, m)
    if not np.isfinite(top).all() or (top[:, 2] <= 0.0).any():
        raise SolidError("a relief that has no height everywhere")
    base = top * (1.0, 1.0, 0.0)
    count = len(top)
    upper = _cells(n, m)
    pieces: list[tuple[I64, int]] = [(upper, 0), (upper[:, ::-1] + count, 1)]
    (wide, deep), sides = shape.size, ((0.0, -1.0), (1.0, 0.0), (0.0, 1.0), (-1.0, 0.0))
    rows = [
        (PatchKind.FREE, np.eye(3, 4), 0.0, False),
        (PatchKind.PLANE, plane((0.0, 0.0, 0.0), (0.0, 0.0, -1.0), (1.0, 0.0, 0.0)), 0.0, False),
    ]
    for rim, (x, y) in zip(_rims(n, m), sides, strict=True):
        pieces.append((_wall(rim + count, rim), len(rows)))
        at, along = (x * wide / 2, y * deep / 2, 0.0), (-y, x, 0.0)
        rows.append((PatchKind.PLANE, plane(at, (x, y, 0.0), along), 0.0, False))
    normal = _upper_normals(shape, n, m)[upper]
    rest = np.zeros((sum(len(piece) for piece, _ in pieces[1:]), 3, 3))
    return shell(np.concatenate((top, base)), pieces, surfaces(rows), np.concatenate((normal, rest)))


def _positions(shape: Relief, n: int, m: int) -> F64:
    if isinstance(shape.height, Grid):
        x, y = np.meshgrid(shape.height.x, shape.height.y)
        return np.stack((x.ravel(), y.ravel(), np.array(shape.height.z).ravel()), axis=1)
    return _grid(surface_of(shape), n, m).reshape(-1, 3)


def _upper_normals(shape: Relief, n: int, m: int) -> F64:
    """Normals (k,3) at the vertices of the upper side; those of a table lie between its cells."""
    if not isinstance(shape.height, Grid):
        return _normals(shape, n, m).reshape(-1, 3)
    z, x, y = np.array(shape.height.z), np.array(shape.height.x), np.array(shape.height.y)
    along, across = np.gradient(z, x, axis=1), np.gradient(z, y, axis=0)
    normal = np.stack((-along, -across, np.ones_like(z)), axis=-1).reshape(-1, 3)
    return np.asarray(normal / np.sqrt((normal**2).sum(axis=1))[:, None])


def _wall(low: I64, high: I64) -> I64:
    """A strip between two rows of vertices, low left to right and high above it, seen from outside."""
    a, b, c, d = low[:-1], low[1:], high[1:], high[:-1]
    return np.concatenate((np.stack((a, b, c), 1), np.stack((a, c, d), 1)))


def _sheet(shape: ParametricSurface, n: int, m: int) -> Shell:
    """Two sides and a rim; where the surface closes on itself there is no rim, and its ends are one."""
    middle, normal = _grid(surface_of(shape), n, m), _normals(shape, n, m)
    size = float(np.ptp(middle.reshape(-1, 3), axis=0).max())
    closes_u = bool(np.abs(middle[:, 0] - middle[:, -1]).max() <= CLOSES * size)
    closes_v = bool(np.abs(middle[0] - middle[-1]).max() <= CLOSES * size)
    kept = np.arange((n + 1) * (m + 1)).reshape(m + 1, n + 1)
    if closes_u:
        kept[:, -1] = kept[:, 0]
        normal[:, -1] = normal[:, 0]
    if closes_v:
        kept[-1] = kept[0]
        normal[-1] = normal[0]
    flat, count = kept.ravel(), middle.shape[0] * middle.shape[1]
    outward = normal.reshape(-1, 3)
    half = shape.thickness / 2 * outward
    vertices = np.concatenate((middle.reshape(-1, 3) + half, middle.reshape(-1, 3) - half))
    upper = flat[_cells(n, m)]
    pieces: list[tuple[I64, int]] = [(upper, 0), (upper[:, ::-1] + count, 1)]
    normals = [outward[upper], -outward[upper[:, ::-1]]]
    for k, rim in enumerate(_rims(n, m)):
        if closes_v if k % 2 == 0 else closes_u:
            continue
        wall = _wall(flat[rim] + count, flat[rim])
        pieces.append((wall, len(pieces)))
        normals.append(_rim_normals(vertices, wall))
    rows = [(PatchKind.FREE, np.eye(3, 4), 0.0, False)] * len(pieces)
    return shell(vertices, pieces, surfaces(rows), np.concatenate(normals))


def _rim_normals(vertices: F64, wall: I64) -> F64:
    """Normals at the corners of a rim, the mean of those of the triangles that meet there."""
    a, b, c = (vertices[wall[:, k]] for k in range(3))
    own = np.cross(b - a, c - a)
    total = np.zeros_like(vertices)
    for k in range(3):
        np.add.at(total, wall[:, k], own)
    length = np.sqrt((total**2).sum(axis=1))
    total /= np.where(length > 0.0, length, 1.0)[:, None]
    return np.asarray(total[wall])

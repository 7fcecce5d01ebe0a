"""Surfaces of revolution: rings of vertices about z, joined ring to ring.

A ring's division follows from its own radius and the rung, so a cylinder of a given radius has the same vertices
wherever it occurs. Rings of different division are joined by the order of their angles; a band between rings of n
and m vertices has n + m triangles, n where one ring is a point on the axis of a curved or sloping surface, and a flat
disc has n - 2.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from ..trigonometry import circle_table
from .ladder import divisions
from .outline import Curve, Polyline
from .shell import Shell, shell
from .surfaces import plane, surfaces, upright

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]
_NEAR = 1e-12


def revolve(loops: list[Polyline], rung: float) -> Shell:
    """Turn closed profiles in (radius, height), the material on their left, about z. Radii may not be negative."""
    radius = [_radii(loop) for loop in loops]
    division = ring_divisions(loops, rung)
    vertices: list[F64] = []
    pieces: list[tuple[I64, int]] = []
    rows: list[tuple[PatchKind, F64, float, bool]] = []
    bands: dict[tuple[int, int], I64] = {}
    tables: dict[int, F64] = {1: np.zeros((1, 2))}
    n_vertices = 0
    for loop, rho, count in zip(loops, radius, division, strict=True):
        first = n_vertices + np.concatenate(([0], np.cumsum(count)))
        n_vertices = int(first[-1])
        for r, z, n in zip(rho, loop.points[:, 1], count, strict=True):
            if n not in tables:
                tables[int(n)] = circle_table(int(n))
            ring = np.empty((n, 3))
            ring[:, :2], ring[:, 2] = tables[int(n)] * r, z
            vertices.append(ring)
        row_of = {}
        for k, curve_row in enumerate(loop.curve):
            following = (k + 1) % len(count)
            n, m = int(count[k]), int(count[following])
            if n == 1 and m == 1:
                continue
            curve = loop.curves[curve_row]
            if curve_row not in row_of:
                row_of[curve_row] = len(rows)
                rows.append(_surface(curve))
            flat = rows[row_of[curve_row]][0] == PatchKind.PLANE
            pieces.append((_between(n, m, flat, bands, int(first[k]), int(first[following])), row_of[curve_row]))
    return shell(np.concatenate(vertices), pieces, surfaces(rows))


def ring_divisions(loops: list[Polyline], rung: float) -> list[NDArray[np.int64]]:
    """Vertices in the ring of every point of every loop; 1 on the axis.

    Each follows from the ring's radius, but an arc whose ends take the division of its largest radius, or lie on the
    axis, keeps that division throughout: spheres, tori and domes are grids. Rings whose radii differ by less than two
    chord errors share the division of the larger, so that the chords of a thin wall cannot cut through it.
    """
    wanted = []
    for loop in loops:
        rho = _radii(loop)
        within = loop.curve == np.roll(loop.curve, 1)
        reach = rho.copy()
        for row in np.unique(loop.curve[within]):
            on_curve = loop.curve == row
            on_curve |= np.roll(on_curve, 1)
            largest = float(rho[on_curve].max())
            ends = rho[on_curve & ~(within & (loop.curve == row))]
            if all(divisions(float(r), rung) == divisions(largest, rung) for r in ends if r > 0.0):
                reach[within & (loop.curve == row)] = largest
        wanted.append(np.where(rho == 0.0, 0.0, reach))
    every = np.unique(np.concatenate(wanted))
    every = every[every > 0.0]
    number, n = {0.0: 1}, 0
    for k in range(len(every) - 1, -1, -1):
        if k == len(every) - 1 or every[k + 1] - every[k] > 2.0 * rung:
            n = divisions(float(every[k]), rung)
        number[float(every[k])] = n
    return [np.array([number[float(r)] for r in reach], np.int64) for reach in wanted]


def count_triangles(loops: list[Polyline], rung: float) -> int:
    """Triangles that `revolve` makes: the bands' sums, at most (discs and joins at the axis take fewer)."""
    return sum(int((count + np.roll(count, -1)).sum()) for count in ring_divisions(loops, rung))


def _radii(loop: Polyline) -> F64:
    rho = loop.points[:, 0]
    return np.where(np.abs(rho) <= 1e-9 * max(1e-12, float(np.abs(loop.points).max())), 0.0, rho)


def _between(n: int, m: int, flat: bool, bands: dict[tuple[int, int], I64], a: int, b: int) -> I64:
    """Triangles between the ring of n vertices from row a and that of m from row b, which follows it in the profile."""
    if flat and m == 1:
        return disc(n)[:, ::-1] + a if n > 1 else disc(n)
    if flat and n == 1:
        return disc(m) + b
    if (n, m) not in bands:
        bands[n, m] = _band(n, m)
    band = bands[n, m]
    return np.where(band < n, band + a, band - n + b)


def disc(n: int) -> I64:
    """A convex polygon of n vertices as a strip from side to side, (n-2,3), seen counter-clockwise from below."""
    k = np.arange(n)
    strip = np.where(k % 2 == 0, -(k // 2) % n, (k + 1) // 2)
    triangles = np.stack((strip[:-2], strip[1:-1], strip[2:]), axis=1)
    triangles[0::2] = triangles[0::2, [0, 2, 1]]
    return triangles


def _band(n: int, m: int) -> I64:
    """Join ring 0 .. n-1 to ring n .. n+m-1 in the order of the middles of their chords."""
    if n == 1:
        j = np.arange(m)
        return np.stack((np.zeros_like(j), 1 + (j + 1) % m, 1 + j), axis=1)
    i = np.arange(n)
    if m == 1:
        return np.stack((i, (i + 1) % n, np.full_like(i, n)), axis=1)
    j = np.arange(m)
    # Chord i of the first ring has its middle at (2i+1)/2n of a turn: whole numbers decide the order.
    passed_m = -(-((2 * i + 1) * m - n) // (2 * n))
    passed_n = ((2 * j + 1) * n - m) // (2 * m) + 1
    lower = np.stack((i, (i + 1) % n, n + passed_m % m), axis=1)
    upper = np.stack((passed_n % n, n + (j + 1) % m, n + j), axis=1)
    return np.concatenate((lower, upper))


def _surface(curve: Curve) -> tuple[PatchKind, F64, float, bool]:
    if curve.radius:
        r, (across, height) = curve.radius, curve.centre
        if abs(across) <= 1e-9 * r:
            return PatchKind.SPHERE, upright(r, r, (0.0, 0.0, height)), 0.0, not curve.left
        return PatchKind.TORUS, upright(r, r, (0.0, 0.0, height)), across / r, not curve.left
    (r1, z1), (r2, z2) = curve.start, curve.end
    across, rise = r2 - r1, z2 - z1
    if abs(across) <= _NEAR * max(r1, r2):
        return PatchKind.CYLINDER, upright(r1, 1.0, (0.0, 0.0, 0.0)), 0.0, rise < 0.0
    if abs(rise) <= _NEAR * max(abs(z1), abs(z2), r1, r2):
        up = -1.0 if across > 0.0 else 1.0
        return PatchKind.PLANE, plane((0.0, 0.0, z1), (0.0, 0.0, up), (1.0, 0.0, 0.0)), 0.0, False
    apex = z1 - r1 * rise / across
    r, z = (r1, z1) if r1 > r2 else (r2, z2)
    return PatchKind.CONE, upright(r, z - apex, (0.0, 0.0, apex)), 0.0, rise < 0.0

"""Surfaces of revolution: rings of vertices about z, joined ring to ring.

A ring's division follows from its own radius and the rung, so a cylinder of a given radius has the same vertices
wherever it occurs. Rings of different division are joined by the order of their angles; a band between rings of n
and m vertices has n + m triangles, n where one ring is a point on the axis of a curved or sloping surface, and a flat
disc has n - 2. A cone between rings of n and more, m, vertices is two bands: n + m close to the smaller end, then
2 m; one band of n + m if it is shorter than `2 FAN_RUNGS` chord errors.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import manifold3d
import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from ..trigonometry import circle_points, circle_table, cos_deg, sin_deg
from .curve import Curve
from .ladder import divisions
from .outline import Polyline
from .shell import Shell, shell
from .surfaces import free, plane, surfaces, upright

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]
_NEAR = 1e-12
FAN_SHARE = 1.0 / 64.0
FAN_RUNGS = 12.0
"""The part of a cone's length that joins its few vertices at the smaller end to its many, and the chord errors that
it is long at least.
"""


def revolve(loops: list[Polyline], rung: float, angle: float = 360.0) -> Shell:
    """Turn closed profiles in (radius, height), the material on their left, about z. Radii may not be negative.

    Less than a full turn, `angle` degrees from the x axis, has plane ends.
    """
    loops, division = _with_fine_cones(loops, ring_divisions(loops, rung), rung)
    radius = [_radii(loop) for loop in loops]
    turn = _Turn(angle)
    vertices: list[F64] = []
    pieces: list[tuple[I64, int]] = []
    normals: list[F64] = []
    rows: list[tuple[PatchKind, F64, float, bool]] = []
    n_vertices = 0
    for loop, rho, count in zip(loops, radius, division, strict=True):
        size = np.where(count == 1, 1, [turn.size(int(n)) for n in count])
        first = n_vertices + np.concatenate(([0], np.cumsum(size)))
        n_vertices = int(first[-1])
        for r, z, n in zip(rho, loop.points[:, 1], count, strict=True):
            table = turn.table(int(n))
            ring = np.empty((len(table), 3))
            ring[:, :2], ring[:, 2] = table * r, z
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
                rows.append(profile_surface(curve))
            flat = rows[row_of[curve_row]][0] == PatchKind.PLANE
            local = turn.between(n, m, flat)
            pieces.append(
                (
                    np.where(local < turn.size(n), local + first[k], local - turn.size(n) + first[following]),
                    row_of[curve_row],
                )
            )
            normals.append(
                turn.normals(n, m, loop.tangents[k], local) if curve.is_free else np.zeros((*local.shape, 3))
            )
        turn.starts.append(first[:-1])
        turn.ends.append(first[:-1] + size - 1)
    if angle < 360.0:
        cap = manifold3d.triangulate([loop.points for loop in loops]).astype(np.int64)
        pieces += [
            (np.concatenate(turn.starts)[cap], len(rows)),
            (np.concatenate(turn.ends)[cap[:, ::-1]], len(rows) + 1),
        ]
        normals.append(np.zeros((2 * len(cap), 3, 3)))
        c, s = cos_deg(angle), sin_deg(angle)
        for normal, along in (((0.0, -1.0, 0.0), (1.0, 0.0, 0.0)), ((-s, c, 0.0), (c, s, 0.0))):
            rows.append((PatchKind.PLANE, plane((0.0, 0.0, 0.0), normal, along), 0.0, False))
    is_free = any(row[0] == PatchKind.FREE for row in rows)
    return shell(np.concatenate(vertices), pieces, surfaces(rows), np.concatenate(normals) if is_free else None)


@dataclass(slots=True)
class _Turn:
    """The rings of one revolution: directions by division, and the bands between them, each worked out once."""

    angle: float
    starts: list[I64] = field(default_factory=list)
    ends: list[I64] = field(default_factory=list)
    _tables: dict[int, F64] = field(default_factory=dict)
    _bands: dict[tuple[int, int, bool], I64] = field(default_factory=dict)

    def marks(self, n: int) -> int:
        """Marks of a division in n that lie within the turn, the first included."""
        return n if self.angle >= 360.0 else max(1, math.ceil(n * self.angle / 360.0 - 1e-6))

    def size(self, n: int) -> int:
        """Vertices of a ring of division n."""
        return 1 if n == 1 else self.marks(n) + (self.angle < 360.0)

    def table(self, n: int) -> F64:
        """Directions (k,2) of the vertices of a ring."""
        if n not in self._tables:
            if n == 1:
                self._tables[n] = np.zeros((1, 2))
            elif self.angle >= 360.0:
                self._tables[n] = circle_table(n)
            else:
                last = (cos_deg(self.angle), sin_deg(self.angle))
                self._tables[n] = np.concatenate((circle_points(n, np.arange(self.marks(n))), [last]))
        return self._tables[n]

    def between(self, n: int, m: int, flat: bool) -> I64:
        """Triangles between the ring of division n, its vertices from 0, and that of m, which follows in profile and
        in number.
        """
        key = (n, m, flat and 1 in (n, m))
        if key not in self._bands:
            if self.angle < 360.0:
                self._bands[key] = strip(self._shares(n), self._shares(m))
            elif flat and m == 1:
                self._bands[key] = disc(n)[:, ::-1]
            elif flat and n == 1:
                self._bands[key] = disc(m) + 1
            else:
                self._bands[key] = _band(n, m)
        return self._bands[key]

    def normals(self, n: int, m: int, tangents: F64, faces: I64) -> F64:
        """Outward normals (k,3,3) at the corners of a band, whose profile has the tangents (2,2) at its two rings."""
        rings = []
        for division, (across, up) in zip((n, m), tangents.tolist(), strict=True):
            table = self.table(division)
            rings.append(np.column_stack((up * table, np.full(len(table), -across))))
        found: F64 = np.concatenate(rings)[faces]
        # On the axis only the height of a normal is known, and of it the sign; the triangle's other corners say more.
        length = np.sqrt((found**2).sum(axis=2, keepdims=True))
        return np.where(length > 0.5, found / np.where(length > 0.0, length, 1.0), found)

    def _shares(self, n: int) -> F64:
        if n == 1:
            return np.zeros(1)
        return np.append(np.arange(self.marks(n)) * 360.0 / n, self.angle)


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
        for row in sorted(set(loop.curve[within].tolist())):
            on_curve = loop.curve == row
            on_curve |= np.roll(on_curve, 1)
            largest = float(rho[on_curve].max())
            ends = rho[on_curve & ~(within & (loop.curve == row))]
            if all(divisions(float(r), rung) == divisions(largest, rung) for r in ends if r > 0.0):
                reach[within & (loop.curve == row)] = largest
        wanted.append(np.where(rho == 0.0, 0.0, reach))
    every = np.array(sorted(set(np.concatenate(wanted).tolist())))
    every = every[every > 0.0]
    number, n = {0.0: 1}, 0
    for k in range(len(every) - 1, -1, -1):
        if k == len(every) - 1 or every[k + 1] - every[k] > 2.0 * rung:
            n = divisions(float(every[k]), rung)
        number[float(every[k])] = n
    return [np.array([number[float(r)] for r in reach], np.int64) for reach in wanted]


def count_triangles(loops: list[Polyline], rung: float) -> int:
    """Triangles that `revolve` makes: the bands' sums, at most (discs and joins at the axis take fewer)."""
    _, division = _with_fine_cones(loops, ring_divisions(loops, rung), rung)
    return sum(int((count + np.roll(count, -1)).sum()) for count in division)


def _with_fine_cones(loops: list[Polyline], division: list[I64], rung: float) -> tuple[list[Polyline], list[I64]]:
    """Put a ring of the larger division close to the smaller end of every cone whose ends are divided unlike.

    Where many vertices met few over the whole of a cone, shading between their normals would show as rays. The band
    that joins them is several chord errors long, so that its triangles do not lean over; a cone too short for that
    stays one band.
    """
    finer = [_with_fine_cone(loop, count, rung) for loop, count in zip(loops, division, strict=True)]
    return [loop for loop, _ in finer], [count for _, count in finer]


def fan_share(length: float, rung: float) -> float:
    """The part of a cone of a slant `length` mm that joins its two divisions; from 0.5 on the cone is one band."""
    return max(FAN_SHARE, FAN_RUNGS * rung / length) if length > 0.0 else 1.0


def _with_fine_cone(loop: Polyline, count: I64, rung: float) -> tuple[Polyline, I64]:
    following, end = np.roll(count, -1), np.roll(loop.points, -1, axis=0)
    across, up = (end - loop.points).T
    is_line = np.array([not (curve.is_free or curve.radius) for curve in loop.curves])[loop.curve]
    is_cone = is_line & (count != following) & (count > 1) & (following > 1) & (np.abs(up) > _NEAR * np.abs(across))
    fan = np.array([fan_share(float(length), rung) for length in np.hypot(across, up)])
    rows = np.flatnonzero(is_cone & (fan < 0.5))
    if not len(rows):
        return loop, count
    share = np.where(count[rows] < following[rows], fan[rows], 1.0 - fan[rows])[:, None]
    between = loop.points[rows] * (1.0 - share) + end[rows] * share
    return Polyline(
        np.insert(loop.points, rows + 1, between, axis=0),
        np.insert(loop.curve, rows + 1, loop.curve[rows]),
        loop.curves,
        np.insert(loop.tangents, rows + 1, loop.tangents[rows], axis=0),
    ), np.insert(count, rows + 1, np.maximum(count[rows], following[rows]))


def _radii(loop: Polyline) -> F64:
    rho = loop.points[:, 0]
    return np.where(np.abs(rho) <= 1e-9 * max(1e-12, float(np.abs(loop.points).max())), 0.0, rho)


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


def strip(first: F64, second: F64) -> I64:
    """Triangles between two open rows of vertices at rising places (n,) and (m,), numbered 0 .. n-1 and n .. n+m-1.

    They are joined in the order of the middles of their chords, counter-clockwise if the first runs along +x below the
    second.
    """
    n, m = len(first), len(second)
    below, above = (first[1:] + first[:-1]) / 2.0, (second[1:] + second[:-1]) / 2.0
    # Where middles are equal the first row goes first; a margin keeps rounding from deciding.
    margin = 1e-9 * max(float(first[-1] - first[0]), float(second[-1] - second[0]), 1e-300)
    i, j = np.arange(n - 1), np.arange(m - 1)
    passed_m = np.searchsorted(above, below - margin)
    passed_n = np.searchsorted(below, above + margin)
    lower = np.stack((i, i + 1, n + passed_m), axis=1)
    upper = np.stack((passed_n, n + j + 1, n + j), axis=1)
    return np.concatenate((lower, upper)).astype(np.int64)


def profile_surface(curve: Curve) -> tuple[PatchKind, F64, float, bool]:
    """What one stretch of a profile in (radius, height) sweeps about z, the material on its left."""
    if curve.is_free:
        return free()
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

"""Screw threads of the basic profile of ISO 68-1: closed helicoidal solids, and the cylinder that stands for one.

The profile's fundamental triangle has a height of H = √3/2 P; the crest is flat over P/8, the root over P/4, the flanks
stand at 30° to the plane across the axis and are 5/8 H deep. A crest lies in the middle of z = 0 at the x axis. The
ends are cut square, so that thread after thread, or a thread and its shank, join without a step.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from ..trigonometry import circle_table, cos_deg, sin_deg
from .ladder import divisions
from .recipe import Cylinder, Thread
from .shell import Shell
from .surfaces import Surfaces, plane, surfaces, upright

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]

DEPTH = 5 / 8 * math.sqrt(3.0) / 2
"""Of the basic profile, crest to root, for a pitch of 1: 5/8 H."""
_BREAKS = np.array((1 / 16, 6 / 16, 10 / 16, 15 / 16))
"""Where the profile turns, in pitches above the middle of a crest: flank down, root, flank up, crest."""
_SNAP = 1e-6
"""Of a pitch: a line of the profile this near to an end meets it."""


def minor_diameter(shape: Thread) -> float:
    """d - 1.082532 P (ISO 68-1)."""
    return shape.major - 2.0 * DEPTH * shape.pitch


def plain(shape: Thread) -> Cylinder:
    """The cylinder that stands for a thread drawn by convention (ISO 6410-1): over its crests."""
    return Cylinder(minor_diameter(shape) if shape.internal else shape.major, shape.length)


def count_triangles(shape: Thread, rung: float) -> int:
    """At most, for a real thread."""
    columns = divisions(shape.major / 2, rung) + 8
    return columns * (2 * (4 * math.ceil(shape.length / shape.pitch) + 5) + 2)


def thread(shape: Thread, rung: float) -> Shell:
    """A real thread at a chord error of `rung` mm: crests and roots on cylinders, flanks free with exact normals.

    A column of vertices stands at every division of the crest and wherever a line of the profile meets an end; between
    two columns, strips follow the lines of the profile. Cost: linear in columns times lines.
    """
    turns, circle = _columns(shape, rung)
    rows = [_column(shape, float(t)) for t in turns]
    first = np.concatenate(([0], np.cumsum([len(z) for z, _ in rows])))
    radius = [_radius(shape, z, t) for (z, _), t in zip(rows, turns, strict=True)]
    vertices = np.concatenate(
        [np.column_stack((rho[:, None] * point, z)) for (z, _), rho, point in zip(rows, radius, circle, strict=True)]
        + [np.array(((0.0, 0.0, 0.0), (0.0, 0.0, shape.length)))]
    )
    faces, kinds = _strips(shape, turns, [low for _, low in rows], first)
    caps = _caps(first, len(vertices) - 2)
    faces = np.concatenate((faces, *caps))
    kinds = np.concatenate((kinds, np.repeat((4, 5), len(caps[0]))))
    normals = _flank_normals(shape, vertices, faces, kinds)
    if shape.left:
        mirror = np.array((1.0, -1.0, 1.0))
        vertices, normals, faces = vertices * mirror, (normals * mirror)[:, ::-1], faces[:, ::-1]
    return Shell(
        np.ascontiguousarray(vertices) + 0.0,
        np.ascontiguousarray(faces, np.int32),
        kinds.astype(np.int32),
        _surfaces(shape),
        np.ascontiguousarray(normals) + 0.0,
    )


def _columns(shape: Thread, rung: float) -> tuple[F64, F64]:
    """Places round the axis in turns (c,) from 0 up, and the unit circle's points there (c,2)."""
    n = divisions(shape.major / 2, rung)
    ends = np.concatenate((-_BREAKS, shape.length / shape.pitch - _BREAKS)) % 1.0
    ends = np.unique(np.round(np.where(ends > 1.0 - 0.1 * _SNAP, 0.0, ends), 9))
    even = np.arange(n) / n
    apart = np.abs(even[:, None] - ends[None]).min(axis=1) > 0.1 * _SNAP
    turns = np.concatenate((even[apart], ends))
    points = [(cos_deg(360.0 * float(t)), sin_deg(360.0 * float(t))) for t in ends]
    circle = np.concatenate((circle_table(n)[apart], np.array(points)))
    order = np.argsort(turns, kind="stable")
    return turns[order], circle[order]


def _heights(shape: Thread, lines: I64, turn: float) -> F64:
    """Where lines of the profile, counted from the lowest of the first crest up, stand at a place round the axis."""
    return np.asarray(shape.pitch * (lines // 4 + _BREAKS[lines % 4] + turn))


def _column(shape: Thread, turn: float) -> tuple[F64, int]:
    """Heights of a column's vertices, bottom and top first, and the number of the lowest line between them."""
    lines = np.arange(-12, 4 * math.ceil(shape.length / shape.pitch) + 8)
    z = _heights(shape, lines, turn)
    near = _SNAP * shape.pitch
    inside = (z > near) & (z < shape.length - near)
    low = int(lines[np.argmax(z > near)])
    return np.concatenate(((0.0, shape.length), z[inside])), low


def _radius(shape: Thread, z: F64, turn: float) -> F64:
    """Of the profile at heights z."""
    u = np.abs((z / shape.pitch - turn + 0.5) % 1.0 - 0.5)
    down = np.clip((u - 1 / 16) / (5 / 16), 0.0, 1.0)
    return np.asarray(shape.major / 2 - DEPTH * shape.pitch * down)


def _strips(shape: Thread, turns: F64, lows: list[int], first: I64) -> tuple[I64, I64]:
    """Triangles (m,3) between neighbouring columns, and for each what it lies on: 0, 2 flanks, 1 root, 3 crest."""
    found, kinds = [], []
    near = _SNAP * shape.pitch
    every = np.arange(-12, 4 * math.ceil(shape.length / shape.pitch) + 8)

    def at(column: int, lines: I64) -> I64:
        z = _heights(shape, lines, float(turns[column]))
        own = first[column] + 2 + lines - lows[column]
        inner = np.where(z <= near, first[column], np.where(z >= shape.length - near, first[column] + 1, own))
        return np.concatenate(([first[column]], inner, [first[column] + 1]))

    for k in range(len(turns)):
        following = (k + 1) % len(turns)
        end = float(turns[following]) + (1.0 if following == 0 else 0.0)
        z = _heights(shape, every, (float(turns[k]) + end) / 2)
        lines = every[(z > 0.0) & (z < shape.length)]
        a, b = at(k, lines), at(following, lines + 4 if following == 0 else lines)
        before = int(every[z <= 0.0][-1])
        kind = np.concatenate(([before], lines)) % 4
        for triangles in (np.stack((a[:-1], b[:-1], b[1:]), 1), np.stack((a[:-1], b[1:], a[1:]), 1)):
            whole = (triangles != np.roll(triangles, 1, axis=1)).all(axis=1)
            found.append(triangles[whole])
            kinds.append(kind[whole])
    return np.concatenate(found), np.concatenate(kinds)


def _caps(first: I64, middle: int) -> tuple[I64, I64]:
    """Fans round the middles of both ends, which stand behind all columns."""
    low = first[:-1]
    following = np.roll(low, -1)
    centre = np.full(len(low), middle)
    return np.stack((centre, following, low), 1), np.stack((centre + 1, low + 1, following + 1), 1)


def _flank_normals(shape: Thread, vertices: F64, faces: I64, kinds: I64) -> F64:
    """Unit normals (m,3,3) of z = ∓ρ tan 30° + P θ/2π at the corners of flanks, zero elsewhere."""
    normals = np.zeros((len(faces), 3, 3))
    flanks = np.flatnonzero((kinds == 0) | (kinds == 2))
    corners = vertices[faces[flanks]]
    rho = np.hypot(corners[:, :, 0], corners[:, :, 1])
    radial = corners[:, :, :2] / rho[:, :, None]
    around = np.stack((-radial[:, :, 1], radial[:, :, 0]), axis=2)
    side = np.where(kinds[flanks] == 0, 1.0, -1.0)[:, None]
    climb = shape.pitch / (2.0 * math.pi) / rho
    across = math.tan(math.radians(30.0)) * radial - (side * climb)[:, :, None] * around
    found = np.concatenate((across, np.broadcast_to(side[:, :, None], (*rho.shape, 1))), axis=2)
    normals[flanks] = found / np.sqrt((found**2).sum(axis=2))[:, :, None]
    return normals


def _surfaces(shape: Thread) -> Surfaces:
    free = (PatchKind.FREE, np.eye(3, 4), 0.0, False)
    root, crest = (upright(d / 2, 1.0, (0.0, 0.0, 0.0)) for d in (minor_diameter(shape), shape.major))
    return surfaces(
        [
            free,
            (PatchKind.CYLINDER, root, 0.0, False),
            free,
            (PatchKind.CYLINDER, crest, 0.0, False),
            (PatchKind.PLANE, plane((0.0, 0.0, 0.0), (0.0, 0.0, -1.0), (1.0, 0.0, 0.0)), 0.0, False),
            (PatchKind.PLANE, plane((0.0, 0.0, shape.length), (0.0, 0.0, 1.0), (1.0, 0.0, 0.0)), 0.0, False),
        ]
    )

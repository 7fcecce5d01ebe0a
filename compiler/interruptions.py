"""Interrupted views (ISO 128-3): a stretch of a long part left out, the rest moved together, with break lines."""

from __future__ import annotations

import hashlib
from dataclasses import replace
from math import sin

import numpy as np
from msgspec import Struct
from platewright.backend.contract import F64, FaceOrigin, Mesh, Node, Patches, Thread
from platewright.lang.source import Span

from .graph import Entry, Point
from .solids.cut import Cutter, cut_mesh
from .solids.transform import dot, heights

GAP_SHARE = 0.03
"""The gap that is left where a stretch goes, over the length that stays."""

ALONG = 1e-6
"""A view looks along a stretch where the product of the unit directions is nearer to 1 than this."""

_N_WAVE = 48
_WAVE_SHARE = 0.05  # amplitude of the break over the width of what is broken
_BREAK = int(FaceOrigin.BREAK)


class Interruption(Struct, frozen=True):
    """A stretch along a unit direction, from `low` to `high` in mm from the origin, that is left out."""

    axis: Point
    low: float
    high: float
    span: Span


class Interrupting:
    """Takes stretches out of copies while a scene is flattened. `sight` is the direction the view looks along."""

    def __init__(self, interruptions: tuple[Interruption, ...], sight: Point, vertices: F64) -> None:
        self.n_broken = [0] * len(interruptions)
        # Those further along go first, so that none is moved by one before its own turn.
        order = sorted(range(len(interruptions)), key=lambda k: -interruptions[k].low)
        self.steps = [(k, interruptions[k], _cutter(interruptions[k], sight, vertices)) for k in order]
        reach = vertices.max(axis=0) - vertices.min(axis=0)
        self.size = float(np.sqrt((reach**2).sum()))

    def alter(self, entry: Entry, placement: F64, mesh: Mesh) -> Mesh | None:
        """The mesh of one copy without the stretches; see `flatten.Alter`."""
        left: Mesh | None = mesh
        for number, each, cutter in self.steps:
            if left is None:
                return None
            before = left
            left = cut_mesh(left, placement, cutter) if left.closed else left
            self.n_broken[number] += left is not before
            if left is not None:
                left = _moved_up(left, placement, each, self._gap(each))
        return left

    def carry(self, point: Point) -> Point:
        """Where a world point goes with what stands beyond the stretches."""
        x, y, z = point
        for _, each, _ in self.steps:
            a, b, c = each.axis
            if x * a + y * b + z * c > (each.low + each.high) / 2.0:
                by = each.high - each.low - self._gap(each)
                x, y, z = x - by * a, y - by * b, z - by * c
        return (x, y, z)

    def carried(self, node: Node) -> Node:
        """A node whose marks and threads follow what they belong to."""
        marks = tuple(replace(mark, point=self.carry(mark.point)) for mark in node.marks)
        return replace(node, marks=marks, threads=tuple(map(self._thread, node.threads)))

    def _thread(self, thread: Thread) -> Thread:
        x, y, z = thread.start
        a, b, c = thread.axis
        end = self.carry((x + a * thread.length, y + b * thread.length, z + c * thread.length))
        start = self.carry(thread.start)
        length = dot((end[0] - start[0], end[1] - start[1], end[2] - start[2]), thread.axis)
        return replace(thread, start=start, length=max(length, 0.0))

    def _gap(self, each: Interruption) -> float:
        return min(GAP_SHARE * max(self.size - (each.high - each.low), 0.0), 0.5 * (each.high - each.low))


def shown_by(interruptions: tuple[Interruption, ...], sight: Point) -> tuple[Interruption, ...]:
    """Those that a view shows: none whose stretch it looks along."""
    return tuple(each for each in interruptions if abs(dot(each.axis, sight)) < 1.0 - ALONG)


def _cutter(each: Interruption, sight: Point, vertices: F64) -> Cutter:
    """A slab with wavy ends, the waves drawn as they look along the line of sight."""
    axis = np.array(each.axis)
    across = np.array(sight) - axis * dot(sight, each.axis)
    if float((across**2).sum()) < 1e-12:
        across = np.array((0.0, 0.0, 1.0) if abs(each.axis[2]) < 0.9 else (0.0, 1.0, 0.0))
        across = across - axis * float((across * axis).sum())
    w = across / np.sqrt((across**2).sum())
    v = np.cross(w, axis)
    # The waves follow what is broken: its width across the axis, as the view shows it.
    aside = heights(vertices, v)
    width = float(np.ptp(aside))
    low, high = vertices.min(axis=0), vertices.max(axis=0)
    deep = float(np.sqrt(((high - low) ** 2).sum())) + 1.0
    middle = v * float(aside.min() + width / 2.0) + w * float(heights(vertices, w).mean())
    reach, height = 0.6 * width + 1e-3, min(_WAVE_SHARE * width, 0.25 * (each.high - each.low))
    ups = [reach * (2.0 * k / _N_WAVE - 1.0) for k in range(_N_WAVE + 1)]
    waves = [height * (0.75 * sin(5.2 * up / reach) + 0.25 * sin(11.0 * up / reach + 1.3)) for up in ups]
    far = [(each.high + wave, up) for up, wave in zip(ups, waves, strict=True)]
    near = [(each.low + wave, up) for up, wave in zip(ups, waves, strict=True)]
    profile = (*far, *reversed(near))
    x, y, z = (float(a) for a in middle)
    vx, vy, vz = (float(a) for a in v)
    return Cutter(profile, (x, y, z), each.axis, (vx, vy, vz), -deep, deep, (_BREAK,) * (len(profile) + 2))


def _moved_up(mesh: Mesh, placement: F64, each: Interruption, gap: float) -> Mesh:
    """What lies beyond the stretch moved back along it, its patches with it."""
    axis = np.array(each.axis)
    linear = placement[:3, :3]
    local = linear[0] * axis[0] + linear[1] * axis[1] + linear[2] * axis[2]
    offset = float((placement[:3, 3] * axis).sum())
    at = heights(mesh.vertices, local) + offset
    is_beyond = at > (each.low + each.high) / 2.0
    if not is_beyond.any():
        return mesh
    # The placement turns, mirrors and scales alike in all directions, so its transpose over scale² is its inverse.
    square = float((local**2).sum())
    shift = -(each.high - each.low - gap) * local / square
    whole = np.ones(len(mesh.patches.kind), np.bool_)
    whole[mesh.face_patch[~is_beyond[mesh.faces].all(axis=1)]] = False
    frame = mesh.patches.frame.copy()
    frame[whole, 0] += shift
    patches = Patches(mesh.patches.kind, frame, mesh.patches.size, mesh.patches.inward)
    vertices = np.where(is_beyond[:, None], mesh.vertices + shift, mesh.vertices)
    content = f"{mesh.key} {each.axis!r} {each.low!r} {each.high!r} {gap!r} {placement.tobytes().hex()}"
    return replace(mesh, key=hashlib.sha256(content.encode()).hexdigest(), vertices=vertices, patches=patches)

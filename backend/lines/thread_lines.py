"""Screw threads drawn by convention, after ISO 6410-1.

The crest is the outline of the cylinder that stands in the geometry. The root is a pair of narrow lines along the
thread, seen along the axis three quarters of a circle that is open in the upper right quadrant; the limit of a thread
that ends part of the way along its cylinder is a wide line.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import radians

import numpy as np

from ..contract import F64, I32, FaceOrigin, LineClass, PatchKind, Thread
from .contours import CHORD_MM
from .model import Candidates, View
from .segments import along_sight, dot, length, placed, shifts, unit
from .walls import Wall, along_face, along_wall, is_covered, wall

ROOT_ARC = (80.0, 350.0)
"""Degrees, from the right and turning left, between which the root is drawn in a view along the axis: it begins a
little past the upright centre line and ends a little before the level one (common practice)."""
_SAME = 1e-6
_EDGE_ON = 0.02
"""Cosine between sight and axis below which circles about the axis are seen edge-on and add nothing."""
_CHAMFER = 2.5
"""Pitches that a chamfer takes of a thread at most (common practice)."""
_ALLOWANCE = 0.08
"""Of the crest's radius: a chord of eight to the circle leaves it by no more, so its facets never hide its lines."""


@dataclass(frozen=True, eq=False, slots=True)
class _Threaded:
    """A thread where it stands: origin and unit axis, world; radii of crest and root, and how much of its length a
    chamfer may take, mm; its wall; the faces cut through the part, as (normal, distance from the origin, triangles).
    """

    node: int
    patch: int
    origin: F64
    axis: F64
    length: float
    crest: float
    root: float
    is_internal: bool
    chamfer: float
    wall: Wall
    cuts: tuple[tuple[F64, float, Wall], ...]


def thread_lines(view: View) -> tuple[Candidates, ...]:
    """Root lines, root circles and limits of every thread of the nodes. Cost: the faces of parts with threads."""
    found: list[Candidates] = []
    nodes = view.geometry.nodes
    shift = shifts(view) if any(node.threads for node in nodes) else np.empty((0, 3))
    for row, node in enumerate(nodes):
        if not node.threads:
            continue
        faces = np.flatnonzero(view.face_node == row).astype(np.int32)
        for thread in node.threads:
            threaded = _threaded(view, row, thread, faces, shift[row])
            if threaded is not None:
                found += _lines(view, threaded)
    return tuple(found)


def _threaded(view: View, node: int, thread: Thread, faces: I32, shift: F64) -> _Threaded | None:
    """None where the cylinder is gone."""
    origin, axis = np.array(thread.start) + shift, np.array(thread.axis)
    crest, root = (thread.minor, thread.major) if thread.internal else (thread.major, thread.minor)
    patches = view.geometry.patches
    rows = np.unique(view.face_patch[faces])
    off = patches.frame[rows, 0] + shift - origin
    beside = length(off - dot(off, axis)[:, None] * axis)
    is_crest = (
        (patches.kind[rows] == PatchKind.CYLINDER)
        & (1.0 - np.abs(dot(patches.frame[rows, 3], axis)) < _SAME)
        & (beside < _SAME * (crest + length(off)))
        & (np.abs(patches.size[rows, 0] - crest / 2.0) < _SAME * crest)
    )
    of_crest = faces[np.isin(view.face_patch[faces], rows[is_crest])]
    stands = wall(view, of_crest, origin, axis)
    is_within = (stands.heights.min(axis=1) < thread.length) & (stands.heights.max(axis=1) > 0.0)
    if not is_within.any():
        return None
    patch = int(view.face_patch[of_crest[is_within]].min())
    cuts = tuple(_cuts(view, faces, origin, axis))
    return _Threaded(
        node, patch, origin, axis, thread.length, crest / 2.0, root / 2.0, thread.internal, _CHAMFER * thread.pitch,
        stands, cuts,
    )  # fmt: skip


def _cuts(view: View, faces: I32, origin: F64, axis: F64) -> list[tuple[F64, float, Wall]]:
    """The section faces of a part, by patch."""
    cap = faces[view.geometry.face_origin[view.face_row[faces]] == FaceOrigin.SECTION_CAP]
    found = []
    for patch in np.unique(view.face_patch[cap]):
        of_patch = wall(view, cap[view.face_patch[cap] == patch], origin, axis)
        normal = view.geometry.patches.frame[patch, 3]
        found.append((normal, float(dot(of_patch.corners[0, 0], normal)), of_patch))
    return found


def _lines(view: View, of: _Threaded) -> list[Candidates]:
    found = _root_lines(view, of) + _root_lines_on_cuts(view, of)
    for height, normal, goes_on in (
        (0.0, -of.axis, bool(of.wall.heights.min() < -_SAME * of.length)),
        (of.length, of.axis, bool(of.wall.heights.max() > of.length * (1.0 + _SAME))),
    ):
        found += _limit(view, of, height) if goes_on else _root_circle(view, of, height, normal)
        if goes_on or of.is_internal:
            found += _limit_on_cuts(view, of, height)
    for normal, distance, _ in of.cuts:
        height = distance * float(dot(normal, of.axis))
        if 1.0 - abs(float(dot(normal, of.axis))) < _SAME and 0.0 < height < of.length:
            found += _root_circle(view, of, height, normal)
    return found


# --- seen from the side


def touching_directions(view: View, origin: F64, axis: F64, radius: float) -> tuple[F64, ...]:
    """Unit directions across an axis in which lines of sight touch a cylinder about it: two, or none seen end-on."""
    v = along_sight(view.projection, origin[None])[0]
    across = v - dot(v, axis) * axis
    size = float(length(across))
    if view.projection.eye is None:
        side = np.cross(axis, across)
        return (unit(side), -unit(side)) if size > _EDGE_ON else ()
    if size <= radius * (1.0 + _SAME):
        return ()
    toward, side = -across / size, np.cross(axis, across / size)
    cosine = radius / size
    sine = float(np.sqrt(1.0 - cosine * cosine))
    return cosine * toward + sine * side, cosine * toward - sine * side


def _root_lines(view: View, of: _Threaded) -> list[Candidates]:
    """Along the outline of the root: of an external thread as it appears on its crest, of an internal one in place."""
    found = []
    for touch in touching_directions(view, of.origin, of.axis, of.root):
        direction, radius = (touch, of.root) if of.is_internal else (_before(view, of, touch), of.crest)
        for low, high in np.clip(along_wall(of.wall, direction), 0.0, of.length):
            if high - low > _SAME * of.length:
                base = of.origin + radius * direction
                ends = (base + low * of.axis)[None], (base + high * of.axis)[None]
                found.append(_candidates(view, of, *ends, LineClass.THREAD_ROOT))
    return found


def _before(view: View, of: _Threaded, touch: F64) -> F64:
    """The direction in which the crest covers the outline of the root."""
    point = of.root * touch
    v = along_sight(view.projection, (of.origin + point)[None])[0]
    across = v - dot(v, of.axis) * of.axis
    back = np.sqrt(of.crest * of.crest - of.root * of.root) / length(across)
    return np.asarray((point - back * across) / of.crest)


def _root_lines_on_cuts(view: View, of: _Threaded) -> list[Candidates]:
    """Where faces cut along the axis meet the root."""
    found = []
    for normal, distance, face in _cuts_along(of, of.root):
        across = np.cross(normal, of.axis)
        offset = float(np.sqrt(of.root * of.root - distance * distance))
        for side in (offset, -offset):
            base = of.origin + distance * normal + side * across
            for low, high in np.clip(along_face(face, across, side), 0.0, of.length):
                if high - low > _SAME * of.length:
                    ends = (base + low * of.axis)[None], (base + high * of.axis)[None]
                    found.append(_candidates(view, of, *ends, LineClass.THREAD_ROOT))
    return found


def _limit_on_cuts(view: View, of: _Threaded, height: float) -> list[Candidates]:
    """On faces cut along the axis, the end of a thread within the part is a line between crest and root."""
    found, near = [], _SAME * of.length
    for normal, distance, face in _cuts_along(of, min(of.crest, of.root)):
        across = np.cross(normal, of.axis)
        base = of.origin + distance * normal + height * of.axis
        ends = [float(np.sqrt(radius * radius - distance * distance)) for radius in (of.crest, of.root)]
        for side in (1.0, -1.0):
            there = along_face(face, across, side * 0.5 * (ends[0] + ends[1]))
            if ((there[:, 0] < height - near) & (there[:, 1] > height + near)).any():
                points = [(base + side * end * across)[None] for end in ends]
                found.append(_candidates(view, of, points[0], points[1], LineClass.THREAD_CREST))
    return found


def _cuts_along(of: _Threaded, radius: float) -> list[tuple[F64, float, Wall]]:
    """Faces cut along the axis within a distance of it."""
    return [
        each for each in of.cuts if abs(float(dot(each[0], of.axis))) < _SAME and abs(each[1]) < radius * (1.0 - _SAME)
    ]


# --- round the axis


def _root_circle(view: View, of: _Threaded, height: float, normal: F64) -> list[Candidates]:
    """Three quarters of the root's circle at an end of the thread that is turned to the viewer, where the crest reaches
    it but for a chamfer.
    """
    centre = of.origin + height * of.axis
    v = unit(along_sight(view.projection, centre[None])[0])
    if -float(dot(normal, v)) < _EDGE_ON:
        return []
    right = np.array(view.projection.right)
    x = unit(right - dot(right, normal) * normal)
    between = height - of.chamfer, height + of.chamfer
    return _arc(view, of, centre, x, np.cross(normal, x), ROOT_ARC, of.root, between, LineClass.THREAD_ROOT)


def _limit(view: View, of: _Threaded, height: float) -> list[Candidates]:
    """The line round the crest where the thread ends and its cylinder goes on; of an internal one round its root too.

    None where it would be a circle over the circle of the cylinder.
    """
    centre = of.origin + height * of.axis
    found = []
    for radius in (of.crest, of.root) if of.is_internal else (of.crest,):
        # From where it is touched, so that it reaches the outline exactly.
        for x in touching_directions(view, of.origin, of.axis, radius)[:1]:
            ways = centre, x, np.cross(of.axis, x), (0.0, 360.0)
            found += _arc(view, of, *ways, radius, (height, height), LineClass.THREAD_CREST)
    return found


def _arc(
    view: View, of: _Threaded, centre: F64, x: F64, y: F64, ends: tuple[float, float], radius: float,
    between: tuple[float, float], line_class: LineClass,
) -> list[Candidates]:  # fmt: skip
    """Chords of a circle about the axis, where the crest stands at some height between two."""
    turn = radians(ends[1] - ends[0])
    n = 4 * int(np.clip(np.ceil(turn / np.sqrt(8.0 * CHORD_MM / (radius * view.projection.scale)) / 4.0), 3, 90))
    angle = radians(ends[0]) + turn * np.arange(2 * n + 1) / (2 * n)
    directions = np.cos(angle)[:, None] * x + np.sin(angle)[:, None] * y
    is_there = is_covered(of.wall, directions[1::2], *between)
    points = centre + radius * directions[::2]
    rows = np.flatnonzero(is_there)
    if not len(rows):
        return []
    chain = np.cumsum(np.diff(rows, prepend=rows[0] - 1) > 1, dtype=np.int32)
    return [_candidates(view, of, points[rows], points[rows + 1], line_class, chain)]


def _candidates(
    view: View, of: _Threaded, start: F64, end: F64, line_class: LineClass, chain: I32 | int = -1
) -> Candidates:
    allowance = _ALLOWANCE * of.crest
    return placed(
        view, start, end, line_class, node=of.node, chain=chain, patch=of.patch, allowance=allowance
    )  # fmt: skip

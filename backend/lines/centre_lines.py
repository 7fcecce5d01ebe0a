"""Centre lines: the axes of turned surfaces, crossed where a circle is seen from its axis.

A centre line belongs to what is round at least half the way about: holes, shafts, half-round ends, but not to rounded
edges. Coaxial surfaces of a part share one line along the whole of them. Lines that fall together on paper are one.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..contract import F64, I32, LineClass, PatchKind
from .model import Candidates, View
from .near import NEAR
from .occluders import Occluders
from .queries import hiders
from .segments import along_sight, candidates, dot, length, shifts, to_view, unit, weight
from .walls import joined_stretches

FAR_APART = 12.0
"""Round surfaces on one axis with more than this many radii between them have centre lines of their own."""

BEYOND_MM = 2.0
"""A centre line passes the outline by this on paper, mm."""
SMALLEST_MM = 1.5
"""Diameter on paper below which nothing gets a centre line: its strokes would hide it (common practice)."""
_END_ON = 0.05
"""Sine of the angle between sight and axis below which circles about it are seen as circles."""
_WIDEST_GAP = np.radians(181.0)
_DOME = 0.55
"""Mean of the unit normals of half a sphere is 1/2; of less of it, as at a rounded corner, it is more."""
_SAME = 1e-6
_SAME_ANGLE, _SAME_MM = 1e-4, 0.03
_SAMPLES = 24


@dataclass(frozen=True, eq=False, slots=True)
class _Round:
    """Coaxial surfaces of one node: a point on the axis, its unit direction, where they begin and end along it from
    that point, their greatest radius, mm; whether it is a lone ball; some points on them (k,3).
    """

    node: int
    origin: F64
    axis: F64
    low: float
    high: float
    radius: float
    is_ball: bool
    samples: F64


def centre_lines(view: View, occluders: Occluders | None = None) -> Candidates:
    """Centre lines, class centre-line, drawn whole. With `occluders`, only of what is seen at some sampled vertex.

    Cost: the faces of turned surfaces, and one pass over them for each part.
    """
    rounds = [each for each in _rounds(view) if 2.0 * each.radius * _scale(view, each) >= SMALLEST_MM]
    if occluders is not None:
        rounds = _seen(view, rounds, occluders)
    lines = [line for each in rounds for line in _lines(view, each)]
    if not lines:
        empty = np.empty((0, 3))
        return candidates(empty, empty, LineClass.CENTRE_LINE)
    start, end = (np.stack([line[k] for line in lines]) for k in (0, 1))
    nodes = np.array([each.node for each in rounds for _ in _lines(view, each)])
    start, end, nodes = _united(view, start, end, nodes)
    return candidates(start, end, LineClass.CENTRE_LINE, node=nodes, is_plain=True)


# --- what is round


_TURNED = (PatchKind.CYLINDER, PatchKind.CONE, PatchKind.TORUS)


def _rounds(view: View) -> list[_Round]:
    kind = view.geometry.patches.kind[view.face_patch]
    faces = np.flatnonzero(np.isin(kind, (*_TURNED, PatchKind.SPHERE)))
    if not len(faces):
        return []
    faces = faces[np.argsort(view.face_patch[faces], kind="stable")]
    starts = np.flatnonzero(np.diff(view.face_patch[faces], prepend=-1))
    of_node: dict[int, list[I32]] = {}
    for some in np.split(faces.astype(np.int32), starts[1:]):
        of_node.setdefault(int(view.face_node[some[0]]), []).append(some)
    moved = shifts(view)
    return [each for node, patches in sorted(of_node.items()) for each in _rounds_of(view, node, patches, moved[node])]


def _rounds_of(view: View, node: int, patches: list[I32], shift: F64) -> list[_Round]:
    """Of one node: surfaces by axis, balls on an axis with it, other balls alone."""
    frames, kinds = view.geometry.patches.frame, view.geometry.patches.kind
    axes: list[tuple[F64, F64, list[I32]]] = []
    balls: list[I32] = []
    for some in patches:
        row = int(view.face_patch[some[0]])
        if kinds[row] == PatchKind.SPHERE:
            balls.append(some)
            continue
        origin, axis = frames[row, 0] + shift, frames[row, 3]
        known = next((each for each in axes if _is_on(each, origin) and _is_parallel(each[1], axis)), None)
        if known is None:
            axes.append((origin, axis, [some]))
        else:
            known[2].append(some)
    alone = []
    for some in balls:
        centre = frames[int(view.face_patch[some[0]]), 0] + shift
        known = next((each for each in axes if _is_on(each, centre)), None)
        if known is None:
            alone.append((centre, some))
        else:
            known[2].append(some)
    turned = [
        _turned(view, node, origin, axis, np.concatenate(group))
        for origin, axis, some in axes
        for group in _apart(view, origin, axis, some)
    ]
    return [each for each in (*turned, *(_ball(view, node, *ball) for ball in alone)) if each is not None]


def _apart(view: View, origin: F64, axis: F64, patches: list[I32]) -> list[list[I32]]:
    """Surfaces on one axis in groups: what is far from the next along it has a line of its own."""
    places = []
    for some in patches:
        off = view.world[view.faces[some]].reshape(-1, 3) - origin
        height = dot(off, axis)
        places.append((float(height.min()), float(height.max()), float(length(off - height[:, None] * axis).max())))
    groups: list[list[I32]] = []
    reach, radius = 0.0, 0.0
    for row in sorted(range(len(patches)), key=lambda k: (places[k][0], k)):
        low, high, wide = places[row]
        if not groups or low - reach > FAR_APART * max(radius, wide):
            groups.append([])
            reach, radius = high, wide
        groups[-1].append(patches[row])
        reach, radius = max(reach, high), max(radius, wide)
    return groups


def _is_on(known: tuple[F64, F64, list[I32]], point: F64) -> bool:
    off = point - known[0]
    return float(length(off - dot(off, known[1]) * known[1])) <= _SAME * (1.0 + float(length(off)))


def _is_parallel(a: F64, b: F64) -> bool:
    return float(length(np.cross(a, b))) <= _SAME


def _turned(view: View, node: int, origin: F64, axis: F64, faces: I32) -> _Round | None:
    """None where they are not half the way round."""
    corners = view.world[np.unique(view.faces[faces])]
    off = corners - origin
    height = dot(off, axis)
    across = off - height[:, None] * axis
    radius = length(across)
    is_off_axis = radius > _SAME * radius.max()
    x = unit(across[np.argmax(radius)])
    angle = np.sort(np.arctan2(dot(across, np.cross(axis, x)), dot(across, x))[is_off_axis])
    gap = np.diff(angle, append=angle[0] + 2.0 * np.pi).max()
    if gap > _WIDEST_GAP:
        return None
    ends = float(height.min()), float(height.max())
    return _Round(node, origin, axis, *ends, float(radius.max()), False, _some(corners))


def _ball(view: View, node: int, centre: F64, faces: I32) -> _Round | None:
    """None for less than half of one."""
    corners = view.world[view.faces[faces]]
    doubled = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    if float(length(doubled.sum(axis=0))) > _DOME * float(length(doubled).sum()):
        return None
    radius = float(view.geometry.patches.size[view.face_patch[faces[0]], 0])
    samples = _some(view.world[np.unique(view.faces[faces])])
    return _Round(node, centre, np.array((0.0, 0.0, 1.0)), -radius, radius, radius, True, samples)


def _some(points: F64) -> F64:
    return points[:: max(1, len(points) // _SAMPLES)]


def _scale(view: View, each: _Round) -> float:
    """Mm on paper for one mm, across the sight at the middle of the axis."""
    middle = (each.origin + 0.5 * (each.low + each.high) * each.axis)[None]
    if view.projection.eye is None:
        return view.projection.scale
    distance = float(weight(view.projection, middle)[0])
    if distance < NEAR:
        return 0.0
    right = np.array(view.projection.right)
    points = to_view(view.projection, np.concatenate((middle, middle + right)))
    return float(np.hypot(*(points[1, :2] - points[0, :2])))


def _seen(view: View, rounds: list[_Round], occluders: Occluders) -> list[_Round]:
    if not rounds:
        return rounds
    node, _ = hiders(view, occluders, np.concatenate([each.samples for each in rounds]))
    counts = np.cumsum([len(each.samples) for each in rounds])[:-1]
    return [each for each, some in zip(rounds, np.split(node < 0, counts), strict=True) if some.any()]


# --- lines on paper


def _lines(view: View, each: _Round) -> list[tuple[F64, F64]]:
    """Start and end, view points, of the lines of coaxial surfaces."""
    middle = each.origin + 0.5 * (each.low + each.high) * each.axis
    v = unit(along_sight(view.projection, middle[None])[0])
    if each.is_ball or float(length(np.cross(v, each.axis))) < _END_ON:
        reach = each.radius * _scale(view, each) + BEYOND_MM
        centre = to_view(view.projection, middle[None])[0]
        return [(centre - reach * way, centre + reach * way) for way in np.eye(3)[:2]]
    ends = each.origin + np.array(((each.low,), (each.high,))) * each.axis
    if (weight(view.projection, ends) < NEAR).any():
        return []
    start, end = to_view(view.projection, ends)
    run = float(np.hypot(*(end[:2] - start[:2])))
    if run == 0.0:
        return []
    more = (BEYOND_MM / run) * (end - start)
    return [(start - more, end + more)]


def _united(view: View, start: F64, end: F64, nodes: I32) -> tuple[F64, F64, I32]:
    """Lines that fall together on paper as one, which belongs to the part whose path sorts first."""
    rank = {row: k for k, row in enumerate(sorted(set(nodes.tolist()), key=lambda row: view.geometry.nodes[row].path))}
    along = end[:, :2] - start[:, :2]
    angle = np.remainder(np.arctan2(along[:, 1], along[:, 0]) + _SAME_ANGLE, np.pi)
    found = []
    for alike in _runs(angle, _SAME_ANGLE):
        way = along[alike[0]] / np.hypot(*along[alike[0]])
        offset = way[0] * start[alike, 1] - way[1] * start[alike, 0]
        for run in _runs(offset, _SAME_MM):
            rows = alike[run]
            place = np.sort(np.stack([way[0] * p[rows, 0] + way[1] * p[rows, 1] for p in (start, end)], axis=1), axis=1)
            for stretch in joined_stretches(place, 0.0):
                within = rows[(place[:, 0] >= stretch[0]) & (place[:, 1] <= stretch[1])]
                points = np.concatenate((start[within], end[within]))
                at = way[0] * points[:, 0] + way[1] * points[:, 1]
                node = min(nodes[within].tolist(), key=lambda row: rank[row])
                found.append((points[np.argmin(at)], points[np.argmax(at)], node))
    starts, ends, owners = zip(*found, strict=True)
    return np.stack(starts), np.stack(ends), np.array(owners, np.int32)


def _runs(values: F64, gap: float) -> list[I32]:
    """Rows of values in order, split where two that follow each other are further apart than `gap`."""
    order = np.argsort(values, kind="stable")
    return [rows.astype(np.int32) for rows in np.split(order, np.flatnonzero(np.diff(values[order]) > gap) + 1)]

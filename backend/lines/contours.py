"""Outlines of smooth surfaces: where they turn away from the viewer.

The sign of n.v at the corners of triangles says which of them an outline runs through and how its pieces follow each
other; where exactly it runs is found from the surface itself on cylinders, cones, spheres and tori, and on free
surfaces by interpolating the normals at the corners. Two triangles find the same point on the side they share.
An outline ends where its patch ends, on the side of the triangle there, as drawn.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..compiled import kernel
from ..contract import F32, F64, I32, U8, EdgeKind, LineClass, PatchKind
from .chaining import walked
from .model import Bools, Candidates, View, joined
from .near import NEAR
from .segments import along_sight, candidates, dot, fixed, length, none, shifts, to_view, weight
from .tangency import Surfaces, bends_away, chord_crossing, lifted, surfaces_of, turning

CHORD_MM = 0.004
"""Chords of curved outlines stay this near to them on paper, mm."""
NEVER_HIDES = 1e9
"""The allowance of an outline that its own patch cannot hide: a tangent of a quadric meets it nowhere else."""
_MOST_CHORDS = 32
_NOISE = 1e-6
"""Of interpolated normals, which are of single precision: a smaller n.v is a touch."""
_STRAIGHT = (PatchKind.CYLINDER, PatchKind.CONE)


@dataclass(frozen=True, eq=False, slots=True)
class _Turns:
    """Triangles that may hold an outline.

    face (k,) view faces; corner (k,3) rows of the view's points; value (k,3) n.v at them; patch (k,).
    """

    face: I32
    corner: I32
    value: F64
    patch: I32

    def take(self, rows: NDArray[np.integer]) -> _Turns:
        return _Turns(self.face[rows], self.corner[rows], self.value[rows], self.patch[rows])


@dataclass(frozen=True, eq=False, slots=True)
class _Crossings:
    """Where outlines cross sides of triangles, each once.

    low, high (c,) rows of the view's points, the same one where an outline passes through it; chord (c,3) world on
    the side itself; exact (c,3) world on the outline.
    """

    low: I32
    high: I32
    chord: F64
    exact: F64


def contours_of(view: View) -> Candidates:
    """Outlines of smooth patches, class visible-outline; segments of one outline share a chain.

    Straight ones are one segment from rim to rim, and name the first and last face they run in. `allowance`: an outline
    that the solid does not hide at the touch may have its own patch before it by the longest side of the triangle it
    runs in, or by any length on a quadric. Where a torus bends the other way, so that the touch is inside the solid,
    the outline stands that much deeper instead and its own surface hides it for certain.
    Where an outline ends on a rim, the rim is seen from there on, but its edges only from a corner of the triangle on:
    the stretch between is given with the outlines.
    Cost: one pass over the corner normals, then linear in the triangles that outlines run in.
    """
    surfaces = _surfaces(view)
    turns = _pieces(_turns(view, surfaces))
    if not len(turns.face):
        return none()
    crossings, ends = _crossings(view, surfaces, turns)
    is_point = ends[:, 0] == ends[:, 1]
    kept = np.flatnonzero(~(is_point | _is_sharp_side(view, turns, crossings, ends)))
    if not len(kept):
        return none()
    turns, ends = turns.take(kept), ends[kept]
    order, turned, chain = walked(fixed(ends), len(crossings.low))
    turns, ends = turns.take(order), ends[order]
    ends = np.where(turned[:, None], ends[:, ::-1], ends)
    return joined(
        (_drawn(view, surfaces, turns, crossings, ends, chain), _rims(view, surfaces, turns, crossings, ends))
    )


# --- which triangles


def _surfaces(view: View) -> Surfaces:
    """The surfaces of all patches, where displaced parts have them."""
    patches = view.geometry.patches
    counts = np.diff(view.geometry.patch_start, append=len(patches.kind))
    return surfaces_of(patches, np.repeat(shifts(view), counts, axis=0), view.projection)


def _turns(view: View, surfaces: Surfaces) -> _Turns:
    """Triangles of curved patches on whose corners n.v has, or may have, both signs."""
    sight = np.array(view.projection.sight if view.projection.eye is None else view.projection.eye)
    faces = np.empty(len(view.faces), np.int32)
    n = _near_turn(
        fixed(view.faces), fixed(view.world), fixed(view.corner_normals), fixed(view.face_patch), fixed(surfaces.kind),
        sight, surfaces.is_central, faces,
    )  # fmt: skip
    faces = faces[:n].copy()
    corner, patch = view.faces[faces], view.face_patch[faces]
    value = np.empty((n, 3))
    is_free = surfaces.kind[patch] == PatchKind.FREE
    free, exact = np.flatnonzero(is_free), np.flatnonzero(~is_free)
    value[free] = _interpolated(view, faces[free])
    for k in range(3):
        value[exact, k] = turning(surfaces, patch[exact], view.world[corner[exact, k]])
    return _Turns(faces, corner, value, patch)


@kernel
def _near_turn(
    faces: I32, world: F64, normals: F32, patch: I32, kinds: U8, sight: F64, is_central: bool, found: I32
) -> int:
    """Write the faces to look at into `found` and return how many; see `_turns`. A wide net for exact surfaces."""
    n = 0
    for f in range(len(faces)):
        kind = kinds[patch[f]]
        if kind == 0:
            continue
        low, high = np.inf, -np.inf
        margin = 0.05 if kind == 2 else 1e-5
        x, y, z = sight[0], sight[1], sight[2]
        for k in range(3):
            size = 1.0
            if is_central:
                p = faces[f, k]
                x, y, z = world[p, 0] - sight[0], world[p, 1] - sight[1], world[p, 2] - sight[2]
                size = np.sqrt(x * x + y * y + z * z)
                q = faces[f, (k + 1) % 3]
                u, v, w = world[q, 0] - world[p, 0], world[q, 1] - world[p, 1], world[q, 2] - world[p, 2]
                margin = max(margin, (0.5 * np.sqrt(u * u + v * v + w * w)) / max(size, 1e-300))
            value = (x * normals[f, k, 0] + y * normals[f, k, 1] + z * normals[f, k, 2]) / max(size, 1e-300)
            low, high = min(low, value), max(high, value)
        if kind == 5:
            margin = 2e-6
        if low <= margin and high >= -margin:
            found[n] = f
            n += 1
    return n


def _interpolated(view: View, faces: I32) -> F64:
    """n.v (k,3) from the corner normals."""
    value = np.empty((len(faces), 3))
    for k in range(3):
        v = along_sight(view.projection, view.world[view.faces[faces, k]])
        value[:, k] = dot(view.corner_normals[faces, k].astype(np.float64), v)
        value[np.abs(value[:, k]) <= _NOISE * length(v), k] = 0.0
    return value


# --- pieces and the points between them


def _pieces(turns: _Turns) -> _Turns:
    """The triangles whose corners lie on both sides, turned so that the odd corner stands first."""
    away = turns.value >= 0.0
    n_away = away.sum(axis=1)
    chosen = np.flatnonzero((n_away == 1) | (n_away == 2))
    turns, away, n_away = turns.take(chosen), away[chosen], n_away[chosen]
    odd = np.argmax(away == (n_away == 1)[:, None], axis=1)
    around = (odd[:, None] + np.arange(3)) % 3
    rows = np.arange(len(odd))[:, None]
    return _Turns(turns.face, turns.corner[rows, around], turns.value[rows, around], turns.patch)


def _crossings(view: View, surfaces: Surfaces, turns: _Turns) -> tuple[_Crossings, I32]:
    """All crossings, and those (k,2) that each piece runs between."""
    n = len(turns.face)
    a, b = np.tile(turns.corner[:, 0], 2), turns.corner[:, 1:].T.ravel()
    at_a, at_b = np.tile(turns.value[:, 0], 2), turns.value[:, 1:].T.ravel()
    # A corner that is itself a touch is the crossing of all sides that meet in it.
    a, b = np.where(at_b == 0.0, b, a), np.where(at_a == 0.0, a, b)
    is_turned = a > b
    low, high = np.where(is_turned, b, a), np.where(is_turned, a, b)
    at_low, at_high = np.where(is_turned, at_b, at_a), np.where(is_turned, at_a, at_b)
    patch = np.tile(turns.patch, 2)
    of_side = np.unique(low.astype(np.int64) * len(view.points) + high, return_inverse=True)[1]
    keys = of_side.astype(np.int64) * len(surfaces.kind) + patch
    _, first, joint = np.unique(keys, return_index=True, return_inverse=True)
    is_end = np.bincount(joint) == 1
    sides_of = low[first], high[first], at_low[first], at_high[first], is_end
    chord = _on_chords(view, surfaces, patch[first], *sides_of)
    exact = _on_outline(view, surfaces, patch[first], chord)
    crossings = _Crossings(low[first].astype(np.int32), high[first].astype(np.int32), chord, exact)
    return crossings, np.ascontiguousarray(joint.reshape(2, n).T, np.int32)


def _on_chords(
    view: View, surfaces: Surfaces, patch: I32, low: I32, high: I32, at_low: F64, at_high: F64, is_end: Bools
) -> F64:
    """World points (c,3) on sides: exact where an outline ends, otherwise near enough to be lifted."""
    chord = view.world[low].copy()
    rows = np.flatnonzero(low != high)
    share = at_low[rows] / (at_low[rows] - at_high[rows])
    chord[rows] += share[:, None] * (view.world[high[rows]] - view.world[low[rows]])
    rows = np.flatnonzero((low != high) & is_end)
    between = (view.world[low[rows]], view.world[high[rows]], at_low[rows], at_high[rows])
    chord[rows] = chord_crossing(surfaces, patch[rows], *between)
    return chord


def _is_sharp_side(view: View, turns: _Turns, crossings: _Crossings, ends: I32) -> Bools:
    """Whether a piece is a whole side of its triangle where the patch ends sharply: an edge already, not an outline."""
    is_side = (crossings.low == crossings.high)[ends].all(axis=1)
    side = np.argmax(view.faces[turns.face] == turns.corner[:, 1:2], axis=1)
    kind = view.edge_kind[turns.face, side]
    return np.asarray(is_side & ((kind == EdgeKind.SHARP) | (kind == EdgeKind.BORDER)))


# --- what is drawn


def _drawn(view: View, surfaces: Surfaces, turns: _Turns, crossings: _Crossings, ends: I32, chain: I32) -> Candidates:
    """Candidates of pieces in the order of their chains."""
    is_end = np.bincount(ends.ravel(), minlength=len(crossings.low)) == 1
    points = np.where(is_end[:, None], crossings.chord, crossings.exact)
    vertex = np.where(crossings.low == crossings.high, crossings.low, -1).astype(np.int32)
    kind = surfaces.kind[turns.patch]
    is_apex = (kind == PatchKind.CONE) & (vertex[ends[:, 0]] >= 0)
    run = _runs(chain, np.isin(kind, _STRAIGHT) & ~is_apex)
    first = np.flatnonzero(np.diff(run, prepend=-1))
    last = np.append(first[1:], len(run)) - 1
    start, end = points[ends[first, 0]], points[ends[last, 1]]
    number = _chords(view, surfaces, turns.patch[first], start, end)
    rows = np.repeat(np.arange(len(first)), number)
    step = np.arange(len(rows)) - np.repeat(np.cumsum(number) - number, number)
    patch = turns.patch[first[rows]]
    along = _between(view, surfaces, patch, start[rows], end[rows], step / number[rows])
    beyond = np.where((step + 1 == number[rows])[:, None], end[rows], np.roll(along, -1, axis=0))
    vertices = np.stack((vertex[ends[first, 0]][rows], vertex[ends[last, 1]][rows]), axis=1)
    vertices[step > 0, 0], vertices[step + 1 < number[rows], 1] = -1, -1
    faces = np.stack((turns.face[first], np.where(first == last, -1, turns.face[last])), axis=1)[rows]
    depth, allowance = _depths(view, surfaces, patch, faces[:, 0], 0.5 * (along + beyond))
    seen = _seen(view, along, vertices[:, 0], depth), _seen(view, beyond, vertices[:, 1], depth)
    return candidates(
        *seen,
        LineClass.VISIBLE_OUTLINE,
        node=view.face_node[faces[:, 0]],
        chain=chain[first][rows],
        faces=faces,
        vertices=vertices,
        patch=patch,
        allowance=allowance,
    )


def _rims(view: View, surfaces: Surfaces, turns: _Turns, crossings: _Crossings, ends: I32) -> Candidates:
    """Stretches of rims from where an outline ends to the near corner of its triangle, where no edge is given."""
    is_end = (np.bincount(ends.ravel(), minlength=len(crossings.low)) == 1) & (crossings.low != crossings.high)
    piece, slot = np.nonzero(is_end[ends])
    crossing, face = ends[piece, slot], turns.face[piece]
    low, high = crossings.low[crossing], crossings.high[crossing]
    corners = view.faces[face]
    following = np.roll(corners, -1, axis=1)
    is_side = ((corners == low[:, None]) & (following == high[:, None])) | (
        (corners == high[:, None]) & (following == low[:, None])
    )
    side = np.argmax(is_side, axis=1)
    kind, other = view.edge_kind[face, side], view.neighbour[face, side]
    is_open = np.array([not node.closed for node in view.geometry.nodes], np.bool_)[view.face_node[face]]
    gives = np.stack([_gives_edge(view.facing[each], is_open) & (each >= 0) for each in (face, other)]).any(axis=0)
    kept = np.flatnonzero(((kind == EdgeKind.SHARP) | (kind == EdgeKind.BORDER)) & ~gives)
    piece, crossing, face, low, high = piece[kept], crossing[kept], face[kept], low[kept], high[kept]
    # The corner at which the surface faces the viewer.
    is_low = (turns.corner[piece] == low[:, None]) & (turns.value[piece] < 0.0)
    near = np.where(is_low.any(axis=1), low, high).astype(np.int32)
    unknown, patch, point = np.full(len(kept), -1, np.int32), view.face_patch[face], crossings.chord[crossing]
    depth, allowance = _depths(view, surfaces, patch, face, point)
    return candidates(
        _seen(view, point, unknown, depth),
        _seen(view, view.world[near], unknown, depth),
        LineClass.VISIBLE_OUTLINE,
        node=view.face_node[face],
        faces=np.stack((face, unknown), axis=1),
        vertices=np.stack((unknown, near), axis=1),
        patch=patch,
        allowance=allowance,
    )


def _gives_edge(facing: NDArray[np.int8], is_open: Bools) -> Bools:
    """Whether a triangle on one side of an edge is enough for it to be given; see `edges.edges_of`."""
    return np.asarray((facing > 0) | (is_open & (facing != 0)))


def _runs(chain: I32, goes_straight_on: Bools) -> NDArray[np.intp]:
    """Numbers (k,) of the pieces that are drawn as one: all of a straight outline, on a cone up to its apex."""
    goes_on = np.zeros(len(chain), np.bool_)
    goes_on[1:] = (chain[1:] == chain[:-1]) & goes_straight_on[1:]
    return np.cumsum(~goes_on) - 1


def _chords(view: View, surfaces: Surfaces, patch: I32, start: F64, end: F64) -> NDArray[np.intp]:
    """Into how many chords (k,) each piece goes: the sagitta falls with their square."""
    middle = 0.5 * (start + end)
    off = to_view(view.projection, _on_outline(view, surfaces, patch, middle)) - to_view(view.projection, middle)
    sagitta = np.sqrt(off[:, 0] * off[:, 0] + off[:, 1] * off[:, 1])
    return np.clip(np.ceil(np.sqrt(sagitta / CHORD_MM)), 1, _MOST_CHORDS).astype(np.intp)


def _between(view: View, surfaces: Surfaces, patch: I32, start: F64, end: F64, share: F64) -> F64:
    """Points of outlines at a share of the way; at 0 the start itself."""
    points = start + share[:, None] * (end - start)
    rows = np.flatnonzero(share > 0.0)
    if len(rows):
        points[rows] = _on_outline(view, surfaces, patch[rows], points[rows])
    return points


def _on_outline(view: View, surfaces: Surfaces, patch: I32, points: F64) -> F64:
    """Points lifted onto the exact outline, but for those that would come too near the eye: they stay on the chord."""
    exact = lifted(surfaces, patch, points)
    if view.projection.eye is None:
        return exact
    return np.where((weight(view.projection, exact) >= 0.5 * NEAR)[:, None], exact, points)


def _depths(view: View, surfaces: Surfaces, patch: I32, faces: I32, middle: F64) -> tuple[F64, F64]:
    """How much deeper each segment stands, and its allowance, both (s,) in mm of model; see `contours_of`."""
    corners = view.world[view.faces[faces]]
    longest = np.stack([length(corners[:, k] - corners[:, k - 1]) for k in range(3)]).max(axis=0)
    kind = surfaces.kind[patch]
    is_bent = kind == PatchKind.TORUS
    is_quadric = ~is_bent & (kind != PatchKind.FREE)
    is_solid = np.array([node.closed for node in view.geometry.nodes], np.bool_)[view.face_node[faces]]
    is_inside = is_bent & is_solid & ~bends_away(surfaces, patch, middle)
    allowance = np.where(is_quadric, NEVER_HIDES, np.where(is_inside, 0.0, longest))
    return np.where(is_inside, longest, 0.0), allowance


def _seen(view: View, world: F64, vertex: I32, deeper: F64) -> F64:
    """View points of world points, some of them mesh vertices, some moved away from the viewer in depth alone."""
    points = to_view(view.projection, world)
    rows = np.flatnonzero(vertex >= 0)
    points[rows] = view.points[vertex[rows]]
    rows = np.flatnonzero(deeper > 0.0)
    if len(rows):
        v = along_sight(view.projection, world[rows])
        moved = world[rows] + (deeper[rows] / length(v))[:, None] * v
        points[rows, 2] = to_view(view.projection, moved)[:, 2]
    return points

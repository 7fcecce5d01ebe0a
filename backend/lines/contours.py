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

from ..contract import F32, F64, I32, U8, EdgeKind, LineClass, PatchKind
from .chaining import walked
from .compiled import kernel
from .model import Candidates, View
from .segments import along_sight, candidates, dot, fixed, length, none, shifts, to_view
from .tangency import Touched, bends_away, chord_crossing, lifted, turning

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

    face (k,) view faces; corner (k,3) rows of the view's points; value (k,3) n.v at them; patch (k,); touched the
    patch of each; kind (k,) as traced.
    """

    face: I32
    corner: I32
    value: F64
    touched: Touched

    def take(self, rows: NDArray[np.integer] | NDArray[np.bool_]) -> _Turns:
        return _Turns(self.face[rows], self.corner[rows], self.value[rows], self.touched.take(rows))


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
    Cost: one pass over the corner normals, then linear in the triangles that outlines run in.
    """
    turns = _pieces(_turns(view))
    if not len(turns.face):
        return none()
    crossings, ends = _crossings(view, turns)
    is_point = ends[:, 0] == ends[:, 1]
    kept = np.flatnonzero(~(is_point | _is_sharp_side(view, turns, crossings, ends)))
    if not len(kept):
        return none()
    turns, ends = turns.take(kept), ends[kept]
    order, turned, chain = walked(fixed(ends), len(crossings.low))
    turns, ends = turns.take(order), ends[order]
    ends = np.where(turned[:, None], ends[:, ::-1], ends)
    return _drawn(view, turns, crossings, ends, chain)


# --- which triangles


def _turns(view: View) -> _Turns:
    """Triangles of curved patches on whose corners n.v has, or may have, both signs."""
    patches = view.geometry.patches
    sight = np.array(view.projection.sight if view.projection.eye is None else view.projection.eye)
    is_central = view.projection.eye is not None
    faces = np.empty(len(view.faces), np.int32)
    arrays = view.faces, view.world, view.corner_normals, view.face_patch, patches.kind, sight
    n = _near_turn(*map(fixed, arrays), is_central, faces)
    faces = faces[:n].copy()
    corner = view.faces[faces]
    touched = _touched(view, faces)
    value = _interpolated(view, faces)
    rows = np.flatnonzero(touched.kind != PatchKind.FREE)
    some = touched.take(rows)
    for k in range(3):
        value[rows, k] = turning(some, view.world[corner[rows, k]])
    return _Turns(faces, corner, value, touched)


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


def _touched(view: View, faces: I32) -> Touched:
    """The patches of faces, where displaced parts have them. FREE where it cannot be told where that is."""
    patches, rows = view.geometry.patches, view.face_patch[faces]
    shift, is_known = shifts(view, faces)
    size = patches.size[rows].copy()
    is_cone = patches.kind[rows] == PatchKind.CONE
    size[is_cone, 0] = np.tan(np.radians(size[is_cone, 0]))
    frame = patches.frame[rows]
    origin = frame[:, 0] + shift
    eye = view.projection.eye
    sight = np.broadcast_to(np.array(view.projection.sight), origin.shape) if eye is None else np.array(eye) - origin
    return Touched(
        np.where(is_known, patches.kind[rows], PatchKind.FREE).astype(np.uint8),
        origin,
        frame[:, 3],
        size,
        np.where(patches.inward[rows], -1.0, 1.0),
        sight,
        eye is not None,
    )


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
    return _Turns(turns.face, turns.corner[rows, around], turns.value[rows, around], turns.touched)


def _crossings(view: View, turns: _Turns) -> tuple[_Crossings, I32]:
    """All crossings, and those (k,2) that each piece runs between."""
    n = len(turns.face)
    a, b = np.tile(turns.corner[:, 0], 2), turns.corner[:, 1:].T.ravel()
    at_a, at_b = np.tile(turns.value[:, 0], 2), turns.value[:, 1:].T.ravel()
    # A corner that is itself a touch is the crossing of all sides that meet in it.
    a, b = np.where(at_b == 0.0, b, a), np.where(at_a == 0.0, a, b)
    is_turned = a > b
    low, high = np.where(is_turned, b, a), np.where(is_turned, a, b)
    at_low, at_high = np.where(is_turned, at_b, at_a), np.where(is_turned, at_a, at_b)
    patch = np.tile(view.face_patch[turns.face], 2).astype(np.int64)
    sides, of_side = np.unique(low.astype(np.int64) * len(view.points) + high, return_inverse=True)
    keys = of_side.astype(np.int64) * len(view.geometry.patches.kind) + patch
    _, first, joint = np.unique(keys, return_index=True, return_inverse=True)
    touched = turns.touched.take(first % n)
    chord = _on_chords(view, touched, low[first], high[first], at_low[first], at_high[first])
    exact = lifted(touched, chord)
    crossings = _Crossings(low[first].astype(np.int32), high[first].astype(np.int32), chord, exact)
    return crossings, np.ascontiguousarray(joint.reshape(2, n).T, np.int32)


def _on_chords(view: View, touched: Touched, low: I32, high: I32, at_low: F64, at_high: F64) -> F64:
    chord = view.world[low].copy()
    rows = np.flatnonzero(low != high)
    between = (view.world[low[rows]], view.world[high[rows]], at_low[rows], at_high[rows])
    chord[rows] = chord_crossing(touched.take(rows), *between)
    return chord


def _is_sharp_side(view: View, turns: _Turns, crossings: _Crossings, ends: I32) -> NDArray[np.bool_]:
    """Whether a piece is a whole side of its triangle where the patch ends sharply: an edge already, not an outline."""
    is_side = (crossings.low == crossings.high)[ends].all(axis=1)
    side = np.argmax(view.faces[turns.face] == turns.corner[:, 1:2], axis=1)
    kind = view.edge_kind[turns.face, side]
    return np.asarray(is_side & ((kind == EdgeKind.SHARP) | (kind == EdgeKind.BORDER)))


# --- what is drawn


def _drawn(view: View, turns: _Turns, crossings: _Crossings, ends: I32, chain: I32) -> Candidates:
    """Candidates of pieces in the order of their chains."""
    is_end = np.bincount(ends.ravel(), minlength=len(crossings.low)) == 1
    points = np.where(is_end[:, None], crossings.chord, crossings.exact)
    vertex = np.where(crossings.low == crossings.high, crossings.low, -1).astype(np.int32)
    is_straight = np.isin(turns.touched.kind, _STRAIGHT)
    is_apex = (turns.touched.kind == PatchKind.CONE) & (vertex[ends[:, 0]] >= 0)
    run = _runs(chain, is_straight & ~is_apex)
    first = np.flatnonzero(np.diff(run, prepend=-1))
    last = np.append(first[1:], len(run)) - 1
    start, end = points[ends[first, 0]], points[ends[last, 1]]
    number = _chords(view, turns.touched.take(first), start, end)
    rows = np.repeat(np.arange(len(first)), number)
    step = np.arange(len(rows)) - np.repeat(np.cumsum(number) - number, number)
    touched = turns.touched.take(first[rows])
    along = _between(touched, start[rows], end[rows], step / number[rows])
    beyond = np.where((step + 1 == number[rows])[:, None], end[rows], np.roll(along, -1, axis=0))
    vertices = np.stack((vertex[ends[first, 0]][rows], vertex[ends[last, 1]][rows]), axis=1)
    vertices[step > 0, 0], vertices[step + 1 < number[rows], 1] = -1, -1
    faces = np.stack((turns.face[first], np.where(first == last, -1, turns.face[last])), axis=1)[rows]
    depth, allowance = _depths(view, touched, faces[:, 0], 0.5 * (along + beyond))
    seen = _seen(view, along, vertices[:, 0], depth), _seen(view, beyond, vertices[:, 1], depth)
    return candidates(
        *seen,
        LineClass.VISIBLE_OUTLINE,
        node=view.face_node[faces[:, 0]],
        chain=chain[first][rows],
        faces=faces,
        vertices=vertices,
        patch=view.face_patch[faces[:, 0]],
        allowance=allowance,
    )


def _runs(chain: I32, goes_straight_on: NDArray[np.bool_]) -> NDArray[np.intp]:
    """Numbers (k,) of the pieces that are drawn as one: all of a straight outline, on a cone up to its apex."""
    goes_on = np.zeros(len(chain), np.bool_)
    goes_on[1:] = (chain[1:] == chain[:-1]) & goes_straight_on[1:]
    return np.cumsum(~goes_on) - 1


def _chords(view: View, touched: Touched, start: F64, end: F64) -> NDArray[np.intp]:
    """Into how many chords (k,) each piece goes: the sagitta falls with their square."""
    middle = 0.5 * (start + end)
    off = to_view(view.projection, lifted(touched, middle)) - to_view(view.projection, middle)
    sagitta = np.sqrt(off[:, 0] * off[:, 0] + off[:, 1] * off[:, 1])
    return np.clip(np.ceil(np.sqrt(sagitta / CHORD_MM)), 1, _MOST_CHORDS).astype(np.intp)


def _between(touched: Touched, start: F64, end: F64, share: F64) -> F64:
    """Points of outlines at a share of the way; at 0 the start itself."""
    points = start + share[:, None] * (end - start)
    rows = np.flatnonzero(share > 0.0)
    if len(rows):
        points[rows] = lifted(touched.take(rows), points[rows])
    return points


def _depths(view: View, touched: Touched, faces: I32, middle: F64) -> tuple[F64, F64]:
    """How much deeper each segment stands, and its allowance, both (s,) in mm of model; see `contours_of`."""
    corners = view.world[view.faces[faces]]
    longest = np.stack([length(corners[:, k] - corners[:, k - 1]) for k in range(3)]).max(axis=0)
    is_bent = touched.kind == PatchKind.TORUS
    is_quadric = ~is_bent & (touched.kind != PatchKind.FREE)
    is_solid = np.array([node.closed for node in view.geometry.nodes], np.bool_)[view.face_node[faces]]
    is_inside = is_bent & is_solid & ~bends_away(touched, middle)
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

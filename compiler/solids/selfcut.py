"""Whether a body along a path cuts itself: where it bends too tightly for its section, and where far stretches meet.

Judged at one chord error that follows from the section, never at a figure's. Near: every point of the section has to
move forward from station to station. Far: the body is cut into pieces about as long as the section is wide; pieces
that are no neighbours, and whose axes come closer than the sections reach, are intersected as solids.
"""

from __future__ import annotations

import math
from itertools import pairwise

import manifold3d
import numpy as np
from manifold3d import Manifold
from numpy.typing import NDArray

from .outline import OutlineFlaw, Polyline, count_chords, faults, flatten, oriented
from .recipe import Bellows, Spring, Sweep, Tube
from .spine import SMOOTH_WITHIN, Arc, PathFlaw, Trace, spelled
from .stations import Stations, affordable, stations
from .sweep import bellows_outline, divisions_in_common, parts_of, reach_from_path, rings

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]

_SHARE = 1e-2  # chord error as part of the reach
MAX_CLOSE = 4_000
"""Limit named `close`: pairs of pieces of one body that come close to each other."""
_BLOCK = 1_000_000
_TURN = math.radians(150.0)
"""A curve that bends nowhere tighter than the section reaches has to turn half round before it can meet itself: where
two normal discs share a point, its distance to the curve has two minima, and between them the curve leaves the ball of
that radius round the point and comes back to it. Some of the half turn is kept as a margin.
"""
_WHOLE = 1e-9
"""Degrees off a whole turn that are rounding."""
_MOST_POINTS = 1_000_000  # of all sections; with more of them the chord error is coarser


def flaws_along(shape: Sweep | Tube | Spring | Bellows) -> tuple[OutlineFlaw, ...]:
    """The first mistake of a body along a path, its place in mm in the shape's own frame."""
    if isinstance(shape, Bellows):
        return _bellows_flaws(shape)
    outline, found, twist = parts_of(shape)
    if isinstance(found, PathFlaw):
        return (OutlineFlaw(found.code, found.sentence, found.hint),)
    if isinstance(shape, Tube) and shape.bore >= shape.diameter:
        sentence = f"the bore of {shape.bore:.6g} mm leaves no wall in a tube of {shape.diameter:.6g} mm"
        return (OutlineFlaw("no-wall", sentence, "make the bore smaller"),)
    if isinstance(shape, Sweep):
        wrong = faults(outline, False) or _does_not_close(shape, found)
        if wrong:
            return wrong
    reach = reach_from_path(flatten(outline, 0.02 * _extent(shape)))
    curves = [oriented(loop, k == 0) for k, loop in enumerate((outline.outer, *outline.holes))]
    rung = affordable(
        found, _SHARE * reach, reach, lambda at: sum(count_chords(each, at) for each in curves), _MOST_POINTS
    )
    loops = flatten(outline, rung)
    symmetry = 1 if isinstance(shape, Sweep) else divisions_in_common(loops)
    along = stations(found, rung, reach, twist, symmetry)
    if len(along.points) * sum(len(loop.points) for loop in loops) > 4 * _MOST_POINTS:
        sentence = f"it is judged by more than {4 * _MOST_POINTS} points, the limit named `points`"
        return (OutlineFlaw("too-large", sentence, "give its path fewer turns or its section fewer curves"),)
    if isinstance(shape, Sweep) and shape.twist:
        wrong = _twisted_corner(along)
        if wrong:
            return wrong
    points = rings(loops, along)
    tight = _tight(points, along)
    if tight is not None:
        return (_tight_flaw(along, found, tight),)
    return _far(loops, points, along, reach)


def _extent(shape: Sweep | Tube | Spring) -> float:
    """A first idea of the size of the section."""
    if isinstance(shape, Tube):
        return shape.diameter / 2
    if isinstance(shape, Spring):
        return shape.wire / 2
    outer = shape.outline.outer
    return max(math.hypot(*outer.start), *(math.hypot(*stretch.end) for stretch in outer.stretches))


def _does_not_close(shape: Sweep, found: Trace) -> tuple[OutlineFlaw, ...]:
    """A twist that does not bring the section back onto itself where its path closes."""
    if not found.is_closed or abs(math.remainder(shape.twist, 360.0)) <= _WHOLE:
        return ()
    sentence = f"a twist of {shape.twist:.6g} deg does not bring the section back onto itself where the path closes"
    return (OutlineFlaw("twist-does-not-close", sentence, "twist it by whole turns, `360 deg`, or open the path"),)


def _twisted_corner(along: Stations) -> tuple[OutlineFlaw, ...]:
    """The first mitre, in whose plane twisted stretches do not meet: they have no section in common there."""
    ahead = (along.before[:, :, 2] * along.after[:, :, 2]).sum(axis=1)
    corners = np.flatnonzero(ahead < math.cos(math.radians(SMOOTH_WITHIN)))
    if not len(corners):
        return ()
    sentence = f"a twist does not go round the mitred corner at {spelled(along.points[corners[0]])}"
    return (OutlineFlaw("twisted-corner", sentence, "give the corners of its path a bend"),)


def _bellows_flaws(shape: Bellows) -> tuple[OutlineFlaw, ...]:
    if bellows_outline(shape) is None:
        sentence = (
            f"a wall of {shape.thickness:.6g} mm cannot be folded into {shape.convolutions} convolutions "
            f"on {shape.length:.6g} mm between diameters of {shape.bore:.6g} mm and {shape.diameter:.6g} mm"
        )
        return (OutlineFlaw("cuts-itself", sentence, "make the wall thinner, or the convolutions fewer or deeper"),)
    return ()


def _tight(points: F64, along: Stations) -> int | None:
    """The first interval in which a point of the section does not move forward."""
    n = len(along.points)
    m = len(along.stretch)
    behind = (np.arange(m) + 1) % n
    step = points[behind] - points[:m]
    forward = np.minimum(
        np.einsum("nki,ni->nk", step, along.after[:m, :, 2]), np.einsum("nki,ni->nk", step, along.before[behind, :, 2])
    ).min(axis=1)
    length = np.sqrt(((along.points[behind] - along.points[:m]) ** 2).sum(axis=1))
    bad = np.flatnonzero(forward <= 1e-9 * length)
    return int(bad[0]) if len(bad) else None


def _tight_flaw(along: Stations, found: Trace, at: int) -> OutlineFlaw:
    stretch = found.stretches[along.stretch[at]]
    place = spelled((along.points[at] + along.points[(at + 1) % len(along.points)]) / 2)
    if isinstance(stretch, Arc):
        sentence = f"it would cut itself at {place}, where it bends round a radius of {stretch.radius:.6g} mm"
        return OutlineFlaw("cuts-itself", sentence, "widen the bend, or make the section smaller")
    bent = float(np.sqrt((along.bent[at] ** 2).sum()))
    if bent > 0.0:
        sentence = f"it would cut itself at {place}, where its path bends round a radius of {1.0 / bent:.4g} mm"
        return OutlineFlaw("cuts-itself", sentence, "widen the curve, or make the section smaller")
    sentence = f"it would cut itself at {place}, where corners of its path follow too closely"
    return OutlineFlaw("cuts-itself", sentence, "give the corners a bend, or move them apart")


def _far(loops: list[Polyline], points: F64, along: Stations, reach: float) -> tuple[OutlineFlaw, ...]:
    pieces = _pieces(along, reach)
    pairs = _close(points, along, pieces, reach)
    if pairs is None:
        sentence = f"it comes close to itself in more than {MAX_CLOSE} places, the limit named `close`"
        return (OutlineFlaw("too-large", sentence, "give it fewer turns, or a smaller section"),)
    cap = manifold3d.triangulate([loop.points for loop in loops]).astype(np.int64)
    solids: dict[int, Manifold] = {}
    for one, other in pairs:
        for each in (one, other):
            if each not in solids:
                solids[each] = _solid(loops, points, cap, pieces[each])
        common = solids[one] ^ solids[other]
        if not common.is_empty() and common.volume() > 1e-6 * reach**3:
            place = spelled(np.array(common.bounding_box()).reshape(2, 3).mean(axis=0))
            sentence = f"it would cut itself at {place}, where far stretches of it meet"
            return (OutlineFlaw("cuts-itself", sentence, "lead the path further round, or make the section smaller"),)
    return ()


def _pieces(along: Stations, reach: float) -> list[tuple[int, int]]:
    """First and last station of every piece; the last of a closed path is numbered on."""
    length = along.lengths
    ends = [0]
    for k in range(1, len(along.stretch)):
        if length[k] - length[ends[-1]] >= reach:
            ends.append(k)
    ends.append(len(along.stretch))
    return list(pairwise(ends))


def _close(points: F64, along: Stations, pieces: list[tuple[int, int]], reach: float) -> list[tuple[int, int]] | None:
    """Pieces, not neighbours, whose boxes overlap and whose axes come closer than twice the reach; None if too many.

    Cost: a sweep along the longest axis in blocks, n log n for bodies that are not wound on themselves.
    """
    n, m = len(points), len(pieces)
    flat = [points[np.arange(a, b + 1) % n].reshape(-1, 3) for a, b in pieces]
    low, high = np.array([p.min(axis=0) for p in flat]), np.array([p.max(axis=0) for p in flat])
    start, end = along.points[[a for a, _ in pieces]], along.points[[b % n for _, b in pieces]]
    off = np.array([_off_chord(along.points[np.arange(a, b + 1) % n]) for a, b in pieces])
    turned, is_gentle = _turned(along), float((along.bent**2).sum(axis=1).max()) * reach**2 < 1.0
    begin, stop_at = turned[[a for a, _ in pieces]], turned[[b for _, b in pieces]]

    def may_meet(i: I64, j: I64) -> NDArray[np.bool_]:
        between = stop_at[j] - begin[i]
        if along.is_closed:
            between = np.minimum(between, turned[-1] - begin[j] + stop_at[i])
        return (between > _TURN) | (not is_gentle)

    axis = int(np.ptp(along.points, axis=0).argmax())
    order = np.argsort(low[:, axis], kind="stable")
    counts = np.searchsorted(low[order, axis], high[order, axis], side="right") - np.arange(m) - 1
    found: list[tuple[int, int]] = []
    at = 0
    while at < m:
        stop = at + max(1, int(np.searchsorted(np.cumsum(counts[at:]), _BLOCK, side="right")))
        some = counts[at:stop]
        first = np.repeat(np.arange(at, stop), some)
        second = first + 1 + np.arange(len(first)) - np.repeat(np.cumsum(some) - some, some)
        i, j = np.minimum(order[first], order[second]), np.maximum(order[first], order[second])
        apart = (j - i > 1) & ~(along.is_closed & (j - i == m - 1)) & may_meet(i, j)
        boxes = (low[i] < high[j]).all(axis=1) & (low[j] < high[i]).all(axis=1)
        i, j = i[apart & boxes], j[apart & boxes]
        near = _gaps(start[i], end[i], start[j], end[j]) < 2.0 * reach + off[i] + off[j]
        found.extend(zip(i[near].tolist(), j[near].tolist(), strict=True))
        if len(found) > MAX_CLOSE:
            return None
        at = stop
    return sorted(found)


def _turned(along: Stations) -> F64:
    """How far, radians, the path has turned up to every station and, closed, at its end."""
    m = len(along.stretch)
    behind = (np.arange(m) + 1) % len(along.points)

    def between(one: F64, other: F64) -> F64:
        angles: F64 = 2.0 * np.arcsin(np.minimum(np.sqrt(((one - other) ** 2).sum(axis=1)) / 2.0, 1.0))
        return angles

    bends = between(along.after[:m, :, 2], along.before[behind, :, 2])
    corners = between(along.before[behind, :, 2], along.after[behind, :, 2])
    return np.concatenate(([0.0], np.cumsum(bends + corners)))


def _off_chord(points: F64) -> float:
    """How far points (k,3) lie from the straight line between their ends, at most."""
    along = points[-1] - points[0]
    share = np.clip((points - points[0]) @ along / max(float(along @ along), 1e-300), 0.0, 1.0)
    off = points - points[0] - share[:, None] * along
    return float(np.sqrt((off**2).sum(axis=1)).max())


def _gaps(a: F64, b: F64, c: F64, d: F64) -> F64:
    """Distances (k,) between straight stretches a-b and c-d in space: the least of the four from their ends and, where
    the feet of the common normal lie within both, that.
    """
    found = np.minimum.reduce([_from_end(a, c, d), _from_end(b, c, d), _from_end(c, a, b), _from_end(d, a, b)])
    u, v, w = b - a, d - c, a - c
    uu, uv, vv = (u * u).sum(axis=1), (u * v).sum(axis=1), (v * v).sum(axis=1)
    uw, vw = (u * w).sum(axis=1), (v * w).sum(axis=1)
    square = uu * vv - uv * uv
    crossing = square > 1e-12 * uu * vv
    scale = np.where(crossing, square, 1.0)
    s, t = (uv * vw - vv * uw) / scale, (uu * vw - uv * uw) / scale
    within = crossing & (s > 0.0) & (s < 1.0) & (t > 0.0) & (t < 1.0)
    normal = w + s[:, None] * u - t[:, None] * v
    gaps: F64 = np.where(within, np.sqrt((normal**2).sum(axis=1)), found)
    return gaps


def _from_end(p: F64, a: F64, b: F64) -> F64:
    along = b - a
    share = np.clip(((p - a) * along).sum(axis=1) / np.maximum((along**2).sum(axis=1), 1e-300), 0.0, 1.0)
    off = p - a - share[:, None] * along
    gaps: F64 = np.sqrt((off**2).sum(axis=1))
    return gaps


def _solid(loops: list[Polyline], points: F64, cap: I64, piece: tuple[int, int]) -> Manifold:
    """The closed body between two stations."""
    some = points[np.arange(piece[0], piece[1] + 1) % len(points)]
    n, k = some.shape[:2]
    faces = [cap[:, ::-1], cap + (n - 1) * k]
    station, first = np.arange(n - 1)[:, None] * k, 0
    for loop in loops:
        m = len(loop.points)
        a, b = station + first + np.arange(m), station + first + (np.arange(m) + 1) % m
        faces.append(np.stack((a, b, b + k, a, b + k, a + k), axis=2).reshape(-1, 3))
        first += m
    mesh = manifold3d.Mesh64(vert_properties=some.reshape(-1, 3), tri_verts=np.concatenate(faces).astype(np.uint64))
    return Manifold(mesh)

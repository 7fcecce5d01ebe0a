"""Bodies that run along a path: an outline carried along it, and tubes, springs and bellows, which are such bodies.

Straight stretches and bends give planes, cylinders, cones, spheres and tori; splines, helices and twisted sections
give free surfaces, with exact normals. Triangles: 2k between two sections of k points, and two caps.
"""

from __future__ import annotations

import math
from itertools import pairwise

import manifold3d
import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from .curve import Curve
from .flaw import SolidError
from .ladder import divisions
from .outline import Polyline, flatten
from .polyhedra import wall
from .recipe import ArcTo, Bellows, LineTo, Loop, Outline, Point2, Spring, Sweep, Tube
from .revolve import profile_surface
from .shell import Shell, shell
from .spine import Arc, Coil, Line, PathFlaw, Trace, trace
from .stations import Stations, stations
from .surfaces import free, plane, surfaces

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]
Row = tuple[PatchKind, F64, float, bool]


def swept(shape: Sweep | Tube | Spring, rung: float) -> Shell:
    """The closed shell of a body along a path at a chord error. SolidError for a path that has a flaw."""
    outline, found, twist = parts_of(shape)
    if not isinstance(found, Trace):
        raise SolidError(f"a path with a flaw: {found.sentence}")
    loops = flatten(outline, rung)
    reach = reach_from_path(loops)
    round_section = isinstance(shape, Tube | Spring)
    symmetry = divisions_in_common(loops) if round_section else 1
    along = stations(found, rung, reach, twist, symmetry)
    if along.twist and not round_section:
        loops = [_divided(loop, rung, reach) for loop in loops]
    return body(loops, along, found, is_round=round_section)


def parts_of(shape: Sweep | Tube | Spring) -> tuple[Outline, Trace | PathFlaw, float]:
    """Outline, curves and twist of a body along a path."""
    if isinstance(shape, Sweep):
        return shape.outline, trace(shape.path), shape.twist
    if isinstance(shape, Tube):
        return ring_outline(shape.diameter, shape.bore), trace(shape.path), 0.0
    rise = (shape.length - shape.wire) / shape.turns / math.tau
    coil = Coil(shape.diameter / 2, rise, math.tau * shape.turns, -1.0 if shape.left else 1.0, shape.wire / 2)
    return ring_outline(shape.wire, 0.0), Trace((coil,), (0,), False), 0.0


def ring_outline(diameter: float, bore: float) -> Outline:
    """A circle round the origin, with a hole if `bore` is not 0."""
    return Outline(_circle(diameter), (_circle(bore),) if bore else ())


def reach_from_path(loops: list[Polyline]) -> float:
    """How far a section reaches from the path, mm."""
    return max(float(np.hypot(loop.points[:, 0], loop.points[:, 1]).max()) for loop in loops)


def divisions_in_common(loops: list[Polyline]) -> int:
    """How many turns of concentric circles meet all their points."""
    return math.gcd(*(len(loop.points) for loop in loops))


def rings(loops: list[Polyline], along: Stations) -> F64:
    """The points (n,k,3) of all sections."""
    flat = np.concatenate([loop.points for loop in loops])
    points: F64 = along.points[:, None] + np.einsum("nij,kj->nki", along.section, flat)
    return points


def body(loops: list[Polyline], along: Stations, found: Trace, is_round: bool = False) -> Shell:
    """Join the sections. A round body's stretches are exact even where its frame turns a little to close."""
    vertices = rings(loops, along)
    n, k = vertices.shape[:2]
    is_exact = [isinstance(each, Line | Arc) and (is_round or along.twist == 0.0) for each in found.stretches]
    pieces: list[tuple[I64, int]] = []
    rows: list[Row] = []
    normals: list[F64] = []
    for (low, high), free_run in zip(_spans(along), _free_runs(along, is_exact), strict=True):
        row_of: dict[tuple[int, int], int] = {}
        for number, loop, first, run in _curve_runs(loops):
            faces = _wall_faces(n, k, loop, first, run, (low, high), along, number)
            key = (number, int(loop.curve[run[0]]))
            if free_run is None or key not in free_run:
                row = _row(loop.curves[key[1]], along, low, found) if is_exact[along.stretch[low]] else free()
                (row_of if free_run is None else free_run)[key] = len(rows)
                rows.append(row)
            at = (row_of if free_run is None else free_run)[key]
            pieces.append((faces, at))
            is_free = rows[at][0] == PatchKind.FREE
            normals.append(_normals(loop, run, (low, high), along) if is_free else np.zeros((len(faces), 3, 3)))
    if not along.is_closed:
        cap = manifold3d.triangulate([loop.points for loop in loops]).astype(np.int64)
        for faces, station, side in ((cap[:, ::-1], 0, -1.0), (cap + (n - 1) * k, n - 1, 1.0)):
            frame = along.after[station]
            pieces.append((faces, len(rows)))
            origin, normal, x = (v.tolist() for v in (along.points[station], side * frame[:, 2], frame[:, 0]))
            rows.append((PatchKind.PLANE, plane(origin, normal, x), 0.0, False))
            normals.append(np.zeros((len(faces), 3, 3)))
    any_free = any(row[0] == PatchKind.FREE for row in rows)
    return shell(vertices.reshape(-1, 3), pieces, surfaces(rows), np.concatenate(normals) if any_free else None)


def bellows_outline(shape: Bellows) -> Outline | None:
    """The profile of a bellows in (radius, height): arcs of one radius at its roots and crests, joined by walls square
    to the axis or, where they are shallow, directly. None if the arcs are tighter than half the wall.
    """
    fold = shape.length / shape.convolutions
    half = shape.thickness / 2
    root, crest = shape.bore / 2 + half, shape.diameter / 2 - half
    depth = crest - root
    if depth <= 0.0:
        return None
    theta = math.pi / 2 if 2.0 * depth >= fold else 2.0 * math.atan(2.0 * depth / fold)
    radius = fold / 4.0 / math.sin(theta)
    if radius <= half * (1.0 + 1e-9):
        return None
    up = _fold_line(shape.convolutions, fold, root, crest, radius, theta, half)
    down = _fold_line(shape.convolutions, fold, root, crest, radius, theta, -half)
    stretches: list[LineTo | ArcTo] = [_stretch(*each) for each in up]
    stretches.append(LineTo(down[-1][0]))
    starts: list[Point2] = [(root - half, 0.0), *(each[0] for each in down[:-1])]
    for start, (_, centre, left) in zip(reversed(starts), reversed(down), strict=True):
        stretches.append(_stretch(start, centre, not left))
    return Outline(Loop((root + half, 0.0), tuple(stretches)))


def _fold_line(
    n: int, fold: float, root: float, crest: float, radius: float, theta: float, off: float
) -> list[tuple[Point2, Point2 | None, bool]]:
    """End, centre and side of the stretches of one face of a bellows' wall, from its foot up."""
    line: list[tuple[Point2, Point2 | None, bool]] = []
    c, s = (0.0, 1.0) if theta == math.pi / 2 else (math.cos(theta), math.sin(theta))
    low, high = radius - off, radius + off
    for k in range(n):
        z = k * fold
        foot, top = (root + radius, z), (crest - radius, z + fold / 2)
        over = (root + radius, z + fold)
        leaves: Point2 = (foot[0] - low * c, z + low * s)
        meets: Point2 = (top[0] + high * c, top[1] - high * s)
        line.append((leaves, foot, False))
        if math.dist(leaves, meets) > 1e-9:
            line.append((meets, None, True))
        line.append(((meets[0], top[1] + high * s), top, True))
        if math.dist(leaves, meets) > 1e-9:
            line.append(((leaves[0], z + fold - low * s), None, True))
        line.append(((root + off, z + fold), over, False))
    return line


def _stretch(end: Point2, centre: Point2 | None, left: bool) -> LineTo | ArcTo:
    return LineTo(end) if centre is None else ArcTo(end, centre, left)


def _circle(diameter: float) -> Loop:
    start = (diameter / 2, 0.0)
    return Loop(start, (ArcTo(start, (0.0, 0.0), True),))


def _divided(loop: Polyline, rung: float, reach: float) -> Polyline:
    """With chords so short that the quadrilaterals of a twisted body stay within the chord error of its surface."""
    widest = 2.0 * rung / (math.tau / divisions(reach, rung)) * 2.0
    following = np.roll(loop.points, -1, axis=0)
    n = np.maximum(1, np.ceil(np.hypot(*(following - loop.points).T) / widest)).astype(np.int64)
    row = np.repeat(np.arange(len(n)), n)
    share = ((np.arange(len(row)) - np.repeat(np.cumsum(n) - n, n)) / n[row])[:, None]
    then = share + 1.0 / n[row][:, None]
    points = loop.points[row] + share * (following - loop.points)[row]
    one, other = loop.tangents[row, 0], loop.tangents[row, 1]
    tangents = np.stack((one + share * (other - one), one + then * (other - one)), axis=1)
    tangents /= np.hypot(tangents[..., 0], tangents[..., 1])[..., None]
    return Polyline(points, loop.curve[row], loop.curves, tangents)


def _spans(along: Stations) -> list[tuple[int, int]]:
    """First interval and the one behind the last, of every stretch."""
    starts = np.flatnonzero(np.concatenate(([True], along.stretch[1:] != along.stretch[:-1], [True])))
    return list(pairwise(starts.tolist()))


def _free_runs(along: Stations, is_exact: list[bool]) -> list[dict[tuple[int, int], int] | None]:
    """For every stretch without exact surfaces the rows of its run of such stretches, which are one surface."""
    runs: list[dict[tuple[int, int], int] | None] = []
    for low, _ in _spans(along):
        if is_exact[along.stretch[low]]:
            runs.append(None)
            continue
        straight_on = float(along.before[low, :, 2] @ along.after[low, :, 2]) > 1.0 - 1e-5
        previous = runs[-1] if runs and straight_on else None
        runs.append({} if previous is None else previous)
    return runs


def _curve_runs(loops: list[Polyline]) -> list[tuple[int, Polyline, int, I64]]:
    """Number of the loop, the loop, its first point among all, and the chords of one curve of it."""
    found: list[tuple[int, Polyline, int, I64]] = []
    first = 0
    for number, loop in enumerate(loops):
        starts = np.flatnonzero(np.concatenate(([True], loop.curve[1:] != loop.curve[:-1], [True])))
        found.extend((number, loop, first, np.arange(low, high)) for low, high in pairwise(starts.tolist()))
        first += len(loop.points)
    return found


def _wall_faces(
    n: int, k: int, loop: Polyline, first: int, run: I64, span: tuple[int, int], along: Stations, number: int
) -> I64:
    m = len(loop.points)
    here, then = first + run, first + (run + 1) % m
    station = np.arange(*span)[:, None]
    a, b = station * k + here, station * k + then
    up_here, up_then = np.broadcast_to(here, a.shape).copy(), np.broadcast_to(then, a.shape).copy()
    if along.is_closed and span[1] == n and along.shift:
        # Outer loops count with the turn of the frame, holes against it.
        places = (along.shift if number == 0 else -along.shift) * (m // along.symmetry)
        up_here[-1], up_then[-1] = first + (run - places) % m, first + (run + 1 - places) % m
    c, d = (station + 1) % n * k + up_then, (station + 1) % n * k + up_here
    return np.stack((a, b, c, a, c, d), axis=2).reshape(-1, 3)


def _normals(loop: Polyline, run: I64, span: tuple[int, int], along: Stations) -> F64:
    """Outward normals of a free surface at the corners of `_wall_faces`: square to the section's edge and to the way
    its points move along the path, which is along the tangent but for the twist.
    """
    edge = loop.tangents[run]
    corner = np.stack((loop.points[run], np.roll(loop.points, -1, axis=0)[run]), axis=1)
    ends = []
    low, high = span
    behind = np.arange(low + 1, high + 1) % len(along.points)
    for frame, station in ((along.after[low:high], np.arange(low, high)), (along.before[behind], behind)):
        offset = np.einsum("nij,kcj->nkci", frame[:, :, :2], corner)
        along_edge = np.einsum("nij,kcj->nkci", frame[:, :, :2], edge)
        way = frame[:, None, None, :, 2]
        if along.twist:
            ahead = 1.0 - np.einsum("ni,nkci->nkc", along.bent[station], offset)
            way = ahead[..., None] * way + along.twist * np.cross(way, offset)
        normal = np.cross(along_edge, np.broadcast_to(way, along_edge.shape))
        ends.append(normal / np.sqrt((normal**2).sum(axis=-1))[..., None])
    (a, b), (d, c) = (np.moveaxis(each, 2, 0) for each in ends)
    return np.stack((a, b, c, a, c, d), axis=2).reshape(-1, 3, 3)


def _row(curve: Curve, along: Stations, low: int, found: Trace) -> Row:
    """The surface that one curve of the section makes along a straight stretch or a bend, from the station where it
    starts.
    """
    stretch, frame, point = found.stretches[along.stretch[low]], along.after[low], along.points[low]
    if curve.is_free:
        return free()
    if isinstance(stretch, Line):
        return _moved(wall(curve), np.column_stack((frame, point)))
    assert isinstance(stretch, Arc)
    axis = np.cross(stretch.y, stretch.x)
    turn = np.stack((stretch.x, axis)) @ frame[:, :2]

    def across(p: Point2) -> Point2:
        u, v = (turn @ p).tolist()
        return (stretch.radius + u, v)

    turned = Curve(across(curve.start), across(curve.end), across(curve.centre), curve.radius, curve.left)
    return _moved(
        profile_surface(turned), np.column_stack((stretch.x, np.cross(axis, stretch.x), axis, stretch.centre))
    )


def _moved(row: Row, placement: F64) -> Row:
    kind, affine, ratio, flipped = row
    moved = placement[:, :3] @ affine
    moved[:, 3] += placement[:, 3]
    return kind, moved, ratio, flipped

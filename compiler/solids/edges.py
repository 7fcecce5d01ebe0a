"""Rounded and chamfered edges: of solids with flat faces, cylinders, cones, and the rims of outlines raised or turned.

A convex solid with rounded edges is the sum of the solid shrunk by the radius and a ball: its faces, a cylinder along
each edge, a piece of a sphere at each corner. A chamfer takes the same length off both faces of an edge.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import PatchKind

from . import stack
from .curve import Curve
from .ladder import divisions
from .outline import OutlineFlaw, Polyline, contact, faults, inside, oriented, polyline
from .plane import Corner, PlaneFlaw, all_corners, cornered
from .polyhedra import facets, polyhedron
from .recipe import Cone, Cylinder, Edged, Extrude, Point2, Revolve
from .revolve import disc, revolve, strip
from .shell import Shell, shell
from .surfaces import plane, surfaces

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]
_NEAR = 1e-9
_HINT = "make it smaller, or the shape larger"


def edged(shape: Edged, rung: float) -> Shell:
    """The closed shell of a shape that `edge_flaws` has passed, at a chord error in mm."""
    inner = shape.shape
    if isinstance(inner, Extrude):
        return stack.stack(inner, _corner(shape), rung)
    if isinstance(inner, Cylinder | Cone | Revolve):
        return revolve(_profile(shape, rung), rung, inner.angle if isinstance(inner, Revolve) else 360.0)
    if shape.kind == "chamfered":
        return polyhedron(*_chamfered(*facets(inner), shape.size))
    return _rounded(*facets(inner), shape.size, rung)


def edge_flaws(shape: Edged) -> tuple[OutlineFlaw, ...]:
    """What is wrong with the edges, or with the outline below them."""
    inner = shape.shape
    if isinstance(inner, Extrude | Revolve):
        found = faults(inner.outline, isinstance(inner, Revolve))
        if found:
            return found
    try:
        if isinstance(inner, Extrude):
            stack.check(inner, _corner(shape))
        elif isinstance(inner, Cylinder | Cone | Revolve):
            _check_profile(shape)
        elif shape.kind == "chamfered":
            _chamfered(*facets(inner), shape.size)
        else:
            _shrunk(*facets(inner), shape.size)
    except PlaneFlaw as flaw:
        sentence = f"{_named(shape)} does not fit: {flaw.sentence}"
        return (OutlineFlaw("corner-too-large", sentence, _HINT),)
    return ()


def count_edged(shape: Edged, rung: float) -> int:
    """Triangles of `edged` at most."""
    inner, n = shape.shape, divisions(shape.size, rung)
    if isinstance(inner, Extrude):
        return stack.count_triangles(inner, _corner(shape), rung)
    if isinstance(inner, Cylinder | Cone | Revolve):
        lines = _profile(shape, rung)
        widest = max(float(line.points[:, 0].max()) for line in lines)
        return 2 * sum(len(line.points) for line in lines) * (divisions(widest, rung) + 2) + 4 * n
    _, polygons = facets(inner)
    sides = sum(len(polygon) for polygon in polygons)
    if shape.kind == "chamfered":
        return 4 * sides
    return sides * (n + 4) + sides * n * n


def _corner(shape: Edged) -> Corner:
    return Corner(shape.kind, shape.size)


def _named(shape: Edged) -> str:
    return f"`{shape.kind} {shape.size:.6g} mm`"


# --- turned shapes


def _curves(shape: Edged) -> list[tuple[Curve, ...]]:
    """The loops of a turned shape in (radius, height) with their corners made. Raises PlaneFlaw."""
    inner, corner = shape.shape, _corner(shape)
    if isinstance(inner, Revolve):
        found = []
        for k, loop in enumerate((inner.outline.outer, *inner.outline.holes)):
            curves = oriented(loop, k == 0)
            size = max(abs(curve.start[0]) for curve in curves)
            corners = all_corners(curves, corner, "left")
            at_axis = [abs(curve.start[0]) <= _NEAR * size for curve in curves]
            found.append(cornered(curves, [None if a else c for a, c in zip(at_axis, corners, strict=True)]))
        return found
    assert isinstance(inner, Cylinder | Cone)
    r, length = inner.diameter / 2, inner.length
    top = inner.top / 2 if isinstance(inner, Cone) else r
    if top > 0.0:
        return [cornered(_closed((0.0, 0.0), (r, 0.0), (top, length), (0.0, length)), [None, corner, corner, None])]
    return [_pointed(r, length, corner)]


def _pointed(r: float, length: float, corner: Corner) -> tuple[Curve, ...]:
    """A cone with its base edge and its point made: a ball that touches the slope, or a flat square to the axis."""
    slant = math.hypot(r, length)
    sine, cosine = r / slant, length / slant
    if corner.kind == "chamfered":
        end = (corner.size * sine, length - corner.size * cosine)
        curves = _closed((0.0, 0.0), (r, 0.0), end, (0.0, end[1]))
        off = corner.size
    else:
        middle = length - corner.size / sine
        end, off = (corner.size * cosine, middle + corner.size * sine), corner.size * cosine / sine
        tip = (0.0, middle + corner.size)
        lines = _closed((0.0, 0.0), (r, 0.0), end, tip)
        curves = (*lines[:2], Curve(end, tip, (0.0, middle), corner.size), lines[3])
    if off >= slant:
        raise PlaneFlaw("corner-too-large", f"the slope is {slant:.6g} mm long")
    return cornered(curves, [None, corner, None, None])


def _closed(*points: Point2) -> tuple[Curve, ...]:
    return tuple(Curve(a, b) for a, b in zip(points, (*points[1:], points[0]), strict=True))


def _profile(shape: Edged, rung: float) -> list[Polyline]:
    loops = _curves(shape)
    for error in (rung, rung / 4.0, rung / 16.0, rung / 64.0):
        lines = [polyline(curves, error) for curves in loops]
        if contact(lines) is None:
            return lines
    return [polyline(curves, 0.0) for curves in loops]


def _check_profile(shape: Edged) -> None:
    lines = [polyline(curves, 0.0) for curves in _curves(shape)]
    if contact(lines) is not None or any(not inside(line.points[0], lines[0].points) for line in lines[1:]):
        raise PlaneFlaw("corner-too-large", "the outline would cross itself")


# --- solids with flat faces


def _planes(vertices: F64, polygons: Sequence[Sequence[int]]) -> F64:
    """Unit normals (f,3) by Newell's sum."""
    found = []
    for polygon in polygons:
        corners = vertices[list(polygon)]
        total = np.cross(corners, np.roll(corners, -1, axis=0)).sum(axis=0)
        found.append(total / np.sqrt((total**2).sum()))
    return np.array(found)


def _sides(polygons: Sequence[Sequence[int]]) -> dict[tuple[int, int], int]:
    """The face to the left of each directed edge."""
    return {
        (a, b): f
        for f, polygon in enumerate(polygons)
        for a, b in zip(polygon, (*polygon[1:], polygon[0]), strict=True)
    }


def _round_corner(
    v: int, sides: dict[tuple[int, int], int], polygons: Sequence[Sequence[int]], first: int
) -> list[int]:
    """The faces round a corner, counter-clockwise from outside."""
    found = [first]
    while True:
        polygon = polygons[found[-1]]
        before = polygon[list(polygon).index(v) - 1]
        face = sides[v, before]
        if face == first:
            return found
        found.append(face)


def _common_point(normals: F64, heights: F64) -> F64:
    """The point that several planes have in common, by least squares where there are more than three."""
    return np.asarray(np.linalg.solve(normals.T @ normals, normals.T @ heights), np.float64)


def _shrunk(vertices: F64, polygons: Sequence[Sequence[int]], by: float) -> F64:
    """The corners (n,3) after every face has moved inward. Raises PlaneFlaw where an edge vanishes."""
    normals, sides = _planes(vertices, polygons), _sides(polygons)
    of_vertex: list[list[int]] = [[] for _ in vertices]
    for f, polygon in enumerate(polygons):
        for v in polygon:
            of_vertex[v].append(f)
    moved = np.array(
        [vertices[v] + _common_point(normals[faces], np.full(len(faces), -by)) for v, faces in enumerate(of_vertex)]
    )
    for a, b in sides:
        old, new = vertices[b] - vertices[a], moved[b] - moved[a]
        if float(old @ new) <= _NEAR * float(old @ old):
            raise PlaneFlaw("corner-too-large", f"the edge of {math.sqrt(float(old @ old)):.6g} mm is too short")
    return moved


def _chamfered(vertices: F64, polygons: Sequence[Sequence[int]], by: float) -> tuple[F64, list[list[int]]]:
    """Corners and faces of the solid with a bevel along every edge. Raises PlaneFlaw where it does not fit."""
    normals, sides = _planes(vertices, polygons), _sides(polygons)
    points: list[F64] = []
    row: dict[tuple[int, int], int] = {}
    for f, polygon in enumerate(polygons):
        for k, v in enumerate(polygon):
            before, after = (
                vertices[polygon[k - 1]] - vertices[v],
                vertices[polygon[(k + 1) % len(polygon)]] - vertices[v],
            )
            before, after = before / math.sqrt(float(before @ before)), after / math.sqrt(float(after @ after))
            turn = np.cross(before, after)
            row[v, f] = len(points)
            points.append(vertices[v] + by / math.sqrt(float(turn @ turn)) * (before + after))
    tips: dict[int, int] = {}
    for v, f in list(row):
        if v in tips:
            continue
        ring = _round_corner(v, sides, polygons, f)
        bevels, heights = [], []
        for one, other in zip(ring, (*ring[1:], ring[0]), strict=True):
            normal = normals[one] + normals[other]
            bevels.append(normal)
            heights.append(float(normal @ points[row[v, one]]))
        tips[v] = len(points)
        points.append(_common_point(np.array(bevels), np.array(heights)))
    found = [[row[v, f] for v in polygon] for f, polygon in enumerate(polygons)]
    for (a, b), f in sides.items():
        g = sides[b, a]
        if a < b:
            found.append([tips[a], row[a, g], row[b, g], tips[b], row[b, f], row[a, f]])
    corners = np.array(points)
    for polygon in found:
        if not _is_convex(corners[polygon]):
            raise PlaneFlaw("corner-too-large", "the bevels of neighbouring edges would meet")
    return corners, found


def _is_convex(corners: F64) -> bool:
    sides = np.roll(corners, -1, axis=0) - corners
    turns = np.cross(sides, np.roll(sides, -1, axis=0))
    normal = np.cross(corners, np.roll(corners, -1, axis=0)).sum(axis=0)
    scale = float((sides**2).sum(axis=1).max()) * math.sqrt(float(normal @ normal))
    return bool(((turns @ normal) > _NEAR * scale).all())


def _rounded(vertices: F64, polygons: Sequence[Sequence[int]], radius: float, rung: float) -> Shell:
    centres = _shrunk(vertices, polygons, radius)
    normals, sides = _planes(vertices, polygons), _sides(polygons)
    step = math.tau / divisions(radius, rung)
    points: list[F64] = []
    pieces: list[tuple[I64, int]] = []
    rows: list[tuple[PatchKind, F64, float, bool]] = []
    count = 0

    def added(new: F64) -> I64:
        nonlocal count
        points.append(new)
        count += len(new)
        return np.arange(count - len(new), count)

    foot = {}
    for f, polygon in enumerate(polygons):
        at = added(centres[list(polygon)] + radius * normals[f])
        foot.update({(v, f): int(k) for v, k in zip(polygon, at, strict=True)})
        pieces.append((at[disc(len(at))[:, ::-1]], len(rows)))
        longest = vertices[polygon[1]] - vertices[polygon[0]]
        x_axis = longest / np.sqrt(longest @ longest)
        origin = centres[polygon[0]] + radius * normals[f]
        rows.append((PatchKind.PLANE, plane(origin.tolist(), normals[f].tolist(), x_axis.tolist()), 0.0, False))
    arcs: dict[tuple[int, int, int], I64] = {}
    for (a, b), f in sides.items():
        g = sides[b, a]
        if a > b:
            continue
        way = _great_circle(normals[f], normals[g], max(1, math.ceil(_apart(normals[f], normals[g]) / step - 1e-9)))
        for v in (a, b):
            within = added(centres[v] + radius * way[1:-1])
            arcs[v, f, g] = np.concatenate(([foot[v, f]], within, [foot[v, g]])).astype(np.int64)
            arcs[v, g, f] = arcs[v, f, g][::-1]
        low, high = arcs[a, f, g], arcs[b, f, g]
        quads = np.stack((low[:-1], low[1:], high[1:], high[:-1]), axis=1)
        pieces.append((np.concatenate((quads[:, :3], quads[:, [0, 2, 3]])), len(rows)))
        along = (centres[b] - centres[a]) / np.sqrt(((centres[b] - centres[a]) ** 2).sum())
        across = np.cross(along, normals[f])
        frame = np.column_stack((radius * normals[f], radius * across, along, centres[a]))
        rows.append((PatchKind.CYLINDER, frame, 0.0, False))
    for v, centre in enumerate(centres):
        first = next(f for f, polygon in enumerate(polygons) if v in polygon)
        ring = _round_corner(v, sides, polygons, first)
        pieces.append(
            (
                _ball_corner(
                    centre,
                    radius,
                    normals[ring],
                    [arcs[v, f, g] for f, g in zip(ring, (*ring[1:], ring[0]), strict=True)],
                    step,
                    added,
                ),
                len(rows),
            )
        )
        rows.append((PatchKind.SPHERE, np.column_stack((radius * np.eye(3), centre)), 0.0, False))
    return shell(np.concatenate(points), pieces, surfaces(rows))


def _ball_corner(centre: F64, radius: float, normals: F64, sides: list[I64], step: float, added: object) -> I64:
    """A piece of a sphere between arcs of great circles, row by row from its middle out.

    `sides` are the rows of the points of each arc, from one of `normals` (k,3) to the next.
    """
    assert callable(added)
    middle = normals.sum(axis=0)
    middle /= np.sqrt(middle @ middle)
    n_rows = max(1, math.ceil(max(_apart(middle, normal) for normal in normals) / step - 1e-9))
    spokes = [_great_circle(middle, normal, n_rows) for normal in normals]
    hub = added(centre[None] + radius * middle[None])
    # The points of the spokes are shared by the sectors on both sides.
    on_spoke = [added(centre + radius * spoke[1:-1]) for spoke in spokes]
    found = []
    for k, side in enumerate(sides):
        after = (k + 1) % len(sides)
        inner = hub
        for j in range(1, n_rows + 1):
            if j == n_rows:
                outer = side
            else:
                parts = max(1, math.ceil((len(side) - 1) * j / n_rows))
                between = _great_circle(spokes[k][j], spokes[after][j], parts)[1:-1]
                ends = on_spoke[k][j - 1], on_spoke[after][j - 1]
                outer = np.concatenate(([ends[0]], added(centre + radius * between), [ends[1]])).astype(np.int64)
            share = strip(
                np.linspace(0.0, 1.0, len(outer)), np.linspace(0.0, 1.0, len(inner)) if len(inner) > 1 else np.zeros(1)
            )
            found.append(np.concatenate((outer, inner))[share])
            inner = outer
    return np.concatenate(found)


def _apart(a: F64, b: F64) -> float:
    """The angle between unit vectors, radians."""
    across = np.cross(a, b)
    return math.atan2(math.sqrt(float(across @ across)), float(a @ b))


def _great_circle(a: F64, b: F64, n: int) -> F64:
    """n + 1 unit vectors at even steps from one to another."""
    turn = _apart(a, b)
    share = np.arange(n + 1)[:, None] / n
    found: F64 = (np.sin((1.0 - share) * turn) * a + np.sin(share * turn) * b) / math.sin(turn)
    found[0], found[-1] = a, b
    return found

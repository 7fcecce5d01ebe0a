"""The areas of the page on which each part is seen: the planar arrangement of the visible lines, each face labelled.

Lines that close areas, drawn or not, are extended by a hair where they end, noded, and made into faces; the part
under one point of a face is the part of the whole face. Areas of one patch become one outline; a border that two
regions share has the same points in both, so fills meet without a seam. Clean curves of smooth outlines take no part:
the outline of the triangles stands for them, so that areas close and agree with what hides what.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterator, Sequence
from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from ..contract import F64, I32, FaceOrigin, LineClass
from .chaining import walked
from .model import Bools, Candidates, Pieces, Region, View, number_of
from .occluders import Occluders
from .queries import front_face

I64 = NDArray[np.int64]
Polygons: TypeAlias = NDArray[np.object_]
Rings: TypeAlias = tuple[F64, ...]
FacesUnder: TypeAlias = Callable[[F64], I32]

EXTENSION_MM = 0.02
"""How far a line runs on where it ends, past the line that hides the rest of it."""
BRIDGE_MM = 0.3
"""A hidden stretch shorter than this, with the same line seen on both sides, is taken as seen: where a line of
penetration runs along a silhouette it may dip behind a facet. A border too many parts nothing, as both sides of it are
told by what is seen there."""
SAMPLES = 10_000
"""Points of a page that areas are judged by besides the one that labels them."""
WELL_WITHIN_MM = 0.02
LEAST_AREA_MM2 = 1e-3
"""Faces of the arrangement smaller than this go to a neighbour."""
SIMPLIFY_MM = 5e-3
"""A point goes if its triangle with its neighbours is smaller than this squared (Visvalingam and Whyatt 1993); the
outlines of machine parts then move by less than 0.002 mm."""
_STEPS_PER_MM = 2.0**20  # points lie on this lattice before they are noded, so equal points are equal bits
_ROW = 1 << 32
_STUB_MM, _BAR_MM = 1e-3, 1e-3
_SMOOTH = -0.6  # cosine between two segments that make one line
_PRUNINGS = 2  # the bars, then what they stand on
_BORDERS = tuple(
    number_of(line_class)
    for line_class in (
        LineClass.VISIBLE_OUTLINE,
        LineClass.VISIBLE_EDGE,
        LineClass.SECTION_OUTLINE,
        LineClass.IMAGINARY_INTERSECTION,
        LineClass.BREAK_LINE,
    )
)


@dataclass(frozen=True, eq=False, slots=True)
class Polylines:
    """Lines on the page: points (n,2) float64 mm, and line (n,) int32, the line each point stands in, ascending."""

    points: F64
    line: I32


def regions_of(view: View, pieces: Pieces, candidates: Candidates, occluders: Occluders) -> tuple[Region, ...]:
    """Return the visible regions, one for each connected area of one patch of one part.

    They cover what is seen without gaps or overlaps; they stand in the order of part paths, then patches, then from
    the top of the page down. Cost: near linear in the visible pieces; some 0.4 s for those of 250 000 triangles.
    """
    borders, spare = borders_of(pieces, candidates), hidden_borders_of(pieces, candidates)
    return regions_within(view, borders, lambda xy: front_face(view, occluders, xy), spare)


def borders_of(pieces: Pieces, candidates: Candidates) -> Polylines:
    """Return the visible pieces that bound areas, put together where just two meet, their ends extended."""
    is_border = np.isin(candidates.line_class, _BORDERS) & (candidates.patch < 0) & ~candidates.is_plain
    seen = pieces.is_visible | _is_bridge(pieces, candidates)
    rows = np.flatnonzero(seen & is_border[pieces.segment])
    ends = np.stack([pieces.start[rows, :2], pieces.end[rows, :2]], axis=1)
    lattice = np.rint(ends * _STEPS_PER_MM).astype(np.int64)
    long = (lattice[:, 0] != lattice[:, 1]).any(axis=1)
    rows, lattice = rows[long], lattice[long]
    is_drawn = candidates.is_drawn[pieces.segment[rows]]
    is_cut = np.stack([pieces.span[rows, 0] > 0.0, pieces.span[rows, 1] < 1.0], axis=1)
    return _polylines(lattice, is_cut, is_drawn)


def hidden_borders_of(pieces: Pieces, candidates: Candidates) -> F64:
    """Return the hidden stretches (k,2,2) of the lines that bound areas where they are seen."""
    is_border = np.isin(candidates.line_class, _BORDERS) & (candidates.patch < 0) & ~candidates.is_plain
    rows = np.flatnonzero(~pieces.is_visible & is_border[pieces.segment])
    ends = np.stack([pieces.start[rows, :2], pieces.end[rows, :2]], axis=1)
    return np.asarray(ends[(ends[:, 0] != ends[:, 1]).any(axis=1)])


def _is_bridge(pieces: Pieces, candidates: Candidates) -> Bools:
    """Short hidden pieces between two seen ones of the same line: they leave no gap."""
    found = np.zeros(len(pieces.segment), np.bool_)
    if len(found) < 3:
        return found
    run = np.hypot(*(pieces.end[:, :2] - pieces.start[:, :2]).T)
    segment, chain = pieces.segment, candidates.chain[pieces.segment]
    before, after = slice(None, -2), slice(2, None)

    def goes_on(other: slice) -> Bools:
        alike = (chain[1:-1] >= 0) & (chain[other] == chain[1:-1])
        return np.asarray(pieces.is_visible[other] & (alike | (segment[other] == segment[1:-1])))

    found[1:-1] = ~pieces.is_visible[1:-1] & (run[1:-1] < BRIDGE_MM) & goes_on(before) & goes_on(after)
    return found


def regions_within(
    view: View, borders: Polylines, faces_under: FacesUnder, spare: F64 | None = None
) -> tuple[Region, ...]:
    """Return the regions that lines enclose; `faces_under` gives the view face at page points (k,2), -1 for none.

    Lines need not be noded. Dangling ends are no borders. Areas in which two parts are found to show are divided by
    `spare` lines (k,2,2), those held to be hidden: a border too many parts nothing.
    """
    import shapely

    if not len(borders.points):
        return ()
    lines = shapely.linestrings(borders.points, indices=borders.line)
    noded = shapely.get_parts(shapely.unary_union(lines))
    faces = shapely.get_parts(shapely.polygonize(_without_ends(noded)))
    labels = _labels(faces, faces_under(_points_within(faces)), view)
    if spare is not None and len(spare):
        faces, labels = _divided(faces, labels, view, faces_under, noded, _lengthened(spare))
    areas, labels = _united_by(faces, labels)
    areas, labels = _united_by(areas, _of_neighbours(areas, labels))
    rows = np.flatnonzero(labels[:, 0] >= 0)
    return _regions(areas[rows], labels[rows], view)


def _lengthened(segments: F64) -> Polygons:
    """Segments (k,2,2) as lines that run on at both ends, so that they reach what they were cut at."""
    import shapely

    along = segments[:, 1] - segments[:, 0]
    along = along * (EXTENSION_MM / np.hypot(along[:, 0], along[:, 1]))[:, None]
    return np.asarray(shapely.linestrings(np.stack([segments[:, 0] - along, segments[:, 1] + along], axis=1)))


def _divided(
    faces: Polygons, labels: I64, view: View, faces_under: FacesUnder, noded: Polygons, spare: Polygons
) -> tuple[Polygons, I64]:
    """The arrangement once more with the `spare` lines through areas that show another part at some of their points.

    All of it is made again, so that neighbours have the points of a border in common.
    """
    import shapely

    mixed = _mixed(faces, labels, view, faces_under)
    if not len(mixed):
        return faces, labels
    met = np.unique(shapely.STRtree(spare).query(faces[mixed], predicate="intersects")[1])
    whole = shapely.get_parts(shapely.unary_union(np.concatenate([noded, spare[met]])))
    parts = shapely.get_parts(shapely.polygonize(_without_ends(whole)))
    return parts, _labels(parts, faces_under(_points_within(parts)), view)


def _mixed(faces: Polygons, labels: I64, view: View, faces_under: FacesUnder) -> NDArray[np.intp]:
    """Faces that show another part than their label says, at some point that is well within them."""
    import shapely

    low, high = shapely.total_bounds(faces).reshape(2, 2)
    pitch = float(np.sqrt((high - low).prod() / SAMPLES))
    across, down = (np.arange(a + pitch / 2, b, pitch) for a, b in zip(low, high, strict=True))
    # Rows are shifted against each other, so that no upright line of a drawing runs through a whole column.
    shift = (np.arange(len(down)) * 0.618034 % 1.0 - 0.5) * pitch
    points = np.stack(
        [np.repeat(across[None], len(down), axis=0) + shift[:, None], np.repeat(down[:, None], len(across), axis=1)],
        axis=2,
    )
    points = points.reshape(-1, 2)
    at, face = shapely.STRtree(faces).query(shapely.points(points), predicate="within")
    seen = _labels(faces, faces_under(points[at]), view)[:, 0]
    other = np.flatnonzero(seen != labels[face, 0])
    off = shapely.distance(shapely.boundary(faces[face[other]]), shapely.points(points[at[other]]))
    return np.unique(face[other[off > WELL_WITHIN_MM]])


def parts_of(regions: Sequence[Region]) -> tuple[Region, ...]:
    """Return regions of whole parts, the patches of a part taken together and caps apart from its own surface."""
    groups: dict[tuple[int, bool], list[Region]] = {}
    for region in regions:
        groups.setdefault((region.node, region.is_cap), []).append(region)
    return tuple(
        Region(rings, node, -1, is_cap, area)
        for (node, is_cap), members in groups.items()
        for rings, area in _united(members)
    )


def visible_regions_of(regions: Sequence[Region], nodes: Collection[int]) -> tuple[Rings, ...]:
    """Return the polygons on which any of these rows of nodes is seen, each an outer ring and its holes."""
    return tuple(rings for rings, _ in _united([region for region in regions if region.node in nodes]))


def polygon_of(region: Region) -> Any:
    """Return the region as a shapely polygon."""
    import shapely

    return shapely.Polygon(region.rings[0], region.rings[1:])


def rings_of(polygon: Any) -> Rings:
    """Return the rings of a shapely polygon, the outer one first, each (k,2) float64 with its first point once."""
    import shapely

    rings = (shapely.get_exterior_ring(polygon), *polygon.interiors)
    return tuple(np.ascontiguousarray(shapely.get_coordinates(ring)[:-1]) for ring in rings)


def _polylines(lattice: I64, is_cut: Bools, is_drawn: Bools) -> Polylines:
    """Join segments (k,2,2) on the lattice where just two meet smoothly, and extend what does not close in itself.

    Corners of drawn lines are extended too: those of two flush parts may miss each other by a rounding.
    """
    keys = (lattice[..., 0] * _ROW + lattice[..., 1]).reshape(-1)
    joint = np.unique(keys, return_inverse=True)[1].reshape(-1)
    apart = np.flatnonzero(is_cut.reshape(-1) | (_is_corner(lattice, joint) & np.repeat(is_drawn, 2)))
    joint[apart] = int(joint.max(initial=-1)) + 1 + np.arange(len(apart))
    n_joints = int(joint.max(initial=-1)) + 1
    joints = joint.reshape(-1, 2).astype(np.int32)
    order, turned, chain = walked(joints, n_joints)
    ends, joints = (lattice / _STEPS_PER_MM)[order], joints[order]
    ends[turned], joints[turned] = ends[turned, ::-1], joints[turned, ::-1]
    first = np.flatnonzero(np.diff(chain, prepend=-1))
    last = np.append(first[1:], len(chain)) - 1
    is_loop = (joints[first, 0] == joints[last, 1]) & (np.bincount(joint, minlength=n_joints)[joints[first, 0]] == 2)
    lines = Polylines(np.insert(ends[:, 1], first, ends[first, 0], axis=0), np.insert(chain, first, chain[first]))
    return _extended(lines, ~is_loop)


def _is_corner(lattice: I64, joint: I64) -> Bools:
    """Whether a segment's end (2k,) is one of just two that meet there, at an angle."""
    along = (lattice[:, 1] - lattice[:, 0]) / _STEPS_PER_MM
    along /= np.hypot(along[:, 0], along[:, 1])[:, None]
    inward = np.stack([along, -along], axis=1).reshape(-1, 2)
    order = np.argsort(joint, kind="stable")
    count = np.bincount(joint)
    first = (np.cumsum(count) - count)[count == 2]
    one, other = order[first], order[first + 1]
    straight = inward[one, 0] * inward[other, 0] + inward[one, 1] * inward[other, 1]
    is_corner = np.zeros(len(joint), np.bool_)
    bent = straight > _SMOOTH
    is_corner[one[bent]] = is_corner[other[bent]] = True
    return is_corner


def _extended(lines: Polylines, is_open: Bools) -> Polylines:
    """Lines, the open ones with their ends moved on, and a short bar across each new end for lines nearly parallel.

    The direction is that of the last `_STUB_MM` or more: visibility may have left a stub of any direction.
    """
    points, n = lines.points, len(lines.points)
    run = np.append(0.0, np.cumsum(np.hypot(*np.diff(points, axis=0).T)))
    first = np.flatnonzero(np.diff(lines.line, prepend=-1))
    last = np.append(first[1:], n) - 1
    inner = np.minimum(np.searchsorted(run, run[first] + _STUB_MM), last)
    outer = np.maximum(np.searchsorted(run, run[last] - _STUB_MM, side="right") - 1, first)
    at, back = np.concatenate([first, last]), np.concatenate([inner, outer])
    is_moved = np.tile(is_open, 2) & (points[at] != points[back]).any(axis=1)
    at, along = at[is_moved], (points[at] - points[back])[is_moved]
    along /= np.hypot(along[:, 0], along[:, 1])[:, None]
    moved = points.copy()
    moved[at] += along * EXTENSION_MM
    moved = np.rint(moved * _STEPS_PER_MM) / _STEPS_PER_MM
    across = _BAR_MM * along[:, ::-1] * (-1.0, 1.0)
    bars = np.stack([moved[at] - across, moved[at], moved[at] + across], axis=1)
    rows = len(first) + np.repeat(np.arange(len(at)), 3)
    return Polylines(
        np.concatenate([moved, bars.reshape(-1, 2)]), np.concatenate([lines.line, rows]).astype(lines.line.dtype)
    )


def _without_ends(noded: Polygons) -> Polygons:
    """Noded lines without most of those that end free: what was extended, which finding faces would be slower at."""
    import shapely

    points, line = shapely.get_coordinates(noded, return_index=True)
    first = np.flatnonzero(np.diff(line, prepend=-1))
    last = np.append(first[1:], len(line)) - 1
    ends = np.stack([points[first], points[last]], axis=1)
    joint = np.unique(ends[..., 0] + 1j * ends[..., 1], return_inverse=True)[1].reshape(-1, 2)
    kept = np.ones(len(noded), np.bool_)
    for _ in range(_PRUNINGS):
        meeting = np.bincount(joint[kept].reshape(-1), minlength=int(joint.max()) + 1)
        kept &= (meeting[joint] > 1).all(axis=1)
    return noded[kept]


def _points_within(faces: Polygons) -> F64:
    import shapely

    return np.asarray(shapely.get_coordinates(shapely.point_on_surface(faces)))


def _labels(faces: Polygons, seen: I32, view: View) -> I64:
    """Node, patch and whether it is a cap (k,3) int64 of the faces of an arrangement; -1 where nothing is seen."""
    origin = view.geometry.face_origin[view.face_row[seen]]
    labels = np.column_stack([view.face_node[seen], view.face_patch[seen], origin == FaceOrigin.SECTION_CAP])
    labels = labels.astype(np.int64)
    labels[seen < 0] = -1
    return labels


def _united_by(areas: Polygons, labels: I64) -> tuple[Polygons, I64]:
    """Unite what touches and has one label; parts of it that do not touch stay apart."""
    import shapely

    if not len(areas):
        return areas, labels
    keys, group = np.unique(labels, axis=0, return_inverse=True)
    order = np.argsort(group.reshape(-1), kind="stable")
    members = np.split(areas[order], np.cumsum(np.bincount(group.reshape(-1)))[:-1])
    united = [each if len(each) == 1 else shapely.get_parts(_whole_of(each)) for each in members]
    return np.concatenate(united), np.repeat(keys, [len(each) for each in united], axis=0)


def _whole_of(areas: Sequence[Any] | Polygons) -> Any:
    """What areas that touch cover together.

    Their borders have points in common unless noding has rounded two lines to the same place; then the slower union,
    which finds the points itself, is taken.
    """
    import shapely

    try:
        return shapely.coverage_union_all(areas)
    except shapely.errors.GEOSException:
        return shapely.union_all(areas)


def _of_neighbours(areas: Polygons, labels: I64) -> I64:
    """Labels in which each area that is too small has that of the neighbour it has the longest border with."""
    import shapely

    small = np.flatnonzero(shapely.area(areas) < LEAST_AREA_MM2)
    borders = _borders_between(areas, small)
    changed = labels.copy()
    waiting = set(small.tolist())
    while settled := [row for row in sorted(waiting) if any(other not in waiting for other, _ in borders[row])]:
        for row in settled:
            _, other = max((length, -other) for other, length in borders[row] if other not in waiting)
            changed[row] = changed[-other]
        waiting.difference_update(settled)
    return changed


def _borders_between(areas: Polygons, rows: I64) -> dict[int, list[tuple[int, float]]]:
    """For each of `rows` the areas it has a border with, and the length of the border in mm."""
    import shapely

    of, other = shapely.STRtree(areas).query(areas[rows], predicate="touches")
    shared = shapely.length(shapely.intersection(shapely.boundary(areas[rows[of]]), shapely.boundary(areas[other])))
    borders: dict[int, list[tuple[int, float]]] = {row: [] for row in rows.tolist()}
    for row, neighbour, length in zip(rows[of].tolist(), other.tolist(), shared.tolist(), strict=True):
        if length > 0.0:
            borders[row].append((neighbour, length))
    return borders


def _regions(areas: Polygons, labels: I64, view: View) -> tuple[Region, ...]:
    """Areas with the points that do not matter left out, in their order."""
    import shapely

    if not len(areas):
        return ()
    outlines = shapely.normalize(shapely.coverage_simplify(areas, SIMPLIFY_MM))
    size = shapely.area(outlines).tolist()
    boxes = np.round(shapely.bounds(outlines), 3)
    paths = [view.geometry.nodes[node].path for node in labels[:, 0].tolist()]
    rows = sorted(range(len(outlines)), key=lambda k: (paths[k], *labels[k, 1:], *boxes[k, [1, 0, 3, 2]]))
    return tuple(
        Region(rings_of(outlines[k]), int(labels[k, 0]), int(labels[k, 1]), bool(labels[k, 2]), size[k]) for k in rows
    )


def _united(regions: Sequence[Region]) -> Iterator[tuple[Rings, float]]:
    if len(regions) == 1:
        yield regions[0].rings, regions[0].area
        return
    import shapely

    whole = _whole_of([polygon_of(region) for region in regions])
    for polygon in shapely.get_parts(shapely.normalize(whole)):
        yield rings_of(polygon), float(polygon.area)

"""Hatching of cut faces after ISO 128-3: which lines each part gets on all the views of a sheet, then the lines.

Lines lie at 45 degrees on the paper, turned by steps until they are 15 degrees off every straight outline of the part's
cut faces and every drawn axis. Parts whose cut faces touch in any view differ: they lean the other way, else their
lines have another pitch or angle. A part has the same hatch in every view. Lines keep a phase fixed to the page, so
those of separate faces of one part, and of the halves of a stepped section, lie on the same lines. Sections too thin
to hatch are solid black, with white between two of them.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import chain
from typing import Any

import numpy as np

from ..contract import F64, LineClass, Node, Style
from ..drawing import WHITE, Fill, Lines, Path, Stroke
from .fills import outline_path
from .model import Region
from .regions import polygon_of, rings_of
from .scanlines import stretches

CLEAR_DEG = 15.0
"""Least angle between hatching and outlines or axes; the roundings of directions are forgiven by `_FORGIVEN_DEG`."""
LEAST_PITCH_MM, MOST_PITCH_MM = 0.7, 4.0
THIN_MM = 1.0
"""A section is drawn solid if circles of this diameter inside it fill less than a tenth of it."""
GAP_MM = 0.7
"""White left between neighbouring solid sections."""
NEAR_MM = 0.7
"""Cut faces nearer than this touch, as the reader sees it."""
_FORGIVEN_DEG = 0.05
_LEANS = (45.0, 135.0)
_TURNS = (0.0, 5.0, -5.0, 10.0, -10.0, 15.0, -15.0)
_LARGE_TURNS = (20.0, -20.0, 25.0, -25.0, 30.0, -30.0)
_WIDER = (1.0, 1.5, 2.0)
_APART_DEG, _APART_RATIO = 30.0, 1.4
_SMOOTH_TURN_DEG, _SMOOTH_RATIO = 25.0, 2.5
_LEAST_STRAIGHT_MM, _LEAST_STRAIGHT_SHARE = 0.5, 0.02
_LEAST_STROKE_MM = 0.05
_LEAST_SOLID_MM = 0.25
_THICK_SHARE = 0.1


@dataclass(frozen=True, slots=True)
class Hatch:
    """Lines at `angle` degrees in 0 to 180, 45 rising to the right, `pitch` mm apart.

    One of them passes `offset` mm from the page's left top corner, away from it across the lines.
    """

    angle: float
    pitch: float
    offset: float = 0.0


@dataclass(frozen=True, slots=True)
class HatchRequest:
    """The regions of one view, the nodes its rows mean, and the directions in degrees of the axes drawn in it."""

    regions: tuple[Region, ...]
    nodes: tuple[Node, ...]
    axis_angles: tuple[float, ...] = ()


@dataclass(frozen=True, eq=False, slots=True)
class Hatching:
    """The marks of one view's cut faces.

    strokes: hatch lines; solids: thin sections, black; gaps: white between two solids, to be painted over the outlines.
    """

    strokes: tuple[Stroke, ...]
    solids: tuple[Fill, ...]
    gaps: tuple[Fill, ...]


def assign_hatches(requests: Sequence[HatchRequest]) -> dict[str, Hatch]:
    """Return the hatch of each part that is cut in any of the views, by its path.

    Parts take theirs in the order of their paths, the first that differs from what their neighbours have. Where no
    angle is free of outlines, the one with the least length of outline near it. Cost: near linear in outline points,
    and the pairs of neighbours.
    """
    caps: dict[str, list[Region]] = {}
    axes: dict[str, set[float]] = {}
    for request in requests:
        for region in filter(_is_cap, request.regions):
            path = request.nodes[region.node].path
            caps.setdefault(path, []).append(region)
            axes.setdefault(path, set()).update(request.axis_angles)
    neighbours = _neighbours(requests)
    hatches: dict[str, Hatch] = {}
    for path in sorted(caps):
        taken = [hatches[other] for other in sorted(neighbours.get(path, ())) if other in hatches]
        hatches[path] = _chosen(caps[path], sorted(axes[path]), taken)
    return hatches


def hatching_of(
    regions: Sequence[Region],
    nodes: Sequence[Node],
    hatches: Mapping[str, Hatch],
    style: Style,
    clear_of: Sequence[F64] = (),
) -> Hatching:
    """Return the hatching of one view's cut faces, narrow lines that stop at outlines.

    `clear_of` are polygons (k,2) mm on the page that stay free of it, such as the surrounds of words. Cost: linear in
    the crossings of lines and outlines.
    """
    caps = [(region, is_thin(region)) for region in filter(_is_cap, regions)]
    solids, gaps = _solid([region for region, thin in caps if thin], clear_of)
    strokes = (
        Stroke(Path((x0, y0), (Lines(np.array([[x1, y1]])),)), style.narrow, LineClass.HATCHING)
        for region, thin in caps
        if not thin
        for x0, y0, x1, y1 in hatch_lines(region.rings, hatches[nodes[region.node].path], clear_of).tolist()
    )
    return Hatching(tuple(strokes), solids, gaps)


def hatch_lines(rings: Sequence[F64], hatch: Hatch, clear_of: Sequence[F64] = ()) -> F64:
    """Return the stretches of the hatch's lines inside the rings and outside the polygons, (k,4) x0 y0 x1 y1 mm."""
    _, ends = stretches(rings, clear_of, hatch.angle, hatch.pitch, hatch.offset)
    return ends[np.hypot(ends[:, 2] - ends[:, 0], ends[:, 3] - ends[:, 1]) > _LEAST_STROKE_MM]


def pitch_of(area: float, perimeter: float) -> float:
    """Pitch in mm for a cut face: 0.7 + sqrt(area) / 25, at most 4, in tenths.

    In a strip it is no more than the strip's width, 2 area / perimeter, so that several lines cross it.
    """
    wanted = min(LEAST_PITCH_MM + math.sqrt(area) / 25.0, max(2.0 * area / perimeter, LEAST_PITCH_MM))
    return round(min(max(wanted, LEAST_PITCH_MM), MOST_PITCH_MM), 1)


def is_thin(region: Region) -> bool:
    """Whether circles of `THIN_MM` inside the region fill less than a tenth of it."""
    thick = polygon_of(region).buffer(-0.5 * THIN_MM).buffer(0.5 * THIN_MM)
    return bool(thick.area < _THICK_SHARE * region.area)


def straight_directions(rings: Sequence[F64]) -> F64:
    """Return the straight stretches of outlines, (k,2): direction in degrees, 0 to 180, and length in mm.

    Stretches shorter than 0.5 mm or a fiftieth of all outlines, and the chords of curves, do not count.
    """
    found = np.concatenate([_straight(ring) for ring in rings])
    total = sum(float(_lengths(ring).sum()) for ring in rings)
    least = max(_LEAST_STRAIGHT_MM, _LEAST_STRAIGHT_SHARE * total)
    return np.asarray(found[found[:, 1] >= least])


def _is_cap(region: Region) -> bool:
    return region.is_cap


def _lengths(ring: F64) -> F64:
    side = np.roll(ring, -1, axis=0) - ring
    return np.hypot(side[:, 0], side[:, 1])


def _straight(ring: F64) -> F64:
    """Direction and length (k,2) of the sides of a ring that are no chords of a curve.

    A side is a chord if at one end the outline turns gently into a side not much shorter than itself.
    """
    side, length = np.roll(ring, -1, axis=0) - ring, _lengths(ring)
    following = np.roll(side, -1, axis=0)
    cross = side[:, 0] * following[:, 1] - side[:, 1] * following[:, 0]
    dot = side[:, 0] * following[:, 0] + side[:, 1] * following[:, 1]
    turn = np.degrees(np.arctan2(np.abs(cross), dot))  # at the end of the side
    is_gentle = (turn > _FORGIVEN_DEG) & (turn < _SMOOTH_TURN_DEG)
    next_length, last_length = np.roll(length, -1), np.roll(length, 1)
    is_chord = is_gentle & (next_length * _SMOOTH_RATIO > length)
    is_chord |= np.roll(is_gentle, 1) & (last_length * _SMOOTH_RATIO > length)
    direction = np.degrees(np.arctan2(-side[:, 1], side[:, 0])) % 180.0
    return np.column_stack([direction, length])[~is_chord]


def _neighbours(requests: Sequence[HatchRequest]) -> dict[str, set[str]]:
    import shapely

    pairs: dict[str, set[str]] = {}
    for request in requests:
        caps = [region for region in request.regions if region.is_cap]
        shapes = np.array([polygon_of(region) for region in caps], object)
        paths = [request.nodes[region.node].path for region in caps]
        for one, other in shapely.STRtree(shapes).query(shapes, predicate="dwithin", distance=NEAR_MM).T.tolist():
            if paths[one] != paths[other]:
                pairs.setdefault(paths[one], set()).add(paths[other])
    return pairs


def _chosen(caps: Sequence[Region], axes: Sequence[float], taken: Sequence[Hatch]) -> Hatch:
    """The first hatch clear of outlines and different from those taken; failing that, the best of them."""
    lines = straight_directions([ring for region in caps for ring in region.rings])
    drawn = np.column_stack([axes, np.full(len(axes), 1e3)]) if axes else np.empty((0, 2))
    forbidden = np.concatenate([lines, drawn])
    largest = max(caps, key=lambda region: region.area)
    pitch = pitch_of(largest.area, float(sum(_lengths(ring).sum() for ring in largest.rings)))

    def demerit(ranked: tuple[int, tuple[Hatch, bool]]) -> tuple[int, float, bool, int]:
        rank, (hatch, is_odd) = ranked
        clash = sum(not _differ(hatch, other) for other in taken)
        is_alike = any(angle_between(hatch.angle, other.angle) < _APART_DEG - _FORGIVEN_DEG for other in taken)
        return clash, round(_length_near(hatch.angle, forbidden), 3), is_alike or is_odd, rank

    return min(enumerate(_options(pitch)), key=demerit)[1][0]


def _options(pitch: float) -> Iterator[tuple[Hatch, bool]]:
    """Hatches in the order they are preferred, and whether the turn is large: other lean, wider pitch, turned more."""
    for turns in (_TURNS, _LARGE_TURNS):
        for wider in _WIDER:
            wide = round(pitch * wider, 2)
            for turn in turns:
                yield from ((Hatch((lean + turn) % 180.0, wide), turns is _LARGE_TURNS) for lean in _LEANS)


def _differ(one: Hatch, other: Hatch) -> bool:
    ratio = max(one.pitch, other.pitch) / min(one.pitch, other.pitch)
    return angle_between(one.angle, other.angle) >= _APART_DEG - _FORGIVEN_DEG or ratio >= _APART_RATIO


def angle_between(one: float, other: float) -> float:
    """Return the angle between two directions of lines in degrees, 0 to 90."""
    apart = abs(one - other) % 180.0
    return min(apart, 180.0 - apart)


def _length_near(angle: float, forbidden: F64) -> float:
    apart = np.abs(forbidden[:, 0] - angle) % 180.0
    return float(forbidden[np.minimum(apart, 180.0 - apart) < CLEAR_DEG - _FORGIVEN_DEG, 1].sum())


def _solid(thin: Sequence[Region], clear_of: Sequence[F64]) -> tuple[tuple[Fill, ...], tuple[Fill, ...]]:
    """Thin sections in black, and the white between those of different parts."""
    import shapely

    shapes = np.array([polygon_of(region) for region in thin], object)
    words = shapely.union_all([shapely.Polygon(ring) for ring in clear_of])
    tree = shapely.STRtree(shapes)
    solids, gaps = [], []
    for region, shape in zip(thin, shapes, strict=True):
        near = sorted(tree.query(shape, predicate="dwithin", distance=GAP_MM).tolist())
        others = [shapes[other] for other in near if thin[other].node != region.node]
        white = shape.intersection(_surround(shape, others))
        solids.append(_fill(shape.difference(white).difference(words), (0, 0, 0)))
        gaps.append(_fill(white, WHITE))
    return tuple(fill for fill in solids if fill.paths), tuple(fill for fill in gaps if fill.paths)


def _surround(shape: Any, others: Sequence[Any]) -> Any:
    """All that lies too near to other solids to be black in this one.

    Each of two gives half of what the gap still needs, yet keeps 0.25 mm, or half of its width where it has less.
    """
    import shapely

    width = 2.0 * shape.area / shape.length
    spare = (width - min(_LEAST_SOLID_MM, 0.5 * width)) / min(max(len(others), 1), 2)
    zones = []
    for other in others:
        apart = shape.distance(other)
        zones.append(other.buffer(apart + min(spare, 0.5 * (GAP_MM - apart))))
    return shapely.union_all(zones)


def _fill(area: Any, colour: tuple[int, int, int]) -> Fill:
    import shapely

    polygons = [part for part in shapely.get_parts(shapely.normalize(area)) if part.geom_type == "Polygon"]
    return Fill(tuple(outline_path(ring) for ring in chain.from_iterable(map(rings_of, polygons))), colour)

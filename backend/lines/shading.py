"""Tone by black marks alone: stipple, dots set denser where a surface is darker, and line shading.

Both are anchored to the page and each mark depends on the tone at its own place only, so marks of parts that do not
change stay where they are from one picture to the next.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ..contract import F64, I32, Emphasis, FaceOrigin, LineClass, Panel, PatchKind, Projection
from ..drawing import BLACK, Arc, Fill, Group, Lines, Path, Stroke
from .dots import SIDE, scatter
from .model import Bools, Candidates, Pieces, Region, View
from .near import NEAR
from .occluders import Occluders
from .queries import front_face, page_points
from .regions import borders_of, polygon_of, rings_of
from .scanlines import I64, stretches
from .tone import darkness

LIGHTEST, DARKEST = 0.16, 0.5
"""Darkness (see `tone`) up to which a surface stays white, and from which marks stand as close as they may."""
SAMPLE_MM = 0.25
LEAST_STROKE_MM = 1.0
_FREE_ANGLE = 45.0  # along the limit of light and shade, for light from the upper left
_END_ON = 0.1
_RANKS = np.array([0.06, 0.75, 0.5, 0.75, 0.25, 0.75, 0.5, 0.75])  # of row modulo 8: how full a tone draws the row
_EVERY = len(_RANKS)


@dataclass(frozen=True, slots=True)
class Marks:
    """Sizes in mm on paper: diameter of dots, and the least gap between two dots or two strokes."""

    dot: float = 0.25
    gap: float = 0.4


def stipple_of(
    view: View, pieces: Pieces, candidates: Candidates, occluders: Occluders, panel: Panel, marks: Marks | None = None
) -> tuple[Group, ...]:
    """Return the dots of each part, one fill of circles in a group named by its path.

    No dot touches a line, or comes nearer to it than half of itself. Cut faces and muted parts have none. Cost: one
    query of the view for each dot that would stand on a black page.
    """
    sizes = marks or Marks()
    points, rank = _all_dots(view, panel, sizes)
    faces = front_face(view, occluders, points)
    rows = np.flatnonzero(_is_shaded(view, faces, panel))
    rows = rows[fullness(darkness(view, faces[rows], points[rows], panel.lighting)) > rank[rows]]
    rows = rows[~_is_near(points[rows], pieces, candidates, sizes.dot + 0.5 * panel.style.wide)]
    node = view.face_node[faces[rows]]
    paths = {view.geometry.nodes[row].path: int(row) for row in np.unique(node).tolist()}
    return tuple(
        Group(
            "part", path, (Fill(tuple(_circle(x, y, sizes.dot) for x, y in points[rows[node == row]].tolist()), BLACK),)
        )
        for path, row in sorted(paths.items())
    )


def line_shading_of(
    view: View,
    regions: Sequence[Region],
    occluders: Occluders,
    panel: Panel,
    flat_faces: bool = False,
    marks: Marks | None = None,
) -> tuple[Group, ...]:
    """Return narrow strokes that stand closer where a surface is darker, those of each part in a group.

    They run along the straight elements of cylinders and cones, down plane faces (if `flat_faces`), and along the limit
    of light and shade elsewhere; they keep a gap from outlines. Cost: one query for each quarter mm of stroke.
    """
    sizes, narrow = marks or Marks(), panel.style.narrow
    groups: dict[str, list[Stroke]] = {}
    for region in regions:
        kind = view.geometry.patches.kind[region.patch]
        if region.is_cap or not _takes_tone(panel, region.node) or (kind == PatchKind.PLANE and not flat_faces):
            continue
        angle = direction_of(view, region.patch)
        inner = _shrunk(region, 0.5 * panel.style.wide + sizes.gap)
        for x0, y0, x1, y1 in _strokes(view, inner, occluders, panel, angle, sizes.gap + narrow).tolist():
            stroke = Stroke(Path((x0, y0), (Lines(np.array([[x1, y1]])),)), narrow, LineClass.SHADING)
            groups.setdefault(view.geometry.nodes[region.node].path, []).append(stroke)
    return tuple(Group("part", path, tuple(strokes)) for path, strokes in groups.items())


def fullness(dark: F64) -> F64:
    """Share of all possible marks, 0 to 1, that stands for a darkness."""
    return np.asarray(np.clip((dark - LIGHTEST) / (DARKEST - LIGHTEST), 0.0, 1.0))


def direction_of(view: View, patch: int) -> float:
    """Return the direction of a patch's strokes on the page in degrees, 45 rising to the right."""
    kind, frame = PatchKind(int(view.geometry.patches.kind[patch])), view.geometry.patches.frame[patch]
    if kind in (PatchKind.CYLINDER, PatchKind.CONE):
        return _angle_on_page(view.projection, frame[0], frame[3])
    if kind == PatchKind.PLANE:
        down = np.array([0.0, 0.0, 1.0]) - frame[3, 2] * frame[3]
        level = np.array([1.0, 0.0, 0.0]) - frame[3, 0] * frame[3]
        return _angle_on_page(view.projection, frame[0], down if (down**2).sum() > _END_ON else level)
    return _FREE_ANGLE


def _all_dots(view: View, panel: Panel, sizes: Marks) -> tuple[F64, F64]:
    """All dots within the view and its panel, (k,2) mm, and the fullness above which each is set."""
    tile = scatter()
    step = (sizes.dot + sizes.gap) / tile.least_distance
    left, top, width, height = panel.place
    shown = view.points[view.faces].reshape(-1, 3)[:, :2] if len(view.faces) else np.empty((0, 2))
    low = np.maximum(shown.min(axis=0, initial=np.inf), (left, top))
    high = np.minimum(shown.max(axis=0, initial=-np.inf), (left + width, top + height))
    edge = SIDE * step
    first, last = np.floor(low / edge), np.ceil(np.maximum(high, low) / edge)
    columns, rows = np.arange(first[0], last[0]), np.arange(first[1], last[1])
    corners = np.stack(np.meshgrid(columns, rows), axis=-1).reshape(-1, 1, 2) * edge
    points = (corners + tile.points * step).reshape(-1, 2)
    rank = np.tile((np.arange(len(tile.points)) + 0.5) / len(tile.points), len(corners))
    inside = ((points >= low) & (points <= high)).all(axis=1)
    return points[inside], rank[inside]


def _is_shaded(view: View, faces: I32, panel: Panel) -> Bools:
    takes = np.array([_takes_tone(panel, row) for row in range(len(view.geometry.nodes))], np.bool_)
    origin = view.geometry.face_origin[view.face_row[faces]]
    return np.asarray((faces >= 0) & takes[view.face_node[faces]] & (origin != FaceOrigin.SECTION_CAP))


def _takes_tone(panel: Panel, node: int) -> bool:
    return panel.emphasis is None or panel.emphasis[node] in (Emphasis.PLAIN, Emphasis.HIGHLIGHT)


def _is_near(points: F64, pieces: Pieces, candidates: Candidates, distance: float) -> Bools:
    """Whether a point is nearer than this to a line that is drawn or where a smooth surface turns away."""
    import shapely

    borders = borders_of(pieces, candidates)
    drawn = np.flatnonzero(pieces.is_visible & candidates.is_drawn[pieces.segment])
    segments = np.stack([pieces.start[drawn, :2], pieces.end[drawn, :2]], axis=1)
    lines = [*shapely.linestrings(borders.points, indices=borders.line), *shapely.linestrings(segments)]
    near = np.zeros(len(points), np.bool_)
    found = shapely.STRtree(lines).query(shapely.points(points), predicate="dwithin", distance=distance)
    near[found[0]] = True
    return near


def _circle(x: float, y: float, diameter: float) -> Path:
    radius = 0.5 * diameter
    halves = (Arc((radius, radius), 0.0, False, True, (x + side * radius, y)) for side in (1.0, -1.0))
    return Path((x - radius, y), tuple(halves), is_closed=True)


def _angle_on_page(projection: Projection, origin: F64, axis: F64) -> float:
    """Direction of a world axis through a point, on the page; the free one if it is seen end-on."""
    ends = np.stack([origin, origin + axis / max(float(np.abs(axis).max()), 1e-300)])
    points, weight = page_points(projection, ends)
    if (weight < NEAR).any():
        return _FREE_ANGLE
    across, down = points[1, :2] - points[0, :2]
    if np.hypot(across, down) < _END_ON * projection.scale:
        return _FREE_ANGLE
    return round(float(np.degrees(np.arctan2(-down, across))) % 180.0, 6)


def _shrunk(region: Region, margin: float) -> list[F64]:
    import shapely

    inner = polygon_of(region).buffer(-margin)
    return [ring for polygon in shapely.get_parts(inner) if not polygon.is_empty for ring in rings_of(polygon)]


def _strokes(view: View, rings: Sequence[F64], occluders: Occluders, panel: Panel, angle: float, pitch: float) -> F64:
    """The stretches (k,4) of lines inside rings along which the surface is as dark as their row asks."""
    if not rings:
        return np.empty((0, 4))
    row, ends = stretches(rings, (), angle, pitch)
    share, owner = _samples(ends)
    points = ends[owner, :2] + share[:, None] * (ends[owner, 2:] - ends[owner, :2])
    faces = front_face(view, occluders, points)
    full = np.zeros(len(points))
    seen = np.flatnonzero(faces >= 0)
    full[seen] = fullness(darkness(view, faces[seen], points[seen], panel.lighting))
    first, last = _runs(full > _RANKS[row[owner] % _EVERY], owner)
    found = np.concatenate([points[first], points[last]], axis=1)
    is_long: Bools = np.hypot(found[:, 2] - found[:, 0], found[:, 3] - found[:, 1]) >= LEAST_STROKE_MM
    return np.asarray(found[is_long])


def _samples(ends: F64) -> tuple[F64, I64]:
    """Evenly spaced samples of lines, both ends among them: their place from 0 to 1, and the line of each."""
    length = np.hypot(ends[:, 2] - ends[:, 0], ends[:, 3] - ends[:, 1])
    count = np.ceil(length / SAMPLE_MM).astype(np.int64) + 1
    owner = np.repeat(np.arange(len(ends)), count)
    within = np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count)
    return within / np.maximum(count - 1, 1)[owner], owner


def _runs(is_on: Bools, owner: I64) -> tuple[I64, I64]:
    """First and last row of each run of samples that are on, of one line."""
    joined = is_on[1:] & is_on[:-1] & (owner[1:] == owner[:-1])
    first = np.flatnonzero(is_on & ~np.concatenate([[False], joined]))
    last = np.flatnonzero(is_on & ~np.concatenate([joined, [False]]))
    return first, last

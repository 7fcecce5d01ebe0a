"""Pictures that answer a question about the model rather than show its tone: one sample a pixel, no smoothing."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from .. import camera
from ..contract import F64, I32, U8, Emphasis, Geometry, Page, Panel, Projection
from .picture import Progress, Visibility, see

NEAREST_LEVEL, FARTHEST_LEVEL = 235, 40
EDGE_ON_LEVEL, FACE_ON_LEVEL = 60, 230
_SPREAD, _COLOURS = 0x13C6EF, 1 << 21  # an odd step near the golden section goes through all 2^21 colours
_ROWS = 256


def part_colour(node: int) -> tuple[int, int, int]:
    """Return the 8-bit colour of a row of the part tree in a part survey: even levels, one to a row up to 2^21 rows."""
    code = (node + 1) * _SPREAD % _COLOURS
    return 2 * (code >> 14), 2 * (code >> 7 & 127), 2 * (code & 127)


def survey(
    geometry: Geometry,
    panel: Panel,
    page: Page,
    image: U8,
    threads: int | None = None,
    progress: Progress | None = None,
) -> None:
    """Draw a survey panel into its window of `image` (rows, columns, 3) uint8, white where nothing is seen.

    part: `part_colour` of the node. depth: grey, even in distance along the sight, from NEAREST_LEVEL at the
    nearest shown vertex to FARTHEST_LEVEL at the farthest. facing: by the cosine between the face's normal and the
    direction to the eye, from EDGE_ON_LEVEL to FACE_ON_LEVEL, grey if its outer side is seen, red if its inner.
    """
    seen = see(geometry, replace(panel, style=replace(panel.style, samples=1)), page, threads)
    place = seen.window
    target = image[place.top : place.top + place.rows, place.left : place.left + place.columns]
    target[:] = 255
    kind = panel.style.drawn_as
    depths = _depth_range(geometry, panel) if kind == "survey depth" else (0.0, 0.0)
    palette = np.array([part_colour(row) for row in range(len(geometry.nodes))], np.uint8)
    for top in range(0, place.rows, _ROWS):
        rows = slice(top, top + _ROWS)
        face = seen.face[rows, :, 0]
        is_seen = face >= 0
        if kind == "survey part":
            levels = palette[geometry.face_node[face[is_seen]]]
        elif kind == "survey depth":
            levels = _depth_levels(seen, panel.projection, rows, is_seen, depths)
        else:
            levels = _facing_levels(geometry, panel, face[is_seen])
        target[rows][is_seen] = levels
        if progress is not None:
            progress(min(1.0, (top + _ROWS) / place.rows))


def _distance(depth: F64, projection: Projection) -> F64:
    """Distance along the sight, mm: from the eye, or from the plane of depth 0."""
    return -1.0 / depth if projection.kind == "central" else depth


def _depth_range(geometry: Geometry, panel: Panel) -> tuple[float, float]:
    near, far = np.inf, -np.inf
    for row, node in enumerate(geometry.nodes):
        if node.mesh < 0 or (panel.emphasis is not None and panel.emphasis[row] == Emphasis.HIDE):
            continue
        points = geometry.vertices[slice(*node.vertex_range)]
        moved = points if panel.displacement is None else points + panel.displacement[row]
        depth = camera.to_page(panel.projection, moved)[1]
        distance = _distance(depth[np.isfinite(depth)], panel.projection)
        if len(distance):
            near, far = min(near, float(distance.min())), max(far, float(distance.max()))
    return near, far


def _depth_levels(
    seen: Visibility, projection: Projection, rows: slice, is_seen: NDArray[np.bool_],
    depths: tuple[float, float],
) -> U8:  # fmt: skip
    depth = seen.depth[rows, :, 0][is_seen].astype(np.float64) + seen.depth_shift
    near, far = depths
    share = (_distance(depth, projection) - near) / max(far - near, 1e-12)
    grey = NEAREST_LEVEL + (FARTHEST_LEVEL - NEAREST_LEVEL) * np.clip(share, 0.0, 1.0)
    return np.repeat(np.floor(grey + 0.5).astype(np.uint8)[:, None], 3, axis=1)


def _facing_levels(geometry: Geometry, panel: Panel, face: I32) -> U8:
    shown, inverse = np.unique(face, return_inverse=True)
    corners = geometry.vertices[geometry.faces[shown]]
    if panel.displacement is not None:
        corners = corners + panel.displacement[geometry.face_node[shown], None]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    toward = -np.array(panel.projection.sight)
    if panel.projection.eye is not None:
        toward = np.array(panel.projection.eye) - corners.mean(axis=1)
    lengths = np.linalg.norm(normal, axis=1) * np.linalg.norm(np.atleast_2d(toward), axis=1)
    cosine = np.einsum("ij,ij->i", normal, np.broadcast_to(toward, normal.shape)) / np.maximum(lengths, 1e-300)
    level = np.floor(EDGE_ON_LEVEL + (FACE_ON_LEVEL - EDGE_ON_LEVEL) * np.abs(cosine) + 0.5).astype(np.uint8)
    colours = np.repeat(level[:, None], 3, axis=1)
    colours[cosine < 0.0, 1:] //= 4
    return np.asarray(colours[inverse])

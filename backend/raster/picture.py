"""Seeing and painting one panel: bands of tiles, worked by a pool of threads.

The cut into chunks, bands and runs of tiles depends on the job alone, each writes what no other writes, so the
result is the same for any number of threads.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

import numpy as np

from .. import colour
from ..contract import F32, F64, I32, U8, Geometry, Material, Page, Panel
from .reflectance import light_rows, material_rows, surround_axis
from .scene import Scene, prepare
from .window import Window

N_CHUNKS = 16
BAND_PIXELS = 4_000_000
BAND_ENTRIES = 64_000_000
_RUNS = 64
_GUESS_STEPS = 4096
_TILE = 32

Progress = Callable[[float], None]


@dataclass(frozen=True, eq=False, slots=True)
class Visibility:
    """What each sample of a panel shows.

    face (rows, columns, samples) int32: row of the geometry's faces, -1 for none. depth (same) float32: as
    `Projection.world_to_page` counts it less `depth_shift`, infinite for none.
    """

    window: Window
    face: I32
    depth: F32
    depth_shift: float


def see(geometry: Geometry, panel: Panel, page: Page, threads: int | None = None) -> Visibility:
    """Find the visible face and its depth for every sample of `panel` on `page`, `panel.style.samples` a pixel.

    Hidden nodes are left out; displacement is applied; every other emphasis is seen as plain.
    Memory: 8 bytes a sample besides the geometry. Cost: linear in triangles and in covered samples.
    """
    from .frame import see_tiles

    scene = prepare(geometry, panel, page)
    place, samples = scene.window, panel.style.samples
    face = np.full((place.rows, place.columns, samples), -1, np.int32)
    depth = np.full(face.shape, np.inf, np.float32)
    with _pool(threads) as pool:
        for band in _bands(scene, pool):

            def work(run: tuple[int, int], band: _Band = band) -> None:
                see_tiles(band.raster, band.size, run[0], run[1], band.top_row, face, depth)

            _all(pool, work, band.runs)
    return Visibility(place, face, depth, scene.depth_shift)


def shade(
    seen: Visibility,
    geometry: Geometry,
    panel: Panel,
    page: Page,
    materials: Sequence[Material],
    threads: int | None = None,
) -> U8:
    """Shade what `see` found for the same arguments: (rows, columns, 3) uint8 sRGB over white.

    Equal bit for bit to what `paint` writes.
    """
    from .frame import shade_tiles

    scene = prepare(geometry, panel, page)
    place = scene.window
    image = np.full((place.rows, place.columns, 3), 255, np.uint8)
    if image.size == 0 or not len(scene.spans):
        return image
    tones = _tones(scene, materials)
    n_columns, n_rows = -(-place.columns // _TILE), -(-place.rows // _TILE)
    size = (n_columns, place.columns, place.rows, panel.style.samples)
    with _pool(threads) as pool:

        def work(run: tuple[int, int]) -> None:
            shade_tiles(seen.face, (place.left, place.top), *tones, size, run[0], run[1], image)

        _all(pool, work, _cut(n_columns * n_rows, _RUNS))
    return image


def paint(
    geometry: Geometry,
    panel: Panel,
    page: Page,
    materials: Sequence[Material],
    image: U8,
    threads: int | None = None,
    progress: Progress | None = None,
) -> None:
    """Draw `panel` in tone into its window of `image` (rows, columns, 3) uint8, the picture of the whole page.

    Every pixel of the window is written, white where nothing is seen. Emphasis as in `see`.
    Memory besides geometry and image: 13 bytes a vertex, 4 a triangle, 4 for each triangle in each of its tiles.
    """
    from .frame import paint_tiles

    scene = prepare(geometry, panel, page)
    place = scene.window
    if not len(scene.spans):
        image[place.top : place.top + place.rows, place.left : place.left + place.columns] = 255
        return
    tones = _tones(scene, materials)
    with _pool(threads) as pool:
        for band in _bands(scene, pool):

            def work(run: tuple[int, int], band: _Band = band) -> None:
                paint_tiles(
                    band.raster, *tones, band.size, run[0], run[1], band.top_row, image, place.top, place.left
                )  # fmt: skip

            _all(pool, work, band.runs, progress, band.span)


def pick(seen: Visibility, x: int, y: int) -> int:
    """Face shown by most samples of page pixel (x, y), the lowest of equals, or -1."""
    row, column = y - seen.window.top, x - seen.window.left
    if not (0 <= row < seen.window.rows and 0 <= column < seen.window.columns):
        return -1
    faces, counts = np.unique(seen.face[row, column], return_counts=True)
    return int(faces[np.argmax(counts)])


@dataclass(frozen=True, slots=True)
class _Band:
    """Some tile rows with their triangles sorted in: what the kernels take, and the share of the work done by then."""

    raster: tuple[Any, ...]
    size: tuple[int, int, int, int]
    top_row: int
    runs: list[tuple[int, int]]
    span: tuple[float, float]


def _bands(scene: Scene, pool: ThreadPoolExecutor) -> Iterator[_Band]:
    from . import bins

    place, samples = scene.window, scene.panel.style.samples
    n_columns, n_rows = -(-place.columns // _TILE), -(-place.rows // _TILE)
    if not len(scene.spans) or n_columns * n_rows == 0:
        return
    geometry = scene.geometry
    vertices, pieces = _project(scene, pool)
    x, y, z, outside = vertices
    piece_corners, piece_face, piece_position = pieces
    boxes = np.empty(scene.face_first[-1], np.uint32)
    window = (place.columns, place.rows, samples)
    chunks = _cut(len(boxes), N_CHUNKS)

    def box(run: tuple[int, int]) -> None:
        bins.box_faces(geometry.faces, x, y, outside, scene.spans, scene.face_first, *window, run[0], run[1], boxes)

    _all(pool, box, chunks)
    piece_boxes = np.empty(len(piece_corners), np.uint32)
    bins.box_pieces(piece_corners, x, y, *window, piece_boxes)

    def sort(top: int, bottom: int, counts: Any, entries: I32) -> None:
        def work(chunk: int) -> None:
            begin, end = chunks[chunk]
            bins.sort_into_tiles(
                geometry.faces, x, y, scene.spans, scene.face_first, boxes, piece_corners, piece_position, piece_boxes,
                *window, begin, end, top, bottom, n_columns, counts[chunk], entries,
            )  # fmt: skip

        _all(pool, work, range(len(chunks)))

    corner = (place.left, place.top)
    top, step = 0, max(1, BAND_PIXELS // (n_columns * _TILE * _TILE))
    nothing = np.empty(0, np.int32)
    while top < n_rows:
        bottom = min(top + step, n_rows)
        counts = np.zeros((len(chunks), (bottom - top) * n_columns), np.int32)
        starts = np.empty(counts.shape[1] + 1, np.int64)
        sort(top, bottom, counts, nothing)
        if counts.sum() > BAND_ENTRIES and bottom - top > 1:
            step = (bottom - top) // 2
            continue
        entries = np.empty(bins.tile_starts(counts, starts), np.int32)
        if len(entries):
            sort(top, bottom, counts, entries)
        raster = (
            geometry.faces, piece_corners, piece_face, x, y, z, geometry.face_patch, scene.patch_plane, scene.planes,
            (entries, starts), corner,
        )  # fmt: skip
        size = (n_columns, place.columns, place.rows, samples)
        yield _Band(raster, size, top, _cut(counts.shape[1], _RUNS), (top / n_rows, bottom / n_rows))
        top = bottom


def _project(scene: Scene, pool: ThreadPoolExecutor) -> tuple[tuple[Any, ...], tuple[Any, ...]]:
    """Vertices in window pixels, with those of clipped pieces behind; the pieces."""
    from . import project

    points, faces, place = scene.geometry.vertices, scene.geometry.faces, scene.window
    n = len(points)
    x, y, z = np.empty(n, np.int32), np.empty(n, np.int32), np.empty(n, np.float32)
    outside = np.empty(n, np.uint8)
    corner = (place.left, place.top)
    middle = (place.left + place.columns / 2.0, place.top + place.rows / 2.0)
    common = (scene.to_pixel, scene.spans)

    def work(run: tuple[int, int]) -> int:
        return project.project(
            points, *common, scene.vertex_first, scene.node_shift, corner, middle, run[0], run[1], x, y, z, outside
        )

    if not sum(pool.map(work, _cut(int(scene.vertex_first[-1]), N_CHUNKS))):
        none = np.empty(0, np.int32)
        return (x, y, z, outside), (np.empty((0, 3), np.int32), none, np.empty(0, np.int64))
    count = project.count_outside(faces, scene.spans, outside)
    more_x, more_y, more_z, *pieces = project.clip(
        points, faces, *common, scene.face_first, scene.node_shift, corner, middle, outside, count
    )
    vertices = tuple(np.concatenate(pair) for pair in ((x, more_x), (y, more_y), (z, more_z)))
    return (*vertices, outside), tuple(pieces)


def _tones(scene: Scene, materials: Sequence[Material]) -> tuple[Any, Any, Any]:
    """What the shading kernels take: surface, lighting, encoding."""
    geometry, panel = scene.geometry, scene.panel
    n_nodes = len(geometry.nodes)
    moved = np.zeros((n_nodes, 3)) if panel.displacement is None else panel.displacement
    node_material = np.array([max(node.material, 0) for node in geometry.nodes], np.int32)
    node_open = np.array([not node.closed for node in geometry.nodes], bool)
    surface = (
        geometry.vertices, geometry.faces, geometry.corner_normals, geometry.face_node, scene.node_shift, moved,
        node_material, node_open, scene.to_pixel, _sight(scene),
    )  # fmt: skip
    lights = light_rows(panel.lighting, materials)
    edges = colour.thresholds()
    encoding = (edges, colour.first_guess(edges, _GUESS_STEPS), np.float32(_GUESS_STEPS))
    return surface, (surround_axis(panel.projection), material_rows(materials), *lights), encoding


def _sight(scene: Scene) -> F64:
    """(3,3): the direction toward the eye from page pixel (x, y) is this @ (x, y, 1)."""
    projection = scene.panel.projection
    sight = np.zeros((3, 3))
    if projection.kind == "parallel":
        sight[:, 2] = -np.array(projection.sight)
        return sight
    matrix = scene.to_pixel
    sight[:] = -np.linalg.inv(matrix[[0, 1, 3], :3])
    return sight


@contextmanager
def _pool(threads: int | None) -> Iterator[ThreadPoolExecutor]:
    with ThreadPoolExecutor(threads or os.cpu_count() or 1) as pool:
        yield pool


def _all(
    pool: ThreadPoolExecutor,
    work: Callable[[Any], None],
    parts: Iterable[Any],
    progress: Progress | None = None,
    span: tuple[float, float] = (0.0, 1.0),
) -> None:
    parts = list(parts)
    for done, _ in enumerate(pool.map(work, parts), start=1):
        if progress is not None:
            progress(span[0] + (span[1] - span[0]) * done / len(parts))


def _cut(n: int, n_parts: int) -> list[tuple[int, int]]:
    return [(k * n // n_parts, (k + 1) * n // n_parts) for k in range(n_parts)]

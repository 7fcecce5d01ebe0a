"""Kernels that go through a run of tiles: draw each, then keep what is seen or paint it."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..compiled import inner, kernel
from .bins import TILE
from .light import BLOCK, WIDTH
from .shading import N_BLOCKS, encode_tile, shade_tile
from .tiles import raster_tile


@kernel
def see_tiles(raster: Any, size: Any, begin: int, end: int, top_row: int, face: Any, depth: Any) -> None:
    """Write tiles begin .. end of a band into face, depth (rows, columns, samples) of the whole window."""
    n_columns, columns, rows, samples = size
    tile_depth = np.empty(TILE * TILE * samples, np.float32)
    tile_face = np.empty(TILE * TILE * samples, np.int32)
    farthest = np.empty(16, np.float32)
    for tile in range(begin, end):
        left, top = (tile % n_columns) * TILE, (top_row + tile // n_columns) * TILE
        _draw(raster, tile, left, top, columns, rows, samples, tile_depth, tile_face, farthest)
        for y in range(min(TILE, rows - top)):
            for x in range(min(TILE, columns - left)):
                for s in range(samples):
                    o = (y * TILE + x) * samples + s
                    face[top + y, left + x, s] = tile_face[o]
                    depth[top + y, left + x, s] = tile_depth[o]


@kernel
def paint_tiles(
    raster: Any, surface: Any, lighting: Any, encoding: Any, size: Any, begin: int, end: int, top_row: int,
    image: Any, first_row: int, first_column: int,
) -> None:  # fmt: skip
    """Draw, shade and write tiles begin .. end of a band into image (rows, columns, 3) uint8, from that corner on."""
    n_columns, columns, rows, samples = size
    tile_depth = np.empty(TILE * TILE * samples, np.float32)
    tile_face = np.empty(TILE * TILE * samples, np.int32)
    farthest = np.empty(16, np.float32)
    scratch = _scratch(len(lighting[1]))
    for tile in range(begin, end):
        left, top = (tile % n_columns) * TILE, (top_row + tile // n_columns) * TILE
        _draw(raster, tile, left, top, columns, rows, samples, tile_depth, tile_face, farthest)
        _paint(
            surface, lighting, encoding, size, scratch, tile_face, left, top, raster[10], image, first_row, first_column
        )


@kernel
def shade_tiles(
    face: Any, corner: Any, surface: Any, lighting: Any, encoding: Any, size: Any, begin: int, end: int, image: Any
) -> None:
    """Shade tiles begin .. end of what `see_tiles` wrote into image (rows, columns, 3) of the window."""
    n_columns, columns, rows, samples = size
    tile_face = np.empty(TILE * TILE * samples, np.int32)
    scratch = _scratch(len(lighting[1]))
    for tile in range(begin, end):
        left, top = (tile % n_columns) * TILE, (tile // n_columns) * TILE
        tile_face[:] = -1
        for y in range(min(TILE, rows - top)):
            for x in range(min(TILE, columns - left)):
                for s in range(samples):
                    tile_face[(y * TILE + x) * samples + s] = face[top + y, left + x, s]
        _paint(surface, lighting, encoding, size, scratch, tile_face, left, top, corner, image, 0, 0)


@inner
def _draw(
    raster: Any, tile: int, left: int, top: int, columns: int, rows: int, samples: int,
    depth: Any, face: Any, farthest: Any,
) -> None:  # fmt: skip
    faces, pieces, piece_face, x, y, z, face_patch, patch_plane, planes, bins, corner = raster
    entries, starts = bins
    raster_tile(
        faces, pieces, piece_face, x, y, z, face_patch, patch_plane, planes, entries, starts[tile], starts[tile + 1],
        left, top, columns, rows, corner, samples, depth, face, farthest,
    )  # fmt: skip


@inner
def _scratch(n_materials: int) -> Any:
    jobs = np.zeros(N_BLOCKS * BLOCK, np.float32)
    pixel, share = np.empty(N_BLOCKS * WIDTH, np.int32), np.empty(N_BLOCKS * WIDTH, np.float32)
    block_material, fills = np.empty(N_BLOCKS, np.int32), np.empty(N_BLOCKS, np.int32)
    return (
        jobs,
        pixel,
        share,
        block_material,
        fills,
        np.zeros(n_materials, np.int32),
        np.empty(TILE * TILE * 3, np.float32),
    )


@inner
def _paint(
    surface: Any, lighting: Any, encoding: Any, size: Any, scratch: Any, face: Any, left: int, top: int, corner: Any,
    image: Any, first_row: int, first_column: int,
) -> None:  # fmt: skip
    _, columns, rows, samples = size
    points, faces, normals, face_node, node_shift, node_move, node_material, node_open, to_pixel, sight = surface
    axis, materials, far, near, ambient = lighting
    edges, guess, steps = encoding
    jobs, pixel, share, block_material, fills, open_block, light = scratch
    width, height = min(TILE, columns - left), min(TILE, rows - top)
    is_seen = shade_tile(
        face, corner[0] + left, corner[1] + top, width, height, samples, points, faces, normals, face_node,
        node_shift, node_move, node_material, node_open, to_pixel, sight, materials, far, near, ambient, axis,
        jobs, pixel, share, block_material, fills, open_block, light,
    )  # fmt: skip
    row, column = first_row + top, first_column + left
    if is_seen:
        encode_tile(light, width, height, image, row, column, edges, guess, steps)
    else:
        image[row : row + height, column : column + width] = 255

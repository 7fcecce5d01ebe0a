"""From a drawing to pixels: strokes, fills and glyphs with exact coverage, in bands.

A level is the mean over the pixel's square of what shows there, in sRGB as encoded, not in linear light: half a pixel
of black ink is level 128, half a tint to a printing plate, so that lines keep their weight on paper and viewers of the
vector files agree. Marks are opaque; later ones hide earlier ones exactly, so two areas that share a side leave no
seam.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from .. import colour
from ..contract import U8, Page
from ..drawing import Drawing, Group, Mark, Stroke
from ..outlines import Letters

if TYPE_CHECKING:
    from .painting import Prepared

FEWEST_PIXELS = 4.0
"""A line of 1-bit print should be at least this many pixels wide: common practice."""


@dataclass(frozen=True, eq=False, slots=True)
class Bits:
    """A picture of two values: `rows` (rows, ceil(columns/8)) uint8, the left pixel in the highest bit, 1 is ink."""

    rows: U8
    columns: int


def pixels(
    drawing: Drawing,
    resolution: float,
    letters: Letters | None = None,
    is_snapped: bool = False,
    threads: int | None = None,
) -> U8:
    """The drawing as (rows, columns, 3) uint8 sRGB over white, sized as `contract.Page.pixels` has it.

    With `is_snapped` line widths are whole pixels and level and upright lines lie on the pixel grid. The result does
    not depend on `threads` (default: all processors).
    """
    prepared = _prepared(drawing, resolution, letters, is_snapped, False)
    out = np.empty((prepared.rows, prepared.columns, 3), np.uint8)
    _paint(prepared, out, 0, threads)
    return out


def grey_pixels(
    drawing: Drawing,
    resolution: float,
    letters: Letters | None = None,
    is_snapped: bool = False,
    threads: int | None = None,
) -> U8 | None:
    """As `pixels`, but (rows, columns) for a drawing that has nothing but greys; None for one that has colours."""
    prepared = _prepared(drawing, resolution, letters, is_snapped, False)
    if not prepared.is_grey:
        return None
    grey = prepared.of_one_channel()
    out = np.empty((grey.rows, grey.columns, 1), np.uint8)
    _paint(grey, out, 0, threads)
    return out[:, :, 0]


def bands(
    drawing: Drawing,
    resolution: float,
    rows_at_a_time: int = 512,
    letters: Letters | None = None,
    is_snapped: bool = False,
    threads: int | None = None,
) -> Iterator[U8]:
    """The rows of `pixels` from the top in bands, the same bytes however they are divided."""
    prepared = _prepared(drawing, resolution, letters, is_snapped, False)
    yield from _bands(prepared, rows_at_a_time, 3, threads)


def bits(
    drawing: Drawing,
    resolution: float,
    letters: Letters | None = None,
    is_snapped: bool = True,
    threads: int | None = None,
    rows_at_a_time: int = 512,
) -> Bits:
    """The drawing in two values: ink where more than half of a pixel is covered by dark marks.

    A colour is dark if its luminance, encoded as sRGB, is below one half; so are the pixels of a picture judged. With
    `is_snapped` a weight has one width in pixels throughout. Memory is the result and one band.
    """
    prepared = _prepared(drawing, resolution, letters, is_snapped, True)
    packed = [np.packbits(band[:, :, 0] < 128, axis=1) for band in _bands(prepared, rows_at_a_time, 1, threads)]
    return Bits(np.concatenate(packed), prepared.columns)


def thin_weights(drawing: Drawing, resolution: float) -> tuple[tuple[float, float], ...]:
    """Line widths in mm, each once from the thinnest, that are under `FEWEST_PIXELS` pixels, and their pixels."""
    widths = sorted({mark.width for mark in _all_marks(drawing.groups) if isinstance(mark, Stroke)})
    wide = ((width, width * resolution / 25.4) for width in widths)
    return tuple((width, n_pixels) for width, n_pixels in wide if n_pixels < FEWEST_PIXELS)


def is_dark(levels: U8) -> U8:
    """1 where sRGB levels (...,3) are dark enough to be ink in two values, else 0."""
    return (colour.encode(colour.luminance(colour.from_bytes(levels))) < 0.5).astype(np.uint8)


def _prepared(
    drawing: Drawing, resolution: float, letters: Letters | None, is_snapped: bool, is_two_valued: bool
) -> Prepared:
    from .painting import prepare

    columns, rows = Page(drawing.width, drawing.height, resolution).pixels
    prepared = prepare(drawing, resolution, letters, is_snapped, columns, rows)
    return prepared.of_two_values() if is_two_valued else prepared


def _bands(prepared: Prepared, rows_at_a_time: int, n_channels: int, threads: int | None) -> Iterator[U8]:
    from .coverage import TILE_ROWS

    height = max(1, rows_at_a_time // TILE_ROWS) * TILE_ROWS
    for first in range(0, prepared.rows, height):
        band = np.empty((min(height, prepared.rows - first), prepared.columns, n_channels), np.uint8)
        _paint(prepared, band, first, threads)
        yield band


def _paint(prepared: Prepared, out: U8, first: int, threads: int | None) -> None:
    """Paint `out`, whose first row is row `first` of the page, a multiple of the tile's rows."""
    from .coverage import TILE_ROWS

    workers = threads or os.cpu_count() or 1
    starts = range(0, len(out), TILE_ROWS)
    with ThreadPoolExecutor(workers) as pool:
        for _ in pool.map(lambda start: prepared.paint(first + start, out[start : start + TILE_ROWS]), starts):
            pass


def _all_marks(items: tuple[Group | Mark, ...]) -> Iterator[Mark]:
    for item in items:
        if isinstance(item, Group):
            yield from _all_marks(item.items)
        else:
            yield item

"""A drawing made ready for painting at one resolution, and the painting of a few of its rows."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from ..contract import F64, I32, U8
from ..drawing import Drawing
from ..outlines import Letters
from . import is_dark
from .coverage import mark_boxes, paint_strip
from .gathering import EVEN_ODD, Gathered, gathered
from .stroking import edges_of

I64 = NDArray[np.int64]


@dataclass(frozen=True, eq=False, slots=True)
class Prepared:
    """Edges of all marks in pixels, what each shows, and the size of the page; arrays as in `coverage.paint_strip`."""

    columns: int
    rows: int
    edges: F64
    mark_edges: I64
    boxes: F64
    rules: U8
    inks: I64
    mark_images: I32
    image_pixels: U8
    image_first: I64
    image_shapes: I32
    image_places: F64

    @property
    def is_grey(self) -> bool:
        """Whether all inks and pictures have three equal channels."""
        seen = (self.inks[self.mark_images < 0], self.image_pixels.reshape(-1, 3))
        return all(bool((levels[:, :1] == levels[:, 1:]).all()) for levels in seen)

    def of_one_channel(self) -> Prepared:
        """The same with the first channel alone."""
        return replace(
            self,
            inks=self.inks[:, :1].copy(),
            image_pixels=self.image_pixels[::3].copy(),
            image_first=self.image_first // 3,
        )

    def of_two_values(self) -> Prepared:
        """The same in one channel: 0 where colours are dark, else 255."""
        inks = 255 - 255 * is_dark(self.inks.astype(np.uint8)).astype(np.int64)
        pixels = 255 - 255 * is_dark(self.image_pixels.reshape(-1, 3))
        return replace(self, inks=inks[:, None].copy(), image_pixels=pixels, image_first=self.image_first // 3)

    def paint(self, first_row: int, out: U8) -> None:
        """Paint `out` (rows, columns, channels), the page from `first_row`, a multiple of coverage.TILE_ROWS."""
        paint_strip(
            self.edges,
            self.mark_edges,
            self.boxes,
            self.rules,
            self.inks,
            self.mark_images,
            self.image_pixels,
            self.image_first,
            self.image_shapes,
            self.image_places,
            np.full(out.shape[2], 255, np.int64),
            first_row,
            out,
        )


def prepare(
    drawing: Drawing, resolution: float, letters: Letters | None, is_snapped: bool, columns: int, rows: int
) -> Prepared:
    """Flatten, stroke and cut all marks of a drawing for a resolution in dots per inch."""
    found = gathered(drawing, letters)
    scale = resolution / 25.4
    edges, mark_edges = _edges(found, scale, is_snapped)
    images = [image.pixels for image in found.images]
    return Prepared(
        columns,
        rows,
        edges,
        mark_edges,
        mark_boxes(edges, mark_edges),
        np.array([kind == EVEN_ODD for kind in found.kinds], np.uint8),
        np.array(found.colours, np.int64).reshape(-1, 3),
        np.array(found.mark_images, np.int32),
        np.concatenate([np.empty(0, np.uint8), *(image.ravel() for image in images)]),
        np.cumsum([0, *(image.size for image in images)])[:-1].astype(np.int64),
        np.array([image.shape[:2] for image in images], np.int32).reshape(-1, 2),
        np.array([image.place for image in found.images], np.float64).reshape(-1, 4) * scale,
    )


def _edges(found: Gathered, scale: float, is_snapped: bool) -> tuple[F64, I64]:
    codes = np.array(found.codes, np.int64).reshape(-1, 2)
    return edges_of(
        np.repeat(codes[:, 0], codes[:, 1]).astype(np.uint8),
        np.concatenate([np.empty((0, 2)), *found.points]),
        _firsts(found.path_points),
        np.array(found.path_closed, np.uint8),
        _firsts(found.mark_paths),
        np.array(found.kinds, np.uint8),
        np.array(found.widths, np.float64),
        np.array(found.mark_clips, np.int32),
        np.concatenate([np.empty((0, 2)), *found.clips]) * scale,
        _firsts([len(clip) for clip in found.clips]),
        scale,
        is_snapped,
    )


def _firsts(counts: list[int]) -> I64:
    return np.cumsum([0, *counts], dtype=np.int64)

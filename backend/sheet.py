"""From a job to its finished drawing: every panel on the page, and what was asked to be measured."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .contract import U8, ContractError, Job, Measure, verify
from .raster import Progress, measure, paint, survey
from .write import png, tiff

_PICTURES = ("png", "tiff")


@dataclass(frozen=True, eq=False, slots=True)
class Drawing:
    """What drawing a sheet gives.

    image (rows, columns, 3) uint8, sRGB over white, or None if no picture was asked for; measures in the order asked.
    """

    image: U8 | None
    measures: tuple[Measure, ...]


def draw(job: Job, kinds: tuple[str, ...], threads: int | None = None, progress: Progress | None = None) -> Drawing:
    """Draw the job's sheet for the file kinds wanted, and measure.

    Panels are painted in their order, each over the whole of its place and clipped to it. `progress` is called with
    the share done, 0..1, from the calling thread. The result does not depend on `threads` (default: all processors).
    Raises ContractError if the job breaks the contract or a panel is larger than the rasteriser can hold.
    """
    verify(job)
    sheet, image = job.sheet, None
    if any(kind in _PICTURES for kind in kinds):
        columns, rows = sheet.page.pixels
        image = np.full((rows, columns, 3), 255, np.uint8)
        for row in range(len(sheet.panels)):
            _draw_panel(job, row, image, threads, _part_of(progress, row, len(sheet.panels)))
    measures: dict[tuple[int, int], Measure] = {}
    for row, panel in enumerate(sheet.panels):
        wanted = list(dict.fromkeys(ask.node for ask in sheet.measures if ask.panel == row))
        for found in measure(job.geometries[panel.geometry], panel, row, sheet.page, wanted, threads):
            measures[row, found.node] = found
    return Drawing(image, tuple(measures[ask.panel, ask.node] for ask in sheet.measures))


def encode(drawing: Drawing, job: Job, kind: str) -> bytes:
    """Bytes of the file of `kind`, png or tiff, at the page's resolution, with the sheet's title and description.

    Raises ContractError for another kind or if no picture was drawn.
    """
    if drawing.image is None or kind not in _PICTURES:
        raise ContractError(f"no picture to write as {kind}")
    sheet = job.sheet
    if kind == "tiff":
        return tiff.tiff_bytes(drawing.image, sheet.page.resolution)
    # Keywords of the PNG standard: the short alternative is the description, the long one the comment.
    words = (("Title", sheet.title), ("Description", sheet.alt), ("Comment", sheet.description))
    text = tuple((key, value) for key, value in words if value)
    return png.png_bytes(drawing.image, sheet.page.resolution, text)


def _draw_panel(job: Job, row: int, image: U8, threads: int | None, progress: Progress | None) -> None:
    panel = job.sheet.panels[row]
    geometry = job.geometries[panel.geometry]
    if panel.style.drawn_as == "tone":
        paint(geometry, panel, job.sheet.page, job.materials, image, threads, progress)
    else:
        survey(geometry, panel, job.sheet.page, image, threads, progress)


def _part_of(progress: Progress | None, row: int, n_panels: int) -> Progress | None:
    if progress is None:
        return None

    def report(share: float) -> None:
        progress((row + share) / n_panels)

    return report

"""From a job to its finished drawing: every panel on the page, and what was asked to be measured."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from types import MappingProxyType
from typing import TYPE_CHECKING

import numpy as np

from .composition import compose
from .contract import U8, ContractError, Job, Measure, Panel, verify
from .drawing import Drawing, Group, Image
from .lettering.type import Lettering
from .raster import Progress, measure, paint, survey
from .write.record import DrawnLine

if TYPE_CHECKING:
    from .composition import PanelLines
    from .converter import Bits
    from .outlines import Letters

PICTURES = ("png", "tiff")
VECTORS = ("svg", "pdf", "eps")

TONE_RESOLUTION_DPI = 300.0
"""Resolution of tone within a vector file: what printers ask of halftone pictures (common practice)."""

_BLACK_ONLY = ("lines", "stipple")
"""Manners of drawing that two values hold whole."""


@dataclass(frozen=True, eq=False, slots=True)
class Drawn:
    """What drawing a sheet gives.

    image (rows, columns, 3) uint8, sRGB over white, and bits the same in two values, where a kind wanted them;
    drawing with all panels for vector kinds, and the letters of its words; lines of each panel that is drawn in lines;
    `thin` are widths in mm, and what they are in pixels, that are too few in two values; measures in the order asked.
    """

    image: U8 | None
    bits: Bits | None
    drawing: Drawing | None
    lines: tuple[PanelLines, ...]
    measures: tuple[Measure, ...]
    letters: Letters
    thin: tuple[tuple[float, float], ...] = ()

    @property
    def n_lines(self) -> int:
        """How many straight stretches of lines there were to be judged, in all panels."""
        return sum(len(each.seen.candidates) for each in self.lines)


def line_list(drawn: Drawn, job: Job) -> tuple[DrawnLine, ...]:
    """Every line of the panels drawn in lines, in the order they were joined in."""
    found: list[DrawnLine] = []
    for lines in drawn.lines:
        panel = job.sheet.panels[lines.panel]
        for row, chains in (
            (panel.geometry, lines.chains),
            *((extreme.geometry, each) for extreme, each in zip(panel.extremes, lines.extremes, strict=True)),
        ):
            nodes = job.geometries[row].nodes
            for chain in chains:
                path = nodes[chain.node].path if chain.node >= 0 else ""
                found.append(DrawnLine(lines.panel, path, chain.line_class, chain.is_visible, chain.length))
    return tuple(found)


def draw(job: Job, kinds: tuple[str, ...], threads: int | None = None, progress: Progress | None = None) -> Drawn:
    """Draw the job's sheet for the file kinds wanted, and measure.

    Panels of tone are painted in their order, each over the whole of its place and clipped to it; lines are drawn over
    all of them. `progress` is called with the share done, 0..1, from the calling thread. The result does not depend on
    `threads` (default: all processors). Raises ContractError if the job breaks the contract or a panel is larger than
    the rasteriser can hold.
    """
    verify(job)
    sheet = job.sheet
    of_lines = any(panel.style.is_of_lines for panel in sheet.panels)
    pictures, vectors = (any(kind in kinds for kind in known) for known in (PICTURES, VECTORS))
    image = _tone(job, sheet.page.resolution, threads, progress) if pictures else None
    drawing, bits = None, None
    lines: tuple[PanelLines, ...] = ()
    thin: tuple[tuple[float, float], ...] = ()
    lettering = Lettering()
    if vectors or (of_lines and kinds):
        resolution = min(TONE_RESOLUTION_DPI, sheet.page.resolution)
        is_painted = pictures and (resolution == sheet.page.resolution or not vectors)
        tone = image if is_painted else _tone(job, resolution, threads, None)
        composed = compose(job, tone, lettering, threads)
        drawing, lines = composed.drawing, composed.panels
        if of_lines and pictures:
            from . import converter

            whole = drawing if not vectors else _with_tone(drawing, image)
            if "png" in kinds or not is_two_valued(job):
                image = converter.pixels(whole, sheet.page.resolution, lettering.outlines, threads=threads)
            if "tiff" in kinds and is_two_valued(job):
                bits = converter.bits(whole, sheet.page.resolution, lettering.outlines, threads=threads)
                thin = converter.thin_weights(whole, sheet.page.resolution)
    return Drawn(image, bits, drawing, lines, _measured(job, threads), lettering.outlines, thin)


def is_two_valued(job: Job) -> bool:
    """Whether a sheet is nothing but black lines on white, so that a TIFF of it has one bit a pixel."""
    return all(panel.style.drawn_as in _BLACK_ONLY for panel in job.sheet.panels)


def encode(drawn: Drawn, job: Job, kind: str) -> bytes:
    """Bytes of the file of `kind`, at the page's resolution, with the sheet's title and description.

    Raises ContractError for another kind or if nothing was drawn for it.
    """
    sheet = job.sheet
    if kind in VECTORS:
        if drawn.drawing is None:
            raise ContractError(f"no drawing to write as {kind}")
        return _vector(drawn.drawing, kind, drawn.letters)
    if kind == "tiff" and drawn.bits is not None:
        from .write.bilevel import group4_bytes

        return group4_bytes(drawn.bits, sheet.page.resolution)
    if drawn.image is None or kind not in PICTURES:
        raise ContractError(f"no picture to write as {kind}")
    if kind == "tiff":
        from .write import tiff

        return tiff.tiff_bytes(drawn.image, sheet.page.resolution)
    from .write import png

    # Keywords of the PNG standard: the short alternative is the description, the long one the comment.
    words = (("Title", sheet.title), ("Description", sheet.alt), ("Comment", sheet.description))
    text = tuple((key, value) for key, value in words if value)
    return png.png_bytes(drawn.image, sheet.page.resolution, text)


def _vector(drawing: Drawing, kind: str, letters: Letters) -> bytes:
    match kind:
        case "svg":
            from .write.svg import svg_bytes

            return svg_bytes(drawing, letters)
        case "pdf":
            from .write.pdf import pdf_bytes

            return pdf_bytes(drawing, letters)
        case _:
            from .write.eps import eps_bytes

            return eps_bytes(drawing, letters)


def _tone(job: Job, resolution: float, threads: int | None, progress: Progress | None) -> U8 | None:
    """All panels of tone painted on one page at a resolution; None where there are none."""
    panels = job.sheet.panels
    painted = [row for row, panel in enumerate(panels) if _painter(panel) is not None]
    if not painted:
        return None
    page = replace(job.sheet.page, resolution=resolution)
    columns, rows = page.pixels
    image = np.full((rows, columns, 3), 255, np.uint8)
    for number, row in enumerate(painted):
        panel = panels[row]
        report = _part_of(progress, number, len(painted))
        if _painter(panel) == "tone":
            paint(job.geometries[panel.geometry], panel, page, job.materials, image, threads, report)
        else:
            survey(job.geometries[panel.geometry], panel, page, image, threads, report)
    return image


_PAINTERS: Mapping[str, str] = MappingProxyType(
    {
        "tone": "tone",
        "lines and tone": "tone",
        "survey part": "survey",
        "survey depth": "survey",
        "survey facing": "survey",
    }
)


def _painter(panel: Panel) -> str | None:
    return _PAINTERS.get(panel.style.drawn_as)


def _with_tone(drawing: Drawing, image: U8 | None) -> Drawing:
    """The drawing with its tone replaced by that of another resolution."""
    if image is None:
        return drawing
    kept = tuple(group for group in drawing.groups if group.kind != "image")
    whole = Image(image, (0.0, 0.0, drawing.width, drawing.height))
    return replace(drawing, groups=(Group("image", "tone", (whole,)), *kept))


def _measured(job: Job, threads: int | None) -> tuple[Measure, ...]:
    sheet = job.sheet
    measures: dict[tuple[int, int], Measure] = {}
    for row, panel in enumerate(sheet.panels):
        wanted = list(dict.fromkeys(ask.node for ask in sheet.measures if ask.panel == row))
        for found in measure(job.geometries[panel.geometry], panel, row, sheet.page, wanted, threads):
            measures[row, found.node] = found
    return tuple(measures[ask.panel, ask.node] for ask in sheet.measures)


def _part_of(progress: Progress | None, row: int, n_panels: int) -> Progress | None:
    if progress is None:
        return None

    def report(share: float) -> None:
        progress((row + share) / n_panels)

    return report

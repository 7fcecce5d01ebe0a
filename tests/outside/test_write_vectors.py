"""SVG, PDF and EPS as renderers of others draw them, against our own converter, and measures taken from their pixels.

SVG: resvg and CairoSVG. PDF: pdfium and poppler. EPS: Ghostscript. They cover a pixel by sampling it (resvg in 4
levels down, poppler and Ghostscript 4 x 4) or by areas (cairo, pdfium), so the bounds differ. poppler and Ghostscript
also move strokes to the pixel grid; their bounds are those of a line half a pixel off.
"""

from __future__ import annotations

from pathlib import Path as File

import numpy as np
import pytest
from platewright.backend import converter
from platewright.backend.drawing import Drawing, Words
from support import renderers
from support.drawings import SAMPLES, line, mosaic, page
from support.renderers import Renderer

DPI = 300.0
AREAS = [renderers.cairo, renderers.pdfium]
ALL = [*AREAS, renderers.resvg, renderers.poppler, renderers.ghostscript]
# Mean difference in levels over the pixels that have ink, and what at most 1 in 500 of the page's pixels exceed.
BOUNDS = {
    renderers.cairo: (4.0, 25.0),
    renderers.pdfium: (4.0, 25.0),
    renderers.resvg: (8.0, 60.0),
    renderers.poppler: (30.0, 128.0),
    renderers.ghostscript: (30.0, 128.0),
}
# Where rims lie over one another the others darken a pixel twice, up to 64 levels more than its area says: two halves
# make three quarters. Fills that abut are spread in files, 0.3 pixels here.
RIMS = ("dense", "mosaic", "nested")
TWICE = 64.0
FEW = ("curves", "islands", "wording", "clipped", "picture")


def name_of(renderer: Renderer) -> str:
    return renderer.__name__


def compare(name: str, renderer: Renderer, folder: File) -> None:
    drawing = SAMPLES[name]()
    ours = converter.pixels(drawing, DPI).astype(int)
    theirs = renderer(drawing, DPI, folder).astype(int)
    assert theirs.shape == ours.shape
    difference = np.abs(ours - theirs).max(axis=2)
    mean, most = BOUNDS[renderer]
    assert difference.sum() / (ours.min(axis=2) < 250).sum() < mean
    assert np.percentile(difference, 99.8) <= most + (TWICE if name in RIMS else 0.0)


@pytest.mark.parametrize("renderer", AREAS, ids=name_of)
@pytest.mark.parametrize("name", sorted(SAMPLES))
def test_renderers_by_area_see_what_we_see(name: str, renderer: Renderer, tmp_path: File) -> None:
    compare(name, renderer, tmp_path)


@pytest.mark.parametrize("renderer", [renderers.resvg, renderers.poppler, renderers.ghostscript], ids=name_of)
@pytest.mark.parametrize("name", FEW)
def test_renderers_by_samples_see_what_we_see(name: str, renderer: Renderer, tmp_path: File) -> None:
    compare(name, renderer, tmp_path)


@pytest.mark.slow
@pytest.mark.parametrize("renderer", [renderers.resvg, renderers.poppler, renderers.ghostscript], ids=name_of)
@pytest.mark.parametrize("name", sorted(set(SAMPLES) - set(FEW)))
def test_renderers_by_samples_see_what_we_see_in_all(name: str, renderer: Renderer, tmp_path: File) -> None:
    compare(name, renderer, tmp_path)


def test_the_comparison_notices_a_shift(tmp_path: File) -> None:
    """A drawing moved by a fifth of a pixel fails the bounds of renderers by area."""
    here = page(line([(3, 4), (30, 4)], 0.3), line([(6, 6), (30, 20)], 0.3))
    there = page(line([(3, 4.017), (30, 4.017)], 0.3), line([(6, 6.017), (30, 20.017)], 0.3))
    ours = converter.pixels(here, DPI).astype(int)
    difference = np.abs(ours - renderers.pdfium(there, DPI, tmp_path)).max(axis=2)
    assert difference.sum() / (ours.min(axis=2) < 250).sum() > BOUNDS[renderers.pdfium][0]


@pytest.mark.parametrize("renderer", [renderers.resvg, renderers.cairo, renderers.pdfium], ids=name_of)
def test_no_light_pixel_in_a_flat_area_at_eight_times(renderer: Renderer, tmp_path: File) -> None:
    """Fills that abut, at 8 x 96 dots per inch: inside their rim the tint is 150 in every pixel but for rounding."""
    resolution = 768.0
    drawing = mosaic()
    found = renderer(drawing, resolution, tmp_path)[:, :, 0]
    rows, columns = np.mgrid[: found.shape[0], : found.shape[1]]
    away = np.hypot((columns + 0.5) * 25.4 / resolution - 20.137, (rows + 0.5) * 25.4 / resolution - 15.291)
    assert found[away < 8.0].max() <= 151


@pytest.mark.parametrize("renderer", [None, *ALL], ids=lambda each: each.__name__ if each else "ours")
def test_measures_read_from_pixels(renderer: Renderer | None, tmp_path: File) -> None:
    """A line of 50.00 mm 0.70 mm wide, a dash of 3 mm, a capital of 5 mm, by sums of ink at 600 dots per inch.

    Within 0.01 mm, a quarter pixel; within a pixel where the renderer moves strokes.
    """
    resolution = 600.0
    mm = 25.4 / resolution
    marks = page(
        line([(5.0, 5.0), (55.0, 5.0)], 0.7, False),
        line([(5.0, 12.0), (8.0, 12.0)], 0.35, False),
        Words("H", (20.0, 25.0), 5.0),
    )
    drawing = Drawing(60.96, 30.48, marks.groups)
    image = converter.pixels(drawing, resolution) if renderer is None else renderer(drawing, resolution, tmp_path)
    ink = (1.0 - image[:, :, 0] / 255.0) * mm
    within = mm if renderer in (renderers.poppler, renderers.ghostscript) else 0.0106

    assert ink[int(5.0 / mm)].sum() == pytest.approx(50.0, abs=within)
    assert ink[int(12.0 / mm)].sum() == pytest.approx(3.0, abs=within)
    assert ink[: int(9 / mm), int(30 / mm)].sum() == pytest.approx(0.7, abs=within)
    letter = ink[int(16 / mm) :]
    stem = int(letter.sum(axis=0).argmax())
    assert letter[:, stem].sum() == pytest.approx(5.0, abs=within)

"""PDF: boxes, words, tags, nothing that changes from run to run, arcs as exact as stated."""

from __future__ import annotations

import io
import re

import numpy as np
import pikepdf
import pytest
from platewright.backend.contract import LineClass
from platewright.backend.drawing import Arc, Drawing, Image, Path, Stroke
from platewright.backend.outlines import arc_cubics, end_of
from platewright.backend.write.pdf import pdf_bytes
from support.drawings import SAMPLES, dense, ellipse, line, page, picture, wording

POINT = 72.0 / 25.4


def opened(drawing: Drawing) -> pikepdf.Pdf:
    return pikepdf.open(io.BytesIO(pdf_bytes(drawing)))


def content(pdf: pikepdf.Pdf) -> str:
    return pdf.pages[0].Contents.read_bytes().decode("ascii")


@pytest.mark.parametrize("name", sorted(SAMPLES))
def test_files_repeat_and_hold_no_time(name: str) -> None:
    data = pdf_bytes(SAMPLES[name]())
    assert data == pdf_bytes(SAMPLES[name]())
    assert data.startswith(b"%PDF-1.7")
    with pikepdf.open(io.BytesIO(data)) as pdf:
        assert pdf.check_pdf_syntax() == []
        assert not {"/CreationDate", "/ModDate", "/Producer"} & set(pdf.docinfo.keys())
        assert "/Font" not in pdf.pages[0].Resources
        assert not re.search(r"(?<![\d.])-0(?![.\d])|nan|inf", content(pdf))


def test_the_boxes_are_the_page() -> None:
    with opened(Drawing(210.0, 297.0, ())) as pdf:
        for name in ("/MediaBox", "/CropBox", "/TrimBox"):
            box = [float(side) for side in pdf.pages[0][name]]
            assert box == pytest.approx([0, 0, 210 * POINT, 297 * POINT], abs=1e-4)


def test_the_document_bears_title_language_and_alternative_text() -> None:
    """ISO 32000-1: 14.8.4.5 illustration elements, 14.9.2 language, 14.9.3 alternate descriptions."""
    with opened(Drawing(30.0, 20.0, dense().groups, "Täglich", "A drum in half section", "Long", "de-CH")) as pdf:
        assert str(pdf.docinfo["/Title"]) == "Täglich" and str(pdf.docinfo["/Subject"]) == "Long"
        assert str(pdf.Root.Lang) == "de-CH"
        assert pdf.Root.MarkInfo.Marked and pdf.Root.ViewerPreferences.DisplayDocTitle
        document = pdf.Root.StructTreeRoot.K[0]
        figure = document.K[0]
        assert (pikepdf.Name.Document, pikepdf.Name.Figure) == (document.S, figure.S)
        assert str(figure.Alt) == "A drum in half section" and figure.K == 0
        assert figure.Pg.objgen == pdf.pages[0].objgen
        numbers = pdf.Root.StructTreeRoot.ParentTree.Nums
        assert numbers[0] == pdf.pages[0].StructParents == 0 and numbers[1][0].objgen == figure.objgen
        assert content(pdf).startswith("/Figure <</MCID 0>> BDC") and content(pdf).rstrip().endswith("EMC")


def test_words_can_be_read_back_though_they_are_outlines() -> None:
    with opened(wording()) as pdf:
        found = re.findall(r"/ActualText <([0-9a-f]*)>", content(pdf))
        assert [bytes.fromhex(each).decode("utf-16") for each in found] == [
            "Section A–A",
            "Ωμέγα 1:2",
            "turned 30°",
            "8 & <9>",
        ]


def test_black_is_grey_so_that_it_prints_with_one_ink() -> None:
    with opened(dense()) as pdf:
        assert " rg" not in content(pdf) and content(pdf).count("0 g 0 G") == 1
    with opened(page(line([(1, 1), (2, 2)], colour=(255, 0, 51)))) as pdf:
        assert "1 0 .2 rg" in content(pdf).replace("0.2", ".2")
        space = pdf.pages[0].Resources.ColorSpace.DefaultRGB
        assert space[0] == pikepdf.Name.ICCBased and space[1].N == 3


def test_a_picture_comes_back_pixel_by_pixel() -> None:
    mark = picture().groups[0].items[0]
    assert isinstance(mark, Image)
    grey = np.repeat(mark.pixels[:, :, :1], 3, axis=2)
    for pixels in (mark.pixels, grey):
        with opened(page(Image(pixels, mark.place))) as pdf:
            read = pikepdf.PdfImage(pdf.pages[0].Resources.XObject.Im0).as_pil_image()
            assert np.array_equal(np.asarray(read.convert("RGB")), pixels)
            left, top, width, height = mark.place
            matrix = re.search(r"([^\n]*) cm /Im0 Do", content(pdf))
            assert matrix is not None
            assert list(map(float, matrix[1].split())) == pytest.approx([width, 0, 0, -height, left, top + height])


def test_lines_have_the_lengths_and_widths_asked() -> None:
    """A 50 mm line read from the page: its matrix and its points; all other numbers are mm."""
    with opened(page(line([(3.0, 4.0), (53.0, 4.0)], 0.35), width=60.0)) as pdf:
        text = content(pdf)
    scale, _, _, flip, _, up = map(float, re.findall(r"(.*) cm", text)[0].split())
    assert -flip == scale and up == pytest.approx(30.48 * POINT, abs=1e-4)
    start, end = re.findall(r"(\S+) (\S+) [ml]\b", text)
    assert (float(end[0]) - float(start[0])) * scale / POINT == pytest.approx(50.0, abs=1e-4)
    assert re.search(r"^\.35 w$", text, re.MULTILINE)


@pytest.mark.parametrize("sweep", [1.0, 44.0, 45.5, 90.0, 179.999, 180.0, 180.001, 271.0, 359.0])
@pytest.mark.parametrize("is_clockwise", [True, False])
def test_arcs_become_cubics_within_a_hundred_thousandth(sweep: float, is_clockwise: bool) -> None:
    """Every point against the implicit ellipse, and the whole sweep run through in the right sense."""
    a, b, turn, first = 30.0, 11.0, 25.0, 40.0
    sense = 1.0 if is_clockwise else -1.0
    frame = np.array([[a * np.cos(t := np.radians(turn)), -b * np.sin(t)], [a * np.sin(t), b * np.cos(t)]])

    def at(degrees: float) -> tuple[float, float]:
        x, y = frame @ (np.cos(np.radians(degrees)), np.sin(np.radians(degrees)))
        return float(x), float(y)

    start, end = at(first), at(first + sense * sweep)
    cubics = arc_cubics(start, Arc((a, b), turn, sweep > 180.0, is_clockwise, end))
    assert tuple(cubics[-1]) == end
    t = np.linspace(0.0, 1.0, 33)[:, None]
    points, here = [], np.array(start)
    for p1, p2, p3 in cubics.reshape(-1, 3, 2):
        points.append((1 - t) ** 3 * here + 3 * (1 - t) ** 2 * t * p1 + 3 * (1 - t) * t**2 * p2 + t**3 * p3)
        here = p3
    units = np.linalg.solve(frame, np.concatenate(points).T).T
    assert np.abs(np.hypot(*units.T) - 1.0).max() < 1e-5
    angles = np.unwrap(np.arctan2(units[:, 1], units[:, 0]))
    assert angles[-1] - angles[0] == pytest.approx(sense * np.radians(sweep), abs=1e-6)


def test_straight_arcs_and_short_axes() -> None:
    """SVG 1.1 F.6.2 and F.6.6: no axis is a straight line; axes too short grow until they reach."""
    assert len(arc_cubics((0.0, 0.0), Arc((0.0, 3.0), 0.0, False, True, (1.0, 1.0)))) == 0
    grown = arc_cubics((0.0, 0.0), Arc((1.0, 1.0), 0.0, False, True, (10.0, 0.0)))
    assert np.abs(np.hypot(*(grown[2::3] - (5.0, 0.0)).T) - 5.0).max() < 1e-9
    whole = Path((0.0, 0.0), (Arc((1.0, 1.0), 0.0, False, True, (2.0, 0.0)),))
    assert end_of(whole.pieces[0]) == (2.0, 0.0)


def test_circles_of_halves_are_whole() -> None:
    with opened(page(Stroke(ellipse((20, 15), 9, 9), 0.5, LineClass.VISIBLE_OUTLINE))) as pdf:
        points = [tuple(map(float, found)) for found in re.findall(r"(\S+) (\S+) c\b", content(pdf))]
    assert len(points) == 8
    assert np.abs(np.hypot(*(np.array(points) - (20, 15)).T) - 9.0).max() < 1e-4

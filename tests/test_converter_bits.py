"""Two values: one width in pixels for a weight, thresholds, and the files that hold them."""

from __future__ import annotations

import io

import numpy as np
import pytest
from PIL import Image as Picture
from platewright.backend import converter
from platewright.backend.contract import U8
from platewright.backend.converter import Bits
from platewright.backend.drawing import Drawing, Fill, Image
from platewright.backend.write.bilevel import group4_bytes, png_bits_bytes
from support.drawings import chain, grid, line, page, wording


def unpacked(bits: Bits) -> U8:
    return np.unpackbits(bits.rows, axis=1)[:, : bits.columns]


def run_lengths(values: U8) -> list[int]:
    """Lengths of the runs of ones."""
    ends = np.flatnonzero(np.diff(np.concatenate(([0], values, [0]))))
    return (ends[1::2] - ends[::2]).tolist()


@pytest.mark.parametrize("resolution", [300.0, 600.0, 1200.0])
@pytest.mark.parametrize("width", [0.18, 0.25, 0.35, 0.5, 0.7])
def test_a_weight_has_one_width_in_pixels_wherever_it_runs(resolution: float, width: float) -> None:
    """25 level lines at odd places: each is its width rounded to whole pixels; so are upright ones."""
    marks = [line([(2.0, 2.011 + 1.0937 * k), (9.0, 2.011 + 1.0937 * k)], width) for k in range(25)]
    marks += [line([(10.511 + 1.0937 * k, 2.0), (10.511 + 1.0937 * k, 28.0)], width) for k in range(25)]
    ink = unpacked(converter.bits(page(*marks), resolution))
    scale = resolution / 25.4
    n_pixels = max(1, int(np.floor(width * scale + 0.5)))
    assert run_lengths(ink[:, int(5.0 * scale)]) == [n_pixels] * 25
    assert run_lengths(ink[int(15.0 * scale), int(9.5 * scale) :]) == [n_pixels] * 25


def test_without_snapping_widths_would_differ() -> None:
    """The check above can fail: unsnapped lines of 0.25 mm at 300 dpi are two to four pixels wide."""
    marks = [line([(2.0, 2.011 + 1.0937 * k), (9.0, 2.011 + 1.0937 * k)], 0.25) for k in range(25)]
    ink = unpacked(converter.bits(page(*marks), 300.0, is_snapped=False))
    assert len(set(run_lengths(ink[:, 60]))) > 1


def test_lines_move_by_half_a_pixel_at_most_and_stay_joined() -> None:
    """A closed outline with a slanting side: its corners meet, and no side moves further than half a pixel."""
    points = [(5.03, 4.07), (20.11, 4.07), (24.0, 15.3), (5.03, 15.3)]
    drawing = page(line(points, 0.35, is_closed=True))
    snapped = unpacked(converter.bits(drawing, 600.0))
    plain = unpacked(converter.bits(drawing, 600.0, is_snapped=False))
    for found in (snapped, plain):
        rows, columns = np.flatnonzero(found.any(axis=1)), np.flatnonzero(found.any(axis=0))
        box = np.array((columns[0], rows[0], columns[-1] + 1, rows[-1] + 1)) * 25.4 / 600.0
        assert np.abs(box - (4.855, 3.895, 24.175, 15.475)).max() < 1.01 * 25.4 / 600.0
    import cv2

    assert cv2.connectedComponents(snapped)[0] == 2  # the paper and one line
    assert cv2.connectedComponents(1 - snapped, connectivity=4)[0] == 3  # the line, the inside and the outside


def test_snapping_is_for_grey_pictures_too() -> None:
    image = converter.pixels(grid(), 300.0, is_snapped=True)[:, :, 0]
    assert set(image[: int(16 * 300 / 25.4), int(10 * 300 / 25.4)].tolist()) == {0, 255}


def test_half_a_pixel_of_ink_is_paper_and_more_is_ink() -> None:
    pixel = 25.4 / 254.0

    def fill(height: float) -> Fill:
        return Fill(
            (chain([(0, 0), (10 * pixel, 0), (10 * pixel, height * pixel), (0, height * pixel)], True),), (0,) * 3
        )

    def inked(height: float) -> list[int]:
        return unpacked(converter.bits(Drawing(1.0, 0.4, (page(fill(height)).groups)), 254.0))[:, 3].tolist()

    assert inked(1.5) == [1, 0, 0, 0]
    assert inked(1.51) == [1, 1, 0, 0]


def test_dark_colours_are_ink_and_light_ones_paper() -> None:
    """The middle is level 128 of grey; red is dark, if barely, yellow light (luminance of IEC 61966-2-1)."""
    colours = np.array([(127, 127, 127), (128, 128, 128), (255, 0, 0), (255, 255, 0), (0, 0, 255)], np.uint8)
    expected = [1, 0, 1, 0, 1]
    assert converter.is_dark(colours).tolist() == expected
    pixel = 25.4 / 254.0
    picture = page(Image(colours[None], (0.0, 0.0, 5 * pixel, pixel)), width=0.5, height=0.1)
    assert unpacked(converter.bits(picture, 254.0)).tolist() == [expected]


def test_thin_weights_are_told() -> None:
    """0.18 mm is 4.25 pixels at 600 dpi and 2.13 at 300."""
    assert converter.thin_weights(grid(), 600.0) == ()
    thin = converter.thin_weights(grid(), 300.0)
    assert [width for width, _ in thin] == [0.18, 0.25]
    assert [n for _, n in thin] == pytest.approx([0.18 * 300 / 25.4, 0.25 * 300 / 25.4])


def test_files_of_two_values_give_their_bits_back() -> None:
    bits = converter.bits(wording(), 600.0)
    expected = np.where(unpacked(bits) == 1, 0, 255)
    for data in (group4_bytes(bits, 600.0), png_bits_bytes(bits, 600.0)):
        with Picture.open(io.BytesIO(data)) as read:
            assert read.mode == "1"
            assert np.array_equal(np.asarray(read.convert("L")), expected)
            assert tuple(map(float, read.info["dpi"])) == pytest.approx((600.0, 600.0), abs=0.01)
    assert group4_bytes(bits, 600.0) == group4_bytes(bits, 600.0)


def test_the_tiff_says_what_offices_ask_for() -> None:
    """TIFF 6.0: compression 4 is T.6, photometric 0 is white as zero, one bit, one sample, inches."""
    with Picture.open(io.BytesIO(group4_bytes(converter.bits(wording(), 600.0), 600.0))) as read:
        tags = read.tag_v2
        assert (tags[259], tags[262], tags[258], tags[277], tags[296]) == (4, 0, (1,), 1, 2)
        assert float(tags[282]) == float(tags[283]) == 600.0
        assert not {305, 306, 315, 316} & set(tags)  # software, date, artist, host


def test_a_png_of_two_values_bears_its_words() -> None:
    data = png_bits_bytes(converter.bits(wording(), 300.0), 300.0, (("Title", "A"),))
    assert b"iTXtTitle" in data and data[24:26] == b"\x01\x00"  # one bit, grey

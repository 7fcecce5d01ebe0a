"""The converter: exact areas by closed forms, what hides what, seams, clips, pictures, bands and threads."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from platewright.backend import converter
from platewright.backend.contract import U8, Page
from platewright.backend.converter import gathering
from platewright.backend.drawing import Drawing, Fill, Group, Image, Mark
from support.drawings import SAMPLES, chain, clipped, dense, line, mosaic, page, picture

PX = 25.4 / 254.0  # mm of a pixel at 254 dots per inch: a tenth of a millimetre
DPI = 254.0


def painted(*marks: Group | Mark, columns: int = 12, rows: int = 8) -> U8:
    return converter.pixels(Drawing(columns * PX, rows * PX, (Group("panel", "", marks),)), DPI)


def quad(left: float, top: float, right: float, bottom: float, level: int = 0) -> Fill:
    corners = [(left * PX, top * PX), (right * PX, top * PX), (right * PX, bottom * PX), (left * PX, bottom * PX)]
    return Fill((chain(corners, True),), (level, level, level))


def level(cover: float) -> int:
    """Level of a white pixel covered so far with black, halves up."""
    return int(np.floor(255.0 * (1.0 - cover) + 0.5))


def test_the_size_is_that_of_the_page() -> None:
    for width, height, dpi in ((210.0, 297.0, 50.0), (17.3, 8.1, 96.0)):
        columns, rows = Page(width, height, dpi).pixels
        assert converter.pixels(Drawing(width, height, ()), dpi).shape == (rows, columns, 3)
        assert (converter.pixels(Drawing(width, height, ()), dpi) == 255).all()


def test_an_upright_rectangle_covers_what_it_says() -> None:
    image = painted(quad(2.25, 1.5, 6.75, 5.125))[:, :, 0]
    across = np.array([0, 0, 0.75, 1, 1, 1, 0.75, 0, 0, 0, 0, 0])
    down = np.array([0, 0.5, 1, 1, 1, 0.125, 0, 0])
    assert image.tolist() == [[level(a * b) for a in across] for b in down]


def test_a_slanting_side_covers_the_areas_of_its_trapezoids() -> None:
    """The side y = x / 4 leaves (k + 1/2) / 4 of pixel k above it, in the first row."""
    image = painted(Fill((chain([(0, 0), (0.8, 0.2), (0.0, 0.2)], True),), (0, 0, 0)))[:, :, 0]
    assert image[0, :4].tolist() == [level(1.0 - (k + 0.5) / 4.0) for k in range(4)]
    assert image[1, :4].tolist() == [0] * 4
    assert image[1, 4:8].tolist() == [level(1.0 - (k + 0.5) / 4.0) for k in range(4)]


def test_a_side_that_is_nearly_level_covers_the_areas_of_its_trapezoids() -> None:
    """A wedge from nothing to one pixel high over twelve: pixel k holds (k + 1/2) / 12."""
    image = painted(Fill((chain([(0, 0.3), (1.2, 0.3), (1.2, 0.4)], True),), (0, 0, 0)))[:, :, 0]
    assert image[3].tolist() == [level((k + 0.5) / 12.0) for k in range(12)]


def test_what_lies_above_hides_exactly_what_is_below() -> None:
    """Half black, then all of it white again: nothing may shine through; and a smaller one above adds no rim."""
    assert (painted(quad(2.5, 2.5, 7.5, 6.5), quad(2.5, 2.5, 7.5, 6.5, 255)) == 255).all()
    image = painted(quad(1.5, 1.5, 8.5, 6.5), quad(2.3, 2.3, 7.7, 5.7, 100), quad(2.3, 2.3, 7.7, 5.7, 0))
    assert np.array_equal(image, painted(quad(1.5, 1.5, 8.5, 6.5)))


def test_areas_that_share_sides_leave_no_seam() -> None:
    """A fan of triangles of one tint: inside its rim every pixel has that tint exactly, at any resolution."""
    for resolution in (96.0, 300.0, 768.0):
        image = converter.pixels(mosaic(), resolution)[:, :, 0]
        rows, columns = np.mgrid[: image.shape[0], : image.shape[1]]
        mm = 25.4 / resolution
        inner = np.hypot((columns + 0.5) * mm - 20.137, (rows + 0.5) * mm - 15.291) < 8.0
        assert inner.sum() > 500
        assert set(image[inner].tolist()) == {150}
        assert image.min() == 150


def test_even_odd_leaves_holes_and_strokes_do_not() -> None:
    outer, inner = chain([(0, 0), (1, 0), (1, 0.8), (0, 0.8)], True), chain([(0.2, 0.2), (0.6, 0.2), (0.6, 0.6)], True)
    image = painted(Fill((outer, inner), (0, 0, 0)))[:, :, 0]
    assert image[3, 5] == 255 and image[1, 1] == 0 and image[7, 9] == 0
    twice = line([(0.1, 0.4), (1.0, 0.4), (0.1, 0.4)], 0.2)
    assert np.array_equal(painted(twice), painted(line([(0.1, 0.4), (1.0, 0.4)], 0.2)))


def test_a_flat_stroke_is_its_rectangle_and_a_corner_its_mitre() -> None:
    stroke = line([(0.2, 0.25), (0.9, 0.25)], 0.3, False)
    assert np.array_equal(painted(stroke), painted(quad(2, 1, 9, 4)))
    corner = line([(0.2, 0.25), (0.8, 0.25), (0.8, 0.7)], 0.3, False)
    assert np.array_equal(painted(corner), painted(quad(2, 1, 9.5, 4), quad(6.5, 1, 9.5, 7)))


def test_a_round_end_has_the_area_of_half_a_disc() -> None:
    """Total ink of a line is length x width + a disc, of a point a disc, within 1 in 2 000 of the disc."""
    for resolution in (100.0, 600.0, 1200.0):
        scale = resolution / 25.4
        for points, length in (([(3.1, 3.3), (3.1, 3.3)], 0.0), ([(3.1, 3.3), (7.4, 5.2)], np.hypot(4.3, 1.9))):
            image = converter.pixels(page(line(points, 1.7), width=12, height=9), resolution)[:, :, 0]
            ink = float((255.0 - image).sum() / 255.0) / scale**2
            disc = np.pi * 0.85**2
            assert ink == pytest.approx(length * 1.7 + disc, abs=disc / 2000 + 4 * 0.5 / 255 / scale)


@pytest.mark.parametrize("name", sorted(SAMPLES))
def test_bands_and_threads_do_not_show(name: str) -> None:
    drawing = SAMPLES[name]()
    whole = converter.pixels(drawing, 203.0, threads=1)
    assert np.array_equal(whole, converter.pixels(drawing, 203.0, threads=3))
    for rows_at_a_time in (32, 96):
        bands = list(converter.bands(drawing, 203.0, rows_at_a_time, threads=2))
        assert len(bands) > 2
        assert np.array_equal(whole, np.concatenate(bands))


def test_two_values_do_not_depend_on_bands() -> None:
    one = converter.bits(dense(), 300.0, rows_at_a_time=10_000)
    for rows in (32, 64):
        assert np.array_equal(one.rows, converter.bits(dense(), 300.0, rows_at_a_time=rows).rows)


def test_grey_is_the_first_channel_and_only_without_colours() -> None:
    grey = converter.grey_pixels(dense(), 150.0)
    assert grey is not None
    assert np.array_equal(grey, converter.pixels(dense(), 150.0)[:, :, 0])
    assert converter.grey_pixels(picture(), 150.0) is None
    assert converter.grey_pixels(SAMPLES["islands"](), 150.0) is None


def test_a_clip_cuts_and_does_nothing_else() -> None:
    """Inside the clip all is as without it; outside nothing is painted."""
    drawing = clipped()
    bare = replace(drawing, groups=(replace(drawing.groups[0], clip=None),))
    cut, whole = converter.pixels(drawing, 200.0)[:, :, 0], converter.pixels(bare, 200.0)[:, :, 0]
    polygon = drawing.groups[0].clip
    assert polygon is not None
    mm = 25.4 / 200.0
    y, x = (np.mgrid[: cut.shape[0], : cut.shape[1]] + 0.5) * mm
    following = np.roll(polygon, -1, axis=0)
    depth = np.min(
        [
            ((b[0] - a[0]) * (y - a[1]) - (b[1] - a[1]) * (x - a[0])) / np.hypot(*(b - a))
            for a, b in zip(polygon, following, strict=True)
        ],
        axis=0,
    )
    inside, outside = depth > mm, depth < -mm
    assert np.array_equal(cut[inside], whole[inside])
    assert (cut[outside] == 255).all() and (whole[outside] < 255).sum() > 100


def test_a_clip_within_a_clip_is_what_they_share() -> None:
    square = np.array([(0.0, 0.0), (4.0, 0.0), (4.0, 4.0), (0.0, 4.0)])
    moved = square + np.array((2.0, 1.0))
    for other in (moved, moved[::-1]):
        found = gathering.common(square, other)
        assert sorted(map(tuple, found.tolist())) == [(2.0, 1.0), (2.0, 4.0), (4.0, 1.0), (4.0, 4.0)]
    assert len(gathering.common(square, square + 9.0)) == 0


def test_a_picture_on_the_grid_comes_back_pixel_by_pixel() -> None:
    levels = np.random.default_rng(5).integers(0, 256, (5, 7, 3), dtype=np.uint8)
    image = painted(Image(levels, (3 * PX, 2 * PX, 7 * PX, 5 * PX)))
    assert np.array_equal(image[2:7, 3:10], levels)
    assert (image[:2] == 255).all() and (image[:, :3] == 255).all() and (image[:, 10:] == 255).all()


def test_a_picture_in_between_is_the_mean_of_what_a_pixel_sees() -> None:
    levels = np.array([[[0], [200]], [[100], [40]]], np.uint8).repeat(3, axis=2)
    image = painted(Image(levels, (0.0, 0.0, 4 * PX, 2 * PX)), Image(levels, (6 * PX, 3 * PX, PX, PX)))[:, :, 0]
    assert image[:2, :4].tolist() == [[0, 0, 200, 200], [100, 100, 40, 40]]
    assert image[3, 6] == 85
    moved = painted(Image(levels, (0.5 * PX, 0.0, 4 * PX, 2 * PX)))[:, :, 0]
    assert moved[0, :5].tolist() == [128, 0, 100, 200, 228]


def test_a_picture_lies_in_register_with_lines_over_it() -> None:
    """Centroids of a dark square in the picture and of a fill in its place agree to 0.001 mm at an odd scale."""
    levels = np.full((60, 90, 3), 255, np.uint8)
    levels[20:40, 30:70] = 0
    left, top, width, height = 3.217, 2.871, 27.013, 18.009
    square = [(left + width * k / 90, top + height * j / 60) for k, j in ((30, 20), (70, 20), (70, 40), (30, 40))]
    found = []
    for mark in (Image(levels, (left, top, width, height)), Fill((chain(square, True),), (0, 0, 0))):
        ink = 255.0 - converter.pixels(page(mark), 300.0)[:, :, 0]
        y, x = np.mgrid[: ink.shape[0], : ink.shape[1]] + 0.5
        found.append(np.array(((ink * x).sum(), (ink * y).sum())) / ink.sum() * 25.4 / 300.0)
    assert np.abs(found[0] - found[1]).max() < 0.001


def test_more_edges_in_a_row_than_there_are_slabs_for() -> None:
    """A comb of 4 000 teeth in two rows of pixels keeps its mean tint and stays within its bounds."""
    teeth = [(0.1 + 1e-4 * k, 0.2 if k % 2 else 0.4) for k in range(8000)]
    image = painted(Fill((chain([*teeth, (0.9, 0.5), (0.1, 0.5)], True),), (0, 0, 0)))[:, :, 0]
    assert (image[2:4, 2:8].mean(axis=1) - (255 * 0.75, 255 * 0.25)).tolist() == pytest.approx([0, 0], abs=3)
    assert (image[4, 1:9] == 0).all() and (image[:2] == 255).all() and (image[5:] == 255).all()


def test_nothing_is_painted_off_the_page() -> None:
    """Marks that reach over all sides, or lie outside, give the same page as their parts within it."""
    wide = quad(-50, 2, 90, 5)
    assert np.array_equal(painted(wide, quad(-9, -9, -2, -2)), painted(quad(0, 2, 12, 5)))
    tall = line([(0.55, -30.0), (0.55, 40.0)], 0.3)
    assert np.array_equal(painted(tall), painted(quad(4, 0, 7, 8)))

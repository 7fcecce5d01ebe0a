"""Coverage against areas by shapely (GEOS): polygons, strokes as buffered lines, and what later marks leave to be seen.

GEOS computes the polygons and their parts in each pixel by another method than ours. Levels are those of
255 (1 - area), and a TIFF of two values is read back by tifffile and imagecodecs.
"""

from __future__ import annotations

import io

import numpy as np
import pytest
import shapely
from platewright.backend import converter
from platewright.backend.contract import F64, U8
from platewright.backend.drawing import Drawing, Fill, Group, Mark
from platewright.backend.write.bilevel import group4_bytes
from support.drawings import chain, dense, line, wording

COLUMNS, ROWS, DPI = 48, 36, 254.0
PX = 25.4 / DPI


def painted(*marks: Mark) -> U8:
    return converter.pixels(Drawing(COLUMNS * PX, ROWS * PX, (Group("panel", "", marks),)), DPI)[:, :, 0]


def areas(shape: shapely.Geometry) -> F64:
    """Area of the shape in each pixel (rows, columns), in pixels."""
    columns, rows = np.meshgrid(np.arange(COLUMNS), np.arange(ROWS))
    boxes = shapely.box(columns * PX, rows * PX, (columns + 1) * PX, (rows + 1) * PX)
    return shapely.area(shapely.intersection(boxes, shape)) / PX**2


def polygon(random: np.random.Generator, n: int) -> list[tuple[float, float]]:
    """A star-shaped polygon, partly off the page."""
    middle = random.uniform((0.5, 0.5), (COLUMNS * PX - 0.5, ROWS * PX - 0.5))
    angles = np.sort(random.uniform(0, 2 * np.pi, n))
    radii = random.uniform(0.2, 2.0, n)
    return [
        (float(middle[0] + r * np.cos(t)), float(middle[1] + r * np.sin(t))) for r, t in zip(radii, angles, strict=True)
    ]


@pytest.mark.parametrize("seed", range(12))
def test_polygons_cover_their_areas(seed: int) -> None:
    """Two star-shaped polygons by the even-odd rule: their symmetric difference. Within rounding to a level."""
    random = np.random.default_rng(seed)
    rings = [polygon(random, int(random.integers(3, 14))) for _ in range(2)]
    image = painted(Fill(tuple(chain(ring, True) for ring in rings), (0, 0, 0)))
    shapes = [shapely.make_valid(shapely.Polygon(ring)) for ring in rings]
    expected = 255.0 * (1.0 - areas(shapely.symmetric_difference(*shapes)))
    assert np.abs(image - expected).max() <= 0.5 + 1e-3


@pytest.mark.parametrize("is_round", [True, False])
@pytest.mark.parametrize("seed", range(8))
def test_strokes_cover_their_lines_with_width(seed: int, is_round: bool) -> None:
    """Random zigzags, turning back sharply and over themselves; 256 chords a quarter; mitres up to 4 (SVG 1.1).

    GEOS cuts mitres beyond the limit elsewhere than SVG has it, so flat lines turn by less than 150 degrees.
    """
    random = np.random.default_rng(100 + seed)
    directions = np.cumsum(random.uniform(-2.5, 2.5, 6) if is_round else random.uniform(-1.9, 1.9, 6))
    steps = random.uniform(0.4, 1.5, 6)[:, None] * np.column_stack((np.cos(directions), np.sin(directions)))
    points = [tuple(map(float, point)) for point in np.array((2.4, 1.8)) + np.cumsum(steps, axis=0)]
    width = float(random.uniform(0.12, 0.4))
    image = painted(line(points, width, is_round))
    styles = ("round", "round") if is_round else ("flat", "mitre")
    shape = shapely.buffer(
        shapely.LineString(points), width / 2, quad_segs=256, cap_style=styles[0], join_style=styles[1], mitre_limit=4.0
    )
    error = image - 255.0 * (1.0 - areas(shape))
    assert np.abs(error).max() <= (2.5 if is_round else 0.51)
    # Some 500 pixels rounded to levels are 0.29 sqrt(500) levels off in the sum: 0.05 pixels is twice that.
    assert abs(error.sum()) / 255.0 < 0.05


@pytest.mark.parametrize("seed", range(6))
def test_later_marks_hide_earlier_ones_exactly(seed: int) -> None:
    """Five polygons of five levels over one another: a pixel is the mean of what is seen in it, by set algebra."""
    random = np.random.default_rng(200 + seed)
    marks, expected, seen = [], np.full((ROWS, COLUMNS), 255.0), []
    for level in (20, 220, 90, 160, 0):
        ring = polygon(random, 7)
        marks.append(Fill((chain(ring, True),), (level,) * 3))
        seen = [(shapely.difference(shape, shapely.make_valid(shapely.Polygon(ring))), below) for shape, below in seen]
        seen.append((shapely.make_valid(shapely.Polygon(ring)), level))
    for shape, level in seen:
        expected += (level - 255.0) * areas(shape)
    assert np.abs(painted(*marks) - expected).max() <= 0.5 + 1e-3


def test_two_values_are_ink_where_more_than_half_is_covered() -> None:
    drawing = dense()
    grey = converter.grey_pixels(drawing, 300.0)
    bits = converter.bits(drawing, 300.0, is_snapped=False)
    assert grey is not None
    assert np.array_equal(np.unpackbits(bits.rows, axis=1)[:, : bits.columns] == 1, grey < 128)


def test_group_4_is_read_alike_by_opencv() -> None:
    """OpenCV reads TIFF by a libtiff of its own: ink is black, paper white."""
    import cv2

    bits = converter.bits(wording(), 600.0)
    read = cv2.imdecode(np.frombuffer(group4_bytes(bits, 600.0), np.uint8), cv2.IMREAD_GRAYSCALE)
    ink = np.unpackbits(bits.rows, axis=1)[:, : bits.columns]
    assert ink.any() and np.array_equal(read, np.where(ink == 1, 0, 255))


def test_group_4_is_read_alike_by_another_decoder() -> None:
    """tifffile unpacks with imagecodecs' own T.6 decoder; white is zero, so ink is one (TIFF 6.0, section 8)."""
    tifffile = pytest.importorskip("tifffile")
    pytest.importorskip("imagecodecs", reason="imagecodecs unpacks Group 4 for tifffile")
    bits = converter.bits(wording(), 600.0)
    with tifffile.TiffFile(io.BytesIO(group4_bytes(bits, 600.0))) as file:
        (sheet,) = file.pages
        assert sheet.photometric == tifffile.PHOTOMETRIC.MINISWHITE
        assert sheet.compression == tifffile.COMPRESSION.CCITT_T6
        ink = sheet.asarray()
    assert np.array_equal(ink.astype(np.uint8), np.unpackbits(bits.rows, axis=1)[:, : bits.columns])

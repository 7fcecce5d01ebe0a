"""Whole sheets: panels in their places, surveys, measures, files, and what a broken job gives."""

from __future__ import annotations

import io
import subprocess
import sys
from dataclasses import replace

import numpy as np
import pytest
from PIL import Image
from platewright.backend import camera, raster, sheet
from platewright.backend.contract import (
    ContractError,
    Emphasis,
    Job,
    MeasureWanted,
    Page,
    Panel,
    Sheet,
    Style,
)
from platewright.backend.raster.survey import EDGE_ON_LEVEL, FACE_ON_LEVEL, FARTHEST_LEVEL, NEAREST_LEVEL, part_colour
from support.raster_models import MATT, PAINT, assemble, block, panel, plan, sphere, triangles

PAGE = Page(30.0, 20.0, 127.0)  # 150 x 100 px


def job_of(geometry, *panels: Panel, page: Page = PAGE, **more) -> Job:
    return Job((geometry,), (PAINT, MATT), Sheet("figure", page, panels, **more))


def two_blocks():
    return assemble([block("a", (4, -10, 0), (14, -4, 2)), block("b", (10, -8, 4), (20, -2, 6), 1)])


def test_panels_fill_their_places_and_no_more() -> None:
    geometry = assemble([block("a", (-99, -99, 0), (99, 99, 2))])
    whole = panel(plan(PAGE), PAGE)
    left = replace(whole, place=(2.0, 2.0, 10.0, 16.0))
    right = replace(whole, place=(12.0, 2.0, 16.03, 16.0))
    image = sheet.draw(job_of(geometry, left, right), ("png",)).image
    assert image is not None and image.shape == (100, 150, 3)
    filled = (image < 255).all(axis=2)
    expected = np.zeros((100, 150), bool)
    expected[10:90, 10:140] = True
    assert (filled == expected).all()


def test_a_later_panel_covers_an_earlier_one() -> None:
    geometry = assemble([block("a", (-99, -99, 0), (12, 99, 2))])
    whole = panel(plan(PAGE), PAGE)
    over = replace(whole, emphasis=np.full(2, Emphasis.HIDE, np.uint8), place=(0.0, 0.0, 6.0, 20.0))
    image = sheet.draw(job_of(geometry, whole, over), ("tiff",)).image
    assert image is not None
    assert (image[:, :30] == 255).all() and (image[:, 30:60] < 255).all() and (image[:, 60:] == 255).all()


def test_nothing_is_drawn_when_no_picture_is_asked_for() -> None:
    drawing = sheet.draw(job_of(two_blocks(), panel(plan(PAGE), PAGE)), ("csv",))
    assert drawing.image is None and drawing.measures == ()
    with pytest.raises(ContractError, match="no picture"):
        sheet.encode(drawing, job_of(two_blocks()), "png")


@pytest.mark.parametrize("kind", ["png", "tiff"])
def test_files_hold_the_picture_and_its_resolution(kind: str) -> None:
    job = job_of(two_blocks(), panel(plan(PAGE), PAGE), title="Two blocks", alt="One above the other.")
    drawing = sheet.draw(job, (kind,))
    with Image.open(io.BytesIO(sheet.encode(drawing, job, kind))) as picture:
        assert (np.asarray(picture) == drawing.image).all()
        assert abs(float(picture.info["dpi"][0]) - 127.0) < 0.01
    again = sheet.draw(job, (kind,), threads=1)
    assert sheet.encode(again, job, kind) == sheet.encode(drawing, job, kind)


def test_part_survey_shows_each_node_in_its_own_flat_colour() -> None:
    geometry = two_blocks()
    image = sheet.draw(job_of(geometry, panel(plan(PAGE), PAGE, 1, "survey part")), ("png",)).image
    assert image is not None
    colours = {tuple(int(v) for v in colour) for colour in image.reshape(-1, 3)}
    assert colours == {(255, 255, 255), part_colour(1), part_colour(2)}
    # b stands above a and covers 10 x 6 mm at 5 px a mm.
    assert (image == part_colour(2)).all(axis=2).sum() == 50 * 30
    assert (image == part_colour(1)).all(axis=2).sum() == 50 * 30 - 20 * 20


def test_part_colours_are_unique_and_never_white() -> None:
    colours = {part_colour(row) for row in range(50_000)}
    assert len(colours) == 50_000 and (255, 255, 255) not in colours


def test_a_survey_is_never_smoothed() -> None:
    geometry = assemble([sphere("a", 7, (15, -10, 0))])
    image = sheet.draw(job_of(geometry, panel(plan(PAGE), PAGE, 4, "survey part")), ("png",)).image
    assert image is not None and len(np.unique(image.reshape(-1, 3), axis=0)) == 2


def test_depth_survey_is_even_in_distance() -> None:
    ramp = triangles("r", [(0, 0, 0), (30, 0, 12), (30, -20, 12), (0, -20, 0)], [[0, 2, 1], [0, 3, 2]])
    image = sheet.draw(job_of(assemble([ramp]), panel(plan(PAGE), PAGE, 1, "survey depth")), ("png",)).image
    assert image is not None
    x = (np.arange(150) + 0.5) / 150
    expected = FARTHEST_LEVEL + (NEAREST_LEVEL - FARTHEST_LEVEL) * x
    assert np.abs(image[50, :, 0] - expected).max() <= 0.51 and (image[..., 0] == image[..., 2]).all()
    eye = camera.central((15, -10, 40), (15, -10, 0), 40.0, (15, 10), up=(0, 1, 0))
    image = sheet.draw(job_of(assemble([ramp]), panel(eye, PAGE, 1, "survey depth")), ("png",)).image
    assert image is not None
    # Along the middle row the ray at page x meets z = 0.4 (15 + t (x - 15)), t = (40 - z) / 40.
    page = (np.arange(150) + 0.5) / 5 - 15
    z = 0.4 * (15 + page) / (1 + 0.4 * page / 40)
    expected = FARTHEST_LEVEL + (NEAREST_LEVEL - FARTHEST_LEVEL) * z / 12
    inside = (z > 0.2) & (z < 11.8)
    assert np.abs(image[50, inside, 0] - expected[inside]).max() <= 1.01


def test_facing_survey_tells_the_sides_and_the_angle() -> None:
    up = triangles("u", [(0, 0, 0), (10, 0, 0), (10, -20, 0), (0, -20, 0)], [[0, 2, 1], [0, 3, 2]])
    down = triangles("d", [(10, 0, 0), (20, 0, 0), (20, -20, 0), (10, -20, 0)], [[0, 1, 2], [0, 2, 3]])
    steep = triangles(
        "s", [(20, 0, 0), (30, 0, 10 * 3**0.5), (30, -20, 10 * 3**0.5), (20, -20, 0)], [[0, 2, 1], [0, 3, 2]]
    )
    image = sheet.draw(job_of(assemble([up, down, steep]), panel(plan(PAGE), PAGE, 1, "survey facing")), ("png",)).image
    assert image is not None
    assert image[50, 25].tolist() == [FACE_ON_LEVEL] * 3
    assert image[50, 75].tolist() == [FACE_ON_LEVEL, FACE_ON_LEVEL // 4, FACE_ON_LEVEL // 4]
    assert image[50, 125].tolist() == [(FACE_ON_LEVEL + EDGE_ON_LEVEL) // 2] * 3


def test_measures_are_areas_on_paper_whatever_the_resolution() -> None:
    geometry = two_blocks()
    asked = (MeasureWanted(0, 1), MeasureWanted(0, 2), MeasureWanted(0, 0))
    found = sheet.draw(job_of(geometry, panel(plan(PAGE), PAGE), measures=asked), ()).measures
    coarse = replace(PAGE, resolution=50.0)
    assert sheet.draw(job_of(geometry, panel(plan(coarse), coarse), page=coarse, measures=asked), ()).measures == found
    # a is 10 x 6 mm, of which b hides 4 x 4; sampling errs by at most half a sample (1/600 inch) along each side.
    for measure, visible, whole, box in (
        (found[0], 44.0, 60.0, (4, 4, 14, 10)),
        (found[1], 60.0, 60.0, (10, 2, 20, 8)),
        (found[2], 104.0, 104.0, (4, 2, 20, 10)),
    ):
        assert abs(measure.visible - visible) < 36 * 25.4 / 1200
        assert abs(measure.unoccluded - whole) < 36 * 25.4 / 1200
        assert measure.box is not None and np.abs(np.array(measure.box) - box).max() < 0.085


def test_a_hidden_part_measures_nothing() -> None:
    geometry = two_blocks()
    drawn = replace(panel(plan(PAGE), PAGE), emphasis=np.array([0, 0, Emphasis.HIDE], np.uint8))
    under = assemble([block("a", (5, -9, 0), (9, -6, 2)), block("b", (4, -10, 4), (20, -2, 6), 1)])
    hidden = sheet.draw(job_of(geometry, drawn, measures=(MeasureWanted(0, 2),)), ()).measures[0]
    covered = sheet.draw(job_of(under, panel(plan(PAGE), PAGE), measures=(MeasureWanted(0, 1),)), ()).measures[0]
    assert (hidden.visible, hidden.unoccluded, hidden.box) == (0.0, 0.0, None)
    assert covered.visible == 0.0 and covered.box is None and abs(covered.unoccluded - 12.0) < 0.2


def test_progress_rises_to_one() -> None:
    told: list[float] = []
    drawn = panel(plan(PAGE), PAGE)
    sheet.draw(
        job_of(two_blocks(), drawn, replace(drawn, style=Style("survey part", 1))), ("png",), progress=told.append
    )
    assert told == sorted(told) and told[-1] == 1.0 and len(told) > 5


def test_a_broken_job_is_refused_at_the_door() -> None:
    job = job_of(two_blocks(), panel(plan(PAGE), PAGE))
    with pytest.raises(ContractError, match="version"):
        sheet.draw(replace(job, version=0), ("png",))
    huge = Page(3000.0, 10.0, 600.0)
    with pytest.raises(ContractError, match="more than 31000"):
        sheet.draw(job_of(two_blocks(), panel(plan(huge), huge), page=huge), ("png",))


def test_numba_is_imported_only_to_draw() -> None:
    code = "import sys; import platewright.backend.sheet; sys.exit('numba' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


@pytest.mark.slow
def test_an_a4_page_at_600_dpi_is_drawn_in_bands() -> None:
    page = Page(210.0, 297.0, 600.0)
    assert page.pixels == (4961, 7016)
    geometry = assemble([sphere("a", 95, (105, -148, 0), 200), block("b", (3, -294, -99), (207, -3, -97))])
    image = sheet.draw(job_of(geometry, panel(plan(page), page), page=page), ("png",)).image
    assert image is not None and (image[3000:4000, 1000:4000] < 255).any(axis=2).all()
    part = replace(panel(plan(page), page), place=(100.0, 140.0, 20.0, 20.0))
    columns, rows = page.pixels
    alone = np.full((rows, columns, 3), 255, np.uint8)
    raster.paint(geometry, part, page, (PAINT, MATT), alone)
    window = (slice(3308, 3779), slice(2363, 2834))
    # The same samples; attributes are counted from other tile corners, so a tone may round the other way.
    assert np.abs(alone[window].astype(int) - image[window]).max() <= 1

"""Figures: pages, scales, views and light, measured where points of the model land on the page."""

from __future__ import annotations

import math

import numpy as np
import pytest
from platewright.backend import camera, contract
from platewright.compiler import scene
from platewright.compiler.frames import STANDARD_SCALES
from platewright.compiler.lightings import WHITE
from platewright.lang.problems import Severity
from support.scenes import built, checked, clean, planned

BOX = "part box\n    add block (100 mm, 60 mm, 40 mm)\n    cut cylinder diameter 30 mm length 40 mm\n"
BALL = "part ball\n    add sphere diameter 80 mm\n"


def figure(*lines: str, show: str = "show box", part: str = BOX) -> contract.Job:
    text = part + "figure f\n" + "".join(f"    {line}\n" for line in (show, *lines) if line)
    return planned(text, "f")


def content(job: contract.Job) -> tuple[float, float, float, float]:
    """Left, top, right and bottom of the subject on the page, mm."""
    points, _ = camera.to_page(job.sheet.panels[0].projection, job.geometries[0].vertices)
    (left, top), (right, bottom) = points.min(axis=0), points.max(axis=0)
    return float(left), float(top), float(right), float(bottom)


def margins(job: contract.Job) -> tuple[float, float, float, float]:
    """Paper free on the left, above, on the right and below, round the ink: half of an outline lies outside."""
    left, top, right, bottom = content(job)
    page, style = job.sheet.page, job.sheet.panels[0].style
    ink = style.wide / 2 if style.is_of_lines else 0.0
    return left - ink, top - ink, page.width - right - ink, page.height - bottom - ink


def on_page(job: contract.Job, *points: tuple[float, float, float]) -> np.ndarray:
    return camera.to_page(job.sheet.panels[0].projection, np.array(points, np.float64))[0]


def test_84_mm_at_600_dpi_are_1984_pixels() -> None:
    assert figure().sheet.page.pixels[0] == 1984
    text = BOX + "figure f\n    width 84 mm\n"
    assert planned(text, "f", resolution=300).sheet.page.pixels[0] == 992


def test_a_scene_without_figures_draws_its_one_unplaced_thing() -> None:
    job = planned(BOX + "assembly all\n    place box\n    place box as other at (200 mm, 0, 0)\n", "all")
    assert job.sheet.name == "all" and job.sheet.page.width == 84.0
    assert [node.path for node in job.geometries[0].nodes] == ["all", "all.box", "all.other"]


def test_a_figure_that_says_nothing_is_fitted_to_84_mm_with_2_mm_round_it() -> None:
    job = figure(show="")
    assert job.sheet.page.width == 84.0
    assert margins(job) == pytest.approx((2, 2, 2, 2), abs=0.1)
    assert job.sheet.panels[0].style.drawn_as == "lines"
    assert job.sheet.files == ("png",)


@pytest.mark.parametrize(
    ("lines", "page", "limiting"),
    [
        (("width 120 mm",), (120, None), "both"),
        (("width 120 mm at most 30 mm",), (120, 30), "tall"),
        (("width 120 mm at most 300 mm",), (120, None), "both"),
        (("size 100 mm by 100 mm",), (100, 100), "wide"),
        (("size 100 mm by 20 mm",), (100, 20), "tall"),
        (("width 60 mm", "margin 0 mm"), (60, None), "both"),
        (("width 60 mm", "margin 7.5 mm"), (60, None), "both"),
    ],
)
@pytest.mark.parametrize("view", ["front", "isometric", "top"])
def test_the_content_fills_the_limiting_side_and_stands_in_the_middle(
    lines: tuple[str, ...], page: tuple[float, float | None], limiting: str, view: str
) -> None:
    job = figure(*lines, "drawn as tone", show=f"show box from {view}")
    margin = {"margin 0 mm": 0.0, "margin 7.5 mm": 7.5}.get(lines[-1], 2.0)
    assert job.sheet.page.width == page[0]
    if page[1] is not None:
        assert job.sheet.page.height == pytest.approx(page[1])
    left, top, right, bottom = margins(job)
    assert left == pytest.approx(right, abs=0.1) and top == pytest.approx(bottom, abs=0.1)
    assert min(left, top) == pytest.approx(margin, abs=0.1)
    if limiting == "both":
        assert (left, top) == pytest.approx((margin, margin), abs=0.1)


SIDES = {
    "front": ((100, 0, 0), (0, 0, 40)),
    "rear": ((-100, 0, 0), (0, 0, 40)),
    "right": ((0, 60, 0), (0, 0, 40)),
    "left": ((0, -60, 0), (0, 0, 40)),
    "top": ((100, 0, 0), (0, 60, 0)),
    "bottom": ((100, 0, 0), (0, -60, 0)),
}


@pytest.mark.parametrize("side", SIDES)
def test_an_edge_along_an_axis_keeps_the_scale_in_orthographic_views(side: str) -> None:
    job = figure("scale 1:2", show=f"show box from {side}")
    origin, right, up = on_page(job, (0, 0, 0), *SIDES[side])
    across, along = np.subtract(right, origin), np.subtract(up, origin)
    assert across == pytest.approx((abs(sum(SIDES[side][0])) / 2, 0), abs=1e-9)
    assert along == pytest.approx((0, -abs(sum(SIDES[side][1])) / 2), abs=1e-9)
    assert job.sheet.panels[0].projection.scale == pytest.approx(0.5)


@pytest.mark.parametrize("axis", range(3))
def test_an_edge_of_100_mm_measures_50_mm_at_1_to_2_along_any_axis_of_an_isometric_view(axis: int) -> None:
    end = [0.0, 0.0, 0.0]
    end[axis] = 100.0
    for lines, length in ((("scale 1:2",), 50.0), (("scale 1:2", "true projection"), 50.0 * math.sqrt(2 / 3))):
        job = figure(*lines, show="show box from isometric")
        start, stop = on_page(job, (0, 0, 0), (end[0], end[1], end[2]))
        assert math.dist(start, stop) == pytest.approx(length, abs=1e-9)


def test_isometric_views_from_all_eight_corners_show_the_side_they_name() -> None:
    for depth, y in (("front", -1), ("rear", 1)):
        for side, x in (("left", -1), ("right", 1)):
            for height, z in (("above", 1), ("below", -1)):
                text = BOX + f"viewpoint v\n    isometric from {depth} {side} {height}\nfigure f\n    show box from v\n"
                sight = planned(text, "f").sheet.panels[0].projection.sight
                assert sight == pytest.approx((-x / math.sqrt(3), -y / math.sqrt(3), -z / math.sqrt(3)))


def test_a_scale_makes_the_page_unless_the_page_is_stated() -> None:
    job = figure("scale 1:4", "margin 3 mm", "drawn as tone", show="show box from front")
    assert (job.sheet.page.width, job.sheet.page.height) == pytest.approx((31, 16))
    job = figure("scale 1:4", "size 80 mm by 50 mm", "drawn as tone", show="show box from front")
    assert (job.sheet.page.width, job.sheet.page.height) == pytest.approx((80, 50))
    assert margins(job) == pytest.approx((27.5, 20, 27.5, 20))


@pytest.mark.parametrize(("width", "scale"), [(84, 1 / 2), (104, 1), (103, 1 / 2), (53, 1 / 5), (204, 2), (24, 1 / 5)])
def test_a_standard_scale_is_the_largest_of_the_series_that_fits(width: int, scale: float) -> None:
    job = figure("scale standard", f"width {width} mm", "drawn as tone", show="show box from front")
    assert job.sheet.panels[0].projection.scale == pytest.approx(scale)


def test_a_standard_scale_holds_in_central_projection_at_the_target() -> None:
    text = (
        BOX
        + "viewpoint v\n    eye (0, -1000 mm, 0) toward (0, 0, 0)\nfigure f\n    show box from v\n    scale standard\n"
    )
    job = planned(text, "f")
    assert job.sheet.panels[0].projection.scale == pytest.approx(0.5)
    start, stop = on_page(job, (-10, 0, 0), (10, 0, 0))
    assert math.dist(start, stop) == pytest.approx(10, abs=1e-9)


def view(*lines: str) -> str:
    return "viewpoint v\n" + "".join(f"    {line}\n" for line in lines)


def test_a_lens_takes_in_what_its_film_does() -> None:
    part = BOX + view("eye (0, -1000 mm, 20 mm) toward (0, 0, 20 mm)", "lens 85 mm")
    job = figure("size 90 mm by 60 mm", show="show box from v", part=part)
    # 36 mm of film at 85 mm take in 36/85 of the distance; the page is 90 mm wide.
    start, stop = on_page(job, (-50, 0, 20), (50, 0, 20))
    assert math.dist(start, stop) == pytest.approx(100 * 85 / 1000 * 90 / 36, abs=1e-9)
    assert on_page(job, (0, 0, 20))[0] == pytest.approx((45, 30), abs=1e-9)


def test_a_film_and_an_angle_of_view() -> None:
    for lines in (("lens 50 mm on 24 mm",), (f"angle of view {2 * math.degrees(math.atan(12 / 50))!r} deg",)):
        part = BOX + view("eye (0, -1000 mm, 20 mm) toward (0, 0, 20 mm)", *lines)
        job = figure("size 90 mm by 60 mm", show="show box from v", part=part)
        start, stop = on_page(job, (-50, 0, 20), (50, 0, 20))
        assert math.dist(start, stop) == pytest.approx(100 * 50 / 1000 * 90 / 24, abs=1e-9)


def test_an_eye_without_a_field_of_view_is_fitted_and_never_moved() -> None:
    part = BOX + view("eye (-300 mm, -400 mm, 250 mm) toward (0, 0, 20 mm)")
    job = figure("width 70 mm", show="show box from v", part=part)
    assert margins(job) == pytest.approx((2, 2, 2, 2), abs=0.1)
    assert job.sheet.panels[0].projection.eye == (-300.0, -400.0, 250.0)


def test_nearer_things_are_larger_in_central_projection() -> None:
    part = BOX + view("eye (0, -500 mm, 20 mm) toward (0, 0, 20 mm)")
    job = figure(show="show box from v", part=part)
    near, far = (np.diff(on_page(job, (-50, y, 0), (50, y, 0)), axis=0)[0][0] for y in (-30, 30))
    assert near / far == pytest.approx(530 / 470)


def test_a_subject_past_the_edge_is_a_warning() -> None:
    text = BOX + view("eye (0, -300 mm, 20 mm) toward (0, 0, 20 mm)", "lens 200 mm")
    run = checked(text + "figure f\n    show box from v\n    size 50 mm by 50 mm\n")
    (problem,) = run.problems
    assert (problem.code, problem.severity, problem.within) == ("cropped", Severity.WARNING, "f")


def test_a_parallel_view_along_any_direction() -> None:
    part = BOX + view("parallel along (-1, 2, -1)")
    sight = figure(show="show box from v", part=part).sheet.panels[0].projection.sight
    assert sight == pytest.approx(tuple(np.array((-1, 2, -1)) / math.sqrt(6)))


def test_a_figure_shows_what_is_placed_in_an_assembly_in_its_own_frame() -> None:
    text = BOX + "part lid\n    add block (50 mm, 20 mm, 4 mm)\nassembly a\n    place box\n"
    text += "    place lid at (0, 0, 40 mm) turn 90 deg ring 1\nfigure f\n    show a.lid[1] from top\n"
    text += "    scale 1:1\n    margin 0 mm\n    drawn as tone\n"
    job = planned(text, "f")
    assert (job.sheet.page.width, job.sheet.page.height) == pytest.approx((50, 20))
    assert [node.path for node in job.geometries[0].nodes] == ["a.lid[1]"]


def test_a_figure_shows_a_thing_with_values_of_its_own() -> None:
    text = "part rod(d)\n    add cylinder diameter d length 2 * d\n    cut sphere diameter d / 2\n"
    text += "figure f\n    show rod(d = 30 mm) from front\n    scale 1:1\n    margin 0 mm\n"
    text += "    drawn as tone\n"
    job = planned(text, "f")
    assert (job.sheet.page.width, job.sheet.page.height) == pytest.approx((30, 60))
    sources = {job.geometries[0].sources[row].line for row in np.unique(job.geometries[0].face_source)}
    assert sources == {2, 3}


def test_a_mistake_in_a_thing_made_for_one_figure_is_told_there() -> None:
    text = (
        BOX + "part rod(d)\n    add cylinder diameter d length 9 mm - d\nfigure f\n    show rod(d = 30 mm)\n"
        "figure other\n    show box\n"
    )
    (error,) = checked(text).errors
    assert (error.code, error.within, error.span.line) == ("out-of-range", "f", 5)


def test_words_and_kinds_of_file_go_with_the_sheet() -> None:
    job = figure('title "The box"', 'alt "A box."', 'description "A box with a bore."', "files tiff, png, tiff")
    assert (job.sheet.title, job.sheet.alt, job.sheet.description) == ("The box", "A box.", "A box with a bore.")
    assert job.sheet.files == ("tiff", "png")


@pytest.mark.parametrize(
    ("style", "samples"), [("tone", 4), ("survey part", 1), ("survey depth", 1), ("survey facing", 1)]
)
def test_styles(style: str, samples: int) -> None:
    assert figure(f"drawn as {style}").sheet.panels[0].style == contract.Style(style, samples)  # type: ignore[arg-type]


def test_measures_are_asked_for_the_subject_and_what_it_holds() -> None:
    run = clean(BOX + "assembly a\n    place box\n    place box as b at (0, 0, 90 mm)\nfigure f\n    show a\n")
    assert run.model is not None
    job, _ = scene.plan(run.model, "f", run.meshes, measures=True)
    assert job is not None
    assert [wanted.node for wanted in job.sheet.measures] == [0, 1, 2]
    assert planned(BOX, "box").sheet.measures == ()


def test_the_rung_of_a_figure_keeps_to_two_hundredths_of_a_millimetre_on_paper() -> None:
    for width in (20, 84, 300):
        job = figure(f"width {width} mm", show="show ball from front", part=BALL)
        vertices = job.geometries[0].vertices
        level = vertices[np.abs(vertices[:, 2]) < 1e-9]
        n = len(np.unique(np.round(level, 6), axis=0))
        sagitta = 40 * (1 - math.cos(math.pi / n)) * job.sheet.panels[0].projection.scale
        assert sagitta <= 0.02 * 1.001


# --- light


def lights(lighting: str, show: str = "show ball from front under noon", part: str = BALL) -> contract.Lighting:
    body = "".join(f"    {line}\n" for line in lighting.split("; "))
    return figure(show=show, part=part + "lighting noon\n" + body).sheet.panels[0].lighting


def test_the_default_light_comes_from_the_upper_left_front_at_45_degrees_in_the_picture() -> None:
    for name in ("front", "isometric", "top", "right"):
        panel = figure(show=f"show ball from {name}", part=BALL).sheet.panels[0]
        (key,) = (light for light in panel.lighting.lights if light.kind == "directional")
        toward = np.array(key.vector)
        right, up, sight = (
            np.array(each) for each in (panel.projection.right, panel.projection.up, panel.projection.sight)
        )
        assert toward @ toward == pytest.approx(1)
        assert math.degrees(math.atan2(toward @ up, toward @ right)) == pytest.approx(135)
        assert toward @ sight < 0
        assert toward == pytest.approx(np.array(camera.upper_left(panel.projection)))


@pytest.mark.parametrize(
    ("corner", "degrees"),
    [("upper left", 135), ("upper right", 45), ("lower left", -135), ("lower right", -45), ("left", 180), ("right", 0),
     ("above", 90)],
)  # fmt: skip
def test_a_light_keeps_its_corner_of_the_picture(corner: str, degrees: float) -> None:
    (light,) = lights(f"light from {corner}").lights
    x, _, z = light.vector  # seen from the front, x is right and z is up
    assert math.degrees(math.atan2(z, x)) == pytest.approx(degrees)


def test_the_sun_stands_by_elevation_and_by_azimuth_from_north_over_east() -> None:
    (north,) = lights("sun elevation 30 deg azimuth 0 deg").lights
    (east,) = lights("sun elevation 30 deg azimuth 90 deg").lights
    assert north.vector == pytest.approx((0, math.cos(math.radians(30)), 0.5))
    assert east.vector == pytest.approx((math.cos(math.radians(30)), 0, 0.5))


def test_the_exposure_shows_white_that_faces_the_strongest_light_just_short_of_paper_white() -> None:
    for lighting, brightest in (
        ("light from eye illuminance 700 lx", 700.0),
        ("light from eye illuminance 700 lx; ambient 300 lx", 1000.0),
        ("light from above illuminance 90 klx", 90000.0),
    ):
        found = lights(lighting)
        assert found.exposure * brightest == pytest.approx(WHITE)
    # 800 lm all round are 800 / 4 pi cd; at 2 m a quarter of that many lux.
    found = lights("lamp at (0, -2 m, 0) flux 800 lm")
    assert found.exposure * 800 / (4 * math.pi) / 4 == pytest.approx(WHITE)
    assert found.lights[0].power == pytest.approx((800 / (4 * math.pi),) * 3)


def test_an_exposure_is_a_factor_on_the_automatic_one_and_repeats() -> None:
    plain, doubled = lights("light from left; ambient 100 lx"), lights("light from left; ambient 100 lx; exposure 2")
    assert doubled.exposure == pytest.approx(2 * plain.exposure)
    assert lights("light from left; ambient 100 lx") == plain


def test_brightness_as_a_whole_does_not_change_the_picture() -> None:
    dim, bright = lights("light from left illuminance 10 lx"), lights("light from left illuminance 100 klx")
    assert dim.exposure * dim.lights[0].power[0] == pytest.approx(bright.exposure * bright.lights[0].power[0])


# --- materials


def material(*lines: str) -> contract.Material:
    body = "".join(f"    {line}\n" for line in lines)
    part = f"material stuff\n{body}part box\n    made of stuff\n    add block (9 mm, 9 mm, 9 mm)\n"
    (found,) = figure(part=part).materials
    return found


def test_what_nothing_is_said_of_is_plain_white_and_forty_per_cent_gloss() -> None:
    (found,) = figure().materials
    assert (found.name, found.flat, found.roughness, found.metal) == ("", (255, 255, 255), 0.6, False)
    assert found.colour == pytest.approx((1, 1, 1)) and found.normal_reflectance == (0.04, 0.04, 0.04)


def test_a_colour_is_decoded_and_a_gloss_leaves_roughness() -> None:
    found = material('colour "#ff8000"', "gloss 75 %", "density 2.7 g/cm3")
    assert found.colour == pytest.approx((1.0, 0.2158605, 0.0), abs=1e-6)
    assert found.flat == (255, 128, 0) and found.roughness == pytest.approx(0.25)
    assert found.density == pytest.approx(2.7)


def test_a_metal_has_no_diffuse_part_and_its_own_reflectance() -> None:
    found = material("metal gold")
    assert found.metal and found.colour == (0.0, 0.0, 0.0)
    red, green, blue = found.normal_reflectance
    assert red > green > blue


def test_a_colour_beside_a_metal_has_no_effect_and_says_so() -> None:
    text = 'material stuff\n    metal iron\n    colour "#ff0000"\npart box\n    made of stuff\n'
    text += "    add block (9 mm, 9 mm, 9 mm)\n"
    (problem,) = checked(text).problems
    assert (problem.code, problem.severity, problem.span.line) == ("no-effect", Severity.WARNING, 3)


def test_two_builds_plan_the_same_job() -> None:
    text = BOX + view("eye (-300 mm, -400 mm, 250 mm) toward (0, 0, 20 mm)") + "figure f\n    show box from v\n"
    one, other = planned(text, "f"), planned(text, "f")
    assert one.geometries[0].key == other.geometries[0].key
    assert one.sheet.page == other.sheet.page and one.materials == other.materials
    panels = [job.sheet.panels[0] for job in (one, other)]
    assert panels[0].projection.world_to_page.tobytes() == panels[1].projection.world_to_page.tobytes()
    assert panels[0].lighting == panels[1].lighting


def test_the_series_of_standard_scales_is_that_of_the_standard() -> None:
    """ISO 5455: 1, 2 and 5 times the powers of ten; enlargements and reductions named there."""
    named = [50, 20, 10, 5, 2, 1, 1 / 2, 1 / 5, 1 / 10, 1 / 20, 1 / 50, 1 / 100, 1 / 200, 1 / 500, 1 / 1000, 1 / 10000]
    for each in named:
        assert any(abs(each - scale) < 1e-12 for scale in STANDARD_SCALES), each
    assert list(STANDARD_SCALES) == sorted(STANDARD_SCALES, reverse=True)
    assert built(BOX).problems == []


def test_an_eye_inside_a_solid_is_a_problem_unless_the_solid_is_hidden_or_hollow_there() -> None:
    text = (
        "part shell\n    add block (40 mm, 40 mm, 40 mm)\n    cut block (30 mm, 30 mm, 30 mm) at (0, 0, 5 mm)\n"
        "part post\n    add block (4 mm, 4 mm, 10 mm)\n"
        "assembly a\n    place shell\n    place post at (0, 0, 10 mm)\n"
        "viewpoint wall\n    eye (18 mm, 0, 20 mm) toward (0, 0, 20 mm)\n    angle of view 60 deg\n"
        "viewpoint hollow\n    eye (12 mm, 0, 15 mm) toward (0, 0, 15 mm)\n    angle of view 60 deg\n"
        "figure f\n    show a from {}\n    size 60 mm by 60 mm\n{}"
    )

    def problems(viewpoint: str, line: str) -> list[str]:
        return [f"{each.code}: {each.sentence}" for each in checked(text.format(viewpoint, line)).problems]

    assert problems("wall", "")[-1] == "eye-inside: the eye stands inside `a.shell`"
    for viewpoint, line in (("hollow", ""), ("wall", "    hide shell\n")):
        assert not [each for each in problems(viewpoint, line) if each.startswith("eye-inside")]

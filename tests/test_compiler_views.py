"""View sets, views by reference arrow, styles of panels, notes on filling: measured where points land on the sheet."""

from __future__ import annotations

import math

import numpy as np
import pytest
from platewright.backend import camera, contract
from platewright.compiler import scene
from platewright.compiler.layout import GAP_MM
from platewright.compiler.signs import SYMBOL_WIDTH
from platewright.lang.problems import Problem, Severity
from support.scenes import built, checked, planned

BOX = """part box
    add block (100 mm, 60 mm, 40 mm)
    cut cylinder diameter 30 mm length 40 mm at (20 mm, 10 mm, 0)
    mark slope at (50 mm, 0, 20 mm) along (1, 0, 1)
    mark corner at (50 mm, -30 mm, 40 mm)
"""


def figure(*lines: str, part: str = BOX) -> contract.Job:
    return planned(part + "figure f\n" + "".join(f"    {line}\n" for line in lines), "f")


def problems_of(*lines: str, part: str = BOX) -> list[Problem]:
    shown = lines if any(line.startswith("show") for line in lines) else (*lines, "show box")
    return checked(part + "figure f\n" + "".join(f"    {line}\n" for line in shown)).problems


def the_problem(*lines: str, part: str = BOX) -> Problem:
    (problem,) = problems_of(*lines, part=part)
    return problem


def panel(job: contract.Job, view: str) -> contract.Panel:
    return next(each for each in job.sheet.panels if each.name == f"box {view}")


def on_page(job: contract.Job, view: str, *points: tuple[float, float, float]) -> np.ndarray:
    return camera.to_page(panel(job, view).projection, np.array(points, np.float64))[0]


def box_of(job: contract.Job, each: contract.Panel) -> tuple[np.ndarray, np.ndarray]:
    points, _ = camera.to_page(each.projection, job.geometries[each.geometry].vertices)
    return points.min(axis=0), points.max(axis=0)


FIRST = {"top": (0, 1), "bottom": (0, -1), "left": (1, 0), "right": (-1, 0), "rear": (2, 0)}
THIRD = {"top": (0, -1), "bottom": (0, 1), "left": (-1, 0), "right": (1, 0), "rear": (2, 0)}


@pytest.mark.parametrize(("method", "cells"), [("first angle", FIRST), ("third angle", THIRD)])
def test_views_stand_round_the_front_view_as_iso_5456_2_says(method: str, cells: dict[str, tuple[int, int]]) -> None:
    # ISO 5456-2:1996, 5.1: first angle, the view from above below, from below above, from the left to the right, from
    # the right to the left; third angle, the other way round; the view from the rear on either side.
    job = figure("show box", f"{method} front, rear, left, right, top, bottom", "width 200 mm")
    front_low, front_high = box_of(job, panel(job, "front"))
    for view, (column, row) in cells.items():
        low, high = box_of(job, panel(job, view))
        if column:
            assert (low[0] > front_high[0]) if column > 0 else (high[0] < front_low[0])
            assert (low[1], high[1]) == pytest.approx((front_low[1], front_high[1]), abs=1e-9)
        if row:
            assert (low[1] > front_high[1]) if row > 0 else (high[1] < front_low[1])
            assert (low[0], high[0]) == pytest.approx((front_low[0], front_high[0]), abs=1e-9)
    outermost = max(job.sheet.panels, key=lambda each: box_of(job, each)[0][0])
    assert outermost.name == "box rear"
    assert {each.projection.scale for each in job.sheet.panels} == {job.sheet.panels[0].projection.scale}


def test_every_point_lies_over_and_beside_itself() -> None:
    job = figure("show box", "third angle front, top, right, left", "width 150 mm")
    point = (20.0, 25.0, 40.0)
    front, top, right, left = (on_page(job, view, point)[0] for view in ("front", "top", "right", "left"))
    assert front[0] == pytest.approx(top[0], abs=1e-9)
    assert front[1] == pytest.approx(right[1], abs=1e-9) and front[1] == pytest.approx(left[1], abs=1e-9)


def test_neighbouring_views_show_the_edges_they_share_as_the_method_wants() -> None:
    # Third angle: what lies next to the front view is the object's front; first angle: its rear.
    third, first = (
        figure("show box", f"{each} angle front, top", "width 80 mm", "drawn as tone") for each in ("third", "first")
    )
    near, far = (0.0, -30.0, 40.0), (0.0, 30.0, 40.0)
    for job, nearest, other in ((third, near, far), (first, far, near)):
        front = box_of(job, panel(job, "front"))
        gaps = []
        for point in (nearest, other):
            y = on_page(job, "top", point)[0][1]
            gaps.append(min(abs(y - front[0][1]), abs(y - front[1][1])))
        assert gaps[0] == pytest.approx(GAP_MM) and gaps[1] > gaps[0]


def test_a_set_fills_its_page_and_panels_do_not_overlap() -> None:
    job = figure("show box", "third angle front, top, right", "width 120 mm", "drawn as tone")
    boxes = [box_of(job, each) for each in job.sheet.panels]
    low, high = np.min([each[0] for each in boxes], axis=0), np.max([each[1] for each in boxes], axis=0)
    page = job.sheet.page
    assert (low[0], page.width - high[0]) == pytest.approx((2, 2), abs=0.1)
    assert (low[1], page.height - high[1]) == pytest.approx((2, 2), abs=0.1)
    for k, one in enumerate(job.sheet.panels):
        for other in job.sheet.panels[k + 1 :]:
            apart = [
                one.place[axis] + one.place[axis + 2] <= other.place[axis] + 1e-9
                or other.place[axis] + other.place[axis + 2] <= one.place[axis] + 1e-9
                for axis in (0, 1)
            ]
            assert any(apart)
        left, top, wide, tall = one.place
        assert (boxes[k][0] >= (left, top)).all() and (boxes[k][1] <= (left + wide, top + tall)).all()


def test_views_of_one_subject_share_their_triangles() -> None:
    job = figure("show box", "first angle front, top, left", "width 120 mm")
    assert len(job.geometries) == 1 and {each.geometry for each in job.sheet.panels} == {0}


@pytest.mark.parametrize("scale", ["1:2", "1:5", "2:1"])
def test_a_stated_scale_holds_in_every_view_of_a_set(scale: str) -> None:
    job = figure("show box", "third angle front, top, right, isometric", f"scale {scale}")
    first, second = (float(each) for each in scale.split(":"))
    for view, axes in (("front", (0, 2)), ("top", (0, 1)), ("right", (1, 2)), ("isometric", (0, 1, 2))):
        for axis in axes:
            end = [0.0, 0.0, 0.0]
            end[axis] = 100.0
            start, stop = on_page(job, view, (0, 0, 0), (end[0], end[1], end[2]))
            assert math.dist(start, stop) == pytest.approx(100 * first / second, abs=1e-9)


def test_a_pictorial_view_stands_in_the_free_corner() -> None:
    third = figure("show box", "third angle front, top, right, isometric", "width 150 mm")
    first = figure("show box", "first angle front, top, left, isometric", "width 150 mm")
    for job, above in ((third, True), (first, False)):
        front, corner = box_of(job, panel(job, "front")), box_of(job, panel(job, "isometric"))
        assert corner[0][0] > front[1][0]
        assert corner[1][1] < front[0][1] if above else corner[0][1] > front[1][1]


@pytest.mark.parametrize("size", ["width 84 mm", "width 150 mm", "size 150 mm by 150 mm", "scale 1:2"])
@pytest.mark.parametrize(
    "views",
    [
        "first angle front, top, left",
        "third angle front, top, right",
        "first angle front, left",
        "third angle front, left, right, top, bottom",
        "third angle front, top, right, isometric",
    ],
)
def test_the_symbol_of_the_method_stands_free_on_the_page(size: str, views: str) -> None:
    job = figure("show box", views, size)
    (symbol,) = job.sheet.symbols
    assert symbol.method == " ".join(views.split()[:2])
    left, top = symbol.place
    right, bottom = left + SYMBOL_WIDTH * symbol.height, top + symbol.height
    page, slack = job.sheet.page, 1e-9
    assert left > 2 - slack and right < page.width - 2 + slack and bottom < page.height - 2 + slack
    for each in job.sheet.panels:
        low, high = box_of(job, each)
        assert high[0] < left - 1 or low[0] > right + 1 or high[1] < top - 1 or low[1] > bottom + 1
    assert figure("show box").sheet.symbols == ()


@pytest.mark.parametrize(
    ("lines", "code", "says"),
    [
        (("first angle top, left",), "wrong-form", "front view"),
        (("first angle front, top, top",), "said-twice", "`top` stands twice"),
        (("first angle front, tpo",), "unknown-name", "no viewpoint `tpo`"),
        (("first angle front, top", "third angle front, top"), "said-twice", "one set"),
        (("show box from isometric", "first angle front, top"), "said-twice", "from isometric"),
        (("first angle front, top, left, right", "width 20 mm"), "does-not-fit", "leave no paper"),
        (("first angle front, top", "size 40 mm by 40 mm", "scale 1:1"), "does-not-fit", "needs"),
        (("show box from front", "view along y as A"), "edge-on-view", "end-on"),
        (("show box from front", "view along x as A", "view along z as A"), "said-twice", "letter A"),
        (("show box from front", "view along x as side"), "wrong-form", "capital letter"),
        (("show box from top", "section across z at 20 mm", "view along x as A"), "said-twice", "letter A"),
    ],
)
def test_mistakes_in_sets_are_located_problems(lines: tuple[str, ...], code: str, says: str) -> None:
    problem = the_problem(*lines)
    assert (problem.code, problem.within) == (code, "f") and says in problem.sentence
    assert problem.hint or code in ("said-twice", "unknown-name")


EYE = "viewpoint near\n    eye (-300 mm, -500 mm, 260 mm) toward (0, 0, 20 mm)\n    lens 50 mm\n"


@pytest.mark.parametrize(
    "lines", [("third angle front, near",), ("show box from near", "detail of corner enlarged 3 diameter 10 mm")]
)
def test_a_view_that_says_what_its_page_takes_in_shares_it_with_none(lines: tuple[str, ...]) -> None:
    problem = the_problem(*lines, part=BOX + EYE)
    assert problem.code == "does-not-fit" and "field of view" in problem.sentence and "lens" in problem.hint
    assert problems_of(*lines, part=BOX + EYE.replace("    lens 50 mm\n", "")) == []


# --- views by reference arrow


def test_a_view_by_reference_arrow_looks_along_it_and_has_its_letter() -> None:
    job = figure("show box from front", "view along (-1, 0, -1) as A", "view along -x as B", "width 150 mm")
    assert [each.name for each in job.sheet.panels] == ["box", "box A", "box B"]
    slanting = panel(job, "A")
    assert slanting.projection.sight == pytest.approx((-math.sqrt(0.5), 0, -math.sqrt(0.5)))
    assert not slanting.style.is_pictorial and slanting.style.centre_lines
    assert [text.text for text in job.sheet.inscriptions] == ["A", "B"]
    for text, each in zip(job.sheet.inscriptions, job.sheet.panels[1:], strict=True):
        low, high = box_of(job, each)
        assert low[0] < text.place[0] < high[0] and text.place[1] < low[1]
        assert text.place[1] - text.height > 0
    low, high = box_of(job, job.sheet.panels[0])
    for arrow, sight in zip(job.sheet.panels[0].arrows, ((-1, 0, 1), (-1, 0, 0)), strict=True):
        tip = camera.to_page(job.sheet.panels[0].projection, np.array([arrow.tip]))[0][0]
        assert (tip < low - 1).any() or (tip > high + 1).any()
        along = camera.to_page(job.sheet.panels[0].projection, np.array([arrow.tip, np.add(arrow.tip, arrow.sight)]))[0]
        drawn = along[1] - along[0]
        assert drawn / np.linalg.norm(drawn) == pytest.approx(np.array(sight)[[0, 2]] / np.linalg.norm(sight))
        # From the tip on, the arrow's line meets the content.
        steps = tip + np.linspace(0, 300, 3001)[:, None] * drawn / np.linalg.norm(drawn)
        assert ((steps > low) & (steps < high)).all(axis=1).any()


def test_an_auxiliary_view_shows_an_inclined_face_in_its_true_shape() -> None:
    part = "part ramp\n    add wedge (60 mm, 30 mm, 40 mm)\n    mark slope at (0, 0, 20 mm) along (2, 0, 3)\n"
    text = part + "figure f\n    show ramp from front\n    view along slope as A\n    scale 1:1\n"
    job = planned(text, "f")
    corners = np.array([(-30, -15, 40), (-30, 15, 40), (30, -15, 0)], np.float64)
    page, _ = camera.to_page(job.sheet.panels[1].projection, corners)
    main, sight = job.sheet.panels[0], job.sheet.panels[1].projection.sight
    assert sight == pytest.approx(np.array((-2, 0, -3)) / math.sqrt(13))
    # The arrow points at the mark.
    tip, mark = camera.to_page(main.projection, np.array([main.arrows[0].tip, (0.0, 0, 20)]))[0]
    assert (mark - tip) / math.dist(mark, tip) == pytest.approx(np.array((-2, 3)) / math.sqrt(13))
    assert math.dist(mark, tip) < 20
    assert math.dist(page[0], page[1]) == pytest.approx(30)
    assert math.dist(page[0], page[2]) == pytest.approx(math.hypot(60, 40))


def test_a_local_view_is_clipped_to_its_circle() -> None:
    job = figure("show box from front", "view along -z as B round corner diameter 20 mm", "scale 1:1")
    view = panel(job, "B")
    assert view.clip is not None
    centre = camera.to_page(view.projection, np.array([(50.0, -30.0, 40.0)]))[0][0]
    radii = np.linalg.norm(view.clip - centre, axis=1)
    assert radii == pytest.approx(10, abs=0.05)
    assert job.sheet.links == ()


def test_there_is_room_on_the_page_for_arrows_and_their_letters() -> None:
    for line in ("view along -x as A", "view along x as A", "view along z as A", "view along (1, 0, -1) as A"):
        for size in ("width 84 mm", "size 150 mm by 100 mm", "scale 1:1"):
            job = figure("show box from front", line, size)
            main = job.sheet.panels[0]
            (arrow,) = main.arrows
            tip, other = camera.to_page(main.projection, np.array([arrow.tip, np.add(arrow.tip, arrow.sight)]))[0]
            height = job.sheet.inscriptions[0].height
            tail = tip - (other - tip) / math.dist(tip, other) * 3 * height
            for point in (tip, tail):
                assert (point >= 2).all() and (point <= (main.place[2] + main.place[0], job.sheet.page.height)).all()


def test_there_is_room_on_the_page_for_centre_lines_and_for_half_an_outline() -> None:
    part = "part rod\n    add cylinder diameter 20 mm length 50 mm\n"
    for line, margin in (("drawn as lines", 4), ("drawn as tone", 2), ("centre lines off\n    drawn as lines", 2.175)):
        job = figure("show rod from front", "width 84 mm", line, part=part)
        low, high = box_of(job, job.sheet.panels[0])
        assert (low[1], job.sheet.page.height - high[1]) == pytest.approx((margin, margin), abs=0.01)
    plate = "part plate\n    add block (60 mm, 40 mm, 4 mm)\n    cut cylinder diameter 6 mm length 4 mm\n"
    job = figure("show plate from top", "width 84 mm", "drawn as lines", part=plate)
    assert box_of(job, job.sheet.panels[0])[0] == pytest.approx((2.175, 2.175), abs=0.01)


# --- styles


def style(*lines: str) -> contract.Style:
    return figure(*lines).sheet.panels[0].style


def test_what_is_said_of_lines_goes_into_the_style() -> None:
    found = style(
        "show box from front", "drawn as lines", "hidden edges dashed", "tangent edges off", "edges from 20 deg",
        "centre lines off", "line group 0.7 mm", "gaps 0.6 mm", "shade lines",
    )  # fmt: skip
    assert found == contract.Style("lines", 4, 0.7, 20.0, True, False, False, False, 0.6, True)
    assert style("drawn as lines", "gaps").gap == 0.7
    for kind in ("lines", "lines and tone", "tints", "stipple"):
        assert style(f"drawn as {kind}").drawn_as == kind


def test_defaults_of_lines() -> None:
    plain = style("drawn as lines", "show box")
    assert (plain.hidden, plain.tangent, plain.sharp_angle, plain.gap, plain.shade_lines) == (
        False,
        True,
        30.0,
        0.0,
        False,
    )
    assert plain.is_pictorial and not plain.centre_lines
    square = style("drawn as lines", "show box from front")
    assert not square.is_pictorial and square.centre_lines
    assert style("drawn as lines", "centre lines on", "show box").centre_lines


@pytest.mark.parametrize(
    ("lines", "wide"),
    [(("width 84 mm",), 0.35), (("width 100 mm",), 0.35), (("width 101 mm",), 0.5), (("scale 2:1",), 0.5),
     (("width 200 mm", "line group 0.25 mm"), 0.25)],
)  # fmt: skip
def test_the_line_group_follows_the_width_of_the_page(lines: tuple[str, ...], wide: float) -> None:
    assert style("show box", *lines).wide == wide


def test_a_view_along_an_axis_or_onto_an_inclined_side_is_no_pictorial_one() -> None:
    for along, pictorial in (("(0, 1, 0)", False), ("(0, 1, -1)", False), ("(-1, 2, -1)", True)):
        job = figure("show box from v", part=BOX + f"viewpoint v\n    parallel along {along}\n")
        assert job.sheet.panels[0].style.is_pictorial is pictorial


@pytest.mark.parametrize(
    ("line", "code", "hint"),
    [
        ("line group 0.4 mm", "out-of-range", "0.35"),
        ("edges from 0 deg", "out-of-range", ""),
        ("edges from 180 deg", "out-of-range", ""),
        ("gaps 6 mm", "out-of-range", "leave `gaps` out"),
        ("exploded 200", "out-of-range", ""),
    ],
)
def test_mistakes_in_styles(line: str, code: str, hint: str) -> None:
    problem = the_problem(line)
    assert problem.code == code and hint in problem.hint and problem.span.line == len(BOX.splitlines()) + 2


def test_words_of_lines_change_nothing_in_a_picture_in_tone() -> None:
    problem = the_problem("drawn as tone", "hidden edges dashed")
    assert (problem.code, problem.severity) == ("no-effect", Severity.WARNING)
    assert problems_of("hidden edges dashed", "drawn as lines") == []


def test_every_kind_of_file_is_known() -> None:
    assert figure("files svg, pdf, eps, png, tiff").sheet.files == ("svg", "pdf", "eps", "png", "tiff")
    assert the_problem("files bmp").code == "unknown-name"


# --- filling the page


def note(*lines: str, part: str = BOX) -> Problem | None:
    run = built(part + "figure f\n" + "".join(f"    {line}\n" for line in lines))
    assert run.model is not None
    _, problems = scene.plan(run.model, "f", run.meshes)
    return problems[0] if problems else None


def test_a_standard_scale_that_leaves_much_of_the_page_free_names_projections_that_leave_less() -> None:
    slim = "part rod\n    add cylinder diameter 10 mm length 90 mm\n"
    found = note("show rod", "size 60 mm by 84 mm", "scale standard", part=slim)
    assert found is not None
    assert (found.code, found.severity, found.within) == ("page-half-empty", Severity.NOTE, "f")
    # 90 mm along z and 10 mm of foot, isometrically at 1:2, on 80 mm.
    job_height = (90 + 10 * math.sqrt(1.5) * math.sin(math.radians(35.264390))) / 2
    assert f"{job_height / 80:.0%}" in found.sentence and "1:2" in found.sentence


def test_a_note_can_be_accepted_in_its_figure() -> None:
    slim = "part rod\n    add cylinder diameter 10 mm length 90 mm\n"
    text = slim + 'figure f\n    show rod\n    size 60 mm by 84 mm\n    scale standard\n    accept "page-half-empty"\n'
    run = checked(text)
    assert run.project is not None
    (note,), (acceptance,) = run.problems, run.project.acceptances
    assert note.severity is Severity.NOTE and acceptance.covers(note)


def test_projections_that_are_named_do_fill_the_page_better() -> None:
    flat = "part plate\n    add block (200 mm, 120 mm, 4 mm)\n"
    found = note("show plate", "size 84 mm by 60 mm", "scale standard", part=flat)
    assert found is not None and found.hint.count("would fill") >= 3
    for named in found.hint.split(", "):
        name, percent = named.split("`")[1], int(named.split()[-1].rstrip("%"))
        text = flat + f"figure f\n    show plate from {name}\n    size 84 mm by 60 mm\n    scale standard\n"
        run = built(text)
        assert run.model is not None
        job, _ = scene.plan(run.model, "f", run.meshes)
        assert job is not None
        low, high = box_of(job, job.sheet.panels[0])
        filled = max((high[0] - low[0]) / 80, (high[1] - low[1]) / 56)
        assert round(100 * filled) == percent


def test_a_page_that_is_fitted_or_well_filled_has_no_note() -> None:
    assert note("show box", "width 60 mm") is None
    assert note("show box", "scale standard") is None
    assert note("show box from front", "width 84 mm", "scale standard") is None
    cube = "part cube\n    add block (40 mm, 40 mm, 40 mm)\n"
    assert note("show cube", "size 74 mm by 90 mm", "scale standard", part=cube) is None


def test_a_mixed_figure_plans_alike_twice() -> None:
    text = (
        BOX
        + "figure f\n    third angle front, top, right, isometric\n    view along (-1, 0, -1) as A\n    width 180 mm\n"
    )
    first, second = planned(text, "f"), planned(text, "f")
    for one, other in zip(first.sheet.panels, second.sheet.panels, strict=True):
        assert one.projection.world_to_page.tobytes() == other.projection.world_to_page.tobytes()
        assert one.place == other.place and one.style == other.style

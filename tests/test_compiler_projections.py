"""Projections as figures use them: declared and by name, scales along the axes, the picture plane, mistakes."""

from __future__ import annotations

import math

import numpy as np
import pytest
from platewright.backend import camera, contract
from platewright.compiler.projections import AXONOMETRIC, SIDES, standard, standard_names
from platewright.lang.problems import Problem
from support.scenes import checked, planned

BOX = "part box\n    add block (100 mm, 60 mm, 40 mm)\n"


def figure(view: str, *lines: str, viewpoint: str = "") -> contract.Job:
    declared = f"viewpoint v\n    {viewpoint}\n" if viewpoint else ""
    text = BOX + declared + f"figure f\n    show box from {view}\n" + "".join(f"    {line}\n" for line in lines)
    return planned(text, "f")


def lengths(job: contract.Job) -> list[float]:
    """How long 100 mm along x, y and z are on paper."""
    points = np.vstack((np.zeros(3), 100 * np.eye(3)))
    page, _ = camera.to_page(job.sheet.panels[0].projection, points)
    return [math.dist(page[0], end) for end in page[1:]]


def the_problem(*viewpoint: str, figure: tuple[str, ...] = ()) -> Problem:
    body = "".join(f"    {line}\n" for line in viewpoint)
    lines = "".join(f"    {line}\n" for line in figure)
    (problem,) = checked(BOX + f"viewpoint v\n{body}figure f\n    show box from v\n{lines}").problems
    return problem


@pytest.mark.parametrize(
    ("view", "shares"),
    [
        ("isometric", (1, 1, 1)),
        ("dimetric", (1, 0.5, 1)),
        ("cavalier", (1, 1, 1)),
        ("cabinet", (1, 0.5, 1)),
        ("planometric", (1, 1, 1)),
        ("isometric_rear_left_below", (1, 1, 1)),
        ("cabinet_rear_right_above", (1, 0.5, 1)),
    ],
)
def test_100_mm_along_an_axis_measure_50_mm_at_1_to_2(view: str, shares: tuple[float, ...]) -> None:
    # ISO 5456-3: the scale holds along the axes, and the axis that a dimetric or cabinet view shortens is halved.
    job = figure(view, "scale 1:2")
    assert lengths(job) == pytest.approx([50 * share for share in shares], abs=1e-9)
    assert job.sheet.panels[0].projection.scale == 0.5


def test_fitted_oblique_views_fill_their_page() -> None:
    for view in ("cavalier", "cabinet", "planometric", "dimetric"):
        job = figure(view, "width 70 mm", "drawn as tone")
        page, _ = camera.to_page(job.sheet.panels[0].projection, job.geometries[0].vertices)
        assert page.min(axis=0) == pytest.approx((2, 2), abs=0.01)
        assert page.max(axis=0) == pytest.approx((68, job.sheet.page.height - 2), abs=0.01)


def test_declared_projections_are_those_of_their_names() -> None:
    for word in AXONOMETRIC:
        declared = figure("v", viewpoint=f"{word} from front left above").sheet.panels[0].projection
        named = figure(f"{word}_front_left_above").sheet.panels[0].projection
        assert declared.world_to_page.tobytes() == named.world_to_page.tobytes()


@pytest.mark.parametrize(
    ("viewpoint", "angles"),
    [
        ("cavalier from front right above receding 30 deg", (0, 30, 90)),
        ("cabinet from front left above receding 60 deg", (0, 120, 90)),
        ("planometric from front right above turned 30 deg", (-30, 60, 90)),
        ("dimetric from front right above exact", (-7.180756, 41.409622, 90)),
        ("dimetric from front right above conventional", (-7, 42, 90)),
    ],
)
def test_stated_angles(viewpoint: str, angles: tuple[float, ...]) -> None:
    projection = figure("v", viewpoint=viewpoint).sheet.panels[0].projection
    page, _ = camera.to_page(projection, np.vstack((np.zeros(3), np.eye(3))))
    drawn = page[1:] - page[0]
    assert np.degrees(np.arctan2(-drawn[:, 1], drawn[:, 0])) == pytest.approx(angles, abs=1e-6)


def test_planometric_heights_shortened() -> None:
    job = figure("v", "scale 1:1", viewpoint="planometric from front right above heights shortened")
    assert lengths(job) == pytest.approx([100, 100, 200 / 3])


def test_trimetric_turned_and_raised() -> None:
    job = figure("v", "scale 1:1", viewpoint="trimetric from front right above turned 30 deg raised 25 deg")
    sight = job.sheet.panels[0].projection.sight
    assert math.degrees(math.asin(-sight[2])) == pytest.approx(25)
    assert math.degrees(math.atan2(-sight[0], sight[1])) == pytest.approx(30)
    found = lengths(job)
    assert found == pytest.approx([100 * math.sqrt(1 - each * each) for each in sight])
    assert len({round(each) for each in found}) == 3


def test_the_light_of_the_picture_keeps_to_the_picture_plane_of_oblique_views() -> None:
    for view in ("cavalier", "planometric", "dimetric"):
        panel = figure(view).sheet.panels[0]
        (key,) = (light for light in panel.lighting.lights if light.kind == "directional")
        toward = np.array(key.vector)
        up, right = toward @ np.array(panel.projection.up), toward @ np.array(panel.projection.right)
        assert toward @ np.array(panel.projection.sight) < 0
        assert math.degrees(math.atan2(up, right)) == pytest.approx(135, abs=30)


# --- central projection, ISO 5456-4


EYE = "eye (-300 mm, -500 mm, 260 mm) toward (0, 0, 20 mm)"


def vanishing(projection: contract.Projection, axis: int) -> np.ndarray | None:
    """The vanishing point of an axis; None where its lines stay parallel."""
    along = projection.world_to_page[:, axis]
    return None if abs(along[3]) < 1e-9 else along[:2] / along[3]


@pytest.mark.parametrize(
    ("plane", "points"),
    [((), 3), (("picture plane upright",), 2), (("picture plane square to y",), 1)],
)
def test_one_two_and_three_vanishing_points(plane: tuple[str, ...], points: int) -> None:
    # ISO 5456-4: one-, two- and three-point methods, by how the object stands to the projection plane.
    projection = figure("v", viewpoint="\n    ".join((EYE, *plane))).sheet.panels[0].projection
    found = [vanishing(projection, axis) for axis in range(3)]
    assert sum(each is not None for each in found) == points
    assert projection.eye == (-300, -500, 260)
    if points == 2:
        start, stop = camera.to_page(projection, np.array([(50.0, 30, 0), (50, 30, 40)]))[0]
        assert start[0] == pytest.approx(stop[0], abs=1e-9)
        # Level lines vanish on the horizon: at the height of the eye.
        left, right = found[0], found[1]
        assert left is not None and right is not None and left[1] == pytest.approx(right[1], abs=1e-9)
    if points == 1:
        page, _ = camera.to_page(projection, np.array([(0.0, 0, 0), (40, 0, 0), (0, 0, 40)]))
        assert (page[1] - page[0])[1] == pytest.approx(0, abs=1e-9) == pytest.approx((page[2] - page[0])[0], abs=1e-9)
        assert math.dist(page[0], page[1]) == pytest.approx(math.dist(page[0], page[2]))


def test_what_the_eye_looks_toward_stays_in_the_middle_of_a_stated_size() -> None:
    for plane in ("", "\n    picture plane upright", "\n    picture plane square to y"):
        job = figure("v", "size 90 mm by 60 mm", viewpoint=f"{EYE}\n    lens 50 mm{plane}")
        assert camera.to_page(job.sheet.panels[0].projection, np.array([(0.0, 0, 20)]))[0][0] == pytest.approx((45, 30))


def test_a_shift_moves_the_picture_by_its_length_on_the_film() -> None:
    for shift, moved in (("shift 0 mm up 6 mm", (0, 15)), ("shift 3 mm up -2 mm", (-7.5, -5))):
        job = figure("v", "size 90 mm by 60 mm", viewpoint=f"{EYE}\n    lens 50 mm\n    {shift}")
        at = camera.to_page(job.sheet.panels[0].projection, np.array([(0.0, 0, 20)]))[0][0]
        # 36 mm of film are 90 mm on paper; a film moved up takes in more above, so the object comes lower.
        assert at == pytest.approx((45 + moved[0], 30 + moved[1]))


def test_a_scale_holds_in_the_plane_through_the_target_whatever_the_picture_plane() -> None:
    for plane in ("picture plane upright", "picture plane square to y"):
        projection = figure("v", "scale 1:2", viewpoint=f"{EYE}\n    {plane}").sheet.panels[0].projection
        right = np.array(projection.right)
        page, _ = camera.to_page(projection, np.array([(0, 0, 20) - 10 * right, (0, 0, 20) + 10 * right]))
        assert math.dist(page[0], page[1]) == pytest.approx(10)


# --- names and mistakes


def test_standard_viewpoints_stand_for_all_corners_and_none_else() -> None:
    assert all(standard(name) is not None for name in standard_names())
    assert set(SIDES) < set(standard_names())
    names = ("isometric_front", "isometric_left_front_above", "front_left", "isometric_", "x_front_left_above", "")
    assert all(standard(name) is None for name in names)


def test_a_value_or_part_called_like_a_standard_view_hides_it_not_and_a_viewpoint_does() -> None:
    text = "derived\n    top = 40 mm\npart left\n    add block (100 mm, 60 mm, top)\n"
    lines = "figure f\n    show left\n    third angle front, top, left\n    width 90 mm\n"
    assert [panel.name for panel in planned(text + lines, "f").sheet.panels] == ["left front", "left top", "left left"]
    own = BOX + "viewpoint top\n    orthographic from bottom\nfigure f\n    show box from top\n"
    assert planned(own, "f").sheet.panels[0].projection.sight == (0, 0, 1)


def test_an_unknown_view_names_the_nearest() -> None:
    (problem,) = checked(BOX + "figure f\n    show box from cabnet\n").problems
    assert (problem.code, problem.hint) == ("unknown-name", "did you mean `cabinet`?")


@pytest.mark.parametrize(
    ("lines", "code", "says"),
    [
        (("cavalier from front right above receding 90 deg",), "out-of-range", "between 0 and 90"),
        (("planometric from front right above turned 0 deg",), "out-of-range", "between 0 and 90"),
        (("trimetric from front right above raised -5 deg",), "out-of-range", "between 0 and 90"),
        (("cabinet from front right above", "shift 0 mm up 4 mm"), "wrong-form", "central projection"),
        (("isometric from front right above", "picture plane upright"), "wrong-form", "central projection"),
        (("eye (0, 0, 300 mm) toward (0, 0, 0)", "picture plane upright"), "eye-on-target", "straight up or down"),
        (("eye (0, -300 mm, 0) toward (0, 0, 0)", "picture plane square to z"), "eye-on-target", "edge-on"),
        (("eye (0, -300 mm, 0) toward (0, 0, 0)", "lens 50 mm", "shift 900 mm up 0 mm"), "out-of-range", "ten times"),
    ],
)
def test_mistakes_in_viewpoints_are_located(lines: tuple[str, ...], code: str, says: str) -> None:
    problem = the_problem(*lines)
    assert problem.code == code and says in problem.sentence
    assert problem.span.line == len(BOX.splitlines()) + 1 + len(lines)


def test_a_shift_without_a_held_field_of_view_changes_nothing() -> None:
    problem = the_problem("eye (0, -300 mm, 0) toward (0, 0, 0)", "shift 0 mm up 4 mm")
    assert problem.code == "no-effect" and "fitted" in problem.sentence


def test_a_scale_that_overflows_a_stated_page_is_a_problem() -> None:
    problem = the_problem("cavalier from front right above", figure=("size 84 mm by 60 mm", "scale 2:1"))
    assert (problem.code, problem.within) == ("does-not-fit", "f") and "needs" in problem.sentence

"""Sections, details and interruptions of figures, by numbers on the job."""

from __future__ import annotations

from math import pi

import numpy as np
import pytest
from platewright.backend import camera, contract, sheet
from platewright.backend.contract import FaceOrigin, LineClass
from platewright.backend.lettering.type import Lettering
from platewright.compiler.graph import Entry
from platewright.compiler.mistakes import Problems
from platewright.compiler.sections import Cut, Opening, Plane, letter_of
from platewright.compiler.solids.cut import half_space
from platewright.lang.problems import Problem, Severity
from platewright.lang.source import Span
from support import geometries
from support.scenes import built, checked, planned

JOINT = """part plate
    add block (60 mm, 40 mm, 20 mm)
    cut cylinder diameter 10 mm length 20 mm at (-20 mm, 0, 0) as bore
    cut cylinder diameter 10 mm length 20 mm at (20 mm, 10 mm, 0)
    mark side at (30 mm, 0, 10 mm) along x
    mark hole at (-20 mm, 0, 10 mm) along y

part pin
    uncut along z
    add cylinder diameter 10 mm length 24 mm

part rod
    uncut
    add block (60 mm, 4 mm, 2 mm) at (0, 0, 24 mm)

assembly joint
    place plate
    place pin at (-20 mm, 0, 0)
    place pin as other at (20 mm, 10 mm, 0)
    place rod
"""
HOLE = 500 * pi  # volume of a hole, mm3
WHOLE = 48_000 - 2 * HOLE


def text_of(*lines: str, show: str = "show joint from front", model: str = JOINT) -> str:
    return model + "figure f\n" + "".join(f"    {line}\n" for line in (show, *lines))


def figure(*lines: str, show: str = "show joint from front", model: str = JOINT) -> contract.Job:
    return planned(text_of(*lines, show=show, model=model), "f")


def problem_of(*lines: str, show: str = "show joint from front", model: str = JOINT) -> Problem:
    (found,) = [each for each in checked(text_of(*lines, show=show, model=model)).problems if each.within == "f"]
    return found


def geometry_of(job: contract.Job, panel: int = 0) -> contract.Geometry:
    return job.geometries[job.sheet.panels[panel].geometry]


def volume_of(job: contract.Job, path: str, panel: int = 0) -> float:
    geometry = geometry_of(job, panel)
    low, high = next(node.face_range for node in geometry.nodes if node.path == path)
    a, b, c = (geometry.vertices[geometry.faces[low:high, k]] for k in range(3))
    return float((a * np.cross(b, c)).sum() / 6.0)


def corners_of(job: contract.Job, path: str, panel: int = 0) -> np.ndarray:
    geometry = geometry_of(job, panel)
    return geometry.vertices[slice(*next(node.vertex_range for node in geometry.nodes if node.path == path))]


def cut_area(job: contract.Job, origin: FaceOrigin = FaceOrigin.SECTION_CAP, panel: int = 0) -> float:
    geometry = geometry_of(job, panel)
    a, b, c = (geometry.vertices[geometry.faces[geometry.face_origin == origin, k]] for k in range(3))
    return float(np.sqrt((np.cross(b - a, c - a) ** 2).sum(axis=1)).sum() / 2.0)


def whole_paths(job: contract.Job, panel: int = 0) -> set[str]:
    section = job.sheet.panels[panel].section
    assert section is not None
    return {geometry_of(job, panel).nodes[row].path for row in section.uncut}


# --- what goes


def test_the_side_toward_the_eye_goes() -> None:
    job = figure("section across y at 0")
    assert corners_of(job, "joint.plate")[:, 1].min() == pytest.approx(0.0, abs=1e-12)
    assert volume_of(job, "joint.plate") == pytest.approx(24_000 - 1.5 * HOLE, rel=1e-3)
    assert cut_area(job) == pytest.approx(20 * (60 - 10))
    section = job.sheet.panels[0].section
    assert section is not None and section.drawn == "all"
    assert section.normal == pytest.approx((0, -1, 0)) and section.point == pytest.approx((0, 0, 0))
    from_behind = figure("section across y at 0", show="show joint from rear")
    assert corners_of(from_behind, "joint.plate")[:, 1].max() == pytest.approx(0.0, abs=1e-12)


def test_keeping_names_the_side_that_stays() -> None:
    job = figure("section across y at 0 keeping -y")
    assert corners_of(job, "joint.plate")[:, 1].max() == pytest.approx(0.0, abs=1e-12)
    assert volume_of(job, "joint.plate") == pytest.approx(24_000 - 0.5 * HOLE, rel=1e-3)


@pytest.mark.parametrize(
    "line",
    [
        "section across y at -5 mm",
        "section across y at (7 mm, -5 mm, 3 mm)",
        "section across (0, 2, 0) at -5 mm",
        "section across plate.hole.axis at (0, -5 mm, 0)",
        "section across -y at 5 mm",
    ],
)
def test_a_plane_is_said_by_axis_length_point_or_mark(line: str) -> None:
    job = figure(line)
    assert corners_of(job, "joint.plate")[:, 1].min() == pytest.approx(-5.0)


def test_a_plane_goes_through_a_mark_of_a_placed_part() -> None:
    model = JOINT.replace("place plate\n", "place plate at (0, 3 mm, 0)\n")
    job = figure("section across y at plate.hole", model=model)
    assert corners_of(job, "joint.plate")[:, 1].min() == pytest.approx(3.0)


def test_a_half_section_takes_a_quarter() -> None:
    job = figure("half section across y at 0 beside x past 0")
    assert WHOLE - volume_of(job, "joint.plate") == pytest.approx(30 * 20 * 20, rel=1e-3)
    # Both faces of the quarter are cut faces; in a view along the plane's normal the second is seen edge-on.
    assert cut_area(job) == pytest.approx(30 * 20 + 20 * 20)
    other = figure("half section across y at 0 beside -x past 0")
    assert WHOLE - volume_of(other, "joint.plate") == pytest.approx(30 * 20 * 20 - HOLE / 2, rel=1e-3)


def test_a_stepped_section_takes_what_lies_before_its_planes() -> None:
    corners = "(-40 mm, 0, 0), (0, 0, 0), (0, 10 mm, 0), (40 mm, 10 mm, 0)"
    job = figure(f"stepped section along z through {corners}")
    gone = 30 * 20 * 20 - HOLE / 2 + 30 * 30 * 20 - HOLE / 2
    assert WHOLE - volume_of(job, "joint.plate") == pytest.approx(gone, rel=1e-3)
    assert cut_area(job) == pytest.approx(2 * 20 * (30 - 10))
    assert cut_area(job, FaceOrigin.STEP) == pytest.approx(10 * 20)


def test_a_local_section_breaks_a_patch_out() -> None:
    job = figure("local section across y at 0 round (-20 mm, 0, 10 mm) diameter 16 mm")
    geometry = geometry_of(job)
    faces = geometry.faces[geometry.face_origin == FaceOrigin.SECTION_CAP]
    patch = geometry.vertices[np.unique(faces)]
    assert np.abs(patch[:, 1]).max() < 1e-9
    # Drawn by hand, so to speak: within an eighth of the diameter said.
    off = np.hypot(patch[:, 0] + 20, patch[:, 2] - 10)
    assert off.max() == pytest.approx(8.0, rel=0.125)
    assert cut_area(job, FaceOrigin.BREAK) > 0


def test_two_sections_open_one_view() -> None:
    job = figure("section across y at 0", "section across x at 10 mm keeping -x", show="show joint")
    found = corners_of(job, "joint.plate")
    assert found[:, 1].min() == pytest.approx(0.0, abs=1e-12) and found[:, 0].max() == pytest.approx(10.0)


# --- what stays whole


def test_parts_that_say_so_stay_whole_along_their_axis_and_are_cut_across_it() -> None:
    along = figure("section across y at 0")
    assert whole_paths(along) == {"joint.pin", "joint.other", "joint.rod"}
    assert volume_of(along, "joint.pin") == pytest.approx(24 * 25 * pi, rel=5e-3)
    across = figure("section across z at 15 mm", show="show joint from top")
    assert whole_paths(across) == {"joint.rod"}
    assert volume_of(across, "joint.pin") == pytest.approx(15 * 25 * pi, rel=5e-3)
    slanted = figure("section across (0, 1, 0.5) at 0 keeping y")
    assert "joint.pin" in whole_paths(slanted)
    steep = figure("section across (0, 1, 0.7) at 0 keeping y")
    assert "joint.pin" not in whole_paths(steep)


def test_an_axis_turns_with_the_part() -> None:
    model = JOINT.replace("place pin at (-20 mm, 0, 0)", "place pin turn 90 deg about x at (-20 mm, 12 mm, 10 mm)")
    assert "joint.pin" not in whole_paths(figure("section across y at 0", model=model))


def test_what_lies_before_the_cut_goes_with_the_rest() -> None:
    job = figure("section across z at 15 mm", show="show joint from top")
    assert not len(corners_of(job, "joint.rod"))
    # Seen from the rear the pin at y = 10 mm stands before the plane.
    rear = figure("section across y at 0", show="show joint from rear")
    assert not len(corners_of(rear, "joint.other")) and len(corners_of(rear, "joint.pin"))


def test_a_figure_names_what_stays_whole() -> None:
    job = figure("section across z at 15 mm", "uncut plate, pin", show="show joint from top")
    assert whole_paths(job) == {"joint.plate", "joint.pin", "joint.rod"}
    assert volume_of(job, "joint.plate") == pytest.approx(WHOLE, rel=1e-3)
    assert volume_of(job, "joint.other") == pytest.approx(15 * 25 * pi, rel=5e-3)


def test_a_part_alone_is_cut_whatever_it_says() -> None:
    job = figure("section across y at 0", show="show pin from front")
    assert whole_paths(job) == set() and cut_area(job) == pytest.approx(240, rel=1e-3)


def test_fasteners_of_the_library_stay_whole_along_their_axis() -> None:
    model = 'see library "fasteners" as f\n\npart plate\n    add block (40 mm, 40 mm, 10 mm)\n'
    model += "    cut cylinder diameter 6 mm length 10 mm\n\nassembly joint\n    place plate\n"
    placed = {
        "bolt": 'f.hexagon_bolt("M6", 30 mm) as bolt at (0, 0, 11.6 mm)',
        "washer": 'f.plain_washer("M6") as washer at (0, 0, 10 mm)',
        "nut": 'f.hexagon_nut("M6") as nut at (0, 0, -5.2 mm)',
        "screw": 'f.socket_screw("M6", 16 mm) as screw at (0, 0, 40 mm)',
        "set": 'f.hexagon_screw("M6", 16 mm) as set at (0, 0, 60 mm)',
    }
    model += "".join(f"    place {each}\n" for each in placed.values())
    job = figure("section across y at 0", model=model)
    assert whole_paths(job) == {f"joint.{name}" for name in placed}


# --- problems


@pytest.mark.parametrize(
    ("lines", "code", "says"),
    [
        (("section across x at 0",), "edge-on-section", "edge-on"),
        (("section across y at 0 keeping x",), "edge-on-section", "square to the side"),
        (("third angle front, top", "section across (1, 1, 0) at 0"), "edge-on-section", "no view"),
        (("section across y at -50 mm",), "section-misses", "meets no part"),
        (("section across y at 0", "uncut plate, pin, other, rod"), "section-misses", "meets no part"),
        (("section across y at 50 mm",), "nothing-in-view", "takes everything away"),
        (("section across y at 5 deg",), "wrong-kind", "where the plane lies"),
        (("section across y at plate.nothing",), "unknown-name", "nothing"),
        (("section across y at 0", "uncut plaet"), "unknown-name", "plaet"),
        (("half section across y at 0 beside (1, 1, 0)",), "wrong-form", "square to each other"),
        (("stepped section along z through (0, 0, 0)",), "missing-value", "two points"),
        (("stepped section along z through (0, 0, 0), (0, 0, 5 mm)",), "wrong-form", "behind each other"),
        (
            ("stepped section along z through (-40 mm, 0, 0), (10 mm, 0, 0), (-9 mm, 9 mm, 0), (40 mm, 9 mm, 0)",),
            "wrong-form",
            "turn back",
        ),
        (("local section across y at 0 round (0, 0, 0) diameter 0 mm",), "out-of-range", "diameter"),
        (("detail of plate.hole enlarged 1",), "out-of-range", "above 1"),
        (("detail of plate.hole enlarged 2000",), "out-of-range", "1000"),
        (("interrupted along x from 100 mm to 120 mm",), "section-misses", "no part reaches"),
        (("interrupted along x from 10 mm to -10 mm",), "out-of-range", "before it begins"),
        (("interrupted along x from 0 mm to 9 mm", "interrupted along x from 5 mm to 12 mm"), "wrong-form", "apart"),
        (("interrupted along x from 0 mm to 9 mm", "interrupted along z from 5 mm to 12 mm"), "wrong-form", "one axis"),
        (("revolved section across y at 0",), "edge-on-section", "revolved"),
        (("drawn as tone", "removed section across x at 0"), "wrong-form", "lines"),
        (("section across y at 0", "view along x as A"), "said-twice", "letter A"),
    ],
)
def test_mistakes_are_located(lines: tuple[str, ...], code: str, says: str) -> None:
    error = problem_of(*lines)
    assert (error.code, error.severity) == (code, Severity.ERROR) and says in error.sentence
    texts = text_of(*lines).splitlines()
    assert texts[error.span.line - 1].strip() in lines


def test_a_part_that_is_not_closed_cannot_be_cut() -> None:
    open_mesh = geometries.sheet(2)
    run = built(JOINT)
    assert run.model is not None
    solid = run.model.built.things["plate"]
    span = Span("scene.plate", 1, 1, 1, 5)
    entry = Entry("joint.plate", "plate", 0, solid, ((1, 0, 0, 0), (0, 1, 0, 0), (0, 0, 1, 0)), span)
    cutter = half_space((0.0, -1.0, 0.0), 0.0, np.zeros(3), 100.0)
    cut = Cut("full", Plane((0.0, 1.0, 0.0), (0.0, 0.0, 0.0)), span)
    for whole, codes in (((), ["open-part"]), (("joint",), ["section-misses"])):
        opening, problems = Opening((cutter,), ((0.0, -1.0, 0.0),), whole), Problems()
        assert opening.alter(entry, np.eye(4), open_mesh) is open_mesh
        opening.judge((cut,), problems)
        assert [problem.code for problem in problems.all()] == codes


# --- letters, titles and links


def test_letters_leave_out_what_looks_like_digits() -> None:
    assert "".join(letter_of(number) for number in range(23)) == "ABCDEFGHJKLMNPRSTUVWXYZ"
    assert [letter_of(number) for number in (23, 24, 46)] == ["AA", "AB", "BA"]


def test_a_view_alone_has_no_title_and_no_line() -> None:
    job = figure("section across y at 0")
    assert not job.sheet.inscriptions and not job.sheet.links and not job.sheet.panels[0].cutting_planes


def test_sections_are_dealt_out_to_the_views_of_a_set() -> None:
    job = figure(
        "third angle front, top, right",
        "section across x at -20 mm",
        "section across z at 15 mm",
        show="show joint",
    )
    names = [panel.name.rpartition(" ")[2] for panel in job.sheet.panels]
    front, top, right = (names.index(each) for each in ("front", "top", "right"))
    sections = [panel.section for panel in job.sheet.panels]
    assert sections[front] is None
    assert [section.letter for section in (sections[right], sections[top]) if section is not None] == ["A", "B"]
    assert [each.text for each in job.sheet.inscriptions] == [
        {right: "A–A", top: "B–B"}[row] for row in sorted((right, top))
    ]
    assert {(link.kind, link.parent, link.child, link.letter) for link in job.sheet.links} == {
        ("section", front, right, "A"),
        ("section", front, top, "B"),
    }
    assert len(job.geometries) == 3
    assert corners_of(job, "joint.plate", right)[:, 0].max() == pytest.approx(-20.0)
    assert corners_of(job, "joint.plate", top)[:, 2].max() == pytest.approx(15.0)


def test_the_cutting_plane_line_runs_past_the_subject_and_looks_as_the_view_does() -> None:
    job = figure("third angle front, right", "section across x at -20 mm", show="show joint")
    (line,) = job.sheet.panels[0].cutting_planes
    assert line.letter == "A" and line.sight == pytest.approx((-1, 0, 0))
    assert line.points[:, 0] == pytest.approx((-20, -20))
    past = 6.0 / job.sheet.panels[0].projection.scale
    assert sorted(line.points[:, 2]) == pytest.approx([0 - past, 26 + past])


def test_a_stepped_line_has_the_corners_of_its_planes_in_the_view_along_its_axis() -> None:
    corners = "(0, -40 mm, 0), (0, 5 mm, 0), (20 mm, 5 mm, 0), (20 mm, 40 mm, 0)"
    job = figure("third angle front, top, right", f"stepped section along z through {corners}", show="show joint")
    panels = {panel.name.rpartition(" ")[2]: panel for panel in job.sheet.panels}
    (line,) = panels["top"].cutting_planes
    past = 6.0 / panels["top"].projection.scale
    path = ((0, -20 - past), (0, 5), (20, 5), (20, 20 + past))
    assert np.allclose(line.points[:, :2], path) or np.allclose(line.points[::-1, :2], path)
    assert not panels["front"].cutting_planes and panels["right"].section is not None


# --- details


def test_a_detail_shows_a_circle_of_the_first_view_enlarged() -> None:
    job = figure("section across y at 0", "scale 1:1", "detail of plate.hole enlarged 4 diameter 12 mm")
    main, detail = job.sheet.panels
    assert detail.projection.scale == pytest.approx(4.0) and detail.clip is not None
    middle, _ = camera.to_page(detail.projection, np.array([[-20.0, 0.0, 10.0]]))
    assert np.hypot(*(detail.clip - middle[0]).T) == pytest.approx(24.0)
    (frame,) = main.detail_frames
    assert (frame.centre, frame.diameter, frame.letter) == (pytest.approx((-20, 0, 10)), pytest.approx(12.0), "Z")
    (own,) = detail.detail_frames
    assert own.letter == "" and own.diameter == pytest.approx(48.0)
    assert [(link.kind, link.child, link.letter) for link in job.sheet.links] == [("detail", 1, "Z")]
    assert [each.text for each in job.sheet.inscriptions] == ["Z (4:1)"]
    assert detail.section is not None and detail.style.wide == main.style.wide


def test_a_detail_is_divided_for_its_own_scale_and_lettered_from_the_end() -> None:
    job = figure("detail of plate.hole enlarged 30 diameter 3 mm", "detail of plate.side enlarged 3")
    texts = [each.text for each in job.sheet.inscriptions]
    assert texts == ["Z (30×)", "Y (3×)"]
    sizes = [len(geometry_of(job, row).faces) for row in range(3)]
    assert sizes[1] > 2 * sizes[0] and sizes[1] > sizes[2] >= sizes[0]
    # Without a diameter it takes in 15 % of the largest side.
    assert job.sheet.panels[0].detail_frames[1].diameter == pytest.approx(9 * job.sheet.panels[0].projection.scale)


# --- interruptions


def test_an_interruption_moves_the_rest_together() -> None:
    job = figure("interrupted along x from -10 mm to 10 mm")
    found = corners_of(job, "joint.plate")
    gap = found[:, 0].max() - found[:, 0].min() - (60 - 20)
    assert found[:, 0].min() == pytest.approx(-30.0) and 0 < gap < 10
    assert cut_area(job, FaceOrigin.BREAK) > 2 * 0.9 * 40 * 20
    # Both pins stand at the ends that stay; the one beyond has moved with its end.
    assert corners_of(job, "joint.pin")[:, 0].max() == pytest.approx(-15.0)
    moved = 30.0 - found[:, 0].max()
    assert corners_of(job, "joint.other")[:, 0].max() == pytest.approx(25.0 - moved)


def test_interruptions_follow_each_other_along_an_axis() -> None:
    job = figure("interrupted along x from -10 mm to -2 mm", "interrupted along x from 2 mm to 10 mm")
    one = figure("interrupted along x from -10 mm to -2 mm")
    assert corners_of(job, "joint.plate")[:, 0].max() < corners_of(one, "joint.plate")[:, 0].max() < 30.0


# --- cut faces alone


def test_a_removed_section_stands_beside_the_views_under_its_letters() -> None:
    job = figure("scale 1:1", "section across y at 0", "removed section across x at 10 mm")
    main, removed = job.sheet.panels
    assert removed.section is not None and (removed.section.drawn, removed.section.letter) == ("removed", "B")
    assert main.section is not None and main.section.letter == "A"
    assert [(link.kind, link.parent, link.child, link.letter) for link in job.sheet.links] == [("section", 0, 1, "B")]
    assert [each.text for each in job.sheet.inscriptions] == ["B–B"]
    (line,) = main.cutting_planes
    assert line.letter == "B" and line.points[:, 0] == pytest.approx((10, 10))
    # The plane meets the plate alone, 40 mm by 20 mm, though it does not lie whole behind it.
    on_page, _ = camera.to_page(removed.projection, np.array([[10, -20, 0], [10, 20, 20]], float))
    assert np.abs(on_page[1] - on_page[0]) == pytest.approx((40, 20))
    assert on_page[:, 0].max() < job.sheet.page.width


@pytest.mark.parametrize(
    ("line", "sight"),
    [
        ("removed section across x at 10 mm", (1, 0, 0)),
        ("removed section across -x at -10 mm", (-1, 0, 0)),
        ("removed section across x at 10 mm keeping -x", (-1, 0, 0)),
        ("removed section across z at 10 mm", (0, 0, -1)),
        ("removed section across -z at -10 mm", (0, 0, -1)),
        ("removed section across z at 10 mm keeping z", (0, 0, 1)),
    ],
)
def test_a_removed_section_is_looked_at_along_its_axis(line: str, sight: tuple[int, int, int]) -> None:
    job = figure(line)
    assert job.sheet.panels[1].projection.sight == pytest.approx(sight)
    (trace,) = job.sheet.panels[0].cutting_planes
    assert trace.sight == pytest.approx(sight)


def test_a_pictorial_view_has_no_line_of_a_removed_section() -> None:
    job = figure("removed section across x at 10 mm", show="show joint")
    assert not job.sheet.panels[0].cutting_planes and not job.sheet.links


def test_cut_faces_alone_are_drawn_by_their_outlines() -> None:
    job = figure("drawn as lines", "removed section across x at 10 mm", "revolved section across x at 0")
    lines = sheet.line_list(sheet.draw(job, ("svg",)), job)
    scale = job.sheet.panels[0].projection.scale
    for panel, line_class in ((1, LineClass.SECTION_OUTLINE), (2, LineClass.REVOLVED_SECTION)):
        own = [each for each in lines if each.panel == panel]
        assert {(each.part, each.line_class) for each in own} == {("joint.plate", line_class)}
        assert sum(each.length for each in own) == pytest.approx(120 * scale, rel=1e-6)


def test_a_revolved_section_turns_into_the_view_about_its_middle() -> None:
    job = figure("scale 1:1", "revolved section across x at 5 mm")
    main, turned = job.sheet.panels
    assert turned.section is not None and (turned.section.drawn, turned.section.letter) == ("revolved", "")
    assert turned.place == main.place and not main.cutting_planes and not job.sheet.inscriptions
    on_page, _ = camera.to_page(turned.projection, np.array([[5, -20, 0], [5, 20, 0], [5, 20, 20], [5, 0, 10]], float))
    upright, _ = camera.to_page(main.projection, np.array([[5, 0, 0], [5, 0, 20]], float))
    assert on_page[:, 0] == pytest.approx(upright[0, 0] + np.array((-20, 20, 20, 0)))
    assert on_page[:3, 1] == pytest.approx((upright[0, 1], upright[0, 1], upright[1, 1]))
    other = figure("scale 1:1", "revolved section across x at 5 mm keeping x").sheet.panels[1]
    assert other.projection.sight == pytest.approx((1, 0, 0)) and turned.projection.sight == pytest.approx((-1, 0, 0))


def test_a_revolved_section_takes_no_letter() -> None:
    job = figure("revolved section across x at 5 mm", "removed section across x at 10 mm", "view along x as B")
    assert [each.text for each in job.sheet.inscriptions] == ["A–A", "B"]


def test_a_detail_of_a_place_where_nothing_is_is_a_problem_at_its_line() -> None:
    problem = problem_of("detail of (300 mm, 0, 0) enlarged 2 diameter 10 mm")
    assert (problem.code, problem.severity) == ("nothing-in-view", Severity.ERROR)
    assert problem.span.line == text_of().count("\n") + 1


def test_the_caption_of_a_small_detail_has_room_on_the_page() -> None:
    job = figure("detail of plate.side enlarged 2 diameter 4 mm", "scale 1:3", "width 120 mm")
    (caption,) = [each for each in job.sheet.inscriptions if each.text.startswith("Z")]
    half = Lettering().width_of(caption.text, caption.height) / 2
    assert half <= caption.place[0] <= job.sheet.page.width - half


def test_an_interruption_takes_marks_threads_and_details_with_it_and_not_along_the_sight() -> None:
    model = (
        "part stud\n    add cylinder diameter 20 mm length 40 mm\n"
        '    add thread "M12" length 20 mm at (0, 0, 40 mm)\n    mark tip at (0, 0, 60 mm)\n'
    )
    lines = ("interrupted along z from 10 mm to 30 mm", "detail of tip enlarged 2 diameter 8 mm")
    job = figure(*lines, show="show stud from front", model=model)
    node = geometry_of(job).nodes[0]
    top = float(geometry_of(job).vertices[:, 2].max())
    assert 40.0 < top < 45.0
    assert node.marks[0].point[2] == pytest.approx(top)
    (thread,) = node.threads
    assert thread.start[2] == pytest.approx(top - 20.0) and thread.length == pytest.approx(20.0)
    assert job.sheet.panels[0].detail_frames[0].centre[2] == pytest.approx(top)
    problem = problem_of(lines[0], show="show stud from top", model=model)
    assert (problem.code, problem.sentence) == ("edge-on-section", "the view looks along the stretch left out")

"""Extreme positions: what moves or changes with other values is drawn a second time, by itself."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend import camera, contract, sheet
from platewright.backend.contract import LineClass
from platewright.lang.problems import Problem, Severity
from support.scenes import checked, planned

LEVER = """given
    tilt = 0 deg range -60 deg .. 60 deg
    long = 60 mm
    capped = no

part base
    add block (60 mm, 30 mm, 8 mm)

part lever(length = 60 mm)
    add block (10 mm, 10 mm, length)

part cap
    add sphere diameter 14 mm

assembly unit
    place base
    place lever(length = long) turn tilt about y at (0, 0, 12 mm)
    place cap at (0, 0, 80 mm) when capped
"""


def text_of(*lines: str, show: str = "show unit from front") -> str:
    return LEVER + "figure f\n" + "".join(f"    {line}\n" for line in (show, *lines))


def figure(*lines: str, show: str = "show unit from front") -> contract.Job:
    return planned(text_of(*lines, show=show), "f")


def problems_of(*lines: str) -> list[Problem]:
    return [each for each in checked(text_of(*lines)).problems if each.within == "f"]


def drawn_twice(job: contract.Job, panel: int = 0) -> list[list[str]]:
    return [
        [job.geometries[each.geometry].nodes[row].path for row in each.nodes]
        for each in job.sheet.panels[panel].extremes
    ]


def test_what_moves_is_drawn_twice_and_the_rest_once() -> None:
    job = figure("extreme position with tilt = 40 deg", "extreme position with tilt = -40 deg")
    assert drawn_twice(job) == [["unit.lever"], ["unit.lever"]]
    one, other = (job.geometries[each.geometry] for each in job.sheet.panels[0].extremes)
    right, left = (one.vertices[one.nodes[2].vertex_range[0] :], other.vertices[other.nodes[2].vertex_range[0] :])
    # A turn by 40 degrees about y takes the end of the lever, 60 mm up, by 60 sin 40 to the right.
    assert right[:, 0].max() == pytest.approx(60 * np.sin(np.radians(40)) + 5 * np.cos(np.radians(40)))
    assert left[:, 0].min() == pytest.approx(-right[:, 0].max())


def test_what_changes_its_shape_or_is_new_is_drawn_twice() -> None:
    assert drawn_twice(figure("extreme position with long = 70 mm")) == [["unit.lever"]]
    assert drawn_twice(figure("extreme position with capped = yes")) == [["unit.cap"]]


def test_settings_go_over_those_of_the_figure() -> None:
    job = figure("with tilt = 30 deg", "extreme position with long = 70 mm")
    assert drawn_twice(job) == [["unit.lever"]]
    other = job.geometries[job.sheet.panels[0].extremes[0].geometry]
    assert other.vertices[:, 0].max() == pytest.approx(70 * np.sin(np.radians(30)) + 5 * np.cos(np.radians(30)))


def test_the_page_takes_it_in() -> None:
    job = figure("extreme position with tilt = 60 deg", "scale 1:1")
    plain = figure("scale 1:1")
    panel = job.sheet.panels[0]
    other = job.geometries[panel.extremes[0].geometry]
    lever = other.vertices[slice(*other.nodes[2].vertex_range)]
    on_page, _ = camera.to_page(panel.projection, lever)
    assert on_page[:, 0].max() < job.sheet.page.width
    reach = 60 * np.sin(np.radians(60)) + 5 * np.cos(np.radians(60))
    assert job.sheet.page.width - plain.sheet.page.width == pytest.approx(reach - 30.0, abs=0.2)


def test_every_view_shows_it() -> None:
    job = figure("third angle front, top", "extreme position with tilt = 40 deg", show="show unit")
    assert [drawn_twice(job, row) for row in range(2)] == [[["unit.lever"]], [["unit.lever"]]]
    assert len(job.geometries) == 2


def test_materials_stay_those_of_the_parts() -> None:
    coloured = LEVER.replace("part cap\n", "material brass\n    metal copper_zinc\n\npart cap\n    made of brass\n")
    job = planned(coloured + "figure f\n    show unit\n    extreme position with capped = yes\n", "f")
    nodes = {node.path: job.materials[node.material] for node in job.geometries[1].nodes if node.mesh >= 0}
    assert nodes["unit.cap"].name == "brass" and nodes["unit.cap"].metal
    assert not nodes["unit.lever"].metal


def test_lines_are_of_their_class_and_hidden_by_nothing() -> None:
    job = figure("extreme position with tilt = 40 deg", "drawn as lines")
    lines = sheet.line_list(sheet.draw(job, ("svg",)), job)
    extreme = [each for each in lines if each.line_class is LineClass.EXTREME_POSITION]
    assert {each.part for each in extreme} == {"unit.lever"} and all(each.is_visible for each in extreme)
    # The outline of the lever as seen from the front: a rectangle of 10 mm by 60 mm.
    scale = job.sheet.panels[0].projection.scale
    assert sum(each.length for each in extreme) == pytest.approx(140 * scale, rel=1e-3)
    without = sheet.line_list(sheet.draw(figure("drawn as lines"), ("svg",)), figure("drawn as lines"))
    usual = [each for each in lines if each.line_class is not LineClass.EXTREME_POSITION]
    assert [(each.part, each.line_class) for each in usual] == [(each.part, each.line_class) for each in without]


def test_hidden_parts_stay_hidden() -> None:
    job = figure("extreme position with tilt = 40 deg, capped = yes", "hide lever")
    assert drawn_twice(job) == [["unit.cap"]]


@pytest.mark.parametrize(
    ("lines", "code", "says"),
    [
        (("extreme position with tilt = 0 deg",), "no-effect", "nothing stands elsewhere"),
        (("extreme position with tilt = 90 deg",), "out-of-range", "tilt"),
        (("extreme position with tild = 10 deg",), "unknown-name", "tild"),
        (("extreme position with tilt = 10 deg, tilt = 20 deg",), "said-twice", "set twice"),
        (("extreme position with tilt = 10 deg",) * 21, "too-much", "20 extreme"),
        (("extreme position with tilt = 10 deg", "interrupted along z from 30 mm to 50 mm"), "wrong-form", "stretch"),
    ],
)
def test_mistakes_are_located(lines: tuple[str, ...], code: str, says: str) -> None:
    (error,) = problems_of(*lines)
    assert error.code == code and says in error.sentence and error.severity is Severity.ERROR
    at = text_of(*lines).splitlines().index(f"    {lines[0]}") + 1
    assert error.span.line == (at if len(lines) < 3 else at + len(lines) - 1)


def test_tone_alone_has_no_lines_to_draw_it_in() -> None:
    (warning,) = problems_of("drawn as tone", "extreme position with tilt = 10 deg")
    assert (warning.code, warning.severity) == ("no-effect", Severity.WARNING)

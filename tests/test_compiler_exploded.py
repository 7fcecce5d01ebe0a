"""Exploded figures: how far things move, how the page takes that in, and where trace lines run."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend import camera, contract, sheet
from platewright.backend.contract import LineClass
from platewright.compiler import explosion, limits, scene
from platewright.lang.problems import Severity
from support.scenes import built, checked, planned

DRUM = """part can
    add cylinder diameter 60 mm length 50 mm
    cut cylinder diameter 54 mm length 47 mm at (0, 0, 3 mm)

part lid
    add cylinder diameter 60 mm length 5 mm
    cut cylinder diameter 5 mm length 5 mm at (20 mm, 0, 0) ring 4

part screw
    add cylinder diameter 4 mm length 12 mm at (0, 0, -12 mm)
    add cylinder diameter 8 mm length 3 mm

assembly cover
    place lid
    place screw as screws at (20 mm, 0, 5 mm) ring 4 explodes 15 mm

assembly drum
    place can
    place cover at (0, 0, 50 mm) explodes 40 mm
"""


def figure(*lines: str, model: str = DRUM, show: str = "show drum") -> contract.Job:
    return planned(model + "figure f\n" + "".join(f"    {line}\n" for line in (show, *lines)), "f")


def shift_of(job: contract.Job, path: str) -> tuple[float, ...]:
    moved = job.sheet.panels[0].displacement
    assert moved is not None
    rows = [row for row, node in enumerate(job.geometries[0].nodes) if node.path == path]
    return tuple(moved[rows[0]])


def test_nested_moves_add_and_the_factor_multiplies() -> None:
    for lines, factor in ((("exploded",), 1.0), (("exploded 1.5",), 1.5), (("exploded 0.25",), 0.25)):
        job = figure(*lines)
        assert shift_of(job, "drum") == shift_of(job, "drum.can") == (0, 0, 0)
        assert shift_of(job, "drum.cover") == pytest.approx((0, 0, 40 * factor))
        assert shift_of(job, "drum.cover.lid") == pytest.approx((0, 0, 40 * factor))
        assert shift_of(job, "drum.cover.screws[3]") == pytest.approx((0, 0, 55 * factor))


def test_a_length_goes_along_the_things_own_axis_and_a_vector_along_what_holds_it() -> None:
    model = "part pin\n    add cylinder diameter 4 mm length 20 mm\n"
    model += "assembly inner\n    place pin turn 90 deg about y at (5 mm, 0, 0) explodes 10 mm\n"
    model += "    place pin as upright at (0, 30 mm, 0) explodes (0, 7 mm, 0)\n"
    model += "assembly outer\n    place inner turn 90 deg about z\n"
    job = figure("exploded", model=model, show="show outer")
    # Turned about y the pin's axis is +x, and turned about z that is +y.
    assert shift_of(job, "outer.inner.pin") == pytest.approx((0, 10, 0))
    assert shift_of(job, "outer.inner.upright") == pytest.approx((-7, 0, 0))


def test_the_page_takes_in_what_is_moved() -> None:
    job = figure("exploded 2", "width 60 mm", "drawn as tone")
    points = explosion.moved(job.geometries[0], job.sheet.panels[0].displacement)
    page, _ = camera.to_page(job.sheet.panels[0].projection, points)
    assert page.min(axis=0) == pytest.approx((2, 2), abs=0.1)
    assert page.max(axis=0) == pytest.approx((58, job.sheet.page.height - 2), abs=0.1)
    low, high = points.min(axis=0), points.max(axis=0)
    assert high[2] - low[2] == pytest.approx(50 + 80 + 30 + 5 + 3)


def test_exploded_0_is_the_assembled_figure() -> None:
    assembled, exploded = figure("width 70 mm"), figure("exploded 0", "width 70 mm")
    one, other = assembled.sheet.panels[0], exploded.sheet.panels[0]
    assert other.displacement is None and other.curves == ()
    assert one.projection.world_to_page.tobytes() == other.projection.world_to_page.tobytes()
    assert (one.place, one.style, one.lighting) == (other.place, other.style, other.lighting)
    assert assembled.sheet.page == exploded.sheet.page
    assert assembled.geometries[0].key == exploded.geometries[0].key


@pytest.mark.parametrize(("style", "kind"), [("lines", "svg"), ("tone", "png")])
def test_exploded_0_gives_the_same_bytes(style: str, kind: str) -> None:
    files = []
    for lines in ((), ("exploded 0",), ("exploded 0.5",)):
        job = figure(*lines, "width 30 mm", f"drawn as {style}")
        files.append(sheet.encode(sheet.draw(job, (kind,)), job, kind))
    assert files[0] == files[1] != files[2]


def test_every_moved_thing_has_a_trace_along_its_way_from_where_it_sat() -> None:
    job = figure("exploded")
    curves = {job.geometries[0].nodes[curve.node].path: curve for curve in job.sheet.panels[0].curves}
    assert set(curves) == {"drum.cover", *(f"drum.cover.screws[{k}]" for k in range(1, 5))}
    assert all(curve.line_class is LineClass.TRACE_LINE and curve.is_hidden_by_parts for curve in curves.values())
    # The screws stick out below the lid, so the cover's way begins 7 mm below the rim where the can's sits.
    assert curves["drum.cover"].points == pytest.approx(np.array([(0, 0, 43), (0, 0, 83)]), abs=1e-6)
    # A screw at 20 mm has its tip 12 mm under its head's seat, and the whole cover is 40 mm up.
    tips = np.array([(20, 0, 83), (20, 0, 98)])
    assert curves["drum.cover.screws[1]"].points == pytest.approx(tips, abs=1e-6)


def test_marks_with_an_axis_along_the_way_carry_the_traces() -> None:
    model = DRUM.replace(
        "ring 4\n\npart screw",
        "ring 4\n    mark left at (-20 mm, 0, 0) along z\n    mark right at (20 mm, 0, 0) along -z\n"
        "    mark aside at (0, 0, 0) along x\n\npart screw",
    ).replace("    place cover at (0, 0, 50 mm)", "    place lid at (0, 0, 50 mm)")
    job = figure("exploded", model=model)
    ends = sorted(tuple(np.round(curve.points.ravel(), 9)) for curve in job.sheet.panels[0].curves)
    assert ends == [(-20, 0, 50, -20, 0, 90), (20, 0, 50, 20, 0, 90)]


def test_a_trace_runs_through_the_middle_where_the_origin_axis_misses_the_thing() -> None:
    model = "part plate\n    add block (40 mm, 40 mm, 4 mm)\npart peg\n    add cylinder diameter 6 mm length 10 mm"
    model += " at (12 mm, 5 mm, 4 mm)\nassembly a\n    place plate\n    place peg explodes 20 mm\n"
    (curve,) = figure("exploded", model=model, show="show a").sheet.panels[0].curves
    assert curve.points == pytest.approx(np.array([(12, 5, 4), (12, 5, 24)]), abs=0.01)


def test_traces_on_one_line_become_one() -> None:
    model = "part disc\n    add cylinder diameter 20 mm length 4 mm\nassembly pile\n    place disc\n"
    model += "    place disc as middle at (0, 0, 4 mm) explodes 20 mm\n"
    model += "    place disc as upper at (0, 0, 8 mm) explodes 50 mm\n"
    (curve,) = figure("exploded", model=model, show="show pile").sheet.panels[0].curves
    assert curve.points == pytest.approx(np.array([(0, 0, 4), (0, 0, 58)]), abs=1e-6)


def test_what_is_hidden_leaves_no_trace() -> None:
    job = figure("exploded", "hide cover.screws")
    assert [job.geometries[0].nodes[curve.node].path for curve in job.sheet.panels[0].curves] == ["drum.cover"]


def test_a_subject_within_an_assembly_explodes_in_its_own_frame() -> None:
    job = figure("exploded", show="show drum.cover")
    assert shift_of(job, "drum.cover") == (0, 0, 0)
    assert shift_of(job, "drum.cover.screws[1]") == pytest.approx((0, 0, 15))


def test_details_and_local_views_go_where_their_marks_go() -> None:
    model = DRUM.replace(
        "    cut cylinder diameter 5 mm", "    mark edge at (30 mm, 0, 0) along x\n    cut cylinder diameter 5 mm"
    )
    lines = ("detail of cover.lid.edge enlarged 2 diameter 8 mm", "view along cover.lid.edge as C", "width 150 mm")
    for factor in (0.0, 1.0, 1.5):
        job = figure(f"exploded {factor:g}", *lines, model=model, show="show drum from front")
        main = job.sheet.panels[0]
        assert main.detail_frames[0].centre == pytest.approx((30, 0, 50 + 40 * factor))
        assert main.arrows[0].tip[2] == pytest.approx(50 + 40 * factor) and main.arrows[0].tip[0] > 30


def test_an_exploded_view_set_moves_alike_in_all_views() -> None:
    job = figure("exploded", "third angle front, top, right", "width 120 mm")
    first, *others = (panel.displacement for panel in job.sheet.panels)
    assert first is not None and all(other is not None and (other == first).all() for other in others)
    assert all(len(panel.curves) == 5 for panel in job.sheet.panels)


def test_central_projection_takes_in_what_is_moved() -> None:
    model = DRUM + "viewpoint v\n    eye (-300 mm, -500 mm, 300 mm) toward (0, 0, 50 mm)\n"
    job = figure("exploded", "drawn as tone", model=model, show="show drum from v")
    page, _ = camera.to_page(
        job.sheet.panels[0].projection, explosion.moved(job.geometries[0], job.sheet.panels[0].displacement)
    )
    assert page.min(axis=0) == pytest.approx((2, 2), abs=0.1)


def test_nothing_that_explodes_is_a_warning_and_too_many_things_a_problem(monkeypatch: pytest.MonkeyPatch) -> None:
    run = checked("part p\n    add sphere diameter 9 mm\nfigure f\n    show p\n    exploded\n")
    (warning,) = run.problems
    assert (warning.code, warning.severity, warning.span.line) == ("no-effect", Severity.WARNING, 5)
    monkeypatch.setattr(limits, "TRACES", 3)
    (error,) = checked(DRUM + "figure f\n    show drum\n    exploded\n").problems
    assert (error.code, error.span.line) == ("too-much", len(DRUM.splitlines()) + 3) and "5 things" in error.sentence


def test_measures_and_facts_know_nothing_of_the_explosion() -> None:
    text = DRUM + "expect drum\n    height(cover) = 15 mm within 0.01 mm\nfigure f\n    show drum\n    exploded\n"
    assert checked(text).problems == []
    run = built(text)
    assert run.model is not None
    job, _ = scene.plan(run.model, "f", run.meshes, measures=True)
    assert job is not None and [wanted.node for wanted in job.sheet.measures] == [0, 1, 2]

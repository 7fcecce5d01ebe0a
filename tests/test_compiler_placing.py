"""Placing: where clauses put things, how patterns repeat them, and by which paths the copies are known."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from platewright.compiler import scene
from platewright.compiler.coincidence import coincide
from platewright.compiler.graph import Assembly, walk
from platewright.compiler.solids.recipe import Affine
from platewright.compiler.solids.transform import IDENTITY, compose, translate, turn
from support.scenes import Run, built, checked, clean

PIN = "part pin\n    add cylinder diameter 2 mm length 10 mm\n    mark tip at (0, 0, 10 mm) along z\n"


def placed(clauses: str, extra: str = "") -> dict[str, Affine]:
    """The world placements of an assembly's one line, by path."""
    run = built(PIN + f"assembly a\n{extra}    place pin {clauses}\n")
    assert run.problems == [] and run.model is not None, run.sentences
    root = run.model.built.things["a"]
    return {entry.path: entry.placement for entry in walk(root, "a") if entry.parent >= 0}


def point(placement: Affine, of: tuple[float, float, float] = (0.0, 0.0, 10.0)) -> tuple[float, ...]:
    """Where a point of the thing's frame goes; by default the tip of the pin."""
    return tuple(sum(a * b for a, b in zip(row[:3], of, strict=True)) + row[3] for row in placement)


def measured(run: Run, path: str) -> tuple[float, ...]:
    """Where a mark or feature stands, by the distances that facts measure."""
    assert run.model is not None
    from platewright.compiler.paths import follow
    from platewright.compiler.values import Vector
    from platewright.lang import tree
    from platewright.lang.reader import read_value

    written, problems = read_value("v", path)
    assert isinstance(written, tree.Path), problems
    start = run.model.built.things[written.steps[0].name]
    found = follow(start, written.steps[1:], run.model.built.scope)
    assert isinstance(found, Vector)
    return found.components


@pytest.mark.parametrize(
    ("clauses", "tip"),
    [
        ("", (0, 0, 10)),
        ("at (1 mm, 2 mm, 3 mm)", (1, 2, 13)),
        ("turn 90 deg about x", (0, -10, 0)),
        ("turn 90 deg about y", (10, 0, 0)),
        ("turn 90 deg", (0, 0, 10)),
        ("turn -90 deg about (1, 0, 0)", (0, 10, 0)),
        ("turn 90 deg about x turn 90 deg about z", (10, 0, 0)),
        ("turn 90 deg about z turn 90 deg about x", (0, -10, 0)),
        ("facing x", (10, 0, 0)),
        ("facing -x", (-10, 0, 0)),
        ("facing -z", (0, 0, -10)),
        ("facing (0, 3, 0)", (0, 10, 0)),
        ("mirrored across z", (0, 0, -10)),
        ("mirrored across x", (0, 0, 10)),
        ("scaled 2", (0, 0, 20)),
        ("scaled 2 at (5 mm, 0, 0)", (5, 0, 20)),
        ("at (5 mm, 0, 0) scaled 2", (5, 0, 20)),
        ("at (1 mm, 0, 0) turn 90 deg about y", (11, 0, 0)),
        ("turn 90 deg about y at (1 mm, 0, 0)", (11, 0, 0)),
        ("turn 180 deg about tip", (0, 0, 10)),
    ],
)
def test_a_thing_is_placed_about_its_own_origin_and_then_moved(clauses: str, tip: tuple[float, ...]) -> None:
    ((_, placement),) = placed(clauses).items()
    assert point(placement) == pytest.approx(tip, abs=1e-12)


def test_right_angles_leave_no_residue() -> None:
    ((_, placement),) = placed("turn 90 deg about x turn 180 deg about z turn 270 deg about y").items()
    assert {abs(value) for row in placement for value in row} == {0.0, 1.0}


def test_a_ring_goes_round_an_axis_of_what_encloses_the_thing() -> None:
    found = placed("at (10 mm, 0, 0) ring 4")
    assert list(found) == ["a.pin[1]", "a.pin[2]", "a.pin[3]", "a.pin[4]"]
    bases = [point(each, (0, 0, 0)) for each in found.values()]
    for base, want in zip(bases, [(10, 0, 0), (0, 10, 0), (-10, 0, 0), (0, -10, 0)], strict=True):
        assert base == pytest.approx(want, abs=1e-12)


def test_a_ring_turns_its_copies() -> None:
    found = placed("turn 90 deg about y at (10 mm, 0, 0) ring 3")
    for k, each in enumerate(found.values()):
        angle = math.radians(120 * k)
        assert point(each) == pytest.approx((20 * math.cos(angle), 20 * math.sin(angle), 0), abs=1e-12)


def test_a_ring_over_an_angle_has_a_copy_at_both_ends() -> None:
    found = list(placed("at (10 mm, 0, 0) ring 3 over 180 deg").values())
    assert point(found[0], (0, 0, 0)) == pytest.approx((10, 0, 0))
    assert point(found[2], (0, 0, 0)) == pytest.approx((-10, 0, 0))
    assert len(placed("at (10 mm, 0, 0) ring 1 over 180 deg")) == 1


def test_a_ring_about_a_mark_of_the_assembly() -> None:
    extra = "    mark axle at (100 mm, 0, 0) along y\n"
    found = list(placed("at (110 mm, 0, 0) ring 2 about axle", extra).values())
    assert point(found[1], (0, 0, 0)) == pytest.approx((90, 0, 0))
    assert point(found[1]) == pytest.approx((90, 0, -10))


def test_a_row_and_a_ring_of_rows() -> None:
    row = list(placed("row 3 by (5 mm, 0, 1 mm)").values())
    assert [point(each, (0, 0, 0)) for each in row] == [(0, 0, 0), (5, 0, 1), (10, 0, 2)]
    found = placed("at (10 mm, 0, 0) row 2 by (0, 0, 20 mm) ring 3")
    assert len(found) == 6 and list(found)[-1] == "a.pin[6]"
    grid = placed("row 2 by (5 mm, 0, 0) row 3 by (0, 5 mm, 0)")
    assert [point(each, (0, 0, 0))[:2] for each in grid.values()] == [
        (0, 0), (5, 0), (0, 5), (5, 5), (0, 10), (5, 10),
    ]  # fmt: skip


def test_a_for_makes_copies_named_by_the_turn_and_a_when_leaves_some_out() -> None:
    found = placed("at (i * 5 mm, 0, 0) for i from 2 to 6 when i is not 4")
    assert list(found) == ["a.pin[1]", "a.pin[2]", "a.pin[4]", "a.pin[5]"]
    assert [point(each, (0, 0, 0))[0] for each in found.values()] == [10, 15, 25, 30]


def test_two_fors_count_their_copies() -> None:
    found = placed("at (i * 5 mm, j * 5 mm, 0) for i from 1 to 2 for j from 1 to 2")
    assert list(found) == [f"a.pin[{k}]" for k in (1, 2, 3, 4)]
    triangle = placed("at (i * 5 mm, j * 5 mm, 0) for i from 1 to 3 for j from i to 3")
    assert len(triangle) == 6


def test_a_for_of_one_turn_still_has_brackets_and_a_plain_line_has_none() -> None:
    assert list(placed("at (i * 5 mm, 0, 0) for i from 1 to 1")) == ["a.pin[1]"]
    assert list(placed("ring 1")) == ["a.pin[1]"]
    assert list(placed("as peg")) == ["a.peg"]


TABLE = "size,x mm,d mm\nM4,0,4\nM6,20,6\n8,40,8\n"
BOLTS = (
    "part bolt(d)\n    add cylinder diameter d length 10 mm\n    mark head at (0, 0, 10 mm)\n"
    'assembly rack\n    place bolt(row.d) as bolts at (row.x, 0, 0) for row over "bolts.csv"\n'
)


def test_copies_made_from_a_table_are_named_by_its_first_column_everywhere() -> None:
    text = BOLTS + "figure f\n    show rack.bolts[M6] from front\n    scale 1:1\n    margin 0 mm\n"
    text += "    drawn as tone\n"
    text += "expect rack\n    distance(bolts[M4].head, bolts[M6].head) = 20 mm\n    width(bolts[8]) = 8 mm\n"
    text += '    height(bolts["M4"]) = 10 mm\n    distance(rack.bolts[M4].head, bolts[8].head) = 40 mm\n'
    run = clean(text, {"bolts.csv": TABLE})
    assert run.model is not None and run.project is not None
    job, _ = scene.plan(run.model, "f", run.meshes)
    assert job is not None and (job.sheet.page.width, job.sheet.page.height) == pytest.approx((6, 10))
    assert job.geometries[0].nodes[0].path == "rack.bolts[M6]"
    found, problems = scene.geometry(run.model, "rack.bolts[M4]", run.meshes)
    assert problems == () and found is not None
    assert [node.path for node in found.geometry.nodes] == ["rack.bolts[M4]"]
    (problem,) = scene.geometry(run.model, "rack.bolts[M5]", run.meshes)[1]
    assert "there is no `bolts[M5]`; the 3 copies run from [M4] to [8]" in problem.sentence
    parts = scene.listing(run.model, run.project, run.meshes)[0].parts
    assert [(row.path, row.copies) for row in parts] == [("rack", 1)] + [("rack.bolts", 1)] * 3


def test_cells_compare_as_texts_and_choose_lines() -> None:
    text = "part peg\n    add cylinder diameter 2 mm length 4 mm\npart ball\n    add sphere diameter 2 mm\nassembly a\n"
    text += '    place peg at (row.x, 0, 0) for row over "t.csv" when row.kind is "peg"\n'
    text += '    place ball at (row.x, 0, 0) for row over "t.csv" when row.kind is not "peg" and row.wanted\n'
    run = clean(text, {"t.csv": "name,x mm,kind,wanted\nr1,0,peg,yes\nr2,10,ball,yes\nr3,20,ball,no\nr4,30,peg,no\n"})
    assert run.model is not None
    paths = [entry.path for entry in walk(run.model.built.things["a"], "a")]
    assert paths == ["a", "a.peg[r1]", "a.peg[r4]", "a.ball[r2]"]


def test_features_of_a_table_are_named_by_its_rows_too() -> None:
    text = "part plate\n    add block (80 mm, 20 mm, 4 mm)\n"
    text += '    cut cylinder diameter row.d length 9 mm centred at (row.x, 0, 0) for row over "bolts.csv" as hole\n'
    text += "expect plate\n    distance(hole[M4], hole[M6]) = 20 mm\n    hole[8].diameter = 8 mm\n"
    run = checked(text, {"bolts.csv": TABLE.replace(",40,", ",-20,")})
    assert run.problems == []


PLATE = (
    "part plate\n    add block (60 mm, 60 mm, 4 mm)\n"
    "    cut cylinder diameter 5 mm length 4 mm at (20 mm, 0, 0) ring 4 as hole\n"
    "    cut cylinder diameter 3 mm length 20 mm centred turn 90 deg about x as bore\n"
    "    add\n        sphere diameter 4 mm at (0, 0, 4 mm)\n        at (10 mm, 0, 0) ring 2\n"
    "    mark corner at (30 mm, 30 mm, 4 mm) along -x\n"
).replace("        at (10 mm, 0, 0) ring 2\n", "")


def test_marks_and_features_move_with_the_part_through_patterns_and_nested_placements() -> None:
    text = PLATE + "assembly tower\n    place plate at (0, 0, 10 mm) turn 90 deg\n"
    text += "assembly city\n    place tower at (100 mm, 0, 0) ring 2 scaled 2\n"
    run = checked(text)
    assert run.problems == []
    assert measured(run, "plate.hole[2]") == pytest.approx((0, 20, 2))
    assert measured(run, "plate.hole[2].top") == pytest.approx((0, 20, 4))
    assert measured(run, "plate.bore") == pytest.approx((0, 0, 0), abs=1e-12)
    assert measured(run, "plate.bore.axis") == pytest.approx((0, -1, 0), abs=1e-12)
    assert measured(run, "tower.plate.hole[1]") == pytest.approx((0, 20, 12), abs=1e-12)
    assert measured(run, "tower.plate.corner") == pytest.approx((-30, 30, 14), abs=1e-12)
    assert measured(run, "tower.plate.corner.axis") == pytest.approx((0, -1, 0), abs=1e-12)
    assert measured(run, "city.tower[1].plate.corner") == pytest.approx((40, 60, 28), abs=1e-12)
    assert measured(run, "city.tower[2].plate.corner") == pytest.approx((-40, -60, 28), abs=1e-9)


def test_the_diameter_of_a_feature_is_scaled_with_it() -> None:
    text = PLATE + "assembly a\n    place plate scaled 3\nexpect a\n    plate.hole[1].diameter = 15 mm\n"
    text += "expect plate\n    hole[1].diameter = 5 mm\n"
    assert checked(text).problems == []


@pytest.mark.parametrize(
    ("path", "sentence"),
    [
        ("plate.hole", "there are 4 of `hole`; brackets say which"),
        ("plate.hole[5]", "there is no `hole[5]`; the 4 copies run from [1] to [4]"),
        ("plate.hole[1].rim", "the feature `hole` has no `rim`"),
        ("plate.hole[1].top.top", "nothing can follow `top`"),
        ("plate.bore[1]", "there is one `bore`, so it takes no brackets"),
        ("plate.corner[1]", "`corner` is a mark; brackets count copies"),
        ("plate.corner.top", "the mark `corner` has no `top`"),
        ("plate.corner.axis.x", "nothing can follow `axis`"),
        ("plate.conrer", "`plate` has nothing called `conrer`"),
        ("plate.hole[yes]", "brackets take a count or the name of a row, found yes or no"),
        ("plate", "`plate` is a thing, not a value"),
    ],
)
def test_a_path_that_leads_nowhere_says_where_it_could(path: str, sentence: str) -> None:
    (error,) = checked(PLATE + f"expect plate\n    distance({path}, corner) >= 0\n").errors
    assert sentence in error.sentence


def test_a_thing_that_a_condition_leaves_out_is_said_to_be_left_out() -> None:
    text = (
        "given\n    opened = yes\n"
        + PIN
        + "assembly a\n    place pin as peg\n    place pin at (9 mm, 0, 0) when not opened\n"
    )
    (error,) = checked(text + "expect a\n    distance(pin.tip, peg.tip) = 9 mm\n").errors
    assert error.sentence == "no copy of `pin` is there: its `when` or `for` leaves none"


def test_things_are_made_once_and_shared() -> None:
    text = "part screw(d = 4 mm)\n    add cylinder diameter d length 10 mm\n"
    text += "    cut prism sides 6 across d / 2 length 2 mm\n"
    text += "assembly ring_of\n    place screw at (3 m, 0, 0) ring 4000\n"
    text += (
        "assembly all\n    place ring_of\n    place ring_of as upper at (0, 0, 1 m)\n    place screw(4 mm) as last\n"
    )
    run = built(text)
    assert run.problems == [] and run.model is not None
    root = run.model.built.things["all"]
    assert isinstance(root, Assembly)
    things = {id(copy.thing) for each in root.occurrences for copy in each.copies}
    assert len(things) == 2
    solids = {id(entry.thing) for entry in walk(root, "all") if not isinstance(entry.thing, Assembly)}
    assert len(solids) == 1
    assert root.n_nodes == 8004
    found, problems = scene.geometry(run.model, "all", run.meshes, 0.5)
    assert problems == () and found is not None
    assert len(found.geometry.meshes) == 1
    assert {node.mesh for node in found.geometry.nodes} == {-1, 0}
    assert len(found.geometry.faces) == 8001 * len(found.geometry.meshes[0].faces)
    assert len(run.meshes.kept) == 1


def test_grouped_shapes_act_together_and_share_the_placing_of_their_line() -> None:
    text = "part p\n    add block (90 mm, 90 mm, 4 mm)\n    cut at (20 mm, 0, 0) ring 4 as slot\n"
    text = text.replace("cut at (20 mm, 0, 0) ring 4 as slot", "cut")
    text += "        cylinder diameter 4 mm length 4 mm at (20 mm, 0, 0) ring 4\n        block (2 mm, 2 mm, 4 mm)\n"
    run = clean(text)
    assert run.model is not None and run.project is not None
    (row,) = scene.listing(run.model, run.project, run.meshes)[0].parts
    assert row.volume == pytest.approx(90 * 90 * 4 - 4 * 4 * math.pi * 4 - 16, rel=1e-5)


def test_a_part_is_a_shape_of_another_with_its_own_marks_to_turn_about() -> None:
    text = "part arm\n    add block (20 mm, 4 mm, 4 mm)\n    mark elbow at (10 mm, 0, 0) along z\n"
    text += "part double\n    add arm\n    add arm turn 90 deg about elbow\n"
    run = clean(text)
    assert run.model is not None and run.project is not None
    rows = {row.path: row.size for row in scene.listing(run.model, run.project, run.meshes)[0].parts}
    assert rows["double"] == pytest.approx((22, 22, 4)) or rows["double"] == pytest.approx((22, 12, 4))


def test_explodes_along_the_things_own_axis_or_by_a_vector() -> None:
    text = PIN + "assembly a\n    place pin turn 90 deg about y explodes 5 mm\n"
    text += "    place pin as other at (0, 9 mm, 0) ring 2 explodes (0, 3 mm, 0)\n"
    run = built(text)
    assert run.problems == [] and run.model is not None
    root = run.model.built.things["a"]
    assert isinstance(root, Assembly)
    assert root.occurrences[0].explodes == (pytest.approx((5.0, 0.0, 0.0)),)
    assert root.occurrences[1].explodes == ((0.0, 3.0, 0.0), (0.0, 3.0, 0.0))


@pytest.mark.parametrize(
    ("shape", "coincides"),
    [
        ("sphere diameter 4 mm ring 3", True),
        ("cylinder diameter 4 mm length 4 mm ring 3", True),
        ("torus diameter 9 mm tube 2 mm ring 3", True),
        ("sphere diameter 4 mm turn 30 deg about x at (5 mm, 0, 0) row 2 by (1 mm, 0, 0)", False),
        ("cylinder diameter 4 mm length 4 mm ring 3 about x", False),
        ("prism sides 3 across 4 mm length 4 mm ring 2", False),
        ("sphere diameter 4 mm at (9 mm, 0, 0) ring 3", False),
        ("sphere diameter 4 mm for i from 1 to 2", False),
    ],
)
def test_copies_that_lie_on_each_other(shape: str, coincides: bool) -> None:
    run = built(f"part p\n    add {shape}\n")
    assert ("coincident-copies" in run.codes) == coincides, run.sentences


def test_copies_of_a_placed_thing_that_lie_on_each_other() -> None:
    base = "part ball\n    add sphere diameter 2 mm\npart box\n    add block (2 mm, 2 mm, 2 mm)\nassembly a\n    place "
    for line, coincides in (
        ("ball ring 4", True),
        ("box ring 4", False),
        ("box at (i * i * 1 mm, 0, 0) for i from -2 to 2", True),
        ("ball at (i * 1 mm, 0, 0) for i from -2 to 2", False),
    ):
        assert ("coincident-copies" in built(base + line + "\n").codes) == coincides, line


@given(st.lists(st.tuples(st.integers(-3, 3), st.integers(0, 5)), min_size=2, max_size=8, unique=True))
def test_no_two_different_places_coincide(places: list[tuple[int, int]]) -> None:
    placements = [compose(translate((x, 0.0, 0.0)), turn(60.0 * k, (0.0, 0.0, 1.0))) for x, k in places]
    assert not coincide(placements, "none")
    assert coincide([*placements, placements[0]], "none")
    assert coincide(placements, "round") == (len({x for x, _ in places}) < len(places))
    assert coincide([IDENTITY, turn(17.0, (1.0, 2.0, 3.0))], "ball")


angles = st.integers(-36, 36).map(lambda k: 10 * k)
clauses = st.one_of(
    st.tuples(st.just("turn"), angles, st.sampled_from("xyz")).map(lambda c: f"turn {c[1]} deg about {c[2]}"),
    st.sampled_from("xyz").map(lambda axis: f"mirrored across {axis}"),
)


@given(st.lists(clauses, max_size=4), st.tuples(*[st.integers(-50, 50)] * 3))
def test_placing_keeps_lengths_and_moves_last(lines: list[str], shift: tuple[int, int, int]) -> None:
    at = "at ({} mm, {} mm, {} mm)".format(*shift)
    orders = [" ".join([at, *lines]), " ".join([*lines, at])]
    one, other = (next(iter(placed(order).values())) for order in orders)
    assert one == other
    matrix = np.array(one)
    assert np.allclose(matrix[:, :3] @ matrix[:, :3].T, np.eye(3), atol=1e-12)
    assert np.linalg.det(matrix[:, :3]) == pytest.approx((-1) ** sum("mirrored" in line for line in lines))
    assert tuple(matrix[:, 3]) == shift

"""Outlines as they are written: every line becomes the curve it says, and what does not fit is told with its place."""

from __future__ import annotations

import math

import pytest
from platewright.compiler import measure
from platewright.compiler.graph import Solid
from platewright.compiler.solids.build import build
from platewright.compiler.solids.outline import area, extent, oriented
from platewright.compiler.solids.recipe import Edged, Extrude, Outline, Recipe, Revolve
from support.scenes import Run, built, checked

PI = math.pi
SQUARE = "    from (0, 0)\n    to (20 mm, 0)\n    to (20 mm, 20 mm)\n    to (0, 20 mm)\n"
TABLE = {"p.csv": "x mm,y cm\n0,0\n10,0\n10,1\n0,1\n"}


def lines(text: str) -> str:
    return "".join(f"    {line}\n" for line in text.strip().splitlines())


def drawn(text: str, shape: str = "extrude o by 5 mm", extra: str = "") -> Run:
    return built(f"{extra}outline o\n{text}\npart p\n    add {shape}\n", TABLE)


def shape_of(run: Run) -> Extrude | Revolve | Edged:
    assert run.problems == [] and run.model is not None, run.sentences
    solid = run.model.built.things["p"]
    assert isinstance(solid, Solid)
    shape = solid.recipe.steps[0].placed[0].shape
    assert isinstance(shape, Extrude | Revolve | Edged)
    return shape


def outline_of(text: str, extra: str = "") -> Outline:
    shape = shape_of(drawn(text, extra=extra))
    assert isinstance(shape, Extrude)
    return shape.outline


def area_of(text: str, extra: str = "") -> float:
    outline = outline_of(text, extra)
    outer, *holes = (abs(area(oriented(loop, True))) for loop in (outline.outer, *outline.holes))
    return outer - sum(holes)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (SQUARE, 400.0),
        (SQUARE.replace("from (0, 0)", "from (0, 0) rounded 4 mm"), 400.0 - (1 - PI / 4) * 16),
        (SQUARE.replace("(20 mm, 0)", "(20 mm, 0) chamfered 4 mm"), 400.0 - 8.0),
        (SQUARE + "    rounded 4 mm\n", 400.0 - 4 * (1 - PI / 4) * 16),
        (SQUARE + "    rounded 10 mm\n", PI * 100),
        (
            SQUARE.replace("(20 mm, 0)", "(20 mm, 0) chamfered 4 mm") + "    rounded 4 mm\n",
            392.0 - 3 * (1 - PI / 4) * 16,
        ),
        (
            SQUARE
            + "    hole\n"
            + "".join(
                f"    {line}\n"
                for line in lines(
                    "from (5 mm, 5 mm)\nto (15 mm, 5 mm)\nto (15 mm, 15 mm)\nto (5 mm, 15 mm)\nchamfered 1 mm"
                ).splitlines()
            ),
            400.0 - 98.0,
        ),
        (lines("ellipse axes (20 mm, 10 mm) at (3 mm, 4 mm) turn 30 deg"), PI * 50),
        (lines("ellipse axes (20 mm, 20 mm)"), PI * 100),
        (lines("from (0, 0)\nto (10 mm, 0)\nround to (10 mm, 6 mm) tangent\nto (0, 6 mm)"), 60 + PI * 4.5),
        (lines("from (0, 0)\nto (10 mm, 0)\nto (10 mm, 5 mm)\nto (0, 5 mm)\nmirrored across x"), 100.0),
        (lines("from (4 mm, 0)\nto (10 mm, 3 mm)\nmirrored across y"), 18.0),
        (
            lines(
                "from (-5 mm, 0)\nto (-5 mm, -3 mm)\nround to (5 mm, -3 mm) radius 5 mm right\n"
                "to (5 mm, 0)\nmirrored across y"
            ),
            60.0 + PI * 25,
        ),
        (lines("from (10 mm, 0)\nto (4 mm, 4 mm)\nring 4"), 160.0),
        (lines("from (10 mm, -2 mm)\nto (10 mm, 2 mm)\nring 4"), 400.0 - 4 * 32),
        (lines('points over "p.csv"'), 100.0),
        (lines('from (-5 mm, 5 mm)\npoints over "p.csv"'), 125.0),
    ],
)
def test_lines_make_the_area_they_say(text: str, expected: float) -> None:
    assert area_of(text) == pytest.approx(expected, rel=1e-12)


def test_parallel_to_another_outline_and_with_its_parameters() -> None:
    base = "outline base(size = 20 mm)\n    from (0, 0)\n    to (size, 0)\n    to (size, size)\n    to (0, size)\n\n"
    assert area_of(lines("parallel to base by 2 mm inward"), base) == pytest.approx(256.0)
    assert area_of(lines("parallel to base(size = 10 mm) by 2 mm outward"), base) == pytest.approx(100 + 80 + PI * 4)
    ring = "    parallel to base by 2 mm outward\n    hole\n        parallel to base by 2 mm inward\n"
    assert area_of(ring, base) == pytest.approx(400 + 160 + PI * 4 - 256)


def test_curves_pass_through_their_points_and_may_begin_tangent() -> None:
    way = "from (0, 0)\nto (10 mm, 0)\ncurve through (16 mm, 4 mm), (10 mm, 12 mm){}\nto (0, 12 mm)"
    free, tangent = (outline_of(lines(way.format(ends))) for ends in ("", " tangent"))
    assert [stretch.end for stretch in free.outer.stretches][:2] == [(10.0, 0.0), (10.0, 12.0)]
    assert area(oriented(free.outer, True)) != area(oriented(tangent.outer, True))
    assert extent(oriented(tangent.outer, True))[1][0] > 16.0
    assert free == outline_of(lines(way.format(" natural")))
    assert outline_of(lines('curve over "p.csv"')).outer.stretches[0].end == (0.0, 10.0)


BAD = [
    (SQUARE + "    rounded 11 mm\n", "corner-too-large", 6),
    (SQUARE.replace("(20 mm, 20 mm)", "(20 mm, 20 mm) rounded 30 mm"), "corner-too-large", 4),
    (SQUARE.replace("(20 mm, 0)", "(10 mm, 0) rounded 1 mm\n    to (20 mm, 0)"), "no-corner", 3),
    (SQUARE.replace("(20 mm, 20 mm)", "(20 mm, 20 mm) rounded 1 mm chamfered 1 mm"), "said-twice", 4),
    (lines("from (0, 0)\nto (9 mm, 0) rounded 1 mm\ncurve through (9 mm, 9 mm), (0, 9 mm)"), "no-corner", 3),
    (lines("from (0, 0)\nround to (9 mm, 0) tangent\nto (0, 9 mm)"), "no-arc", 3),
    (lines("from (0, 0)\nto (5 mm, 0)\nround to (9 mm, 0) tangent\nto (0, 9 mm)"), "no-arc", 4),
    (lines("from (0, 0)\ncurve through (5 mm, 0), (5 mm, 0), (0, 9 mm)"), "no-length", 3),
    (lines("from (0, 0)\ncurve through (5 mm, 0), (9 deg, 0), (0, 9 mm)"), "wrong-kind", 3),
    (lines("circle diameter 4 mm\nrounded 1 mm"), "open-outline", 3),
    (lines("from (0, 0)\nto (5 mm, 0)\nto (5 mm, 5 mm)\nmirrored across x\nto (0, 9 mm)"), "open-outline", 6),
    (lines("from (0, 0)\nring 3"), "open-outline", 3),
    (lines("from (4 mm, 0)\nto (0, 4 mm)\nring 1"), "out-of-range", 4),
    (lines("parallel to o by 1 mm inward"), "recursion", 2),
    (lines('points over "none.csv"'), "no-such-file", 2),
    (lines("ellipse axes (4 mm, 0)"), "out-of-range", 2),
]


@pytest.mark.parametrize(("text", "code", "line"), BAD, ids=[f"{row[1]}-{k}" for k, row in enumerate(BAD)])
def test_what_does_not_fit_is_told_with_its_place(text: str, code: str, line: int) -> None:
    run = drawn(text)
    assert [(problem.code, problem.span.line) for problem in run.errors] == [(code, line)], run.sentences


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("parallel to base by 10 mm inward", "parallel-vanishes"),
        ("parallel to base by 12 mm inward", "parallel-vanishes"),
        ("parallel to notched by 2 mm outward", "parallel-crosses-itself"),
        ("parallel to oval by 4 mm inward", "parallel-crosses-itself"),
    ],
)
def test_parallels_that_cannot_be_are_told(text: str, code: str) -> None:
    mouth = "from (0, 0)\nto (24 mm, 0)\nto (24 mm, 9 mm)\nto (16 mm, 9 mm)\nto (16 mm, 2 mm)\nto (4 mm, 2 mm)\n"
    above = (
        "to (4 mm, 19 mm)\nto (16 mm, 19 mm)\nto (16 mm, 12 mm)\nto (24 mm, 12 mm)\nto (24 mm, 21 mm)\nto (0, 21 mm)"
    )
    notch = lines(mouth + above)
    extra = f"outline base\n{SQUARE}\noutline notched\n{notch}\noutline oval\n    ellipse axes (16 mm, 10 mm)\n\n"
    run = drawn(lines(text), extra=extra)
    assert [problem.code for problem in run.errors] == [code], run.sentences


@pytest.mark.parametrize(
    ("table", "code"),
    [
        ("x mm,y mm,z mm\n0,0,0\n1,1,1\n2,0,0\n", "bad-table"),
        ("x mm,y\n0,0\n1,1\n2,0\n", "bad-table"),
        ("x mm,y mm\n0,0\n1,\n2,0\n", "bad-table"),
        ("x mm,y mm\n0,0\n1,1\n1,1\n", "no-length"),
        ("x mm,y mm\n", "bad-table"),
    ],
)
def test_tables_of_points_have_two_columns_of_lengths(table: str, code: str) -> None:
    run = built('outline o\n    points over "p.csv"\npart p\n    add extrude o by 5 mm\n', {"p.csv": table})
    assert [problem.code for problem in run.errors] == [code], run.sentences


def test_points_of_a_table_need_no_names() -> None:
    """Elsewhere the first column names the rows and may not repeat itself; points may."""
    assert area_of(lines('points over "p.csv"')) == pytest.approx(100.0)


@pytest.mark.parametrize(
    ("shape", "made"),
    [
        ("extrude o by 5 mm taper 3 deg", Extrude),
        ("extrude o by 5 mm taper -3 deg twist 20 deg", Extrude),
        ("extrude o by 5 mm twist 20 deg", Extrude),
        ("extrude o by 5 mm rounded 1 mm", Edged),
        ("revolve o through 90 deg", Revolve),
        ("revolve o chamfered 1 mm", Edged),
    ],
)
def test_shapes_made_from_outlines(shape: str, made: type) -> None:
    run = checked(f"outline o\n{SQUARE}\npart p\n    add {shape} as body\n")
    found = shape_of(run)
    assert isinstance(found, made)
    mesh, flaws = build(Recipe(run.model.built.things["p"].recipe.steps), 0.05)  # type: ignore[union-attr]
    assert mesh is not None and flaws == ()
    assert measure.volume(mesh.vertices, mesh.faces) > 1000.0


SHAPES = [
    ("block (10 mm, 8 mm, 6 mm)", 480.0),
    ("wedge (10 mm, 8 mm, 6 mm)", 240.0),
    ("wedge (10 mm, 8 mm, 6 mm) top 4 mm", 336.0),
    ("cylinder diameter 10 mm length 6 mm", PI * 150),
    ("cone diameter 10 mm length 6 mm", PI * 50),
    ("cone diameter 10 mm top 6 mm length 6 mm", PI * 98),
    ("prism sides 5 across 10 mm length 6 mm", 544.9),
    ("pyramid sides 4 across 10 mm length 9 mm", 300.0),
    ("pyramid sides 4 across 10 mm top 6 mm length 6 mm", 392.0),
]


@pytest.mark.parametrize("clause", ["rounded 0.5 mm", "chamfered 0.5 mm"])
@pytest.mark.parametrize(("shape", "volume"), SHAPES)
def test_edges_of_shapes(shape: str, volume: float, clause: str) -> None:
    run = checked(f"part p\n    add {shape} {clause} as body\n    mark top at (0, 0, 6 mm)\n")
    assert run.problems == [] and run.model is not None, run.sentences
    mesh, flaws = build(run.model.built.things["p"].recipe, 0.01)
    assert mesh is not None and flaws == ()
    found = measure.volume(mesh.vertices, mesh.faces)
    assert 0.85 * volume < found < volume


@pytest.mark.parametrize(
    ("shape", "code"),
    [
        ("sphere diameter 9 mm rounded 1 mm", "no-edges"),
        ("block (10 mm, 8 mm, 6 mm) rounded 1 mm chamfered 1 mm", "said-twice"),
        ("block (10 mm, 8 mm, 6 mm) rounded 3 mm", "corner-too-large"),
        ("block (10 mm, 8 mm, 6 mm) chamfered 3 mm", "corner-too-large"),
        ("cylinder diameter 10 mm length 6 mm rounded 3.1 mm", "corner-too-large"),
        ("cone diameter 10 mm length 6 mm rounded 4 mm", "corner-too-large"),
        ("pyramid sides 4 across 10 mm length 9 mm chamfered 6 mm", "corner-too-large"),
        ("extrude o by 5 mm rounded 3 mm", "corner-too-large"),
        ("extrude o by 50 mm rounded 11 mm", "corner-too-large"),
        ("extrude o by 5 mm taper 89 deg", "out-of-range"),
        ("extrude o by 50 mm taper 30 deg", "taper-too-large"),
        ("extrude o by 5 mm twist 40000 deg", "out-of-range"),
        ("revolve o through 400 deg", "out-of-range"),
        ("revolve o through 0", "out-of-range"),
        ("revolve o rounded 11 mm", "corner-too-large"),
    ],
)
def test_edges_and_tapers_that_do_not_fit_are_told(shape: str, code: str) -> None:
    run = checked(f"outline o\n{SQUARE}\npart p\n    add {shape}\n")
    assert [(problem.code, problem.span.line) for problem in run.errors] == [(code, 8)], run.sentences


@pytest.mark.parametrize("axes", ["x mm,y", "x,y mm", "x mm,y mm,z"])
def test_a_column_without_unit_is_named_for_outlines_and_paths_alike(axes: str) -> None:
    bare = next(column for column in axes.split(",") if "mm" not in column)
    table = f"{axes}\n" + "\n".join(",".join("0" for _ in axes.split(",")) for _ in range(3)) + "\n"
    use = "add extrude o by 5 mm" if len(axes.split(",")) == 2 else "add tube along o diameter 1 mm"
    kind = "outline" if len(axes.split(",")) == 2 else "path"
    run = built(f'{kind} o\n    points over "p.csv"\npart p\n    {use}\n', {"p.csv": table})
    assert [(each.code, each.hint) for each in run.errors] == [
        ("bad-table", f"write the unit behind its name: `{bare} mm`")
    ]

"""Surfaces that cross themselves: the test of triangles against exact arithmetic, and the shapes that rely on it."""

from __future__ import annotations

import math
from itertools import combinations

import numpy as np
import pytest
from numpy.typing import NDArray
from platewright.compiler import scene
from platewright.compiler.solids.coarse import coarse_surfaces
from platewright.compiler.solids.crossing import crossing
from platewright.compiler.solids.recipe import (
    Field,
    LineTo,
    Loop,
    Outline,
    ParametricSurface,
    Recipe,
    Relief,
    Transition,
)
from platewright.compiler.solids.sheets import MOST_CELLS, sheet, sheet_flaws, strays
from platewright.compiler.solids.transform import scale
from platewright.compiler.solids.transition import transition, transition_flaws
from platewright.lang.problems import Severity
from support.recipes import add
from support.scenes import built, checked

F64 = NDArray[np.float64]
Exact = list[int]


def _volume(a: Exact, b: Exact, c: Exact, d: Exact) -> int:
    p, q, r = ([x - y for x, y in zip(each, a, strict=True)] for each in (b, c, d))
    return p[0] * (q[1] * r[2] - q[2] * r[1]) - p[1] * (q[0] * r[2] - q[2] * r[0]) + p[2] * (q[0] * r[1] - q[1] * r[0])


def _pierces(a: Exact, b: Exact, triangle: list[Exact]) -> bool:
    """Whether the stretch a-b meets a triangle in whose plane neither end lies."""
    if _volume(*triangle, a) * _volume(*triangle, b) >= 0:
        return False
    around = [_volume(a, b, triangle[k], triangle[(k + 1) % 3]) for k in range(3)]
    return all(each >= 0 for each in around) or all(each <= 0 for each in around)


def test_pairs_of_triangles_against_exact_arithmetic() -> None:
    """Corners on small whole numbers, so that integers decide without rounding; none has a corner in the other's
    plane, where two triangles meet exactly if a side of one pierces the other.
    """
    random, n_met = np.random.default_rng(11), 0
    while n_met < 100:
        corners = random.integers(-6, 7, (6, 3))
        one, other = corners[:3].tolist(), corners[3:].tolist()
        if any(_volume(*one, p) == 0 for p in other) or any(_volume(*other, p) == 0 for p in one):
            continue
        meets = any(_pierces(p, q, other) for p, q in combinations(one, 2)) or any(
            _pierces(p, q, one) for p, q in combinations(other, 2)
        )
        found = crossing(corners.astype(np.float64), np.arange(6).reshape(2, 3))
        assert (found is not None) == meets, corners.tolist()
        n_met += meets


@pytest.mark.parametrize(
    ("other", "meets"),
    [
        ([(2, 2, 0), (9, 2, 0), (2, 9, 0)], True),  # in one plane, over each other
        ([(10, 1, 0), (19, 1, 0), (10, 9, 0)], False),  # in one plane, side by side
        ([(4, 4, 0), (4, 4, 5), (5, 4, 5)], True),  # a corner touches the inside
        ([(4, 4, 1e-6), (4, 4, 5), (5, 4, 5)], False),
        ([(20, 20, 0), (20, 21, 0), (21, 20, 0)], False),
    ],
)
def test_triangles_in_one_plane_and_touching(other: list[tuple[float, float, float]], meets: bool) -> None:
    vertices = np.array([(0, 0, 0), (10, 0, 0), (0, 10, 0), *other], np.float64)
    assert (crossing(vertices, np.arange(6).reshape(2, 3)) is not None) == meets


def test_neighbours_meet_only_where_they_are_folded_or_cross() -> None:
    fan = np.array([(0, 0, 0), (10, 0, 0), (0, 10, 0), (-10, 0, 0), (3, 3, 0), (3, 3, 9), (3, 3, -9)], np.float64)
    assert crossing(fan, np.array([(0, 1, 2), (0, 2, 3)])) is None
    assert crossing(fan, np.array([(0, 1, 2), (2, 1, 5)])) is None
    assert crossing(fan, np.array([(0, 1, 2), (1, 0, 4)])) is not None  # folded onto the first along their side
    assert crossing(fan, np.array([(0, 1, 2), (0, 5, 6)])) is not None  # through it, from a corner they share


def program(*steps: tuple[str, float] | float) -> Field:
    return Field(tuple(("number", float(step)) if isinstance(step, float | int) else step for step in steps))


U, V, TIMES, PLUS = ("variable", 0.0), ("variable", 1.0), ("*", 2.0), ("+", 2.0)


def rolled(radius: Field, turns: float, thickness: float) -> ParametricSurface:
    """A sheet along a curve given by its radius at the angle u, upright."""
    x, y = (program(*radius.program, U, (name, 1.0), TIMES) for name in ("cos", "sin"))
    return ParametricSurface((x, y, program(V)), (0.0, 360.0 * turns), (0.0, 20.0), thickness)


def spiral(thickness: float) -> ParametricSurface:
    """Turns of a spiral of Archimedes 1.8 mm apart; those are the distances between its walls, but for the slope."""
    return rolled(program(5.0, U, 0.005, TIMES, PLUS), 5.0, thickness)


@pytest.mark.parametrize(
    ("shape", "crosses"),
    [
        (spiral(1.0), False),
        (spiral(1.7), False),
        (spiral(1.9), True),
        (rolled(program(10.0), 1.0, 1.0), False),
        (rolled(program(10.0), 0.99, 0.5), False),
        (rolled(program(10.0), 2.0, 1.0), True),
        (rolled(program(10.0), 1.01, 1.0), True),
    ],
)
def test_sheets_whose_far_stretches_meet_are_found(shape: ParametricSurface, crosses: bool) -> None:
    codes = [flaw.code for flaw in sheet_flaws(shape)]
    assert codes == (["cuts-itself"] if crosses else [])
    if not crosses:
        for rung in (0.2, 0.02):
            made = sheet(shape, rung)
            assert crossing(made.vertices, made.faces) is None


def test_a_sheet_that_crosses_itself_is_a_problem_at_its_line_with_the_place() -> None:
    eight = "surface (cos(u) * 10 mm, sin(2 * u) * 10 mm, v) u 0 deg .. 360 deg v 0 mm .. 20 mm thickness 1 mm"
    run = checked(f"part p\n    add block (1 mm, 1 mm, 1 mm)\n    add {eight}\n")
    assert run.codes == ["cuts-itself"]
    assert run.errors[0].span.line == 3
    assert "far stretches of it meet" in run.errors[0].sentence


def test_a_sharp_bend_is_tighter_than_any_thickness() -> None:
    """At a coarse division a fold along |u| still comes out whole; a fine one would turn its cells over."""
    bent = ParametricSurface((program(U), program(V), program(U, ("abs", 1.0))), (-20.0, 20.0), (0.0, 10.0), 1.0)
    flaws = sheet_flaws(bent)
    assert [flaw.code for flaw in flaws] == ["cuts-itself"]
    assert "bends tighter than half its thickness" in flaws[0].sentence
    made = sheet(bent, 0.01)
    assert crossing(made.vertices, made.faces) is not None


def zigzag(random: np.random.Generator) -> list[tuple[float, float]]:
    n, turn, depth = int(random.integers(3, 8)), random.uniform(0, 6), random.uniform(5, 17)
    angle = np.arange(2 * n) * math.pi / n + turn
    radius = np.where(np.arange(2 * n) % 2, 20.0 - depth, 20.0)
    return list(zip((radius * np.cos(angle)).tolist(), (radius * np.sin(angle)).tolist(), strict=True))


def outline(points: list[tuple[float, float]]) -> Outline:
    return Outline(Loop(points[0], tuple(LineTo(point) for point in points[1:])), ())


def _cut_crosses(vertices: F64, faces: NDArray[np.integer], height: float) -> bool:
    """Whether the cut of walls at a height, a stretch for each triangle, crosses itself: every pair, in the plane."""
    ends = []
    for corners in vertices[faces]:
        points = [
            a + (height - a[2]) / (b[2] - a[2]) * (b - a)
            for a, b in (corners[[0, 1]], corners[[1, 2]], corners[[2, 0]])
            if (a[2] < height) != (b[2] < height)
        ]
        ends.append([point[:2] for point in points])
    a, b = (np.array(ends)[:, k] for k in (0, 1))

    def side(p: F64, q: F64, r: F64) -> F64:
        return (q[..., 0] - p[..., 0]) * (r[..., 1] - p[..., 1]) - (q[..., 1] - p[..., 1]) * (r[..., 0] - p[..., 0])

    p, q, r, s = a[:, None], b[:, None], a[None], b[None]
    one = (side(p, q, r) < -1e-9) & (side(p, q, s) > 1e-9)
    other = side(r, s, p) * side(r, s, q) < -1e-9
    return bool((one & other).any())


def test_transitions_that_cut_themselves_against_cuts_at_many_heights() -> None:
    """Between the planes of its outlines a transition crosses itself where one of its cuts does."""
    random, n_bad = np.random.default_rng(3), 0
    for _ in range(25):
        shape = Transition(outline(zigzag(random)), outline(zigzag(random)), 20.0)
        made = transition(shape, 0.2)
        slanted = np.ptp(made.vertices[made.faces][:, :, 2], axis=1) > 0.0
        cut = any(_cut_crosses(made.vertices, made.faces[slanted], h) for h in np.linspace(0.01, 19.99, 41))
        crosses = [flaw.code for flaw in transition_flaws(shape)] == ["cuts-itself"]
        assert crosses == cut
        n_bad += crosses
    assert 0 < n_bad < 25


STEP = Relief(program(5.0, U, 3.3333, (">", 2.0), 3.0, TIMES, PLUS), (40.0, 30.0))
FINE = Relief(program(5.0, U, 3000.0, TIMES, ("sin", 1.0), PLUS), (40.0, 30.0))
SMOOTH = Relief(program(5.0, U, 9.0, TIMES, ("sin", 1.0), PLUS), (40.0, 30.0))


def test_what_a_relief_cannot_follow_is_measured() -> None:
    # A step of 3 mm lies half of it from the slope that stands for it.
    assert strays(STEP, 0.05) == pytest.approx(1.5)
    # A full wave takes about one and a half of the most cells there are.
    assert 0.5 < strays(FINE, 0.05) < 2.0
    assert strays(SMOOTH, 0.05) <= 0.05
    for shape, count in ((STEP, 1), (FINE, 1), (SMOOTH, 0)):
        flaws = coarse_surfaces(Recipe((add(shape),)), 0.05)
        assert [(flaw.code, flaw.is_error) for flaw in flaws] == [("coarse-surface", False)] * count
        assert all(f"at most {MOST_CELLS} cells" in flaw.sentence for flaw in flaws)


def test_a_relief_that_is_enlarged_is_measured_as_it_comes_out() -> None:
    part = Recipe((add(STEP),))
    (flaw,) = coarse_surfaces(Recipe((add(part, scale(100.0)),)), 0.05)
    assert "strays up to 150 mm" in flaw.sentence
    assert coarse_surfaces(Recipe((add(part, scale(0.01)),)), 0.05) == ()


def test_coarse_reliefs_are_warned_of_at_their_line() -> None:
    step = "part p\n    add relief z = 5 mm + (3 mm if x > 3.3333 mm else 0) over (40 mm, 30 mm)\n"
    run = checked(step)
    assert run.codes == ["coarse-surface"]
    assert run.problems[0].span.line == 2
    assert "strays up to 1.5 mm" in run.problems[0].sentence


@pytest.mark.parametrize(
    ("function", "code"),
    [
        ("root((x / 1 mm - 0.15)^2 - 0.001)", "no-value"),  # no value within 0.03 of 0.15, where no sample lies
        ("root(abs(x / 1 mm - 0.15)) - 1.3", "no-wall"),  # below the base within 0.09 of it
    ],
)
def test_what_only_a_fine_division_meets_is_a_problem_then(function: str, code: str) -> None:
    run = built(f"part p\n    add relief z = 1 mm + 1 mm * ({function}) over (20 mm, 20 mm)\n")
    assert run.model is not None and run.errors == []
    coarse, problems = scene.geometry(run.model, "p", run.meshes, 1.0)
    assert coarse is not None and not any(problem.severity is Severity.ERROR for problem in problems)
    fine, problems = scene.geometry(run.model, "p", run.meshes, 0.0005)
    assert fine is None
    assert [(problem.code, problem.span.line) for problem in problems] == [(code, 2)]

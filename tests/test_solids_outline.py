"""Outlines: winding, closing, and the mistakes they can hold, whatever the rung."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.compiler import measure
from platewright.compiler.solids import outline as outlines
from platewright.compiler.solids.build import build
from platewright.compiler.solids.flaw import SolidError
from platewright.compiler.solids.ladder import divisions
from platewright.compiler.solids.recipe import ArcTo, Extrude, LineTo, Loop, Outline, Point2, Recipe, Revolve
from support.recipes import add, check_mesh, made


def through(*points: Point2) -> Loop:
    return Loop(points[0], tuple(LineTo(p) for p in points[1:]))


def circle(x: float, y: float, r: float, left: bool = True) -> Loop:
    return Loop((x + r, y), (ArcTo((x + r, y), (x, y), left),))


SQUARE = through((0.0, 0.0), (10.0, 0.0), (10.0, 10.0), (0.0, 10.0))


def code_of(outline: Outline, turned: bool = False) -> str:
    found = outlines.faults(outline, turned)
    assert len(found) <= 1
    return found[0].code if found else ""


def test_winding_does_not_matter() -> None:
    turned = through((0.0, 0.0), (0.0, 10.0), (10.0, 10.0), (10.0, 0.0))
    volumes = []
    for outer in (SQUARE, turned):
        for left in (True, False):
            mesh = made(add(Extrude(Outline(outer, (circle(5.0, 5.0, 3.0, left),)), 2.0)))
            check_mesh(mesh, 0.02)
            volumes.append(measure.volume(mesh.vertices, mesh.faces))
    assert max(volumes) - min(volumes) < 1e-9
    n = divisions(3.0, 0.02)
    assert volumes[0] == pytest.approx(2.0 * (100.0 - 9.0 * n / 2 * math.sin(math.tau / n)), rel=1e-12)


def test_closing_stretch_may_be_left_out_or_written() -> None:
    written = Loop((0.0, 0.0), (*SQUARE.stretches, LineTo((0.0, 0.0))))
    assert outlines.oriented(written, True) == outlines.oriented(SQUARE, True)


def test_points_on_a_straight_stretch_leave_no_wall_of_their_own() -> None:
    more = through((5.0, 0.0), (10.0, 0.0), (10.0, 10.0), (0.0, 10.0), (0.0, 10.0), (0.0, 4.0), (0.0, 0.0))
    assert len(outlines.oriented(more, True)) == 4
    assert made(add(Extrude(Outline(more), 2.0))).patches.kind.tolist() == [0] * 6


@pytest.mark.parametrize(
    ("outline", "code"),
    [
        (Outline(SQUARE), ""),
        (Outline(SQUARE, (circle(5.0, 5.0, 4.999),)), ""),
        (Outline(SQUARE, (circle(5.0, 5.0, 5.0),)), "outline-crosses-itself"),
        (Outline(SQUARE, (circle(5.0, 5.0, 5.1),)), "outline-crosses-itself"),
        (Outline(SQUARE, (circle(15.0, 5.0, 2.0),)), "hole-outside"),
        (Outline(SQUARE, (circle(5.0, 5.0, 20.0),)), "hole-outside"),
        (Outline(SQUARE, (circle(5.0, 5.0, 4.0), circle(5.0, 5.0, 2.0))), "hole-outside"),
        (Outline(SQUARE, (circle(3.0, 5.0, 1.0), circle(5.0, 5.0, 1.001))), "outline-crosses-itself"),
        (Outline(SQUARE, (circle(3.0, 5.0, 1.0), circle(5.0, 5.0, 0.999))), ""),
        (Outline(through((0.0, 0.0), (10.0, 10.0), (10.0, 0.0), (0.0, 5.0))), "outline-crosses-itself"),
        (Outline(through((0.0, 0.0), (10.0, 0.0), (10.0, 10.0), (5.0, 0.0), (0.0, 10.0))), "outline-crosses-itself"),
        (Outline(through((0.0, 0.0), (10.0, 0.0), (10.0, 5.0), (10.0, -5.0), (0.0, 9.0))), "outline-crosses-itself"),
        (Outline(through((0.0, 0.0), (10.0, 0.0))), "no-area"),
        (Outline(through((0.0, 0.0), (0.0, 0.0))), "no-area"),
        (Outline(Loop((0.0, 0.0), ())), "no-area"),
        (Outline(Loop((0.0, 0.0), (ArcTo((10.0, 0.0), (5.0, 0.0), True),))), ""),
    ],
)
def test_mistakes_have_their_codes(outline: Outline, code: str) -> None:
    assert code_of(outline) == code
    mesh, flaws = build(Recipe((add(Extrude(outline, 1.0), source=3),)), 0.05)
    assert [(f.code, f.source) for f in flaws] == ([(code, 3)] if code else [])
    assert (mesh is None) == bool(code)


def test_crossing_is_named_by_its_place() -> None:
    bow = Outline(through((0.0, 0.0), (10.0, 10.0), (10.0, 0.0), (0.0, 8.0)))
    (flaw,) = outlines.faults(bow, False)
    assert "(4.44444 mm, 4.44444 mm)" in flaw.sentence


def test_radius_below_zero_matters_only_when_revolved() -> None:
    left = Outline(through((-1.0, 0.0), (10.0, 0.0), (10.0, 10.0)))
    assert code_of(left) == ""
    assert code_of(left, turned=True) == "negative-radius"
    bulge = Outline(Loop((1.0, 0.0), (LineTo((5.0, 0.0)), LineTo((5.0, 8.0)), LineTo((1.0, 8.0)), bulge_left())))
    assert code_of(bulge, turned=True) == "negative-radius"
    mesh, flaws = build(Recipe((add(Revolve(bulge), source=4),)), 0.05)
    assert mesh is None
    assert [(f.code, f.source) for f in flaws] == [("negative-radius", 4)]


def bulge_left() -> ArcTo:
    return ArcTo((1.0, 0.0), (1.0, 4.0), True)


def test_too_many_stretches_are_refused_before_any_work() -> None:
    n = outlines.MAX_STRETCHES + 1
    ring = through(*[(math.cos(math.tau * k / n), math.sin(math.tau * k / n)) for k in range(n + 1)])
    assert code_of(Outline(ring)) == "too-large"


def test_arc_whose_ends_differ_in_radius_is_our_bug() -> None:
    with pytest.raises(SolidError, match="radius"):
        outlines.oriented(Loop((1.0, 0.0), (ArcTo((0.0, 2.0), (0.0, 0.0), True),)), True)


def test_nearly_straight_arc_of_huge_radius_stays_cheap() -> None:
    r = 1e7
    centre = (10.0 - math.sqrt(r * r - 25.0), 5.0)
    arc = ArcTo((10.0, 10.0), centre, True)
    outline = Outline(Loop((10.0, 0.0), (arc, LineTo((0.0, 10.0)), LineTo((0.0, 0.0)))))
    mesh = made(add(Extrude(outline, 1.0)), rung=0.001)
    assert len(mesh.faces) < 50
    assert measure.volume(mesh.vertices, mesh.faces) == pytest.approx(100.0, rel=1e-4)


@settings(max_examples=80, deadline=None)
@given(st.lists(st.tuples(st.floats(2.0, 10.0), st.booleans()), min_size=3, max_size=30), st.booleans())
def test_star_outlines_of_lines_and_arcs_are_sound(spokes: list[tuple[float, bool]], revolved: bool) -> None:
    """A star round (20, 0) never crosses itself; its area is that of the solid's cap."""
    n = len(spokes)
    points = [
        (20.0 + r * math.cos(math.tau * k / n), r * math.sin(math.tau * k / n)) for k, (r, _) in enumerate(spokes)
    ]
    stretches: list[LineTo | ArcTo] = []
    for k, (_, curved) in enumerate(spokes):
        a, b = points[k], points[(k + 1) % n]
        middle = ((a[0] + b[0]) / 2, (a[1] + b[1]) / 2)
        across = ((b[1] - a[1]) * 3, (a[0] - b[0]) * 3)
        # A flat arc that bulges outward by a twelfth of its chord.
        centre = (middle[0] - across[0] / 2, middle[1] - across[1] / 2)
        stretches.append(ArcTo(b, centre, True) if curved else LineTo(b))
    outline = Outline(Loop(points[0], tuple(stretches)))
    if code_of(outline, revolved):
        return
    mesh = made(add(Revolve(outline) if revolved else Extrude(outline, 3.0)), rung=0.05)
    check_mesh(mesh, 0.05)
    if not revolved:
        exact = 3.0 * outlines.area(outlines.oriented(outline.outer, True))
        lengths = sum(math.dist(p, q) for p, q in zip(points, points[1:] + points[:1], strict=True))
        assert abs(measure.volume(mesh.vertices, mesh.faces) - exact) <= 3.0 * 0.05 * 1.2 * lengths


@settings(max_examples=100, deadline=None)
@given(st.lists(st.tuples(st.integers(-6, 6), st.integers(-6, 6)), min_size=3, max_size=9))
def test_crossings_agree_with_a_plain_search(points: list[tuple[int, int]]) -> None:
    """Whole-number polygons against an exact test of every pair of sides."""
    polygon = [(float(x), float(y)) for x, y in points]
    curves = outlines.oriented(through(*polygon), True)
    if len(curves) < 3 or outlines.area(curves) == 0.0:
        return
    sides = [(c.start, c.end) for c in curves]
    met = any(_meet(sides, i, j) for i in range(len(sides)) for j in range(i))
    lines = [outlines.polyline(curves, 1.0)]
    assert (outlines.contact(lines) is not None) == met


def _meet(sides: list[tuple[Point2, Point2]], i: int, j: int) -> bool:
    (a, b), (c, d) = sides[i], sides[j]
    neighbours = (i - j) % len(sides) == 1, (j - i) % len(sides) == 1
    ends = [(c, a, b, neighbours[0]), (d, a, b, neighbours[1]), (a, c, d, neighbours[1]), (b, c, d, neighbours[0])]
    if neighbours[0]:  # side j runs into side i: d is a
        ends = [(c, a, b, False), (b, c, d, False)]
    elif neighbours[1]:
        ends = [(d, a, b, False), (a, c, d, False)]
    if any(_on(p, q, r) for p, q, r, _ in ends):
        return True
    if any(neighbours):
        return False
    return _turn(a, b, c) * _turn(a, b, d) < 0 and _turn(c, d, a) * _turn(c, d, b) < 0


def _turn(a: Point2, b: Point2, p: Point2) -> float:
    return (b[0] - a[0]) * (p[1] - a[1]) - (b[1] - a[1]) * (p[0] - a[0])


def _on(p: Point2, a: Point2, b: Point2) -> bool:
    box = min(a[0], b[0]) <= p[0] <= max(a[0], b[0]) and min(a[1], b[1]) <= p[1] <= max(a[1], b[1])
    return _turn(a, b, p) == 0 and box


def test_extent_is_exact_for_arcs() -> None:
    half = Loop((0.0, -2.0), (ArcTo((0.0, 2.0), (0.0, 0.0), True),))
    assert outlines.extent(outlines.oriented(half, True)) == ((0.0, -2.0), (2.0, 2.0))
    fine = outlines.polyline(outlines.oriented(half, True), 1e-4).points
    assert np.abs(fine.max(axis=0) - (2.0, 2.0)).max() < 1e-12

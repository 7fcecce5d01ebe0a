"""Hatching by numbers: angles off outlines, pitch, neighbours, thin sections, lines that lie on one another."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from platewright.backend.contract import F64, LineClass, Node, Style
from platewright.backend.drawing import BLACK, WHITE, Fill, Lines, Stroke
from platewright.backend.lines import hatching
from platewright.backend.lines.hatching import (
    Hatch,
    HatchRequest,
    angle_between,
    assign_hatches,
    hatch_lines,
    hatching_of,
    is_thin,
    pitch_of,
    straight_directions,
)
from platewright.backend.lines.model import Region
from platewright.backend.lines.regions import rings_of
from shapely import affinity

STYLE = Style("lines")


def cap(shape: shapely.Polygon, node: int, patch: int = 0) -> Region:
    return Region(rings_of(shape), node, patch, True, float(shape.area))


def nodes(*paths: str) -> tuple[Node, ...]:
    return tuple(Node(path, path, -1, np.eye(4)) for path in paths)


def request(*shapes: shapely.Polygon, axes: tuple[float, ...] = ()) -> HatchRequest:
    """One part a shape, named a, b, c and so on."""
    regions = tuple(cap(shape, k) for k, shape in enumerate(shapes))
    return HatchRequest(regions, nodes(*(chr(97 + k) for k in range(len(shapes)))), axes)


def ends(strokes: tuple[Stroke, ...]) -> F64:
    """Both ends (k,4) of straight strokes."""
    found = []
    for stroke in strokes:
        (piece,) = stroke.path.pieces
        assert isinstance(piece, Lines) and len(piece.points) == 1
        found.append((*stroke.path.start, *piece.points[0]))
    return np.array(found)


def directions(lines: F64) -> F64:
    return np.degrees(np.arctan2(lines[:, 1] - lines[:, 3], lines[:, 2] - lines[:, 0])) % 180.0


def area_of(fills: tuple[Fill, ...]) -> shapely.Geometry:
    def ring(path: hatching.Path) -> shapely.Polygon:
        (piece,) = path.pieces
        assert isinstance(piece, Lines)
        return shapely.Polygon([path.start, *piece.points])

    return shapely.union_all([ring(path) for fill in fills for path in fill.paths])


def test_a_plain_part_is_hatched_at_45_degrees() -> None:
    """ISO 128-3: hatching preferably at 45 degrees to the main outline."""
    assert assign_hatches([request(shapely.box(0, 0, 25, 25))]) == {"a": Hatch(45.0, 1.7)}


@pytest.mark.parametrize("turn", range(0, 180, 7))
def test_lines_are_15_degrees_off_every_outline_and_axis(turn: int) -> None:
    shape = affinity.rotate(shapely.box(0, 0, 30, 20), turn)
    axes = (90.0,) if turn % 2 else (0.0, 90.0)
    angle = assign_hatches([request(shape, axes=axes)])["a"].angle
    for other in (*axes, *straight_directions(rings_of(shape))[:, 0]):
        assert angle_between(angle, other) >= 15.0 - 0.05


def test_isometric_outlines_leave_45_degrees() -> None:
    """Axes at 30, 90 and 150 degrees (ISO 5456-3) are exactly 15 degrees off or more."""
    rhombus = shapely.Polygon([(0, 0), (17.320508, -10), (34.641016, 0), (17.320508, 10)])
    assert assign_hatches([request(rhombus, axes=(90.0,))])["a"].angle == 45.0


def test_chords_of_curves_are_no_straight_outlines() -> None:
    assert len(straight_directions(rings_of(shapely.Point(0, 0).buffer(10)))) == 0
    half = shapely.Point(0, 0).buffer(10).intersection(shapely.box(-20, -20, 20, 0))
    found = straight_directions(rings_of(half))
    assert found == pytest.approx(np.array([[0.0, 20.0]]), abs=1e-9) or found[0, 0] in (0.0, 180.0)
    rounded = shapely.box(2, 2, 28, 18).buffer(2)
    assert sorted(straight_directions(rings_of(rounded))[:, 1].round(3)) == [16.0, 16.0, 26.0, 26.0]


def test_pitch_grows_with_the_area_from_0_7_mm() -> None:
    squares = [pitch_of(side**2, 4 * side) for side in (1.0, 5.0, 10.0, 25.0, 50.0, 200.0)]
    assert squares == sorted(squares) and squares[0] == 0.7 and squares[-1] == 4.0
    assert pitch_of(25.0**2, 100.0) == 1.7  # 0.7 + 25 / 25
    assert pitch_of(200.0, 402.0) == 1.0  # a strip 1 mm wide


def test_neighbours_differ_by_lean_first() -> None:
    a, b, c = shapely.box(0, 0, 20, 20), shapely.box(20, 0, 40, 20), shapely.box(10, 20, 30, 40)
    found = assign_hatches([request(a, b, c)])
    assert (found["a"].angle, found["b"].angle) == (45.0, 135.0)
    assert found["a"].pitch == found["b"].pitch
    assert found["c"].pitch / found["a"].pitch >= 1.4 and found["c"].angle in (45.0, 135.0)


def test_parts_across_a_narrow_gap_are_neighbours_and_others_not() -> None:
    left, near, far = shapely.box(0, 0, 20, 20), shapely.box(20.5, 0, 40, 20), shapely.box(21, 0, 40, 20)
    assert assign_hatches([request(left, near)])["b"].angle == 135.0
    assert assign_hatches([request(left, far)])["b"].angle == 45.0


@pytest.mark.parametrize("seed", range(6))
def test_no_two_neighbours_look_alike(seed: int) -> None:
    """A random mosaic: cells of a Voronoi diagram, about six neighbours each."""
    points = shapely.MultiPoint(np.random.default_rng(seed).uniform(0, 100, (40, 2)))
    cells = shapely.get_parts(shapely.voronoi_polygons(points, extend_to=shapely.box(0, 0, 100, 100)))
    asked = HatchRequest(
        tuple(cap(cell, k) for k, cell in enumerate(cells)), nodes(*(f"p{k:02}" for k in range(len(cells))))
    )
    found = assign_hatches([asked])
    pairs = shapely.STRtree(cells).query(cells, predicate="touches").T
    assert len(pairs) > 150
    for k, other in pairs:
        one, two = found[f"p{k:02}"], found[f"p{other:02}"]
        ratio = max(one.pitch, two.pitch) / min(one.pitch, two.pitch)
        assert angle_between(one.angle, two.angle) >= 29.9 or ratio >= 1.4
    assert min(hatch.pitch for hatch in found.values()) >= 0.7


def test_a_part_has_one_hatch_in_all_views_whatever_their_order() -> None:
    first = request(shapely.box(0, 0, 20, 20), shapely.box(20, 0, 40, 20))
    second = HatchRequest((cap(affinity.rotate(shapely.box(0, 0, 30, 30), 50), 0),), nodes("b"))
    found = assign_hatches([first, second])
    assert found == assign_hatches([second, first])
    slanting = straight_directions(second.regions[0].rings)[:, 0]
    assert all(angle_between(found["b"].angle, angle) >= 14.95 for angle in (*slanting, 0.0, 90.0))


def test_lines_are_clipped_exactly_and_a_pitch_apart() -> None:
    ring = shapely.box(10, 10, 40, 40).difference(shapely.Point(25, 25).buffer(8))
    lines = hatch_lines(rings_of(ring), Hatch(45.0, 1.5))
    drawn = shapely.linestrings(lines.reshape(-1, 2, 2))
    assert (shapely.length(shapely.difference(drawn, ring.buffer(1e-9))) < 1e-12).all()
    assert shapely.length(drawn).sum() * 1.5 == pytest.approx(ring.area, rel=0.005)
    assert directions(lines) == pytest.approx(np.full(len(lines), 45.0), abs=1e-9)
    rows = (lines[:, 0] + lines[:, 1]) / np.sqrt(2.0) / 1.5
    assert np.abs(rows - rows.round()).max() < 1e-9  # the phase is the page's
    assert (np.diff(np.unique(rows.round())) == 1).all()
    border = ring.boundary
    assert max(border.distance(shapely.Point(x, y)) for x, y in lines.reshape(-1, 2)) < 1e-9


def test_lines_through_corners_and_along_sides_do_not_leak() -> None:
    """A square whose corners and sides lie on hatch lines exactly: half-open sides, no stray stroke."""
    square = np.array([[0.0, 0.0], [4.0, 0.0], [4.0, 4.0], [0.0, 4.0]])
    level = hatch_lines([square], Hatch(0.0, 1.0))
    assert sorted(level[:, 1].round(12).tolist()) == [0.0, 1.0, 2.0, 3.0]
    lines = hatch_lines([square], Hatch(45.0, np.sqrt(2.0)))
    assert ((lines > -1e-9) & (lines < 4.0 + 1e-9)).all() and len(lines) == 3


def test_separate_faces_of_a_part_lie_on_the_same_lines() -> None:
    hatch = Hatch(60.0, 1.3)
    rows = []
    for shape in (shapely.box(0, 0, 10, 10), shapely.box(31.7, 4.2, 50, 22)):
        lines = hatch_lines(rings_of(shape), hatch)
        rows.append((lines[:, 0] * np.sin(np.radians(60)) + lines[:, 1] * np.cos(np.radians(60))) / 1.3)
    assert all(np.abs(row - row.round()).max() < 1e-9 for row in rows)


def test_strokes_are_narrow_and_keep_clear_of_words() -> None:
    asked = request(shapely.box(0, 0, 40, 30))
    words, more = shapely.box(10, 10, 22, 15), shapely.box(20, 12, 30, 18)
    found = hatching_of(
        asked.regions, asked.nodes, assign_hatches([asked]), STYLE, [rings_of(words)[0], rings_of(more)[0]]
    )
    assert {(stroke.width, stroke.line_class) for stroke in found.strokes} == {(0.18, LineClass.HATCHING)}
    lines = shapely.linestrings(ends(found.strokes).reshape(-1, 2, 2))
    free = words.union(more)
    assert (shapely.length(shapely.intersection(lines, free.buffer(-1e-9))) < 1e-9).all()
    total = shapely.length(lines).sum() * assign_hatches([asked])["a"].pitch
    assert total == pytest.approx(1200.0 - free.area, rel=0.01)
    assert found.solids == () and found.gaps == ()


def test_thin_sections_are_solid() -> None:
    sheet, plate = shapely.box(0, 0, 40, 0.9), shapely.box(0, 5, 40, 6.2)
    bent = shapely.LineString([(0, 20), (30, 20), (30, 40)]).buffer(0.45, cap_style="flat", join_style="mitre")
    assert [is_thin(cap(shape, 0)) for shape in (sheet, plate, bent)] == [True, False, True]
    asked = request(sheet, plate, bent)
    found = hatching_of(asked.regions, asked.nodes, assign_hatches([asked]), STYLE)
    assert [fill.colour for fill in found.solids] == [BLACK, BLACK] and found.gaps == ()
    assert area_of(found.solids).area == pytest.approx(sheet.area + bent.area, abs=1e-6)
    assert len(found.strokes) > 20


def test_solid_neighbours_have_white_between_them() -> None:
    """ISO 128-3 asks for a clear gap; 0.7 mm is from memory."""
    one, two = shapely.box(0, 0, 40, 0.9), shapely.box(0, 0.9, 40, 1.75)
    asked = request(one, two)
    found = hatching_of(asked.regions, asked.nodes, assign_hatches([asked]), STYLE)
    assert {fill.colour for fill in found.gaps} == {WHITE}
    upper, lower = shapely.get_parts(area_of(found.solids))
    assert upper.distance(lower) == pytest.approx(0.7, abs=1e-6)
    gap = area_of(found.gaps)
    assert one.union(two).buffer(1e-6).contains(gap) and gap.area == pytest.approx(0.7 * 40, rel=1e-3)


def test_a_stack_of_very_thin_sheets_keeps_some_of_each() -> None:
    sheets = [shapely.box(0, 0.3 * k, 40, 0.3 * (k + 1)) for k in range(4)]
    asked = request(*sheets)
    found = hatching_of(asked.regions, asked.nodes, assign_hatches([asked]), STYLE)
    parts = shapely.get_parts(area_of(found.solids))
    assert len(parts) == 4 and min(part.area for part in parts) > 0.4 * 0.3 * 40
    assert all(a.distance(b) > 0.02 for k, a in enumerate(parts) for b in parts[:k])


def test_what_is_no_cap_is_not_hatched() -> None:
    surface = Region(rings_of(shapely.box(0, 0, 10, 10)), 0, 0, False, 100.0)
    assert assign_hatches([HatchRequest((surface,), nodes("a"))]) == {}
    found = hatching_of([surface], nodes("a"), {}, STYLE)
    assert (found.strokes, found.solids, found.gaps) == ((), (), ())

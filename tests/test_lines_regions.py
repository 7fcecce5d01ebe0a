"""The areas on which parts are seen: exact where the scene says so, closed where lines stop short, in one order."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shapely
from platewright.backend.contract import F64, I32, Geometry
from platewright.backend.lines import regions as under_test
from platewright.backend.lines.model import Region
from platewright.backend.lines.queries import front_face
from platewright.backend.lines.regions import Polylines, parts_of, polygon_of, visible_regions_of
from platewright.compiler.solids.recipe import Block, Cylinder
from support.geometries import flattened
from support.line_scenes import HELD_OUT, PAGE, VIEWS, fitted, fitted_central, line_panel, nut, placed_at, scene, trap
from support.penetrating import Arranged, arranged, tangle
from support.recipes import add, made


def two_plates() -> Geometry:
    """A plate of 40 x 30, and one of 10 x 10 on it, its corner 5 mm from the corner of the first."""
    large, small = made(add(Block((40.0, 30.0, 5.0)))), made(add(Block((10.0, 10.0, 5.0))))
    return scene([("under", large, placed_at(20, 15, 0)), ("upper", small, placed_at(10, 10, 5))])


def of_part(found: Arranged, path: str) -> list[Region]:
    return [region for region in found.regions if found.geometry.nodes[region.node].path == path]


def owners(found: Arranged, points: F64) -> tuple[I32, I32]:
    """The node seen at page points, by queries of the view and by the regions; -1 for none."""
    face = front_face(found.view, found.occluders, points)
    seen = np.where(face >= 0, found.view.face_node[face], -1)
    filled = np.full(len(points), -1)
    polygons = [polygon_of(region) for region in found.regions]
    of, region = shapely.STRtree(polygons).query(shapely.points(points), predicate="within")
    assert len(np.unique(of)) == len(of)  # no point lies in two regions
    filled[of] = np.array([each.node for each in found.regions])[region]
    return seen, filled


def sampled(found: Arranged, n: int, seed: int = 0) -> F64:
    low, high = found.view.points[:, :2].min(axis=0), found.view.points[:, :2].max(axis=0)
    return low + np.random.default_rng(seed).random((n, 2)) * (high - low)


def test_areas_of_two_plates_from_above() -> None:
    found = arranged(two_plates(), fitted(two_plates(), VIEWS["top"], 80.0))
    (under,), (upper,) = of_part(found, "under"), of_part(found, "upper")
    assert upper.area == pytest.approx(4 * 100.0, abs=1e-5)
    assert under.area == pytest.approx(4 * (1200.0 - 100.0), abs=1e-5)
    assert [len(ring) for ring in under.rings] == [4, 4] and [len(ring) for ring in upper.rings] == [4]
    assert not under.is_cap and under.patch >= 0


def test_a_hole_shows_what_is_behind_it() -> None:
    washer = nut(16.0, 10.0, 4.0, 0.02)
    geometry = scene(
        [("back", made(add(Block((30.0, 30.0, 2.0)))), placed_at(0, 0, -8)), ("washer", washer, placed_at(0, 0, 0))]
    )
    found = arranged(geometry, fitted(geometry, VIEWS["top"], 90.0))
    area = np.pi * 25.0 * 9.0
    through, around = sorted(of_part(found, "back"), key=lambda region: region.area)
    assert through.area == pytest.approx(area, rel=0.01)
    (ring,) = of_part(found, "washer")
    assert len(ring.rings) == 2 and len(around.rings) == 2
    assert ring.area == pytest.approx(np.sqrt(3.0) / 2.0 * 256.0 * 9.0 - through.area, abs=1e-3)


@pytest.mark.parametrize("view", [*VIEWS, *HELD_OUT])
def test_penetrating_parts_own_what_is_seen_of_them(view: str) -> None:
    geometry = tangle()
    sight = (VIEWS | HELD_OUT)[view]
    for projection in (fitted(geometry, sight), fitted_central(geometry, sight)):
        found = arranged(geometry, projection)
        seen, filled = owners(found, sampled(found, 20_000))
        # 0.01 % of the covered samples is no more than one of them.
        assert np.count_nonzero(seen != filled) <= 1


@pytest.mark.parametrize("form", ["as built", "rotated, float32"])
@pytest.mark.parametrize("name", ["touching cubes", "thin sheets"])
def test_parts_that_touch_own_what_is_seen_of_them(name: str, form: str) -> None:
    """Corners of flush parts that miss each other by the rounding of 32-bit numbers, 1e-5 mm on the page."""
    found = arranged(*trap(name, form, VIEWS["front"]))
    seen, filled = owners(found, sampled(found, 10_000))
    assert np.count_nonzero(seen != filled) <= 1


def test_shared_borders_have_the_same_points() -> None:
    found = arranged(tangle(), fitted(tangle(), VIEWS["isometric"]))
    polygons = np.array([polygon_of(region) for region in found.regions])
    assert shapely.is_valid(polygons).all() and shapely.coverage_is_valid(polygons)
    points = [set(map(tuple, np.concatenate(region.rings))) for region in found.regions]
    shared = [len(a & b) for k, a in enumerate(points) for b in points[:k]]
    assert sum(shared) > 50


def test_the_order_of_declaration_does_not_matter() -> None:
    geometry = tangle()
    nodes = [geometry.nodes[k] for k in (3, 0, 4, 2, 1)]
    other = flattened(nodes, geometry.meshes)
    one, two = (arranged(each, fitted(geometry, VIEWS["oblique"])) for each in (geometry, other))

    def told(found: Arranged) -> list[tuple[str, float, int]]:
        return [
            (found.geometry.nodes[region.node].path, round(region.area, 6), len(region.rings[0]))
            for region in found.regions
        ]

    assert told(one) == told(two) and len(told(one)) > 5


def test_outlines_have_few_points_near_the_lines() -> None:
    rod = made(add(Cylinder(20.0, 30.0)))
    found = arranged(
        scene([("rod", rod, placed_at(0, 0, 0))]), fitted(scene([("rod", rod, placed_at(0, 0, 0))]), VIEWS["isometric"])
    )
    (whole,) = parts_of(found.regions)
    mesh_points = len(np.unique(found.view.faces))
    assert 20 < len(whole.rings[0]) < mesh_points
    lines = under_test.borders_of(found.pieces, found.candidates)
    drawn = shapely.union_all(shapely.linestrings(lines.points, indices=lines.line))
    border = shapely.Polygon(whole.rings[0]).exterior
    assert max(drawn.distance(border.interpolate(s)) for s in np.linspace(0, border.length, 500)) < 0.002


def test_parts_and_subtrees_are_taken_together() -> None:
    found = arranged(two_plates(), fitted(two_plates(), VIEWS["isometric"]))
    parts = parts_of(found.regions)
    assert len(found.regions) == 6 and len(parts) == 2
    assert [part.patch for part in parts] == [-1, -1]
    assert sum(part.area for part in parts) == pytest.approx(sum(region.area for region in found.regions), abs=1e-9)
    (both,) = visible_regions_of(found.regions, {0, 1})
    assert shapely.Polygon(both[0]).area == pytest.approx(sum(part.area for part in parts), abs=1e-6)
    assert visible_regions_of(found.regions, ()) == ()


def test_what_is_hidden_or_absent_has_no_region() -> None:
    behind = scene(
        [
            ("front", made(add(Block((30.0, 2.0, 30.0)))), placed_at(0, 0, 0)),
            ("rear", made(add(Block((5.0, 5.0, 5.0)))), placed_at(0, 20, 5)),
        ]
    )
    found = arranged(behind, fitted(behind, VIEWS["front"]))
    assert of_part(found, "rear") == [] and len(of_part(found, "front")) == 1
    none = Polylines(np.empty((0, 2)), np.empty(0, np.int32))
    assert under_test.regions_within(found.view, none, lambda xy: np.zeros(len(xy), np.int32)) == ()


@pytest.fixture(scope="module")
def plain() -> Arranged:
    geometry = two_plates()
    return arranged(geometry, fitted(geometry, VIEWS["top"], 80.0))


def lines(*runs: list[tuple[float, float]]) -> Polylines:
    points = np.array([point for run in runs for point in run], float)
    return Polylines(points, np.repeat(np.arange(len(runs), dtype=np.int32), [len(run) for run in runs]))


def moved_on(*runs: list[tuple[float, float]]) -> Polylines:
    return under_test._extended(lines(*runs), np.ones(len(runs), np.bool_))


def two_faces(plain: Arranged, borders: Polylines) -> list[float]:
    """Areas of the regions where the left half of the page shows face 0, the rest the first face of the other part."""
    other = int(np.flatnonzero(plain.view.face_node != plain.view.face_node[0])[0])

    def under(points: F64) -> I32:
        return np.where(points[:, 0] < 5.0, 0, other).astype(np.int32)

    return sorted(round(region.area, 2) for region in under_test.regions_within(plain.view, borders, under))


FRAME = [(0.0, 0.0), (10.0, 0.0), (10.0, 10.0), (0.0, 10.0), (0.0, 0.0)]


def test_a_line_that_stops_short_is_carried_on(plain: Arranged) -> None:
    short = [(5.0, 0.004), (5.0, 9.985)]
    assert two_faces(plain, lines(FRAME, short)) == [100.0]
    assert two_faces(plain, moved_on(FRAME, short)) == [50.0, 50.0]


def test_a_stub_does_not_turn_the_line_away(plain: Arranged) -> None:
    stub = [(5.0, 0.002), (5.0, 9.998), (5.0 + 2e-4, 9.998 - 2e-4)]
    assert two_faces(plain, moved_on(FRAME, stub)) == [50.0, 50.0]


def test_a_line_nearly_along_the_border_it_ends_at_meets_it(plain: Arranged) -> None:
    slanting = [(5.0, 0.0), (5.0, 5.0), (9.0, 10.0 - 0.02), (9.5, 10.0 - 4e-4)]
    assert len(two_faces(plain, moved_on(FRAME, slanting))) == 2


def test_small_faces_go_to_the_neighbour_of_the_longest_border(plain: Arranged) -> None:
    """A crack 0.05 micrometres wide, through which nothing is seen, between two parts; its left border is longer."""
    middle, right = [(5.0, 0.0), (5.0, 10.0)], [(5.00005, 0.0), (5.0 + 3e-5, 5.0), (5.00005, 10.0)]
    other = int(np.flatnonzero(plain.view.face_node != plain.view.face_node[0])[0])

    def under(points: F64) -> I32:
        crack = (points[:, 0] > 5.0) & (points[:, 0] < 5.0001)
        return np.where(crack, -1, np.where(points[:, 0] < 5.0, 0, other)).astype(np.int32)

    found = under_test.regions_within(plain.view, lines(FRAME, middle, right), under)
    assert len(found) == 2 and sum(region.area for region in found) == pytest.approx(100.0, abs=1e-9)


def test_caps_are_told_apart() -> None:
    geometry = two_plates()
    origin = geometry.face_origin.copy()
    view = arranged(geometry, fitted(geometry, VIEWS["top"], 80.0)).view
    top = np.flatnonzero((view.facing > 0) & (view.face_node == 0))
    origin[view.face_row[top]] = 1
    cut_open = replace(geometry, face_origin=origin)
    found = arranged(cut_open, fitted(geometry, VIEWS["top"], 80.0))
    assert [(region.node, region.is_cap) for region in found.regions] == [(0, True), (1, False)]


def test_ghosts_have_no_region_and_hide_none() -> None:
    geometry = two_plates()
    panel = line_panel(fitted(geometry, VIEWS["top"], 80.0))
    assert panel.place[2:] == (PAGE.width, PAGE.height)
    found = arranged(geometry, fitted(geometry, VIEWS["top"], 80.0), emphasis=np.array([0, 3], np.uint8))
    assert {region.node for region in found.regions} == {0}
    assert sum(region.area for region in found.regions) == pytest.approx(4 * 1200.0, abs=1e-5)

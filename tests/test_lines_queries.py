"""Questions about what is seen, at places known in closed form."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend import camera
from platewright.backend.contract import F64, Emphasis, Geometry, Projection
from platewright.backend.lines.model import View
from platewright.backend.lines.occluders import Occluders, occluders_of
from platewright.backend.lines.queries import front_face, hiders, seen_intervals
from platewright.backend.lines.view import see_view
from platewright.compiler.solids.recipe import Block, Sphere
from support.line_oracle import hits, triangles_of
from support.line_scenes import PAGE, fitted, fitted_central, line_panel, mechanical, placed_at, scene
from support.recipes import add, made


def looked(geometry: Geometry, projection: Projection, **more: object) -> tuple[View, Occluders]:
    view = see_view(geometry, line_panel(projection, **more), PAGE)
    return view, occluders_of(view)


def front(scale: float = 2.0) -> Projection:
    return camera.parallel(camera.orthographic("front"), scale, (60.0, 60.0))


def screens() -> Geometry:
    """Two blocks 20 mm wide: y from -1 to 1, and behind it from 19 to 21, 10 mm to the right."""
    block = made(add(Block((20.0, 2.0, 20.0))))
    return scene([("near", block, placed_at(0, 0, -10)), ("far", block, placed_at(10, 20, -10))])


def test_what_hides_a_point_and_how_deep() -> None:
    view, tree = looked(screens(), front())
    points = np.array([[0.0, 10, 0], [15, 30, 0], [5, 30, 0], [0, -5, 0], [25, 50, 0], [0, -1, 0], [0, 1, 0]])
    node, depth = hiders(view, tree, points)
    # Behind the near one; behind the far one alone; behind both, the foremost is named; before both; beside; on the
    # front of the near one; on its back.
    assert node.tolist() == [0, 1, 0, -1, -1, -1, 0]
    assert depth == pytest.approx([11.0, 11.0, 31.0, 0.0, 0.0, 0.0, 2.0])


def test_depth_in_central_projection_is_in_mm() -> None:
    projection = camera.central((0.0, -101.0, 0.0), (0.0, 0.0, 0.0), 150.0, (60.0, 60.0))
    view, tree = looked(screens(), projection)
    node, depth = hiders(view, tree, np.array([[0.0, 10, 0], [0, -5, 0], [-10.5, 10.0, 0.0], [-13.0, 10.0, 0.0]]))
    # Seen from 100 mm before the near one's front, its left edge at -10 mm covers -11.1 mm at a distance of 111 mm.
    assert node.tolist() == [0, -1, 0, -1]
    assert depth == pytest.approx([11.0, 0.0, 11.0, 0.0])


def test_seen_stretches_of_a_curve() -> None:
    """A level polyline behind the near block and before the far one is seen outside of ±10 mm only."""
    view, tree = looked(screens(), front())
    curve = np.array([[-30.0, 10, 0], [0, 10, 0], [30, 10, 0], [30, 10, 30], [0, 10, 30]])
    found = seen_intervals(view, tree, curve)
    assert len(found) == 4
    for stretches, expected in zip(found, ([[0, 2 / 3]], [[1 / 3, 1]], [[0, 1]], [[0, 1]]), strict=True):
        np.testing.assert_allclose(stretches, expected, atol=1e-5)


def test_seen_stretches_are_shares_in_the_world() -> None:
    """In central projection a segment that recedes is cut where it passes behind in space, not on paper."""
    projection = camera.central((0.0, -101.0, 0.0), (0.0, 0.0, 0.0), 150.0, (60.0, 60.0))
    view, tree = looked(screens(), projection)
    start, end = np.array([-40.0, 10.0, 0.0]), np.array([0.0, 60.0, 0.0])
    (found,) = seen_intervals(view, tree, np.stack([start, end]))
    # Hidden from where x / distance = -10 / 100: (-40 + 40 t) / (111 + 50 t) = -0.1.
    t = (40.0 - 11.1) / 45.0
    np.testing.assert_allclose(found, [[0.0, t]], atol=1e-5)


def test_what_lies_behind_the_eye_is_not_seen() -> None:
    projection = camera.central((0.0, -101.0, 0.0), (0.0, 0.0, 0.0), 150.0, (60.0, 60.0))
    view, tree = looked(screens(), projection)
    curve = np.array([[50.0, -301.0, 40.0], [50.0, -1.0, 40.0], [50.0, -1.0, 50.0], [50.0, -301.0, 50.0], [0, -301, 0]])
    found = seen_intervals(view, tree, curve)
    np.testing.assert_allclose(found[0], [[2 / 3, 1.0]], atol=1e-4)
    np.testing.assert_allclose(found[1], [[0.0, 1.0]])
    np.testing.assert_allclose(found[2], [[0.0, 1 / 3]], atol=1e-4)
    assert found[3].shape == (0, 2)


def test_a_curve_on_a_part_is_seen_on_its_near_side() -> None:
    """A ring about a ball, 0.5 mm off it: the far half is hidden but for what stands out beside the ball."""
    ball = scene([("ball", made(add(Sphere(20.0)), rung=0.005), placed_at(0, 0, 0))])
    view, tree = looked(ball, front())
    angle = np.linspace(0, 2 * np.pi, 721)
    ring = np.column_stack([10.5 * np.cos(angle), 10.5 * np.sin(angle), 0 * angle])
    found = seen_intervals(view, tree, ring, node=0)
    is_seen = np.array([len(stretches) > 0 for stretches in found])
    middle = (angle[1:] + angle[:-1]) / 2
    clear = np.abs(np.abs(10.5 * np.cos(middle)) - 10.0) > 0.1
    expected = (np.sin(middle) < 0) | (np.abs(10.5 * np.cos(middle)) > 10.0)
    np.testing.assert_array_equal(is_seen[clear], expected[clear])


@pytest.mark.parametrize("kind", ["parallel", "central"])
def test_front_faces_are_those_that_rays_meet_first(kind: str) -> None:
    """Page points at random: nothing stands before the face given, nothing at all where none is (oracle: rays)."""
    geometry = mechanical(rung=0.2)
    fit = fitted if kind == "parallel" else fitted_central
    view, tree = looked(geometry, fit(geometry, (-1, 1, -1)))
    xy = np.random.default_rng(3).uniform(5.0, 115.0, (1500, 2))
    face = front_face(view, tree, xy)
    origin, toward = camera.rays(view.projection, xy)
    hit = face >= 0
    assert 300 < hit.sum() < 1200
    corners = view.world[view.faces[face]]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    along = np.einsum("ij,ij->i", corners[:, 0] - origin, normal) / np.einsum("ij,ij->i", toward, normal)
    triangles = triangles_of(view.world, view.faces)
    start = origin - 1e4 * toward if kind == "parallel" else origin
    reach = along + (1e4 if kind == "parallel" else 0.0)
    before = hits(triangles, start, toward, np.where(hit, reach - 1e-3, np.inf), 0.0)
    assert not before.any()
    at_face = hits(triangles, start[hit], toward[hit], reach[hit] + 1e-3, 0.0)
    assert at_face.all()


def test_of_two_faces_in_one_place_the_first_by_path_is_seen() -> None:
    block = made(add(Block((20.0, 2.0, 20.0))))
    for order in (("a", "b"), ("b", "a")):
        geometry = scene([(path, block, placed_at(0.0 if path == "a" else 5.0, 0, -10)) for path in order])
        view, tree = looked(geometry, front())
        face = front_face(view, tree, np.array([[60.0, 60.0], [60.0 + 24.0, 60.0], [60.0 - 15.0, 60.0], [20.0, 20.0]]))
        paths = ["" if f < 0 else geometry.nodes[view.face_node[f]].path for f in face]
        assert paths == ["a", "b", "a", ""]


def test_ghosts_hide_nothing_and_are_not_seen() -> None:
    view, tree = looked(screens(), front(), emphasis=np.array([Emphasis.GHOST, 0], np.uint8))
    assert hiders(view, tree, np.array([[-5.0, 10, 0], [5.0, 30, 0]]))[0].tolist() == [-1, 1]
    assert view.face_node[front_face(view, tree, np.array([[65.0, 60.0]]))].tolist() == [1]


def test_questions_to_an_empty_view() -> None:
    projection = camera.central((0.0, 100.0, 0.0), (0.0, 200.0, 0.0), 80.0, (50.0, 50.0))
    view, tree = looked(screens(), projection)
    points: F64 = np.array([[0.0, 150.0, 0.0], [1.0, 150.0, 0.0]])
    assert hiders(view, tree, points)[0].tolist() == [-1, -1]
    assert front_face(view, tree, points[:, :2]).tolist() == [-1, -1]
    (found,) = seen_intervals(view, tree, points)
    np.testing.assert_array_equal(found, [[0.0, 1.0]])
    assert seen_intervals(view, tree, points[:1]) == () and seen_intervals(view, tree, points[:0]) == ()

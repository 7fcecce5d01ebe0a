"""What a panel sees: displacement, parts left out, facing, near clipping, tolerances."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from platewright.backend import camera
from platewright.backend.contract import Emphasis, Geometry, Page, Projection
from platewright.backend.lines.near import NEAR
from platewright.backend.lines.topology import topology_of
from platewright.backend.lines.view import PAPER_DEPTH, see_view, toward_viewer
from support.geometries import mirrored, one_cube, two_of_a_kind, unit_cube
from support.line_scenes import (
    PAGE,
    fitted,
    free_mesh,
    holed_lids,
    line_panel,
    mechanical,
    placed_at,
    scene,
    tiny_in_huge,
    turned_about,
)


def view_of(geometry: Geometry, projection: Projection, **more: object):  # type: ignore[no-untyped-def]
    return see_view(geometry, line_panel(projection, **more), PAGE)


def oblique() -> Projection:
    """Cabinet projection (ISO 5456-3): the front view, depth axis at 45 degrees and half length."""
    matrix = np.eye(4)
    half = 0.5 * np.sqrt(0.5)
    matrix[0] = 10.0, 10.0 * half, 0.0, 50.0
    matrix[1] = 0.0, -10.0 * half, -10.0, 50.0
    matrix[2] = 0.0, 1.0, 0.0, 0.0
    return Projection("parallel", matrix, None, (0.0, 1.0, 0.0), (1.0, 0.0, 0.0), (0.0, 0.0, 1.0), 10.0)


def test_points_agree_with_the_camera() -> None:
    geometry = two_of_a_kind()
    for projection in (
        fitted(geometry, (-1, 1, -1)),
        camera.central((300, -300, 200), (100, 20, 0), 90.0, (50.0, 50.0)),
    ):
        view = view_of(geometry, projection)
        page, depth = camera.to_page(projection, geometry.vertices)
        np.testing.assert_allclose(view.points, np.column_stack([page, depth]), rtol=1e-12, atol=1e-10)
        assert view.world is geometry.vertices and view.faces is geometry.faces


def test_every_side_has_its_neighbour() -> None:
    for geometry in (two_of_a_kind(), mirrored(), holed_lids()):
        found = topology_of(geometry).neighbour
        assert (found >= 0).all()
        face, side = (k.ravel() for k in np.indices(found.shape))
        start, end = geometry.faces[face, side], geometry.faces[face, (side + 1) % 3]
        across = geometry.faces[found[face, side]]
        assert ((across == start[:, None]).any(axis=1) & (across == end[:, None]).any(axis=1)).all()
        assert (found[found[face, side]] == face[:, None]).any(axis=1).all()


def test_displacement_moves_the_parts() -> None:
    geometry = two_of_a_kind()
    moved = np.zeros((len(geometry.nodes), 3))
    moved[2] = 5.0, 6.0, 7.0
    view = view_of(geometry, fitted(geometry, (-1, 1, -1)), displacement=moved)
    first, last = geometry.nodes[2].vertex_range
    expected = geometry.vertices.copy()
    expected[first:last] += (5.0, 6.0, 7.0)
    np.testing.assert_array_equal(view.world, expected)


def test_hidden_parts_are_left_out_and_ghosts_hide_nothing() -> None:
    geometry = two_of_a_kind()
    emphasis = np.zeros(len(geometry.nodes), np.uint8)
    emphasis[2], emphasis[4] = Emphasis.HIDE, Emphasis.GHOST
    view = view_of(geometry, fitted(geometry, (-1, 1, -1)), emphasis=emphasis)
    assert set(view.face_node) == {3, 4}
    assert not view.is_occluder[view.face_node == 4].any()
    assert (view.is_occluder == (view.facing > 0))[view.face_node == 3].all()
    np.testing.assert_array_equal(view.faces, geometry.faces[view.face_row])
    inner = view.neighbour[view.face_node == 3]
    assert (inner >= 0).all() and (view.face_node[inner] == 3).all()


def test_both_sides_of_open_meshes_hide() -> None:
    square = np.array([[0.0, 0, 0], [10, 0, 0], [10, 10, 0], [0, 10, 0]])
    flat = free_mesh("flat", square, np.array([[0, 1, 2], [0, 2, 3]], np.int32), closed=False)
    geometry = scene([("flat", flat, placed_at(0, 0, 0))])
    from_below = view_of(geometry, fitted(geometry, (0, 1, 1)))
    assert (from_below.facing == -1).all() and from_below.is_occluder.all()


def test_slivers_of_a_flat_face_agree() -> None:
    """A lid with 24 holes falls into slivers; seen 1e-4 rad off edge-on, all of its top faces one way."""
    geometry = holed_lids()
    top = np.abs(geometry.corner_normals[:, 0] - (0, 0, 1)).max(axis=1) < 1e-6
    for slope, facing in ((1e-4, 1), (-1e-4, -1), (1e-7, 0), (0.0, 0)):
        view = view_of(geometry, fitted(geometry, (0.3, 1.0, -slope * np.hypot(0.3, 1.0))))
        assert set(view.facing[top]) == {facing}


def test_facing_in_oblique_projection_follows_the_rays() -> None:
    projection = oblique()
    eye = toward_viewer(projection)
    away = projection.world_to_page[:2, :3] @ eye[:3]
    np.testing.assert_allclose(away, 0.0, atol=1e-14)
    view = view_of(one_cube(), projection)
    normals = view.corner_normals[view.facing > 0, 0]
    assert {tuple(round(float(v)) for v in n) for n in normals} == {(0, -1, 0), (1, 0, 0), (0, 0, 1)}


def test_triangles_are_cut_before_the_eye() -> None:
    """A long bar that reaches behind the eye: what is left lies in front of it, and is closed but at the cut."""
    stretched = replace(unit_cube(), key="bar")
    geometry = scene([("bar", stretched, placed_at(-0.5, -50.0, -2.0, np.diag([1.0, 100.0, 1.0])))])
    projection = camera.central((0.0, 0.0, 0.0), (0.0, 10.0, 0.0), 80.0, (50.0, 50.0))
    view = view_of(geometry, projection)
    used = view.world[view.faces.ravel()]
    weight = used @ projection.world_to_page[3, :3] + projection.world_to_page[3, 3]
    assert weight.min() >= NEAR * (1.0 - 1e-9) and weight.max() == pytest.approx(50.0)
    corners = view.world[view.faces]
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    assert (np.einsum("ij,ij->i", normals, view.corner_normals[:, 0]) > 0.0).all()
    # Without its end behind the eye: four sides from the cut to y = 50, and the far end.
    expected = 4.0 * (50.0 - NEAR) + 1.0
    assert np.linalg.norm(normals, axis=1).sum() / 2.0 == pytest.approx(expected)
    open_side = view.neighbour < 0
    start, end = view.faces, view.faces[:, [1, 2, 0]]
    on_cut = [np.abs(view.world[ends[open_side], 1] - NEAR) < 1e-9 for ends in (start, end)]
    assert on_cut[0].all() and on_cut[1].all() and open_side.sum() == 8  # two triangles a side


def test_all_behind_the_eye_is_no_view() -> None:
    projection = camera.central((0.0, 10.0, 0.0), (0.0, 20.0, 0.0), 80.0, (50.0, 50.0))
    assert len(view_of(one_cube(), projection).faces) == 0


def test_threads_do_not_matter() -> None:
    geometry = mechanical(rung=0.1)
    panel = line_panel(fitted(geometry, (-1, 1, -1)))
    one, three = (see_view(geometry, panel, PAGE, threads=n) for n in (1, 3))
    for name in ("points", "facing", "is_occluder"):
        assert getattr(one, name).tobytes() == getattr(three, name).tobytes()


def test_a_huge_part_does_not_widen_the_depth_tolerance() -> None:
    """Lines at one scale keep their tolerance on paper when a floor a hundred times as large is added."""
    small = mechanical(3, 4, rung=0.5)
    projection = fitted(small, (-1, 1, -1))
    alone = view_of(small, projection).tolerance
    beside = view_of(tiny_in_huge(rung=0.5), projection).tolerance
    assert beside.depth_mm * projection.scale <= PAPER_DEPTH * (1 + 1e-12)
    assert beside.depth_mm <= 2.0 * alone.depth_mm
    assert beside.sideways_mm == alone.sideways_mm


def test_the_depth_tolerance_is_never_below_rounding() -> None:
    far = one_cube()
    far = replace(far, vertices=far.vertices + 1e6)
    tolerance = view_of(far, fitted(far, (-1, 1, -1))).tolerance
    assert tolerance.depth_mm >= 16 * np.spacing(1e6)


def test_turns_of_the_whole_keep_the_facing() -> None:
    geometry = mechanical(rung=0.2)
    page = Page(120.0, 120.0)
    sight = np.array((-0.4, 0.8, -0.3))
    turn = turned_about((1, 2, 3), 25.0)
    turned = replace(
        geometry,
        vertices=geometry.vertices @ turn.T,
        corner_normals=(geometry.corner_normals @ turn.T).astype(np.float32),
    )
    facing = [
        see_view(g, line_panel(fitted(g, tuple(s))), page).facing
        for g, s in ((geometry, sight), (turned, turn @ sight))
    ]
    np.testing.assert_array_equal(*facing)

"""Outlines of smooth surfaces: where they run, how they end, what they leave alone."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from platewright.backend import camera
from platewright.backend.contract import F64, LineClass, Mesh, Projection
from platewright.backend.lines.contours import NEVER_HIDES, contours_of
from platewright.backend.lines.model import Candidates, View, number_of
from platewright.backend.lines.view import see_view
from platewright.backend.lines.visibility import cut as seen_pieces
from platewright.compiler.solids.recipe import Block, Cone, Cylinder, Edged, Ellipsoid, Prism, Sphere, Torus
from platewright.compiler.solids.transform import translate
from support.geometries import flattened, leaf, shifted, turned
from support.line_scenes import PAGE, line_panel
from support.plain_views import geometry_of, runs_of, view_of
from support.recipes import add, cut, made

GENERAL = camera.parallel(camera.direction(23.0, 17.0), 1.0, (50.0, 50.0))
SIDES = ("front", "rear", "left", "right", "top", "bottom")


def side(name) -> Projection:
    return camera.parallel(camera.orthographic(name), 1.0, (50.0, 50.0))


def world_of(projection: Projection, points: F64) -> F64:
    """World points of view points."""
    inverse = np.linalg.inv(projection.world_to_page)
    back = np.column_stack((points, np.ones(len(points)))) @ inverse.T
    return back[:, :3] / back[:, 3:]


def outlines(mesh: Mesh, projection: Projection) -> tuple[View, Candidates, list[F64]]:
    view = view_of(geometry_of(mesh), projection)
    found = contours_of(view)
    return view, found, runs_of(found)


def off_segments(points: F64, start: F64, end: F64) -> F64:
    """Distance (k,) of points from the nearest of some segments."""
    along = end - start
    share = np.clip(((points[:, None] - start) * along).sum(-1) / (along * along).sum(-1), 0.0, 1.0)
    return np.linalg.norm(points[:, None] - start - share[..., None] * along, axis=-1).min(axis=1)


@pytest.mark.parametrize("name", [*SIDES, "general"])
def test_a_ball_is_one_closed_outline(name):
    projection = GENERAL if name == "general" else side(name)
    _, found, runs = outlines(made(add(Sphere(40.0))), projection)
    (run,) = runs
    assert np.array_equal(run[0], run[-1])
    assert (found.line_class == number_of(LineClass.VISIBLE_OUTLINE)).all()
    assert (found.allowance == NEVER_HIDES).all() and found.is_drawn.all() and not found.is_plain.any()


def test_a_cylinder_is_two_straight_lines_from_rim_to_rim():
    mesh = made(add(Cylinder(40.0, 30.0)))
    view, found, runs = outlines(mesh, GENERAL)
    assert [len(run) for run in runs] == [2, 2]
    ends = np.concatenate([world_of(GENERAL, run) for run in runs])
    assert np.abs(np.sort(ends[:, 2]) - (0.0, 0.0, 30.0, 30.0)).max() < 1e-9
    # They touch the cylinder square to the sight, where chords of the mesh leave it by no more than its rung.
    sight = np.array(GENERAL.sight)[:2]
    assert np.abs(ends[:, :2] @ sight).max() < 1e-9
    radius = np.linalg.norm(ends[:, :2], axis=1)
    assert radius.max() <= 20.0 + 1e-9 and radius.min() >= 20.0 - 0.02
    sharp = [mesh.vertices[mesh.faces[:, k]][mesh.edge_kind[:, k] == 2] for k in range(3)]
    following = [mesh.vertices[mesh.faces[:, (k + 1) % 3]][mesh.edge_kind[:, k] == 2] for k in range(3)]
    assert off_segments(ends, np.concatenate(sharp), np.concatenate(following)).max() < 1e-9
    assert (found.faces >= 0).any() and (view.face_patch[found.faces[:, 0]] == found.patch).all()


def test_a_cylinder_seen_from_its_axis_has_no_outline_but_its_rims():
    for name in ("top", "bottom"):
        assert len(outlines(made(add(Cylinder(40.0, 30.0))), side(name))[1]) == 0


def test_a_cylinder_from_an_eye_is_touched_in_the_polar_plane_of_the_eye():
    eye = np.array((0.0, -80.0, 15.0))
    projection = camera.central(eye, (0.0, 0.0, 15.0), 100.0, (50.0, 50.0))
    _, _, runs = outlines(made(add(Cylinder(40.0, 30.0)), rung=0.001), projection)
    assert len(runs) == 2
    place = np.concatenate([world_of(projection, run) for run in runs])
    # Tangent points of a circle of radius r seen from distance d lie r2/d before its centre.
    assert np.abs(place[:, 1] + 20.0**2 / 80.0).max() < 1e-9
    assert np.abs(np.hypot(place[:, 0], place[:, 1]) - 20.0).max() < 0.001


def test_an_eye_within_a_pipe_sees_no_outline():
    pipe = made(add(Cylinder(40.0, 30.0)), cut(Cylinder(36.0, 40.0), translate((0, 0, -5))))
    view = view_of(geometry_of(pipe), camera.central((0.0, 0.0, -200.0), (0.0, 0.0, 10.0), 100.0, (50.0, 50.0)))
    assert len(contours_of(view)) == 0


def test_the_outline_of_a_cone_meets_in_its_apex_and_is_gone_from_above():
    mesh = made(add(Cone(40.0, 0.0, 30.0)))
    _, found, runs = outlines(mesh, GENERAL)
    (run,) = runs
    corners = world_of(GENERAL, run)
    assert len(found) == 2 and np.abs(corners[1] - (0.0, 0.0, 30.0)).max() < 1e-9
    # Tangent planes along the sight: q.d - tan2(half angle) h d_z = 0 with q from the apex (the polar form).
    q, d, slope = corners[[0, 2]] - (0.0, 0.0, 30.0), np.array(GENERAL.sight), 20.0 / 30.0
    height = -q[:, 2]
    assert np.abs(q[:, :2] @ d[:2] + slope**2 * height * d[2]).max() < 1e-9
    assert len(outlines(mesh, camera.parallel(camera.direction(0.0, 70.0), 1.0, (50.0, 50.0)))[1]) == 0


def test_a_ring_is_two_closed_outlines_on_the_surface():
    for projection in (GENERAL, camera.central((-90.0, -120.0, 70.0), (0.0, 0.0, 0.0), 100.0, (50.0, 50.0))):
        _, found, runs = outlines(made(add(Torus(40.0, 12.0))), projection)
        assert len(runs) == 2
        assert all(np.array_equal(run[0, :2], run[-1, :2]) for run in runs)
        # Those that stand deeper, where the touch is inside the solid, are left out here.
        place = world_of(projection, found.start[found.allowance > 0.0])
        rho = np.hypot(place[:, 0], place[:, 1])
        normal = np.column_stack((place[:, :2] * (1.0 - 20.0 / rho)[:, None], place[:, 2:])) / 6.0
        assert np.abs(np.linalg.norm(normal, axis=1) - 1.0).max() < 1e-12
        toward = np.array(projection.sight) if projection.eye is None else place - np.array(projection.eye)
        assert np.abs((normal * toward).sum(axis=1) / np.linalg.norm(toward, axis=-1)).max() < 1e-9


def test_chords_stay_within_their_tolerance_on_paper():
    for magnification in (0.1, 1.0, 10.0):
        projection = camera.parallel(camera.direction(23.0, 17.0), magnification, (50.0, 50.0))
        _, found, _ = outlines(made(add(Sphere(40.0)), rung=0.02 / magnification), projection)
        middle = 0.5 * (found.start + found.end)[:, :2] - 50.0
        assert np.abs(np.linalg.norm(middle, axis=1) - 20.0 * magnification).max() < 0.005


def test_an_outline_ends_on_the_rim_of_what_is_cut_away():
    mesh = made(add(Sphere(40.0)), cut(Cylinder(20.0, 60.0), translate((0, -20, -30))))
    runs = outlines(mesh, side("top"))[2]
    arcs = [run for run in runs if len(run) > 2]
    assert len(arcs) == 1 and not np.array_equal(arcs[0][0], arcs[0][-1])
    kinds = [mesh.edge_kind[:, k] == 2 for k in range(3)]
    start = np.concatenate([mesh.vertices[mesh.faces[kind, k]] for k, kind in enumerate(kinds)])
    end = np.concatenate([mesh.vertices[mesh.faces[kind, (k + 1) % 3]] for k, kind in enumerate(kinds)])
    ends = world_of(side("top"), arcs[0][[0, -1]])
    assert off_segments(ends, start, end).max() < 1e-9
    # The circle z = 0 meets the hole where both radii and distances agree: x2 + y2 = 20^2, x2 + (y + 20)2 = 10^2.
    y = (10.0**2 - 20.0**2 - 20.0**2) / 40.0
    assert np.abs(ends[:, 1] - y).max() < 0.05 and np.abs(np.abs(ends[:, 0]) - np.sqrt(400.0 - y * y)).max() < 0.05


def test_flat_faces_have_no_outlines():
    holes = [translate((6.0 * i, 0.0, -1.0)) for i in range(-2, 3)]
    flat = (
        made(add(Block((40.0, 20.0, 5.0)))),
        made(add(Prism(6, 20.0, 8.0))),
        made(add(Block((40.0, 20.0, 5.0))), cut(Prism(12, 4.0, 8.0), *holes)),
    )
    for mesh in flat:
        for name in SIDES:
            assert len(outlines(mesh, side(name))[1]) == 0
        assert len(outlines(mesh, GENERAL)[1]) == 0


def test_the_edge_of_a_flat_on_a_shaft_is_an_edge_and_no_outline():
    shaft = made(add(Cylinder(40.0, 30.0)), cut(Block((60.0, 40.0, 40.0)), translate((0.0, -20.0, -5.0))))
    # From the front the half cylinder begins at the two edges; from above and behind it is an outline of its own.
    assert len(outlines(shaft, side("front"))[1]) == 0
    assert len(outlines(shaft, side("left"))[1]) == 1


def test_rounded_edges_seen_square_on_have_their_outline_where_they_become_flat():
    _, found, runs = outlines(made(add(Edged(Block((40.0, 30.0, 20.0)), "rounded", 3.0))), side("front"))
    place = np.concatenate([run[:, :2] for run in runs]) - 50.0
    # Along all four sides and round all four corners: the box is met all round.
    assert np.abs(place.min(axis=0) - (-20.0, -20.0)).max() < 1e-9
    assert np.abs(place.max(axis=0) - (20.0, 0.0)).max() < 1e-9
    lengths = np.linalg.norm((found.end - found.start)[:, :2], axis=1).sum()
    assert lengths >= 2 * (34.0 + 14.0) + 2 * np.pi * 3.0 - 0.05


def test_the_wall_of_a_hole_has_outlines_too():
    mesh = made(add(Block((40.0, 40.0, 20.0))), cut(Cylinder(10.0, 40.0), translate((0, 0, -10))))
    _, found, runs = outlines(mesh, side("front"))
    assert len(runs) == 2 and np.allclose(np.abs(found.start[:, 0] - 50.0), 5.0, atol=1e-9)
    view = view_of(geometry_of(mesh), side("front"))
    assert not seen_pieces(view, contours_of(view)).is_visible.any()


def test_a_displaced_part_takes_its_outline_along():
    mesh = made(add(Sphere(10.0)))
    geometry = flattened([leaf("a", -1, 0, 0, np.eye(4)), leaf("b", -1, 0, 0, np.eye(4))], [mesh])
    shift = np.array(((0.0, 0.0, 0.0), (3.0, -2.0, 25.0)))
    found = contours_of(view_of(geometry, GENERAL, shift))
    place = world_of(GENERAL, found.start)
    for node in (0, 1):
        own = place[found.node == node]
        assert len(own) and np.abs(np.linalg.norm(own - shift[node], axis=1) - 5.0).max() < 1e-9


def test_outlines_do_not_depend_on_the_order_of_parts():
    meshes = (made(add(Torus(40.0, 12.0))), made(add(Sphere(20.0))), made(add(Cylinder(8.0, 30.0))))
    found = []
    for order in itertools.permutations(range(3)):
        nodes = [leaf(f"part_{k}", -1, k, 0, shifted(10.0 * k, 5.0 * k, 0.0, turned(20.0 * k, 0))) for k in order]
        segments = contours_of(view_of(flattened(nodes, meshes), GENERAL))
        found.append(sorted(map(tuple, np.hstack((segments.start, segments.end)).tolist())))
    assert all(each == found[0] for each in found)


def test_a_free_surface_turns_away_where_its_normals_do():
    _, _, runs = outlines(made(add(Ellipsoid((60.0, 40.0, 30.0))), rung=0.005), GENERAL)
    assert len(runs) == 1 and np.array_equal(runs[0][0], runs[0][-1])
    # The outline of x'A x = 1 along d lies in the plane x'A d = 0.
    place, form = world_of(GENERAL, runs[0]), np.diag((1 / 900.0, 1 / 400.0, 1 / 225.0))
    assert np.abs(place @ form @ np.array(GENERAL.sight)).max() < 2e-4
    assert np.abs(np.einsum("ki,ij,kj->k", place, form, place) - 1.0).max() < 1e-3


def test_what_is_seen_of_outlines_is_whole():
    for mesh, projection, n_seen in (
        (made(add(Sphere(40.0))), GENERAL, 1),
        (made(add(Torus(40.0, 12.0))), camera.parallel(camera.direction(10.0, 60.0), 1.0, (50.0, 50.0)), 2),
    ):
        view = view_of(geometry_of(mesh), projection)
        found = contours_of(view)
        pieces = seen_pieces(view, found)
        assert pieces.is_visible.all() and len(pieces.segment) == len(found)
        assert found.chain.max() + 1 == n_seen


def test_the_drawing_stage_takes_outlines_as_they_are():
    view = see_view(geometry_of(made(add(Sphere(40.0)))), line_panel(GENERAL), PAGE)
    plain = contours_of(view_of(view.geometry, GENERAL))
    assert np.array_equal(contours_of(view).start, plain.start)


@pytest.mark.parametrize("eye", [(20.0, 0.0, 0.0), (26.0001, 0.0, 0.0), (5.0, 5.0, 5.0)])
def test_an_eye_in_the_middle_of_things_gives_outlines_before_it_alone(eye):
    geometry = geometry_of(made(add(Torus(40.0, 12.0))), made(add(Sphere(30.0))), made(add(Cylinder(60.0, 80.0))))
    toward = np.add(eye, (0.3, 1.0, 0.1))
    view = see_view(geometry, line_panel(camera.central(eye, toward, 100.0, (60.0, 60.0))), PAGE)
    found = contours_of(view)
    ends = np.concatenate((found.start, found.end))
    assert len(found) > 100 and np.isfinite(ends).all() and (ends[:, 2] < 0.0).all()
    assert np.abs(ends[:, :2]).max() <= np.abs(view.points[np.unique(view.faces), :2]).max()

"""Lines in which parts penetrate each other: there where they cross, none where they touch."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from platewright.backend import camera
from platewright.backend.contract import F64, LineClass, Mesh, PatchKind
from platewright.backend.lines.model import Candidates, number_of
from platewright.backend.lines.penetrations import penetrations_of
from platewright.compiler.solids.recipe import Block, Cylinder, Prism, Sphere, Torus
from platewright.compiler.solids.transform import translate
from support.geometries import flattened, leaf, shifted, turned
from support.line_scenes import mechanical, rounded_to_float32
from support.plain_views import runs_of, view_of
from support.recipes import add, cut, made

PROJECTION = camera.parallel(camera.direction(23.0, 17.0), 1.0, (50.0, 50.0))
SKEW = shifted(3.0, -2.0, 7.0, turned(33.0) @ turned(20.0, 0))
PLACES = (np.eye(4), SKEW)
BALL, SLAB, PIN = made(add(Sphere(40.0))), made(add(Block((60.0, 60.0, 20.0)))), made(add(Cylinder(10.0, 60.0)))
DRILLED = made(add(Block((60.0, 60.0, 20.0))), cut(Cylinder(10.0, 40.0), translate((0, 0, -10))))


def penetrations(*parts: tuple[Mesh, F64], place: F64 = PLACES[0], float32: bool = False, **more) -> Candidates:
    nodes = [leaf(f"part_{k}", -1, k, 0, place @ at) for k, (_, at) in enumerate(parts)]
    geometry = flattened(nodes, [mesh for mesh, _ in parts])
    return penetrations_of(view_of(rounded_to_float32(geometry) if float32 else geometry, PROJECTION), **more)


def in_place(found: Candidates, place: F64) -> list[F64]:
    """The lines as points in the frame of the parts."""
    inverse = np.linalg.inv(place) @ np.linalg.inv(PROJECTION.world_to_page)
    return [(np.column_stack((run, np.ones(len(run)))) @ inverse.T)[:, :3] for run in runs_of(found)]


@pytest.mark.parametrize("place", PLACES)
def test_a_ball_through_a_slab_leaves_a_circle_on_either_side(place):
    found = penetrations((BALL, shifted(1.0, 2.0, 3.0)), (SLAB, np.eye(4)), place=place)
    lines = sorted(in_place(found, place), key=lambda line: line[0, 2])
    assert [np.array_equal(line[0], line[-1]) for line in lines] == [True, True]
    for line, height in zip(lines, (0.0, 20.0), strict=True):
        assert np.abs(line[:, 2] - height).max() < 1e-9
        radius = np.hypot(line[:, 0] - 1.0, line[:, 1] - 2.0)
        assert np.abs(radius - np.sqrt(400.0 - (height - 3.0) ** 2)).max() < 0.05
    assert (found.line_class == number_of(LineClass.VISIBLE_EDGE)).all()
    assert (found.node == 0).all() and (found.faces >= 0).all()


@pytest.mark.parametrize("place", PLACES)
def test_a_slab_through_the_very_equator_of_a_ball_leaves_its_circle(place):
    # Every vertex of the equator lies in the plane of the slab's top.
    found = penetrations((BALL, shifted(0.0, 0.0, 20.0)), (SLAB, np.eye(4)), place=place)
    (line,) = in_place(found, place)
    assert np.allclose(line[0], line[-1]) and np.abs(line[:, 2] - 20.0).max() < 1e-9
    assert np.abs(np.hypot(line[:, 0], line[:, 1]) - 20.0).max() < 1e-9


@pytest.mark.parametrize("place", PLACES)
def test_two_equal_balls_meet_in_a_circle_though_their_sides_cross_sides(place):
    found = penetrations((BALL, np.eye(4)), (BALL, shifted(15.0, 0.0, 0.0)), place=place)
    (line,) = in_place(found, place)
    assert np.allclose(line[0], line[-1])
    assert np.abs(line[:, 0] - 7.5).max() < 0.05
    assert np.abs(np.hypot(line[:, 1], line[:, 2]) - np.sqrt(400.0 - 7.5**2)).max() < 0.05
    length = np.linalg.norm(np.diff(line, axis=0), axis=1).sum()
    assert length == pytest.approx(2.0 * np.pi * np.sqrt(400.0 - 7.5**2), rel=2e-3)


@pytest.mark.parametrize("place", PLACES)
def test_two_blocks_cross_in_one_closed_line_of_known_length(place):
    found = penetrations((SLAB, np.eye(4)), (SLAB, shifted(30.0, 10.0, 5.0)), place=place)
    (line,) = in_place(found, place)
    assert np.allclose(line[0], line[-1])
    # The overlap is 30 x 50 x 15; of its edges, those where a face of one part meets a face of the other.
    assert np.linalg.norm(np.diff(line, axis=0), axis=1).sum() == pytest.approx(2.0 * (30.0 + 50.0 + 15.0), abs=1e-9)


FLUSH = {
    "block beside block": ((SLAB, np.eye(4)), (SLAB, shifted(60.0, 10.0, 5.0))),
    "block on block": ((SLAB, np.eye(4)), (SLAB, shifted(7.0, 11.0, 20.0))),
    "pin on block": ((PIN, shifted(1.0, 2.0, 20.0)), (SLAB, np.eye(4))),
    "pin in its hole": ((PIN, shifted(0.0, 0.0, -10.0)), (DRILLED, np.eye(4))),
    "pin turned in its hole": ((PIN, shifted(0.0, 0.0, -10.0, turned(1.3))), (DRILLED, np.eye(4))),
    "pin flush in its hole": (
        (made(add(Cylinder(10.0, 20.0))), shifted(0.0, 0.0, 0.0, turned(1.3))),
        (DRILLED, np.eye(4)),
    ),
    "ball on block": ((BALL, shifted(0.0, 0.0, 40.0)), (SLAB, np.eye(4))),
    "nut on pin": (
        (PIN, np.eye(4)),
        (made(add(Prism(6, 17.0, 8.0)), cut(Cylinder(10.0, 20.0), translate((0, 0, -5)))), shifted(0.0, 0.0, 12.0)),
    ),
    "far apart": ((BALL, np.eye(4)), (BALL, shifted(200.0, 0.0, 0.0))),
}  # fmt: skip


@pytest.mark.parametrize("float32", [False, True])
@pytest.mark.parametrize("place", PLACES)
@pytest.mark.parametrize("name", FLUSH)
def test_parts_that_touch_have_no_line(name, place, float32):
    assert len(penetrations(*FLUSH[name], place=place, float32=float32)) == 0


@pytest.mark.parametrize("place", PLACES)
def test_a_pin_let_in_flush_has_its_edge_for_a_line_but_not_on_the_far_side(place):
    found = penetrations((PIN, shifted(1.0, 2.0, -40.0)), (SLAB, np.eye(4)), place=place)
    (line,) = in_place(found, place)
    assert np.abs(line[:, 2]).max() < 1e-9 and np.allclose(line[0], line[-1])


def test_a_pin_wider_than_part_of_its_hole_still_crosses_the_rest():
    # Half the hole is the pin's own surface; where the slab is whole, the pin goes through.
    half = made(
        add(Block((60.0, 60.0, 20.0))),
        cut(Cylinder(10.0, 40.0), translate((0, 0, -10))),
        add(Block((60.0, 30.0, 20.0)), translate((0, 15.0, 0))),
    )
    found = penetrations((PIN, shifted(0.0, 0.0, -10.0)), (half, np.eye(4)))
    lines = in_place(found, np.eye(4))
    level = [line for line in lines if np.ptp(line[:, 2]) < 1e-9]
    assert sorted(round(float(line[0, 2])) for line in level) == [0, 20]
    for line in level:
        assert np.abs(np.hypot(line[:, 0], line[:, 1]) - 5.0).max() < 0.02 and line[:, 1].min() > -0.1
        assert np.linalg.norm(np.diff(line, axis=0), axis=1).sum() == pytest.approx(np.pi * 5.0, rel=0.02)


def test_lines_do_not_depend_on_order_or_threads():
    parts = [
        (BALL, shifted(1.0, 2.0, 3.0)),
        (SLAB, np.eye(4)),
        (PIN, shifted(10.0, 5.0, -20.0, turned(15.0, 0))),
        (made(add(Torus(40.0, 12.0))), shifted(0.0, 0.0, 15.0, turned(40.0, 1))),
    ]
    ways = []
    for order in tuple(itertools.permutations(range(4)))[::5]:
        found = penetrations(*[parts[k] for k in order])
        ends = [
            tuple(sorted((tuple(a), tuple(b)))) for a, b in zip(found.start.tolist(), found.end.tolist(), strict=True)
        ]
        ways.append(sorted(ends))
    assert len(ways[0]) > 100
    for way in ways[1:]:
        assert np.abs(np.array(way) - np.array(ways[0])).max() < 1e-9
    one, four = (penetrations(*parts, threads=n) for n in (1, 4))
    assert np.array_equal(one.start, four.start) and np.array_equal(one.chain, four.chain)


def test_in_a_scene_of_many_flush_parts_only_the_sunk_ball_has_a_line():
    geometry = mechanical()
    found = penetrations_of(view_of(geometry, PROJECTION))
    assert found.chain.max() == 0
    plate, ball = (geometry.nodes[node] for node in np.unique(geometry.face_node[found.faces]))
    kinds = [set(geometry.patches.kind[geometry.face_patch[slice(*node.face_range)]]) for node in (plate, ball)]
    assert kinds == [{PatchKind.PLANE, PatchKind.CYLINDER}, {PatchKind.SPHERE}]


SOLIDS = (BALL, SLAB, PIN, DRILLED, made(add(Torus(40.0, 12.0))), made(add(Prism(6, 30.0, 40.0))))


@pytest.mark.parametrize("seed", range(12))
def test_lines_of_closed_parts_are_closed_and_lie_on_both(seed):
    random = np.random.default_rng(seed)
    nodes = []
    for k in range(5):
        turn = np.linalg.qr(random.normal(size=(3, 3)))[0]
        turn *= np.sign(np.linalg.det(turn))
        nodes.append(
            leaf(f"part_{k}", -1, int(random.integers(len(SOLIDS))), 0, shifted(*random.uniform(-20, 20, 3), turn))
        )
    geometry = flattened(nodes, SOLIDS)
    found = penetrations_of(view_of(geometry, PROJECTION))
    assert len(found) > 50
    assert all(np.array_equal(run[0], run[-1]) for run in runs_of(found))
    inverse = np.linalg.inv(PROJECTION.world_to_page)
    middle = (np.column_stack((0.5 * (found.start + found.end), np.ones(len(found)))) @ inverse.T)[:, :3]
    for side in range(2):
        corners = geometry.vertices[geometry.faces[found.faces[:, side]]]
        normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        normal /= np.linalg.norm(normal, axis=1)[:, None]
        assert np.abs(((middle - corners[:, 0]) * normal).sum(axis=1)).max() < 1e-6


def test_nothing_and_one_part_have_no_lines():
    assert len(penetrations((BALL, np.eye(4)))) == 0

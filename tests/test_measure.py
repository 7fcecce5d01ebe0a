"""Measures of meshes against shapes whose answer is plain."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend.contract import Mesh
from platewright.compiler import measure
from platewright.compiler.solids import transform
from platewright.compiler.solids.recipe import Block, Cylinder, Sphere
from support.recipes import add, cut, made


@pytest.fixture(scope="module")
def block() -> Mesh:
    return made(add(Block((1.0, 2.0, 3.0)), transform.translate((1000.0, -500.0, 0.0))))


def test_block_far_from_the_origin(block: Mesh) -> None:
    assert measure.volume(block.vertices, block.faces) == pytest.approx(6.0, rel=1e-12)
    assert measure.area(block.vertices, block.faces) == pytest.approx(22.0, rel=1e-12)
    assert measure.centroid(block.vertices, block.faces) == pytest.approx((1000.0, -500.0, 1.5), rel=1e-12)
    assert measure.bounds(block.vertices) == ((999.5, -501.0, 0.0), (1000.5, -499.0, 3.0))
    tensor = measure.inertia(block.vertices, block.faces)
    assert np.abs(tensor - np.diag((6.5, 5.0, 2.5))).max() < 1e-9


def test_inertia_turns_with_the_solid() -> None:
    turn = transform.turn(33.0, (1.0, 2.0, 3.0))
    turned = made(add(Block((1.0, 2.0, 3.0)), turn))
    linear = transform.matrix(turn)[:3, :3]
    expected = linear @ np.diag((6.5, 5.0, 2.5)) @ linear.T
    assert np.abs(measure.inertia(turned.vertices, turned.faces) - expected).max() < 1e-12


def test_faces_turned_over_have_a_negative_volume(block: Mesh) -> None:
    assert measure.volume(block.vertices, block.faces[:, ::-1]) == pytest.approx(-6.0, rel=1e-12)


def test_closed_means_every_side_has_its_reverse(block: Mesh) -> None:
    n = len(block.vertices)
    assert measure.is_closed(block.faces, n)
    assert not measure.is_closed(block.faces[1:], n)
    assert not measure.is_closed(np.concatenate((block.faces, block.faces[:1])), n)
    twisted = block.faces.copy()
    twisted[0] = twisted[0, ::-1]
    assert not measure.is_closed(twisted, n)
    assert not measure.is_closed(block.faces[:0], n)


def test_cavities_are_no_pieces() -> None:
    holes = [transform.translate((20.0 * i, 20.0 * j, 50.0)) for i in (-1, 0, 1) for j in (-1, 0, 1)]
    mesh = made(add(Block((100.0, 100.0, 100.0))), cut(Sphere(10.0), *holes))
    assert measure.count_pieces(mesh.vertices, mesh.faces) == 1
    labels = measure.components(mesh.faces, len(mesh.vertices))
    assert sorted(set(labels.tolist())) == list(range(10))
    assert labels[0] == 0
    apart = np.concatenate((mesh.faces, mesh.faces + len(mesh.vertices)))
    assert measure.count_pieces(np.concatenate((mesh.vertices, mesh.vertices + 200.0)), apart) == 2
    assert measure.count_pieces(mesh.vertices, mesh.faces[:0]) == 0


def test_clearance_between_faces_sides_and_corners(block: Mesh) -> None:
    def gap(x: float, y: float, z: float) -> float:
        return measure.clearance(block.vertices, block.faces, block.vertices + np.array((x, y, z)), block.faces)

    assert gap(3.0, 0.5, 0.0) == pytest.approx(2.0, rel=1e-12)
    assert gap(4.0, 6.0, 0.0) == pytest.approx(5.0, rel=1e-12)
    assert gap(4.0, 6.0, 15.0) == pytest.approx(13.0, rel=1e-12)
    assert gap(0.5, 0.5, 0.5) == 0.0
    assert gap(1.0, 0.0, 0.0) == 0.0


def test_bodies_are_imported_once_for_all_clearances(block: Mesh) -> None:
    """Three equal blocks along x; the middle one is asked for twice, the last one only at the end."""
    bodies = [measure.Body(block.vertices + np.array((x, 0.0, 0.0)), block.faces) for x in (0.0, 5.0, 12.0)]
    assert measure.least_clearance(bodies[:1], bodies[1:]) == pytest.approx(5.0 - np.ptp(block.vertices[:, 0]))
    kept = bodies[1].solid
    assert "solid" not in vars(bodies[2])
    assert measure.least_clearance(bodies[1:2], bodies[2:]) == pytest.approx(7.0 - np.ptp(block.vertices[:, 0]))
    assert bodies[1].solid is kept


def test_clearance_of_one_solid_within_another_is_none() -> None:
    outer, inner = made(add(Block((9.0, 9.0, 9.0)))), made(add(Block((1.0, 1.0, 1.0)), transform.translate((0, 0, 4))))
    assert measure.clearance(outer.vertices, outer.faces, inner.vertices, inner.faces) == 0.0


def test_clearance_of_a_pin_in_its_hole() -> None:
    plate = made(add(Block((30.0, 30.0, 5.0))), cut(Cylinder(10.0, 5.0)), rung=0.001)
    pin = made(add(Cylinder(9.0, 5.0)), rung=0.001)
    gap = measure.clearance(plate.vertices, plate.faces, pin.vertices, pin.faces)
    assert gap == pytest.approx(0.5, abs=0.001)


def test_open_surfaces_have_no_clearance(block: Mesh) -> None:
    with pytest.raises(ValueError, match="closed"):
        measure.clearance(block.vertices, block.faces[1:], block.vertices, block.faces)


def test_distance_of_two_points() -> None:
    assert measure.distance((1.0, 2.0, 3.0), (4.0, 6.0, 15.0)) == 13.0

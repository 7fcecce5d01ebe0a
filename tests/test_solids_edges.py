"""Bodies from outlines and with made edges: boxes, budgets, booleans, refusals of the kernel."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.backend.contract import EdgeKind, PatchKind
from platewright.compiler import measure
from platewright.compiler.solids.bounds import bounds
from platewright.compiler.solids.build import build
from platewright.compiler.solids.plane import Corner, with_corners
from platewright.compiler.solids.recipe import (
    Block,
    Cone,
    Cylinder,
    Edged,
    Extrude,
    Loop,
    Outline,
    Primitive,
    Prism,
    Pyramid,
    Recipe,
    Revolve,
    Wedge,
)
from platewright.compiler.solids.tessellate import count_triangles, tessellate
from platewright.compiler.solids.transform import compose, translate, turn
from support.outlines import HALF_DISC, circle, closed_spline, ellipse, plain, polygon, rectangle, rounded
from support.recipes import add, check_mesh, cut, made

EGG = closed_spline((12.0, 0.0), (5.0, 10.0), (-9.0, 8.0), (-9.0, -8.0), (5.0, -10.0))
SLOT = rounded(rectangle(30.0, 16.0), 5.0)
ELL = polygon((0.0, 0.0), (20.0, 0.0), (20.0, 8.0), (8.0, 8.0), (8.0, 20.0), (0.0, 20.0))
SHAPES: list[Primitive] = [
    Extrude(plain(EGG), 4.0),
    Extrude(plain(ellipse(9.0, 5.0, 2.0, 1.0, 30.0), circle(2.0, 1.0, 2.0)), 4.0),
    Extrude(plain(SLOT, circle(3.0, 0.0, 4.0)), 6.0, 8.0),
    Extrude(plain(ELL), 6.0, -12.0),
    Extrude(plain(ELL), 6.0, 0.0, 75.0),
    Extrude(plain(SLOT), 30.0, 3.0, -400.0),
    Extrude(plain(HALF_DISC), 6.0, 7.0),
    Extrude(plain(EGG), 4.0, 10.0, 30.0),
    Revolve(plain(ellipse(3.0, 5.0, 9.0, 0.0, 30.0)), 200.0),
    Revolve(plain(polygon((2.0, 0.0), (9.0, 0.0), (5.0, 6.0))), 75.0),
    Revolve(plain(polygon((0.0, 0.0), (9.0, 0.0), (0.0, 6.0))), 300.0),
    *[
        Edged(shape, kind, 0.8)
        for shape in (
            Block((9.0, 8.0, 7.0)),
            Wedge((9.0, 8.0, 7.0), 0.0),
            Wedge((9.0, 8.0, 7.0), 4.0),
            Prism(7, 9.0, 6.0),
            Pyramid(5, 9.0, 0.0, 8.0),
            Pyramid(3, 12.0, 7.0, 8.0),
            Cylinder(9.0, 5.0),
            Cone(9.0, 5.0, 5.0),
            Cone(9.0, 0.0, 9.0),
            Extrude(plain(ELL), 5.0),
            Extrude(plain(HALF_DISC), 5.0),
            Extrude(plain(SLOT, circle(3.0, 0.0, 4.0)), 5.0, 4.0),
            Extrude(plain(EGG), 4.0),
            Extrude(plain(rectangle(12.0, 9.0)), 8.0, 0.0, 40.0),
            Revolve(plain(polygon((4.0, 0.0), (9.0, 0.0), (9.0, 6.0), (4.0, 6.0)))),
            Revolve(plain(polygon((0.0, 0.0), (9.0, 0.0), (9.0, 6.0), (0.0, 6.0))), 90.0),
        )
        for kind in ("rounded", "chamfered")
    ],
]
TURNED = compose(translate((3.0, -2.0, 5.0)), turn(37.0, (1.0, 2.0, 2.0)))


@pytest.mark.parametrize("shape", SHAPES, ids=range(len(SHAPES)))
def test_meshes_are_sound_within_their_boxes_and_budgets(shape: Primitive) -> None:
    for rung in (0.5, 0.02):
        mesh = made(add(shape), rung=rung)
        check_mesh(mesh, rung)
        assert len(mesh.faces) <= count_triangles(shape, rung)
    for placement in (((1.0, 0.0, 0.0, 0.0), (0.0, 1.0, 0.0, 0.0), (0.0, 0.0, 1.0, 0.0)), TURNED):
        mesh = made(add(shape, placement))
        low, high = (np.array(corner) for corner in bounds(Recipe((add(shape, placement),))))
        size = float(np.ptp(mesh.vertices, axis=0).max())
        assert (mesh.vertices.min(axis=0) >= low - 1e-9 * size).all()
        assert (mesh.vertices.max(axis=0) <= high + 1e-9 * size).all()
        assert ((high - low) <= 2.5 * np.ptp(mesh.vertices, axis=0)).all()


@pytest.mark.parametrize("shape", SHAPES, ids=range(len(SHAPES)))
def test_cut_and_whole_have_the_same_volume_in_pieces(shape: Primitive) -> None:
    """What a cut takes and what it leaves add up, and free faces keep outward normals through it."""
    knife = Block((60.0, 60.0, 80.0))
    place = ((1.0, 0.0, 0.0, 30.7), (0.0, 1.0, 0.0, 0.3), (0.0, 0.0, 1.0, -31.1))
    whole = made(add(shape), rung=0.05)
    left, flaws = build(Recipe((add(shape), cut(knife, place))), 0.05)
    right, more = build(Recipe((add(shape), cut(knife, ((1.0, 0.0, 0.0, -29.3), *place[1:])))), 0.05)
    assert left is not None and right is not None
    assert all(not flaw.is_error for flaw in (*flaws, *more))
    parts = measure.volume(left.vertices, left.faces) + measure.volume(right.vertices, right.faces)
    assert parts == pytest.approx(measure.volume(whole.vertices, whole.faces), rel=1e-9)
    check_mesh(left, 0.05)
    check_mesh(right, 0.05)


def test_smooth_bodies_have_no_sharp_edge_and_the_shell_is_repeated() -> None:
    for shape in SHAPES:
        if isinstance(shape, Edged) and shape.kind == "rounded" and not isinstance(shape.shape, Extrude | Revolve):
            mesh = made(add(shape))
            assert not (mesh.edge_kind == EdgeKind.SHARP).any(), shape
        again = tessellate(shape, 0.05)
        assert np.array_equal(tessellate(shape, 0.05).vertices, again.vertices)


def test_walls_of_a_rimmed_extrusion_share_vertices_with_a_pin() -> None:
    plate = made(add(Edged(Extrude(plain(rectangle(30.0, 30.0), circle(2.0, 1.0, 5.0)), 8.0), "rounded", 1.0)))
    pin = made(add(Cylinder(10.0, 8.0), translate((2.0, 1.0, 0.0))))
    wall = plate.vertices[np.abs(np.hypot(plate.vertices[:, 0] - 2.0, plate.vertices[:, 1] - 1.0) - 5.0) < 1e-9]
    ring = pin.vertices[pin.vertices[:, 2] == 0.0]
    apart = np.linalg.norm(wall[:, None, :2] - ring[None, :, :2], axis=2).min(axis=1)
    assert len(wall) >= 2 * len(ring) - 2 and apart.max() < 1e-9


def rounded_inside(radius: float) -> Loop:
    """An angle with its inner corner rounded."""
    corners = polygon((0.0, 0.0), (60.0, 0.0), (60.0, 10.0), (10.0, 10.0), (10.0, 60.0), (0.0, 60.0))
    return with_corners(corners, [Corner("rounded", radius) if k == 3 else None for k in range(6)])


@pytest.mark.parametrize(
    ("shape", "code"),
    [
        (Extrude(plain(SLOT), 30.0, 20.0), "taper-too-large"),
        (Extrude(plain(rectangle(9.0, 9.0), circle(0.0, 0.0, 3.0)), 9.0, 20.0), "taper-too-large"),
        (Extrude(plain(ellipse(9.0, 2.0)), 9.0, 20.0), "taper-too-large"),
        (Edged(Extrude(plain(ELL), 5.0), "rounded", 2.6), "corner-too-large"),
        # The rim leans out, and its arc bulges further than both of its ends, past what the inner corner bears.
        (Edged(Extrude(plain(rounded_inside(4.0)), 20.0, -12.0), "rounded", 1.0), "corner-too-large"),
        (Edged(Extrude(plain(SLOT), 50.0), "rounded", 6.0), "corner-too-large"),
        (Edged(Extrude(plain(rectangle(9.0, 9.0), circle(0.0, 0.0, 4.0)), 9.0), "chamfered", 0.3), "corner-too-large"),
        (Edged(Block((4.0, 4.0, 1.0)), "rounded", 0.5), "corner-too-large"),
        (Edged(Wedge((9.0, 8.0, 7.0), 0.0), "rounded", 3.0), "corner-too-large"),
        (Edged(Pyramid(4, 9.0, 0.0, 1.0), "rounded", 2.0), "corner-too-large"),
        (Edged(Cone(9.0, 0.0, 9.0), "rounded", 3.0), "corner-too-large"),
        (
            Edged(Revolve(plain(polygon((4.0, 0.0), (5.0, 0.0), (5.0, 6.0), (4.0, 6.0)))), "rounded", 0.6),
            "corner-too-large",
        ),
        (
            Edged(Extrude(Outline(polygon((0.0, 0.0), (9.0, 9.0), (9.0, 0.0), (0.0, 5.0))), 4.0), "rounded", 0.1),
            "outline-crosses-itself",
        ),
    ],
)
def test_what_does_not_fit_is_a_flaw(shape: Primitive, code: str) -> None:
    mesh, flaws = build(Recipe((add(shape, source=7),)), 0.05)
    assert mesh is None and [(flaw.code, flaw.source) for flaw in flaws] == [(code, 7)]


@given(
    st.floats(0.5, 20.0),
    st.floats(0.5, 20.0),
    st.floats(0.5, 20.0),
    st.floats(0.01, 0.49),
    st.sampled_from(["rounded", "chamfered"]),
)
@settings(max_examples=40, deadline=None)
def test_any_block_takes_edges_of_up_to_half_its_least_side(
    a: float, b: float, c: float, share: float, kind: str
) -> None:
    size = share * min(a, b, c)
    assert kind == "rounded" or kind == "chamfered"
    shape = Edged(Block((a, b, c)), "rounded" if kind == "rounded" else "chamfered", size)
    mesh = made(add(shape), rung=0.05)
    check_mesh(mesh, 0.05)
    expected = {"rounded": [6, 12, 0, 8, 0, 0], "chamfered": [18, 0, 0, 0, 0, 0]}[kind]
    assert np.bincount(mesh.patches.kind, minlength=6).tolist() == expected
    assert measure.volume(mesh.vertices, mesh.faces) < a * b * c


def test_thin_wall_with_rims_holds_at_a_coarse_rung() -> None:
    shape = Extrude(plain(circle(0.0, 0.0, 50.0), circle(0.0, 0.0, 49.9)), 10.0, 0.2)
    mesh = made(add(shape), rung=1.0)
    check_mesh(mesh, 1.0)
    assert (mesh.patches.kind == PatchKind.CONE).sum() == 2
    assert measure.volume(mesh.vertices, mesh.faces) > 0.0
    assert math.isclose(float(mesh.vertices[:, 2].max()), 10.0)

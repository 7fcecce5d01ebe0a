"""Every primitive: closed, wound outward, on its surfaces, with the triangles that its formula says."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from msgspec import structs
from platewright.backend.contract import EdgeKind, PatchKind
from platewright.compiler import measure
from platewright.compiler.solids import transform
from platewright.compiler.solids.bounds import bounds
from platewright.compiler.solids.flaw import SolidError
from platewright.compiler.solids.ladder import divisions
from platewright.compiler.solids.recipe import (
    ArcTo,
    Block,
    Cone,
    Cylinder,
    Ellipsoid,
    Extrude,
    LineTo,
    Loop,
    Outline,
    Primitive,
    Prism,
    Pyramid,
    Recipe,
    Revolve,
    Sphere,
    Torus,
    Wedge,
)
from platewright.compiler.solids.tessellate import count_triangles, tessellate
from support.recipes import add, check_mesh, made, surface_distance

RUNG = 0.02
ROUNDED = Outline(
    Loop(
        (5.0, 0.0), (LineTo((10.0, 0.0)), LineTo((10.0, 5.0)), ArcTo((8.0, 7.0), (8.0, 5.0), True), LineTo((5.0, 7.0)))
    ),
    (Loop((8.0, 3.0), (ArcTo((8.0, 3.0), (7.0, 3.0), False),)),),
)
P = PatchKind
# Every shape with the kinds of its patches.
SHAPES: list[tuple[Primitive, list[PatchKind]]] = [
    (Block((1.0, 2.0, 3.0)), [P.PLANE] * 6),
    (Wedge((4.0, 2.0, 3.0), 0.0), [P.PLANE] * 5),
    (Wedge((4.0, 2.0, 3.0), 1.0), [P.PLANE] * 6),
    (Wedge((4.0, 2.0, 3.0), 5.0), [P.PLANE] * 6),
    (Cylinder(10.0, 4.0), [P.PLANE, P.CYLINDER, P.PLANE]),
    (Cone(10.0, 0.0, 4.0), [P.PLANE, P.CONE]),
    (Cone(10.0, 5.0, 4.0), [P.PLANE, P.CONE, P.PLANE]),
    (Cone(5.0, 10.0, 4.0), [P.PLANE, P.CONE, P.PLANE]),
    (Cone(10.0, 10.0, 4.0), [P.PLANE, P.CYLINDER, P.PLANE]),
    (Sphere(10.0), [P.SPHERE]),
    (Ellipsoid((4.0, 6.0, 8.0)), [P.FREE]),
    (Ellipsoid((6.0, 6.0, 6.0)), [P.SPHERE]),
    (Torus(10.0, 3.0), [P.TORUS]),
    (Prism(6, 10.0, 3.0), [P.PLANE] * 8),
    (Prism(3, 10.0, 3.0), [P.PLANE] * 5),
    (Pyramid(4, 10.0, 0.0, 3.0), [P.PLANE] * 5),
    (Pyramid(5, 10.0, 4.0, 3.0), [P.PLANE] * 7),
    (Extrude(ROUNDED, 3.0), [P.PLANE] * 6 + [P.CYLINDER] * 2),
    (Revolve(ROUNDED), [P.PLANE] * 2 + [P.CYLINDER] * 2 + [P.TORUS] * 2),
]
names = [f"{k}-{type(shape).__name__}" for k, (shape, _) in enumerate(SHAPES)]
PLACEMENTS = {
    "plain": transform.IDENTITY,
    "turned": transform.compose(transform.translate((5.0, -3.0, 7.0)), transform.turn(37.0, (1.0, 2.0, 3.0))),
    "mirrored": transform.compose(transform.mirror((1.0, 1.0, 0.0)), transform.turn(20.0, (0.0, 1.0, 0.0))),
    "grown": transform.compose(transform.turn(30.0, (1.0, 0.0, 0.0)), transform.scale(2.5)),
    "skew": transform.compose(transform.scale((1.0, 2.0, 0.7)), transform.turn(25.0, (1.0, 1.0, 0.0))),
}


@pytest.mark.parametrize("placement", PLACEMENTS.values(), ids=PLACEMENTS.keys())
@pytest.mark.parametrize("shape", [shape for shape, _ in SHAPES], ids=names)
def test_promises_hold_under_every_placement(shape: Primitive, placement: transform.Affine) -> None:
    mesh = made(add(shape, placement), rung=RUNG)
    check_mesh(mesh, RUNG)
    plain = made(add(shape), rung=RUNG / transform.largest_scale(placement))
    factor = abs(transform.determinant(placement))
    assert measure.volume(mesh.vertices, mesh.faces) == pytest.approx(
        factor * measure.volume(plain.vertices, plain.faces), rel=1e-12
    )


@pytest.mark.parametrize(("shape", "kinds"), SHAPES, ids=names)
def test_patches_and_count(shape: Primitive, kinds: list[PatchKind]) -> None:
    mesh = made(add(shape), rung=RUNG)
    assert sorted(mesh.patches.kind.tolist()) == sorted(kinds)
    if not isinstance(shape, Extrude | Revolve):
        assert len(mesh.faces) == count_triangles(shape, RUNG)
    else:
        assert len(mesh.faces) <= count_triangles(shape, RUNG)
    assert (mesh.face_source == 0).all()


@pytest.mark.parametrize(("shape", "kinds"), SHAPES, ids=names)
def test_vertices_lie_on_their_surfaces(shape: Primitive, kinds: list[PatchKind]) -> None:
    mesh = made(add(shape, PLACEMENTS["turned"]), rung=RUNG)
    for patch, kind in enumerate(mesh.patches.kind):
        if kind != PatchKind.FREE:
            points = mesh.vertices[np.unique(mesh.faces[mesh.face_patch == patch])]
            assert np.abs(surface_distance(mesh, patch, points)).max() < 1e-9


@pytest.mark.parametrize(("shape", "kinds"), SHAPES, ids=names)
def test_bounds_hold_the_mesh_closely(shape: Primitive, kinds: list[PatchKind]) -> None:
    for name, placement in PLACEMENTS.items():
        low, high = bounds(Recipe((add(shape, placement),)))
        mesh = made(add(shape, placement), rung=0.002)
        assert (mesh.vertices.min(axis=0) >= np.array(low) - 1e-9).all()
        assert (mesh.vertices.max(axis=0) <= np.array(high) + 1e-9).all()
        if name == "plain" or not isinstance(shape, Extrude | Revolve):
            assert np.abs(mesh.vertices.min(axis=0) - low).max() < 0.01
            assert np.abs(mesh.vertices.max(axis=0) - high).max() < 0.01


def test_documented_counts() -> None:
    n, m = divisions(5.0, RUNG), divisions(2.5, RUNG)
    assert len(tessellate(Cylinder(10.0, 4.0), RUNG).faces) == 4 * n - 4
    assert len(tessellate(Cone(10.0, 0.0, 4.0), RUNG).faces) == 2 * n - 2
    assert len(tessellate(Cone(10.0, 5.0, 4.0), RUNG).faces) == 4 * n + 2 * m - 4
    assert len(tessellate(Sphere(10.0), RUNG).faces) == n * (n - 2)
    assert len(tessellate(Torus(5.0, 5.0 - 1e-6), RUNG).faces) == 2 * divisions(5.0 - 5e-7, RUNG) * m


def test_shapes_stand_as_the_trade_says() -> None:
    """Base centre at the origin and rising; a wedge's slope on the +x side; a prism's flat toward -y."""
    for shape in (Block((1.0, 2.0, 3.0)), Cylinder(2.0, 3.0), Cone(2.0, 1.0, 3.0), Prism(6, 2.0, 3.0)):
        mesh = made(add(shape))
        assert mesh.vertices[:, 2].min() == 0.0
        assert mesh.vertices[:, 2].max() == 3.0
        middle = made(add(shape, centred=True))
        assert middle.vertices[:, 2].min() == -1.5
        assert middle.vertices[:, 2].max() == 1.5
    wedge = made(add(Wedge((4.0, 2.0, 3.0), 1.0)))
    assert wedge.vertices[wedge.vertices[:, 2] == 3.0, 0].max() == -1.0
    assert wedge.vertices[:, 0].min() == -2.0
    hexagon = made(add(Prism(6, 10.0, 3.0)))
    assert hexagon.vertices[:, 1].min() == pytest.approx(-5.0, abs=1e-14)
    assert np.count_nonzero(np.abs(hexagon.vertices[:, 1] + 5.0) < 1e-12) == 4
    assert hexagon.vertices[:, 0].max() == pytest.approx(10.0 / math.sqrt(3))
    apex = made(add(Pyramid(4, 10.0, 0.0, 3.0)))
    assert apex.vertices[apex.vertices[:, 2] == 3.0].tolist() == [[0.0, 0.0, 3.0]]


def test_cone_frame_runs_from_the_apex_into_the_cone() -> None:
    for shape, apex, down in ((Cone(10.0, 0.0, 5.0), 5.0, -1.0), (Cone(5.0, 10.0, 5.0), -5.0, 1.0)):
        mesh = made(add(shape))
        (row,) = np.flatnonzero(mesh.patches.kind == PatchKind.CONE)
        assert mesh.patches.frame[row, 0].tolist() == [0.0, 0.0, apex]
        assert mesh.patches.frame[row, 3].tolist() == [0.0, 0.0, down]
        assert mesh.patches.size[row, 0] == pytest.approx(45.0 if apex > 0 else math.degrees(math.atan(0.5)))


def test_tangent_joints_are_found_and_others_are_sharp() -> None:
    corner = ArcTo((9.0, 10.0), (9.0, 9.0), True)
    loop = Loop((0.0, 0.0), (LineTo((10.0, 0.0)), LineTo((10.0, 9.0)), corner, LineTo((0.0, 10.0))))
    mesh = made(add(Extrude(Outline(loop), 2.0)))
    corners = mesh.vertices[mesh.faces]
    tangent = np.argwhere(mesh.edge_kind == EdgeKind.TANGENT)
    ends = {tuple(corners[f, k, :2].round(6).tolist()) for f, k in tangent}
    assert len(tangent) == 4
    assert ends == {(10.0, 9.0), (9.0, 10.0)}
    upright = np.abs(corners[:, [1, 2, 0], 2] - corners[:, :, 2]) == 2.0
    square = (corners[:, :, :2] == corners[:, [1, 2, 0], :2]).all(axis=2) & upright
    sharp = {tuple(p) for p in corners[:, :, :2][square & (mesh.edge_kind == EdgeKind.SHARP)].tolist()}
    assert sharp == {(0.0, 0.0), (10.0, 0.0), (0.0, 10.0)}


def test_hole_wall_of_an_outline_is_inward() -> None:
    mesh = made(add(Extrude(ROUNDED, 3.0)))
    walls = mesh.patches.kind == PatchKind.CYLINDER
    assert sorted(zip(mesh.patches.size[walls, 0], mesh.patches.inward[walls], strict=True)) == [
        (1.0, True),
        (2.0, False),
    ]


def test_arcs_share_the_marks_of_their_circle() -> None:
    """A rounded corner and a whole cylinder of its radius and centre have the same vertices between the arc's ends."""
    corner = made(add(Extrude(ROUNDED, 3.0)), rung=0.001)
    pin = made(add(Cylinder(4.0, 3.0), transform.translate((8.0, 5.0, 0.0))), rung=0.001)
    have = {tuple(v) for v in corner.vertices.tolist()}
    want = [tuple(v) for v in pin.vertices.tolist() if v[0] > 8.0 and v[1] > 5.0]
    assert len(want) > 20
    assert set(want) <= have


def test_sphere_cap_meets_cylinder_without_a_seam() -> None:
    """A domed pin in one revolve: the dome is tangent to the wall, and its ring is the cylinder's."""
    loop = Loop((0.0, 0.0), (LineTo((5.0, 0.0)), LineTo((5.0, 8.0)), ArcTo((0.0, 13.0), (0.0, 8.0), True)))
    mesh = made(add(Revolve(Outline(loop))))
    assert sorted(mesh.patches.kind.tolist()) == [P.PLANE, P.CYLINDER, P.SPHERE]
    assert np.count_nonzero(mesh.edge_kind == EdgeKind.TANGENT) == 2 * divisions(5.0, RUNG)
    check_mesh(mesh, RUNG)


def test_thin_wall_keeps_its_chords_apart() -> None:
    """A tube with a wall of half a chord error, where unlike divisions would cut through it."""
    outer, inner = 10.0, 9.995
    loop = Loop((inner, 0.0), (LineTo((outer, 0.0)), LineTo((outer, 5.0)), LineTo((inner, 5.0))))
    for mesh in (
        made(add(Revolve(Outline(loop))), rung=0.01),
        made(
            add(
                Extrude(
                    Outline(
                        Loop((outer, 0.0), (ArcTo((outer, 0.0), (0.0, 0.0), True),)),
                        (Loop((inner, 0.0), (ArcTo((inner, 0.0), (0.0, 0.0), True),)),),
                    ),
                    5.0,
                )
            ),
            rung=0.01,
        ),
    ):
        check_mesh(mesh, 0.01)
        exact = math.pi * (outer**2 - inner**2) * 5.0
        assert measure.volume(mesh.vertices, mesh.faces) == pytest.approx(exact, rel=0.01)


def test_lemon_and_apple_arcs_that_reach_the_axis() -> None:
    """Arcs whose circle crosses the axis: normals hold, and a lemon's surface is no torus of the contract."""
    half = math.sqrt(5.0**2 - 3.0**2)
    lemon = Loop((0.0, -half), (ArcTo((0.0, half), (-3.0, 0.0), True),))
    apple = Loop((0.0, -half), (ArcTo((0.0, half), (3.0, 0.0), True),))
    for loop, kind in ((lemon, PatchKind.FREE), (apple, PatchKind.TORUS)):
        mesh = made(add(Revolve(Outline(loop))))
        assert mesh.patches.kind.tolist() == [kind]
        check_mesh(mesh, RUNG)


sizes = st.floats(0.05, 500.0)


@settings(max_examples=60, deadline=None)
@given(
    st.one_of(
        st.builds(Cylinder, sizes, sizes),
        st.builds(Cone, sizes, st.one_of(st.just(0.0), sizes), sizes),
        st.builds(Torus, st.floats(5.0, 50.0), st.floats(0.05, 4.9)),
        st.builds(Prism, st.integers(3, 40), sizes, sizes),
        st.builds(Pyramid, st.integers(3, 40), sizes, st.one_of(st.just(0.0), sizes), sizes),
        st.builds(Wedge, st.tuples(sizes, sizes, sizes), st.one_of(st.just(0.0), sizes)),
        st.builds(Sphere, st.floats(0.05, 50.0)),
        st.builds(Ellipsoid, st.tuples(*[st.floats(1.0, 30.0)] * 3)),
    ),
    st.sampled_from([0.5, 0.05]),
)
def test_any_size_is_closed_and_sane(shape: Primitive, rung: float) -> None:
    mesh = made(add(shape), rung=rung)
    check_mesh(mesh, rung)
    assert len(np.unique(mesh.faces)) == len(mesh.vertices)
    assert len(mesh.faces) == count_triangles(shape, rung)


@pytest.mark.parametrize("value", [0.0, -1.0, math.nan, math.inf])
@pytest.mark.parametrize("shape", [Cylinder(1.0, 1.0), Sphere(1.0), Torus(3.0, 1.0), Cone(1.0, 1.0, 1.0)])
def test_sizes_that_are_no_sizes_are_our_bug(shape: Primitive, value: float) -> None:
    for name in type(shape).__struct_fields__:
        if name == "top" and value == 0.0:
            continue
        with pytest.raises(SolidError, match=name):
            tessellate(structs.replace(shape, **{name: value}), RUNG)

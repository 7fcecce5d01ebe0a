"""Booleans: provenance, patches that survive, flush faces, pieces, budgets, repeatability."""

from __future__ import annotations

import hashlib
import math
import os
import subprocess
import sys

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.backend.contract import EdgeKind, FaceOrigin, Mesh, PatchKind
from platewright.compiler import measure
from platewright.compiler.solids import ladder, transform
from platewright.compiler.solids.bounds import bounds
from platewright.compiler.solids.build import build, key_of
from platewright.compiler.solids.flaw import Flaw, SolidError
from platewright.compiler.solids.recipe import (
    Affine,
    Block,
    Cone,
    Cylinder,
    Placed,
    Primitive,
    Prism,
    Recipe,
    Sphere,
    Step,
    Torus,
)
from support.recipes import add, check_mesh, cut, keep, made, surface_distance

RUNG = 0.02
move, turn = transform.translate, transform.turn


def volume(mesh: Mesh) -> float:
    return measure.volume(mesh.vertices, mesh.faces)


def flaws_of(*steps: Step, rung: float = RUNG) -> tuple[Mesh | None, tuple[Flaw, ...]]:
    return build(Recipe(steps), rung)


def test_cut_wall_answers_with_the_cutting_line() -> None:
    mesh = made(add(Block((20.0, 20.0, 5.0)), source=3), cut(Cylinder(8.0, 9.0), move((2.0, 1.0, -2.0)), source=7))
    check_mesh(mesh, RUNG)
    assert (mesh.face_origin == FaceOrigin.SURFACE).all()
    (wall,) = np.flatnonzero(mesh.patches.kind == PatchKind.CYLINDER)
    on_wall = mesh.face_patch == wall
    assert (mesh.face_source[on_wall] == 7).all()
    assert (mesh.face_source[~on_wall] == 3).all()
    assert mesh.patches.inward[wall]
    assert mesh.patches.size[wall, 0] == 4.0
    assert mesh.patches.frame[wall, 0, :2].tolist() == [2.0, 1.0]
    points = mesh.vertices[mesh.faces[on_wall]].reshape(-1, 3)
    inward = np.array((2.0, 1.0)) - points[:, :2]
    inward /= np.linalg.norm(inward, axis=1)[:, None]
    normal = mesh.corner_normals[on_wall].reshape(-1, 3)
    assert np.abs(normal[:, :2] - inward).max() < 1e-6
    n = ladder.divisions(4.0, RUNG)
    assert np.count_nonzero(mesh.edge_kind[on_wall] == EdgeKind.SHARP) == 2 * n


def test_every_step_leaves_faces_of_its_own_line() -> None:
    mesh = made(
        add(Cylinder(60.0, 50.0), source=10),
        add(Cylinder(84.0, 5.0), move((0.0, 0.0, 45.0)), source=11),
        cut(Cylinder(54.0, 47.0), move((0.0, 0.0, 3.0)), source=12),
        keep(Block((200.0, 60.0, 100.0)), move((0.0, 0.0, -20.0)), source=13),
    )
    check_mesh(mesh, RUNG)
    assert set(mesh.face_source.tolist()) == {10, 11, 12, 13}
    kept = mesh.face_patch[mesh.face_source == 13]
    assert (np.abs(mesh.patches.frame[kept, 3, 1]) == 1.0).all()


def test_nested_recipes_carry_lines_and_sides() -> None:
    """A bush (a tube) added twice, once mirrored, and cut once: the cut turns its inside out."""
    bush = Recipe((add(Cylinder(10.0, 10.0), source=3), cut(Cylinder(4.0, 10.0), source=4)))
    mirrored = transform.compose(
        move((-20.0, 0.0, 0.0)), transform.mirror((1.0, 0.0, 0.0)), turn(30.0, (0.0, 0.0, 1.0))
    )
    mesh, flaws = build(
        Recipe((add(Block((60.0, 20.0, 5.0))), add(bush, move((20.0, 0.0, 0.0)), mirrored), cut(bush, source=9))), RUNG
    )
    assert mesh is not None
    assert [(f.code, f.is_error) for f in flaws] == [("several-pieces", False)]
    check_mesh(mesh, RUNG)
    walls = mesh.patches.kind == PatchKind.CYLINDER
    found = {
        (round(float(x)), round(float(r), 9), bool(inward), int(mesh.face_source[mesh.face_patch == k][0]))
        for k, (x, r, inward) in enumerate(
            zip(mesh.patches.frame[:, 0, 0], mesh.patches.size[:, 0], mesh.patches.inward, strict=True)
        )
        if walls[k]
    }
    added = {(x, *wall) for x in (20, -20) for wall in ((5.0, False, 3), (2.0, True, 4))}
    assert found == added | {(0, 5.0, True, 3), (0, 2.0, False, 4)}


def test_nested_recipe_is_divided_for_the_size_it_reaches() -> None:
    bush = Recipe((add(Cylinder(10.0, 10.0)), cut(Cylinder(4.0, 10.0))))
    large = made(add(bush, transform.scale(3.0)), add(Block((60.0, 2.0, 5.0)), move((40.0, 0.0, 0.0)), source=5))
    check_mesh(large, RUNG)
    assert set(large.patches.size[large.patches.kind == PatchKind.CYLINDER, 0].round(9)) == {15.0, 6.0}
    rim = {tuple(v) for v in large.vertices[large.vertices[:, 2] == 30.0].round(9).tolist()}
    assert len(rim) == ladder.divisions(15.0, RUNG) + ladder.divisions(6.0, RUNG)


def test_pin_and_hole_share_their_vertices() -> None:
    for place in (move((3.1, 0.2, 0.7)), transform.compose(move((1.0, 2.0, 3.0)), turn(37.0, (1.0, 1.0, 0.0)))):
        plate = made(
            add(Block((40.0, 40.0, 10.0)), transform.compose(place, move((0.0, 0.0, 2.0)))),
            cut(Cylinder(10.0, 20.0), place),
        )
        pin = made(add(Cylinder(10.0, 10.0), transform.compose(place, move((0.0, 0.0, 2.0)))))
        (wall,) = np.flatnonzero(plate.patches.kind == PatchKind.CYLINDER)
        hole = plate.vertices[np.unique(plate.faces[plate.face_patch == wall])]
        assert len(hole) == len(pin.vertices)
        gaps = np.linalg.norm(hole[:, None] - pin.vertices[None], axis=2).min(axis=1)
        assert gaps.max() < 1e-13


def test_flush_faces_become_one_patch_without_a_line() -> None:
    mesh = made(add(Block((10.0, 10.0, 5.0))), add(Block((10.0, 10.0, 5.0)), move((10.0, 0.0, 0.0)), source=1))
    assert len(mesh.patches.kind) == 6
    assert len(mesh.faces) >= 12
    corners = mesh.vertices[mesh.faces]
    sharp = np.linalg.norm(corners - corners[:, [1, 2, 0]], axis=2)[mesh.edge_kind == EdgeKind.SHARP]
    assert sharp.sum() / 2 == pytest.approx(4 * (20.0 + 10.0 + 5.0))


def test_equal_coaxial_cylinders_become_one_patch() -> None:
    mesh = made(add(Cylinder(10.0, 5.0)), add(Cylinder(10.0, 5.0), move((0.0, 0.0, 5.0)), source=1))
    assert sorted(mesh.patches.kind.tolist()) == [PatchKind.PLANE, PatchKind.PLANE, PatchKind.CYLINDER]
    assert np.count_nonzero(mesh.edge_kind == EdgeKind.SHARP) == 4 * ladder.divisions(5.0, RUNG)
    hole = made(
        add(Block((20.0, 20.0, 10.0))),
        cut(Cylinder(10.0, 5.0), source=1),
        cut(Cylinder(10.0, 5.0), move((0.0, 0.0, 5.0)), source=2),
    )
    assert np.count_nonzero(hole.patches.kind == PatchKind.CYLINDER) == 1
    assert {1, 2} <= set(hole.face_source.tolist())


def test_wall_and_hole_of_one_radius_stay_two_patches() -> None:
    """A boss and a hole that meet in the same cylinder look opposite ways."""
    mesh, _ = flaws_of(
        add(Block((40.0, 40.0, 5.0))),
        cut(Cylinder(10.0, 5.0), source=1),
        add(Cylinder(10.0, 5.0), move((0.0, 0.0, 5.0)), source=2),
    )
    assert mesh is not None
    walls = mesh.patches.kind == PatchKind.CYLINDER
    assert sorted(mesh.patches.inward[walls].tolist()) == [False, True]


def test_tangent_patches_of_two_shapes_are_joined_softly() -> None:
    """A capsule of a cylinder and two spheres: no sharp line anywhere."""
    mesh = made(
        add(Cylinder(10.0, 20.0)), add(Sphere(10.0), transform.IDENTITY, move((0.0, 0.0, 20.0)), source=1), rung=0.01
    )
    check_mesh(mesh, 0.01)
    n = ladder.divisions(5.0, 0.01)
    assert sorted(mesh.patches.kind.tolist()) == [PatchKind.CYLINDER, PatchKind.SPHERE, PatchKind.SPHERE]
    assert not (mesh.edge_kind == EdgeKind.SHARP).any()
    assert np.count_nonzero(mesh.edge_kind == EdgeKind.TANGENT) == 4 * n


@pytest.mark.parametrize(
    ("low", "high", "between"),
    [
        (0.3, 0.7, lambda: 0.1 + 0.2),
        (0.3, 0.1, lambda: 0.1 * 3),
        (0.7, 0.4, lambda: 0.1 * 7),
        (1 / 3 + 1 / 3, 1.0, lambda: 2 / 3),
        (25.4 / 8 * 3, 5.0, lambda: 3 * (25.4 / 8)),
    ],
)
def test_flush_by_arithmetic_is_flush(low: float, high: float, between: object) -> None:
    level = between()  # type: ignore[operator]
    for side in (turn(0.0, (1.0, 0.0, 0.0)), turn(90.0, (1.0, 0.0, 0.0)), turn(90.0, (0.0, 1.0, 0.0))):
        upper = transform.compose(side, move((0.0, 0.0, level)))
        mesh = made(add(Block((4.0, 4.0, low)), side), add(Block((4.0, 4.0, high)), upper, source=1))
        assert len(mesh.patches.kind) == 6
        assert volume(mesh) == pytest.approx(16.0 * (low + high), rel=1e-12)
        cut_flush, flaws = flaws_of(
            add(Block((4.0, 4.0, level)), side), cut(Block((2.0, 2.0, low)), side, source=1), rung=RUNG
        )
        assert flaws == ()
        assert cut_flush is not None
        assert volume(cut_flush) == pytest.approx(12.0 * low, rel=1e-12)
        assert len(cut_flush.patches.kind) == 10


def test_flush_through_a_part_within_a_part() -> None:
    foot = Recipe((add(Block((4.0, 4.0, 0.1))), add(Block((2.0, 2.0, 0.2)), move((0.0, 0.0, 0.1)))))
    mesh = made(add(foot), add(Block((2.0, 2.0, 1.0)), move((0.0, 0.0, 0.3)), source=1))
    assert volume(mesh) == pytest.approx(1.6 + 0.8 + 4.0, rel=1e-12)
    assert len(mesh.patches.kind) == 11


def test_skew_placement_makes_curved_patches_free_and_keeps_normals() -> None:
    mesh = made(add(Block((30.0, 30.0, 5.0))), cut(Cylinder(8.0, 9.0), transform.scale((1.0, 2.0, 1.0)), source=1))
    check_mesh(mesh, RUNG)
    (wall,) = np.flatnonzero(mesh.patches.kind == PatchKind.FREE)
    on_wall = mesh.face_patch == wall
    points = mesh.vertices[mesh.faces[on_wall]].reshape(-1, 3)
    normal = -points * (4.0, 1.0, 0.0)
    normal /= np.linalg.norm(normal, axis=1)[:, None]
    assert np.abs(mesh.corner_normals[on_wall].reshape(-1, 3) - normal).max() < 1e-6
    along = made(add(Cylinder(8.0, 9.0), transform.scale((1.0, 1.0, 3.0))))
    assert sorted(along.patches.kind.tolist()) == [PatchKind.PLANE, PatchKind.PLANE, PatchKind.CYLINDER]


def test_nothing_left_names_the_last_cut() -> None:
    mesh, flaws = flaws_of(add(Block((1.0, 1.0, 1.0))), cut(Cylinder(0.5, 9.0), source=4), cut(Sphere(9.0), source=5))
    assert mesh is None
    assert [(f.code, f.source, f.is_error) for f in flaws] == [("empty-part", 5, True)]
    mesh, flaws = flaws_of(add(Block((1.0, 1.0, 1.0))), keep(Sphere(1.0), move((9.0, 0.0, 0.0)), source=6))
    assert mesh is None
    assert [(f.code, f.source) for f in flaws] == [("empty-part", 6)]
    assert [f.code for f in flaws_of()[1]] == ["empty-part"]
    hollow = Recipe((add(Block((1.0, 1.0, 1.0)), source=7), cut(Sphere(9.0), source=8)))
    mesh, flaws = flaws_of(add(Block((5.0, 5.0, 5.0))), add(hollow, source=9))
    assert mesh is None
    assert [(f.code, f.source) for f in flaws] == [("empty-part", 9)]


def test_a_part_that_begins_with_a_cut_is_refused() -> None:
    _, flaws = flaws_of(cut(Sphere(1.0), source=2), add(Sphere(3.0)))
    assert [(f.code, f.source) for f in flaws] == [("nothing-to-cut", 2)]
    assert "cut" in flaws[0].sentence


def test_pieces_are_counted_and_cavities_are_not() -> None:
    row = [move((3.0 * k, 0.0, 0.0)) for k in range(7)]
    mesh, flaws = flaws_of(add(Sphere(2.0), *row))
    assert mesh is not None
    assert [(f.code, f.is_error) for f in flaws] == [("several-pieces", False)]
    assert "7 pieces" in flaws[0].sentence
    made(add(Block((10.0, 10.0, 10.0))), cut(Sphere(2.0), move((0.0, 0.0, 5.0))))


def test_budgets_are_flaws_that_name_their_limit() -> None:
    many = (transform.IDENTITY,) * (ladder.MAX_COPIES + 1)
    _, flaws = flaws_of(Step("add", (Placed(Block((1.0, 1.0, 1.0)), many, 0),)))
    assert [f.code for f in flaws] == ["too-large"]
    assert "`copies`" in flaws[0].sentence
    nest = Recipe((add(Block((1.0, 1.0, 1.0))),))
    empty = Recipe(())
    for _ in range(40):
        nest, empty = Recipe((add(nest), add(nest))), Recipe((add(empty), add(empty)))
    for recipe in (nest, empty):
        _, flaws = build(recipe, RUNG)
        assert [f.code for f in flaws] == ["too-large"]
    deep = Recipe((add(Block((1.0, 1.0, 1.0))),))
    for _ in range(5000):
        deep = Recipe((add(deep),))
    assert [f.code for f in build(deep, RUNG)[1]] == ["too-large"]
    _, flaws = flaws_of(add(Sphere(1e6)), rung=1e-4)
    assert [f.code for f in flaws] == ["too-large"]
    assert "`triangles`" in flaws[0].sentence


@pytest.mark.parametrize(
    "bad", [transform.scale((1.0, 1.0, 0.0)), move((math.nan, 0.0, 0.0)), transform.scale(math.inf)]
)
def test_placements_that_are_no_placements_are_our_bug(bad: Affine) -> None:
    with pytest.raises(SolidError, match="placement"):
        flaws_of(add(Block((1.0, 1.0, 1.0)), bad))


def _bytes(mesh: Mesh) -> bytes:
    arrays = (mesh.vertices, mesh.faces, mesh.corner_normals, mesh.face_patch, mesh.face_source, mesh.edge_kind)
    patches = (mesh.patches.kind, mesh.patches.frame, mesh.patches.size, mesh.patches.inward)
    return mesh.key.encode() + b"".join(array.tobytes() for array in (*arrays, *patches))


def busy_part() -> Recipe:
    holes = [move((10.0 * i - 45.0, 10.0 * j - 45.0, -1.0)) for i in range(10) for j in range(10)]
    bush = Recipe((add(Cone(9.0, 6.0, 8.0), source=3), cut(Cylinder(3.0, 8.0), source=4)))
    return Recipe((
        add(Block((100.0, 100.0, 5.0))),
        cut(Cylinder(6.0, 10.0), *holes, source=1),
        add(bush, *[transform.compose(turn(60.0 * k, (0.0, 0.0, 1.0)), move((20.1, 0.0, 2.0))) for k in range(6)]),
        add(Torus(80.0, 4.0), move((0.0, 0.0, 5.0)), source=5),
    ))  # fmt: skip


def digest() -> str:
    mesh, _ = build(busy_part(), 0.05)
    assert mesh is not None
    return hashlib.sha256(_bytes(mesh)).hexdigest()


def test_same_recipe_same_bytes() -> None:
    first = digest()
    made(add(Sphere(3.0)), cut(Torus(3.0, 1.0)))
    assert digest() == first
    code = "import sys; sys.path.insert(0, sys.argv[1]); from test_solids_build import digest; print(digest())"
    for seed in ("1", "77"):
        environment = {**os.environ, "PYTHONHASHSEED": seed}
        command = [sys.executable, "-c", code, os.path.dirname(__file__)]
        found = subprocess.run(command, env=environment, capture_output=True, text=True, check=True)
        assert found.stdout.strip() == first


def test_key_names_the_content() -> None:
    recipe = Recipe((add(Sphere(3.0)),))
    again = Recipe((add(Sphere(3.0)),))
    assert key_of(recipe, 0.1) == key_of(again, 0.1)
    assert len({key_of(recipe, 0.1), key_of(recipe, 0.05), key_of(Recipe((add(Sphere(3.1)),)), 0.1)}) == 3
    mesh, _ = build(recipe, 0.1)
    assert mesh is not None
    assert mesh.key == key_of(recipe, 0.1)


def test_specks_of_rounding_are_left_out() -> None:
    """A slanting bar added and cut again beside other cuts: what rounding leaves of it is nothing."""
    slant = transform.compose(move((0.0, 2.0, 0.0)), turn(45.0, (1.0, 0.0, 0.0)))
    mesh = made(
        add(Block((10.0, 10.0, 10.0))),
        add(Block((2.0, 2.0, 2.0)), slant, source=1),
        cut(Block((2.0, 2.0, 3.0)), transform.IDENTITY, transform.IDENTITY, slant, source=2),
        rung=0.1,
    )
    check_mesh(mesh, 0.1)
    assert measure.components(mesh.faces, len(mesh.vertices)).max() == 0


shapes = st.one_of(
    st.builds(Block, st.tuples(*[st.integers(2, 12).map(float)] * 3)),
    st.builds(Cylinder, st.integers(2, 12).map(float), st.integers(2, 12).map(float)),
    st.builds(Cone, st.integers(2, 12).map(float), st.integers(0, 12).map(float), st.integers(2, 12).map(float)),
    st.builds(Prism, st.integers(3, 8), st.integers(2, 12).map(float), st.integers(2, 12).map(float)),
    st.builds(Sphere, st.integers(4, 12).map(float)),
    st.builds(Torus, st.integers(6, 12).map(float), st.integers(1, 5).map(float)),
)
places = st.builds(
    lambda x, y, z, angle, axis, mirrored: transform.compose(
        move((x, y, z)), turn(angle, axis), transform.mirror((1.0, 0.0, 0.0)) if mirrored else transform.IDENTITY
    ),
    *[st.integers(-8, 8).map(float)] * 3,
    st.sampled_from([0.0, 30.0, 45.0, 90.0, 180.0, 17.3]),
    st.sampled_from([(1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0), (1.0, 1.0, 1.0)]),
    st.booleans(),
)
operations = st.sampled_from(["add", "add", "cut", "cut", "keep"])


@settings(max_examples=60, deadline=None)
@given(st.lists(st.tuples(operations, shapes, st.lists(places, min_size=1, max_size=3)), min_size=1, max_size=6))
def test_any_process_sheet_gives_a_sound_mesh(lines: list[tuple[str, Primitive, list[Affine]]]) -> None:
    """Whole-number sizes and places make flush and touching faces frequent."""
    steps = [Step("add", (Placed(Block((10.0, 10.0, 10.0)), (transform.IDENTITY,), 0),))]
    for number, (operation, shape, placements) in enumerate(lines):
        placed = (Placed(shape, tuple(placements), number + 1),)
        steps.append(Step("add" if operation == "add" else "cut" if operation == "cut" else "keep", placed))
    recipe = Recipe(tuple(steps))
    mesh, flaws = build(recipe, 0.1)
    assert {f.code for f in flaws} <= {"several-pieces", "empty-part"}
    if mesh is None:
        assert any(f.code == "empty-part" for f in flaws)
        return
    check_mesh(mesh, 0.1)
    pieces = measure.count_pieces(mesh.vertices, mesh.faces)
    assert (f"{pieces} pieces" in flaws[0].sentence) if flaws else pieces == 1
    assert set(mesh.face_source.tolist()) <= set(range(len(steps)))
    low, high = bounds(recipe)
    assert (mesh.vertices.min(axis=0) >= np.array(low) - 1e-9).all()
    assert (mesh.vertices.max(axis=0) <= np.array(high) + 1e-9).all()


def test_every_vertex_of_a_patch_is_on_its_surface_but_for_chords() -> None:
    """Vertices of the shapes themselves lie on the surface; only those that a boolean made may lie inside a chord."""
    mesh = made(
        add(Cylinder(20.0, 30.0)), cut(Cylinder(9.0, 40.0), transform.compose(move((0, -20, 15)), turn(-90, (1, 0, 0))))
    )
    check_mesh(mesh, RUNG)
    for patch in np.flatnonzero(mesh.patches.kind == PatchKind.CYLINDER):
        off = surface_distance(mesh, patch, mesh.vertices[np.unique(mesh.faces[mesh.face_patch == patch])])
        assert off.max() < 1e-9
        assert np.count_nonzero(np.abs(off) < 1e-9) > 20

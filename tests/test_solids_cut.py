"""Meshes cut open: volumes against closed forms, cap areas, what is kept of patches, sources and normals."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.backend.contract import EdgeKind, FaceOrigin, Mesh
from platewright.compiler.solids.build import build
from platewright.compiler.solids.cut import Cutter, cut_mesh, half_space
from platewright.compiler.solids.recipe import Block, Cylinder, Placed, Recipe, Step
from platewright.compiler.solids.transform import IDENTITY

PIPE = Recipe(
    (
        Step("add", (Placed(Cylinder(40.0, 30.0), (IDENTITY,), 0),)),
        Step("cut", (Placed(Cylinder(20.0, 30.0), (IDENTITY,), 1),)),
    )
)
BLOCK = Recipe((Step("add", (Placed(Block((10.0, 20.0, 30.0)), (IDENTITY,), 0),)),))
HERE = np.eye(4)


def made(recipe: Recipe, rung: float = 0.01) -> Mesh:
    mesh, flaws = build(recipe, rung)
    assert mesh is not None and not flaws
    return mesh


def volume(mesh: Mesh) -> float:
    a, b, c = (mesh.vertices[mesh.faces[:, k]] for k in range(3))
    return float((a * np.cross(b, c)).sum() / 6.0)


def areas(mesh: Mesh) -> np.ndarray:
    a, b, c = (mesh.vertices[mesh.faces[:, k]] for k in range(3))
    return np.linalg.norm(np.cross(b - a, c - a), axis=1) / 2.0


def test_a_pipe_cut_along_its_axis() -> None:
    mesh = made(PIPE)
    cut = cut_mesh(mesh, HERE, half_space((0.0, -1.0, 0.0), 0.0, np.zeros(3), 100.0))
    assert cut is not None and cut.closed
    assert volume(cut) == pytest.approx(volume(mesh) / 2, rel=1e-12)
    is_cap = cut.face_origin == FaceOrigin.SECTION_CAP
    assert areas(cut)[is_cap].sum() == pytest.approx(2 * 10.0 * 30.0, rel=1e-12)
    assert np.unique(cut.face_patch[is_cap]).size == 1
    assert np.allclose(cut.corner_normals[is_cap], (0.0, -1.0, 0.0))
    assert (cut.face_source[is_cap] == -1).all() and set(cut.face_source[~is_cap]) == {0, 1}
    assert np.abs(cut.vertices[cut.faces[is_cap]][..., 1]).max() == 0.0


def test_normals_of_what_stays_are_those_of_its_surfaces() -> None:
    cut = cut_mesh(made(PIPE, 0.05), HERE, half_space((0.6, 0.0, 0.8), 9.0, np.zeros(3), 100.0))
    assert cut is not None
    curved = np.abs(cut.corner_normals[..., 2]).max(axis=1) < 0.1
    curved &= cut.face_origin == FaceOrigin.SURFACE
    at = cut.vertices[cut.faces[curved]]
    radial = at[..., :2] / np.hypot(at[..., 0], at[..., 1])[..., None]
    agreement = np.abs((radial * cut.corner_normals[curved][..., :2]).sum(axis=2))
    assert agreement.min() > math.cos(math.radians(0.3))


def test_the_rim_of_a_cap_is_sharp_and_a_smooth_wall_stays_smooth() -> None:
    cut = cut_mesh(made(PIPE), HERE, half_space((0.0, -1.0, 0.0), 0.0, np.zeros(3), 100.0))
    assert cut is not None
    kinds = cut.edge_kind[cut.face_origin == FaceOrigin.SECTION_CAP]
    assert set(np.unique(kinds)) == {int(EdgeKind.INSIDE), int(EdgeKind.SHARP)}
    assert not (cut.edge_kind == EdgeKind.BORDER).any()


def test_a_cutter_that_misses_gives_the_mesh_back() -> None:
    mesh = made(BLOCK)
    assert cut_mesh(mesh, HERE, half_space((1.0, 0.0, 0.0), 6.0, np.zeros(3), 100.0)) is mesh
    assert cut_mesh(mesh, HERE, half_space((1.0, 0.0, 0.0), 5.0, np.zeros(3), 100.0)) is mesh


def test_a_cutter_that_takes_all_leaves_nothing() -> None:
    assert cut_mesh(made(BLOCK), HERE, half_space((1.0, 0.0, 0.0), -6.0, np.zeros(3), 100.0)) is None


def test_a_quarter_taken_out_has_two_caps() -> None:
    profile = ((0.0, 0.0), (50.0, 0.0), (50.0, 50.0), (0.0, 50.0))
    cap, rest = int(FaceOrigin.SECTION_CAP), int(FaceOrigin.BREAK)
    quarter = Cutter(
        profile, (0.0, 0.0, 0.0), (1.0, 0.0, 0.0), (0.0, 1.0, 0.0), -50.0, 50.0, (cap, rest, rest, cap, rest, rest)
    )
    mesh = made(PIPE)
    cut = cut_mesh(mesh, HERE, quarter)
    assert cut is not None and cut.closed
    assert volume(cut) == pytest.approx(volume(mesh) * 3 / 4, rel=1e-12)
    is_cap = cut.face_origin == FaceOrigin.SECTION_CAP
    assert np.unique(cut.face_patch[is_cap]).size == 2
    assert areas(cut)[is_cap].sum() == pytest.approx(2 * 10.0 * 30.0, rel=1e-12)
    assert {tuple(np.round(each, 6)) for each in cut.corner_normals[is_cap][:, 0]} == {(0.0, 1.0, 0.0), (1.0, 0.0, 0.0)}


def test_the_same_cut_has_the_same_key_and_bytes_and_another_has_not() -> None:
    mesh = made(PIPE)
    one, again, other = (
        cut_mesh(mesh, HERE, half_space((0.0, -1.0, 0.0), offset, np.zeros(3), 100.0)) for offset in (1.0, 1.0, 2.0)
    )
    assert one is not None and again is not None and other is not None
    assert one.key == again.key != other.key
    assert one.vertices.tobytes() == again.vertices.tobytes() and one.faces.tobytes() == again.faces.tobytes()


@settings(max_examples=40, deadline=None)
@given(
    turn=st.floats(0.0, 360.0),
    tilt=st.floats(-90.0, 90.0),
    offset=st.floats(-18.0, 18.0),
    mirrored=st.booleans(),
    shift=st.tuples(*[st.floats(-500.0, 500.0)] * 3),
)
def test_two_halves_make_the_whole(
    turn: float, tilt: float, offset: float, mirrored: bool, shift: tuple[float, float, float]
) -> None:
    mesh = made(PIPE, 0.1)
    a, b = math.radians(turn), math.radians(tilt)
    normal = (math.cos(a) * math.cos(b), math.sin(a) * math.cos(b), math.sin(b))
    placement = np.eye(4)
    placement[:3, :3] = [[math.cos(a), -math.sin(a), 0], [math.sin(a), math.cos(a), 0], [0, 0, -1 if mirrored else 1]]
    placement[:3, 3] = shift
    middle = np.array(shift)
    level = offset + sum(n * s for n, s in zip(normal, shift, strict=True))
    opposite = (-normal[0], -normal[1], -normal[2])
    halves = [
        cut_mesh(mesh, placement, half_space(normal, level, middle, 60.0)),
        cut_mesh(mesh, placement, half_space(opposite, -level, middle, 60.0)),
    ]
    assert all(half is None or half.closed for half in halves)
    assert sum(volume(half) for half in halves if half is not None) == pytest.approx(volume(mesh), rel=1e-9)
    caps = [
        areas(half)[half.face_origin == FaceOrigin.SECTION_CAP].sum() if half is not None else 0.0 for half in halves
    ]
    assert caps[0] == pytest.approx(caps[1], rel=1e-7, abs=1e-6)

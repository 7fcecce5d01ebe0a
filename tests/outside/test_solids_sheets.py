"""Reliefs, sheets and envelopes against integrals and closed forms.

A relief's volume is the integral of its function (here by hand); a sheet of thickness T along a cylinder or torus is
the ring between two of them; the stadium is elementary; scipy's ConvexHull (Qhull) gives hulls of the same points
independently.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from platewright.backend.contract import EdgeKind, Mesh, PatchKind
from platewright.compiler import measure, scene
from platewright.compiler.solids import transform
from platewright.compiler.solids.bounds import bounds
from platewright.compiler.solids.build import build
from platewright.compiler.solids.recipe import (
    Block,
    Cylinder,
    Envelope,
    Field,
    Grid,
    ParametricSurface,
    Placed,
    Recipe,
    Relief,
    Sphere,
)
from platewright.compiler.solids.tessellate import count_triangles, tessellate
from platewright.lang.problems import Severity
from scipy.spatial import ConvexHull
from support.recipes import add, check_mesh, cut, made
from support.scenes import built, checked, clean, exported

PI = math.pi
RUNGS = (0.1, 0.05, 0.02, 0.01)


def field(*steps: tuple[str, float] | float | str) -> Field:
    """A program from numbers, `first`, `second`, and operations with their numbers of values."""
    named = {"first": ("variable", 0.0), "second": ("variable", 1.0)}
    return Field(
        tuple(
            named[s] if isinstance(s, str) else ("number", float(s)) if isinstance(s, float | int) else s for s in steps
        )
    )


def volume(mesh: Mesh) -> float:
    return measure.volume(mesh.vertices, mesh.faces)


def slope(errors: list[float]) -> float:
    return float(np.polyfit(np.log(RUNGS), np.log(errors), 1)[0])


# 5 + 2 cos(20°/mm · x) cos(12°/mm · y), over 36 mm by 30 mm: whole periods, so that the mean is 5.
WAVE = field(
    5.0, 2.0, "first", 20.0, ("*", 2), ("cos", 1), ("*", 2), "second", 12.0, ("*", 2), ("cos", 1), ("*", 2), ("+", 2)
)
# 4 + (x² + y²) / 40 mm
BOWL = field(4.0, "first", 2.0, ("^", 2), "second", 2.0, ("^", 2), ("+", 2), 40.0, ("/", 2), ("+", 2))


def height(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    return 5.0 + 2.0 * np.cos(np.radians(20.0 * x)) * np.cos(np.radians(12.0 * y))


@pytest.mark.parametrize("rung", RUNGS)
def test_a_relief_lies_within_the_chord_error_of_its_function(rung: float) -> None:
    """Random points of its triangles against the function, which is farther off along z than square to it."""
    shape = Relief(WAVE, (36.0, 30.0))
    mesh = made(add(shape), rung=rung)
    check_mesh(mesh, rung)
    assert len(mesh.faces) <= count_triangles(shape, rung)
    assert sorted(mesh.patches.kind.tolist()) == [PatchKind.PLANE] * 5 + [PatchKind.FREE]
    upper = mesh.vertices[mesh.faces[mesh.patches.kind[mesh.face_patch] == PatchKind.FREE]]
    weights = np.random.default_rng(1).dirichlet((1, 1, 1), (len(upper), 8))
    x, y, z = np.einsum("mpk,mkj->jmp", weights, upper)
    assert np.abs(z - height(x, y)).max() <= 1.3 * rung


def test_volumes_of_reliefs_converge() -> None:
    """36 · 30 · 5 for the wave; for the bowl over 20 by 20, 4 · 400 + (2 · 20 · 20³/12) / 40."""
    wave = [abs(volume(made(add(Relief(WAVE, (36.0, 30.0))), rung=r)) - 5400.0) for r in RUNGS]
    assert max(wave) < 36 * 30 * 0.1
    exact = 1600.0 + 2 * 20.0 * 20.0**3 / 12 / 40
    bowl = [abs(volume(made(add(Relief(BOWL, (20.0, 20.0))), rung=r)) - exact) for r in RUNGS]
    assert all(error <= 400 * rung for error, rung in zip(bowl, RUNGS, strict=True))
    assert slope(bowl) == pytest.approx(1.0, abs=0.3)


def test_normals_of_a_relief_are_those_of_its_function() -> None:
    """The gradient of the bowl is (x, y)/20."""
    mesh = made(add(Relief(BOWL, (20.0, 20.0))), rung=0.02)
    upper = mesh.patches.kind[mesh.face_patch] == PatchKind.FREE
    points = mesh.vertices[mesh.faces[upper]]
    normal = np.stack((-points[..., 0] / 20, -points[..., 1] / 20, np.ones(points.shape[:2])), axis=-1)
    normal /= np.linalg.norm(normal, axis=-1)[..., None]
    inner = (np.abs(points[..., :2]) < 9.99).all(axis=-1)
    assert np.abs(mesh.corner_normals[upper] - normal)[inner].max() < 1e-5


def test_a_table_is_met_at_every_corner() -> None:
    grid = Grid((-10.0, 0.0, 10.0), (-5.0, 5.0), ((1.0, 3.0, 2.0), (4.0, 2.0, 5.0)))
    mesh = made(add(Relief(grid, (20.0, 10.0))), rung=0.01)
    check_mesh(mesh, 0.01)
    for j, y in enumerate(grid.y):
        for i, x in enumerate(grid.x):
            assert (np.abs(mesh.vertices - (x, y, grid.z[j][i])).max(axis=1) < 1e-12).any()


def ring(radius: float) -> tuple[Field, Field]:
    return field(radius, "first", ("cos", 1), ("*", 2)), field(radius, "first", ("sin", 1), ("*", 2))


def test_a_sheet_that_closes_once_is_a_pipe() -> None:
    exact = PI * (10.5**2 - 9.5**2) * 20
    errors = []
    for rung in RUNGS:
        shape = ParametricSurface((*ring(10.0), field("second")), (0.0, 360.0), (0.0, 20.0), 1.0)
        mesh = made(add(shape), rung=rung)
        check_mesh(mesh, rung)
        assert measure.count_pieces(mesh.vertices, mesh.faces) == 1
        # A pipe has the Euler number of a torus.
        assert len(mesh.vertices) - len(mesh.faces) // 2 == 0
        errors.append(abs(volume(mesh) - exact))
    assert slope(errors) == pytest.approx(1.0, abs=0.3)


def test_a_sheet_that_closes_twice_is_a_hollow_ring() -> None:
    across = field(20.0, 5.0, "second", ("cos", 1), ("*", 2), ("+", 2)).program
    point = tuple(Field((*across, ("variable", 0.0), (name, 1.0), ("*", 2.0))) for name in ("cos", "sin"))
    up = field(5.0, "second", ("sin", 1), ("*", 2))
    mesh = made(add(ParametricSurface((*point, up), (0.0, 360.0), (0.0, 360.0), 1.0)), rung=0.02)  # type: ignore[arg-type]
    check_mesh(mesh, 0.02)
    assert volume(mesh) == pytest.approx(2 * PI**2 * 20 * (5.5**2 - 4.5**2), rel=5e-3)
    assert (mesh.edge_kind == EdgeKind.INSIDE).all()


def test_flaws_of_functions() -> None:
    def codes(shape: Relief | ParametricSurface) -> list[str]:
        mesh, flaws = build(Recipe((add(shape),)), 0.1)
        assert mesh is None
        return [flaw.code for flaw in flaws]

    assert codes(Relief(field("first"), (10.0, 10.0))) == ["no-wall"]
    assert codes(Relief(field(1.0, "first", ("/", 2)), (10.0, 10.0))) == ["no-value"]
    tight = ParametricSurface((*ring(1.0), field("second")), (0.0, 180.0), (0.0, 20.0), 3.0)
    assert codes(tight) == ["cuts-itself"]
    pole = tuple(Field((*each.program, ("variable", 1.0), ("*", 2.0))) for each in ring(1.0))
    assert codes(ParametricSurface((*pole, field("second")), (0.0, 90.0), (0.0, 5.0), 0.1)) == ["no-value"]  # type: ignore[arg-type]


def at(x: float, y: float, z: float) -> transform.Affine:
    return transform.translate((x, y, z))


def test_the_envelope_of_two_discs_is_a_stadium() -> None:
    shape = Envelope((Placed(Cylinder(20.0, 5.0), (at(0, 0, 0), at(50, 0, 0)), 0),))
    errors = []
    for rung in RUNGS:
        mesh = made(add(shape), rung=rung)
        check_mesh(mesh, rung)
        assert sorted(mesh.patches.kind.tolist()) == [PatchKind.PLANE, PatchKind.PLANE, PatchKind.FREE]
        errors.append(abs(volume(mesh) - 5 * (PI * 100 + 20 * 50)))
    assert slope(errors) == pytest.approx(1.0, abs=0.2)
    low, high = bounds(Recipe((add(shape),)))
    assert (*low, *high) == pytest.approx((-10, -10, 0, 60, 10, 5))


def test_the_envelope_of_flat_shapes_has_flat_faces() -> None:
    turned = transform.turn(30.0, (1.0, 1.0, 0.0))
    mesh = made(add(Envelope((Placed(Block((10.0, 10.0, 10.0)), (at(0, 0, 0), turned), 0),))), rung=0.1)
    check_mesh(mesh, 0.1)
    assert (mesh.patches.kind == PatchKind.PLANE).all()


def test_envelopes_against_qhull() -> None:
    random = np.random.default_rng(5)
    for _ in range(25):
        shapes = [Block((4.0, 3.0, 2.0)), Sphere(3.0), Cylinder(2.0, 6.0)]
        places = [
            transform.compose(
                at(*random.uniform(-6, 6, 3)), transform.turn(float(random.uniform(0, 360)), (1.0, 2.0, 3.0))
            )
            for _ in shapes
        ]
        mesh = made(add(Envelope(tuple(Placed(s, (p,), 0) for s, p in zip(shapes, places, strict=True)))), rung=0.05)
        points = [transform.apply(p, tessellate(s, 0.05).vertices) for s, p in zip(shapes, places, strict=True)]
        assert volume(mesh) == pytest.approx(ConvexHull(np.concatenate(points)).volume, rel=1e-9)


def test_sheets_and_envelopes_are_cut_like_any_solid() -> None:
    shape = Envelope((Placed(Cylinder(20.0, 5.0), (at(0, 0, 0), at(50, 0, 0)), 0),))
    for whole in (shape, Relief(WAVE, (36.0, 30.0))):
        mesh = made(add(whole), cut(Cylinder(8.0, 60.0), at(3.0, 1.0, -10.0)), rung=0.02)
        check_mesh(mesh, 0.02)


SCENE = """platewright 1

derived
    swell(along) = 2 mm * sin(along * 9 deg / 1 mm)

part wave
    add relief z = 6 mm + swell(x) if x < 5 mm else max(6 mm, abs(y)) over (20 mm, 10 mm)
    {}

part sheet
    add surface (u, v, u*v / 50 mm) u 0 mm .. 40 mm v 0 mm .. 30 mm thickness 1 mm
"""


def test_functions_of_the_author_are_followed_into_the_relief() -> None:
    run = built(SCENE.format(""))
    assert run.model is not None
    found, problems = scene.geometry(run.model, "wave", run.meshes, 0.02)
    assert found is not None
    assert [(problem.code, problem.severity) for problem in problems] == [("coarse-surface", Severity.WARNING)]
    mesh = found.geometry
    top = mesh.vertices[mesh.vertices[:, 2] > 1.0]
    x, z = top[:, 0], top[:, 2]
    smooth = x < 4.0
    assert np.abs(z - (6.0 + 2.0 * np.sin(np.radians(9.0 * x))))[smooth].max() < 1e-9


@pytest.mark.parametrize(
    ("line", "code", "word"),
    [
        ("add relief z = 4 deg * x over (4 mm, 4 mm)", "wrong-kind", "a length"),
        ("add relief z = 4 mm + q over (4 mm, 4 mm)", "unknown-name", "`q`"),
        ("add relief z = x over (4 mm, 4 mm)", "no-wall", "above"),
        ("add relief z = 4 mm over (0, 4 mm)", "out-of-range", "above 0"),
        ("add surface (u, 0, 0) u 0 mm .. 4 mm v 0 .. 1 thickness 1 mm", "no-value", "direction"),
        ("add surface (u, v * 1 mm, u) u 4 mm .. 4 mm v 0 .. 1 thickness 1 mm", "out-of-range", "empty"),
        ("add relief z = root(x / 1 mm) * 1 mm over (4 mm, 4 mm)", "wrong-parameters", "below 0"),
    ],
)
def test_mistakes_in_functions_are_located(line: str, code: str, word: str) -> None:
    found = checked(SCENE.format(line)).errors
    assert [(problem.code, problem.span.line) for problem in found] == [(code, 8)]
    assert word in found[0].sentence


def test_an_envelope_in_a_scene() -> None:
    text = """platewright 1

part lever
    add envelope of
        cylinder diameter 20 mm length 6 mm
        cylinder diameter 10 mm length 6 mm at (40 mm, 0, 0) row 2 by (10 mm, 0, 0)
"""
    run = clean(text)
    assert run.model is not None
    geometry = exported(text, "lever", 0.01).geometry
    assert np.ptp(geometry.vertices, axis=0) == pytest.approx((65, 20, 6), abs=0.02)
    part = "part p\n    add sphere diameter 4 mm\n\n" + text.replace("platewright 1\n\n", "").replace(
        "cylinder diameter 20 mm length 6 mm", "p"
    )
    assert [problem.code for problem in checked(part).errors] == ["wrong-form"]

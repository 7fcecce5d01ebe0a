"""Booleans against closed forms, half-space intersection (scipy, Qhull) and the laws of regularised sets.

Bicylinder 16/3 r³ and tricylinder 8(2 - sqrt 2) r³ (Steinmetz solids); sphere with a hole of length h, pi h³/6,
whatever the radius (the napkin-ring theorem); lens of two unit spheres at distance 1, 5 pi/12. Operators are
regularised as in ISO 10303-42 and IfcBooleanResult of ISO 16739.
"""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
import trimesh
from platewright.backend.contract import Mesh, PatchKind
from platewright.compiler import measure
from platewright.compiler.solids import transform
from platewright.compiler.solids.bounds import facts_rung
from platewright.compiler.solids.build import build
from platewright.compiler.solids.recipe import Affine, Block, Cylinder, Prism, Pyramid, Recipe, Sphere, Step
from scipy.spatial import ConvexHull, HalfspaceIntersection
from support.recipes import add, check_mesh, cut, keep, made

RUNGS = (0.02, 0.01, 0.005, 0.002, 0.001)
ALONG_X = transform.turn(90.0, (0.0, 1.0, 0.0))
ALONG_Y = transform.turn(90.0, (1.0, 0.0, 0.0))
move = transform.translate


def volume(mesh: Mesh) -> float:
    return measure.volume(mesh.vertices, mesh.faces)


def rod(step: str, *placements: Affine) -> Step:
    return {"add": add, "keep": keep, "cut": cut}[step](Cylinder(2.0, 4.0), *placements, centred=True)


# Radius 10 to 40 of the ball changes nothing: the hole's length alone counts.
def ring(diameter: float, length: float) -> tuple[Step, Step]:
    hole = math.sqrt(diameter**2 - length**2)
    return add(Sphere(diameter)), cut(Cylinder(hole, 2 * diameter), centred=True)


CASES = {
    "bicylinder": ((rod("add"), rod("keep", ALONG_X)), 16 / 3),
    "tricylinder": ((rod("add"), rod("keep", ALONG_X), rod("keep", ALONG_Y)), 8 * (2 - math.sqrt(2))),
    "lens": ((add(Sphere(2.0)), keep(Sphere(2.0), move((1.0, 0.0, 0.0)))), 5 * math.pi / 12),
    "napkin ring, radius 2": (ring(4.0, 3.0), math.pi * 27 / 6),
    "napkin ring, radius 3": (ring(6.0, 3.0), math.pi * 27 / 6),
}


@pytest.mark.parametrize(("steps", "exact"), CASES.values(), ids=CASES.keys())
def test_volumes_converge_to_the_closed_forms(steps: tuple[Step, ...], exact: float) -> None:
    errors = []
    for rung in RUNGS:
        mesh = made(*steps, rung=rung)
        check_mesh(mesh, rung)
        errors.append(abs(volume(mesh) - exact))
        # Chords lie within two chord errors of a ball, a parabola's mean is two thirds of its height.
        assert errors[-1] <= 4 / 3 * rung * measure.area(mesh.vertices, mesh.faces)
    slope = np.polyfit(np.log(RUNGS), np.log(errors), 1)[0]
    assert slope == pytest.approx(1.0, abs=0.2)


@pytest.mark.parametrize("diameter", [0.5, 10.0, 2e4])
def test_facts_are_as_fine_for_every_size(diameter: float) -> None:
    """What a ball's measured volume lacks is at most 4 in 10 000; the closed form is pi d³/6."""
    recipe = Recipe((add(Sphere(diameter)),))
    mesh, _ = build(recipe, facts_rung(recipe))
    assert mesh is not None
    assert 0.0 < 1.0 - volume(mesh) / (math.pi * diameter**3 / 6) < 4e-4


@pytest.mark.parametrize(("n", "seed"), [(300, 20128), pytest.param(1000, 20129, marks=pytest.mark.slow)])
def test_convex_pairs_against_half_spaces(n: int, seed: int) -> None:
    """Volume of the intersection of two random convex solids: Qhull's half-space intersection, to 1e-9."""
    random = np.random.default_rng(seed)
    worst, met = 0.0, 0
    for _ in range(n):
        steps, planes = [], []
        for make in (add, keep):
            sides, across, length = int(random.integers(3, 9)), *random.uniform(2.0, 6.0, 2).tolist()
            shape = random.choice([0, 1, 2])
            solid = (
                Block((across, length, across)),
                Prism(sides, across, length),
                Pyramid(sides, across, float(random.choice([0.0, 1.0])), length),
            )[shape]
            axis = random.normal(size=3).tolist()
            place = transform.compose(
                move(tuple(random.uniform(-1.5, 1.5, 3).tolist())),
                transform.turn(float(random.uniform(0, 360)), tuple(axis)),
            )
            steps.append(make(solid, place, centred=True))
            alone = made(add(solid, place, centred=True))
            planes.append(ConvexHull(alone.vertices).equations)
        half_spaces = np.concatenate(planes)
        inner = deepest(half_spaces)
        mesh, flaws = build(Recipe(tuple(steps)), 0.1)
        if inner is None:
            assert mesh is None
            assert [f.code for f in flaws] == ["empty-part"]
            continue
        assert mesh is not None
        met += 1
        exact = ConvexHull(HalfspaceIntersection(half_spaces, inner).intersections).volume
        worst = max(worst, abs(volume(mesh) - exact) / max(1.0, exact))
        assert (mesh.patches.kind == PatchKind.PLANE).all()
    assert met > 0.7 * n
    assert worst < 1e-9


def test_what_is_kept_of_a_solid_by_itself_is_the_solid() -> None:
    """A A = A (idempotence). The kernel's difference alone loses a twelfth of this prism: all its faces coincide."""
    place: Affine = (
        (0.9784085179070207, -0.08441279676552099, 0.18865643861053374, 0.034376014779413655),
        (0.11371929180421445, 0.9820705856948581, -0.15035054833457182, -0.7701337922075986),
        (-0.17258242888120204, 0.16855813375563142, 0.9704655896971739, -0.959088782038796),
    )
    prism = Prism(8, 4.034476059764122, 2.9098506212085002)
    alone, kept = made(add(prism, place)), made(add(prism, place), keep(prism, place))
    check_mesh(kept, 0.02)
    assert volume(kept) == pytest.approx(volume(alone), rel=1e-12)


def deepest(half_spaces: np.ndarray) -> np.ndarray | None:
    """The centre of the largest ball within all half spaces, None if there is none (linear programme)."""
    from scipy.optimize import linprog

    found = linprog(
        (0.0, 0.0, 0.0, -1.0),
        A_ub=np.column_stack((half_spaces[:, :3], np.linalg.norm(half_spaces[:, :3], axis=1))),
        b_ub=-half_spaces[:, 3],
        bounds=[(None, None)] * 3 + [(None, None)],
    )
    return found.x[:3] if found.x[3] > 1e-6 else None


def test_blocks_that_share_a_face() -> None:
    """Regularised: their intersection is empty, their union is one solid without an inner face."""
    beside = move((2.0, 0.0, 0.0))
    for one, other in ((Block((2.0, 2.0, 2.0)), Block((2.0, 2.0, 2.0))), (Block((2.0, 8.0, 8.0)), Cylinder(2.0, 2.0))):
        for first, second in ((add(one), keep(other, beside)), (add(other, beside), keep(one))):
            mesh, flaws = build(Recipe((first, second)), 0.1)
            assert mesh is None
            assert [f.code for f in flaws] == ["empty-part"]
    union = made(add(Block((2.0, 2.0, 2.0))), add(Block((2.0, 2.0, 2.0)), beside))
    assert measure.count_pieces(union.vertices, union.faces) == 1
    assert volume(union) == 16.0
    assert measure.area(union.vertices, union.faces) == 40.0
    assert not (union.vertices[union.faces][:, :, 0] == 1.0).all(axis=1).any()
    assert trimesh.Trimesh(union.vertices, union.faces, process=False).euler_number == 2


def test_blocks_that_share_only_an_edge_stay_two_solids() -> None:
    mesh, flaws = build(Recipe((add(Block((2.0, 2.0, 2.0))), add(Block((2.0, 2.0, 2.0)), move((2.0, 2.0, 0.0))))), 0.1)
    assert mesh is not None
    assert mesh.closed
    assert volume(mesh) == 16.0
    assert [f.code for f in flaws] in ([], ["several-pieces"])


def test_difference_depends_on_order_and_volumes_add_up() -> None:
    """A - B is not B - A; vol(A + B) + vol(A * B) = vol A + vol B, of the triangles themselves."""
    a, b = Sphere(10.0), Cylinder(6.0, 30.0)
    place = transform.compose(move((1.0, 2.0, -9.0)), transform.turn(25.0, (1.0, 1.0, 0.0)))
    for rung in (0.1, 0.01):
        of_a, of_b = volume(made(add(a), rung=rung)), volume(made(add(b, place), rung=rung))
        union = volume(made(add(a), add(b, place), rung=rung))
        common = volume(made(add(a), keep(b, place), rung=rung))
        less = volume(made(add(a), cut(b, place), rung=rung))
        other, flaws = build(Recipe((add(b, place), cut(a))), rung)
        assert other is not None
        assert flaws == ()
        assert union + common == pytest.approx(of_a + of_b, rel=1e-12)
        assert less == pytest.approx(of_a - common, rel=1e-12)
        assert volume(other) == pytest.approx(of_b - common, rel=1e-12)


def test_order_of_additions_does_not_matter() -> None:
    """Union is commutative and associative."""
    steps = [
        add(Sphere(10.0)),
        add(Cylinder(4.0, 20.0), move((1.0, 1.0, -10.0))),
        add(Block((9.0, 3.0, 12.0)), transform.turn(20.0, (1.0, 0.0, 0.0))),
    ]
    found = [volume(made(*order, rung=0.05)) for order in itertools.permutations(steps)]
    assert max(found) - min(found) < 1e-9 * max(found)


@pytest.mark.parametrize("turned", [0.0, 90.0, 30.0, 17.0])
def test_trimesh_finds_the_results_sound(turned: float) -> None:
    """trimesh: watertight, wound consistently, the genus of a plate with 9 holes (Euler number 2 - 18)."""
    holes = [move((10.0 * i, 10.0 * j, -1.0)) for i in (-1, 0, 1) for j in (-1, 0, 1)]
    around = transform.turn(turned, (0.0, 0.0, 1.0))
    mesh = made(add(Block((40.0, 40.0, 5.0)), around), cut(Cylinder(6.0, 9.0), *holes))
    other = trimesh.Trimesh(mesh.vertices, mesh.faces, process=False)
    assert other.is_watertight
    assert other.is_winding_consistent
    assert other.euler_number == 2 - 18
    assert other.volume == pytest.approx(volume(mesh), rel=1e-12)

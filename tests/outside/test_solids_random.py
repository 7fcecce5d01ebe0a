"""Random solids: closed forms at three rungs, and the laws of sets, which hold whatever the triangles are.

Closed forms are those of elementary solid geometry: cylinder, cone and its frustum, ball, ellipsoid, torus (Pappus),
spherical cap pi h² (3r - h)/3, a ball less a coaxial hole (napkin ring) pi h³/6, and the common part of two equal
cylinders at right angles 16/3 r³ (Archimedes). The chord error falls with the square of the chord, so volumes converge
at second order in the chord, which is first order in the chord error. The identities of set algebra say nothing about a
true shape: they are consistency, counted apart.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from platewright.backend.contract import Mesh
from platewright.compiler import measure
from platewright.compiler.solids import transform
from platewright.compiler.solids.build import build
from platewright.compiler.solids.recipe import (
    Affine,
    Block,
    Cone,
    Cylinder,
    Ellipsoid,
    Primitive,
    Prism,
    Recipe,
    Sphere,
    Step,
    Torus,
)
from support.recipes import add, check_mesh, cut, keep

PI = math.pi
RUNGS = (0.02, 0.005, 0.001)
ALONG_X = transform.turn(90.0, (0.0, 1.0, 0.0))


def placement(random: np.random.Generator, reach: float = 5.0) -> Affine:
    """Anywhere within a reach, turned anyhow."""
    x, y, z = random.uniform(-reach, reach, 3).tolist()
    i, j, k = random.normal(size=3).tolist()
    turned = transform.turn(float(random.uniform(0.0, 360.0)), (i, j, k))
    return transform.compose(transform.translate((x, y, z)), turned)


def case(random: np.random.Generator) -> tuple[tuple[Step, ...], float]:
    """Steps of a random solid, and its exact volume in mm3."""
    r, h = random.uniform(2.0, 6.0), random.uniform(2.0, 12.0)
    place = placement(random)
    match int(random.integers(9)):
        case 0:
            return (add(Cylinder(2 * r, h), place),), PI * r * r * h
        case 1:
            return (add(Cone(2 * r, 0.0, h), place),), PI * r * r * h / 3
        case 2:
            top = r * random.uniform(0.1, 0.9)
            return (add(Cone(2 * r, 2 * top, h), place),), PI * h * (r * r + r * top + top * top) / 3
        case 3:
            return (add(Sphere(2 * r), place),), 4 / 3 * PI * r**3
        case 4:
            a, b = random.uniform(1.0, 5.0, 2)
            return (add(Ellipsoid((2 * a, 2 * b, 2 * r)), place),), 4 / 3 * PI * a * b * r
        case 5:
            tube = r * random.uniform(0.2, 0.8)
            return (add(Torus(2 * r, 2 * tube), place),), 2 * PI**2 * r * tube * tube
        case 6:
            # What a block leaves of a ball above a plane.
            low = r * random.uniform(-0.5, 0.5)
            rest = transform.compose(place, transform.translate((0.0, 0.0, low)))
            return (add(Sphere(2 * r), place), keep(Block((4 * r, 4 * r, 4 * r)), rest)), PI * (r - low) ** 2 * (
                2 * r + low
            ) / 3
        case 7:
            long = 2 * r * random.uniform(0.3, 0.9)
            hole = Cylinder(2 * math.sqrt(r * r - long * long / 4), 3 * r)
            return (add(Sphere(2 * r), place), cut(hole, place, centred=True)), PI * long**3 / 6
        case _:
            rod, across = Cylinder(2 * r, 5 * r), transform.compose(place, ALONG_X)
            return (add(rod, place, centred=True), keep(rod, across, centred=True)), 16 / 3 * r**3


@pytest.mark.parametrize(("n", "seed"), [(40, 1), pytest.param(500, 2, marks=pytest.mark.slow)])
def test_random_solids_converge_to_their_closed_forms(n: int, seed: int) -> None:
    random = np.random.default_rng(seed)
    slopes = []
    for _ in range(n):
        steps, exact = case(random)
        errors = []
        for rung in RUNGS:
            mesh, flaws = build(Recipe(steps), rung)
            assert mesh is not None and flaws == ()
            errors.append(abs(measure.volume(mesh.vertices, mesh.faces) - exact))
            assert errors[-1] <= 4 / 3 * rung * measure.area(mesh.vertices, mesh.faces)
        check_mesh(mesh, RUNGS[-1])
        slopes.append(float(np.polyfit(np.log(RUNGS), np.log(errors), 1)[0]))
    # Divisions n are rounded up to multiples of four, which makes the coarsest, n about 50, finer by 2/n in the mean:
    # that takes 2 ln(1 + 2/50) / ln 20 = 0.026 off the slope, and lets single solids scatter round it.
    assert np.mean(slopes) == pytest.approx(1.0 - 0.026, abs=0.02)
    assert min(slopes) > 0.8 and max(slopes) < 1.2


def solid(random: np.random.Generator) -> Primitive:
    a, b = random.uniform(2.0, 6.0, 2).tolist()
    sides = int(random.integers(3, 9))
    shapes = (Block((a, b, a)), Cylinder(a, b), Sphere(a), Cone(a, a / 2, b), Prism(sides, a, b), Torus(a, a / 3))
    return shapes[int(random.integers(len(shapes)))]


def volume(mesh: Mesh | None) -> float:
    return 0.0 if mesh is None else measure.volume(mesh.vertices, mesh.faces)


def made(*steps: Step) -> Mesh | None:
    """The solid, None where nothing is left; anything else that is wrong fails the test."""
    mesh, flaws = build(Recipe(steps), 0.05)
    assert {flaw.code for flaw in flaws} <= {"empty-part", "several-pieces"}, flaws
    assert mesh is None or mesh.closed
    return mesh


@pytest.mark.parametrize(("n", "seed"), [(60, 3), pytest.param(1000, 4, marks=pytest.mark.slow)])
def test_consistency_the_laws_of_sets_hold_for_random_pairs(n: int, seed: int) -> None:
    """|A + B| + |A B| = |A| + |B|; A - B and A B make up A; A + B = B + A; A - B - B = A - B; A A = A."""
    random = np.random.default_rng(seed)
    n_met = 0
    for _ in range(n):
        a, b = solid(random), solid(random)
        at, there = placement(random, 1.5), placement(random, 1.5)
        of_a, of_b = volume(made(add(a, at))), volume(made(add(b, there)))
        union, common = volume(made(add(a, at), add(b, there))), volume(made(add(a, at), keep(b, there)))
        less = volume(made(add(a, at), cut(b, there)))
        n_met += common > 0.0
        size = of_a + of_b
        assert abs(union + common - size) <= 1e-9 * size
        assert abs(less + common - of_a) <= 1e-9 * size
        assert abs(volume(made(add(b, there), add(a, at))) - union) <= 1e-9 * size
        assert abs(volume(made(add(a, at), cut(b, there), cut(b, there))) - less) <= 1e-9 * size
        assert abs(volume(made(add(a, at), keep(a, at))) - of_a) <= 1e-9 * size
    assert n_met > n / 2

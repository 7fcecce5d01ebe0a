"""Paths and what runs along them against closed forms, scipy's splines and quadrature, and an integrated frame.

Sources: scipy.interpolate.CubicSpline and scipy.integrate.quad for spline lengths; the length of a helix
2 pi n sqrt(r^2 + (p / 2 pi)^2); the theorem of Pappus in its form for tubes (volume = area of the section times the
length of its centre's path, A. W. Goodman and G. Goodman, Generalizations of the theorems of Pappus, American
Mathematical Monthly 76 (1969)); the frame of parallel transport r' = -(r . t') t (R. L. Bishop, There is more than one
way to frame a curve, American Mathematical Monthly 82 (1975)), integrated by scipy.integrate.solve_ivp; the volume
between convex sections L/3 (A + M + B) with the mixed area M of Minkowski.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.typing import NDArray
from platewright.compiler.solids import spine
from platewright.compiler.solids.recipe import (
    Bellows,
    Helix,
    Outline,
    Primitive,
    SpacePath,
    SpaceSplineTo,
    Spring,
    Sweep,
    Transition,
    Tube,
)
from platewright.compiler.solids.spine import Coil, Spline, derivative, length_of, position, reach_of, tangent
from platewright.compiler.solids.stations import frames
from platewright.compiler.solids.tessellate import tessellate
from scipy.integrate import quad, solve_ivp
from scipy.interpolate import CubicSpline
from support.bodies import HOSE, LOOP, MIXED, SQUARE, STRIP, bent, circle, path_length, ring_path, traced, volume

F64 = NDArray[np.float64]


def random_points(seed: int, n: int = 9) -> F64:
    return np.random.default_rng(seed).normal(size=(n, 3)) * 10.0


@pytest.mark.parametrize("seed", range(40))
def test_the_length_of_a_spline_agrees_with_scipy(seed: int) -> None:
    points = random_points(seed)
    path = SpacePath(tuple(points[0]), (SpaceSplineTo(tuple(map(tuple, points[1:]))),))
    (curve,) = traced(path).stretches
    assert isinstance(curve, Spline)
    reference = CubicSpline(curve.knots, points, bc_type="natural")
    at = np.linspace(0.0, reach_of(curve), 300)
    assert np.abs(position(curve, at) - reference(at)).max() < 1e-11
    assert np.abs(derivative(curve, at, 2) - reference(at, 2)).max() < 1e-10
    length = sum(
        quad(lambda t: float(np.linalg.norm(reference(t, 1))), a, b, epsabs=1e-12, epsrel=1e-12, limit=200)[0]
        for a, b in zip(curve.knots[:-1], curve.knots[1:], strict=True)
    )
    assert length_of(curve) == pytest.approx(length, rel=1e-10)


@pytest.mark.parametrize("seed", range(10))
def test_clamped_and_periodic_splines_agree_with_scipy(seed: int) -> None:
    points = random_points(seed)
    first, last = (v / np.linalg.norm(v) for v in random_points(seed + 100, 2))
    clamped = spine.spline(points, first, last)
    reference = CubicSpline(clamped.knots, points, bc_type=((1, first), (1, last)))
    at = np.linspace(0.0, reach_of(clamped), 300)
    assert np.abs(position(clamped, at) - reference(at)).max() < 1e-11
    ring = np.concatenate((points, points[:1]))
    periodic = spine.spline(ring, periodic=True)
    reference = CubicSpline(periodic.knots, ring, bc_type="periodic")
    at = np.linspace(0.0, reach_of(periodic), 300)
    assert np.abs(position(periodic, at) - reference(at)).max() < 1e-11


@pytest.mark.parametrize(("diameter", "pitch", "turns"), [(20.0, 3.0, 12.0), (5.0, 40.0, 0.3), (100.0, 0.1, 2.75)])
def test_the_length_of_a_helix(diameter: float, pitch: float, turns: float) -> None:
    (coil,) = traced(SpacePath((diameter / 2, 0.0, 0.0), (Helix(diameter, pitch, turns),))).stretches
    assert isinstance(coil, Coil)
    closed_form = math.tau * turns * math.hypot(diameter / 2, pitch / math.tau)
    assert length_of(coil) == pytest.approx(closed_form, rel=1e-14)

    def speed(t: float) -> float:
        return float(np.linalg.norm(derivative(coil, np.array([t]), 1)))

    assert length_of(coil) == pytest.approx(quad(speed, 0.0, math.tau * turns)[0], rel=1e-9)
    end = position(coil, np.array([reach_of(coil)]))[0]
    assert end[2] == pytest.approx(pitch * turns, rel=1e-12)


ROUND = [
    Tube(HOSE, 12.0, 8.0),
    Tube(HOSE, 12.0),
    Tube(LOOP, 8.0, 4.0),
    Tube(MIXED, 6.0),
    Tube(ring_path(), 8.0, 4.0),
    Tube(SpacePath((10.0, 0.0, 0.0), (Helix(20.0, 6.0, 5.0, True),)), 3.0),
]


@pytest.mark.parametrize("shape", ROUND)
def test_a_tube_has_the_volume_of_pappus(shape: Tube) -> None:
    exact = math.pi / 4.0 * (shape.diameter**2 - shape.bore**2) * path_length(shape.path)
    wall = (shape.diameter - shape.bore) / 2
    for rung in (0.05, 0.01, 0.002):
        # A chord error of a rung takes at most a rung, and a bend another one, off a wall.
        assert volume(tessellate(shape, rung)) == pytest.approx(exact, rel=2.0 * rung / wall)


@pytest.mark.parametrize("path", [HOSE, LOOP, MIXED, ring_path()])
def test_a_centred_section_has_the_volume_of_pappus(path: SpacePath) -> None:
    exact = 24.0 * path_length(path)
    errors = [abs(volume(tessellate(Sweep(STRIP, path), rung)) / exact - 1.0) for rung in (0.05, 0.0125)]
    assert errors[0] < 2e-3
    assert errors[1] < 5e-4


def test_a_twisted_bar_keeps_its_volume() -> None:
    bar = bent((0.0, 0.0, 0.0), (0.0, 0.0, 60.0))
    bodies = (tessellate(Sweep(STRIP, bar, 180.0), rung) for rung in (0.1, 0.025, 0.00625))
    errors = [1.0 - volume(body) / (24.0 * 60.0) for body in bodies]
    assert 0.0 < errors[2] < errors[1] / 3.0 < errors[0] / 9.0 < 0.01


@pytest.mark.parametrize("left", [False, True])
def test_a_spring_has_the_volume_of_its_wire(left: bool) -> None:
    spring = Spring(20.0, 2.0, 12.0, 60.0, left)
    wire = math.tau * 12.0 * math.hypot(10.0, 58.0 / 12.0 / math.tau)
    errors = [1.0 - volume(tessellate(spring, rung)) / (math.pi * wire) for rung in (0.02, 0.005, 0.00125)]
    assert 0.0 < errors[2] < errors[1] / 3.0 < errors[0] / 9.0
    assert errors[2] < 2e-3


@pytest.mark.parametrize("shape", [Bellows(60.0, 40.0, 6, 80.0, 1.0), Bellows(46.0, 40.0, 3, 80.0, 1.0)])
def test_a_bellows_has_the_volume_of_pappus(shape: Bellows) -> None:
    """Its wall of thickness T follows a middle line: T times the integral of 2 pi r ds, the wall's even on both sides
    but in its arcs, where the centroid of a ring's sector lies T²/12R off the middle."""
    fold, root, crest = shape.length / shape.convolutions, shape.bore / 2 + 0.5, shape.diameter / 2 - 0.5
    depth = crest - root
    theta = math.pi / 2 if 2.0 * depth >= fold else 2.0 * math.atan(2.0 * depth / fold)
    radius = fold / 4.0 / math.sin(theta)
    straight = max(0.0, depth - 2.0 * radius * (1.0 - math.cos(theta)))
    middle = (root + crest) / 2
    # The four quarter arcs of a fold lie evenly about the middle radius, and so do their offsets.
    area = shape.thickness * (4.0 * radius * theta + 2.0 * straight)
    exact = math.tau * middle * area * shape.convolutions
    assert volume(tessellate(shape, 0.001)) == pytest.approx(exact, rel=2e-3)


def parallel_transport(curve: Spline | Coil, start: F64, n: int) -> tuple[F64, F64, F64]:
    """Points, tangents and the transported axis at n even parameters, integrated to about 1e-11."""
    at = np.linspace(0.0, reach_of(curve), n)

    def turn(t: float, r: F64) -> F64:
        first, second = derivative(curve, np.array([t]), 1)[0], derivative(curve, np.array([t]), 2)[0]
        speed = np.linalg.norm(first)
        along = first / speed
        change = (second - (second @ along) * along) / speed
        result: F64 = -(r @ change) * along
        return result

    solved = solve_ivp(turn, (0.0, at[-1]), start, t_eval=at, rtol=1e-11, atol=1e-12, method="DOP853")
    return position(curve, at), tangent(curve, at), solved.y.T


KNEE = SpaceSplineTo(((20.0, 0.0, 5.0), (30.0, 20.0, 9.0), (10.0, 30.0, 25.0), (0.0, 12.0, 40.0)))
CURVES = [
    traced(SpacePath((0.0, 0.0, 0.0), (KNEE,))).stretches[0],
    traced(ring_path()).stretches[0],
    traced(SpacePath((10.0, 0.0, 0.0), (Helix(20.0, 15.0, 3.0),))).stretches[0],
]


@pytest.mark.parametrize("curve", CURVES)
def test_frames_follow_parallel_transport_at_fourth_order(curve: Spline | Coil) -> None:
    errors = []
    for n in (101, 201):
        at = np.linspace(0.0, reach_of(curve), n)
        own = frames(position(curve, at), tangent(curve, at))
        _, _, reference = parallel_transport(curve, own[0, :, 0], n)
        errors.append(np.abs(own[:, :, 0] - reference).max())
    assert errors[1] < 1e-3
    # Wang et al. prove fourth order; between two resolutions a factor of 16, here with some room.
    assert errors[1] < errors[0] / 10.0


@pytest.mark.parametrize("curve", CURVES)
def test_a_carried_axis_changes_along_the_tangent_alone(curve: Spline | Coil) -> None:
    at = np.linspace(0.0, reach_of(curve), 4001)
    own = frames(position(curve, at), tangent(curve, at))
    step = np.linalg.norm(np.diff(position(curve, at)[::2], axis=0), axis=1)
    change = (own[2::2, :, 0] - own[:-2:2, :, 0]) / step[:, None]
    sideways = np.einsum("ni,ni->n", change, own[1:-1:2, :, 1])
    along = np.einsum("ni,ni->n", change, own[1:-1:2, :, 2])
    assert np.abs(sideways).max() < 1e-3 * np.abs(along).max()
    assert np.abs(np.einsum("nij,nik->njk", own, own) - np.eye(3)).max() < 1e-12


def test_plane_curves_do_not_twist() -> None:
    points = np.column_stack((random_points(5, 8)[:, :2], np.zeros(8)))
    curve = spine.spline(points)
    at = np.linspace(0.0, reach_of(curve), 500)
    own = frames(position(curve, at), tangent(curve, at))
    # One axis keeps its angle with the plane's normal, whatever the curve does.
    assert np.abs(own[:, 2, :2] - own[0, 2, :2]).max() < 1e-12


def mixed_area_with_disc(perimeter: float, radius: float) -> float:
    return perimeter * radius / 2.0


@pytest.mark.parametrize("radius", [10.0, 30.0, 45.0])
def test_a_transition_from_square_to_circle(radius: float) -> None:
    exact = 80.0 / 3.0 * (3600.0 + mixed_area_with_disc(240.0, radius) + math.pi * radius**2)
    bodies = (tessellate(Transition(SQUARE, circle(radius), 80.0), rung) for rung in (0.08, 0.02, 0.005))
    errors = [1.0 - volume(body) / exact for body in bodies]
    assert 0.0 < errors[2] < errors[1] / 3.0 < errors[0] / 9.0
    assert errors[2] < 1e-4


EQUAL: list[tuple[Outline, Outline, float]] = [
    (SQUARE, SQUARE, 3600.0 * 80.0),
    (circle(20.0), circle(20.0), math.pi * 400.0 * 80.0),
    (circle(20.0), circle(30.0), 80.0 * math.pi / 3.0 * (400.0 + 600.0 + 900.0)),
    (circle(20.0), circle(30.0, 10.0, 5.0), 80.0 * math.pi / 3.0 * (400.0 + 600.0 + 900.0)),
]


@pytest.mark.parametrize(("lower", "upper", "exact"), EQUAL)
def test_transitions_that_are_prisms_and_cones(lower: Outline, upper: Outline, exact: float) -> None:
    shape: Primitive = Transition(lower, upper, 80.0)
    assert volume(tessellate(shape, 0.002)) == pytest.approx(exact, rel=3e-4)

"""Volumes, areas and inertia of every primitive against closed forms, trimesh and Pappus, along the ladder.

Closed forms: standard solid geometry, as collected in any table of moments of inertia; each stands beside its shape.
The sagitta law s = r (1 - cos(pi/n)) and the area ratio n/(2 pi) sin(2 pi/n) of the inscribed polygon are elementary.
trimesh 5 is an independent implementation of the mass properties of a mesh.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
import trimesh
from platewright.backend.contract import Mesh
from platewright.compiler import measure
from platewright.compiler.solids import outline as outlines
from platewright.compiler.solids import transform
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
    Revolve,
    Sphere,
    Torus,
    Wedge,
)
from support.recipes import add, made

PI = math.pi
RUNGS = (0.1, 0.05, 0.02, 0.01, 0.005, 0.002)
FINE = (0.02, 0.01, 0.005, 0.002, 0.001)


def moments(x: float, y: float, z: float) -> np.ndarray:
    return np.diag((x, y, z))


def cylinder_inertia(r: float, h: float) -> np.ndarray:
    m = PI * r * r * h
    return moments(m * (3 * r * r + h * h) / 12, m * (3 * r * r + h * h) / 12, m * r * r / 2)


def cone_inertia(r: float, h: float) -> np.ndarray:
    m = PI * r * r * h / 3
    return moments(3 / 80 * m * (4 * r * r + h * h), 3 / 80 * m * (4 * r * r + h * h), 3 / 10 * m * r * r)


def torus_inertia(big: float, r: float) -> np.ndarray:
    m = 2 * PI**2 * big * r * r
    return moments(m * (big**2 / 2 + 5 / 8 * r**2), m * (big**2 / 2 + 5 / 8 * r**2), m * (big**2 + 3 / 4 * r**2))


# Shape, volume, area, centroid's height, inertia about the centroid at unit density (None where no form is quoted).
CURVED: list[tuple[Primitive, float, float | None, float, np.ndarray | None]] = [
    (Cylinder(10.0, 4.0), PI * 25 * 4, 2 * PI * 5 * 9, 2.0, cylinder_inertia(5.0, 4.0)),
    (Cone(10.0, 0.0, 8.0), PI * 25 * 8 / 3, PI * 5 * (5 + math.hypot(5, 8)), 2.0, cone_inertia(5.0, 8.0)),
    (
        Cone(10.0, 6.0, 4.0),
        PI * 4 * (25 + 15 + 9) / 3,
        PI * (25 + 9 + 8 * math.hypot(2, 4)),
        4 / 4 * (25 + 2 * 15 + 3 * 9) / (25 + 15 + 9),
        None,
    ),
    (Sphere(10.0), 4 / 3 * PI * 125, 4 * PI * 25, 0.0, 2 / 5 * 4 / 3 * PI * 125 * 25 * np.eye(3)),
    (
        Ellipsoid((4.0, 6.0, 8.0)),
        4 / 3 * PI * 2 * 3 * 4,
        None,
        0.0,
        4 / 3 * PI * 24 / 5 * moments(9 + 16, 4 + 16, 4 + 9),
    ),
    (Torus(10.0, 4.0), 2 * PI**2 * 5 * 4, 4 * PI**2 * 5 * 2, 0.0, torus_inertia(5.0, 2.0)),
]
FLAT: list[tuple[Primitive, float, float]] = [
    (Block((1.0, 2.0, 3.0)), 6.0, 22.0),
    (Wedge((4.0, 2.0, 3.0), 0.0), 12.0, 2 * 4 + 2 * 3 + 2 * 5 + 2 * 6),
    (Wedge((4.0, 2.0, 4.0), 1.0), 2 * 4 * (4 + 1) / 2, 2 * 4 + 2 * 1 + 2 * 4 + 2 * 5 + 2 * 10),
    (Prism(6, 10.0, 3.0), 3 * 100 * math.sqrt(3) / 2, 2 * 100 * math.sqrt(3) / 2 + 6 * 3 * 10 / math.sqrt(3)),
    (Prism(4, 10.0, 3.0), 300.0, 320.0),
    (Pyramid(4, 6.0, 0.0, 4.0), 36 * 4 / 3, 36 + 4 * 6 * 5 / 2),
    (Pyramid(4, 6.0, 2.0, 3.0), 3 / 3 * (36 + 12 + 4), 36 + 4 + 4 * (6 + 2) / 2 * math.hypot(2, 3)),
]


def mass(mesh: Mesh) -> trimesh.Trimesh:
    return trimesh.Trimesh(mesh.vertices, mesh.faces, process=False)


def order_of(errors: list[float], rungs: tuple[float, ...]) -> float:
    """Slope of log error over log rung: 1, since the chord error falls with the square of the chord."""
    return float(np.polyfit(np.log(rungs), np.log(errors), 1)[0])


@pytest.mark.parametrize(("shape", "volume", "area", "height", "inertia"), CURVED, ids=lambda v: type(v).__name__)
def test_curved_solids_converge_to_their_closed_forms(
    shape: Primitive, volume: float, area: float | None, height: float, inertia: np.ndarray | None
) -> None:
    """Second order in the chord, that is first order in the chord error: halving the rung halves what is missing."""
    both_ways = isinstance(shape, Sphere | Ellipsoid | Torus)
    missing, short, turned, shift = [], [], [], []
    for rung in RUNGS:
        mesh = made(add(shape), rung=rung)
        vertices, faces = mesh.vertices, mesh.faces
        missing.append(1.0 - measure.volume(vertices, faces) / volume)
        short.append(1.0 if area is None else 1.0 - measure.area(vertices, faces) / area)
        shift.append(abs(measure.centroid(vertices, faces)[2] - height))
        # A parabola's mean is two thirds of its height: that much, over all of the surface, is missing at most.
        assert 0.0 < missing[-1] * volume <= (4 / 3 if both_ways else 2 / 3) * rung * measure.area(vertices, faces)
        if inertia is not None:
            turned.append(np.abs(measure.inertia(vertices, faces) - inertia).max() / inertia.max())
    for errors in (missing, *([] if area is None else [short]), *([turned] if turned else [])):
        assert all(e > 0.0 for e in errors)
        assert order_of(errors, RUNGS) == pytest.approx(1.0, abs=0.12)
    assert all(moved <= rung for moved, rung in zip(shift, RUNGS, strict=True))


@pytest.mark.parametrize(("shape", "volume", "area"), FLAT, ids=lambda v: type(v).__name__)
def test_flat_solids_are_exact(shape: Primitive, volume: float, area: float) -> None:
    mesh = made(add(shape, transform.turn(40.0, (1.0, 2.0, 2.0))))
    assert measure.volume(mesh.vertices, mesh.faces) == pytest.approx(volume, rel=1e-13)
    assert measure.area(mesh.vertices, mesh.faces) == pytest.approx(area, rel=1e-13)


@pytest.mark.parametrize("shape", [row[0] for row in CURVED] + [row[0] for row in FLAT], ids=lambda v: type(v).__name__)
def test_measures_agree_with_trimesh(shape: Primitive) -> None:
    """trimesh: volume, area, centroid, inertia about the centroid, watertightness, winding, Euler number."""
    place = transform.compose(transform.translate((30.0, -7.0, 4.0)), transform.turn(50.0, (3.0, 1.0, 2.0)))
    mesh = made(add(shape, place), rung=0.05)
    other = mass(mesh)
    assert other.is_watertight
    assert other.is_winding_consistent
    assert other.euler_number == (0 if isinstance(shape, Torus) else 2)
    assert measure.volume(mesh.vertices, mesh.faces) == pytest.approx(other.volume, rel=1e-10)
    assert measure.area(mesh.vertices, mesh.faces) == pytest.approx(other.area, rel=1e-10)
    assert np.abs(np.array(measure.centroid(mesh.vertices, mesh.faces)) - other.center_mass).max() < 1e-9
    inertia = measure.inertia(mesh.vertices, mesh.faces)
    assert np.abs(inertia - other.moment_inertia).max() < 1e-8 * inertia.max()


@pytest.mark.parametrize(("ratio", "n"), [(1e-2, 23), (1e-3, 71), (1e-4, 223)])
def test_sagitta_law(ratio: float, n: int) -> None:
    """n = ceil(pi / acos(1 - s/r)), tabled values; ours is rounded up to a multiple of 4."""
    assert math.ceil(math.pi / math.acos(1.0 - ratio)) == n
    assert divisions(1.0, ratio) == 4 * math.ceil(n / 4)


@pytest.mark.parametrize(
    ("n", "sagitta", "area", "perimeter"),
    [
        (8, 0.0761204675, 0.9003163162, 0.9744953584),
        (16, 0.0192147196, 0.9744953584, 0.9935868511),
        (32, 0.0048152733, 0.9935868511, 0.9983943930),
        (64, 0.0012045438, 0.9983943930, 0.9995984531),
        (128, 0.0003011813, 0.9995984531, 0.9998996042),
        (256, 0.0000752982, 0.9998996042, 0.9999749005),
    ],
)
def test_inscribed_polygons(n: int, sagitta: float, area: float, perimeter: float) -> None:
    """Tabled values of the sagitta and of the ratios n/(2 pi) sin(2 pi/n) and n/pi sin(pi/n)."""
    assert divisions(1.0, sagitta * (1 + 1e-5)) == n
    mesh = made(add(Cylinder(2.0, 1.0)), rung=sagitta * (1 + 1e-5))
    assert measure.volume(mesh.vertices, mesh.faces) / PI == pytest.approx(area, abs=1e-9)
    wall = measure.area(mesh.vertices, mesh.faces) - 2 * PI * area
    assert wall / (2 * PI) == pytest.approx(perimeter, abs=1e-8)


def test_pappus() -> None:
    """Pappus' second theorem: a revolved volume is the outline's area times the way of its centroid."""
    half = Loop((10.0, -3.0), (ArcTo((10.0, 3.0), (10.0, 0.0), True),))
    area, reach = PI * 9 / 2, 10.0 + 4 * 3 / (3 * PI)
    triangle = Loop((4.0, 0.0), (LineTo((9.0, 1.0)), LineTo((5.0, 6.0))))
    three = abs((9 - 4) * 6 - (5 - 4) * 1) / 2
    cases = ((half, area, reach), (triangle, three, 18 / 3))
    for loop, surface, way in cases:
        errors = []
        # Where the divisions are many, so that rounding them up to multiples of 4 weighs little.
        for rung in FINE:
            mesh = made(add(Revolve(Outline(loop))), rung=rung)
            exact = surface * 2 * PI * way
            errors.append(1.0 - measure.volume(mesh.vertices, mesh.faces) / exact)
            assert 0.0 < errors[-1] * exact <= 4 / 3 * rung * measure.area(mesh.vertices, mesh.faces)
        assert order_of(errors, FINE) == pytest.approx(1.0, abs=0.12)


def test_exact_area_of_outlines_with_arcs() -> None:
    """The area that Pappus' theorem needs, r²(t - sin t)/2 for a circular segment, against a square with round ends."""
    slot = Loop(
        (0.0, -2.0),
        (
            LineTo((6.0, -2.0)),
            ArcTo((6.0, 2.0), (6.0, 0.0), True),
            LineTo((0.0, 2.0)),
            ArcTo((0.0, -2.0), (0.0, 0.0), True),
        ),
    )
    curves = outlines.oriented(slot, True)
    assert outlines.area(curves) == pytest.approx(24 + 4 * PI, rel=1e-14)
    mesh = made(add(Extrude(Outline(slot), 3.0)), rung=0.001)
    n = divisions(2.0, 0.001)
    chords = 24 + 2.0**2 * n / 2 * math.sin(2 * PI / n)
    assert measure.volume(mesh.vertices, mesh.faces) == pytest.approx(3 * chords, rel=1e-12)
    assert len(mesh.patches.kind) == 6

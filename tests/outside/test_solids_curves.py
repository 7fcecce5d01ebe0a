"""Curves of outlines and what is raised or turned from them, against scipy and the textbook theorems.

Sources: interpolating cubic splines, scipy.interpolate.CubicSpline; lengths, scipy.integrate.quad; perimeter of an
ellipse 4 a E(1 - b²/a²), scipy.special.ellipe (DLMF 19.9.9); Steiner's formula for parallel curves of convex ones,
A + P d + pi d² outside (Santaló, Integral Geometry, I.1); Pappus' second theorem; the prismatoid formula
h (A0 + 4 Am + A1) / 6; Cavalieri's principle.
"""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from platewright.backend.contract import EdgeKind, Mesh, PatchKind
from platewright.compiler import measure
from platewright.compiler.solids.cubic import bezier_pieces
from platewright.compiler.solids.curve import divided, full_turn
from platewright.compiler.solids.outline import area, closed, oriented
from platewright.compiler.solids.plane import cornered, inset, parallel, turn_at
from platewright.compiler.solids.recipe import (
    ArcTo,
    Block,
    Cone,
    Cylinder,
    Edged,
    Extrude,
    LineTo,
    Loop,
    Outline,
    Prism,
    Revolve,
    SplineTo,
)
from scipy.integrate import quad
from scipy.interpolate import CubicSpline
from scipy.special import ellipe
from support.outlines import HALF_DISC, circle, closed_spline, ellipse, plain, polygon, rectangle, rounded
from support.recipes import add, check_mesh, cut, made, surface_distance

PI = math.pi


def volume(mesh: Mesh) -> float:
    return measure.volume(mesh.vertices, mesh.faces)


def outline_area(outline: Outline) -> float:
    outer, *holes = (abs(area(oriented(loop, True))) for loop in (outline.outer, *outline.holes))
    return outer - sum(holes)


def knots(points: np.ndarray) -> np.ndarray:
    return np.concatenate(([0.0], np.cumsum(np.linalg.norm(np.diff(points, axis=0), axis=1))))


def at(pieces: np.ndarray, share: float) -> np.ndarray:
    a, b, c, d = (pieces[:, k] for k in range(4))
    s = 1.0 - share
    return s**3 * a + 3 * s * s * share * b + 3 * s * share * share * c + share**3 * d


@pytest.mark.parametrize("ends", ["natural", "start", "both", "closed"])
@pytest.mark.parametrize("dimension", [2, 3])
@pytest.mark.parametrize("seed", range(5))
def test_splines_are_those_of_scipy(ends: str, dimension: int, seed: int) -> None:
    rng = np.random.default_rng(seed)
    points = rng.normal(size=(9, dimension)) * 10.0
    if ends == "closed":
        points[-1] = points[0]
    first, last = rng.normal(size=(2, dimension))
    none = (2, np.zeros(dimension))
    kinds = {
        "natural": (none, none),
        "start": ((1, first / np.linalg.norm(first)), none),
        "both": ((1, first / np.linalg.norm(first)), (1, last / np.linalg.norm(last))),
        "closed": "periodic",
    }
    other = CubicSpline(knots(points), points, bc_type=kinds[ends])
    pieces = bezier_pieces(
        points.tolist(),
        first.tolist() if ends in ("start", "both") else None,
        last.tolist() if ends == "both" else None,
    )
    for share in (0.0, 0.25, 0.6, 1.0):
        where = knots(points)[:-1] + share * np.diff(knots(points))
        assert np.abs(at(pieces, share) - other(where)).max() < 1e-11


@pytest.mark.parametrize("seed", range(6))
def test_lengths_of_splines_converge_to_quadrature(seed: int) -> None:
    points = np.random.default_rng(seed).normal(size=(7, 2)) * 20.0
    u = knots(points)
    slope = CubicSpline(u, points, bc_type="natural").derivative()
    exact = sum(quad(lambda t: float(np.hypot(*slope(t))), a, b, epsabs=1e-10)[0] for a, b in pairwise(u))
    way = Loop(tuple(points[0].tolist()), (SplineTo(tuple(map(tuple, points[1:].tolist()))),))
    curve = closed(way)[0]
    errors = []
    for rung in (0.04, 0.01, 0.0025):
        chain = np.concatenate((divided(curve, rung)[0], [curve.end]))
        errors.append(1.0 - np.hypot(*np.diff(chain, axis=0).T).sum() / exact)
    assert all(e > 0.0 for e in errors)
    assert np.polyfit(np.log((0.04, 0.01, 0.0025)), np.log(errors), 1)[0] == pytest.approx(1.0, abs=0.12)
    assert errors[-1] < 2e-3


@pytest.mark.parametrize(("a", "b"), [(8.0, 5.0), (20.0, 2.0), (5.0, 30.0)])
def test_perimeter_and_area_of_ellipses(a: float, b: float) -> None:
    big, small = max(a, b), min(a, b)
    exact = 4.0 * big * ellipe(1.0 - (small / big) ** 2)
    curve = closed(ellipse(a, b, 3.0, 1.0, 25.0))[0]
    assert area((curve,)) == pytest.approx(PI * a * b, rel=1e-13)
    errors = []
    for rung in (0.02, 0.005, 0.00125):
        points, _ = full_turn(curve, rung)
        errors.append(1.0 - np.hypot(*(np.roll(points, -1, 0) - points).T).sum() / exact)
    assert errors[0] > errors[1] > errors[2] > 0.0
    assert errors[2] < 1e-4


@pytest.mark.parametrize("seed", range(8))
def test_parallels_of_convex_outlines_obey_steiner(seed: int) -> None:
    rng = np.random.default_rng(seed)
    angles = np.sort(rng.uniform(0.0, 2 * PI, 7) + np.arange(7) * 1e-3)
    loop = polygon(*(tuple(p) for p in (20.0 * np.column_stack((np.cos(angles), np.sin(angles)))).tolist()))
    curves = oriented(loop, True)
    length = sum(math.dist(c.start, c.end) for c in curves)
    d = float(rng.uniform(0.1, 8.0))
    base = area(curves)
    assert outline_area(parallel(plain(loop), -d)) == pytest.approx(base + length * d + PI * d * d, rel=1e-12)
    # Inside, corners stay: the triangles d² tan(t/2) that the strips count twice come back.
    tangents = sum(math.tan(turn_at(curves[k - 1], curves[k]) / 2.0) for k in range(len(curves)))
    d = 0.2 * min(math.dist(c.start, c.end) for c in curves) / max(1.0, tangents)
    assert outline_area(parallel(plain(loop), d)) == pytest.approx(base - length * d + tangents * d * d, rel=1e-12)
    r = d / 2.0
    made_round = rounded(loop, r)
    arcs = sum(math.tan(t / 2.0) - t / 2.0 for t in (turn_at(curves[k - 1], curves[k]) for k in range(len(curves))))
    assert outline_area(plain(made_round)) == pytest.approx(base - r * r * arcs, rel=1e-12)
    round_length = length - 2.0 * r * arcs
    # Of rounded corners too, and back again to corners where the arcs shrink to nothing.
    moved = outline_area(parallel(plain(made_round), -d))
    assert moved == pytest.approx(base - r * r * arcs + round_length * d + PI * d * d, rel=1e-12)
    assert outline_area(parallel(plain(made_round), d)) == pytest.approx(
        base - length * d + tangents * d * d, rel=1e-12
    )


@pytest.mark.parametrize("d", [-3.0, -0.5, 0.5, 2.5])
def test_parallels_of_ellipses_obey_steiner(d: float) -> None:
    length = 4.0 * 8.0 * ellipe(1.0 - 25.0 / 64.0)
    found = outline_area(parallel(plain(ellipse(8.0, 5.0)), d))
    # The parallel is a spline within a millionth of its size.
    assert found == pytest.approx(PI * 40.0 - length * d + PI * d * d, abs=2.0 * length * 16.0 * 1e-6)


@pytest.mark.parametrize("angle", [10.0, 90.0, 137.0, 180.0, 270.0, 359.0, 360.0])
def test_pappus_for_part_of_a_turn(angle: float) -> None:
    half = Loop((10.0, -3.0), (ArcTo((10.0, 3.0), (10.0, 0.0), True),))
    exact = PI * 9 / 2 * (10.0 + 4 * 3 / (3 * PI)) * math.radians(angle)
    errors = []
    for rung in (0.02, 0.005, 0.00125):
        mesh = made(add(Revolve(plain(half), angle)), rung=rung)
        check_mesh(mesh, rung)
        errors.append(1.0 - volume(mesh) / exact)
    assert np.polyfit(np.log((0.02, 0.005, 0.00125)), np.log(errors), 1)[0] == pytest.approx(1.0, abs=0.1)
    kinds = np.bincount(mesh.patches.kind, minlength=6).tolist()
    # The ends of a half turn lie in one plane, but do not touch: two patches.
    assert kinds == [2 if angle < 360.0 else 0, 1, 0, 0, 1, 0]


def test_sectors_whose_outline_reaches_the_axis_are_closed() -> None:
    quarter = Loop((0.0, 0.0), (LineTo((5.0, 0.0)), ArcTo((0.0, 5.0), (0.0, 0.0), True)))
    for angle in (30.0, 180.0, 300.0):
        mesh = made(add(Revolve(plain(quarter), angle)), rung=0.001)
        check_mesh(mesh, 0.001)
        assert volume(mesh) == pytest.approx(2 / 3 * PI * 125 * angle / 360.0, rel=1e-3)


def prismatoid(outline: Loop, length: float, taper: float) -> float:
    curves = oriented(outline, True)
    d = length * math.tan(math.radians(taper))
    low, middle, high = (area(inset(curves, t)) if t else area(curves) for t in (0.0, d / 2.0, d))
    return length / 6.0 * (low + 4.0 * middle + high)


@pytest.mark.parametrize("taper", [-20.0, 5.0, 12.0])
def test_tapered_volumes_by_the_prismatoid_formula(taper: float) -> None:
    loop = polygon((-10.0, -8.0), (12.0, -8.0), (12.0, 0.0), (2.0, 0.0), (2.0, 9.0), (-10.0, 9.0))
    mesh = made(add(Extrude(plain(loop), 8.0, taper)))
    assert volume(mesh) == pytest.approx(prismatoid(loop, 8.0, taper), rel=1e-12)
    assert (mesh.patches.kind == PatchKind.PLANE).all() and len(mesh.patches.kind) == 8
    slot = rounded(rectangle(30.0, 16.0), 5.0)
    errors = [
        1.0 - volume(made(add(Extrude(plain(slot), 8.0, taper)), rung=rung)) / prismatoid(slot, 8.0, taper)
        for rung in (0.01, 0.0025)
    ]
    assert 3.0 < errors[0] / errors[1] < 5.0
    mesh = made(add(Extrude(plain(slot), 8.0, taper)))
    assert np.bincount(mesh.patches.kind, minlength=6).tolist() == [6, 0, 4, 0, 0, 0]
    check_mesh(mesh, 0.02)


def test_a_corner_between_arc_and_line_stays_exact_under_taper() -> None:
    """At every height the section of a tapered half disc is its exact inset, so Simpson's rule is not enough: quad."""
    d = 8.0 * math.tan(math.radians(10.0))
    exact = quad(lambda t: area(inset(oriented(HALF_DISC, True), t * d)), 0.0, 1.0)[0] * 8.0
    errors = [
        1.0 - volume(made(add(Extrude(plain(HALF_DISC), 8.0, 10.0)), rung=rung)) / exact for rung in (0.02, 0.005)
    ]
    assert 0.0 < errors[1] < errors[0] < 5e-3 and errors[0] / errors[1] > 3.0


@pytest.mark.parametrize("twist", [45.0, -200.0, 720.0])
@pytest.mark.parametrize(
    "loop",
    [
        rectangle(20.0, 8.0),
        ellipse(8.0, 5.0),
        polygon((2.0, -3.0), (14.0, -3.0), (9.0, 4.0)),
        rounded(rectangle(9.0, 9.0), 2.0),
    ],
    ids=["rectangle", "ellipse", "triangle", "rounded"],
)
def test_a_twist_keeps_the_volume_of_any_section(loop: Loop, twist: float) -> None:
    exact = 20.0 * area(oriented(loop, True))
    errors = []
    for rung in (0.08, 0.02):
        mesh = made(add(Extrude(plain(loop), 20.0, 0.0, twist)), rung=rung)
        errors.append(abs(1.0 - volume(mesh) / exact))
        # Facets lie to one side or the other of a saddle, by at most their chord error.
        assert errors[-1] * exact <= rung * measure.area(mesh.vertices, mesh.faces)
    check_mesh(mesh, 0.02)
    assert errors[1] < 0.7 * errors[0]


def test_rounded_block_is_a_box_with_cylinders_and_a_sphere() -> None:
    """Steiner's formula in space, V + S r + pi r² (a + b + c) + 4/3 pi r³, for the box that is left inside."""
    a, b, c, r = 26.0, 16.0, 6.0, 2.0
    exact = a * b * c + 2.0 * r * (a * b + b * c + c * a) + PI * r * r * (a + b + c) + 4.0 / 3.0 * PI * r**3
    surface = 2.0 * (a * b + b * c + c * a) + 2.0 * PI * r * (a + b + c) + 4.0 * PI * r * r
    errors = []
    for rung in (0.02, 0.005, 0.00125):
        mesh = made(add(Edged(Block((a + 2 * r, b + 2 * r, c + 2 * r)), "rounded", r)), rung=rung)
        check_mesh(mesh, rung)
        errors.append(1.0 - volume(mesh) / exact)
        assert np.bincount(mesh.patches.kind, minlength=6).tolist() == [6, 12, 0, 8, 0, 0]
        assert not (mesh.edge_kind == EdgeKind.SHARP).any()
    assert np.polyfit(np.log((0.02, 0.005, 0.00125)), np.log(errors), 1)[0] == pytest.approx(1.0, abs=0.1)
    assert measure.area(mesh.vertices, mesh.faces) == pytest.approx(surface, rel=1e-3)


@pytest.mark.parametrize("size", [0.5, 1.5])
def test_chamfered_block_loses_twelve_prisms_and_what_they_share(size: float) -> None:
    """Each bevel takes half c² along its edge; at a corner three of them overlap in a solid found by integrating."""
    a, b, c = 30.0, 20.0, 10.0
    # In the corner cube of side s the solid is x + y, y + z, z + x >= s from the corner; what it lacks, by quadrature.
    lost = quad(lambda z: 1.0 - kept_section(z), 0.0, 1.0, points=[0.5])[0] * size**3
    straight = 4.0 * size * size / 2.0 * (a + b + c - 6.0 * size)
    mesh = made(add(Edged(Block((a, b, c)), "chamfered", size)))
    assert volume(mesh) == pytest.approx(a * b * c - straight - 8.0 * lost, rel=1e-9)
    assert len(mesh.patches.kind) == 18


def kept_section(z: float) -> float:
    """Area of x + y >= 1, x >= 1 - z, y >= 1 - z in the unit square."""
    low = 1.0 - z
    square = (1.0 - low) ** 2
    return square - (max(0.0, 1.0 - 2.0 * low) ** 2) / 2.0


def round_cylinder(radius: float, length: float, r: float) -> float:
    core = PI * (radius - r) ** 2 * length + PI * (radius**2 - (radius - r) ** 2) * (length - 2 * r)
    return core + 2.0 * (PI * PI / 2.0 * r * r * (radius - r) + 2.0 / 3.0 * PI * r**3)


@pytest.mark.parametrize(
    "shape",
    [
        Edged(Cylinder(20.0, 8.0), "rounded", 2.0),
        Edged(Extrude(plain(circle(0.0, 0.0, 10.0)), 8.0), "rounded", 2.0),
        Edged(Revolve(plain(polygon((0.0, 0.0), (10.0, 0.0), (10.0, 8.0), (0.0, 8.0)))), "rounded", 2.0),
    ],
    ids=lambda shape: type(shape.shape).__name__,
)
def test_rounded_rims_are_tori(shape: Edged) -> None:
    errors = []
    for rung in (0.02, 0.005):
        mesh = made(add(shape), rung=rung)
        check_mesh(mesh, rung)
        errors.append(1.0 - volume(mesh) / round_cylinder(10.0, 8.0, 2.0))
        tori = np.flatnonzero(mesh.patches.kind == PatchKind.TORUS)
        assert len(tori) == 2
        for patch in tori:
            assert mesh.patches.size[patch] == pytest.approx((8.0, 2.0), rel=1e-12)
            points = mesh.vertices[np.unique(mesh.faces[mesh.face_patch == patch])]
            assert np.abs(surface_distance(mesh, int(patch), points)).max() < 1e-9 * 2.0
        assert not (mesh.edge_kind == EdgeKind.SHARP).any()
    assert 3.0 < errors[0] / errors[1] < 5.0


def test_vertices_of_all_made_edges_lie_on_their_patches() -> None:
    shapes = [
        Edged(Prism(5, 13.0, 8.0), "rounded", 1.0),
        Edged(Block((9.0, 8.0, 7.0)), "rounded", 1.5),
        Edged(Cone(20.0, 0.0, 10.0), "rounded", 1.0),
        Edged(Extrude(plain(rounded(rectangle(30.0, 20.0), 5.0), circle(3.0, 1.0, 4.0)), 9.0), "rounded", 1.5),
        Edged(Extrude(plain(rounded(rectangle(30.0, 20.0), 5.0), circle(3.0, 1.0, 4.0)), 9.0, 6.0), "rounded", 1.0),
        Edged(Extrude(plain(rounded(rectangle(30.0, 20.0), 5.0), circle(3.0, 1.0, 4.0)), 9.0), "chamfered", 1.5),
    ]
    for shape in shapes:
        mesh = made(add(shape))
        check_mesh(mesh, 0.02)
        assert not (mesh.patches.kind == PatchKind.FREE).any()
        for patch in range(len(mesh.patches.kind)):
            points = mesh.vertices[np.unique(mesh.faces[mesh.face_patch == patch])]
            radius = max(float(mesh.patches.size[patch].max()), 1.0)
            assert np.abs(surface_distance(mesh, patch, points)).max() < 1e-9 * radius * 20.0


@pytest.mark.parametrize("n", [6, 12, 24])
def test_flat_faces_with_many_holes_have_no_edge_inside(n: int) -> None:
    plate = Extrude(plain(rounded(rectangle(120.0, 120.0), 12.0)), 6.0)
    angles = np.arange(n) * 2 * PI / n
    turns = [
        ((1.0, 0.0, 0.0, 45 * math.cos(t)), (0.0, 1.0, 0.0, 45 * math.sin(t)), (0.0, 0.0, 1.0, 0.0)) for t in angles
    ]
    drilled = made(add(plate), cut(Cylinder(7.0, 6.0), *turns))
    holes = tuple(circle(45 * math.cos(t), 45 * math.sin(t), 3.5) for t in angles)
    for mesh in (drilled, made(add(Extrude(Outline(plate.outline.outer, holes), 6.0)))):
        assert np.bincount(mesh.patches.kind, minlength=6).tolist() == [6, 4 + n, 0, 0, 0, 0]
        corners = mesh.vertices[mesh.faces]
        face, side = np.nonzero(mesh.edge_kind != EdgeKind.INSIDE)
        top = np.abs(corners[face, side, 2] - 6.0) + np.abs(corners[face, (side + 1) % 3, 2] - 6.0) < 1e-9
        middle = (corners[face, side] + corners[face, (side + 1) % 3])[top][:, :2] / 2.0
        # Whatever is drawn on the top face lies on a hole's rim or on the plate's.
        centres = 45.0 * np.column_stack((np.cos(angles), np.sin(angles)))
        on_hole = (np.abs(np.linalg.norm(middle[:, None] - centres, axis=2) - 3.5) < 0.05).any(axis=1)
        off = np.maximum(np.abs(middle) - 48.0, 0.0)
        on_rim = (np.abs(np.abs(middle).max(axis=1) - 60.0) < 1e-9) | (np.abs(np.hypot(*off.T) - 12.0) < 0.05)
        assert top.any() and (on_hole | on_rim).all()


def test_normals_of_free_walls_are_those_of_the_curve() -> None:
    loop = closed_spline((12.0, 0.0), (5.0, 10.0), (-9.0, 8.0), (-9.0, -8.0), (5.0, -10.0))
    mesh = made(add(Extrude(plain(ellipse(8.0, 5.0)), 4.0)), cut(Cylinder(3.0, 4.0)))
    wall = mesh.patches.kind == PatchKind.FREE
    some = wall[mesh.face_patch]
    points, normals = mesh.vertices[mesh.faces[some]], mesh.corner_normals[some]
    gradient = points * (1 / 64.0, 1 / 25.0, 0.0)
    gradient /= np.linalg.norm(gradient, axis=2, keepdims=True)
    assert np.abs(gradient - normals).max() < 1e-6
    turned = made(add(Extrude(plain(loop), 4.0)), cut(Block((40.0, 3.0, 2.0))))
    check_mesh(turned, 0.02)
    assert (turned.patches.kind == PatchKind.FREE).sum() >= 1


def test_made_corners_keep_tangent() -> None:
    curves = oriented(rounded(rectangle(30.0, 20.0), 5.0), True)
    assert all(abs(turn_at(curves[k - 1], curves[k])) < 1e-12 for k in range(8))
    assert cornered(curves, [None] * 8) == curves

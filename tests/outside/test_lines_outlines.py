"""Outlines of turned surfaces against what geometry says of them.

A ball's outline is a circle in every orthogonal parallel projection, and in all others a conic: the section of its
cone or cylinder of projectors (any textbook of descriptive geometry; ISO 5456-3 draws it an ellipse in oblique
axonometry). The outline of a torus in orthogonal parallel projection is the curve parallel, at the tube's radius, to
the ellipse that its centre circle is drawn as (the "toroid"; A. Gray, Modern Differential Geometry of Curves and
Surfaces). Whether a point of it is seen follows from the quartic equation of a line and a torus (any text on ray
tracing, for example A. Glassner, An Introduction to Ray Tracing, 1989).
"""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend import camera
from platewright.backend.contract import F64, Projection
from platewright.backend.lines.contours import contours_of
from platewright.backend.lines.visibility import cut as seen_pieces
from platewright.compiler.solids.recipe import Cylinder, Sphere, Torus
from platewright.compiler.solids.transform import translate
from support.geometries import flattened, leaf, shifted
from support.plain_views import geometry_of, runs_of, view_of
from support.recipes import add, cut, made

GOAL_MM = 0.02
"""On paper, as the goals of line drawings state it."""
RADIUS, RING, TUBE = 20.0, 20.0, 6.0
VIEWS = [
    (0.0, 0.0),
    (90.0, 0.0),
    (0.0, 90.0),
    (-135.0, 35.264389682754654),
    (23.0, 17.0),
    (-71.0, 48.0),
    (160.0, -33.0),
]


def bearing(azimuth: float, elevation: float, magnification: float = 1.0) -> Projection:
    return camera.parallel(camera.direction(azimuth, elevation), magnification, (0.0, 0.0))


def along(run: F64, n: int = 5) -> F64:
    """Page points (k,2) along a polyline, its corners and n - 1 between two."""
    share = np.arange(n)[:, None, None] / n
    return (run[:-1, :2] + share * (run[1:, :2] - run[:-1, :2])).reshape(-1, 2)


@pytest.mark.parametrize("magnification", [0.05, 1.0, 5.0])
@pytest.mark.parametrize(("azimuth", "elevation"), VIEWS)
def test_a_ball_is_a_circle_in_every_orthogonal_parallel_view(azimuth, elevation, magnification):
    rung = 0.02 / magnification
    view = view_of(geometry_of(made(add(Sphere(2 * RADIUS)), rung=rung)), bearing(azimuth, elevation, magnification))
    (run,) = runs_of(contours_of(view))
    off = np.linalg.norm(along(run), axis=1) - RADIUS * magnification
    assert np.abs(off).max() < GOAL_MM / 2
    turned = np.unwrap(np.arctan2(run[:, 1], run[:, 0]))
    assert abs(turned[-1] - turned[0]) == pytest.approx(2 * np.pi, abs=1e-9)


OBLIQUE = {
    "cavalier": camera.oblique(camera.orthographic("front"), (np.sqrt(0.5), np.sqrt(0.5))),
    "cabinet": camera.oblique(camera.orthographic("front"), (0.5 * np.sqrt(0.5), 0.5 * np.sqrt(0.5))),
    "planometric": camera.oblique(camera.axes((0.0, 0.0, -1.0), (1.0, 1.0, 0.0)), (0.0, -1.0)),
}


@pytest.mark.parametrize("name", OBLIQUE)
def test_a_ball_is_the_ellipse_of_its_projectors_in_oblique_views(name):
    projection = OBLIQUE[name]
    view = view_of(geometry_of(made(add(Sphere(2 * RADIUS)))), projection)
    (run,) = runs_of(contours_of(view))
    # The map of the ball is the disc {M u : |u| <= R}, bounded by x' (M M')^-1 x = R2.
    form = projection.world_to_page[:2, :3]
    inverse = np.linalg.inv(form @ form.T)
    gauge = np.sqrt(np.einsum("ki,ij,kj->k", along(run), inverse, along(run)))
    least = np.sqrt(np.linalg.eigvalsh(form @ form.T)[0])
    assert (np.abs(gauge - RADIUS) / least).max() * np.sqrt(np.linalg.eigvalsh(form @ form.T)[1]) < GOAL_MM
    assert np.ptp(np.unwrap(np.arctan2(run[:, 1], run[:, 0]))) == pytest.approx(2 * np.pi, abs=1e-9)


@pytest.mark.parametrize("distance", [25.0, 60.0, 400.0])
def test_a_ball_is_the_section_of_its_cone_of_projectors_from_an_eye(distance):
    centre = np.array((4.0, -3.0, 8.0))
    projection = camera.central((0.0, -distance, 5.0), (0.0, 0.0, 0.0), distance, (0.0, 0.0))
    geometry = flattened([leaf("ball", -1, 0, 0, shifted(*centre))], [made(add(Sphere(2 * RADIUS)), rung=0.005)])
    (run,) = runs_of(contours_of(view_of(geometry, projection)))
    page = along(run)
    origins, directions = camera.rays(projection, page)
    off = np.linalg.norm(np.cross(centre - origins, directions), axis=1) - RADIUS
    # Distance from the cone in space, as it appears on paper at the touch.
    reach = np.sqrt(((centre - origins[0]) ** 2).sum() - RADIUS**2)
    depth = reach * (directions @ np.array(projection.sight))
    assert np.abs(off * distance / depth).max() < GOAL_MM


@pytest.mark.parametrize(("azimuth", "elevation"), [view for view in VIEWS if view[1] not in (0.0, 90.0)])
def test_a_torus_is_the_parallel_curve_of_an_ellipse(azimuth, elevation):
    view = view_of(geometry_of(made(add(Torus(2 * RING, 2 * TUBE)))), bearing(azimuth, elevation))
    runs = runs_of(contours_of(view))
    assert len(runs) == 2
    u = np.linspace(0.0, 2 * np.pi, 2001)
    sine = abs(np.sin(np.radians(elevation)))
    ellipse = RING * np.column_stack((np.cos(u), sine * np.sin(u)))
    normal = np.column_stack((sine * np.cos(u), np.sin(u)))
    normal /= np.linalg.norm(normal, axis=1)[:, None]
    runs = sorted(runs, key=lambda run: -np.abs(run[:, 0]).max())
    for run, side in zip(runs, (1.0, -1.0), strict=True):
        page, curve = along(run, 3), ellipse + side * TUBE * normal
        apart = np.linalg.norm(page[:, None] - curve, axis=2)
        nearest = apart.argmin(axis=1)
        assert np.abs(((page - curve[nearest]) * normal[nearest]).sum(axis=1)).max() < GOAL_MM
        assert apart.min(axis=0).max() < np.linalg.norm(np.diff(run[:, :2], axis=0), axis=1).max()


def is_hidden_at(origin: F64, sight: F64, depth: float) -> bool:
    """Whether a torus about z hides the point near `depth` at which a line of sight touches it.

    The line meets the torus where a quartic in the depth t is zero. The touch is a double root of it; what is left
    when that is divided out has the other two.
    """
    quadratic = np.array((1.0, 2 * origin @ sight, origin @ origin + RING**2 - TUBE**2))
    flat = 4 * RING**2 * np.array((sight[:2] @ sight[:2], 2 * origin[:2] @ sight[:2], origin[:2] @ origin[:2]))
    quartic = np.polysub(np.polymul(quadratic, quadratic), flat)
    turns = np.roots(np.polyder(quartic))
    turns = turns[np.abs(turns.imag) < 1e-9].real
    touch = turns[np.argmin(np.abs(np.polyval(quartic, turns)) + (np.abs(turns - depth) > 2.0) * 1e9)]
    others = np.roots(np.polydiv(quartic, np.array((1.0, -2 * touch, touch**2)))[0])
    return bool((others[np.abs(others.imag) < 1e-9].real < touch).any())


@pytest.mark.parametrize(
    ("azimuth", "elevation"), [(23.0, 17.0), (23.0, 35.0), (10.0, 60.0), (45.0, 8.0), (160.0, -25.0)]
)
def test_what_is_seen_of_a_torus_is_what_the_quartic_says(azimuth, elevation):
    projection = bearing(azimuth, elevation)
    view = view_of(geometry_of(made(add(Torus(2 * RING, 2 * TUBE)))), projection)
    found = contours_of(view)
    pieces = seen_pieces(view, found)
    first = np.searchsorted(pieces.segment, np.arange(len(found)))
    last = np.searchsorted(pieces.segment, np.arange(len(found)), side="right") - 1
    begins, ends = pieces.is_visible[first], pieces.is_visible[last]
    origins, sight = camera.rays(projection, found.start[:, :2])
    # Points of an outline where the drawing does not change, whose segments both start and end so.
    rows = np.flatnonzero((found.chain[1:] == found.chain[:-1]) & (ends[:-1] == begins[1:])) + 1
    wrong = [row for row in rows if is_hidden_at(origins[row], sight[row], found.start[row, 2]) == bool(begins[row])]
    assert len(rows) > 300
    # No wrong run longer than 0.2 mm is the goal of line drawings; here all wrong ones together are shorter.
    length = np.linalg.norm((found.end - found.start)[:, :2], axis=1)
    assert length[wrong].sum() < 0.2


def test_a_drilled_ball_from_an_eye_shows_one_outline_and_no_wall():
    mesh = made(add(Sphere(2 * RADIUS)), cut(Cylinder(10.0, 60.0), translate((0, 0, -30))))
    projection = camera.central((-90.0, -120.0, 30.0), (0.0, 0.0, 0.0), 100.0, (50.0, 50.0))
    view = view_of(geometry_of(mesh), projection)
    found = contours_of(view)
    pieces = seen_pieces(view, found)
    lengths = np.linalg.norm((pieces.end - pieces.start)[:, :2], axis=1)
    on_ball = np.isclose(np.linalg.norm(_world(projection, found.start), axis=1), RADIUS, atol=1e-6)[pieces.segment]
    assert pieces.is_visible[on_ball].all() and lengths[on_ball].sum() > 75.0
    # The wall's own outlines lie inside the ball; what its facets let through at the rim is shorter than is drawn.
    assert lengths[~on_ball & pieces.is_visible].max() < view.tolerance.shortest_mm


def _world(projection: Projection, points: F64) -> F64:
    back = np.column_stack((points, np.ones(len(points)))) @ np.linalg.inv(projection.world_to_page).T
    return back[:, :3] / back[:, 3:]

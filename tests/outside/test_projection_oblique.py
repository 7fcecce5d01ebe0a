"""Axonometric and oblique representations against ISO 5456-3:1996, and against what projection does to a sphere."""

from __future__ import annotations

import math

import numpy as np
import pytest
from platewright.backend import camera
from platewright.backend.contract import Projection
from platewright.compiler.projections import (
    AXONOMETRIC,
    Corner,
    by_name,
    corner_of,
    exact_dimetric,
    planometric,
    standard,
    unit_projection,
)

CORNERS = tuple(
    (side, hand, height) for side in ("front", "rear") for hand in ("left", "right") for height in ("above", "below")
)


def of(name: str) -> Projection:
    viewpoint = standard(name)
    assert viewpoint is not None
    return unit_projection(viewpoint)


def drawn(view: Projection) -> tuple[np.ndarray, np.ndarray]:
    """Lengths, and angles in degrees from the horizontal, at which units along x, y and z are drawn."""
    page, _ = camera.to_page(view, np.vstack((np.zeros(3), np.eye(3))))
    axes = page[1:] - page[0]
    return np.linalg.norm(axes, axis=1), np.degrees(np.arctan2(-axes[:, 1], axes[:, 0]))


@pytest.mark.parametrize(
    ("name", "lengths", "angles"),
    [
        # ISO 5456-3: isometric axes at 30, 30 and 90 degrees, 1:1:1; dimetric at 7, 42 and 90, 1:1/2:1;
        # cavalier at 0, 45 and 90, 1:1:1; cabinet the same with 1/2; planometric turned by 45, 1:1:1.
        ("isometric", (1, 1, 1), (-30, 30, 90)),
        ("dimetric", (1, 0.5, 1), (-7, 42, 90)),
        ("cavalier", (1, 1, 1), (0, 45, 90)),
        ("cabinet", (1, 0.5, 1), (0, 45, 90)),
        ("planometric", (1, 1, 1), (-45, 45, 90)),
        ("isometric_front_left_above", (1, 1, 1), (30, 150, 90)),
        ("cavalier_front_left_above", (1, 1, 1), (0, 135, 90)),
        ("cabinet_front_right_below", (1, 0.5, 1), (0, -45, 90)),
    ],
)
def test_axes_are_drawn_where_the_standard_says(
    name: str, lengths: tuple[float, ...], angles: tuple[float, ...]
) -> None:
    length, angle = drawn(of(name))
    assert length == pytest.approx(lengths, abs=1e-12)
    assert angle == pytest.approx(angles, abs=1e-9)


def test_exact_dimetric_axes() -> None:
    # Derived: axes at atan(root 7 / 21) and acos(3/4), foreshortened by root 8 / 3 and half of it; elevation asin 1/3.
    length, angle = drawn(unit_projection(exact_dimetric(Corner())))
    assert length == pytest.approx((1, 0.5, 1), abs=1e-12)
    assert angle == pytest.approx((-math.degrees(math.atan(math.sqrt(7) / 21)), math.degrees(math.acos(0.75)), 90))
    assert angle[:2] == pytest.approx((-7.180756, 41.409622), abs=5e-7)
    true, _ = drawn(unit_projection(exact_dimetric(Corner()), is_true=True))
    assert true == pytest.approx((0.9428090, 0.4714045, 0.9428090), abs=5e-8)
    sight = unit_projection(exact_dimetric(Corner())).sight
    assert math.degrees(math.asin(-sight[2])) == pytest.approx(19.471221, abs=5e-7)
    assert math.degrees(math.atan2(-sight[0], sight[1])) == pytest.approx(20.704811, abs=5e-7)


def test_convention_and_exact_dimetric_differ_by_less_than_six_tenths_of_a_degree() -> None:
    _, exact = drawn(unit_projection(exact_dimetric(Corner())))
    _, convention = drawn(of("dimetric"))
    assert 0.1 < np.abs(exact - convention).max() < 0.6


def test_isometric_axes_stand_120_degrees_apart_from_every_corner() -> None:
    for corner in CORNERS:
        _, angle = drawn(of("isometric_" + "_".join(corner)))
        apart = np.diff(np.sort(angle % 180))
        assert apart == pytest.approx((60, 60), abs=1e-9)


@pytest.mark.parametrize("word", AXONOMETRIC)
@pytest.mark.parametrize("corner", CORNERS, ids="_".join)
def test_a_view_shows_the_three_sides_it_names_and_its_projectors_are_drawn_as_points(
    word: str, corner: tuple[str, str, str]
) -> None:
    found = corner_of(*corner)
    assert found is not None
    view = unit_projection(by_name(word, found))
    sight = np.array(view.sight)
    toward = {"front": (0, -1, 0), "rear": (0, 1, 0), "left": (-1, 0, 0), "right": (1, 0, 0)}
    toward |= {"above": (0, 0, 1), "below": (0, 0, -1)}
    assert all(sight @ np.array(toward[side]) < -0.1 for side in corner)
    assert np.linalg.norm(sight) == pytest.approx(1)
    assert np.abs(view.world_to_page[:2, :3] @ sight).max() < 1e-12
    # Depth is mm along the projectors and grows away from the viewer; the picture plane's axes are drawn alike.
    assert view.world_to_page[2, :3] @ sight == pytest.approx(1)
    right, up = np.array(view.right), np.array(view.up)
    assert right @ up == pytest.approx(0, abs=1e-12) and np.cross(right, up) @ sight < 0
    images = view.world_to_page[:2, :3] @ np.column_stack((right, up))
    assert images == pytest.approx(images[0, 0] * np.diag((1, -1)), abs=1e-12)
    # z stands upright, and the axis drawn across runs the way the side seen says.
    length, angle = drawn(view)
    assert angle[2] == pytest.approx(90, abs=1e-9)
    # The three edges from the corner nearest to the viewer are all in view, so no two are drawn one over the other.
    assert min(length) > 0.3 and min(abs(np.diff(np.sort(angle % 180)))) > 1


def test_planometric_turned_and_shortened() -> None:
    # ISO 5456-3: the plan turned by 30 and 60 degrees, heights by two thirds.
    length, angle = drawn(unit_projection(planometric(Corner(), 30.0, 2 / 3)))
    assert length == pytest.approx((1, 1, 2 / 3)) and angle == pytest.approx((-30, 60, 90), abs=1e-9)


def test_oblique_projection_equals_the_plane_its_projectors_meet() -> None:
    # By definition: a point is drawn where the projector through it meets the picture plane.
    random = np.random.default_rng(3)
    points = random.normal(size=(100, 3)) * 30
    for name in ("cavalier", "cabinet", "planometric", "cavalier_rear_left_below"):
        view = of(name)
        right, up, sight = (np.array(each) for each in (view.right, view.up, view.sight))
        normal = -np.cross(right, up)
        along = -(points @ normal) / (sight @ normal)
        met = points + along[:, None] * sight
        page, depth = camera.to_page(view, points)
        assert np.abs(page - np.column_stack((met @ right, -(met @ up)))).max() < 1e-11
        assert np.abs(depth + along).max() < 1e-11


def outline(view: Projection, radius: float) -> np.ndarray:
    """Page points of the circle in which the projectors touch a sphere about the origin."""
    sight = np.array(view.sight)
    aside = np.cross(sight, (0.3, 0.5, 0.8))
    aside /= np.linalg.norm(aside)
    turn = np.linspace(0, 2 * np.pi, 3601)[:, None]
    return camera.to_page(view, radius * (np.cos(turn) * aside + np.sin(turn) * np.cross(sight, aside)))[0]


@pytest.mark.parametrize("name", ["front", "isometric", "trimetric", "isometric_rear_left_below"])
def test_a_sphere_is_a_circle_in_projections_square_to_the_picture_plane(name: str) -> None:
    radii = np.linalg.norm(outline(of(name), 50.0), axis=1)
    assert np.ptp(radii) < 1e-9


@pytest.mark.parametrize("name", ["dimetric", "cavalier", "cabinet", "planometric"])
def test_a_sphere_is_the_ellipse_that_its_projection_gives(name: str) -> None:
    # The image of a ball under a linear map M is bounded by the ellipse x M M' x = r^2, of which the half axes are r
    # times the singular values of M.
    view = of(name)
    radii = np.linalg.norm(outline(view, 50.0), axis=1)
    values = np.linalg.svd(view.world_to_page[:2, :3])[1]
    assert (radii.max(), radii.min()) == pytest.approx(tuple(50.0 * values), abs=1e-4)
    assert camera.magnification(view) == pytest.approx(values[0])
    if name in ("cavalier", "cabinet"):
        k = 1.0 if name == "cavalier" else 0.5
        assert tuple(values) == pytest.approx((math.sqrt(1 + k * k), 1.0))


def test_axes_drawn_along_one_line_are_no_projection() -> None:
    with pytest.raises(ValueError, match="no length"):
        camera.drawn_axes((1, 0), (2, 0), (3, 0))

"""Central projection onto a picture plane of its own, against OpenCV and the vanishing points of ISO 5456-4."""

from __future__ import annotations

import cv2
import numpy as np
import pytest
from platewright.backend import camera
from platewright.compiler.projections import Central, unit_projection

EYE, TOWARD = (-260.0, -480.0, 210.0), (15.0, 10.0, 30.0)
PLANES = (None, (0.0, 1.0, 0.0), (0.5, 0.8660254037844386, 0.0), (0.0, -0.6, 0.8))


@pytest.mark.parametrize("plane", PLANES)
def test_a_picture_plane_of_its_own_is_a_camera_with_its_principal_point_moved(
    plane: tuple[float, float, float] | None,
) -> None:
    # OpenCV calib3d, projectPoints: u = f x/z + c. The principal point c is where the eye's perpendicular meets the
    # picture plane; the target lands on the page's (0, 0) at a scale of 1.
    view = unit_projection(Central(EYE, TOWARD, plane=plane))
    sight, eye = np.array(view.sight), np.array(EYE)
    if plane is not None:
        assert abs(sight @ np.array(plane)) == pytest.approx(1)
    distance = (np.array(TOWARD) - eye) @ sight
    rotation = np.array([view.right, -np.array(view.up), sight])
    offset = -(rotation @ (np.array(TOWARD) - eye))[:2]
    matrix = np.array([[distance, 0, offset[0]], [0, distance, offset[1]], [0, 0, 1]])
    points = np.random.default_rng(4).normal(size=(200, 3)) * 40
    expected, _ = cv2.projectPoints(points, cv2.Rodrigues(rotation)[0], -rotation @ eye, matrix, None)
    found, depth = camera.to_page(view, points)
    assert np.abs(found - expected[:, 0]).max() < 1e-9
    assert np.allclose(depth, -1 / ((points - eye) @ sight), rtol=1e-12)
    assert camera.to_page(view, np.array([TOWARD]))[0][0] == pytest.approx((0, 0), abs=1e-9)


@pytest.mark.parametrize("plane", PLANES)
def test_vanishing_points(plane: tuple[float, float, float] | None) -> None:
    # The vanishing point of a direction v is f v_xy / v_z from the principal point, in the axes of the picture plane.
    view = unit_projection(Central(EYE, TOWARD, plane=plane), 0.5)
    axes = np.array([view.right, -np.array(view.up), view.sight])
    distance = 0.5 * float((np.array(TOWARD) - np.array(EYE)) @ np.array(view.sight))
    principal, _ = camera.to_page(view, np.array([EYE]) + np.array([view.sight]))
    for along in np.eye(3):
        x, y, z = axes @ along
        if abs(z) < 1e-9:
            continue
        far, _ = camera.to_page(view, np.array([EYE]) + np.sign(z) * along * 1e9 + np.array([view.right]))
        assert far[0] == pytest.approx(principal[0] + distance * np.array((x, y)) / z, abs=1e-4)


def test_a_one_point_view_draws_what_faces_it_undistorted() -> None:
    view = unit_projection(Central(EYE, TOWARD, plane=(0.0, 1.0, 0.0)))
    angle = np.linspace(0, 2 * np.pi, 181)[:, None]
    circle = np.array((40.0, 60.0, 20.0)) + 25 * (np.cos(angle) * (1, 0, 0) + np.sin(angle) * (0, 0, 1))
    page, _ = camera.to_page(view, circle)
    radii = np.linalg.norm(page - (page[:-1].mean(axis=0)), axis=1)
    assert np.ptp(radii) < 1e-9

"""Projections against OpenCV's pinhole camera and the closed forms of axonometry (ISO 5456-2, -3)."""

from __future__ import annotations

import cv2
import numpy as np
import pytest
from platewright.backend import camera


def test_central_projection_equals_opencv_project_points() -> None:
    # OpenCV calib3d, projectPoints: camera x right, y down, z along the sight; u = f x/z + c.
    random = np.random.default_rng(11)
    for _ in range(20):
        eye, toward = random.normal(size=3) * 300, random.normal(size=3) * 20
        view = camera.central(eye, toward, 70.0, (42.0, 31.0))
        rotation = np.array([view.right, -np.array(view.up), view.sight])
        points = toward + random.normal(size=(200, 3)) * 30
        pixels_per_mm = 600 / 25.4
        matrix = np.array([[70.0, 0, 42.0], [0, 70.0, 31.0], [0, 0, 1]]) * ((pixels_per_mm,), (pixels_per_mm,), (1,))
        expected, _ = cv2.projectPoints(points, cv2.Rodrigues(rotation)[0], -rotation @ eye, matrix, None)
        found, depth = camera.to_page(view, points)
        assert np.abs(found * pixels_per_mm - expected[:, 0]).max() < 1e-9
        distance = (points - eye) @ np.array(view.sight)
        assert np.allclose(depth, -1.0 / distance, rtol=1e-12)


def test_isometric_foreshortening_and_elevation() -> None:
    view = camera.isometric()
    assert np.allclose(camera.foreshortening(view), np.sqrt(2 / 3), atol=1e-15)
    assert abs(camera.TRUE_ISOMETRIC_ELEVATION - 35.264390) < 5e-7
    assert abs(np.degrees(np.arcsin(-view.sight[2])) - camera.TRUE_ISOMETRIC_ELEVATION) < 1e-12
    assert abs(camera.along_axes(view) - np.sqrt(1.5)) < 1e-15


def test_isometric_axes_lie_at_30_30_and_90_degrees() -> None:
    page, _ = camera.to_page(camera.parallel(camera.isometric(), 1.0, (0.0, 0.0)), np.eye(3))
    angles = np.degrees(np.arctan2(-page[:, 1], page[:, 0]))
    # Seen from the front right above, x runs right and down, y right and up.
    assert np.allclose(angles, (-30.0, 30.0, 90.0), atol=1e-12)


@pytest.mark.parametrize("axis", [0, 1, 2])
def test_a_circle_in_isometric_is_an_ellipse(axis: int) -> None:
    angle = np.linspace(0, 2 * np.pi, 3601)
    circle = np.zeros((len(angle), 3))
    circle[:, (axis + 1) % 3], circle[:, (axis + 2) % 3] = np.cos(angle), np.sin(angle)
    radius = np.linalg.norm(camera.to_page(camera.parallel(camera.isometric(), 1.0, (0, 0)), circle)[0], axis=1)
    assert abs(radius.max() - 1.0) < 1e-6
    assert abs(radius.min() - 1 / np.sqrt(3)) < 1e-6


def test_scale_along_the_axes_is_larger_by_the_root_of_three_halves() -> None:
    view = camera.isometric("rear", "left", "below")
    drawn = camera.parallel(view, 0.5 * camera.along_axes(view), (0, 0))
    ends, _ = camera.to_page(drawn, np.eye(3))
    assert np.allclose(np.linalg.norm(ends, axis=1), 0.5, atol=1e-15)
    assert abs(drawn.scale - 0.5) < 1e-15
    true = camera.parallel(view, 0.5, (0, 0))
    assert abs(np.linalg.norm(camera.to_page(true, np.eye(3))[0][0]) - 0.5 * 0.8164966) < 1e-7


def test_third_angle_views_share_their_edges() -> None:
    # ISO 5456-2, third angle: the view from above stands above the front view, the view from below under it, and
    # all three have x in common; the edge next to the front view is the front, -y, of the object.
    top, front, bottom = (camera.orthographic(side) for side in ("top", "front", "bottom"))
    assert top.right == front.right == bottom.right == (1.0, 0.0, 0.0)
    assert top.up == (0.0, 1.0, 0.0) and bottom.up == (0.0, -1.0, 0.0)
    assert camera.orthographic("right").right == (0.0, 1.0, 0.0)
    assert camera.orthographic("left").right == (0.0, -1.0, 0.0)
    assert camera.orthographic("rear").right == (-1.0, 0.0, 0.0)


def test_rays_lead_back_to_the_points() -> None:
    random = np.random.default_rng(5)
    points = random.normal(size=(100, 3)) * 20
    views = (
        camera.central((100, -300, 150), (3, 4, 5), 80.0, (42, 30)),
        camera.parallel(camera.direction(30, 20), 0.7, (42, 30), (1, 2, 3)),
    )
    for view in views:
        origins, directions = camera.rays(view, camera.to_page(view, points)[0])
        along = np.einsum("ij,ij->i", points - origins, directions)
        assert np.abs(origins + along[:, None] * directions - points).max() < 1e-9
        assert (along > 0).all() or view.kind == "parallel"


def test_depth_of_a_plane_is_affine_on_the_page() -> None:
    random = np.random.default_rng(6)
    u, v = random.normal(size=3), random.normal(size=3)
    points = random.normal(size=(50, 1)) * 10 * u + random.normal(size=(50, 1)) * 10 * v
    for view in (
        camera.central((50, -200, 90), (0, 0, 0), 80.0, (42, 30)),
        camera.parallel(camera.isometric(), 1, (0, 0)),
    ):
        page, depth = camera.to_page(view, points)
        fit, *_ = np.linalg.lstsq(np.column_stack([page, np.ones(50)]), depth, rcond=None)
        assert np.abs(np.column_stack([page, np.ones(50)]) @ fit - depth).max() < 1e-9 * np.ptp(depth)


def test_impossible_views_raise() -> None:
    with pytest.raises(ValueError, match="no length"):
        camera.central((1, 2, 3), (1, 2, 3), 50.0, (0, 0))
    with pytest.raises(ValueError, match="no length"):
        camera.axes((0, 0, 1), (0, 0, -2))
    with pytest.raises(ValueError, match="no points"):
        camera.extents(camera.isometric(), np.zeros((0, 3)))


def test_principal_distances() -> None:
    # A lens of focal length f on a film of width w sees the angle 2 atan(w / 2f) (common practice).
    assert abs(camera.principal_distance_of_lens(85.0, 36.0, 84.0) - 85.0 * 84.0 / 36.0) < 1e-12
    angle = 2 * np.degrees(np.arctan(18.0 / 85.0))
    assert abs(camera.principal_distance_of_angle(angle, 84.0) - 85.0 * 84.0 / 36.0) < 1e-9

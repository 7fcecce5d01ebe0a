"""Coverage of the rasteriser against exact areas of polygons (shoelace formula) and of a convex outline."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend import camera, raster
from platewright.backend.contract import Page
from support.raster_models import assemble, block, panel, plan, triangles

PAGE = Page(50.8, 50.8, 100.0)  # 200 x 200 px
MM = 0.254


def covered_mm2(parts, projection, samples: int) -> float:
    seen = raster.see(assemble(parts), panel(projection, PAGE, samples), PAGE)
    return float((seen.face >= 0).mean()) * 50.8 * 50.8


def shoelace(xy: np.ndarray) -> float:
    x, y = xy.T
    return 0.5 * abs(float(np.dot(x, np.roll(y, -1)) - np.dot(y, np.roll(x, -1))))


@pytest.mark.parametrize("samples", [1, 4])
def test_mean_error_of_random_polygons_is_that_of_unbiased_sampling(samples: int) -> None:
    # A sampling grid without bias errs on either side alike: the mean error over many star-shaped polygons tends to
    # 0, and each error stays below perimeter times the spacing of samples.
    random = np.random.default_rng(samples)
    spacing = MM / np.sqrt(samples)
    errors = []
    for _ in range(60):
        n = int(random.integers(3, 12))
        angle = (
            np.sort(random.uniform(0, 2 * np.pi, n)) if n > 4 else np.arange(n) * 2 * np.pi / n + random.uniform(0, 6)
        )
        gap = np.diff(np.append(angle, angle[0] + 2 * np.pi))
        if gap.max() > 3.0:
            continue
        radius = random.uniform(5, 20, n)
        xy = np.column_stack([25.4 + radius * np.cos(angle), -25.4 + radius * np.sin(angle)])
        corners = np.column_stack([np.vstack([xy, [[25.4, -25.4]]]), np.zeros(n + 1)])
        k = np.arange(n)
        fan = triangles("a", corners, np.column_stack([k, (k + 1) % n, np.full(n, n)]))
        error = covered_mm2([fan], plan(PAGE), samples) - shoelace(xy)
        perimeter = float(np.linalg.norm(np.roll(xy, -1, 0) - xy, axis=1).sum())
        assert abs(error) < 0.25 * perimeter * spacing
        errors.append(error / (np.sqrt(perimeter * spacing) * spacing))
    assert len(errors) > 40
    assert abs(float(np.mean(errors))) < 3 * float(np.std(errors)) / np.sqrt(len(errors))


def test_isometric_cube_covers_the_root_of_three_of_its_side() -> None:
    # The isometric outline of a cube of side a is a regular hexagon of area sqrt(3) a^2 (true projection).
    # Two of its sides run along the pixel grid, so the mean over several positions is compared.
    random = np.random.default_rng(1)
    areas = [
        covered_mm2(
            [block("a", (0, 0, 0), (18, 18, 18))],
            camera.parallel(camera.isometric(), 1.0, tuple(25.4 + random.uniform(-MM, MM, 2)), (9.0, 9.0, 9.0)),
            4,
        )
        for _ in range(24)
    ]
    assert abs(np.mean(areas) / (np.sqrt(3) * 18**2) - 1) < 5e-4


def test_central_square_covers_by_the_inverse_square_of_distance() -> None:
    areas = []
    for distance in (40.0, 80.0):
        view = camera.central((0, -distance, 0), (0, 0, 0), 40.0, (25.4, 25.4))
        wall = triangles("w", [(-15, 0, -15), (15, 0, -15), (15, 0, 15), (-15, 0, 15)], [[0, 1, 2], [0, 2, 3]])
        areas.append(covered_mm2([wall], view, 4))
    assert abs(areas[0] / 900.0 - 1) < 5e-3 and abs(areas[1] / 225.0 - 1) < 1e-2

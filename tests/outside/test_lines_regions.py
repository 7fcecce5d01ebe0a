"""Regions against rays: the part that each region claims is the part a ray through the page meets first.

Oracle: Embree through embreex, where it installs. It knows nothing of lines, views or regions.
"""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from platewright.backend import camera
from platewright.backend.contract import F64, I32
from platewright.backend.lines.regions import polygon_of
from support.line_scenes import HELD_OUT, VIEWS, fitted, fitted_central, mechanical
from support.penetrating import Arranged, arranged, tangle, thrown

MOST_WRONG = 1e-4
"""Share of the covered area that may be in no region, and that may be in the region of another part."""


def part_met(found: Arranged, points: F64) -> I32:
    """Node that the ray through each page point meets first, -1 for none."""
    embree = pytest.importorskip("embreex.rtcore_scene", reason="embreex has no wheel for this platform")
    from embreex.mesh_construction import TriangleMesh

    geometry, projection = found.geometry, found.view.projection
    low, high = geometry.vertices.min(axis=0), geometry.vertices.max(axis=0)
    middle, size = (low + high) / 2, float(np.linalg.norm(high - low))
    tracer = embree.EmbreeScene(robust=True)
    TriangleMesh(tracer, (geometry.vertices[geometry.faces] - middle).astype(np.float32))
    origins, directions = camera.rays(projection, points)
    if projection.kind == "parallel":
        along = ((middle - origins) * directions).sum(axis=1) - size
        origins = origins + along[:, None] * directions
    hit = tracer.run((origins - middle).astype(np.float32), directions.astype(np.float32))
    return np.append(geometry.face_node, -1)[hit]


def wrong_samples(found: Arranged, n: int, seed: int = 0) -> tuple[int, int, int]:
    """Samples that rays say are covered, those of them in no region, and those in the region of another part.

    Samples within 0.001 mm of a border are left out: rays are traced in single precision.
    """
    points = found.view.points[:, :2]
    xy = points.min(axis=0) + np.random.default_rng(seed).random((n, 2)) * np.ptp(points, axis=0)
    polygons = np.array([polygon_of(region) for region in found.regions])
    of, row = shapely.STRtree(polygons).query(shapely.points(xy), predicate="within")
    assert len(np.unique(of)) == len(of)
    claimed = np.full(n, -1)
    claimed[of] = np.array([region.node for region in found.regions])[row]
    met = part_met(found, xy)
    differing = np.flatnonzero(met != claimed)
    near = shapely.STRtree(shapely.boundary(polygons)).query(
        shapely.points(xy[differing]), predicate="dwithin", distance=1e-3
    )[0]
    sure = np.delete(differing, np.unique(near))
    covered = int(np.count_nonzero(met >= 0))
    return covered, int(np.count_nonzero(claimed[sure] < 0)), int(np.count_nonzero(claimed[sure] >= 0))


def assert_right(found: Arranged, n: int = 40_000) -> None:
    covered, unfilled, other = wrong_samples(found, n)
    assert covered > n // 5
    assert unfilled <= MOST_WRONG * covered and other <= MOST_WRONG * covered


@pytest.mark.parametrize("view", ["isometric", "oblique", "trimetric"])
@pytest.mark.parametrize("kind", ["parallel", "central"])
def test_parts_that_penetrate(view: str, kind: str) -> None:
    geometry, sight = tangle(), (VIEWS | HELD_OUT)[view]
    assert_right(arranged(geometry, (fitted if kind == "parallel" else fitted_central)(geometry, sight)))


@pytest.mark.parametrize("view", ["isometric", "front", "top"])
def test_a_plate_with_flush_parts_and_a_sunk_ball(view: str) -> None:
    geometry = mechanical()
    assert_right(arranged(geometry, fitted(geometry, VIEWS[view])))


def test_the_oracle_notices_a_region_that_is_missing_or_another_part() -> None:
    geometry = tangle()
    found = arranged(geometry, fitted(geometry, VIEWS["isometric"]))
    less = Arranged(geometry, found.view, found.candidates, found.pieces, found.occluders, found.regions[1:])
    covered, unfilled, _ = wrong_samples(less, 40_000)
    assert unfilled > MOST_WRONG * covered


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(100))
def test_parts_thrown_together(seed: int) -> None:
    geometry = thrown(seed)
    random = np.random.default_rng(seed + 1000)
    for k in range(10):
        sight = random.normal(size=3)
        assert_right(arranged(geometry, (fitted_central if k % 2 else fitted)(geometry, sight)), 20_000)

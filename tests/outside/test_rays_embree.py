"""What rays meet against Embree (through embreex), wherever no two triangles are met at nearly one place."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend import camera
from platewright.backend.contract import Geometry
from platewright.backend.rays import bvh, picking, tracing
from support.raster_models import assemble, block, cylinder, sphere, torus, triangles

rtcore_scene = pytest.importorskip("embreex.rtcore_scene")
mesh_construction = pytest.importorskip("embreex.mesh_construction")


def model() -> Geometry:
    random = np.random.default_rng(4)
    soup = random.normal(size=(400, 1, 3)) * 14 + random.normal(size=(400, 3, 3)) * 2
    return assemble([
        sphere("ball", 6, (3, 2, 4), 60), torus("ring", 9, 2, (-4, 0, 1), 60),
        block("block", (-6, -13, -3), (9, -7, 3)),
        cylinder("pin", 2.5, -9, 14, 200), triangles("soup", soup.reshape(-1, 3), np.arange(1200).reshape(-1, 3)),
    ])  # fmt: skip


def rays(n: int, seed: int) -> tuple[np.ndarray, np.ndarray]:
    random = np.random.default_rng(seed)
    origins, aims = random.normal(size=(n, 3)) * 20, random.normal(size=(n, 3)) * 8
    ways = aims - origins
    origins = origins.astype(np.float32).astype(np.float64)
    ways = (ways / np.linalg.norm(ways, axis=1, keepdims=True)).astype(np.float32).astype(np.float64)
    return origins, ways


def embree(geometry: Geometry):
    scene = rtcore_scene.EmbreeScene()
    mesh_construction.TriangleMesh(scene, geometry.vertices.astype(np.float32), geometry.faces)
    return scene


def test_the_first_face_and_its_distance() -> None:
    geometry = model()
    tree, scene = bvh.build_over(geometry), embree(geometry)
    origins, ways = rays(40_000, 1)
    hits = tracing.nearest(tree, origins, ways)
    theirs = scene.run(origins.astype(np.float32), ways.astype(np.float32), output=True)
    face, far = theirs["primID"].astype(np.int64), theirs["tfar"].astype(np.float64)
    both = (hits.face >= 0) & (face >= 0)
    assert both.sum() > 10_000
    same = hits.face == face
    # Where the faces differ both are met within a few float32 steps, or the ray grazes an edge that only one counts.
    near = np.zeros(len(face), bool)
    near[both] = np.abs(hits.distance[both] - far[both]) < 1e-4
    assert (same | near).mean() > 0.9995
    assert same.mean() > 0.998
    apart = np.abs(hits.distance[both & same] - far[both & same])
    assert np.quantile(apart, 0.999) < 2e-4 and np.median(apart) < 1e-5


def test_whether_anything_is_in_the_way() -> None:
    geometry = model()
    tree, scene = bvh.build_over(geometry), embree(geometry)
    origins, ways = rays(40_000, 2)
    ours = tracing.is_stopped(tree, origins, ways, 20.0)
    reach = np.full(len(origins), 20.0, np.float32)
    theirs = scene.run(origins.astype(np.float32), ways.astype(np.float32), reach, query="OCCLUDED")
    assert 0.1 < ours.mean() < 0.9
    assert (ours == (theirs == 0)).mean() > 0.9995


@pytest.mark.parametrize("kind", ["parallel", "central"])
def test_what_is_picked_on_the_page_is_what_embree_meets(kind: str) -> None:
    geometry = model()
    tree, scene = bvh.build_over(geometry), embree(geometry)
    if kind == "parallel":
        view = camera.parallel(camera.isometric(), 0.6, (15.0, 12.0))
    else:
        view = camera.central((30, -60, 25), (0, 0, 0), 40.0, (15.0, 12.0))
    points = np.random.default_rng(3).random((5000, 2)) * (30.0, 24.0)
    hits = picking.pick(tree, view, points)
    origins, ways = camera.rays(view, points)
    start = origins - (200.0 * ways if kind == "parallel" else 0.0)
    theirs = scene.run(start.astype(np.float32), ways.astype(np.float32))
    assert (hits.face >= 0).mean() > 0.3
    assert (hits.face == theirs).mean() > 0.995
    met = hits.face >= 0
    place = origins[met] + hits.distance[met, None] * ways[met]
    page = np.column_stack([place, np.ones(len(place))]) @ view.world_to_page.T
    assert np.abs(page[:, :2] / page[:, 3:] - points[met]).max() < 1e-6

"""The yardstick of line drawings: what embreex takes to build a scene of the same triangles."""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np
from embreex.mesh_construction import TriangleMesh
from embreex.rtcore_scene import EmbreeScene
from platewright.backend.contract import Geometry


def timed(work: Callable[[], object]) -> tuple[object, float]:
    """What the work gives, and the seconds it took."""
    begin = time.perf_counter()
    result = work()
    return result, time.perf_counter() - begin


def yardstick(geometry: Geometry) -> float:
    """Seconds to build an embreex scene of the geometry's triangles."""
    vertices, faces = geometry.vertices.astype(np.float32), geometry.faces
    origin, ray = np.zeros((1, 3), np.float32), np.array([[0.0, 0.0, 1.0]], np.float32)

    def build() -> None:
        scene = EmbreeScene()
        TriangleMesh(scene, vertices, faces)
        scene.run(origin, ray)  # the scene is built at its first ray

    return timed(build)[1]

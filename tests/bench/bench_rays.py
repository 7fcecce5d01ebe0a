"""Rays and building beside a yardstick from the same run: `python tests/bench/bench_rays.py [triangles ...]`.

The yardstick is Embree (through embreex) in its default build. Its rays are asked for the face alone, in float32, in
one call on one thread; ours, on one thread too, answer with face, distance and weights from float64, in processor time.
Runs alternate and medians are compared. Primary rays come from one eye in rows of pixels; diffuse rays start on the
surfaces those met, in random order, to random sides. Either are asked for the first face, and whether they meet any:
diffuse ones within 20 mm, a fifth of the model, primary ones within 200 mm. Building is elapsed time, all threads on
both sides. Rates of ours over theirs: must 0.85, aim 1.0; time to build: must 0.6, aim 0.45.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path

import numpy as np
from embreex import rtcore_scene
from embreex.mesh_construction import TriangleMesh
from platewright.backend.rays import bvh, tracing

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
from bench.bench_raster import objects
from support.raster_models import assemble

N_RAYS = 500_000


def timed(work):
    start, busy = time.perf_counter(), time.process_time()
    value = work()
    return time.perf_counter() - start, time.process_time() - busy, value


def embree(vertices, faces):
    scene = rtcore_scene.EmbreeScene()
    TriangleMesh(scene, vertices, faces)
    scene.run(np.array([[0, 0, 1e6]], np.float32), np.array([[0, 0, 1]], np.float32))
    return scene


def primary():
    columns, rows = 816, 612
    x, y = np.meshgrid(np.linspace(-0.49, 0.49, columns), np.linspace(-0.37, 0.37, rows))
    directions = np.stack([x, np.ones_like(x), y], -1).reshape(-1, 3)
    directions /= np.linalg.norm(directions, axis=1, keepdims=True)
    return np.tile([0.0, -120.0, 0.0], (len(directions), 1)), directions


def diffuse(tree, geometry, seed: int = 3):
    random = np.random.default_rng(seed)
    origins, directions = primary()
    hits = tracing.nearest(tree, origins, directions)
    met = np.flatnonzero(hits.face >= 0)
    met = met[random.integers(0, len(met), N_RAYS)]
    a, b, c = (geometry.vertices[geometry.faces[hits.face[met], k]] for k in range(3))
    normals = np.cross(b - a, c - a)
    normals /= np.maximum(np.linalg.norm(normals, axis=1, keepdims=True), 1e-300)
    points = origins[met] + hits.distance[met, None] * directions[met]
    ways = normals + (lambda v: v / np.linalg.norm(v, axis=1, keepdims=True))(random.normal(size=(N_RAYS, 3)))
    return points + 1e-3 * normals, ways / np.linalg.norm(ways, axis=1, keepdims=True)


def compare(name: str, ours, theirs, n: int, repeats: int = 5) -> None:
    ours(), theirs()
    times = np.array([(timed(ours)[1], timed(theirs)[1]) for _ in range(repeats)])
    mine, other = np.median(times, axis=0)
    rates = f"{n / mine / 1e6:.2f} M/s / {n / other / 1e6:.2f} M/s"
    print(f"  {name}: rate {other / mine:.2f} of Embree's (must 0.85)   {rates}", flush=True)


def run(n_triangles: int, repeats: int = 5) -> None:
    geometry = assemble(objects(n_triangles)[0])
    vertices, faces = geometry.vertices.astype(np.float32), geometry.faces
    bvh.build_over(geometry)
    times = []
    for _ in range(repeats):
        *mine, tree = timed(lambda: bvh.build_over(geometry))
        *other, scene = timed(lambda: embree(vertices, faces))
        times.append((mine, other))
    (mine, my_work), (other, their_work) = np.median(np.array(times), axis=0)
    print(
        f"{len(faces)} triangles: build {mine / other:.2f} of Embree's time (must 0.6)   {mine * 1e3:.0f} ms / "
        f"{other * 1e3:.0f} ms; in processor time {my_work / their_work:.2f}; "
        f"{tree.n_bytes / len(faces):.1f} bytes a triangle",
        flush=True,
    )
    for name, cast in (("primary", primary()), ("diffuse", diffuse(tree, geometry))):
        against(tree, scene, name, *cast, 200.0 if name == "primary" else 20.0)


def against(tree, scene, name: str, origins, directions, reach: float) -> None:
    """One thread each, as embreex has but one, in processor time: other work on the machine then shows less."""
    o, d = origins.astype(np.float32), directions.astype(np.float32)
    n, near = len(o), np.full(len(o), reach, np.float32)
    compare(
        f"{name}, first face", lambda: tracing.nearest(tree, origins, directions, threads=1), lambda: scene.run(o, d), n
    )
    compare(
        f"{name}, any face within {reach:.0f} mm",
        lambda: tracing.is_stopped(tree, origins, directions, reach, threads=1),
        lambda: scene.run(o, d, near.copy(), query="OCCLUDED"),
        n,
    )


if __name__ == "__main__":
    for size in sys.argv[1:] or ["250000", "1000000"]:
        run(int(size))

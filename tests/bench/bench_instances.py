"""10 000 instances of a 200-triangle part flattened, and what one changed parameter makes be built again.

Run: python tests/bench/bench_instances.py

Time stands beside a yardstick of the same run: numpy copying as many bytes as the flattened geometry holds. Memory is
the growth of the process's peak over what it holds before flattening (ru_maxrss).
"""

from __future__ import annotations

import resource
import time

import numpy as np
from platewright.backend.contract import Geometry
from platewright.compiler import scene
from platewright.compiler.driver.meshes import KeptMeshes

BALLS = """platewright 1

given
    size = 10 mm range 1 mm .. 20 mm

part ball
    add sphere diameter 10 mm

assembly rack
    place ball row 100 by (12 mm, 0, 0) row 100 by (0, 12 mm, 0)
    place lid at (0, 0, 5 mm + size)

part lid
    add block (1200 mm, 1200 mm, size)
"""
SHEETS = 40


def peak() -> float:
    """The most this process has held so far, in MB."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def rack(size: str = "") -> scene.Model:
    """The evaluated scene, `size` set where given."""
    project, problems = scene.open_scene("a.plate", lambda name: BALLS.encode())
    assert project is not None and not problems
    model, problems = scene.build(project, settings=(("size", size),) if size else ())
    assert model is not None and not problems
    return model


def n_bytes(geometry: Geometry) -> int:
    """What the arrays of a geometry hold."""
    names = (
        "vertices",
        "faces",
        "corner_normals",
        "face_node",
        "face_patch",
        "face_origin",
        "face_source",
        "edge_kind",
    )
    patches = (geometry.patches.kind, geometry.patches.frame, geometry.patches.size, geometry.patches.inward)
    return sum(getattr(geometry, name).nbytes for name in names) + sum(each.nbytes for each in patches)


def instances() -> None:
    """Flattens the rack at the rung that gives a ball about 200 triangles."""
    model, meshes = rack(), KeptMeshes()
    rung = next(r for r in (0.5, 0.2, 0.1, 0.05) if _faces(model, meshes, r) >= 200)
    scene.geometry(model, "rack.lid", meshes, rung)
    before, started = peak(), time.perf_counter()
    exported, problems = scene.geometry(model, "rack", meshes, rung)
    seconds, grown = time.perf_counter() - started, peak() - before
    assert exported is not None and not problems
    geometry = exported.geometry
    size = n_bytes(geometry)
    started = time.perf_counter()
    np.empty(size, np.uint8)[:] = 1
    copied = time.perf_counter() - started
    n = sum(node.mesh >= 0 for node in geometry.nodes)
    print(f"{n} instances, {len(geometry.faces)} triangles, {len(geometry.meshes)} meshes at {rung} mm")
    print(
        f"flattened in {seconds:.2f} s; filling {size / 1e6:.0f} MB takes {copied:.2f} s: {seconds / copied:.1f} times"
    )
    print(f"peak memory grew by {grown:.0f} MB, of which the arrays are {size / 1e6:.0f} MB")


def _faces(model: scene.Model, meshes: KeptMeshes, rung: float) -> int:
    exported, _ = scene.geometry(model, "ball", meshes, rung)
    assert exported is not None
    return len(exported.geometry.faces)


def one_parameter() -> None:
    """How many of 40 parts are built again after a parameter changes that one of them depends on."""
    parts = "".join(
        f"part sheet_{k}\n    add block (40 mm, {k + 10} mm, 2 mm)\n    cut cylinder diameter 5 mm length 2 mm\n\n"
        for k in range(SHEETS - 1)
    )
    places = "".join(f"    place sheet_{k} at (0, 0, {2 * k} mm)\n" for k in range(SHEETS - 1))
    text = (
        f"platewright 1\n\ngiven\n    bore = 5 mm\n\n{parts}part cover\n    add block (40 mm, 40 mm, 2 mm)\n"
        f"    cut cylinder diameter bore length 2 mm\n\nassembly stack\n{places}    place cover at (0, 0, -2 mm)\n"
    )
    project, _ = scene.open_scene("a.plate", lambda name: text.encode())
    assert project is not None
    meshes = KeptMeshes()
    for bore in ("5 mm", "6 mm"):
        before, started = meshes.n_built, time.perf_counter()
        model, _ = scene.build(project, settings=(("bore", bore),))
        assert model is not None
        scene.geometry(model, "stack", meshes, 0.01)
        print(
            f"bore = {bore}: {meshes.n_built - before} of {SHEETS} parts built, {time.perf_counter() - started:.3f} s"
        )


if __name__ == "__main__":
    print(f"idle process: {peak():.0f} MB")
    instances()
    one_parameter()

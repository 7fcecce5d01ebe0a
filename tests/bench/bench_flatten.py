"""Flattening: 10 000 copies of 200 triangles to world space, and evaluation, beside plain numpy in the same run.

    python tests/bench/bench_flatten.py [ROUNDS]

The yardstick for flattening is the least any program must do: every vertex through its matrix, every triangle's
corners renumbered, in bare numpy with the same results in memory. For evaluation it is Python's own evaluation of the
same sums. Memory is the peak that tracemalloc sees, in a pass of its own. Each row is the median of the rounds, the
sides of a ratio taken in turn.
"""

from __future__ import annotations

import statistics
import sys
import time
import tracemalloc
from collections.abc import Callable
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from platewright.backend.contract import Mesh
from platewright.compiler import scene
from platewright.compiler.flatten import Flattened, flatten
from platewright.lang.problems import is_error
from support.scenes import MAIN, Meshes, built, loader

COPIES, SECONDS, MEGABYTES = 10_000, 2.0, 300.0
PIN = "part pin\n    add cylinder diameter 10 mm length 20 mm\n"


def model(line: str) -> str:
    return PIN + f"assembly field\n    place pin {line}\n"


def mesh_of_about(n_faces: int) -> tuple[float, Mesh]:
    """A rung at which the pin has the number of triangles nearest to the one asked for."""
    meshes = Meshes()
    run = built(PIN)
    assert run.model is not None
    recipe = run.model.built.things["pin"].recipe  # type: ignore[union-attr]
    best: tuple[int, float, Mesh] | None = None
    for rung in (0.1, 0.05, 0.02, 0.01, 0.005, 0.002, 0.001):
        mesh, _ = meshes(recipe, rung)
        assert mesh is not None
        if best is None or abs(len(mesh.faces) - n_faces) < best[0]:
            best = (abs(len(mesh.faces) - n_faces), rung, mesh)
    assert best is not None
    return best[1], best[2]


def bare(mesh: Mesh, placements: np.ndarray) -> tuple[np.ndarray, ...]:
    """Vertices and triangles of all copies, nothing else."""
    vertices = np.einsum("kij,nj->kni", placements[:, :3, :3], mesh.vertices) + placements[:, None, :3, 3]
    start = (np.arange(len(placements)) * len(mesh.vertices)).astype(np.int32)
    faces = mesh.faces[None] + start[:, None, None]
    return vertices.reshape(-1, 3), faces.reshape(-1, 3)


def seconds(work: Callable[[], object]) -> float:
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def row(name: str, ours: Callable[[], object], yardstick: Callable[[], object], rounds: int) -> None:
    """Print one row: medians and their ratio."""
    pairs = [(seconds(ours), seconds(yardstick)) for _ in range(rounds)]
    mine, other = statistics.median(a for a, _ in pairs), statistics.median(b for _, b in pairs)
    print(f"{name:<52} {1000 * mine:9.1f} ms {1000 * other:9.1f} ms  x {mine / other:7.2f}")


def sums(n: int) -> list[tuple[float, float]]:
    """What the evaluated lines compute, in Python itself."""
    return [(i * 12.0, 12.0 * (i % 7)) for i in range(1, n + 1)]


def plate(n: int) -> str:
    """A scene of about n lines: parameters, parts with a cut, an assembly of them all, one figure."""
    parts = max(1, (n - 8) // 6)
    lines = ["given", "    span = 40 mm"]
    for k in range(parts):
        lines += [f"part p{k}(d = span / {k + 2})", "    add cylinder diameter d length span"]
        lines += ["    cut cylinder diameter d / 2 length span", "    mark tip at (0, 0, span)"]
    lines += ["assembly all", *(f"    place p{k} at ({k} * span * 2, 0, 0)" for k in range(parts))]
    lines += ["figure f", "    show all", "    width 120 mm at most 100 mm"]
    return "\n".join(lines) + "\n"


def check(text: str, meshes: Meshes) -> None:
    """What `check --figures` does once everything is imported."""
    project, problems = scene.open_scene(MAIN, loader({MAIN: text}))
    assert project is not None and not problems
    found, problems = scene.build(project)
    assert found is not None and not problems
    errors = [each for each in (*scene.prove(found, meshes), *scene.judge(found, meshes)) if is_error(each)]
    assert not errors
    assert scene.plan(found, "f", meshes)[0] is not None


def rows_of_check(n: int, rounds: int) -> None:
    """Checking a scene of about n lines, beside opening it."""
    text, meshes = plate(n), Meshes()
    check(text, meshes)
    load = loader({MAIN: text})

    def opened() -> object:
        return scene.open_scene(MAIN, load)

    row(f"check {n} lines, meshes kept / opening alone", lambda: check(text, meshes), opened, rounds)
    row(f"check {n} lines, nothing kept / opening alone", lambda: check(text, Meshes()), opened, max(1, rounds // 2))


def main() -> None:
    """Run all rows."""
    rounds = int(sys.argv[1]) if len(sys.argv) > 1 else 5
    rung, mesh = mesh_of_about(200)
    run = built(model(f"row 100 by (20 mm, 0, 0) row {COPIES // 100} by (0, 20 mm, 0)"))
    assert run.model is not None
    field, sources = run.model.built.things["field"], run.model.built.sources

    def whole() -> Flattened:
        found, problems = flatten(field, "field", rung, sources, run.meshes)
        assert found is not None and not problems
        return found

    flattened = whole()
    placements = np.stack([node.placement for node in flattened.geometry.nodes if node.mesh >= 0])
    print(f"{COPIES:,} copies of {len(mesh.faces)} triangles; ours, yardstick, ratio ({rounds} rounds)")
    row("flatten (aim: at most 2 s)", whole, lambda: bare(mesh, placements), rounds)
    mirrored = built(model(f"row 100 by (20 mm, 0, 0) row {COPIES // 100} by (0, 20 mm, 0) mirrored across x"))
    assert mirrored.model is not None
    other = mirrored.model.built.things["field"]
    row(
        "flatten, all copies mirrored",
        lambda: flatten(other, "field", rung, mirrored.model.built.sources, run.meshes) if mirrored.model else None,
        lambda: bare(mesh, placements),
        rounds,
    )
    evaluated = model(f"at (i * 12 mm, 12 mm * (i - 7 * floor(i / 7)), 0) for i from 1 to {COPIES}")
    row(f"evaluate {COPIES:,} copies of a `for`", lambda: built(evaluated), lambda: sums(COPIES), rounds)
    for n in (200, 2000):
        rows_of_check(n, rounds)
    tracemalloc.start()
    kept = whole()
    peak = tracemalloc.get_traced_memory()[1] / 1e6
    tracemalloc.stop()
    arrays = sum(
        each.nbytes
        for each in (kept.geometry.vertices, kept.geometry.faces, kept.geometry.corner_normals, kept.geometry.edge_kind)
    )
    print(f"peak memory of one flattening {peak:.0f} MB (aim: at most 300 MB), its large arrays {arrays / 1e6:.0f} MB")


if __name__ == "__main__":
    main()

"""Booleans: a recipe to a finished mesh against the same tree of the same triangles in bare manifold3d.

    python tests/bench/bench_booleans.py [ROUNDS]

Ours is the whole of `build`: tessellation, provenance, placements, the boolean, patches, edge kinds, exact normals,
checks. Bare is the same placed shapes in one lazy tree, evaluated and read back as arrays. `without tessellation`
starts from ready shells on both sides; `with` lets bare make its cylinders and spheres by its own constructors, of as
many triangles. Each row is the median of the rounds, the sides of a ratio taken in turn.
"""

from __future__ import annotations

import math
import statistics
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass

import manifold3d
import numpy as np
from manifold3d import Manifold, OpType
from platewright.compiler.solids import build as building
from platewright.compiler.solids import transform
from platewright.compiler.solids.ladder import divisions
from platewright.compiler.solids.recipe import Affine, Block, Cylinder, Placed, Primitive, Recipe, Sphere, Step
from platewright.compiler.solids.tessellate import tessellate

MUST, AIM = 1.15, 1.05


@dataclass(frozen=True, slots=True)
class Case:
    """A block or ball, the shape cut from it, where, and the chord error."""

    name: str
    body: Primitive
    tool: Primitive
    places: tuple[Affine, ...]
    rung: float

    def recipe(self) -> Recipe:
        added = Placed(self.body, (transform.IDENTITY,), 0)
        return Recipe((Step("add", (added,)), Step("cut", (Placed(self.tool, self.places, 1),))))


def grid(n: int) -> tuple[Affine, ...]:
    """Places of n by n holes, 10 mm apart."""
    middle = 5.0 * (n - 1)
    return tuple(transform.translate((10.0 * i - middle, 10.0 * j - middle, -2.5)) for i in range(n) for j in range(n))


def ready(shape: Primitive, rung: float) -> Manifold:
    """Our triangles as a bare solid."""
    shell = tessellate(shape, rung)
    return Manifold(manifold3d.Mesh64(shell.vertices, shell.faces.astype(np.uint64)))


def constructed(shape: Primitive, rung: float) -> Manifold:
    """The library's own constructor, as many triangles."""
    if isinstance(shape, Block):
        x, y, z = shape.size
        return Manifold.cube(shape.size).translate((-x / 2, -y / 2, 0.0 * z))
    if isinstance(shape, Cylinder):
        r = shape.diameter / 2
        return Manifold.cylinder(shape.length, r, r, divisions(r, rung))
    assert isinstance(shape, Sphere)
    # The library divides an octahedron into n²/2 triangles, ours is a grid of n (n - 2).
    n = divisions(shape.diameter / 2, rung)
    return Manifold.sphere(shape.diameter / 2, 4 * round(n * math.sqrt(2.0) / 4))


def bare(body: Manifold, tool: Manifold, places: tuple[Affine, ...]) -> int:
    """The tree in one lazy evaluation, read back."""
    tools = [tool.transform(np.array(place)) for place in places]
    mesh = Manifold.batch_boolean([body, *tools], OpType.Subtract).to_mesh64()
    return len(np.asarray(mesh.tri_verts))


def seconds(work: Callable[[], object]) -> float:
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def measure(case: Case, rounds: int) -> None:
    """Print one case's rows."""
    recipe = case.recipe()
    ours, tessellated, theirs, made = [], [], [], []
    for _ in range(rounds):
        tessellated.append(seconds(lambda: [tessellate(shape, case.rung) for shape in (case.body, case.tool)]))
        ours.append(seconds(lambda: building.build(recipe, case.rung)))
        theirs.append(seconds(lambda: bare(ready(case.body, case.rung), ready(case.tool, case.rung), case.places)))
        made.append(
            seconds(lambda: bare(constructed(case.body, case.rung), constructed(case.tool, case.rung), case.places))
        )
    mesh, _ = building.build(recipe, case.rung)
    assert mesh is not None
    # `ready` tessellates too, so it is taken off both sides.
    plain = [(o - t) / (b - t) for o, t, b in zip(ours, tessellated, theirs, strict=True)]
    whole = [o / b for o, b in zip(ours, made, strict=True)]
    print(f"{case.name}: {len(mesh.faces)} triangles, ours {1e3 * statistics.median(ours):.1f} ms")
    print(f"    without tessellation {statistics.median(plain):.3f}   (must {MUST}, aim {AIM})")
    took = f"ours takes {1e3 * statistics.median(tessellated):.1f} ms"
    print(f"    with tessellation    {statistics.median(whole):.3f}   ({took})")


def main() -> None:
    rounds = int(sys.argv[1]) if len(sys.argv) > 1 else 9
    plate, large = Block((100.0, 100.0, 5.0)), Block((300.0, 300.0, 5.0))
    cases = (
        Case("plate less 100 cylinders of 32 sides", plate, Cylinder(6.0, 10.0), grid(10), 0.02),
        Case("plate less 100 cylinders of 64 sides", plate, Cylinder(6.0, 10.0), grid(10), 0.004),
        Case("plate less 900 cylinders of 32 sides", large, Cylinder(6.0, 10.0), grid(30), 0.02),
        Case(
            "ball less ball, 125 k triangles left",
            Sphere(100.0),
            Sphere(100.0),
            (transform.translate((50, 10, 10)),),
            0.002,
        ),
    )
    for case in cases:
        measure(case, rounds)


if __name__ == "__main__":
    main()

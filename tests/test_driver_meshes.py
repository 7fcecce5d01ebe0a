"""What a run keeps of solids: nothing is built twice or finished unasked, and no byte depends on it."""

from __future__ import annotations

from platewright.backend.contract import Mesh
from platewright.compiler import scene
from platewright.compiler.driver.meshes import KeptMeshes
from platewright.compiler.solids import transform
from platewright.compiler.solids.bounds import bounds
from platewright.compiler.solids.build import build
from platewright.compiler.solids.flaw import Flaw
from platewright.compiler.solids.recipe import Block, Cylinder, Recipe, Sphere
from support.recipes import add, cut
from support.scenes import built

RUNG = 0.05
PLATE = Recipe((add(Block((20.0, 20.0, 4.0))), cut(Cylinder(6.0, 9.0), transform.translate((2.0, 1.0, -2.0)))))
APART = Recipe((add(Sphere(2.0), transform.IDENTITY, transform.translate((9.0, 0.0, 0.0))),))
EMPTY = Recipe((add(Sphere(2.0)), cut(Sphere(3.0))))


class Counted(KeptMeshes):
    """Counts the meshes that are asked for."""

    def __init__(self) -> None:
        super().__init__()
        self.n_asked = 0

    def __call__(self, recipe: Recipe, rung: float) -> tuple[Mesh | None, tuple[Flaw, ...]]:
        self.n_asked += 1
        return super().__call__(recipe, rung)


def test_flaws_and_mesh_come_of_one_building() -> None:
    kept = KeptMeshes()
    for n, recipe in enumerate((PLATE, APART, EMPTY), 1):
        mesh, flaws = build(recipe, RUNG)
        assert kept.flaws(recipe, RUNG) == flaws
        first, again = kept(recipe, RUNG), kept(recipe, RUNG)
        assert first[1] == again[1] == kept.flaws(recipe, RUNG) == flaws
        assert first[0] is again[0]
        assert (first[0] is None) == (mesh is None)
        if mesh is not None and first[0] is not None:
            assert first[0].vertices.tobytes() == mesh.vertices.tobytes()
            assert first[0].faces.tobytes() == mesh.faces.tobytes()
            assert first[0].corner_normals.tobytes() == mesh.corner_normals.tobytes()
        assert kept.n_built == n
        assert kept.box(recipe) == kept.box(recipe) == bounds(recipe)
    kept(PLATE, 2.0 * RUNG)
    assert kept.n_built == 4


def test_parts_whose_boxes_are_apart_are_proved_without_a_mesh() -> None:
    text = (
        "platewright 1\n\npart plate\n    add block (9 mm, 9 mm, 2 mm)\n    cut cylinder diameter 3 mm length 2 mm\n\n"
        "assembly pile\n    place plate\n    place plate at (0, 0, {height} mm) as upper\n"
    )
    asked = {}
    for height in (2, 40):
        run, meshes = built(text.format(height=height)), Counted()
        assert run.model is not None
        codes = [problem.code for problem in scene.prove(run.model, meshes)]
        assert codes == ([] if height == 2 else ["floating-part"])
        asked[height] = meshes.n_asked
    assert asked[2] > 0
    assert asked[40] == 0

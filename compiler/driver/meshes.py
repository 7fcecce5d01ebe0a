"""What is kept of solids for one run: figures and variants that share a part, or parts that share a shape, share it."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from platewright.backend.contract import Mesh
    from platewright.compiler.solids.blank import Blank
    from platewright.compiler.solids.build import Unfinished
    from platewright.compiler.solids.flaw import Flaw
    from platewright.compiler.solids.recipe import Point3, Primitive, Recipe

_MOST_FACES = 10_000_000
"""Triangles kept before all are let go: about 1.5 GB."""


class KeptMeshes:
    """A mesher (`compiler.flatten.Prover`) that builds each recipe at each rung once. Results never depend on it.

    `n_built` counts what has been built, finished or not.
    """

    def __init__(self) -> None:
        self.n_built = 0
        self._boxes: dict[Recipe, tuple[Point3, Point3]] = {}
        self._blanks: dict[tuple[Primitive, float], Blank] = {}
        self._kept: dict[tuple[Recipe, float], tuple[Mesh | Unfinished | None, tuple[Flaw, ...]]] = {}
        self._n_faces = 0

    def __call__(self, recipe: Recipe, rung: float) -> tuple[Mesh | None, tuple[Flaw, ...]]:
        """The mesh at that chord error in mm, or None, with what is wrong with the recipe."""
        from platewright.compiler.solids.build import Unfinished

        found, flaws = self._found(recipe, rung)
        if isinstance(found, Unfinished):
            found = found.mesh()
            self._kept[recipe, rung] = found, flaws
        return found, flaws

    def flaws(self, recipe: Recipe, rung: float) -> tuple[Flaw, ...]:
        """What is wrong with the recipe at that chord error in mm; no mesh is finished for it."""
        return self._found(recipe, rung)[1]

    def box(self, recipe: Recipe) -> tuple[Point3, Point3]:
        """The box round the solid, as `solids.bounds.bounds` has it."""
        from platewright.compiler.solids.bounds import bounds

        if recipe not in self._boxes:
            self._boxes[recipe] = bounds(recipe)
        return self._boxes[recipe]

    def _found(self, recipe: Recipe, rung: float) -> tuple[Mesh | Unfinished | None, tuple[Flaw, ...]]:
        from platewright.compiler.solids.build import combine

        if (recipe, rung) not in self._kept:
            if self._n_faces > _MOST_FACES:
                self._kept.clear()
                self._blanks.clear()
                self._n_faces = 0
            unfinished, flaws = combine(recipe, rung, self._blank)
            self.n_built += 1
            self._kept[recipe, rung] = unfinished, flaws
            self._n_faces += 0 if unfinished is None else unfinished.n_faces
        return self._kept[recipe, rung]

    def _blank(self, shape: Primitive, rung: float) -> Blank:
        from platewright.compiler.solids.blank import blank

        if (shape, rung) not in self._blanks:
            self._blanks[shape, rung] = blank(shape, rung)
            self._n_faces += len(self._blanks[shape, rung].shell.faces)
        return self._blanks[shape, rung]

"""Meshes kept for one run: figures and variants that share a part share its mesh."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from platewright.backend.contract import Mesh
    from platewright.compiler.solids.flaw import Flaw
    from platewright.compiler.solids.recipe import Recipe

_MOST_FACES = 10_000_000
"""Triangles kept before all are let go: about 1.5 GB."""


class KeptMeshes:
    """A mesher (`compiler.flatten.Mesher`) that builds each recipe at each rung once. Results never depend on it.

    `n_built` counts what has been built.
    """

    def __init__(self) -> None:
        self.n_built = 0
        self._kept: dict[tuple[Recipe, float], tuple[Mesh | None, tuple[Flaw, ...]]] = {}
        self._n_faces = 0

    def __call__(self, recipe: Recipe, rung: float) -> tuple[Mesh | None, tuple[Flaw, ...]]:
        """The mesh at that chord error in mm, or None, with what is wrong with the recipe."""
        if (recipe, rung) not in self._kept:
            self._keep(recipe, rung)
        return self._kept[recipe, rung]

    def _keep(self, recipe: Recipe, rung: float) -> None:
        from platewright.compiler.solids.build import build

        if self._n_faces > _MOST_FACES:
            self._kept.clear()
            self._n_faces = 0
        mesh, flaws = build(recipe, rung)
        self.n_built += 1
        self._kept[recipe, rung] = mesh, flaws
        self._n_faces += 0 if mesh is None else len(mesh.faces)

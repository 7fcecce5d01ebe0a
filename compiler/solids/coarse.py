"""What stays coarser than the chord error that a mesh was asked for: surfaces whose functions no grid can follow."""

from __future__ import annotations

from collections.abc import Iterator

from .flaw import Flaw
from .recipe import Envelope, ParametricSurface, Placed, Recipe, Relief
from .sheets import MOST_CELLS, finer_flaws, strays
from .transform import largest_scale


def coarse_surfaces(recipe: Recipe, rung: float) -> tuple[Flaw, ...]:
    """Warnings for reliefs and sheets whose triangles lie further than `rung` mm from their functions, and errors for
    those whose functions have no value, or sink to the base, where only so fine a division looks.

    Cost: the division of each such shape; a walk where there are none.
    """
    found: dict[Flaw, None] = {}
    for placed, grown in _surfaces(recipe, 1.0, set()):
        assert isinstance(placed.shape, Relief | ParametricSurface)
        wrong = finer_flaws(placed.shape, rung / grown)
        if wrong:
            found.update((Flaw(w.code, placed.source, w.sentence, w.hint), None) for w in wrong)
            continue
        off = strays(placed.shape, rung / grown) * grown
        if off > rung * (1.0 + 1e-9):
            what = "relief" if isinstance(placed.shape, Relief) else "surface"
            sentence = (
                f"the {what} strays up to {off:.3g} mm from its function: it has at most {MOST_CELLS} cells a side"
            )
            hint = "make it smoother, or of several smaller ones; a step becomes a slope one cell wide"
            found[Flaw("coarse-surface", placed.source, sentence, hint, is_error=False)] = None
    return tuple(found)


def _surfaces(recipe: Recipe, grown: float, seen: set[tuple[int, float]]) -> Iterator[tuple[Placed, float]]:
    """Reliefs and sheets of a recipe and of those within it, and how much each is enlarged at most."""
    if (id(recipe), grown) in seen:
        return
    seen.add((id(recipe), grown))
    for placed in (placed for step in recipe.steps for placed in step.placed):
        if isinstance(placed.shape, Recipe):
            yield from _surfaces(placed.shape, grown * _scale(placed), seen)
        elif isinstance(placed.shape, Envelope):
            inside = grown * _scale(placed)
            yield from ((each, inside * _scale(each)) for each in placed.shape.placed if _is_surface(each))
        elif _is_surface(placed):
            yield placed, grown * _scale(placed)


def _is_surface(placed: Placed) -> bool:
    return isinstance(placed.shape, Relief | ParametricSurface)


def _scale(placed: Placed) -> float:
    return max((largest_scale(placement) for placement in placed.placements), default=1.0)

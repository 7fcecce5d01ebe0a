"""Extreme positions: which parts stand elsewhere, or look otherwise, at other values, drawn as well (ISO 128-3)."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from msgspec import Struct
from platewright.backend import contract
from platewright.backend.contract import F64
from platewright.lang.problems import is_error
from platewright.lang.source import Span

from .emphasis import Stress, emphasis_of
from .flatten import Flattened, Mesher, flatten
from .graph import Thing
from .mistakes import Mistake, Problems, mistake

SAME_MM = 1e-6
"""Parts whose vertices differ by less than this stand where they stood."""


class Extreme(Struct, frozen=True, eq=False):
    """A figure's subject with other values, and the lines its recipes refer to by row."""

    thing: Thing
    sources: Sequence[Span]
    span: Span


class Moved(Struct, frozen=True, eq=False):
    """The triangles of an extreme position, and the rows of the nodes that differ from the figure's."""

    flattened: Flattened
    rows: tuple[int, ...]

    @property
    def vertices(self) -> F64:
        """World vertices (n,3) of what differs."""
        geometry = self.flattened.geometry
        return np.concatenate([geometry.vertices[slice(*geometry.nodes[row].vertex_range)] for row in self.rows])


def moved_by(
    extreme: Extreme,
    path: str,
    stresses: Sequence[Stress],
    usual: contract.Geometry,
    rung: float,
    mesher: Mesher,
    problems: Problems,
) -> Moved:
    """What differs from the `usual` geometry, whole and assembled, and is not hidden. Raises Mistake if nothing does.

    Cost: that of flattening, and one pass over the vertices.
    """
    flattened, found = flatten(extreme.thing, path, rung, extreme.sources, mesher)
    errors = tuple(problem for problem in found if is_error(problem))
    problems.extend(errors)
    if flattened is None or errors:
        raise Mistake(None)
    geometry = flattened.geometry
    before = {node.path: node for node in usual.nodes if node.mesh >= 0}
    emphasis = emphasis_of(stresses, [node.path for node in geometry.nodes], [node.parent for node in geometry.nodes])
    rows = tuple(
        row
        for row, node in enumerate(geometry.nodes)
        if node.mesh >= 0
        and (emphasis is None or emphasis[row] != contract.Emphasis.HIDE)
        and not _is_same(geometry, node, usual, before.get(node.path))
    )
    if not rows:
        sentence = "nothing stands elsewhere or looks otherwise with these values"
        raise mistake("no-effect", extreme.span, sentence, "set a parameter that moves or changes a part")
    return Moved(flattened, rows)


def renumbered(geometry: contract.Geometry, by: int) -> contract.Geometry:
    """A geometry with the rows of its materials raised by a number."""
    nodes = (replace(node, material=node.material + by) if node.mesh >= 0 else node for node in geometry.nodes)
    return replace(geometry, nodes=tuple(nodes))


def _is_same(
    geometry: contract.Geometry, node: contract.Node, usual: contract.Geometry, other: contract.Node | None
) -> bool:
    if other is None:
        return False
    ours = geometry.vertices[slice(*node.vertex_range)]
    theirs = usual.vertices[slice(*other.vertex_range)]
    return ours.shape == theirs.shape and bool((np.abs(ours - theirs) < SAME_MM).all())

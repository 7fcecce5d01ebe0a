"""The scene graph: solids and assemblies with all parameters fixed, shared by every copy that is placed of them.

An assembly names its occurrences; an occurrence holds one copy or many. Walking the graph from a root gives the
part tree with its stable paths; nothing is expanded before that.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import TypeAlias

from msgspec import Struct, field
from platewright.lang.source import Span

from .materials import Surface
from .solids.recipe import Affine, Recipe
from .solids.transform import IDENTITY, compose

Point = tuple[float, float, float]


class Mark(Struct, frozen=True):
    """A named point of a thing in the thing's own frame, with an axis where one is given."""

    name: str
    point: Point
    axis: Point | None
    span: Span


class FeatureCopy(Struct, frozen=True):
    """What one `add` or `cut` line made, in the part's frame: middle, axis, end of the axis, diameter if it is
    round, and what stands in brackets behind its name.
    """

    label: str
    centre: Point
    axis: Point
    top: Point
    diameter: float | None


class Feature(Struct, frozen=True):
    """A named feature of a part and its copies; none where its `when` held for no copy."""

    name: str
    copies: tuple[FeatureCopy, ...]
    span: Span


class Thread(Struct, frozen=True):
    """A thread that is drawn by convention, in the part's frame: the middle of one end, the unit axis, sizes in mm."""

    start: Point
    axis: Point
    length: float
    major: float
    minor: float
    pitch: float
    internal: bool
    left: bool


class Uncut(Struct, frozen=True):
    """Says that sections leave a part whole; with an `axis` of its own frame, only those that run along it."""

    axis: Point | None = None


class Solid(Struct, frozen=True, eq=False):
    """A part with its parameters fixed.

    `n_shapes` counts the shapes it is made of, with all copies; `n_levels` the parts within parts, itself among them.
    """

    name: str
    recipe: Recipe
    surface: Surface
    marks: tuple[Mark, ...]
    features: tuple[Feature, ...]
    span: Span
    n_shapes: int = field(default=1)
    n_levels: int = field(default=1)
    threads: tuple[Thread, ...] = ()
    uncut: Uncut | None = None


class Copy(Struct, frozen=True):
    """One placed copy: its label (`""` for a single one, else what stands in brackets), the thing, and its place."""

    label: str
    thing: Thing
    placement: Affine


class Occurrence(Struct, frozen=True):
    """One `place` line: a name and its copies; none where its `when` held for no copy.

    `explodes` is a vector in the assembly's frame, one for each copy.
    """

    name: str
    copies: tuple[Copy, ...]
    explodes: tuple[Point, ...]
    span: Span


class Assembly(Struct, frozen=True, eq=False):
    """An assembly with its parameters fixed.

    `n_nodes` counts everything below it and itself, `n_levels` the things within things.
    """

    name: str
    occurrences: tuple[Occurrence, ...]
    marks: tuple[Mark, ...]
    span: Span
    n_nodes: int = field(default=1)
    n_levels: int = field(default=1)


Thing: TypeAlias = Solid | Assembly


class Entry(Struct, frozen=True):
    """One entry of the walked tree. `placement` maps the thing's frame to the root's; parents come before children."""

    path: str
    name: str
    parent: int
    thing: Thing
    placement: Affine
    span: Span


def walk(root: Thing, name: str) -> Iterator[Entry]:
    """Every entry from the root down, depth first in the order written. Cost: linear in the number of entries."""
    index = 0
    pending: list[tuple[str, str, int, Thing, Affine, Span]] = [(name, name, -1, root, IDENTITY, root.span)]
    while pending:
        path, short, parent, thing, placement, span = pending.pop()
        yield Entry(path, short, parent, thing, placement, span)
        if isinstance(thing, Assembly):
            below = [
                (
                    f"{path}.{bracketed(occurrence.name, copy.label)}",
                    bracketed(occurrence.name, copy.label),
                    index,
                    copy.thing,
                    compose(placement, copy.placement),
                    occurrence.span,
                )
                for occurrence in thing.occurrences
                for copy in occurrence.copies
            ]
            pending.extend(reversed(below))
        index += 1


def bracketed(name: str, label: str) -> str:
    """`name`, or `name[label]` where there is a label."""
    return f"{name}[{label}]" if label else name


def count_nodes(thing: Thing) -> int:
    """How many entries a walk from here yields, without walking."""
    return 1 if isinstance(thing, Solid) else thing.n_nodes

"""What a solid is made from: shapes, where each stands, and in which order they join, cut and keep.

Everything here is evaluated: lengths in mm, angles in degrees, placements as (3,4) row tuples that map
a shape's own frame to the part's frame. Values are frozen and hashable; equal recipes give equal meshes.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Point2 = tuple[float, float]
Point3 = tuple[float, float, float]
Affine = tuple[tuple[float, float, float, float], tuple[float, float, float, float], tuple[float, float, float, float]]


@dataclass(frozen=True, slots=True)
class LineTo:
    """A straight stretch to `end`."""

    end: Point2


@dataclass(frozen=True, slots=True)
class ArcTo:
    """A circular stretch to `end` round `centre`; `left` turns counter-clockwise."""

    end: Point2
    centre: Point2
    left: bool


@dataclass(frozen=True, slots=True)
class Loop:
    """A closed plane curve from `start`; if the last stretch does not end there, a straight one closes it.

    A full circle is one `ArcTo` whose end is the start.
    """

    start: Point2
    stretches: tuple[LineTo | ArcTo, ...]


@dataclass(frozen=True, slots=True)
class Outline:
    """An outer loop and the loops of its holes, in any winding."""

    outer: Loop
    holes: tuple[Loop, ...] = ()


@dataclass(frozen=True, slots=True)
class Block:
    """Sides along x, y, z; centre of the base at the origin."""

    size: Point3


@dataclass(frozen=True, slots=True)
class Wedge:
    """A block whose top is `top_length` long in x.

    From 0 (a sharp ridge) up, its slope on the +x side (ISO 10303-42 right angular wedge).
    """

    size: Point3
    top_length: float


@dataclass(frozen=True, slots=True)
class Cylinder:
    """Base centre at the origin, axis z."""

    diameter: float
    length: float


@dataclass(frozen=True, slots=True)
class Cone:
    """Base centre at the origin, axis z; `top` is the upper diameter, 0 for a point."""

    diameter: float
    top: float
    length: float


@dataclass(frozen=True, slots=True)
class Sphere:
    """Centred at the origin."""

    diameter: float


@dataclass(frozen=True, slots=True)
class Ellipsoid:
    """Full axes along x, y, z; centred at the origin."""

    axes: Point3


@dataclass(frozen=True, slots=True)
class Torus:
    """`diameter` of the centre circle, `tube` diameter; centred at the origin, axis z."""

    diameter: float
    tube: float


@dataclass(frozen=True, slots=True)
class Prism:
    """A regular prism.

    `across` its flats for an even number of sides, else twice the inscribed radius; a flat faces -y.
    """

    sides: int
    across: float
    length: float


@dataclass(frozen=True, slots=True)
class Pyramid:
    """As `Prism`, running to `top` across (0 for a point) at height `length`."""

    sides: int
    across: float
    top: float
    length: float


@dataclass(frozen=True, slots=True)
class Extrude:
    """The outline's plane is xy; it rises from z = 0."""

    outline: Outline
    length: float


@dataclass(frozen=True, slots=True)
class Revolve:
    """The outline's second axis becomes z, its first the radius, which may not be negative; a full turn."""

    outline: Outline


Primitive = Block | Wedge | Cylinder | Cone | Sphere | Ellipsoid | Torus | Prism | Pyramid | Extrude | Revolve


@dataclass(frozen=True, slots=True)
class Placed:
    """One shape, or another part's recipe, at each of `placements` (a pattern's copies).

    `source` is the row of the author's line in the table that the compiler keeps beside the recipe.
    `centred` puts the middle of a rising shape's length at the origin before it is placed.
    """

    shape: Primitive | Recipe
    placements: tuple[Affine, ...]
    source: int
    centred: bool = False


@dataclass(frozen=True, slots=True)
class Step:
    """One line of the process sheet: the union of `placed` is added, cut, or kept."""

    operation: Literal["add", "cut", "keep"]
    placed: tuple[Placed, ...]


@dataclass(frozen=True, slots=True)
class Recipe:
    """The steps of one part in order. Sources of a nested recipe are rows of the outermost part's table."""

    steps: tuple[Step, ...]

"""A finished drawing: strokes, fills, words and images placed on the page, as every writer takes them.

All lengths are millimetres on the page, x to the right of its left edge, y below its top edge; angles are degrees,
clockwise on the page as y points down. Colours are 8-bit sRGB. Nothing here is dashed: dashes are strokes of their own.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal, TypeAlias

from .contract import F64, U8, LineClass

Point: TypeAlias = tuple[float, float]
Colour: TypeAlias = tuple[int, int, int]

BLACK: Colour = (0, 0, 0)
WHITE: Colour = (255, 255, 255)


@dataclass(frozen=True, eq=False, slots=True)
class Lines:
    """Straight segments through points (k,2) float64, k at least 1, from where the path stands."""

    points: F64


@dataclass(frozen=True, slots=True)
class Arc:
    """An arc of an ellipse to `end`: half axes, the turn of the first one, the longer of two arcs, the direction.

    The fields mean what the flags of an elliptical arc mean in SVG 1.1; an arc never spans a full turn.
    """

    half_axes: tuple[float, float]
    turn: float
    is_large: bool
    is_clockwise: bool
    end: Point


@dataclass(frozen=True, eq=False, slots=True)
class Cubics:
    """Cubic Bezier curves, points (3k,2) float64: two control points and an end each, from where the path stands."""

    points: F64


Piece: TypeAlias = Lines | Arc | Cubics


@dataclass(frozen=True, eq=False, slots=True)
class Path:
    """One open or closed run of pieces. A closed one comes back to `start` by a straight segment if it has not yet."""

    start: Point
    pieces: tuple[Piece, ...]
    is_closed: bool = False


@dataclass(frozen=True, eq=False, slots=True)
class Stroke:
    """A line along a path. `is_round` ends and joins, otherwise flat ends and mitred joins (dashes)."""

    path: Path
    width: float
    line_class: LineClass
    colour: Colour = BLACK
    is_round: bool = True


@dataclass(frozen=True, eq=False, slots=True)
class Fill:
    """An area within closed paths by the even-odd rule."""

    paths: tuple[Path, ...]
    colour: Colour


@dataclass(frozen=True, slots=True)
class Words:
    """A text on one base line. `origin` is the left end of the base line, `height` the capitals', `turn` about it."""

    text: str
    origin: Point
    height: float
    turn: float = 0.0
    colour: Colour = BLACK
    face: Literal["sans", "sans bold"] = "sans"


@dataclass(frozen=True, eq=False, slots=True)
class Image:
    """Pixels (rows, columns, 3) uint8 sRGB over the rectangle (left, top, width, height)."""

    pixels: U8
    place: tuple[float, float, float, float]


Mark: TypeAlias = Stroke | Fill | Words | Image


@dataclass(frozen=True, eq=False, slots=True)
class Group:
    """Marks and groups painted in order, under a name that stays the same over revisions.

    `kind` says what is grouped; `name` is a part path, a line class, a panel. `clip` (k,2) is a convex polygon.
    """

    kind: Literal["panel", "fills", "part", "class", "image", "words"]
    name: str
    items: tuple[Group | Mark, ...]
    clip: F64 | None = None


@dataclass(frozen=True, eq=False, slots=True)
class Drawing:
    """One page: its size in mm, groups from back to front, and the words that go with it."""

    width: float
    height: float
    groups: tuple[Group, ...]
    title: str = ""
    alt: str = ""
    description: str = ""
    language: str = ""
    notes: tuple[str, ...] = field(default=())

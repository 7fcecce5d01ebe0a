"""What a solid is made from: shapes, where each stands, and in which order they join, cut and keep.

Everything here is evaluated: lengths in mm, angles in degrees, placements as (3,4) row tuples that map
a shape's own frame to the part's frame. Values are frozen and hashable; equal recipes give equal meshes.
"""

from __future__ import annotations

from typing import Literal

from msgspec import Struct

Point2 = tuple[float, float]
Point3 = tuple[float, float, float]
Affine = tuple[tuple[float, float, float, float], tuple[float, float, float, float], tuple[float, float, float, float]]


class LineTo(Struct, frozen=True):
    """A straight stretch to `end`."""

    end: Point2


class ArcTo(Struct, frozen=True):
    """A circular stretch to `end` round `centre`; `left` turns counter-clockwise."""

    end: Point2
    centre: Point2
    left: bool


class SplineTo(Struct, frozen=True):
    """A C2 cubic spline from here through `points`, chord lengths its parameter (`cubic.bezier_pieces`).

    It starts along `tangent` and ends along `end_tangent`, without bending where they are None, and closes smoothly
    where it is a whole loop.
    """

    points: tuple[Point2, ...]
    tangent: Point2 | None = None
    end_tangent: Point2 | None = None

    @property
    def end(self) -> Point2:
        """The last point."""
        return self.points[-1]


class EllipseTo(Struct, frozen=True):
    """A stretch of an ellipse to `end`, by its half axes, the first `turn` degrees from x; the end at the start is all
    of it.
    """

    end: Point2
    centre: Point2
    axes: tuple[float, float]
    turn: float
    left: bool


class BezierTo(Struct, frozen=True):
    """Cubic Bezier curves that go on smoothly, two control points and an end each: 3k points."""

    points: tuple[Point2, ...]

    @property
    def end(self) -> Point2:
        """The last point."""
        return self.points[-1]


Stretch = LineTo | ArcTo | SplineTo | EllipseTo | BezierTo


class Loop(Struct, frozen=True):
    """A closed plane curve from `start`; if the last stretch does not end there, a straight one closes it.

    A full circle is one `ArcTo` whose end is the start.
    """

    start: Point2
    stretches: tuple[Stretch, ...]


class Outline(Struct, frozen=True):
    """An outer loop and the loops of its holes, in any winding."""

    outer: Loop
    holes: tuple[Loop, ...] = ()


class Block(Struct, frozen=True):
    """Sides along x, y, z; centre of the base at the origin."""

    size: Point3


class Wedge(Struct, frozen=True):
    """A block whose top is `top_length` long in x.

    From 0 (a sharp ridge) up, its slope on the +x side (ISO 10303-42 right angular wedge).
    """

    size: Point3
    top_length: float


class Cylinder(Struct, frozen=True):
    """Base centre at the origin, axis z."""

    diameter: float
    length: float


class Cone(Struct, frozen=True):
    """Base centre at the origin, axis z; `top` is the upper diameter, 0 for a point."""

    diameter: float
    top: float
    length: float


class Sphere(Struct, frozen=True):
    """Centred at the origin."""

    diameter: float


class Ellipsoid(Struct, frozen=True):
    """Full axes along x, y, z; centred at the origin."""

    axes: Point3


class Torus(Struct, frozen=True):
    """`diameter` of the centre circle, `tube` diameter; centred at the origin, axis z."""

    diameter: float
    tube: float


class Prism(Struct, frozen=True):
    """A regular prism.

    `across` its flats for an even number of sides, else twice the inscribed radius; a flat faces -y.
    """

    sides: int
    across: float
    length: float


class Pyramid(Struct, frozen=True):
    """As `Prism`, running to `top` across (0 for a point) at height `length`."""

    sides: int
    across: float
    top: float
    length: float


class Extrude(Struct, frozen=True):
    """The outline's plane is xy; it rises from z = 0.

    Its walls lean inward by `taper` degrees, parallel outlines all the way; it turns by `twist` degrees as it rises.
    """

    outline: Outline
    length: float
    taper: float = 0.0
    twist: float = 0.0


class Revolve(Struct, frozen=True):
    """The outline's second axis becomes z, its first the radius, which may not be negative; turned by `angle` degrees
    from the x axis, with plane ends if that is less than 360.
    """

    outline: Outline
    angle: float = 360.0


class Edged(Struct, frozen=True):
    """A shape with its edges rounded by a radius or chamfered, `size` being the length taken off either side.

    All edges of a block, wedge, cylinder, cone, prism or pyramid; those round the two ends of an extrusion; the
    outer ones of a revolution.
    """

    shape: Block | Wedge | Cylinder | Cone | Prism | Pyramid | Extrude | Revolve
    kind: Literal["rounded", "chamfered"]
    size: float


class SpaceLineTo(Struct, frozen=True):
    """A straight stretch to `end`; above 0, `bend` is the radius of the arc that rounds the corner there."""

    end: Point3
    bend: float = 0.0


class SpaceArcTo(Struct, frozen=True):
    """A circular stretch through a point to `end`."""

    through: Point3
    end: Point3


class SpaceSplineTo(Struct, frozen=True):
    """A C2 cubic spline from here through `points`, chord lengths its parameter (`spine.spline`).

    It takes over the direction of the stretch before it and, if that is straight or an arc, of the one after it; a
    free end is natural, and one spline back to the start of its path is periodic.
    """

    points: tuple[Point3, ...]


class Helix(Struct, frozen=True):
    """A whole path about z from (diameter/2, 0, 0) upward; `left` turns clockwise as it rises."""

    diameter: float
    pitch: float
    turns: float
    left: bool = False


class SpacePath(Struct, frozen=True):
    """A curve in space from `start`; closed if its last stretch ends there. A helix stands alone."""

    start: Point3
    stretches: tuple[SpaceLineTo | SpaceArcTo | SpaceSplineTo | Helix, ...]


class Sweep(Struct, frozen=True):
    """The outline carried along the path in a frame that does not turn about it, but for `twist` degrees in all.

    At the start the outline's plane stands square to the path, its axes as `transform.facing` tips x and y.
    """

    outline: Outline
    path: SpacePath
    twist: float = 0.0


class Tube(Struct, frozen=True):
    """A round tube along the path, a rod if the bore is 0."""

    path: SpacePath
    diameter: float
    bore: float = 0.0


class Spring(Struct, frozen=True):
    """A coil about z by its mean diameter, with open ends; `length` from end to end of its wire, from z = 0."""

    diameter: float
    wire: float
    turns: float
    length: float
    left: bool = False


class Bellows(Struct, frozen=True):
    """A corrugated tube about z from z = 0 by its outer diameter and bore, its ends in the middle of a root."""

    diameter: float
    bore: float
    convolutions: int
    length: float
    thickness: float


class Transition(Struct, frozen=True):
    """From one outline at z = 0 to another at `length`: their common envelope where both are convex."""

    lower: Outline
    upper: Outline
    length: float


class Thread(Struct, frozen=True):
    """A screw thread of the basic profile of ISO 68-1, base centre at the origin, axis z.

    `major` is its diameter, `internal` says that it is the wall of a hole, `left` its hand. A plain cylinder over its
    crests stands for it unless it is `real`.
    """

    major: float
    pitch: float
    length: float
    left: bool = False
    internal: bool = False
    real: bool = False


class Field(Struct, frozen=True):
    """A function of two variables as a program for a stack (`fields`)."""

    program: tuple[tuple[str, float], ...]


class Grid(Struct, frozen=True):
    """A function of x and y by its values `z`, a row for each y, straight between them; `x` and `y` rise."""

    x: tuple[float, ...]
    y: tuple[float, ...]
    z: tuple[tuple[float, ...], ...]


class Relief(Struct, frozen=True):
    """The solid between z = 0 and a height above it over a rectangle, its middle at the origin.

    A grid starts at minus half the size and ends at half of it.
    """

    height: Field | Grid
    size: Point2


class ParametricSurface(Struct, frozen=True):
    """A sheet of a thickness, half of it on each side of the surface that `point` describes over ranges of u and v."""

    point: tuple[Field, Field, Field]
    u: Point2
    v: Point2
    thickness: float


class Envelope(Struct, frozen=True):
    """The smallest convex solid round shapes, none of them a recipe."""

    placed: tuple[Placed, ...]


Primitive = (
    Block
    | Wedge
    | Cylinder
    | Cone
    | Sphere
    | Ellipsoid
    | Torus
    | Prism
    | Pyramid
    | Extrude
    | Revolve
    | Edged
    | Sweep
    | Tube
    | Spring
    | Bellows
    | Transition
    | Thread
    | Relief
    | ParametricSurface
    | Envelope
)


class Placed(Struct, frozen=True):
    """One shape, or another part's recipe, at each of `placements` (a pattern's copies).

    `source` is the row of the author's line in the table that the compiler keeps beside the recipe.
    `centred` puts the middle of a rising shape's length at the origin before it is placed.
    """

    shape: Primitive | Recipe
    placements: tuple[Affine, ...]
    source: int
    centred: bool = False


class Step(Struct, frozen=True):
    """One line of the process sheet: the union of `placed` is added, cut, or kept."""

    operation: Literal["add", "cut", "keep"]
    placed: tuple[Placed, ...]


class Recipe(Struct, frozen=True):
    """The steps of one part in order. Sources of a nested recipe are rows of the outermost part's table."""

    steps: tuple[Step, ...]

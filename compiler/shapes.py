"""Shapes: from the words of a shape to a primitive of a recipe, with its sizes checked."""

from __future__ import annotations

from platewright.lang import tree
from platewright.lang.units import ANGLE, LENGTH

from .expressions import count, quantity, vector
from .mistakes import mistake
from .placement import positive_length, within_size
from .readings import expression, optional
from .scope import Scope
from .solids.outline import extent, oriented
from .solids.recipe import (
    Bellows,
    Block,
    Cone,
    Cylinder,
    Edged,
    Ellipsoid,
    Extrude,
    Outline,
    Primitive,
    Prism,
    Pyramid,
    Recipe,
    Revolve,
    Sphere,
    Spring,
    Thread,
    Torus,
    Transition,
    Tube,
    Wedge,
)
from .threads import read_thread

MOST_TWIST = 36_000.0
"""Degrees that an extrusion may turn: a hundred turns."""
OUTLINED = ("extrude", "revolve")
"""Shapes made from an outline, which the caller resolves."""


def read_shape(reading: tree.Reading, scope: Scope, outline: Outline | None, is_cut: bool = False) -> Primitive:
    """The primitive that a shape's words describe; `outline` is that of `extrude` and `revolve`.

    A thread that is cut is internal. Raises Mistake.
    """

    def size(slot: str, zero: bool = False) -> float:
        return positive_length(expression(reading, slot), scope, slot, zero)

    match reading.word:
        case "block":
            return Block(_sizes(reading, "size", scope))
        case "wedge":
            return _wedge(reading, scope)
        case "cylinder":
            return Cylinder(size("diameter"), size("length"))
        case "cone":
            return _cone(reading, size("diameter"), _top(reading, scope), size("length"))
        case "sphere":
            return Sphere(size("diameter"))
        case "ellipsoid":
            return Ellipsoid(_sizes(reading, "axes", scope))
        case "torus":
            return _torus(reading, size("diameter"), size("tube"))
        case "prism":
            return Prism(_sides(reading, scope), size("across"), size("length"))
        case "pyramid":
            return Pyramid(_sides(reading, scope), size("across"), _top(reading, scope), size("length"))
        case "extrude":
            assert outline is not None
            return Extrude(outline, size("length"), _taper(reading, scope), _twist(reading, scope))
        case "revolve":
            assert outline is not None
            return Revolve(outline, _part_turn(reading, scope))
        case "thread":
            return read_thread(reading, scope, size("length"), is_cut)
    raise AssertionError(f"no shape {reading.word}")


def with_edges(shape: Primitive | Recipe, clauses: tuple[tree.Reading, ...], scope: Scope) -> Primitive | Recipe:
    """The shape with its edges made, where a clause says `rounded` or `chamfered`. Raises Mistake."""
    made = [clause for clause in clauses if clause.word in ("rounded", "chamfered")]
    if not made:
        return shape
    clause = made[0]
    if len(made) > 1:
        raise mistake("said-twice", made[1].span, "the edges of a shape are rounded or chamfered, not both")
    if not isinstance(shape, Block | Wedge | Cylinder | Cone | Prism | Pyramid | Extrude | Revolve):
        hint = "it goes with block, wedge, cylinder, cone, prism, pyramid, extrude and revolve"
        raise mistake("no-edges", clause.span, f"`{clause.word}` finds no edges of its own on this shape", hint)
    if clause.word == "rounded":
        return Edged(shape, "rounded", positive_length(expression(clause, "radius"), scope, "radius"))
    return Edged(shape, "chamfered", positive_length(expression(clause, "by"), scope, "chamfer"))


def height(shape: Primitive) -> float:
    """The length a shape rises along its z axis from z = 0; 0 for shapes centred on the origin."""
    match shape:
        case Edged():
            return height(shape.shape)
        case Block() | Wedge():
            return shape.size[2]
        case Cylinder() | Cone() | Prism() | Pyramid() | Extrude() | Thread() | Spring() | Bellows() | Transition():
            return shape.length
        case Revolve():
            return extent(oriented(shape.outline.outer, True))[1][1]
        case _:
            return 0.0


def diameter(shape: Primitive) -> float | None:
    """The diameter of a round shape at its base, None for others."""
    if isinstance(shape, Thread):
        return shape.major
    if isinstance(shape, Edged):
        return diameter(shape.shape)
    round_ones = (Cylinder, Cone, Sphere, Torus, Tube, Spring, Bellows)
    return shape.diameter if isinstance(shape, round_ones) else None


def _sizes(reading: tree.Reading, slot: str, scope: Scope) -> tuple[float, float, float]:
    written = expression(reading, slot)
    x, y, z = vector(written, scope, 3, LENGTH).components
    for axis, value in zip("xyz", (x, y, z), strict=True):
        if value <= 0:
            sentence = f"size along {axis}: expected more than 0, found {value:g} mm"
            raise mistake("out-of-range", written.span, sentence)
        within_size(value, written.span, f"size along {axis}")
    return (x, y, z)


def _taper(reading: tree.Reading, scope: Scope) -> float:
    written = optional(reading, "taper")
    if written is None:
        return 0.0
    angle = quantity(written, scope, ANGLE)
    if not -85.0 <= angle <= 85.0:
        raise mistake("out-of-range", written.span, f"taper: expected -85 deg to 85 deg, found {angle:g} deg")
    return angle


def _twist(reading: tree.Reading, scope: Scope) -> float:
    written = optional(reading, "twist")
    if written is None:
        return 0.0
    angle = quantity(written, scope, ANGLE)
    if abs(angle) > MOST_TWIST:
        raise mistake("out-of-range", written.span, f"twist: expected at most {MOST_TWIST:g} deg, found {angle:g} deg")
    return angle


def _part_turn(reading: tree.Reading, scope: Scope) -> float:
    written = optional(reading, "angle")
    if written is None:
        return 360.0
    angle = quantity(written, scope, ANGLE)
    if not 0.01 <= angle <= 360.0:
        sentence = f"expected an angle of 0.01 deg to 360 deg, found {angle:g} deg"
        raise mistake("out-of-range", written.span, sentence)
    return angle


def _wedge(reading: tree.Reading, scope: Scope) -> Wedge:
    size = _sizes(reading, "size", scope)
    top = _top(reading, scope)
    written = optional(reading, "top")
    if written is not None and top >= size[0]:
        raise mistake("out-of-range", written.span, f"top: expected less than {size[0]:g} mm, found {top:g} mm")
    return Wedge(size, top)


def _top(reading: tree.Reading, scope: Scope) -> float:
    written = optional(reading, "top")
    return positive_length(written, scope, "top", zero=True) if written is not None else 0.0


def _cone(reading: tree.Reading, diameter: float, top: float, length: float) -> Cone | Cylinder:
    if diameter == top:
        return Cylinder(diameter, length)
    return Cone(diameter, top, length)


def _torus(reading: tree.Reading, diameter: float, tube: float) -> Torus:
    if tube >= diameter:
        sentence = (
            f"tube: expected less than the diameter {diameter:g} mm, found {tube:g} mm; the ring would cut itself"
        )
        raise mistake("out-of-range", expression(reading, "tube").span, sentence)
    return Torus(diameter, tube)


def _sides(reading: tree.Reading, scope: Scope) -> int:
    return count(expression(reading, "sides"), scope, least=3, most=10_000)

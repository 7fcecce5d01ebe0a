"""Where things stand: `turn`, `facing`, `mirrored`, `scaled` and `at`, then `ring` and `row` to repeat."""

from __future__ import annotations

from collections.abc import Mapping

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.source import Span
from platewright.lang.units import ANGLE, LENGTH, NUMBER

from . import limits
from .expressions import count, evaluate, quantity, vector
from .mistakes import mistake
from .readings import expression, optional, word
from .scope import Scope
from .solids.recipe import Affine
from .solids.transform import IDENTITY, compose, facing, mirror, scale, translate, turn
from .values import Vector, kind_of, unit_vector

Point = tuple[float, float, float]


class Axis(Struct, frozen=True):
    """A line in space: a point and a unit direction."""

    through: Point
    along: Point


Marks = Mapping[str, Axis]
AXES: dict[str, Point] = {"x": (1.0, 0.0, 0.0), "y": (0.0, 1.0, 0.0), "z": (0.0, 0.0, 1.0)}
ORIGIN: Point = (0.0, 0.0, 0.0)


def place(clauses: tuple[tree.Reading, ...], scope: Scope, marks: Marks) -> Affine:
    """One placement from the placing clauses: turns and the like in the order written, then `at`. Raises Mistake.

    `marks` are the axes of the thing itself, in its own frame.
    """
    placed, shift = IDENTITY, IDENTITY
    for clause in clauses:
        match clause.word:
            case "at":
                shift = translate(point(expression(clause, "point"), scope))
            case "turn":
                angle = quantity(expression(clause, "by"), scope, ANGLE)
                axis = axis_of(optional(clause, "axis"), scope, marks)
                placed = compose(turn(angle, axis.along, axis.through), placed)
            case "facing":
                placed = compose(facing(direction(expression(clause, "direction"), scope)), placed)
            case "mirrored across":
                placed = compose(mirror(AXES[word(clause, "axis")]), placed)
            case "scaled":
                placed = compose(scale(_factor(clause, scope)), placed)
    return compose(shift, placed)


def repeat(clauses: tuple[tree.Reading, ...], scope: Scope, marks: Marks) -> tuple[Affine, ...]:
    """The placements that `ring` and `row` add, in order; one identity where there are none. Raises Mistake.

    `marks` are the axes of what encloses the thing.
    """
    copies: tuple[Affine, ...] = (IDENTITY,)
    for clause in clauses:
        if clause.word not in ("ring", "row"):
            continue
        number = count(expression(clause, "count"), scope, least=1)
        made = len(copies) * number
        if made > limits.COPIES:
            raise mistake("too-much", clause.span, f"{made:,} copies are more than {limits.COPIES:,}, the limit")
        scope.budget.copy(made - len(copies), clause.span)
        more = _ring(clause, number, scope, marks) if clause.word == "ring" else _row(clause, number, scope)
        copies = tuple(compose(outer, inner) for outer in more for inner in copies)
    return copies


def axis_of(written: tree.Expression | None, scope: Scope, marks: Marks) -> Axis:
    """The axis written: x, y or z, a mark with an axis, or a direction; z where nothing is written. Raises Mistake."""
    if written is None:
        return Axis(ORIGIN, AXES["z"])
    if isinstance(written, tree.Path) and len(written.steps) == 1:
        name = written.steps[0].name
        if name in AXES:
            return Axis(ORIGIN, AXES[name])
        if name in marks:
            return marks[name]
    return Axis(ORIGIN, direction(written, scope))


def direction(written: tree.Expression, scope: Scope) -> Point:
    """A unit direction: x, y, z, their opposites, or three values. Raises Mistake."""
    if isinstance(written, tree.Unary) and written.operator == "-":
        x, y, z = direction(written.operand, scope)
        return (0.0 - x, 0.0 - y, 0.0 - z)
    if isinstance(written, tree.Path) and len(written.steps) == 1 and written.steps[0].name in AXES:
        return AXES[written.steps[0].name]
    value = evaluate(written, scope)
    if not isinstance(value, Vector) or len(value.components) != 3:
        hint = "write x, y, z, -x, -y, -z or three values such as (1, 0, 1)"
        raise mistake("wrong-kind", written.span, f"expected a direction, found {kind_of(value)}", hint)
    x, y, z = value.components
    found = unit_vector((x, y, z))
    if found is None:
        raise mistake("out-of-range", written.span, "a direction needs a length")
    return found


def point(written: tree.Expression, scope: Scope) -> Point:
    """A point of space in mm, within the largest length. Raises Mistake."""
    x, y, z = vector(written, scope, 3, LENGTH).components
    if max(abs(x), abs(y), abs(z)) > limits.LARGEST_MM:
        raise mistake("out-of-range", written.span, f"this lies further than {limits.LARGEST_MM:g} mm, the limit")
    return (x, y, z)


def positive_length(written: tree.Expression, scope: Scope, what: str, zero: bool = False) -> float:
    """A length above 0 (or from 0) in mm, within what geometry can hold. Raises Mistake."""
    value = quantity(written, scope, LENGTH, what)
    if value < 0 or (value == 0 and not zero):
        least = "0 or more" if zero else "more than 0"
        raise mistake("out-of-range", written.span, f"{what}: expected {least}, found {value:g} mm")
    within_size(value, written.span, what)
    return value


def within_size(value: float, span: Span, what: str) -> None:
    """Raise Mistake for a size that is too large or too small, and not 0, to be built."""
    if value > limits.LARGEST_MM:
        raise mistake("out-of-range", span, f"{what}: {value:g} mm is more than {limits.LARGEST_MM:g} mm, the limit")
    if 0 < value < limits.SMALLEST_MM:
        raise mistake("out-of-range", span, f"{what}: {value:g} mm is less than {limits.SMALLEST_MM:g} mm, the limit")


def _factor(clause: tree.Reading, scope: Scope) -> float:
    written = expression(clause, "by")
    factor = quantity(written, scope, NUMBER)
    if factor <= 0:
        hint = "to mirror a thing, write `mirrored across x`" if factor < 0 else ""
        raise mistake("out-of-range", written.span, f"expected a factor above 0, found {factor:g}", hint)
    if not 1 / limits.SCALE <= factor <= limits.SCALE:
        sentence = f"expected a factor from {1 / limits.SCALE:g} to {limits.SCALE:g}, found {factor:g}"
        raise mistake("out-of-range", written.span, sentence)
    return factor


def _ring(clause: tree.Reading, number: int, scope: Scope, marks: Marks) -> tuple[Affine, ...]:
    axis = axis_of(optional(clause, "axis"), scope, marks)
    over = optional(clause, "over")
    whole, steps = 360.0, number
    if over is not None:
        whole, steps = quantity(over, scope, ANGLE), max(number - 1, 1)
        if not 0 < abs(whole) < 360:
            hint = "leave `over` out for a full ring"
            sentence = f"expected an angle between 0 and 360 deg, found {whole:g} deg"
            raise mistake("out-of-range", over.span, sentence, hint)
    written = optional(clause, "start")
    start = quantity(written, scope, ANGLE) if written is not None else 0.0
    return tuple(turn(start + whole * k / steps, axis.along, axis.through) for k in range(number))


def _row(clause: tree.Reading, number: int, scope: Scope) -> tuple[Affine, ...]:
    written = expression(clause, "step")
    x, y, z = point(written, scope)
    if number > 1 and not any((x, y, z)):
        raise mistake("coincident-copies", written.span, "the copies of this row would lie in one place")
    return tuple(translate((x * k, y * k, z * k)) for k in range(number))

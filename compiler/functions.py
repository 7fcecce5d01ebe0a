"""The functions an author may call in any expression. Angles are degrees, exact at multiples of 30 and 90."""

from __future__ import annotations

import math
from collections.abc import Callable

from platewright.lang.units import ANGLE, NUMBER, Dimension

from .trigonometry import cos_deg, sin_deg, tan_deg
from .values import Quantity, Value, Vector, dimension_name, kind_of, with_article

Function = Callable[[tuple[Value, ...]], Value]


class Unfit(Exception):
    """A function was given what it cannot take; the text says what it wants."""


def call(name: str, arguments: tuple[Value, ...]) -> Value:
    """The value of a function of the language. Raises KeyError for an unknown name, Unfit for unfit arguments."""
    return FUNCTIONS[name](arguments)


def _quantities(arguments: tuple[Value, ...], least: int, most: int | None, what: str) -> list[Quantity]:
    if len(arguments) < least or (most is not None and len(arguments) > most):
        raise Unfit(f"takes {what}, but was given {len(arguments)} value{'s' if len(arguments) != 1 else ''}")
    found = []
    for argument in arguments:
        if not isinstance(argument, Quantity):
            raise Unfit(f"takes {what}, but was given {kind_of(argument)}")
        found.append(argument)
    return found


def _one(arguments: tuple[Value, ...], dimension: Dimension) -> float:
    what = with_article(dimension_name(dimension))
    (quantity,) = _quantities(arguments, 1, 1, what)
    if quantity.dimension != dimension and not quantity.bare_zero:
        raise Unfit(f"takes {what}, but was given {kind_of(quantity)}")
    return quantity.value


def _alike(arguments: tuple[Value, ...], least: int, most: int | None, what: str) -> list[Quantity]:
    """Quantities of one dimension; a bare 0 takes the dimension of the others."""
    quantities = _quantities(arguments, least, most, what)
    dimension = next((q.dimension for q in quantities if not q.bare_zero), quantities[0].dimension)
    for quantity in quantities:
        if quantity.dimension != dimension and not quantity.bare_zero:
            raise Unfit(
                f"takes values of one kind, but was given {with_article(dimension_name(dimension))} and "
                f"{kind_of(quantity)}"
            )
    return [Quantity(q.value, dimension) for q in quantities]


def _sin(arguments: tuple[Value, ...]) -> Value:
    return Quantity(sin_deg(_one(arguments, ANGLE)))


def _cos(arguments: tuple[Value, ...]) -> Value:
    return Quantity(cos_deg(_one(arguments, ANGLE)))


def _tan(arguments: tuple[Value, ...]) -> Value:
    angle = _one(arguments, ANGLE)
    if cos_deg(angle) == 0:
        raise Unfit(f"has no value at {angle:g} deg")
    return Quantity(tan_deg(angle))


def _ratio(arguments: tuple[Value, ...]) -> float:
    number = _one(arguments, NUMBER)
    if not -1 <= number <= 1:
        raise Unfit(f"takes a number from -1 to 1, but was given {number:g}")
    return number


_EXACT = {-1.0: -90.0, -0.5: -30.0, 0.0: 0.0, 0.5: 30.0, 1.0: 90.0}


def _arcsin(arguments: tuple[Value, ...]) -> Value:
    number = _ratio(arguments)
    return Quantity(_EXACT.get(number, math.degrees(math.asin(number))), ANGLE)


def _arccos(arguments: tuple[Value, ...]) -> Value:
    number = _ratio(arguments)
    if number in _EXACT:
        return Quantity(90.0 - _EXACT[number], ANGLE)
    return Quantity(math.degrees(math.acos(number)), ANGLE)


def _arctan(arguments: tuple[Value, ...]) -> Value:
    if len(arguments) == 2:
        rise, run = _alike(arguments, 2, 2, "a number, or a rise and a run")
        if rise.value == 0 and run.value == 0:
            raise Unfit("has no value for a rise and a run of 0")
        return Quantity(math.degrees(math.atan2(rise.value, run.value)), ANGLE)
    return Quantity(math.degrees(math.atan(_one(arguments, NUMBER))), ANGLE)


def _root(arguments: tuple[Value, ...]) -> Value:
    (quantity,) = _quantities(arguments, 1, 1, "a value")
    if quantity.value < 0:
        raise Unfit("has no value below 0")
    half = quantity.dimension.root()
    if half is None:
        raise Unfit(f"cannot take {kind_of(quantity)}: its dimension is no square")
    return Quantity(math.sqrt(quantity.value), half)


def _abs(arguments: tuple[Value, ...]) -> Value:
    (quantity,) = _quantities(arguments, 1, 1, "a value")
    return Quantity(abs(quantity.value), quantity.dimension, quantity.bare_zero)


def _min(arguments: tuple[Value, ...]) -> Value:
    return min(_alike(arguments, 1, None, "one or more values"), key=lambda q: q.value)


def _max(arguments: tuple[Value, ...]) -> Value:
    return max(_alike(arguments, 1, None, "one or more values"), key=lambda q: q.value)


def _stepped(arguments: tuple[Value, ...], settle: Callable[[float], float]) -> Value:
    """A number to a whole one, or a value to a multiple of a step."""
    if len(arguments) == 1:
        return Quantity(float(settle(_one(arguments, NUMBER))))
    value, step = _alike(arguments, 2, 2, "a number, or a value and a step")
    if step.value <= 0:
        raise Unfit("takes a step above 0")
    return Quantity(settle(value.value / step.value) * step.value, value.dimension)


def _floor(arguments: tuple[Value, ...]) -> Value:
    return _stepped(arguments, math.floor)


def _ceiling(arguments: tuple[Value, ...]) -> Value:
    return _stepped(arguments, math.ceil)


def _round(arguments: tuple[Value, ...]) -> Value:
    return _stepped(arguments, round)


def _length(arguments: tuple[Value, ...]) -> Value:
    if len(arguments) != 1 or not isinstance(arguments[0], Vector):
        raise Unfit("takes a point or a vector")
    return Quantity(math.hypot(*arguments[0].components), arguments[0].dimension)


FUNCTIONS: dict[str, Function] = {
    "sin": _sin,
    "cos": _cos,
    "tan": _tan,
    "arcsin": _arcsin,
    "arccos": _arccos,
    "arctan": _arctan,
    "root": _root,
    "abs": _abs,
    "min": _min,
    "max": _max,
    "floor": _floor,
    "ceiling": _ceiling,
    "round": _round,
    "length": _length,
}

CONSTANTS: dict[str, Value] = {"pi": Quantity(math.pi)}

"""Evaluated values: quantities with dimensions, points, truths, texts and intervals."""

from __future__ import annotations

import math
from typing import TypeAlias

from msgspec import Struct
from platewright.lang import units
from platewright.lang.units import LENGTH, NUMBER, Dimension


class Quantity(Struct, frozen=True):
    """A number in the base unit of its dimension (mm, degree, g, lm, ...).

    `bare_zero` marks the literal 0, which fits any.
    """

    value: float
    dimension: Dimension = NUMBER
    bare_zero: bool = False


class Vector(Struct, frozen=True):
    """Two or three components of one dimension: a point (lengths) or a direction (pure numbers)."""

    components: tuple[float, ...]
    dimension: Dimension


class Interval(Struct, frozen=True):
    """`low .. high`, ends included."""

    low: Quantity
    high: Quantity


class Proportion(Struct, frozen=True):
    """`1:2`: lengths on paper to lengths of the model."""

    first: float
    second: float


class Day(Struct, frozen=True):
    """A calendar date as written."""

    text: str


Value: TypeAlias = Quantity | Vector | Interval | Proportion | Day | bool | str


def kind_of(value: Value) -> str:
    """What a value is, in an author's words: `a length`, `a point`, `a text`."""
    match value:
        case bool():
            return "yes or no"
        case str():
            return "a text"
        case Quantity(dimension=dimension):
            return with_article(dimension_name(dimension))
        case Vector(components=components, dimension=dimension):
            if dimension == LENGTH:
                return "a point" if len(components) == 3 else "a point of a plane"
            return "a direction" if dimension == NUMBER else f"a vector of {dimension_name(dimension)}"
        case Interval():
            return "a range"
        case Proportion():
            return "a proportion"
        case Day():
            return "a date"


def dimension_name(dimension: Dimension) -> str:
    """The dimension in words; a pure one is `number`."""
    return "number" if dimension == NUMBER else dimension.name


def with_article(noun: str) -> str:
    """`a` or `an` before a noun."""
    return f"{'an' if noun[:1] in 'aeiou' else 'a'} {noun}"


def spell(value: Value) -> str:
    """A value as an author would write it, to ten significant digits."""
    match value:
        case bool():
            return "yes" if value else "no"
        case str():
            return f'"{value}"'
        case Quantity(value=number, dimension=dimension):
            symbol, factor = usual_unit(dimension)
            return spell_number(number / factor) + (f" {symbol}" if symbol else "")
        case Vector(components=components, dimension=dimension):
            return "(" + ", ".join(spell(Quantity(c, dimension)) for c in components) + ")"
        case Interval(low=low, high=high):
            return f"{spell(low)} .. {spell(high)}"
        case Proportion(first=first, second=second):
            return f"{spell_number(first)}:{spell_number(second)}"
        case Day(text=text):
            return text


def shortened(text: str) -> str:
    """A text fit to stand in a sentence: on one line, at most 40 characters of it."""
    line = " ".join(text.split())
    return line if len(line) <= 40 else line[:39] + "…"


def shown(value: Value) -> str:
    """A value as `spell` gives it, but a long text shortened, for sentences."""
    return f'"{shortened(value)}"' if isinstance(value, str) else spell(value)


def usual_unit(dimension: Dimension) -> tuple[str, float]:
    """The unit that results are spelt in, and its size in base units.

    The dimension's name in brackets if it has none.
    """
    if dimension == NUMBER:
        return "", 1.0
    symbol = _USUAL.get(dimension)
    if symbol is None:
        return f"[{dimension.name}]", 1.0
    return symbol, float(units.UNITS[symbol].factor)


def spell_number(number: float) -> str:
    """A number to ten significant digits, without exponent where it is of ordinary size, never `-0`."""
    if number == 0:
        return "0"
    if number == int(number) and abs(number) < 1e15:
        return str(int(number))
    return f"{number:.10g}"


def unit_vector(components: tuple[float, float, float]) -> tuple[float, float, float] | None:
    """The direction of a vector, or None if it has no length."""
    size = math.hypot(*components)
    if not size > 0 or not math.isfinite(size):
        return None
    x, y, z = components
    return (x / size, y / size, z / size)


_USUAL: dict[Dimension, str] = {
    units.LENGTH: "mm",
    units.AREA: "mm2",
    units.VOLUME: "mm3",
    units.ANGLE: "deg",
    units.MASS: "g",
    units.TIME: "s",
    units.TEMPERATURE: "K",
    units.DENSITY: "g/cm3",
    units.LUMINOUS_FLUX: "lm",
    units.LUMINOUS_INTENSITY: "cd",
    units.ILLUMINANCE: "lx",
    units.LUMINANCE: "cd/m2",
    units.WAVELENGTH: "nm",
    units.LATITUDE: "degN",
    units.LONGITUDE: "degE",
}

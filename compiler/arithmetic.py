"""Sums, products, powers and comparisons of values, with dimensions checked."""

from __future__ import annotations

import math
from collections.abc import Callable

from platewright.lang import tree
from platewright.lang.source import Span
from platewright.lang.units import NUMBER, Dimension

from . import limits
from .mistakes import mistake
from .values import Quantity, Value, Vector, kind_of

COMPARISONS: dict[str, Callable[[float, float], bool]] = {
    "<": lambda a, b: a < b,
    "<=": lambda a, b: a <= b,
    ">": lambda a, b: a > b,
    ">=": lambda a, b: a >= b,
}


def finite(value: float, span: Span) -> float:
    """The value, if it is a number, with -0 made 0. Raises Mistake."""
    if not math.isfinite(value):
        raise mistake("out-of-range", span, "the result is too large to be a number")
    return value + 0.0


def matched(left: Quantity, right: Quantity, span: Span, what: str) -> tuple[Quantity, Quantity]:
    """Both with one dimension; a bare 0 takes the other's. Raises Mistake, which begins with `what`."""
    if left.dimension is right.dimension or left.dimension == right.dimension:
        return left, right
    if left.bare_zero:
        return Quantity(0.0, right.dimension), right
    if right.bare_zero:
        return left, Quantity(0.0, left.dimension)
    raise mistake("wrong-kind", span, f"{what}, found {kind_of(left)} and {kind_of(right)}")


def same(left: Value, right: Value, span: Span) -> bool:
    """Whether two values of one kind are equal. Raises Mistake for values of two kinds."""
    what = "only values of one kind can be compared"
    if isinstance(left, Quantity) and isinstance(right, Quantity):
        left, right = matched(left, right, span, what)
        return left.value == right.value
    if isinstance(left, Vector) and isinstance(right, Vector) and _one_kind(left, right):
        return left.components == right.components
    if type(left) is not type(right) or isinstance(left, Vector):
        raise mistake("wrong-kind", span, f"{what}, found {kind_of(left)} and {kind_of(right)}")
    return left == right


def ordered(operator: str, left: Value, right: Value, span: Span) -> bool:
    """Whether `<`, `<=`, `>` or `>=` holds. Raises Mistake."""
    if not isinstance(left, Quantity) or not isinstance(right, Quantity):
        wrong = left if not isinstance(left, Quantity) else right
        raise mistake("wrong-kind", span, f"`{operator}` compares two quantities, found {kind_of(wrong)}")
    left, right = matched(left, right, span, "only values of one kind can be compared")
    return COMPARISONS[operator](left.value, right.value)


def compare(operator: str, left: Value, right: Value, span: Span) -> bool:
    """Whether a comparison holds, `is` and `is not` among them. Raises Mistake."""
    if operator in COMPARISONS:
        return ordered(operator, left, right, span)
    return same(left, right, span) == (operator == "is")


def negative(value: Value, span: Span) -> Value:
    """The value with the other sign; never -0. Raises Mistake."""
    match value:
        case Quantity():
            return Quantity(0.0 - value.value, value.dimension, value.bare_zero)
        case Vector():
            return Vector(tuple(0.0 - each for each in value.components), value.dimension)
        case _:
            raise mistake("wrong-kind", span, f"a sign needs a number, found {kind_of(value)}")


def arithmetic(operator: str, left: Value, right: Value, at: tree.Binary) -> Value:
    """Sums, differences, products, quotients and powers of quantities and vectors. Raises Mistake."""
    for value in (left, right):
        if isinstance(value, (Quantity, Vector)) and value.dimension.place:
            raise mistake("wrong-kind", at.span, f"a {value.dimension.place} takes no part in arithmetic")
    match operator, left, right:
        case ("+" | "-", Quantity(), Quantity()):
            left, right = matched(left, right, at.span, f"`{operator}` joins values of one kind")
            total = left.value + right.value if operator == "+" else left.value - right.value
            return Quantity(finite(total, at.span), left.dimension, left.bare_zero and right.bare_zero)
        case ("+" | "-", Vector(), Vector()):
            return _vector_sum(operator, left, right, at.span)
        case ("*", Quantity(), Quantity()):
            return Quantity(finite(left.value * right.value, at.span), _product(left, right, at.span))
        case ("*", Quantity(), Vector()):
            return _multiplied(right, left, at.span)
        case ("*", Vector(), Quantity()):
            return _multiplied(left, right, at.span)
        case ("/", Quantity() | Vector(), Quantity()):
            return _quotient(left, right, at)
        case ("^", Quantity(), Quantity()):
            return _power(left, right, at)
    raise mistake("wrong-kind", at.span, f"`{operator}` cannot join {kind_of(left)} and {kind_of(right)}")


def _one_kind(left: Vector, right: Vector) -> bool:
    """Whether two vectors can be compared: one dimension, or one of them bare zeros."""
    if len(left.components) != len(right.components):
        return False
    return left.dimension == right.dimension or not any(left.components) or not any(right.components)


def _product(left: Quantity | Vector, right: Quantity, span: Span) -> Dimension:
    if right.dimension is NUMBER:
        return left.dimension
    return right.dimension if left.dimension is NUMBER else _limited(left.dimension * right.dimension, span)


def _limited(dimension: Dimension, span: Span) -> Dimension:
    if max(map(abs, dimension.exponents)) > limits.POWERS:
        sentence = f"the powers in the dimension of this value pass {limits.POWERS}, the limit"
        raise mistake("out-of-range", span, sentence)
    return dimension


def _multiplied(moved: Vector, factor: Quantity, span: Span) -> Vector:
    components = tuple(finite(each * factor.value, span) for each in moved.components)
    return Vector(components, _product(moved, factor, span))


def _vector_sum(operator: str, left: Vector, right: Vector, span: Span) -> Vector:
    sign = 1 if operator == "+" else -1
    if len(left.components) != len(right.components):
        raise mistake("wrong-kind", span, "one of these has two values, the other three")
    if not _one_kind(left, right):
        sentence = f"`{operator}` joins values of one kind, found {kind_of(left)} and {kind_of(right)}"
        raise mistake("wrong-kind", span, sentence)
    dimension = left.dimension if any(left.components) else right.dimension
    pairs = zip(left.components, right.components, strict=True)
    return Vector(tuple(finite(a + sign * b, span) for a, b in pairs), dimension)


def _quotient(left: Quantity | Vector, right: Quantity, at: tree.Binary) -> Value:
    if right.value == 0:
        raise mistake("division-by-zero", at.right.span, "this divides by 0")
    is_number = right.dimension is NUMBER
    dimension = left.dimension if is_number else _limited(left.dimension / right.dimension, at.span)
    if isinstance(left, Vector):
        return Vector(tuple(finite(each / right.value, at.span) for each in left.components), dimension)
    return Quantity(finite(left.value / right.value, at.span), dimension)


def _power(left: Quantity, right: Quantity, at: tree.Binary) -> Quantity:
    if right.dimension != NUMBER:
        raise mistake("wrong-kind", at.right.span, f"expected a number as the power, found {kind_of(right)}")
    is_whole = right.value == math.floor(right.value)
    if left.dimension != NUMBER and (not is_whole or abs(right.value) > 9):
        raise mistake("wrong-kind", at.right.span, f"{kind_of(left)} can only be raised to a whole power up to 9")
    if left.value == 0 and right.value < 0:
        raise mistake("division-by-zero", at.span, "0 cannot be raised to a negative power")
    if left.value < 0 and not is_whole:
        raise mistake("out-of-range", at.span, "a negative number can only be raised to a whole power")
    dimension = NUMBER if left.dimension == NUMBER else _limited(left.dimension ** int(right.value), at.span)
    return Quantity(finite(_raised(left.value, right.value), at.span), dimension)


def _raised(base: float, power: float) -> float:
    """Whole powers by multiplication, the same on every processor; others by the platform's `pow`.

    Infinite where the result is beyond the floats.
    """
    if power != math.floor(power) or abs(power) > 1024:
        try:
            return float(base**power)
        except OverflowError:
            return math.inf
    result, factor, left = 1.0, base, int(abs(power))
    while left:
        if left & 1:
            result *= factor
        factor *= factor
        left >>= 1
    if power >= 0:
        return result
    return 1.0 / result if result else math.inf

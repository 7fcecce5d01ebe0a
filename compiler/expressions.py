"""Expressions to values, with dimensions checked."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Protocol

from platewright.lang import tree, units
from platewright.lang.nearest import nearest
from platewright.lang.source import Span
from platewright.lang.units import LENGTH, NUMBER, Dimension

from . import limits
from .functions import FUNCTIONS, Unfit
from .mistakes import Mistake, mistake
from .values import (
    Day,
    Interval,
    Proportion,
    Quantity,
    Value,
    Vector,
    dimension_name,
    kind_of,
    spell,
    spell_number,
    usual_unit,
    with_article,
)


@dataclass(frozen=True, slots=True)
class Formula:
    """A function an author has defined: its parameters and body, and the scope it sees."""

    name: str
    parameters: tuple[str, ...]
    body: tree.Expression
    scope: Scope


class Failed:
    """Stands for a name whose value has been reported as wrong already."""


class Paths(Protocol):
    """Values that stand behind a path of several names: marks, features, measures."""

    def value(self, path: tree.Path) -> Value | None:
        """The value at the path; None if its first name means nothing here. Raises Mistake."""

    def call(self, call: tree.Call) -> Value | None:
        """The value of a measure; None if there is none of that name. Raises Mistake."""

    def names(self) -> tuple[str, ...]:
        """The names a path may start with."""


@dataclass(slots=True)
class Budget:
    """Counts values computed, against `limits.STEPS`."""

    left: int = limits.STEPS


@dataclass(frozen=True, slots=True)
class Scope:
    """Names and what they stand for, inside an enclosing scope. `prefixes` leads to the scopes of files seen."""

    names: Mapping[str, Value | Formula | Failed]
    outer: Scope | None = None
    prefixes: Mapping[str, Scope] = field(default_factory=dict)
    paths: Paths | None = None
    budget: Budget = field(default_factory=Budget)

    def inside(self, names: Mapping[str, Value | Formula | Failed], paths: Paths | None = None) -> Scope:
        """A scope within this one."""
        return Scope(names, self, {}, paths, self.budget)

    def find(self, name: str) -> Value | Formula | Failed | None:
        """What a name stands for, here or outside."""
        scope: Scope | None = self
        while scope is not None:
            if name in scope.names:
                return scope.names[name]
            scope = scope.outer
        return None

    def prefix(self, name: str) -> Scope | None:
        """The scope of a file seen under that prefix."""
        scope: Scope | None = self
        while scope is not None:
            if name in scope.prefixes:
                return scope.prefixes[name]
            scope = scope.outer
        return None

    def known(self) -> list[str]:
        """All names in reach, nearest scope first."""
        found: list[str] = []
        scope: Scope | None = self
        while scope is not None:
            found += [*scope.names, *scope.prefixes, *(scope.paths.names() if scope.paths else ())]
            scope = scope.outer
        return found


def evaluate(expression: tree.Expression, scope: Scope, depth: int = 0) -> Value:
    """The value of an expression. Raises Mistake. Cost: linear in the expression and the functions it calls."""
    scope.budget.left -= 1
    if scope.budget.left < 0:
        raise mistake("too-much", expression.span, f"this scene computes more than {limits.STEPS:,} values, the limit")
    match expression:
        case tree.Number():
            value, dimension = units.quantity(expression.text, expression.unit)
            return Quantity(value, dimension, value == 0 and not expression.unit)
        case tree.Truth():
            return expression.value
        case tree.Text():
            return _text(expression, scope, depth)
        case tree.Path():
            return _path(expression, scope)
        case tree.Call():
            return _call(expression, scope, depth)
        case tree.Tuple():
            return _vector(expression, scope, depth)
        case tree.Unary():
            return _unary(expression, scope, depth)
        case tree.Binary():
            return _binary(expression, scope, depth)
        case tree.Choice():
            chosen = expression.then if truth(expression.condition, scope, depth) else expression.otherwise
            return evaluate(chosen, scope, depth)
        case tree.Range():
            return _interval(expression, scope, depth)
        case tree.Ratio():
            return Proportion(float(expression.first), float(expression.second))
        case tree.Date():
            return Day(expression.text)


def truth(expression: tree.Expression, scope: Scope, depth: int = 0) -> bool:
    """A yes or no. Raises Mistake."""
    value = evaluate(expression, scope, depth)
    if not isinstance(value, bool):
        raise mistake("wrong-kind", expression.span, f"expected yes or no, found {kind_of(value)}")
    return value


def quantity(expression: tree.Expression, scope: Scope, dimension: Dimension, what: str = "") -> float:
    """A number in the base unit of a dimension; the bare 0 fits any. Raises Mistake."""
    value = evaluate(expression, scope)
    if isinstance(value, Quantity) and (value.dimension == dimension or value.bare_zero):
        return value.value
    wanted = with_article(dimension_name(dimension))
    hint = ""
    if isinstance(value, Quantity) and value.dimension == NUMBER and isinstance(expression, tree.Number):
        hint = f"give it a unit, such as `{expression.text} {usual_unit(dimension)[0]}`"
    raise mistake(
        "wrong-kind", expression.span, f"{what + ': ' if what else ''}expected {wanted}, found {kind_of(value)}", hint
    )


def vector(expression: tree.Expression, scope: Scope, size: int, dimension: Dimension | None = None) -> Vector:
    """A point or vector of so many components, of `dimension` where given (bare zeros fit). Raises Mistake."""
    value = evaluate(expression, scope)
    if not isinstance(value, Vector) or len(value.components) != size:
        wanted = {LENGTH: "a point"}.get(dimension or NUMBER, "a vector") + f" of {size} values"
        raise mistake("wrong-kind", expression.span, f"expected {wanted}, found {kind_of(value)}")
    if dimension is not None and value.dimension != dimension:
        if not any(value.components):
            return Vector(value.components, dimension)
        found = dimension_name(value.dimension)
        raise mistake(
            "wrong-kind", expression.span, f"expected {dimension_name(dimension)}s in the parentheses, found {found}s"
        )
    return value


def count(expression: tree.Expression, scope: Scope, least: int = 0, most: int = limits.COPIES) -> int:
    """A whole number within bounds. Raises Mistake."""
    number = quantity(expression, scope, NUMBER)
    if number != math.floor(number):
        raise mistake("not-whole", expression.span, f"expected a whole number, found {spell_number(number)}")
    if number < least:
        raise mistake("out-of-range", expression.span, f"expected {least} or more, found {spell_number(number)}")
    if number > most:
        raise mistake("too-much", expression.span, f"{spell_number(number)} is more than {most:,}, the limit")
    return int(number)


def text(expression: tree.Expression, scope: Scope) -> str:
    """A text. Raises Mistake."""
    value = evaluate(expression, scope)
    if not isinstance(value, str):
        raise mistake("wrong-kind", expression.span, f"expected a text, found {kind_of(value)}")
    return value


def unknown_name(name: str, span: Span, scope: Scope) -> Mistake:
    """The mistake of using a name that nothing declares, with the nearest name in reach."""
    near = nearest(name, [*scope.known(), *FUNCTIONS])
    return mistake("unknown-name", span, f"nothing here is called `{name}`", f"did you mean `{near}`?" if near else "")


def _finite(value: float, span: Span) -> float:
    if not math.isfinite(value):
        raise mistake("out-of-range", span, "the result is too large to be a number")
    return value


def _text(expression: tree.Text, scope: Scope, depth: int) -> str:
    parts = []
    for part in expression.parts:
        if isinstance(part, str):
            parts.append(part)
        else:
            value = evaluate(part, scope, depth)
            parts.append(value if isinstance(value, str) else spell(value))
    joined = "".join(parts)
    if len(joined) > limits.TEXT:
        raise mistake("too-much", expression.span, f"this text is longer than {limits.TEXT:,} characters, the limit")
    return joined


def _path(path: tree.Path, scope: Scope) -> Value:
    inner: Scope | None = scope
    while inner is not None:
        if inner.paths is not None:
            value = inner.paths.value(path)
            if value is not None:
                return value
        inner = inner.outer
    first = path.steps[0]
    if len(path.steps) > 1:
        seen = scope.prefix(first.name)
        if seen is not None:
            return _path(tree.Path(path.steps[1:], path.span), seen)
        if scope.find(first.name) is None:
            raise unknown_name(first.name, first.span, scope)
        raise mistake(
            "unknown-name", path.steps[1].span, f"`{first.name}` is a value; it has no `{path.steps[1].name}`"
        )
    found = scope.find(first.name)
    if found is None:
        raise unknown_name(first.name, path.span, scope)
    if isinstance(found, Failed):
        raise Mistake(None)
    if isinstance(found, Formula):
        raise mistake("wrong-kind", path.span, f"`{first.name}` is a function", f"call it: `{first.name}(…)`")
    if first.index is not None:
        raise mistake("wrong-kind", first.span, f"`{first.name}` is a single value; brackets count copies")
    return found


def _call(call: tree.Call, scope: Scope, depth: int) -> Value:
    inner: Scope | None = scope
    while inner is not None:
        if inner.paths is not None:
            measured = inner.paths.call(call)
            if measured is not None:
                return measured
        inner = inner.outer
    name = call.path.dotted
    holder, local = _holder(call.path, scope)
    found = holder.find(local) if holder else None
    if isinstance(found, Failed):
        raise Mistake(None)
    if isinstance(found, Formula):
        return _apply(found, call, scope, depth)
    function = FUNCTIONS.get(name)
    if function is None:
        if found is not None:
            raise mistake("wrong-kind", call.path.span, f"`{name}` is {kind_of(found)}, not a function")
        raise unknown_name(name, call.path.span, scope)
    if call.named:
        raise mistake("wrong-kind", call.named[0].span, f"`{name}` takes values in order, without names")
    arguments = tuple(evaluate(argument, scope, depth) for argument in call.positional)
    try:
        value = function(arguments)
    except Unfit as unfit:
        raise mistake("wrong-kind", call.span, f"`{name}` {unfit}") from None
    except (OverflowError, ValueError):
        raise mistake("out-of-range", call.span, "the result is too large to be a number") from None
    if isinstance(value, Quantity):
        _finite(value.value, call.span)
    return value


def _holder(path: tree.Path, scope: Scope) -> tuple[Scope | None, str]:
    """The scope that a dotted function name leads to, and the name in it."""
    holder: Scope | None = scope
    for step in path.steps[:-1]:
        holder = holder.prefix(step.name) if holder else None
    return holder, path.steps[-1].name


def _apply(formula: Formula, call: tree.Call, scope: Scope, depth: int) -> Value:
    if depth >= limits.NESTING:
        raise mistake("too-deep", call.span, f"functions call each other more than {limits.NESTING} deep, the limit")
    if len(call.positional) > len(formula.parameters):
        raise mistake(
            "wrong-parameters",
            call.span,
            f"`{formula.name}` takes {len(formula.parameters)}, found {len(call.positional)}",
        )
    given: dict[str, Value | Formula | Failed] = dict(
        zip(formula.parameters, (evaluate(p, scope, depth) for p in call.positional), strict=False)
    )
    for setting in call.named:
        if setting.name not in formula.parameters:
            near = nearest(setting.name, list(formula.parameters))
            hint = f"did you mean `{near}`?" if near else ""
            raise mistake(
                "unknown-name", setting.name_span, f"`{formula.name}` has no parameter `{setting.name}`", hint
            )
        if setting.name in given:
            raise mistake("wrong-parameters", setting.span, f"`{setting.name}` is given twice")
        given[setting.name] = evaluate(setting.value, scope, depth)
    missing = [name for name in formula.parameters if name not in given]
    if missing:
        raise mistake("wrong-parameters", call.span, f"`{formula.name}` needs `{missing[0]}`")
    return evaluate(formula.body, formula.scope.inside(given), depth + 1)


def _vector(expression: tree.Tuple, scope: Scope, depth: int) -> Vector:
    components: list[Quantity] = []
    for item in expression.items:
        value = evaluate(item, scope, depth)
        if not isinstance(value, Quantity):
            raise mistake("wrong-kind", item.span, f"expected a value of a point, found {kind_of(value)}")
        components.append(value)
    dimension = next((c.dimension for c in components if not c.bare_zero), NUMBER)
    for item, component in zip(expression.items, components, strict=True):
        if component.dimension != dimension and not component.bare_zero:
            raise mistake(
                "wrong-kind",
                item.span,
                f"the values of a point are of one kind: expected {with_article(dimension_name(dimension))}, "
                f"found {kind_of(component)}",
            )
    return Vector(tuple(c.value for c in components), dimension)


def _interval(expression: tree.Range, scope: Scope, depth: int) -> Interval:
    low, high = evaluate(expression.low, scope, depth), evaluate(expression.high, scope, depth)
    if not isinstance(low, Quantity) or not isinstance(high, Quantity):
        wrong = low if not isinstance(low, Quantity) else high
        raise mistake("wrong-kind", expression.span, f"a range runs between two values, found {kind_of(wrong)}")
    low, high = _matched(low, high, expression.span, "a range runs between values of one kind")
    if low.value > high.value:
        raise mistake(
            "out-of-range", expression.span, f"the range ends before it starts: {spell(low)} .. {spell(high)}"
        )
    return Interval(low, high)


def _matched(left: Quantity, right: Quantity, span: Span, what: str) -> tuple[Quantity, Quantity]:
    """Both with one dimension; a bare 0 takes the other's."""
    if left.dimension == right.dimension:
        return left, right
    if left.bare_zero:
        return Quantity(0.0, right.dimension), right
    if right.bare_zero:
        return left, Quantity(0.0, left.dimension)
    raise mistake("wrong-kind", span, f"{what}, found {kind_of(left)} and {kind_of(right)}")


def _unary(expression: tree.Unary, scope: Scope, depth: int) -> Value:
    if expression.operator == "not":
        return not truth(expression.operand, scope, depth)
    value = evaluate(expression.operand, scope, depth)
    match value:
        case Quantity():
            return Quantity(0.0 - value.value if value.value else 0.0, value.dimension, value.bare_zero)
        case Vector():
            return Vector(tuple(0.0 - c if c else 0.0 for c in value.components), value.dimension)
        case _:
            raise mistake("wrong-kind", expression.span, f"a sign needs a number, found {kind_of(value)}")


def _binary(expression: tree.Binary, scope: Scope, depth: int) -> Value:
    operator = expression.operator
    if operator == "and":
        return truth(expression.left, scope, depth) and truth(expression.right, scope, depth)
    if operator == "or":
        return truth(expression.left, scope, depth) or truth(expression.right, scope, depth)
    left, right = evaluate(expression.left, scope, depth), evaluate(expression.right, scope, depth)
    if operator in ("is", "is not"):
        return _same(left, right, expression.span) == (operator == "is")
    if operator in ("<", "<=", ">", ">="):
        return _ordered(operator, left, right, expression.span)
    return arithmetic(operator, left, right, expression)


def _same(left: Value, right: Value, span: Span) -> bool:
    if isinstance(left, Quantity) and isinstance(right, Quantity):
        left, right = _matched(left, right, span, "only values of one kind can be compared")
        return left.value == right.value
    if type(left) is not type(right):
        raise mistake(
            "wrong-kind", span, f"only values of one kind can be compared, found {kind_of(left)} and {kind_of(right)}"
        )
    return left == right


_ORDER: dict[str, Callable[[float, float], bool]] = {
    "<": lambda a, b: a < b,
    "<=": lambda a, b: a <= b,
    ">": lambda a, b: a > b,
    ">=": lambda a, b: a >= b,
}


def _ordered(operator: str, left: Value, right: Value, span: Span) -> bool:
    if not isinstance(left, Quantity) or not isinstance(right, Quantity):
        wrong = left if not isinstance(left, Quantity) else right
        raise mistake("wrong-kind", span, f"`{operator}` compares two values, found {kind_of(wrong)}")
    left, right = _matched(left, right, span, "only values of one kind can be compared")
    return _ORDER[operator](left.value, right.value)


def arithmetic(operator: str, left: Value, right: Value, at: tree.Binary) -> Value:
    """Sums, differences, products, quotients and powers of quantities and vectors. Raises Mistake."""
    for value in (left, right):
        if isinstance(value, Quantity) and value.dimension.place:
            raise mistake("wrong-kind", at.span, f"a {value.dimension.place} takes no part in arithmetic")
    match operator, left, right:
        case ("+" | "-", Quantity(), Quantity()):
            left, right = _matched(left, right, at.span, f"`{operator}` joins values of one kind")
            total = left.value + right.value if operator == "+" else left.value - right.value
            return Quantity(_finite(total, at.span), left.dimension, left.bare_zero and right.bare_zero)
        case ("+" | "-", Vector(), Vector()):
            return _vector_sum(operator, left, right, at.span)
        case ("*", Quantity(), Quantity()):
            return Quantity(_finite(left.value * right.value, at.span), left.dimension * right.dimension)
        case ("*", Quantity(), Vector()) | ("*", Vector(), Quantity()):
            factor, moved = (left, right) if isinstance(left, Quantity) else (right, left)
            assert isinstance(factor, Quantity) and isinstance(moved, Vector)
            components = tuple(_finite(c * factor.value, at.span) for c in moved.components)
            return Vector(components, moved.dimension * factor.dimension)
        case ("/", Quantity() | Vector(), Quantity()):
            return _quotient(left, right, at)
        case ("^", Quantity(), Quantity()):
            return _power(left, right, at)
    raise mistake("wrong-kind", at.span, f"`{operator}` cannot join {kind_of(left)} and {kind_of(right)}")


def _vector_sum(operator: str, left: Vector, right: Vector, span: Span) -> Vector:
    sign = 1 if operator == "+" else -1
    if len(left.components) != len(right.components):
        raise mistake("wrong-kind", span, "one of these has two values, the other three")
    if left.dimension != right.dimension and any(left.components) and any(right.components):
        raise mistake(
            "wrong-kind", span, f"`{operator}` joins values of one kind, found {kind_of(left)} and {kind_of(right)}"
        )
    dimension = left.dimension if any(left.components) else right.dimension
    pairs = zip(left.components, right.components, strict=True)
    return Vector(tuple(_finite(a + sign * b, span) for a, b in pairs), dimension)


def _quotient(left: Value, right: Quantity, at: tree.Binary) -> Value:
    if right.value == 0:
        raise mistake("division-by-zero", at.right.span, "this divides by 0")
    if isinstance(left, Vector):
        components = tuple(_finite(c / right.value, at.span) for c in left.components)
        return Vector(components, left.dimension / right.dimension)
    assert isinstance(left, Quantity)
    return Quantity(_finite(left.value / right.value, at.span), left.dimension / right.dimension)


def _power(left: Quantity, right: Quantity, at: tree.Binary) -> Quantity:
    if right.dimension != NUMBER:
        raise mistake("wrong-kind", at.right.span, f"expected a number as the power, found {kind_of(right)}")
    if left.dimension != NUMBER and (right.value != math.floor(right.value) or abs(right.value) > 9):
        raise mistake("wrong-kind", at.right.span, f"{kind_of(left)} can only be raised to a whole power up to 9")
    if left.value == 0 and right.value < 0:
        raise mistake("division-by-zero", at.span, "0 cannot be raised to a negative power")
    if left.value < 0 and right.value != math.floor(right.value):
        raise mistake("out-of-range", at.span, "a negative number can only be raised to a whole power")
    try:
        value = _raised(left.value, right.value)
    except OverflowError:
        value = math.inf
    dimension = NUMBER if left.dimension == NUMBER else left.dimension ** int(right.value)
    return Quantity(_finite(value, at.span), dimension)


def _raised(base: float, power: float) -> float:
    """Whole powers by multiplication, the same on every processor; others by the platform's `pow`."""
    if power != math.floor(power) or abs(power) > 1024:
        return float(base**power)
    result, factor, left = 1.0, base, int(abs(power))
    while left:
        if left & 1:
            result *= factor
        factor *= factor
        left >>= 1
    return result if power >= 0 else 1.0 / result

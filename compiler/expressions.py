"""Expressions to values, with dimensions checked."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from typing import Any

from platewright.lang import tree, units
from platewright.lang.nearest import nearest
from platewright.lang.source import Span
from platewright.lang.units import LENGTH, NUMBER, Dimension

from . import limits
from .arithmetic import arithmetic, compare, finite, matched, negative
from .functions import FUNCTIONS, Unfit
from .mistakes import Mistake, mistake
from .scope import Failed, Formula, Named, Record, Scope, did_you_mean, unknown_name
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


def evaluate(expression: tree.Expression, scope: Scope, depth: int = 0) -> Value:
    """The value of an expression. Raises Mistake. Cost: linear in the expression and the functions it calls."""
    scope.budget.step(expression.span)
    if depth >= limits.LEVELS:
        sentence = f"operations and functions stand within each other more than {limits.LEVELS} deep, the limit"
        raise mistake("too-deep", expression.span, sentence)
    return _EVALUATORS[type(expression)](expression, scope, depth + 1)


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
        unit = usual_unit(dimension)[0]
        hint = f"give it a unit, such as `{expression.text} {unit}`" if not expression.unit else ""
    raise mistake(
        "wrong-kind", expression.span, f"{what + ': ' if what else ''}expected {wanted}, found {kind_of(value)}", hint
    )


def vector(expression: tree.Expression, scope: Scope, size: int, dimension: Dimension | None = None) -> Vector:
    """A point or vector of so many components, of `dimension` where given (bare zeros fit). Raises Mistake."""
    value = evaluate(expression, scope)
    if not isinstance(value, Vector) or len(value.components) != size:
        wanted = ("a point" if dimension == LENGTH else "a vector") + f" of {size} values"
        found = kind_of(value) if not isinstance(value, Vector) else f"one of {len(value.components)}"
        raise mistake("wrong-kind", expression.span, f"expected {wanted}, found {found}")
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


_EXPONENT = re.compile(r"[eE]([+-]?)0*(\d+)$")


def literal(written: str, unit: str, span: Span) -> Quantity:
    """A number as written in the text or in a table; the 0 without a unit fits any dimension. Raises Mistake.

    A number too large, or too small and not 0, to be held is refused before it is computed.
    """
    power = _EXPONENT.search(written)
    if power is not None and (len(power[2]) > 3 or int(power[2]) > limits.EXPONENT):
        too = "small" if power[1] == "-" else "large"
        raise mistake("out-of-range", span, f"this number is too {too}: its power of ten passes {limits.EXPONENT}")
    value, dimension = units.quantity(written, unit)
    if not math.isfinite(value):
        raise mistake("out-of-range", span, "this number is too large to be held")
    if value == 0 and re.search("[1-9]", written.split("e")[0]):
        raise mistake("out-of-range", span, "this number is too small to be held")
    return Quantity(value + 0.0, dimension, value == 0 and not unit)


def _number(expression: tree.Number, scope: Scope, depth: int) -> Value:
    key = (expression.text, expression.unit)
    known = scope.budget.literals.get(key)
    if known is None:
        known = scope.budget.literals[key] = literal(*key, expression.span)
    return known


def _text(expression: tree.Text, scope: Scope, depth: int) -> str:
    parts: list[str] = []
    for part in expression.parts:
        value = part if isinstance(part, str) else evaluate(part, scope, depth)
        parts.append(value if isinstance(value, str) else spell(value))
    joined = "".join(parts)
    if len(joined) > limits.TEXT:
        raise mistake("too-much", expression.span, f"this text is longer than {limits.TEXT:,} characters, the limit")
    return joined


def _path(path: tree.Path, scope: Scope, depth: int) -> Value:
    value = scope.path_value(path)
    if value is not None:
        return value
    first = path.steps[0]
    seen = scope.prefix(first.name) if len(path.steps) > 1 else None
    if seen is not None:
        return _path(tree.Path(path.steps[1:], path.span), seen, depth)
    found = _meant(first, scope)
    if isinstance(found, Record):
        return found.cell(path)
    if len(path.steps) > 1:
        sentence = f"`{first.name}` is a value; it has no `{path.steps[1].name}`"
        raise mistake("unknown-name", path.steps[1].span, sentence)
    if isinstance(found, Formula):
        raise mistake("wrong-kind", path.span, f"`{first.name}` is a function", f"call it: `{first.name}(…)`")
    if first.index is not None:
        raise mistake("wrong-kind", first.span, f"`{first.name}` is a single value; brackets count copies")
    return found


def _meant(step: tree.Step, scope: Scope) -> Value | Formula | Record:
    """What a name stands for. Raises Mistake, without a problem where its value has been reported already."""
    found = scope.find(step.name)
    if found is None:
        if scope.prefix(step.name) is not None:
            hint = f"name what it declares, such as `{step.name}.size`"
            raise mistake("wrong-kind", step.span, f"`{step.name}` is the prefix of a file seen, not a value", hint)
        if step.name in FUNCTIONS:
            hint = f"call it: `{step.name}(…)`"
            raise mistake("wrong-kind", step.span, f"`{step.name}` is a function of the language", hint)
        raise unknown_name(step.name, step.span, scope)
    if isinstance(found, Failed):
        raise Mistake(None)
    return found


def _call(call: tree.Call, scope: Scope, depth: int) -> Value:
    measured = scope.measured(call)
    if measured is not None:
        return measured
    name = call.path.dotted
    if name in FUNCTIONS:
        return _built_in(name, call, scope, depth)
    holder = scope
    for step in call.path.steps[:-1]:
        inner = holder.prefix(step.name)
        if inner is None:
            _meant(step, holder)
            raise mistake("wrong-kind", step.span, f"`{step.name}` is a value; it has no functions")
        holder = inner
    last = call.path.steps[-1]
    found = holder.find(last.name)
    if found is None:
        raise unknown_name(name, call.path.span, holder)
    if isinstance(found, Failed):
        raise Mistake(None)
    if not isinstance(found, Formula):
        what = "a row of a table" if isinstance(found, Record) else kind_of(found)
        raise mistake("wrong-kind", call.path.span, f"`{name}` is {what}, not a function")
    given = _given(found, call, scope, depth)
    return evaluate(found.body, found.scope.inside(given), depth)


def _built_in(name: str, call: tree.Call, scope: Scope, depth: int) -> Value:
    if call.named:
        raise mistake("wrong-parameters", call.named[0].span, f"`{name}` takes values in order, without names")
    arguments = [evaluate(argument, scope, depth) for argument in call.positional]
    try:
        value = FUNCTIONS[name](tuple(arguments))
    except Unfit as unfit:
        raise mistake("wrong-parameters", call.span, f"`{name}` {unfit}") from None
    except (OverflowError, ValueError):
        raise mistake("out-of-range", call.span, "the result is too large to be a number") from None
    if isinstance(value, Quantity):
        return Quantity(finite(value.value, call.span), value.dimension, value.bare_zero)
    return value


def _given(formula: Formula, call: tree.Call, scope: Scope, depth: int) -> dict[str, Named]:
    """The parameters of a function as called. Raises Mistake."""
    wanted = formula.parameters
    if len(call.positional) > len(wanted):
        takes = {0: "no values", 1: "one value"}.get(len(wanted), f"{len(wanted)} values")
        sentence = f"`{formula.name}` takes {takes}, found {len(call.positional)}"
        raise mistake("wrong-parameters", call.span, sentence)
    given: dict[str, Named] = {}
    for name, argument in zip(wanted, call.positional, strict=False):
        given[name] = evaluate(argument, scope, depth)
    for setting in call.named:
        if setting.name not in wanted:
            near = nearest(setting.name, wanted)
            sentence = f"`{formula.name}` has no parameter `{setting.name}`"
            raise mistake("unknown-name", setting.name_span, sentence, did_you_mean(near))
        if setting.name in given:
            raise mistake("wrong-parameters", setting.span, f"`{setting.name}` is given twice")
        given[setting.name] = evaluate(setting.value, scope, depth)
    missing = [name for name in wanted if name not in given]
    if missing:
        raise mistake("wrong-parameters", call.span, f"`{formula.name}` needs `{missing[0]}`")
    return given


def _tuple(expression: tree.Tuple, scope: Scope, depth: int) -> Vector:
    components: list[Quantity] = []
    for item in expression.items:
        value = evaluate(item, scope, depth)
        if not isinstance(value, Quantity):
            raise mistake("wrong-kind", item.span, f"expected a value of a point, found {kind_of(value)}")
        components.append(value)
    dimension = next((each.dimension for each in components if not each.bare_zero), NUMBER)
    for item, component in zip(expression.items, components, strict=True):
        if component.dimension is not dimension and component.dimension != dimension and not component.bare_zero:
            wanted = with_article(dimension_name(dimension))
            sentence = f"the values of a point are of one kind: expected {wanted}, found {kind_of(component)}"
            raise mistake("wrong-kind", item.span, sentence)
    return Vector(tuple([each.value for each in components]), dimension)


def _range(expression: tree.Range, scope: Scope, depth: int) -> Interval:
    low, high = evaluate(expression.low, scope, depth), evaluate(expression.high, scope, depth)
    if not isinstance(low, Quantity) or not isinstance(high, Quantity):
        wrong = low if not isinstance(low, Quantity) else high
        raise mistake("wrong-kind", expression.span, f"a range runs between two quantities, found {kind_of(wrong)}")
    low, high = matched(low, high, expression.span, "a range runs between values of one kind")
    if low.value > high.value:
        sentence = f"the range ends before it starts: {spell(low)} .. {spell(high)}"
        raise mistake("out-of-range", expression.span, sentence, "write the smaller value first")
    return Interval(low, high)


def _unary(expression: tree.Unary, scope: Scope, depth: int) -> Value:
    if expression.operator == "not":
        return not truth(expression.operand, scope, depth)
    return negative(evaluate(expression.operand, scope, depth), expression.span)


def _binary(expression: tree.Binary, scope: Scope, depth: int) -> Value:
    operator = expression.operator
    if operator == "and":
        return truth(expression.left, scope, depth) and truth(expression.right, scope, depth)
    if operator == "or":
        return truth(expression.left, scope, depth) or truth(expression.right, scope, depth)
    left, right = evaluate(expression.left, scope, depth), evaluate(expression.right, scope, depth)
    if operator in ("+", "-", "*", "/", "^"):
        return arithmetic(operator, left, right, expression)
    return compare(operator, left, right, expression.span)


def _choice(expression: tree.Choice, scope: Scope, depth: int) -> Value:
    chosen = expression.then if truth(expression.condition, scope, depth) else expression.otherwise
    return evaluate(chosen, scope, depth)


def _constant(expression: tree.Truth | tree.Ratio | tree.Date, scope: Scope, depth: int) -> Value:
    match expression:
        case tree.Truth():
            return expression.value
        case tree.Ratio():
            first, second = (literal(each, "", expression.span).value for each in (expression.first, expression.second))
            return Proportion(first, second)
        case tree.Date():
            return Day(expression.text)


_EVALUATORS: dict[type, Callable[[Any, Scope, int], Value]] = {
    tree.Number: _number,
    tree.Path: _path,
    tree.Binary: _binary,
    tree.Tuple: _tuple,
    tree.Unary: _unary,
    tree.Call: _call,
    tree.Choice: _choice,
    tree.Text: _text,
    tree.Truth: _constant,
    tree.Range: _range,
    tree.Ratio: _constant,
    tree.Date: _constant,
}

"""From an author's expression in two variables to a program that can be asked for its value anywhere."""

from __future__ import annotations

from collections.abc import Mapping

from platewright.lang import tree
from platewright.lang.units import Dimension

from .expressions import evaluate
from .functions import FUNCTIONS
from .mistakes import mistake
from .modules import names_in
from .scope import Formula, Scope
from .solids.recipe import Field
from .values import Interval, Quantity, dimension_name, kind_of, with_article

Program = tuple[tuple[str, float], ...]

MOST_STEPS = 2000
"""Steps of one program."""
_PROBES = (0.0, 0.5, 1.0, 0.25, 0.6180339887498949)
"""Where in their ranges the variables are tried, as parts of them: dimensions and domains show at a few places."""


def read_field(
    written: tree.Expression, variables: Mapping[str, Interval], scope: Scope, dimension: Dimension, what: str
) -> Field:
    """The function that an expression is of two variables, checked to be of a dimension. Raises Mistake."""
    for name in variables:
        if scope.find(name) is not None:
            sentence = f"`{name}` is declared outside already; here it would be a variable of the surface"
            raise mistake("duplicate-name", written.span, sentence, "rename the one outside")
    for one in _PROBES:
        for other in _PROBES:
            at = {
                name: Quantity(each.low.value + part * (each.high.value - each.low.value), each.low.dimension)
                for (name, each), part in zip(variables.items(), (one, other), strict=True)
            }
            value = evaluate(written, scope.inside(at))
            if not isinstance(value, Quantity) or (value.dimension != dimension and not value.bare_zero):
                wanted = with_article(dimension_name(dimension))
                raise mistake("wrong-kind", written.span, f"{what}: expected {wanted}, found {kind_of(value)}")
    numbered: dict[str, Program] = {name: (("variable", float(k)),) for k, name in enumerate(variables)}
    return Field(_program(written, scope, numbered))


def _program(written: tree.Expression, scope: Scope, inner: Mapping[str, Program]) -> Program:
    """The steps that leave the value of an expression on the stack. Raises Mistake."""
    scope.budget.step(written.span)
    if not any(path.steps[0].name in inner for path in names_in(written)):
        return (("number", _constant(written, scope)),)
    match written:
        case tree.Path():
            return inner[written.steps[0].name]
        case tree.Unary():
            name = "not" if written.operator == "not" else "negative"
            return _joined(written, name, _program(written.operand, scope, inner))
        case tree.Binary():
            sides = (_program(written.left, scope, inner), _program(written.right, scope, inner))
            return _joined(written, written.operator, *sides)
        case tree.Choice():
            parts = (written.condition, written.then, written.otherwise)
            return _joined(written, "choice", *(_program(each, scope, inner) for each in parts))
        case tree.Call():
            return _call(written, scope, inner)
    raise mistake("wrong-form", written.span, "the function of a surface is made of sums, products and functions")


def _constant(written: tree.Expression, scope: Scope) -> float:
    value = evaluate(written, scope)
    if isinstance(value, bool):
        return float(value)
    if not isinstance(value, Quantity):
        raise mistake("wrong-kind", written.span, f"expected a number or a quantity, found {kind_of(value)}")
    return value.value


def _joined(written: tree.Expression, name: str, *parts: Program) -> Program:
    if sum(map(len, parts)) >= MOST_STEPS:
        raise mistake("too-much", written.span, f"this function takes more than {MOST_STEPS:,} steps, the limit")
    return (*(step for part in parts for step in part), (name, float(len(parts))))


def _call(call: tree.Call, scope: Scope, inner: Mapping[str, Program]) -> Program:
    name = call.path.dotted
    if name in FUNCTIONS:
        parts = [_program(each, scope, inner) for each in call.positional]
        if name == "arctan" and len(parts) == 2:
            return _joined(call, "arctan of two", *parts)
        if name in ("min", "max"):
            whole = parts[0]
            for part in parts[1:]:
                whole = _joined(call, name, whole, part)
            return whole
        if name in ("floor", "ceiling", "round") and len(parts) == 2:
            steps = _joined(call, name, _joined(call, "/", parts[0], parts[1]))
            return _joined(call, "*", steps, parts[1])
        if len(parts) == 1 and name != "length":
            return _joined(call, name, parts[0])
        raise mistake("wrong-form", call.span, f"`{name}` has no place in the function of a surface")
    holder = scope
    for step in call.path.steps[:-1]:
        holder = holder.prefix(step.name) or holder
    found = holder.find(call.path.steps[-1].name)
    # The probes have called it before, so that it is there and takes what it is given.
    assert isinstance(found, Formula)
    given = {
        each: _program(value, scope, inner) for each, value in zip(found.parameters, call.positional, strict=False)
    }
    given |= {setting.name: _program(setting.value, scope, inner) for setting in call.named}
    return _program(found.body, found.scope, given)

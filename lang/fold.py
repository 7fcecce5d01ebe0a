"""Flat runs of operands and operators into nested nodes, by one table of precedence."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any, TypeAlias

from .scanner import Slip
from .source import Span
from .tree import Binary, Choice, Expression, Number, Range, Unary

Operator: TypeAlias = tuple[str, int, int]
"""An operator's word and its 0-based columns; everything else in a flat run is an expression."""

_COMPARISONS = frozenset({"is", "is not", "<", "<=", ">", ">="})
# What binds tighter has the greater strength. `else` ends whatever it meets.
STRENGTH: Mapping[str, int] = MappingProxyType(
    {
        "else": 0,
        "..": 1,
        "if": 2,
        "or": 3,
        "and": 4,
        "not": 5,
        **dict.fromkeys(sorted(_COMPARISONS), 6),
        "+": 7,
        "-": 7,
        "*": 8,
        "/": 8,
        "sign": 9,
        "^": 10,
    }
)


def fold(flat: list[Any]) -> Expression:
    """The expression of a flat run, which is used up. Raises Slip where operators do not go together.

    Precedence climbing (Richards and Whitby-Strevens 1979); its depth is bounded by the scanner's limit of operations.
    """
    if len(flat) == 1:
        return flat[0]  # type: ignore[no-any-return]
    flat.reverse()
    node = _climb(flat, 0)
    if flat:
        _, start, end = flat[-1]
        raise Slip("broken-value", start, end, "`else` has no `if` before it", "write `A if CONDITION else B`")
    return node


def _climb(flat: list[Any], strength: int) -> Expression:
    """The expression at the end of a reversed run, as far as its operators are stronger than `strength`."""
    node: Any = flat.pop()
    if isinstance(node, tuple):
        node = _prefixed(flat, node, strength)
    before = ""
    while flat:
        operator, start, end = flat[-1]
        power = STRENGTH[operator]
        if power <= strength:
            break
        flat.pop()
        if operator == "is" and isinstance(flat[-1], tuple) and flat[-1][0] == "not":
            operator = "is not"
            flat.pop()
        _check_chain(before, operator, start, end)
        before = operator
        if operator == "if":
            node = _choice(flat, node)
            continue
        right = _climb(flat, power - 1 if operator == "^" else power)
        whole = node.span.to(right.span)
        node = Range(node, right, whole) if operator == ".." else Binary(operator, node, right, whole)
    return node  # type: ignore[no-any-return]


def _check_chain(before: str, operator: str, start: int, end: int) -> None:
    if operator in _COMPARISONS and before in _COMPARISONS:
        sentence = "a comparison cannot be compared again"
        raise Slip("chained-comparison", start, end, sentence, "join two comparisons by `and`")
    if operator == ".." and before == "..":
        raise Slip("broken-value", start, end, "a range has one `..` between its two ends")


def _prefixed(flat: list[Any], prefix: Operator, strength: int) -> Expression:
    word, start, end_column = prefix
    if word == "not" and strength > STRENGTH["not"]:
        sentence = "`not` binds looser than the operator before it"
        raise Slip("broken-value", start, end_column, sentence, "put `not` and its value in parentheses")
    operand = _climb(flat, STRENGTH["not" if word == "not" else "sign"] - 1)
    end = operand.span
    whole = Span(end.file, end.line, start + 1, end.end_line, end.end_column)
    if word == "not":
        return Unary("not", operand, whole)
    if isinstance(operand, Number) and operand.unit == "degC" and operand.text[0] != "-":
        return Number("-" + operand.text, operand.unit, whole)
    return Unary("-", operand, whole)


def _choice(flat: list[Any], then: Expression) -> Choice:
    condition = _climb(flat, STRENGTH["if"])
    if not flat or flat[-1][0] != "else":
        end = condition.span.end_column - 1
        raise Slip("broken-value", end, end, "expected `else` and a value", "write `A if CONDITION else B`")
    flat.pop()
    otherwise = _climb(flat, STRENGTH["if"] - 1)
    return Choice(condition, then, otherwise, then.span.to(otherwise.span))

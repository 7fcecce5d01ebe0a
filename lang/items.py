"""What a line is made of before its words are read: items, equations, series."""

from __future__ import annotations

from typing import NamedTuple, TypeAlias

from msgspec import Struct

from .scanner import Slip
from .source import Span
from .tree import Expression, Path, Setting, Step


class Equation(Struct, frozen=True):
    """`left = right`, before it is known what it sets or defines."""

    left: Expression
    right: Expression
    span: Span


class Series(Struct, frozen=True):
    """Values or settings joined by commas outside parentheses."""

    entries: tuple[Expression | Equation, ...]
    span: Span


Node: TypeAlias = "Expression | Equation | Series"


class Item(NamedTuple):
    """One item of a line: a bare name has a `word` and no node yet; `start` and `end` are 0-based columns.

    `kind` is the terminal it starts with.
    """

    word: str
    node: Node | None
    start: int
    end: int
    kind: str


class Place(NamedTuple):
    """Where a line stands."""

    file: str
    line: int

    def span(self, start: int, end: int) -> Span:
        """The span of 0-based columns of this line."""
        return Span(self.file, self.line, start + 1, self.line, end + 1)


def path_of(place: Place, written: str, start: int) -> Path:
    """The path of a dotted name whose first letter is in column `start`."""
    file, line = place
    span = Span(file, line, start + 1, line, start + 1 + len(written))
    if "." not in written:
        return Path((Step(written, None, span),), span)
    steps = []
    column = start
    for name in written.split("."):
        steps.append(Step(name, None, place.span(column, column + len(name))))
        column += len(name) + 1
    return Path(tuple(steps), span)


def expression_of(place: Place, item: Item) -> Expression | None:
    """The expression an item is, or None for an equation or a series."""
    if item.node is None:
        return path_of(place, item.word, item.start)
    if isinstance(item.node, Equation | Series):
        return None
    return item.node


def plain_name(node: object) -> str:
    """The name a node is if it is a single name without brackets, else ""."""
    if isinstance(node, Path) and len(node.steps) == 1 and node.steps[0].index is None:
        return node.steps[0].name
    return ""


def setting_of(equation: Equation) -> Setting:
    """`name = value` as a setting. Raises Slip where the left side is no plain name."""
    name = plain_name(equation.left)
    if not name:
        raise slip_at(equation.left.span, "wrong-form", "expected a plain name before `=`", "equality is written `is`")
    return Setting(name, equation.right, equation.span, equation.left.span)


def slip_at(span: Span, code: str, sentence: str, hint: str = "") -> Slip:
    """A slip at a span of the line being read."""
    return Slip(code, span.column - 1, span.end_column - 1, sentence, hint)

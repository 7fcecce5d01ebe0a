"""Items into tree nodes: literals and names at once, everything else through the grammar (grammar.lark)."""

from __future__ import annotations

import functools
from collections.abc import Iterator
from dataclasses import dataclass, replace
from importlib import resources
from typing import Any, NamedTuple, TypeAlias

from lark import Lark, UnexpectedToken
from lark.lexer import Lexer

from .nearest import nearest
from .scanner import LITERALS, QUANTITY_PARTS, Piece, Slip, split_items
from .source import Span
from .tree import (
    Binary,
    Call,
    Choice,
    Date,
    Expression,
    Number,
    Path,
    Range,
    Ratio,
    Setting,
    Step,
    Text,
    Truth,
    Tuple,
    Unary,
)
from .units import UNITS


@dataclass(frozen=True, slots=True)
class Equation:
    """`left = right`, before it is known what it sets or defines."""

    left: Expression
    right: Expression
    span: Span


@dataclass(frozen=True, slots=True)
class Series:
    """Values or settings joined by commas outside parentheses."""

    entries: tuple[Expression | Equation, ...]
    span: Span


Node: TypeAlias = "Expression | Equation | Series"


class Item(NamedTuple):
    """One item of a line: a bare name has a `word` and no node yet; `start` and `end` are 0-based columns."""

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


def read_items(parser: Lark, place: Place, text: str, start: int) -> tuple[list[Item], int]:
    """The items of one line from column `start`, and the column of its comment, or -1. Raises Slip."""
    pieces, comment = split_items(text, start)
    return [_item(parser, place, text, item) for item in pieces], comment


def _item(parser: Lark, place: Place, text: str, pieces: list[Piece]) -> Item:
    if len(pieces) == 1:
        kind, start, end = pieces[0]
        if kind == "NAME":
            written = text[start:end]
            if "." not in written:
                return Item(written, None, start, end, kind)
            return Item("", path_of(place, written, start), start, end, kind)
        if kind in LITERALS:
            return Item("", _literal(parser, place, text, kind, start, end), start, end, kind)
    node = _parse(parser, place, text, pieces)
    return Item("", node, pieces[0].start, pieces[-1].end, pieces[0].kind)


def path_of(place: Place, written: str, start: int) -> Path:
    """The path of a dotted name whose first letter is in column `start`."""
    if "." not in written:
        span = place.span(start, start + len(written))
        return Path((Step(written, None, span),), span)
    steps = []
    column = start
    for name in written.split("."):
        steps.append(Step(name, None, place.span(column, column + len(name))))
        column += len(name) + 1
    return Path(tuple(steps), place.span(start, start + len(written)))


def _literal(parser: Lark, place: Place, text: str, kind: str, start: int, end: int) -> Expression:
    span = place.span(start, end)
    written = text[start:end]
    match kind:
        case "QUANTITY":
            return _quantity(written, start, span)
        case "NUMBER":
            return Number(written, "", span)
        case "TEXT":
            return _text(parser, place, written, start, span)
        case "TRUTH":
            return Truth(written == "yes", span)
        case "DATE":
            return Date(written, span)
    first, _, second = written.partition(":")
    return Ratio(first, second, span)


def _quantity(written: str, start: int, span: Span) -> Number:
    parts = QUANTITY_PARTS.fullmatch(written)
    assert parts is not None
    number, unit = parts.groups()
    if "/" in number and not int(number.partition("/")[2][:40]):
        raise Slip("bad-number", start, start + len(number), "a fraction cannot have 0 below the line")
    return Number(number, "inch" if unit == "in" else unit, span)


_ESCAPES = {'"': '"', "\\": "\\", "n": "\n", "{": "{", "}": "}"}


def _text(parser: Lark, place: Place, written: str, start: int, span: Span) -> Text:
    """The parts of a quoted text; the values in braces are read as any value is."""
    if "\\" not in written and "{" not in written and "}" not in written:
        return Text((written[1:-1],) if len(written) > 2 else (), span)
    parts: list[str | Expression] = []
    letters: list[str] = []
    column = 1
    last = len(written) - 1
    while column < last:
        letter = written[column]
        if letter == "\\":
            meant = _ESCAPES.get(written[column + 1])
            if meant is None:
                raise Slip(
                    "bad-escape",
                    start + column,
                    start + column + 2,
                    f"`\\{written[column + 1]}` means nothing in a text",
                    'the escapes are `\\"`, `\\\\`, `\\n`, `\\{` and `\\}`',
                )
            letters.append(meant)
            column += 2
        elif letter == "{":
            close = written.find("}", column)
            if close < 0:
                raise Slip(
                    "unclosed-bracket",
                    start + last,
                    start + last,
                    "expected `}`: a value in a text stands in braces",
                    "close the brace; for the brace itself write `\\{`",
                    opened=start + column,
                )
            if letters:
                parts.append("".join(letters))
                letters = []
            parts.append(_braced(parser, place, written[column + 1 : close], start + column + 1))
            column = close + 1
        elif letter == "}":
            raise Slip(
                "unopened-bracket",
                start + column,
                start + column + 1,
                "`}` closes nothing that is open",
                "for the brace itself write `\\}`",
            )
        else:
            letters.append(letter)
            column += 1
    if letters:
        parts.append("".join(letters))
    return Text(tuple(parts), span)


def _braced(parser: Lark, place: Place, written: str, start: int) -> Expression:
    padded = " " * start + written
    items, comment = read_items(parser, place, padded, start)
    if len(items) != 1 or comment >= 0:
        raise Slip("broken-value", start, start + len(written), "braces in a text hold one value, `{rim}`")
    node = expression_of(place, items[0])
    if node is None:
        raise Slip("broken-value", start, start + len(written), "braces in a text hold one value, `{rim}`")
    return node


def expression_of(place: Place, item: Item) -> Expression | None:
    """The expression an item is, or None for an equation or a series."""
    if item.node is None:
        return path_of(place, item.word, item.start)
    if isinstance(item.node, Equation | Series):
        return None
    return item.node


# --- through the grammar


class Token:
    """A token for the grammar: its terminal, and what it stands for. The columns are for slips alone.

    The other fields are what lark copies from the last token to its end token.
    """

    __slots__ = ("end", "start", "type", "value")
    start_pos = line = column = end_line = end_column = end_pos = 0

    def __init__(self, kind: str, value: Any, start: int, end: int) -> None:
        self.type = kind
        self.value = value
        self.start = start
        self.end = end


class _Handed(Lexer):
    """Hands over tokens that have been scanned before."""

    __future_interface__ = 2

    def __init__(self, lexer_conf: Any) -> None:
        pass

    def lex(self, lexer_state: Any, parser_state: Any) -> Iterator[Any]:
        return iter(lexer_state.text)


@functools.cache
def value_parser() -> Lark:
    """The LALR tables of the grammar, made once a process: a pure function of the grammar file (10 ms)."""
    grammar = resources.files(__package__).joinpath("grammar.lark").read_text(encoding="utf-8")
    return Lark(
        grammar,
        parser="lalr",
        lexer=_Handed,
        transformer=_Builder(),
        start="series",
        keep_all_tokens=True,
        maybe_placeholders=False,
    )


def _parse(parser: Lark, place: Place, text: str, pieces: list[Piece]) -> Node:
    tokens = [_token(parser, place, text, piece) for piece in pieces]
    try:
        node: Node = parser.parse(tokens)  # type: ignore[assignment]  # our lexer takes tokens
    except UnexpectedToken as unexpected:
        raise _broken(text, pieces, tokens, unexpected) from None
    return node


def _token(parser: Lark, place: Place, text: str, piece: Piece) -> Token:
    kind, start, end = piece
    if kind == "NAME":
        return Token(kind, path_of(place, text[start:end], start), start, end)
    if kind in LITERALS:
        return Token("LITERAL", _literal(parser, place, text, kind, start, end), start, end)
    if kind == "OPERATOR" or kind == "PREFIX":
        return Token(kind, (text[start:end], place.span(start, end)), start, end)
    return Token(kind, place.span(start, end), start, end)


def _broken(text: str, pieces: list[Piece], tokens: list[Token], unexpected: UnexpectedToken) -> Slip:
    """What is wrong with a value, from the token the grammar could not take."""
    at = next((i for i, token in enumerate(tokens) if token is unexpected.token), len(tokens))
    before = pieces[at - 1] if at else None
    found = pieces[at] if at < len(pieces) else None
    shown = f"`{text[found.start : found.end]}`" if found else "the end of the line"
    ends_value = before is not None and (before.kind in LITERALS or before.kind in ("NAME", "CLOSE", "UNINDEX"))
    if before is None:
        assert found is not None
        return Slip("broken-value", found.start, found.end, f"a value cannot start with {shown}")
    if not ends_value:
        behind = text[before.start : before.end]
        if found and found.kind == "CLOSE" and before.kind == "OPEN":
            return Slip("broken-value", before.end, before.end, "expected a value between the parentheses")
        return Slip("broken-value", before.end, before.end, f"expected a value behind `{behind}`, found {shown}")
    assert found is not None or at == len(tokens)
    if found is None:
        return Slip("broken-value", before.end, before.end, "expected `else` and a value: `A if CONDITION else B`")
    if found.kind == "PREFIX" and text[found.start] == "-":
        return sign_slip(found.start)
    if found.kind == "NAME" and before.kind == "NUMBER":
        return unit_slip(text, before, found.start, found.end)
    if found.kind == "EQUALS":
        return Slip("broken-value", found.start, found.end, "`=` defines or sets; equality is `is`", "write `is`")
    if found.kind == "RANGE":
        return Slip("broken-value", found.start, found.end, "a range has one `..` between its two ends")
    if found.kind == "OPEN" and before.kind == "NAME":
        return Slip(
            "call-space",
            before.end,
            found.end,
            "the parenthesis of a call touches its name",
            f"write `{text[before.start : before.end]}(`",
        )
    return Slip(
        "broken-value", before.end, before.end, f"expected a comma, an operator or the end of the value before {shown}"
    )


def sign_slip(start: int) -> Slip:
    """A sign that touches its value where a difference was meant."""
    return Slip(
        "sign-space",
        start,
        start + 1,
        "a sign that touches its value starts a value of its own",
        "for a difference write ` - ` with a space on both sides",
    )


def unit_slip(text: str, number: Piece, start: int, end: int) -> Slip:
    """A word behind a bare number where a unit was meant."""
    written = text[start:end]
    near = nearest(written, UNITS)
    return Slip(
        "unknown-unit",
        start,
        end,
        f"`{written}` behind the number `{text[number.start : number.end]}` is no unit",
        f"did you mean `{near}`?" if near else "",
    )


_COMPARISONS = frozenset({"is", "is not", "<", "<=", ">", ">="})
_STRENGTH = {"or": 1, "and": 2, "+": 5, "-": 5, "*": 6, "/": 6, "^": 8} | dict.fromkeys(_COMPARISONS, 4)
_NOT_STRENGTH = 3
_SIGN_STRENGTH = 7


class _Builder:
    """Builds tree nodes as rules are reduced; a method for each rule or alias of the grammar."""

    @staticmethod
    def series(children: list[Any]) -> Node:
        return children[0]  # type: ignore[no-any-return]

    @staticmethod
    def further_entry(children: list[Any]) -> Series:
        first, _, last = children
        before = first.entries if isinstance(first, Series) else (first,)
        return Series((*before, last), first.span.to(last.span))

    @staticmethod
    def equation(children: list[Any]) -> Equation:
        left, _, right = children
        return Equation(left, right, left.span.to(right.span))

    @staticmethod
    def range(children: list[Any]) -> Range:
        low, _, high = children
        return Range(low, high, low.span.to(high.span))

    @staticmethod
    def choice(children: list[Any]) -> Choice:
        then, _, condition, _, otherwise = children
        return Choice(condition, then, otherwise, then.span.to(otherwise.span))

    @staticmethod
    def literal(children: list[Any]) -> Expression:
        return children[0].value  # type: ignore[no-any-return]

    @staticmethod
    def group(children: list[Any]) -> Expression:
        opening, inner, closing = children
        grouped: Expression = replace(inner, span=opening.value.to(closing.value))
        return grouped

    @staticmethod
    def values_first(children: list[Any]) -> list[Expression]:
        return [children[0], children[2]]

    @staticmethod
    def values_more(children: list[Any]) -> list[Expression]:
        children[0].append(children[2])
        return children[0]  # type: ignore[no-any-return]

    @staticmethod
    def point(children: list[Any]) -> Tuple:
        return Tuple(tuple(children[1]), children[0].value.to(children[2].value))

    @staticmethod
    def arguments_first(children: list[Any]) -> list[Any]:
        return children

    @staticmethod
    def arguments_more(children: list[Any]) -> list[Any]:
        children[0].append(children[2])
        return children[0]  # type: ignore[no-any-return]

    @staticmethod
    def call_empty(children: list[Any]) -> Call:
        path, _, close = children
        return Call(path, (), (), path.span.to(close.value))

    @staticmethod
    def call(children: list[Any]) -> Call:
        path, _, arguments, close = children
        positional = tuple(entry for entry in arguments if not isinstance(entry, Equation))
        named = tuple(setting_of(entry) for entry in arguments if isinstance(entry, Equation))
        return Call(path, positional, named, path.span.to(close.value))

    @staticmethod
    def path(children: list[Any]) -> Path:
        return children[0].value  # type: ignore[no-any-return]

    @staticmethod
    def indexed(children: list[Any]) -> Path:
        path, _, index, close = children
        step = path.steps[-1]
        span = path.span.to(close.value)
        return Path((*path.steps[:-1], Step(step.name, index, step.span.to(close.value))), span)

    @staticmethod
    def stepped(children: list[Any]) -> Path:
        path, _, name = children
        return Path((*path.steps, *name.value.steps), path.span.to(name.value.span))

    @staticmethod
    def prefixed(children: list[Any]) -> list[Any]:
        return [children[0].value, children[1]]

    @staticmethod
    def prefixed_more(children: list[Any]) -> list[Any]:
        return [children[0].value, *children[1]]

    @staticmethod
    def joined(children: list[Any]) -> list[Any]:
        left, operator, right = children
        return [left, operator.value, right]

    @staticmethod
    def joined_more(children: list[Any]) -> list[Any]:
        left, operator, rest = children
        return [left, operator.value, *rest]

    @staticmethod
    def folded(children: list[Any]) -> Expression:
        flat = children[0]
        flat.reverse()
        return _fold(flat, 0)


def setting_of(equation: Equation) -> Setting:
    """`name = value` as a setting. Raises Slip where the left side is no plain name."""
    left = equation.left
    if not isinstance(left, Path) or len(left.steps) != 1 or left.steps[0].index is not None:
        raise Slip(
            "wrong-form",
            left.span.column - 1,
            left.span.end_column - 1,
            "expected a plain name before `=`",
            "equality is `is`",
        )
    return Setting(left.steps[0].name, equation.right, equation.span, left.span)


def _fold(flat: list[Any], strength: int) -> Expression:
    """The expression at the end of a reversed flat list, taking operators stronger than `strength`.

    Precedence climbing; depth is bounded by the scanner's limit of operations in one value.
    """
    node: Any = flat.pop()
    if isinstance(node, tuple):
        word, span = node
        operand = _fold(flat, _NOT_STRENGTH - 1 if word == "not" else _SIGN_STRENGTH - 1)
        node = _prefixed(word, span, operand)
    is_compared = False
    while flat:
        operator, span = flat[-1]
        is_not = operator == "is" and isinstance(flat[-2], tuple) and flat[-2][0] == "not"
        power = _STRENGTH[operator]
        if power <= strength:
            break
        flat.pop()
        if is_not:
            flat.pop()
            operator = "is not"
        if is_compared and operator in _COMPARISONS:
            raise Slip(
                "chained-comparison",
                span.column - 1,
                span.end_column - 1,
                "a comparison cannot be compared again",
                "join two comparisons by `and`",
            )
        is_compared = operator in _COMPARISONS
        right = _fold(flat, power - 1 if operator == "^" else power)
        node = Binary(operator, node, right, node.span.to(right.span))
    return node  # type: ignore[no-any-return]


def _prefixed(word: str, span: Span, operand: Expression) -> Expression:
    if word == "-" and isinstance(operand, Number) and operand.unit == "degC" and operand.text[0] != "-":
        return Number("-" + operand.text, operand.unit, span.to(operand.span))
    return Unary("not" if word == "not" else "-", operand, span.to(operand.span))

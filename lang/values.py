"""Items into tree nodes: literals and names at once, everything else through the grammar, and what is wrong there."""

from __future__ import annotations

from typing import Any

from lark import Lark, UnexpectedToken

from .fold import fold
from .items import Equation, Item, Node, Place, expression_of, path_of
from .parser import Token
from .scanner import LITERALS, QUANTITY_PARTS, Piece, Slip, split_items, unit_hint
from .source import Span
from .tree import Date, Expression, Number, Ratio, Text, Truth, Tuple

NUMBER_LENGTH_LIMIT = 40
EXPONENT_LIMIT = 300


def read_items(parser: Lark, place: Place, text: str, start: int) -> tuple[list[Item], int]:
    """The items of one line from column `start`, and the column of its comment, or -1. Raises Slip."""
    pieces, comment = split_items(text, start)
    return [_item(parser, place, text, item) for item in pieces], comment


def _item(parser: Lark, place: Place, text: str, pieces: list[Piece]) -> Item:
    kind, start, end = pieces[0]
    if len(pieces) == 1:
        if kind == "NAME":
            written = text[start:end]
            if "." not in written:
                return Item(written, None, start, end, kind)
            return Item("", path_of(place, written, start), start, end, kind)
        if kind in LITERALS:
            return Item("", _literal(parser, place, text, kind, start, end), start, end, kind)
    node = _flat_node(parser, place, text, pieces) or _parse(parser, place, text, pieces)
    return Item("", node, start, pieces[-1][2], kind)


def _flat_node(parser: Lark, place: Place, text: str, pieces: list[Piece]) -> Node | None:
    """The node of the most frequent items, just as the grammar builds it but sooner; None for all others.

    These are `a + b`, `name = a + b` and `(a, b + c, d)` without brackets inside. Mistakes are left to the grammar.
    """
    run: list[Any] = []
    done: list[Any] = []
    wants_operand = True
    separator = ""
    for i, (kind, start, end) in enumerate(pieces):
        if kind == "NAME" or kind in LITERALS:
            if not wants_operand:
                return None
            is_name = kind == "NAME"
            run.append(
                path_of(place, text[start:end], start) if is_name else _literal(parser, place, text, kind, start, end)
            )
            wants_operand = False
        elif kind in _FOLDED:
            if wants_operand != (kind == "PREFIX"):
                return None
            run.append((text[start:end], start, end))
            wants_operand = True
        elif kind == "OPEN" and i == 0:
            separator = "COMMA"
        elif kind == (separator or "EQUALS") and not wants_operand:
            separator = kind
            done.append(fold(run))
            run = []
            wants_operand = True
        elif kind == "CLOSE" and i == len(pieces) - 1:
            break
        else:
            return None
    if wants_operand:
        return None
    done.append(fold(run))
    if separator == "COMMA":
        span = place.span(pieces[0][1], pieces[-1][2])
        return Tuple(tuple(done), span) if len(done) > 1 else None
    if separator:
        return Equation(done[0], done[1], done[0].span.to(done[1].span)) if len(done) == 2 else None
    return done[0]  # type: ignore[no-any-return]


def _literal(parser: Lark, place: Place, text: str, kind: str, start: int, end: int) -> Expression:
    file, line = place
    span = Span(file, line, start + 1, line, end + 1)
    written = text[start:end]
    match kind:
        case "QUANTITY":
            return _quantity(written, start, span)
        case "NUMBER":
            _check_number(written, start)
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
    number, _, unit = written.rpartition(" ")
    if number:
        number = number.rstrip(" ")
    else:
        parts = QUANTITY_PARTS.fullmatch(written)
        assert parts is not None
        number, unit = parts.groups()
    _check_number(number, start)
    return Number(number, "inch" if unit == "in" else unit, span)


def _check_number(written: str, start: int) -> None:
    """Raises Slip for a number that is none, or that would take long to make exact."""
    if len(written) <= NUMBER_LENGTH_LIMIT and written.replace(".", "", 1).isdigit():
        return
    end = start + len(written)
    if len(written) > NUMBER_LENGTH_LIMIT:
        sentence = f"a number may have {NUMBER_LENGTH_LIMIT} characters, and this one has {len(written)}"
        raise Slip("bad-number", start, end, sentence)
    mantissa, _, exponent = written.lower().partition("e")
    if exponent and abs(int(exponent)) > EXPONENT_LIMIT:
        raise Slip("bad-number", start, end, f"a power of ten may go from -{EXPONENT_LIMIT} to {EXPONENT_LIMIT}")
    if "/" in mantissa and not int(mantissa.partition("/")[2]):
        raise Slip("bad-number", start, end, "a fraction cannot have 0 below its line")


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


def _parse(parser: Lark, place: Place, text: str, pieces: list[Piece]) -> Node:
    tokens = _tokens(parser, place, text, pieces)
    try:
        node: Node = parser.parse(tokens)  # type: ignore[assignment]  # our lexer takes tokens
    except UnexpectedToken as unexpected:
        raise _broken(text, pieces, tokens, unexpected) from None
    return node


_NAME_GOES_ON = frozenset({"CALL", "INDEX"})
_FOLDED = frozenset({"OPERATOR", "PREFIX", "IF", "ELSE", "RANGE"})


def _tokens(parser: Lark, place: Place, text: str, pieces: list[Piece]) -> list[Token]:
    """The tokens of an item for the grammar, with the nodes of its leaves."""
    tokens = []
    last = len(pieces) - 1
    for i, (kind, start, end) in enumerate(pieces):
        if kind == "NAME":
            terminal = "NAME" if i < last and pieces[i + 1][0] in _NAME_GOES_ON else "OPERAND"
            tokens.append(Token(terminal, path_of(place, text[start:end], start)))
        elif kind in LITERALS:
            tokens.append(Token("OPERAND", _literal(parser, place, text, kind, start, end)))
        elif kind in _FOLDED:
            terminal = "PREFIX" if kind == "PREFIX" else "OPERATOR"
            tokens.append(Token(terminal, (text[start:end], start, end)))
        else:
            tokens.append(Token(kind, end))
    return tokens


def _broken(text: str, pieces: list[Piece], tokens: list[Token], unexpected: UnexpectedToken) -> Slip:
    """What is wrong with a value, from the token the grammar could not take."""
    at = next((i for i, token in enumerate(tokens) if token is unexpected.token), len(tokens))
    before = pieces[at - 1] if at else None
    found = pieces[at] if at < len(pieces) else None
    shown = f"`{text[found[1] : found[2]]}`" if found else "the end of the line"
    ends_value = before is not None and (before[0] in LITERALS or before[0] in ("NAME", "CLOSE", "UNINDEX"))
    if before is None:
        assert found is not None
        return Slip("broken-value", found[1], found[2], f"a value cannot start with {shown}")
    if not ends_value:
        behind = text[before[1] : before[2]]
        if found and found[0] == "CLOSE" and before[0] == "OPEN":
            return Slip("broken-value", before[2], before[2], "expected a value between the parentheses")
        return Slip("broken-value", before[2], before[2], f"expected a value behind `{behind}`, found {shown}")
    assert found is not None
    if found[0] == "PREFIX" and text[found[1]] == "-":
        return sign_slip(found[1])
    if found[0] == "NAME" and before[0] == "NUMBER":
        return unit_slip(text, before, found[1], found[2])
    if found[0] == "EQUALS":
        return Slip("broken-value", found[1], found[2], "`=` defines or sets; equality is `is`", "write `is`")
    if found[0] == "OPEN" and before[0] == "NAME":
        return Slip(
            "call-space",
            before[2],
            found[2],
            "the parenthesis of a call touches its name",
            f"write `{text[before[1] : before[2]]}(`",
        )
    return Slip(
        "broken-value", before[2], before[2], f"expected a comma, an operator or the end of the value before {shown}"
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
    return Slip(
        "unknown-unit",
        start,
        end,
        f"`{written}` behind the number `{text[number[1] : number[2]]}` is no unit",
        unit_hint(written),
    )

"""One line of text into items: a word, a literal, or a value of several tokens.

A *value is one item or one expression*: two tokens side by side that could each end and start a value are two items, so
where an item ends is known before anything is parsed. Single tokens become items at once; the others go through
the grammar (values.py). What touches what is decided here: signs, the parenthesis of a call, commas, units.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from datetime import date
from types import MappingProxyType
from typing import TypeAlias

from .nearest import nearest
from .units import COMMON_UNITS, UNITS

NESTING_LIMIT = 50
OPERATIONS_LIMIT = 100


class Slip(Exception):
    """A mistake inside a line, with its place as 0-based columns of that line."""

    def __init__(self, code: str, start: int, end: int, sentence: str, hint: str = "", opened: int = -1) -> None:
        super().__init__(sentence)
        self.code = code
        self.start = start
        self.end = end
        self.sentence = sentence
        self.hint = hint
        self.opened = opened


Piece: TypeAlias = tuple[str, int, int]
"""A token: its kind, which is a terminal of the grammar, and its place as 0-based columns. A plain tuple, for speed."""


def _longest_first(symbols: list[str]) -> str:
    return "|".join(re.escape(symbol) for symbol in sorted(symbols, key=lambda symbol: (-len(symbol), symbol)))


_UNIT = rf"(?:(?:{_longest_first([s for s in UNITS if s != '%'])})(?![\w(])|%)"
_DIGITS = r"\d+(?:\.\d+)?(?:[eE][+-]?\d+)?"

TOKENS = re.compile(
    r" *(?:"
    r"(?P<NAME>[A-Za-z_]\w*(?:\.[A-Za-z_]\w*)*)"
    r"|(?P<DATE>\d{4}-\d\d-\d\d(?!\w))"
    r"|(?P<RATIO>\d+(?:\.\d+)?:\d+(?:\.\d+)?(?!\w))"
    rf"|(?P<QUANTITY>(?:\d+/\d+|{_DIGITS})(?: *{_UNIT}|in(?![\w(])))"
    rf"|(?P<NUMBER>{_DIGITS})"
    r'|(?P<TEXT>"(?:[^"\\]|\\.)*")'
    r"|(?P<COMMA>,)"
    r"|(?P<OPEN>\()"
    r"|(?P<CLOSE>\))"
    r"|(?P<RANGE>\.\.)"
    r"|(?P<FOREIGN>\*\*|==|!=|<>|=>|=<|&&|\|\||!|&|\||:=)"
    r"|(?P<EQUALS>=)"
    r"|(?P<SIGN>[+-])"
    r"|(?P<OPERATOR>[*/^]|[<>]=?)"
    r"|(?P<INDEX>\[)"
    r"|(?P<UNINDEX>\])"
    r"|(?P<DOT>\.)"
    r"|(?P<COMMENT>#)"
    r"|(?P<JUNK>[^ ])"
    r")",
    re.ASCII,
)
QUANTITY_PARTS = re.compile(rf"(\d+/\d+|{_DIGITS}) *(.+)", re.ASCII)

RESERVED: Mapping[str, str] = MappingProxyType(
    {
        "and": "OPERATOR",
        "or": "OPERATOR",
        "not": "PREFIX",
        "is": "OPERATOR",
        "if": "IF",
        "else": "ELSE",
        "yes": "TRUTH",
        "no": "TRUTH",
    }
)
LITERALS = frozenset({"DATE", "RATIO", "QUANTITY", "NUMBER", "TEXT", "TRUTH"})
_KINDS = ("", *TOKENS.groupindex)
_OPERANDS = LITERALS | {"NAME"}
_STARTS = _OPERANDS | {"OPEN", "PREFIX"}
_ENDS = frozenset({"NAME", "CLOSE", "UNINDEX"}) | LITERALS
_NUMBERS = frozenset({"QUANTITY", "NUMBER", "RATIO", "DATE"})

_MEANT: Mapping[str, str] = MappingProxyType(
    {
        "−": "-",
        "–": "-",
        "—": "-",
        "×": "*",
        "·": "*",
        "÷": "/",
        "°": "deg",
        "“": '"',
        "”": '"',
        "„": '"',
        "’": '"',
        "'": '"',
        "≤": "<=",
        "≥": ">=",
        "≠": "is not",
        "\u00a0": "a plain space",
        "µ": "um, for micrometres",
        "μ": "um, for micrometres",
        ":": "=",
        ";": "a line of its own",
        "{": "braces only inside a text",
        "}": "braces only inside a text",
    }
)
_OPERATORS_MEANT: Mapping[str, str] = MappingProxyType(
    {
        "**": "^",
        "!=": "is not",
        "<>": "is not",
        "=>": ">=",
        "=<": "<=",
        "&&": "and",
        "&": "and",
        "||": "or",
        "|": "or",
        "!": "not",
        ":=": "=",
    }
)


def split_items(text: str, start: int = 0) -> tuple[list[list[Piece]], int]:
    """The items of one line, each a list of tokens, and the column of its comment (-1 if it has none).

    `start` is the column of the first character that is no indentation. Raises Slip at the first mistake.
    Cost: linear in the line.
    """
    items: list[list[Piece]] = []
    item: list[Piece] = []
    opened: list[tuple[str, int]] = []
    previous = ""
    previous_end = start
    operations = 0
    for match in TOKENS.finditer(text, start):
        index = match.lastindex
        begin, end = match.span(index)  # type: ignore[arg-type]  # every alternative is a group
        kind = _KINDS[index]  # type: ignore[index]
        if kind == "NAME":
            kind = RESERVED.get(text[begin:end], "NAME")
            if previous in _NUMBERS and begin == previous_end:
                raise _glued(text, begin, end, item[-1])
        elif kind not in _PLAIN:
            if kind == "COMMENT":
                if opened:
                    raise _unclosed(opened, previous_end)
                return items, begin
            kind = _settle(text, kind, begin, end, previous, previous_end)
        if kind in _STARTS and not opened and previous in _ENDS:
            item = []
            items.append(item)
            operations = 0
        elif not items:
            items.append(item)
        if kind in _OPERATIONS:
            operations += 1
            if operations > OPERATIONS_LIMIT:
                raise _too_many(begin, end)
        elif kind in _BRACKETS:
            _count(text, kind, begin, end, opened)
        elif kind == "COMMA" and not opened:
            operations = 0
        item.append((kind, begin, end))
        previous = kind
        previous_end = end
    if opened:
        raise _unclosed(opened, previous_end)
    return items, -1


def _too_many(begin: int, end: int) -> Slip:
    return Slip(
        "too-many-operations",
        begin,
        end,
        f"one value may hold {OPERATIONS_LIMIT} operations, and this one has more",
        "give names to parts of it under `derived`",
    )


_OPERATIONS = frozenset({"OPERATOR", "PREFIX", "IF"})
_PLAIN = frozenset({"QUANTITY", "TEXT", "RATIO", "CLOSE", "EQUALS", "UNINDEX", "RANGE", "OPERATOR"})
_BRACKETS = frozenset({"OPEN", "CALL", "CLOSE", "INDEX", "UNINDEX"})


def _settle(text: str, kind: str, begin: int, end: int, previous: str, previous_end: int) -> str:
    """The terminal for a token whose kind depends on its neighbours; raises Slip where none fits."""
    match kind:
        case "COMMA":
            _check_comma(text, begin, end)
        case "NUMBER":
            _check_number(text, begin, end)
        case "DATE":
            _check_date(text, begin, end)
        case "SIGN":
            return _settle_sign(text, begin, previous, previous_end)
        case "OPEN":
            return "CALL" if previous == "NAME" and begin == previous_end else "OPEN"
        case "INDEX":
            if previous not in ("NAME", "UNINDEX") or begin != previous_end:
                raise Slip(
                    "broken-value",
                    begin,
                    end,
                    "brackets count copies and touch the name they follow",
                    "write `screws[3]`; points stand in parentheses",
                )
        case "DOT":
            _check_dot(text, begin, end, previous, previous_end)
        case "FOREIGN":
            raise _foreign(text[begin:end], begin, end)
        case "JUNK":
            raise _junk(text, begin, end)
    return kind


_SUSPECT = frozenset({".", " "})
"""What may stand behind a number and be the start of a mistake: a point without digits, ` in`."""


def _check_number(text: str, begin: int, end: int) -> None:
    following = text[end : end + 1]
    if following not in _SUSPECT:
        return
    if following == "." and text[end + 1 : end + 2] != ".":
        raise Slip(
            "bad-number",
            begin,
            end + 1,
            "expected a digit behind the decimal point",
            f"write `{text[begin:end]}` or `{text[begin:end]}.0`",
        )
    if text[end : end + 3] == " in" and not text[end + 3 : end + 4].isalnum():
        raise Slip(
            "unit-in",
            begin,
            end + 3,
            "`in` is a unit only where it is glued to its number",
            f"write `{text[begin:end]} inch` or `{text[begin:end]}in`",
        )


def _check_date(text: str, begin: int, end: int) -> None:
    try:
        date.fromisoformat(text[begin:end])
    except ValueError:
        raise Slip(
            "bad-date",
            begin,
            end,
            f"`{text[begin:end]}` is no day of the calendar",
            "a date is year-month-day, `2026-06-21`; a difference has spaces round its sign",
        ) from None


def _settle_sign(text: str, begin: int, previous: str, previous_end: int) -> str:
    sign = text[begin]
    before = begin > previous_end
    after = text[begin + 1 : begin + 2] in ("", " ")
    if previous in _ENDS and before == after:
        return "OPERATOR"
    if after:
        where = previous_end if previous not in _ENDS else begin
        raise Slip(
            "sign-space",
            begin if previous in _ENDS else where,
            begin + 1,
            f"a sign touches its value, and a {_of_sign(sign)} has a space on both sides or on neither",
            f"write `{sign}` close to the value behind it"
            if previous not in _ENDS
            else f"write ` {sign} ` with a space on both sides",
        )
    if sign == "+":
        if previous in _ENDS:
            raise Slip(
                "sign-space",
                begin,
                begin + 1,
                "a sum has a space on both sides of `+`, or on neither",
                "write ` + ` with a space on both sides",
            )
        raise Slip("broken-value", begin, begin + 1, "a value needs no `+` before it", "leave out the `+`")
    return "PREFIX"


def _of_sign(sign: str) -> str:
    return "difference" if sign == "-" else "sum"


def _check_comma(text: str, begin: int, end: int) -> None:
    following = text[end : end + 1]
    if following in ("", " "):
        return
    if begin and text[begin - 1].isdigit() and following.isdigit():
        hint = "the decimal mark is a point, `0.5`; values of their own have a space between, `0, 5`"
    else:
        hint = "put a space behind the comma"
    raise Slip("comma-space", begin, end, "a comma is followed by a space", hint)


def _check_dot(text: str, begin: int, end: int, previous: str, previous_end: int) -> None:
    following = text[end : end + 1]
    if following.isdigit() and following.isascii() and (previous not in _ENDS or begin > previous_end):
        digits = re.match(r"\d+", text[end:], re.ASCII)
        written = digits[0] if digits else ""
        raise Slip("bad-number", begin, end + len(written), "a number starts with a digit", f"write `0.{written}`")
    touches = begin == previous_end and (following.isalpha() or following == "_")
    if previous != "UNINDEX" or not touches:
        raise Slip(
            "broken-value",
            begin,
            end,
            "a dot goes down a path and touches the names on both sides",
            "write `gauge.funnel`; a range is written `1 .. 6`",
        )


def _foreign(written: str, begin: int, end: int) -> Slip:
    hint = "equality is `is`; one `=` sets or defines" if written == "==" else f"write `{_OPERATORS_MEANT[written]}`"
    return Slip("foreign-operator", begin, end, f"`{written}` is no operator of this language", hint)


def _junk(text: str, begin: int, end: int) -> Slip:
    character = text[begin]
    if character == '"':
        return Slip(
            "unclosed-text",
            begin,
            len(text),
            "this text has no closing quote on its line",
            "close it; a long text goes on in a quoted text of its own on an indented line below",
        )
    shown = character if character.isprintable() else f"U+{ord(character):04X}"
    meant = _MEANT.get(character, "")
    if character.isalpha():
        return Slip(
            "unexpected-character",
            begin,
            end,
            f"names are written with the letters a to z, digits and _, and `{shown}` is none of them",
            f"write {meant}" if meant else "",
        )
    hint = f"write {meant}" if " " in meant else f"write `{meant}`" if meant else ""
    return Slip("unexpected-character", begin, end, f"the character `{shown}` has no meaning here", hint)


def _glued(text: str, begin: int, end: int, number: Piece) -> Slip:
    written = text[begin:end]
    return Slip(
        "unknown-unit",
        begin,
        end,
        f"`{written}` behind the number `{text[number[1] : number[2]]}` is no unit",
        unit_hint(written),
    )


def unit_hint(written: str) -> str:
    """The unit that was meant, by its symbol or by its name."""
    names = {unit.name: symbol for symbol, unit in UNITS.items()} | {"degree": "deg", "micron": "um", "feet": "ft"}
    ranked = dict.fromkeys((*COMMON_UNITS, *UNITS))
    near = nearest(written, ranked, is_ranked=True) or names.get(nearest(written, names), "")
    return f"did you mean the unit `{near}`?" if near else ""


def _count(text: str, kind: str, begin: int, end: int, opened: list[tuple[str, int]]) -> None:
    if kind in ("OPEN", "CALL", "INDEX"):
        if len(opened) >= NESTING_LIMIT:
            raise Slip(
                "nested-too-deep",
                begin,
                end,
                f"brackets are nested deeper than {NESTING_LIMIT}, the limit",
                "give names to parts of the value under `derived`",
            )
        opened.append((text[begin], begin))
        return
    partner = "[" if kind == "UNINDEX" else "("
    if not opened or opened[-1][0] != partner:
        raise Slip(
            "unopened-bracket",
            begin,
            end,
            f"`{text[begin]}` closes nothing that is open",
            opened=opened[-1][1] if opened else -1,
        )
    opened.pop()


def _unclosed(opened: list[tuple[str, int]], end: int) -> Slip:
    bracket, column = opened[-1]
    closing = ")" if bracket == "(" else "]"
    return Slip(
        "unclosed-bracket",
        end,
        end,
        f"expected `{closing}`: brackets close on their line",
        f"put `{closing}` where the value ends",
        opened=column,
    )

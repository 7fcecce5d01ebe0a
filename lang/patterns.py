"""The vocabulary's patterns as small structures, and the tables that say which rows may start where."""

from __future__ import annotations

import functools
import re
from collections.abc import Mapping
from types import MappingProxyType
from typing import TypeAlias

from msgspec import Struct

from .words import ROWS, Row


class Literal(Struct, frozen=True):
    """A word that stands for itself."""

    text: str


class Slot(Struct, frozen=True):
    """A place for one value; `options` are the words it offers, each split at its spaces."""

    name: str
    kind: str
    options: tuple[tuple[str, ...], ...] = ()


class Equals(Struct, frozen=True):
    """`left = right` in one item; where `is_optional`, the left side alone will do."""

    left: Slot
    right: Slot
    is_optional: bool


class Optional(Struct, frozen=True):
    """Elements that may be left out together."""

    elements: tuple[Element, ...]


class Either(Struct, frozen=True):
    """One of several runs of elements."""

    branches: tuple[tuple[Element, ...], ...]


Element: TypeAlias = "Literal | Slot | Equals | Optional | Either"

_PARTS = re.compile(r"<(?P<name>\w+):(?P<kind>[^>]+)>|(?P<mark>[\[\]{}/=])|(?P<word>[a-z]+)")


class Pattern(Struct, frozen=True):
    """A row ready for reading: its elements, the words it starts with, and the word it is known by."""

    row: Row
    elements: tuple[Element, ...]
    words: tuple[str, ...]
    word: str


class Starts(Struct, frozen=True):
    """The rows that may start at one place: by their first word, and those that start with a value."""

    by_word: Mapping[str, tuple[Pattern, ...]]
    wordless: tuple[Pattern, ...]


class Vocabulary(Struct, frozen=True):
    """All rows by place. `clauses` joins the places of each set of clause contexts that some row names.

    `homes` gives the places of each first word, `later` the keys of rows that are
    not drawn yet, `once` of those that may be said once in one thing.
    """

    places: Mapping[str, Starts]
    clauses: Mapping[tuple[str, ...], Starts]
    homes: Mapping[str, tuple[str, ...]]
    later: frozenset[str]
    once: frozenset[str]


def parse_pattern(text: str) -> tuple[Element, ...]:
    """The elements of a pattern as words.py writes it; a malformed one is a bug and raises ValueError."""
    parts = list(_PARTS.finditer(text))
    elements, used = _elements(parts, 0, frozenset())
    if used != len(parts):
        raise ValueError(f"malformed pattern: {text}")
    return elements


def _elements(parts: list[re.Match[str]], at: int, closing: frozenset[str]) -> tuple[tuple[Element, ...], int]:
    found: list[Element] = []
    while at < len(parts) and parts[at]["mark"] not in closing:
        part = parts[at]
        if part["word"]:
            found.append(Literal(part["word"]))
        elif part["name"]:
            found.append(_slot(part["name"], part["kind"]))
        elif part["mark"] == "[" and parts[at + 1]["mark"] == "=":
            found.append(_equals(found.pop(), parts[at + 2], True))
            at += 3
        elif part["mark"] == "=":
            found.append(_equals(found.pop(), parts[at + 1], False))
            at += 1
        elif part["mark"] == "[":
            inner, at = _elements(parts, at + 1, frozenset("]"))
            found.append(Optional(inner))
        elif part["mark"] == "{":
            branches = []
            while parts[at]["mark"] != "}":
                branch, at = _elements(parts, at + 1, frozenset("/}"))
                branches.append(branch)
            found.append(Either(tuple(branches)))
        else:
            raise ValueError(f"`{part['mark']}` closes nothing in a pattern")
        at += 1
    return tuple(found), at


def _slot(name: str, kind: str) -> Slot:
    if "|" in kind:
        return Slot(name, "words", tuple(tuple(option.split()) for option in kind.split("|")))
    return Slot(name, kind)


def _equals(left: Element, right: re.Match[str], is_optional: bool) -> Equals:
    if not isinstance(left, Slot):
        raise ValueError("`=` stands between two slots")
    return Equals(left, _slot(right["name"], right["kind"]), is_optional)


def prepare(row: Row) -> Pattern:
    """A row with its pattern parsed."""
    elements = parse_pattern(row.pattern)
    words: list[str] = []
    for element in elements:
        if not isinstance(element, Literal):
            break
        words.append(element.text)
    word = row.key if " ".join(words).startswith(row.key) else " ".join(words)
    return Pattern(row, elements, tuple(words), word)


@functools.cache
def vocabulary() -> Vocabulary:
    """The tables of words.py, prepared once a process: a pure function of that table."""
    patterns = [prepare(row) for row in ROWS]
    places = {place: _starts(patterns, (place,)) for place in {place: 0 for row in ROWS for place in row.stands}}
    clauses = {joined: _starts(patterns, joined) for joined in {row.clauses: 0 for row in ROWS}}
    homes: dict[str, tuple[str, ...]] = {}
    for pattern in patterns:
        if pattern.words:
            first = pattern.words[0]
            homes[first] = tuple(dict.fromkeys((*homes.get(first, ()), *pattern.row.stands)))
    later = frozenset(row.key for row in ROWS if row.later)
    once = frozenset(row.key for row in ROWS if row.is_once)
    return Vocabulary(places, clauses, homes, later, once)


def _starts(patterns: list[Pattern], places: tuple[str, ...]) -> Starts:
    by_word: dict[str, list[Pattern]] = {}
    wordless = []
    for pattern in patterns:
        if not set(places).intersection(pattern.row.stands):
            continue
        if pattern.words:
            by_word.setdefault(pattern.words[0], []).append(pattern)
        else:
            wordless.append(pattern)
    ordered = {
        word: tuple(sorted(rows, key=lambda p: (-len(p.words), -len(p.elements)))) for word, rows in by_word.items()
    }
    return Starts(ordered, tuple(wordless))


def written(row: Row) -> str:
    """A row as people read it: `turn ANGLE [about AXIS]`. Options stand as `left/right`, alternatives in braces."""
    return _written(parse_pattern(row.pattern))


def _written(elements: tuple[Element, ...]) -> str:
    return " ".join(_written_one(element) for element in elements)


def _written_one(element: Element) -> str:
    match element:
        case Literal(text):
            return text
        case Slot(name, kind, options):
            if options:
                return "/".join(" ".join(option) for option in options)
            return _BLANKS.get(kind, name if kind == "any" else kind).upper()
        case Equals(left, right, is_optional):
            behind = f"= {_written_one(right)}"
            return f"{_written_one(left)} {f'[{behind}]' if is_optional else behind}"
        case Optional(inner):
            return f"[{_written(inner)}]"
        case Either(branches):
            return f"{{{' / '.join(_written(branch) for branch in branches)}}}"


_BLANKS: Mapping[str, str] = MappingProxyType(
    {
        "clock": "time",
        "list": "values",
        "new": "name",
        "point2": "point",
        "ratio": "scale",
        "settings": "name = value",
        "signature": "name",
        "truth": "condition",
    }
)

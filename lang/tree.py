"""The tree of a scene: expressions, and lines whose words have been read against the vocabulary.

All nodes are frozen and carry the span of their text; a node's span lies inside its parent's.
"""

from __future__ import annotations

from typing import Literal, TypeAlias

from msgspec import Struct

from .source import Span


class Number(Struct, frozen=True):
    """A number as written, with its unit symbol, or `""` for a pure number. `text` may be `1/2`."""

    text: str
    unit: str
    span: Span


class Text(Struct, frozen=True):
    """A quoted text: stretches of characters and the values set into it in braces."""

    parts: tuple[str | Expression, ...]
    span: Span


class Truth(Struct, frozen=True):
    """`yes` or `no`."""

    value: bool
    span: Span


class Date(Struct, frozen=True):
    """A calendar date, `2026-06-21`."""

    text: str
    span: Span


class Step(Struct, frozen=True):
    """One step of a path: a name and, in brackets, which copy: a count from 1 or the name of a table row."""

    name: str
    index: Expression | None
    span: Span


class Path(Struct, frozen=True):
    """A name, or names joined by dots: `rim`, `gauge.cap_screws[3].head`."""

    steps: tuple[Step, ...]
    span: Span

    @property
    def dotted(self) -> str:
        """The names joined by dots, without brackets."""
        return ".".join(step.name for step in self.steps)


class Call(Struct, frozen=True):
    """A function, or a thing with its parameters: `pitch(d)`, `fasteners.screw(d = 4 mm)`."""

    path: Path
    positional: tuple[Expression, ...]
    named: tuple[Setting, ...]
    span: Span


class Tuple(Struct, frozen=True):
    """Two or three values in parentheses: a point or a vector."""

    items: tuple[Expression, ...]
    span: Span


class Unary(Struct, frozen=True):
    """A sign or `not`."""

    operator: Literal["-", "not"]
    operand: Expression
    span: Span


class Binary(Struct, frozen=True):
    """Arithmetic, comparison (`is`, `is not`, `<` ...) and `and`, `or`."""

    operator: Literal["+", "-", "*", "/", "^", "is", "is not", "<", "<=", ">", ">=", "and", "or"]
    left: Expression
    right: Expression
    span: Span


class Choice(Struct, frozen=True):
    """`A if CONDITION else B`."""

    condition: Expression
    then: Expression
    otherwise: Expression
    span: Span


class Range(Struct, frozen=True):
    """`low .. high`, both ends included."""

    low: Expression
    high: Expression
    span: Span


class Ratio(Struct, frozen=True):
    """`1:2`, a scale; in the slot of a clock time `12:30` is read as hours and minutes."""

    first: str
    second: str
    span: Span


Expression: TypeAlias = Number | Text | Truth | Date | Path | Call | Tuple | Unary | Binary | Choice | Range | Ratio


class Setting(Struct, frozen=True):
    """`name = value`."""

    name: str
    value: Expression
    span: Span
    name_span: Span


class Name(Struct, frozen=True):
    """A name that this line declares."""

    text: str
    span: Span


class Word(Struct, frozen=True):
    """One of the words a slot offers: `left`, `upper left`, `survey part`."""

    text: str
    span: Span


class Parameter(Struct, frozen=True):
    """A parameter of a part, assembly, outline or function; `default` is None where the caller must give it."""

    name: str
    default: Expression | None
    span: Span


Value: TypeAlias = (
    "Expression | Name | Word | Reading | tuple[Expression, ...] | tuple[Setting, ...] | tuple[Parameter, ...]"
)


class Reading(Struct, frozen=True):
    """A word and the values of its slots: `turn 12 deg about y` is `turn` with `by` and `axis`.

    `row` names the vocabulary row it was read by (`words.Row.key`); absent optional slots are left out. A slot of kind
    `signature` gives its name, and under `parameters` a tuple where the name has parentheses. Where a row starts with a
    value, `word` is empty.
    """

    row: str
    word: str
    values: tuple[tuple[str, Value], ...]
    span: Span
    word_span: Span

    def get(self, slot: str) -> Value | None:
        """The value of a slot, or None."""
        for name, value in self.values:
            if name == slot:
                return value
        return None


class Line(Struct, frozen=True):
    """One line: what it says first, the clauses that follow in the order written, and the lines indented under it.

    Clauses written one a line under a line stand in `clauses` too. `note` holds the `##` lines above, joined.
    """

    head: Reading
    clauses: tuple[Reading, ...]
    lines: tuple[Line, ...]
    note: str
    span: Span

    @property
    def word(self) -> str:
        """The word of the head."""
        return self.head.word

    def clause(self, word: str) -> Reading | None:
        """The first clause with that word, or None."""
        return next((clause for clause in self.clauses if clause.word == word), None)


class Scene(Struct, frozen=True):
    """One file: its language version (0 if it states none) and its declarations in the order written.

    `broken` are names that lines left out for a problem would have declared: a path that uses one of them needs no
    problem of its own.
    """

    file: str
    version: int
    lines: tuple[Line, ...]
    span: Span
    broken: tuple[str, ...] = ()

"""Raw lines against the vocabulary: readings, lines and the scene, with a problem for whatever does not fit.

A row's pattern is matched item by item. Matching a correct line keeps no account of what else could have stood; only
when a line does not match is it matched again with that account, from which the message is made (mismatch.py).
"""

from __future__ import annotations

import functools
import gc
import re
from collections.abc import Callable
from typing import TypeVar

from lark import Lark

from .items import Item, Place, expression_of
from .layout import PROBLEMS_LIMIT, Layout, RawLine, lay_out, slip_problem
from .matcher import NO_STARTS, Matcher
from .mismatch import explain, explain_clauses
from .nearest import nearest
from .parser import value_parser
from .patterns import Equals, Pattern, Slot, Starts, Vocabulary, vocabulary
from .problems import Problem, Related, Severity
from .scanner import Slip
from .source import Span
from .tree import Expression, Line, Name, Number, Reading, Scene, Text, Word
from .values import read_items

VERSION = 1
_Result = TypeVar("_Result")


def read_scene(file: str, text: str) -> tuple[Scene, tuple[Problem, ...]]:
    """The tree of one file and all that is wrong with its text, in the order of the text.

    `file` is the name that spans carry. A line that is broken is left out of the tree with a problem, and the lines
    under it are still checked; the names it would have declared stand in `Scene.broken`. Never raises on any text;
    cost is linear in it.
    """
    return _without_collector(lambda: _Scene(value_parser(), vocabulary(), file).read(text))


def read_layout(file: str, text: str) -> Layout:
    """The lines of a file before their words are read, for the printer."""
    return _without_collector(lambda: lay_out(value_parser(), file, text))


def read_value(file: str, text: str) -> tuple[Expression | None, tuple[Problem, ...]]:
    """One value on its own, as after `--set NAME=` or in a cell of a table; None with problems where it is none."""
    place = Place(file, 1)
    if "\n" in text or "\t" in text or len(text) > 10_000:
        sentence = "expected one value on one line, without tabs"
        return None, (Problem("broken-value", Severity.ERROR, place.span(0, 0), sentence),)
    start = len(text) - len(text.lstrip(" "))
    try:
        items, _ = read_items(value_parser(), place, text, start)
    except Slip as slip:
        return None, (slip_problem(place, slip),)
    node = expression_of(place, items[0]) if len(items) == 1 else None
    if node is None:
        at = items[1].start if len(items) > 1 else start
        problem = Problem("broken-value", Severity.ERROR, place.span(at, len(text)), "expected one value and no more")
        return None, (problem,)
    return node, ()


def _without_collector(work: Callable[[], _Result]) -> _Result:
    """Runs with the garbage collector off: trees have no cycles, and looking for them costs half of the reading."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        return work()
    finally:
        if was_on:
            gc.enable()


class _Scene:
    """The state of reading one file: its problems, and where in it the reading stands."""

    def __init__(self, parser: Lark, words: Vocabulary, file: str) -> None:
        self.parser = parser
        self.words = words
        self.file = file
        self.problems: list[Problem] = []
        self.broken: list[str] = []
        self.version: Span | None = None
        self.first_line = 0
        self.figure = ""
        self.is_later = False
        self.layout: list[RawLine] = []
        self.known_things: frozenset[str] | None = None

    def read(self, text: str) -> tuple[Scene, tuple[Problem, ...]]:
        layout = lay_out(self.parser, self.file, text)
        self.problems.extend(layout.problems)
        self.first_line = layout.lines[0].place.line if layout.lines else 0
        self.layout = layout.lines
        lines = self.lines(layout.lines, "scene")
        version = VERSION if self.version else 0
        span = Span(self.file, 1, 1, layout.end.end_line, layout.end.end_column)
        scene = Scene(self.file, version, lines, span, tuple(dict.fromkeys(self.broken)))
        return scene, limited(self.problems)

    def lines(self, raws: list[RawLine], context: str) -> tuple[Line, ...]:
        """The lines that may stand in a context; broken ones are left out."""
        starts = self.words.places.get(context, NO_STARTS)
        read = []
        for raw in raws:
            if len(self.problems) > PROBLEMS_LIMIT:
                break
            line = self.line(raw, starts, context)
            if line is not None:
                read.append(line)
        self.check_once([line.head for line in read])
        return tuple(read)

    def check_once(self, readings: list[Reading]) -> None:
        """Reports what is said again among the lines or clauses of one thing, though it may be said once."""
        if len(readings) < 2:
            return
        said: dict[str, Reading] = {}
        for reading in readings:
            first = said.setdefault(reading.row, reading)
            if first is not reading and reading.row in self.words.once:
                sentence = f"`{reading.word}` is said twice"
                related = (Related(first.word_span, "said here first"),)
                hint = "keep one of the two"
                self.problems.append(Problem("said-twice", Severity.ERROR, reading.word_span, sentence, hint, related))

    def line(self, raw: RawLine, starts: Starts, context: str) -> Line | None:
        if raw.lines:
            join_texts(raw)
        if raw.is_broken:
            self.give_up(raw, starts)
            return None
        clauses: list[Reading] = []
        matcher = Matcher(raw, self.words)
        try:
            found = matcher.start(starts, 0)
            if found is not None and matcher.clauses(found[2], found[1], clauses) < 0:
                found = None
            if found is None:
                self.problems.append(explain(raw, starts, self.words, self.things()))
        except Slip as slip:
            self.problems.append(slip_problem(raw.place, slip))
            found = None
        if found is None:
            self.give_up(raw, starts)
            return None
        return self.whole(raw, found[0], found[2], clauses, context)

    def whole(self, raw: RawLine, head: Reading, pattern: Pattern, clauses: list[Reading], context: str) -> Line:
        """A line whose own words have been read, with the lines under it."""
        before = self.is_later, self.figure
        if context == "scene":
            self.declaration(head)
        self.report_later(pattern.row.later, head)
        self.is_later = self.is_later or pattern.row.later
        for clause in clauses:
            self.report_later(False, clause)
        lines: tuple[Line, ...] = ()
        if raw.lines:
            rest = self.fold(raw.lines, pattern, clauses)
            if pattern.row.lines:
                lines = self.lines(rest, pattern.row.lines)
            elif rest:
                self.refuse(rest[0], pattern)
        if pattern.row.key in ("add", "cut", "keep"):
            self.check_shapes(raw, head, lines)
        self.is_later, self.figure = before
        self.check_once(clauses)
        ends = [clause.span for clause in clauses[-1:]] + [line.span for line in lines[-1:]]
        span = functools.reduce(_wider, ends, head.span)
        return Line(head, tuple(clauses), lines, raw.note, span)

    def check_shapes(self, raw: RawLine, head: Reading, lines: tuple[Line, ...]) -> None:
        """A line of a part takes one shape, or shapes on the lines below; only an envelope takes both."""
        shape = head.get("shape")
        takes_lines = shape is None or (isinstance(shape, Reading) and shape.row == "envelope of")
        if lines and not takes_lines:
            sentence = f"`{head.word}` takes the shape on its own line or shapes on the lines below, not both"
            self.problems.append(Problem("no-lines-here", Severity.ERROR, lines[0].span, sentence))
        elif takes_lines and not raw.lines:
            span = raw.place.span(head.span.end_column - 1, head.span.end_column - 1)
            sentence = f"expected a shape behind `{head.word}`, or shapes on the lines below"
            hint = f"for example `{head.word} cylinder diameter 20 mm length 8 mm`"
            self.problems.append(Problem("missing-value", Severity.ERROR, span, sentence, hint))

    def declaration(self, head: Reading) -> None:
        name = head.get("name")
        self.figure = name.text if head.row == "figure" and isinstance(name, Name) else ""
        if head.row == "platewright":
            self.check_version(head)

    def things(self) -> frozenset[str]:
        """The names of the parts and assemblies that the file declares, on broken lines too; found once, when asked."""
        if self.known_things is None:
            heads = [_DECLARES.match(raw.text, raw.column) for raw in self.layout]
            self.known_things = frozenset(
                head["name"] for head in heads if head and head["word"] in ("part", "assembly") and head["name"]
            )
        return self.known_things

    def check_version(self, head: Reading) -> None:
        stated = head.get("version")
        if self.version is not None:
            sentence = "the version of the language is stated twice"
            related = (Related(self.version, "stated here"),)
            self.problems.append(Problem("version", Severity.ERROR, head.span, sentence, "", related))
        elif not isinstance(stated, Number) or stated.text != str(VERSION):
            sentence = f"expected `platewright {VERSION}`, the version of the language that is known here"
            self.problems.append(Problem("version", Severity.ERROR, head.span, sentence))
        elif head.span.line != self.first_line:
            sentence = "the version of the language stands above everything else"
            self.problems.append(Problem("version", Severity.ERROR, head.span, sentence, "move this line to the top"))
        self.version = self.version or head.span

    def report_later(self, is_later: bool, reading: Reading) -> None:
        """Reports the first word in a reading whose work is not built yet, unless what holds it was reported."""
        if self.is_later:
            return
        if not is_later:
            later = self.first_later(reading)
            if later is None:
                return
            reading = later
        # Of the rows that share a word some may be drawn already: then the option behind the word tells them apart.
        option = reading.values[0][1] if reading.values and reading.row != reading.word else None
        shown = f"{reading.word} {option.text}" if isinstance(option, Word) else reading.word
        sentence = f"`{shown}` is a word of the language that is not drawn yet"
        self.problems.append(Problem("not-drawn-yet", Severity.ERROR, reading.word_span, sentence, within=self.figure))

    def first_later(self, reading: Reading) -> Reading | None:
        if reading.row in self.words.later:
            return reading
        for _, value in reading.values:
            if isinstance(value, Reading):
                return self.first_later(value)
        return None

    def fold(self, raws: list[RawLine], pattern: Pattern, clauses: list[Reading]) -> list[RawLine]:
        """Reads the lines that are clauses of the line above into `clauses`; the other lines are returned."""
        if not pattern.row.clauses:
            return raws
        starts = self.words.clauses[pattern.row.clauses]
        rest = []
        for raw in raws:
            if raw.is_broken or (pattern.row.lines and raw.items[0].word not in starts.by_word):
                rest.append(raw)
                continue
            self.clause_line(raw, pattern, clauses)
        return rest

    def clause_line(self, raw: RawLine, pattern: Pattern, clauses: list[Reading]) -> None:
        read: list[Reading] = []
        try:
            if Matcher(raw, self.words).clauses(pattern, 0, read) < 0:
                self.problems.append(explain_clauses(raw, pattern, self.words, self.things()))
                return
        except Slip as slip:
            self.problems.append(slip_problem(raw.place, slip))
            return
        for clause in read:
            self.report_later(False, clause)
        clauses.extend(read)
        if raw.lines:
            self.refuse(raw.lines[0], None)

    def refuse(self, raw: RawLine, pattern: Pattern | None) -> None:
        """Reports the first of the lines indented under a line that takes none."""
        if raw.is_broken:
            return
        above = f"`{pattern.word}`" if pattern is not None and pattern.word else "the line above"
        sentence = f"{above} takes no lines under it"
        span = raw.place.span(raw.column, raw.end)
        hint = "start this line in the column of the line above"
        self.problems.append(Problem("no-lines-here", Severity.ERROR, span, sentence, hint))

    def give_up(self, raw: RawLine, starts: Starts) -> None:
        """Leaves a broken line out, but keeps the name it would have declared and checks the lines under it."""
        written = _DECLARES.match(raw.text, raw.column)
        if written is None:
            return
        word = written["word"]
        rows = starts.by_word.get(word) or starts.by_word.get(nearest(word, starts.by_word), ())
        if rows and written["name"] and _is_declared_behind(rows[0]):
            self.broken.append(written["name"])
        elif not rows and any(_is_declared_first(pattern) for pattern in starts.wordless):
            self.broken.append(word)
        context = next((pattern.row.lines for pattern in rows if pattern.row.lines), "")
        if context:
            pattern = rows[0]
            rest = self.fold(raw.lines, pattern, [])
            self.lines(rest, context)


_DECLARES = re.compile(r"(?P<word>[A-Za-z_]\w*)(?: +(?P<name>[A-Za-z_]\w*))?", re.ASCII)


def _is_declared_behind(pattern: Pattern) -> bool:
    """Whether a row declares the name behind its words."""
    behind = pattern.elements[len(pattern.words) :]
    return bool(behind) and isinstance(behind[0], Slot) and behind[0].kind in ("new", "signature")


def _is_declared_first(pattern: Pattern) -> bool:
    """Whether a row that starts with a value declares a name by it."""
    first = pattern.elements[0]
    slot = first.left if isinstance(first, Equals) else first
    return isinstance(slot, Slot) and slot.kind in ("new", "signature")


def limited(problems: list[Problem]) -> tuple[Problem, ...]:
    """Problems in the order of the text, and where there are too many of them, the first and a word on the rest."""
    ordered = sorted(problems, key=lambda problem: problem.span)
    if len(ordered) > PROBLEMS_LIMIT:
        sentence = f"reading stopped after {PROBLEMS_LIMIT} problems"
        ordered[PROBLEMS_LIMIT:] = [
            Problem("too-many-problems", Severity.ERROR, ordered[PROBLEMS_LIMIT].span, sentence)
        ]
    return tuple(ordered)


def _wider(span: Span, other: Span) -> Span:
    if (other.end_line, other.end_column) > (span.end_line, span.end_column):
        return span.to(other)
    return span


def join_texts(raw: RawLine) -> None:
    """Joins the texts on lines of their own under a line to its last text, or makes them its last text.

    Two texts are joined by one space, or by nothing where the first ends in a space or a line break.
    """
    texts = [line for line in raw.lines if len(line.items) == 1 and isinstance(line.items[0].node, Text)]
    if not texts or raw.is_broken:
        return
    last = raw.items[-1]
    joined = last.node if isinstance(last.node, Text) else None
    for line in texts:
        further = line.items[0].node
        assert isinstance(further, Text)
        joined = further if joined is None else _joined(joined, further)
    items = raw.items[:-1] if isinstance(last.node, Text) else raw.items
    start = last.start if isinstance(last.node, Text) else raw.end
    raw.items = [*items, Item("", joined, start, raw.end, "TEXT")]
    raw.lines = [line for line in raw.lines if line not in texts]


def _joined(first: Text, further: Text) -> Text:
    last = first.parts[-1] if first.parts else ""
    gap = "" if isinstance(last, str) and last[-1:] in ("", " ", "\n") else " "
    parts: list[str | Expression] = []
    for part in (*first.parts, gap, *further.parts):
        if isinstance(part, str) and parts and isinstance(parts[-1], str):
            parts[-1] += part
        elif part:
            parts.append(part)
    return Text(tuple(parts), first.span.to(further.span))

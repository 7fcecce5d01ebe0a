"""A file into nested lines: indentation, comments, notes, blank lines. What a line says is read by values.py."""

from __future__ import annotations

from lark import Lark
from msgspec import Struct, field

from .items import Item, Place
from .problems import Problem, Related, Severity
from .scanner import Slip
from .source import Span
from .values import read_items

FILE_LIMIT = 4_000_000
LINES_LIMIT = 200_000
LINE_LIMIT = 10_000
LEVELS_LIMIT = 20
PROBLEMS_LIMIT = 500
INDENT = 4


class RawLine(Struct):
    """A line with its items and the lines indented under it.

    `comment` is the comment behind it; `above` are the comments, notes and blank lines above it, as the printer keeps
    them. A line whose shape is broken has no items and `is_broken` set.
    """

    place: Place
    text: str
    column: int
    items: list[Item]
    end: int
    comment: str = ""
    note: str = ""
    is_broken: bool = False
    above: list[Aside] = field(default_factory=list)
    lines: list[RawLine] = field(default_factory=list)


class Aside(Struct, frozen=True):
    """A comment or note on a line of its own, or a blank line (`text` empty); `depth` counts levels."""

    text: str
    depth: int


class Layout(Struct):
    """A file's lines, and the comments and blank lines after the last of them."""

    file: str
    lines: list[RawLine]
    below: list[Aside]
    end: Span
    problems: list[Problem]


def slip_problem(place: Place, slip: Slip) -> Problem:
    """The problem that a slip in a line is."""
    related: tuple[Related, ...] = ()
    if slip.opened >= 0:
        related = (Related(place.span(slip.opened, slip.opened + 1), "opened here"),)
    return Problem(slip.code, Severity.ERROR, place.span(slip.start, slip.end), slip.sentence, slip.hint, related)


def lay_out(parser: Lark, file: str, text: str) -> Layout:
    """Splits a file into nested lines. Never raises on any text; cost is linear in the text."""
    return _Reader(parser, file).read(text)


class _Reader:
    """The state of one reading: the open levels, and the comments that wait for the next line."""

    def __init__(self, parser: Lark, file: str) -> None:
        self.parser = parser
        self.file = file
        self.problems: list[Problem] = []
        self.top: list[RawLine] = []
        self.columns = [0]
        self.owners: list[list[RawLine]] = [self.top]
        self.waiting: list[tuple[str, int]] = []
        self.has_tab = False

    def read(self, text: str) -> Layout:
        text = text.removeprefix("\ufeff")
        lines = text.split("\n")
        end = Span(self.file, len(lines), len(lines[-1]) + 1, len(lines), len(lines[-1]) + 1)
        if len(text) > FILE_LIMIT or len(lines) > LINES_LIMIT:
            sentence = (
                f"a file may have {FILE_LIMIT} characters in {LINES_LIMIT} lines, "
                f"and this one has {len(text)} in {len(lines)}"
            )
            self.add("file-too-long", Span(self.file, 1, 1, 1, 1), sentence, "split it, and join the files by `see`")
            return Layout(self.file, [], [], end, self.problems)
        for number, line in enumerate(lines, 1):
            self.line(Place(self.file, number), line)
            if len(self.problems) > PROBLEMS_LIMIT:
                break
        below = self.asides(self.columns)
        return Layout(self.file, self.top, below, end, self.problems)

    def add(self, code: str, span: Span, sentence: str, hint: str = "") -> None:
        self.problems.append(Problem(code, Severity.ERROR, span, sentence, hint))

    def line(self, place: Place, line: str) -> None:
        if line.endswith("\r"):
            line = line[:-1]
        if "\t" in line:
            line = self.without_tabs(place, line)
        stripped = line.lstrip(" ")
        if not stripped:
            if not self.waiting or self.waiting[-1][0]:
                self.waiting.append(("", 0))
            return
        column = len(line) - len(stripped)
        if len(line) > LINE_LIMIT:
            sentence = f"a line may have {LINE_LIMIT} characters, and this one has {len(line)}"
            self.add("line-too-long", place.span(LINE_LIMIT, len(line)), sentence, "put long lists into a table")
            self.attach(RawLine(place, line[:LINE_LIMIT], column, [], LINE_LIMIT, is_broken=True))
            return
        if stripped[0] == "#":
            self.waiting.append((stripped.rstrip(), column))
            return
        self.attach(self.scan(place, line, column))

    def without_tabs(self, place: Place, line: str) -> str:
        if not self.has_tab:
            self.has_tab = True
            column = line.index("\t")
            sentence = "this file has a tab; indentation and gaps are spaces"
            self.add("tab", place.span(column, column + 1), sentence, f"indent by {INDENT} spaces a level")
        body = line.lstrip(" \t")
        indentation = line[: len(line) - len(body)].expandtabs(INDENT)
        return indentation + body.replace("\t", " ")

    def scan(self, place: Place, line: str, column: int) -> RawLine:
        try:
            items, comment = read_items(self.parser, place, line, column)
        except Slip as slip:
            self.problems.append(slip_problem(place, slip))
            return RawLine(place, line, column, [], len(line.rstrip()), is_broken=True)
        remark = line[comment:].rstrip() if comment >= 0 else ""
        return RawLine(place, line, column, items, items[-1].end if items else column, remark)

    def attach(self, raw: RawLine) -> None:
        """Puts a line under the line it belongs to, with the comments that waited for it."""
        before = self.columns.copy() if self.waiting else self.columns
        owner = self.owner(raw)
        if self.waiting:
            raw.above = self.asides(max(self.columns, before, key=len))
            raw.note = "\n".join(aside.text[2:].strip() for aside in raw.above if aside.text.startswith("##"))
        owner.append(raw)

    def owner(self, raw: RawLine) -> list[RawLine]:
        columns = self.columns
        column = raw.column
        if column > columns[-1]:
            parent = self.owners[-1][-1] if self.owners[-1] else None
            if parent is None:
                sentence = "the first line is indented, and there is no line above it"
                self.add("odd-indentation", raw.place.span(0, column), sentence, "start it in the first column")
                return self.owners[-1]
            if len(columns) > LEVELS_LIMIT:
                if len(columns) == LEVELS_LIMIT + 1:
                    sentence = f"lines are indented more than {LEVELS_LIMIT} levels deep, the limit"
                    self.add("nested-lines-too-deep", raw.place.span(0, column), sentence)
                return self.owners[-1]
            columns.append(column)
            self.owners.append(parent.lines)
            return parent.lines
        while column < columns[-1]:
            last = columns.pop()
            owner = self.owners.pop()
            if column > columns[-1]:
                known = " or ".join(str(level) for level in (*columns[-1:], last))
                sentence = f"this line is indented by {column}, and the lines above it by {known}"
                self.add("odd-indentation", raw.place.span(0, column), sentence, "indent by 4 spaces a level")
                columns.append(last)
                self.owners.append(owner)
                break
        return self.owners[-1]

    def asides(self, levels: list[int]) -> list[Aside]:
        """The waiting comments and blank lines, each comment at the deepest of the levels that it reaches."""
        asides = []
        for text, column in self.waiting:
            depth = max((i for i, level in enumerate(levels) if level <= column), default=0)
            asides.append(Aside(text, depth if text else 0))
        self.waiting = []
        return asides

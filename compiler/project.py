"""A scene with everything it sees: files are asked of a loader, parsed, and their tables read."""

from __future__ import annotations

import posixpath
from collections.abc import Callable, Iterator, Mapping

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.problems import Problem, is_error
from platewright.lang.reader import read_scene
from platewright.lang.source import Span

from . import limits
from .mistakes import Problems
from .ordering import order
from .readings import LATER
from .tables import Table, read_table


class Refusal(Struct, frozen=True):
    """What a loader answers instead of bytes."""

    reason: str


Loader = Callable[[str], "bytes | Refusal"]


class Files(Struct, frozen=True):
    """Parsed scenes and tables by file name, the texts they came from, and where each `see` leads.

    `faults` are the lines of each scene that could not be read and have their problem already; `is_readable` says that
    there are none but in figures, whose own concern they are.
    """

    main: str
    scenes: Mapping[str, tree.Scene]
    tables: Mapping[str, Table]
    texts: Mapping[str, str]
    faults: Mapping[str, frozenset[int]]
    sees: Mapping[str, tuple[tuple[str, str, Span], ...]]
    is_readable: bool = True


POINT_TABLES = ("points over", "curve over", "relief", "reflectance", "light from", "lamp", "ambient")
"""Words whose table holds points or a spectrum, so that its first column need not name the rows."""

_REASONS = {
    "missing": "there is no file `{name}`",
    "no library": "no library comes with the program as `{name}`",
    "outside": "`{name}` lies outside the project's folder",
    "too large": f"`{{name}}` is larger than {limits.FILE_BYTES:,} bytes, the limit",
    "not a file": "`{name}` is not a file",
    "unreadable": "`{name}` cannot be read",
    "too many": f"the scene sees more than {limits.FILES} files, the limit",
}


LIBRARY = "library:/"
"""Where the files that come with the program stand among those of a scene; no file of a project can stand there."""


def read_library(name: str) -> bytes | Refusal:
    """A file of a library that comes with the program, or why there is none."""
    from importlib import resources

    folder = resources.files(__package__).joinpath("library")
    known = {each.name: each for each in folder.iterdir()}
    found = known.get(name.removeprefix(LIBRARY))
    return found.read_bytes() if found is not None else Refusal("no library")


def load(main: str, loader: Loader) -> tuple[Files | None, tuple[Problem, ...]]:
    """Read `main` and, from file to file, all that it sees. Names are POSIX paths relative to the project's folder.

    None only where `main` itself gives no text. Cost: linear in the texts.
    """
    reading = _Reading(loader)
    if not reading.read(main):
        return None, reading.problems.all()
    texts, faults, sees = reading.texts, reading.faults, reading.sees
    files = Files(main, reading.scenes, reading.tables, texts, faults, sees, reading.is_readable)
    return files, reading.problems.all()


class _Reading:
    def __init__(self, loader: Loader) -> None:
        self.loader = loader
        self.problems = Problems()
        self.scenes: dict[str, tree.Scene] = {}
        self.tables: dict[str, Table] = {}
        self.texts: dict[str, str] = {}
        self.faults: dict[str, frozenset[int]] = {}
        self.sees: dict[str, tuple[tuple[str, str, Span], ...]] = {}
        self.refused: set[str] = set()
        self.is_readable = True

    def read(self, main: str) -> bool:
        """Read a scene and what it sees, each file once; False if the main file gives no text."""
        pending: list[tuple[str, Span]] = [(main, Span(main, 1, 1, 1, 1))]
        while pending:
            name, span = pending.pop()
            if name in self.scenes:
                continue
            text = self.text(name, span)
            if text is None:
                if name == main:
                    return False
                continue
            parsed, problems = read_scene(name, text)
            self.scenes[name] = parsed
            self.problems.extend(problems)
            errors = [problem for problem in problems if is_error(problem)]
            self.faults[name] = frozenset(problem.span.line for problem in errors)
            self.is_readable = self.is_readable and all(problem.within for problem in errors)
            self.sees[name] = tuple(self._sees(parsed))
            pending.extend((seen, at) for _, seen, at in reversed(self.sees[name]))
            self._read_tables(parsed)
        self._report_circles()
        return True

    def _report_circles(self) -> None:
        """Files that see each other in a circle, each circle once, at the line that closes it."""
        _, circles = order({file: [seen for _, seen, _ in sees] for file, sees in self.sees.items()})
        for circle in circles:
            last, first = circle[-2], circle[-1]
            at = next(span for _, seen, span in self.sees[last] if seen == first)
            way = " sees ".join(f"`{step}`" for step in circle)
            sentence = f"files see each other in a circle: {way}" if len(circle) > 2 else "this file sees itself"
            self.problems.error("circular-see", at, sentence, "move what both need into a third file")

    def text(self, name: str, span: Span) -> str | None:
        """The text of a file, decoded; None with a problem, given once, if there is none."""
        if name in self.refused:
            return None
        load = read_library if name.startswith(LIBRARY) else self.loader
        answer = Refusal("too many") if len(self.texts) >= limits.FILES else load(name)
        if isinstance(answer, Refusal):
            self.refused.add(name)
            sentence = _REASONS.get(answer.reason, _REASONS["unreadable"]).format(name=name.removeprefix(LIBRARY))
            self.problems.error("too-much" if answer.reason == "too many" else "no-such-file", span, sentence)
            return None
        try:
            text = answer.decode("utf-8")
        except UnicodeDecodeError as error:
            self.refused.add(name)
            self.texts[name] = answer.decode("utf-8", "replace")
            before = answer[: error.start].decode("utf-8")
            line, column = before.count("\n") + 1, len(before) - (before.rfind("\n") + 1) + 1
            sentence = f"this file is not UTF-8: byte {answer[error.start]:#04x} at offset {error.start}"
            self.problems.error("not-utf-8", Span(name, line, column, line, column + 1), sentence, "save it as UTF-8")
            return None
        self.texts[name] = text
        return text

    def _sees(self, scene: tree.Scene) -> Iterator[tuple[str, str, Span]]:
        for line in scene.lines:
            if line.word == "see library":
                prefix, wanted = line.head.get("prefix"), self._constant(line.head.get("library"))
                if isinstance(prefix, tree.Name) and wanted is not None:
                    yield prefix.text, f"{LIBRARY}{wanted[0]}.plate", wanted[1]
            if line.word == "see":
                prefix, wanted = line.head.get("prefix"), self._constant(line.head.get("file"))
                if isinstance(prefix, tree.Name) and wanted is not None:
                    target = self._within(scene.file, *wanted)
                    if target:
                        yield prefix.text, target, wanted[1]

    def _read_tables(self, scene: tree.Scene) -> None:
        for reading in readings(scene.lines):
            wanted = self._constant(reading.get("table")) if reading.row not in LATER else None
            if wanted is None:
                continue
            target = self._within(scene.file, *wanted)
            if target and target not in self.texts:
                text = self.text(target, wanted[1])
                if text is not None:
                    table, problems = read_table(target, text, reading.word not in POINT_TABLES)
                    self.problems.extend(problems)
                    if table is not None:
                        self.tables[target] = table

    def _constant(self, value: tree.Value | None) -> tuple[str, Span] | None:
        """A text written out, not computed: files are known before anything is evaluated."""
        if not isinstance(value, tree.Text):
            return None
        if not all(isinstance(part, str) for part in value.parts):
            self.problems.error(
                "computed-file-name", value.span, "a file name is written out, without values in braces"
            )
            return None
        return "".join(part for part in value.parts if isinstance(part, str)), value.span

    def _within(self, file: str, wanted: str, span: Span) -> str | None:
        """The project-relative name of a file named from another; None with a problem if it leaves the project."""
        target = beside(file, wanted)
        if target is None:
            self.problems.error("no-such-file", span, f"`{wanted}` lies outside the project's folder")
        return target


def beside(file: str, wanted: str) -> str | None:
    """The project-relative POSIX name of `wanted` as named from `file`; None if it leaves the project's folder."""
    if not wanted or wanted.startswith("/") or "\\" in wanted or "\0" in wanted or ":" in wanted:
        return None
    target = posixpath.normpath(posixpath.join(posixpath.dirname(file), wanted))
    return None if target == ".." or target.startswith("../") else target


def readings(lines: tuple[tree.Line, ...]) -> Iterator[tree.Reading]:
    """Every word read, with the words nested in its values, in the order of the text."""
    pending: list[tree.Line | tree.Reading] = list(reversed(lines))
    while pending:
        node = pending.pop()
        if isinstance(node, tree.Reading):
            yield node
            pending.extend(value for _, value in reversed(node.values) if isinstance(value, tree.Reading))
        else:
            pending.extend(reversed(node.lines))
            pending.extend(reversed(node.clauses))
            pending.append(node.head)

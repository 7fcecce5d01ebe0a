"""Warnings that an author accepts by name: `accept "floating-part"` in a scene, a part, an assembly or a figure."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.codes import CODES
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, Severity, is_error
from platewright.lang.source import Span

from .mistakes import Problems
from .scope import did_you_mean


class Acceptance(Struct, frozen=True):
    """One code accepted: where that is said, and where it holds, in all files or within a stretch of one."""

    code: str
    span: Span
    within: Span | None
    figure: str = ""

    def covers(self, problem: Problem) -> bool:
        """Whether a problem is a warning accepted here."""
        if problem.code != self.code or is_error(problem):
            return False
        within, at = self.within, problem.span
        if within is None or (self.figure and problem.within == self.figure):
            return True
        start, end = (within.line, within.column), (within.end_line, within.end_column)
        return at.file == within.file and start <= (at.line, at.column) < end


def read_acceptances(main: str, scenes: Mapping[str, tree.Scene]) -> tuple[tuple[Acceptance, ...], tuple[Problem, ...]]:
    """What a scene accepts: at the top of its main file for all it sees, at the top of another for that one.

    Problems: codes that no problem has.
    """
    problems = Problems()
    found: list[Acceptance] = []
    for file, scene in scenes.items():
        for line in scene.lines:
            if line.word == "accept":
                found += _read(line, None if file == main else scene.span, "", problems)
            name = line.head.get("name")
            figure = name.text if line.word == "figure" and isinstance(name, tree.Name) else ""
            for below in line.lines:
                if below.word == "accept":
                    found += _read(below, line.span, figure, problems)
    return tuple(found), problems.all()


def _read(line: tree.Line, within: Span | None, figure: str, problems: Problems) -> Iterator[Acceptance]:
    written = line.head.get("codes")
    for each in written if isinstance(written, tuple) else ():
        code = "".join(map(str, each.parts)) if isinstance(each, tree.Text) else ""
        if not isinstance(each, tree.Text) or code not in CODES:
            sentence = (
                f"no problem has the code `{code}`" if code else "expected the code of a warning, in double quotes"
            )
            problems.error("unknown-name", each.span, sentence, did_you_mean(nearest(code, CODES)))
        else:
            yield Acceptance(code, each.span, within, figure)


def unused(acceptances: Iterable[Acceptance], used: Iterable[Acceptance]) -> tuple[Problem, ...]:
    """A warning for each that has accepted nothing."""
    done = set(used)
    return tuple(
        Problem(
            "accepts-nothing",
            Severity.WARNING,
            each.span,
            f"there is no warning `{each.code}` here to accept",
            "take the line out",
        )
        for each in acceptances
        if each not in done
    )

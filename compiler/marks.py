"""Names inside a thing: its marks, and that no two things in it share a name."""

from __future__ import annotations

from platewright.lang import tree
from platewright.lang.problems import Related
from platewright.lang.source import Span

from .graph import Mark
from .mistakes import Problems
from .placement import AXES, Axis, Marks, direction, point
from .readings import expression, name, optional
from .scope import Scope


class OwnNames:
    """The names of a thing's marks, features and placed things, each with where it is given first."""

    def __init__(self, problems: Problems) -> None:
        self._problems = problems
        self._taken: dict[str, Span] = {}

    def take(self, text: str, span: Span) -> None:
        """Take a name; report it if something here has it already."""
        if text in self._taken:
            related = (Related(self._taken[text], "the first of them"),)
            hint = "give one of them another name with `as`"
            self._problems.error("duplicate-name", span, f"two things here are called `{text}`", hint, related)
        self._taken.setdefault(text, span)


def read_marks(lines: tuple[tree.Line, ...], scope: Scope, names: OwnNames, problems: Problems) -> tuple[Mark, ...]:
    """The marks among the lines of a part or assembly."""
    found: list[Mark] = []
    for line in lines:
        if line.word == "mark":
            with problems.collecting():
                own = name(line.head)
                names.take(own.text, own.span)
                if own.text in AXES:
                    problems.error("reserved-name", own.span, f"`{own.text}` is an axis; no mark can be called so")
                along = optional(line.head, "axis")
                axis = direction(along, scope) if along is not None else None
                found.append(Mark(own.text, point(expression(line.head, "point"), scope), axis, own.span))
    return tuple(found)


def axes_of(marks: tuple[Mark, ...]) -> Marks:
    """The marks as axes to turn about; a mark set along nothing stands along z."""
    return {mark.name: Axis(mark.point, mark.axis or AXES["z"]) for mark in marks}

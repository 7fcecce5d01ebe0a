"""The stress that parts carry in a figure: brought forward, held back, seen through, left out."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from msgspec import Struct
from platewright.backend.contract import U8, Emphasis
from platewright.lang import tree
from platewright.lang.problems import Related
from platewright.lang.source import Span

from .graph import Thing
from .mistakes import Problems
from .readings import listed
from .scope import Scope
from .selection import parts_named

WORDS = {
    "highlight": Emphasis.HIGHLIGHT,
    "mute": Emphasis.MUTE,
    "ghost": Emphasis.GHOST,
    "hide": Emphasis.HIDE,
}


class Stress(Struct, frozen=True):
    """What one line of a figure gives to the parts it names and all below them."""

    emphasis: Emphasis
    paths: tuple[str, ...]
    span: Span


def read_stresses(
    lines: Sequence[tree.Line], subject: Thing, path: str, scope: Scope, problems: Problems
) -> tuple[Stress, ...]:
    """The lines of a figure that stress parts, in their order."""
    found: list[Stress] = []
    said: dict[str, tuple[Emphasis, Span]] = {}
    for line in lines:
        emphasis = WORDS.get(line.head.row)
        if emphasis is None:
            continue
        for written in listed(line.head, "parts"):
            with problems.collecting():
                paths = parts_named(written, subject, path, scope)
                _report_twice(paths, emphasis, written.span, said, problems)
                said.update((each, (emphasis, written.span)) for each in paths)
                found.append(Stress(emphasis, paths, written.span))
    return tuple(found)


def _report_twice(
    paths: tuple[str, ...],
    emphasis: Emphasis,
    span: Span,
    said: dict[str, tuple[Emphasis, Span]],
    problems: Problems,
) -> None:
    """A problem where one part is given two stresses by its own path; what holds it may carry another."""
    for each in paths:
        if each in said:
            related = (Related(said[each][1], "first here"),)
            what = "again" if said[each][0] is emphasis else f"{said[each][0].name.lower()} and {emphasis.name.lower()}"
            sentence = f"`{each}` is stressed twice: {what}"
            problems.error("said-twice", span, sentence, "leave one out", related)
            return


def emphasis_of(stresses: Sequence[Stress], paths: Sequence[str], parents: Sequence[int]) -> U8 | None:
    """The emphasis of every row of a part tree, (n,) uint8; None where nothing is stressed.

    A part carries what is said of it or, failing that, of the nearest thing that holds it.
    """
    if not stresses:
        return None
    said = {path: stress.emphasis for stress in stresses for path in stress.paths}
    found = np.zeros(len(paths), np.uint8)
    for row, (path, parent) in enumerate(zip(paths, parents, strict=True)):
        found[row] = said.get(path, Emphasis(int(found[parent])) if parent >= 0 else Emphasis.PLAIN)
    return found

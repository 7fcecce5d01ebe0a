"""Names of figures and variants as names of files and folders: which are fit for every common file system."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Sequence
from typing import Protocol

from platewright.lang.problems import Problem, Related, Severity
from platewright.lang.source import Span

CODE = "unfit-file-name"

_FORBIDDEN = frozenset('<>:"/\\|?*')
_DEVICES = frozenset({"con", "prn", "aux", "nul", *(f"{port}{n}" for port in ("com", "lpt") for n in range(1, 10))})
_LONGEST = 200


def unfit(name: str) -> str:
    """Why a name cannot name a file or folder everywhere, in a few words; empty if it can."""
    if not name or name in (".", ".."):
        return "is no name for a file"
    if len(name.encode("utf-8", "surrogatepass")) > _LONGEST:
        return f"is longer than {_LONGEST} bytes"
    if bad := sorted({character for character in name if character in _FORBIDDEN or not character.isprintable()}):
        return f"has {', '.join(map(repr, bad))} in it"
    if name[0] in ". " or name[-1] in ". ":
        return "begins or ends with a dot or a space"
    if name.split(".")[0].casefold() in _DEVICES:
        return "names a device on some systems"
    return ""


def clash(names: Iterable[str]) -> tuple[str, str] | None:
    """The first two different names that a file system blind to case or to Unicode composition takes for one."""
    seen: dict[str, str] = {}
    for name in names:
        key = unicodedata.normalize("NFC", unicodedata.normalize("NFC", name).casefold())
        if seen.setdefault(key, name) != name:
            return seen[key], name
    return None


class Named(Protocol):
    """A figure or a variant."""

    @property
    def name(self) -> str:
        """Its name, to become that of a file or folder."""

    @property
    def span(self) -> Span:
        """Where it is declared."""


def problems(things: Sequence[Named], what: str) -> tuple[Problem, ...]:
    """What keeps figures or variants (`what` is the word for one) from being files or folders side by side."""
    found = [
        Problem(CODE, Severity.ERROR, thing.span, f"the {what} `{thing.name}` {reason}, so no file can carry its name")
        for thing in things
        if (reason := unfit(thing.name))
    ]
    if (pair := clash(thing.name for thing in things)) is not None:
        first, second = (next(thing for thing in things if thing.name == name) for name in pair)
        sentence = f"`{second.name}` and `{first.name}` would be one file where capitals do not count"
        related = (Related(first.span, f"`{first.name}` is here"),)
        found.append(Problem(CODE, Severity.ERROR, second.span, sentence, f"rename one {what}", related))
    return tuple(found)

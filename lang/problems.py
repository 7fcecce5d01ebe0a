"""Problem records: what is wrong, where, why, and the way out."""

from __future__ import annotations

from enum import StrEnum

from msgspec import Struct

from .source import Span


class Severity(StrEnum):
    """An error stops output; a warning does not; a note tells."""

    ERROR = "error"
    WARNING = "warning"
    NOTE = "note"


class Related(Struct, frozen=True):
    """Another place that belongs to a problem, with a few words on how."""

    span: Span
    words: str


class Problem(Struct, frozen=True):
    """One mistake. `code` is stable (see `codes`); `sentence` says found and expected in the author's words; `hint`
    is the fix.

    `within` names the figure the problem is confined to; empty if it concerns the whole scene.
    """

    code: str
    severity: Severity
    span: Span
    sentence: str
    hint: str = ""
    related: tuple[Related, ...] = ()
    within: str = ""


def is_error(problem: Problem) -> bool:
    """Whether the problem stops output."""
    return problem.severity is Severity.ERROR

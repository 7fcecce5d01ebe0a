"""Places in an author's text."""

from __future__ import annotations

from msgspec import Struct


class Span(Struct, frozen=True, order=True):
    """A stretch of text.

    1-based lines and columns in code points, the end exclusive. `file` is relative to the project.
    """

    file: str
    line: int
    column: int
    end_line: int
    end_column: int

    def to(self, other: Span) -> Span:
        """The stretch from this one's start to the other's end."""
        return Span(self.file, self.line, self.column, other.end_line, other.end_column)

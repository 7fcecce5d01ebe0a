"""What can be wrong with a recipe: a record that the compiler turns into a located problem."""

from __future__ import annotations

from msgspec import Struct


class Flaw(Struct, frozen=True):
    """One mistake. `code` is stable; `source` is a row of the compiler's table of lines, -1 for the whole part.

    The sentence is in the author's words and in the style of problems, small at the start and without a period; so is
    the hint, the way out. `is_error` is False for a warning.
    """

    code: str
    source: int
    sentence: str
    hint: str = ""
    is_error: bool = True


class SolidError(ValueError):
    """A recipe that the compiler should never have passed on: our bug, not the author's."""

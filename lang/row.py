"""What a row of the vocabulary is."""

from __future__ import annotations

from msgspec import Struct


class Row(Struct, frozen=True):
    """One word of the language.

    `key` names the row; `pattern` says what it takes; `stands` are the contexts in which it may start a line or a
    clause; `lines` is the context of the lines indented under it; `clauses` are the contexts whose clauses may follow
    it. With `is_once` it may be said once in one thing; with `later` it is read in full and reported as not drawn yet.
    """

    key: str
    pattern: str
    stands: tuple[str, ...]
    sentence: str
    example: str = ""
    clauses: tuple[str, ...] = ()
    lines: str = ""
    later: bool = False
    is_once: bool = False

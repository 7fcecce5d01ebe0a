"""Getting typed values out of words that have been read."""

from __future__ import annotations

from platewright.lang import tree
from platewright.lang.words import ROWS

LATER = frozenset(row.key for row in ROWS if row.later)
"""Rows of the vocabulary whose work is not built yet; each reading of one has its problem already."""


def expression(reading: tree.Reading, slot: str) -> tree.Expression:
    """The expression in a slot that the vocabulary requires."""
    found = optional(reading, slot)
    assert found is not None, f"{reading.row}: no {slot}"
    return found


def optional(reading: tree.Reading, slot: str) -> tree.Expression | None:
    """The expression in a slot, or None where it was left out."""
    value = reading.get(slot)
    if value is None or isinstance(value, (tree.Name, tree.Word, tree.Reading, tuple)):
        return None
    return value


def word(reading: tree.Reading, slot: str) -> str:
    """The word in a slot, or `""` where it was left out."""
    value = reading.get(slot)
    return value.text if isinstance(value, tree.Word) else ""


def name(reading: tree.Reading, slot: str = "name") -> tree.Name:
    """The name that a slot declares."""
    value = reading.get(slot)
    assert isinstance(value, tree.Name), f"{reading.row}: no {slot}"
    return value


def settings(reading: tree.Reading, slot: str = "settings") -> tuple[tree.Setting, ...]:
    """The settings in a slot, none where it was left out."""
    value = reading.get(slot)
    if not isinstance(value, tuple):
        return ()
    return tuple(each for each in value if isinstance(each, tree.Setting))


def listed(reading: tree.Reading, slot: str) -> tuple[tree.Expression, ...]:
    """The expressions that a slot joins by commas, none where it was left out."""
    value = reading.get(slot)
    if not isinstance(value, tuple):
        return ()
    return tuple(each for each in value if isinstance(each, tree.Expression))


def parameters(line: tree.Line) -> tuple[tree.Parameter, ...]:
    """The parameters of a declaration, none where it has none."""
    value = line.head.get("parameters")
    if not isinstance(value, tuple):
        return ()
    return tuple(each for each in value if isinstance(each, tree.Parameter))

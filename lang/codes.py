"""The stable codes of problems, one sentence each. A code never changes its meaning; a new meaning is a new code."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

CODES: Mapping[str, str] = MappingProxyType(
    {
        # --- the shape of the text
        "file-too-long": "a file has more characters than the limit",
        "line-too-long": "a line has more characters than the limit",
        "too-many-problems": "a file has so many problems that reading stopped",
        "tab": "a file is laid out with tabs instead of spaces",
        "odd-indentation": "a line is indented to a column that matches no line above",
        "nested-lines-too-deep": "lines are indented more levels deep than the limit",
        "unexpected-character": "a character that has no meaning in the language",
        "unclosed-text": "a text has no closing quote on its line",
        "unclosed-bracket": "a bracket is not closed on its line",
        "unopened-bracket": "a bracket closes that was never opened",
        "nested-too-deep": "brackets are nested deeper than the limit",
        "too-many-operations": "one value has more operations than the limit",
        "bad-number": "a number is not written as the language wants it",
        "bad-date": "a date that is in no calendar",
        "bad-escape": "a text has a backslash before a character it does not go with",
        "comma-space": "a comma is not followed by a space",
        "sign-space": "a sign does not touch its value, or a difference is spaced on one side only",
        "call-space": "a parenthesis stands where it does not touch, or touches where it should not",
        "unit-in": "the unit `in` is not glued to its number",
        "unknown-unit": "a number is followed by what is no unit",
        "foreign-operator": "an operator of another notation",
        "chained-comparison": "a comparison is compared again",
        "broken-value": "a value is not complete, or has something in it that does not fit",
        # --- words
        "unknown-word": "a word that the vocabulary does not know at this place",
        "misplaced-word": "a word of the vocabulary that may not stand at this place",
        "missing-value": "a word lacks a value or a word that must follow it",
        "value-too-many": "a value stands where nothing takes it",
        "wrong-form": "a value is not of the form that its place takes",
        "no-lines-here": "lines are indented under a line that takes none",
        "reserved-name": "a declared name that the language keeps for itself",
        "said-twice": "what may be said once of a thing is said again",
        "version": "the version of the language is stated twice, late, or is unknown",
        "not-drawn-yet": "a word of the language whose work is not built yet",
    }
)

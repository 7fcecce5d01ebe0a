"""The nearest known word to one that was not known."""

from __future__ import annotations

from collections.abc import Iterable


def nearest(word: str, known: Iterable[str], is_ranked: bool = False) -> str:
    """The known word that is fewest slips away, or "" if none is near enough to be meant.

    A slip is a letter too many, one missing, one wrong, or two neighbours swapped (Damerau-Levenshtein distance in its
    restricted form). Up to a third of the letters may be slips, at least one; among equals the first in the order
    of the alphabet wins, or where `is_ranked` the first in the order given. Cost: the product of the lengths for each
    known word.
    """
    if len(word) > 60:
        return ""
    folded = word.lower()
    best = ""
    limit = max(1, len(word) // 3)
    for candidate in known if is_ranked else sorted(set(known)):
        if abs(len(candidate) - len(word)) > limit:
            continue
        slips = 0 if candidate.lower() == folded else distance(folded, candidate.lower())
        if slips <= limit and slips < len(candidate):
            if slips == 0:
                return candidate
            best, limit = candidate, slips - 1
    return best


def distance(a: str, b: str) -> int:
    """The number of slips between two words: insertions, deletions, substitutions, swaps of neighbours.

    The restricted edit distance of Damerau (1964), by the recurrence of Wagner and Fischer (1974) with swaps.
    """
    before: list[int] = []
    row = list(range(len(b) + 1))
    for i, letter in enumerate(a, 1):
        before, last, row = row, before, [i]
        for j, other in enumerate(b, 1):
            cost = min(before[j] + 1, row[j - 1] + 1, before[j - 1] + (letter != other))
            if i > 1 and j > 1 and letter == b[j - 2] and a[i - 2] == other:
                cost = min(cost, last[j - 2] + 1)
            row.append(cost)
    return row[-1]

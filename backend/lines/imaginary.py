"""Imaginary lines of intersection kept clear of outlines and of one another (ISO 128-3; the 0.7 mm of ISO 128-2)."""

from __future__ import annotations

from collections import Counter
from itertools import pairwise
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from ..contract import F64
from .noding import near

I64: TypeAlias = NDArray[np.int64]
Bools: TypeAlias = NDArray[np.bool_]

SHORT_OF = 1.0
"""mm by which an imaginary line stops short of the line it runs up to."""
CLEAR = 0.7
"""mm that stay between an imaginary line and any other line."""
SHORTEST = 2.0
"""mm: shorter stretches that remain are left out."""
_STEP = 0.1  # mm between the places at which the distance is looked at


def spaced(points: F64, first: I64, is_closed: Bools, solid_start: F64, solid_end: F64) -> list[tuple[int, F64]]:
    """The stretches of imaginary lines that are drawn: the chain each is of, and its points (k,2), by chain and along.

    points (m,2) mm, those of chain c from first[c] to first[c+1]; solid_start, solid_end (s,2) are all other visible
    lines. Ends stop SHORT_OF unless they meet the end of another imaginary line; what is nearer than CLEAR to another
    visible line, or to a longer imaginary one that is drawn there, is left out. Cost: linear in length over 0.1 mm.
    """
    lines = [_closed(points[a:b], ring) for (a, b), ring in zip(pairwise(first), is_closed, strict=True)]
    runs = [np.concatenate([[0.0], np.cumsum(_steps(line))]) for line in lines]
    ends = _cut_ends(lines, is_closed)
    places = [
        np.linspace(low, run[-1] - high, max(2, int(np.ceil((run[-1] - low - high) / _STEP)) + 1))
        if run[-1] - low - high >= SHORTEST
        else np.zeros(0)
        for run, (low, high) in zip(runs, ends, strict=True)
    ]
    kept = _kept(lines, runs, places, solid_start, solid_end)
    return [
        (chain, _stretch(lines[chain], runs[chain], places[chain][low], places[chain][high]))
        for chain in range(len(lines))
        for low, high in _stretches(kept[chain], places[chain])
    ]


def _closed(line: F64, is_closed: bool) -> F64:
    return np.concatenate([line, line[:1]]) if is_closed else line


def _steps(line: F64) -> F64:
    step = np.diff(line, axis=0)
    return np.sqrt(step[:, 0] ** 2 + step[:, 1] ** 2)


def _cut_ends(lines: list[F64], is_closed: Bools) -> list[tuple[float, float]]:
    """How much each line is cut short at both ends."""
    tips = [tuple(tip) for line in lines for tip in (line[0], line[-1])]
    count = Counter(tips)
    cut = [0.0 if count[tip] > 1 else SHORT_OF for tip in tips]
    return [(0.0, 0.0) if ring else (cut[2 * k], cut[2 * k + 1]) for k, ring in enumerate(is_closed.tolist())]


def _kept(lines: list[F64], runs: list[F64], places: list[F64], solid_start: F64, solid_end: F64) -> list[Bools]:
    """Of each place of each line whether it keeps clear, longer lines first."""
    spots = [_at(line, run, place) for line, run, place in zip(lines, runs, places, strict=True)]
    begin = np.concatenate([[0], np.cumsum([len(spot) for spot in spots])])
    every = np.concatenate(spots)
    kept = np.ones(len(every), bool)
    kept[near(every, solid_start, solid_end, CLEAR)[1]] = False
    chain = np.repeat(np.arange(len(lines)), np.diff(begin))
    step = np.flatnonzero(chain[1:] == chain[:-1])
    segment, spot = near(every, every[step], every[step + 1], CLEAR)
    order = sorted(range(len(lines)), key=lambda k: (-round(float(runs[k][-1]), 3), k))
    rank = np.empty(len(lines), np.int64)
    rank[order] = np.arange(len(lines))
    is_before = rank[chain[step[segment]]] < rank[chain[spot]]
    segment, spot = step[segment[is_before]], spot[is_before]
    by_rank = np.argsort(rank[chain[spot]], kind="stable")
    segment, spot = segment[by_rank], spot[by_rank]
    limits = np.searchsorted(rank[chain[spot]], np.arange(len(lines) + 1))
    for k in range(len(lines)):
        mine = slice(limits[k], limits[k + 1])
        is_there = kept[segment[mine]] & kept[segment[mine] + 1]
        kept[spot[mine][is_there]] = False
    return [kept[a:b] for a, b in pairwise(begin)]


def _at(line: F64, run: F64, place: F64) -> F64:
    return np.column_stack([np.interp(place, run, line[:, 0]), np.interp(place, run, line[:, 1])])


def _stretches(kept: Bools, place: F64) -> list[tuple[int, int]]:
    """First and last place of each stretch that is kept and long enough."""
    change = np.flatnonzero(np.diff(np.concatenate([[False], kept, [False]]).astype(np.int8)))
    pairs = zip(change[::2].tolist(), (change[1::2] - 1).tolist(), strict=True)
    return [(low, high) for low, high in pairs if place[high] - place[low] >= SHORTEST - _STEP / 2]


def _stretch(line: F64, run: F64, low: float, high: float) -> F64:
    inside = (run > low + 1e-9) & (run < high - 1e-9)
    ends = _at(line, run, np.array([low, high]))
    return np.concatenate([ends[:1], line[inside], ends[1:]])

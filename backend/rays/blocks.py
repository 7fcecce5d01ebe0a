"""Work in fixed blocks on a pool of threads: what comes out depends neither on their number nor on their order."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from typing import TypeVar

_T = TypeVar("_T")
_R = TypeVar("_R")


def in_blocks(work: Callable[[int, int], None], n: int, size: int, threads: int | None = None) -> None:
    """Call work(begin, end) for stretches of at most `size` out of n; threads default to all processors."""
    starts = range(0, n, size)
    for_all(lambda begin: work(begin, min(begin + size, n)), starts, threads)


def for_all(work: Callable[[_T], _R], things: Sequence[_T], threads: int | None = None) -> list[_R]:
    """Results of work on every thing, in their order."""
    workers = min(threads or os.cpu_count() or 1, len(things))
    if workers <= 1:
        return [work(thing) for thing in things]
    with ThreadPoolExecutor(workers) as pool:
        return list(pool.map(work, things))

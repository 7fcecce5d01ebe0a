"""The ladder of chord errors and the division of circles that follows from it.

A chord error (sagitta) is the greatest distance between a circle and its chord, in mm of model. A surface that is
curved both ways (sphere, torus) obeys it along its meridians and its parallels, and departs from the middle of a
facet by at most twice as much.
"""

from __future__ import annotations

import math

FINEST = 1e-5
COARSEST = 1e3
FACTS_SHARE = 20_000.0
"""Every measured fact about a part (volumes, areas, expectations) is taken at the first rung of at most this part of
the longest side of its box (`bounds.facts_rung`), never at that of a figure. A ball's volume then lacks less than 4
in 10 000, whatever its size.
"""

FEWEST_DIVISIONS = 8
MAX_TRIANGLES = 5_000_000
"""Limit named `triangles`: of one part at one rung, before cutting."""
MAX_COPIES = 100_000
"""Limit named `copies`: shapes of one part, with all copies of patterns and of parts within it."""
MAX_DEPTH = 64
"""Parts within parts; a deeper nest counts as too many copies."""


def rungs() -> tuple[float, ...]:
    """All rungs, coarsest first: 1, 2 and 5 times the powers of ten from 1000 to 0.00001 mm."""
    return (COARSEST, *(float(f"{step}e{power}") for power in range(2, -6, -1) for step in (5, 2, 1)))


def first_at_most(error: float) -> float:
    """The coarsest rung whose chord error is at most `error` mm; the finest there is if none is.

    ValueError for an error that is not a positive number.
    """
    if not error > 0.0:
        raise ValueError(f"chord error {error}")
    return next((rung for rung in rungs() if rung <= error * (1.0 + 1e-12)), FINEST)


def divisions(radius: float, rung: float) -> int:
    """Chords in a full circle: ceil(pi / acos(1 - s/r)) rounded up to a multiple of 4, at least 8.

    The sagitta law s = r (1 - cos(pi/n)), written with the half-angle sine because acos loses digits near 1.
    Depends on radius over rung alone, so equal coaxial cylinders share their vertices.
    """
    if not (radius > 0.0 and rung > 0.0):
        raise ValueError(f"radius {radius}, chord error {rung}")
    if rung >= radius:
        return FEWEST_DIVISIONS
    exact = math.pi / (2.0 * math.asin(math.sqrt(rung / (2.0 * radius))))
    return max(FEWEST_DIVISIONS, 4 * math.ceil((exact - 1e-9) / 4.0))

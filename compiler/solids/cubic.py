"""Interpolating cubic splines as Bézier pieces, in any number of dimensions.

The spline is the C2 cubic through its points with the chord lengths between them as parameter; its ends are natural
(no bending) or follow a tangent, and where the last point is the first it closes smoothly. The second
derivatives M solve h[i-1] M[i-1] + 2 (h[i-1] + h[i]) M[i] + h[i] M[i+1] = 6 (d[i] - d[i-1]), d the divided differences
(de Boor, A Practical Guide to Splines, chapter IV); the system is solved by elimination, a closed one with the
Sherman-Morrison formula.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

F64 = NDArray[np.float64]


def bezier_pieces(
    points: Sequence[Sequence[float]],
    tangent: Sequence[float] | None = None,
    end_tangent: Sequence[float] | None = None,
) -> F64:
    """Control points (n-1,4,d) of the spline through n points of d values, two or more, neighbours apart.

    `tangent` and `end_tangent` are the directions in which it starts and ends; their lengths do not matter.
    Cost: linear.
    """
    p = np.array(points, np.float64)
    steps = np.diff(p, axis=0)
    h = np.array([math.hypot(*step) for step in steps.tolist()])
    if not (h > 0.0).all():
        raise ValueError("two neighbouring points of a spline are one")
    closed = len(p) > 3 and tangent is None and end_tangent is None and bool((p[0] == p[-1]).all())
    bending = _closed(h, steps) if closed else _open(h, steps, tangent, end_tangent)
    width = h[:, None]
    first = steps / width - width * (2.0 * bending[:-1] + bending[1:]) / 6.0
    last = steps / width + width * (bending[:-1] + 2.0 * bending[1:]) / 6.0
    return np.stack((p[:-1], p[:-1] + width * first / 3.0, p[1:] - width * last / 3.0, p[1:]), axis=1)


def _open(h: F64, steps: F64, tangent: Sequence[float] | None, end_tangent: Sequence[float] | None) -> F64:
    n = len(h) + 1
    slope = steps / h[:, None]
    low, middle, high, right = np.zeros(n), np.ones(n), np.zeros(n), np.zeros((n, steps.shape[1]))
    low[1:-1], middle[1:-1], high[1:-1] = h[:-1], 2.0 * (h[:-1] + h[1:]), h[1:]
    right[1:-1] = 6.0 * np.diff(slope, axis=0)
    if tangent is not None:
        unit = np.array(tangent, np.float64) / math.hypot(*tangent)
        middle[0], high[0], right[0] = 2.0 * h[0], h[0], 6.0 * (slope[0] - unit)
    if end_tangent is not None:
        unit = np.array(end_tangent, np.float64) / math.hypot(*end_tangent)
        middle[-1], low[-1], right[-1] = 2.0 * h[-1], h[-1], 6.0 * (unit - slope[-1])
    return _solved(low, middle, high, right)


def _closed(h: F64, steps: F64) -> F64:
    slope = steps / h[:, None]
    before = np.roll(h, 1)
    low, middle, high = before.copy(), 2.0 * (before + h), h.copy()
    right = 6.0 * (slope - np.roll(slope, 1, axis=0))
    # The corners of the matrix, low[0] and high[-1], as a change of rank one.
    corner = -middle[0]
    last = high[-1]
    first = low[0]
    middle[0] -= corner
    middle[-1] -= first * last / corner
    change = np.zeros((len(h), 1))
    change[0, 0], change[-1, 0] = corner, last
    low[0] = high[-1] = 0.0
    both = _solved(low, middle, high, np.concatenate((right, change), axis=1))
    y, q = both[:, :-1], both[:, -1:]
    share = (y[0] + first / corner * y[-1]) / (1.0 + q[0, 0] + first / corner * q[-1, 0])
    bending = y - q * share
    return np.concatenate((bending, bending[:1]))


def _solved(low: F64, middle: F64, high: F64, right: F64) -> F64:
    """Elimination of a tridiagonal system that is diagonally dominant."""
    n = len(middle)
    ratio, found = np.zeros(n), right.copy()
    ratio[0], found[0] = high[0] / middle[0], right[0] / middle[0]
    for k in range(1, n):
        pivot = middle[k] - low[k] * ratio[k - 1]
        ratio[k] = high[k] / pivot
        found[k] = (right[k] - low[k] * found[k - 1]) / pivot
    for k in range(n - 2, -1, -1):
        found[k] -= ratio[k] * found[k + 1]
    return found

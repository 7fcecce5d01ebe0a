"""Signs of drawing practice that text fonts lack, as closed polygons for capitals of height 1, y up.

They are built as strokes of the letters' own weight, a tenth of the height (type B of ISO 3098-1).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from math import cos, pi, radians, sin, tan
from types import MappingProxyType

import numpy as np

from ..contract import F64

Sign = tuple[float, tuple[F64, ...]]
"""An advance and rings (k,2), filled by the nonzero rule."""

_WEIGHT = 0.1
_SIDE = 0.09  # free space on either side
_N_ARC = 96  # chords of a full circle: 0.0003 of the height off it


def _ring(centre: tuple[float, float], radius: float, start: float = 0.0, end: float = 360.0) -> F64:
    """Points of a circle, counter-clockwise from `start` to `end` degrees."""
    count = max(2, round(_N_ARC * abs(end - start) / 360.0))
    steps = [radians(start + (end - start) * k / count) for k in range(count + (abs(end - start) < 360.0))]
    return np.array([(centre[0] + radius * cos(step), centre[1] + radius * sin(step)) for step in steps])


def _bar(start: tuple[float, float], end: tuple[float, float]) -> F64:
    """A stroke with flat ends, counter-clockwise."""
    along = np.subtract(end, start) / np.hypot(*np.subtract(end, start))
    aside = np.array((-along[1], along[0])) * _WEIGHT / 2
    return np.array((np.add(start, -aside), np.add(end, -aside), np.add(end, aside), np.add(start, aside)))


def _diameter() -> Sign:
    """⌀: a circle and a line through its middle from the base line to the height of capitals."""
    radius, lean = 0.36, tan(pi / 6)
    middle = (_SIDE + radius + _WEIGHT / 2, 0.5)
    bar = _bar((middle[0] - lean * 0.5, 0.0), (middle[0] + lean * 0.5, 1.0))
    rings = (_ring(middle, radius + _WEIGHT / 2), _ring(middle, radius - _WEIGHT / 2)[::-1].copy(), bar)
    return 2 * middle[0], rings


def _angle() -> Sign:
    """∠: two lines from a corner on the base line."""
    foot, wide, rise = _WEIGHT / 2, 0.75, radians(45.0)
    left = _SIDE + _WEIGHT
    level = _bar((left - foot, foot), (left + wide, foot))
    slope = _bar((left, foot), (left + wide * cos(rise), foot + wide * sin(rise)))
    return left + wide + _SIDE, (level, slope)


def _square() -> Sign:
    """□: the square of a side."""
    side, half = 0.74, _WEIGHT / 2
    x0, x1, y0, y1 = _SIDE, _SIDE + side, 0.13, 0.13 + side
    outer = np.array(((x0, y0), (x1, y0), (x1, y1), (x0, y1)))
    inner = np.array(((x0, y0), (x0, y1), (x1, y1), (x1, y0))) - (x0, y0)
    return side + 2 * _SIDE, (outer, inner * (1 - 4 * half / side) + (x0 + 2 * half, y0 + 2 * half))


def _arc() -> Sign:
    """⌒: the upper part of a circle."""
    radius, middle = 0.5, (_SIDE + 0.45, 0.35)
    outer = _ring(middle, radius + _WEIGHT / 2, 30.0, 150.0)
    inner = _ring(middle, radius - _WEIGHT / 2, 150.0, 30.0)
    return 0.9 + 2 * _SIDE, (np.concatenate((outer, inner)),)


SIGNS: Mapping[str, Callable[[], Sign]] = MappingProxyType(
    {"\u2300": _diameter, "\u2220": _angle, "\u25a1": _square, "\u2312": _arc}
)

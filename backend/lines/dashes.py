"""Broken lines as the dashes and dots they are made of, each a path of its own.

The rule: a line begins and ends with a dash, and so does each stretch between two corners, so that a corner lies
within a dash that goes round it. Gaps and dots keep their lengths (3 d and 0.5 d); the dashes take up what the length
of the stretch leaves over, so that all dashes of one stretch are equal (the formulas of ISO 128-21 in this form are
from memory). A stretch too short for that has one gap, or one gap, dot, gap, in its middle as long as its two dashes
are not shorter than `Pattern.shortest`; a shorter one is continuous (ISO 128-2 knows the short centre line as a
continuous one; the limit is this program's). A ring without corners has whole periods, a dash about its start.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

from ..contract import LineClass, Style
from ..drawing import Path, Stroke
from .tracks import Track, track_of
from .weights import Pattern, weight_of


@dataclass(frozen=True, eq=False, slots=True)
class Dash:
    """One dash or dot. `is_end` tells that it is an end of the line or goes round a corner of it."""

    path: Path
    is_end: bool


def dashes_of(path: Path, pattern: Pattern, width: float) -> tuple[Dash, ...]:
    """Break a path into dashes for a line of `width` mm. Cost: linear in the number of dashes and pieces."""
    track = track_of(path)
    if track.length == 0:
        return ()
    if track.is_closed and not track.is_corner_at_start:
        if not track.corners:
            return _ring(track, path, pattern, width)
        turn = track.corners[0]
        bounds = [turn, *track.corners[1:], turn + track.length]
    else:
        bounds = [0.0, *track.corners, track.length]
    return _between(track, path, bounds, pattern, width)


def chain_line(path: Path, style: Style, line_class: LineClass) -> tuple[Stroke, ...]:
    """A path as the strokes of its class, all of the class's own width, also those at ends and corners."""
    weight = weight_of(line_class, style)
    if weight.line_type is None:
        return (Stroke(path, weight.width, line_class),)
    dashes = dashes_of(path, weight.line_type, weight.width)
    return tuple(Stroke(dash.path, weight.width, line_class, is_round=False) for dash in dashes)


def laid_out(length: float, pattern: Pattern, width: float) -> list[tuple[float, float]]:
    """Where a straight line of `length` mm is inked: from and to, the first from 0, the last to `length`."""
    rest = sum(pattern.between) * width
    count = int((length - pattern.dash * width) / (pattern.dash * width + rest) + 0.5)
    if count < 1:
        count = 1 if length >= rest + 2 * pattern.shortest * width else 0
    dash = (length - count * rest) / (count + 1)
    inked: list[tuple[float, float]] = []
    for k in range(count):
        here = k * (dash + rest)
        inked.append((here, here + dash))
        inked += _dots(here + dash, pattern, width)
    inked.append((length - dash, length))
    return inked


def _dots(here: float, pattern: Pattern, width: float) -> list[tuple[float, float]]:
    dots = []
    for gap, dot in zip(pattern.between[:-1:2], pattern.between[1::2], strict=True):
        here += gap * width
        dots.append((here, here + dot * width))
        here += dot * width
    return dots


def _ring(track: Track, path: Path, pattern: Pattern, width: float) -> tuple[Dash, ...]:
    rest = sum(pattern.between) * width
    count = max(2, int(track.length / (pattern.dash * width + rest) + 0.5))
    dash = track.length / count - rest
    if dash < pattern.shortest * width:
        return (Dash(path, True),)
    inked: list[tuple[float, float]] = []
    for k in range(count):
        middle = k * (dash + rest)
        inked.append((middle - dash / 2, middle + dash / 2))
        inked += _dots(middle + dash / 2, pattern, width)
    return tuple(Dash(track.stretch(low, high), False) for low, high in inked)


def _between(track: Track, path: Path, bounds: list[float], pattern: Pattern, width: float) -> tuple[Dash, ...]:
    """Dashes between the corners at `bounds`, those that meet at a corner made one."""
    inked: list[tuple[float, float, bool]] = []
    for low, high in pairwise(bounds):
        stretches = laid_out(high - low, pattern, width)
        last = len(stretches) - 1
        for k, (a, b) in enumerate(stretches):
            if k == 0 and inked:
                inked[-1] = (inked[-1][0], low + b, True)
            else:
                inked.append((low + a, low + b, k in (0, last)))
    if track.is_closed:
        if len(inked) == 1:
            return (Dash(path, True),)
        first, end = inked.pop(0), inked.pop()
        inked.append((end[0], first[1] + track.length, True))
    return tuple(Dash(track.stretch(low, high), is_end) for low, high, is_end in inked)

"""Outlines: `from`, `to`, `round to`, `circle` and `hole` lines to closed loops."""

from __future__ import annotations

import math

from platewright.lang import tree
from platewright.lang.source import Span
from platewright.lang.units import LENGTH

from . import limits
from .expressions import vector
from .mistakes import mistake
from .placement import positive_length
from .readings import expression, optional, word
from .scope import Scope
from .solids.recipe import ArcTo, LineTo, Loop, Outline

Point2 = tuple[float, float]


def read_outline(line: tree.Line, scope: Scope) -> Outline:
    """The loops an `outline` declaration describes, in the order written, the outer first. Raises Mistake."""
    holes = tuple(_loop(below.lines, below.span, scope) for below in line.lines if below.word == "hole")
    stretches = tuple(below for below in line.lines if below.word not in ("hole", "derived"))
    return Outline(_loop(stretches, line.span, scope), holes)


def _loop(lines: tuple[tree.Line, ...], span: Span, scope: Scope) -> Loop:
    if not lines:
        raise mistake("open-outline", span, "this outline has no lines", "begin with `from (0, 0)` or with a `circle`")
    first = lines[0]
    if first.word == "circle":
        if len(lines) > 1:
            raise mistake("open-outline", lines[1].span, "a circle is a whole loop; nothing can follow it")
        return _circle(first.head, scope)
    if first.word != "from":
        raise mistake("open-outline", first.head.word_span, f"expected `from` or `circle` first, found `{first.word}`")
    start = here = point2(expression(first.head, "point"), scope)
    stretches: list[LineTo | ArcTo] = []
    for line in lines[1:]:
        if line.word in ("from", "circle"):
            hint = "a further loop is a `hole`, its lines indented under it"
            raise mistake(
                "open-outline", line.head.word_span, f"`{line.word}` begins a loop and this one has begun", hint
            )
        end = point2(expression(line.head, "point"), scope)
        if end == here:
            raise mistake("no-length", line.span, "this stretch has no length: it ends where it starts")
        stretches.append(LineTo(end) if line.word == "to" else _arc(line.head, here, end, scope))
        here = end
    if len(stretches) < 2 and all(isinstance(stretch, LineTo) for stretch in stretches):
        raise mistake("open-outline", span, "this outline encloses nothing", "it needs two stretches or more")
    return Loop(start, tuple(stretches))


def point2(written: tree.Expression, scope: Scope) -> Point2:
    """A point of the outline's plane in mm. Raises Mistake."""
    x, y = vector(written, scope, 2, LENGTH).components
    if max(abs(x), abs(y)) > limits.LARGEST_MM:
        raise mistake("out-of-range", written.span, f"this lies further than {limits.LARGEST_MM:g} mm, the limit")
    return (x, y)


def _circle(reading: tree.Reading, scope: Scope) -> Loop:
    radius = positive_length(expression(reading, "diameter"), scope, "diameter") / 2
    written = optional(reading, "centre")
    x, y = point2(written, scope) if written is not None else (0.0, 0.0)
    start = (x + radius, y)
    return Loop(start, (ArcTo(start, (x, y), True),))


def _arc(reading: tree.Reading, start: Point2, end: Point2, scope: Scope) -> ArcTo:
    through = optional(reading, "through")
    if through is not None:
        return _arc_through(start, point2(through, scope), end, through.span)
    written = expression(reading, "radius")
    radius = positive_length(written, scope, "radius")
    chord_x, chord_y = end[0] - start[0], end[1] - start[1]
    half = math.hypot(chord_x, chord_y) / 2
    if radius < half * (1 - 1e-9):
        sentence = f"a radius of {radius:g} mm cannot reach: the ends lie {2 * half:g} mm apart"
        raise mistake("out-of-range", written.span, sentence, f"a radius of {half:g} mm or more")
    rise = math.sqrt(max(radius * radius - half * half, 0.0))
    # The arc bows to the side named, seen along the way, so its centre lies to the other; the shorter arc is meant.
    turns_left = word(reading, "side") == "right"
    sign = 1.0 if turns_left else -1.0
    x = (start[0] + end[0]) / 2 - sign * rise * chord_y / (2 * half)
    y = (start[1] + end[1]) / 2 + sign * rise * chord_x / (2 * half)
    return ArcTo(end, (x, y), turns_left)


def _arc_through(start: Point2, middle: Point2, end: Point2, span: Span) -> ArcTo:
    ax, ay = middle[0] - start[0], middle[1] - start[1]
    bx, by = end[0] - start[0], end[1] - start[1]
    cross = ax * by - ay * bx
    if abs(cross) <= 1e-12 * (math.hypot(ax, ay) * math.hypot(bx, by)):
        raise mistake("no-arc", span, "the three points lie on one line, so no arc passes through them", "write `to`")
    a2, b2 = ax * ax + ay * ay, bx * bx + by * by
    x = start[0] + (by * a2 - ay * b2) / (2 * cross)
    y = start[1] + (ax * b2 - bx * a2) / (2 * cross)
    return ArcTo(end, (x, y), cross > 0)

"""Letters as solids: from a text to the outlines of its letters, raised together."""

from __future__ import annotations

import math

from platewright.backend.lettering.type import Contour, Lettering
from platewright.lang import tree

from .expressions import text
from .mistakes import mistake
from .placement import positive_length
from .readings import expression
from .scope import Scope
from .solids.outline import area, closed, extent, inside, polyline
from .solids.recipe import BezierTo, Extrude, LineTo, Loop, Outline, Placed, Point2, Recipe, Step, Stretch

MOST_LETTERS = 500
"""The limit on letters of one text."""

SMOOTH_DEG = 10.0
"""Two curves of a letter that meet at less are one: the corners of letters are far sharper."""

_Piece = tuple[Point2, ...]
"""The end of a line, or the three points of a cubic."""


def read_lettering(
    reading: tree.Reading, scope: Scope, lettering: Lettering, source: int, is_centred: bool
) -> tuple[Recipe, int]:
    """The solid that a text's letters make, and how many shapes it is made of.

    The base line runs along x, the middle of the text's width at x = 0; it rises from z = 0, or stands about it where
    it is centred. Letters that overlap join. Raises Mistake.
    """
    written = expression(reading, "text")
    words = text(written, scope)
    height = positive_length(expression(reading, "capitals"), scope, "capitals")
    depth = positive_length(expression(reading, "depth"), scope, "depth")
    if not words.strip():
        raise mistake(
            "wrong-form", written.span, "there is nothing to letter in this text", "write at least one letter"
        )
    if len(words) > MOST_LETTERS:
        raise mistake("too-much", written.span, f"{len(words):,} letters are more than {MOST_LETTERS}, the limit")
    missing = lettering.missing(words)
    if missing:
        listed = ", ".join(f"`{each}`" if each.isprintable() else f"U+{ord(each):04X}" for each in missing[:8])
        raise mistake("missing-letter", written.span, f"no font here has {listed}", "write it with other letters")
    middle = lettering.width_of(words, height) / 2
    loops = [_loop(contour, middle) for contour in lettering.contours(words, height)]
    low = -depth / 2 if is_centred else 0.0
    stand = ((1.0, 0.0, 0.0, 0.0), (0.0, 1.0, 0.0, 0.0), (0.0, 0.0, 1.0, low))
    placed = tuple(Placed(Extrude(outline, depth), (stand,), source) for outline in nested(loops))
    return Recipe((Step("add", placed),)), len(placed)


def nested(loops: list[Loop]) -> tuple[Outline, ...]:
    """Outlines of loops that fill by the nonzero rule: those that wind as the largest are outer ones, the others holes.

    A hole belongs to the smallest outer loop round it; one with none round it is filled too. Cost: holes times loops.
    """
    curves = [closed(loop) for loop in loops]
    areas = [area(each) for each in curves]
    lines = [polyline(each, 0.0).points for each in curves]
    boxes = [extent(each) for each in curves]
    is_left = max(areas, key=abs) > 0.0
    holes: dict[int, list[Loop]] = {row: [] for row, each in enumerate(areas) if (each > 0.0) == is_left}
    outer = tuple(holes)
    for row, loop in enumerate(loops):
        if row in outer:
            continue
        x, y = loop.start
        round_it = [
            other
            for other in outer
            if boxes[other][0][0] <= x <= boxes[other][1][0]
            and boxes[other][0][1] <= y <= boxes[other][1][1]
            and inside(lines[row][0], lines[other])
        ]
        if round_it:
            holes[min(round_it, key=lambda other: abs(areas[other]))].append(loop)
        else:
            holes[row] = []
    return tuple(Outline(loops[row], tuple(within)) for row, within in sorted(holes.items()))


def _loop(contour: Contour, middle: float) -> Loop:
    """A contour as a loop, its x less `middle`."""

    def moved(point: list[float]) -> Point2:
        return (point[0] - middle, point[1])

    stretches: list[_Piece] = []
    for kind, run in contour.runs:
        points = [moved(point) for point in run.tolist()]
        if kind == "lines":
            stretches += [(point,) for point in points]
        else:
            stretches += zip(points[::3], points[1::3], points[2::3], strict=True)
    return _joined(moved(contour.start.tolist()), stretches)


def _joined(start: Point2, stretches: list[_Piece]) -> Loop:
    """Lines and cubics as a loop, cubics that go on smoothly in one stretch; it starts where two stretches meet."""
    if math.dist(stretches[-1][-1], start) > 0.0:
        stretches = [*stretches, (start,)]
    n = len(stretches)
    begins = [stretches[k - 1][-1] for k in range(n)]
    goes_on = [_goes_on(begins[k - 1], stretches[k - 1], stretches[k]) for k in range(n)]
    first = goes_on.index(False) if False in goes_on else 0
    found: list[Stretch] = []
    run: list[Point2] = []
    for k in (*range(first, n), *range(first)):
        if run and not goes_on[k]:
            found.append(BezierTo(tuple(run)))
            run = []
        if len(stretches[k]) == 3:
            run += stretches[k]
        else:
            found.append(LineTo(stretches[k][0]))
    if run:
        found.append(BezierTo(tuple(run)))
    return Loop(begins[first], tuple(found))


def _goes_on(start: Point2, before: _Piece, after: _Piece) -> bool:
    """Whether a cubic goes on smoothly where another one, from `start`, ends."""
    if len(before) != 3 or len(after) != 3:
        return False
    joint = before[2]
    came = _direction((start, before[0], before[1]), joint, 1.0)
    goes = _direction((after[2], after[1], after[0]), joint, -1.0)
    turn = math.atan2(came[0] * goes[1] - came[1] * goes[0], came[0] * goes[0] + came[1] * goes[1])
    return abs(math.degrees(turn)) < SMOOTH_DEG


def _direction(others: tuple[Point2, ...], joint: Point2, sign: float) -> Point2:
    """The direction from the last of `others` that is not at the joint to it, or back with a sign of -1."""
    away = next((each for each in reversed(others) if math.dist(each, joint) > 0.0), joint)
    return (sign * (joint[0] - away[0]), sign * (joint[1] - away[1]))

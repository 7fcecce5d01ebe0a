"""Outlines: the lines of an `outline` or a `hole` to a closed loop."""

from __future__ import annotations

import math
from collections.abc import Callable

from msgspec import Struct, field
from platewright.lang import tree
from platewright.lang.source import Span
from platewright.lang.units import ANGLE, LENGTH

from . import limits
from .expressions import count, quantity, vector
from .mistakes import mistake
from .placement import positive_length
from .readings import expression, optional, word
from .scope import Scope
from .solids import plane
from .solids.curve import end_tangents
from .solids.outline import closed
from .solids.plane import Corner, PlaneFlaw
from .solids.recipe import ArcTo, EllipseTo, LineTo, Loop, Outline, Point2, SplineTo, Stretch
from .tables import Table, points_in

WHOLE = ("circle", "ellipse", "parallel to")
"""Lines that are a whole loop."""
REST = ("mirrored across", "ring", "rounded", "chamfered")
"""Lines that finish a loop of stretches."""


class Around(Struct, frozen=True):
    """What an outline may ask of the scene: the table that a line names, another outline."""

    table: Callable[[tree.Reading], Table]
    outline: Callable[[tree.Path | tree.Call, Scope], Outline]


def read_outline(line: tree.Line, scope: Scope, around: Around) -> Outline:
    """The loops an `outline` declaration describes, in the order written, the outer first. Raises Mistake."""
    holes = tuple(_loop(below.lines, below.span, scope, around) for below in line.lines if below.word == "hole")
    lines = tuple(below for below in line.lines if below.word not in ("hole", "derived"))
    if lines and lines[0].word == "parallel to":
        _alone(lines)
        moved = _parallel(lines[0], scope, around)
        return Outline(moved.outer, (*moved.holes, *holes))
    return Outline(_loop(lines, line.span, scope, around), holes)


def point2(written: tree.Expression, scope: Scope) -> Point2:
    """A point of the outline's plane in mm. Raises Mistake."""
    x, y = vector(written, scope, 2, LENGTH).components
    if max(abs(x), abs(y)) > limits.LARGEST_MM:
        raise mistake("out-of-range", written.span, f"this lies further than {limits.LARGEST_MM:g} mm, the limit")
    return (x, y)


def _loop(lines: tuple[tree.Line, ...], span: Span, scope: Scope, around: Around) -> Loop:
    if not lines:
        hint = "begin with `from (0, 0)` or with a `circle`"
        raise mistake("open-outline", span, "this outline has no lines", hint)
    first = lines[0]
    if first.word in WHOLE:
        _alone(lines)
        if first.word == "parallel to":
            return _parallel(first, scope, around).outer
        return _circle(first.head, scope) if first.word == "circle" else _ellipse(first.head, scope)
    way = _Way(scope, around)
    for line in lines:
        way.take(line)
    return way.loop(span)


def _alone(lines: tuple[tree.Line, ...]) -> None:
    if len(lines) > 1:
        word = lines[0].word
        article = "an" if word[0] == "e" else "a"
        sentence = "a parallel outline is whole" if word == "parallel to" else f"{article} {word} is a whole loop"
        raise mistake("open-outline", lines[1].span, f"{sentence}; nothing can follow it")


class _Way(Struct):
    """A loop while its lines are read: where it starts, its stretches, what is wanted of each corner and by which line.

    Corner k stands at the start of stretch k, the last one at the end of all.
    """

    scope: Scope
    around: Around
    start: Point2 | None = None
    stretches: list[Stretch] = field(default_factory=list)
    corners: list[Corner | None] = field(default_factory=list)
    spans: list[Span] = field(default_factory=list)
    finished: tree.Line | None = None
    every: tuple[Corner, Span] | None = None

    @property
    def here(self) -> Point2:
        assert self.start is not None
        return self.stretches[-1].end if self.stretches else self.start

    def take(self, line: tree.Line) -> None:
        """Read one more line. Raises Mistake."""
        if line.word in ("rounded", "chamfered"):
            self.every = (_corner(line.head, self.scope), line.span)
            return
        if self.start is None:
            self._begin(line)
            return
        if line.word in ("from", *WHOLE):
            hint = "a further loop is a `hole`, its lines indented under it"
            sentence = f"`{line.word}` begins a loop and this one has begun"
            raise mistake("open-outline", line.head.word_span, sentence, hint)
        if self.finished is not None:
            sentence = f"`{self.finished.word}` closes the loop; nothing can follow it"
            raise mistake("open-outline", line.span, sentence, f"write this line above `{self.finished.word}`")
        if line.word == "mirrored across":
            self._mirror(line)
        elif line.word == "ring":
            self._ring(line)
        else:
            self._stretch(line)

    def loop(self, span: Span) -> Loop:
        """The loop, its corners made. Raises Mistake."""
        if self.start is None or (len(self.stretches) < 2 and all(isinstance(s, LineTo) for s in self.stretches)):
            raise mistake("open-outline", span, "this outline encloses nothing", "it needs two stretches or more")
        if self.here != self.start:
            self.stretches.append(LineTo(self.start))
        else:
            last, last_span = self.corners.pop(), self.spans.pop()
            if last is not None:
                self.corners[0], self.spans[0] = last, last_span
        loop = Loop(self.start, tuple(self.stretches))
        if self.every is None and not any(self.corners):
            return loop
        wanted, spans = self.corners, self.spans
        if self.every is not None:
            corner, line_span = self.every
            rest = plane.all_corners(closed(loop), corner)
            spans = [s if own else line_span for own, s in zip(wanted, spans, strict=True)]
            wanted = [own or other for own, other in zip(wanted, rest, strict=True)]
        try:
            return plane.with_corners(loop, wanted)
        except PlaneFlaw as flaw:
            is_large = flaw.code == "corner-too-large"
            hint = "make it smaller, or the stretches beside it longer" if is_large else "leave it out here"
            where = loop.stretches[flaw.corner - 1].end
            sentence = f"{flaw.sentence}, at ({where[0]:.6g} mm, {where[1]:.6g} mm)"
            raise mistake(flaw.code, spans[flaw.corner], sentence, hint) from None

    def _begin(self, line: tree.Line) -> None:
        if line.word in ("points over", "curve over"):
            first, *points = _table_points(line.head, self.around)
            self._begin_at(first, None, line)
            self._follow(line, points)
            return
        if line.word != "from":
            sentence = f"expected `from` or `circle` first, found `{line.word}`"
            raise mistake("open-outline", line.head.word_span, sentence)
        self._begin_at(point2(expression(line.head, "point"), self.scope), self._own_corner(line), line)

    def _begin_at(self, point: Point2, corner: Corner | None, line: tree.Line) -> None:
        self.start = point
        self.corners.append(corner)
        self.spans.append(line.span)

    def _stretch(self, line: tree.Line) -> None:
        match line.word:
            case "curve through":
                points = _points(line.head, self.scope)
                self._add(
                    _spline(
                        self.here, points, self._tangent(line) if word(line.head, "start") == "tangent" else None, line
                    ),
                    line,
                )
            case "points over" | "curve over":
                self._follow(line, _table_points(line.head, self.around))
            case _:
                end = point2(expression(line.head, "point"), self.scope)
                if end == self.here:
                    raise mistake("no-length", line.span, "this stretch has no length: it ends where it starts")
                self._add(LineTo(end) if line.word == "to" else self._arc(line, end), line, self._own_corner(line))

    def _follow(self, line: tree.Line, points: list[Point2]) -> None:
        if points and points[0] == self.here:
            points = points[1:]
        if line.word == "curve over":
            self._add(_spline(self.here, points, None, line), line)
            return
        for point in points:
            if point == self.here:
                raise mistake("no-length", line.span, "two points of the table that follow each other are one")
            self._add(LineTo(point), line)

    def _add(self, stretch: Stretch, line: tree.Line, corner: Corner | None = None) -> None:
        self.stretches.append(stretch)
        self.corners.append(corner)
        self.spans.append(line.span)

    def _own_corner(self, line: tree.Line) -> Corner | None:
        clauses = [clause for clause in line.clauses if clause.word in ("rounded", "chamfered")]
        if len(clauses) > 1:
            raise mistake("said-twice", clauses[1].span, "a corner is rounded or chamfered, not both")
        return _corner(clauses[0], self.scope) if clauses else None

    def _tangent(self, line: tree.Line) -> Point2:
        if not self.stretches:
            sentence = "there is no stretch before this one to be tangent to"
            raise mistake("no-arc", line.span, sentence, "begin with a stretch of another kind")
        before = self.stretches[-2].end if len(self.stretches) > 1 else self.start
        assert before is not None
        x, y = end_tangents(closed(Loop(before, (self.stretches[-1],)))[0])[1].tolist()
        return (x, y)

    def _arc(self, line: tree.Line, end: Point2) -> ArcTo:
        reading = line.head
        through = optional(reading, "through")
        if through is not None:
            return _arc_through(self.here, point2(through, self.scope), end, through.span)
        if optional(reading, "radius") is not None:
            return _arc_by_radius(reading, self.here, end, self.scope)
        return _arc_along(self.here, self._tangent(line), end, line.span)

    def _mirror(self, line: tree.Line) -> None:
        assert self.start is not None
        axis = "x" if word(line.head, "axis") == "x" else "y"
        image = plane.mirrored(self.stretches, self.start, "x" if axis == "x" else "y")
        x, y = self.here
        turned = (0.0 - x, y) if axis == "x" else (x, 0.0 - y)
        corners, spans = self.corners[::-1], self.spans[::-1]
        if turned == self.here:
            corners, spans = corners[1:], spans[1:]
        else:
            self.stretches.append(LineTo(turned))
        self.stretches += image
        self.corners += corners
        self.spans += spans
        self.finished = line

    def _ring(self, line: tree.Line) -> None:
        assert self.start is not None
        number = count(expression(line.head, "count"), self.scope, least=2, most=limits.COPIES)
        once, corners, spans = tuple(self.stretches), tuple(self.corners), tuple(self.spans)
        if len(once) * number > limits.COPIES:
            sentence = f"this ring has more than {limits.COPIES:,} stretches, the limit"
            raise mistake("too-much", line.span, sentence)
        if not once:
            raise mistake(
                "open-outline", line.span, "there is no stretch yet to repeat", "write stretches above `ring`"
            )
        self.scope.budget.copy(number, line.span)
        # One copy ends where the next begins, but for rounding.
        joins = math.dist(self.here, plane.turn_point(self.start, 360.0 / number)) <= 1e-9 * math.hypot(*self.here)
        for k in range(1, number):
            begin = plane.turn_point(self.start, 360.0 * k / number)
            more = plane.turned(once, 360.0 * k / number)
            if joins:
                self.corners[-1] = self.corners[-1] or corners[0]
                self.corners += corners[1:]
                self.spans += spans[1:]
            else:
                self.stretches.append(LineTo(begin))
                self.corners += corners
                self.spans += spans
            self.stretches += more
        if joins:
            self.stretches[-1] = plane.ending_at(self.stretches[-1], self.start)
        self.finished = line


def _corner(reading: tree.Reading, scope: Scope) -> Corner:
    if reading.word == "rounded":
        return Corner("rounded", positive_length(expression(reading, "radius"), scope, "radius"))
    return Corner("chamfered", positive_length(expression(reading, "by"), scope, "chamfer"))


def _points(reading: tree.Reading, scope: Scope) -> list[Point2]:
    listed = reading.get("points")
    assert isinstance(listed, tuple)
    return [point2(each, scope) for each in listed if not isinstance(each, (tree.Setting, tree.Parameter, tree.Name))]


def _spline(start: Point2, points: list[Point2], tangent: Point2 | None, line: tree.Line) -> SplineTo:
    if not points:
        raise mistake("no-length", line.span, "a curve needs a point to go to")
    for one, other in zip([start, *points], points, strict=False):
        if one == other:
            where = f"({one[0]:.6g} mm, {one[1]:.6g} mm)"
            raise mistake("no-length", line.span, f"two points of the curve that follow each other are one: {where}")
    return SplineTo(tuple(points), tangent)


def _table_points(reading: tree.Reading, around: Around) -> list[Point2]:
    return [(x, y) for x, y in points_in(around.table(reading), ("x", "y"))]


def _parallel(line: tree.Line, scope: Scope, around: Around) -> Outline:
    reading = line.head
    written = expression(reading, "outline")
    assert isinstance(written, (tree.Path, tree.Call))
    base = around.outline(written, scope)
    distance = positive_length(expression(reading, "distance"), scope, "distance")
    try:
        return plane.parallel(base, distance if word(reading, "side") == "inward" else -distance)
    except PlaneFlaw as flaw:
        raise mistake(
            flaw.code, line.span, flaw.sentence, "a smaller distance, or wider places in the outline"
        ) from None


def _circle(reading: tree.Reading, scope: Scope) -> Loop:
    radius = positive_length(expression(reading, "diameter"), scope, "diameter") / 2
    x, y = _centre(reading, scope)
    start = (x + radius, y)
    return Loop(start, (ArcTo(start, (x, y), True),))


def _centre(reading: tree.Reading, scope: Scope) -> Point2:
    written = optional(reading, "centre")
    return point2(written, scope) if written is not None else (0.0, 0.0)


def _ellipse(reading: tree.Reading, scope: Scope) -> Loop:
    written = expression(reading, "axes")
    a, b = point2(written, scope)
    if min(a, b) < limits.SMALLEST_MM:
        raise mistake("out-of-range", written.span, f"axes: expected more than 0, found {min(a, b):g} mm")
    x, y = _centre(reading, scope)
    if a == b:
        start = (x + a / 2, y)
        return Loop(start, (ArcTo(start, (x, y), True),))
    angle = optional(reading, "turn")
    turn = quantity(angle, scope, ANGLE) if angle is not None else 0.0
    dx, dy = plane.turn_point((a / 2, 0.0), turn)
    start = (x + dx, y + dy)
    return Loop(start, (EllipseTo(start, (x, y), (a / 2, b / 2), turn, True),))


def _arc_by_radius(reading: tree.Reading, start: Point2, end: Point2, scope: Scope) -> ArcTo:
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


def _arc_along(start: Point2, tangent: Point2, end: Point2, span: Span) -> ArcTo:
    """The arc that leaves `start` along a unit tangent: its centre lies on the normal, as far from both ends."""
    x, y = end[0] - start[0], end[1] - start[1]
    across = tangent[0] * y - tangent[1] * x
    if abs(across) <= 1e-12 * math.hypot(x, y):
        raise mistake("no-arc", span, "the end lies straight along the way, so no arc reaches it", "write `to`")
    radius = (x * x + y * y) / (2.0 * across)
    return ArcTo(end, (start[0] - radius * tangent[1], start[1] + radius * tangent[0]), across > 0.0)

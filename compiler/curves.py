"""Paths: the lines of a `path` to a curve in space, its mistakes at the line that makes them."""

from __future__ import annotations

from collections.abc import Callable

from msgspec import Struct, field
from platewright.lang import tree
from platewright.lang.source import Span
from platewright.lang.units import NUMBER

from . import limits
from .expressions import quantity
from .mistakes import mistake
from .placement import point, positive_length
from .readings import expression, optional, word
from .scope import Scope
from .solids.recipe import Helix, Point3, SpaceArcTo, SpaceLineTo, SpacePath, SpaceSplineTo
from .solids.spine import PathFlaw, trace
from .tables import Table, points_in

TableOf = Callable[[tree.Reading], Table]


def read_path(line: tree.Line, scope: Scope, table_of: TableOf) -> SpacePath:
    """The curve that a `path` declaration describes. Raises Mistake, also for bends that do not fit and corners."""
    way = _Way(scope, table_of)
    for below in line.lines:
        if below.word != "derived":
            way.take(below)
    if way.start is None or not way.stretches:
        hint = "begin with `from (0, 0, 0)` and go on with `to`, or write a `helix`"
        raise mistake("open-path", line.span, "this path leads nowhere", hint)
    path = SpacePath(way.start, tuple(way.stretches))
    flaw = flaw_of(path)
    if flaw is not None:
        raise mistake(flaw.code, way.spans[flaw.stretch], flaw.sentence, flaw.hint)
    return path


def flaw_of(path: SpacePath) -> PathFlaw | None:
    """The first mistake of a path."""
    found = trace(path)
    return found if isinstance(found, PathFlaw) else None


def points_of(reading: tree.Reading, scope: Scope) -> list[Point3]:
    """The points that a reading lists. Raises Mistake."""
    listed = reading.get("points")
    assert isinstance(listed, tuple)
    return [point(each, scope) for each in listed if not isinstance(each, (tree.Setting, tree.Parameter, tree.Name))]


class _Way(Struct):
    """A path while its lines are read; `spans` are the lines of its stretches."""

    scope: Scope
    table_of: TableOf
    start: Point3 | None = None
    stretches: list[SpaceLineTo | SpaceArcTo | SpaceSplineTo | Helix] = field(default_factory=list)
    spans: list[Span] = field(default_factory=list)

    def take(self, line: tree.Line) -> None:
        """Read one more line. Raises Mistake."""
        if any(isinstance(each, Helix) for each in self.stretches):
            raise mistake("open-path", line.span, "a helix is a whole path; nothing can follow it")
        if line.word == "helix":
            self._helix(line)
        elif line.word == "from":
            if self.start is not None:
                raise mistake("open-path", line.head.word_span, "`from` begins a path and this one has begun")
            self.start = point(expression(line.head, "point"), self.scope)
        else:
            self._stretches(line)

    def _helix(self, line: tree.Line) -> None:
        if self.start is not None:
            raise mistake("open-path", line.span, "a helix is a whole path; nothing can stand before it")
        helix = read_helix(line.head, self.scope)
        self.start = (helix.diameter / 2, 0.0, 0.0)
        self._add(line, helix)

    def _stretches(self, line: tree.Line) -> None:
        reading = line.head
        over: list[Point3] = []
        if reading.get("table") is not None:
            over = [(x, y, z) for x, y, z in points_in(self.table_of(reading), ("x", "y", "z"))]
        if self.start is None and not over:
            hint = "write `from (0, 0, 0)` above it"
            raise mistake("open-path", reading.word_span, f"expected `from` first, found `{line.word}`", hint)
        if self.start is None:
            self.start, over = over[0], over[1:]
        match line.word:
            case "to":
                bend = optional(reading, "radius")
                radius = positive_length(bend, self.scope, "bend") if bend is not None else 0.0
                self._add(line, SpaceLineTo(point(expression(reading, "point"), self.scope), radius))
            case "round to":
                through = point(expression(reading, "through"), self.scope)
                self._add(line, SpaceArcTo(through, point(expression(reading, "point"), self.scope)))
            case "curve through":
                self._add(line, SpaceSplineTo(tuple(points_of(reading, self.scope))))
            case "curve over":
                if over:
                    self._add(line, SpaceSplineTo(tuple(over)))
            case "points over":
                for each in over:
                    self._add(line, SpaceLineTo(each))

    def _add(self, line: tree.Line, stretch: SpaceLineTo | SpaceArcTo | SpaceSplineTo | Helix) -> None:
        self.stretches.append(stretch)
        self.spans.append(line.span)


def read_helix(reading: tree.Reading, scope: Scope) -> Helix:
    """The helix that a reading describes. Raises Mistake."""
    diameter = positive_length(expression(reading, "diameter"), scope, "diameter")
    pitch = positive_length(expression(reading, "pitch"), scope, "pitch")
    return Helix(diameter, pitch, turns_of(reading, scope), word(reading, "hand") == "left")


def turns_of(reading: tree.Reading, scope: Scope) -> float:
    """A number of turns, above 0 and within the limit. Raises Mistake."""
    written = expression(reading, "turns")
    turns = quantity(written, scope, NUMBER, "turns")
    if turns <= 0:
        raise mistake("out-of-range", written.span, f"turns: expected more than 0, found {turns:g}")
    if turns > limits.TURNS:
        raise mistake("too-much", written.span, f"turns: {turns:g} are more than {limits.TURNS:,}, the limit")
    return turns

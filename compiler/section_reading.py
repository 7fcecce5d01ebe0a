"""What a figure says of sections: the lines that cut its subject, and what stays whole."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

from platewright.lang import tree
from platewright.lang.problems import Related
from platewright.lang.units import LENGTH, NUMBER

from .expressions import evaluate, quantity
from .extent import box_corners
from .graph import Point, Thing
from .interruptions import Interruption
from .mistakes import Problems, mistake
from .placement import direction, positive_length
from .pointing import direction_in, holder_of, point_in
from .readings import expression, listed, optional
from .scope import Scope
from .sections import Cut, Plane, Shown
from .selection import parts_named
from .solids.transform import dot
from .specs import Detail
from .values import Quantity, Vector, kind_of

ALONE: dict[str, Shown] = {"removed section across": "removed", "revolved section across": "revolved"}
"""Rows of sections of which the cut face is drawn alone."""

ROWS = ("section across", "half section across", "stepped section along", "local section across", *ALONE)
"""Rows of the vocabulary that each make one cut."""

_ORIGIN = (0.0, 0.0, 0.0)

MOST_ENLARGED = 1000.0
"""The limit on how many times a detail is enlarged."""

DETAIL_SHARE = 0.15
"""Diameter of what a detail shows, over the subject's largest side, where none is stated."""


def read_cuts(lines: Sequence[tree.Line], subject: Thing, scope: Scope, problems: Problems) -> tuple[Cut, ...]:
    """The cuts among a figure's lines, in their order, but revolved ones, which have no letter, last.

    Paths begin in the subject.
    """
    found: list[Cut] = []
    for line in lines:
        if line.head.row in ROWS:
            with problems.collecting():
                found.append(_Reader(line.head, subject, scope).cut())
    return tuple(sorted(found, key=lambda cut: cut.shown == "revolved"))


def read_details(
    lines: Sequence[tree.Line], subject: Thing, name: str, scope: Scope, problems: Problems
) -> tuple[Detail, ...]:
    """The details among a figure's lines, in their order. Paths begin in the subject."""
    found: list[Detail] = []
    for line in lines:
        if line.head.row == "detail of":
            with problems.collecting():
                found.append(_Reader(line.head, subject, scope).detail(name))
    return tuple(found)


def read_interruptions(
    lines: Sequence[tree.Line], subject: Thing, scope: Scope, problems: Problems
) -> tuple[Interruption, ...]:
    """The stretches that a figure leaves out, in the order of its lines."""
    found: list[Interruption] = []
    for line in lines:
        if line.head.row == "interrupted along":
            with problems.collecting():
                each = _Reader(line.head, subject, scope).interruption()
                for other in found:
                    parallel = abs(dot(other.axis, each.axis)) > 1 - 1e-9
                    if not parallel or (each.low < other.high and other.low < each.high) or other.axis != each.axis:
                        sentence = "the stretches that a figure leaves out lie apart along one axis"
                        raise mistake("wrong-form", each.span, sentence, "", (Related(other.span, "another one"),))
                found.append(each)
    return tuple(found)


def read_uncut(
    lines: Sequence[tree.Line], subject: Thing, path: str, scope: Scope, problems: Problems
) -> tuple[str, ...]:
    """The paths of what a figure's sections leave whole."""
    found: list[str] = []
    for line in lines:
        if line.head.row == "uncut":
            for written in listed(line.head, "parts"):
                with problems.collecting():
                    found += parts_named(written, subject, path, scope)
    return tuple(dict.fromkeys(found))


class _Reader:
    """Reads one line that cuts."""

    def __init__(self, head: tree.Reading, subject: Thing, scope: Scope) -> None:
        self.head, self.subject, self.scope = head, subject, scope

    def cut(self) -> Cut:
        head = self.head
        keeping = optional(head, "keeping")
        kept = direction(keeping, self.scope) if keeping is not None else None
        match head.row:
            case "stepped section along":
                axis = self._direction("axis")
                return Cut("stepped", Plane(axis, _ORIGIN), head.span, None, self._corners(axis), 0.0, kept)
            case "half section across":
                side = self._direction("side")
                beside = Plane(side, self._place("past", side))
                return Cut("half", self._plane(), head.span, beside, (), 0.0, kept)
            case "local section across":
                return self._local(kept)
            case _:
                return Cut("full", self._plane(), head.span, None, (), 0.0, kept, ALONE.get(head.row, "in view"))

    def detail(self, name: str) -> Detail:
        head = self.head
        centre = self._point(expression(head, "mark"))
        written = expression(head, "times")
        times = quantity(written, self.scope, NUMBER)
        if not 1.0 < times <= MOST_ENLARGED:
            sentence = f"expected an enlargement above 1, to {MOST_ENLARGED:g}, found {times:g}"
            raise mistake("out-of-range", written.span, sentence)
        across = optional(head, "diameter")
        if across is not None:
            diameter = positive_length(across, self.scope, "diameter")
        else:
            corners, _ = box_corners(self.subject, name)
            diameter = float((corners.max(axis=0) - corners.min(axis=0)).max()) * DETAIL_SHARE
        holder = holder_of(expression(head, "mark"), self.subject, self.scope)
        return Detail(centre, diameter, times, head.span, holder)

    def interruption(self) -> Interruption:
        axis = self._direction("axis")
        low, high = (dot(self._place(slot, axis), axis) for slot in ("low", "high"))
        if high - low < 1e-6:
            raise mistake("out-of-range", self.head.span, "the stretch left out ends before it begins")
        return Interruption(axis, low, high, self.head.span)

    def _plane(self) -> Plane:
        normal = self._direction("plane")
        return Plane(normal, self._place("at", normal))

    def _local(self, kept: Point | None) -> Cut:
        plane = self._plane()
        middle = self._point(expression(self.head, "mark"))
        n = plane.normal
        off = sum((a - b) * c for a, b, c in zip(middle, plane.through, n, strict=True))
        on_plane = (middle[0] - off * n[0], middle[1] - off * n[1], middle[2] - off * n[2])
        diameter = positive_length(expression(self.head, "diameter"), self.scope, "diameter")
        return Cut("local", Plane(n, on_plane), self.head.span, None, (), diameter, kept)

    def _direction(self, slot: str) -> Point:
        return direction_in(expression(self.head, slot), self.subject, self.scope)

    def _place(self, slot: str, along: Point) -> Point:
        """A point of the plane: a mark's, or a length along its normal from the origin."""
        written = optional(self.head, slot)
        if written is None:
            return _ORIGIN
        if isinstance(written, tree.Path) and self.scope.find(written.steps[0].name) is None:
            return self._point(written)
        value = evaluate(written, self.scope)
        if isinstance(value, Vector) and len(value.components) == 3 and value.dimension == LENGTH:
            return self._point(written)
        if not isinstance(value, Quantity) or (value.dimension != LENGTH and value.value != 0):
            hint = "a length such as `12 mm`, or a mark"
            raise mistake("wrong-kind", written.span, f"expected where the plane lies, found {kind_of(value)}", hint)
        return (along[0] * value.value, along[1] * value.value, along[2] * value.value)

    def _point(self, written: tree.Expression) -> Point:
        return point_in(written, self.subject, self.scope)

    def _corners(self, axis: Point) -> tuple[Point, ...]:
        points = tuple(self._point(each) for each in listed(self.head, "corners"))
        if len(points) < 2:
            raise mistake("missing-value", self.head.span, "a stepped section runs through two points at least")
        for one, other in pairwise(points):
            apart = tuple(b - a for a, b in zip(one, other, strict=True))
            along = sum(a * b for a, b in zip(apart, axis, strict=True))
            if sum((a - along * b) ** 2 for a, b in zip(apart, axis, strict=True)) < 1e-12:
                raise mistake("wrong-form", self.head.span, "two points of this section lie behind each other")
        return points

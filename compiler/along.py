"""Shapes that run along a path or between outlines: from their words to primitives, and where they begin and end."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from platewright.lang import tree
from platewright.lang.units import ANGLE

from .curves import flaw_of, points_of, turns_of
from .expressions import count, quantity
from .mistakes import mistake
from .modules import Module
from .placement import positive_length
from .readings import expression, optional, word
from .scope import Scope
from .solids.recipe import (
    Bellows,
    Outline,
    Point3,
    Primitive,
    Recipe,
    SpaceLineTo,
    SpacePath,
    Spring,
    Sweep,
    Transition,
    Tube,
)
from .solids.spine import Trace, position, reach_of, tangent, trace

if TYPE_CHECKING:
    from .instances import Instances

WORDS = frozenset({"sweep", "tube along", "tube through", "spring", "bellows", "transition"})
"""Rows of the vocabulary that `read_along` reads."""

_CONVOLUTIONS = 2_000


def read_along(reading: tree.Reading, scope: Scope, things: Instances, module: Module) -> Primitive:
    """The primitive that the words of one of `WORDS` describe. Raises Mistake."""

    def size(slot: str) -> float:
        return positive_length(expression(reading, slot), scope, slot)

    match reading.row:
        case "sweep":
            angle = optional(reading, "twist")
            twist = quantity(angle, scope, ANGLE, "twist") if angle is not None else 0.0
            return Sweep(
                _outline(reading, "outline", scope, things, module), _path(reading, scope, things, module), twist
            )
        case "tube along":
            return _tube(reading, _path(reading, scope, things, module), scope)
        case "tube through":
            return _tube(reading, _path_through(reading, scope), scope)
        case "spring":
            return _spring(reading, scope)
        case "bellows":
            folds = count(expression(reading, "convolutions"), scope, least=1, most=_CONVOLUTIONS)
            bore = _smaller(reading, "bore", "diameter", scope)
            return Bellows(size("diameter"), bore, folds, size("length"), size("wall"))
        case "transition":
            lower, upper = (_outline(reading, slot, scope, things, module) for slot in ("base", "top"))
            return Transition(lower, upper, size("length"))
    raise AssertionError(f"no shape {reading.row}")


def ends_of(shape: Primitive | Recipe) -> tuple[Point3, Point3, Point3] | None:
    """Where a body along a path starts, the direction in which it leaves, and where it ends; None for other shapes."""
    found = trace(shape.path) if isinstance(shape, Sweep | Tube) else None
    if not isinstance(found, Trace):
        return None
    first, last = found.stretches[0], found.stretches[-1]
    start, zero = position(first, np.zeros(1))[0], np.zeros(1)
    return _point(start), _point(tangent(first, zero)[0]), _point(position(last, np.array([reach_of(last)]))[0])


def _point(array: np.ndarray) -> Point3:
    x, y, z = array.tolist()
    return (x + 0.0, y + 0.0, z + 0.0)


def _outline(reading: tree.Reading, slot: str, scope: Scope, things: Instances, module: Module) -> Outline:
    written = expression(reading, slot)
    assert isinstance(written, (tree.Path, tree.Call))
    return things.outline(module, written, scope)


def _path(reading: tree.Reading, scope: Scope, things: Instances, module: Module) -> SpacePath:
    written = expression(reading, "path")
    assert isinstance(written, (tree.Path, tree.Call))
    return things.path(module, written, scope)


def _path_through(reading: tree.Reading, scope: Scope) -> SpacePath:
    """Straight stretches through the points listed, with one bend radius at those between."""
    points = points_of(reading, scope)
    listed = reading.get("points")
    assert isinstance(listed, tuple)
    if len(points) < 2:
        raise mistake("open-path", reading.span, "a tube leads through two points or more")
    written = optional(reading, "radius")
    bend = positive_length(written, scope, "bend") if written is not None else 0.0
    closes = points[0] == points[-1]
    inner = [SpaceLineTo(each, bend) for each in points[1:-1]]
    path = SpacePath(points[0], (*inner, SpaceLineTo(points[-1], bend if closes else 0.0)))
    flaw = flaw_of(path)
    if flaw is not None:
        at = listed[flaw.stretch + 1]
        span = reading.span if isinstance(at, (tree.Setting, tree.Parameter, tree.Name)) else at.span
        raise mistake(flaw.code, span, flaw.sentence, flaw.hint)
    return path


def _tube(reading: tree.Reading, path: SpacePath, scope: Scope) -> Tube:
    diameter = positive_length(expression(reading, "diameter"), scope, "diameter")
    bore = _smaller(reading, "bore", "diameter", scope) if optional(reading, "bore") is not None else 0.0
    return Tube(path, diameter, bore)


def _spring(reading: tree.Reading, scope: Scope) -> Spring:
    diameter = positive_length(expression(reading, "diameter"), scope, "diameter")
    wire, length = _smaller(reading, "wire", "diameter", scope), _longer(reading, scope)
    return Spring(diameter, wire, turns_of(reading, scope), length, word(reading, "hand") == "left")


def _longer(reading: tree.Reading, scope: Scope) -> float:
    written = expression(reading, "length")
    length = positive_length(written, scope, "length")
    wire = positive_length(expression(reading, "wire"), scope, "wire")
    if length <= wire:
        sentence = f"length: expected more than the wire's {wire:g} mm, found {length:g} mm"
        raise mistake("out-of-range", written.span, sentence)
    return length


def _smaller(reading: tree.Reading, slot: str, than: str, scope: Scope) -> float:
    """A length smaller than another one of the same shape. Raises Mistake."""
    written = expression(reading, slot)
    value = positive_length(written, scope, slot)
    most = positive_length(expression(reading, than), scope, than)
    if value >= most:
        sentence = f"{slot}: expected less than the {than} {most:g} mm, found {value:g} mm"
        raise mistake("out-of-range", written.span, sentence)
    return value

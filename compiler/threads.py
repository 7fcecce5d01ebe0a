"""Screw threads by designation: `M20`, or `M20x1.5` for another pitch, in the ISO metric system."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from types import MappingProxyType

from msgspec.structs import replace
from platewright.lang import tree

from .expressions import text
from .graph import Assembly, Solid, Thing, Thread
from .mistakes import mistake
from .readings import expression, word
from .scope import Scope
from .solids import recipe
from .solids.recipe import Affine, Recipe
from .solids.thread import DEPTH, minor_diameter
from .solids.transform import IDENTITY, compose, determinant

COARSE: Mapping[str, float] = MappingProxyType(
    {
        "M1.6": 0.35,
        "M1.8": 0.35,
        "M2": 0.4,
        "M2.2": 0.45,
        "M2.5": 0.45,
        "M3": 0.5,
        "M3.5": 0.6,
        "M4": 0.7,
        "M5": 0.8,
        "M6": 1.0,
        "M7": 1.0,
        "M8": 1.25,
        "M10": 1.5,
        "M12": 1.75,
        "M14": 2.0,
        "M16": 2.0,
        "M18": 2.5,
        "M20": 2.5,
        "M22": 2.5,
        "M24": 3.0,
        "M27": 3.0,
        "M30": 3.5,
        "M33": 3.5,
        "M36": 4.0,
        "M39": 4.0,
        "M42": 4.5,
        "M45": 4.5,
        "M48": 5.0,
        "M52": 5.0,
        "M56": 5.5,
        "M60": 5.5,
        "M64": 6.0,
    }
)
"""Pitches in mm of the coarse series, ISO 261 table 2 (first and second choice) and ISO 262; from memory."""

_DESIGNATION = re.compile(r"M(\d{1,4}(?:\.\d{1,3})?)(?:x(\d{1,3}(?:\.\d{1,3})?))?")


def is_designation(written: object) -> bool:
    """Whether a value is a plain name of the form of a designation, such as `M20`."""
    if not isinstance(written, tree.Path) or len(written.steps) != 1:
        return False
    return written.steps[0].index is None and _DESIGNATION.fullmatch(written.steps[0].name) is not None


def read_thread(reading: tree.Reading, scope: Scope, length: float, is_internal: bool) -> recipe.Thread:
    """The thread that a `thread` reading describes. Raises Mistake."""
    written = expression(reading, "designation")
    plain_name = isinstance(written, tree.Path) and is_designation(written) and scope.find(written.dotted) is None
    named = written.dotted if plain_name and isinstance(written, tree.Path) else text(written, scope)
    major, pitch = _sizes(named, written)
    is_left, is_real = word(reading, "hand") == "left", word(reading, "form") == "real"
    return recipe.Thread(major, pitch, length, is_left, is_internal, is_real)


def _sizes(named: str, written: tree.Expression) -> tuple[float, float]:
    """Major diameter and pitch in mm. Raises Mistake."""
    found = _DESIGNATION.fullmatch(named)
    if found is None:
        sentence = f"`{named}` is no designation of a metric thread"
        raise mistake("out-of-range", written.span, sentence, 'write `M20`, or with its pitch `"M20x1.5"`')
    if found[2] is None and named not in COARSE:
        sentence = f"`{named}` is not in the coarse series of ISO 261"
        raise mistake("out-of-range", written.span, sentence, f'state the pitch: `"{named}x1"`')
    major, pitch = float(found[1]), float(found[2]) if found[2] else COARSE[named]
    if not 0.0 < 2.0 * DEPTH * pitch < 0.9 * major:
        sentence = f"a pitch of {pitch:g} mm does not fit a diameter of {major:g} mm"
        raise mistake("out-of-range", written.span, sentence)
    return major, pitch


def threads_of(made: Recipe) -> tuple[Thread, ...]:
    """Every thread of a part that is drawn by convention, in the part's frame, in the order of its lines."""
    return tuple(_threads(made, IDENTITY))


def _threads(made: Recipe, outer: Affine) -> Iterator[Thread]:
    for step in made.steps:
        for placed in step.placed:
            if not _has_threads(placed.shape):
                continue
            for placement in placed.placements:
                whole = compose(outer, placement)
                if isinstance(placed.shape, Recipe):
                    yield from _threads(placed.shape, whole)
                elif isinstance(placed.shape, recipe.Thread):
                    yield _placed(placed.shape, whole, -placed.shape.length / 2 if placed.centred else 0.0)


def by_convention(thing: Thing) -> Thing:
    """A thing whose real threads, and those of all below it, are drawn by convention (ISO 6410-1); itself if none are.

    Copies that shared a thing share it still. Cost: one walk over the things, not over their copies.
    """
    return _Conventional().of(thing)


class _Conventional:
    """Remembers what has become of each thing and each recipe."""

    def __init__(self) -> None:
        self.things: dict[int, Thing] = {}
        self.recipes: dict[int, Recipe] = {}

    def of(self, thing: Thing) -> Thing:
        if id(thing) not in self.things:
            self.things[id(thing)] = self._solid(thing) if isinstance(thing, Solid) else self._assembly(thing)
        return self.things[id(thing)]

    def _solid(self, solid: Solid) -> Solid:
        made = self._recipe(solid.recipe)
        return solid if made is solid.recipe else replace(solid, recipe=made, threads=threads_of(made))

    def _assembly(self, assembly: Assembly) -> Assembly:
        occurrences = tuple(
            replace(each, copies=tuple(replace(copy, thing=self.of(copy.thing)) for copy in each.copies))
            for each in assembly.occurrences
        )
        before = [copy.thing for each in assembly.occurrences for copy in each.copies]
        after = [copy.thing for each in occurrences for copy in each.copies]
        is_same = all(one is other for one, other in zip(before, after, strict=True))
        return assembly if is_same else replace(assembly, occurrences=occurrences)

    def _recipe(self, made: Recipe) -> Recipe:
        if id(made) not in self.recipes:
            self.recipes[id(made)] = self._made(made)
        return self.recipes[id(made)]

    def _made(self, made: Recipe) -> Recipe:
        steps = tuple(replace(step, placed=tuple(map(self._placed, step.placed))) for step in made.steps)
        pairs = (
            (a, b)
            for old, new in zip(made.steps, steps, strict=True)
            for a, b in zip(old.placed, new.placed, strict=True)
        )
        return made if all(a is b for a, b in pairs) else replace(made, steps=steps)

    def _placed(self, placed: recipe.Placed) -> recipe.Placed:
        if isinstance(placed.shape, Recipe):
            return replace(placed, shape=self._recipe(placed.shape))
        if isinstance(placed.shape, recipe.Thread) and placed.shape.real:
            return replace(placed, shape=replace(placed.shape, real=False))
        return placed


def _has_threads(shape: recipe.Primitive | Recipe) -> bool:
    if isinstance(shape, Recipe):
        return any(_has_threads(placed.shape) for step in shape.steps for placed in step.placed)
    return isinstance(shape, recipe.Thread) and not shape.real


def _placed(shape: recipe.Thread, place: Affine, low: float) -> Thread:
    scale = abs(determinant(place)) ** (1 / 3)
    x, y, z = (row[2] * low + row[3] for row in place)
    i, j, k = (row[2] / scale for row in place)
    return Thread(
        (x, y, z),
        (i, j, k),
        shape.length * scale,
        shape.major * scale,
        minor_diameter(shape) * scale,
        shape.pitch * scale,
        shape.internal,
        shape.left != (determinant(place) < 0.0),
    )

"""Parts: from the lines of a `part` to the recipe of one solid, with its material, marks and features."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from itertools import groupby
from typing import TYPE_CHECKING, Literal

from platewright.lang import tree
from platewright.lang.problems import Related

from . import limits
from .along import WORDS, ends_of, read_along
from .coincidence import coincide, shared_lines, symmetry
from .graph import Feature, FeatureCopy, Solid, Uncut
from .lettering import read_lettering
from .marks import OwnNames, axes_of, read_marks
from .materials import PLAIN
from .mistakes import Mistake, mistake
from .modules import Declaration, Module, find_kind
from .placement import Marks, direction
from .readings import LATER, expression, name, optional
from .scope import Scope
from .shapes import OUTLINED, diameter, height, read_shape, with_edges
from .sheets import SHEETS, read_sheet
from .solids.recipe import Affine, Edged, Envelope, Placed, Primitive, Recipe, Revolve, Step
from .solids.transform import IDENTITY, compose, determinant
from .threads import threads_of
from .turns import labels, placements, turns

if TYPE_CHECKING:
    from .instances import Instances

Point = tuple[float, float, float]


def make_part(things: Instances, module: Module, declaration: Declaration, scope: Scope) -> Solid:
    """The solid that a part's lines describe; what is wrong in them goes to the problems of `things`."""
    return _Part(things, module, declaration, scope).solid()


@dataclass(slots=True)
class _Part:
    """A part while its lines are read."""

    things: Instances
    module: Module
    declaration: Declaration
    scope: Scope
    names: OwnNames = field(init=False)
    steps: list[Step] = field(default_factory=list)
    features: list[Feature] = field(default_factory=list)
    axes: Marks = field(default_factory=dict)
    n_shapes: int = 0
    n_levels: int = 1

    def __post_init__(self) -> None:
        self.names = OwnNames(self.things.problems)

    def solid(self) -> Solid:
        lines, problems = self.declaration.line.lines, self.things.problems
        marks = read_marks(lines, self.scope, self.names, problems)
        self.axes = axes_of(marks)
        before = problems.n_mistakes
        for line in lines:
            if line.word in ("add", "cut", "keep"):
                with problems.collecting():
                    self._step(line)
        if problems.n_mistakes == before and not self.declaration.is_faulty:
            self._begins_with_add()
        self._shared()
        surface = PLAIN
        for line in lines:
            if line.word == "made of":
                with problems.collecting():
                    path = expression(line.head, "material")
                    assert isinstance(path, tree.Path)
                    material = find_kind(self.things.modules, self.module, path, ("material",))
                    surface = self.things.surface(*material)
        uncut: Uncut | None = None
        for line in lines:
            if line.head.row == "part uncut":
                with problems.collecting():
                    axis = optional(line.head, "axis")
                    uncut = Uncut(direction(axis, self.scope) if axis is not None else None)
        recipe, span = Recipe(tuple(self.steps)), self.declaration.span
        features = tuple(self.features)
        size = (self.n_shapes, self.n_levels)
        return Solid(self.declaration.name, recipe, surface, marks, features, span, *size, threads_of(recipe), uncut)

    def _begins_with_add(self) -> None:
        declaration, problems = self.declaration, self.things.problems
        if not self.steps:
            hint = "begin with an `add` line, such as `add block (10 mm, 10 mm, 10 mm)`"
            problems.error("empty-part", declaration.span, f"the part `{declaration.name}` adds nothing", hint)
        elif self.steps[0].operation != "add":
            span = self.things.sources[self.steps[0].placed[0].source]
            sentence = f"there is nothing to {self.steps[0].operation} yet: a part begins with `add`"
            problems.error("empty-part", span, sentence, "move an `add` line before it")

    def _shared(self) -> None:
        """Warn of shapes that two lines put in one place, where nothing between them does otherwise."""
        for _, run in groupby(self.steps, lambda step: step.operation):
            placed: dict[object, tuple[Primitive | Recipe, list[tuple[int, Affine]]]] = {}
            for each in (each for step in run for each in step.placed):
                key = (id(each.shape) if isinstance(each.shape, Recipe) else each.shape, each.centred)
                found = placed.setdefault(key, (each.shape, []))[1]
                found.extend((each.source, place) for place in each.placements)
            for shape, places in placed.values():
                for earlier, later in shared_lines(places, symmetry(shape)):
                    related = (Related(self.things.sources[earlier], "it stands there already"),)
                    sentence = "this puts a shape where the same one stands already"
                    at, hint = self.things.sources[later], "leave one of the two out"
                    self.things.problems.warn("coincident-copies", at, sentence, hint, related)

    def _step(self, line: tree.Line) -> None:
        """Read one line of the process sheet and what it names."""
        operation: Literal["add", "cut", "keep"] = "add"
        if line.word == "cut" or line.word == "keep":
            operation = "cut" if line.word == "cut" else "keep"
        placed: list[Placed] = []
        copies: list[FeatureCopy] = []
        for turn in turns(line, self.scope, self.things.tables, self.module.file):
            for each in self._placed(line, turn.scope):
                placed.append(each)
                named = labels(line, turn.label, len(each.placements), len(copies))
                copies.extend(_feature_copies(each, named))
        if placed:
            self.steps.append(Step(operation, tuple(placed)))
        for clause in line.clauses:
            if clause.word == "as":
                own = name(clause)
                self.names.take(own.text, own.span)
                self.features.append(Feature(own.text, tuple(copies), own.span))

    def _placed(self, line: tree.Line, scope: Scope) -> Iterator[Placed]:
        """The shapes of one line, or of the lines indented under it, placed and repeated."""
        reading = line.head.get("shape")
        if isinstance(reading, tree.Reading) and reading.row == "envelope of":
            yield self._envelope(line, reading, scope)
            return
        if isinstance(reading, tree.Reading):
            yield self._shape(line, reading, scope, (IDENTITY,), line.word == "cut")
            return
        outer = placements(line, scope, self.axes, {})
        for below in line.lines:
            with self.things.problems.collecting():
                for turn in turns(below, scope, self.things.tables, self.module.file):
                    inner = below.head.get("shape")
                    assert isinstance(inner, tree.Reading)
                    yield self._shape(below, inner, turn.scope, outer, line.word == "cut")

    def _envelope(self, line: tree.Line, reading: tree.Reading, scope: Scope) -> Placed:
        """The convex solid round the shapes on the lines below, placed and repeated as its own line says."""
        inside: list[Placed] = []
        for below in line.lines:
            for turn in turns(below, scope, self.things.tables, self.module.file):
                inner = below.head.get("shape")
                assert isinstance(inner, tree.Reading)
                inside.append(self._shape(below, inner, turn.scope, (IDENTITY,), line.word == "cut"))
                if isinstance(inside[-1].shape, Recipe):
                    sentence = "an envelope goes round shapes, and this is a part"
                    raise mistake("wrong-form", inner.span, sentence, "write the shapes that the part is made of")
        if not inside:
            raise mistake("empty-part", reading.span, "this envelope goes round nothing", "give it shapes, a line each")
        with_edges(Envelope(()), line.clauses, scope)
        return Placed(Envelope(tuple(inside)), placements(line, scope, self.axes, {}), self.things.source(line.span))

    def _shape(
        self, line: tree.Line, reading: tree.Reading, scope: Scope, outer: tuple[Affine, ...], is_cut: bool
    ) -> Placed:
        if reading.row in LATER:
            raise Mistake(None)
        centred = any(clause.word == "centred" for clause in line.clauses)
        shape: Primitive | Recipe
        own: Marks = {}
        n_levels = 0
        if reading.word == "lettering":
            source = self.things.source(line.span)
            shape, n_shapes = read_lettering(reading, scope, self.things.lettering, source, centred)
            centred = False
        else:
            shape, own, n_shapes, n_levels = self._made(reading, scope, is_cut)
        shape = with_edges(shape, line.clauses, scope)
        self._sharp(shape, line)
        places = placements(line, scope, self.axes, own)
        self._count(len(outer) * len(places) * n_shapes, n_levels, line)
        if outer != (IDENTITY,):
            places = tuple([compose(a, b) for a in outer for b in places])
        if coincide(places, symmetry(shape)):
            raise mistake("coincident-copies", line.span, "two copies of this shape lie in one place")
        if centred and isinstance(shape, Recipe):
            clause = next(each for each in line.clauses if each.word == "centred")
            raise mistake("wrong-form", clause.span, "`centred` goes with shapes; a part stands where its lines put it")
        return Placed(shape, places, self.things.source(line.span), centred)

    def _sharp(self, shape: Primitive | Recipe, line: tree.Line) -> None:
        """Warn of edges that `rounded` and `chamfered` do not make."""
        if not isinstance(shape, Edged) or not isinstance(shape.shape, Revolve) or shape.shape.angle == 360.0:
            return
        clause = next(each for each in line.clauses if each.word == shape.kind)
        sentence = f"`{shape.kind}` leaves the edges round the two plane ends of a part of a turn sharp"
        hint = 'say `accept "sharp-ends"` where they may be, or cut the ends with a shape that has the edges wanted'
        self.things.problems.warn("sharp-ends", clause.span, sentence, hint)

    def _count(self, n_shapes: int, n_levels: int, line: tree.Line) -> None:
        self.n_shapes += n_shapes
        self.n_levels = max(self.n_levels, n_levels + 1)
        if self.n_shapes > limits.SHAPES:
            sentence = f"the part `{self.declaration.name}` is made of more than {limits.SHAPES:,} shapes, the limit"
            raise mistake("too-much", line.span, sentence)
        if self.n_levels > limits.NESTING:
            sentence = f"parts hold each other more than {limits.NESTING} deep, the limit"
            raise mistake("too-deep", line.span, sentence)

    def _made(self, reading: tree.Reading, scope: Scope, is_cut: bool) -> tuple[Primitive | Recipe, Marks, int, int]:
        """The primitive or part that a shape's words name, the axes of its marks, how many shapes and levels it is."""
        if reading.row == "solid":
            written = expression(reading, "part")
            assert isinstance(written, (tree.Path, tree.Call))
            path = written.path if isinstance(written, tree.Call) else written
            find_kind(self.things.modules, self.module, path, ("part",))
            self.things.note_placed(self.module, written)
            thing = self.things.resolve(self.module, written, scope)
            assert isinstance(thing, Solid)
            return thing.recipe, axes_of(thing.marks), thing.n_shapes, thing.n_levels
        if reading.row == "envelope of":
            hint = "write it behind `add`, `cut` or `keep`, its shapes on the lines below"
            raise mistake("wrong-form", reading.span, "an envelope cannot stand here", hint)
        if reading.word in SHEETS:
            return read_sheet(reading, scope, self.things.tables, self.module.file), {}, 1, 0
        if reading.row in WORDS:
            return read_along(reading, scope, self.things, self.module), {}, 1, 0
        outline = None
        if reading.word in OUTLINED:
            written = expression(reading, "outline")
            assert isinstance(written, (tree.Path, tree.Call))
            outline = self.things.outline(self.module, written, scope)
        return read_shape(reading, scope, outline, is_cut), {}, 1, 0


def _feature_copies(placed: Placed, named: list[str]) -> Iterator[FeatureCopy]:
    shape = placed.shape
    rise = 0.0 if isinstance(shape, Recipe) else height(shape)
    low = -rise / 2 if placed.centred else 0.0
    across = None if isinstance(shape, Recipe) else diameter(shape)
    ends = ends_of(shape)
    for label, placement in zip(named, placed.placements, strict=True):
        size = sum(row[2] * row[2] for row in placement) ** 0.5
        x, y, z = (row[2] / size for row in placement)
        scaled = across * abs(determinant(placement)) ** (1 / 3) if across is not None else None
        if ends is not None:
            start, end = (_placed_at(placement, each) for each in (ends[0], ends[2]))
            yield FeatureCopy(label, start, _placed_along(placement, ends[1]), end, scaled)
            continue
        yield FeatureCopy(label, _moved(placement, low + rise / 2), (x, y, z), _moved(placement, low + rise), scaled)


def _placed_at(placement: Affine, at: Point) -> Point:
    x, y, z = (row[0] * at[0] + row[1] * at[1] + row[2] * at[2] + row[3] for row in placement)
    return (x, y, z)


def _placed_along(placement: Affine, way: Point) -> Point:
    moved = [row[0] * way[0] + row[1] * way[1] + row[2] * way[2] for row in placement]
    size = sum(each * each for each in moved) ** 0.5
    x, y, z = (each / size for each in moved)
    return (x, y, z)


def _moved(placement: Affine, up: float) -> Point:
    x, y, z = (row[2] * up + row[3] for row in placement)
    return (x, y, z)

"""Assemblies: from the lines of an `assembly` to placed copies of parts and assemblies."""

from __future__ import annotations

from typing import TYPE_CHECKING

from msgspec import Struct, field
from platewright.lang import tree
from platewright.lang.problems import Related
from platewright.lang.units import LENGTH

from . import limits
from .coincidence import coincide, of_thing, shared_lines
from .expressions import evaluate
from .graph import Assembly, Copy, Occurrence, Thing, count_nodes
from .marks import OwnNames, axes_of, read_marks
from .mistakes import Problems, mistake
from .modules import Declaration, Module
from .placement import Marks, point
from .readings import expression, name
from .scope import Scope
from .solids.recipe import Affine
from .turns import labels, placements, turns
from .values import Quantity, Vector, kind_of

if TYPE_CHECKING:
    from .instances import Instances

Point = tuple[float, float, float]


def make_assembly(things: Instances, module: Module, declaration: Declaration, scope: Scope) -> Assembly:
    """What an assembly's lines place; what is wrong in them goes to the problems of `things`."""
    lines, problems = declaration.line.lines, things.problems
    names = OwnNames(problems)
    marks = read_marks(lines, scope, names, problems)
    axes = axes_of(marks)
    occurrences: list[Occurrence] = []
    n_nodes, n_levels = 1, 1
    for line in lines:
        if line.word == "place" and n_nodes <= limits.COPIES:
            with problems.collecting():
                occurrence = _Placing(things, module, line, axes).occurrence(scope)
                names.take(occurrence.name, occurrence.span)
                occurrences.append(occurrence)
                n_nodes += sum(count_nodes(copy.thing) for copy in occurrence.copies)
                n_levels = max([n_levels, *(copy.thing.n_levels + 1 for copy in occurrence.copies)])
                if n_levels > limits.NESTING:
                    sentence = f"things hold each other more than {limits.NESTING} deep, the limit"
                    raise mistake("too-deep", line.span, sentence)
                if n_nodes > limits.COPIES:
                    sentence = f"`{declaration.name}` holds more than {limits.COPIES:,} things, the limit"
                    raise mistake("too-much", line.span, sentence)
    _shared(occurrences, problems)
    if not any(line.word == "place" for line in lines) and not declaration.is_faulty:
        sentence = f"the assembly `{declaration.name}` places nothing"
        problems.error("empty-assembly", declaration.span, sentence, "give it a `place` line")
    return Assembly(declaration.name, tuple(occurrences), marks, declaration.span, n_nodes, n_levels)


def _shared(occurrences: list[Occurrence], problems: Problems) -> None:
    """Warn of lines that place the same thing in one place."""
    placed: dict[int, tuple[Thing, list[tuple[int, Affine]]]] = {}
    for row, occurrence in enumerate(occurrences):
        for copy in occurrence.copies:
            placed.setdefault(id(copy.thing), (copy.thing, []))[1].append((row, copy.placement))
    for thing, places in placed.values():
        for earlier, later in shared_lines(places, of_thing(thing)):
            related = (Related(occurrences[earlier].span, "it stands there already"),)
            sentence = f"this places `{thing.name}` where it stands already"
            problems.warn("coincident-copies", occurrences[later].span, sentence, "leave one of the two out", related)


class _Placing(Struct):
    """A `place` line while it is read."""

    things: Instances
    module: Module
    line: tree.Line
    axes: Marks
    copies: list[Copy] = field(default_factory=list)
    explodes: list[Point] = field(default_factory=list)

    def occurrence(self, scope: Scope) -> Occurrence:
        """The copies of the line and the name they share. Raises Mistake."""
        line = self.line
        written = expression(line.head, "thing")
        assert isinstance(written, (tree.Path, tree.Call))
        self.things.note_placed(self.module, written)
        for clause in line.clauses:
            if clause.word == "centred":
                sentence = "`centred` goes with shapes; a thing stands where its own lines put it"
                raise mistake("wrong-form", clause.span, sentence)
        own = next((name(clause) for clause in line.clauses if clause.word == "as"), None)
        last = (written.path if isinstance(written, tree.Call) else written).steps[-1]
        for turn in turns(line, scope, self.things.tables, self.module.file):
            self._turn(written, turn.scope, turn.label)
        places: dict[int, list[Affine]] = {}
        for copy in self.copies:
            places.setdefault(id(copy.thing), []).append(copy.placement)
        things = {id(copy.thing): copy.thing for copy in self.copies}
        if any(coincide(places[key], of_thing(thing)) for key, thing in things.items()):
            raise mistake("coincident-copies", line.span, "two copies of this thing lie in one place")
        called, span = (own.text, own.span) if own else (last.name, last.span)
        return Occurrence(called, tuple(self.copies), tuple(self.explodes), span)

    def _turn(self, written: tree.Path | tree.Call, scope: Scope, label: str) -> None:
        line = self.line
        thing = self.things.resolve(self.module, written, scope)
        places = placements(line, scope, self.axes, axes_of(thing.marks))
        if len(self.copies) + len(places) > limits.COPIES:
            raise mistake("too-much", line.span, f"this line makes more than {limits.COPIES:,} copies, the limit")
        for each, placement in zip(labels(line, label, len(places), len(self.copies)), places, strict=True):
            self.copies.append(Copy(each, thing, placement))
            self.explodes.append(self._explodes(scope, placement))

    def _explodes(self, scope: Scope, placement: Affine) -> Point:
        """The exploded shift in the assembly's frame: a length along the thing's own z axis, or a vector."""
        clause = next((each for each in self.line.clauses if each.word == "explodes"), None)
        if clause is None:
            return (0.0, 0.0, 0.0)
        written = expression(clause, "by")
        value = evaluate(written, scope)
        if isinstance(value, Quantity) and (value.dimension == LENGTH or value.bare_zero):
            along = tuple(row[2] for row in placement)
            size = sum(each * each for each in along) ** 0.5
            x, y, z = (value.value * each / size for each in along)
            return (x, y, z)
        if isinstance(value, Vector) and len(value.components) == 3:
            return point(written, scope)
        raise mistake("wrong-kind", written.span, f"expected a length or a vector of lengths, found {kind_of(value)}")

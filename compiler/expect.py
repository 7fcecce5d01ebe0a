"""Facts that must hold: measures of the unexploded model, compared with what the author expects."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, is_error
from platewright.lang.source import Span
from platewright.lang.units import AREA, LENGTH, MASS, NUMBER, VOLUME, Dimension

from .arithmetic import COMPARISONS, compare, matched, same
from .build import Model
from .expressions import evaluate, truth
from .flatten import Flattened, Mesher, Prover, flatten, prove
from .graph import Solid
from .measure import Body, area, least_clearance, volume
from .mistakes import Mistake, Problems, mistake
from .modules import names_in
from .paths import Placed, follow
from .readings import expression, optional
from .scope import Scope, did_you_mean
from .solids.recipe import Affine
from .solids.transform import apply, determinant
from .subjects import Subject, find_subject
from .values import Quantity, Value, Vector, kind_of, shown, spell

SIZES = {"width": 0, "depth": 1, "height": 2}
LATER = ("visible",)
MEASURES = ("distance", "clearance", *SIZES, "volume", "area", "mass", *LATER)
MAX_PAIRS = 2_500

EQUAL = 1e-6
EQUAL_ON_TRIANGLES = 1e-3
"""Part of the larger value by which two values may differ where no `within` is stated; the second where a volume, area
or mass is among them, for these are measured on triangles (`solids.bounds.facts_rung` says how far they fall short).
"""
ON_TRIANGLES = ("volume", "area", "mass")


def judge_facts(model: Model, mesher: Prover) -> tuple[Problem, ...]:
    """One error for each fact that does not hold, or for what is wrong with the parts of its subject.

    Cost: a boolean at the rung of proof for each part of a subject, and one at its rung of facts for each measured by
    volume, area, mass or size; distances between marks need none.
    """
    problems = Problems()
    for line in model.module.expectations:
        with problems.collecting():
            written = expression(line.head, "subject")
            assert isinstance(written, tree.Path)
            subject = find_subject(model, written, problems)
            flaws = tuple(filter(is_error, prove((subject.thing,), model.sources, mesher)))
            problems.extend(flaws)
            if flaws:
                continue
            measures = _Measures(subject, model, mesher, problems)
            inner = model.scope.inside({}, measures)
            for fact in line.lines:
                with problems.collecting():
                    _judge(fact, inner, model)
    return problems.all()


class _Measures:
    """Marks, features and measures of one subject, for the expressions of its facts."""

    def __init__(self, subject: Subject, model: Model, mesher: Mesher, problems: Problems) -> None:
        self.name, self.thing = subject.name, subject.thing
        self.model, self.mesher, self.problems = model, mesher, problems
        self.flattened: dict[int, Flattened] = {}
        self.bodies: dict[tuple[int, Affine], list[Body]] = {}

    def value(self, path: tree.Path) -> Value | None:
        steps = self._steps(path)
        if steps is None:
            return None
        found = follow(self.thing, steps, self.model.scope)
        if isinstance(found, Placed):
            sentence = f"`{path.dotted}` is a thing, not a value"
            hint = f"a measure makes it one, such as `height({path.dotted})`"
            raise mistake("wrong-kind", path.span, sentence, hint)
        return found

    def call(self, call: tree.Call) -> Value | None:
        name = call.path.dotted
        if name not in MEASURES:
            return None
        if name in LATER:
            raise mistake(
                "not-drawn-yet", call.span, f"the measure `{name}` is a word of the language that is not drawn yet"
            )
        what = {"distance": "two points", "clearance": "two parts or assemblies"}.get(name, "a part or assembly")
        if len(call.positional) != (2 if name in ("distance", "clearance") else 1) or call.named:
            raise mistake("wrong-parameters", call.span, f"`{name}` takes {what}")
        if name == "distance":
            return self._distance(call)
        if name == "clearance":
            return self._clearance(call)
        written = call.positional[0]
        placed = self._placed(name, written)
        return self._size(name, placed, written) if name in SIZES else self._sum(name, placed, written, call.span)

    def names(self) -> tuple[str, ...]:
        return (*self._inside(), self.name, *MEASURES)

    def _inside(self) -> list[str]:
        inside = [mark.name for mark in self.thing.marks]
        below = self.thing.features if isinstance(self.thing, Solid) else self.thing.occurrences
        return [*inside, *(each.name for each in below)]

    def _steps(self, path: tree.Path) -> Sequence[tree.Step] | None:
        """The steps from the subject down; None where the path does not begin at the subject or in it."""
        first = path.steps[0].name
        if first in self._inside():
            return path.steps
        return path.steps[1:] if first == self.name else None

    def _distance(self, call: tree.Call) -> Quantity:
        ends = []
        for each in call.positional:
            value = evaluate(each, self.model.scope.inside({}, self))
            is_point = isinstance(value, Vector) and (value.dimension == LENGTH or not any(value.components))
            if not isinstance(value, Vector) or len(value.components) != 3 or not is_point:
                raise mistake("wrong-kind", each.span, f"`distance` takes two points, found {kind_of(value)}")
            ends.append(value.components)
        return Quantity(math.dist(*ends), LENGTH)

    def _placed(self, name: str, written: tree.Expression) -> Placed:
        if not isinstance(written, tree.Path):
            raise mistake("wrong-kind", written.span, f"`{name}` takes the path of a part or assembly")
        steps = self._steps(written)
        if steps is None:
            first = written.steps[0]
            hint = did_you_mean(nearest(first.name, [self.name, *self._inside()]))
            raise mistake("unknown-name", first.span, f"`{self.name}` has nothing called `{first.name}`", hint)
        placed = follow(self.thing, steps, self.model.scope)
        if not isinstance(placed, Placed):
            raise mistake("wrong-kind", written.span, f"`{name}` takes a part or assembly, found {kind_of(placed)}")
        return placed

    def _size(self, name: str, placed: Placed, written: tree.Expression) -> Quantity:
        axis = SIZES[name]
        row = placed.placement[axis]
        vertices = self._geometry(placed, written).geometry.vertices
        along = vertices[:, 0] * row[0] + vertices[:, 1] * row[1] + vertices[:, 2] * row[2]
        return Quantity(float(along.max() - along.min()), LENGTH)

    def _sum(self, name: str, placed: Placed, written: tree.Expression, span: Span) -> Quantity:
        flattened = self._geometry(placed, written)
        total = 0.0
        for node in flattened.geometry.nodes:
            if node.mesh < 0:
                continue
            faces = flattened.geometry.faces[slice(*node.face_range)]
            each = (area if name == "area" else volume)(flattened.geometry.vertices, faces)
            if name == "mass":
                material = flattened.materials[node.material]
                if not material.density:
                    hint = "give its material a `density`"
                    raise mistake("no-density", span, f"`{node.path}` has no density, so no mass", hint)
                each *= material.density / 1000.0  # g/cm3 to g/mm3
            total += each
        enlarged = abs(determinant(placed.placement)) ** (2 / 3 if name == "area" else 1)
        return Quantity(total * enlarged, _DIMENSIONS[name])

    def _clearance(self, call: tree.Call) -> Quantity:
        one, other = (self._placed("clearance", each) for each in call.positional)
        if any(f"{a.path}.".startswith(f"{b.path}.") or not b.path for a, b in ((one, other), (other, one))):
            raise mistake("wrong-parameters", call.span, "one of these is part of the other, so there is no gap")
        sides = [self._bodies(placed, each) for placed, each in zip((one, other), call.positional, strict=True)]
        if len(sides[0]) * len(sides[1]) > MAX_PAIRS:
            raise mistake("too-much", call.span, f"more than {MAX_PAIRS:,} pairs of parts lie between these, the limit")
        return Quantity(least_clearance(sides[0], sides[1]), LENGTH)

    def _bodies(self, placed: Placed, written: tree.Expression) -> list[Body]:
        """The solids of one placed thing, once. Raises Mistake if it holds no parts."""
        key = id(placed.thing), placed.placement
        if key not in self.bodies:
            self.bodies[key] = _bodies(self._geometry(placed, written), placed.placement)
        return self.bodies[key]

    def _geometry(self, placed: Placed, written: tree.Expression) -> Flattened:
        """One thing flattened in its own frame, once. Raises Mistake if it holds no parts."""
        if id(placed.thing) not in self.flattened:
            path = f"{self.name}.{placed.path}" if placed.path else self.name
            found, problems = flatten(placed.thing, path, None, self.model.sources, self.mesher)
            self.problems.extend(problems)
            if found is None:
                raise Mistake(None)
            if not len(found.geometry.faces):
                raise mistake("nothing-to-measure", written.span, f"`{path}` holds no parts to measure")
            self.flattened[id(placed.thing)] = found
        return self.flattened[id(placed.thing)]


_DIMENSIONS: dict[str, Dimension] = {"volume": VOLUME, "area": AREA, "mass": MASS}


def _bodies(flattened: Flattened, placement: Affine) -> list[Body]:
    """Vertices, placed, and faces of every solid."""
    geometry, found = flattened.geometry, []
    for node in geometry.nodes:
        if node.mesh >= 0:
            start, stop = node.vertex_range
            faces = geometry.faces[slice(*node.face_range)] - np.int32(start)
            turned_over = determinant(placement) < 0
            vertices = apply(placement, geometry.vertices[start:stop])
            found.append(Body(vertices, faces[:, ::-1] if turned_over else faces))
    return found


def _judge(fact: tree.Line, scope: Scope, model: Model) -> None:
    """Raise the mistake that the fact does not hold, with what was measured; one whose `when` fails is not judged."""
    written, when = expression(fact.head, "measure"), optional(fact.head, "condition")
    if when is not None and not truth(when, scope):
        return
    wanted, within = optional(fact.head, "value"), optional(fact.head, "tolerance")
    if wanted is not None:
        _judge_equal(fact, written, wanted, scope, model)
        return
    if within is not None:
        hint = f"write `{_source_text(model, written.span)} = … within …`"
        raise mistake("wrong-form", within.span, "`within` belongs to a fact with `=`", hint)
    if isinstance(written, tree.Binary) and written.operator in (*COMPARISONS, "is", "is not"):
        left, right = evaluate(written.left, scope), evaluate(written.right, scope)
        if not compare(written.operator, left, right, written.span):
            words = _source_text(model, written.left.span)
            sentence = f"`{words}` is {shown(left)}, expected {written.operator} {shown(_like(right, left))}"
            raise mistake("broken-fact", fact.span, sentence)
        return
    value = evaluate(written, scope)
    words = _source_text(model, written.span)
    if not isinstance(value, bool):
        hint = f"compare it: `{words} = …`, or with `<=` or `>=`"
        raise mistake("wrong-kind", written.span, f"a fact compares; this is only {kind_of(value)}", hint)
    if not value:
        raise mistake("broken-fact", fact.span, f"`{words}` does not hold")


def _like(value: Value, other: Value) -> Value:
    """The value; a bare 0 with the other's dimension."""
    if isinstance(value, Quantity) and value.bare_zero and isinstance(other, Quantity):
        return Quantity(0.0, other.dimension)
    return value


def _judge_equal(
    fact: tree.Line, written: tree.Expression, wanted: tree.Expression, scope: Scope, model: Model
) -> None:
    left, right = evaluate(written, scope), evaluate(wanted, scope)
    within = optional(fact.head, "tolerance")
    if not isinstance(left, Quantity) or not isinstance(right, Quantity):
        if within is not None:
            raise mistake("wrong-form", within.span, f"`within` goes with quantities, not with {kind_of(left)}")
        is_met, expected = same(left, right, fact.span), shown(right)
    else:
        left, right = matched(left, right, fact.span, "the two sides of a fact are of one kind")
        share = EQUAL_ON_TRIANGLES if _is_on_triangles(written, wanted) else EQUAL
        tolerance, spelt = share * max(abs(left.value), abs(right.value)), ""
        if within is not None:
            tolerance, spelt = _tolerance(within, left, right, scope)
        # The last few bits of a sum are no difference.
        is_met = abs(left.value - right.value) <= tolerance + 1e-12 * abs(right.value)
        expected = spell(right) + spelt
    if not is_met:
        words = _source_text(model, written.span)
        raise mistake("broken-fact", fact.span, f"`{words}` is {shown(left)}, expected {expected}")


def _is_on_triangles(*written: tree.Expression) -> bool:
    return any(path.dotted in ON_TRIANGLES for each in written for path in names_in(each))


def _tolerance(within: tree.Expression, left: Quantity, right: Quantity, scope: Scope) -> tuple[float, str]:
    value = evaluate(within, scope)
    if isinstance(value, Quantity) and value.value < 0:
        raise mistake("out-of-range", within.span, f"a tolerance is 0 or more, found {spell(value)}")
    if isinstance(value, Quantity):
        if value.dimension == left.dimension or value.bare_zero:
            return value.value, f" within {spell(value)}"
        if value.dimension == NUMBER:
            return value.value * abs(right.value), f" within {100 * value.value:g} %"
    raise mistake(
        "wrong-kind", within.span, f"expected a tolerance: {kind_of(left)} or a percentage, found {kind_of(value)}"
    )


def _source_text(model: Model, span: Span) -> str:
    lines = model.files.texts.get(span.file, "").split("\n")
    if span.line != span.end_line or span.line > len(lines):
        return "the fact"
    return lines[span.line - 1][span.column - 1 : span.end_column - 1]

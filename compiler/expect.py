"""Facts that must hold: measures of the unexploded model, compared with what the author expects."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from platewright.backend.contract import F64, I32, Geometry
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem
from platewright.lang.source import Span
from platewright.lang.units import AREA, LENGTH, MASS, NUMBER, VOLUME, Dimension

from .build import Model
from .expressions import evaluate
from .flatten import Flattened, Mesher, flatten
from .graph import Solid, Thing
from .measure import area, clearance, volume
from .mistakes import Mistake, Problems, mistake
from .modules import THINGS, find_kind
from .paths import Placed, follow
from .readings import expression, optional
from .scope import Scope
from .values import Quantity, Value, Vector, kind_of, spell

SIZES = {"width": 0, "depth": 1, "height": 2}
LATER = ("visible",)
MEASURES = ("distance", "clearance", *SIZES, "volume", "area", "mass", *LATER)
MAX_PAIRS = 2_500

EQUAL = 1e-6
"""Part of the larger value by which two values may differ where no `within` is stated."""


def judge_facts(model: Model, mesher: Mesher) -> tuple[Problem, ...]:
    """One error for each fact that does not hold. Cost: a mesh at its rung of facts for each part measured by volume,
    area, mass or size; distances between marks need none."""
    problems = Problems()
    module = model.modules[model.files.main]
    scope = model.scopes[model.files.main]
    for line in module.expectations:
        with problems.collecting():
            subject = expression(line.head, "subject")
            assert isinstance(subject, tree.Path)
            find_kind(model.modules, module, tree.Path(subject.steps[:1], subject.span), (*THINGS, "see"))
            measures = _Measures(subject, _subject(model, subject, scope), model, mesher, scope, problems)
            inner = scope.inside({}, measures)
            for fact in line.lines:
                with problems.collecting():
                    _judge(fact, inner, model)
    return problems.all()


def _subject(model: Model, subject: tree.Path, scope: Scope) -> Thing:
    module = model.modules[model.files.main]
    declared = module.names.get(subject.steps[0].name)
    if len(subject.steps) == 1 or (declared is not None and declared.kind == "see"):
        return model.instantiate(subject)
    root = model.instantiate(tree.Path(subject.steps[:1], subject.steps[0].span))
    target = follow(root, subject.steps[1:], scope)
    if not isinstance(target, Placed):
        raise mistake("wrong-kind", subject.span, f"`{subject.dotted}` is no part or assembly")
    return target.thing


class _Measures:
    """Marks, features and measures of one subject, for the expressions of its facts."""

    def __init__(
        self, subject: tree.Path, thing: Thing, model: Model, mesher: Mesher, scope: Scope, problems: Problems
    ) -> None:
        self.name, self.thing, self.model, self.mesher = subject.steps[-1].name, thing, model, mesher
        self.scope, self.problems = scope, problems
        self.flattened: Flattened | None = None

    def value(self, path: tree.Path) -> Value | None:
        steps = self._steps(path)
        if steps is None:
            return None
        found = follow(self.thing, steps, self.scope)
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
        placed = self._placed(name, call.positional[0])
        return self._size(name, placed) if name in SIZES else self._sum(name, placed, call.span)

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
            value = evaluate(each, self.scope.inside({}, self))
            if not isinstance(value, Vector) or len(value.components) != 3 or value.dimension != LENGTH:
                raise mistake("wrong-kind", each.span, f"`distance` takes two points, found {kind_of(value)}")
            ends.append(value.components)
        return Quantity(math.dist(*ends), LENGTH)

    def _placed(self, name: str, written: tree.Expression) -> Placed:
        if not isinstance(written, tree.Path):
            raise mistake("wrong-kind", written.span, f"`{name}` takes the path of a part or assembly")
        steps = self._steps(written)
        if steps is None:
            near = nearest(written.steps[0].name, list(self.names()))
            hint = f"did you mean `{near}`?" if near else ""
            raise mistake("unknown-name", written.span, f"`{self.name}` has nothing called `{written.dotted}`", hint)
        placed = follow(self.thing, steps, self.scope)
        if not isinstance(placed, Placed):
            raise mistake("wrong-kind", written.span, f"`{name}` takes a part or assembly, found {kind_of(placed)}")
        return placed

    def _rows(self, placed: Placed) -> list[int]:
        """Rows of the solids at a path and below it."""
        path = f"{self.name}.{placed.path}" if placed.path else self.name
        nodes = self._geometry().geometry.nodes
        return [k for k, node in enumerate(nodes) if node.mesh >= 0 and f"{node.path}.".startswith(f"{path}.")]

    def _size(self, name: str, placed: Placed) -> Quantity:
        geometry, axis = self._geometry().geometry, SIZES[name]
        ranges = [geometry.nodes[row].vertex_range for row in self._rows(placed)]
        low = min(float(geometry.vertices[a:b, axis].min()) for a, b in ranges)
        high = max(float(geometry.vertices[a:b, axis].max()) for a, b in ranges)
        return Quantity(high - low, LENGTH)

    def _sum(self, name: str, placed: Placed, span: Span) -> Quantity:
        flattened = self._geometry()
        total = 0.0
        for row in self._rows(placed):
            node = flattened.geometry.nodes[row]
            faces = flattened.geometry.faces[slice(*node.face_range)]
            each = (area if name == "area" else volume)(flattened.geometry.vertices, faces)
            if name == "mass":
                material = flattened.materials[node.material]
                if not material.density:
                    hint = "give its material a `density`"
                    raise mistake("no-density", span, f"`{node.path}` has no density, so no mass", hint)
                each *= material.density / 1000.0  # g/cm3 to g/mm3
            total += each
        return Quantity(total, _DIMENSIONS[name])

    def _clearance(self, call: tree.Call) -> Quantity:
        one, other = (self._rows(self._placed("clearance", each)) for each in call.positional)
        if set(one) & set(other):
            raise mistake("wrong-parameters", call.span, "one of these is part of the other, so there is no gap")
        if len(one) * len(other) > MAX_PAIRS:
            raise mistake("too-much", call.span, f"more than {MAX_PAIRS} pairs of parts lie between these, the limit")
        geometry = self._geometry().geometry
        gaps = [clearance(*_solid_of(geometry, a), *_solid_of(geometry, b)) for a in one for b in other]
        return Quantity(min(gaps), LENGTH)

    def _geometry(self) -> Flattened:
        if self.flattened is None:
            found, problems = flatten(self.thing, self.name, None, self.model.sources, self.mesher)
            self.problems.extend(problems)
            if found is None:
                raise Mistake(None)
            self.flattened = found
        return self.flattened


_DIMENSIONS: dict[str, Dimension] = {"volume": VOLUME, "area": AREA, "mass": MASS}


def _solid_of(geometry: Geometry, row: int) -> tuple[F64, I32]:
    """Vertices and faces of one node, by themselves."""
    node = geometry.nodes[row]
    start, stop = node.vertex_range
    return geometry.vertices[start:stop], geometry.faces[slice(*node.face_range)] - np.int32(start)


def _judge(fact: tree.Line, scope: Scope, model: Model) -> None:
    """Raise the mistake that the fact does not hold, with what was measured."""
    written = expression(fact.head, "measure")
    wanted = optional(fact.head, "value")
    words = _source_text(model, written.span)
    if wanted is not None:
        _judge_equal(fact, written, wanted, scope, words)
        return
    if isinstance(written, tree.Binary) and written.operator in ("<", "<=", ">", ">=", "is", "is not"):
        if evaluate(written, scope) is True:
            return
        left, right = evaluate(written.left, scope), evaluate(written.right, scope)
        words = _source_text(model, written.left.span)
        sentence = f"`{words}` is {spell(left)}, expected {written.operator} {spell(right)}"
        raise mistake("broken-fact", fact.span, sentence)
    value = evaluate(written, scope)
    if not isinstance(value, bool):
        hint = f"compare it: `{words} = …`, or with `<=` or `>=`"
        raise mistake(
            "wrong-kind", written.span, f"a fact compares; this is only {kind_of(value)}, {spell(value)}", hint
        )
    if not value:
        raise mistake("broken-fact", fact.span, f"`{words}` does not hold")


def _judge_equal(fact: tree.Line, written: tree.Expression, wanted: tree.Expression, scope: Scope, words: str) -> None:
    left, right = evaluate(written, scope), evaluate(wanted, scope)
    if not isinstance(left, Quantity) or not isinstance(right, Quantity):
        if left != right:
            raise mistake("broken-fact", fact.span, f"`{words}` is {spell(left)}, expected {spell(right)}")
        return
    if left.dimension != right.dimension and not right.bare_zero:
        raise mistake("wrong-kind", wanted.span, f"`{words}` is {kind_of(left)}, expected {kind_of(right)}")
    tolerance, spelt = EQUAL * max(abs(left.value), abs(right.value)), ""
    within = optional(fact.head, "tolerance")
    if within is not None:
        tolerance, spelt = _tolerance(within, left, right, scope)
    if not abs(left.value - right.value) <= tolerance + 1e-12 * abs(right.value):
        expected = spell(Quantity(right.value, left.dimension))
        raise mistake("broken-fact", fact.span, f"`{words}` is {spell(left)}, expected {expected}{spelt}")


def _tolerance(within: tree.Expression, left: Quantity, right: Quantity, scope: Scope) -> tuple[float, str]:
    value = evaluate(within, scope)
    if isinstance(value, Quantity) and value.value >= 0:
        if value.dimension == left.dimension:
            return value.value, f" within {spell(value)}"
        if value.dimension == NUMBER:
            return value.value * abs(right.value), f" within {100 * value.value:g} %"
    raise mistake(
        "wrong-kind", within.span, f"expected a tolerance: {kind_of(left)} or a percentage, found {kind_of(value)}"
    )


def _source_text(model: Model, span: Span) -> str:
    lines = model.files.texts.get(span.file, "").splitlines()
    if span.line != span.end_line or span.line > len(lines):
        return "the fact"
    return lines[span.line - 1][span.column - 1 : span.end_column - 1]

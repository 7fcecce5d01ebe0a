"""The scene graph of one variant: parts and assemblies with their parameters fixed, each evaluated once and shared."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from typing import Literal

from platewright.lang import tree
from platewright.lang.problems import Problem, Related
from platewright.lang.source import Span
from platewright.lang.units import LENGTH, NUMBER

from . import limits
from .expressions import Scope, count, evaluate, truth
from .graph import Assembly, Copy, Feature, FeatureCopy, Mark, Occurrence, Solid, Thing, count_nodes
from .materials import PLAIN, Surface, read_material, said_twice
from .mistakes import Mistake, Problems, mistake
from .modules import THINGS, Declaration, Module, Modules, find_kind
from .outlines import read_outline
from .parameters import Setting, arguments, local_scope, module_scope, outermost
from .placement import AXES, Axis, Marks, place, point, repeat
from .placement import direction as read_direction
from .project import Files, beside
from .readings import expression, name, optional, parameters
from .shapes import OUTLINED, diameter, height, read_shape
from .solids.recipe import Affine, Outline, Placed, Primitive, Recipe, Step
from .solids.transform import compose, determinant
from .tables import Table
from .values import Quantity, Value, Vector, kind_of

Point = tuple[float, float, float]


@dataclass(frozen=True, slots=True, eq=False)
class Model:
    """One variant of a scene, evaluated. `things` are the parts and assemblies of the main file that have all
    parameters.

    `roots` are the names of those that nothing else places; `sources` the lines that recipes refer to by row.
    """

    files: Files
    modules: Modules
    scopes: Mapping[str, Scope]
    things: Mapping[str, Thing]
    roots: tuple[str, ...]
    sources: tuple[Span, ...]
    settings: tuple[Setting, ...]
    instantiate: Callable[[tree.Path | tree.Call], Thing]


def build_model(files: Files, modules: Modules, settings: tuple[Setting, ...]) -> tuple[Model, tuple[Problem, ...]]:
    """Evaluate every part and assembly that has all its parameters.

    Cost: linear in the lines and the copies they make.
    """
    builder = _Builder(files, modules, settings)
    things: dict[str, Thing] = {}
    main = modules[files.main]
    for module in modules.values():
        builder.check_materials(module)
        for declaration in module.names.values():
            if declaration.kind in THINGS and _has_defaults(declaration):
                with builder.problems.collecting():
                    thing = builder.thing(module, declaration, None, builder.scopes[module.file], declaration.span)
                    if module is main:
                        things[declaration.name] = thing
            elif declaration.kind == "outline" and _has_defaults(declaration):
                with builder.problems.collecting():
                    builder.outline(module, declaration, None, builder.scopes[module.file], declaration.span)
    roots = tuple(each for each in things if (main.file, each) not in builder.placed)

    def instantiate(written: tree.Path | tree.Call) -> Thing:
        return builder.resolve(main, written, builder.scopes[main.file])

    model = Model(files, modules, builder.scopes, things, roots, tuple(builder.sources), settings, instantiate)
    return model, builder.problems.all()


def _has_defaults(declaration: Declaration) -> bool:
    return all(parameter.default is not None for parameter in parameters(declaration.line))


@dataclass(slots=True)
class _Copies:
    """What one line makes: a label and scope for each turn of its `for`."""

    label: str
    scope: Scope


@dataclass(frozen=True, slots=True)
class _RowPaths:
    """`row.column` for a `for row over table` line."""

    variable: str
    table: Table
    row: int

    def value(self, path: tree.Path) -> Value | None:
        first = path.steps[0]
        if first.name != self.variable:
            return None
        if len(path.steps) != 2:
            columns = ", ".join(f"`{self.variable}.{column}`" for column in self.table.columns)
            raise mistake(
                "wrong-kind", path.span, f"`{self.variable}` is a row of the table", f"its values are {columns}"
            )
        column = path.steps[1].name
        if column not in self.table.columns:
            columns = ", ".join(self.table.columns)
            raise mistake("unknown-name", path.steps[1].span, f"the table has no column `{column}`; it has {columns}")
        value = self.table.rows[self.row][self.table.columns.index(column)]
        if value is None:
            related = (Related(self.table.row_spans[self.row], "this row"),)
            raise mistake("bad-table", path.span, f"the cell `{column}` is empty", "", related)
        return value

    def call(self, call: tree.Call) -> Value | None:
        return None

    def names(self) -> tuple[str, ...]:
        return (self.variable,)


@dataclass(slots=True)
class _Builder:
    files: Files
    modules: Modules
    settings: tuple[Setting, ...]
    problems: Problems = field(default_factory=Problems)
    scopes: dict[str, Scope] = field(default_factory=dict)
    placed: set[tuple[str, str]] = field(default_factory=set)
    sources: list[Span] = field(default_factory=list)
    source_rows: dict[Span, int] = field(default_factory=dict)
    made: dict[tuple[str, str, object], Thing | None] = field(default_factory=dict)
    outlines: dict[tuple[str, str, object], Outline] = field(default_factory=dict)
    surfaces: dict[tuple[str, str], Surface] = field(default_factory=dict)
    under_way: list[Declaration] = field(default_factory=list)

    def __post_init__(self) -> None:
        outer = outermost()
        for file in _seen_first(self.files.main, self.modules):
            module = self.modules[file]
            prefixes = {name: self.scopes[seen] for name, seen in module.prefixes.items() if seen in self.scopes}
            settings = self.settings if file == self.files.main else ()
            self.scopes[file] = module_scope(module, prefixes, settings, self.problems, outer)

    def check_materials(self, module: Module) -> None:
        """Evaluate every material of a file, used or not."""
        for declaration in module.names.values():
            if declaration.kind == "material":
                self.surface(module, declaration)

    def surface(self, module: Module, declaration: Declaration) -> Surface:
        """The surface of a material, evaluated once."""
        key = (module.file, declaration.name)
        if key not in self.surfaces:
            self.surfaces[key] = read_material(declaration.line, self.scopes[module.file], self.problems)
        return self.surfaces[key]

    def resolve(self, module: Module, written: tree.Path | tree.Call, scope: Scope) -> Thing:
        """The part or assembly that a path or call names. Raises Mistake."""
        path = written.path if isinstance(written, tree.Call) else written
        here, declaration = find_kind(self.modules, module, path, THINGS)
        call = written if isinstance(written, tree.Call) else None
        return self.thing(here, declaration, call, scope, written.span)

    def thing(
        self, module: Module, declaration: Declaration, call: tree.Call | None, scope: Scope, span: Span
    ) -> Thing:
        """A part or assembly with its parameters, evaluated once for each set of values. Raises Mistake."""
        if declaration in self.under_way:
            start = self.under_way.index(declaration)
            circle = " holds ".join(f"`{each.name}`" for each in (*self.under_way[start:], declaration))
            raise mistake(
                "recursion",
                span,
                f"a thing cannot hold itself: {circle}",
                "",
                (Related(declaration.span, "declared here"),),
            )
        if len(self.under_way) >= limits.NESTING:
            raise mistake("too-deep", span, f"things hold each other more than {limits.NESTING} deep, the limit")
        named = arguments(declaration, call, scope, self.scopes[module.file], span)
        key = (module.file, declaration.name, tuple(named.items()))
        if key not in self.made:
            inner = self.scopes[module.file].inside(named) if named else self.scopes[module.file]
            self.under_way.append(declaration)
            try:
                self.made[key] = self._make(module, declaration, inner)
            finally:
                self.under_way.pop()
        thing = self.made[key]
        if thing is None:
            raise Mistake(None)
        return thing

    def _make(self, module: Module, declaration: Declaration, scope: Scope) -> Thing | None:
        before = len(self.problems.all())
        inner = local_scope(declaration.line.lines, scope, self.problems)
        make = self._part if declaration.kind == "part" else self._assembly
        thing = make(module, declaration, inner)
        failed = any(problem.severity.value == "error" for problem in self.problems.all()[before:])
        return None if failed else thing

    # --- parts

    def _part(self, module: Module, declaration: Declaration, scope: Scope) -> Solid:
        surface = PLAIN
        steps: list[Step] = []
        features: list[Feature] = []
        names: dict[str, Span] = {}
        said: dict[str, Span] = {}
        marks, axes = self._marks(declaration, scope, names)
        for line in declaration.line.lines:
            with self.problems.collecting():
                if line.word == "made of":
                    said_twice(line, said, self.problems)
                    path = expression(line.head, "material")
                    assert isinstance(path, tree.Path)
                    surface = self.surface(*find_kind(self.modules, module, path, ("material",)))
                elif line.word in ("add", "cut", "keep"):
                    step, feature = self._step(module, line, scope, axes)
                    if step.placed:
                        steps.append(step)
                    if feature is not None:
                        self._own_name(feature.name, feature.span, names)
                        features.append(feature)
        self._begins_with_add(declaration, steps, said)
        return Solid(declaration.name, Recipe(tuple(steps)), surface, marks, tuple(features), declaration.span)

    def _begins_with_add(self, declaration: Declaration, steps: list[Step], said: dict[str, Span]) -> None:
        if not steps:
            hint = "begin with an `add` line, such as `add block (10 mm, 10 mm, 10 mm)`"
            self.problems.error("empty-part", declaration.span, f"the part `{declaration.name}` adds nothing", hint)
        elif steps[0].operation != "add":
            span = self.sources[steps[0].placed[0].source]
            sentence = f"there is nothing to {steps[0].operation} yet: a part begins with `add`"
            self.problems.error("empty-part", span, sentence, "move an `add` line before it")

    def _step(self, module: Module, line: tree.Line, scope: Scope, axes: Marks) -> tuple[Step, Feature | None]:
        operation: Literal["add", "cut", "keep"] = "add"
        if line.word == "cut" or line.word == "keep":
            operation = "cut" if line.word == "cut" else "keep"
        feature_name = next((name(clause) for clause in line.clauses if clause.word == "as"), None)
        placed: list[Placed] = []
        copies: list[FeatureCopy] = []
        for turn in self._turns(line, scope, module):
            for each in self._placed(module, line, turn.scope, axes):
                placed.append(each)
                copies.extend(_feature_copies(each))
        step = Step(operation, tuple(placed))
        if feature_name is None:
            return step, None
        return step, Feature(feature_name.text, tuple(copies), feature_name.span)

    def _placed(self, module: Module, line: tree.Line, scope: Scope, axes: Marks) -> Iterator[Placed]:
        """The shapes of one line, or of the lines indented under it, placed and repeated."""
        reading = line.head.get("shape")
        if isinstance(reading, tree.Reading):
            if line.lines:
                raise mistake("wrong-form", line.lines[0].span, "shapes stand on this line or under it, not both")
            yield self._shape(module, line, reading, scope, axes, ())
            return
        if not line.lines:
            raise mistake(
                "missing-value",
                line.head.word_span,
                f"expected a shape after `{line.word}`",
                f"such as `{line.word} cylinder diameter 10 mm length 5 mm`",
            )
        outer = self._placements(line, scope, axes, {})
        for below in line.lines:
            with self.problems.collecting():
                for turn in self._turns(below, scope, module):
                    inner = below.head.get("shape")
                    assert isinstance(inner, tree.Reading)
                    yield self._shape(module, below, inner, turn.scope, axes, outer)

    def _shape(
        self,
        module: Module,
        line: tree.Line,
        reading: tree.Reading,
        scope: Scope,
        axes: Marks,
        outer: tuple[Affine, ...],
    ) -> Placed:
        shape, own = self._solid(module, reading, scope)
        placements = self._placements(line, scope, axes, own)
        if outer:
            if len(outer) * len(placements) > limits.COPIES:
                made = len(outer) * len(placements)
                raise mistake("too-much", line.span, f"{made:,} copies are more than {limits.COPIES:,}, the limit")
            placements = tuple(compose(a, b) for a in outer for b in placements)
        if len(set(placements)) < len(placements):
            raise mistake("coincident-copies", line.span, "two copies of this shape lie in one place")
        centred = any(clause.word == "centred" for clause in line.clauses)
        return Placed(shape, placements, self._source(line.span), centred)

    def _solid(self, module: Module, reading: tree.Reading, scope: Scope) -> tuple[Primitive | Recipe, Marks]:
        """The primitive or part that a shape's words name, with the axes of its own marks. Raises Mistake."""
        if reading.row == "solid":
            written = expression(reading, "part")
            assert isinstance(written, (tree.Path, tree.Call))
            path = written.path if isinstance(written, tree.Call) else written
            find_kind(self.modules, module, path, ("part",))
            thing = self.resolve(module, written, scope)
            assert isinstance(thing, Solid)
            self._note_placed(module, path)
            return thing.recipe, _axes(thing.marks)
        outline = None
        if reading.word in OUTLINED:
            written = expression(reading, "outline")
            assert isinstance(written, (tree.Path, tree.Call))
            path = written.path if isinstance(written, tree.Call) else written
            here, declaration = find_kind(self.modules, module, path, ("outline",))
            call = written if isinstance(written, tree.Call) else None
            outline = self.outline(here, declaration, call, scope, written.span)
        return read_shape(reading, scope, outline), {}

    def outline(
        self, module: Module, declaration: Declaration, call: tree.Call | None, scope: Scope, span: Span
    ) -> Outline:
        """An outline with its parameters, evaluated once for each set of values. Raises Mistake."""
        named = arguments(declaration, call, scope, self.scopes[module.file], span)
        key = (module.file, declaration.name, tuple(named.items()))
        if key not in self.outlines:
            inner = self.scopes[module.file].inside(named) if named else self.scopes[module.file]
            self.outlines[key] = read_outline(
                declaration.line, local_scope(declaration.line.lines, inner, self.problems)
            )
        return self.outlines[key]

    # --- assemblies

    def _assembly(self, module: Module, declaration: Declaration, scope: Scope) -> Assembly:
        names: dict[str, Span] = {}
        marks, axes = self._marks(declaration, scope, names)
        occurrences: list[Occurrence] = []
        for line in declaration.line.lines:
            if line.word == "place":
                with self.problems.collecting():
                    occurrence = self._occurrence(module, line, scope, axes)
                    self._own_name(occurrence.name, occurrence.span, names)
                    if occurrence.copies:
                        occurrences.append(occurrence)
        if not any(line.word == "place" for line in declaration.line.lines):
            sentence = f"the assembly `{declaration.name}` places nothing"
            self.problems.error("empty-assembly", declaration.span, sentence, "give it a `place` line")
        n_nodes = 1 + sum(count_nodes(copy.thing) for each in occurrences for copy in each.copies)
        if n_nodes > limits.COPIES:
            sentence = f"`{declaration.name}` holds {n_nodes:,} things, more than {limits.COPIES:,}, the limit"
            self.problems.error("too-much", declaration.span, sentence)
        return Assembly(declaration.name, tuple(occurrences), marks, declaration.span, n_nodes)

    def _occurrence(self, module: Module, line: tree.Line, scope: Scope, axes: Marks) -> Occurrence:
        written = expression(line.head, "thing")
        assert isinstance(written, (tree.Path, tree.Call))
        path = written.path if isinstance(written, tree.Call) else written
        self._note_placed(module, path)
        own = next((name(clause) for clause in line.clauses if clause.word == "as"), None)
        called = own.text if own else path.steps[-1].name
        span = own.span if own else path.steps[-1].span
        copies: list[Copy] = []
        explodes: list[Point] = []
        turns = self._turns(line, scope, module)
        for turn in turns:
            thing = self.resolve(module, written, turn.scope)
            placements = self._placements(line, turn.scope, axes, _axes(thing.marks))
            if len(copies) + len(placements) > limits.COPIES:
                raise mistake("too-much", line.span, f"this line makes more than {limits.COPIES:,} copies, the limit")
            labelled = len(placements) == 1 and turn.label
            for placement in placements:
                label = turn.label if labelled else str(len(copies) + 1)
                copies.append(Copy(label, thing, placement))
                explodes.append(self._explodes(line, turn.scope, placement))
        if len({(id(copy.thing), copy.placement) for copy in copies}) < len(copies):
            raise mistake("coincident-copies", line.span, "two copies of this thing lie in one place")
        if len(copies) == 1 and not _repeats(line):
            copies = [replace(copies[0], label="")]
        return Occurrence(called, tuple(copies), tuple(explodes), span)

    def _explodes(self, line: tree.Line, scope: Scope, placement: Affine) -> Point:
        """The exploded shift in the assembly's frame: a length along the thing's own z axis, or a vector."""
        clause = next((each for each in line.clauses if each.word == "explodes"), None)
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

    def _note_placed(self, module: Module, path: tree.Path) -> None:
        with self.problems.collecting():
            here, declaration = find_kind(self.modules, module, path, THINGS)
            self.placed.add((here.file, declaration.name))

    # --- what parts and assemblies share

    def _placements(self, line: tree.Line, scope: Scope, axes: Marks, own: Marks) -> tuple[Affine, ...]:
        base = place(line.clauses, scope, own)
        if abs(determinant(base)) < 1e-12:
            raise mistake("out-of-range", line.span, "this placement flattens the thing to nothing")
        return tuple(compose(each, base) for each in repeat(line.clauses, scope, axes))

    def _turns(self, line: tree.Line, scope: Scope, module: Module) -> list[_Copies]:
        """One scope for each turn of the line's `for` clauses that its `when` lets through. Raises Mistake."""
        turns = [_Copies("", scope)]
        for clause in line.clauses:
            if clause.word == "for":
                turns = [inner for outer in turns for inner in self._turn(clause, outer, module)]
                if len(turns) > limits.COPIES:
                    raise mistake(
                        "too-much", clause.span, f"this line makes more than {limits.COPIES:,} copies, the limit"
                    )
        conditions = [expression(clause, "condition") for clause in line.clauses if clause.word == "when"]
        return [turn for turn in turns if all(truth(condition, turn.scope) for condition in conditions)]

    def _turn(self, clause: tree.Reading, outer: _Copies, module: Module) -> Iterator[_Copies]:
        variable = name(clause, "variable").text
        if outer.scope.find(variable) is not None:
            sentence = f"`{variable}` is declared outside already; inside it would mean something else"
            raise mistake("duplicate-name", name(clause, "variable").span, sentence, "rename it")
        table_name = clause.get("table")
        if table_name is not None:
            table = self._table(table_name, module)
            for row, label in enumerate(table.labels):
                yield _Copies(_joined(outer.label, label), outer.scope.inside({}, _RowPaths(variable, table, row)))
            return
        first = count(expression(clause, "first"), outer.scope, least=-limits.COPIES)
        last = count(expression(clause, "last"), outer.scope, least=-limits.COPIES)
        if last - first + 1 > limits.COPIES:
            raise mistake(
                "too-much", clause.span, f"{last - first + 1:,} turns are more than {limits.COPIES:,}, the limit"
            )
        for number in range(first, last + 1):
            inner = outer.scope.inside({variable: Quantity(float(number), NUMBER)})
            yield _Copies(_joined(outer.label, str(number - first + 1)), inner)

    def _table(self, written: tree.Value, module: Module) -> Table:
        assert isinstance(written, tree.Text)
        wanted = "".join(part for part in written.parts if isinstance(part, str))
        target = beside(module.file, wanted)
        table = self.files.tables.get(target) if target else None
        if table is None:
            raise Mistake(None)
        return table

    def _marks(self, declaration: Declaration, scope: Scope, names: dict[str, Span]) -> tuple[tuple[Mark, ...], Marks]:
        marks: list[Mark] = []
        for line in declaration.line.lines:
            if line.word == "mark":
                with self.problems.collecting():
                    own = name(line.head)
                    self._own_name(own.text, own.span, names)
                    along = optional(line.head, "axis")
                    axis = read_direction(along, scope) if along is not None else None
                    marks.append(Mark(own.text, point(expression(line.head, "point"), scope), axis, own.span))
        return tuple(marks), _axes(tuple(marks))

    def _own_name(self, text: str, span: Span, names: dict[str, Span]) -> None:
        """Report a second use of a name among a thing's marks, features and placed things."""
        if text in names:
            related = (Related(names[text], "the first of them"),)
            hint = "give one of them another name with `as`"
            self.problems.error("duplicate-name", span, f"two things here are called `{text}`", hint, related)
        names.setdefault(text, span)

    def _source(self, span: Span) -> int:
        if span not in self.source_rows:
            self.source_rows[span] = len(self.sources)
            self.sources.append(span)
        return self.source_rows[span]


def _seen_first(main: str, modules: Modules) -> list[str]:
    """Files so that each stands after those it sees; the loader has reported circles."""
    sequence: list[str] = []
    entered: set[str] = set()
    pending: list[tuple[str, bool]] = [(main, False)]
    while pending:
        file, is_done = pending.pop()
        if is_done:
            sequence.append(file)
        elif file not in entered and file in modules:
            entered.add(file)
            pending.append((file, True))
            pending.extend((seen, False) for seen in reversed(tuple(modules[file].prefixes.values())))
    return sequence


def _axes(marks: tuple[Mark, ...]) -> Marks:
    return {mark.name: Axis(mark.point, mark.axis or AXES["z"]) for mark in marks}


def _repeats(line: tree.Line) -> bool:
    return any(clause.word in ("ring", "row", "for") for clause in line.clauses)


def _joined(outer: str, inner: str) -> str:
    return f"{outer},{inner}" if outer else inner


def _feature_copies(placed: Placed) -> Iterator[FeatureCopy]:
    shape = placed.shape
    rise = 0.0 if isinstance(shape, Recipe) else height(shape)
    low = -rise / 2 if placed.centred else 0.0
    across = None if isinstance(shape, Recipe) else diameter(shape)
    for placement in placed.placements:
        size = sum(row[2] * row[2] for row in placement) ** 0.5
        x, y, z = (row[2] / size for row in placement)
        scaled = across * abs(determinant(placement)) ** (1 / 3) if across is not None else None
        yield FeatureCopy(_moved(placement, low + rise / 2), (x, y, z), _moved(placement, low + rise), scaled)


def _moved(placement: Affine, up: float) -> Point:
    x, y, z = (row[2] * up + row[3] for row in placement)
    return (x, y, z)

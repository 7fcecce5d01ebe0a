"""The compiler's door: everything a driver asks for, from the name of a scene to jobs, facts, lists and dumps.

All of it is pure: files come from a loader, meshes from a mesher that may keep what it has built.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from platewright.backend import contract
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, Severity
from platewright.lang.reader import read_value
from platewright.lang.source import Span

from .build import Model as Built
from .build import build_model
from .dump import dump_graph, dump_tree, dump_triangles
from .expect import judge_facts
from .expressions import evaluate
from .figures import Spec, default_figure, plan_figure, read_figure
from .flatten import Mesher, flatten
from .flatten import prove as prove_things
from .listing import Listing, list_scene
from .mistakes import Problems, mistake
from .modules import Modules, gather
from .parameters import Setting as Assigned
from .parameters import outermost
from .paths import Placed, follow
from .project import Files, Loader, Refusal, beside, load
from .readings import name as declared_name
from .readings import optional, settings
from .solids.ladder import first_at_most
from .tables import Table
from .values import Value

Setting = tuple[str, str]
"""A parameter's name and its value as source text."""

__all__ = [
    "Exported",
    "Listing",
    "Loader",
    "Model",
    "Project",
    "Refusal",
    "Setting",
    "Variant",
    "build",
    "dump",
    "figure_names",
    "geometry",
    "judge",
    "listing",
    "open_scene",
    "plan",
    "prove",
]


@dataclass(frozen=True, slots=True)
class Variant:
    """One named group of settings, and the `variants` declaration it stands in."""

    name: str
    set_name: str
    span: Span
    settings: tuple[Assigned, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Project:
    """A scene with all it sees, names checked, variants read."""

    main: str
    files: Files
    modules: Modules
    variants: tuple[Variant, ...]

    @property
    def texts(self) -> Mapping[str, str]:
        """Source texts by file, for messages."""
        return self.files.texts

    @property
    def scenes(self) -> Mapping[str, tree.Scene]:
        """Trees by file."""
        return self.files.scenes


@dataclass(frozen=True, slots=True)
class FigureName:
    """One figure of a model and the kinds of file it wants."""

    name: str
    span: Span
    files: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Model:
    """One variant, evaluated. A figure with `with` lines has a model of its own."""

    built: Built
    specs: Mapping[str, tuple[Built, Spec]]
    figures: tuple[FigureName, ...]
    problems: tuple[Problem, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Exported:
    """Triangles to hand on: a part path and all below it."""

    geometry: contract.Geometry
    materials: tuple[contract.Material, ...]
    nodes: tuple[int, ...]


def open_scene(name: str, loader: Loader) -> tuple[Project | None, tuple[Problem, ...]]:
    """Read a scene and all it sees; check names; read its variants. None where the scene itself cannot be read."""
    files, found = load(name, loader)
    if files is None:
        return None, found
    problems = Problems()
    problems.extend(found)
    modules, named = gather(files)
    problems.extend(named)
    variants = _variants(files, modules, problems)
    return Project(name, files, modules, variants), problems.all()


def build(
    project: Project, variant: Variant | None = None, settings: tuple[Setting, ...] = ()
) -> tuple[Model | None, tuple[Problem, ...]]:
    """Evaluate one variant with further settings on top, and read its figures.

    None where the scene has errors; errors within a figure leave that figure out and the rest whole.
    """
    problems = Problems()
    given = (*(variant.settings if variant else ()), *_from_texts(settings, problems))
    built, found = build_model(project.files, project.modules, given)
    problems.extend(found)
    if problems.has_errors:
        return None, problems.all()
    specs: dict[str, tuple[Built, Spec]] = {}
    names: list[FigureName] = []
    for declaration in project.modules[project.main].figures.values():
        spec = _figure(project, built, given, declaration.line, declaration.name, problems)
        names.append(FigureName(declaration.name, declaration.span, spec[1].files if spec else ("png",)))
        if spec is not None:
            specs[declaration.name] = spec
    if not names and built.roots:
        spec_or_none, found = default_figure(built, built.files.scenes[project.main].span)
        if spec_or_none is not None:
            specs[spec_or_none.name] = (built, spec_or_none)
            names.append(FigureName(spec_or_none.name, spec_or_none.span, spec_or_none.files))
    return Model(built, specs, tuple(names), problems.all()), problems.all()


def figure_names(project: Project) -> tuple[str, ...]:
    """Names of the figures declared, in the order of the text."""
    return tuple(project.modules[project.main].figures)


def prove(model: Model, mesher: Mesher) -> tuple[Problem, ...]:
    """Problems that only meshing shows: outlines that cross themselves, parts that are empty or fall into pieces.

    Covers every part of the model and of those of its figures.
    """
    problems = Problems()
    models = {id(model.built): model.built, **{id(built): built for built, _ in model.specs.values()}}
    for built in models.values():
        problems.extend(prove_things(tuple(built.things.values()), built.sources, mesher))
    return problems.all()


def judge(model: Model, mesher: Mesher) -> tuple[Problem, ...]:
    """Errors for facts that do not hold."""
    return judge_facts(model.built, mesher)


def plan(
    model: Model, figure: str, mesher: Mesher, *, resolution: float | None = None, measures: bool = False
) -> tuple[contract.Job | None, tuple[Problem, ...]]:
    """The job that draws a figure; None with problems confined to it. KeyError for a figure the model does not hold."""
    if figure not in model.specs:
        if figure not in [each.name for each in model.figures]:
            raise KeyError(figure)
        return None, tuple(problem for problem in model.problems if problem.within == figure)
    built, spec = model.specs[figure]
    return plan_figure(built, spec, mesher, resolution, measures)


def geometry(
    model: Model, path: str, mesher: Mesher, tolerance_mm: float | None = None
) -> tuple[Exported | None, tuple[Problem, ...]]:
    """World-space triangles of a part path and all below it, at a chord error of at most `tolerance_mm`."""
    written, problems = read_value("--of", path)
    collected = Problems()
    collected.extend(problems)
    exported: Exported | None = None
    with collected.collecting():
        exported = _export(model.built, written, path, tolerance_mm, mesher, collected)
    return (None if collected.has_errors else exported), collected.all()


def listing(model: Model, project: Project, mesher: Mesher) -> tuple[Listing, tuple[Problem, ...]]:
    """Parameters, parts, figures and variants."""
    return list_scene(model.built, tuple(variant.name for variant in project.variants), mesher)


def dump(project: Project, model: Model | None, stage: str, mesher: Mesher) -> tuple[str, tuple[Problem, ...]]:
    """The plain text of a stage: `tree`, `graph` or `triangles`, the last at the rung of facts."""
    if stage == "tree":
        return dump_tree(project.files.scenes[project.main]), ()
    if model is None:
        return "", ()
    if stage == "graph":
        return dump_graph(model.built), ()
    texts: list[str] = []
    problems = Problems()
    for root in model.built.roots:
        flattened, found = flatten(model.built.things[root], root, None, model.built.sources, mesher)
        problems.extend(found)
        texts += [dump_triangles(flattened)] if flattened is not None else []
    return "".join(texts), problems.all()


def _export(
    built: Built,
    written: tree.Expression | None,
    path: str,
    tolerance_mm: float | None,
    mesher: Mesher,
    problems: Problems,
) -> Exported | None:
    start = Span("--of", 1, 1, 1, len(path) + 1)
    if not isinstance(written, tree.Path):
        raise mistake("wrong-form", start, "expected the path of a part or assembly, such as `gauge.funnel`")
    first = written.steps[0]
    if first.name not in built.things:
        near = nearest(first.name, list(built.things))
        hint = f"did you mean `{near}`?" if near else ""
        raise mistake("unknown-name", first.span, f"there is no part or assembly `{first.name}`", hint)
    target = follow(built.things[first.name], written.steps[1:], built.scopes[built.files.main])
    if not isinstance(target, Placed):
        raise mistake("wrong-kind", written.span, f"`{path}` is a mark or feature; only things have triangles")
    rung = None if tolerance_mm is None else first_at_most(tolerance_mm)
    flattened, found = flatten(built.things[first.name], first.name, rung, built.sources, mesher)
    problems.extend(found)
    if flattened is None:
        return None
    wanted = f"{first.name}.{target.path}" if target.path else first.name
    nodes = flattened.geometry.nodes
    rows = tuple(row for row, node in enumerate(nodes) if f"{node.path}.".startswith(f"{wanted}."))
    return Exported(flattened.geometry, flattened.materials, rows)


def _figure(
    project: Project, built: Built, given: tuple[Assigned, ...], line: tree.Line, name: str, problems: Problems
) -> tuple[Built, Spec] | None:
    """A figure's spec and the model it shows: its own where it sets parameters."""
    own = Problems()
    more: list[Assigned] = []
    for each in line.lines:
        if each.word == "with":
            for setting in settings(each.head):
                with own.collecting():
                    value = evaluate(setting.value, built.scopes[project.main])
                    more.append(Assigned(setting.name, value, setting.span))
    if more and not own.has_errors:
        built, found = build_model(project.files, project.modules, (*given, *more))
        own.extend(found)
    spec: Spec | None = None
    if not own.has_errors:
        spec, found = read_figure(built, line, name)
        own.extend(found)
    for problem in own.all():
        problems.add(_within(problem, name))
    parsed = any(each.within == name and each.severity is Severity.ERROR for each in problems.all())
    return None if spec is None or parsed else (built, spec)


def _within(problem: Problem, figure: str) -> Problem:
    return Problem(
        problem.code, problem.severity, problem.span, problem.sentence, problem.hint, problem.related, figure
    )


def _from_texts(given: tuple[Setting, ...], problems: Problems) -> list[Assigned]:
    """Settings from outside the text, each with a span in a file named after the option."""
    found: list[Assigned] = []
    for name, text in given:
        file = f"--set {name}"
        written, wrong = read_value(file, text)
        problems.extend(wrong)
        if written is not None and not wrong:
            with problems.collecting():
                found.append(Assigned(name, evaluate(written, outermost()), Span(file, 1, 1, 1, len(text) + 1)))
    return found


def _variants(files: Files, modules: Modules, problems: Problems) -> tuple[Variant, ...]:
    variants: list[Variant] = []
    for declaration in modules[files.main].variants.values():
        table = _table(declaration.line, files)
        if table is not None:
            variants += _from_table(table, declaration.name)
        for line in declaration.line.lines:
            name = declared_name(line.head)
            variants.append(Variant(name.text, declaration.name, name.span, tuple(_settings(line, problems))))
    seen: dict[str, Variant] = {}
    for variant in variants:
        if variant.name in seen:
            sentence = f"two variants are called `{variant.name}`"
            problems.error("duplicate-name", variant.span, sentence, "rename one")
        seen.setdefault(variant.name, variant)
    return tuple(variants)


def _table(line: tree.Line, files: Files) -> Table | None:
    written = optional(line.head, "table")
    if not isinstance(written, tree.Text):
        return None
    target = beside(files.main, "".join(part for part in written.parts if isinstance(part, str)))
    return files.tables.get(target) if target else None


def _from_table(table: Table, set_name: str) -> list[Variant]:
    variants = []
    for label, span, row in zip(table.labels, table.row_spans, table.rows, strict=True):
        cells: list[tuple[str, Value | None]] = list(zip(table.columns[1:], row[1:], strict=True))
        chosen = tuple(Assigned(column, value, span) for column, value in cells if value is not None)
        variants.append(Variant(label, set_name, span, chosen))
    return variants


def _settings(line: tree.Line, problems: Problems) -> list[Assigned]:
    found: list[Assigned] = []
    for setting in settings(line.head):
        with problems.collecting():
            found.append(Assigned(setting.name, evaluate(setting.value, outermost()), setting.span))
    return found

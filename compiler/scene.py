"""The compiler's door: everything a driver asks for, from the name of a scene to jobs, facts, lists and dumps.

All of it is pure: files come from a loader, meshes from a mesher that may keep what it has built.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence, Set

from msgspec import Struct, structs
from platewright.backend import contract
from platewright.lang import tree
from platewright.lang.problems import Problem, Related, Severity, is_error
from platewright.lang.reader import read_value
from platewright.lang.source import Span

from . import limits
from .acceptance import Acceptance, read_acceptances, unused
from .build import Model as Built
from .build import build_model
from .contacts import Leaves, check_contacts, check_sizes
from .dump import dump_graph, dump_tree, dump_triangles
from .expect import judge_facts
from .expressions import evaluate
from .extremes import Extreme
from .figure_reading import default_figure, read_figure, thing_shown
from .figures import plan_figure
from .flatten import Mesher, Prover, flatten
from .flatten import prove as prove_things
from .listing import Listing, list_scene
from .mistakes import Problems, mistake
from .modules import Declaration, Modules, gather
from .parameters import Setting as Assigned
from .parameters import outermost
from .project import Files, Loader, Refusal, load
from .readings import settings
from .solids.ladder import first_at_most
from .specs import Spec
from .subjects import find_subject
from .usage import check_names
from .variants import Variant, read_variants

Setting = tuple[str, str]
"""A parameter's name and its value as source text."""

__all__ = [
    "Acceptance",
    "Exported",
    "Listing",
    "Loader",
    "Model",
    "Project",
    "Refusal",
    "Setting",
    "Variant",
    "attempt",
    "build",
    "dump",
    "figure_names",
    "geometry",
    "judge",
    "listing",
    "open_scene",
    "plan",
    "prove",
    "sources_of",
    "unused",
]


class Project(Struct, frozen=True, eq=False):
    """A scene with all it sees, names checked, variants read. `known` are the places of what has been reported."""

    main: str
    files: Files
    modules: Modules
    variants: tuple[Variant, ...]
    known: frozenset[tuple[str, Span]]
    acceptances: tuple[Acceptance, ...] = ()

    @property
    def texts(self) -> Mapping[str, str]:
        """Source texts by file, for messages."""
        return self.files.texts

    @property
    def scenes(self) -> Mapping[str, tree.Scene]:
        """Trees by file."""
        return self.files.scenes


class FigureName(Struct, frozen=True):
    """One figure of a model and the kinds of file it wants."""

    name: str
    span: Span
    files: tuple[str, ...]


class Model(Struct, frozen=True, eq=False):
    """One variant, evaluated. A figure with `with` lines has a model of its own.

    `is_sound` says that nothing but figures has errors; where it does not, the model holds what could be made and
    serves `prove` and `judge` alone. `known` are the places of what the opening has reported.
    """

    built: Built
    specs: Mapping[str, tuple[Built, Spec]]
    figures: tuple[FigureName, ...]
    problems: tuple[Problem, ...]
    is_sound: bool = True
    known: frozenset[tuple[str, Span]] = frozenset()


class Exported(Struct, frozen=True, eq=False):
    """Triangles to hand on: a part path and all below it."""

    geometry: contract.Geometry
    materials: tuple[contract.Material, ...]
    nodes: tuple[int, ...]


def open_scene(name: str, loader: Loader) -> tuple[Project | None, tuple[Problem, ...]]:
    """Read a scene and all it sees; check names; read its variants. None where the scene itself cannot be read.

    What could be read can be built even where there are errors, for more problems in one run: `build` and what follows
    give none that come of those given here.
    """
    files, found = load(name, loader)
    if files is None:
        return None, found
    problems = Problems()
    problems.extend(found)
    modules, named = gather(files)
    problems.extend(named)
    problems.extend(check_names(modules, name))
    variants = read_variants(files, modules, problems)
    acceptances, unread = read_acceptances(name, files.scenes)
    problems.extend(unread)
    known = frozenset((each.code, each.span) for each in problems.all() if is_error(each))
    return Project(name, files, modules, variants, known, acceptances), problems.all()


def build(
    project: Project, variant: Variant | None = None, settings: tuple[Setting, ...] = ()
) -> tuple[Model | None, tuple[Problem, ...]]:
    """Evaluate one variant with further settings on top, and read its figures.

    None where the scene has errors; errors within a figure leave that figure out and the rest whole.
    """
    model, problems = attempt(project, variant, settings)
    return model if model.is_sound else None, problems


def attempt(
    project: Project, variant: Variant | None = None, settings: tuple[Setting, ...] = ()
) -> tuple[Model, tuple[Problem, ...]]:
    """As `build`, but where the scene has errors the model of what could be made, for more problems in one run."""
    problems = Problems()
    given = _chosen(variant.settings if variant else (), _from_texts(settings, problems), problems)
    built, found = build_model(project.files, project.modules, given)
    problems.extend(found)
    specs: dict[str, tuple[Built, Spec]] = {}
    names: list[FigureName] = []
    for declaration in project.modules[project.main].figures.values():
        spec = _figure(project, built, given, declaration, problems)
        names.append(FigureName(declaration.name, declaration.span, spec[1].files if spec else ("png",)))
        if spec is not None:
            specs[declaration.name] = spec
    reported = {(each.code, each.span) for each in problems.all()}
    unused = [each for described in built.viewpoints.values() for each in described.problems]
    unused += [each for described in built.lightings.values() for each in described.problems]
    problems.extend(tuple(each for each in unused if (each.code, each.span) not in reported))
    if not names and built.roots and built.is_whole:
        spec_or_none, _ = default_figure(built, project.files.scenes[project.main].span)
        if spec_or_none is not None:
            specs[spec_or_none.name] = (built, spec_or_none)
            names.append(FigureName(spec_or_none.name, spec_or_none.span, spec_or_none.files))
    news = tuple(each for each in problems.all() if _is_news(each, project))
    is_sound = built.is_whole and not any(is_error(each) and not each.within for each in news)
    return Model(built, specs, tuple(names), news, is_sound, project.known), news


def _is_news(problem: Problem, project: Project) -> bool:
    """Whether a problem says more than what was reported when the scene was opened."""
    if (problem.code, problem.span) in project.known:
        return False
    return problem.span.line not in project.files.faults.get(problem.span.file, ())


def figure_names(project: Project) -> tuple[str, ...]:
    """Names of the figures declared, in the order of the text."""
    return tuple(project.modules[project.main].figures)


def prove(model: Model, mesher: Prover) -> tuple[Problem, ...]:
    """Problems that only meshing shows: outlines that cross themselves, parts that are empty, in pieces, or float.

    Covers every part of the model and of those of its figures; of a model that is not sound, what could be made,
    and no word on what may touch or measure otherwise once it is whole.
    """
    problems = Problems()
    models = {id(model.built): model.built, **{id(built): built for built, _ in model.specs.values()}}
    for built in models.values():
        problems.extend(prove_things(tuple(built.things.values()), built.sources, mesher))
    # What a figure sets may lift parts off on purpose.
    if model.is_sound:
        leaves = Leaves(mesher.box)
        problems.extend(check_sizes([model.built.things[root] for root in model.built.roots], leaves))
        problems.extend(check_contacts(tuple(model.built.things.values()), leaves, mesher))
    return problems.all()


def judge(model: Model, mesher: Prover) -> tuple[Problem, ...]:
    """Errors for facts that do not hold. What holds a part that could not be made or proved is passed over."""
    return tuple(each for each in judge_facts(model.built, mesher) if (each.code, each.span) not in model.known)


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
    if problems:
        return None, problems
    collected = Problems()
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
    if not isinstance(written, (tree.Path, tree.Call)):
        start = Span("--of", 1, 1, 1, len(path) + 1)
        raise mistake("wrong-form", start, "expected the path of a part or assembly, such as `gauge.funnel`")
    subject = find_subject(built, written, problems)
    rung = None if tolerance_mm is None else first_at_most(tolerance_mm)
    flattened, found = flatten(subject.thing, subject.path, rung, built.sources, mesher)
    problems.extend(found)
    if flattened is None:
        return None
    if not len(flattened.geometry.faces):
        raise mistake("nothing-to-show", written.span, f"`{subject.path}` holds no parts, so it has no triangles")
    return Exported(flattened.geometry, flattened.materials, tuple(range(len(flattened.geometry.nodes))))


def _figure(
    project: Project, built: Built, given: tuple[Assigned, ...], declaration: Declaration, problems: Problems
) -> tuple[Built, Spec] | None:
    """A figure's spec and the model it shows: its own where it sets parameters."""
    own = Problems()
    known = {(each.code, each.span) for each in problems.all()}
    lines = declaration.line.lines
    chosen = _assigned([line for line in lines if line.head.row == "with"], built, own)
    if chosen and not own.n_mistakes:
        given = _over(given, chosen)
        built, found = build_model(project.files, project.modules, given)
        own.extend(tuple(each for each in found if (each.code, each.span) not in known))
    spec, found = read_figure(built, declaration.line, declaration.name)
    own.extend(found)
    if spec is not None and not own.n_mistakes:
        known |= {(each.code, each.span) for each in own.all()}
        wanted = [line for line in lines if line.head.row == "extreme position"]
        if len(wanted) > limits.EXTREMES:
            own.error("too-much", wanted[-1].span, f"more than {limits.EXTREMES} extreme positions, the limit")
        extremes = [
            _extreme(project, built, given, declaration.line, line, known, own) for line in wanted[: limits.EXTREMES]
        ]
        spec = structs.replace(spec, extremes=tuple(each for each in extremes if each is not None))
    for problem in own.all():
        if problem.severity is Severity.ERROR or not chosen or problem.within:
            problems.add(_within(problem, declaration.name))
    is_sound = built.is_whole and not own.n_mistakes and not declaration.is_faulty
    return (built, spec) if is_sound and spec is not None else None


def _extreme(
    project: Project,
    built: Built,
    given: tuple[Assigned, ...],
    figure: tree.Line,
    line: tree.Line,
    known: Set[tuple[str, Span]],
    problems: Problems,
) -> Extreme | None:
    """What a figure shows at the values of one of its extreme positions; None where they cannot be taken."""
    before = problems.n_mistakes
    chosen = _assigned([line], built, problems)
    if problems.n_mistakes != before:
        return None
    model, found = build_model(project.files, project.modules, _over(given, chosen))
    problems.extend(tuple(each for each in found if is_error(each) and (each.code, each.span) not in known))
    with problems.collecting():
        if model.is_whole:
            return Extreme(thing_shown(model, figure, problems), model.sources, line.span)
    return None


def _assigned(lines: Sequence[tree.Line], built: Built, problems: Problems) -> tuple[Assigned, ...]:
    """What lines of a figure set, each parameter once."""
    found: list[Assigned] = []
    for line in lines:
        for setting in settings(line.head):
            with problems.collecting():
                found.append(Assigned(setting.name, evaluate(setting.value, built.scope), setting.span))
    return _chosen((), found, problems)


def _over(given: Sequence[Assigned], chosen: Sequence[Assigned]) -> tuple[Assigned, ...]:
    """Settings with others in the place of those of the same names."""
    names = {each.name for each in chosen}
    return (*(each for each in given if each.name not in names), *chosen)


def _chosen(base: Sequence[Assigned], more: Sequence[Assigned], problems: Problems) -> tuple[Assigned, ...]:
    """Settings of which each parameter has one, those of `more` before those of `base`."""
    named: dict[str, Assigned] = {each.name: each for each in base}
    said: dict[str, Assigned] = {}
    for each in more:
        if each.name in said:
            related = (Related(said[each.name].span, "set here first"),)
            problems.error("said-twice", each.span, f"`{each.name}` is set twice", "leave one out", related)
        said.setdefault(each.name, each)
    return tuple((named | said).values())


def _within(problem: Problem, figure: str) -> Problem:
    return Problem(
        problem.code, problem.severity, problem.span, problem.sentence, problem.hint, problem.related, figure
    )


def sources_of(settings: Iterable[Setting]) -> Iterator[tuple[str, Setting]]:
    """Settings from outside the text, each with the file that spans in its value name, which no two share."""
    numbers: dict[str, int] = {}
    for name, text in settings:
        numbers[name] = numbers.get(name, 0) + 1
        yield f"--set {name}" + (f" ({numbers[name]})" if numbers[name] > 1 else ""), (name, text)


def _from_texts(given: tuple[Setting, ...], problems: Problems) -> list[Assigned]:
    """Settings from outside the text, each with a span in a file named after the option."""
    found: list[Assigned] = []
    for file, (name, text) in sources_of(given):
        written, wrong = read_value(file, text)
        problems.extend(wrong)
        if written is not None and not wrong:
            with problems.collecting():
                found.append(Assigned(name, evaluate(written, outermost()), Span(file, 1, 1, 1, len(text) + 1)))
    return found

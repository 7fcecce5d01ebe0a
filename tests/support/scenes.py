"""Scenes as texts in memory, taken through the compiler's facade as far as asked."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from platewright.backend import contract
from platewright.compiler import scene
from platewright.compiler.solids.bounds import bounds
from platewright.compiler.solids.build import build
from platewright.compiler.solids.flaw import Flaw
from platewright.compiler.solids.recipe import Point3, Recipe
from platewright.lang.problems import Problem, is_error

MAIN = "scene.plate"


class Meshes:
    """A mesher that keeps what it has built, and counts."""

    def __init__(self) -> None:
        self.kept: dict[tuple[Recipe, float], tuple[contract.Mesh | None, tuple[Flaw, ...]]] = {}
        self.n_asked = 0

    def __call__(self, recipe: Recipe, rung: float) -> tuple[contract.Mesh | None, tuple[Flaw, ...]]:
        self.n_asked += 1
        if (recipe, rung) not in self.kept:
            self.kept[recipe, rung] = build(recipe, rung)
        return self.kept[recipe, rung]

    def flaws(self, recipe: Recipe, rung: float) -> tuple[Flaw, ...]:
        return self(recipe, rung)[1]

    def box(self, recipe: Recipe) -> tuple[Point3, Point3]:
        return bounds(recipe)


@dataclass
class Run:
    """What came of one scene: everything found on the way, and the last stage reached."""

    project: scene.Project | None
    model: scene.Model | None
    problems: list[Problem]
    meshes: Meshes = field(default_factory=Meshes)

    @property
    def errors(self) -> list[Problem]:
        return [problem for problem in self.problems if is_error(problem)]

    @property
    def sentences(self) -> list[str]:
        return [problem.sentence for problem in self.problems]

    @property
    def codes(self) -> list[str]:
        return [problem.code for problem in self.problems]


Texts = Mapping[str, str | bytes]


def loader(files: Texts) -> scene.Loader:
    """A loader that answers from texts, and refuses what is not among them."""

    def load(name: str) -> bytes | scene.Refusal:
        found = files.get(name)
        if found is None:
            return scene.Refusal("missing")
        return found.encode() if isinstance(found, str) else found

    return load


def variant_of(project: scene.Project, name: str) -> scene.Variant:
    return next(variant for variant in project.variants if variant.name == name)


def built(
    text: str | bytes,
    files: Texts | None = None,
    variant: str | None = None,
    settings: tuple[tuple[str, str], ...] = (),
) -> Run:
    """Open and build; nothing is meshed."""
    project, problems = scene.open_scene(MAIN, loader({MAIN: text, **(files or {})}))
    found = list(problems)
    model = None
    if project is not None:
        chosen = variant_of(project, variant) if variant else None
        model, more = scene.build(project, chosen, settings)
        found += more
    return Run(project, model, found)


def checked(text: str | bytes, files: Texts | None = None, variant: str | None = None) -> Run:
    """All that `check` does for one variant: build, prove, judge, and lay out every figure."""
    run = built(text, files, variant)
    if run.model is None or any(not problem.within for problem in run.errors):
        return run
    proved = scene.prove(run.model, run.meshes)
    # Scenes of tests lay things side by side; that these float has tests of its own.
    run.problems += [problem for problem in proved if problem.code != "floating-part"]
    if any(map(is_error, proved)):
        return run
    run.problems += scene.judge(run.model, run.meshes)
    for figure in run.model.figures:
        _, more = scene.plan(run.model, figure.name, run.meshes)
        run.problems += [problem for problem in more if problem not in run.problems]
    return run


def clean(text: str, files: Texts | None = None, variant: str | None = None) -> Run:
    """A run through everything that must give no problem, and a model."""
    run = checked(text, files, variant)
    assert run.problems == []
    assert run.model is not None
    return run


def planned(text: str, figure: str, files: Texts | None = None, resolution: float | None = None) -> contract.Job:
    """The job of one figure of a scene without problems."""
    run = built(text, files)
    assert run.errors == [] and run.model is not None
    job, problems = scene.plan(run.model, figure, run.meshes, resolution=resolution)
    assert problems == () and job is not None
    contract.verify(job)
    return job


def exported(text: str, path: str, tolerance: float | None = None, files: Texts | None = None) -> scene.Exported:
    """The triangles of a path of a scene without errors."""
    run = built(text, files)
    assert run.errors == [] and run.model is not None
    found, problems = scene.geometry(run.model, path, run.meshes, tolerance)
    assert problems == () and found is not None
    return found


def value_of(text: str, *lines: str) -> str:
    """A value as `list` spells it: the default of a parameter, after lines of derived values."""
    body = "".join(f"    {line}\n" for line in lines)
    derived = f"derived\n{body}" if lines else ""
    run = built(f"given\n    probe = {text}\n{derived}part p\n    add sphere diameter 1 mm\n")
    assert run.errors == [], run.sentences
    assert run.model is not None and run.project is not None
    listed, problems = scene.listing(run.model, run.project, run.meshes)
    assert problems == ()
    return next(row.value for row in listed.parameters if row.name == "probe")


def mistake_in(text: str, *lines: str) -> Problem:
    """The one error of a value."""
    body = "".join(f"    {line}\n" for line in lines)
    derived = f"derived\n{body}" if lines else ""
    run = built(f"given\n    probe = {text}\n{derived}part p\n    add sphere diameter 1 mm\n")
    (error,) = run.errors
    return error

"""One run of a command: the scene it opens, the variants it covers, the problems it gathers."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

from platewright.lang.problems import Problem, Related, is_error

from . import crash, files

if TYPE_CHECKING:
    from platewright.compiler.scene import Loader, Model, Project, Refusal, Setting, Variant

_MOST_NAMED_VARIANTS = 8


class UsageError(Exception):
    """The command line asks for something that does not exist or makes no sense; the sentence says what."""


class OutputError(Exception):
    """A file that was asked for cannot be written; the sentence says which and why."""


@dataclass(frozen=True, slots=True)
class Place:
    """Where a scene lies: its project folder, and its name in there as spans and `see` write names."""

    folder: Path
    name: str


@dataclass(slots=True)
class Findings:
    """All problems of a run in the order found, each once, with the variants it was found in."""

    found: dict[Problem, list[Variant | None]] = field(default_factory=dict)

    def add(self, problems: Iterable[Problem], variant: Variant | None = None) -> None:
        """Take in problems of the scene's defaults or of one variant."""
        for problem in problems:
            self.found.setdefault(problem, []).append(variant)

    def worded(self) -> tuple[Problem, ...]:
        """The problems; one that the defaults do not have points to the variants that do."""
        return tuple(_with_variants(problem, variants) for problem, variants in self.found.items())

    @property
    def has_errors(self) -> bool:
        """Whether any problem stops output."""
        return any(map(is_error, self.found))


def _with_variants(problem: Problem, variants: Sequence[Variant | None]) -> Problem:
    named = [variant for variant in variants if variant is not None]
    if len(named) < len(variants):
        return problem
    notes = [Related(variant.span, f"in variant {variant.name}") for variant in named[:_MOST_NAMED_VARIANTS]]
    if len(named) > _MOST_NAMED_VARIANTS:
        notes[-1] = Related(notes[-1].span, f"and in {len(named) - len(notes) + 1} variants more")
    return dataclasses.replace(problem, related=(*problem.related, *notes))


def locate(scene: Path, project: Path | None) -> Place:
    """Find the scene's project folder and its name in it. Raises UsageError if there is no file or it lies outside."""
    if scene.is_dir():
        raise UsageError(f"{scene} is a folder, not a scene file")
    if not scene.exists():
        raise UsageError(f"there is no file {scene}")
    real = scene.resolve()
    folder = real.parent if project is None else project.resolve()
    if not folder.is_dir():
        raise UsageError(f"there is no project folder {project}")
    if not real.is_relative_to(folder):
        raise UsageError(f"{scene} lies outside the project folder {project}")
    return Place(folder, real.relative_to(folder).as_posix())


def loader(place: Place, trace: crash.Trace) -> Loader:
    """A loader confined to the project folder, which also keeps what it reads for a fault's folder."""
    from platewright.compiler.scene import Refusal

    def load(name: str) -> bytes | Refusal:
        answer = files.read_confined(place.folder, name)
        if isinstance(answer, str):
            return Refusal(answer)
        trace.sources[name] = answer
        return answer

    return load


def texts(project: Project | None, trace: crash.Trace, settings: Iterable[Setting] = ()) -> dict[str, str]:
    """Every text that a problem may point into: files, with marks where one is not UTF-8, and values of `--set`."""
    read = {name: content.decode("utf-8", "replace") for name, content in trace.sources.items()}
    given = {f"--set {name}": value for name, value in settings}
    return read | (dict(project.texts) if project is not None else {}) | given


def open_project(arguments_scene: Path, folder: Path | None, trace: crash.Trace, findings: Findings) -> Project | None:
    """Read and parse a scene and all it sees. Raises UsageError; problems go to `findings`."""
    place = locate(arguments_scene, folder)
    from platewright.compiler.scene import open_scene

    trace.copies[str(arguments_scene)] = place.name
    trace.overrides = ("--project", crash.SOURCES, *trace.overrides)
    trace.stage = "reading the scene"
    project, problems = open_scene(place.name, loader(place, trace))
    findings.add(problems)
    return None if any(map(is_error, problems)) else project


def build_model(
    project: Project, variant: Variant | None, settings: tuple[Setting, ...], trace: crash.Trace
) -> tuple[Model | None, tuple[Problem, ...]]:
    """The scene with all parameters fixed, as `scene.build`, with no model where an error concerns all of it."""
    from platewright.compiler.scene import build

    trace.stage = f"building {title(variant)}"
    model, problems = build(project, variant, settings)
    return (None if any(is_error(problem) and not problem.within for problem in problems) else model), problems


def title(variant: Variant | None) -> str:
    """What a variant is called in a message."""
    return "the scene" if variant is None else f"variant {variant.name}"


def chosen_variants(project: Project, names: Sequence[str], everyone: bool) -> tuple[Variant | None, ...]:
    """The variants to cover: those named, all of them, or the defaults alone (None). Raises UsageError."""
    if everyone:
        if not project.variants:
            raise UsageError("the scene declares no variants")
        return tuple(project.variants)
    if not names:
        return (None,)
    known = {variant.name: variant for variant in project.variants}
    return tuple(known[name] for name in _checked(names, known, "variant"))


def chosen_figures(project: Project, names: Sequence[str]) -> tuple[str, ...]:
    """The declared figures to make: those named, else all, in the order of the source. Raises UsageError.

    Empty for a scene that declares none, whose one figure is that of its unplaced thing.
    """
    from platewright.compiler.scene import figure_names

    known = figure_names(project)
    wanted = set(_checked(names, known, "figure")) or set(known)
    return tuple(name for name in known if name in wanted)


def _checked(names: Sequence[str], known: Iterable[str], what: str) -> Iterator[str]:
    choices = list(known)
    for name in dict.fromkeys(names):
        if name not in choices:
            raise UsageError(unknown(name, choices, what))
        yield name


def unknown(name: str, known: Iterable[str], what: str) -> str:
    """The sentence for a name that is not among those known, with the nearest one that is."""
    from platewright.lang.nearest import nearest

    choices = list(known)
    if near := nearest(name, choices):
        return f"there is no {what} `{name}`; did you mean `{near}`?"
    listed = ", ".join(choices[:12]) + (", …" if len(choices) > 12 else "")
    return f"there is no {what} `{name}`; " + (f"the scene has {listed}" if choices else f"the scene has no {what}s")

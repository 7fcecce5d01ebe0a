"""One run of a command: the scene it opens, the variants it covers, the problems it gathers."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

from msgspec import structs
from platewright.lang.problems import Problem, Related, is_error

from . import crash, files, names
from .meshes import KeptMeshes

if TYPE_CHECKING:
    from platewright.compiler.scene import Acceptance, Loader, Model, Project, Refusal, Setting, Variant

_MOST_NAMED_VARIANTS = 8

_AMBIGUOUS = ("duplicate-name",)
"""Codes of errors that leave two meanings, so that what is found by following one of them may not be meant."""


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
    acceptances: tuple[Acceptance, ...] = ()
    used: dict[Acceptance, None] = field(default_factory=dict)

    def add(self, problems: Iterable[Problem], variant: Variant | None = None) -> None:
        """Take in problems of the scene's defaults or of one variant, but for warnings that the scene accepts."""
        for problem in problems:
            covers = [each for each in self.acceptances if each.covers(problem)]
            self.used.update((each, None) for each in covers)
            if not covers:
                self.found.setdefault(problem, []).append(variant)

    def worded(self, after: int = 0) -> tuple[Problem, ...]:
        """The problems but for the first `after` found, in the order of the text.

        One that the defaults do not have points to the variants that do.
        """
        news = [_with_variants(problem, variants) for problem, variants in list(self.found.items())[after:]]
        files = list(dict.fromkeys(problem.span.file for problem in self.found))
        return tuple(sorted(news, key=lambda problem: (files.index(problem.span.file), problem.span)))

    @property
    def has_errors(self) -> bool:
        """Whether any problem stops output."""
        return any(map(is_error, self.found))

    def stops(self, figures: Sequence[str]) -> bool:
        """Whether any problem stops one of these figures: one that concerns all, or is confined to one of them."""
        return any(is_error(problem) and (not problem.within or problem.within in figures) for problem in self.found)


def _with_variants(problem: Problem, variants: Sequence[Variant | None]) -> Problem:
    named = [variant for variant in variants if variant is not None]
    if len(named) < len(variants) or any(_is_on_line(problem, variant) for variant in named):
        return problem
    notes = [Related(variant.span, f"in variant {variant.name}") for variant in named[:_MOST_NAMED_VARIANTS]]
    if len(named) > _MOST_NAMED_VARIANTS:
        notes[-1] = Related(notes[-1].span, f"and in {len(named) - len(notes) + 1} variants more")
    return structs.replace(problem, related=(*problem.related, *notes))


def _is_on_line(problem: Problem, variant: Variant) -> bool:
    return (problem.span.file, problem.span.line) == (variant.span.file, variant.span.line)


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


@dataclass(slots=True)
class Session:
    """A scene that has been opened; `project` is None if it gives no text. Problems gather in `findings`."""

    project: Project | None
    opening: tuple[Problem, ...]
    trace: crash.Trace
    findings: Findings
    mesher: KeptMeshes = field(default_factory=KeptMeshes)

    def build(self, variant: Variant | None = None, settings: tuple[Setting, ...] = ()) -> Model | None:
        """The model of one variant; None where an error of the opening or of the building concerns all of it."""
        model, is_sound = self.attempt(variant, settings)
        return model if is_sound else None

    def attempt(self, variant: Variant | None = None, settings: tuple[Setting, ...] = ()) -> tuple[Model | None, bool]:
        """What could be made of one variant, proved, and whether it is free of errors that concern all of it.

        None where nothing can be told of it: it has no text, or it may mean either of two things.
        """
        from platewright.compiler.scene import attempt, prove

        if self.project is None:
            return None, False
        self.trace.stage = f"building {title(variant)}"
        model, problems = attempt(self.project, variant, settings)
        is_clear = not any(each.code in _AMBIGUOUS for each in (*self.opening, *problems) if is_error(each))
        if is_clear:
            self.trace.stage = f"proving the parts of {title(variant)}"
            problems = (*problems, *names.problems(model.figures, "figure"), *prove(model, self.mesher))
        self.findings.add(problems, variant)
        return model if is_clear else None, not any(map(_concerns_all, (*self.opening, *problems)))

    def bad_figures(self, model: Model) -> frozenset[str]:
        """Figures that a problem found so far keeps from being made."""
        problems = (*filter(self._is_of_main, self.opening), *model.problems)
        return frozenset(problem.within for problem in problems if is_error(problem))

    def _is_of_main(self, problem: Problem) -> bool:
        """Whether a problem of the opening stands in the scene itself: figures of files it sees are not made."""
        return self.project is not None and problem.span.file == self.project.main

    def texts(self, settings: Iterable[Setting] = ()) -> dict[str, str]:
        """Every text that a problem may point into: files, with marks where one is not UTF-8, and values of `--set`."""
        read = {name: content.decode("utf-8", "replace") for name, content in self.trace.sources.items()}
        from platewright.compiler.scene import sources_of

        given = {file: value for file, (_, value) in sources_of(settings)}
        return read | (dict(self.project.texts) if self.project is not None else {}) | given


def _concerns_all(problem: Problem) -> bool:
    return is_error(problem) and not problem.within


def open_session(scene: Path, folder: Path | None, trace: crash.Trace) -> Session:
    """Read and parse a scene and all it sees, in the project folder given or else the scene's. Raises UsageError."""
    place = locate(scene, folder)
    from platewright.compiler.scene import open_scene

    trace.copies[str(scene)] = place.name
    trace.overrides = ("--project", crash.SOURCES, *trace.overrides)
    trace.stage = "reading the scene"
    project, problems = open_scene(place.name, loader(place, trace))
    if project is not None:
        problems = (*problems, *names.problems(project.variants, "variant"))
    findings = Findings(acceptances=project.acceptances if project is not None else ())
    findings.add(problems)
    return Session(project, problems, trace, findings)


def title(variant: Variant | None) -> str:
    """What a variant is called in a message."""
    return "the scene" if variant is None else f"variant {variant.name}"


def chosen_variants(project: Project, wanted: Sequence[str], everyone: bool) -> tuple[Variant | None, ...]:
    """The variants to cover: those named, all of them, or the defaults alone (None). Raises UsageError."""
    if everyone:
        if not project.variants:
            raise UsageError("the scene declares no variants")
        return tuple(project.variants)
    if not wanted:
        return (None,)
    known = {variant.name: variant for variant in project.variants}
    return tuple(known[name] for name in _checked(wanted, known, "variant"))


def chosen_figures(project: Project, wanted: Sequence[str]) -> tuple[str, ...]:
    """The declared figures to make: those named, else all, in the order of the source. Raises UsageError.

    Empty for a scene that declares none, whose one figure is that of its unplaced thing.
    """
    from platewright.compiler.scene import figure_names

    known = figure_names(project)
    chosen = set(_checked(wanted, known, "figure")) or set(known)
    return tuple(name for name in known if name in chosen)


def _checked(wanted: Sequence[str], known: Iterable[str], what: str) -> Iterator[str]:
    choices = list(known)
    for name in dict.fromkeys(wanted):
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

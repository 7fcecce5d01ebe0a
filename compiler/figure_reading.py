"""What a figure says: from the lines of a `figure` declaration to its values, with defaults filled in."""

from __future__ import annotations

from typing import Literal, get_args

from msgspec.structs import replace
from platewright.backend.contract import FileKind
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem
from platewright.lang.source import Span
from platewright.lang.units import NUMBER

from . import limits
from .build import Model
from .emphasis import read_stresses
from .expressions import evaluate, quantity, text
from .graph import Solid, Thing
from .lightings import DEFAULT, Sources
from .mistakes import Mistake, Problems, confined, mistake
from .modules import find_kind
from .placement import positive_length
from .projections import standard
from .readings import LATER, expression, optional
from .scope import Scope, did_you_mean
from .section_reading import read_cuts, read_details, read_interruptions, read_uncut
from .specs import Exploded, Spec
from .styles import read_manner
from .subjects import find_subject
from .values import Proportion, kind_of
from .view_reading import find_viewpoint, read_views

FILE_KINDS: tuple[FileKind, ...] = get_args(FileKind)

MOST_EXPLODED = 100.0


def read_figure(model: Model, line: tree.Line, name: str) -> tuple[Spec | None, tuple[Problem, ...]]:
    """What a figure says. Problems are confined to the figure."""
    reading = _Reading(model, line, name)
    spec = reading.spec()
    found = tuple(confined(problem, name) for problem in reading.problems.all())
    return (None if reading.problems.has_errors else spec), found


def thing_shown(model: Model, line: tree.Line, problems: Problems) -> Thing:
    """The thing that a figure shows, in a model of other values. Raises Mistake."""
    show = next((each for each in line.lines if each.head.row == "show"), None)
    if show is None:
        return only_root(model, line.head.span)[1]
    written = expression(show.head, "subject")
    assert isinstance(written, (tree.Path, tree.Call))
    return find_subject(model, written, problems).thing


def default_figure(model: Model, span: Span) -> tuple[Spec | None, tuple[Problem, ...]]:
    """The figure of a scene that declares none: its one unplaced thing, named after it."""
    problems = Problems()
    with problems.collecting():
        root, thing = only_root(model, span)
        viewpoint = standard("isometric")
        assert viewpoint is not None
        return Spec(root, thing, root, viewpoint, DEFAULT, thing.span), problems.all()
    return None, problems.all()


def only_root(model: Model, span: Span) -> tuple[str, Thing]:
    """The one thing that nothing else places: the one assembly, else the one part. Raises Mistake."""
    assemblies = [name for name in model.roots if not isinstance(model.things[name], Solid)]
    candidates = assemblies or list(model.roots)
    if not model.is_whole:
        raise Mistake(None)
    if len(candidates) == 1:
        return candidates[0], model.things[candidates[0]]
    if not candidates:
        raise mistake("nothing-to-show", span, "there is no part or assembly to show")
    names = ", ".join(f"`{name}`" for name in candidates)
    sentence = f"nothing says which of these to show: {names}"
    raise mistake("nothing-to-show", span, sentence, f"write a figure that says `show {candidates[0]}`")


class _Reading:
    """Reads one figure's lines."""

    def __init__(self, model: Model, line: tree.Line, name: str) -> None:
        self.model, self.line, self.name = model, line, name
        self.problems = Problems()
        self.scope: Scope = model.scope

    def spec(self) -> Spec | None:
        lines: dict[str, tree.Line] = {}
        for line in self.line.lines:
            if line.head.row not in LATER:
                lines.setdefault(line.word, line)
        if "size" in lines and "width" in lines:
            self.problems.error("said-twice", lines["width"].head.word_span, "`size` states the width already")
        found: Spec | None = None
        with self.problems.collecting():
            found = self._subject(lines.get("show"))
        changes: dict[str, object] = {}
        if found is not None:
            changes["cuts"] = read_cuts(self.line.lines, found.subject, self.scope, self.problems)
            changes["interruptions"] = read_interruptions(self.line.lines, found.subject, self.scope, self.problems)
            changes["uncut"] = read_uncut(self.line.lines, found.subject, found.path, self.scope, self.problems)
            changes["details"] = read_details(self.line.lines, found.subject, found.path, self.scope, self.problems)
            changes["stresses"] = read_stresses(self.line.lines, found.subject, found.path, self.scope, self.problems)
            views = read_views(self.model, self.line.lines, found.subject, self.problems)
            changes["view_set"], changes["looks"] = views.of_set, views.looks
        changes["manner"] = read_manner(self.line.lines, self.scope, self.problems)
        for each, line in lines.items():
            with self.problems.collecting():
                changes.update(self._read(each, line.head))
        return replace(found, **changes) if found is not None else None

    def _subject(self, line: tree.Line | None) -> Spec:
        viewpoint, sources = standard("isometric"), DEFAULT
        assert viewpoint is not None
        if line is None:
            root, thing = only_root(self.model, self.line.head.span)
            return Spec(self.name, thing, root, viewpoint, sources, self.line.head.span)
        view, lighting = optional(line.head, "viewpoint"), optional(line.head, "lighting")
        with self.problems.collecting():
            if isinstance(view, tree.Path):
                viewpoint = find_viewpoint(self.model, view, self.problems)
        with self.problems.collecting():
            if isinstance(lighting, tree.Path):
                sources = self._lighting(lighting)
        written = expression(line.head, "subject")
        assert isinstance(written, (tree.Path, tree.Call))
        subject = find_subject(self.model, written, self.problems)
        return Spec(self.name, subject.thing, subject.path, viewpoint, sources, self.line.head.span)

    def _lighting(self, path: tree.Path) -> Sources:
        here, declaration = find_kind(self.model.modules, self.model.module, path, ("lighting",))
        described = self.model.lightings[here.file, declaration.name]
        self.problems.extend(described.problems)
        if described.value is None:
            raise Mistake(None)
        return described.value

    def _read(self, each: str, head: tree.Reading) -> dict[str, object]:
        match each:
            case "width":
                at_most = optional(head, "height")
                return {
                    "width": self._paper(expression(head, "width"), "width"),
                    "at_most": self._paper(at_most, "height") if at_most is not None else None,
                }
            case "size":
                width, height = expression(head, "width"), expression(head, "height")
                return {"width": self._paper(width, "width"), "height": self._paper(height, "height")}
            case "scale":
                return {"scale": self._scale(optional(head, "scale"))}
            case "true projection":
                return {"true_projection": True}
            case "margin":
                return {"margin": positive_length(expression(head, "margin"), self.scope, "margin", zero=True)}
            case "exploded":
                return {"exploded": Exploded(self._factor(optional(head, "factor")), head.span)}
            case "files":
                return {"files": self._files(head)}
            case "title" | "alt" | "description":
                return {each: text(expression(head, "text"), self.scope)}
        return {}

    def _paper(self, written: tree.Expression, what: str) -> float:
        value = positive_length(written, self.scope, what)
        if value > limits.PAPER_MM:
            raise mistake("out-of-range", written.span, f"{what}: more than {limits.PAPER_MM:g} mm of paper, the limit")
        return value

    def _factor(self, written: tree.Expression | None) -> float:
        """How far an exploded figure moves things, in parts of what they state."""
        if written is None:
            return 1.0
        factor = quantity(written, self.scope, NUMBER)
        if not 0 <= factor <= MOST_EXPLODED:
            sentence = f"expected a factor from 0 to {MOST_EXPLODED:g}, found {factor:g}"
            raise mistake("out-of-range", written.span, sentence)
        return factor

    def _scale(self, written: tree.Expression | None) -> float | Literal["standard"]:
        if written is None:
            return "standard"
        value = evaluate(written, self.scope)
        if not isinstance(value, Proportion):
            raise mistake("wrong-kind", written.span, f"expected a scale such as `1:2`, found {kind_of(value)}")
        if value.first <= 0 or value.second <= 0:
            raise mistake("out-of-range", written.span, "the numbers of a scale are above 0")
        return value.first / value.second

    def _files(self, head: tree.Reading) -> tuple[FileKind, ...]:
        wanted = head.get("files")
        found: list[FileKind] = []
        for each in wanted if isinstance(wanted, tuple) else ():
            if not isinstance(each, tree.Path):
                continue
            kind = each.dotted
            if kind not in FILE_KINDS:
                hint = did_you_mean(nearest(kind, FILE_KINDS)) or ", ".join(FILE_KINDS[:-1]) + f" or {FILE_KINDS[-1]}"
                self.problems.error("unknown-name", each.span, f"there is no kind of file called `{kind}`", hint)
            found += [drawable for drawable in FILE_KINDS if drawable == kind]
        return tuple(dict.fromkeys(found))

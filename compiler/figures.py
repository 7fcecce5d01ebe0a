"""Figures: from a `figure` declaration to the view, the page and the job the backend draws."""

from __future__ import annotations

from typing import Literal

import numpy as np
from msgspec.structs import replace
from platewright.backend import camera, contract
from platewright.backend.contract import F64
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, is_error
from platewright.lang.source import Span

from . import limits
from .build import Model
from .expressions import evaluate, text
from .flatten import Flattened, Mesher, flatten, walked
from .frames import RESOLUTION_DPI, Frame, Spec, central_frame, parallel_frame
from .graph import Solid, Thing
from .lightings import DEFAULT, Sources, lights_for
from .mistakes import Mistake, Problems, mistake
from .modules import find_kind
from .placement import positive_length
from .readings import LATER, expression, optional, word
from .scope import Scope, did_you_mean
from .solids.bounds import bounds
from .solids.ladder import first_at_most
from .subjects import find_subject
from .values import Proportion, kind_of
from .viewpoints import STANDARD_SIDES, Parallel, Viewpoint, standard

ERROR_ON_PAPER_MM = 0.02
"""The chord error on paper that a figure's rung keeps to, at its nearest point."""

DRAWABLE: tuple[Literal["png", "tiff"], ...] = ("png", "tiff")
LEAST_ON_PAPER_MM = 0.05
"""A subject smaller than this on paper is not drawn: about a dot at 500 to the inch."""

NOT_YET = ("svg", "pdf", "eps")


def read_figure(model: Model, line: tree.Line, name: str) -> tuple[Spec | None, tuple[Problem, ...]]:
    """What a figure says. Problems are confined to the figure."""
    reading = _Reading(model, line, name)
    spec = reading.spec()
    found = tuple(_confined(problem, name) for problem in reading.problems.all())
    return (None if reading.problems.has_errors else spec), found


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


def plan_figure(
    model: Model, spec: Spec, mesher: Mesher, resolution: float | None = None, measures: bool = False
) -> tuple[contract.Job | None, tuple[Problem, ...]]:
    """The job that draws a figure. Cost: one or two flattenings and a pass over the vertices."""
    problems = Problems()
    planner = _Planner(model, spec, mesher, problems)
    job: contract.Job | None = None
    with problems.collecting():
        job = planner.job(resolution or RESOLUTION_DPI, measures)
    found = tuple(_confined(problem, spec.name) for problem in problems.all())
    return (None if problems.has_errors else job), found


def _confined(problem: Problem, name: str) -> Problem:
    return Problem(problem.code, problem.severity, problem.span, problem.sentence, problem.hint, problem.related, name)


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
                viewpoint = self._viewpoint(view)
        with self.problems.collecting():
            if isinstance(lighting, tree.Path):
                sources = self._lighting(lighting)
        written = expression(line.head, "subject")
        assert isinstance(written, (tree.Path, tree.Call))
        subject = find_subject(self.model, written, self.problems)
        return Spec(self.name, subject.thing, subject.path, viewpoint, sources, self.line.head.span)

    def _viewpoint(self, path: tree.Path) -> Viewpoint:
        module = self.model.module
        if len(path.steps) == 1 and path.dotted not in module.names:
            found = standard(path.dotted)
            if found is not None:
                return found
            if path.dotted in module.broken:
                raise Mistake(None)
            declared = (name for name, each in module.names.items() if each.kind == "viewpoint")
            near = nearest(path.dotted, [*declared, *STANDARD_SIDES, "isometric"])
            hint = did_you_mean(near) or "declare it with `viewpoint`, or take front, top, isometric …"
            raise mistake("unknown-name", path.span, f"there is no viewpoint `{path.dotted}`", hint)
        here, declaration = find_kind(self.model.modules, module, path, ("viewpoint",))
        described = self.model.viewpoints[here.file, declaration.name]
        self.problems.extend(described.problems)
        if described.value is None:
            raise Mistake(None)
        return described.value

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
            case "drawn as":
                return {"style": word(head, "style")}
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

    def _scale(self, written: tree.Expression | None) -> float | Literal["standard"]:
        if written is None:
            return "standard"
        value = evaluate(written, self.scope)
        if not isinstance(value, Proportion):
            raise mistake("wrong-kind", written.span, f"expected a scale such as `1:2`, found {kind_of(value)}")
        if value.first <= 0 or value.second <= 0:
            raise mistake("out-of-range", written.span, "the numbers of a scale are above 0")
        return value.first / value.second

    def _files(self, head: tree.Reading) -> tuple[Literal["png", "tiff"], ...]:
        wanted = head.get("files")
        found: list[Literal["png", "tiff"]] = []
        for each in wanted if isinstance(wanted, tuple) else ():
            if not isinstance(each, tree.Path):
                continue
            kind = each.dotted
            if kind in NOT_YET:
                self.problems.error(
                    "not-drawn-yet", each.span, f"files of kind `{kind}` are not drawn yet", "png or tiff"
                )
            elif kind not in DRAWABLE:
                hint = did_you_mean(nearest(kind, [*DRAWABLE, *NOT_YET])) or "png or tiff"
                self.problems.error("unknown-name", each.span, f"there is no kind of file called `{kind}`", hint)
            else:
                found += [drawable for drawable in DRAWABLE if drawable == kind]
        return tuple(dict.fromkeys(found))


class _Planner:
    """Fits one figure: boxes first, then the mesh of the rung they ask for."""

    def __init__(self, model: Model, spec: Spec, mesher: Mesher, problems: Problems) -> None:
        self.model, self.spec, self.mesher, self.problems = model, spec, mesher, problems

    def job(self, resolution: float, measures: bool) -> contract.Job | None:
        spec = self.spec
        frame = self._frame(_box_corners(spec.subject, spec.path))
        rung = first_at_most(ERROR_ON_PAPER_MM / frame.magnification)
        flattened = self._flatten(rung)
        if flattened is None:
            return None
        frame = self._frame(flattened.geometry.vertices)
        finer = first_at_most(ERROR_ON_PAPER_MM / frame.magnification)
        if finer < rung:
            flattened = self._flatten(finer)
            if flattened is None:
                return None
            frame = self._frame(flattened.geometry.vertices)
        return self._sheet(frame, flattened, resolution, measures)

    def _flatten(self, rung: float) -> Flattened | None:
        spec = self.spec
        flattened, problems = flatten(spec.subject, spec.path, rung, self.model.sources, self.mesher)
        # Warnings about parts are the scene's, and `prove` has given them.
        self.problems.extend(tuple(problem for problem in problems if is_error(problem)))
        return flattened

    def _frame(self, points: F64) -> Frame:
        viewpoint = self.spec.viewpoint
        if isinstance(viewpoint, Parallel):
            return parallel_frame(self.spec, viewpoint, points)
        return central_frame(self.spec, viewpoint, points)

    def _sheet(self, frame: Frame, flattened: Flattened, resolution: float, measures: bool) -> contract.Job:
        spec, geometry = self.spec, flattened.geometry
        page = contract.Page(frame.width, frame.height, resolution)
        columns, rows = page.pixels
        if columns * rows > limits.PIXELS:
            sentence = f"{columns:,} x {rows:,} pixels are more than {limits.PIXELS:,}, the limit"
            raise mistake("too-much", spec.span, sentence, "a smaller size or a lower resolution")
        self._seen(frame, geometry.vertices)
        middle = (geometry.vertices.min(axis=0) + geometry.vertices.max(axis=0)) / 2
        target = (float(middle[0]), float(middle[1]), float(middle[2]))
        style = contract.Style(spec.style, 4 if spec.style == "tone" else 1)
        lighting = lights_for(spec.sources, frame.projection, target)
        place = (0.0, 0.0, frame.width, frame.height)
        panel = contract.Panel(spec.path, 0, frame.projection, place, style, lighting)
        wanted = _measured(geometry) if measures else ()
        sheet = contract.Sheet(
            spec.name, page, (panel,), spec.files, (), spec.title, spec.alt, spec.description, "", wanted
        )
        return contract.Job((geometry,), flattened.materials, sheet)

    def _seen(self, frame: Frame, vertices: F64) -> None:
        """A figure with nothing in view is a problem; one whose subject leaves the page says so."""
        points, _ = camera.to_page(frame.projection, vertices)
        inside = (points >= 0).all(axis=1) & (points <= (frame.width, frame.height)).all(axis=1)
        spans = np.nanmin(points, axis=0), np.nanmax(points, axis=0)
        reach = float((spans[1] - spans[0]).max())
        if reach < LEAST_ON_PAPER_MM:
            sentence = f"the whole subject would be {reach:.2g} mm large on paper, too small to be seen"
            raise mistake("nothing-in-view", self.spec.span, sentence, "a larger scale")
        if inside.all():
            return
        misses = not inside.any() and ((spans[0] > (frame.width, frame.height)).any() or (spans[1] < 0).any())
        if misses:
            raise mistake("nothing-in-view", self.spec.span, "nothing of the subject lies within this view")
        over = 1e-6 + max(0.0, float(-spans[0].min()), float((spans[1] - (frame.width, frame.height)).max()))
        if over > 0.01 or not np.isfinite(points).all():
            sentence = "the subject reaches past the edge of the page"
            hint = "a shorter lens, a wider angle of view, or an eye further off"
            self.problems.warn("cropped", self.spec.span, sentence, hint)


def _measured(geometry: contract.Geometry) -> tuple[contract.MeasureWanted, ...]:
    """The subject and everything placed directly in it."""
    return tuple(contract.MeasureWanted(0, row) for row, node in enumerate(geometry.nodes) if node.parent <= 0)


def _box_corners(thing: Thing, name: str) -> F64:
    """World corners of the boxes of all solids below a thing, (8n,3). Raises Mistake if there are none."""
    rows: dict[int, tuple[Solid, list[int]]] = {}
    entries, placements = walked(thing, name)
    for row, entry in enumerate(entries):
        if isinstance(entry.thing, Solid):
            rows.setdefault(id(entry.thing), (entry.thing, []))[1].append(row)
    if not rows:
        raise mistake("nothing-to-show", thing.span, f"`{name}` holds no parts, so there is nothing to show")
    corners: list[F64] = []
    for solid, copies in rows.values():
        (x0, y0, z0), (x1, y1, z1) = bounds(solid.recipe)
        box = np.array([(x, y, z) for x in (x0, x1) for y in (y0, y1) for z in (z0, z1)])
        placed = placements[copies]
        corners.append((box @ placed[:, :3, :3].transpose(0, 2, 1) + placed[:, None, :3, 3]).reshape(-1, 3))
    return np.concatenate(corners)

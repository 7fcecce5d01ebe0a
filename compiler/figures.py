"""Figures: from a `figure` declaration to the view, the page and the job the backend draws."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from platewright.backend import camera, contract
from platewright.backend.contract import F64, Projection
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, is_error
from platewright.lang.source import Span

from . import limits
from .build import Model
from .expressions import Scope, evaluate, text
from .flatten import Flattened, Mesher, flatten
from .graph import Solid, Thing, walk
from .lightings import DEFAULT, Sources, lights_for, read_lighting
from .materials import said_twice
from .mistakes import Problems, mistake
from .modules import find_kind
from .paths import Placed, follow
from .placement import positive_length
from .readings import expression, optional, word
from .solids.bounds import bounds
from .solids.ladder import first_at_most
from .solids.transform import matrix
from .values import Proportion, kind_of
from .viewpoints import STANDARD_SIDES, Central, Parallel, Viewpoint, read_viewpoint, standard

ERROR_ON_PAPER_MM = 0.02
"""The chord error on paper that a figure's rung keeps to, at its nearest point."""

WIDTH_MM, MARGIN_MM, RESOLUTION_DPI = 84.0, 2.0, 600.0
DRAWABLE: tuple[Literal["png", "tiff"], ...] = ("png", "tiff")
NOT_YET = ("svg", "pdf", "eps")

STANDARD_SCALES = tuple(
    ratio for power in (1e3, 1e2, 1e1, 1.0, 1e-1, 1e-2, 1e-3, 1e-4) for ratio in (5 * power, 2 * power, power)
)
"""Scales of ISO 5455 (1, 2 and 5 times the powers of ten), largest first."""

ONCE = (
    "show",
    "width",
    "size",
    "scale",
    "true projection",
    "margin",
    "drawn as",
    "files",
    "title",
    "alt",
    "description",
)
"""Words that may stand once in a figure."""

Style = Literal["tone", "survey part", "survey depth", "survey facing"]


@dataclass(frozen=True, slots=True)
class Spec:
    """What a figure says, with its values fixed and its defaults filled in. Lengths are mm on paper."""

    name: str
    subject: Thing
    path: str
    viewpoint: Viewpoint
    sources: Sources
    span: Span
    width: float | None = None
    at_most: float | None = None
    height: float | None = None
    scale: float | Literal["standard"] | None = None
    true_projection: bool = False
    margin: float = MARGIN_MM
    style: Style = "tone"
    says_style: bool = True
    files: tuple[Literal["png", "tiff"], ...] = ("png",)
    title: str = ""
    alt: str = ""
    description: str = ""


@dataclass(frozen=True, slots=True)
class Frame:
    """A page and the projection onto it. `magnification` is mm on paper a model mm at the nearest point."""

    width: float
    height: float
    projection: Projection
    magnification: float


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
        return Spec(root, thing, root, viewpoint, DEFAULT, thing.span, says_style=False), problems.all()
    return None, problems.all()


def only_root(model: Model, span: Span) -> tuple[str, Thing]:
    """The one thing that nothing else places: the one assembly, else the one part. Raises Mistake."""
    assemblies = [name for name in model.roots if not isinstance(model.things[name], Solid)]
    candidates = assemblies or list(model.roots)
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
        self.scope: Scope = model.scopes[model.files.main]
        self.module = model.modules[model.files.main]

    def spec(self) -> Spec | None:
        said: dict[str, Span] = {}
        lines: dict[str, tree.Line] = {}
        for line in self.line.lines:
            if line.word in ONCE:
                said_twice(line, said, self.problems)
            lines.setdefault(line.word, line)
        if "size" in lines and "width" in lines:
            self.problems.error("said-twice", lines["width"].head.word_span, "`size` states the width already")
        found: Spec | None = None
        with self.problems.collecting():
            found = self._subject(lines.get("show"))
        if found is None:
            return None
        changes: dict[str, object] = {"says_style": "drawn as" in lines}
        for each, line in lines.items():
            with self.problems.collecting():
                changes.update(self._read(each, line.head))
        return _replaced(found, changes)

    def _subject(self, line: tree.Line | None) -> Spec:
        viewpoint, sources = standard("isometric"), DEFAULT
        assert viewpoint is not None
        if line is None:
            root, thing = only_root(self.model, self.line.head.span)
            return Spec(self.name, thing, root, viewpoint, sources, self.line.span)
        written = expression(line.head, "subject")
        assert isinstance(written, (tree.Path, tree.Call))
        thing, path = self._thing(written)
        view = optional(line.head, "viewpoint")
        if isinstance(view, tree.Path):
            viewpoint = self._viewpoint(view)
        lighting = optional(line.head, "lighting")
        if isinstance(lighting, tree.Path):
            here, declaration = find_kind(self.model.modules, self.module, lighting, ("lighting",))
            sources = read_lighting(declaration.line, self.model.scopes[here.file], self.problems)
        return Spec(self.name, thing, path, viewpoint, sources, self.line.span)

    def _thing(self, written: tree.Path | tree.Call) -> tuple[Thing, str]:
        """The thing shown and its path: a part or assembly by name, or something placed in one."""
        if isinstance(written, tree.Call):
            return self.model.instantiate(written), written.path.dotted
        first = written.steps[0]
        declared = self.module.names.get(first.name)
        if len(written.steps) == 1 or (declared is not None and declared.kind == "see"):
            return self.model.instantiate(written), written.dotted
        root = self.model.instantiate(tree.Path((first,), first.span))
        target = follow(root, written.steps[1:], self.scope)
        if not isinstance(target, Placed):
            raise mistake("wrong-kind", written.span, f"`{written.dotted}` is a mark or feature; a figure shows things")
        return target.thing, f"{first.name}.{target.path}"

    def _viewpoint(self, path: tree.Path) -> Viewpoint:
        if len(path.steps) == 1 and path.dotted not in self.module.names:
            found = standard(path.dotted)
            if found is not None:
                return found
            known = [
                *(n for n, each in self.module.names.items() if each.kind == "viewpoint"),
                *STANDARD_SIDES,
                "isometric",
            ]
            near = nearest(path.dotted, known)
            hint = f"did you mean `{near}`?" if near else "declare it with `viewpoint`, or take front, top, isometric …"
            raise mistake("unknown-name", path.span, f"there is no viewpoint `{path.dotted}`", hint)
        here, declaration = find_kind(self.model.modules, self.module, path, ("viewpoint",))
        viewpoint = read_viewpoint(declaration.line, self.model.scopes[here.file], self.problems)
        if viewpoint is None:
            raise mistake("no-projection", declaration.span, f"the viewpoint `{path.dotted}` states no projection")
        return viewpoint

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
                near = nearest(kind, [*DRAWABLE, *NOT_YET])
                hint = f"did you mean `{near}`?" if near else "png or tiff"
                self.problems.error("unknown-name", each.span, f"there is no kind of file called `{kind}`", hint)
            else:
                found += [drawable for drawable in DRAWABLE if drawable == kind]
        return tuple(dict.fromkeys(found))


def _replaced(spec: Spec, changes: dict[str, object]) -> Spec:
    values = {name: getattr(spec, name) for name in Spec.__dataclass_fields__}
    return Spec(**(values | changes))


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
        if inside.all():
            return
        spans = np.nanmin(points, axis=0), np.nanmax(points, axis=0)
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
    """World corners of the boxes of all solids below a thing, (8n,3)."""
    boxes: dict[int, F64] = {}
    corners: list[F64] = []
    for entry in walk(thing, name):
        if isinstance(entry.thing, Solid):
            if id(entry.thing) not in boxes:
                (x0, y0, z0), (x1, y1, z1) = bounds(entry.thing.recipe)
                boxes[id(entry.thing)] = np.array(
                    [(x, y, z, 1.0) for x in (x0, x1) for y in (y0, y1) for z in (z0, z1)]
                )
            corners.append((boxes[id(entry.thing)] @ matrix(entry.placement).T)[:, :3])
    return np.concatenate(corners)


def parallel_frame(spec: Spec, viewpoint: Parallel, points: F64) -> Frame:
    """The page of a parallel projection of world points (n,3). Raises Mistake where the content does not fit."""
    low, high = camera.extents(viewpoint.axes, points)
    wide, tall = float(high[0] - low[0]), float(high[1] - low[1])
    ratio = 1.0 if spec.true_projection else camera.along_axes(viewpoint.axes)
    if spec.scale is None:
        width, height, magnification = _fitted(spec, wide, tall)
    else:
        width, height, magnification = _scaled(spec, wide, tall, ratio)
    _check_page(spec, width, height)
    right, up, _ = (np.array(each) for each in (viewpoint.axes.right, viewpoint.axes.up, viewpoint.axes.sight))
    middle = right * (low[0] + high[0]) / 2 + up * (low[1] + high[1]) / 2
    projection = camera.parallel(viewpoint.axes, magnification, (width / 2, height / 2), middle, magnification / ratio)
    return Frame(width, height, projection, magnification)


def _fitted(spec: Spec, wide: float, tall: float) -> tuple[float, float, float]:
    """Width, height and magnification of a page that content of a size in model mm is fitted to."""
    width = spec.width if spec.width is not None else WIDTH_MM
    free = _free(spec, width)
    room = spec.height if spec.height is not None else spec.at_most
    choices = [free / wide] if wide > 0 else []
    if room is not None and tall > 0:
        choices.append(_free(spec, room) / tall)
    if not choices:
        choices = [free / tall] if tall > 0 else [1.0]
    magnification = min(choices)
    height = spec.height if spec.height is not None else tall * magnification + 2 * spec.margin
    return width, max(height, 0.1), magnification


def _scaled(spec: Spec, wide: float, tall: float, ratio: float) -> tuple[float, float, float]:
    """As `_fitted`, at the scale stated, or at the largest standard one that fits."""
    room = spec.height if spec.height is not None else spec.at_most
    scale = spec.scale
    if scale == "standard":
        width = spec.width if spec.width is not None else WIDTH_MM
        free_wide, free_tall = _free(spec, width), _free(spec, room) if room is not None else np.inf
        fitting = [
            each for each in STANDARD_SCALES if wide * each * ratio <= free_wide and tall * each * ratio <= free_tall
        ]
        if not fitting:
            raise mistake("out-of-range", spec.span, "no standard scale is small enough for this page")
        scale = fitting[0]
    assert isinstance(scale, float)
    magnification = scale * ratio
    needs_wide, needs_tall = (side * magnification + 2 * spec.margin for side in (wide, tall))
    width = spec.width if spec.width is not None else needs_wide
    height = spec.height if spec.height is not None else needs_tall
    slack = 1e-6
    if needs_wide > width + slack or needs_tall > (room if room is not None else needs_tall) + slack:
        sentence = f"at this scale the figure needs {needs_wide:.1f} mm by {needs_tall:.1f} mm of paper with its margin"
        raise mistake("does-not-fit", spec.span, sentence, "a smaller scale or a larger page")
    return max(width, 0.1), max(height, 0.1), magnification


def _free(spec: Spec, side: float) -> float:
    free = side - 2 * spec.margin
    if free <= 0:
        raise mistake("does-not-fit", spec.span, f"margins of {spec.margin:g} mm leave no paper of {side:g} mm")
    return free


def _check_page(spec: Spec, width: float, height: float) -> None:
    if max(width, height) > limits.PAPER_MM:
        sentence = f"the page would be {width:.0f} mm by {height:.0f} mm; {limits.PAPER_MM:g} mm is the limit"
        raise mistake("out-of-range", spec.span, sentence, "state a `size`, or a height with `at most`")


def central_frame(spec: Spec, viewpoint: Central, points: F64) -> Frame:
    """The page of a central projection of world points (n,3). The eye is never moved. Raises Mistake."""
    unit = camera.central(viewpoint.eye, viewpoint.toward, 1.0, (0.0, 0.0))
    on_page, depth = camera.to_page(unit, points)
    ahead = np.isfinite(depth)
    if not ahead.any():
        raise mistake("nothing-in-view", spec.span, "the subject lies behind the eye")
    width = spec.width if spec.width is not None else WIDTH_MM
    distance = float(np.linalg.norm(np.subtract(viewpoint.toward, viewpoint.eye)))
    low, high = on_page[ahead].min(axis=0), on_page[ahead].max(axis=0)
    held = _held_distance(spec, viewpoint, width, distance)
    if held is None and not ahead.all():
        hint = "move the eye off, or state a `lens` or an `angle of view`"
        raise mistake(
            "nothing-in-view", spec.span, "part of the subject lies behind the eye, so it cannot be fitted", hint
        )
    wide, tall = float(high[0] - low[0]), float(high[1] - low[1])
    if held is None:
        width, height, principal = _fitted(spec, wide, tall)
        origin = (width / 2 - principal * (low[0] + high[0]) / 2, height / 2 - principal * (low[1] + high[1]) / 2)
    else:
        principal = held
        room = spec.height if spec.height is not None else spec.at_most
        height = spec.height if spec.height is not None else min(tall * principal + 2 * spec.margin, room or np.inf)
        middle = 0.0 if spec.height is not None else principal * float(low[1] + high[1]) / 2
        origin = (width / 2, height / 2 - middle)
    _check_page(spec, width, height)
    projection = camera.central(viewpoint.eye, viewpoint.toward, principal, (float(origin[0]), float(origin[1])))
    # Points nearer than a twentieth of the way to the target do not drive the chord error: it would grow without bound.
    nearest_mm = max(float((-1.0 / depth[ahead]).min()), distance / 20)
    return Frame(width, float(height), projection, principal / nearest_mm)


def _held_distance(spec: Spec, viewpoint: Central, width: float, distance: float) -> float | None:
    """The principal distance on paper that a lens, an angle of view or a scale fixes.

    None where the figure is fitted.
    """
    if isinstance(spec.scale, float):
        return spec.scale * distance
    if viewpoint.angle is not None:
        return camera.principal_distance_of_angle(viewpoint.angle, width)
    if viewpoint.lens is not None:
        return camera.principal_distance_of_lens(viewpoint.lens, viewpoint.film, width)
    return None

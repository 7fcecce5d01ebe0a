"""Planning a figure: its views, the triangles each needs, the page, and the job the backend draws.

The views are fitted twice: boxes known before tessellation give a scale and with it the rungs, the meshes of those
rungs the exact extents. Views that show the same triangles share them.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from msgspec import Struct, structs
from platewright.backend import camera, contract
from platewright.backend.contract import F64
from platewright.lang.problems import Problem, is_error

from . import limits
from .build import Model
from .emphasis import emphasis_of
from .enclosure import enclosing
from .explosion import Explosion, explode, moved, trace_lines
from .extent import box_corners
from .extremes import Moved, moved_by, renumbered
from .filling import report_filling
from .flatten import Flattened, Mesher, flatten, walked
from .frames import RESOLUTION_DPI, WIDTH_MM, Content, Frame, content, frame_of, held_frame
from .graph import Entry, Point
from .interruptions import Interrupting, shown_by
from .layout import Box
from .lightings import lights_for, paired
from .mistakes import Mistake, Problems, confined, mistake
from .overhang import NONE, Around, Extent, larger, past_arrows, past_centre_lines, round_extent
from .panels import (
    carried,
    check_shown,
    clip_of,
    faces_alone,
    frame_round,
    frames_of_details,
    links_of,
    measured,
    section_of,
    title_height,
    title_of,
    traces_of,
    turned_into,
)
from .projections import Central, Parallel, is_pictorial, unit_projection
from .sections import Cut, Opening, away_of, cutter_of, facing
from .signs import check_arrows, strip_for_symbol, symbol_of, view_arrow
from .solids.ladder import COARSEST, first_at_most
from .specs import Spec
from .styles import style_of
from .threads import by_convention
from .views import View, cuts_of, views_of

ERROR_ON_PAPER_MM = 0.02
"""The chord error on paper that a figure's rung keeps to, at its nearest point."""

_OVERHANG_ROUNDS = 3

TITLE_SHARE = 2.0
"""Paper that a view's title takes above it, over the height of its letters."""

CAPTION_LETTERS, LETTER_WIDTH = 10, 0.75
"""Letters of the longest caption of a detail that is common, and their width over the height of capitals."""

TRACE_FREE_MM = 13.0
"""Paper that the end of a cutting-plane line takes, with its letter."""

LEAST_ON_PAPER_MM = 0.05
"""A subject smaller than this on paper is not drawn: about a dot at 500 to the inch."""


def plan_figure(
    model: Model, spec: Spec, mesher: Mesher, resolution: float | None = None, measures: bool = False
) -> tuple[contract.Job | None, tuple[Problem, ...]]:
    """The job that draws a figure. Cost: one or two flattenings a geometry, and a pass over the vertices a view."""
    problems = Problems()
    job: contract.Job | None = None
    with problems.collecting():
        job = _Planner(model, spec, mesher, problems).job(resolution or RESOLUTION_DPI, measures)
    found = tuple(confined(problem, spec.name) for problem in problems.all())
    return (None if problems.has_errors else job), found


class _Shot(Struct, frozen=True):
    """A view, its projection at a sheet scale of 1, and the rung its triangles are made at."""

    view: View
    unit: contract.Projection
    rung: float


class _Planner:
    """Fits one figure. `shapes` keeps the triangles already made, by what is shown of the subject and rung."""

    def __init__(self, model: Model, spec: Spec, mesher: Mesher, problems: Problems) -> None:
        # A picture of tone shows what is there; a drawing shows a thread as ISO 6410-1 has it.
        if spec.manner.is_of_lines and not spec.manner.real_threads:
            extremes = tuple(structs.replace(each, thing=by_convention(each.thing)) for each in spec.extremes)
            spec = structs.replace(spec, subject=by_convention(spec.subject), extremes=extremes)
        self.model, self.spec, self.mesher, self.problems = model, spec, mesher, problems
        self.extremes: dict[tuple[float, int], Moved] = {}
        self.shapes: dict[tuple[float, tuple[int, ...], Point | None], Flattened] = {}
        self.contents: dict[tuple[str, float], Content] = {}
        self.round_contents: dict[tuple[str, float], Extent | None] = {}
        self.overhangs: dict[str, Around] = {}
        self.sights: dict[int, tuple[float, float, float]] = {}
        self.corners, owners = box_corners(spec.subject, spec.path)
        self.explosion = self._explosion()
        if self.explosion is not None:
            self.spec = carried(spec, self.explosion)
        self.reach = self.corners if self.explosion is None else self.corners + self.explosion.shifts[owners]

    def job(self, resolution: float, measures: bool) -> contract.Job:
        spec = self.spec
        corners = self.reach
        shots = [
            _Shot(view, unit_projection(view.viewpoint, view.factor, spec.true_projection), COARSEST)
            for view in views_of(spec)
        ]
        self.sights = {number: shot.unit.sight for shot in shots for number in shot.view.cuts}
        shots = [self._following(shot, shots[0]) for shot in shots]
        frame = self._frame(shots, lambda shot: content(shot.unit, corners))
        shots = self._finer(shots, frame, lambda shot: corners)
        frame = self._frame(shots, self._content)
        finer = self._finer(shots, frame, self._vertices)
        if [shot.rung for shot in finer] != [shot.rung for shot in shots]:
            shots = finer
            frame = self._frame(shots, self._content)
        return self._sheet(shots, self._with_overhangs(shots, frame), resolution, measures)

    def _with_overhangs(self, shots: Sequence[_Shot], frame: Frame) -> Frame:
        """The page with room for what stands past the content, which depends on the scale."""
        for _ in range(_OVERHANG_ROUNDS):
            found = {
                shot.view.name: self._overhang(shot, camera.enlarged(shot.unit, frame.scale, spot.origin), frame)
                for shot, spot in zip(shots, frame.spots, strict=True)
            }
            if all(each == self.overhangs.get(name, NONE) for name, each in found.items()):
                return frame
            self.overhangs = found
            frame = self._frame(shots, self._content)
        return frame

    def _overhang(self, shot: _Shot, projection: contract.Projection, frame: Frame) -> Around:
        style = style_of(self.spec.manner, frame.width, is_pictorial(shot.view.viewpoint))
        # Half of an outline lies outside what it is the outline of.
        ink = style.wide / 2 if style.is_of_lines else 0.0
        window = shot.view.window
        if window is not None:
            # A caption that is wider than the circle below it.
            caption = CAPTION_LETTERS * LETTER_WIDTH * title_height(frame.width) if window.letter else 0.0
            aside = max(ink, (caption - window.diameter * projection.scale) / 2)
            return (aside, ink, aside, ink)
        low, high, _ = self._content(shot)
        found: Around = (ink, ink, ink, ink)
        of_round = self._round_content(shot) if style.is_of_lines and style.centre_lines else None
        if of_round is not None:
            found = larger(found, past_centre_lines((low, high), of_round, frame.scale))
        if not shot.view.is_main or not self.spec.looks:
            return found
        low, high, _ = content(projection, self._vertices(shot))
        arrows = self._arrows(shot, projection, frame)
        return larger(found, past_arrows(arrows, (low, high), projection, title_height(frame.width)))

    def _content(self, shot: _Shot) -> Content:
        """The page box of a view's triangles at a sheet scale of 1."""
        key = (shot.view.name, shot.rung)
        if key not in self.contents:
            self.contents[key] = content(shot.unit, self._reached(shot))
        return self.contents[key]

    def _round_content(self, shot: _Shot) -> Extent | None:
        key = (shot.view.name, shot.rung)
        if key not in self.round_contents:
            self.round_contents[key] = round_extent(self._shape(shot).geometry, self._vertices(shot), shot.unit)
        return self.round_contents[key]

    def _arrows(self, shot: _Shot, projection: contract.Projection, frame: Frame) -> tuple[contract.ViewArrow, ...]:
        height, vertices = title_height(frame.width), self._vertices(shot)
        return tuple(view_arrow(look, projection, vertices, height) for look in self.spec.looks)

    def _explosion(self) -> Explosion | None:
        """How things are moved; None where nothing is, so that the figure is the assembled one."""
        exploded, path = self.spec.exploded, self.spec.path
        if exploded is None or not exploded.factor:
            return None
        explosion = explode(walked(self.spec.subject, path)[0], exploded.factor)
        if not explosion.moves:
            sentence = f"nothing in `{path}` explodes, so the figure shows it assembled"
            self.problems.warn("no-effect", exploded.span, sentence, "write `explodes 40 mm` behind what is placed")
            return None
        if len(explosion.moves) > limits.TRACES:
            sentence = f"{len(explosion.moves):,} things explode by themselves; {limits.TRACES:,} is the limit"
            raise mistake("too-much", exploded.span, sentence, "let what holds them explode as one")
        return explosion

    def _reached(self, shot: _Shot) -> F64:
        """World points of all that a view shows, extreme positions with it."""
        if shot.view.shows != "all":
            return faces_alone(self._shape(shot).geometry, self._vertices(shot))
        return np.concatenate((self._vertices(shot), *(each.vertices for each in self._extremes(shot))))

    def _extremes(self, shot: _Shot) -> tuple[Moved, ...]:
        """What other values move or change. Raises Mistake where that cannot be shown, or is nothing."""
        spec, found = self.spec, []
        for number, extreme in enumerate(spec.extremes if shot.view.shows == "all" else ()):
            if self.explosion is not None or spec.interruptions:
                what = "an exploded figure" if self.explosion is not None else "a figure that leaves out a stretch"
                hint = "show it in a figure of its own"
                raise mistake("wrong-form", extreme.span, f"{what} shows no extreme position", hint)
            key = (shot.rung, number)
            if key not in self.extremes:
                usual = self._shape(_Shot(structs.replace(shot.view, cuts=()), shot.unit, shot.rung)).geometry
                self.extremes[key] = moved_by(
                    extreme, spec.path, spec.stresses, usual, shot.rung, self.mesher, self.problems
                )
            found.append(self.extremes[key])
        return tuple(found)

    def _following(self, shot: _Shot, main: _Shot) -> _Shot:
        """A detail that looks where the mark it names has gone to with the rest of an interrupted view."""
        window = shot.view.window
        if window is None or not self.spec.interruptions:
            return shot
        centre = self._interrupting(main.view, main.unit.sight).carry(window.centre)
        view = structs.replace(shot.view, window=structs.replace(window, centre=centre))
        return _Shot(view, shot.unit, shot.rung)

    def _vertices(self, shot: _Shot) -> F64:
        return self._moved(self._shape(shot).geometry)

    def _revolved(self, main: _Shot) -> list[_Shot]:
        """Views of cut faces turned into the plane of the main one."""
        found: list[_Shot] = []
        for number, cut in enumerate(self.spec.cuts):
            if cut.shown == "revolved":
                name = f"{self.spec.path} revolved section {len(found) + 1}"
                view = View(name, main.view.viewpoint, cuts=(number,), shows="revolved")
                found.append(_Shot(view, turned_into(main.unit, cut), main.rung))
        return found

    def _moved(self, geometry: contract.Geometry) -> F64:
        return geometry.vertices if self.explosion is None else moved(geometry, self.explosion.shifts)

    def _shape(self, shot: _Shot) -> Flattened:
        """What a view shows, as triangles. Raises Mistake, without a problem of its own, where a part has none."""
        key = (shot.rung, shot.view.cuts, shot.unit.sight if self.spec.interruptions or shot.view.cuts else None)
        if key not in self.shapes:
            spec, opening = self.spec, self._opening(shot.view, shot.unit.sight)
            interrupting = self._interrupting(shot.view, shot.unit.sight)

            def alter(entry: Entry, placement: F64, mesh: contract.Mesh) -> contract.Mesh | None:
                left = opening.alter(entry, placement, mesh) if opening.cutters else mesh
                return interrupting.alter(entry, placement, left) if left is not None else None

            flattened, problems = flatten(
                spec.subject,
                spec.path,
                shot.rung,
                self.model.sources,
                self.mesher,
                alter if opening.cutters or interrupting.steps else None,
            )
            # Warnings about parts are the scene's, and `prove` has given them.
            self.problems.extend(tuple(problem for problem in problems if is_error(problem)))
            opening.judge(cuts_of(shot.view, spec), self.problems)
            if shot.view.is_main:
                self._judge_interruptions(interrupting)
            if flattened is None or self.problems.has_errors:
                raise Mistake(None)
            if interrupting.steps:
                nodes = tuple(map(interrupting.carried, flattened.geometry.nodes))
                flattened = structs.replace(flattened, geometry=replace(flattened.geometry, nodes=nodes))
            self.shapes[key] = flattened
        return self.shapes[key]

    def _interrupting(self, view: View, sight: Point) -> Interrupting:
        """The stretches that a view leaves out; a cut face alone is shown whole."""
        shown = shown_by(self.spec.interruptions, sight) if view.shows == "all" else ()
        return Interrupting(shown, sight, self.corners)

    def _judge_interruptions(self, interrupting: Interrupting) -> None:
        broken = {each.span for number, each, _ in interrupting.steps if interrupting.n_broken[number]}
        seen = {each.span for _, each, _ in interrupting.steps}
        for each in self.spec.interruptions:
            if each.span not in seen:
                hint = "take a view from the side"
                self.problems.error("edge-on-section", each.span, "the view looks along the stretch left out", hint)
            elif each.span not in broken:
                self.problems.error("section-misses", each.span, "no part reaches through the stretch left out")

    def _opening(self, view: View, sight: Point) -> Opening:
        cuts = cuts_of(view, self.spec)
        aways = tuple(away_of(cut, sight) for cut in cuts)
        cutters = tuple(cutter_of(cut, away, self.corners) for cut, away in zip(cuts, aways, strict=True))
        return Opening(cutters, aways, frozenset(self.spec.uncut))

    def _uncut(self, view: View, sight: Point) -> tuple[int, ...]:
        """Rows of what the sections of a view leave whole."""
        return self._opening(view, sight).rows_whole(*walked(self.spec.subject, self.spec.path)) if view.cuts else ()

    def _finer(self, shots: Sequence[_Shot], frame: Frame, points: Callable[[_Shot], F64]) -> list[_Shot]:
        return [_Shot(each.view, each.unit, min(each.rung, self._rung(each, frame, points(each)))) for each in shots]

    def _frame(self, shots: Sequence[_Shot], contents: Callable[[_Shot], Content]) -> Frame:
        boxes = self._boxes(shots, contents)
        main = shots[0].view.viewpoint
        if isinstance(main, Central) and main.is_held and len(shots) > 1:
            sentence = (
                "the viewpoint's field of view says what the page takes in, which leaves no room for further views"
            )
            raise mistake("does-not-fit", self.spec.span, sentence, "leave out the `lens` or `angle of view`")
        if isinstance(main, Central) and len(shots) == 1:
            held = held_frame(self.spec, main, boxes[0])
            if held is not None:
                return held
            if main.shift != (0.0, 0.0):
                sentence = "the viewpoint's `shift` changes nothing, for the picture is fitted to its content"
                self.problems.warn("no-effect", self.spec.span, sentence, "state a `lens` or an `angle of view`")
        frame = frame_of(self.spec, boxes)
        view_set = self.spec.view_set
        if view_set is None or symbol_of(view_set.method, boxes, frame, self.spec.margin) is not None:
            return frame
        last, strip = max(box.row for box in boxes), strip_for_symbol(frame.width)
        boxes = [
            structs.replace(box, around=(*box.around[:3], box.around[3] + strip)) if box.row == last else box
            for box in boxes
        ]
        return frame_of(self.spec, boxes)

    def _boxes(self, shots: Sequence[_Shot], contents: Callable[[_Shot], Content]) -> list[Box]:
        return [self._box(shot.view, shot.unit, contents(shot)) for shot in shots]

    def _box(self, view: View, unit: contract.Projection, within: Content) -> Box:
        """The box of a view. Raises Mistake for a subject behind the eye to which the view would be fitted."""
        low, high, is_ahead = within
        viewpoint = view.viewpoint
        if not np.isfinite(low[0]):
            raise mistake("nothing-in-view", self.spec.span, "the subject lies behind the eye")
        if isinstance(viewpoint, Central):
            is_held = viewpoint.is_held or isinstance(self.spec.scale, float)
            if not is_ahead and not is_held:
                sentence = "part of the subject lies behind the eye, so it cannot be fitted"
                raise mistake("nothing-in-view", self.spec.span, sentence, "move the eye off, or state a `lens`")
        if view.window is not None:
            middle, _ = camera.to_page(unit, np.array([view.window.centre]))
            reach = view.window.diameter / 2 * unit.scale
            low = (float(middle[0, 0]) - reach, float(middle[0, 1]) - reach)
            high = (low[0] + 2 * reach, low[1] + 2 * reach)
        axes = (unit.right, unit.up) if view.window is None and isinstance(viewpoint, Parallel) else None
        return Box(low, high, view.column, view.row, axes, self._around(view, unit))

    def _around(self, view: View, unit: contract.Projection) -> tuple[float, float, float, float]:
        """Paper kept free round a view for its title and the ends of its cutting-plane lines."""
        aside = upright = 0.0
        above = title_height(self.spec.width or WIDTH_MM) * TITLE_SHARE if view.title else 0.0
        for number in view.traces:
            along = np.cross(facing(self.spec.cuts[number]), unit.sight)
            across, up = abs(float(along @ np.array(unit.right))), abs(float(along @ np.array(unit.up)))
            aside, upright = max(aside, across * TRACE_FREE_MM), max(upright, up * TRACE_FREE_MM)
        free = (aside, upright, aside, upright)
        if view.is_main:
            check_arrows(self.spec.looks, unit)
        free = larger(free, self.overhangs.get(view.name, NONE))
        return (free[0], free[1] + above, free[2], free[3])

    def _rung(self, shot: _Shot, frame: Frame, points: F64) -> float:
        magnification, viewpoint = frame.scale * camera.magnification(shot.unit), shot.view.viewpoint
        if isinstance(viewpoint, Central):
            _, depth = camera.to_page(shot.unit, points)
            distance = viewpoint.distance
            # Points nearer than a twentieth of the way to the target do not drive the chord error: it would grow
            # without bound.
            nearest_mm = max(float((-1.0 / depth[np.isfinite(depth)]).min()), distance / 20)
            magnification *= distance / nearest_mm
        return first_at_most(ERROR_ON_PAPER_MM / magnification)

    def _sheet(self, shots: Sequence[_Shot], frame: Frame, resolution: float, measures: bool) -> contract.Job:
        spec = self.spec
        page = contract.Page(frame.width, frame.height, resolution)
        columns, rows = page.pixels
        if columns * rows > limits.PIXELS:
            sentence = f"{columns:,} x {rows:,} pixels are more than {limits.PIXELS:,}, the limit"
            raise mistake("too-much", spec.span, sentence, "a smaller size or a lower resolution")
        revolved = self._revolved(shots[0])
        shapes = list({id(each): each for each in map(self._shape, (*shots, *revolved))}.values())
        others = list({id(each): each for shot in shots for each in self._extremes(shot)}.values())
        views = [shot.view for shot in shots]
        panels: list[contract.Panel] = []
        inscriptions: list[contract.Inscription] = []
        for shot, spot in zip(shots, frame.spots, strict=True):
            shape = self._shape(shot)
            projection = camera.enlarged(shot.unit, frame.scale, spot.origin)
            vertices = self._reached(shot)
            if shot.view.window is None:
                self._seen(projection, spot.place, vertices)
            else:
                self._finds(shot.view, projection, vertices)
            panel = self._panel(shot.view, projection, spot.place, shape.geometry, shapes.index(shape), frame)
            self._looks_from_outside(panel, shape.geometry)
            extremes = tuple(
                contract.ExtremePosition(len(shapes) + others.index(each), each.rows) for each in self._extremes(shot)
            )
            panels.append(replace(panel, extremes=extremes))
            if shot.view.title:
                inscriptions.append(title_of(spec, shot.view, projection, vertices, frame))
        panels[0] = replace(
            panels[0],
            detail_frames=frames_of_details(views, panels[0].projection),
            arrows=self._arrows(shots[0], panels[0].projection, frame),
        )
        for shot in revolved:
            (number,), shape = shot.view.cuts, self._shape(shot)
            projection = turned_into(panels[0].projection, spec.cuts[number], self._reached(shot))
            place = panels[0].place
            panels.append(self._panel(shot.view, projection, place, shape.geometry, shapes.index(shape), frame))
        boxes = self._boxes(shots, self._content)
        symbol = None if spec.view_set is None else symbol_of(spec.view_set.method, boxes, frame, spec.margin)
        report_filling(spec, boxes, frame, self._vertices(shots[0]), self.problems)
        wanted = measured(shapes[0].geometry) if measures else ()
        sheet = contract.Sheet(
            spec.name,
            page,
            tuple(panels),
            spec.files,
            links_of(views),
            spec.title,
            spec.alt,
            spec.description,
            "",
            wanted,
            title_height(page.width),
            tuple(inscriptions),
            () if symbol is None else (symbol,),
        )
        geometries, materials = [shape.geometry for shape in shapes], shapes[0].materials
        surfaces = (*shapes[0].surfaces, *(surface for other in others for surface in other.flattened.surfaces))
        for other in others:
            geometries.append(renumbered(other.flattened.geometry, len(materials)))
            materials += other.flattened.materials
        if others and not spec.manner.is_of_lines:
            sentence = "an extreme position is drawn in lines, which this figure has none of"
            self.problems.warn("no-effect", spec.extremes[0].span, sentence, "say `drawn as lines and tone`")
        return contract.Job(tuple(geometries), materials, paired(sheet, spec.sources, surfaces))

    def _panel(
        self,
        view: View,
        projection: contract.Projection,
        place: tuple[float, float, float, float],
        geometry: contract.Geometry,
        row: int,
        frame: Frame,
    ) -> contract.Panel:
        spec = self.spec
        emphasis = emphasis_of(
            spec.stresses, [node.path for node in geometry.nodes], [node.parent for node in geometry.nodes]
        )
        check_shown(spec, geometry, emphasis)
        curves = trace_lines(self.explosion, geometry, emphasis) if self.explosion is not None else ()
        middle = (geometry.vertices.min(axis=0) + geometry.vertices.max(axis=0)) / 2
        target = (float(middle[0]), float(middle[1]), float(middle[2]))
        style = style_of(spec.manner, frame.width, is_pictorial(view.viewpoint))
        if view.shows != "all":
            style = self._flat(style, spec.cuts[view.cuts[0]])
        lighting = lights_for(spec.sources, projection, target)
        return contract.Panel(
            view.name,
            row,
            projection,
            place,
            style,
            lighting,
            displacement=self.explosion.shifts if self.explosion is not None else None,
            emphasis=emphasis,
            curves=curves,
            section=section_of(spec, view, projection, self._uncut(view, projection.sight)),
            clip=clip_of(view, projection),
            detail_frames=frame_round(view, projection),
            cutting_planes=traces_of(spec, view, projection, geometry.vertices, self.sights),
        )

    def _flat(self, style: contract.Style, cut: Cut) -> contract.Style:
        """The style of a cut face alone, which has no tone. Raises Mistake in a figure without lines."""
        if not style.is_of_lines:
            sentence = f"a {cut.shown} section is drawn in lines, which this figure has none of"
            raise mistake("wrong-form", cut.span, sentence, "say `drawn as lines`")
        return style if style.drawn_as == "tints" else replace(style, drawn_as="lines")

    def _finds(self, view: View, projection: contract.Projection, vertices: F64) -> None:
        """A detail, or a round view, of a place where nothing is, is a problem."""
        assert view.window is not None
        low, high, _ = content(projection, vertices)
        middle, _ = camera.to_page(projection, np.array([view.window.centre]))
        reach = view.window.diameter / 2 * projection.scale
        at = (float(middle[0, 0]), float(middle[0, 1]))
        if any(at[k] + reach < low[k] or at[k] - reach > high[k] for k in (0, 1)):
            span = next((each.span for each in self.spec.details if each.centre == view.window.centre), self.spec.span)
            raise mistake("nothing-in-view", span, "nothing of the subject lies within this circle", "move it")

    def _looks_from_outside(self, panel: contract.Panel, geometry: contract.Geometry) -> None:
        """An eye within a solid that is shown is a problem: nothing of it, and little else, could be seen."""
        if panel.projection.eye is None:
            return
        hidden = np.flatnonzero(panel.emphasis == contract.Emphasis.HIDE) if panel.emphasis is not None else ()
        row = enclosing(geometry, panel.projection.eye, frozenset(int(each) for each in hidden))
        if row is not None:
            sentence = f"the eye stands inside `{geometry.nodes[row].path}`"
            hint = "move it out, cut the part open with a section, or `hide` it"
            raise mistake("eye-inside", self.spec.span, sentence, hint)

    def _seen(self, projection: contract.Projection, place: tuple[float, float, float, float], vertices: F64) -> None:
        """A view with nothing in it is a problem; one whose subject leaves its place says so."""
        points, _ = camera.to_page(projection, vertices)
        low, high = np.array(place[:2]), np.array(place[:2]) + np.array(place[2:])
        inside = (points >= low).all(axis=1) & (points <= high).all(axis=1)
        spans = np.nanmin(points, axis=0), np.nanmax(points, axis=0)
        reach = float((spans[1] - spans[0]).max())
        if reach < LEAST_ON_PAPER_MM:
            sentence = f"the whole subject would be {reach:.2g} mm large on paper, too small to be seen"
            raise mistake("nothing-in-view", self.spec.span, sentence, "a larger scale")
        if inside.all():
            return
        if not inside.any() and ((spans[0] > high).any() or (spans[1] < low).any()):
            raise mistake("nothing-in-view", self.spec.span, "nothing of the subject lies within this view")
        over = 1e-6 + max(0.0, float((low - spans[0]).max()), float((spans[1] - high).max()))
        if over > 0.01 or not np.isfinite(points).all():
            sentence = "the subject reaches past the edge of the page"
            hint = "a shorter lens, a wider angle of view, or an eye further off"
            self.problems.warn("cropped", self.spec.span, sentence, hint)

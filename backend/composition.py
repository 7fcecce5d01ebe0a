"""The drawing of a sheet: every panel seen, its areas filled and hatched, its lines inked, its signs and words set.

It is made in passes: see all panels, settle what must agree between them (the hatch of each part), then put each panel
together from back to front: tone, fills, hatching, lines, signs.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from .contract import F64, U8, Emphasis, Job, LineClass, Panel
from .drawing import BLACK, Colour, Drawing, Group, Image, Lines, Mark, Words
from .lettering.type import Lettering

if TYPE_CHECKING:
    from .lines.hatching import Hatch
    from .lines.joining import Chain
    from .lines.panel import Seen

MUTED: Colour = (150, 150, 150)
"""Lines of parts that are held back: as dark as a line of 0.18 mm must be to survive a copier (common practice)."""

_CLEAR_MM = 1.0


@dataclass(frozen=True, eq=False, slots=True)
class PanelLines:
    """What was found in one panel: its number, what is seen, the joined lines, and those of each extreme position."""

    panel: int
    seen: Seen
    chains: tuple[Chain, ...]
    extremes: tuple[tuple[Chain, ...], ...] = ()


@dataclass(frozen=True, eq=False, slots=True)
class Composed:
    """A drawing and the lines of each of its panels that is drawn in lines."""

    drawing: Drawing
    panels: tuple[PanelLines, ...]


def compose(job: Job, tone: U8 | None, lettering: Lettering, threads: int | None = None) -> Composed:
    """Compose a job's sheet. `tone` is the picture of all that lies under lines, (rows, columns, 3) of the whole page.

    The result does not depend on `threads`. Cost: that of `lines.panel.see` for each panel drawn in lines.
    """
    sheet = job.sheet
    found = {row: _lines_of(job, row, threads) for row, panel in enumerate(sheet.panels) if panel.style.is_of_lines}
    hatches = _hatches(job, found)
    groups: list[Group] = []
    if tone is not None:
        groups.append(Group("image", "tone", (Image(tone, (0.0, 0.0, sheet.page.width, sheet.page.height)),)))
    height = sheet.letters
    for row, panel in enumerate(sheet.panels):
        parts = _panel_groups(job, found[row], hatches, lettering, height) if row in found else ()
        if parts:
            groups.append(Group("panel", panel.name, parts))
    words = _words(job, lettering, height)
    groups += [Group("words", "words", words)] if words else []
    drawing = Drawing(
        sheet.page.width,
        sheet.page.height,
        tuple(groups),
        sheet.title,
        sheet.alt,
        sheet.description,
        sheet.language,
    )
    return Composed(drawing, tuple(found.values()))


def _lines_of(job: Job, row: int, threads: int | None) -> PanelLines:
    from .lines.apart import extreme_chains, set_apart
    from .lines.joining import chains_of
    from .lines.panel import see

    panel = job.sheet.panels[row]
    seen = set_apart(see(job.geometries[panel.geometry], panel, job.sheet.page, threads), panel)
    # Of two parts with one line the first by its path has it, in whatever order they are declared.
    rank, tolerance = seen.occluders.rank.astype(np.int64), seen.view.tolerance
    chains = chains_of(seen.pieces, seen.candidates, tolerance, panel.style, view=seen.view, rank=rank)
    return PanelLines(row, seen, chains, tuple(extreme_chains(job, panel, each, threads) for each in panel.extremes))


def _hatches(job: Job, found: Mapping[int, PanelLines]) -> Mapping[str, Hatch]:
    """The hatch of every part that any panel cuts: the same in all of them."""
    from .lines.hatching import HatchRequest, assign_hatches

    requests = [
        HatchRequest(each.seen.regions, job.geometries[job.sheet.panels[row].geometry].nodes, _axis_angles(each))
        for row, each in found.items()
        if any(region.is_cap for region in each.seen.regions)
    ]
    return assign_hatches(requests) if requests else {}


def _axis_angles(lines: PanelLines) -> tuple[float, ...]:
    """Directions in degrees, counter-clockwise on the page, of the centre lines that a panel draws, each once."""
    from .lines.model import number_of

    candidates = lines.seen.candidates
    rows = np.flatnonzero(candidates.line_class == number_of(LineClass.CENTRE_LINE))
    along = candidates.end[rows, :2] - candidates.start[rows, :2]
    angles = np.degrees(np.arctan2(-along[:, 1], along[:, 0])) % 180.0
    return tuple(sorted({round(float(angle), 3) for angle in angles}))


def _panel_groups(
    job: Job, lines: PanelLines, hatches: Mapping[str, Hatch], lettering: Lettering, height: float
) -> tuple[Group, ...]:
    from .lines.fills import fills_of
    from .lines.hatching import hatching_of
    from .lines.notation import notation_of
    from .lines.pen import groups_of

    panel = job.sheet.panels[lines.panel]
    nodes, regions = job.geometries[panel.geometry].nodes, lines.seen.regions
    signs = notation_of(panel, lettering, height, _inked(lines))
    groups: list[Group] = []
    fills = fills_of(regions, nodes, job.materials, panel.style, panel.emphasis)
    if fills:
        groups.append(Group("fills", "fills", fills, panel.clip))
    gaps: tuple[Mark, ...] = ()
    if panel.section is not None:
        hatching = hatching_of(regions, nodes, hatches, panel.style, _surrounds(signs, lettering))
        marks: tuple[Mark, ...] = (*hatching.solids, *hatching.strokes)
        gaps = hatching.gaps
        if marks:
            groups.append(Group("class", LineClass.HATCHING.value, marks, panel.clip))
    groups += _shading(panel, lines)
    groups += groups_of(_beside_traces(lines.chains, panel), nodes, panel.style, colours=_colours(panel))
    # The white between thin sections cuts through their outlines, which would close it.
    groups += [Group("class", "between-thin-sections", gaps, panel.clip)] if gaps else []
    for extreme, chains in zip(panel.extremes, lines.extremes, strict=True):
        groups += groups_of(chains, job.geometries[extreme.geometry].nodes, panel.style)
    return (*groups, *signs)


def _inked(lines: PanelLines) -> F64:
    """Stretches on the page that are drawn, (k,2,2) mm, so that words may keep clear of them."""
    pieces, candidates = lines.seen.pieces, lines.seen.candidates
    rows = np.flatnonzero(pieces.is_visible & candidates.is_drawn[pieces.segment])
    return np.stack((pieces.start[rows, :2], pieces.end[rows, :2]), axis=1)


_SAME_LINE_MM = 0.05


def _beside_traces(chains: Sequence[Chain], panel: Panel) -> tuple[Chain, ...]:
    """Lines without the centre lines that a cutting-plane line runs along: one of two patterns is enough."""
    from .lines.segments import on_page

    traces = [on_page(panel.projection, plane.points) for plane in panel.cutting_planes]
    if not traces:
        return tuple(chains)
    return tuple(
        chain
        for chain in chains
        if chain.line_class is not LineClass.CENTRE_LINE or not any(_runs_along(chain, trace) for trace in traces)
    )


def _runs_along(chain: Chain, trace: F64) -> bool:
    pieces = [piece for piece in chain.path.pieces if isinstance(piece, Lines)]
    if len(pieces) != len(chain.path.pieces):
        return False
    points = np.concatenate([np.array([chain.path.start]), *(piece.points for piece in pieces)])
    for a, b in pairwise(trace):
        along = (b - a) / np.hypot(*(b - a))
        off = (points[:, 0] - a[0]) * along[1] - (points[:, 1] - a[1]) * along[0]
        if (np.abs(off) < _SAME_LINE_MM).all():
            return True
    return False


def _shading(panel: Panel, lines: PanelLines) -> tuple[Group, ...]:
    if panel.style.drawn_as != "stipple":
        return ()
    from .lines.shading import stipple_of

    seen = lines.seen
    groups = stipple_of(seen.view, seen.pieces, seen.candidates, seen.occluders, panel)
    return (Group("class", LineClass.SHADING.value, groups, panel.clip),) if groups else ()


def _colours(panel: Panel) -> tuple[Colour, ...] | None:
    """The colour of each part's lines: black, or grey where it is held back."""
    if panel.emphasis is None:
        return None
    return tuple(MUTED if value == Emphasis.MUTE else BLACK for value in panel.emphasis)


def _words(job: Job, lettering: Lettering, height: float) -> tuple[Group | Words, ...]:
    from .lines.notation import inscribed, symbol_of

    sheet = job.sheet
    style = sheet.panels[0].style
    symbols = tuple(symbol_of(symbol, style) for symbol in sheet.symbols)
    return (*symbols, *(inscribed(each, lettering) for each in sheet.inscriptions))


def _surrounds(signs: Sequence[Group], lettering: Lettering) -> tuple[F64, ...]:
    """Boxes (4,2) round the words of signs, `_CLEAR_MM` free on every side."""
    found: list[F64] = []
    for group in signs:
        for item in group.items:
            if isinstance(item, Words):
                x, y = item.origin
                width = lettering.width_of(item.text, item.height, item.face)
                left, right, top, bottom = (
                    x - _CLEAR_MM,
                    x + width + _CLEAR_MM,
                    y - item.height - _CLEAR_MM,
                    y + _CLEAR_MM,
                )
                found.append(np.array(((left, top), (right, top), (right, bottom), (left, bottom))))
    return tuple(found)

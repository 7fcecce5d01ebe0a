"""What of a panel is drawn otherwise than the rest: parts seen through, cut faces alone, extreme positions."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..contract import U8, Emphasis, ExtremePosition, Job, LineClass, Panel
from .joining import Chain, chains_of
from .model import CLASSES, Bools, Candidates, number_of
from .panel import Seen, see

_OF_THINGS = (
    LineClass.VISIBLE_OUTLINE,
    LineClass.VISIBLE_EDGE,
    LineClass.IMAGINARY_INTERSECTION,
    LineClass.THREAD_CREST,
    LineClass.THREAD_ROOT,
    LineClass.SECTION_OUTLINE,
    LineClass.BREAK_LINE,
    LineClass.HIDDEN_OUTLINE,
    LineClass.HIDDEN_EDGE,
)
"""Classes of the lines of the things themselves."""


def set_apart(seen: Seen, panel: Panel) -> Seen:
    """A panel with the lines of ghosts in a class of their own, and without all but the cut faces where they are alone.

    What is left out still closes the areas round it, which have been found. Cost: a pass over the candidates.
    """
    candidates, regions = seen.candidates, seen.regions
    if panel.emphasis is not None:
        is_ghost = np.append(panel.emphasis == Emphasis.GHOST, False)[candidates.node]
        candidates = _reclassed(candidates, is_ghost, LineClass.PART_SEEN_THROUGH)
    if panel.section is not None and panel.section.drawn != "all":
        is_cut = candidates.line_class == number_of(LineClass.SECTION_OUTLINE)
        candidates = replace(candidates, is_drawn=candidates.is_drawn & is_cut)
        regions = tuple(region for region in regions if region.is_cap)
        if panel.section.drawn == "revolved":
            candidates = _reclassed(candidates, is_cut, LineClass.REVOLVED_SECTION)
    return replace(seen, candidates=candidates, regions=regions)


def extreme_chains(job: Job, panel: Panel, extreme: ExtremePosition, threads: int | None) -> tuple[Chain, ...]:
    """The lines of parts in an extreme position, as seen with nothing else there. Cost: that of `see` for them."""
    geometry = job.geometries[extreme.geometry]
    emphasis: U8 = np.full(len(geometry.nodes), Emphasis.HIDE, np.uint8)
    emphasis[list(extreme.nodes)] = Emphasis.PLAIN
    style = replace(panel.style, hidden=False, centre_lines=False, tangent=False, gap=0.0, shade_lines=False)
    alone = replace(panel, style=style, displacement=None, emphasis=emphasis, section=None, curves=())
    seen = see(geometry, alone, job.sheet.page, threads, with_regions=False)
    candidates = _reclassed(seen.candidates, np.ones(len(seen.candidates), np.bool_), LineClass.EXTREME_POSITION)
    return chains_of(seen.pieces, candidates, seen.view.tolerance, style, view=seen.view)


def _reclassed(candidates: Candidates, which: Bools, line_class: LineClass) -> Candidates:
    """Candidates with those lines of things that are told by `which` (s,) bool in another class."""
    is_of_thing = np.array([each in _OF_THINGS for each in CLASSES])[candidates.line_class]
    number = np.uint8(number_of(line_class))
    return replace(candidates, line_class=np.where(which & is_of_thing, number, candidates.line_class))

"""Signs that a sheet's views need paper for: reference arrows, and the symbol of the projection method."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from platewright.backend.contract import F64, Projection, ProjectionSymbol, ViewArrow

from .frames import Frame
from .layout import Box
from .mistakes import mistake
from .view_sets import Look, Method

ARROW_CLEAR = 0.8
"""How far off the content the tip of a reference arrow stays, over the height of letters."""

_N_SIDES = 72

END_ON = 0.05
"""A direction is seen end-on where a unit along it is drawn shorter than this, at a scale of 1."""

SYMBOL_WIDTH, SYMBOL_PAST = 2.65, 0.15
"""Width of the symbol, and how far its centre lines reach past it above and below, over its height."""

SYMBOL_CLEAR_MM = 2.0


def letter_height(width: float) -> float:
    """Height in mm of capitals on a page of this width."""
    return 2.5 if width <= 100.0 else 3.5


def check_arrows(looks: Sequence[Look], unit: Projection) -> None:
    """Raises Mistake where a reference arrow cannot be shown in a view."""
    for look in looks:
        _drawn(look, unit)


def view_arrow(look: Look, projection: Projection, points: F64, height: float) -> ViewArrow:
    """The reference arrow of a view, in a parallel view of world points (n,3).

    It points at what is looked at: a stated point, the middle of the window, else the middle of everything; its tip
    stays clear of the convex outline of all that is shown.
    """
    matrix = projection.world_to_page
    aim = look.aim
    if aim is None:
        aim = look.window[0] if look.window is not None else _middle(points)
    at, along = matrix[:2, :3] @ np.array(aim) + matrix[:2, 3], np.array(_drawn(look, projection))
    back = _way_out(points @ matrix[:2, :3].T + matrix[:2, 3], at, -along) + ARROW_CLEAR * height
    steps = max(back, 0.0) / np.sqrt(float(along @ along))
    x, y, z = (float(a - steps * b) for a, b in zip(aim, look.viewpoint.axes.sight, strict=True))
    return ViewArrow((x, y, z), look.viewpoint.axes.sight, look.letter)


def _middle(points: F64) -> tuple[float, float, float]:
    x, y, z = ((a + b) / 2 for a, b in zip(points.min(axis=0).tolist(), points.max(axis=0).tolist(), strict=True))
    return (x, y, z)


def _way_out(page: F64, start: F64, along: F64) -> float:
    """Mm from `start` along a direction to where a line leaves the convex outline of page points (n,2).

    The outline is taken from outside, as the least polygon with `_N_SIDES` sides of evenly spread directions.
    """
    unit = along / np.sqrt(float(along @ along))
    turns = 2 * np.pi * np.arange(_N_SIDES) / _N_SIDES
    normals = np.column_stack((np.cos(turns), np.sin(turns)))
    supports = np.array([float((page @ normal).max()) for normal in normals])
    speeds = normals @ unit
    leaving = speeds > 1e-9
    return float(((supports - normals @ start)[leaving] / speeds[leaving]).min())


def _drawn(look: Look, projection: Projection) -> tuple[float, float]:
    """Where a unit along the sight of a view is drawn on the page of another. Raises Mistake if that sees it end-on."""
    if projection.kind == "central":
        hint = "show the subject in a parallel projection"
        raise mistake("edge-on-view", look.span, "a reference arrow does not stand in a central projection", hint)
    x, y = (float(each) for each in projection.world_to_page[:2, :3] @ np.array(look.viewpoint.axes.sight))
    if (x * x + y * y) ** 0.5 < END_ON * projection.scale:
        sentence = f"the main view sees the arrow of view {look.letter} end-on, for both look the same way"
        raise mistake("edge-on-view", look.span, sentence, "take another direction, or another main view")
    return x, y


def symbol_of(method: Method, boxes: Sequence[Box], frame: Frame, margin: float) -> ProjectionSymbol | None:
    """The symbol in a corner of the page that no view needs; None where there is none. The lower right comes first."""
    height = 2 * letter_height(frame.width)
    wide, tall = SYMBOL_WIDTH * height, (1 + 2 * SYMBOL_PAST) * height
    for x in (frame.width - margin - wide, margin):
        for y in (frame.height - margin - tall, margin):
            place = (x, y, wide, tall)
            placed = zip(boxes, frame.spots, strict=True)
            if not any(_meets(box, spot.origin, frame.scale, place) for box, spot in placed):
                return ProjectionSymbol(method, (x, y + SYMBOL_PAST * height), height)
    return None


def strip_for_symbol(width: float) -> float:
    """Paper in mm below the views that holds the symbol where no corner does."""
    return 2 * letter_height(width) * (1 + 2 * SYMBOL_PAST) + 2 * SYMBOL_CLEAR_MM


def _meets(box: Box, origin: tuple[float, float], scale: float, place: tuple[float, float, float, float]) -> bool:
    """Whether a view, with what stands round it, comes near to a rectangle (left, top, width, height)."""
    x, y, wide, tall = place
    clear = SYMBOL_CLEAR_MM
    left, top = origin[0] + scale * box.low[0] - box.around[0], origin[1] + scale * box.low[1] - box.around[1]
    right, bottom = origin[0] + scale * box.high[0] + box.around[2], origin[1] + scale * box.high[1] + box.around[3]
    return left < x + wide + clear and x - clear < right and top < y + tall + clear and y - clear < bottom

"""The page of a figure and its scale: what it says of its size, fitted to the boxes of its views."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from msgspec import Struct
from platewright.backend import camera
from platewright.backend.contract import F64, Projection

from . import layout, limits
from .layout import Box, Spot
from .mistakes import mistake
from .projections import Central
from .specs import Spec

WIDTH_MM, RESOLUTION_DPI = 84.0, 600.0

LEAST_MM = 0.1
"""Least side of a page."""

STANDARD_SCALES = tuple(
    ratio for power in (1e3, 1e2, 1e1, 1.0, 1e-1, 1e-2, 1e-3, 1e-4) for ratio in (5 * power, 2 * power, power)
)
"""Scales of ISO 5455 (1, 2 and 5 times the powers of ten), largest first."""


class Frame(Struct, frozen=True):
    """A page, the scale of the sheet, and where each view stands on it."""

    width: float
    height: float
    scale: float
    spots: tuple[Spot, ...]


def frame_of(spec: Spec, boxes: Sequence[Box]) -> Frame:
    """The page that views with these boxes are drawn on. Raises Mistake where they do not fit."""
    width, height, scale = _fitted(spec, boxes) if spec.scale is None else _scaled(spec, boxes)
    _check_page(spec, width, height)
    return Frame(width, height, scale, layout.spots(boxes, scale, width, height))


def _fitted(spec: Spec, boxes: Sequence[Box]) -> tuple[float, float, float]:
    """Width, height and scale of a page that boxes, of some width and height, are fitted to."""
    width = spec.width if spec.width is not None else WIDTH_MM
    scale = _largest_scale(spec, boxes, width)
    height = spec.height if spec.height is not None else layout.size(boxes, scale)[1] + 2 * spec.margin
    return width, max(height, LEAST_MM), scale


def _scaled(spec: Spec, boxes: Sequence[Box]) -> tuple[float, float, float]:
    """As `_fitted`, at the scale stated, or at the largest standard one that fits."""
    room = spec.height if spec.height is not None else spec.at_most
    scale = spec.scale
    if scale == "standard":
        scale = largest_standard(spec, _largest_scale(spec, boxes, spec.width if spec.width is not None else WIDTH_MM))
    assert isinstance(scale, float)
    needs_wide, needs_tall = (side + 2 * spec.margin for side in layout.size(boxes, scale))
    width = spec.width if spec.width is not None else needs_wide
    height = spec.height if spec.height is not None else needs_tall
    slack = 1e-6
    if needs_wide > width + slack or needs_tall > (room if room is not None else needs_tall) + slack:
        sentence = f"at this scale the figure needs {needs_wide:.1f} mm by {needs_tall:.1f} mm of paper with its margin"
        raise mistake("does-not-fit", spec.span, sentence, "a smaller scale or a larger page")
    return max(width, LEAST_MM), max(height, LEAST_MM), scale


def _largest_scale(spec: Spec, boxes: Sequence[Box], width: float) -> float:
    room = spec.height if spec.height is not None else spec.at_most
    free_tall = _free(spec, room) if room is not None else None
    scale = layout.scale_that_fits(boxes, _free(spec, width), free_tall)
    if scale <= 0:
        sentence = f"the gaps and words between {len(boxes)} views leave no paper for the views themselves"
        raise mistake("does-not-fit", spec.span, sentence, "a larger page or fewer views")
    return scale


def _free(spec: Spec, side: float) -> float:
    free = side - 2 * spec.margin
    if free <= 0:
        raise mistake("does-not-fit", spec.span, f"margins of {spec.margin:g} mm leave no paper of {side:g} mm")
    return free


def _check_page(spec: Spec, width: float, height: float) -> None:
    if max(width, height) > limits.PAPER_MM:
        sentence = f"the page would be {width:.0f} mm by {height:.0f} mm; {limits.PAPER_MM:g} mm is the limit"
        raise mistake("out-of-range", spec.span, sentence, "state a `size`, or a height with `at most`")


def largest_standard(spec: Spec, limit: float) -> float:
    """The largest standard scale that is not above `limit`. Raises Mistake if none is."""
    scale = standard_below(limit)
    if scale is None:
        raise mistake("out-of-range", spec.span, "no standard scale is small enough for this page")
    return scale


def standard_below(limit: float) -> float | None:
    """The largest standard scale that is not above `limit`, None if none is."""
    return next((each for each in STANDARD_SCALES if each <= limit * (1 + 1e-12)), None)


Content = tuple[tuple[float, float], tuple[float, float], bool]
"""Least and greatest coordinates on the page, and whether all lies in front of the eye."""


def content(projection: Projection, points: F64) -> Content:
    """Least and greatest page coordinates of world points (n,3) in front of the eye, and whether all of them are.

    NaN where none is. Cost: one pass.
    """
    on_page, depth = camera.to_page(projection, points)
    ahead = np.isfinite(depth)
    if not ahead.any():
        return (np.nan, np.nan), (np.nan, np.nan), False
    low, high = on_page[ahead].min(axis=0), on_page[ahead].max(axis=0)
    return (float(low[0]), float(low[1])), (float(high[0]), float(high[1])), bool(ahead.all())


def held_frame(spec: Spec, viewpoint: Central, box: Box) -> Frame | None:
    """The page of a central projection whose field of view is stated; None where the figure is fitted.

    `box` is that of the content at a scale of 1 in the plane through the target. The eye's axis meets the middle of
    the page. Raises Mistake where a scale is stated as well.
    """
    if not viewpoint.is_held and not isinstance(spec.scale, float):
        return None
    width = spec.width if spec.width is not None else WIDTH_MM
    distance = viewpoint.distance
    scale = _held_distance(spec, viewpoint, width, distance) / distance
    room = spec.height if spec.height is not None else spec.at_most
    tall = (box.high[1] - box.low[1]) * scale + 2 * spec.margin
    height = spec.height if spec.height is not None else min(tall, room if room is not None else np.inf)
    _check_page(spec, width, height)
    height = max(float(height), LEAST_MM)
    aside, upward = (each * width / viewpoint.film for each in viewpoint.shift)
    down = upward if spec.height is not None else -scale * (box.low[1] + box.high[1]) / 2
    return Frame(width, height, scale, (Spot((width / 2 - aside, height / 2 + down), (0.0, 0.0, width, height)),))


def _held_distance(spec: Spec, viewpoint: Central, width: float, distance: float) -> float:
    """The principal distance on paper that a lens, an angle of view or a scale fixes. Raises Mistake if two do."""
    if spec.scale is not None and viewpoint.is_held:
        sentence = "the viewpoint's field of view fixes the size already; a `scale` cannot hold as well"
        raise mistake("said-twice", spec.span, sentence, "leave out the `scale`, or the `lens` or `angle of view`")
    if viewpoint.angle is not None:
        return camera.principal_distance_of_angle(viewpoint.angle, width)
    if viewpoint.lens is not None:
        return camera.principal_distance_of_lens(viewpoint.lens, viewpoint.film, width)
    assert isinstance(spec.scale, float)
    return spec.scale * distance

"""The page of a figure and the projection onto it: what it says of its size, fitted to its content."""

from __future__ import annotations

from typing import Literal

import numpy as np
from msgspec import Struct
from platewright.backend import camera
from platewright.backend.contract import F64, Projection
from platewright.lang.source import Span

from . import limits
from .graph import Thing
from .lightings import Sources
from .mistakes import mistake
from .viewpoints import Central, Parallel, Viewpoint

WIDTH_MM, MARGIN_MM, RESOLUTION_DPI = 84.0, 2.0, 600.0

LEAST_MM = 0.1
"""Least side of a page."""

STANDARD_SCALES = tuple(
    ratio for power in (1e3, 1e2, 1e1, 1.0, 1e-1, 1e-2, 1e-3, 1e-4) for ratio in (5 * power, 2 * power, power)
)
"""Scales of ISO 5455 (1, 2 and 5 times the powers of ten), largest first."""

Style = Literal["tone", "survey part", "survey depth", "survey facing"]


class Spec(Struct, frozen=True):
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
    files: tuple[Literal["png", "tiff"], ...] = ("png",)
    title: str = ""
    alt: str = ""
    description: str = ""


class Frame(Struct, frozen=True):
    """A page and the projection onto it. `magnification` is mm on paper a model mm at the nearest point."""

    width: float
    height: float
    projection: Projection
    magnification: float


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
    """Width, height and magnification of a page that content of a size in model mm, above 0, is fitted to."""
    width = spec.width if spec.width is not None else WIDTH_MM
    free = _free(spec, width)
    room = spec.height if spec.height is not None else spec.at_most
    magnification = free / wide
    if room is not None:
        magnification = min(magnification, _free(spec, room) / tall)
    height = spec.height if spec.height is not None else tall * magnification + 2 * spec.margin
    return width, max(height, LEAST_MM), magnification


def _scaled(spec: Spec, wide: float, tall: float, ratio: float) -> tuple[float, float, float]:
    """As `_fitted`, at the scale stated, or at the largest standard one that fits."""
    room = spec.height if spec.height is not None else spec.at_most
    scale = spec.scale
    if scale == "standard":
        width = spec.width if spec.width is not None else WIDTH_MM
        free_tall = _free(spec, room) if room is not None else np.inf
        # A solid has a width and a height in every view.
        scale = _largest_standard(spec, min(_free(spec, width) / (wide * ratio), float(free_tall) / (tall * ratio)))
    assert isinstance(scale, float)
    magnification = scale * ratio
    needs_wide, needs_tall = (side * magnification + 2 * spec.margin for side in (wide, tall))
    width = spec.width if spec.width is not None else needs_wide
    height = spec.height if spec.height is not None else needs_tall
    slack = 1e-6
    if needs_wide > width + slack or needs_tall > (room if room is not None else needs_tall) + slack:
        sentence = f"at this scale the figure needs {needs_wide:.1f} mm by {needs_tall:.1f} mm of paper with its margin"
        raise mistake("does-not-fit", spec.span, sentence, "a smaller scale or a larger page")
    return max(width, LEAST_MM), max(height, LEAST_MM), magnification


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
        sentence = "part of the subject lies behind the eye, so it cannot be fitted"
        raise mistake("nothing-in-view", spec.span, sentence, "move the eye off, or state a `lens`")
    wide, tall = float(high[0] - low[0]), float(high[1] - low[1])
    middle = (low + high) / 2
    if held is None:
        width, height, principal = _fitted(spec, wide, tall)
        if spec.scale == "standard":
            principal = distance * _largest_standard(spec, principal / distance)
            height = spec.height if spec.height is not None else tall * principal + 2 * spec.margin
        origin = (width / 2 - principal * middle[0], height / 2 - principal * middle[1])
    else:
        principal = held
        room = spec.height if spec.height is not None else spec.at_most
        height = spec.height if spec.height is not None else min(tall * principal + 2 * spec.margin, room or np.inf)
        origin = (width / 2, height / 2 - (0.0 if spec.height is not None else principal * middle[1]))
    _check_page(spec, width, height)
    projection = camera.central(viewpoint.eye, viewpoint.toward, principal, (float(origin[0]), float(origin[1])))
    # Points nearer than a twentieth of the way to the target do not drive the chord error: it would grow without bound.
    nearest_mm = max(float((-1.0 / depth[ahead]).min()), distance / 20)
    return Frame(width, max(float(height), LEAST_MM), projection, principal / nearest_mm)


def _largest_standard(spec: Spec, limit: float) -> float:
    """The largest standard scale that is not above `limit`. Raises Mistake if none is."""
    fitting = [each for each in STANDARD_SCALES if each <= limit * (1 + 1e-12)]
    if not fitting:
        raise mistake("out-of-range", spec.span, "no standard scale is small enough for this page")
    return fitting[0]


def _held_distance(spec: Spec, viewpoint: Central, width: float, distance: float) -> float | None:
    """The principal distance on paper that a lens, an angle of view or a scale fixes; None where the figure is fitted.

    Raises Mistake where two of them do.
    """
    if spec.scale is not None and (viewpoint.angle is not None or viewpoint.lens is not None):
        sentence = "the viewpoint's field of view fixes the size already; a `scale` cannot hold as well"
        raise mistake("said-twice", spec.span, sentence, "leave out the `scale`, or the `lens` or `angle of view`")
    if isinstance(spec.scale, float):
        return spec.scale * distance
    if viewpoint.angle is not None:
        return camera.principal_distance_of_angle(viewpoint.angle, width)
    if viewpoint.lens is not None:
        return camera.principal_distance_of_lens(viewpoint.lens, viewpoint.film, width)
    return None

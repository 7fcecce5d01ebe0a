"""How well a page is filled, and which standard projections would fill it better."""

from __future__ import annotations

from collections.abc import Sequence

from platewright.backend.contract import F64

from . import layout
from .frames import Frame, content, standard_below
from .layout import Box
from .mistakes import Problems
from .projections import Central, is_pictorial, standard, standard_names, unit_projection
from .specs import Spec

FULL = 0.85
"""A page is well filled where content takes this much of its limiting side."""

_NAMED = 5


def report_filling(spec: Spec, boxes: Sequence[Box], frame: Frame, points: F64, problems: Problems) -> None:
    """A note where a standard scale leaves much of the stated page free, with projections that would leave less.

    Only for one pictorial view, of world points (n,3), on a page whose size is stated: which side an orthographic view
    shows is no matter of paper. Cost: a pass over the points for each pictorial projection.
    """
    viewpoint = spec.viewpoint
    if spec.scale != "standard" or len(boxes) != 1 or isinstance(viewpoint, Central) or not is_pictorial(viewpoint):
        return
    filled = _filled(spec, boxes[0], frame.scale)
    if filled is None or filled >= FULL:
        return
    better: list[tuple[float, str]] = []
    for name in standard_names():
        other = standard(name)
        if other is None or other == viewpoint or not is_pictorial(other):
            continue
        low, high, _ = content(unit_projection(other, 1.0, spec.true_projection), points)
        box = Box(low, high)
        room = spec.height if spec.height is not None else spec.at_most
        free_tall = None if room is None else room - 2 * spec.margin
        scale = standard_below(layout.scale_that_fits([box], (spec.width or 0.0) - 2 * spec.margin, free_tall))
        share = _filled(spec, box, scale) if scale is not None else None
        if share is not None and share > filled:
            better.append((share, name))
    better.sort(key=lambda each: -each[0])
    hint = ""
    if better:
        hint = ", ".join(f"`{name}` would fill {share:.0%}" for share, name in better[:_NAMED])
    sentence = f"at the standard scale {_spelt(frame.scale)} the content fills {filled:.0%} of the page's limiting side"
    problems.note("page-half-empty", spec.span, sentence, hint)


def _filled(spec: Spec, box: Box, scale: float) -> float | None:
    """The share of the limiting one of the sides stated that content takes; None where none is stated."""
    sides = ((spec.width, box.high[0] - box.low[0]), (spec.height, box.high[1] - box.low[1]))
    shares = [length * scale / (side - 2 * spec.margin) for side, length in sides if side is not None]
    return max(shares, default=None)


def _spelt(scale: float) -> str:
    return f"{scale:.6g}:1" if scale >= 1 else f"1:{1 / scale:.6g}"

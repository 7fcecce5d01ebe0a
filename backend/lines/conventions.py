"""Lines that stand for something by convention, and curves in space that come with a panel."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..contract import F64, SpaceCurve, Style
from .centre_lines import centre_lines
from .model import Candidates, View, joined
from .near import NEAR
from .occluders import Occluders
from .segments import none, placed, weight
from .thread_lines import thread_lines


def conventions_of(view: View, style: Style, occluders: Occluders | None = None) -> Candidates:
    """Threads drawn by convention and, if the style asks for them, centre lines.

    With `occluders`, and unless hidden edges are drawn, centre lines are left out of what is hidden altogether.
    """
    found = thread_lines(view)
    if style.centre_lines:
        found = (*found, centre_lines(view, None if style.hidden else occluders))
    return joined(found) if found else none()


def curves_of(view: View, curves: Sequence[SpaceCurve]) -> Candidates:
    """Space curves as candidates, each a chain of its own; in central projection cut `near.NEAR` mm before the eye."""
    found = []
    for curve in curves:
        start, end = _before_eye(view, curve.points)
        more = {"node": curve.node, "chain": 0, "is_plain": not curve.is_hidden_by_parts}
        found.append(placed(view, start, end, curve.line_class, **more))
    return joined(tuple(found)) if found else none()


def _before_eye(view: View, points: F64) -> tuple[F64, F64]:
    """Starts and ends (s,3) of the segments of a polyline, what is not before the eye cut off."""
    start, end = points[:-1], points[1:]
    is_step = (start != end).any(axis=1)
    start, end = start[is_step], end[is_step]
    here, there = weight(view.projection, start), weight(view.projection, end)
    # A little beyond, so that what is cut off there is safely in view.
    limit = NEAR * (1.0 + 1e-6)
    slope = np.where(here != there, there - here, 1.0)
    share = np.clip((limit - here) / slope, 0.0, 1.0)[:, None]
    crossing = start + share * (end - start)
    is_before = (here >= limit) | (there >= limit)
    first = np.where((here < limit)[:, None], crossing, start)
    last = np.where((there < limit)[:, None], crossing, end)
    return first[is_before], last[is_before]

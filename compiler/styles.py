"""The manner of drawing: from the words of a figure to the style of a panel."""

from __future__ import annotations

from collections.abc import Sequence
from typing import cast

from msgspec import Struct
from msgspec.structs import replace
from platewright.backend.contract import NARROW, DrawnAs, Style
from platewright.lang import tree
from platewright.lang.units import ANGLE, LENGTH

from .expressions import quantity
from .mistakes import Problems, mistake
from .readings import expression, optional, word
from .scope import Scope

DEFAULT_STYLE: DrawnAs = "lines"
"""The manner of drawing of a figure that names none."""

GAP_MM = 0.7
"""Paper left free where a line passes behind another and no width is stated."""

MOST_GAP_MM = 5.0
SMALL_PAGE_MM = 100.0
LINE_GROUPS = (0.35, 0.5)
"""Line groups of figures up to `SMALL_PAGE_MM` wide and above (common practice)."""

LINE_WORDS = (
    "hidden edges",
    "centre lines",
    "line group",
    "tangent edges",
    "edges from",
    "gaps",
    "shade lines",
    "drawn threads",
)
"""Lines of a figure that only line drawings heed."""


class Manner(Struct, frozen=True):
    """How a figure is drawn; None where the view or the page decides."""

    drawn_as: DrawnAs = DEFAULT_STYLE
    hidden: bool = False
    centre_lines: bool | None = None
    wide: float | None = None
    sharp_angle: float = 30.0
    tangent: bool = True
    gap: float = 0.0
    shade_lines: bool = False
    real_threads: bool = False

    @property
    def is_of_lines(self) -> bool:
        """Whether lines are drawn at all."""
        return Style(self.drawn_as).is_of_lines


def read_manner(lines: Sequence[tree.Line], scope: Scope, problems: Problems) -> Manner:
    """What the lines of a figure say of how it is drawn."""
    manner = Manner()
    for line in lines:
        with problems.collecting():
            manner = _with(manner, line.head, scope)
    named = next((line for line in lines if line.head.row == "drawn as"), None)
    if named is not None and (manner.drawn_as == "tone" or manner.drawn_as.startswith("survey")):
        for line in lines:
            if line.head.row in LINE_WORDS:
                sentence = f"`{line.word}` changes nothing where the figure is drawn as {manner.drawn_as}"
                problems.warn("no-effect", line.head.span, sentence, "leave it out, or draw the figure as lines")
    return manner


def _with(manner: Manner, head: tree.Reading, scope: Scope) -> Manner:
    match head.row:
        case "drawn as":
            return replace(manner, drawn_as=cast(DrawnAs, word(head, "style")))
        case "hidden edges":
            return replace(manner, hidden=word(head, "drawn") == "dashed")
        case "centre lines":
            return replace(manner, centre_lines=word(head, "drawn") == "on")
        case "tangent edges":
            return replace(manner, tangent=word(head, "drawn") == "narrow")
        case "line group":
            return replace(manner, wide=_line_group(expression(head, "wide"), scope))
        case "edges from":
            return replace(manner, sharp_angle=_sharp(expression(head, "angle"), scope))
        case "gaps":
            return replace(manner, gap=_gap(optional(head, "width"), scope))
        case "drawn threads":
            return replace(manner, real_threads=word(head, "drawn") == "real")
        case "shade lines":
            return replace(manner, shade_lines=True)
    return manner


def _line_group(written: tree.Expression, scope: Scope) -> float:
    wide = quantity(written, scope, LENGTH)
    for group in NARROW:
        if abs(wide - group) < 1e-9:
            return group
    groups = ", ".join(f"{group:g}" for group in NARROW)
    sentence = f"there is no line group of {wide:g} mm"
    raise mistake("out-of-range", written.span, sentence, f"the wide lines of ISO 128-2 are {groups} mm")


def _sharp(written: tree.Expression, scope: Scope) -> float:
    angle = quantity(written, scope, ANGLE)
    if not 0 < angle < 180:
        raise mistake("out-of-range", written.span, f"expected an angle between 0 and 180 deg, found {angle:g} deg")
    return angle


def _gap(written: tree.Expression | None, scope: Scope) -> float:
    if written is None:
        return GAP_MM
    gap = quantity(written, scope, LENGTH)
    if not 0 < gap <= MOST_GAP_MM:
        sentence = f"expected a gap of more than 0 mm and at most {MOST_GAP_MM:g} mm, found {gap:g} mm"
        raise mistake("out-of-range", written.span, sentence, "leave `gaps` out for none")
    return gap


def style_of(manner: Manner, page_width: float, is_pictorial: bool) -> Style:
    """The style of one panel.

    Where nothing is said, the line group follows the page's width, and centre lines are drawn in orthographic views.
    """
    wide = manner.wide if manner.wide is not None else LINE_GROUPS[page_width > SMALL_PAGE_MM]
    centre_lines = manner.centre_lines if manner.centre_lines is not None else not is_pictorial
    return Style(
        manner.drawn_as,
        1 if manner.drawn_as.startswith("survey") else 4,
        wide,
        manner.sharp_angle,
        manner.hidden,
        manner.tangent,
        centre_lines,
        is_pictorial,
        manner.gap,
        manner.shade_lines,
    )

"""Width and type of the line of every class, in the words and numbers of ISO 128-2."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

from ..contract import LineClass, Style


@dataclass(frozen=True, slots=True)
class Pattern:
    """What a broken line is made of, in multiples of its width d: a dash, then gaps and dots in turn, then a dash.

    `between` begins and ends with a gap. `shortest` is the least dash of a line too short for the full pattern.
    """

    dash: float
    between: tuple[float, ...]
    shortest: float


DASHED = Pattern(12.0, (3.0,), 3.0)
"""Line 02: dashes 12 d, gaps 3 d (ISO 128-2, formerly ISO 128-20 table 3; the dash from memory)."""
LONG_DASHED_DOTTED = Pattern(24.0, (3.0, 0.5, 3.0), 6.0)
"""Line 04: long dashes 24 d, gaps 3 d, dots 0.5 d (ISO 128-2, formerly ISO 128-20 table 3)."""
LONG_DASHED_DOUBLE_DOTTED = Pattern(24.0, (3.0, 0.5, 3.0, 0.5, 3.0), 6.0)
"""Line 05: as line 04 with two dots."""
LineType: TypeAlias = Pattern | None
"""A pattern, or None for a continuous line, 01."""

SHADE = 2.0
"""Shade lines over wide ones: the extra-wide line of ISO 128-2, 4 : 2 : 1. That outlines on the side away from the
light are heavier is common practice."""

_WIDE, _NARROW = True, False
# Applications of ISO 128-2 (formerly ISO 128-24 table 1). A cutting plane is 04.1 with wide ends. A trace line of an
# exploded view is long-dashed dotted so that it is not taken for an edge (common practice). A break line is continuous,
# its zigzag or free hand being part of its path. What is
# drawn as if seen through is narrow and continuous, as patent offices ask of what stands behind something clear.
_TYPES: dict[LineClass, tuple[bool, LineType]] = {
    LineClass.VISIBLE_OUTLINE: (_WIDE, None),
    LineClass.VISIBLE_EDGE: (_WIDE, None),
    LineClass.HIDDEN_OUTLINE: (_NARROW, DASHED),
    LineClass.HIDDEN_EDGE: (_NARROW, DASHED),
    LineClass.IMAGINARY_INTERSECTION: (_NARROW, None),
    LineClass.THREAD_CREST: (_WIDE, None),
    LineClass.THREAD_ROOT: (_NARROW, None),
    LineClass.SECTION_OUTLINE: (_WIDE, None),
    LineClass.CUTTING_PLANE: (_NARROW, LONG_DASHED_DOTTED),
    LineClass.HATCHING: (_NARROW, None),
    LineClass.CENTRE_LINE: (_NARROW, LONG_DASHED_DOTTED),
    LineClass.ADJACENT_PART: (_NARROW, LONG_DASHED_DOUBLE_DOTTED),
    LineClass.EXTREME_POSITION: (_NARROW, LONG_DASHED_DOUBLE_DOTTED),
    LineClass.BREAK_LINE: (_NARROW, None),
    LineClass.DETAIL_FRAME: (_NARROW, None),
    LineClass.TRACE_LINE: (_NARROW, LONG_DASHED_DOTTED),
    LineClass.LEADER: (_NARROW, None),
    LineClass.DIMENSION: (_NARROW, None),
    LineClass.EXTENSION: (_NARROW, None),
    LineClass.SHADING: (_NARROW, None),
    LineClass.PART_SEEN_THROUGH: (_NARROW, None),
    LineClass.REVOLVED_SECTION: (_NARROW, None),
}


@dataclass(frozen=True, slots=True)
class Weight:
    """How a line is drawn: width in mm, type, and the width at its ends and corners where that is another."""

    width: float
    line_type: LineType
    end_width: float


def weight_of(line_class: LineClass, style: Style, is_shaded: bool = False) -> Weight:
    """The weight of a class in a style.

    In pictorial views edges of which both surfaces are seen are narrow, in orthographic ones wide (common practice).
    """
    is_wide, line_type = _TYPES[line_class]
    if line_class is LineClass.VISIBLE_EDGE and style.is_pictorial:
        is_wide = False
    width = style.wide if is_wide else style.narrow
    if is_shaded:
        width = style.wide * SHADE
    end_width = style.wide if line_class is LineClass.CUTTING_PLANE else width
    return Weight(width, line_type, end_width)

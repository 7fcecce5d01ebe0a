"""Signs that tie views together: cutting-plane lines, reference arrows, frames of details, the projection symbol.

Sizes follow the height of letters, as in ISO 128-3 and ISO 5456-2; where those leave a size open it is common practice.
"""

from __future__ import annotations

from math import cos, hypot, radians, sin

import numpy as np

from ..contract import (
    F64,
    CuttingPlaneLine,
    DetailFrame,
    Inscription,
    LineClass,
    Panel,
    Projection,
    ProjectionSymbol,
    Style,
    ViewArrow,
)
from ..drawing import Arc, Fill, Group, Lines, Mark, Path, Point, Stroke, Words
from ..lettering.type import Lettering
from .segments import on_page

HEAD_ANGLE = 30.0
"""Degrees between the sides of an arrow head: a filled one of 30° (common practice within ISO 129-1's 15° to 90°)."""


def notation_of(panel: Panel, lettering: Lettering, height: float, inked: F64) -> tuple[Group, ...]:
    """Signs of one panel, capitals `height` mm high. Page mm; cost: a pass over the lines for each frame of a detail.

    `inked` (k,2,2) are the stretches of lines that words keep clear of where they can.
    """
    items: list[Mark] = []
    for plane in panel.cutting_planes:
        items += _cutting_plane(plane, panel.projection, panel.style, lettering, height)
    for arrow in panel.arrows:
        items += _view_arrow(arrow, panel.projection, panel.style, lettering, height)
    for frame in panel.detail_frames:
        items += _detail_frame(frame, panel.projection, panel.style, lettering, height, inked, panel.place)
    return (Group("words", f"signs of {panel.name}", tuple(items)),) if items else ()


def inscribed(inscription: Inscription, lettering: Lettering) -> Words:
    """An inscription as words from their left end."""
    width = lettering.width_of(inscription.text, inscription.height)
    share = {"left": 0.0, "middle": 0.5, "right": 1.0}[inscription.align]
    x, y = inscription.place
    return Words(inscription.text, (x - share * width, y), inscription.height)


def symbol_of(symbol: ProjectionSymbol, style: Style) -> Group:
    """The truncated cone of ISO 5456-2, seen from its small end and from the side.

    The diameters are as 2 to 1 and the cone is as long as its large diameter. In first-angle projection the view from
    the small end stands behind the large end, in third-angle projection before the small one.
    """
    x, y = symbol.place
    large, small, long = symbol.height, symbol.height / 2, symbol.height
    gap, past = symbol.height * 0.35, symbol.height * 0.15
    middle = y + large / 2
    cone_left = x + past if symbol.method == "first angle" else x + past + large + gap
    round_middle = x + past + (long + gap + large / 2 if symbol.method == "first angle" else large / 2)
    # The side view shows the small end toward the left in first angle, and in third angle as well (ISO 5456-2).
    corners = np.array(
        (
            (cone_left + long, middle - large / 2),
            (cone_left + long, middle + large / 2),
            (cone_left, middle + small / 2),
        )
    )
    items: list[Mark] = [
        Stroke(
            Path((cone_left, middle - small / 2), (Lines(corners),), is_closed=True),
            style.wide,
            LineClass.VISIBLE_OUTLINE,
        ),
        *(
            Stroke(circle((round_middle, middle), each / 2), style.wide, LineClass.VISIBLE_EDGE)
            for each in (large, small)
        ),
    ]
    for start, end in (
        ((cone_left - past, middle), (cone_left + long + past, middle)),
        ((round_middle - large / 2 - past, middle), (round_middle + large / 2 + past, middle)),
        ((round_middle, middle - large / 2 - past), (round_middle, middle + large / 2 + past)),
    ):
        items.append(_straight(start, end, style.narrow, LineClass.CENTRE_LINE))
    return Group("words", symbol.method, tuple(items))


def circle(centre: Point, radius: float) -> Path:
    """A full circle as two arcs."""
    x, y = centre
    right, left = (x + radius, y), (x - radius, y)
    half = (radius, radius)
    return Path(right, (Arc(half, 0.0, False, True, left), Arc(half, 0.0, False, True, right)), is_closed=True)


def arrow(tip: Point, tail: Point, width: float, head: float, line_class: LineClass) -> list[Mark]:
    """A shaft from `tail` and a filled head of length `head` mm that ends in `tip`."""
    length = hypot(tip[0] - tail[0], tip[1] - tail[1])
    along = ((tip[0] - tail[0]) / length, (tip[1] - tail[1]) / length)
    half = head * sin(radians(HEAD_ANGLE / 2)) / cos(radians(HEAD_ANGLE / 2))
    foot = (tip[0] - along[0] * head, tip[1] - along[1] * head)
    sides = np.array(
        (
            (foot[0] - along[1] * half, foot[1] + along[0] * half),
            (foot[0] + along[1] * half, foot[1] - along[0] * half),
        )
    )
    # The shaft ends within the head, so that its round end does not blunt the tip.
    end = (tip[0] - along[0] * head * 0.8, tip[1] - along[1] * head * 0.8)
    return [
        _straight(tail, end, width, line_class),
        Fill((Path(tip, (Lines(sides),), is_closed=True),), (0, 0, 0)),
    ]


def _cutting_plane(
    plane: CuttingPlaneLine, projection: Projection, style: Style, lettering: Lettering, height: float
) -> list[Mark]:
    from .dashes import chain_line

    points = on_page(projection, plane.points)
    items: list[Mark] = list(chain_line(Path(_point(points[0]), (Lines(points[1:]),)), style, LineClass.CUTTING_PLANE))
    end_length, corner_length = 2.0 * height, height
    for k in range(len(points)):
        for other in (k - 1, k + 1):
            if 0 <= other < len(points):
                inner = _toward(points[k], points[other], end_length if k in (0, len(points) - 1) else corner_length)
                items.append(_straight(_point(points[k]), inner, style.wide, LineClass.CUTTING_PLANE))
    sight = _direction(projection, plane.points[0], plane.sight)
    for end, before in ((points[0], points[1]), (points[-1], points[-2])):
        outward = np.asarray(_point(end)) - np.asarray(_toward(end, before, 1.0))
        # The tip touches the wide end of the line from the side that is looked from (ISO 128-3).
        tip = np.asarray(_toward(end, before, height * 0.35))
        tail = tip - sight * height * 2.2
        items += arrow(_point(tip), _point(tail), style.wide, height * 0.95, LineClass.CUTTING_PLANE)
        items.append(_letter(plane.letter, tail + sight * height * 0.45 + outward * height * 0.95, lettering, height))
    return items


def _view_arrow(
    sign: ViewArrow, projection: Projection, style: Style, lettering: Lettering, height: float
) -> list[Mark]:
    tip = on_page(projection, np.array([sign.tip]))[0]
    sight = _direction(projection, np.array(sign.tip), sign.sight)
    tail = tip - sight * height * 3.0
    beside = np.array((sight[1], -sight[0]))
    if beside[1] > 1e-9 or (abs(beside[1]) <= 1e-9 and beside[0] > 0):
        beside = -beside  # the letter stands above the shaft, or to the left of an upright one
    letter = _letter(sign.letter, (tail * 2 + tip) / 3 + beside * height * 0.95, lettering, height)
    return [*arrow(_point(tip), _point(tail), style.wide, height * 0.95, LineClass.LEADER), letter]


def _detail_frame(
    frame: DetailFrame,
    projection: Projection,
    style: Style,
    lettering: Lettering,
    height: float,
    inked: F64,
    place: tuple[float, float, float, float],
) -> list[Mark]:
    centre = on_page(projection, np.array([frame.centre]))[0]
    radius = frame.diameter / 2
    found: list[Mark] = [Stroke(circle(_point(centre), radius), style.narrow, LineClass.DETAIL_FRAME)]
    if frame.letter:
        half = np.array((lettering.width_of(frame.letter, height), height)) / 2 + 0.2 * height
        turns = [radians(angle) for angle in _ASIDE]
        middles = [centre + np.array((cos(turn), -sin(turn))) * (radius + height * 0.95) for turn in turns]
        corner, size = np.array(place[:2]), np.array(place[2:])

        def cost(at: F64) -> tuple[float, float]:
            """How far a letter would leave the panel, then how much of lines it would cover."""
            past = np.maximum(corner - (at - half), at + half - corner - size).max()
            return max(round(float(past), 6), 0.0), _crossed(inked, at - half, at + half)

        middle = min(middles, key=cost)
        found.append(_letter(frame.letter, middle, lettering, height))
    return found


_ASIDE = (45.0, 135.0, -45.0, -135.0, 0.0, 180.0, 90.0, -90.0)
"""Directions in degrees, counter-clockwise on the page, in which a frame's letter is put, the first that is clear."""


def _crossed(segments: F64, low: F64, high: F64) -> float:
    """Length in mm of segments (k,2,2) within a box."""
    start, along = segments[:, 0], segments[:, 1] - segments[:, 0]
    with np.errstate(divide="ignore", invalid="ignore"):
        first, last = (low - start) / along, (high - start) / along
    enter, leave = np.minimum(first, last), np.maximum(first, last)
    level = along == 0.0
    is_inside = (start >= low) & (start <= high)
    enter = np.where(level, np.where(is_inside, -np.inf, np.inf), enter)
    leave = np.where(level, np.where(is_inside, np.inf, -np.inf), leave)
    share = np.minimum(leave.min(axis=1), 1.0) - np.maximum(enter.max(axis=1), 0.0)
    return float((np.maximum(share, 0.0) * np.hypot(along[:, 0], along[:, 1])).sum())


def _letter(text: str, middle: F64, lettering: Lettering, height: float) -> Words:
    """Upright letters whose middle is at a point."""
    width = lettering.width_of(text, height)
    return Words(text, (float(middle[0]) - width / 2, float(middle[1]) + height / 2), height)


def _straight(start: Point, end: Point, width: float, line_class: LineClass) -> Stroke:
    return Stroke(Path(start, (Lines(np.array([end])),)), width, line_class)


def _toward(start: F64, end: F64, length: float) -> Point:
    whole = hypot(float(end[0] - start[0]), float(end[1] - start[1]))
    share = length / whole if whole else 0.0
    return (float(start[0] + (end[0] - start[0]) * share), float(start[1] + (end[1] - start[1]) * share))


def _direction(projection: Projection, at: F64, along: tuple[float, float, float]) -> F64:
    """The unit direction on the page of a world direction at a world point; down where it is seen end-on."""
    ends = on_page(projection, np.stack((at, at + np.asarray(along))))
    x, y = (float(each) for each in ends[1] - ends[0])
    if hypot(x, y) < 1e-9:
        return np.array((0.0, 1.0))
    # An arrow along an axis is exactly level or upright, whatever the last digit says.
    size = hypot(x, y)
    return np.array([round(each / size, 9) for each in (x, y)])


def _point(at: F64) -> Point:
    return (float(at[0]), float(at[1]))

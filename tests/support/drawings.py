"""Small drawings for the tests of writers and of the converter, each about one thing, in mm.

Pages are 1.6 by 1.2 inches, a whole number of pixels at usual resolutions, since renderers round pages differently.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from platewright.backend.contract import LineClass
from platewright.backend.drawing import (
    BLACK,
    Arc,
    Colour,
    Cubics,
    Drawing,
    Fill,
    Group,
    Image,
    Lines,
    Mark,
    Path,
    Stroke,
    Words,
)

Points = list[tuple[float, float]]


def chain(points: Points, is_closed: bool = False) -> Path:
    """Straight segments through points."""
    return Path(points[0], (Lines(np.array(points[1:], float).reshape(-1, 2)),), is_closed)


def line(
    points: Points,
    width: float = 0.35,
    is_round: bool = True,
    colour: Colour = BLACK,
    is_closed: bool = False,
    line_class: LineClass = LineClass.VISIBLE_EDGE,
) -> Stroke:
    return Stroke(chain(points, is_closed), width, line_class, colour, is_round)


def ellipse(centre: tuple[float, float], a: float, b: float, turn: float = 0.0, n_arcs: int = 2) -> Path:
    """A whole ellipse in equal arcs."""
    angles = 2.0 * np.pi * np.arange(n_arcs + 1) / n_arcs
    t = np.radians(turn)
    x = centre[0] + a * np.cos(angles) * np.cos(t) - b * np.sin(angles) * np.sin(t)
    y = centre[1] + a * np.cos(angles) * np.sin(t) + b * np.sin(angles) * np.cos(t)
    points = [(float(u), float(v)) for u, v in zip(x, y, strict=True)]
    points[-1] = points[0]
    return Path(points[0], tuple(Arc((a, b), turn, n_arcs == 1, True, end) for end in points[1:]), True)


def page(*items: Group | Mark, width: float = 40.64, height: float = 30.48, **words: str) -> Drawing:
    return Drawing(width, height, (Group("panel", "1", items),), **words)


def joins() -> Drawing:
    """Round and flat ends, round and mitred joins, sharp turns, a closed line, a point."""
    return page(
        line([(4, 4), (16, 4), (16, 10)], 1.5),
        line([(4, 8), (13, 9), (5, 12)], 1.2, False),
        line([(20, 4), (34, 5), (26, 12)], 1.5, is_closed=True),
        line([(20, 16), (34, 16), (34, 22), (20, 22)], 1.0, False, is_closed=True),
        line([(4, 16), (16, 16.5), (4, 17)], 1.2),
        line([(6, 22), (14, 22), (6, 22)], 0.8),
        line([(5, 27), (5, 27)], 2.0),
        line([(10, 25), (11, 27), (12, 25), (13, 27), (14, 25), (14.2, 25.1), (14.3, 25.4)], 1.0, False),
    )


def curves() -> Drawing:
    """Arcs of ellipses, turned and large, whole circles, cubics with tight bends."""
    large = Path((24.0, 8.0), (Arc((7.0, 3.0), 25.0, True, False, (27.0, 6.0)),))
    small = Path((4.0, 26.0), (Arc((9.0, 9.0), 0.0, False, True, (15.0, 26.0)),))
    tight = Path((22.0, 27.0), (Cubics(np.array([(40.0, 14.0), (14.0, 16.0), (36.0, 27.0)])),))
    edge = LineClass.VISIBLE_OUTLINE
    return page(
        Stroke(ellipse((10, 9), 7, 7), 0.5, edge),
        Stroke(ellipse((10, 9), 5, 2, 30.0, 4), 0.25, edge),
        Stroke(large, 0.7, edge),
        Stroke(small, 0.7, edge, is_round=False),
        Stroke(tight, 0.9, edge),
        Fill((ellipse((33, 24), 3, 2, -40.0),), (200, 60, 30)),
    )


def dashes() -> Drawing:
    """Real dashes of 3 mm with gaps of 0.75 mm along slanting lines and about corners, flat-ended."""
    marks = []
    for k in range(10):
        direction = np.array((np.cos(0.15 * k), np.sin(0.15 * k)))
        for step in range(8):
            a, b = 3 + direction * 3.75 * step, 3 + direction * (3.75 * step + 3.0)
            if max(b) < 28:
                marks.append(line([tuple(a), tuple(b)], 0.25, False, line_class=LineClass.HIDDEN_EDGE))
    marks.append(line([(34, 4), (36, 4), (36, 6)], 0.5, False, line_class=LineClass.HIDDEN_OUTLINE))
    return page(*marks)


def dense() -> Drawing:
    """Crowded crossing lines of two weights."""
    random = np.random.default_rng(7)
    marks = []
    for k in range(400):
        a = random.uniform((2, 2), (38, 28))
        b = np.clip(a + random.normal(size=2) * 4, 1, (39, 29))
        marks.append(line([tuple(a), tuple(b)], 0.25 if k % 2 else 0.5))
    return page(*marks)


def hatching() -> Drawing:
    """Parallel lines 0.7 mm apart within an outline."""
    marks = [line([(6 + 0.7 * k, 6), (16 + 0.7 * k, 16)], 0.18, line_class=LineClass.HATCHING) for k in range(15)]
    return page(*marks, line([(6, 6), (16.5, 6), (26, 16), (16, 16)], 0.7, is_closed=True))


def mosaic() -> Drawing:
    """Fills that abut along slanting sides, all of one tint, about a middle that no pixel corner meets."""
    random = np.random.default_rng(3)
    middle = (20.137, 15.291)
    angles = np.sort(random.uniform(0, 2 * np.pi, 23))
    rim = [(middle[0] + 12 * np.cos(t), middle[1] + 12 * np.sin(t)) for t in angles]
    fills = tuple(
        Fill((chain([middle, rim[k], rim[(k + 1) % len(rim)]], True),), (150, 150, 150)) for k in range(len(rim))
    )
    return Drawing(40.64, 30.48, (Group("fills", "tints", fills),))


def islands() -> Drawing:
    """Even-odd fills with holes and overlaps, each painted over by the next."""
    star = [(20 + 11 * np.sin(4 * np.pi * k / 5), 14 - 11 * np.cos(4 * np.pi * k / 5)) for k in range(5)]
    ring = (chain([(3, 3), (15, 4), (14, 13), (4, 12)], True), ellipse((9, 8), 3, 3))
    return page(
        Fill(ring, (30, 90, 160)),
        Fill((chain(star, True),), (90, 90, 90)),
        Fill((ellipse((28, 20), 6, 4, 20.0),), (250, 210, 60)),
    )


def clipped() -> Drawing:
    """A group cut to a slanting quadrangle, and one within it cut again."""
    rays = tuple(line([(20, 15), (20 + 30 * np.cos(t), 15 + 30 * np.sin(t))], 0.5) for t in np.arange(24) * np.pi / 12)
    disc = Stroke(ellipse((20, 15), 9, 9), 1.0, LineClass.VISIBLE_OUTLINE)
    inner = Group("part", "disc", (disc,), np.array([(12.0, 0.0), (30.0, 10.0), (12.0, 30.0)]))
    outer = Group("panel", "A", (*rays, inner), np.array([(5.0, 6.0), (33.0, 3.0), (36.0, 26.0), (8.0, 24.0)]))
    return Drawing(40.64, 30.48, (outer,))


def nested() -> Drawing:
    """Groups as a figure has them: panels, parts with brackets in their names, classes; alike names twice."""

    def part(name: str, x: float) -> Group:
        outline = line([(x, 4), (x + 6, 4), (x + 6, 10), (x, 10)], 0.7, is_closed=True)
        edge = line([(x + 1, 5), (x + 5, 9)], 0.35)
        classes = (Group("class", "visible-outline", (outline,)), Group("class", "visible-edge", (edge,)))
        return Group("part", name, classes)

    parts = (part("gauge.cap_screws[3].head", 4), part("gauge.cap screws 3.head", 14), part("gauge.ö & <x>", 24))
    fills = Group("fills", "", (Fill((chain([(4, 4), (10, 4), (10, 10), (4, 10)], True),), (255, 255, 255)),))
    return Drawing(40.64, 30.48, (Group("panel", "A", (fills, *parts)), Group("panel", "A", (part("base", 4),))))


def wording() -> Drawing:
    """Texts of several heights, turned, with letters and signs."""
    return page(
        Words("Section A–A", (4.0, 8.0), 3.5),
        Words("Ωμέγα 1:2", (4.0, 15.0), 2.5, face="sans bold"),
        Words("turned 30°", (22.0, 26.0), 2.5, -30.0, (160, 0, 0)),
        Words("8 & <9>", (8.0, 25.0), 5.0, 90.0),
    )


def picture() -> Drawing:
    """A picture under lines, its pixels 0.2 mm, with a frame about it."""
    rows, columns = np.mgrid[0:80, 0:120]
    levels = np.stack((60 + rows, 255 - columns, 100 + (rows + columns) // 2), axis=2).astype(np.uint8)
    return page(
        Image(levels, (8.0, 7.0, 24.0, 16.0)),
        line([(8, 7), (32, 7), (32, 23), (8, 23)], 0.35, is_closed=True),
    )


def grid() -> Drawing:
    """Level and upright lines at odd places, in three weights, and a slanting one of each."""
    marks = []
    for k, width in enumerate((0.18, 0.25, 0.5)):
        for step in range(6):
            at = 3.017 + 4 * k + 0.613 * step * (1 + k)
            marks.append(line([(2.3, at), (17.9, at)], width))
            marks.append(line([(20 + at / 2, 2.1), (20 + at / 2, 27.7)], width))
        marks.append(line([(2, 27 - k), (18, 21 - k)], width))
    return page(*marks)


SAMPLES: dict[str, Callable[[], Drawing]] = {
    make.__name__: make
    for make in (
        joins,
        curves,
        dashes,
        dense,
        hatching,
        mosaic,
        islands,
        clipped,
        nested,
        wording,
        picture,
        grid,
    )
}

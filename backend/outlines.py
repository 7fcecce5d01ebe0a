"""Paths in the forms writers need: arcs in smaller steps or as cubic curves, words as the outlines of their letters.

Arcs are halved with square roots alone, which every processor rounds alike; sines appear only for the turn of an
ellipse.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np

from .contract import F64
from .drawing import Arc, Cubics, Lines, Path, Piece, Point, Words

Letters: TypeAlias = Callable[[str, float, Literal["sans", "sans bold"]], tuple[Path, ...]]
"""Outlines of a text by its capitals' height and face: page mm, base line from (0,0) to the right, nonzero rule."""

CUBIC_STEP = math.radians(45.0) + 1e-9
"""Longest stretch of an ellipse, in radians, that one cubic stands for: it strays by 4.2e-6 of the radius."""


@dataclass(frozen=True, eq=False, slots=True)
class ArcSteps:
    """An arc in n equal steps: `units` (n+1,2) on the unit circle, `frame` (2,2) and `centre` take them to the page.

    A page point is `centre + frame @ unit`. `cosine` is that of one step.
    """

    units: F64
    frame: F64
    centre: F64
    cosine: float

    @property
    def points(self) -> F64:
        """Ends of the steps on the page (n+1,2)."""
        return _mapped(self.frame, self.units) + self.centre


def arc_steps(start: Point, arc: Arc, longest: float) -> ArcSteps | None:
    """The arc from `start` in 1, 2, 4 ... equal steps of at most `longest` radians; None if it is a straight line.

    Half axes too short to reach are lengthened alike, as SVG 1.1 F.6.6 has it; the centre is that of F.6.5.
    """
    long, short = abs(arc.half_axes[0]), abs(arc.half_axes[1])
    if long == 0.0 or short == 0.0 or start == arc.end:
        return None
    cos, sin = math.cos(math.radians(arc.turn)), math.sin(math.radians(arc.turn))
    across, down = (start[0] - arc.end[0]) / 2.0, (start[1] - arc.end[1]) / 2.0
    half = ((cos * across + sin * down) / long, (cos * down - sin * across) / short)
    reach = math.sqrt(half[0] * half[0] + half[1] * half[1])
    if reach > 1.0:
        long, short, half, reach = long * reach, short * reach, (half[0] / reach, half[1] / reach), 1.0
    frame = np.array(((long * cos, -short * sin), (long * sin, short * cos)))
    rise = math.sqrt(max(0.0, 1.0 - reach * reach)) / reach
    side = -rise if arc.is_large == arc.is_clockwise else rise
    centre_unit = (side * half[1], -side * half[0])
    middle = np.array(((start[0] + arc.end[0]) / 2.0, (start[1] + arc.end[1]) / 2.0))
    centre = middle + _mapped(frame, np.array((centre_unit,)))[0]
    ends = np.array(
        ((half[0] - centre_unit[0], half[1] - centre_unit[1]), (-half[0] - centre_unit[0], -half[1] - centre_unit[1]))
    )
    units, cosine = _halved(_unit(ends), arc.is_large, arc.is_clockwise, math.cos(longest))
    return ArcSteps(units, frame, centre, cosine)


def arc_cubics(start: Point, arc: Arc) -> F64:
    """The arc as cubics (3k,2): two control points and an end each, the last exactly `arc.end`; empty if straight.

    The handle of a step by angle a is (4/3) tan(a/4) long: Goldapp 1991, "Approximation of circular arcs by cubic
    polynomials".
    """
    steps = arc_steps(start, arc, CUBIC_STEP)
    if steps is None:
        return np.empty((0, 2))
    half = math.sqrt((1.0 + steps.cosine) / 2.0)  # cosine of half a step; tan(x/2) = sin x / (1 + cos x)
    handle = 4.0 / 3.0 * math.sqrt(max(0.0, 1.0 - half * half)) / (1.0 + half)
    sign = handle if arc.is_clockwise else -handle
    tangents = _mapped(steps.frame, steps.units[:, ::-1] * (-sign, sign))
    points = steps.points
    points[0], points[-1] = start, arc.end
    cubics = np.stack((points[:-1] + tangents[:-1], points[1:] - tangents[1:], points[1:]), axis=1)
    return cubics.reshape(-1, 2)


def without_arcs(path: Path) -> Path:
    """The same path with its arcs as cubics."""
    pieces: list[Piece] = []
    at = path.start
    for piece in path.pieces:
        if isinstance(piece, Arc):
            cubics = arc_cubics(at, piece)
            pieces.append(Cubics(cubics) if len(cubics) else Lines(np.array((piece.end,))))
        else:
            pieces.append(piece)
        at = end_of(piece)
    return Path(path.start, tuple(pieces), path.is_closed)


def end_of(piece: Piece) -> Point:
    """Where a piece ends."""
    if isinstance(piece, Arc):
        return piece.end
    return (float(piece.points[-1, 0]), float(piece.points[-1, 1]))


def standard_letters() -> Letters:
    """The letters of `lettering`, fonts being read when the first one is wanted."""
    from .lettering.type import Lettering

    return Lettering().outlines


def outlined(words: Words, letters: Letters) -> tuple[Path, ...]:
    """Closed outlines of the words at their place on the page, without arcs, to be filled by the nonzero rule."""
    cos, sin = math.cos(math.radians(words.turn)), math.sin(math.radians(words.turn))
    turn, origin = np.array(((cos, -sin), (sin, cos))), np.array(words.origin)

    def placed(points: F64) -> F64:
        moved: F64 = _mapped(turn, points) + origin
        return moved

    paths = []
    for path in map(without_arcs, letters(words.text, words.height, words.face)):
        x, y = placed(np.array((path.start,)))[0]
        pieces = tuple(
            Lines(placed(piece.points)) if isinstance(piece, Lines) else Cubics(placed(piece.points))
            for piece in path.pieces
            if not isinstance(piece, Arc)
        )
        paths.append(Path((float(x), float(y)), pieces, True))
    return tuple(paths)


def _halved(ends: F64, is_large: bool, is_clockwise: bool, least_cosine: float) -> tuple[F64, float]:
    """Unit vectors from ends[0] to ends[1] by halving, until the cosine of a step is at least `least_cosine`."""
    cosine = float(ends[0, 0] * ends[1, 0] + ends[0, 1] * ends[1, 1])
    if not is_large and cosine >= least_cosine:
        return ends, cosine
    if cosine < 0.0:
        chord = ends[1] - ends[0]
        middle = np.array((chord[1], -chord[0])) * (1.0 if is_clockwise else -1.0)
    else:
        middle = (ends[0] + ends[1]) * (-1.0 if is_large else 1.0)
    units = np.stack((ends[0], _unit(middle[None])[0], ends[1]))
    while (cosine := float(units[0, 0] * units[1, 0] + units[0, 1] * units[1, 1])) < least_cosine:
        finer = np.empty((2 * len(units) - 1, 2))
        finer[::2], finer[1::2] = units, _unit(units[:-1] + units[1:])
        units = finer
    return units, cosine


def _unit(vectors: F64) -> F64:
    lengths: F64 = np.sqrt(vectors[:, :1] * vectors[:, :1] + vectors[:, 1:] * vectors[:, 1:])
    units: F64 = vectors / lengths
    return units


def _mapped(matrix: F64, vectors: F64) -> F64:
    """`matrix @ vector` for each row, sums spelled out so that no library chooses their order."""
    return np.stack(
        (
            matrix[0, 0] * vectors[:, 0] + matrix[0, 1] * vectors[:, 1],
            matrix[1, 0] * vectors[:, 0] + matrix[1, 1] * vectors[:, 1],
        ),
        axis=1,
    )

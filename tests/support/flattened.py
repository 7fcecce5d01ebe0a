"""Paths of a drawing as close rows of points, worked out apart from the project's own measuring of paths."""

from __future__ import annotations

import numpy as np
from platewright.backend.contract import F64
from platewright.backend.drawing import Arc, Cubics, Lines, Path

ARC_STEPS, CUBIC_STEPS = 250, 120  # points on each curve


def flattened(path: Path) -> F64:
    """Points (k,2) along a path, from its start to its end; a closed one comes back to its start."""
    rows = [np.array([path.start])]
    for piece in path.pieces:
        here = rows[-1][-1]
        match piece:
            case Lines(points):
                rows.append(points)
            case Arc():
                rows.append(_arc(here, piece))
            case Cubics(points):
                for curve in points.reshape(-1, 3, 2):
                    rows.append(_cubic(np.vstack([rows[-1][-1:], curve])))
    if path.is_closed:
        rows.append(rows[0])
    return np.vstack(rows)


def _cubic(p: F64) -> F64:
    t = np.linspace(0.0, 1.0, CUBIC_STEPS)[1:, None]
    return (1 - t) ** 3 * p[0] + 3 * (1 - t) ** 2 * t * p[1] + 3 * (1 - t) * t**2 * p[2] + t**3 * p[3]


def _arc(start: F64, arc: Arc) -> F64:
    """SVG 1.1, appendix F.6.5 and F.6.6, with complex numbers."""
    turn = np.exp(1j * np.radians(arc.turn))
    long, short = arc.half_axes

    def unit(x: float, y: float) -> complex:
        own = complex(x, y) / turn
        return complex(own.real / long, own.imag / short)

    a, b = unit(*start), unit(*arc.end)
    half = abs(b - a) / 2
    stretch = max(half, 1.0)
    a, b = a / stretch, b / stretch
    away = np.sqrt(max(0.0, 1 - (half / stretch) ** 2)) * 1j * (b - a) / abs(b - a)
    centre = (a + b) / 2 + (away if arc.is_large != arc.is_clockwise else -away)
    sweep = np.angle((b - centre) / (a - centre)) % (2 * np.pi)
    if not arc.is_clockwise:
        sweep -= 2 * np.pi
    circle = centre + (a - centre) * np.exp(1j * sweep * np.linspace(0.0, 1.0, ARC_STEPS)[1:])
    page = turn * (circle.real * long + 1j * circle.imag * short) * stretch
    return np.column_stack([page.real, page.imag])


def farthest(points: F64, line: F64) -> float:
    """The greatest distance of any of the points from a row of points joined by straight lines."""
    start, along = line[:-1], np.diff(line, axis=0)
    square = np.maximum((along**2).sum(axis=1), 1e-300)
    place = ((points[:, None] - start) * along).sum(axis=2) / square
    away = points[:, None] - start - np.clip(place, 0.0, 1.0)[:, :, None] * along
    return float(np.sqrt((away**2).sum(axis=2)).min(axis=1).max())


def length(line: F64) -> float:
    """Length of a row of points joined by straight lines."""
    return float(np.sqrt((np.diff(line, axis=0) ** 2).sum(axis=1)).sum())

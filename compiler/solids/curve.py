"""Stretches of plane curves: straight, circular, elliptic, cubic; their division, tangents, lengths and areas.

Circles and ellipses are divided at the marks of their own full turn, so an arc and a cylinder of its radius and centre
share vertices. A cubic piece is divided evenly: a chord over the share w of it is off by at most w² max|P''| / 8.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from ..trigonometry import circle_points, circle_table, cos_deg, sin_deg
from .ladder import divisions
from .recipe import Point2

F64 = NDArray[np.float64]

CHECK_SHARE = 1e-5
"""Chord error as part of the radius where no rung is given: 704 chords a circle."""
_NEAR = 1e-9
# Gauss-Legendre, exact for polynomials up to degree 5: the area below a cubic piece needs no more.
_GAUSS = ((0.5 - math.sqrt(0.15), 5.0 / 18.0), (0.5, 8.0 / 18.0), (0.5 + math.sqrt(0.15), 5.0 / 18.0))


@dataclass(frozen=True, slots=True)
class Curve:
    """One stretch. An arc has a radius above 0 and turns counter-clockwise round `centre` if `left`.

    An ellipse has `oval` in place of a radius: its half axes and the angle in degrees by which the first is turned.
    A spline has `pieces`, the control points of its cubics.
    """

    start: Point2
    end: Point2
    centre: Point2 = (0.0, 0.0)
    radius: float = 0.0
    left: bool = True
    oval: tuple[float, float, float] | None = None
    pieces: tuple[tuple[Point2, Point2, Point2, Point2], ...] = ()

    @property
    def is_line(self) -> bool:
        """Whether it is straight."""
        return not (self.radius or self.oval or self.pieces)

    @property
    def is_free(self) -> bool:
        """Whether it is neither straight nor circular."""
        return bool(self.oval or self.pieces)


def reverse(curve: Curve) -> Curve:
    """The same stretch from its end to its start."""
    pieces = tuple((d, c, b, a) for a, b, c, d in reversed(curve.pieces))
    return replace(curve, start=curve.end, end=curve.start, left=not curve.left, pieces=pieces)


def sweep(curve: Curve) -> float:
    """The angle a circular stretch turns through, radians in (0, 2 pi]; of an ellipse, that of the circle it maps."""
    if curve.start == curve.end:
        return math.tau
    first, last = angle(curve, curve.start), angle(curve, curve.end)
    turn = (last - first if curve.left else first - last) % math.tau
    return math.tau if turn <= _NEAR else turn


def angle(curve: Curve, point: Point2) -> float:
    """Where a point lies on the circle, or on that which maps to the ellipse, radians."""
    x, y = point[0] - curve.centre[0], point[1] - curve.centre[1]
    if curve.oval is None:
        return math.atan2(y, x)
    a, b, turn = curve.oval
    c, s = cos_deg(turn), sin_deg(turn)
    return math.atan2((c * y - s * x) / b, (c * x + s * y) / a)


def frame(curve: Curve) -> F64:
    """The (2,2) map of the unit circle to a circle or an ellipse."""
    if curve.oval is None:
        return np.array(((curve.radius, 0.0), (0.0, curve.radius)))
    a, b, turn = curve.oval
    c, s = cos_deg(turn), sin_deg(turn)
    return np.array(((a * c, -b * s), (a * s, b * c)))


def area_beside(curve: Curve) -> float:
    """Half the integral of x dy - y dx along the stretch, mm²; round a closed loop they add up to its area."""
    (x0, y0), (x1, y1) = curve.start, curve.end
    total = (x0 * y1 - x1 * y0) / 2.0
    if curve.radius or curve.oval:
        turn = sweep(curve)
        product = curve.radius**2 if curve.oval is None else curve.oval[0] * curve.oval[1]
        return total + (1.0 if curve.left else -1.0) * product * (turn - math.sin(turn)) / 2.0
    if curve.pieces:
        control = np.array(curve.pieces)
        total = 0.0
        for share, weight in _GAUSS:
            p, d = _positions(control, share), _derivatives(control, share)
            total += weight * float((p[:, 0] * d[:, 1] - p[:, 1] * d[:, 0]).sum()) / 2.0
    return total


def reached(curve: Curve) -> list[Point2]:
    """The start, and the points where the stretch reaches furthest along x and y, strictly within it."""
    found = [curve.start]
    if curve.radius or curve.oval:
        begin, turn = angle(curve, curve.start if curve.left else curve.end), sweep(curve)
        matrix, (x, y) = frame(curve), curve.centre
        if curve.oval is None:
            r = curve.radius
            marks = [(k * math.pi / 2, p) for k, p in enumerate(((x + r, y), (x, y + r), (x - r, y), (x, y - r)))]
        else:
            marks = []
            for p, q in matrix.tolist():
                for t in (math.atan2(q, p), math.atan2(q, p) + math.pi):
                    turned = matrix @ (math.cos(t), math.sin(t))
                    marks.append((t, (x + float(turned[0]), y + float(turned[1]))))
        found += [point for mark, point in marks if (mark - begin) % math.tau <= turn]
    for piece in curve.pieces:
        control = np.array((piece,))
        a, b, c = np.diff(control[0], axis=0)
        # The derivative as a quadratic: a (1-t)² + 2 b t (1-t) + c t².
        for axis in range(2):
            roots = _roots(float((a - 2 * b + c)[axis]), float(2 * (b - a)[axis]), float(a[axis]))
            found += [_point(_positions(control, t)[0]) for t in roots if 0.0 < t < 1.0]
        found.append(piece[3])
    return found


def count_chords(curve: Curve, rung: float) -> int:
    """Chords of `divided` at most."""
    if curve.is_line:
        return 1
    if curve.pieces:
        return int(_cubic_chords(np.array(curve.pieces), rung).sum())
    return math.ceil(_circle_chords(curve, rung) * sweep(curve) / math.tau) + 2


def divided(curve: Curve, rung: float) -> tuple[F64, F64]:
    """Points (k,2) from the start on, without the end, and unit tangents (k+1,2) with that of the end.

    Chords are off by at most `rung` mm, for 0 by 1/100 000 of the size.
    """
    if curve.is_line:
        along = np.array(curve.end) - curve.start
        return np.array([curve.start]), np.repeat(unit(along)[None], 2, axis=0)
    if curve.pieces:
        return _divided_cubics(curve, rung)
    points = np.concatenate((np.array([curve.start]), _marks(curve, rung)))
    return points, tangents_at(curve, np.concatenate((points, np.array([curve.end]))))


def full_turn(curve: Curve, rung: float) -> tuple[F64, F64]:
    """As `divided`, for a whole circle or ellipse, from its own zero mark."""
    points = np.array(curve.centre) + circle_table(_circle_chords(curve, rung)) @ frame(curve).T
    points = points if curve.left else np.concatenate((points[:1], points[:0:-1]))
    return points, tangents_at(curve, np.concatenate((points, points[:1])))


def tangents_at(curve: Curve, points: F64) -> F64:
    """Unit tangents (k,2) of a circle or an ellipse at points (k,2) of it, in its direction."""
    matrix = frame(curve)
    local = (points - curve.centre) @ np.linalg.inv(matrix).T
    turned = np.stack((-local[:, 1], local[:, 0]), axis=1) @ matrix.T
    return unit(turned if curve.left else -turned)


def end_tangents(curve: Curve) -> tuple[F64, F64]:
    """Unit tangents (2,) where the stretch starts and ends."""
    if curve.is_line:
        # Plain numbers: for one vector they are many times faster than arrays.
        x, y = curve.end[0] - curve.start[0], curve.end[1] - curve.start[1]
        length = math.hypot(x, y) or 1.0
        along = np.array((x / length, y / length))
        return along, along
    if curve.radius:
        side = 1.0 if curve.left else -1.0
        found = []
        for x, y in (curve.start, curve.end):
            x, y = side * (x - curve.centre[0]), side * (y - curve.centre[1])
            length = math.hypot(x, y)
            found.append(np.array((-y / length, x / length)))
        return found[0], found[1]
    if curve.pieces:
        control = np.array(curve.pieces)
        return unit(_derivatives(control[:1], 0.0)[0]), unit(_derivatives(control[-1:], 1.0)[0])
    first, last = tangents_at(curve, np.array((curve.start, curve.end)))
    return first, last


def fraction_points(curve: Curve, n: int) -> tuple[F64, F64]:
    """n points (n,2) at even shares of the parameter from the start on, without the end; tangents (n+1,2)."""
    points, tangents = points_at(curve, np.arange(n + 1) / n)
    points[0] = curve.start
    return points[:-1], tangents


def points_at(curve: Curve, share: F64) -> tuple[F64, F64]:
    """Points (k,2) and unit tangents (k,2) at shares (k,) of the parameter, 0 to 1."""
    if curve.is_line:
        points = np.array(curve.start) + share[:, None] * (np.array(curve.end) - curve.start)
        return points, np.repeat(end_tangents(curve)[0][None], len(share), axis=0)
    if curve.pieces:
        control = np.array(curve.pieces)
        place = share * len(control)
        row = np.minimum(place.astype(np.int64), len(control) - 1)
        within = place - row
        return _positions(control[row], within), unit(_derivatives(control[row], within))
    turn = sweep(curve) * (1.0 if curve.left else -1.0)
    t = angle(curve, curve.start) + share * turn
    points = np.array(curve.centre) + np.stack((np.cos(t), np.sin(t)), axis=1) @ frame(curve).T
    return points, tangents_at(curve, points)


def shares_of(curve: Curve, points: F64) -> F64:
    """The shares (k,) of the parameter at which points (k,2) of a circular or elliptic stretch lie."""
    sign = 1.0 if curve.left else -1.0
    first = angle(curve, curve.start)
    local = (points - curve.centre) @ np.linalg.inv(frame(curve)).T
    turns = (sign * (np.arctan2(local[:, 1], local[:, 0]) - first)) % math.tau
    turns = np.where(turns > math.tau - _NEAR, 0.0, turns)
    shares: F64 = turns / sweep(curve)
    return shares


def unit(vectors: F64) -> F64:
    """Vectors (...,2) at length 1; zeros stay zeros."""
    length = np.hypot(vectors[..., 0], vectors[..., 1])
    found: F64 = vectors / np.where(length > 0.0, length, 1.0)[..., None]
    return found


def _circle_chords(curve: Curve, rung: float) -> int:
    radius = curve.radius if curve.oval is None else max(curve.oval[:2])
    return divisions(radius, rung or CHECK_SHARE * radius)


def _marks(curve: Curve, rung: float) -> F64:
    """The marks of the full turn that lie strictly within the stretch, in its direction."""
    n = _circle_chords(curve, rung)
    step = math.tau / n
    first, turn = angle(curve, curve.start), sweep(curve)
    if not curve.left:
        first -= turn
    # A mark that all but coincides with an end would leave a sliver; for a check alone, marks need not be kept.
    margin = 1e-6 if rung else 0.05
    low, high = first / step + margin, (first + turn) / step - margin
    marks = np.arange(math.ceil(low), math.floor(high) + 1)
    table = circle_points(n, marks)
    points = np.array(curve.centre) + (table @ frame(curve).T if curve.oval else curve.radius * table)
    return points if curve.left else points[::-1]


def _cubic_chords(control: F64, rung: float) -> NDArray[np.int64]:
    bend = 6.0 * np.diff(control, n=2, axis=1)
    most = np.hypot(bend[..., 0], bend[..., 1]).max(axis=1)
    error = rung or CHECK_SHARE * float(np.ptp(control, axis=(0, 1)).max())
    # At least two, so that no piece is taken for straight.
    chords: NDArray[np.int64] = np.maximum(np.ceil(np.sqrt(most / (8.0 * error)) - _NEAR), 2).astype(np.int64)
    return chords


def _divided_cubics(curve: Curve, rung: float) -> tuple[F64, F64]:
    control = np.array(curve.pieces)
    n = _cubic_chords(control, rung)
    row = np.repeat(np.arange(len(n)), n)
    share = (np.arange(len(row)) - np.repeat(np.cumsum(n) - n, n)) / n[row]
    points = _positions(control[row], share)
    tangents = np.concatenate((_derivatives(control[row], share), _derivatives(control[-1:], 1.0)))
    points[0] = curve.start
    return points, unit(tangents)


def _positions(control: F64, share: F64 | float) -> F64:
    t = np.asarray(share, np.float64).reshape(-1, 1)
    a, b, c, d = (control[:, k] for k in range(4))
    s = 1.0 - t
    found: F64 = s * s * s * a + 3.0 * s * s * t * b + 3.0 * s * t * t * c + t * t * t * d
    return found


def _derivatives(control: F64, share: F64 | float) -> F64:
    t = np.asarray(share, np.float64).reshape(-1, 1)
    a, b, c = (control[:, k + 1] - control[:, k] for k in range(3))
    s = 1.0 - t
    found: F64 = 3.0 * (s * s * a + 2.0 * s * t * b + t * t * c)
    return found


def _roots(a: float, b: float, c: float) -> list[float]:
    if abs(a) <= 1e-14 * (abs(b) + abs(c)):
        return [-c / b] if b else []
    inner = b * b - 4.0 * a * c
    if inner < 0.0:
        return []
    q = -(b + math.copysign(math.sqrt(inner), b)) / 2.0
    return [q / a] + ([c / q] if q else [])


def _point(array: F64) -> Point2:
    return (float(array[0]), float(array[1]))

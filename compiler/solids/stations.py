"""Where along a path the section is drawn, and how it is turned there.

The frame is carried by the double reflection method (W. Wang, B. Juettler, D. Zheng, Y. Liu, Computation of
rotation minimizing frames, ACM Transactions on Graphics 27(1), 2008), in steps of at most two degrees whatever the
rung, so that a figure's rung does not turn a section (longer ones where a path turns more than 1000 times). A closed
path spreads what its frame lacks over its length.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from .ladder import divisions
from .spine import (
    SMOOTH_WITHIN,
    Arc,
    Coil,
    Line,
    Spline,
    Stretch,
    Trace,
    curvature,
    derivative,
    length_of,
    position,
    reach_of,
    tangent,
)
from .transform import facing

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]

_STEP = math.radians(2.0)
_MOST_STEPS = 200_000  # of a path; one that turns more is followed in longer steps
_FINE = 32  # samples a span of a spline, for its curvature
_COILED = 8  # samples a turn of a helix, whose curvature does not change


@dataclass(frozen=True, eq=False, slots=True)
class Stations:
    """Sections along a path: n of them, and as many stretches between them as `stretch` has rows.

    points (n,3); before and after (n,3,3), columns the section's axes and the tangent, as the stretches on either side
    see them (they differ at a mitre alone); section (n,3,2) maps the section to the offset from the point, along
    the bisecting plane at a mitre; bent (n,3) curvature vectors of the stretch behind; lengths (n,) mm along the path;
    stretch (n-1,) or, closed, (n,) the row of `Trace.stretches`; shift: places by which a closed round section is
    turned on to meet itself, of `symmetry` in a turn; twist: radians a mm.
    """

    points: F64
    before: F64
    after: F64
    section: F64
    bent: F64
    lengths: F64
    stretch: I64
    is_closed: bool
    shift: int
    symmetry: int
    twist: float


def stations(found: Trace, rung: float, reach: float, twist: float = 0.0, symmetry: int = 1) -> Stations:
    """Sections of a body that reaches `reach` mm from the path, so that its outside keeps the chord error.

    `twist` degrees in all; `symmetry` is the number of turns of the section about the path that look alike.
    Cost: linear in the turning of the path.
    """
    total = sum(map(length_of, found.stretches))
    # A frame that looks alike however it turns need not be followed closely.
    closely = max(_STEP, sum(map(_all_turning, found.stretches)) / _MOST_STEPS)
    fine = _Fine(closely if symmetry == 1 else math.inf)
    turned = math.radians(twist)
    for row, each in enumerate(found.stretches):
        share = abs(turned) * length_of(each) / total
        fine.follow(row, each, parameters(each, rung, reach, share))
    dense = fine.table()
    axes = carried(dense.points, dense.tangents, start_axis(dense.tangents[0]))
    shift = 0
    if found.is_closed:
        rest = _rest(axes, dense.tangents)
        steps = round(rest / (math.tau / symmetry))
        shift = steps % symmetry
        turned += rest - steps * math.tau / symmetry
    angle = turned / total * dense.lengths
    every = _rolled(axes, dense.tangents, angle)
    return _chosen(dense, every, found.is_closed, (shift, symmetry), turned / total)


def affordable(found: Trace, rung: float, reach: float, chords: Callable[[float], int], most: int) -> float:
    """The rung, or the first of its doubles below the reach at which all sections have at most `most` points."""
    while rung < reach / 2.0:
        n = sum(len(parameters(each, rung, reach)) for each in found.stretches)
        if n * chords(rung) <= most:
            break
        rung *= 2.0
    return rung


def frames(points: F64, tangents: F64) -> F64:
    """Rotation-minimising frames (n,3,3), columns two axes and the tangent, at points and unit tangents (n,3).

    The first is that of `transform.facing`. Fourth order in the step.
    """
    return _rolled(carried(points, tangents, start_axis(tangents[0])), tangents, np.zeros(len(points)))


def start_axis(along: F64) -> F64:
    """Where the section's first axis looks at the start of a path that leaves along a unit vector."""
    x, y, z = along.tolist()
    return np.array([row[0] for row in facing((x, y, z))])


def carried(points: F64, tangents: F64, axis: F64) -> F64:
    """The axis (n,3) carried along; where two points are one, by the smallest turn between their tangents."""
    # Both mirror planes of every step are known beforehand; only the axis itself has to follow step by step.
    v = np.diff(points, axis=0)
    square = (v * v).sum(axis=1)
    moves = square > 1e-24
    one, other = tangents[:-1], tangents[1:]
    left = one - _shares(v, one, square, moves) * v
    w = np.where(moves[:, None], other - left, one + other)
    across = (w * w).sum(axis=1)
    first = (v * np.sqrt(2.0 / np.where(moves, square, np.inf))[:, None]).tolist()
    second = (w * np.sqrt(2.0 / np.where(across > 1e-24, across, np.inf))[:, None]).tolist()
    x, y, z = axis.tolist()
    axes = [(x, y, z)]
    for (a, b, c), (d, e, f) in zip(first, second, strict=True):
        share = a * x + b * y + c * z
        x, y, z = x - share * a, y - share * b, z - share * c
        share = d * x + e * y + f * z
        x, y, z = x - share * d, y - share * e, z - share * f
        axes.append((x, y, z))
    return np.array(axes)


def _shares(v: F64, vectors: F64, square: F64, moves: NDArray[np.bool_]) -> F64:
    shares: F64 = (2.0 * (v * vectors).sum(axis=1) / np.where(moves, square, np.inf))[:, None]
    return shares


def parameters(stretch: Stretch, rung: float, reach: float, twist: float = 0.0) -> F64:
    """Where a stretch is divided, both ends included: each step keeps the outside of a body of that reach within the
    chord error, and turns it by no more than its chords do.
    """
    end = reach_of(stretch)
    steps = twist / (math.tau / divisions(reach, rung))
    if isinstance(stretch, Line):
        return np.linspace(0.0, end, max(1, math.ceil(steps - 1e-9)) + 1)
    if isinstance(stretch, Arc):
        bends = divisions(stretch.radius + reach, rung) * stretch.angle / math.tau
        return np.linspace(0.0, end, max(1, math.ceil(max(steps, bends) - 1e-9)) + 1)
    at = _probes(stretch)
    middle = (at[1:] + at[:-1]) / 2.0
    bent = np.sqrt((curvature(stretch, middle) ** 2).sum(axis=1))
    speed = np.sqrt((derivative(stretch, middle, 1) ** 2).sum(axis=1))
    outside = 1.0 / np.maximum(bent, 1e-12) + reach
    # The half-angle of a chord with this sagitta, as in `ladder.divisions`.
    step = 4.0 * np.arcsin(np.sqrt(np.minimum(rung / (2.0 * outside), 0.5)))
    wanted = np.maximum(bent * speed / step, steps / end) * np.diff(at)
    so_far = np.concatenate(([0.0], np.cumsum(wanted)))
    n = max(1, math.ceil(so_far[-1] - 1e-9))
    if so_far[-1] == 0.0:
        return np.array([0.0, end])
    chosen = np.interp(np.linspace(0.0, so_far[-1], n + 1), so_far, at)
    chosen[0], chosen[-1] = 0.0, end
    return chosen


def _probes(stretch: Spline | Coil) -> F64:
    if isinstance(stretch, Spline):
        share = np.arange(_FINE) / _FINE
        inner = stretch.knots[:-1, None] + np.diff(stretch.knots)[:, None] * share
        return np.concatenate((inner.ravel(), stretch.knots[-1:]))
    return np.linspace(0.0, stretch.angle, _COILED * max(1, math.ceil(stretch.angle / math.tau)) + 1)


@dataclass(frozen=True, eq=False, slots=True)
class _Dense:
    """points, tangents, bent (m,3), lengths (m,); chosen (s,) rows of stations; rows (i,) stretch of every interval."""

    points: F64
    tangents: F64
    lengths: F64
    bent: F64
    chosen: I64
    rows: I64


class _Fine:
    """The path in small steps, some of them stations. Joints stand twice, as either side sees them."""

    def __init__(self, step: float) -> None:
        self._step = step
        self._parts: list[tuple[F64, F64, F64, F64]] = []
        self._chosen: list[I64] = []
        self._rows: list[I64] = []
        self._n = 0
        self._so_far = 0.0

    def follow(self, row: int, stretch: Stretch, at: F64) -> None:
        """Take in one stretch, divided at its parameters."""
        angles = _turning(stretch, at)
        n = np.maximum(1, np.ceil(angles / self._step).astype(np.int64))
        pieces = [np.linspace(a, b, k, endpoint=False) for a, b, k in zip(at[:-1], at[1:], n.tolist(), strict=True)]
        dense = np.concatenate((*pieces, at[-1:]))
        self._chosen.append(self._n + np.concatenate(([0], np.cumsum(n))))
        self._rows.append(np.full(len(at) - 1, row))
        self._n += len(dense)
        points = position(stretch, dense)
        length = length_of(stretch)
        along = np.concatenate(([0.0], np.cumsum(np.sqrt((np.diff(points, axis=0) ** 2).sum(axis=1)))))
        lengths = self._so_far + along * (length / along[-1])
        self._so_far += length
        self._parts.append((points, tangent(stretch, dense), lengths, curvature(stretch, dense)))

    def table(self) -> _Dense:
        """All of it."""
        points, tangents, lengths, bent = (np.concatenate(each) for each in zip(*self._parts, strict=True))
        return _Dense(points, tangents, lengths, bent, np.concatenate(self._chosen), np.concatenate(self._rows))


def _all_turning(stretch: Stretch) -> float:
    """The angle, radians, that a stretch turns through, roughly."""
    return float(_turning(stretch, _probes(stretch)).sum()) if isinstance(stretch, Spline | Coil) else 0.0


def _turning(stretch: Stretch, at: F64) -> F64:
    """The angle, radians, that the path turns through between parameters."""
    if isinstance(stretch, Line):
        return np.zeros(len(at) - 1)
    if isinstance(stretch, Arc):
        return np.diff(at)
    nodes = np.linspace(0.0, 1.0, 5)
    where = at[:-1, None] + np.diff(at)[:, None] * nodes
    bent = np.sqrt((curvature(stretch, where.ravel()) ** 2).sum(axis=1))
    speed = np.sqrt((derivative(stretch, where.ravel(), 1) ** 2).sum(axis=1))
    angles: F64 = (bent * speed).reshape(where.shape).max(axis=1) * np.diff(at)
    return angles


def _rest(axes: F64, tangents: F64) -> float:
    """The angle, radians in (-pi, pi], that the frame at the end has to turn to be that of the start."""
    last = carried(np.zeros((2, 3)), np.stack((tangents[-1], tangents[0])), axes[-1])[1]
    side = np.cross(tangents[0], last)
    return math.atan2(float(axes[0] @ side), float(axes[0] @ last))


def _rolled(axes: F64, tangents: F64, angle: F64) -> F64:
    other = np.cross(tangents, axes)
    c, s = np.cos(angle)[:, None], np.sin(angle)[:, None]
    return np.stack((c * axes + s * other, c * other - s * axes, tangents), axis=2)


def _chosen(fine: _Dense, every: F64, is_closed: bool, shift: tuple[int, int], twist: float) -> Stations:
    """The stations among the small steps: at a joint one for the two that stand there."""
    chosen = fine.chosen
    starts = np.flatnonzero(np.diff(fine.rows, prepend=-1))
    # The end of stretch j stands in `chosen` just before the start of stretch j + 1.
    ahead = starts + np.arange(len(starts))
    after = np.delete(chosen, ahead[1:] - 1)
    before = np.delete(chosen, ahead[1:])
    if is_closed:
        after, before = after[:-1], np.concatenate((before[-1:], before[1:-1]))
    points = fine.points[after]
    one, other = every[before], every[after]
    section = other[:, :, :2].copy()
    way_in, way_out = one[:, :, 2], other[:, :, 2]
    corner = (way_in * way_out).sum(axis=1) < math.cos(math.radians(SMOOTH_WITHIN))
    if corner.any():
        plane = way_in[corner] + way_out[corner]
        slope = (plane[:, :, None] * section[corner]).sum(axis=1) / (plane * way_out[corner]).sum(axis=1)[:, None]
        section[corner] -= way_out[corner][:, :, None] * slope[:, None, :]
    bent, lengths = fine.bent[after], fine.lengths[after]
    return Stations(points, one, other, section, bent, lengths, fine.rows, is_closed, *shift, twist)

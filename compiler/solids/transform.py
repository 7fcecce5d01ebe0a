"""Affine placements as three rows of four numbers: the linear part and the shift in mm.

`compose(outer, inner)` applies `inner` first. Rotations by multiples of 30 and 90 degrees about an axis of the frame
are exact (`trigonometry`).
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from ..trigonometry import cos_deg, sin_deg
from .recipe import Affine, Point3

F64 = NDArray[np.float64]

IDENTITY: Affine = ((1.0, 0.0, 0.0, 0.0), (0.0, 1.0, 0.0, 0.0), (0.0, 0.0, 1.0, 0.0))


def translate(shift: Point3) -> Affine:
    """Move by `shift` mm."""
    x, y, z = shift
    return ((1.0, 0.0, 0.0, float(x)), (0.0, 1.0, 0.0, float(y)), (0.0, 0.0, 1.0, float(z)))


def turn(angle: float, axis: Point3, through: Point3 = (0.0, 0.0, 0.0)) -> Affine:
    """Turn by `angle` degrees, right-handed, about the line along `axis` through a point (Rodrigues' formula).

    ValueError for a zero axis.
    """
    unit = _unit(axis)
    c, s = cos_deg(angle), sin_deg(angle)
    x, y, z = unit
    skew = ((0.0, -z, y), (z, 0.0, -x), (-y, x, 0.0))
    rows = tuple(
        tuple((c if i == j else 0.0) + s * skew[i][j] + (1.0 - c) * unit[i] * unit[j] for j in range(3))
        for i in range(3)
    )
    return _about(rows, through)


def mirror(normal: Point3, through: Point3 = (0.0, 0.0, 0.0)) -> Affine:
    """Mirror in the plane with `normal` through a point. ValueError for a zero normal."""
    unit = _unit(normal)
    rows = tuple(tuple((1.0 if i == j else 0.0) - 2.0 * unit[i] * unit[j] for j in range(3)) for i in range(3))
    return _about(rows, through)


def scale(factors: float | Point3, through: Point3 = (0.0, 0.0, 0.0)) -> Affine:
    """Scale about a point by one factor, or by one for each axis."""
    each = factors if isinstance(factors, tuple) else (factors, factors, factors)
    rows = tuple(tuple(float(each[i]) if i == j else 0.0 for j in range(3)) for i in range(3))
    return _about(rows, through)


def facing(direction: Point3) -> Affine:
    """The turn that takes +z to `direction` and keeps y level: about y by the tilt, then about z by the bearing.

    So what is ringed about z stands alike at every place. Straight down is a half turn about y. ValueError for a zero
    direction.
    """
    x, y, z = _unit(direction)
    level = math.hypot(x, y)
    # A tilt far below one rounding of z has no bearing: its quotients would be those of subnormal numbers.
    if level < 2.0**-60:
        return IDENTITY if z > 0.0 else turn(180.0, (0.0, 1.0, 0.0))
    c, s = x / level, y / level
    return _about(((c * z, -s, x), (s * z, c, y), (-level, 0.0, z)), (0.0, 0.0, 0.0))


def compose(*affines: Affine) -> Affine:
    """The product; the last one acts first. No arguments give the identity."""
    result = IDENTITY
    for affine in affines:
        if result is IDENTITY:
            result = affine
        elif affine is not IDENTITY:
            result = _product(result, affine)
    return result


def matrix(affine: Affine) -> F64:
    """The (4,4) float64 matrix."""
    return np.array((*affine, (0.0, 0.0, 0.0, 1.0)))


def from_matrix(array: F64) -> Affine:
    """The rows of a (3,4) or (4,4) array."""
    rows = [tuple(float(value) + 0.0 for value in row) for row in array[:3]]
    return (_row(rows[0]), _row(rows[1]), _row(rows[2]))


def apply(affine: Affine, points: F64) -> F64:
    """Map points (..., 3). One point or many."""
    linear = np.array(affine)
    # Spelt out, so that the order of the sums does not depend on a matrix library.
    x, y, z = points[..., 0], points[..., 1], points[..., 2]
    return np.stack([row[0] * x + row[1] * y + row[2] * z + row[3] for row in linear], axis=-1)


def determinant(affine: Affine) -> float:
    """Of the linear part: negative if it mirrors, 0 if it flattens."""
    (a, b, c, _), (d, e, f, _), (g, h, i, _) = affine
    return a * (e * i - f * h) - b * (d * i - f * g) + c * (d * h - e * g)


def largest_scale(affine: Affine) -> float:
    """The largest factor by which a length grows: the linear part's spectral norm; exactly 1 for a turn."""
    return float(largest_scales(np.array((affine,)))[0])


def largest_scales(affines: F64) -> F64:
    """`largest_scale` of each of (n,3,4)."""
    linear = affines[:, :, :3]
    gram = (linear[:, :, :, None] * linear[:, :, None, :]).sum(axis=1)
    rigid = np.abs(gram - np.eye(3)).max(axis=(1, 2)) <= 1e-12
    scales = np.ones(len(affines))
    if not rigid.all():
        scales[~rigid] = np.sqrt(np.linalg.eigvalsh(gram[~rigid])[:, -1])
    return scales


def _about(rows: Sequence[Sequence[float]], through: Point3) -> Affine:
    shift = [through[i] - sum(rows[i][j] * through[j] for j in range(3)) for i in range(3)]
    return (_row((*rows[0], shift[0])), _row((*rows[1], shift[1])), _row((*rows[2], shift[2])))


def _product(outer: Affine, inner: Affine) -> Affine:
    rows = []
    for row in outer:
        linear = [sum(row[k] * inner[k][j] for k in range(3)) + 0.0 for j in range(3)]
        rows.append((*linear, sum(row[k] * inner[k][3] for k in range(3)) + row[3]))
    return (_row(rows[0]), _row(rows[1]), _row(rows[2]))


def dot(a: Point3, b: Point3) -> float:
    """The inner product of two vectors, summed in the order x, y, z."""
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


def heights(points: NDArray[np.float64], way: Sequence[float] | NDArray[np.float64]) -> NDArray[np.float64]:
    """Inner products (n,) of points (n,3) with one vector, summed so that their order is the same everywhere."""
    return np.asarray(points[:, 0] * way[0] + points[:, 1] * way[1] + points[:, 2] * way[2])


def _row(values: Sequence[float]) -> tuple[float, float, float, float]:
    a, b, c, d = values
    return (a + 0.0, b + 0.0, c + 0.0, d + 0.0)


def _unit(vector: Point3) -> Point3:
    length = math.hypot(*vector)
    if not length > 0.0 or not math.isfinite(length):
        raise ValueError(f"no direction: {vector}")
    return (vector[0] / length, vector[1] / length, vector[2] / length)

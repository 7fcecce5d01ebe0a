"""Sines, cosines and tangents of angles in degrees, exact where the answer is.

Libraries differ by an ulp between processors; here the multiples of 30 and 45 degrees are settled by symmetry and
by the correctly rounded square roots, so a quarter turn leaves no residue. Everything else is the platform's
`math.sin` of an angle folded into 0 .. 45 degrees.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

_HALF_ROOT_3 = math.sqrt(3.0) / 2
_HALF_ROOT_2 = math.sqrt(0.5)


def cos_deg(angle: float) -> float:
    """Cosine of `angle` degrees; exact at multiples of 60 and 90, correctly rounded at 30 and 45."""
    folded = math.fmod(abs(angle), 360.0)
    if folded > 180.0:
        folded = 360.0 - folded
    if folded > 90.0:
        return -_cos_first_quadrant(180.0 - folded)
    return _cos_first_quadrant(folded)


def sin_deg(angle: float) -> float:
    """Sine of `angle` degrees; exact at multiples of 30 and 90, correctly rounded at 45 and 60."""
    folded = math.fmod(angle, 360.0)
    sign = -1.0 if folded < 0.0 else 1.0
    folded = abs(folded)
    if folded > 180.0:
        folded, sign = folded - 180.0, -sign
    if folded > 90.0:
        folded = 180.0 - folded
    return sign * _sin_first_quadrant(folded) + 0.0


def tan_deg(angle: float) -> float:
    """Tangent of `angle` degrees; exact at multiples of 45; infinite at odd multiples of 90, with the sine's sign."""
    cosine, sine = cos_deg(angle), sin_deg(angle)
    if cosine == 0.0:
        return math.copysign(math.inf, sine)
    if abs(cosine) == abs(sine):
        return math.copysign(1.0, sine * cosine)
    return sine / cosine + 0.0


def circle_table(n: int) -> NDArray[np.float64]:
    """Cosine and sine of k·360/n degrees, (n,2) float64, for n a multiple of 4.

    One octant is computed and the rest mirrored from it, so the table is exactly symmetric about both axes and
    both diagonals, and its quarter points are exact. ValueError if n is not a positive multiple of 4.
    """
    return circle_points(n, np.arange(n))


def circle_points(n: int, marks: NDArray[np.integer]) -> NDArray[np.float64]:
    """The rows (k,2) of `circle_table` at `marks`, any whole numbers, without the rest of the table."""
    if n < 4 or n % 4:
        raise ValueError(f"a circle is divided into a multiple of 4, not {n}")
    quarter, within = np.divmod(np.asarray(marks, np.int64) % n, n // 4)
    above = 2 * within > n // 4
    octant, place = np.unique(np.where(above, n // 4 - within, within), return_inverse=True)
    angles = [360.0 * k / n for k in octant.tolist()]
    # The half quarter is 45 degrees, where cosine and sine are one number.
    short = np.array([(cos_deg(a), sin_deg(a)) for a in angles]).reshape(-1, 2)[place]
    x, y = np.where(above, short[:, 1], short[:, 0]), np.where(above, short[:, 0], short[:, 1])
    across = np.select([quarter == 0, quarter == 1, quarter == 2], [x, -y, -x], y)
    up = np.select([quarter == 0, quarter == 1, quarter == 2], [y, x, -y], -x)
    return np.column_stack((across, up)) + 0.0


def _cos_first_quadrant(angle: float) -> float:
    if angle == 30.0:
        return _HALF_ROOT_3
    if angle == 60.0:
        return 0.5
    if angle > 45.0:
        return math.sin(math.radians(90.0 - angle))
    return _HALF_ROOT_2 if angle == 45.0 else math.cos(math.radians(angle))


def _sin_first_quadrant(angle: float) -> float:
    return _cos_first_quadrant(90.0 - angle)

"""sRGB as IEC 61966-2-1:1999 has it. The values of the curve were computed with colour-science 0.4.7."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend import colour


def test_constants_of_iec_61966_2_1() -> None:
    assert (colour.SLOPE, colour.OFFSET, colour.EXPONENT) == (12.92, 0.055, 2.4)
    assert (colour.BREAK_ENCODED, colour.BREAK_LINEAR) == (0.04045, 0.0031308)
    # Second row of the RGB to XYZ matrix.
    assert colour.LUMINANCE == (0.2126, 0.7152, 0.0722)


@pytest.mark.parametrize(("encoded", "linear"), [(0.5, 0.21404114), (128 / 255, 0.21586050), (1.0, 1.0), (0.0, 0.0)])
def test_decoding(encoded: float, linear: float) -> None:
    assert abs(float(colour.decode(encoded)) - linear) < 5e-9


@pytest.mark.parametrize(("linear", "encoded"), [(0.18, 0.46135613), (0.5, 0.73535698), (0.0031308, 0.0404499)])
def test_encoding(linear: float, encoded: float) -> None:
    assert abs(float(colour.encode(linear)) - encoded) < 5e-8


def test_the_curve_joins_at_the_break() -> None:
    # The published constants are rounded: the two branches meet within 1e-7 of each other there.
    at = colour.BREAK_LINEAR
    assert abs(float(colour.encode(at)) - float(colour.encode(np.nextafter(at, 1.0)))) < 1e-7

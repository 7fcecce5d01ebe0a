"""Units: exact factors, one rounding, dimensions."""

from __future__ import annotations

import math
import sys
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.lang.units import (
    ANGLE,
    AREA,
    DENSITY,
    ILLUMINANCE,
    LATITUDE,
    LENGTH,
    LUMINANCE,
    MASS,
    NUMBER,
    PI,
    UNITS,
    VOLUME,
    WAVELENGTH,
    Dimension,
    exact,
    in_unit,
    quantity,
)


@pytest.mark.parametrize(
    ("one", "other"),
    [
        (("1", "inch"), ("25.4", "mm")),
        (("0.1", "inch"), ("2.54", "mm")),
        (("2.54", "cm"), ("1", "inch")),
        (("1/2", "inch"), ("12.7", "mm")),
        (("1/3", "ft"), ("4", "inch")),
        (("1", "ft"), ("304.8", "mm")),
        (("0.001", "m"), ("1", "mm")),
        (("1", "inch2"), ("645.16", "mm2")),
        (("1", "l"), ("1000", "cm3")),
        (("1", "ml"), ("1", "cm3")),
        (("8.5", "g/cm3"), ("8500", "kg/m3")),
        (("20", "degC"), ("293.15", "K")),
        (("-40", "degC"), ("233.15", "K")),
        (("1", "h"), ("3600", "s")),
        (("90", "arcmin"), ("1.5", "deg")),
        (("1", "klx"), ("1000", "lx")),
        (("25", "%"), ("0.25", "")),
        (("1e3", "um"), ("1", "mm")),
        (("1", "t"), ("1000", "kg")),
    ],
)
def test_equal_quantities_are_the_same_float(one: tuple[str, str], other: tuple[str, str]) -> None:
    assert quantity(*one) == quantity(*other)


def test_base_units_are_one() -> None:
    for symbol, dimension in (("mm", LENGTH), ("g", MASS), ("deg", ANGLE), ("nm", WAVELENGTH)):
        assert quantity("1", symbol) == (1.0, dimension)


def test_radian_is_rounded_once() -> None:
    # pi to 50 decimals, OEIS A000796 (from memory); math.pi is the nearest float to it.
    assert PI.numerator / PI.denominator == math.pi
    assert quantity("1", "rad") == (math.degrees(1.0), ANGLE)
    assert quantity("3", "rad")[0] == pytest.approx(math.degrees(3.0), rel=sys.float_info.epsilon)


@given(st.decimals(min_value=0, max_value=10**6, allow_nan=False, places=6), st.sampled_from(sorted(UNITS)))
@settings(derandomize=True, deadline=None, max_examples=200)
def test_every_quantity_is_the_float_nearest_to_the_exact_value(number: object, unit: str) -> None:
    text = str(number)
    value, dimension = quantity(text, unit)
    row = UNITS[unit]
    true = exact(text) * row.factor + row.offset
    assert dimension == row.dimension
    below, above = Fraction(math.nextafter(value, -math.inf)), Fraction(math.nextafter(value, math.inf))
    assert abs(Fraction(value) - true) <= min(abs(below - true), abs(above - true))
    assert in_unit(value, unit) == pytest.approx(float(exact(text)), rel=1e-12, abs=1e-12)


def test_beyond_the_floats_is_an_infinity() -> None:
    assert quantity("1e300", "km")[0] == 1e306
    assert quantity("9e307", "km")[0] == math.inf


def test_places_have_a_sign_and_no_algebra() -> None:
    assert quantity("52.5", "degN") == (52.5, LATITUDE)
    assert quantity("33", "degS")[0] == -33.0
    with pytest.raises(ValueError, match="latitude"):
        LATITUDE * LENGTH
    assert LATITUDE.name == "latitude" and LATITUDE.root() is None


def test_dimensions_multiply_and_have_names() -> None:
    assert (LENGTH * LENGTH).name == "area" and LENGTH**3 == VOLUME and AREA / LENGTH == LENGTH
    assert (MASS / VOLUME) == DENSITY and DENSITY.name == "density"
    assert (AREA / MASS).name == "length^2·mass^-1"
    assert LENGTH / LENGTH == NUMBER and NUMBER.is_number and NUMBER.name == "number"
    assert AREA.root() == LENGTH and LENGTH.root() is None
    assert ILLUMINANCE != LUMINANCE and UNITS["cd/m2"].dimension.name == "luminance"
    assert Dimension(length=1) == LENGTH and LENGTH != WAVELENGTH


def test_a_candela_fills_the_sphere_with_four_pi_lumens() -> None:
    # A lumen is a candela times a steradian (BIPM, SI Brochure, 9th edition, table 4); a sphere has 4 pi of them.
    degrees_squared = 4 * math.pi * (180 / math.pi) ** 2
    assert quantity("1", "cd")[0] * degrees_squared == pytest.approx(4 * math.pi, rel=1e-15)

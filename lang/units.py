"""Units: symbols, exact factors to the base units, and dimensions.

Base units: millimetre, gram, second, kelvin, degree of angle, lumen, nanometre of wavelength. The degree is the base of
angles so that trigonometry can be exact at multiples of 30 degrees. Wavelength is a dimension of its own: a wavelength
is never laid off along a model's edge, and adding the two is a mistake.

Symbols follow ISO 80000-1 and its parts 3 (space and time), 4 (mechanics), 5 (temperature) and 7 (light); `inch` and
`ft` are exact by the international yard of 1959 (1 yard = 0.9144 m).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from fractions import Fraction
from types import MappingProxyType
from typing import Literal

from msgspec import Struct


class Dimension(Struct, frozen=True):
    """Exponents of the base units. `place` marks the kinds that take no part in algebra: latitudes and longitudes."""

    length: int = 0
    mass: int = 0
    time: int = 0
    temperature: int = 0
    angle: int = 0
    flux: int = 0
    wavelength: int = 0
    place: Literal["", "latitude", "longitude"] = ""

    @property
    def exponents(self) -> tuple[int, int, int, int, int, int, int]:
        """The seven exponents in the order of the fields."""
        return (self.length, self.mass, self.time, self.temperature, self.angle, self.flux, self.wavelength)

    def __mul__(self, other: Dimension) -> Dimension:
        """The dimension of a product; a place has none, and asking for it is a bug of the caller."""
        self._must_be_algebraic()
        other._must_be_algebraic()
        return _from_exponents(a + b for a, b in zip(self.exponents, other.exponents, strict=True))

    def __truediv__(self, other: Dimension) -> Dimension:
        """The dimension of a quotient."""
        self._must_be_algebraic()
        other._must_be_algebraic()
        return _from_exponents(a - b for a, b in zip(self.exponents, other.exponents, strict=True))

    def __pow__(self, exponent: int) -> Dimension:
        """The dimension of a whole power."""
        self._must_be_algebraic()
        return _from_exponents(a * exponent for a in self.exponents)

    def root(self) -> Dimension | None:
        """The dimension of a square root, or None where an exponent is odd."""
        if self.place or any(a % 2 for a in self.exponents):
            return None
        return _from_exponents(a // 2 for a in self.exponents)

    def _must_be_algebraic(self) -> None:
        if self.place:
            raise ValueError(f"a {self.place} takes no part in algebra")

    @property
    def is_number(self) -> bool:
        """Whether this is the dimension of a pure number."""
        return self == NUMBER

    @property
    def name(self) -> str:
        """The name for people: `length`, `illuminance`, or the exponents where it has none: `length^2·mass^-1`."""
        if self.place:
            return self.place
        known = NAMES.get(self.exponents)
        if known is not None:
            return known
        words = ("length", "mass", "time", "temperature", "angle", "luminous flux", "wavelength")
        factors = [
            word if power == 1 else f"{word}^{power}"
            for word, power in zip(words, self.exponents, strict=True)
            if power
        ]
        return "·".join(factors)


def _from_exponents(exponents: Iterable[int]) -> Dimension:
    length, mass, time, temperature, angle, flux, wavelength = exponents
    return Dimension(length, mass, time, temperature, angle, flux, wavelength)


NUMBER = Dimension()
LENGTH = Dimension(length=1)
AREA = Dimension(length=2)
VOLUME = Dimension(length=3)
MASS = Dimension(mass=1)
TIME = Dimension(time=1)
TEMPERATURE = Dimension(temperature=1)
ANGLE = Dimension(angle=1)
LUMINOUS_FLUX = Dimension(flux=1)
LUMINOUS_INTENSITY = Dimension(flux=1, angle=-2)
ILLUMINANCE = Dimension(flux=1, length=-2)
LUMINANCE = Dimension(flux=1, length=-2, angle=-2)
DENSITY = Dimension(mass=1, length=-3)
WAVELENGTH = Dimension(wavelength=1)
LATITUDE = Dimension(place="latitude")
LONGITUDE = Dimension(place="longitude")

NAMES: Mapping[tuple[int, ...], str] = MappingProxyType(
    {
        NUMBER.exponents: "number",
        LENGTH.exponents: "length",
        AREA.exponents: "area",
        VOLUME.exponents: "volume",
        MASS.exponents: "mass",
        TIME.exponents: "time",
        TEMPERATURE.exponents: "temperature",
        ANGLE.exponents: "angle",
        LUMINOUS_FLUX.exponents: "luminous flux",
        LUMINOUS_INTENSITY.exponents: "luminous intensity",
        ILLUMINANCE.exponents: "illuminance",
        LUMINANCE.exponents: "luminance",
        DENSITY.exponents: "density",
        WAVELENGTH.exponents: "wavelength",
    }
)

# pi to 50 decimals: far below half a unit in the last place of any float that is a rational times a power of pi.
PI = Fraction(314159265358979323846264338327950288419716939937511, 10**50)
DEGREES_A_RADIAN = 180 / PI
INCH = Fraction(254, 10)
FOOT = 12 * INCH


class Unit(Struct, frozen=True):
    """A symbol, its size in base units, its dimension, and its name for people.

    `offset` is what is added after the factor, in base units; only the degree Celsius has one. A unit with an offset
    stands only in literals, for a difference and a reading in it are two things, and a sum could not tell which is
    meant.
    """

    symbol: str
    factor: Fraction
    dimension: Dimension
    name: str
    offset: Fraction = Fraction(0)


def _table(*units: Unit) -> Mapping[str, Unit]:
    return MappingProxyType({unit.symbol: unit for unit in units})


UNITS: Mapping[str, Unit] = _table(
    Unit("um", Fraction(1, 1000), LENGTH, "micrometre"),
    Unit("mm", Fraction(1), LENGTH, "millimetre"),
    Unit("cm", Fraction(10), LENGTH, "centimetre"),
    Unit("m", Fraction(1000), LENGTH, "metre"),
    Unit("km", Fraction(10**6), LENGTH, "kilometre"),
    Unit("inch", INCH, LENGTH, "inch"),
    Unit("ft", FOOT, LENGTH, "foot"),
    Unit("mm2", Fraction(1), AREA, "square millimetre"),
    Unit("cm2", Fraction(100), AREA, "square centimetre"),
    Unit("m2", Fraction(10**6), AREA, "square metre"),
    Unit("inch2", INCH**2, AREA, "square inch"),
    Unit("mm3", Fraction(1), VOLUME, "cubic millimetre"),
    Unit("cm3", Fraction(1000), VOLUME, "cubic centimetre"),
    Unit("m3", Fraction(10**9), VOLUME, "cubic metre"),
    Unit("ml", Fraction(1000), VOLUME, "millilitre"),
    Unit("l", Fraction(10**6), VOLUME, "litre"),
    Unit("mg", Fraction(1, 1000), MASS, "milligram"),
    Unit("g", Fraction(1), MASS, "gram"),
    Unit("kg", Fraction(1000), MASS, "kilogram"),
    Unit("t", Fraction(10**6), MASS, "tonne"),
    Unit("g/cm3", Fraction(1, 1000), DENSITY, "gram by cubic centimetre"),
    Unit("kg/m3", Fraction(1, 10**6), DENSITY, "kilogram by cubic metre"),
    Unit("K", Fraction(1), TEMPERATURE, "kelvin"),
    Unit("degC", Fraction(1), TEMPERATURE, "degree Celsius", offset=Fraction(27315, 100)),
    Unit("ms", Fraction(1, 1000), TIME, "millisecond"),
    Unit("s", Fraction(1), TIME, "second"),
    Unit("min", Fraction(60), TIME, "minute"),
    Unit("h", Fraction(3600), TIME, "hour"),
    Unit("deg", Fraction(1), ANGLE, "degree of angle"),
    Unit("arcmin", Fraction(1, 60), ANGLE, "minute of arc"),
    Unit("arcsec", Fraction(1, 3600), ANGLE, "second of arc"),
    Unit("rad", DEGREES_A_RADIAN, ANGLE, "radian"),
    Unit("lm", Fraction(1), LUMINOUS_FLUX, "lumen"),
    Unit("lx", Fraction(1, 10**6), ILLUMINANCE, "lux, a lumen by square metre"),
    Unit("klx", Fraction(1, 1000), ILLUMINANCE, "kilolux"),
    Unit("cd", DEGREES_A_RADIAN**-2, LUMINOUS_INTENSITY, "candela, a lumen by steradian"),
    Unit("cd/m2", DEGREES_A_RADIAN**-2 / 10**6, LUMINANCE, "candela by square metre"),
    Unit("nm", Fraction(1), WAVELENGTH, "nanometre, of wavelength"),
    Unit("%", Fraction(1, 100), NUMBER, "per cent"),
    Unit("degN", Fraction(1), LATITUDE, "degree of north latitude"),
    Unit("degS", Fraction(-1), LATITUDE, "degree of south latitude"),
    Unit("degE", Fraction(1), LONGITUDE, "degree of east longitude"),
    Unit("degW", Fraction(-1), LONGITUDE, "degree of west longitude"),
)

# The units that scenes use most, the most frequent first (common practice): one of them is meant sooner than the rest.
COMMON_UNITS: tuple[str, ...] = ("mm", "deg", "m", "cm", "um", "km", "inch", "ft")


def exact(text: str) -> Fraction:
    """The value of a number as written: `12`, `0.5`, `1e-3`, `1/2`, with or without a sign.

    A denominator of zero raises ZeroDivisionError; the scanner never lets one through.
    """
    return Fraction(text)


def quantity(text: str, unit: str) -> tuple[float, Dimension]:
    """A literal in base units, rounded once: `1 inch` and `25.4 mm` are the same float.

    `text` is a number as `exact` takes it, `unit` a symbol of `UNITS` or "". A value beyond the floats gives an
    infinity with its sign.
    """
    value = exact(text)
    if unit == "":
        return _rounded(value), NUMBER
    row = UNITS[unit]
    return _rounded(value * row.factor + row.offset), row.dimension


def in_unit(value: float, unit: str) -> float:
    """A value in base units expressed in a unit, rounded once."""
    row = UNITS[unit]
    return _rounded((Fraction(value) - row.offset) / row.factor)


def _rounded(value: Fraction) -> float:
    try:
        return value.numerator / value.denominator
    except OverflowError:
        return float("inf") if value > 0 else float("-inf")

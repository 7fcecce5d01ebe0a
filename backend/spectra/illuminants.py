"""Sources by name and by temperature: CIE illuminants, daylight, blackbodies. Relative spectra, (471,) float64.

Sources: CIE 15 (illuminants A, E, the D series with its rounding, lamps FL, HP and LED), Planck's law with
the constants of CODATA 2018, CIE 13.3 (which reference goes with a temperature).
"""

from __future__ import annotations

import numpy as np

from ..contract import F64
from .grid import FIRST, N, on_grid, table, wavelengths

C2 = 1.438776877e-2
"""Second radiation constant h c / k in m K (CODATA 2018, exact constants of the SI)."""

DAYLIGHT_FROM, DAYLIGHT_TO = 4000.0, 25000.0
REFERENCE_DAYLIGHT_FROM = 5000.0

NAMED_DAYLIGHT = {"D50": 5000.0, "D55": 5500.0, "D65": 6500.0, "D75": 7500.0}


def blackbody(temperature: float) -> F64:
    """Spectral radiance of a blackbody of `temperature` K, 1 at 560 nm, in a medium of index 1."""
    metres = wavelengths() * 1e-9
    exponent = C2 / temperature
    ratio = np.expm1(exponent / 560e-9) * np.exp(-exponent / metres) / -np.expm1(-exponent / metres)
    return np.asarray((560e-9 / metres) ** 5 * ratio)


def illuminant_a() -> F64:
    """CIE standard illuminant A by its defining equation (ISO/CIE 11664-2), 100 at 560 nm."""
    nm = wavelengths()
    return np.asarray(100.0 * (560.0 / nm) ** 5 * np.expm1(1.435e7 / (2848 * 560)) / np.expm1(1.435e7 / (2848 * nm)))


def daylight_chromaticity(temperature: float) -> tuple[float, float]:
    """Return x, y of daylight of a correlated colour temperature from 4 000 K to 25 000 K (CIE 15, 4.1.2)."""
    if temperature <= 7000.0:
        x = -4.6070e9 / temperature**3 + 2.9678e6 / temperature**2 + 0.09911e3 / temperature + 0.244063
    else:
        x = -2.0064e9 / temperature**3 + 1.9018e6 / temperature**2 + 0.24748e3 / temperature + 0.237040
    return x, -3.0 * x * x + 2.870 * x - 0.275


def daylight_of(x: float, y: float, digits: int | None = None) -> F64:
    """Daylight of a chromaticity from the components of CIE 15; their shares rounded to `digits` decimals, if any."""
    scale = 0.0241 + 0.2562 * x - 0.7341 * y
    shares = ((-1.3515 - 1.7703 * x + 5.9114 * y) / scale, (0.0300 - 31.4424 * x + 30.0717 * y) / scale)
    first, second = shares if digits is None else (round(share, digits) for share in shares)
    _, rows = table("daylight")
    parts = on_grid(rows[:, 0], rows[:, 1:])
    return np.asarray(np.maximum(parts[:, 0] + first * parts[:, 1] + second * parts[:, 2], 0.0))


def daylight(temperature: float) -> F64:
    """Daylight of a correlated colour temperature from 4 000 K to 25 000 K."""
    return daylight_of(*daylight_chromaticity(temperature))


def reference(temperature: float) -> F64:
    """The source meant by a colour temperature: a blackbody below 5 000 K, daylight from there on (CIE 13.3)."""
    return blackbody(temperature) if temperature < REFERENCE_DAYLIGHT_FROM else daylight(temperature)


def names() -> tuple[str, ...]:
    """The names that `illuminant` knows."""
    return ("A", *NAMED_DAYLIGHT, "E", *table("lamps")[0][1:])


def illuminant(name: str) -> F64:
    """A CIE illuminant: A, D50, D55, D65, D75, E, FL1 .. FL12, FL3.1 .. FL3.15, HP1 .. HP5, LED-B1 ... Raises KeyError.

    Lamps are tabulated from 380 to 780 nm and meant to be summed at the table's own 5 nm, so that a line counts whole
    wherever it falls: they stand on the grid at these wavelengths, five times as strong, and are dark between.
    """
    if name == "A":
        return illuminant_a()
    if name == "E":
        return np.ones(N)
    if name in NAMED_DAYLIGHT:
        # The nominal temperatures were fixed with an older second radiation constant, 1.4380e-2 m K.
        return daylight_of(*daylight_chromaticity(NAMED_DAYLIGHT[name] * 1.4388 / 1.4380), 3)
    columns, rows = table("lamps")
    if name not in columns[1:]:
        raise KeyError(name)
    spectrum = np.zeros(N)
    spectrum[rows[:, 0].astype(np.int64) - FIRST] = 5.0 * rows[:, columns.index(name)]
    return spectrum

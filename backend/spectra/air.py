"""Sunlight on its way through clear air: scattered by molecules and haze, absorbed by ozone, water vapour and oxygen.

Sources: Bodhaine et al. 1999 (Rayleigh, equations 29 and 30), Angstrom 1929 (haze), Preetham, Shirley and Smits 1999
(haze by turbidity), Kasten and Young 1989 (path through the air), Bird and Riordan 1986 (gases, equations 4 to 12).
"""

from __future__ import annotations

from dataclasses import dataclass
from math import exp, log, radians, sin, sqrt

import numpy as np

from ..contract import F64
from .grid import on_grid, table, wavelengths

SEA_LEVEL = 1013.25


@dataclass(frozen=True, slots=True)
class Air:
    """A column of clear air.

    `haze` is the optical depth of aerosol at 1 um and `exponent` how it falls with wavelength (Angstrom); `ozone` in
    atm cm; `water` vapour in cm of water; `pressure` in hPa.
    """

    haze: float
    exponent: float = 1.3
    ozone: float = 0.35
    water: float = 2.0
    pressure: float = SEA_LEVEL


def air_of(turbidity: float) -> Air:
    """Air of a turbidity: 2 very clear, 3 clear, 6 hazy, 10 thick haze. Below 1 there is none (Preetham 1999, A.1)."""
    return Air(max(0.04608 * turbidity - 0.04586, 0.0))


def rayleigh_cross_section(micrometres: F64) -> F64:
    """Scattering cross section of a molecule of dry air, cm2 (Bodhaine 1999, equation 29)."""
    return 1e-28 * _bodhaine(micrometres)


def rayleigh_depth(micrometres: F64, pressure: float = SEA_LEVEL) -> F64:
    """Optical depth of the molecules straight up, at 45 deg of latitude (Bodhaine 1999, equation 30)."""
    return 0.0021520 * _bodhaine(micrometres) * (pressure / SEA_LEVEL)


def _bodhaine(micrometres: F64) -> F64:
    square = np.asarray(micrometres, np.float64) ** 2
    above = 1.0455996 - 341.29061 / square - 0.90230850 * square
    return np.asarray(above / (1.0 + 0.0027059889 / square - 85.968563 * square))


def air_mass(elevation: float) -> float:
    """Length of the path through the air, 1 straight up, at an elevation as seen in degrees, from 0 (Kasten, Young)."""
    return 1.0 / (sin(radians(elevation)) + 0.50572 * exp(-1.6364 * log(elevation + 6.07995)))


def transmittance(air: Air, elevation: float) -> F64:
    """Share of sunlight (471,) that comes straight through the air at an elevation as seen in degrees, from 0."""
    um = wavelengths() / 1000.0
    mass = air_mass(elevation)
    _, rows = table("absorption")
    water, ozone, mixed = on_grid(rows[:, 0], rows[:, 1:]).T
    height = 22.0 / 6370.0
    ozone_mass = (1.0 + height) / sqrt(sin(radians(elevation)) ** 2 + 2.0 * height)
    depth = rayleigh_depth(um, air.pressure) * mass + air.haze * um**-air.exponent * mass
    depth += ozone * air.ozone * ozone_mass
    wet = water * air.water * mass
    depth += 0.2385 * wet / (1.0 + 20.07 * wet) ** 0.45
    dense = mixed * mass * (air.pressure / SEA_LEVEL)
    depth += 1.41 * dense / (1.0 + 118.3 * dense) ** 0.45
    return np.asarray(np.exp(-depth))


def sunlight(distance: float = 1.0) -> F64:
    """Spectral irradiance (471,) outside the air, W m-2 nm-1, the sun being `distance` astronomical units away."""
    return np.asarray(table("sunlight")[1][:, 1] / distance**2)


def direct_sunlight(air: Air, elevation: float, distance: float = 1.0) -> F64:
    """Spectral irradiance (471,) of a surface that faces the sun, by its direct light, W m-2 nm-1."""
    return np.asarray(sunlight(distance) * transmittance(air, elevation))

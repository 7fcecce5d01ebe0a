"""Sunlight on its way through clear air: scattered by molecules and haze, absorbed by ozone, water vapour and oxygen.

Sources: Bodhaine et al. 1999 (Rayleigh, equations 29 and 30), Angstrom 1929 (haze), Preetham, Shirley and Smits 1999
(haze by turbidity), Kasten and Young 1989 (path through the air), Bird and Riordan 1984 (SERI/TR-215-2436: absorption
by the gases, 2-8 to 2-11, and the light of the clear sky, 3-1 to 3-15).
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


@dataclass(frozen=True, eq=False, slots=True)
class _Layers:
    """Shares of light (471,) that each constituent of the air lets through: molecules, haze that scatters, haze that
    absorbs, and the gases."""

    molecules: F64
    scattering: F64
    absorbing: F64
    gases: F64


def _layers(air: Air, mass: float, ozone_mass: float) -> _Layers:
    um = wavelengths() / 1000.0
    _, rows = table("absorption")
    water, ozone, mixed = on_grid(rows[:, 0], rows[:, 1:]).T
    wet, dense = water * air.water * mass, mixed * mass * (air.pressure / SEA_LEVEL)
    depth = ozone * air.ozone * ozone_mass
    depth += 0.2385 * wet / (1.0 + 20.07 * wet) ** 0.45
    depth += 1.41 * dense / (1.0 + 118.3 * dense) ** 0.45
    haze, scattered = air.haze * um**-air.exponent * mass, 0.945 * np.exp(-0.095 * np.log(um / 0.4) ** 2)
    return _Layers(
        np.exp(-rayleigh_depth(um, air.pressure) * mass),
        np.exp(-scattered * haze),
        np.exp((scattered - 1.0) * haze),
        np.exp(-depth),
    )


def _ozone_mass(elevation: float) -> float:
    height = 22.0 / 6370.0
    return (1.0 + height) / sqrt(sin(radians(elevation)) ** 2 + 2.0 * height)


def transmittance(air: Air, elevation: float) -> F64:
    """Share of sunlight (471,) that comes straight through the air at an elevation as seen in degrees, from 0."""
    layers = _layers(air, air_mass(elevation), _ozone_mass(elevation))
    return np.asarray(layers.molecules * layers.scattering * layers.absorbing * layers.gases)


def sunlight(distance: float = 1.0) -> F64:
    """Spectral irradiance (471,) outside the air, W m-2 nm-1, the sun being `distance` astronomical units away."""
    return np.asarray(table("sunlight")[1][:, 1] / distance**2)


def direct_sunlight(air: Air, elevation: float, distance: float = 1.0) -> F64:
    """Spectral irradiance (471,) of a surface that faces the sun, by its direct light, W m-2 nm-1."""
    return np.asarray(sunlight(distance) * transmittance(air, elevation))


def diffuse_skylight(air: Air, elevation: float, distance: float = 1.0, ground: float = 0.2) -> F64:
    """Spectral irradiance (471,) of a level plane by the whole clear sky without the sun, W m-2 nm-1.

    `ground` is the reflectance of the land around. Light scattered more than once enters by the model's own factors.
    """
    layers = _layers(air, air_mass(elevation), _ozone_mass(elevation))
    level = sin(radians(elevation))
    arriving = sunlight(distance) * level * layers.gases
    molecules = arriving * layers.absorbing * (1.0 - layers.molecules**0.95) * 0.5
    haze = arriving * layers.absorbing * layers.molecules**1.5 * (1.0 - layers.scattering) * _forward(level)
    direct = arriving * layers.molecules * layers.scattering * layers.absorbing
    back = _layers(air, 1.8, 1.8)
    upward = 0.5 * (1.0 - back.molecules) + (1.0 - _forward(1.0 / 1.8)) * back.molecules * (1.0 - back.scattering)
    mirrored = ground * back.gases * back.absorbing * upward
    um = wavelengths() / 1000.0
    blue = np.where(um <= 0.45, (um + 0.55) ** 1.8, 1.0)
    return np.asarray((molecules + haze + (direct + molecules + haze) * mirrored / (1.0 - mirrored)) * blue)


def _forward(level: float) -> float:
    """Share of what haze scatters that goes downward, the sun's sine of elevation being `level` (3-11 to 3-15)."""
    asymmetry = log(1.0 - 0.65)
    a = asymmetry * (1.459 + asymmetry * (0.1595 + asymmetry * 0.4129))
    b = asymmetry * (0.0783 + asymmetry * (-0.3824 - asymmetry * 0.5874))
    return 1.0 - 0.5 * exp((a + b * level) * level)

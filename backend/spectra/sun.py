"""Where the sun stands, by date, time and place, after Meeus, Astronomical Algorithms (2nd edition, 1998).

Chapters 7 (Julian day), 12 (sidereal time), 13 (horizontal coordinates), 22 (nutation and obliquity, the short
series), 25 (the sun), 40 (parallax). The earth's longitude is the leading part of VSOP87 as NREL/TP-560-34302 has it
(table A4.2), which leaves out less than 1e-3 deg; refraction is that report's 3.11.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import asin, atan2, cos, degrees, floor, radians, sin, tan

HORIZON = -0.8333
"""Elevation in deg of the sun's centre when its upper rim touches the horizon: refraction and half the sun's width."""


# Heliocentric longitude of the earth: rows (amplitude in 1e-8 radian, phase, frequency by millennium), powers of time.
_LONGITUDE: tuple[tuple[tuple[float, float, float], ...], ...] = (
    (
        (175347046.0, 0.0, 0.0), (3341656, 4.6692568, 6283.07585), (34894, 4.6261, 12566.1517),
        (3497, 2.7441, 5753.3849), (3418, 2.8289, 3.5231), (3136, 3.6277, 77713.7715),
        (2676, 4.4181, 7860.4194), (2343, 6.1352, 3930.2097), (1324, 0.7425, 11506.7698),
        (1273, 2.0371, 529.691), (1199, 1.1096, 1577.3435), (990, 5.233, 5884.927), (902, 2.045, 26.298),
        (857, 3.508, 398.149), (780, 1.179, 5223.694), (753, 2.533, 5507.553), (505, 4.583, 18849.228),
        (492, 4.205, 775.523), (357, 2.92, 0.067), (317, 5.849, 11790.629), (284, 1.899, 796.298),
        (271, 0.315, 10977.079), (243, 0.345, 5486.778), (206, 4.806, 2544.314), (205, 1.869, 5573.143),
        (202, 2.458, 6069.777),
    ),
    (
        (628331966747.0, 0.0, 0.0), (206059, 2.678235, 6283.07585), (4303, 2.6351, 12566.1517),
        (425, 1.59, 3.523), (119, 5.796, 26.298), (109, 2.966, 1577.344),
    ),
    (
        (52919, 0.0, 0.0), (8720, 1.0721, 6283.0758), (309, 0.867, 12566.152),
    ),
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class SunPosition:
    """`elevation` of the centre above the horizon as it is seen, `azimuth` clockwise from north; degrees.

    `distance` in astronomical units.
    """

    elevation: float
    azimuth: float
    distance: float


def julian_day(year: int, month: int, day: int, hour: float) -> float:
    """The Julian day of a date of the Gregorian calendar, `hour` 0 .. 24."""
    if month <= 2:
        year, month = year - 1, month + 12
    century = year // 100
    leap = 2 - century + century // 4
    return floor(365.25 * (year + 4716)) + floor(30.6001 * (month + 1)) + day + hour / 24.0 + leap - 1524.5


def sun_position(
    day: float, latitude: float, longitude: float, pressure: float = 1013.25, temperature: float = 15.0
) -> SunPosition:
    """The sun at a Julian day of universal time, seen from a place in degrees, east and north positive.

    `pressure` in hPa and `temperature` in degrees Celsius bend the light. Terrestrial time is taken 69 s ahead of
    universal time, as it is in the 2020s; a minute more or less moves the sun by 1e-3 deg at most. To 0.001 deg.
    """
    centuries = (day + 69.0 / 86400.0 - 2451545.0) / 36525.0
    longitude_of_sun, obliquity, distance, nutation = _ecliptic(centuries)
    ascension = atan2(cos(obliquity) * sin(longitude_of_sun), cos(longitude_of_sun))
    declination = asin(sin(obliquity) * sin(longitude_of_sun))
    hour_angle = radians(_sidereal(day) + longitude) + nutation * cos(obliquity) - ascension
    north = radians(latitude)
    height = asin(sin(north) * sin(declination) + cos(north) * cos(declination) * cos(hour_angle))
    azimuth = atan2(sin(hour_angle), cos(hour_angle) * sin(north) - tan(declination) * cos(north))
    elevation = degrees(height) - 8.794 / 3600.0 / distance * cos(height)
    return SunPosition(
        elevation + refraction(elevation, pressure, temperature), (degrees(azimuth) + 180.0) % 360.0, distance
    )


def refraction(elevation: float, pressure: float = 1013.25, temperature: float = 15.0) -> float:
    """How far, in degrees, the air lifts what stands at a true elevation; nothing below the horizon."""
    if elevation < HORIZON:
        return 0.0
    bend = 1.02 / (60.0 * tan(radians(elevation + 10.3 / (elevation + 5.11))))
    return pressure / 1010.0 * 283.0 / (273.0 + temperature) * bend


def _ecliptic(t: float) -> tuple[float, float, float, float]:
    """Apparent longitude and true obliquity, radians, distance, and nutation in longitude, radians."""
    millennia = t / 10.0
    longitude = 180.0 - 0.09033 / 3600.0
    for power, rows in enumerate(_LONGITUDE):
        total = sum(size * cos(phase + rate * millennia) for size, phase, rate in rows)
        longitude += degrees(1e-8 * total * millennia**power) % 360.0
    anomaly = radians(357.52911 + 35999.05029 * t - 0.0001537 * t * t)
    eccentricity = 0.016708634 - 0.000042037 * t - 0.0000001267 * t * t
    centre = 1.914602 * sin(anomaly) + 0.019993 * sin(2 * anomaly)
    distance = 1.000001018 * (1 - eccentricity**2) / (1 + eccentricity * cos(anomaly + radians(centre)))
    node = radians(125.04452 - 1934.136261 * t)
    moon = radians(218.3165 + 481267.8813 * t)
    sun = radians(280.4665 + 36000.7698 * t)
    nutation = (-17.20 * sin(node) - 1.32 * sin(2 * sun) - 0.23 * sin(2 * moon) + 0.21 * sin(2 * node)) / 3600.0
    tilt = (9.20 * cos(node) + 0.57 * cos(2 * sun) + 0.10 * cos(2 * moon) - 0.09 * cos(2 * node)) / 3600.0
    obliquity = 23.43929111 - (46.8150 * t + 0.00059 * t * t - 0.001813 * t**3) / 3600.0 + tilt
    aberration = -20.4898 / 3600.0 / distance
    return radians((longitude + nutation + aberration) % 360.0), radians(obliquity), distance, radians(nutation)


def _sidereal(day: float) -> float:
    """Mean sidereal time at Greenwich, degrees."""
    days = day - 2451545.0
    t = days / 36525.0
    return (280.46061837 + 360.98564736629 * days + 0.000387933 * t * t - t**3 / 38710000.0) % 360.0

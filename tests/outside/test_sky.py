"""The sun's place, the air it shines through, and the sky, against published worked examples and tables.

Sources beside each check: NREL/TP-560-34302, Bodhaine et al. 1999, Bucholtz 1995, ASTM G-173-03, CIE S 011, Preetham
1999, Meeus 1998.
"""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend.spectra import air, grid, sky, sun, tristimulus

MATCHING = tristimulus.observer()


def _xy(spectrum: np.ndarray) -> np.ndarray:
    return tristimulus.chromaticity_of(spectrum @ MATCHING)


def test_the_sun_stands_where_the_worked_example_of_nrel_has_it() -> None:
    # NREL/TP-560-34302, table A5.1: 2003-10-17, 12:30:30 at UTC-7, 39.742476 N, 105.1786 W, 820 hPa, 11 C.
    day = sun.julian_day(2003, 10, 17, 19 + 30 / 60 + 30 / 3600)
    found = sun.sun_position(day, 39.742476, -105.1786, 820.0, 11.0)
    assert day == pytest.approx(2452930.312847, abs=1e-6)
    assert 90 - found.elevation == pytest.approx(50.11162, abs=1e-3)  # asked: 0.01
    assert found.azimuth == pytest.approx(194.34024, abs=1e-3)
    assert found.distance == pytest.approx(0.9965422974, abs=1e-5)


@pytest.mark.parametrize(
    ("date", "expected"),
    [((2000, 1, 1, 12.0), 2451545.0), ((1987, 1, 27, 0.0), 2446822.5), ((1988, 6, 19, 12.0), 2447332.0)],
)
def test_julian_days_are_those_of_meeus(date: tuple[int, int, int, float], expected: float) -> None:
    assert sun.julian_day(*date) == expected  # Meeus 1998, chapter 7


def test_the_sun_of_equinox_and_solstice() -> None:
    # Equinox of March 2000: 20 March, 7:35 UT; solstice of June 2000: 21 June, 1:48 UT (Meeus 1998, chapter 27).
    for date, declination in (((2000, 3, 20, 7 + 35 / 60), 0.0), ((2000, 6, 21, 1.8), 23.4384)):
        # At the pole the elevation is the declination; without air, less the parallax.
        found = sun.sun_position(sun.julian_day(*date), 90.0, 0.0, pressure=0.0)
        assert found.elevation == pytest.approx(declination - 8.794 / 3600, abs=3e-3)


def test_refraction_lifts_the_rising_sun() -> None:
    # At a true elevation of 0 the sun is lifted by 29 minutes of arc at 1010 hPa and 10 C (Meeus 1998, chapter 16).
    assert sun.refraction(0.0, 1010.0, 10.0) * 60 == pytest.approx(29.0, abs=0.4)
    assert sun.refraction(-3.0) == 0.0 and sun.refraction(90.0) == pytest.approx(0.0, abs=1e-3)


def test_molecules_scatter_as_bodhaine_says() -> None:
    # Equations 29 and 30 worked out elsewhere: cm2, and optical depth at sea level, 45 deg N.
    um = np.array([0.40, 0.45, 0.50, 0.55, 0.60, 0.65, 0.70])
    sections = np.array([16.73854, 10.27444, 6.661400, 4.510466, 3.163901, 2.285479, 1.692421]) * 1e-27
    depths = (0.360213, 0.221106, 0.143353, 0.097065, 0.068087, 0.049184, 0.036421)
    np.testing.assert_allclose(air.rayleigh_cross_section(um), sections, rtol=4e-7)
    np.testing.assert_allclose(air.rayleigh_depth(um), depths, atol=6e-7)
    # Bucholtz 1995 tabulates 4.513e-27 cm2 at 0.55 um.
    assert air.rayleigh_cross_section(np.array([0.55]))[0] == pytest.approx(4.513e-27, rel=1e-3)


def test_sunlight_outside_the_air_is_that_of_astm_g_173() -> None:
    # Integrals of its column at 683.002 lm/W: 133 101 lx, x 0.32338, y 0.33266.
    light = air.sunlight()
    assert tristimulus.illuminance_of(light, MATCHING) == pytest.approx(133_101, abs=10)
    np.testing.assert_allclose(_xy(light), (0.32338, 0.33266), atol=5e-5)
    assert tristimulus.illuminance_of(air.sunlight(0.98), MATCHING) == pytest.approx(133_101 / 0.98**2, abs=10)


def test_direct_sunlight_is_close_to_that_of_astm_g_173() -> None:
    """Air mass 1.5, 0.3438 atm cm of ozone, 1.4164 cm of water, aerosol of depth 0.084 at 500 nm (the standard's own).

    The standard's aerosol is that of rural air, whose exponent between 0.5 and 1 um is 1.206 and 1.0274 below (Bird and
    Riordan 1986). Its column: 97 143 lx, x 0.33908, y 0.35008, 1.3391 and 1.3648 W m-2 nm-1 at 500 and 550 nm.
    """
    exponent = 1.14
    through = air.Air(0.084 * 0.5**exponent, exponent, 0.3438, 1.4164)
    elevation = 41.77
    assert air.air_mass(elevation) == pytest.approx(1.5, abs=2e-3)
    light = air.direct_sunlight(through, elevation)
    assert tristimulus.illuminance_of(light, MATCHING) == pytest.approx(97_143, rel=0.015)
    np.testing.assert_allclose(_xy(light), (0.33908, 0.35008), atol=0.0015)
    np.testing.assert_allclose(light[[500 - grid.FIRST, 550 - grid.FIRST]], (1.3391, 1.3648), rtol=0.012)


def test_air_masses_are_those_of_kasten_and_young() -> None:
    # As pvlib lists them for the apparent zenith angles 30, 60, 75, 85 and 90 deg.
    found = [air.air_mass(elevation) for elevation in (60.0, 30.0, 15.0, 5.0, 0.0)]
    np.testing.assert_allclose(found, (1.154, 1.994, 3.813, 10.306, 37.92), rtol=5e-4)


def test_the_low_sun_is_redder_and_dimmer_than_the_high_one_and_the_sky_bluer_than_the_sun() -> None:
    through = air.air_of(3.0)
    elevations = (60.0, 30.0, 10.0, 5.0, 2.0)
    lights = [air.direct_sunlight(through, elevation) for elevation in elevations]
    reds = [_xy(light)[0] for light in lights]
    lux = [tristimulus.illuminance_of(light, MATCHING) for light in lights]
    assert all(np.diff(reds) > 0.005) and all(np.diff(lux) < 0)
    # Illuminance by direct sun of 60 deg: 80 to 105 klx in clear air (common practice), of 5 deg below 10 klx.
    assert 80_000 < lux[0] < 105_000 and lux[3] < 10_000
    assert reds[0] == pytest.approx(0.342, abs=0.003) and reds[3] == pytest.approx(0.479, abs=0.01)
    for elevation, light in zip(elevations[:4], lights[:4], strict=True):
        skylight = air.diffuse_skylight(through, elevation)
        assert _xy(skylight)[0] < _xy(light)[0] - 0.05 and _xy(skylight)[1] < _xy(light)[1] - 0.02


def test_the_clear_sky_shines_as_the_simple_spectral_model_has_it() -> None:
    """Shares of the sunlight outside the air on a level plane, by pvlib 0.13, which has the same model (`spectrl2`).

    Bird and Riordan 1984: zenith angle 48.23 deg, 0.084 of aerosol at 500 nm with exponent 1.14, 1.4164 cm of water,
    0.3438 atm cm of ozone, ground 0.2. It takes an older formula for the molecules, which is worth 1 %.
    """
    at = np.array([400, 450, 500, 550, 610, 710]) - grid.FIRST
    through = air.Air(0.084 * 0.5**1.14, 1.14, 0.3438, 1.4164)
    diffuse = (air.diffuse_skylight(through, 41.77) / air.sunlight())[at]
    np.testing.assert_allclose(diffuse, (0.17783, 0.15278, 0.12051, 0.09582, 0.07608, 0.05926), rtol=0.0135)
    direct = air.transmittance(through, 41.77)[at]
    np.testing.assert_allclose(direct, (0.49236, 0.61939, 0.69840, 0.73783, 0.77201, 0.85971), rtol=0.0075)


def test_sun_and_sky_together_look_like_daylight() -> None:
    # Typical daylight is of 5 500 to 6 500 K (CIE 15): x from 0.3127 to 0.3324, near the daylight locus.
    for elevation in (60.0, 40.0, 20.0):
        through = air.air_of(3.0)
        level = np.sin(np.radians(elevation))
        whole = air.direct_sunlight(through, elevation) * level + air.diffuse_skylight(through, elevation)
        x, y = _xy(whole)
        assert 0.3127 < x < 0.3335 and abs(y - (-3 * x * x + 2.87 * x - 0.275)) < 0.006


def test_haze_reddens_and_dims_the_sun() -> None:
    clear, thick = (air.direct_sunlight(air.air_of(turbidity), 20.0) for turbidity in (2.0, 6.0))
    assert _xy(thick)[0] > _xy(clear)[0] + 0.02
    assert tristimulus.illuminance_of(thick, MATCHING) < 0.7 * tristimulus.illuminance_of(clear, MATCHING)


def test_cie_skies_have_their_ratios() -> None:
    # CIE S 011 worked out elsewhere; type 1 at the horizon is 1 / (1 + 4 exp(-0.7)) of the zenith.
    assert sky.relative_luminance(1, 90.0, 90.0, 0.0) == pytest.approx(0.3348579, abs=1e-7)
    zenith, away = np.array([0.0, 30, 45, 60, 85]), np.array([45.0, 15, 0, 15, 40])
    np.testing.assert_allclose(sky.relative_luminance(5, zenith, away, 45.0), 1.0, rtol=1e-12)
    expected = (1, 3.189515, 7.249075, 4.880528, 4.110096)
    np.testing.assert_allclose(sky.relative_luminance(12, zenith, away, 45.0), expected, rtol=1e-6)
    expected = (1, 0.961495, 0.906702, 0.817853, 0.669303)
    np.testing.assert_allclose(sky.relative_luminance(3, zenith, away, 45.0), expected, rtol=1e-6)
    for each in range(1, 16):
        assert sky.relative_luminance(each, 0.0, 40.0, 40.0) == pytest.approx(1.0)


def test_an_overcast_sky_lights_the_ground_by_seven_ninths_of_pi() -> None:
    assert sky.over_the_sky(lambda zenith, _: np.ones_like(zenith), 0.0) == pytest.approx(np.pi, rel=1e-12)
    moon_spencer = sky.over_the_sky(lambda zenith, _: sky.moon_spencer(zenith), 0.0)
    assert moon_spencer == pytest.approx(7 * np.pi / 9, rel=1e-12)
    overcast = sky.over_the_sky(lambda zenith, away: sky.relative_luminance(1, zenith, away, 30.0), 30.0)
    assert overcast == pytest.approx(2.449541, abs=1e-6)


@pytest.mark.parametrize(
    ("turbidity", "zenith", "expected"),
    [
        (2.5, 45.0, (5.916113, 0.243282, 0.247584)), (3.0, 60.0, (5.139156, 0.244929, 0.252573)),
        (2.0, 30.0, (5.886743, 0.251421, 0.255924)), (6.0, 45.0, (14.893327, 0.261448, 0.275450)),
    ],
)  # fmt: skip
def test_the_zenith_of_the_clear_sky_is_that_of_preetham(
    turbidity: float, zenith: float, expected: tuple[float, float, float]
) -> None:
    # Preetham 1999, appendix A.2, worked out elsewhere.
    assert sky.clear_zenith(turbidity, zenith) == pytest.approx(expected, abs=1e-6)
    at_zenith = sky.clear_sky(turbidity, np.zeros(1), np.array([zenith]), zenith)
    np.testing.assert_allclose(at_zenith[0], expected, atol=1e-6)


def test_the_integral_over_the_sky_has_converged() -> None:
    def seen(zenith: np.ndarray, away: np.ndarray) -> np.ndarray:
        return sky.clear_sky(3.0, zenith, away, 60.0)[:, 0]

    assert sky.over_the_sky(seen, 60.0) == pytest.approx(sky.over_the_sky(seen, 60.0, 160), rel=1e-3)

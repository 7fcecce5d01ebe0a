"""Lightings and materials by spectra, from the text to the job: colours, strengths, pairs, white, mistakes."""

from __future__ import annotations

import math

import numpy as np
import pytest
from platewright.backend import colour, contract
from platewright.backend.spectra import grid, illuminants, tristimulus
from platewright.compiler.lightings import SURROUND, WHITE
from support.scenes import checked, planned

PLAIN = 'material stuff\n    colour "#c03020"\n'
METAL = "material stuff\n    metal gold\n"
MEASURED = 'material stuff\n    reflectance over "paint.csv"\n'
FLAT = "wavelength nm,reflectance\n" + "".join(f"{nm},0.4\n" for nm in range(380, 781, 10))
DEEP_RED = "wavelength nm,power\n" + "".join(f"{nm},{int(nm >= 680)}\n" for nm in range(380, 781, 5))


def files(light: str, material: str = PLAIN, **tables: str) -> dict[str, str]:
    body = "".join(f"    {line}\n" for line in light.split("; "))
    part = "part ball\n    made of stuff\n    add sphere diameter 40 mm\n"
    figure = 'figure f\n    show ball from front under noon\n    drawn as tone\n    alt "A ball."\n'
    text = f"{material}{part}lighting noon\n{body}{figure}"
    return {"scene.plate": text, **{f"{name}.csv": table for name, table in tables.items()}}


def job(light: str, material: str = PLAIN, **tables: str) -> contract.Job:
    texts = files(light, material, **tables)
    return planned(texts.pop("scene.plate"), "f", texts)


def lit(light: str, material: str = PLAIN, **tables: str) -> contract.Lighting:
    return job(light, material, **tables).sheet.panels[0].lighting


def found(light: str, material: str = PLAIN, **tables: str) -> list[tuple[str, str]]:
    texts = files(light, material, **tables)
    return [(each.code, each.sentence) for each in checked(texts.pop("scene.plate"), texts).problems]


def shares(power: tuple[float, float, float]) -> np.ndarray:
    return np.array(power) / colour.luminance(power)


def test_light_of_which_nothing_is_said_stays_white_and_unpaired() -> None:
    plain = lit("light from left; ambient 100 lx; lamp at (0, -1 m, 0) flux 800 lm")
    assert plain.pairs == ()
    assert all(light.power[0] == light.power[1] == light.power[2] for light in plain.lights)


def test_a_lamp_is_red_by_its_temperature_and_keeps_its_lumens() -> None:
    # 800 lm all round are 800 / 4 pi cd, whatever their colour.
    reds = []
    for kelvin in (2000, 3000, 5000, 6504, 10000):
        (light,) = lit(f"lamp at (0, -1 m, 0) flux 800 lm temperature {kelvin} K").lights
        assert colour.luminance(light.power) == pytest.approx(800 / (4 * math.pi), rel=1e-3)
        reds.append(light.power[0] / light.power[2])
    assert all(np.diff(reds) < 0) and reds[3] == pytest.approx(1, abs=0.01) and reds[1] > 3


def test_the_light_that_counts_as_white_is_white() -> None:
    for light in (
        "temperature 3000 K; white point 3000 K",
        'illuminant "D65"',
        "temperature 5500 K; white point 5500 K",
    ):
        (found_light,) = lit(f"light from left {light}").lights
        np.testing.assert_allclose(found_light.power, 1000.0, rtol=1e-9)
    # 2 856 K is the temperature of illuminant A, by a slightly other law.
    (found_light,) = lit('light from left illuminant "A"; white point 2856 K').lights
    np.testing.assert_allclose(found_light.power, 1000.0, rtol=2e-3)


def test_no_light_has_a_negative_channel() -> None:
    (light,) = lit('light from left spectrum over "lamp.csv"', lamp=DEEP_RED).lights
    assert min(light.power) >= 0 and light.power[0] > 4 * light.power[1]
    assert colour.luminance(light.power) == pytest.approx(1000.0, rel=1e-3)


def test_the_exposure_leaves_no_channel_of_a_coloured_white_above_its_level() -> None:
    for light in ("light from eye illuminance 700 lx temperature 2700 K", "sun elevation 5 deg azimuth 0 deg"):
        lighting = lit(light)
        assert lighting.exposure * max(lighting.lights[0].power) == pytest.approx(WHITE)
    even = lit("ambient 500 lx")
    assert even.exposure * even.lights[0].power[0] * SURROUND == pytest.approx(WHITE)


def test_the_low_sun_is_redder_and_dimmer_and_the_sky_bluer() -> None:
    high, low = (lit(f"sun elevation {angle} deg azimuth 180 deg; sky clear").lights for angle in (60, 5))
    assert shares(low[0].power)[0] > 1.7 * shares(high[0].power)[0]
    assert shares(low[0].power)[2] < 0.3 * shares(high[0].power)[2]
    assert colour.luminance(low[0].power) < 0.1 * colour.luminance(high[0].power)
    for sun, sky in (high, low):
        assert sky.kind == "ambient" and shares(sky.power)[2] > 1.5 * shares(sun.power)[2]


def test_the_sun_of_a_date_stands_where_the_almanac_of_nrel_has_it() -> None:
    # NREL/TP-560-34302, table A5.1, at sea level: 19:30 UTC; half a minute moves the sun by 0.1 deg.
    (sun,) = lit("sun on 2003-10-17 at 19:30 place 39.742476 degN 105.1786 degW").lights
    x, y, z = sun.vector
    assert math.degrees(math.asin(z)) == pytest.approx(90 - 50.11162, abs=0.06)
    assert math.degrees(math.atan2(x, y)) % 360 == pytest.approx(194.34024, abs=0.2)
    stated = lit(f"sun elevation {math.degrees(math.asin(z))} deg azimuth 194 deg illuminance 1 klx").lights[0]
    np.testing.assert_allclose(shares(stated.power), shares(sun.power), rtol=1e-6)


def test_an_overcast_sky_is_white_and_of_ten_kilolux() -> None:
    (sky,) = lit("sky overcast").lights
    np.testing.assert_allclose(sky.power, 10_000.0, rtol=1e-9)
    assert lit("sky clear").lights[0].power[2] > 1.4 * lit("sky clear").lights[0].power[0]


def test_pairs_are_the_products_where_the_light_is_d65() -> None:
    plain = job("light from left; ambient 200 lx")
    daylight = lit('light from left illuminant "D65"; ambient 200 lx illuminant "D65"')
    (material,) = plain.materials
    for row, lux in zip(daylight.pairs, (1000.0, 200.0), strict=True):
        answers = np.array([*material.colour, *material.normal_reflectance])
        np.testing.assert_allclose(np.array(row[0]) / lux, answers, atol=1e-4)


def test_a_light_without_spectrum_keeps_its_products_beside_one_with() -> None:
    whole = job("light from left temperature 3000 K; ambient 200 lx", METAL)
    (material,), row = whole.materials, whole.sheet.panels[0].lighting.pairs[1][0]
    np.testing.assert_allclose(row, 200 * np.array([0, 0, 0, *material.normal_reflectance]), rtol=1e-12)


def test_gold_in_lamplight_has_its_own_colour_not_a_product() -> None:
    """The product of light and D65 reflectance misses what n and k give by more than 2 % of the light."""
    whole = job("light from left temperature 2700 K; white point 2700 K", METAL)
    lighting = whole.sheet.panels[0].lighting
    product = np.array(lighting.lights[0].power) * whole.materials[0].normal_reflectance
    pair = np.array(lighting.pairs[0][0][3:])
    assert np.abs(pair - product).max() / 1000 > 0.02


def test_a_measured_reflectance_is_read_and_gives_its_colour() -> None:
    flat = job("ambient 100 lx", MEASURED, paint=FLAT).materials[0]
    np.testing.assert_allclose(flat.colour, 0.4, atol=4e-3)  # an 8-bit colour
    percent = FLAT.replace("reflectance", "reflectance %").replace(",0.4", ",40")
    assert job("ambient 100 lx", MEASURED, paint=percent).materials == (flat,)
    pair = lit("light from left temperature 3000 K; white point 3000 K", MEASURED, paint=FLAT).pairs[0][0]
    np.testing.assert_allclose(pair[:3], 400.0, rtol=1e-6)


def metamer() -> str:
    """A table of a reflectance that looks like `FLAT` under D65: the grey and what D65 does not show."""
    seen = illuminants.illuminant("D65")[:, None] * tristimulus.observer()
    wave = np.cos(np.arange(grid.N) * (2 * np.pi / 110.0))
    black = wave - seen @ np.linalg.lstsq(seen.T @ seen, seen.T @ wave, rcond=None)[0]
    other = 0.4 + 0.35 * black / np.abs(black).max()
    rows = zip(grid.wavelengths().astype(int), other.tolist(), strict=True)
    return "wavelength nm,reflectance\n" + "".join(f"{nm},{share:.7f}\n" for nm, share in rows)


def test_two_paints_that_match_in_daylight_differ_in_lamplight() -> None:
    """From the tables to the pairs that are drawn; in CIELAB, whose unit is about the least difference seen."""
    found_pairs = {}
    for name in ("D65", "A"):
        light = f'light from left illuminant "{name}"; white point {6504 if name == "D65" else 2856} K'
        found_pairs[name] = [
            np.array(lit(light, MEASURED, paint=table).pairs[0][0][:3]) / 1000.0 for table in (FLAT, metamer())
        ]
    assert np.abs(np.subtract(*found_pairs["D65"])).max() < 1e-3
    grey, tinted = found_pairs["A"]
    apart = lab(grey) - lab(tinted)
    assert np.sqrt(apart @ apart) > 5


def lab(rgb: np.ndarray) -> np.ndarray:
    """CIELAB of linear sRGB under its own white (CIE 15, 8.2.1)."""
    to_xyz = np.linalg.inv(tristimulus.xyz_to_rgb())
    x, y, z = np.cbrt(to_xyz @ rgb / (to_xyz @ np.ones(3)))
    return np.array([116 * y - 16, 500 * (x - y), 200 * (y - z)])


def test_lines_need_no_pairs() -> None:
    texts = files("light from left temperature 3000 K")
    text = texts["scene.plate"].replace("drawn as tone", "drawn as lines")
    assert planned(text, "f").sheet.panels[0].lighting.pairs == ()


@pytest.mark.parametrize(
    ("light", "code", "words"),
    [
        ("light from left temperature 300 K", "out-of-range", "from 1000 K to 25000 K, found 300 K"),
        ("light from left; white point 0 K", "out-of-range", "found 0 K"),
        ('light from left illuminant "D66"', "unknown-name", "no illuminant"),
        ("sun on 2026-12-21 at 22:00 place 52.5 degN 13.4 degE", "out-of-range", "below the horizon"),
        ("sun on 2026-06-21 at 25:00 place 52.5 degN 13.4 degE", "out-of-range", "time of day"),
        ("sun elevation 40 deg azimuth 0 deg turbidity 1", "out-of-range", "from 2 to 10, found 1"),
        ("sun on 2026-06-21 at 12:00 place 95 degN 13.4 degE", "out-of-range", "latitude"),
        ("light from left; white point 3000 K", "no-effect", "white point changes nothing"),
    ],
)
def test_mistakes_in_light_are_told(light: str, code: str, words: str) -> None:
    ((given, sentence),) = found(light)
    assert given == code and words in sentence


@pytest.mark.parametrize(
    ("table", "code", "words"),
    [
        (FLAT.replace(" nm", ""), "bad-table", "no wavelengths"),
        (FLAT.replace("0.4", "40"), "bad-table", "from 0 to 1, found 40"),
        (FLAT.replace("550,0.4", "550,-0.1"), "bad-table", "0 or more, found -0.1"),
        (FLAT.replace("550,0.4", "540,0.4"), "bad-table", "above 540 nm"),
        (FLAT.replace("550,0.4", "550,"), "bad-table", "empty"),
        (FLAT.replace("550,0.4", "550,pale"), "bad-table", "no plain numbers"),
        ("wavelength nm,reflectance\n400,0.4\n550,0.4\n700,0.5\n", "coarse-spectrum", "between 400 nm and 550 nm"),
        ("wavelength nm,reflectance\n900,0.4\n950,0.4\n", "bad-table", "from 900 nm to 950 nm"),
        ("wavelength nm,reflectance,note\n400,0.4,1\n", "bad-table", "3 columns"),
        ("wavelength nm,reflectance\n", "bad-table", "no rows"),
    ],
)
def test_mistakes_in_a_table_are_told(table: str, code: str, words: str) -> None:
    ((given, sentence),) = found("light from left", MEASURED, paint=table)
    assert given == code and words in sentence


def test_what_a_measured_surface_makes_needless_is_told() -> None:
    assert found("light from left", MEASURED + '    colour "#ff0000"\n', paint=FLAT)[0][0] == "no-effect"
    assert found("light from left", METAL + '    reflectance over "paint.csv"\n', paint=FLAT)[0][0] == "no-effect"

"""Colours of surfaces from their spectra: ColorChecker patches against colour-science, metamers, upsampled colours.

ColorChecker reflectances: N. Ohta, as colour-science 0.4.7 (BSD-3-Clause) carries them. CIEDE2000: Sharma, Wu, Dalal
2005.
"""

from __future__ import annotations

import itertools
import warnings

import numpy as np
import pytest
from platewright.backend import colour as srgb
from platewright.backend.spectra import grid, illuminants, tristimulus, upsampling

with warnings.catch_warnings():
    warnings.simplefilter("ignore")  # what it says of plotting, which is not asked of it
    import colour

MATCHING = tristimulus.observer()
PATCHES = colour.SDS_COLOURCHECKERS["ColorChecker N Ohta"]


def _white(name: str) -> np.ndarray:
    xyz = illuminants.illuminant(name) @ MATCHING
    return xyz / xyz[1]


def _lab(xyz: np.ndarray, white: np.ndarray) -> np.ndarray:
    return colour.XYZ_to_Lab(xyz, colour.XYZ_to_xy(white))


def _surfaces() -> np.ndarray:
    return np.stack([grid.on_grid(each.wavelengths, each.values) for each in PATCHES.values()])


@pytest.mark.parametrize("name", ["D65", "A"])
def test_patches_look_as_colour_science_finds_them(name: str) -> None:
    source = illuminants.illuminant(name)
    ours = (_surfaces() * source) @ MATCHING / (source @ MATCHING[:, 1])
    light, observer = colour.SDS_ILLUMINANTS[name], colour.MSDS_CMFS["CIE 1931 2 Degree Standard Observer"]
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # that it brings the light to the wavelengths of the observer
        theirs = np.stack([colour.sd_to_XYZ(each, observer, light) / 100 for each in PATCHES.values()])
    apart = colour.delta_E(_lab(ours, _white(name)), _lab(theirs, _white(name)), method="CIE 2000")
    assert len(apart) == 24 and apart.max() < 0.05


def test_patches_have_their_published_tristimulus_values() -> None:
    expected = {
        "dark skin": (0.10971, 0.09703, 0.06056), "white 9.5 (.05 D)": (0.84138, 0.88724, 0.95436),
        "red": (0.20176, 0.11826, 0.05200), "blue": (0.08412, 0.06230, 0.30007), "yellow": (0.56047, 0.59638, 0.09554),
    }  # fmt: skip
    source = illuminants.illuminant("D65")
    found = dict(zip(PATCHES, (_surfaces() * source) @ MATCHING / (source @ MATCHING[:, 1]), strict=True))
    for name, values in expected.items():
        # Interpolated there by Sprague's polynomials, here by straight lines, which shows where violet falls off.
        np.testing.assert_allclose(found[name], values, atol=5e-4)


@pytest.mark.parametrize("name", ["A", "D50", "FL2"])
def test_adaptation_is_that_of_cat16(name: str) -> None:
    white, to = _white(name), tristimulus.white_xyz(*tristimulus.WHITE)
    theirs = colour.adaptation.matrix_chromatic_adaptation_VonKries(white, to, transform="CAT16")
    np.testing.assert_allclose(tristimulus.adaptation(white, to), theirs, atol=1e-6)


def test_two_metamers_equal_under_d65_differ_under_a() -> None:
    """A grey, and the same grey with a metameric black: a spectrum that the observer does not see under D65."""
    daylight, lamp = illuminants.illuminant("D65"), illuminants.illuminant("A")
    seen = daylight[:, None] * MATCHING
    wave = np.cos(np.arange(grid.N) * (2 * np.pi / 110.0))
    black = wave - seen @ np.linalg.lstsq(seen.T @ seen, seen.T @ wave, rcond=None)[0]
    grey = np.full(grid.N, 0.4)
    other = grey + black * 0.35 / np.abs(black).max()
    assert other.min() >= 0 and other.max() <= 1
    for source, least, most in ((daylight, 0.0, 0.01), (lamp, 5.0, 60.0)):
        to_rgb = tristimulus.rgb_under(source @ MATCHING / (source @ MATCHING[:, 1]))
        pair = tristimulus.pair_colours(source[None], np.stack([grey, other]), MATCHING, to_rgb)[0]
        labs = colour.XYZ_to_Lab(pair @ np.linalg.inv(tristimulus.xyz_to_rgb()).T, np.array(tristimulus.WHITE))
        assert least <= colour.delta_E(labs[0], labs[1], method="CIE 2000") <= most


def test_an_upsampled_colour_comes_back_under_d65() -> None:
    """Every fourth of the gamut's sides, its corners and its darkest colours, to half an 8-bit level."""
    source = illuminants.illuminant("D65")
    to_rgb = tristimulus.rgb_under(_white("D65"))
    levels = [*itertools.product((0, 85, 170, 255), repeat=3), (1, 1, 1), (3, 0, 12), (254, 255, 250), (216, 220, 210)]
    for level in levels:
        surface = upsampling.reflectance_of(srgb.from_bytes(level), MATCHING)
        assert surface.min() >= 0 and surface.max() <= 1
        back = tristimulus.pair_colour(source, surface, MATCHING, to_rgb)
        assert np.abs(255 * srgb.encode(back) - level).max() <= 0.5, level


def test_an_upsampled_grey_is_flat() -> None:
    for share in (0.05, 0.18, 0.6):
        surface = upsampling.reflectance_of((share,) * 3, MATCHING)
        np.testing.assert_allclose(surface, share, atol=1e-4)

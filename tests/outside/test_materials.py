"""Surfaces and clear bodies: Fresnel's equations, metals from n and k, absorption, plates, leaves.

Values worked out from Fresnel's equations (Born and Wolf, 1.5.2); reflectances of metals as the refractiveindex.info
database (CC0) gives them for the same n and k.
"""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend.spectra import grid, illuminants, optics, tristimulus
from platewright.compiler.materials import METALS as METALS_OF_SCENES

MATCHING = tristimulus.observer()

DIELECTRIC = {  # index 1.5: angle, Rs, Rp
    0: (0.04, 0.04), 30: (0.05779611, 0.02524915), 45: (0.09201336, 0.00846646), 60: (0.17657149, 0.00180194),
    75: (0.39935603, 0.10676510), 85: (0.73234548, 0.49325381), 90: (1.0, 1.0),
}  # fmt: skip

# 450, 550 and 650 nm, then linear sRGB under D65.
METALS = {
    "gold": ((0.40819, 0.79155, 0.95652), (1.0375, 0.7284, 0.3646)),
    "copper": ((0.53826, 0.62351, 0.93522), (0.9317, 0.6228, 0.5223)),
    "silver": ((0.98024, 0.98305, 0.98983), (0.9893, 0.9840, 0.9778)),
    "aluminium": ((0.92186, 0.91537, 0.90561), (0.9073, 0.9159, 0.9223)),
    "iron": ((0.49583, 0.51236, 0.53123), (0.5296, 0.5133, 0.4942)),
}


@pytest.mark.parametrize("angle", DIELECTRIC)
def test_a_dielectric_reflects_as_fresnel_says(angle: int) -> None:
    found = optics.fresnel(np.cos(np.radians(angle)), 1.5)
    np.testing.assert_allclose(found, DIELECTRIC[angle], atol=1e-8)


def test_nothing_of_one_polarisation_is_reflected_at_brewsters_angle_and_all_beyond_the_critical_one() -> None:
    assert optics.fresnel(np.cos(np.radians(56.309932)), 1.5)[1] < 1e-14
    inside = [optics.fresnel(np.cos(np.radians(angle)), 1 / 1.5) for angle in (41.810314, 41.810316, 70.0)]
    assert inside[0][0] < 1 - 1e-4
    np.testing.assert_allclose(inside[1:], 1.0, atol=1e-12)


def test_diffuse_light_is_reflected_as_published() -> None:
    # Egan and Hilgeman 1973 give 0.0918 for 1.5; the further digits by quadrature elsewhere.
    assert optics.diffuse_reflectance(1.5) == pytest.approx(0.0917780, abs=5e-7)
    assert optics.diffuse_reflectance(4 / 3) == pytest.approx(0.0664585, abs=5e-7)


@pytest.mark.parametrize("name", METALS)
def test_metals_reflect_as_measured(name: str) -> None:
    spectrum = optics.normal_reflectance(optics.metal_index(name))
    at = [nm - grid.FIRST for nm in (450, 550, 650)]
    np.testing.assert_allclose(spectrum[at], METALS[name][0], atol=1e-5)
    source = illuminants.illuminant("D65")
    to_rgb = tristimulus.rgb_under(source @ MATCHING / (source @ MATCHING[:, 1]))
    found = tristimulus.pair_colour(source, spectrum, MATCHING, to_rgb)
    np.testing.assert_allclose(found, METALS[name][1], atol=3e-4)


def test_the_metals_of_the_language_are_those_of_the_data() -> None:
    source = illuminants.illuminant("D65")
    to_rgb = tristimulus.rgb_under(source @ MATCHING)
    assert sorted(METALS_OF_SCENES) == sorted(optics.METALS)
    for name, expected in METALS_OF_SCENES.items():
        spectrum = optics.normal_reflectance(optics.metal_index(name))
        found = tristimulus.into_gamut(tristimulus.pair_colour(source, spectrum, MATCHING, to_rgb), 1.0)
        np.testing.assert_allclose(found, expected, atol=3e-4)


def test_gold_at_60_degrees() -> None:
    found = optics.fresnel(0.5, optics.metal_index("gold")[550 - grid.FIRST])
    np.testing.assert_allclose(found, (0.895246, 0.689298), atol=2e-6)


@pytest.mark.parametrize("name", optics.METALS)
def test_no_metal_gives_back_more_than_it_gets(name: str) -> None:
    index = optics.metal_index(name)
    for cosine in (1.0, 0.5, 0.1, 0.0):
        s, p = optics.fresnel(cosine, index)
        assert max(s.max(), p.max()) <= 1 + 1e-12 and min(s.min(), p.min()) >= 0


def test_absorption_doubles_with_the_path() -> None:
    tint = np.array([0.9, 0.5, 0.2])
    absorption = optics.absorption_of(tint, 10.0)
    np.testing.assert_allclose(optics.inner_transmittance(absorption, 10.0), tint, rtol=1e-12)
    np.testing.assert_allclose(optics.inner_transmittance(absorption, 20.0), tint**2, rtol=1e-12)


def test_a_clear_plate_lets_through_what_its_two_faces_leave() -> None:
    # Born and Wolf: 2 r / (1 + r) reflected by a clear plate; 0.0769 and 0.9231 for index 1.5.
    reflected, through = optics.plate(1.5, np.zeros(1), 3.0)
    assert (reflected[0], through[0]) == pytest.approx((0.08 / 1.04, 0.96 / 1.04), abs=1e-12)
    for cosine in (1.0, 0.6, 0.2):
        reflected, through = optics.plate(1.5, np.array([0.0, 0.05]), 4.0, cosine)
        assert reflected[0] + through[0] == pytest.approx(1.0, abs=1e-12)
        assert reflected[1] + through[1] < 1.0


def test_a_leaf_is_green() -> None:
    # PROSPECT-5 (Feret et al. 2008) with N 1.5, Cab 40, Car 8, Cw 0.01, Cm 0.009, at seven wavelengths.
    at = np.array([400.0, 450, 550, 675, 700, 750, 800])
    share = np.array([0.0455, 0.04553, 0.11470, 0.04224, 0.12110, 0.44026, 0.45232])
    source = illuminants.illuminant("D65")
    to_rgb = tristimulus.rgb_under(source @ MATCHING / (source @ MATCHING[:, 1]))
    red, green, blue = tristimulus.pair_colour(source, grid.on_grid(at, share), MATCHING, to_rgb)
    assert green > 1.3 * red > red > blue


def test_tables_that_are_no_spectra_are_told() -> None:
    at = np.array([400.0, 500.0, 600.0, 700.0])
    good = np.array([0.1, 0.2, 0.3, 0.4])
    dense = np.arange(400.0, 701.0, 20.0)
    assert grid.faults_of(dense, np.full(16, 0.5), True) == ()

    def words(at: np.ndarray, values: np.ndarray, is_share: bool = True) -> list[tuple[int, bool]]:
        return [(each.row, each.is_error) for each in grid.faults_of(at, values, is_share)]

    assert words(at, good) == [(0, False)]  # steps of 100 nm: a warning
    assert words(at[[0, 2, 1, 3]], good) == [(2, True)]
    assert words(dense / 1000, np.full(16, 0.5)) == [(0, True)]  # micrometres
    assert words(dense[4:], np.full(12, 0.5)) == [(0, True)]  # the blue is missing
    assert words(dense, np.linspace(-0.1, 1, 16)) == [(0, True)]
    assert words(dense, np.full(16, 50.0)) == [(0, True)]  # per cent
    assert words(dense, np.full(16, 50.0), False) == []
    assert words(dense, np.zeros(16), False) == [(0, True)]
    assert words(dense[:0], np.zeros(0)) == [(0, True)]

"""Illuminants, blackbodies, sRGB and adaptation against published chromaticities and matrices.

Sources beside each table: CIE 15 (rounded tables of chromaticities), IEC 61966-2-1, Li et al. 2017. Values marked
"integrated" come from the same published tables by colour-science 0.4.7.
"""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend.spectra import grid, illuminants, tristimulus

MATCHING = tristimulus.observer()

# CIE 15, tables T.3 and T.8: five decimals for A, D55, D65, D75; four for the rest.
ILLUMINANTS = {
    "A": (0.44758, 0.40745), "D50": (0.34567, 0.35850), "D55": (0.33243, 0.34744), "D65": (0.31272, 0.32903),
    "D75": (0.29903, 0.31488), "E": (1 / 3, 1 / 3), "FL1": (0.3131, 0.3371), "FL2": (0.3721, 0.3751),
    "FL3": (0.4091, 0.3941), "FL4": (0.4402, 0.4031), "FL7": (0.3129, 0.3292), "FL8": (0.3458, 0.3586),
    "FL9": (0.3741, 0.3727), "FL11": (0.3805, 0.3769), "FL12": (0.4370, 0.4042), "HP1": (0.5330, 0.4150),
    "LED-B3": (0.3756, 0.3723),
}  # fmt: skip

# Integrated from Planck's law with c2 = 1.4388e-2 m K, 360 to 830 nm by 1 nm.
BLACKBODIES = {
    1000: (0.6527252, 0.3444864), 1500: (0.5857127, 0.3931268), 2000: (0.5266768, 0.4132994),
    2500: (0.4769955, 0.4136774), 2856: (0.4475366, 0.4074303), 3000: (0.4369326, 0.4040760),
    4000: (0.3804412, 0.3767489), 5000: (0.3451026, 0.3516100), 6500: (0.3135269, 0.3236300),
    10000: (0.2806341, 0.2882889), 20000: (0.2564573, 0.2576313),
}  # fmt: skip


@pytest.mark.parametrize("name", ILLUMINANTS)
def test_illuminants_have_the_chromaticities_of_cie_15(name: str) -> None:
    found = tristimulus.chromaticity_of(tristimulus.xyz_of(illuminants.illuminant(name), MATCHING))
    np.testing.assert_allclose(found, ILLUMINANTS[name], rtol=0, atol=5e-5)


@pytest.mark.parametrize("temperature", BLACKBODIES)
def test_blackbodies_have_their_chromaticities(temperature: int) -> None:
    found = tristimulus.chromaticity_of(illuminants.blackbody(temperature) @ MATCHING)
    np.testing.assert_allclose(found, BLACKBODIES[temperature], rtol=0, atol=5e-5)


def test_the_observer_is_that_of_iso_cie_11664_1() -> None:
    rows = {450: (0.3362, 0.038, 1.77211), 555: (0.51205, 1, 0.00575), 700: (0.01135916, 0.004102, 0)}
    for nm, values in rows.items():
        np.testing.assert_allclose(MATCHING[nm - grid.FIRST], values, atol=2e-7)  # tabulated to more digits
    np.testing.assert_allclose(MATCHING.sum(axis=0), (106.8654695, 106.8569171, 106.8922513), atol=1e-6)


def test_standard_sources_have_their_tristimulus_values() -> None:
    # CIE 15, table T.3, Y = 100. The shares of the components are rounded there: worth 1 in 10 000 of the Z of D50.
    expected = {"A": (109.850, 100, 35.585), "D50": (96.422, 100, 82.521), "D65": (95.047, 100, 108.883)}
    for name, values in expected.items():
        xyz = illuminants.illuminant(name) @ MATCHING
        np.testing.assert_allclose(100 * xyz / xyz[1], values, rtol=1.2e-4)


def test_a_blackbody_follows_wien_and_is_the_same_at_any_temperature_far_out() -> None:
    # Wien's displacement law, b = 2.897771955e-3 m K (CODATA 2018): the peak of 5 000 K lies at 579.55 nm.
    spectrum = illuminants.blackbody(5000.0)
    assert grid.wavelengths()[spectrum.argmax()] == pytest.approx(2.897771955e6 / 5000, abs=0.51)
    assert np.isfinite(illuminants.blackbody(200.0)).all() and np.isfinite(illuminants.blackbody(1e6)).all()


def test_a_colour_temperature_means_a_blackbody_below_5000_k_and_daylight_above() -> None:
    # CIE 13.3: the reference source of a colour temperature.
    np.testing.assert_array_equal(illuminants.reference(4999.0), illuminants.blackbody(4999.0))
    np.testing.assert_array_equal(illuminants.reference(5000.0), illuminants.daylight(5000.0))


@pytest.mark.parametrize(("temperature", "x"), [(4000.0, 0.38234), (7000.0, 0.30536), (25000.0, 0.24985)])
def test_daylight_lies_on_the_locus_of_cie_15(temperature: float, x: float) -> None:
    # The locus as CIE 15 writes it, worked out by hand at its ends and its joint.
    found = illuminants.daylight_chromaticity(temperature)
    assert found[0] == pytest.approx(x, abs=2e-5)
    spectrum = illuminants.daylight(temperature) @ MATCHING
    # The shares of the components have rounded factors in CIE 15: the spectrum meets its chromaticity to 1.2e-4.
    np.testing.assert_allclose(tristimulus.chromaticity_of(spectrum), found, atol=1.5e-4)


def test_the_matrix_is_that_of_srgb() -> None:
    # IEC 61966-2-1, rounded there to four places.
    expected = [[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]]
    np.testing.assert_allclose(np.linalg.inv(tristimulus.xyz_to_rgb()), expected, atol=5.1e-5)


def test_the_white_is_neutral_and_the_receivers_own_white_needs_no_adaptation() -> None:
    white = illuminants.illuminant("A") @ MATCHING
    np.testing.assert_allclose(tristimulus.rgb_under(white) @ white / white[1], 1.0, atol=1e-12)
    own = tristimulus.white_xyz(*tristimulus.WHITE)
    np.testing.assert_allclose(tristimulus.rgb_under(own), tristimulus.xyz_to_rgb(), atol=1e-12)


def test_colours_outside_the_gamut_keep_their_luminance_and_lean_toward_grey() -> None:
    luminance = np.array([0.2126, 0.7152, 0.0722])
    gold = np.array([1.0375, 0.7284, 0.3646])  # published beside its n and k: its red is outside sRGB
    cyan = np.array([-0.2, 0.3, 0.5])
    for colour, ceiling in ((gold, 1.0), (cyan, np.inf)):
        found = tristimulus.into_gamut(colour, ceiling)
        assert found.min() >= 0 and found.max() <= ceiling
        assert found @ luminance == pytest.approx(colour @ luminance, abs=1e-12)
        assert np.argsort(found).tolist() == np.argsort(colour).tolist()
    inside = np.array([[0.2, 0.3, 0.4], [0.0, 1.0, 0.0]])
    np.testing.assert_array_equal(tristimulus.into_gamut(inside, 1.0), inside)
    np.testing.assert_allclose(tristimulus.into_gamut([-1.0, -1.0, -1.0]), 0.0)


def test_luminous_efficacy_gives_683_lumens_at_555_nm() -> None:
    # The candela's definition: 683 lm/W at 540 THz, 555.016 nm.
    line = np.zeros(grid.N)
    line[555 - grid.FIRST] = 1.0
    assert tristimulus.illuminance_of(line, MATCHING) == pytest.approx(683.0, abs=0.01)

"""Type: heights, widths, missing letters, signs drawn as shapes."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend.drawing import Cubics, Path
from platewright.backend.lettering.type import FaceName, Lettering


@pytest.fixture(scope="module")
def lettering() -> Lettering:
    return Lettering()


def points(paths: tuple[Path, ...]) -> np.ndarray:
    return np.concatenate([piece.points for path in paths for piece in path.pieces if hasattr(piece, "points")])


def box(paths: tuple[Path, ...]) -> tuple[float, float, float, float]:
    found = points(paths)
    return (*found.min(axis=0), *found.max(axis=0))


@pytest.mark.parametrize("face", ["sans", "sans bold"])
@pytest.mark.parametrize("letter", ["H", "E", "A", "Ж", "Ω", "N"])
def test_height_is_that_of_capitals(lettering: Lettering, face: FaceName, letter: str) -> None:
    _, top, _, bottom = box(lettering.outlines(letter, 3.5, face))
    assert -top == pytest.approx(3.5, abs=0.08)
    assert bottom == pytest.approx(0.0, abs=0.02)
    if letter in "HE":
        assert -top == pytest.approx(3.5, abs=1e-9)


def test_width_is_the_sum_of_the_letters(lettering: Lettering) -> None:
    parts = sum(lettering.width_of(each, 2.5) for each in "A – A (1:2)")
    assert lettering.width_of("A – A (1:2)", 2.5) == pytest.approx(parts)
    assert lettering.width_of("AA", 5.0) == pytest.approx(2 * lettering.width_of("AA", 2.5))


def test_a_second_letter_stands_behind_the_first(lettering: Lettering) -> None:
    one, two = box(lettering.outlines("I", 2.0)), box(lettering.outlines("II", 2.0))
    assert two[2] - one[2] == pytest.approx(lettering.width_of("I", 2.0))


def test_letters_of_three_scripts_are_there(lettering: Lettering) -> None:
    assert lettering.missing("Schnitt A–A Ø µm ° × ± Разрез Τομή «№»") == ()


@pytest.mark.parametrize("sign", ["⌀", "∠", "□", "⌒"])
def test_signs_that_the_fonts_lack_are_shapes(lettering: Lettering, sign: str) -> None:
    assert lettering.missing(sign) == ()
    left, top, right, bottom = box(lettering.outlines(sign, 10.0))
    assert left >= 0.0
    assert right <= lettering.width_of(sign, 10.0) + 0.3
    assert -10.5 <= top < bottom <= 0.5


def test_a_letter_no_font_has_is_named_once(lettering: Lettering) -> None:
    assert lettering.missing("A字B字") == ("字",)
    assert box(lettering.outlines("A字B", 1.0)) == box(lettering.outlines("AB", 1.0))


def test_curves_are_cubics(lettering: Lettering) -> None:
    assert any(isinstance(piece, Cubics) for path in lettering.outlines("O", 1.0) for piece in path.pieces)

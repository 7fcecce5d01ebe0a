"""Surfaces: from a `material` declaration to reflectances the backend understands.

Metals: linear sRGB reflectance at normal incidence under D65, integrated with the CIE 1931 observer from published
n and k; sources beside the table.
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.units import DENSITY, NUMBER

from .expressions import quantity, text
from .mistakes import Problems, mistake
from .readings import LATER, expression, name, word
from .scope import Scope
from .values import shortened

if TYPE_CHECKING:
    from .spectra import Tabled

RGB = tuple[float, float, float]


class Surface(Struct, frozen=True):
    """A material with its values fixed. `colour` is 8-bit sRGB, `reflectance` linear RGB at normal incidence.

    gloss runs from 0, matt, to 1, a mirror; density in g/cm3, 0 where none is stated. `metal` is the name of a bare
    metal; `spectrum` a measured reflectance by nm from 360 to 830, empty where there is none.
    """

    name: str
    colour: tuple[int, int, int]
    reflectance: RGB
    gloss: float
    is_metal: bool
    density: float
    metal: str = ""
    spectrum: tuple[float, ...] = ()


DIELECTRIC: RGB = (0.04, 0.04, 0.04)
"""Fresnel reflectance at normal incidence for a refractive index of 1.5: ((1.5 - 1) / (1.5 + 1))^2."""

PLAIN = Surface("", (255, 255, 255), DIELECTRIC, 0.4, False, 0.0)
"""What a part is made of when nothing is said: plain white, 40 % gloss."""


def read_material(line: tree.Line, scope: Scope, tabled: Tabled, problems: Problems) -> Surface:
    """The surface a `material` declaration describes; what is wrong in it is reported and left at its default."""
    colour: tuple[int, int, int] | None = None
    metal, spectrum = "", ()  # type: str, tuple[float, ...]
    gloss, density = PLAIN.gloss, 0.0
    for below in line.lines:
        with problems.collecting():
            match below.word:
                case "colour":
                    colour = _colour(expression(below.head, "colour"), scope)
                case "metal":
                    metal = word(below.head, "metal")
                case "reflectance" if below.head.row not in LATER:
                    from . import spectra  # loads tables and what reads them, which few scenes need

                    spectrum = spectra.tabulated(tabled(below.head), True, problems)
                case "gloss":
                    gloss = _share(expression(below.head, "gloss"), scope)
                case "density":
                    density = _density(expression(below.head, "density"), scope)
    named = name(line.head).text
    if metal or spectrum:
        owner = "metal" if metal else "reflectance"
        for below in line.lines:
            if below.word == "colour" or (metal and below.word == "reflectance"):
                sentence = f"`{owner}` gives the colour by what was measured; `{below.word}` has no effect beside it"
                problems.warn("no-effect", below.span, sentence, "leave one of the two out")
    if metal:
        return Surface(named, _encoded(METALS[metal]), METALS[metal], gloss, True, density, metal)
    if spectrum:
        colour = _encoded(spectra.daylight_colour(spectrum))
    return Surface(named, colour or PLAIN.colour, DIELECTRIC, gloss, False, density, "", spectrum)


def linear(colour: tuple[int, int, int]) -> RGB:
    """8-bit sRGB to linear RGB (IEC 61966-2-1)."""
    red, green, blue = (_decoded(value / 255) for value in colour)
    return red, green, blue


def _colour(written: tree.Expression, scope: Scope) -> tuple[int, int, int]:
    colour = text(written, scope)
    if not re.fullmatch(r"#[0-9a-fA-F]{6}", colour):
        hint = 'write it as `"#rrggbb"`, two hexadecimal digits each for red, green and blue'
        raise mistake("wrong-kind", written.span, f'expected a colour, found "{shortened(colour)}"', hint)
    red, green, blue = (int(colour[k : k + 2], 16) for k in (1, 3, 5))
    return red, green, blue


def _share(written: tree.Expression, scope: Scope) -> float:
    share = quantity(written, scope, NUMBER)
    if not 0 <= share <= 1:
        raise mistake("out-of-range", written.span, f"expected 0 % to 100 %, found {100 * share:g} %")
    return share


def _density(written: tree.Expression, scope: Scope) -> float:
    density = quantity(written, scope, DENSITY) * 1000.0  # the base unit is g/mm3
    if density <= 0:
        raise mistake("out-of-range", written.span, "a density is more than 0")
    return density


def _decoded(value: float) -> float:
    return value / 12.92 if value <= 0.04045 else ((value + 0.055) / 1.055) ** 2.4


def _encoded(colour: RGB) -> tuple[int, int, int]:
    def encode(value: float) -> int:
        value = min(max(value, 0.0), 1.0)
        coded = 12.92 * value if value <= 0.0031308 else 1.055 * value ** (1 / 2.4) - 0.055
        return int(255 * coded + 0.5)

    red, green, blue = (encode(value) for value in colour)
    return red, green, blue


METALS: dict[str, RGB] = {
    "aluminium": (0.9072, 0.9160, 0.9222),  # Rakic 1995
    "chromium": (0.5496, 0.5561, 0.5541),  # Johnson and Christy 1974
    "copper": (0.9316, 0.6228, 0.5222),  # Johnson and Christy 1972
    "copper_zinc": (0.9096, 0.7784, 0.4227),  # Querry 1985, 70 % copper and 30 % zinc
    "gold": (1.0, 0.7339, 0.4208),  # Johnson and Christy 1972; from (1.0375, 0.7284, 0.3646), outside sRGB
    "iron": (0.5296, 0.5133, 0.4941),  # Johnson and Christy 1974
    "nickel": (0.6970, 0.6406, 0.5631),  # Johnson and Christy 1974
    "silver": (0.9892, 0.9841, 0.9776),  # Johnson and Christy 1972
    "titanium": (0.6186, 0.5794, 0.5424),  # Johnson and Christy 1974
}
"""n and k from the refractiveindex.info database (CC0), under D65 from 380 to 780 nm in steps of 5 nm, white at Y = 1.

A colour outside 0 .. 1 is moved toward the grey of its luminance, so that no metal gives back more than it gets.
"""

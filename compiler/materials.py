"""Surfaces: from a `material` declaration to reflectances the backend understands.

Metals: linear sRGB reflectance at normal incidence under D65, integrated with the CIE 1931 observer from published
n and k; sources beside the table.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from platewright.lang import tree
from platewright.lang.source import Span
from platewright.lang.units import DENSITY, NUMBER

from .expressions import Scope, quantity, text
from .mistakes import Problems, mistake

RGB = tuple[float, float, float]


@dataclass(frozen=True, slots=True)
class Surface:
    """A material with its values fixed. `colour` is 8-bit sRGB, `reflectance` linear RGB at normal incidence.

    gloss runs from 0, matt, to 1, a mirror; density in g/cm3, 0 where none is stated.
    """

    name: str
    colour: tuple[int, int, int]
    reflectance: RGB
    gloss: float
    is_metal: bool
    density: float


DIELECTRIC: RGB = (0.04, 0.04, 0.04)
"""Fresnel reflectance at normal incidence for a refractive index of 1.5: ((1.5 - 1) / (1.5 + 1))^2."""

PLAIN = Surface("", (255, 255, 255), DIELECTRIC, 0.4, False, 0.0)
"""What a part is made of when nothing is said: plain white, 40 % gloss."""


def read_material(line: tree.Line, scope: Scope, problems: Problems) -> Surface:
    """The surface a `material` declaration describes; what is wrong in it is reported and left at its default."""
    name = line.head.get("name")
    assert isinstance(name, tree.Name)
    colour: tuple[int, int, int] | None = None
    metal: str | None = None
    gloss, density = PLAIN.gloss, 0.0
    said: dict[str, Span] = {}
    for below in line.lines:
        said_twice(below, said, problems)
        with problems.collecting():
            match below.word:
                case "colour":
                    colour = _colour(_expression(below, "colour"), scope)
                case "metal":
                    word = below.head.get("metal")
                    metal = word.text if isinstance(word, tree.Word) else None
                case "gloss":
                    gloss = _share(_expression(below, "gloss"), scope)
                case "density":
                    density = _density(_expression(below, "density"), scope)
    if metal is None:
        return Surface(name.text, colour or PLAIN.colour, DIELECTRIC, gloss, False, density)
    if colour is not None:
        sentence = "a metal takes its colour from its measured reflectance; `colour` has no effect beside `metal`"
        problems.warn("no-effect", said["colour"], sentence, "leave one of the two out")
    reflectance = METALS[metal]
    return Surface(name.text, _encoded(reflectance), reflectance, gloss, True, density)


def said_twice(line: tree.Line, said: dict[str, Span], problems: Problems) -> None:
    """Report a line whose word may stand once in its block and has stood before; note it otherwise."""
    if line.word in said:
        problems.error("said-twice", line.head.word_span, f"`{line.word}` stands here twice", "leave one of them out")
    said.setdefault(line.word, line.head.word_span)


def linear(colour: tuple[int, int, int]) -> RGB:
    """8-bit sRGB to linear RGB (IEC 61966-2-1)."""
    red, green, blue = (_decoded(value / 255) for value in colour)
    return red, green, blue


def _expression(line: tree.Line, slot: str) -> tree.Expression:
    value = line.head.get(slot)
    assert value is not None and not isinstance(value, (tree.Name, tree.Word, tree.Reading, tuple))
    return value


def _colour(expression: tree.Expression, scope: Scope) -> tuple[int, int, int]:
    written = text(expression, scope)
    if not re.fullmatch(r"#[0-9a-fA-F]{6}", written):
        hint = 'write it as `"#rrggbb"`, two hexadecimal digits each for red, green and blue'
        raise mistake("wrong-kind", expression.span, f'expected a colour, found "{written}"', hint)
    red, green, blue = (int(written[k : k + 2], 16) for k in (1, 3, 5))
    return red, green, blue


def _share(expression: tree.Expression, scope: Scope) -> float:
    share = quantity(expression, scope, NUMBER)
    if not 0 <= share <= 1:
        raise mistake("out-of-range", expression.span, f"expected 0 % to 100 %, found {100 * share:g} %")
    return share


def _density(expression: tree.Expression, scope: Scope) -> float:
    density = quantity(expression, scope, DENSITY) * 1000.0  # the base unit is g/mm3
    if density <= 0:
        raise mistake("out-of-range", expression.span, "a density is more than 0")
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
    "gold": (1.0375, 0.7285, 0.3645),  # Johnson and Christy 1972; red lies outside sRGB
    "iron": (0.5296, 0.5133, 0.4941),  # Johnson and Christy 1974
    "nickel": (0.6970, 0.6406, 0.5631),  # Johnson and Christy 1974
    "silver": (0.9892, 0.9841, 0.9776),  # Johnson and Christy 1972
    "titanium": (0.6186, 0.5794, 0.5424),  # Johnson and Christy 1974
}
"""n and k from the refractiveindex.info database (CC0), under D65 from 380 to 780 nm in steps of 5 nm, white at Y
= 1.
"""

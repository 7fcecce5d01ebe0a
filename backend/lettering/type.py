"""Letters as outlines: what a text looks like at a height, how wide it is, which of its letters no font has.

The height of a text is that of its capitals. Letters come from Source Sans Pro (OFL) and, where it lacks one, from
Roboto (Apache-2.0), both of which come as packages; signs of drawing practice that neither has are drawn as shapes.
"""

from __future__ import annotations

import importlib.resources
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, Literal, TypeAlias

import numpy as np

from ..contract import F64
from ..drawing import Cubics, Lines, Path, Piece
from .signs import SIGNS

if TYPE_CHECKING:
    from fontTools.ttLib import TTFont

FaceName: TypeAlias = Literal["sans", "sans bold"]

_FILES: dict[FaceName, tuple[tuple[str, str], ...]] = {
    "sans": (("font_source_sans_pro", "SourceSansPro-Regular.otf"), ("font_roboto", "Roboto-Regular.ttf")),
    "sans bold": (("font_source_sans_pro", "SourceSansPro-Semibold.otf"), ("font_roboto", "Roboto-Bold.ttf")),
}
"""The fonts of a face, the one asked first in front."""


@dataclass(frozen=True, eq=False, slots=True)
class Letter:
    """One letter for capitals of height 1: its advance, and its contours, y up from the base line.

    A contour is (kind, points): "line" (1,2), "cubic" (3,2) pieces after a start point. Filled by the nonzero rule.
    """

    advance: float
    contours: tuple[Contour, ...]


@dataclass(frozen=True, eq=False, slots=True)
class Contour:
    """A closed contour: where it starts, then runs of line ends (k,2) and cubic points (3k,2), y up."""

    start: F64
    runs: tuple[tuple[Literal["lines", "cubics"], F64], ...]


@dataclass(eq=False, slots=True)
class Lettering:
    """Reads fonts when a letter is first wanted and keeps what it has read. One serves all drawings of a process."""

    _fonts: dict[tuple[str, str], _Font] = field(default_factory=dict)
    _letters: dict[tuple[FaceName, str], Letter | None] = field(default_factory=dict)

    def width_of(self, text: str, height: float, face: FaceName = "sans") -> float:
        """Width in mm that `text` takes, with capitals `height` mm high: the sum of its advances."""
        return height * sum(letter.advance for letter in self._set(text, face))

    def missing(self, text: str, face: FaceName = "sans") -> tuple[str, ...]:
        """Letters of `text` that can not be drawn, each once, in their order."""
        return tuple(dict.fromkeys(each for each in text if self._letter(each, face) is None))

    def contours(self, text: str, height: float, face: FaceName = "sans") -> tuple[Contour, ...]:
        """Closed contours of a text in mm, y up, otherwise as `outlines`."""
        found: list[Contour] = []
        at = 0.0
        for letter in self._set(text, face):
            aside = np.array((at, 0.0))
            for each in letter.contours:
                runs = tuple((kind, points * height + aside) for kind, points in each.runs)
                found.append(Contour(each.start * height + aside, runs))
            at += letter.advance * height
        return tuple(found)

    def outlines(self, text: str, height: float, face: FaceName = "sans") -> tuple[Path, ...]:
        """Closed paths of a text in mm, y down, its base line starting at (0, 0), filled by the nonzero rule.

        Letters that can not be drawn are left out; `missing` names them. Cost: about 20 ms for a font's first letter.
        """
        found: list[Path] = []
        at = 0.0
        for letter in self._set(text, face):
            found += [_placed(contour, height, at) for contour in letter.contours]
            at += letter.advance * height
        return tuple(found)

    def _set(self, text: str, face: FaceName) -> Iterator[Letter]:
        for each in text:
            letter = self._letter(each, face)
            if letter is not None:
                yield letter

    def _letter(self, sign: str, face: FaceName) -> Letter | None:
        key = (face, sign)
        if key not in self._letters:
            self._letters[key] = self._find(sign, face)
        return self._letters[key]

    def _find(self, sign: str, face: FaceName) -> Letter | None:
        for package, file in _FILES[face]:
            font = self._fonts.get((package, file))
            if font is None:
                font = self._fonts[package, file] = _read(package, file)
            name = font.names.get(ord(sign))
            if name is not None:
                return _letter_of(font, name)
        if sign in SIGNS:
            advance, rings = SIGNS[sign]()
            return Letter(advance, tuple(Contour(ring[0], (("lines", ring[1:]),)) for ring in rings))
        return None


@dataclass(frozen=True, eq=False, slots=True)
class _Font:
    """A font read: its table of characters, its glyphs, and the size of a unit for capitals of height 1."""

    names: dict[int, str]
    glyphs: Any
    unit: float


def _read(package: str, file: str) -> _Font:
    from fontTools.pens.boundsPen import BoundsPen
    from fontTools.ttLib import TTFont

    with importlib.resources.as_file(importlib.resources.files(package) / "files" / file) as path:
        font: TTFont = TTFont(path, lazy=False)
    glyphs = font.getGlyphSet()
    # The height of a capital is measured on H: the height a font states may be rounded.
    pen = BoundsPen(glyphs)
    glyphs["H"].draw(pen)
    return _Font(font.getBestCmap(), glyphs, 1.0 / pen.bounds[3])


def _letter_of(font: _Font, name: str) -> Letter:
    from fontTools.pens.qu2cuPen import Qu2CuPen
    from fontTools.pens.recordingPen import DecomposingRecordingPen

    glyph = font.glyphs[name]
    pen = DecomposingRecordingPen(font.glyphs)
    # Cubic outlines pass through as they are; quadratic ones become cubics within a thousandth of an em.
    glyph.draw(Qu2CuPen(pen, max_err=0.001 / font.unit, all_cubic=True))
    return Letter(glyph.width * font.unit, tuple(_contours(pen.value, font.unit)))


def _contours(commands: list[tuple[str, tuple[Any, ...]]], unit: float) -> Iterator[Contour]:
    start: F64 | None = None
    runs: list[tuple[Literal["lines", "cubics"], list[F64]]] = []
    for command, points in commands:
        scaled = [np.array(point, np.float64) * unit for point in points]
        match command:
            case "moveTo":
                start, runs = scaled[0], []
            case "lineTo":
                _extend(runs, "lines", scaled)
            case "curveTo":
                _extend(runs, "cubics", scaled)
            case "closePath" | "endPath":
                if start is not None and runs:
                    yield Contour(start, tuple((kind, np.array(run)) for kind, run in runs))
                start = None


def _extend(
    runs: list[tuple[Literal["lines", "cubics"], list[F64]]], kind: Literal["lines", "cubics"], points: list[F64]
) -> None:
    if runs and runs[-1][0] == kind:
        runs[-1][1].extend(points)
    else:
        runs.append((kind, list(points)))


def _placed(contour: Contour, height: float, at: float) -> Path:
    def page(points: F64) -> F64:
        return np.stack((points[..., 0] * height + at, points[..., 1] * -height), axis=-1)

    pieces: list[Piece] = []
    for kind, points in contour.runs:
        pieces.append(Lines(page(points)) if kind == "lines" else Cubics(page(points)))
    start = page(contour.start)
    return Path((float(start[0]), float(start[1])), tuple(pieces), is_closed=True)

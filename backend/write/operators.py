"""The painting operators of a page, spelled as ISO 32000-1 has them; PDF holds them as they are, EPS defines them.

Coordinates are mm from the page's upper left corner, y down, to 1e-4 mm; who embeds the operators sets the matrix. Arcs
are cubics within 4.2e-6 of their radius, words the outlines of their letters, so that no font has to be embedded.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field
from typing import TypeAlias

from ..contract import F64
from ..drawing import Arc, Colour, Drawing, Fill, Group, Image, Lines, Mark, Path, Stroke, Words
from ..outlines import Letters, outlined, without_arcs
from .numbers import number_text
from .strokes import SPREAD, Decimals, in_units

PlaceImage: TypeAlias = Callable[[Image], str]
Wrap: TypeAlias = Callable[[str], tuple[str, str]]


@dataclass(slots=True)
class Operators:
    """Spells drawings. `place_image` gives the operators of a picture, `around_words` those before and after a text."""

    letters: Letters
    place_image: PlaceImage
    around_words: Wrap
    decimals: Decimals = field(default_factory=Decimals)

    def of(self, drawing: Drawing) -> list[str]:
        """Lines of operators that paint the whole drawing. Cost: about 5 us a number."""
        return ["4 M", *self._items(drawing.groups, False, _State())]

    def _items(self, items: Iterable[Group | Mark], is_fills: bool, state: _State) -> Iterator[str]:
        for item in items:
            if not isinstance(item, Group):
                yield from self._mark(item, is_fills, state)
            elif item.clip is None:
                yield from self._items(item.items, item.kind == "fills", state)
            else:
                yield "q"
                yield f"{self._polygon(item.clip)} W n"
                yield from self._items(item.items, item.kind == "fills", _State(state.colour, state.width, state.ends))
                yield "Q"

    def _mark(self, mark: Mark, is_fills: bool, state: _State) -> Iterator[str]:
        if isinstance(mark, Image):
            yield "q"
            yield self.place_image(mark)
            yield "Q"
            return
        if mark.colour != state.colour:
            state.colour = mark.colour
            yield _colour(mark.colour)
        match mark:
            case Stroke():
                yield from self._pen(mark.width, 1 if mark.is_round else 0, state)
                yield f"{self._path(mark.path)} S"
            case Fill():
                if is_fills:
                    yield from self._pen(SPREAD, 1, state)
                paths = "\n".join(map(self._path, mark.paths))
                yield f"{paths} {'B*' if is_fills else 'f*'}"
            case Words():
                before, after = self.around_words(mark.text)
                paths = "\n".join(map(self._path, outlined(mark, self.letters)))
                if paths:
                    yield f"{before}{paths} f{after}"

    def _pen(self, width: float, ends: int, state: _State) -> Iterator[str]:
        if width != state.width:
            state.width = width
            yield f"{self._text(width)} w"
        if ends != state.ends:
            state.ends = ends
            yield f"{ends} J {ends} j"

    def _path(self, path: Path) -> str:
        path = without_arcs(path) if any(isinstance(piece, Arc) for piece in path.pieces) else path
        parts = [f"{self._point(path.start)} m"]
        for piece in path.pieces:
            assert not isinstance(piece, Arc)
            size, operator = (2, "l") if isinstance(piece, Lines) else (6, "c")
            rows = in_units(piece.points).reshape(-1, size).tolist()
            parts += [f"{' '.join(map(self.decimals.__getitem__, row))} {operator}" for row in rows]
        return "\n".join(parts) + (" h" if path.is_closed else "")

    def _polygon(self, points: F64) -> str:
        return self._path(Path((float(points[0, 0]), float(points[0, 1])), (Lines(points[1:]),), True))

    def _point(self, point: tuple[float, float]) -> str:
        x, y = in_units(point).tolist()
        return f"{self.decimals[x]} {self.decimals[y]}"

    def _text(self, length: float) -> str:
        return self.decimals[int(in_units((length,))[0])]


@dataclass(slots=True)
class _State:
    """Colour, line width and ends as last set; what a page starts with is always set anew."""

    colour: Colour | None = None
    width: float = -1.0
    ends: int = -1


def _colour(colour: Colour) -> str:
    """Set the colour of lines and areas alike; greys as greys, so that black prints with black ink alone."""
    levels = [number_text(round(level / 255.0, 4)) for level in colour]
    if colour[0] == colour[1] == colour[2]:
        return f"{levels[0]} g {levels[0]} G"
    text = " ".join(levels)
    return f"{text} rg {text} RG"

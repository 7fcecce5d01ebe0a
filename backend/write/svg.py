"""Drawings as SVG 1.1, laid out for people who touch them up: named groups, one path a line, attributes once a group.

One user unit is one millimetre. Points are rounded to 1e-4 mm and then told relative to one another, so that errors do
not add up. Arcs stay arcs, but longer ones are told in quarters of an ellipse at most: where the ends of an arc lie
almost a half or a whole turn apart, rounding them would move its centre. Words are outlines that carry their text.
"""

from __future__ import annotations

import base64
import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field
from xml.sax.saxutils import escape, quoteattr

import numpy as np

from ..contract import F64
from ..drawing import Arc, Colour, Drawing, Fill, Group, Image, Lines, Mark, Path, Point, Stroke, Words
from ..outlines import Letters, arc_steps, end_of, outlined, standard_letters
from .png import png_bytes
from .strokes import SPREAD, Decimals, in_units, is_grey, runs

_QUARTER = np.pi / 2.0 + 1e-9
_NOT_XML = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")
_NOT_IN_ID = re.compile("[^A-Za-z0-9._-]+")


def svg_bytes(drawing: Drawing, letters: Letters | None = None) -> bytes:
    """The drawing as UTF-8 text with LF. Cost: about 5 us a number.

    Every group of the drawing is a `g` with an id made of its own and its parents' kinds and names, and the name itself
    as `data-name`; only names that come out alike get a number. Lines bear the words of their class as `class`.
    """
    writer = _Writer(letters or standard_letters())
    width, height = (writer.text(side) for side in (drawing.width, drawing.height))
    name = drawing.alt or drawing.title
    attributes = [
        'xmlns="http://www.w3.org/2000/svg"',
        *(['xmlns:xlink="http://www.w3.org/1999/xlink"'] if _has_image(drawing.groups) else []),
        'version="1.1"',
        f'width="{width}mm" height="{height}mm" viewBox="0 0 {width} {height}"',
        'role="img"',
        *([f"aria-label={_quoted(name)}"] if name else []),
        *(['aria-describedby="desc"'] if drawing.description else []),
        *([f"xml:lang={_quoted(drawing.language)}"] if drawing.language else []),
    ]
    lines = [
        '<?xml version="1.0" encoding="UTF-8"?>',
        f"<svg {' '.join(attributes)}>",
        *([f'<title id="title">{_escaped(drawing.title)}</title>'] if drawing.title else []),
        *([f'<desc id="desc">{_escaped(drawing.description)}</desc>'] if drawing.description else []),
        *writer.items(drawing.groups, ""),
        "</svg>\n",
    ]
    return "\n".join(lines).encode()


@dataclass(slots=True)
class _Writer:
    """What is kept while one file is written: spelled lengths, and the ids already given."""

    letters: Letters
    decimals: Decimals = field(default_factory=Decimals)
    ids: set[str] = field(default_factory=lambda: {"title", "desc"})

    def text(self, length: float) -> str:
        return self.decimals[int(in_units((length,))[0])]

    def items(self, items: Iterable[Group | Mark], parent: str, is_fills: bool = False) -> Iterator[str]:
        """Lines of markup for marks and groups in order; marks that share their attributes share a `g`."""
        for _, run in runs(items):
            first = run[0]
            if isinstance(first, Group):
                yield from self._group(first, parent)
                continue
            marks = [mark for mark in run if not isinstance(mark, Group)]
            attributes = self._attributes(first, is_fills)
            if len(marks) == 1:
                yield self._mark(marks[0], attributes + " " if attributes else "")
            else:
                yield f"<g {attributes}>"
                yield from map(self._mark, marks)
                yield "</g>"

    def _group(self, group: Group, parent: str) -> Iterator[str]:
        identity = self._identity(group, parent)
        head = f'g id="{identity}"' + (f" data-name={_quoted(group.name)}" if group.name else "")
        if group.clip is not None:
            clip = Path((float(group.clip[0, 0]), float(group.clip[0, 1])), (Lines(group.clip[1:]),), True)
            clip_identity = self._unique(f"{identity}_clip")
            yield f'<clipPath id="{clip_identity}"><path d="{self._data(clip)}"/></clipPath>'
            head += f' clip-path="url(#{clip_identity})"'
        found = list(runs(group.items))
        marks = [mark for mark in group.items if not isinstance(mark, Group)]
        if len(found) == 1 and marks and (attributes := self._attributes(marks[0], group.kind == "fills")):
            yield f"<{head} {attributes}>"
            yield from map(self._mark, marks)
        else:
            yield f"<{head}>"
            yield from self.items(group.items, identity, group.kind == "fills")
        yield "</g>"

    def _identity(self, group: Group, parent: str) -> str:
        own = f"{group.kind}.{group.name}" if group.name else group.kind
        return self._unique(_NOT_IN_ID.sub("-", f"{parent}_{own}" if parent else own).strip("-"))

    def _unique(self, base: str) -> str:
        identity, number = base, 1
        while identity in self.ids:
            number += 1
            identity = f"{base}-{number}"
        self.ids.add(identity)
        return identity

    def _attributes(self, mark: Mark, is_fills: bool) -> str:
        match mark:
            case Stroke():
                ends = ' stroke-linecap="round" stroke-linejoin="round"' if mark.is_round else ""
                return (
                    f'class="{mark.line_class.value}" fill="none" stroke="{_colour(mark.colour)}"'
                    f' stroke-width="{self.text(mark.width)}"{ends}'
                )
            case Fill() if is_fills:
                colour = _colour(mark.colour)
                return (
                    f'fill="{colour}" fill-rule="evenodd" stroke="{colour}" stroke-width="{self.text(SPREAD)}"'
                    ' stroke-linejoin="round"'
                )
            case Fill():
                return f'fill="{_colour(mark.colour)}" fill-rule="evenodd"'
            case Words():
                return f'fill="{_colour(mark.colour)}"'
        return ""

    def _mark(self, mark: Mark, attributes: str = "") -> str:
        match mark:
            case Stroke():
                return f'<path {attributes}d="{self._data(mark.path)}"/>'
            case Fill():
                return f'<path {attributes}d="{"".join(map(self._data, mark.paths))}"/>'
            case Words():
                data = "".join(map(self._data, outlined(mark, self.letters)))
                return f'<path {attributes}role="text" aria-label={_quoted(mark.text)} d="{data}"/>'
        return self._image(mark)

    def _image(self, image: Image) -> str:
        left, top, width, height = map(self.text, image.place)
        pixels = image.pixels
        png = png_bytes(pixels[:, :, 0] if is_grey(pixels) else pixels, pixels.shape[1] * 25.4 / image.place[2])
        return (
            f'<image x="{left}" y="{top}" width="{width}" height="{height}" preserveAspectRatio="none"'
            f' xlink:href="data:image/png;base64,{base64.b64encode(png).decode()}"/>'
        )

    def _data(self, path: Path) -> str:
        """Path data: one absolute point, the rest relative to the point before, as rounded."""
        x, y = in_units(path.start).tolist()
        parts = [f"M{self._numbers((x, y))}"]
        at = path.start
        for piece in path.pieces:
            if isinstance(piece, Arc):
                text, x, y = self._arcs(at, piece, x, y)
            elif isinstance(piece, Lines):
                text, x, y = self._lines(piece.points, x, y)
            else:
                text, x, y = self._cubics(piece.points, x, y)
            parts.append(text)
            at = end_of(piece)
        return "".join(parts) + ("z" if path.is_closed else "")

    def _lines(self, points: F64, x: int, y: int) -> tuple[str, int, int]:
        parts, last = [], ""
        for to_x, to_y in in_units(points).tolist():
            dx, dy = to_x - x, to_y - y
            command, numbers = ("h", (dx,)) if dy == 0 else ("v", (dy,)) if dx == 0 else ("l", (dx, dy))
            text = self._numbers(numbers)
            parts.append((command if command != last else "" if text.startswith("-") else " ") + text)
            x, y, last = to_x, to_y, command
        return "".join(parts), x, y

    def _cubics(self, points: F64, x: int, y: int) -> tuple[str, int, int]:
        numbers: list[int] = []
        for x1, y1, x2, y2, x3, y3 in in_units(points).reshape(-1, 6).tolist():
            numbers += (x1 - x, y1 - y, x2 - x, y2 - y, x3 - x, y3 - y)
            x, y = x3, y3
        return "c" + self._numbers(numbers), x, y

    def _arcs(self, at: Point, arc: Arc, x: int, y: int) -> tuple[str, int, int]:
        steps = arc_steps(at, arc, _QUARTER)
        if steps is None:
            return self._lines(np.array((arc.end,)), x, y)
        points = steps.points
        points[-1] = arc.end
        axes = np.sqrt(steps.frame[0] * steps.frame[0] + steps.frame[1] * steps.frame[1])
        head = f"a{self._numbers(in_units(axes).tolist())} {self.text(arc.turn)} 0 {int(arc.is_clockwise)} "
        parts = []
        for to_x, to_y in in_units(points[1:]).tolist():
            parts.append(head + self._numbers((to_x - x, to_y - y)))
            x, y = to_x, to_y
        return "".join(parts), x, y

    def _numbers(self, units: Iterable[int]) -> str:
        return " ".join(map(self.decimals.__getitem__, units)).replace(" -", "-")


def _has_image(items: Iterable[Group | Mark]) -> bool:
    return any(_has_image(item.items) if isinstance(item, Group) else isinstance(item, Image) for item in items)


def _colour(colour: Colour) -> str:
    text = "".join(f"{level:02x}" for level in colour)
    return "#" + (text[::2] if text[::2] == text[1::2] else text)


def _escaped(text: str) -> str:
    return escape(_NOT_XML.sub("\ufffd", text))


def _quoted(text: str) -> str:
    return quoteattr(_NOT_XML.sub("\ufffd", text))

"""What vector writers share: lengths to a ten-thousandth of a millimetre, runs of marks alike, the spread of fills."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from itertools import groupby

import numpy as np
from numpy.typing import NDArray

from ..contract import F64, U8
from ..drawing import Fill, Group, Image, Mark, Stroke, Words
from .numbers import number_text

I64 = NDArray[np.int64]

UNIT = 1e-4
"""Millimetres of the last decimal that files state."""

SPREAD = 0.05
"""Width in mm of the line in its own colour that every area of a group of fills gets.

Viewers paint the two halves of a pixel one after the other, so that paper shines through between areas that abut. A
neighbour that reaches half of this over covers it, as printers let inks overlap ("trapping"); lines of the drawing
are wider and lie above. Our own converter needs none.
"""


class Decimals(dict[int, str]):
    """Whole units to the shortest text in millimetres, without a leading zero; one serves one file."""

    def __missing__(self, units: int) -> str:
        text = number_text(units * 1e4 / 1e8)
        if text.startswith("0."):
            text = text[1:]
        elif text.startswith("-0."):
            text = "-" + text[2:]
        self[units] = text
        return text


def in_units(points: F64 | Sequence[float]) -> I64:
    """Millimetres, any shape, to whole units, halves to even."""
    return np.rint(np.asarray(points, np.float64) / UNIT).astype(np.int64)


def is_grey(pixels: U8) -> bool:
    """Whether the three channels of (rows, columns, 3) are equal."""
    return bool((pixels[:, :, :1] == pixels[:, :, 1:]).all())


def runs(items: Iterable[Group | Mark]) -> Iterator[tuple[tuple[object, ...], list[Group | Mark]]]:
    """Neighbours that share all attributes, and what they share; a group, words and a picture stand alone."""
    for (_, key), found in groupby(enumerate(items), lambda numbered: _style(*numbered)):
        yield key, [item for _, item in found]


def _style(place: int, item: Group | Mark) -> tuple[int, tuple[object, ...]]:
    match item:
        case Stroke():
            return -1, ("stroke", item.colour, item.width, item.is_round, item.line_class.value)
        case Fill():
            return -1, ("fill", item.colour)
        case Words():
            return -1, ("words", item.colour)
        case Image():
            return place, ("image",)
    return place, ("group",)

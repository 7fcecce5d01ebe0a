"""Scene texts for the tests of the language: a broad sample, and a frame round an example of each row."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from msgspec import Struct
from platewright.lang.row import Row
from platewright.lang.source import Span
from platewright.lang.tree import Reading
from platewright.lang.words import ROWS

SAMPLE = """\
platewright 1

see "fasteners.plate" as fasteners

given
    ## inside diameter of the rim
    rim = 203 mm range 100 mm .. 400 mm
    tilt = 12 deg range 0 deg .. 25 deg
    opened = no
    form = "round" one of "round", "square"

derived
    throat = rim / 10
    pitch(d) = 0.2 * d
    wall = 2 mm if rim < 150 mm else 3 mm

material brass
    metal copper_zinc
    gloss 60 %
    density 8.5 g/cm3

## radius, height
outline shell
    from (rim/2, 120 mm)
    to (rim/2 + 14 mm, 120 mm)
    round to (throat/2, 0) radius 1 mm left
    hole
        circle diameter 2 mm at (rim/2 + 7 mm, 60 mm)

part funnel(extra = 4 mm)
    made of brass
    derived
        half = (rim + extra) / 2
    add revolve shell
    cut cylinder diameter 4.5 mm length 4 mm at (half + 8 mm, 0, 116 mm) ring 4 as screw_hole
    cut
        block (1 inch, 1/2 inch, 3 mm)
        sphere diameter 4 mm at (-rim/2, 0, 1e1 mm)
            turn -30 deg about x
            facing (1, 0, 1)
    mark rim_left at (-rim/2, 0, 120 mm) along z

assembly gauge
    place funnel(extra = 2 mm) at (0, 0, 180 mm) explodes 120 mm
    place funnel as spare at (300 mm, 0, 0) when not opened and tilt is not 0
    place fasteners.screw(d = 4 mm) as screws for i from 1 to 6 at (i * 20 mm, 0, 0)

figure overview
    show gauge from front
    with opened = yes, rim = 160 mm
    width 84 mm at most 60 mm
    drawn as survey part
    files png, tiff
    alt "A gauge of {rim}; \\"open\\"."
    description
        "The funnel stands on its housing."
        "Four screws hold it."

variants sizes
    rg160 rim = 160 mm
    rg203

expect gauge
    distance(funnel.rim_left, spare.screw_hole[2].centre) = rim within 0.1 mm
    visible(funnel, overview) >= 20 %
"""

_FRAMES = {
    "scene": "{}",
    "given": "given\n    {}",
    "derived": "derived\n    {}",
    "material": "material a\n    {}",
    "outline": "outline a\n    {}",
    "hole": "outline a\n    hole\n        {}",
    "path": "path a\n    {}",
    "part": "part a\n    {}",
    "group": "part a\n    add\n        {}",
    "shape": "part a\n    add {}",
    "assembly": "assembly a\n    {}",
    "placing": "part a\n    add sphere diameter 1 mm {}",
    "repeating": "part a\n    add sphere diameter 1 mm {}",
    "feature": "part a\n    add sphere diameter 1 mm {}",
    "edges": "part a\n    add sphere diameter 1 mm {}",
    "corner": "outline a\n    to (0, 0) {}",
    "placed": "assembly a\n    place b {}",
    "lighting": "lighting a\n    {}",
    "viewpoint": "viewpoint a\n    {}",
    "figure": "figure a\n    {}",
    "sequence": "sequence a\n    {}",
    "step": "sequence a\n    step b\n        {}",
    "variants": "variants a\n    {}",
    "wording": "wording a\n    {}",
    "texts": "wording a\n    language en\n        {}",
    "receiver": "receiver a\n    {}",
    "expect": "expect a\n    {}",
}


def framed(row: Row, context: str) -> str:
    """A scene in which the row's example stands in one of its contexts."""
    text = _FRAMES[context].format(row.example) + "\n"
    if row.key == "envelope of":
        text += "        sphere diameter 1 mm\n        sphere diameter 1 mm at (9 mm, 0, 0)\n"
    return text


def framed_rows() -> list[tuple[Row, str]]:
    """Every row in every context in which it may stand."""
    return [(row, context) for row in ROWS for context in row.stands]


def readings(node: Any) -> Iterator[Reading]:
    """All readings in a tree."""
    if isinstance(node, Reading):
        yield node
    if isinstance(node, tuple):
        for part in node:
            yield from readings(part)
    elif isinstance(node, Struct):
        for field in node.__struct_fields__:
            yield from readings(getattr(node, field))


def without_places(node: Any) -> Any:
    """A tree as nested tuples, without its spans."""
    if isinstance(node, tuple):
        return tuple(without_places(part) for part in node)
    if isinstance(node, Struct):
        kept = [getattr(node, field) for field in node.__struct_fields__]
        return (type(node).__name__, *(without_places(part) for part in kept if not isinstance(part, Span)))
    return node

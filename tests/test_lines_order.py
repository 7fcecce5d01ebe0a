"""Line art does not depend on the order in which things are declared."""

from __future__ import annotations

import itertools

from platewright.backend import sheet
from support.scenes import planned

PLACED = (
    "    place arm\n",
    "    place knob at (0, 0, 50 mm)\n",
    "    place cross at (0, 0, 20 mm)\n",
)
PARTS = (
    "part arm\n    add block (40 mm, 20 mm, 90 mm)\n",
    "part knob\n    add cylinder diameter 26 mm length 70 mm centred turn 90 deg about x\n",
    "part cross\n    add cylinder diameter 18 mm length 80 mm centred turn 90 deg about y\n",
)


def drawn(order: tuple[int, ...]) -> bytes:
    parts, placed = ("".join(rows[k] for k in order) for rows in (PARTS, PLACED))
    job = planned(parts + "assembly one\n" + placed + "figure f\n    show one\n", "f")
    return sheet.encode(sheet.draw(job, ("svg",)), job, "svg")


def test_parts_that_penetrate_give_the_same_bytes_in_any_order() -> None:
    first, *others = (drawn(order) for order in itertools.permutations(range(3)))
    assert b"visible-edge" in first
    assert all(other == first for other in others)

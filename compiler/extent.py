"""How far a thing reaches before anything is meshed: the corners of the boxes of its solids."""

from __future__ import annotations

import numpy as np
from platewright.backend.contract import F64, I32

from .flatten import walked
from .graph import Solid, Thing
from .mistakes import mistake
from .solids.bounds import bounds


def box_corners(thing: Thing, name: str) -> tuple[F64, I32]:
    """World corners (8n,3) of the boxes of all solids below a thing, and the row of the walked entry of each.

    Raises Mistake if there is no solid.
    """
    rows: dict[int, tuple[Solid, list[int]]] = {}
    entries, placements = walked(thing, name)
    for row, entry in enumerate(entries):
        if isinstance(entry.thing, Solid):
            rows.setdefault(id(entry.thing), (entry.thing, []))[1].append(row)
    if not rows:
        raise mistake("nothing-to-show", thing.span, f"`{name}` holds no parts, so there is nothing to show")
    corners: list[F64] = []
    owners: list[int] = []
    for solid, copies in rows.values():
        (x0, y0, z0), (x1, y1, z1) = bounds(solid.recipe)
        box = np.array([(x, y, z) for x in (x0, x1) for y in (y0, y1) for z in (z0, z1)])
        placed = placements[copies]
        corners.append((box @ placed[:, :3, :3].transpose(0, 2, 1) + placed[:, None, :3, 3]).reshape(-1, 3))
        owners += copies
    return np.concatenate(corners), np.repeat(np.array(owners, np.int32), 8)

"""What stands past the content of a view on paper, found once the scale is known: centre lines, reference arrows."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from platewright.backend.contract import F64, Geometry, PatchKind, Projection, ViewArrow

from .frames import content

Around = tuple[float, float, float, float]
"""Paper in mm on the left, above, on the right and below."""

Extent = tuple[tuple[float, float], tuple[float, float]]
"""Least and greatest coordinates on the page."""

NONE: Around = (0.0, 0.0, 0.0, 0.0)

CENTRE_PAST_MM = 2.0
"""How far centre lines run past the outline."""

ARROW_LONG, ARROW_LETTER = 3.0, 1.5
"""Length of a reference arrow, and the room of its letter, over the height of letters."""

_ROUND = (PatchKind.CYLINDER, PatchKind.CONE, PatchKind.SPHERE, PatchKind.TORUS)


def round_extent(geometry: Geometry, vertices: F64, projection: Projection) -> Extent | None:
    """Page box of all round surfaces, world vertices (n,3); None where there are none. Cost: a pass over triangles."""
    is_round = np.isin(geometry.patches.kind[geometry.face_patch], _ROUND)
    if not is_round.any():
        return None
    is_on_one = np.zeros(len(vertices), np.bool_)
    is_on_one[geometry.faces[is_round]] = True
    low, high, _ = content(projection, vertices[is_on_one])
    return low, high


def past_centre_lines(extent: Extent, of_round: Extent, scale: float) -> Around:
    """How far the centre lines of round surfaces reach past a view's content, both boxes at a scale of 1."""
    (low, high), (round_low, round_high) = extent, of_round
    gaps = (round_low[0] - low[0], round_low[1] - low[1], high[0] - round_high[0], high[1] - round_high[1])
    left, above, right, below = (max(0.0, CENTRE_PAST_MM - scale * gap) for gap in gaps)
    return (left, above, right, below)


def past_arrows(arrows: Sequence[ViewArrow], extent: Extent, projection: Projection, height: float) -> Around:
    """How far reference arrows and their letters, `height` mm high, reach past a content's box on the page."""
    low, high = extent
    matrix = projection.world_to_page
    found = list(NONE)
    for arrow in arrows:
        along = matrix[:2, :3] @ np.array(arrow.sight)
        tip = matrix[:2, :3] @ np.array(arrow.tip) + matrix[:2, 3]
        tail = tip - along / np.sqrt(float(along @ along)) * ARROW_LONG * height
        room = ARROW_LETTER * height
        for k in (0, 1):
            least, most = min(float(tip[k]), float(tail[k]) - room), max(float(tip[k]), float(tail[k]) + room)
            found[k], found[k + 2] = max(found[k], low[k] - least), max(found[k + 2], most - high[k])
    return (found[0], found[1], found[2], found[3])


def larger(one: Around, other: Around) -> Around:
    """The larger of two on each side."""
    return (max(one[0], other[0]), max(one[1], other[1]), max(one[2], other[2]), max(one[3], other[3]))

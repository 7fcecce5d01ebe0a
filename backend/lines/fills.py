"""Flat fills of parts: white under lines, tints in the colour declared.

Neighbours share the very points of their border, and every border has a line on it; all the same each fill reaches a
hair under that line, so that no renderer shows a seam where the line is left out or broken.
"""

from __future__ import annotations

from collections.abc import Sequence

from ..contract import F64, U8, DrawnAs, Emphasis, Material, Node, Style
from ..drawing import WHITE, Colour, Fill, Group, Lines, Path
from .model import Region
from .regions import Rings, parts_of, polygon_of, rings_of

ACCENT: Colour = (120, 190, 240)
"""Fill of what is highlighted: a light blue, apart from white, greys and the colours of metals for every kind of colour
vision, a fifth darker than white in grey, with a contrast of 10:1 under black lines."""
HAIR_MM = 0.02
"""How far a fill reaches beyond its border, well under half a narrow line."""
_MITRE = 2.0
_FILLED: tuple[DrawnAs, ...] = ("lines", "tints", "stipple")


def fills_of(
    regions: Sequence[Region],
    nodes: Sequence[Node],
    materials: Sequence[Material],
    style: Style,
    emphasis: U8 | None = None,
) -> tuple[Group, ...]:
    """Return one group of fills for each part seen, named by its path; none where a tone image lies below the lines.

    `emphasis` (n_nodes,) uint8. Parts drawn as ghosts have no fill. Cost: one offset of each outline.
    """
    if style.drawn_as not in _FILLED:
        return ()
    groups: dict[str, list[Fill]] = {}
    for region in parts_of(regions):
        node = nodes[region.node]
        stress = Emphasis.PLAIN if emphasis is None else Emphasis(int(emphasis[region.node]))
        colour = colour_of(materials[node.material], style.drawn_as == "tints", stress)
        if colour is not None:
            paths = tuple(outline_path(ring) for rings in _widened(region) for ring in rings)
            groups.setdefault(node.path, []).append(Fill(paths, colour))
    return tuple(Group("part", path, tuple(fills)) for path, fills in groups.items())


def colour_of(material: Material, is_tint: bool, emphasis: Emphasis) -> Colour | None:
    """Return the colour a part is filled with, None for a ghost.

    A tint is the material's flat colour, exactly; muted, two thirds of the way from it to white.
    """
    if emphasis in (Emphasis.GHOST, Emphasis.HIDE):
        return None
    if emphasis == Emphasis.HIGHLIGHT:
        return ACCENT
    if not is_tint:
        return WHITE
    red, green, blue = material.flat
    if emphasis == Emphasis.MUTE:
        return _paler(red), _paler(green), _paler(blue)
    return red, green, blue


def outline_path(ring: F64) -> Path:
    """Return a ring (k,2) as a closed path."""
    return Path((float(ring[0, 0]), float(ring[0, 1])), (Lines(ring[1:]),), is_closed=True)


def _paler(level: int) -> int:
    return level + (255 - level) * 2 // 3


def _widened(region: Region) -> list[Rings]:
    import shapely

    wide = shapely.buffer(polygon_of(region), HAIR_MM, join_style="mitre", mitre_limit=_MITRE)
    return [rings_of(polygon) for polygon in shapely.get_parts(wide)]

"""How much of a part a panel shows, in mm² on paper, whatever the picture's own resolution."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from ..contract import Emphasis, Geometry, Measure, Page, Panel
from .picture import Visibility, see

RESOLUTION = 300.0  # dots per inch, 4 samples each: a sample stands for 0.0018 mm²


def measure(
    geometry: Geometry, panel: Panel, row: int, page: Page, nodes: Iterable[int], threads: int | None = None
) -> tuple[Measure, ...]:
    """Measure each of `nodes` with all below it in `panel`, which is row `row` of the sheet.

    Sampled at `RESOLUTION`, so areas are whole numbers of samples and boxes are true to 0.05 mm. Hidden nodes count as
    absent. Cost: one drawing of the panel and one of each node alone.
    """
    coarse = Page(page.width, page.height, RESOLUTION)
    fine = replace(panel, style=replace(panel.style, samples=4))
    wanted = tuple(nodes)
    if not wanted:
        return ()
    seen = see(geometry, fine, coarse, threads)
    return tuple(_measure(geometry, fine, row, coarse, node, seen, threads) for node in wanted)


def _measure(
    geometry: Geometry, panel: Panel, row: int, page: Page, node: int, seen: Visibility, threads: int | None
) -> Measure:
    inside = below(geometry, node)
    is_shown = np.append(inside[geometry.face_node], False)
    shown = is_shown[seen.face]
    hidden = np.zeros(len(inside), np.uint8) if panel.emphasis is None else panel.emphasis
    alone = np.where(inside, hidden, np.uint8(Emphasis.HIDE)).astype(np.uint8)
    whole = see(geometry, replace(panel, emphasis=alone), page, threads)
    sample = (25.4 / page.resolution) ** 2 / 4.0
    visible, unoccluded = int(shown.sum()) * sample, int((whole.face >= 0).sum()) * sample
    return Measure(row, node, visible, unoccluded, _box(seen, shown))


def below(geometry: Geometry, node: int) -> NDArray[np.bool_]:
    """Mark `node` and all nodes below it: (n_nodes,) bool."""
    inside = np.zeros(len(geometry.nodes), bool)
    inside[node] = True
    for row in range(node + 1, len(inside)):
        parent = geometry.nodes[row].parent
        inside[row] = parent >= 0 and inside[parent]
    return inside


def _box(seen: Visibility, shown: NDArray[np.bool_]) -> tuple[float, float, float, float] | None:
    pixels: NDArray[np.bool_] = np.any(shown, axis=2)
    columns, rows = np.flatnonzero(np.any(pixels, axis=0)), np.flatnonzero(np.any(pixels, axis=1))
    if not len(columns):
        return None
    mm = 1.0 / seen.window.pixels_per_mm
    left, right = (seen.window.left + int(columns[0])) * mm, (seen.window.left + int(columns[-1]) + 1) * mm
    top, bottom = (seen.window.top + int(rows[0])) * mm, (seen.window.top + int(rows[-1]) + 1) * mm
    return left, top, right, bottom

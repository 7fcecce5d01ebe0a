"""Outlines and the rims they end on: no gap between them, whichever way the triangles lie."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from platewright.backend import contract
from platewright.backend.lines.panel import see
from support.scenes import planned

CAN = """part can
    add cylinder diameter 60 mm length 40 mm
    cut cylinder diameter 50 mm length 36 mm at (0, 0, 4 mm)

part cap
    add cone diameter 40 mm top 20 mm length 30 mm

viewpoint v
    {view}

figure f
    show {part} from v
    scale 1:1
"""
NEAR_MM = 0.02
"""What the curves of a drawing may be off by."""


def widest_gap(job: contract.Job) -> float:
    """How far an end of what is drawn lies from everything else that is drawn, mm."""
    panel = job.sheet.panels[0]
    seen = see(job.geometries[0], panel, job.sheet.page, 1)
    rows = np.flatnonzero(seen.pieces.is_visible & seen.candidates.is_drawn[seen.pieces.segment])
    ends = np.stack((seen.pieces.start[rows, :2], seen.pieces.end[rows, :2]), axis=1)
    lines = shapely.linestrings(ends)
    widest = 0.0
    for slot in range(2):
        for row, point in enumerate(shapely.points(ends[:, slot])):
            widest = max(widest, float(np.delete(shapely.distance(lines, point), row).min()))
    return widest


@pytest.mark.parametrize("part", ["can", "cap"])
@pytest.mark.parametrize(
    "view",
    [
        "isometric from front right above",
        "isometric from front left below",
        "trimetric from front right above turned 16.8 deg raised 66.5 deg",
        "trimetric from front right above turned 59.7 deg raised 64 deg",
        "trimetric from front right above turned 10 deg raised 30 deg",
        "eye (200 mm, -300 mm, 150 mm) toward (0, 0, 20 mm)",
    ],
)
def test_outlines_meet_the_rims_they_end_on(view: str, part: str) -> None:
    assert widest_gap(planned(CAN.format(view=view, part=part), "f")) < NEAR_MM

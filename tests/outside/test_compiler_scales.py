"""Scales and views of figures against ISO 5455 (scales) and ISO 5456-3 (axonometric representations)."""

from __future__ import annotations

import math

import numpy as np
import pytest
from platewright.backend import camera
from platewright.compiler.frames import STANDARD_SCALES
from support.scenes import planned

BOX = "part box\n    add block (100 mm, 100 mm, 100 mm)\n"


def test_recommended_scales() -> None:
    """ISO 5455:1979, 5.1: enlargement 50:1 20:1 10:1 5:1 2:1, full size 1:1, reduction 1:2 1:5 1:10 ... 1:10000."""
    enlargements = [50, 20, 10, 5, 2, 1]
    reductions = [2, 5, 10, 20, 50, 100, 200, 500, 1000, 2000, 5000, 10000]
    within = [scale for scale in STANDARD_SCALES if 1e-4 - 1e-12 <= scale <= 50]
    assert within == pytest.approx([float(each) for each in enlargements] + [1 / each for each in reductions])


@pytest.mark.parametrize(("true", "length"), [("", 50.0), ("    true projection\n", 50.0 * math.sqrt(2 / 3))])
def test_isometric_axes_stand_at_120_degrees_and_are_equally_long(true: str, length: float) -> None:
    """ISO 5456-3:1996, isometric axonometry: the lines of the three axes stand at 120 degrees to each other, z upright,
    and are equally foreshortened, in the true projection by the root of 2/3."""
    job = planned(BOX + f"figure f\n    show box from isometric\n    scale 1:2\n{true}", "f")
    points, _ = camera.to_page(job.sheet.panels[0].projection, np.vstack((np.zeros(3), 100 * np.eye(3))))
    axes = points[1:] - points[0]
    assert np.linalg.norm(axes, axis=1) == pytest.approx([length] * 3, abs=1e-9)
    turned = np.degrees(np.arctan2(-axes[:, 1], axes[:, 0]))
    assert turned[2] == pytest.approx(90, abs=1e-9)
    assert sorted(turned % 180) == pytest.approx([30, 90, 150], abs=1e-9)

"""Lines of penetration, and outlines, beside a yardstick: `python tests/bench/bench_penetrations.py [scene ...]`.

The yardstick is the time embreex takes to build a scene of the same triangles. All sides take turns, medians of five
are compared. In the turned scenes the boxes of parts that only touch overlap, so that their triangles are looked at;
the smooth bodies penetrate each other deeply. Scenes are 100 mm large on paper.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np
from platewright.backend.contract import Geometry
from platewright.backend.lines.contours import contours_of
from platewright.backend.lines.penetrations import penetrations_of
from platewright.backend.lines.view import see_view

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
from embree import timed, yardstick
from support.line_scenes import (
    PAGE,
    VIEWS,
    fitted,
    line_panel,
    mechanical,
    moved,
    placed_at,
    scene,
    smooth,
    turned_about,
)

ROUNDS = 5
TURN = turned_about((1.0, 2.0, 3.0), 25.0)


def crossing_bodies(n_triangles: int) -> Geometry:
    """Two smooth bodies, half a diameter apart."""
    body = smooth(n_triangles // 2).meshes[0]
    return scene([("one", body, placed_at(0.0, 0.0, 0.0)), ("other", body, placed_at(50.0, 10.0, 5.0))])


SCENES: dict[str, Callable[[], Geometry]] = {
    "mechanical 20k": lambda: mechanical(),
    "mechanical 250k": lambda: mechanical(3, 4),
    "mechanical 250k turned": lambda: moved(mechanical(3, 4), TURN),
    "mechanical 1M": lambda: mechanical(7, 7),
    "mechanical 1M turned": lambda: moved(mechanical(7, 7), TURN),
    "crossing bodies 250k": lambda: crossing_bodies(250_000),
    "smooth 1M": lambda: smooth(1_000_000),
}
MUST = 0.3  # seconds for lines of penetration, 250 k triangles with touching parts


def measure(geometry: Geometry) -> tuple[dict[str, float], dict[str, int]]:
    """Median seconds, and segments found."""
    view = see_view(geometry, line_panel(fitted(geometry, VIEWS["isometric"])), PAGE)
    times: dict[str, list[float]] = {"penetrations": [], "outlines": [], "embreex": []}
    counts = {}
    for _ in range(ROUNDS):
        for name, stage in (("penetrations", penetrations_of), ("outlines", contours_of)):
            found, seconds = timed(lambda seen=view, work=stage: work(seen))
            times[name].append(seconds)
            counts[name] = len(found)
        times["embreex"].append(yardstick(geometry))
    return {name: float(np.median(each)) for name, each in times.items()}, counts


def main() -> None:
    measure(mechanical())
    print(f"{'scene':24} {'triangles':>9} | penetrations: lines   ms  ratio (must ms) | outlines: lines   ms  ratio")
    for name in sys.argv[1:] or SCENES:
        geometry = SCENES[name]()
        seconds, counts = measure(geometry)
        row = f"{name:24} {len(geometry.faces):9} |"
        for stage in ("penetrations", "outlines"):
            ratio = seconds[stage] / seconds["embreex"]
            must = f" ({1e3 * MUST:.0f})" if stage == "penetrations" and "250k" in name else ""
            row += f" {counts[stage]:12} {1e3 * seconds[stage]:7.1f} {ratio:6.2f}{must} |"
        print(f"{row} embreex {1e3 * seconds['embreex']:.1f} ms", flush=True)


if __name__ == "__main__":
    main()

"""Times of line drawings beside a yardstick from the same run: `python tests/bench/bench_lines.py [scene ...]`.

The yardstick is the time embreex takes to build a scene of the same triangles. Ours and the yardstick alternate, and
medians of five are compared. The total is that of one view: edges, tree of occluders, cutting, chains; topology (once a
geometry) and the mapping to the page have columns of their own. Scenes are 100 mm large on paper, isometric.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np
from platewright.backend.contract import Geometry, Style
from platewright.backend.lines.edges import edges_of
from platewright.backend.lines.joining import chains_of
from platewright.backend.lines.occluders import occluders_of
from platewright.backend.lines.topology import topology_of
from platewright.backend.lines.view import see_view
from platewright.backend.lines.visibility import cut

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
from embree import timed, yardstick
from support.line_scenes import PAGE, VIEWS, fitted, line_panel, mechanical, smooth, tiny_in_huge

ROUNDS = 5
SCENES: dict[str, Callable[[], Geometry]] = {
    "mechanical 20k": lambda: mechanical(),
    "mechanical 250k": lambda: mechanical(3, 4),
    "mechanical 1M": lambda: mechanical(7, 7),
    "smooth 20k": lambda: smooth(20_000),
    "smooth 250k": lambda: smooth(250_000),
    "smooth 1M": lambda: smooth(1_000_000),
    "tiny in huge 250k": lambda: tiny_in_huge(),
}
MUST = {"mechanical 250k": 0.15, "mechanical 1M": 0.6, "smooth 250k": 0.15, "smooth 1M": 0.6}  # seconds


def measure(geometry: Geometry) -> dict[str, float]:
    """Median seconds of every stage, and counts."""
    # The view of the small module fills the page alike, on whatever it stands.
    near = geometry.nodes[-1].path == "floor"
    projection = fitted(mechanical(3, 4) if near else geometry, VIEWS["isometric"])
    panel, style = line_panel(projection), Style()
    times: dict[str, list[float]] = {k: [] for k in ("topology", "view", "edges", "tree", "cut", "chains", "yardstick")}
    counts = {}
    for _ in range(ROUNDS):
        topology, seconds = timed(lambda: topology_of(geometry))
        times["topology"].append(seconds)
        view, seconds = timed(lambda known=topology: see_view(geometry, panel, PAGE, known))
        times["view"].append(seconds)
        candidates, seconds = timed(lambda seen=view: edges_of(seen, style))
        times["edges"].append(seconds)
        tree, seconds = timed(lambda seen=view: occluders_of(seen))
        times["tree"].append(seconds)
        pieces, seconds = timed(lambda s=view, c=candidates, t=tree: cut(s, c, occluders=t))
        times["cut"].append(seconds)
        chains, seconds = timed(lambda p=pieces, c=candidates, v=view: chains_of(p, c, v.tolerance, style))
        times["chains"].append(seconds)
        times["yardstick"].append(yardstick(geometry))
        counts = {"candidates": len(candidates), "chains_found": len(chains)}
    return {**{k: float(np.median(v)) for k, v in times.items()}, **counts}


def main() -> None:
    chosen = sys.argv[1:] or list(SCENES)
    totals: dict[str, tuple[int, float]] = {}
    measure(mechanical())
    print(
        f"{'scene':18} {'triangles':>9} {'candid.':>8} topology  view edges  tree   cut chains"
        " | total ms  embreex  ratio  must"
    )
    for name in chosen:
        geometry = SCENES[name]()
        found = measure(geometry)
        total = sum(found[k] for k in ("edges", "tree", "cut", "chains"))
        totals[name] = len(geometry.faces), total
        ms = " ".join(f"{1e3 * found[k]:5.1f}" for k in ("view", "edges", "tree", "cut", "chains"))
        print(
            f"{name:18} {len(geometry.faces):9} {found['candidates']:8.0f} {1e3 * found['topology']:8.1f} {ms} |"
            f" {1e3 * total:8.1f} {1e3 * found['yardstick']:8.1f} {total / found['yardstick']:6.2f}"
            f"  {1e3 * MUST[name] if name in MUST else float('nan'):.0f}",
            flush=True,
        )
    for kind in ("mechanical", "smooth"):
        if f"{kind} 20k" in totals and f"{kind} 1M" in totals:
            (n, t), (m, u) = totals[f"{kind} 20k"], totals[f"{kind} 1M"]
            print(f"{kind}: growth exponent 20k to 1M {np.log(u / t) / np.log(m / n):.2f} (must 1.15)")
    if "tiny in huge 250k" in totals and "mechanical 250k" in totals:
        print(f"tiny in huge / even: {totals['tiny in huge 250k'][1] / totals['mechanical 250k'][1]:.2f} (must 2)")


if __name__ == "__main__":
    main()

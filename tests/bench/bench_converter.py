"""Times of the converter and the vector writers: `python tests/bench/bench_converter.py [strokes]`.

The yardstick is resvg drawing our SVG of the same page in the same run, less the time it takes for an empty page, which
is mostly the packing of a PNG; runs alternate and medians are compared. Lines are 5 mm long on an A4 page, half of
them 0.35 and half 0.7 mm wide, with round ends.
"""

from __future__ import annotations

import re
import statistics
import sys
import time
from collections.abc import Callable

import numpy as np
import resvg_py
from platewright.backend import converter
from platewright.backend.contract import LineClass
from platewright.backend.drawing import Drawing, Group, Lines, Path, Stroke
from platewright.backend.write.bilevel import group4_bytes
from platewright.backend.write.eps import eps_bytes
from platewright.backend.write.pdf import pdf_bytes
from platewright.backend.write.svg import svg_bytes

WIDTH, HEIGHT = 210.0, 297.0
ROUNDS = 5


def page(n: int) -> Drawing:
    random = np.random.default_rng(1)
    groups = []
    for width, name in ((0.35, LineClass.VISIBLE_EDGE), (0.7, LineClass.VISIBLE_OUTLINE)):
        starts = random.uniform((6, 6), (WIDTH - 6, HEIGHT - 6), (n // 2, 2))
        angles = random.uniform(0, 2 * np.pi, n // 2)
        ends = starts + 5.0 * np.column_stack((np.cos(angles), np.sin(angles)))
        strokes = tuple(
            Stroke(Path((float(a[0]), float(a[1])), (Lines(b[None]),)), width, name)
            for a, b in zip(starts, ends, strict=True)
        )
        groups.append(Group("class", name.value, strokes))
    return Drawing(WIDTH, HEIGHT, tuple(groups))


def seconds(work: Callable[[], object]) -> float:
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def resvg(drawing: Drawing, resolution: float) -> Callable[[], object]:
    columns, rows = (round(side / 25.4 * resolution) for side in (WIDTH, HEIGHT))
    text = re.sub(
        r'width="[\d.]+mm" height="[\d.]+mm"', f'width="{columns}px" height="{rows}px"', svg_bytes(drawing).decode()
    )
    return lambda: resvg_py.svg_to_bytes(svg_string=text)


def compare(n: int, resolution: float, rounds: int) -> None:
    drawing, empty = page(n), Drawing(WIDTH, HEIGHT, ())
    works = {
        "resvg": resvg(drawing, resolution),
        "resvg, empty page": resvg(empty, resolution),
        "pixels": lambda: converter.pixels(drawing, resolution),
        "pixels, one thread": lambda: converter.pixels(drawing, resolution, threads=1),
        "grey": lambda: converter.grey_pixels(drawing, resolution),
        "bits": lambda: converter.bits(drawing, resolution),
        "bits, empty page": lambda: converter.bits(empty, resolution),
    }
    times: dict[str, list[float]] = {name: [] for name in works}
    for _ in range(rounds):
        for name, work in works.items():
            times[name].append(seconds(work))
    medians = {name: statistics.median(found) for name, found in times.items()}
    yardstick = medians["resvg"] - medians["resvg, empty page"]
    print(f"A4 at {resolution:.0f} dpi, {n} strokes; resvg less its empty page {yardstick * 1e3:.0f} ms")
    for name, median in medians.items():
        print(f"  {name:20} {median * 1e3:8.0f} ms, / yardstick {median / yardstick:5.2f}")


def main() -> None:
    n = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000
    converter.pixels(page(10), 100.0)
    compare(n, 300.0, 3)
    compare(n, 600.0, 3)
    compare(n, 1200.0, 1)
    drawing = page(n)
    bits = converter.bits(drawing, 1200.0)
    print(f"Group 4 of A4 at 1200 dpi: {seconds(lambda: group4_bytes(bits, 1200.0)) * 1e3:.0f} ms")
    for write in (svg_bytes, pdf_bytes, eps_bytes):
        time_taken = seconds(lambda write=write: write(drawing))
        print(f"{write.__name__}: {time_taken * 1e3:.0f} ms, {len(write(drawing)) / n:.1f} bytes a stroke")


if __name__ == "__main__":
    main()

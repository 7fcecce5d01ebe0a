"""Start-up: whole processes against bare processes that only import the libraries no run can do without.

    python tests/bench/bench_process.py [ROUNDS]

Each row is the median of the rounds, the two sides of a ratio taken in turn. Bytecode and kernels are
compiled before the first round, as they are on a machine in use.
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Mapping, Sequence
from pathlib import Path

COMMAND = (sys.executable, "-m", "platewright.compiler")
_PART_LINES = """
## bracket {k}, one of a family
part bracket_{k}
    made of steel
    add block (60 mm, 40 mm, thickness)
    add block (thickness, 40 mm, 50 mm) at (-30 mm + thickness/2, 0, 0)
    cut cylinder diameter hole length 20 mm at (15 mm, 10 mm, -5 mm)
    cut cylinder diameter hole length 20 mm at (15 mm, -10 mm, -5 mm)
    mark corner at (30 mm, 20 mm, thickness)
"""
_HEAD = """\
platewright 1

given
    thickness = 4 mm range 2 mm .. 8 mm
    hole = 5 mm range 3 mm .. 8 mm

material steel
    metal iron
    gloss 40 %
"""
_SMALL = """\
platewright 1

part knob
    add cylinder diameter 30 mm length 12 mm
    add sphere diameter 24 mm at (0, 0, 12 mm)
    cut cylinder diameter 6 mm length 40 mm at (0, 0, -5 mm)

figure knob_seen
    show knob
    drawn as tone
    width 40 mm
"""
_LINES = _SMALL.replace("drawn as tone", "drawn as lines")


def scene_of_200_lines() -> str:
    """A family of brackets, eighteen parts placed one above the other."""
    parts = [_PART_LINES.format(k=k) for k in range(1, 19)]
    places = [f"    place bracket_{k} at (0, 0, {80 * k} mm)\n" for k in range(1, 19)]
    text = "".join([_HEAD, *parts, "\nassembly rack\n", *places])
    return text + "# a line of comment\n" * (200 - text.count("\n"))


def seconds(arguments: Sequence[str]) -> float:
    """The wall time of one process that must succeed."""
    environment = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
    started = time.perf_counter()
    subprocess.run(arguments, check=True, env=environment, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE)
    return time.perf_counter() - started


def measure(sides: Mapping[str, Sequence[str]], rounds: int) -> dict[str, float]:
    """The median time of each side, all sides once a round."""
    times: dict[str, list[float]] = {name: [] for name in sides}
    for _ in range(rounds):
        for name, arguments in sides.items():
            times[name].append(seconds(arguments))
    return {name: statistics.median(taken) for name, taken in times.items()}


def main(rounds: int) -> None:
    """Print all rows."""
    with tempfile.TemporaryDirectory() as folder:
        long, small = Path(folder, "long.plate"), Path(folder, "small.plate")
        long.write_text(scene_of_200_lines(), encoding="utf-8")
        small.write_text(_SMALL, encoding="utf-8")
        lines = Path(folder, "lines.plate")
        lines.write_text(_LINES, encoding="utf-8")
        check = [*COMMAND, "check", str(long)]
        draw = [*COMMAND, "draw", str(small), "--out", folder]
        seconds(check)
        ink = [*COMMAND, "draw", str(lines), "--kind", "svg", "--out", folder]
        seconds(draw)
        seconds(ink)
        sides = {
            "check, 200 lines": check,
            "import lark, numpy": [sys.executable, "-c", "import lark, numpy"],
            "draw, small and warm": draw,
            "draw, small, warm, of lines to svg": ink,
            "import numba": [sys.executable, "-c", "import numba"],
        }
        medians = measure(sides, rounds)
    rows = (
        ("check, 200 lines", "import lark, numpy"),
        ("draw, small and warm", "import numba"),
        ("draw, small, warm, of lines to svg", "import numba"),
    )
    for ours, yardstick in rows:
        ratio = medians[ours] / medians[yardstick]
        print(f"{ours}: {medians[ours]:.3f} s; bare {yardstick}: {medians[yardstick]:.3f} s; ratio {ratio:.2f}")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 7)

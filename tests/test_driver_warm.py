"""The warm-up compiles all that drawing needs, and leaves the collector of garbage as it was."""

from __future__ import annotations

import gc
import io
import os
import subprocess
import sys
from pathlib import Path

import pytest
from platewright.compiler.driver import warm
from platewright.compiler.driver.report import Report

ROOT = Path(__file__).parents[1]
SCENE = ROOT / "examples" / "rain_gauge" / "rain_gauge.plate"

# Runs a command line and prints how many functions numba compiled; what it reads from its cache is no such event.
_COUNTED = """\
import sys
from numba.core.event import RecordingListener, install_listener
from platewright.compiler.driver.cli import main

with install_listener("numba:compile", RecordingListener()) as seen:
    code = main(sys.argv[1:])
print("compiled", len(seen.buffer) // 2)
sys.exit(code)
"""


def n_compiled(cache: Path, *arguments: str) -> int:
    """How many functions a command compiles in a process of its own, with numba's cache in a folder."""
    environment = {**os.environ, "NUMBA_CACHE_DIR": str(cache)}
    run = subprocess.run(
        [sys.executable, "-c", _COUNTED, *arguments], capture_output=True, text=True, check=True, env=environment
    )
    return int(run.stdout.rsplit("compiled", 1)[1])


@pytest.mark.slow
def test_nothing_is_compiled_after_the_warm_up(tmp_path: Path) -> None:
    cache, out = tmp_path / "cache", str(tmp_path / "out")
    assert n_compiled(cache, "warm-up") > 50
    for figure in ("opened", "opened_in_tone", "section"):
        kinds = ("--kind", "svg", "--kind", "png", "--kind", "tiff")
        assert n_compiled(cache, "draw", str(SCENE), "--figure", figure, *kinds, "--out", out) == 0, figure
    assert not list(tmp_path.glob("*.plate"))


def test_the_collector_is_left_as_it_was() -> None:
    import numba

    usual = gc.get_threshold()
    with pytest.raises(ZeroDivisionError), warm.compiling_told(Report(io.StringIO(), io.StringIO(), False, False)):
        numba.njit(lambda x: x + 1)(1)
        assert gc.get_threshold() != usual
        raise ZeroDivisionError
    assert gc.get_threshold() == usual

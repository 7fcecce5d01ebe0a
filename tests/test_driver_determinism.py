"""The same source gives the same bytes, whatever surrounds the run."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest
from platewright.compiler.driver.cli import main

TWO_UNITS = """\
platewright 1

given
    bore = {bore}

material steel
    metal iron

part plate
    made of steel
    add block ({side}, {side}, {thin})
    cut cylinder diameter bore length {side} at (0, 0, -{thin}) row 2 by ({step}, 0, 0)
    add sphere diameter {step} at ({step}, {step}, {thin})

assembly pair
    place plate
    place plate as upper at (0, 0, {side}) turn 30 deg about z

viewpoint near
    eye ({far}, -{far}, {far}) toward (0, 0, 0)

figure plain
    show pair
    drawn as tone
    width {paper}

figure central
    show pair from near
    drawn as tone
    width {paper}
"""
METRIC = {
    "bore": "6.35 mm",
    "side": "50.8 mm",
    "thin": "12.7 mm",
    "step": "12.7 mm",
    "far": "254 mm",
    "paper": "25.4 mm",
}
INCHES = {
    "bore": "1/4 inch",
    "side": "2 inch",
    "thin": "0.5 inch",
    "step": "1/2 inch",
    "far": "10 inch",
    "paper": "1 inch",
}
SCRIPT = """
import locale, os, sys
os.cpu_count = lambda: int(os.environ["CORES"])
locale.setlocale(locale.LC_ALL, "")
from platewright.compiler.driver.cli import main
scene = sys.argv[1]
code = main(["draw", scene, "--out", "out", "--kind", "png", "--kind", "tiff", "--record", "--resolution", "200"])
for kind in ("csv", "stl", "ply", "obj", "glb"):
    code = code or main(["export", scene, "--of", "pair", "--to", "out/pair." + kind])
code = code or main(["list", scene, "--json"]) or main(["check", scene, "--dump", "graph"])
sys.exit(code)
"""


def _outputs(folder: Path, scene: str, **environment: str) -> dict[str, bytes]:
    """Everything one process makes of a scene in a folder, by name."""
    folder.mkdir(parents=True)
    (folder / "pair.plate").write_text(scene, encoding="utf-8")
    done = subprocess.run(
        [sys.executable, "-c", SCRIPT, "pair.plate"],
        cwd=folder,
        env={**os.environ, **environment},
        capture_output=True,
        timeout=300,
        check=False,
    )
    assert done.returncode == 0, done.stderr.decode()
    made = {path.name: path.read_bytes() for path in sorted((folder / "out").iterdir())}
    return made | {"stdout": done.stdout}


def test_surroundings_leave_no_trace(tmp_path: Path) -> None:
    scene = TWO_UNITS.format(**METRIC)
    first = _outputs(tmp_path / "a", scene, PYTHONHASHSEED="0", TZ="UTC0", LC_ALL="C", NUMBA_NUM_THREADS="1", CORES="1")
    second = _outputs(
        tmp_path / "another folder" / "b",
        scene,
        PYTHONHASHSEED="4242",
        TZ="XYZ-14",
        LC_ALL="C.UTF-8",
        NUMBA_NUM_THREADS="2",
        CORES="3",
        SOURCE_DATE_EPOCH="1",
    )
    assert len(first) == 2 * 3 + 6 + 1
    assert first.keys() == second.keys()
    assert [name for name in first if first[name] != second[name]] == []


@pytest.mark.parametrize("kind", ["csv", "glb"])
def test_an_inch_is_25_4_millimetres_to_the_byte(tmp_path: Path, kind: str) -> None:
    made = []
    for name, unit in (("metric", METRIC), ("inches", INCHES)):
        folder = tmp_path / name
        folder.mkdir()
        (folder / "pair.plate").write_text(TWO_UNITS.format(**unit), encoding="utf-8")
        scene, target = str(folder / "pair.plate"), folder / f"pair.{kind}"
        assert main(["export", scene, "--of", "pair", "--to", str(target)]) == 0
        assert main(["draw", scene, "--resolution", "100", "--record", "--kind", "png", "--kind", "tiff"]) == 0
        pictures = {path.name: path.read_bytes() for path in (folder / "figures").iterdir()}
        made.append(pictures | {"export": target.read_bytes()})
    assert len(made[0]) == 7
    assert made[0] == made[1]

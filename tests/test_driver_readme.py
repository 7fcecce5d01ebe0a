"""What README.md says is what happens: its scenes, its messages, its options, its commands."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from PIL import Image
from platewright.compiler.driver.cli import main

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
COMPILING = "platewright: compiling the drawing kernels for this machine, which happens once\n"
CASES = Path(__file__).parent / "cases" / "typical"


def _blocks(language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```$", README, flags=re.MULTILINE | re.DOTALL)


@pytest.fixture
def drum(tmp_path: Path) -> Path:
    """The scene of the first page with what the tour adds to its end."""
    path = tmp_path / "drum.plate"
    path.write_text("\n".join(_blocks("platewright")), encoding="utf-8")
    return path


def test_the_tour_draws_what_it_says(drum: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(drum), "--figures"]) == 0
    assert main(["draw", str(drum), "--all-variants", "--resolution", "60"]) == 0
    assert capsys.readouterr().err.replace(COMPILING, "") == ""
    figures = drum.parent / "figures"
    made = {path.relative_to(figures).as_posix(): path.read_bytes() for path in figures.rglob("*.png")}
    names = [f"{variant}/{figure}.png" for variant in ("large", "small") for figure in ("cut_open", "parts")]
    assert sorted(made) == names
    text = drum.read_text(encoding="utf-8")
    assert text.count("flange length 5 mm\n") == 1
    drum.write_text(text.replace("flange length 5 mm\n", "flange length 8 mm\n"), encoding="utf-8")
    assert main(["draw", str(drum), "--all-variants", "--resolution", "60"]) == 0
    after = {path.relative_to(figures).as_posix(): path.read_bytes() for path in figures.rglob("*.png")}
    assert [name for name in names if after[name] == made[name]] == []


def test_the_first_scene_is_that_of_the_picture_beside_it(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "drum.plate"
    path.write_text(_blocks("platewright")[0], encoding="utf-8")
    assert path.read_bytes() == (ROOT / "examples" / "drum" / "drum.plate").read_bytes()
    assert main(["draw", str(path), "--resolution", "200"]) == 0
    out, err = capsys.readouterr()
    assert out == f"{tmp_path / 'figures' / 'parts.png'}\n"
    assert err.replace(COMPILING, "") == ""
    drawn, shown = (
        np.asarray(Image.open(picture)) for picture in (Path(out.strip()), ROOT / "examples/drum/parts.png")
    )
    assert drawn.shape == shown.shape
    stale = "draw it again: platewright draw examples/drum/drum.plate --resolution 200 --out examples/drum"
    assert np.abs(drawn.astype(int) - shown).max() <= 2, stale


def test_every_picture_and_page_the_readme_points_to_is_there() -> None:
    targets = re.findall(r"\]\(([^)#]+)\)|src=\"([^\"]+)\"", README)
    assert len(targets) >= 4
    assert [name for pair in targets if not (ROOT / (name := "".join(pair))).is_file()] == []


def test_the_shown_messages_are_those_of_the_cases() -> None:
    shown = _blocks("text")
    cases = {path.name.split(".")[0]: path.read_text(encoding="utf-8") for path in CASES.glob("*.problems.txt")}
    real = {text.replace(f"{stem}.plate", "drum.plate") for stem, text in cases.items()}
    assert len(shown) == 10
    assert [message for message in shown if message not in real] == []


def test_every_option_is_in_the_readme_and_every_one_there_exists(capsys: pytest.CaptureFixture[str]) -> None:
    offered: set[str] = set()
    for command in ("draw", "check", "format", "export", "list", "warm-up"):
        main([command, "--help"])
        offered |= set(re.findall(r"--[a-z][a-z-]*", capsys.readouterr().out))
    commands = README[README.index("## Commands") : README.index("## Files")]
    assert set(re.findall(r"--[a-z][a-z-]*", commands)) == offered - {"--help"}


def test_both_commands_do_all_their_set_up() -> None:
    for name in ("example", "tests"):
        (command,) = re.findall(rf"^<!-- \.ci/run: {name} -->\n```sh\n(.*)\n```$", README, flags=re.MULTILINE)
        assert command.startswith("python3 -m venv .venv && .venv/bin/python -m pip install ")

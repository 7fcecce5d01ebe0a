"""The examples are what a careful author would hand in: without problems, in canonical layout, with their pictures."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from PIL import Image
from platewright.compiler.driver.cli import main

EXAMPLES = Path(__file__).parents[1] / "examples"
FILES = sorted(EXAMPLES.rglob("*.plate"))
SCENES = [path for path in FILES if "\nassembly " in (text := path.read_text(encoding="utf-8")) and "\nfigure " in text]
PICTURES = sorted(path for path in EXAMPLES.rglob("*.png") if "figures" not in path.parts)


def _name(path: Path) -> str:
    return path.relative_to(EXAMPLES).as_posix()


def test_the_examples_hold_two_document_sets_with_variants_and_several_figures() -> None:
    texts = [path.read_text(encoding="utf-8") for path in SCENES]
    sets = [text for text in texts if "\nvariants " in text and text.count("\nfigure ") >= 3]
    assert len(sets) >= 2 and len(PICTURES) >= 2 * len(sets)


@pytest.mark.parametrize("scene", SCENES, ids=_name)
def test_nothing_is_wrong_with_the_defaults_every_variant_and_every_figure(
    scene: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["check", str(scene), "--figures"]) == 0
    assert capsys.readouterr().err == ""


@pytest.mark.parametrize("path", FILES, ids=_name)
def test_the_layout_is_canonical(path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["format", "--check", str(path)]) == 0
    assert capsys.readouterr() == ("", "")


@pytest.mark.parametrize("scene", SCENES, ids=_name)
def test_every_figure_has_an_alternative_text(scene: Path) -> None:
    figures = re.split(r"^figure ", scene.read_text(encoding="utf-8"), flags=re.MULTILINE)[1:]
    assert [
        figure.split("\n")[0] for figure in figures if not re.search(r'^    alt ".{20,}"$', figure, re.MULTILINE)
    ] == []


@pytest.mark.parametrize("picture", PICTURES, ids=_name)
def test_a_picture_kept_beside_a_scene_is_one_of_its_figures_and_light(picture: Path) -> None:
    scene = picture.parent / f"{picture.parent.name}.plate"
    found = re.search(
        rf"^figure {picture.stem}\n(?:    .*\n)*?    width (\d+) mm\n", scene.read_text("utf-8"), re.MULTILINE
    )
    assert found is not None
    assert picture.stat().st_size < 250_000
    with Image.open(picture) as image:
        dots = image.info["dpi"][0]
        assert image.width == pytest.approx(float(found[1]) / 25.4 * dots, abs=1)


@pytest.mark.slow
@pytest.mark.parametrize("scene", SCENES, ids=_name)
def test_every_figure_of_every_variant_draws(scene: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    text = scene.read_text(encoding="utf-8")
    figures = len(re.findall(r"^figure ", text, flags=re.MULTILINE))
    which = ["--all-variants"] if "\nvariants " in text else []
    assert main(["draw", str(scene), *which, "--resolution", "50", "--out", str(tmp_path)]) == 0
    assert capsys.readouterr().err == ""
    made = sorted(tmp_path.rglob("*.png"))
    assert len(made) == figures * (4 if which else 1)
    for picture in made:
        with Image.open(picture) as image:
            grey = np.asarray(image.convert("L"))
        assert grey.min() < 200 and grey.max() == 255, picture.name

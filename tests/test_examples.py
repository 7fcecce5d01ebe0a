"""The examples are what a careful author would hand in: without problems, in canonical layout, with their pictures."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from PIL import Image
from platewright.compiler import scene
from platewright.compiler.driver.cli import main
from platewright.compiler.driver.meshes import KeptMeshes

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


def _loader(folder: Path) -> scene.Loader:
    return lambda name: (folder / name).read_bytes() if (folder / name).is_file() else scene.Refusal("missing")


@pytest.mark.parametrize("path", SCENES, ids=_name)
def test_nothing_is_wrong_with_the_defaults_and_their_figures(path: Path) -> None:
    project, problems = scene.open_scene(path.name, _loader(path.parent))
    assert project is not None and problems == ()
    model, problems = scene.build(project)
    assert model is not None and problems == ()
    mesher = KeptMeshes()
    found = [*scene.prove(model, mesher), *scene.judge(model, mesher)]
    for figure in model.figures:
        job, problems = scene.plan(model, figure.name, mesher)
        assert job is not None, figure.name
        found += problems
    assert [each for each in found if not any(accept.covers(each) for accept in project.acceptances)] == []


@pytest.mark.slow
@pytest.mark.parametrize("path", SCENES, ids=_name)
def test_nothing_is_wrong_with_any_variant_and_any_figure(path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(path), "--figures"]) == 0
    assert capsys.readouterr().err == ""


@pytest.mark.parametrize("path", FILES, ids=_name)
def test_the_layout_is_canonical(path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["format", "--check", str(path)]) == 0
    assert capsys.readouterr() == ("", "")


@pytest.mark.parametrize("path", SCENES, ids=_name)
def test_every_figure_has_an_alternative_text(path: Path) -> None:
    figures = re.split(r"^figure ", path.read_text(encoding="utf-8"), flags=re.MULTILINE)[1:]
    assert [
        figure.split("\n")[0] for figure in figures if not re.search(r'^    alt ".{20,}"$', figure, re.MULTILINE)
    ] == []


@pytest.mark.parametrize("picture", PICTURES, ids=_name)
def test_a_picture_kept_beside_a_scene_is_one_of_its_figures_and_light(picture: Path) -> None:
    path = picture.parent / f"{picture.parent.name}.plate"
    figure = re.search(rf"^figure {picture.stem}\n((?:    .*\n)*)", path.read_text("utf-8"), re.MULTILINE)
    assert figure is not None
    stated = re.search(r"^    width (\d+) mm( at most)?", figure[1], re.MULTILINE)
    assert picture.stat().st_size < 250_000
    with Image.open(picture) as image:
        dots = image.info["dpi"][0]
        pixels = (84 if stated is None else float(stated[1])) / 25.4 * dots
        if stated is not None and stated[2] is not None:
            assert image.width <= pixels + 1
        elif stated is not None or "\n    scale " not in figure[1]:
            assert image.width == pytest.approx(pixels, abs=1)


@pytest.mark.slow
@pytest.mark.parametrize("path", SCENES, ids=_name)
def test_every_figure_of_every_variant_draws(path: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    project, _ = scene.open_scene(path.name, _loader(path.parent))
    assert project is not None
    figures, variants = len(scene.figure_names(project)), len(project.variants)
    which = ["--all-variants"] if variants else []
    assert main(["draw", str(path), *which, "--resolution", "50", "--out", str(tmp_path)]) == 0
    assert capsys.readouterr().err == ""
    made = sorted(tmp_path.rglob("*.png"))
    assert len(made) == figures * max(variants, 1)
    for picture in made:
        with Image.open(picture) as image:
            grey = np.asarray(image.convert("L"))
        assert grey.min() < 200 and grey.max() == 255, picture.name

"""Every scene under tests/cases against the outputs expected of it."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from support import cases


def _name(scene: Path) -> str:
    return scene.relative_to(cases.FOLDER).with_suffix("").as_posix()


@pytest.mark.parametrize("scene", cases.scenes(cases.FOLDER), ids=_name)
def test_case(scene: Path, request: pytest.FixtureRequest, capsys: pytest.CaptureFixture[str]) -> None:
    if request.config.getoption("--update"):
        if os.environ.get("CI"):
            pytest.fail("--update is refused where CI is set: expectations change on a desk, under a person's eyes")
        rewritten = cases.update(scene)
        with capsys.disabled():
            for path in rewritten:
                print(f"\nrewrote {path.relative_to(cases.FOLDER)}", end="")
    differences = cases.compare(scene)
    assert not differences, "\n\n".join(differences)


def test_no_expectation_is_orphaned() -> None:
    assert cases.orphans(cases.FOLDER) == []


def test_a_case_without_expectation_and_an_orphan_are_both_found(tmp_path: Path) -> None:
    scene = tmp_path / "lonely.plate"
    scene.write_text("platewright 1\n", encoding="utf-8")
    (tmp_path / "gone.problems.txt").write_text("", encoding="utf-8")
    (tmp_path / "lonely.unheard.txt").write_text("", encoding="utf-8")
    (difference,) = cases.compare(scene)
    assert "without any expectation" in difference
    assert [path.name for path in cases.orphans(tmp_path)] == ["gone.problems.txt", "lonely.unheard.txt"]


def test_a_wrong_expectation_is_found_and_update_mends_it(tmp_path: Path) -> None:
    scene = tmp_path / "wrong.plate"
    scene.write_text("platewright 1\n\npart knob\n    add sphere diametr 4 mm\n", encoding="utf-8")
    expected = tmp_path / "wrong.problems.txt"
    expected.write_text("all is well\n", encoding="utf-8")
    (difference,) = cases.compare(scene)
    assert "all is well" in difference and "diametr" in difference
    assert cases.update(scene) == [expected]
    assert cases.compare(scene) == []
    assert cases.update(scene) == []

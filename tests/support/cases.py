"""Scenes beside what is expected of them: `NAME.plate` with `NAME.problems.txt`, `NAME.graph.txt` and so on.

Which expectations stand beside a scene says what is compared. Scenes below a folder named `seen` are no cases of
their own: they are there to be seen by the cases around that folder.
"""

from __future__ import annotations

import io
from collections.abc import Callable, Mapping
from pathlib import Path

from platewright.compiler.driver.commands import check, show_list
from platewright.compiler.driver.crash import Trace
from platewright.compiler.driver.report import Report

FOLDER = Path(__file__).parents[1] / "cases"
_SEEN = "seen"


def _problems(scene: Path) -> str:
    """What `check --figures` says to the author, nothing at all for a clean scene."""
    err = io.StringIO()
    check(scene, None, True, "text", None, Trace(), Report(io.StringIO(), err, False, False))
    return err.getvalue()


def _dump(stage: str) -> Callable[[Path], str]:
    def dumped(scene: Path) -> str:
        out = io.StringIO()
        check(scene, None, False, "text", stage, Trace(), Report(out, io.StringIO(), False, False))
        return out.getvalue()

    return dumped


def _listed(scene: Path) -> str:
    out = io.StringIO()
    show_list(scene, None, False, Trace(), Report(out, io.StringIO(), False, False))
    return out.getvalue()


OUTPUTS: Mapping[str, Callable[[Path], str]] = {
    "problems": _problems,
    "tree": _dump("tree"),
    "graph": _dump("graph"),
    "triangles": _dump("triangles"),
    "list": _listed,
}
"""What can be expected of a scene, by the word in the name of the expectation."""


def scenes(folder: Path) -> list[Path]:
    """Every case below a folder, in a fixed order."""
    found = (scene for scene in folder.rglob("*.plate") if _SEEN not in scene.relative_to(folder).parts[:-1])
    return sorted(found, key=lambda scene: scene.relative_to(folder).as_posix())


def expectations(scene: Path) -> dict[str, Path]:
    """The expectations that stand beside a scene, by the word of each."""
    paths = {word: scene.with_name(f"{scene.stem}.{word}.txt") for word in OUTPUTS}
    return {word: path for word, path in paths.items() if path.exists()}


def orphans(folder: Path) -> list[Path]:
    """Files below a folder that are neither a scene, nor seen by one, nor an expectation of one."""
    known = {path for scene in scenes(folder) for path in (scene, *expectations(scene).values())}
    files = (path for path in folder.rglob("*") if path.is_file())
    return sorted(path for path in files if path not in known and _SEEN not in path.relative_to(folder).parts[:-1])


def compare(scene: Path) -> list[str]:
    """What differs from the expectations, one text each; also if there is none."""
    expected = expectations(scene)
    if not expected:
        return [f"{scene.name} stands without any expectation; --update makes {scene.stem}.problems.txt"]
    differences = []
    for word, path in expected.items():
        want, have = path.read_text(encoding="utf-8"), OUTPUTS[word](scene)
        if want != have:
            differences.append(f"{path.name} expects\n{want}\nbut the output is\n{have}")
    return differences


def update(scene: Path) -> list[Path]:
    """Rewrite the expectations that differ, or make the one on problems if there is none. The paths rewritten."""
    expected = expectations(scene) or {"problems": scene.with_name(f"{scene.stem}.problems.txt")}
    rewritten = []
    for word, path in expected.items():
        have = OUTPUTS[word](scene)
        if not path.exists() or path.read_text(encoding="utf-8") != have:
            path.write_text(have, encoding="utf-8", newline="\n")
            rewritten.append(path)
    return rewritten

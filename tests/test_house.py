"""What holds for every file of the project."""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator
from fnmatch import fnmatch
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
CODE_FOLDERS = ("lang", "compiler", "backend")
FOLDERS = {*CODE_FOLDERS, "tests", "examples"}
FILES = {"README.md", "DEVELOPERS.md", "pyproject.toml", "LICENSE"}
BINARY = {".png", ".tif", ".tiff", ".icc", ".npz", ".glb", ".stl", ".ply"}
BAD_ON_PURPOSE = "tests/cases/"  # scenes with wrong line ends, tabs or encodings
MOST_LINES = 700
_MACHINE_PATHS = re.compile(
    rb"(?<![\w./-])/(?:" + b"|".join([b"work/", b"opt/p" + b"w", b"root/", b"home/"]) + rb")|[A-Z]:\\Users"
)


def ignored() -> list[str]:
    """Patterns of what is never part of the project, from .gitignore."""
    lines = (ROOT / ".gitignore").read_text(encoding="utf-8").splitlines()
    return [line.strip("/") for line in lines if line and not line.startswith("#")]


def project_files() -> Iterator[Path]:
    """Every file of the project, dot-files and the continuous-integration folder with it, in a fixed order."""
    patterns = [*ignored(), ".git"]
    for path in sorted(ROOT.rglob("*")):
        parts = path.relative_to(ROOT).parts
        if path.is_file() and not any(fnmatch(part, pattern) for part in parts for pattern in patterns):
            yield path


def text_files() -> list[Path]:
    return [path for path in project_files() if path.suffix not in BINARY]


def name(path: Path) -> str:
    return path.relative_to(ROOT).as_posix()


def code_files() -> list[Path]:
    return [path for path in project_files() if path.suffix == ".py"]


def test_the_files_are_found() -> None:
    names = {name(path) for path in project_files()}
    assert {"pyproject.toml", "backend/contract.py", "tests/test_house.py", "backend/write/srgb.icc"} <= names


def test_no_file_names_a_place_on_a_machine() -> None:
    assert [name(path) for path in text_files() if _MACHINE_PATHS.search(path.read_bytes())] == []


@pytest.mark.parametrize(
    "place", [("", "home", "ann"), ("(", "work", "main"), ("", "root", ""), ("C:", "Users", "ann")]
)
def test_a_place_on_a_machine_is_known(place: tuple[str, str, str]) -> None:
    assert _MACHINE_PATHS.search(("\\" if place[0] == "C:" else "/").join(place).encode())
    assert not _MACHINE_PATHS.search(b"at-home/" + b"work/root, https://example.org/home/")


def test_text_is_utf_8_with_unix_line_ends() -> None:
    for path in text_files():
        if not name(path).startswith(BAD_ON_PURPOSE):
            data = path.read_bytes()
            assert b"\r" not in data, name(path)
            data.decode("utf-8")


def test_code_has_no_tabs_and_no_long_files() -> None:
    for path in code_files():
        text = path.read_text(encoding="utf-8")
        assert "\t" not in text, name(path)
        assert text.count("\n") <= MOST_LINES, name(path)


def test_every_module_says_what_it_is() -> None:
    modules = [path for path in code_files() if name(path).split("/")[0] in CODE_FOLDERS]
    silent = [name(path) for path in modules if not ast.get_docstring(ast.parse(path.read_bytes()))]
    assert len(modules) > 20 and silent == []


def test_the_top_level_holds_what_it_should() -> None:
    patterns = ignored()
    entries = [path for path in ROOT.iterdir() if not path.name.startswith(".")]
    kept = [path for path in entries if not any(fnmatch(path.name, pattern) for pattern in patterns)]
    assert {path.name for path in kept if path.is_dir()} == FOLDERS
    assert {path.name for path in kept if path.is_file()} == FILES

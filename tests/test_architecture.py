"""The walls between the folders: every import is read, and an arrow that points the wrong way fails.

`lang <- compiler -> backend.contract`; `backend` stands alone; `compiler/driver` is above all and nothing imports it.
"""

from __future__ import annotations

import ast
import importlib.util
import re
import subprocess
import sys
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path, PurePosixPath

import pytest

ROOT = Path(__file__).parents[1]
NAMESPACE = "platewright"
FOLDERS = ("lang", "compiler", "backend")
DRIVER = "compiler.driver"
# What of the backend the compiler may name: values and their makers, and the letters, for those that are made as solids
# are the same as those that are drawn.
SPECTRA = ("air", "grid", "illuminants", "optics", "sky", "sun", "tristimulus", "upsampling")
DOOR = (
    "backend.contract", "backend.camera", "backend.lettering.type", *(f"backend.spectra.{each}" for each in SPECTRA),
)  # fmt: skip
KERNELS = ("backend.compiled", "backend.raster.", "backend.lines.", "backend.converter.", "backend.rays.")
HEAVY_FOR_LANG = ("numpy", "PIL", "numba", "manifold3d", "rich")
SHIPPED_WITH = {"PIL": "pillow", "llvmlite": "numba", "fontTools": "fonttools"}


@dataclass(frozen=True)
class Import:
    """One imported module: who names it, where, how, and whether it runs when the importer is loaded."""

    owner: str  # module without the namespace, as `backend.write.png`
    line: int
    target: str  # module without the namespace if ours, else the name itself
    is_ours: bool
    is_relative: bool
    runs_at_load: bool


def floor(module: str) -> str:
    """The folder whose rules a module obeys; `python -m platewright.compiler` belongs to the driver."""
    if module == "compiler.__main__" or module == DRIVER or module.startswith(DRIVER + "."):
        return DRIVER
    return module.split(".")[0]


def faults(found: Import) -> Iterator[str]:
    """What is wrong with one import, in words."""
    here, there = floor(found.owner), floor(found.target)
    if not found.is_ours:
        top = found.target.split(".")[0]
        if here == "lang" and top in HEAVY_FOR_LANG:
            yield f"lang imports {top}"
        if top == "numba" and found.runs_at_load and not found.owner.startswith(KERNELS):
            yield "numba is imported on loading, outside the kernels"
        return
    if there == DRIVER and here != DRIVER:
        yield "the driver is imported from below"
    elif here == "lang" and there != "lang":
        yield f"lang imports {there}"
    elif here == "backend" and there != "backend":
        yield f"the backend imports {there}"
    elif here == "compiler" and there == "backend" and found.target not in DOOR:
        yield f"the compiler imports {found.target}, not only {' and '.join(DOOR)}"
    if here == there and not found.is_relative:
        yield "an absolute import inside a folder"
    if here != there and found.is_relative:
        yield "a relative import across a wall"


def imports(owner: str, text: str, is_package: bool, modules: frozenset[str]) -> Iterator[Import]:
    """All imports of a module's text; names imported from a package count as modules where they are such."""
    for statement, runs_at_load in _statements(ast.parse(text), True):
        if isinstance(statement, ast.Import):
            for alias in statement.names:
                yield _import(owner, statement, alias.name, False, runs_at_load)
        elif isinstance(statement, ast.ImportFrom):
            base = _base(owner, statement, is_package)
            for alias in statement.names:
                longer = f"{base}.{alias.name}"
                name = longer if longer.removeprefix(NAMESPACE + ".") in modules else base
                yield _import(owner, statement, name, statement.level > 0, runs_at_load)


def _import(owner: str, at: ast.stmt, name: str, is_relative: bool, runs_at_load: bool) -> Import:
    is_ours = name.split(".")[0] == NAMESPACE
    return Import(owner, at.lineno, name.removeprefix(NAMESPACE + "."), is_ours, is_relative, runs_at_load)


def _base(owner: str, statement: ast.ImportFrom, is_package: bool) -> str:
    if statement.level == 0:
        return statement.module or ""
    package = f"{NAMESPACE}.{owner}" if is_package else f"{NAMESPACE}.{owner}".rpartition(".")[0]
    return importlib.util.resolve_name("." * statement.level + (statement.module or ""), package)


def _statements(node: ast.AST, runs_at_load: bool) -> Iterator[tuple[ast.stmt, bool]]:
    for child in ast.iter_child_nodes(node):
        is_function = isinstance(child, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda)
        is_for_checkers = isinstance(child, ast.If) and ast.unparse(child.test).endswith("TYPE_CHECKING")
        if isinstance(child, ast.stmt):
            yield child, runs_at_load
        yield from _statements(child, runs_at_load and not is_function and not is_for_checkers)


def sources() -> dict[str, Path]:
    """Module name without the namespace to file, packages by their own name."""
    files = sorted(path for folder in FOLDERS for path in (ROOT / folder).rglob("*.py"))
    names = (path.relative_to(ROOT).with_suffix("").parts for path in files)
    return {
        ".".join(parts[:-1] if parts[-1] == "__init__" else parts): path
        for parts, path in zip(names, files, strict=True)
    }


def all_imports() -> list[Import]:
    files = sources()
    modules = frozenset(files)
    return [
        found
        for owner, path in files.items()
        for found in imports(owner, path.read_text(encoding="utf-8"), path.name == "__init__.py", modules)
    ]


def test_no_arrow_points_the_wrong_way() -> None:
    found = all_imports()
    assert len(found) > 50
    wrong = [f"{one.owner}, line {one.line}: {fault}" for one in found for fault in faults(one)]
    assert wrong == []


@pytest.mark.parametrize(
    ("owner", "text", "fault"),
    [
        ("lang.tree", "import numpy as np", "lang imports numpy"),
        ("lang.tree", "def f():\n    from PIL import Image", "lang imports PIL"),
        ("lang.tree", "from platewright.backend import contract", "lang imports backend"),
        ("lang.tree", "from platewright.compiler.graph import Node", "lang imports compiler"),
        ("backend.sheet", "from platewright.lang import tree", "the backend imports lang"),
        (
            "backend.sheet",
            "if TYPE_CHECKING:\n    from platewright.compiler import graph",
            "the backend imports compiler",
        ),
        ("backend.sheet", "from ..lang import tree", "the backend imports lang"),
        ("compiler.graph", "from platewright.backend import sheet", "not only backend.contract"),
        ("compiler.graph", "import platewright.backend.write.png", "not only backend.contract"),
        ("compiler.graph", "from .driver import cli", "the driver is imported from below"),
        ("compiler.graph", "from platewright.compiler.driver.cli import main", "the driver is imported from below"),
        ("compiler.graph", "from platewright.compiler import values", "an absolute import inside a folder"),
        ("compiler.graph", "from ..lang import tree", "a relative import across a wall"),
        ("compiler.driver.cli", "from .. import graph", "a relative import across a wall"),
        ("backend.sheet", "import numba", "numba is imported on loading"),
        ("backend.sheet", "class A:\n    from numba import njit", "numba is imported on loading"),
        ("backend.sheet", "try:\n    import numba.core\nexcept ImportError:\n    pass", "numba is imported on loading"),
    ],
)
def test_a_wrong_arrow_is_found(owner: str, text: str, fault: str) -> None:
    found = imports(owner, text, False, frozenset({"backend.contract", "backend.sheet", "compiler.driver.cli"}))
    assert any(fault in words for one in found for words in faults(one))


@pytest.mark.parametrize(
    ("owner", "text"),
    [
        ("compiler.graph", "from platewright.backend import contract"),
        ("compiler.graph", "from platewright.backend.camera import fitted"),
        ("compiler.solids.ladder", "from ..graph import Node"),
        ("compiler.__main__", "from .driver.cli import main"),
        ("compiler.driver.cli", "from platewright.backend import sheet\nfrom platewright.compiler import graph"),
        ("backend.raster.tiles", "import numba"),
        ("backend.sheet", "def draw():\n    import numba"),
        ("backend.sheet", "if TYPE_CHECKING:\n    import numba"),
    ],
)
def test_a_right_arrow_passes(owner: str, text: str) -> None:
    modules = frozenset({"backend.contract", "backend.sheet", "compiler.graph", "compiler.driver.cli"})
    assert [fault for one in imports(owner, text, False, modules) for fault in faults(one)] == []


def test_every_package_in_use_is_declared() -> None:
    settings = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
    declared = {re.split(r"[<>=!~ ;\[]", line)[0] for line in settings["project"]["dependencies"]}
    tops = {one.target.split(".")[0] for one in all_imports() if not one.is_ours} - set(sys.stdlib_module_names)
    assert {SHIPPED_WITH.get(top, top) for top in tops} <= declared


def test_every_folder_with_code_is_packed() -> None:
    settings = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
    folders = {PurePosixPath(path.relative_to(ROOT).parent.as_posix()) for path in sources().values()}
    assert sorted(settings["tool"]["setuptools"]["packages"]) == sorted(
        ".".join([NAMESPACE, *folder.parts]) for folder in folders
    )
    assert all((ROOT / folder / "__init__.py").is_file() for folder in folders)


def test_the_command_line_starts_light() -> None:
    """Loading the command line must not load what only drawing, booleans or a terminal need."""
    if "compiler.driver.cli" not in sources():
        pytest.skip("there is no command line yet")
    code = (
        f"import sys, {NAMESPACE}.{DRIVER}.cli\n"
        "print(*sorted({'numba', 'llvmlite', 'manifold3d', 'rich'} & set(sys.modules)))"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.split() == []

"""The Khronos glTF validator (npm package gltf-validator), run by node where both are installed."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
from dataclasses import dataclass
from pathlib import Path
from typing import Any

PACKAGE = "gltf-validator"
FOLDER_VARIABLE = "GLTF_VALIDATOR_DIR"
_PROGRAM = f"""
const validator = require({PACKAGE!r});
const fs = require('fs');
const reports = process.argv.slice(1).map(
  file => validator.validateBytes(new Uint8Array(fs.readFileSync(file)), {{maxIssues: 0}}));
Promise.all(reports).then(all => console.log(JSON.stringify(all)));
"""


@dataclass(frozen=True)
class Validator:
    """A node program and the folder of packages in which it finds the validator."""

    node: str
    packages: Path

    def reports(self, files: list[Path]) -> list[dict[str, Any]]:
        """The validator's report on each file, in order."""
        surroundings = os.environ | {"NODE_PATH": str(self.packages)}
        command = [self.node, "-e", _PROGRAM, "--", *map(str, files)]
        run = subprocess.run(command, env=surroundings, capture_output=True, text=True, check=True, timeout=60)
        loaded: list[dict[str, Any]] = json.loads(run.stdout)
        return loaded


def find_validator() -> Validator | str:
    """The validator, or the reason why there is none.

    Looked for in the folder named by GLTF_VALIDATOR_DIR (the package itself, or a folder of packages), in
    `node_modules` beside the project, then among npm's global packages.
    """
    node = shutil.which("node")
    if node is None:
        return "node is not installed"
    for folder in _package_folders():
        if (folder / PACKAGE / "package.json").is_file():
            return Validator(node, folder)
    return f"npm package {PACKAGE} is not installed, and {FOLDER_VARIABLE} does not name its folder"


def _package_folders() -> list[Path]:
    folders = []
    if named := os.environ.get(FOLDER_VARIABLE):
        folders += [Path(named), Path(named) / "node_modules", Path(named).parent]
    folders.append(Path(__file__).parents[2] / "node_modules")
    if npm := shutil.which("npm"):
        run = subprocess.run([npm, "root", "-g"], capture_output=True, text=True, check=False, timeout=60)
        if run.returncode == 0:
            folders.append(Path(run.stdout.strip()))
    return folders

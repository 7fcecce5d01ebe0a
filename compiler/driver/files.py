"""Disk: reading inside the project folder, and writing that leaves either every file of a set or none."""

from __future__ import annotations

import errno
import os
import stat
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from platewright.compiler.limits import FILE_BYTES

Reason = Literal["missing", "outside", "too large", "not a file", "unreadable"]


def read_confined(root: Path, name: str, limit: int = FILE_BYTES) -> bytes | Reason:
    """The bytes of `name`, a path relative to the folder `root`, or why they cannot be had.

    Symbolic links are followed first, and what they lead to must lie in `root` as well. A folder, pipe or device is
    refused without being opened for reading; nothing over `limit` bytes is held. Raises nothing.
    """
    try:
        base = root.resolve(strict=True)
        path = (base / name).resolve(strict=True)
    except FileNotFoundError:
        return "missing" if _stays_inside(root, name) else "outside"
    except NotADirectoryError:
        return "missing"
    except (OSError, RuntimeError, ValueError):
        return "unreadable"
    return read_regular(path, limit) if path.is_relative_to(base) else "outside"


def read_regular(path: Path, limit: int = FILE_BYTES) -> bytes | Reason:
    """The bytes of a regular file of at most `limit` bytes, or why they cannot be had. Raises nothing."""
    try:
        descriptor = os.open(path, os.O_RDONLY | getattr(os, "O_NONBLOCK", 0) | getattr(os, "O_BINARY", 0))
    except FileNotFoundError:
        return "missing"
    except (OSError, ValueError):
        return "not a file" if os.path.isdir(path) else "unreadable"
    try:
        return _read_open(descriptor, limit)
    except OSError:
        return "unreadable"
    finally:
        os.close(descriptor)


def _read_open(descriptor: int, limit: int) -> bytes | Reason:
    if not stat.S_ISREG(os.fstat(descriptor).st_mode):
        return "not a file"
    with open(descriptor, "rb", closefd=False) as file:
        content = file.read(limit + 1)
    return content if len(content) <= limit else "too large"


def _stays_inside(root: Path, name: str) -> bool:
    """Whether a name whose file is missing would have been inside: a missing file outside is not told apart."""
    path = os.path.normpath(os.path.join(os.path.realpath(root), name))
    return Path(os.path.realpath(path)).is_relative_to(os.path.realpath(root))


@dataclass(slots=True)
class _Replacement:
    """One file on its way: `fresh` holds the new bytes, `kept` what stood at `target` before."""

    target: Path
    fresh: Path
    kept: Path
    is_begun: bool = False
    had_earlier: bool = False


def write_all(files: Mapping[Path, bytes]) -> None:
    """Write every file, or leave every path as it was.

    All bytes are on disk under temporary names, in the folders they belong to, before the first rename; a rename that
    fails undoes those before it. Folders are made as needed and taken away again on failure. Raises OSError, and
    passes on an interruption, both after cleaning up.
    """
    folders: list[Path] = []
    replacements: list[_Replacement] = []
    try:
        for target, content in files.items():
            _make_folder(target.parent, folders)
            _stage(target, content, replacements)
        for replacement in replacements:
            _commit(replacement)
    except BaseException:
        for replacement in reversed(replacements):
            _undo(replacement)
        for folder in reversed(folders):
            _remove_if_empty(folder)
        raise
    for replacement in replacements:
        replacement.kept.unlink(missing_ok=True)


def _make_folder(folder: Path, made: list[Path]) -> None:
    if folder.is_dir():
        return
    _make_folder(folder.parent, made)
    try:
        folder.mkdir()
    except FileExistsError:
        if not folder.is_dir():
            raise
    else:
        made.append(folder)


def _stage(target: Path, content: bytes, replacements: list[_Replacement]) -> None:
    number = len(replacements)
    while True:
        stem = f".platewright-{os.getpid()}-{number}"
        replacement = _Replacement(target, target.with_name(stem + ".new"), target.with_name(stem + ".old"))
        try:
            descriptor = os.open(
                replacement.fresh, os.O_WRONLY | os.O_CREAT | os.O_EXCL | getattr(os, "O_BINARY", 0), 0o666
            )
        except FileExistsError:
            number += 1
            continue
        break
    replacements.append(replacement)
    with open(descriptor, "wb") as file:
        if target.is_file():
            os.chmod(replacement.fresh, stat.S_IMODE(target.stat().st_mode))
        file.write(content)
        file.flush()
        os.fsync(descriptor)


def _commit(replacement: _Replacement) -> None:
    target = replacement.target
    if target.is_dir():
        raise IsADirectoryError(errno.EISDIR, os.strerror(errno.EISDIR), str(target))
    if os.path.lexists(target):
        _keep(target, replacement)
    replacement.is_begun = True
    os.replace(replacement.fresh, target)


def _keep(target: Path, replacement: _Replacement) -> None:
    """Hold on to the earlier file under a second name; a copy where the file system has no hard links."""
    replacement.kept.unlink(missing_ok=True)
    try:
        os.link(target, replacement.kept)
    except OSError:
        import shutil

        shutil.copy2(target, replacement.kept)
    replacement.had_earlier = True


def _undo(replacement: _Replacement) -> None:
    if replacement.is_begun:
        if replacement.had_earlier:
            os.replace(replacement.kept, replacement.target)
        else:
            replacement.target.unlink(missing_ok=True)
    replacement.fresh.unlink(missing_ok=True)
    replacement.kept.unlink(missing_ok=True)


def _remove_if_empty(folder: Path) -> None:
    try:
        folder.rmdir()
    except OSError:
        return

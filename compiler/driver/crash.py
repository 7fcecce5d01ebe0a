"""Faults of our own: which stage it was, and a folder that reproduces it."""

from __future__ import annotations

import sys
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from pathlib import Path, PurePosixPath

from . import files

SOURCES = "sources"
"""The folder, inside that of a fault, that holds a copy of every file the run had read."""

_MOST_FOLDERS = 1000


@dataclass(slots=True)
class Trace:
    """What a run has done so far, kept in case it ends in a fault.

    `stage` is said in words; `sources` are the bytes read, by name relative to the project; `copies` turns arguments
    of the command line into the copies they stand for, and `overrides` are options that keep a repeated run inside
    its folder; `beside` is a folder near which the reader will look.
    """

    stage: str = "reading the command line"
    sources: dict[str, bytes] = field(default_factory=dict)
    copies: dict[str, str] = field(default_factory=dict)
    overrides: tuple[str, ...] = ()
    beside: Path | None = None


def keep_fault(trace: Trace, fault: BaseException, arguments: Sequence[str], temporary: Path) -> Path | None:
    """Write the folder of one fault, beside the output if it can be, else under `temporary`.

    It holds the sources read, the command that repeats the run on them, and the traceback. The folder, or None if
    no place took it. Raises nothing.
    """
    content = _describe(trace, fault, arguments)
    for place in (trace.beside, temporary):
        folder = _new_folder(place) if place is not None else None
        if folder is None:
            continue
        try:
            files.write_all({folder / name: text for name, text in content.items()})
        except OSError:
            continue
        return folder
    return None


def _describe(trace: Trace, fault: BaseException, arguments: Sequence[str]) -> dict[str, bytes]:
    import platform
    import shlex
    import traceback

    repeat = ["platewright", *_on_the_copies(trace, arguments)]
    versions = f"python {platform.python_version()} {sys.platform} {platform.machine()}"
    command = f"{shlex.join(repeat)}\n\n# as it was given: {shlex.join(['platewright', *arguments])}\n# {versions}\n"
    report = f"stage: {trace.stage}\n\n{''.join(traceback.format_exception(fault))}"
    content = {"command.txt": command, "traceback.txt": report}
    encoded = {name: text.encode("utf-8", "backslashreplace") for name, text in content.items()}
    sources = {f"{SOURCES}/{name}": source for name, source in trace.sources.items() if _is_plain(name)}
    return encoded | sources


def _on_the_copies(trace: Trace, arguments: Iterable[str]) -> list[str]:
    """The arguments with paths turned to their copies; of an option given twice the later one holds."""
    copied = [f"{SOURCES}/{trace.copies[argument]}" if argument in trace.copies else argument for argument in arguments]
    return [*copied, *trace.overrides]


def _is_plain(name: str) -> bool:
    path = PurePosixPath(name)
    return not path.is_absolute() and ".." not in path.parts


def _new_folder(place: Path) -> Path | None:
    for number in range(1, _MOST_FOLDERS + 1):
        folder = place / f"platewright-fault-{number}"
        try:
            folder.mkdir()
        except FileExistsError:
            continue
        except OSError:
            return None
        return folder
    return None

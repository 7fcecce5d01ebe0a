"""How kernels are compiled. Import this, and what uses it, only when something is drawn: numba starts slowly."""

from __future__ import annotations

import hashlib
import re
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any, TypeVar, cast

import numba

_F = TypeVar("_F", bound=Callable[..., object])

# Contraction and reciprocals may differ in the last bit between processors; NaN and infinity keep their meaning.
_FAST = {"contract", "arcp", "nsz"}
_USE = re.compile(rb"^from \.+compiled import", re.MULTILINE)
_RELATIVE = re.compile(rb"^from (\.\.?)(\w+) import", re.MULTILINE)


def kernel(function: _F) -> _F:
    """Compile exactly, and keep what comes of it: equal inputs give equal bits on any machine. Python may call it."""
    made: Any = numba.njit(nogil=True, cache=True, error_model="numpy", fastmath=False)(function)
    # numba's stored code knows only its own file's time, yet other kernels' code is built into it. With this stamp it
    # is used only while none of them has changed.
    made._cache._cache_file._source_stamp = sources_digest(Path(function.__code__.co_filename).parent)
    return cast(_F, made)


def inner(function: _F) -> _F:
    """Compile exactly what only kernels call: half the work, as it is not kept and Python can not call it."""
    return _inner(function, False)


def fast_inner(function: _F) -> _F:
    """`inner` with contraction: for shading, where the last bit does not matter."""
    return _inner(function, _FAST)


def _inner(function: _F, fastmath: Any) -> _F:
    # These two options are numba's own for all its targets, but its types leave them out.
    options: dict[str, Any] = {"no_cpython_wrapper": True, "no_cfunc_wrapper": True}
    return cast(_F, numba.njit(nogil=True, error_model="numpy", fastmath=fastmath, **options)(function))


@cache
def sources_digest(folder: Path) -> str:
    """Digest of all source text that may be built into kernels of `folder`.

    That is this module, every module of the folder that holds kernels and what those import from it or from the folder
    above. A folder that is not beside this module may use the kernels of all that are.
    """
    here = Path(__file__).parent
    folders = [folder] if folder.parent == here else [folder, *(path for path in here.iterdir() if path.is_dir())]
    files = {Path(__file__)}
    for place in folders:
        for path in place.glob("*.py"):
            text = path.read_bytes()
            if _USE.search(text):
                roots = ((place if dots == b"." else place.parent, name) for dots, name in _RELATIVE.findall(text))
                files |= {path, *(root / f"{name.decode()}.py" for root, name in roots)}
    digest = hashlib.sha256()
    for path in sorted(filter(Path.is_file, files)):
        digest.update(path.name.encode() + b"\0" + path.read_bytes())
    return digest.hexdigest()

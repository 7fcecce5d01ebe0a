"""How kernels of line drawings are compiled. Import this, and what uses it, only when something is drawn."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any, TypeVar, cast

import numba

_F = TypeVar("_F", bound=Callable[..., object])
_IMPORT = b"from .compiled import"


def kernel(function: _F) -> _F:
    """Compile exactly: no contraction and no reordering, so that equal inputs give equal bits on any machine."""
    made: Any = numba.njit(nogil=True, cache=True, error_model="numpy", fastmath=False)(function)
    # numba's stored code knows only its own file's time, yet other kernels' code is built into it. With this stamp it
    # is used only while no file of kernels has changed.
    made._cache._cache_file._source_stamp = sources_digest()
    return cast(_F, made)


@cache
def sources_digest() -> str:
    """Digest of the source text of this module and of every one in its folder that holds kernels."""
    digest = hashlib.sha256()
    for path in sorted(Path(__file__).parent.glob("*.py")):
        text = path.read_bytes()
        if path.name == Path(__file__).name or _IMPORT in text:
            digest.update(path.name.encode() + b"\0" + text)
    return digest.hexdigest()

"""How kernels are compiled. Import this, and what uses it, only when something is drawn: numba starts slowly."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any, TypeVar, cast

import numba

_F = TypeVar("_F", bound=Callable[..., object])

# Contraction and reciprocals may differ in the last bit between processors; NaN and infinity keep their meaning.
_FAST = {"contract", "arcp", "nsz"}


def kernel(function: _F) -> _F:
    """Compile exactly: for coverage and depth, where equal inputs must give equal bits."""
    return _compiled(function, False)


def fast_kernel(function: _F) -> _F:
    """Compile with contraction: for shading, where the last bit does not matter."""
    return _compiled(function, _FAST)


def _compiled(function: _F, fastmath: Any) -> _F:
    made: Any = numba.njit(nogil=True, cache=True, error_model="numpy", fastmath=fastmath)(function)
    # numba's stored code knows only its own file's time, yet other kernels' code is built into it. With this stamp it
    # is used only while no file beside this one has changed.
    made._cache._cache_file._source_stamp = sources_digest()
    return cast(_F, made)


@cache
def sources_digest() -> str:
    """Digest of the source text of every module in this folder."""
    digest = hashlib.sha256()
    for path in sorted(Path(__file__).parent.glob("*.py")):
        digest.update(path.name.encode() + b"\0" + path.read_bytes())
    return digest.hexdigest()

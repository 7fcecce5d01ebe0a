"""How the converter's kernels are compiled. Import this, and what uses it, only when something is drawn."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar, cast

import numba

_F = TypeVar("_F", bound=Callable[..., object])


def kernel(function: _F) -> _F:
    """Compile exactly: no contraction and no reordering, so that equal inputs give equal bits on any machine.

    A kernel may call inner ones of its own file only: stored code knows the time of that file alone.
    """
    return cast(_F, numba.njit(nogil=True, cache=True, error_model="numpy", fastmath=False)(function))


def inner(function: _F) -> _F:
    """Compile what only kernels call: it becomes part of them, so it is not stored and Python can not call it."""
    # These two options are numba's own for all its targets, but its types leave them out.
    options: dict[str, Any] = {"no_cpython_wrapper": True, "no_cfunc_wrapper": True}
    made = numba.njit(nogil=True, error_model="numpy", fastmath=False, **options)(function)
    return cast(_F, made)

"""How kernels are compiled. Import this, and what uses it, only when something is drawn: numba starts slowly."""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeVar, cast

import numba

_F = TypeVar("_F", bound=Callable[..., object])

# Contraction and reciprocals may differ in the last bit between processors; NaN and infinity keep their meaning.
_FAST = {"contract", "arcp", "nsz"}


def kernel(function: _F) -> _F:
    """Compile exactly: for coverage and depth, where equal inputs must give equal bits."""
    return cast(_F, numba.njit(nogil=True, cache=True, error_model="numpy")(function))


def fast_kernel(function: _F) -> _F:
    """Compile with contraction: for shading, where the last bit does not matter."""
    return cast(_F, numba.njit(nogil=True, cache=True, error_model="numpy", fastmath=_FAST)(function))

"""Sample points that repeat: the same for a key and a number, whatever is drawn beside them.

Two dimensions of Sobol's sequence (Sobol 1967; direction numbers of the second: Pascal's triangle modulo 2) with Owen's
nested scrambling (Owen 1995) by hashing, as Burley 2020 gives it ("Practical hash-based Owen scrambling", JCGT 9(4));
the hash on the bits is Laine and Karras's (2011) with Burley's constants, keys are mixed by MurmurHash3's finaliser
(Appleby). Of the points numbered 0 .. 2^m - 1 of a key every box of area 2^-m with sides of powers of two holds
exactly one, and so it is for each further run of 2^m.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import F64

_WORD = 0xFFFFFFFF
_UNIT = 1.0 / 4294967296.0


def points(keys: NDArray[np.uint32], first: int, n: int) -> F64:
    """Points first .. first + n of each key: (k,n,2) float64 in [0, 1). Keys (k,) uint32."""
    out = np.empty((len(keys), n, 2))
    _fill(np.ascontiguousarray(keys), first, out)
    return out


def keys_of(column: NDArray[np.int64], row: NDArray[np.int64], stream: int = 0) -> NDArray[np.uint32]:
    """Keys of pixels, counted on the page: (n,) uint32, so that neither bands nor windows change a picture.

    `stream` tells apart what is sampled at one pixel, such as several lights.
    """
    mixed = np.zeros(np.shape(column), np.uint64)
    for part in (column, row, stream):
        mixed = _mixed(
            (mixed + np.asarray(part, np.int64).astype(np.uint64) + np.uint64(0x9E3779B9)) & np.uint64(_WORD)
        )
    return mixed.astype(np.uint32)


def _mixed(x: NDArray[np.uint64]) -> NDArray[np.uint64]:
    mask = np.uint64(_WORD)
    x = ((x ^ (x >> np.uint64(16))) * np.uint64(0x85EBCA6B)) & mask
    x = ((x ^ (x >> np.uint64(13))) * np.uint64(0xC2B2AE35)) & mask
    return x ^ (x >> np.uint64(16))


@inner
def mix(x: Any) -> Any:
    """MurmurHash3's finaliser on 32 bits, held in an int64."""
    x = ((x ^ (x >> 16)) * 0x85EBCA6B) & _WORD
    x = ((x ^ (x >> 13)) * 0xC2B2AE35) & _WORD
    return x ^ (x >> 16)


@inner
def _reversed(x: Any) -> Any:
    x = ((x & 0x55555555) << 1) | ((x >> 1) & 0x55555555)
    x = ((x & 0x33333333) << 2) | ((x >> 2) & 0x33333333)
    x = ((x & 0x0F0F0F0F) << 4) | ((x >> 4) & 0x0F0F0F0F)
    x = ((x & 0x00FF00FF) << 8) | ((x >> 8) & 0x00FF00FF)
    return ((x << 16) | (x >> 16)) & _WORD


@inner
def _scrambled(x: Any, seed: Any) -> Any:
    """Scramble reversed bits: each bit is turned or not by a hash of those below it."""
    x = (x + seed) & _WORD
    x ^= (x * 0x6C50B47C) & _WORD
    x ^= (x * 0xB82F1E52) & _WORD
    x ^= (x * 0xC7AFE638) & _WORD
    return x ^ ((x * 0x8D22F6E6) & _WORD)


@inner
def point(key: int, number: int) -> Any:
    """Point `number` of a key: two float64 in [0, 1).

    The order is scrambled too, so that the points of two keys are paired by chance.
    """
    seed = mix(np.int64(key))
    number = _reversed(_scrambled(_reversed(np.int64(number)), seed))
    first, second, direction, rest = number, np.int64(0), np.int64(0x80000000), number
    while rest != 0:
        if rest & 1:
            second ^= direction
        direction ^= direction >> 1
        rest >>= 1
    # The first dimension is the number's bits reversed; scrambling wants them reversed once more.
    x = _reversed(_scrambled(first, mix((seed + 0x9E3779B9) & _WORD)))
    y = _reversed(_scrambled(_reversed(second), mix((seed + 0x3C6EF372) & _WORD)))
    return x * _UNIT, y * _UNIT


@kernel
def _fill(keys: Any, first: int, out: Any) -> None:
    for i in range(len(keys)):
        for j in range(out.shape[1]):
            out[i, j, 0], out[i, j, 1] = point(keys[i], first + j)

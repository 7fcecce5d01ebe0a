"""Functions of two variables as small programs, so that a recipe can hold them and a mesh can ask for them anywhere.

A program is a list of steps for a stack: `("number", value)`, `("variable", 0 or 1)`, or an operation and how many
values it takes. Lengths are mm, angles degrees.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from .recipe import Field, Grid

F64 = NDArray[np.float64]


def _divided(a: F64, b: F64) -> F64:
    return np.asarray(a / b)


def _chosen(condition: F64, a: F64, b: F64) -> F64:
    return np.asarray(np.where(condition != 0.0, a, b), np.float64)


OPERATIONS: Mapping[str, Callable[..., F64]] = MappingProxyType(
    {
        "+": np.add,
        "-": np.subtract,
        "*": np.multiply,
        "/": _divided,
        "^": np.power,
        "<": lambda a, b: (a < b) * 1.0,
        "<=": lambda a, b: (a <= b) * 1.0,
        ">": lambda a, b: (a > b) * 1.0,
        ">=": lambda a, b: (a >= b) * 1.0,
        "is": lambda a, b: (a == b) * 1.0,
        "is not": lambda a, b: (a != b) * 1.0,
        "and": lambda a, b: ((a != 0.0) & (b != 0.0)) * 1.0,
        "or": lambda a, b: ((a != 0.0) | (b != 0.0)) * 1.0,
        "not": lambda a: (a == 0.0) * 1.0,
        "negative": np.negative,
        "choice": _chosen,
        "sin": lambda a: np.sin(np.radians(a)),
        "cos": lambda a: np.cos(np.radians(a)),
        "tan": lambda a: np.tan(np.radians(a)),
        "arcsin": lambda a: np.degrees(np.arcsin(a)),
        "arccos": lambda a: np.degrees(np.arccos(a)),
        "arctan": lambda a: np.degrees(np.arctan(a)),
        "arctan of two": lambda a, b: np.degrees(np.arctan2(a, b)),
        "root": np.sqrt,
        "abs": np.abs,
        "min": np.minimum,
        "max": np.maximum,
        "floor": np.floor,
        "ceiling": np.ceil,
        "round": np.round,
    }
)


def values(field: Field | Grid, first: F64, second: F64) -> F64:
    """The function at places of one shape; not finite where it has no value. Cost: steps times places."""
    if isinstance(field, Grid):
        return _interpolated(field, first, second)
    stack: list[F64] = []
    with np.errstate(all="ignore"):
        for name, number in field.program:
            if name == "number":
                stack.append(np.full(np.shape(first), number))
            elif name == "variable":
                stack.append(second if number else first)
            else:
                taken = stack[len(stack) - int(number) :]
                del stack[len(stack) - int(number) :]
                stack.append(OPERATIONS[name](*taken))
    return np.asarray(stack[-1], np.float64)


def _interpolated(grid: Grid, x: F64, y: F64) -> F64:
    """Between the four corners of a cell, along straight lines in x and in y."""
    xs, ys, z = np.array(grid.x), np.array(grid.y), np.array(grid.z)
    i = np.clip(np.searchsorted(xs, x, "right") - 1, 0, len(xs) - 2)
    j = np.clip(np.searchsorted(ys, y, "right") - 1, 0, len(ys) - 2)
    s, t = (x - xs[i]) / (xs[i + 1] - xs[i]), (y - ys[j]) / (ys[j + 1] - ys[j])
    low = z[j, i] * (1.0 - s) + z[j, i + 1] * s
    return np.asarray(low * (1.0 - t) + (z[j + 1, i] * (1.0 - s) + z[j + 1, i + 1] * s) * t)

"""The one way from a float to text, and the two text forms built on it: a number and JSON.

A float prints as the shortest decimal that reads back as the same float64 (`repr`, IEEE 754 round trip), without
a trailing `.0`; where a caller states decimals, as exactly that many. Minus zero prints as zero, and a number that
is not finite is a fault of the caller. No locale takes part. JSON follows RFC 8259 with keys in the order given.
"""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Mapping, Sequence
from typing import TypeAlias

import numpy as np

from ..contract import F64

JsonValue: TypeAlias = "bool | int | float | str | Sequence[JsonValue] | Mapping[str, JsonValue] | None"


def number_text(value: float, decimals: int | None = None) -> str:
    """One float as text: shortest exact, or with fixed decimals. Raises ValueError if it is not finite."""
    if not math.isfinite(value):
        raise ValueError(f"{value} is not a number a file may hold")
    return next(iter(_spelled([float(value) + 0.0], decimals)))


def number_texts(values: F64, decimals: int | None = None) -> list[str]:
    """All floats of an array in C order, spelled as by `number_text`.

    Raises ValueError if one is not finite. Cost: about half a microsecond a number.
    """
    if not np.isfinite(values).all():
        raise ValueError("not finite: no number a file may hold")
    return list(_spelled((values.ravel() + 0.0).tolist(), decimals))


def row_texts(rows: F64, between: str, decimals: int | None = None) -> list[str]:
    """Each row of (n,k) floats as text, its numbers separated by `between`. Raises as `number_texts`."""
    texts = number_texts(rows, decimals)
    columns = (texts[start :: rows.shape[1]] for start in range(rows.shape[1]))
    return list(map(between.join, zip(*columns, strict=True)))


def json_text(value: JsonValue) -> str:
    """JSON without white space, floats by `number_text`, text escaped to ASCII.

    Raises ValueError on floats that are not finite, TypeError on values JSON has no form for.
    """
    match value:
        case None | bool() | int() | str():
            return json.dumps(value)
        case float():
            return number_text(value)
        case Mapping():
            return "{" + ",".join(f"{json.dumps(key)}:{json_text(item)}" for key, item in value.items()) + "}"
        case Sequence():
            return "[" + ",".join(map(json_text, value)) + "]"
    raise TypeError(f"no JSON form for {type(value).__name__}")


def _spelled(values: list[float], decimals: int | None) -> Iterable[str]:
    if decimals is None:
        return (text[:-2] if text.endswith(".0") else text for text in map(repr, values))
    form = f"%.{decimals}f"
    minus_zero, zero = form % -0.0, form % 0.0
    return (zero if text == minus_zero else text for text in map(form.__mod__, values))

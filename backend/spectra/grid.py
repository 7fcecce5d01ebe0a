"""The wavelengths that all spectra here share, how tables come onto them, and what is wrong with a table.

A spectrum is float64 (471,): one value for every nanometre from 360 to 830, the range of ISO/CIE 11664-1. Integrals
are sums over them (CIE 15). Tables are interpolated linearly, which CIE 15 prescribes for daylight and which never
makes a value that lies outside its neighbours; beyond the ends of a table its end values hold (CIE 15, 7.2.3).
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from ..contract import F64

FIRST, LAST = 360, 830
N = LAST - FIRST + 1
VISIBLE = (400.0, 700.0)
"""Range in nm that a table must cover. What lies outside adds less than 1 in 1 000 to the luminance of daylight."""

WIDEST_STEP = 20.0
"""Steps in nm up to which tables are used without a warning: the widest of ASTM E308."""


@dataclass(frozen=True, slots=True)
class Fault:
    """What is wrong with a table of a spectrum: its row from 0, a sentence, a hint; a warning unless `is_error`."""

    row: int
    sentence: str
    hint: str = ""
    is_error: bool = True


def wavelengths() -> F64:
    """Return (471,) float64, nm."""
    return np.arange(FIRST, LAST + 1, dtype=np.float64)


def on_grid(at: F64, values: F64) -> F64:
    """Spectra (471,) or (471, columns) of a table (k,) or (k, columns) over increasing wavelengths `at` (k,) nm."""
    if values.ndim == 1:
        return np.asarray(np.interp(wavelengths(), at, values), np.float64)
    return np.stack([on_grid(at, column) for column in values.T], axis=1)


def faults_of(at: F64, values: F64, is_share: bool) -> tuple[Fault, ...]:
    """What keeps a table (k,), (k,) from being a spectrum; of a share between 0 and 1 (a reflectance) if `is_share`.

    Each kind of fault is told once, at the first row that has it. Cost: linear in the rows.
    """
    if not len(at):
        return (Fault(0, "the table has no rows"),)
    found: list[Fault] = []
    falls = np.flatnonzero(np.diff(at) <= 0)
    if len(falls):
        sentence = f"expected a wavelength above {at[falls[0]]:g} nm, found {at[falls[0] + 1]:g} nm"
        return (Fault(int(falls[0]) + 1, sentence, "list the wavelengths in rising order, each once"),)
    if at[0] > VISIBLE[0] or at[-1] < VISIBLE[1]:
        sentence = f"the table runs from {at[0]:g} nm to {at[-1]:g} nm; light is seen from 400 nm to 700 nm at least"
        found.append(Fault(0, sentence, "the column of wavelengths names its unit: `wavelength nm`"))
    else:
        seen = (at[1:] > VISIBLE[0]) & (at[:-1] < VISIBLE[1])
        wide = np.flatnonzero(seen & (np.diff(at) > WIDEST_STEP))
        if len(wide):
            sentence = f"no value between {at[wide[0]]:g} nm and {at[wide[0] + 1]:g} nm; a straight line is drawn there"
            found.append(Fault(int(wide[0]), sentence, "give a value at least every 20 nm", False))
    negative = np.flatnonzero(values < 0)
    if len(negative):
        found.append(Fault(int(negative[0]), f"expected a value of 0 or more, found {values[negative[0]]:g}"))
    large = np.flatnonzero(values > 1) if is_share else np.zeros(0, np.int64)
    if len(large):
        hint = "a column of percentages names its unit: `reflectance %`"
        found.append(Fault(int(large[0]), f"expected a share from 0 to 1, found {values[large[0]]:g}", hint))
    elif not is_share and not (values > 0).any():
        found.append(Fault(0, "all values are 0: this is no light"))
    return tuple(found)


def table(name: str) -> tuple[tuple[str, ...], F64]:
    """The columns and rows of a data file of this package: float64 (rows, columns), the first of wavelengths in nm."""
    lines = Path(__file__).with_name("data").joinpath(f"{name}.csv").read_text(encoding="utf-8").split("\n")
    head, *rows = [line for line in lines if line and not line.startswith("#")]
    columns = tuple(head.split(","))
    return columns, np.array(",".join(rows).split(","), np.float64).reshape(-1, len(columns))

"""A smooth reflectance for a colour: the sigmoid of a quadratic polynomial (Jakob and Hanika 2019, equations 4 and 9).

The three coefficients are found at run time, by Newton steps with Levenberg's damping on linear RGB under the source in
which the colour was declared, from a grey toward the colour. Reflectances lie between 0 and 1 everywhere.
"""

from __future__ import annotations

from math import sqrt

import numpy as np
from numpy.typing import ArrayLike

from ..contract import F64
from .grid import N
from .illuminants import illuminant
from .tristimulus import rgb_under

N_STAGES, N_STEPS = 8, 60
LEAST = 4e-5
"""Linear values are fitted no closer to 0 and 1 than this, an eighth of an 8-bit level: a sigmoid meets neither."""

ENOUGH = 1e-9


def reflectance_of(colour: ArrayLike, matching: F64, declared_under: str = "D65") -> F64:
    """The reflectance (471,) that has linear RGB `colour` (3,) under the illuminant it was declared in.

    Cost: some hundred products of (3, 471) and (471, 3).
    """
    source = illuminant(declared_under)
    weights = source[:, None] * matching / (source @ matching[:, 1])
    to_rgb = weights @ rgb_under(source @ matching / (source @ matching[:, 1])).T
    target = np.clip(np.asarray(colour, np.float64), LEAST, 1.0 - LEAST)
    along = np.linspace(-1.0, 1.0, N)
    basis = np.stack([along**2, along, np.ones(N)], axis=1)
    grey = float(np.clip(target.mean(), 0.05, 0.95))
    coefficients = np.array([0.0, 0.0, _inverse(grey)])
    for stage in range(1, N_STAGES + 1):
        goal = grey + (target - grey) * stage / N_STAGES
        coefficients = _fitted(coefficients, goal, basis, to_rgb)
    return _sigmoid(basis @ coefficients)


def _fitted(start: F64, goal: F64, basis: F64, to_rgb: F64) -> F64:
    """Coefficients (3,) whose reflectance comes closest to the goal, from `start` on."""
    coefficients, damping = start, 1e-3
    values = basis @ coefficients
    miss = _sigmoid(values) @ to_rgb - goal
    for _ in range(N_STEPS):
        if float(miss @ miss) < ENOUGH**2:
            break
        slopes = (to_rgb.T * (0.5 * (1.0 + values**2) ** -1.5)) @ basis
        normal = slopes.T @ slopes
        step = np.linalg.solve(normal + damping * np.diag(np.diag(normal) + 1e-12), slopes.T @ miss)
        tried = basis @ (coefficients - step)
        missed = _sigmoid(tried) @ to_rgb - goal
        if float(missed @ missed) < float(miss @ miss):
            coefficients, values, miss, damping = coefficients - step, tried, missed, damping * 0.2
        else:
            damping = min(damping * 4.0, 1e12)
    return coefficients


def _sigmoid(values: F64) -> F64:
    return np.asarray(0.5 + values / (2.0 * np.sqrt(1.0 + values**2)))


def _inverse(share: float) -> float:
    return (2.0 * share - 1.0) / (2.0 * sqrt(share * (1.0 - share)))

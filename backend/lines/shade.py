"""Which outlines lie on the side away from the light of a drawing, which comes from the upper left."""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from ..contract import F64
from .model import Candidates, View

I64: TypeAlias = NDArray[np.int64]

AWAY = (0.5**0.5, 0.5**0.5)
"""Unit direction on the page, y down, in which the light of shade lines runs (common practice: from the upper left)."""
_LEAST = 0.05  # cosine: outlines along the light are not shaded


def is_away_from_light(view: View, candidates: Candidates, rows: I64) -> NDArray[np.bool_]:
    """Whether each of the candidates `rows` (k,) has what it bounds on its side toward the light. Cost: linear."""
    start, end = candidates.start.take(rows, 0)[:, :2], candidates.end.take(rows, 0)[:, :2]
    along = end - start
    away = _outward(view, candidates, rows, start, along)
    length = np.maximum(np.sqrt(along[:, 0] ** 2 + along[:, 1] ** 2), 1e-300)
    square = np.column_stack([-along[:, 1], along[:, 0]]) / length[:, None]
    side = np.sign(square[:, 0] * away[:, 0] + square[:, 1] * away[:, 1])
    return side * (square[:, 0] * AWAY[0] + square[:, 1] * AWAY[1]) > _LEAST  # type: ignore[no-any-return]


def _outward(view: View, candidates: Candidates, rows: I64, start: F64, along: F64) -> F64:
    """Directions on the page away from the surface: of a contour its normal's, of an edge away from the seen face."""
    faces = candidates.faces.take(rows, 0)
    is_seen = (faces >= 0) & (view.facing.take(np.maximum(faces, 0)) > 0)
    face = np.where(is_seen[:, 0] | (faces[:, 1] < 0), faces[:, 0], faces[:, 1])
    corner = view.points[view.faces.take(np.maximum(face, 0), axis=0)][:, :, :2]
    away = start + along / 2 - corner.mean(axis=1)
    normal = view.corner_normals.take(np.maximum(face, 0), axis=0).sum(axis=1).astype(np.float64)
    right, up = np.array(view.projection.right), np.array(view.projection.up)
    on_page = np.column_stack(
        [
            normal[:, 0] * right[0] + normal[:, 1] * right[1] + normal[:, 2] * right[2],
            -(normal[:, 0] * up[0] + normal[:, 1] * up[1] + normal[:, 2] * up[2]),
        ]
    )
    is_contour = candidates.patch.take(rows) >= 0
    result = np.where(is_contour[:, None], on_page, away)
    return np.where((face >= 0)[:, None], result, 0.0)

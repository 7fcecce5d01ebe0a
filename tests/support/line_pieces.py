"""Candidates and pieces made by hand from lines on the page, for tests of what reads them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np
from platewright.backend.contract import F64, LineClass
from platewright.backend.lines.model import Candidates, Pieces, Tolerance, number_of

TOLERANCE = Tolerance(depth_mm=1e-4, sideways_mm=1e-5)


@dataclass
class Sheet:
    """Lines put down one after another: visible or hidden polylines, each segment a candidate of one piece."""

    start: list[F64] = field(default_factory=list)
    end: list[F64] = field(default_factory=list)
    rows: list[tuple[int, int, int, bool, bool]] = field(default_factory=list)
    n_curves: int = 0

    def line(
        self,
        points: Sequence[Sequence[float]] | F64,
        line_class: LineClass = LineClass.VISIBLE_EDGE,
        node: int = 0,
        *,
        is_curve: bool = False,
        is_visible: bool = True,
        is_drawn: bool = True,
    ) -> None:
        """A polyline of points (k,2) or (k,3)."""
        xyz = np.array(points, dtype=np.float64)
        if xyz.shape[1] == 2:
            xyz = np.column_stack([xyz, np.zeros(len(xyz))])
        curve = self.n_curves if is_curve else -1
        self.n_curves += is_curve
        for a, b in pairwise(xyz):
            self.start.append(a)
            self.end.append(b)
            self.rows.append((number_of(line_class), node, curve, is_visible, is_drawn))

    def pieces(self, order: Sequence[int] | None = None) -> tuple[Pieces, Candidates]:
        """What was put down, in the order asked for."""
        n = len(self.rows)
        order = np.arange(n) if order is None else np.asarray(order)
        rows = np.array(self.rows, dtype=np.int64).reshape(n, 5)[order]
        start, end = (np.array(ends, dtype=np.float64).reshape(n, 3)[order] for ends in (self.start, self.end))
        none = np.full((n, 2), -1, dtype=np.int32)
        candidates = Candidates(
            start=start,
            end=end,
            line_class=rows[:, 0].astype(np.uint8),
            node=rows[:, 1].astype(np.int32),
            chain=rows[:, 2].astype(np.int32),
            faces=none,
            vertices=none,
            patch=np.full(n, -1, dtype=np.int32),
            allowance=np.zeros(n),
            is_drawn=rows[:, 4].astype(bool),
            is_plain=np.zeros(n, dtype=bool),
        )
        spans = np.tile([0.0, 1.0], (n, 1))
        return Pieces(np.arange(n, dtype=np.int32), spans, rows[:, 3].astype(bool), start, end), candidates


def hidden_after(pieces: Pieces, row: int, end: Sequence[float]) -> Pieces:
    """Let the candidate of one piece go on hidden to a point (3,); the piece is then the first part of it."""
    end_xyz = np.array(end, dtype=np.float64)
    size = np.linalg.norm(pieces.end[row] - pieces.start[row])
    share = float(size / np.linalg.norm(end_xyz - pieces.start[row]))
    span = pieces.span.copy()
    span[row, 1] = share
    at = row + 1
    return Pieces(
        np.insert(pieces.segment, at, pieces.segment[row]),
        np.insert(span, at, [share, 1.0], axis=0),
        np.insert(pieces.is_visible, at, False),
        np.insert(pieces.start, at, pieces.end[row], axis=0),
        np.insert(pieces.end, at, end_xyz, axis=0),
    )

"""Pieces of lines within a convex part of the page."""

from __future__ import annotations

import numpy as np

from ..contract import F64
from .model import Candidates, Pieces


def clipped(pieces: Pieces, polygon: F64) -> Pieces:
    """What lies of pieces within a convex polygon (k,2) on the page, in mm, by the half-planes of its sides.

    Depth and span are affine along a piece on the page in parallel and central projection alike, so both are cut with
    it. Method: Cyrus and Beck 1978. Cost: sides times pieces.
    """
    corners = polygon if _area(polygon) > 0.0 else polygon[::-1]
    low, high = np.zeros(len(pieces.segment)), np.ones(len(pieces.segment))
    start, along = pieces.start, pieces.end - pieces.start
    for a, b in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        side = b - a
        off = side[0] * (start[:, 1] - a[1]) - side[1] * (start[:, 0] - a[0])
        slope = side[0] * along[:, 1] - side[1] * along[:, 0]
        with np.errstate(divide="ignore", invalid="ignore"):
            at = -off / slope
        low = np.where(slope > 0.0, np.maximum(low, at), low)
        high = np.where(slope < 0.0, np.minimum(high, at), high)
        high = np.where((slope == 0.0) & (off < 0.0), -1.0, high)
    kept = np.flatnonzero(high > low)
    low, high = low[kept, None], high[kept, None]
    span, start, along = pieces.span[kept], start[kept], along[kept]
    length = span[:, 1:] - span[:, :1]
    ends = np.where(high == 1.0, pieces.end[kept], start + high * along)
    spans = np.concatenate(
        (span[:, :1] + low * length, np.where(high == 1.0, span[:, 1:], span[:, :1] + high * length)), axis=1
    )
    return Pieces(
        pieces.segment[kept], spans, pieces.is_visible[kept], np.where(low == 0.0, start, start + low * along), ends
    )


def near(candidates: Candidates, polygon: F64, margin: float) -> Candidates:
    """Candidates whose boxes on the page come within `margin` mm of a polygon's box."""
    low, high = polygon.min(axis=0) - margin, polygon.max(axis=0) + margin
    first = np.minimum(candidates.start[:, :2], candidates.end[:, :2])
    last = np.maximum(candidates.start[:, :2], candidates.end[:, :2])
    kept = np.flatnonzero(((last >= low) & (first <= high)).all(axis=1))
    return Candidates(**{name: getattr(candidates, name)[kept] for name in Candidates.__dataclass_fields__})


def _area(polygon: F64) -> float:
    following = np.roll(polygon, -1, axis=0)
    return float((polygon[:, 0] * following[:, 1] - polygon[:, 1] * following[:, 0]).sum())

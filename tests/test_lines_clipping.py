"""Pieces cut to a convex part of the page."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from platewright.backend.lines.clipping import clipped
from platewright.backend.lines.model import Pieces

SQUARE = np.array(((0.0, 0.0), (10.0, 0.0), (10.0, 10.0), (0.0, 10.0)))


def pieces(*ends: tuple[float, float, float, float]) -> Pieces:
    rows = np.array(ends)
    depth = np.arange(len(rows), dtype=np.float64)
    start = np.stack((rows[:, 0], rows[:, 1], depth), axis=1)
    end = np.stack((rows[:, 2], rows[:, 3], depth + 10.0), axis=1)
    n = len(rows)
    return Pieces(np.arange(n, dtype=np.int32), np.tile([0.0, 1.0], (n, 1)), np.ones(n, np.bool_), start, end)


def test_a_piece_across_is_cut_at_both_sides_with_its_depth_and_span() -> None:
    found = clipped(pieces((-5.0, 5.0, 15.0, 5.0)), SQUARE)
    assert np.allclose(found.start, [[0.0, 5.0, 2.5]])
    assert np.allclose(found.end, [[10.0, 5.0, 7.5]])
    assert np.allclose(found.span, [[0.25, 0.75]])


def test_a_piece_within_stays_to_the_last_bit_and_one_outside_goes() -> None:
    given_pieces = pieces((1.1, 2.2, 3.3, 4.4), (-3.0, -1.0, 13.0, -1.0), (11.0, 0.0, 20.0, 5.0))
    found = clipped(given_pieces, SQUARE)
    assert found.segment.tolist() == [0]
    assert found.start.tobytes() == given_pieces.start[:1].tobytes()
    assert found.end.tobytes() == given_pieces.end[:1].tobytes()


def test_the_way_round_of_the_polygon_does_not_matter() -> None:
    given_pieces = pieces((-5.0, 3.0, 7.0, 20.0))
    one, other = clipped(given_pieces, SQUARE), clipped(given_pieces, SQUARE[::-1].copy())
    assert np.allclose(one.start, other.start) and np.allclose(one.end, other.end)


@given(st.tuples(*[st.floats(-20.0, 30.0)] * 4))
def test_sampled_points_agree(ends: tuple[float, float, float, float]) -> None:
    found = clipped(pieces(ends), SQUARE)
    low, high = found.span[0] if len(found.segment) else (2.0, -1.0)
    for k in range(1, 40):
        t = k / 40
        x, y = ends[0] + t * (ends[2] - ends[0]), ends[1] + t * (ends[3] - ends[1])
        margin = min(x, 10.0 - x, y, 10.0 - y)
        if abs(margin) > 1e-9:
            assert (margin > 0) == (low < t < high)

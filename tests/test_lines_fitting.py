"""Chains written as lines, arcs and cubics: what is recognised, how far off it is, what stays a polygon."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.backend.contract import F64
from platewright.backend.drawing import Arc, Cubics, Lines, Path
from platewright.backend.lines.fitting import BULGE, ERROR, paths_of
from support.flattened import farthest, flattened, length


def written(points: F64, is_closed: bool = False, curve: int = -1) -> tuple[Path, float]:
    """One chain as a path, and its length."""
    paths, lengths = paths_of(
        np.ascontiguousarray(points, dtype=np.float64),
        np.array([0, len(points)]),
        np.array([is_closed]),
        np.full(len(points), curve),
    )
    return paths[0], float(lengths[0])


def on_ellipse(long: float, short: float, turn: float, angles: F64, centre: tuple[float, float] = (50.0, 40.0)) -> F64:
    u, v = long * np.cos(angles), short * np.sin(angles)
    cosine, sine = np.cos(np.radians(turn)), np.sin(np.radians(turn))
    return np.column_stack([centre[0] + u * cosine - v * sine, centre[1] + u * sine + v * cosine])


def ring(n: int) -> F64:
    return np.arange(n) * 2 * np.pi / n


def kinds(path: Path) -> list[str]:
    return [type(piece).__name__ for piece in path.pieces]


@pytest.mark.parametrize("shift", [0, 7, 31])
@pytest.mark.parametrize("is_reversed", [False, True])
def test_a_circle_is_two_arcs_from_its_left_end(shift: int, is_reversed: bool) -> None:
    points = np.roll(on_ellipse(10.0, 10.0, 0.0, ring(48)), shift, axis=0)
    path, size = written(points[::-1] if is_reversed else points, is_closed=True)
    assert path.is_closed and kinds(path) == ["Arc", "Arc"]
    assert path.start == pytest.approx((40.0, 40.0), abs=1e-9)
    first, second = path.pieces
    assert isinstance(first, Arc) and isinstance(second, Arc)
    assert first.end == pytest.approx((60.0, 40.0), abs=1e-9) and second.end == path.start
    assert first.half_axes == pytest.approx((10.0, 10.0), abs=2e-4)
    assert size == pytest.approx(2 * np.pi * 10.0, abs=1e-6)


def test_rounding_to_a_ten_thousandth_leaves_a_circle_round() -> None:
    """Half a turn is fixed badly by its ends and radii, so radii are written short and renderers stretch them."""
    for radius in np.linspace(0.5, 60.0, 40):
        path, _ = written(on_ellipse(radius, radius, 0.0, ring(200), (70.03123, 61.71771)), is_closed=True)
        arcs = [piece for piece in path.pieces if isinstance(piece, Arc)]
        rounded = [
            Arc((round(a.half_axes[0], 4), round(a.half_axes[1], 4)), 0.0, a.is_large, a.is_clockwise,
                (round(a.end[0], 4), round(a.end[1], 4)))
            for a in arcs
        ]  # fmt: skip
        start = (round(path.start[0], 4), round(path.start[1], 4))
        drawn = flattened(Path(start, tuple(rounded), True))
        assert np.abs(np.hypot(*(drawn - (70.03123, 61.71771)).T) - radius).max() < 3e-4


def test_an_ellipse_is_two_arcs_with_its_axes() -> None:
    path, size = written(on_ellipse(10.0, 4.0, 30.0, ring(60)), is_closed=True)
    first = path.pieces[0]
    assert isinstance(first, Arc) and kinds(path) == ["Arc", "Arc"]
    assert first.half_axes == pytest.approx((10.0, 4.0), abs=2e-4) and first.turn == pytest.approx(30.0, abs=1e-6)
    assert size == pytest.approx(length(on_ellipse(10.0, 4.0, 30.0, np.linspace(0, 2 * np.pi, 20001))), abs=1e-4)


@pytest.mark.parametrize("n", [3, 4, 6, 8, 12])
def test_a_polygon_stays_one(n: int) -> None:
    path, size = written(on_ellipse(10.0, 10.0, 0.0, ring(n)), is_closed=True)
    assert kinds(path) == ["Lines"]
    assert size == pytest.approx(2 * n * 10.0 * np.sin(np.pi / n))


def test_an_arc_cut_off_a_chord_ends_on_the_circle() -> None:
    points = on_ellipse(10.0, 10.0, 0.0, np.linspace(0.3, 3.0, 24))
    points[-1] = points[-2] + 0.4 * (points[-1] - points[-2])
    path, _ = written(points)
    assert set(kinds(path)) == {"Arc"}
    end = flattened(path)[-1]
    assert np.hypot(*(end - (50.0, 40.0))) == pytest.approx(10.0, abs=1e-6)
    assert np.hypot(*(end - points[-1])) <= BULGE


def test_an_arc_joined_to_others_keeps_its_ends() -> None:
    arc = on_ellipse(10.0, 10.0, 0.0, np.linspace(0.0, np.pi / 2, 14))
    points = np.vstack([[[75.0, 30.0]], arc, [[50.0, 70.0]]])
    path, _ = written(points)
    assert kinds(path) == ["Lines", "Arc", "Lines"]
    drawn = flattened(path)
    assert farthest(arc[[0, -1]], drawn) < 1e-9 and farthest(points, drawn) < ERROR


def test_a_slot_is_two_lines_and_two_half_turns() -> None:
    angles = np.linspace(-np.pi / 2, np.pi / 2, 26)
    right = np.column_stack([20 + 5 * np.cos(angles), 5 * np.sin(angles)])
    path, size = written(np.vstack([right, -right + [20.0, 0.0]]), is_closed=True)
    assert kinds(path) == ["Arc", "Arc", "Lines", "Arc", "Arc", "Lines"]
    assert size == pytest.approx(2 * np.pi * 5 + 40.0, abs=1e-4)


def test_a_straight_run_is_one_line() -> None:
    points = np.column_stack([np.linspace(0, 30, 40), np.linspace(0, 7, 40)])
    path, _ = written(points)
    assert len(path.pieces) == 1 and isinstance(path.pieces[0], Lines) and len(path.pieces[0].points) == 1


def test_a_corner_stays_sharp() -> None:
    t = np.linspace(0, 3, 40)
    wave = np.column_stack([t * 8, np.sin(2 * t) * 3])
    points = np.vstack([wave, wave[-1] + [[0.0, 6.0]]])
    drawn = flattened(written(points)[0])
    assert np.abs(drawn - wave[-1]).sum(axis=1).min() < 1e-9
    assert farthest(points, drawn) < ERROR


def test_pieces_of_one_curve_are_smooth_at_sharper_bends() -> None:
    """Five chords of a ring of 0.24 mm turn 72 degrees a point: only the number of its curve tells it is round."""
    points = on_ellipse(0.12, 0.12, 0.0, ring(5))
    assert kinds(written(points, True, curve=3)[0]) == ["Arc", "Arc"]
    assert kinds(written(points, True)[0]) == ["Lines"]


@given(
    long=st.floats(0.5, 80.0),
    share=st.floats(0.12, 1.0),
    turn=st.floats(-89.0, 89.0),
    begin=st.floats(0.0, 6.2),
    sweep=st.floats(0.6, 6.0),
    chord_error=st.floats(0.002, 0.02),
)
@settings(max_examples=60, deadline=None)
def test_any_stretch_of_an_ellipse_is_close(
    long: float, share: float, turn: float, begin: float, sweep: float, chord_error: float
) -> None:
    n = max(6, int(np.ceil(sweep / (2 * np.arccos(1 - min(chord_error / long, 0.1))))) + 1)
    points = on_ellipse(long, long * share, turn, np.linspace(begin, begin + sweep, n))
    path, size = written(points)
    drawn = flattened(path)
    assert farthest(points, drawn) < ERROR
    assert farthest(drawn, points) < BULGE + ERROR
    assert size == pytest.approx(length(drawn), rel=2e-3)


@given(
    waves=st.lists(st.tuples(st.integers(1, 5), st.floats(-3, 3), st.floats(-3, 3)), min_size=1, max_size=4),
    n=st.integers(60, 300),
    is_closed=st.booleans(),
)
@settings(max_examples=40, deadline=None)
def test_any_smooth_curve_is_close(waves: list[tuple[int, float, float]], n: int, is_closed: bool) -> None:
    t = ring(n)
    points = np.column_stack([20 * np.cos(t), 15 * np.sin(t)])
    for k, a, b in waves:
        points += np.column_stack([a * np.cos(k * t), b * np.sin(k * t)])
    path, size = written(points, is_closed)
    drawn = flattened(path)
    assert farthest(points, drawn) < ERROR
    assert farthest(drawn, np.vstack([points, points[:1]]) if is_closed else points) < BULGE + ERROR
    assert size == pytest.approx(length(drawn), rel=1e-3)


def test_a_free_curve_takes_few_cubics() -> None:
    x = np.linspace(0, 60, 400)
    path, _ = written(np.column_stack([x, 5 * np.sin(x / 6)]))
    assert {type(piece) for piece in path.pieces} == {Cubics}
    assert sum(len(piece.points) // 3 for piece in path.pieces if isinstance(piece, Cubics)) <= 16


@given(st.lists(st.tuples(st.integers(0, 400), st.integers(0, 400)), min_size=2, max_size=40, unique=True))
@settings(max_examples=150, deadline=None)
def test_any_polyline_is_close(cells: list[tuple[int, int]]) -> None:
    points = np.array(cells, dtype=np.float64) * 0.05
    path, _ = written(points)
    drawn = flattened(path)
    if len(points) > 2:
        assert farthest(points[1:-1], drawn) < ERROR
    assert farthest(points[[0, -1]], drawn) <= BULGE + ERROR
    assert farthest(drawn, points) < BULGE + ERROR


def test_no_chains_are_no_paths() -> None:
    paths, lengths = paths_of(np.zeros((0, 2)), np.zeros(1, np.int64), np.zeros(0, bool), np.zeros(0, np.int64))
    assert paths == () and len(lengths) == 0

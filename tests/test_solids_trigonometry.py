"""Exact trigonometry, affine placements and the chord-error ladder."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from platewright.compiler.solids import ladder, transform
from platewright.compiler.trigonometry import circle_points, circle_table, cos_deg, sin_deg, tan_deg

angles = st.floats(-1e4, 1e4)
directions = st.tuples(*[st.floats(-1, 1)] * 3).filter(lambda v: math.hypot(*v) > 1e-3)


@pytest.mark.parametrize("turns", [-2, -1, 0, 1, 3])
def test_multiples_of_30_and_90_are_exact(turns: int) -> None:
    whole = 360.0 * turns
    half_root_3, half_root_2 = math.sqrt(3) / 2, math.sqrt(0.5)
    expected = [1.0, half_root_3, half_root_2, 0.5, 0.0, -0.5, -half_root_2, -half_root_3]
    expected += [-1.0, -half_root_3, -half_root_2, -0.5, 0.0, 0.5, half_root_2, half_root_3]
    marks = (0, 30, 45, 60, 90, 120, 135, 150, 180, 210, 225, 240, 270, 300, 315, 330)
    assert [cos_deg(whole + a) for a in marks] == expected
    assert [sin_deg(whole + a + 90) for a in marks] == expected
    assert tan_deg(whole + 45) == 1.0
    assert tan_deg(whole + 135) == -1.0
    assert tan_deg(whole + 225) == 1.0
    assert tan_deg(whole + 180) == 0.0
    assert tan_deg(whole + 90) == math.inf


@given(angles)
def test_agrees_with_the_library_elsewhere(angle: float) -> None:
    assert cos_deg(angle) == pytest.approx(math.cos(math.radians(angle)), abs=5e-14)
    assert sin_deg(angle) == pytest.approx(math.sin(math.radians(angle)), abs=5e-14)
    assert cos_deg(-angle) == cos_deg(angle)
    assert sin_deg(-angle) == -sin_deg(angle)


@pytest.mark.parametrize("n", [8, 12, 16, 20, 24, 36, 100, 360, 1024])
def test_circle_table_is_symmetric_to_the_bit(n: int) -> None:
    table = circle_table(n)
    as_set = {tuple(row) for row in table.tolist()}
    assert len(as_set) == n
    for x, y in as_set:
        assert {(-x + 0.0, y), (x, -y + 0.0), (y, x), (-y + 0.0, x)} <= as_set
    assert table[0].tolist() == [1.0, 0.0]
    assert table[n // 4].tolist() == [0.0, 1.0]
    k = np.arange(n)
    assert np.abs(table - np.column_stack((np.cos(math.tau * k / n), np.sin(math.tau * k / n)))).max() < 1e-15
    if n % 12 == 0:
        assert table[n // 12, 1] == 0.5


@given(st.integers(1, 10_000), st.lists(st.integers(-50_000, 50_000), max_size=20))
def test_marks_alone_are_those_of_the_table(quarter: int, marks: list[int]) -> None:
    table = circle_table(4 * quarter)
    rows = np.array(marks, int)
    assert np.array_equal(circle_points(4 * quarter, rows), table[rows % (4 * quarter)])


@pytest.mark.parametrize("n", [0, 2, 6, 10])
def test_circle_table_refuses_other_divisions(n: int) -> None:
    with pytest.raises(ValueError, match="multiple of 4"):
        circle_table(n)


def test_four_quarter_turns_are_no_turn() -> None:
    quarter = transform.turn(90.0, (0.0, 0.0, 1.0), (3.0, 4.0, 5.0))
    assert transform.compose(quarter, quarter, quarter, quarter) == transform.IDENTITY
    assert transform.turn(90.0, (0.0, 0.0, 2.0)) == (
        (0.0, -1.0, 0.0, 0.0),
        (1.0, 0.0, 0.0, 0.0),
        (0.0, 0.0, 1.0, 0.0),
    )


def test_last_argument_of_compose_acts_first() -> None:
    both = transform.compose(transform.translate((1.0, 0.0, 0.0)), transform.turn(90.0, (0.0, 0.0, 1.0)))
    assert transform.apply(both, np.array([1.0, 0.0, 0.0])).tolist() == [1.0, 1.0, 0.0]
    assert transform.compose() == transform.IDENTITY


@given(angles, directions, directions)
def test_turn_is_rigid_and_leaves_its_axis(angle: float, axis: transform.Point3, through: transform.Point3) -> None:
    turned = transform.turn(angle, axis, through)
    linear = transform.matrix(turned)[:3, :3]
    assert np.abs(linear @ linear.T - np.eye(3)).max() < 1e-14
    assert transform.determinant(turned) == pytest.approx(1.0, abs=1e-14)
    assert transform.largest_scale(turned) == 1.0
    on_axis = np.array(through) + 7.0 * np.array(axis)
    assert np.abs(transform.apply(turned, on_axis) - on_axis).max() < 1e-13


@given(directions)
def test_facing_takes_z_to_the_direction(direction: transform.Point3) -> None:
    turned = transform.facing(direction)
    linear = transform.matrix(turned)[:3, :3]
    assert np.abs(linear @ linear.T - np.eye(3)).max() < 1e-13
    assert np.abs(linear[:, 2] - np.array(direction) / math.hypot(*direction)).max() < 1e-15
    assert transform.determinant(turned) > 0.0
    assert linear[2, 1] == 0.0, "y stays level"


@given(directions, directions)
def test_mirror_undoes_itself(normal: transform.Point3, through: transform.Point3) -> None:
    mirrored = transform.mirror(normal, through)
    assert transform.determinant(mirrored) == pytest.approx(-1.0, abs=1e-14)
    twice = transform.matrix(transform.compose(mirrored, mirrored))
    assert np.abs(twice - np.eye(4)).max() < 1e-13
    assert np.abs(transform.apply(mirrored, np.array(through)) - through).max() < 1e-14


def test_scale_has_a_fixed_point_and_a_largest_factor() -> None:
    grown = transform.scale((1.0, 2.0, 0.5), (1.0, 1.0, 1.0))
    assert transform.apply(grown, np.ones(3)).tolist() == [1.0, 1.0, 1.0]
    assert transform.largest_scale(grown) == pytest.approx(2.0)
    assert transform.from_matrix(transform.matrix(grown)) == grown


@pytest.mark.parametrize("make", [transform.facing, transform.mirror, lambda v: transform.turn(1.0, v)])
def test_no_direction_is_a_bug(make: object) -> None:
    with pytest.raises(ValueError, match="no direction"):
        make((0.0, 0.0, 0.0))  # type: ignore[operator]


def test_rungs_are_a_series_of_1_2_5() -> None:
    rungs = ladder.rungs()
    assert rungs[0] == ladder.COARSEST
    assert rungs[-1] == ladder.FINEST
    assert len(rungs) == 25
    assert {0.1, 0.05, 0.02, 0.01, 0.005} <= set(rungs)
    ratios = {round(a / b, 9) for a, b in pairwise(rungs)}
    assert ratios == {2.0, 2.5}


@given(st.floats(1e-7, 1e5))
def test_first_at_most_is_the_coarsest_that_will_do(error: float) -> None:
    rung = ladder.first_at_most(error)
    assert rung in ladder.rungs()
    if error >= ladder.FINEST:
        assert rung <= error * (1 + 1e-9)
        coarser = [r for r in ladder.rungs() if r > rung]
        assert not coarser or coarser[-1] > error


@given(st.floats(1e-3, 1e5), st.floats(1e-5, 1e3))
def test_divisions_keep_the_chord_error(radius: float, rung: float) -> None:
    n = ladder.divisions(radius, rung)
    assert n % 4 == 0
    assert n >= 8
    assert 2.0 * radius * math.sin(math.pi / (2 * n)) ** 2 <= rung * (1 + 1e-9)
    if n > 8:
        assert 2.0 * radius * math.sin(math.pi / (2 * (n - 4))) ** 2 > rung * (1 - 1e-9)


@pytest.mark.parametrize(("radius", "rung"), [(0.0, 1.0), (1.0, 0.0), (-1.0, 1.0), (math.nan, 1.0)])
def test_divisions_of_nothing_are_a_bug(radius: float, rung: float) -> None:
    with pytest.raises(ValueError, match="radius"):
        ladder.divisions(radius, rung)

"""Pieces of lines joined: each place drawn once, nothing lost, the same whatever the order."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.backend.contract import F64, LineClass, Style
from platewright.backend.drawing import Lines
from platewright.backend.lines.joining import PRECEDENCE, Chain, chains_of
from platewright.backend.lines.model import number_of
from platewright.backend.lines.noding import near, snapped, sorted_rows, split
from support.flattened import farthest, flattened, length
from support.line_pieces import TOLERANCE, Sheet, hidden_after

C = LineClass
STYLE = Style()
JOINT = TOLERANCE.joint_mm


def joined(sheet: Sheet, style: Style = STYLE, order: list[int] | None = None) -> tuple[Chain, ...]:
    return chains_of(*sheet.pieces(order), TOLERANCE, style)


def told(chains: tuple[Chain, ...]) -> list[tuple[LineClass, int, list[tuple[float, float]]]]:
    """Chains as (class, part, points to 0.01 mm), each from its lesser end."""
    result = []
    for chain in chains:
        points = [(round(x, 2) + 0.0, round(y, 2) + 0.0) for x, y in flattened(chain.path).tolist()]
        result.append((chain.line_class, chain.node, min(points, points[::-1])))
    return result


def test_overlapping_pieces_of_two_parts_are_one_line_of_the_first() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (10, 0)], node=1)
    sheet.line([(5, 0), (15, 0)], node=0)
    assert told(joined(sheet)) == [(C.VISIBLE_EDGE, 0, [(5, 0), (15, 0)]), (C.VISIBLE_EDGE, 1, [(0, 0), (5, 0)])]


def test_a_rank_of_parts_settles_whose_the_line_is() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (10, 0)], node=1)
    sheet.line([(0, 0), (10, 0)], node=0)
    chains = chains_of(*sheet.pieces(), TOLERANCE, STYLE, rank=np.array([7, 3]))
    assert [chain.node for chain in chains] == [1]


@pytest.mark.parametrize(
    ("stays", "goes"),
    [
        (C.VISIBLE_OUTLINE, C.VISIBLE_EDGE),
        (C.VISIBLE_EDGE, C.IMAGINARY_INTERSECTION),
        (C.SECTION_OUTLINE, C.VISIBLE_OUTLINE),
        (C.VISIBLE_EDGE, C.CENTRE_LINE),
        (C.CUTTING_PLANE, C.CENTRE_LINE),
    ],
)
def test_of_coinciding_lines_the_one_that_takes_precedence_stays(stays: LineClass, goes: LineClass) -> None:
    sheet = Sheet()
    sheet.line([(0, 5), (20, 5)], goes, node=0)
    sheet.line([(5, 5), (9, 5)], stays, node=1)
    short = 1 if goes is C.IMAGINARY_INTERSECTION else 0  # it stops short of the other
    ends = [(0 + short, 5), (5 - short, 5)], [(9 + short, 5), (20 - short, 5)]
    assert told(joined(sheet)) == [(stays, 1, [(5, 5), (9, 5)]), (goes, 0, ends[0]), (goes, 0, ends[1])]


def test_every_class_has_a_precedence() -> None:
    assert sorted(PRECEDENCE) == sorted(LineClass)


def test_hidden_lines_are_drawn_on_request_and_never_under_visible_ones() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (10, 0)], C.VISIBLE_EDGE)
    sheet.line([(4, 0), (20, 0)], C.VISIBLE_OUTLINE, is_visible=False)
    sheet.line([(0, 9), (20, 9)], C.VISIBLE_EDGE, is_visible=False)
    sheet.line([(0, 12), (20, 12)], C.IMAGINARY_INTERSECTION, is_visible=False)
    assert told(joined(sheet)) == [(C.VISIBLE_EDGE, 0, [(0, 0), (10, 0)])]
    assert told(joined(sheet, Style(hidden=True))) == [
        (C.VISIBLE_EDGE, 0, [(0, 0), (10, 0)]),
        (C.HIDDEN_OUTLINE, 0, [(10, 0), (20, 0)]),
        (C.HIDDEN_EDGE, 0, [(0, 9), (20, 9)]),
    ]


def test_undrawn_candidates_are_in_no_chain() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (10, 0)], is_drawn=False)
    assert joined(sheet) == ()


def test_a_piece_too_short_that_joins_nothing_is_left_out() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (10, 0)])
    sheet.line([(10, 0), (10.1, 0.1)], C.VISIBLE_OUTLINE)
    sheet.line([(5, 5), (5.1, 5.1)])
    sheet.line([(7, 7), (7.3, 7)])
    assert [points for _, _, points in told(joined(sheet))] == [
        [(10, 0), (10.1, 0.1)],
        [(0, 0), (10, 0)],
        [(7, 7), (7.3, 7)],
    ]


def test_pieces_run_on_where_two_meet_and_straight_on_where_more_do() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (5, 0)])
    sheet.line([(5, 0), (5, 4)])
    sheet.line([(5, 0), (9, 0)])
    sheet.line([(5, 4), (9, 4)])
    assert told(joined(sheet)) == [
        (C.VISIBLE_EDGE, 0, [(0, 0), (9, 0)]),
        (C.VISIBLE_EDGE, 0, [(5, 0), (5, 4), (9, 4)]),
    ]


def test_classes_and_parts_are_not_strung_together() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (5, 0)], node=0)
    sheet.line([(5, 0), (9, 0)], node=1)
    sheet.line([(9, 0), (12, 0)], C.VISIBLE_OUTLINE, node=1)
    assert len(joined(sheet)) == 3


def test_a_loop_is_closed() -> None:
    sheet = Sheet()
    for a, b in (((0, 0), (5, 0)), ((5, 5), (5, 0)), ((5, 5), (0, 5)), ((0, 0), (0, 5))):
        sheet.line([a, b])
    (chain,) = joined(sheet)
    assert chain.path.is_closed and chain.length == pytest.approx(20.0)


def test_gaps_within_a_joint_are_closed() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (5, 0)])
    sheet.line([(5 + 0.6 * JOINT, 0), (9, 0)])
    (chain,) = joined(sheet)
    assert chain.length == pytest.approx(9.0, abs=2 * JOINT)


def test_a_line_is_one_path_through_points_where_others_end() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (20, 0)])
    for x in range(2, 18, 3):
        sheet.line([(x, 0), (x, 5)], node=1)
    assert told(joined(sheet))[0] == (C.VISIBLE_EDGE, 0, [(0, 0), (20, 0)])


def test_a_cut_end_behind_a_nearer_line_is_told() -> None:
    """By height: behind; at the depth of the line it ends on; ends there; ends free; hidden only for a hair."""
    sheet = Sheet()
    sheet.line([(5, -9, 0), (5, 11, 0)], C.VISIBLE_OUTLINE, 1)
    for y, x, depth in ((0, 5, 3), (2, 5, 0), (4, 5, 3), (6, 4, 3), (8, 5, 3)):
        sheet.line([(0, y, depth), (x, y, depth)])
    pieces, candidates = sheet.pieces()
    for row, end in ((5, (5.1, 8, 3)), (4, (9, 6, 3)), (2, (9, 2, 0)), (1, (9, 0, 3))):
        pieces = hidden_after(pieces, row, end)
    chains = chains_of(pieces, candidates, TOLERANCE, Style(gap=0.7))
    behind = {round(chain.path.start[1]): chain.is_behind for chain in chains if chain.node == 0}
    never = (False, False)
    assert behind == {0: (False, True), 2: never, 4: never, 6: never, 8: never}
    assert not any(any(chain.is_behind) for chain in chains_of(pieces, candidates, TOLERANCE, STYLE))


def test_a_curve_in_short_pieces_passes_behind_too() -> None:
    sheet = Sheet()
    sheet.line([(5, -9, 0), (5, 9, 0)], C.VISIBLE_OUTLINE, 1)
    x = np.arange(0, 5.01, 0.25)
    sheet.line(np.column_stack([x, 0.02 * x**2, 3 + 0 * x]), is_curve=True)
    sheet.line(np.column_stack([x + 5.1, 0.02 * (x + 5.1) ** 2, 3 + 0 * x]), is_curve=True, is_visible=False)
    pieces, candidates = sheet.pieces()
    last = len(x) - 1
    chain = candidates.chain.copy()
    chain[last + 1 :] = chain[last]
    pieces = hidden_after(pieces, last, tuple(candidates.start[last + 1]))
    (curve,) = (
        c for c in chains_of(pieces, replace(candidates, chain=chain), TOLERANCE, Style(gap=0.7)) if c.node == 0
    )
    assert curve.is_behind == (False, True)


def test_imaginary_lines_keep_clear() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (20, 0), (20, 20), (0, 20), (0, 0)], C.VISIBLE_OUTLINE)
    sheet.line([(0, 5), (20, 5)], C.IMAGINARY_INTERSECTION)
    sheet.line([(0, 5.6), (10, 5.6), (19, 8)], C.IMAGINARY_INTERSECTION)
    sheet.line([(3, 19.5), (17, 19.5)], C.IMAGINARY_INTERSECTION)
    found = [flattened(chain.path) for chain in joined(sheet) if chain.line_class is C.IMAGINARY_INTERSECTION]
    assert found[0].tolist() == [[1.0, 5.0], [19.0, 5.0]]
    assert len(found) == 2
    nearest = np.abs(found[1][:, 1] - 5.0).min()
    assert 0.7 < nearest < 0.75 and found[1][:, 0].max() < 18.1
    assert not [chain for chain in joined(sheet, replace(STYLE, tangent=False)) if "imaginary" in chain.line_class]


# Lattice lines: every segment lies on one of a few lines, so what should be drawn is known by construction.
DIRECTIONS = ((1.0, 0.0), (0.0, 1.0), (0.8, 0.6), (-0.6, 0.8))
SEGMENTS = st.lists(
    st.tuples(st.integers(0, 3), st.integers(0, 5), st.integers(0, 60), st.integers(1, 30), st.integers(0, 2)),
    min_size=1,
    max_size=60,
)


def lattice(segments: list[tuple[int, int, int, int, int]], one_class: bool = True) -> Sheet:
    sheet = Sheet()
    for direction, line, begin, size, node in segments:
        (dx, dy), offset = DIRECTIONS[direction], 3.7 * line
        ends = [(50 - dy * offset + dx * t * 0.5, 50 + dx * offset + dy * t * 0.5) for t in (begin, begin + size)]
        sheet.line(ends, C.VISIBLE_EDGE if one_class else (C.VISIBLE_OUTLINE, C.VISIBLE_EDGE)[node % 2], node)
    return sheet


def union_length(segments: list[tuple[int, int, int, int, int]]) -> float:
    cells = {(d, line, begin + k) for d, line, begin, size, _ in segments for k in range(size)}
    return len(cells) * 0.5


def ends_of(sheet: Sheet) -> list[F64]:
    return [np.array([a[:2], b[:2]]) for a, b in zip(sheet.start, sheet.end, strict=True)]


@given(SEGMENTS)
@settings(max_examples=50, deadline=None)
def test_joined_lines_cover_what_was_given_once(segments: list[tuple[int, int, int, int, int]]) -> None:
    sheet = lattice(segments)
    chains = joined(sheet)
    drawn = [flattened(chain.path) for chain in chains]
    assert sum(map(length, drawn)) == pytest.approx(union_length(segments), abs=1e-2)
    assert sum(chain.length for chain in chains) == pytest.approx(union_length(segments), abs=1e-2)
    for given_line in ends_of(sheet):
        places = given_line[0] + np.linspace(0, 1, 23)[:, None] * (given_line[1] - given_line[0])
        away = np.array([[farthest(place[None], line) for line in drawn] for place in places]).min(axis=1)
        assert away.max() < 2 * JOINT
    for line in drawn:
        middles = (line[:-1] + line[1:]) / 2
        away = np.array([[farthest(m[None], g) for g in ends_of(sheet)] for m in np.vstack([line, middles])])
        assert away.min(axis=1).max() < 2 * JOINT


@given(SEGMENTS, st.randoms(use_true_random=False))
@settings(max_examples=100, deadline=None)
def test_the_order_of_pieces_does_not_matter(segments: list[tuple[int, int, int, int, int]], random: object) -> None:
    sheet = lattice(segments, one_class=False)
    order = list(range(len(segments)))
    random.shuffle(order)  # type: ignore[attr-defined]
    assert exactly(joined(sheet)) == exactly(joined(sheet, order=order))


@given(SEGMENTS)
@settings(max_examples=60, deadline=None)
def test_the_direction_of_pieces_does_not_matter(segments: list[tuple[int, int, int, int, int]]) -> None:
    sheet = lattice(segments, one_class=False)
    turned = lattice(segments, one_class=False)
    turned.start, turned.end = turned.end, turned.start
    assert exactly(joined(sheet)) == exactly(joined(turned))


def exactly(chains: tuple[Chain, ...]) -> list[tuple[object, ...]]:
    return [
        (
            *(chain.line_class, chain.node, chain.path.is_closed, chain.length, chain.path.start),
            *(piece.points.tobytes() if isinstance(piece, Lines) else repr(piece) for piece in chain.path.pieces),
        )
        for chain in chains
    ]


def test_a_curve_broken_by_hidden_stretches_and_shuffled_is_one_path() -> None:
    t = np.linspace(0, 2 * np.pi, 81)
    sheet = Sheet()
    sheet.line(np.column_stack([30 + 20 * np.cos(t), 30 + 8 * np.sin(t)]), C.VISIBLE_OUTLINE, is_curve=True)
    order = np.random.default_rng(4).permutation(80).tolist()
    (chain,) = joined(sheet, order=order)
    assert chain.path.is_closed and len(chain.path.pieces) == 2


@given(st.lists(st.tuples(st.integers(-300, 300), st.integers(-300, 300)), min_size=1, max_size=200))
@settings(max_examples=100, deadline=None)
def test_ends_move_no_farther_than_stated(cells: list[tuple[int, int]]) -> None:
    xy = np.array(cells, dtype=np.float64) * 1.3e-4
    number, points = snapped(xy, JOINT)
    assert np.hypot(*(points[number] - xy).T).max() <= 1.71 * JOINT
    apart = np.hypot(*(points[:, None] - points[None]).transpose(2, 0, 1)) + np.eye(len(points))
    assert apart.min() >= JOINT * (1 - 1e-9)
    order = np.random.default_rng(len(cells)).permutation(len(cells))
    number_2, points_2 = snapped(xy[order], JOINT)
    assert np.array_equal(points, points_2) and np.array_equal(number[order], number_2)


@given(st.integers(0, 2**32 - 1), st.sampled_from([0.001, 0.3, 4.0]), st.booleans())
@settings(max_examples=60, deadline=None)
def test_near_points_are_those_found_by_trying_all(seed: int, reach: float, is_crowded: bool) -> None:
    random = np.random.default_rng(seed)
    points = random.uniform(0, 30, (random.integers(1, 300), 2))
    if is_crowded:
        points[: len(points) // 2] = points[: len(points) // 2] * 1e-3 + 7.0
    start = random.uniform(0, 30, (40, 2))
    end = start + random.normal(0, 1, (40, 2)) * random.choice([0.0, 0.1, 5.0], (40, 1)) * random.integers(
        0, 2, (40, 2)
    )
    start[:10], end[:10] = points[random.integers(0, len(points), 10)], points[random.integers(0, len(points), 10)]
    segment, point = near(points, start, end, reach)
    along = end - start
    away = points[None] - start[:, None]
    place = (away * along[:, None]).sum(axis=2) / np.maximum((along**2).sum(axis=1), 1e-300)[:, None]
    distance = np.hypot(*(away - np.clip(place, 0, 1)[:, :, None] * along[:, None]).transpose(2, 0, 1))
    sure = np.abs(distance - reach) > 1e-9
    found = np.zeros(distance.shape, bool)
    found[segment, point] = True
    assert np.array_equal(found[sure], (distance <= reach)[sure])
    assert len(set(zip(segment.tolist(), point.tolist(), strict=True))) == len(segment)


def test_split_cuts_only_where_lines_lie_one_on_the_other() -> None:
    points = np.array([[0.0, 0.0], [10.0, 0.0], [4.0, 0.0], [14.0, 0.0], [4.0, 6.0]])
    ends = np.array([[0, 1], [2, 3], [2, 4]])
    parts, source = split(ends, points, JOINT)
    assert sorted(map(tuple, np.sort(parts, axis=1).tolist())) == [(0, 2), (1, 2), (1, 2), (1, 3), (2, 4)]
    assert sorted(source.tolist()) == [0, 0, 1, 1, 2]
    alone, _ = split(ends[[0, 2]], points, JOINT)
    assert len(alone) == 2


def test_rows_are_sorted_as_they_stand() -> None:
    keys = np.random.default_rng(3).integers(0, 2**40, 5000) >> 30
    assert np.array_equal(sorted_rows(keys), np.argsort(keys, kind="stable"))


def test_a_flush_line_is_one_whatever_the_classes_are() -> None:
    for one in (C.VISIBLE_OUTLINE, C.VISIBLE_EDGE):
        sheet = Sheet()
        sheet.line([(0, 0), (10, 0)], one, 0)
        sheet.line([(10, 1e-4), (0, -1e-4)], C.VISIBLE_OUTLINE, 1)
        (chain,) = joined(sheet)
        assert chain.line_class is C.VISIBLE_OUTLINE


def test_class_numbers_are_those_of_the_model() -> None:
    sheet = Sheet()
    sheet.line([(0, 0), (10, 0)], C.TRACE_LINE)
    assert sheet.pieces()[1].line_class.tolist() == [number_of(C.TRACE_LINE)]
    assert [chain.line_class for chain in joined(sheet)] == [C.TRACE_LINE]


def test_nothing_gives_nothing() -> None:
    assert joined(Sheet()) == ()

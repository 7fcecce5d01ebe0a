"""Chains as strokes: widths, order, groups, dashes at ends and corners, gaps and shade lines."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.backend.contract import F64, LineClass, Node, Style
from platewright.backend.drawing import Arc, Cubics, Group, Lines, Path, Stroke
from platewright.backend.lines.dashes import chain_line, dashes_of, laid_out
from platewright.backend.lines.joining import Chain, chains_of
from platewright.backend.lines.pen import groups_of, strokes_of
from platewright.backend.lines.tracks import track_of
from platewright.backend.lines.weights import DASHED, LONG_DASHED_DOTTED, LONG_DASHED_DOUBLE_DOTTED, Pattern, weight_of
from support.flattened import farthest, flattened, length
from support.line_pieces import TOLERANCE, Sheet, hidden_after

C = LineClass
STYLE = Style(hidden=True)
PATTERNS = (DASHED, LONG_DASHED_DOTTED, LONG_DASHED_DOUBLE_DOTTED)


def straight(*points: tuple[float, float], is_closed: bool = False) -> Path:
    return Path(points[0], (Lines(np.array(points[1:], dtype=np.float64)),), is_closed)


def chain(path: Path, line_class: LineClass = C.VISIBLE_EDGE, node: int = 0) -> Chain:
    return Chain(path, line_class, node, True, track_of(path).length)


def nodes(*paths: str) -> list[Node]:
    return [Node(path, path, -1, np.eye(4)) for path in paths]


def ring(radius: float) -> Path:
    """A circle from its left end at the origin."""
    ends = ((2 * radius, 0.0), (0.0, 0.0))
    return Path((0.0, 0.0), tuple(Arc((radius, radius), 0.0, False, True, end) for end in ends), True)


CURVES = [
    straight((0, 0), (30, 0)),
    straight((0, 0), (30, 0), (30, 20), (12, 20)),
    straight((0, 0), (30, 0), (30, 20), (0, 20), is_closed=True),
    ring(10.0),
    Path((0.0, 0.0), (Arc((20.0, 8.0), 30.0, True, False, (9.0, 5.0)),)),
    Path((0.0, 0.0), (Cubics(np.array([[10.0, 20.0], [20.0, -20.0], [30.0, 5.0]])), Lines(np.array([[45.0, 5.0]])))),
]


@pytest.mark.parametrize("path", CURVES)
def test_a_track_is_as_long_as_its_path(path: Path) -> None:
    assert track_of(path).length == pytest.approx(length(flattened(path)), rel=1e-3)


@pytest.mark.parametrize("path", CURVES)
@given(st.floats(0.0, 1.0), st.floats(0.0, 1.0))
@settings(max_examples=40, deadline=None)
def test_a_stretch_lies_on_its_path_and_has_its_length(path: Path, one: float, other: float) -> None:
    track = track_of(path)
    low, high = sorted((one * track.length, other * track.length))
    if high - low < 0.01:
        return
    stretch = flattened(track.stretch(low, high))
    assert length(stretch) == pytest.approx(high - low, rel=2e-3, abs=2e-3)
    assert farthest(stretch, flattened(path)) < 0.005


@pytest.mark.parametrize("pattern", PATTERNS)
@given(st.floats(0.05, 200.0), st.sampled_from([0.13, 0.18, 0.25, 0.35, 0.5]))
@settings(max_examples=100, deadline=None)
def test_a_line_begins_and_ends_with_equal_dashes(pattern: Pattern, size: float, width: float) -> None:
    inked = laid_out(size, pattern, width)
    assert inked[0][0] == 0 and inked[-1][1] == size
    between = [b[0] - a[1] for a, b in pairwise(inked)]
    assert between == pytest.approx([3 * width] * len(between), abs=1e-9)
    if len(inked) > 1:
        n_dots = len(pattern.between) // 2
        dashes = [b - a for a, b in inked[:: n_dots + 1]]
        assert dashes == pytest.approx([dashes[0]] * len(dashes), abs=1e-9)
        assert pattern.shortest * width - 1e-9 <= dashes[0] < 2.2 * pattern.dash * width


def test_a_short_line_is_shortened_then_continuous() -> None:
    assert len(laid_out(54.5, LONG_DASHED_DOTTED, 1.0)) == 3
    assert laid_out(18.5, LONG_DASHED_DOTTED, 1.0) == [(0, 6), (9, 9.5), (12.5, 18.5)]
    assert laid_out(18.4, LONG_DASHED_DOTTED, 1.0) == [(0.0, 18.4)]
    assert laid_out(9.0, DASHED, 1.0) == [(0, 3), (6, 9)] and laid_out(8.9, DASHED, 1.0) == [(0.0, 8.9)]


@pytest.mark.parametrize("pattern", PATTERNS)
@pytest.mark.parametrize("is_closed", [False, True])
def test_corners_lie_within_dashes(pattern: Pattern, is_closed: bool) -> None:
    corners = [(0.0, 0.0), (30.0, 0.0), (30.0, 18.0), (14.0, 30.0)]
    dashes = dashes_of(straight(*corners, is_closed=is_closed), pattern, 0.18)
    for corner in corners[0 if is_closed else 1 : 4 if is_closed else 3]:
        round_it = [dash for dash in dashes if farthest(np.array([corner]), flattened(dash.path)) < 1e-9]
        assert len(round_it) == 1 and round_it[0].is_end
        points = flattened(round_it[0].path)
        assert len(points) == 3 and points[1].tolist() == pytest.approx(list(corner))
        assert min(np.hypot(*(points[k] - corner)) for k in (0, 2)) >= pattern.shortest * 0.18
    assert [dash.is_end for dash in dashes].count(True) == 4


@pytest.mark.parametrize("pattern", PATTERNS)
def test_a_ring_has_whole_periods(pattern: Pattern) -> None:
    dashes = dashes_of(CURVES[3], pattern, 0.25)
    n_dots = len(pattern.between) // 2
    sizes = [length(flattened(dash.path)) for dash in dashes[:: n_dots + 1]]
    assert len(dashes) % (n_dots + 1) == 0 and sizes == pytest.approx([sizes[0]] * len(sizes), rel=1e-4)
    assert all(np.abs(np.hypot(*(flattened(dash.path) - (10.0, 0.0)).T) - 10.0).max() < 1e-6 for dash in dashes)
    whole = sum(sizes) + len(sizes) * sum(pattern.between) * 0.25
    assert whole == pytest.approx(2 * np.pi * 10, rel=1e-4)


def test_a_tiny_ring_is_continuous() -> None:
    tiny = ring(0.2)
    assert [dash.path for dash in dashes_of(tiny, DASHED, 0.18)] == [tiny]


def test_dashes_are_flat_and_lines_round() -> None:
    strokes = strokes_of([chain(straight((0, 0), (30, 0)), C.HIDDEN_EDGE), chain(straight((0, 5), (30, 5)))], STYLE)
    assert {stroke.is_round for stroke in strokes if stroke.line_class is C.HIDDEN_EDGE} == {False}
    assert [stroke.is_round for stroke in strokes if stroke.line_class is C.VISIBLE_EDGE] == [True]


def test_a_cutting_plane_is_wide_at_ends_and_corners() -> None:
    path = straight((0, 0), (40, 0), (40, 20), (80, 20))
    strokes = strokes_of([chain(path, C.CUTTING_PLANE)], STYLE)
    wide = [flattened(stroke.path) for stroke in strokes if stroke.width == STYLE.wide]
    assert len(wide) == 4 and {stroke.width for stroke in strokes} == {STYLE.wide, STYLE.narrow}
    assert [len(points) for points in wide] == [2, 3, 3, 2]
    assert {stroke.width for stroke in chain_line(path, STYLE, C.CUTTING_PLANE)} == {STYLE.narrow}


def test_groups_are_named_by_class_and_part_in_painting_order() -> None:
    line = straight((0, 0), (30, 0))
    chains = [
        chain(line, C.VISIBLE_OUTLINE, 1),
        chain(line, C.CENTRE_LINE, -1),
        chain(line, C.VISIBLE_OUTLINE, 0),
        chain(line, C.VISIBLE_EDGE, 1),
        chain(line, C.VISIBLE_EDGE, 0),
    ]
    groups = groups_of(chains, nodes("frame/bolt", "frame/angle"), STYLE)
    assert [(group.kind, group.name) for group in groups] == [
        ("class", "centre-line"), ("class", "visible-edge"), ("class", "visible-outline"),
    ]  # fmt: skip
    for group in groups[1:]:
        parts = [item for item in group.items if isinstance(item, Group)]
        assert [(part.kind, part.name) for part in parts] == [("part", "frame/angle"), ("part", "frame/bolt")]
    assert all(isinstance(item, Stroke) for item in groups[0].items)
    assert groups_of([], [], STYLE) == ()


def test_names_of_groups_do_not_depend_on_other_parts() -> None:
    line = straight((0, 0), (30, 0))
    alone = groups_of([chain(line, node=0)], nodes("b"), STYLE)
    among = groups_of([chain(line, node=1), chain(line, node=0)], nodes("a", "b"), STYLE)
    assert [item.name for item in alone[0].items if isinstance(item, Group)] == ["b"]
    assert [item.name for item in among[0].items if isinstance(item, Group)] == ["a", "b"]


@pytest.mark.parametrize("is_pictorial", [False, True])
def test_no_stroke_lies_on_a_wider_one(is_pictorial: bool) -> None:
    style = replace(STYLE, is_pictorial=is_pictorial)
    chains = [chain(straight((0, 0), (30, 0)), line_class) for line_class in LineClass]
    widths = [max(weight_of(s.line_class, style).end_width, s.width) for s in strokes_of(chains, style)]
    assert widths == sorted(widths)
    assert weight_of(C.VISIBLE_EDGE, style).width == (style.narrow if is_pictorial else style.wide)


def test_parts_have_their_colours() -> None:
    chains = [chain(straight((0, 0), (30, 0)), node=1), chain(straight((0, 1), (30, 1)), node=-1)]
    colours = [(1, 2, 3), (200, 200, 200)]
    assert [stroke.colour for stroke in strokes_of(chains, STYLE, colours=colours)] == [(200, 200, 200), (0, 0, 0)]


def test_a_gap_stays_white_where_a_line_passes_behind() -> None:
    sheet = Sheet()
    sheet.line([(20, -9, 0), (20, 9, 0)], C.VISIBLE_OUTLINE, 1)
    sheet.line([(0, 0, 3), (20, 0, 3)])
    pieces, candidates = sheet.pieces()
    pieces = hidden_after(pieces, 1, (40, 0, 3))
    for gap in (0.0, 0.5, 1.0):
        style = Style(gap=gap)
        strokes = strokes_of(chains_of(pieces, candidates, TOLERANCE, style), style)
        behind = next(stroke for stroke in strokes if stroke.line_class is C.VISIBLE_EDGE)
        end = max(flattened(behind.path)[:, 0])
        white = 20 - style.wide / 2 - (end + behind.width / 2)
        assert white == pytest.approx(gap) if gap else end == pytest.approx(20)


def test_a_gap_may_leave_nothing() -> None:
    short = replace(chain(straight((0, 0), (1, 0))), is_behind=(True, True))
    assert strokes_of([short], Style(gap=0.7)) == ()


def test_shade_lines_are_extra_wide_and_on_top() -> None:
    plain, shaded = (
        chain(straight((0, 0), (9, 0)), C.VISIBLE_OUTLINE),
        chain(straight((0, 9), (9, 9)), C.VISIBLE_OUTLINE),
    )
    strokes = strokes_of([replace(shaded, is_shaded=True), plain], STYLE)
    assert [stroke.width for stroke in strokes] == [STYLE.wide, 2 * STYLE.wide]


def inked(strokes: tuple[Stroke, ...]) -> list[F64]:
    return [flattened(stroke.path) for stroke in strokes]


@given(st.lists(st.tuples(st.floats(0, 60), st.floats(0, 60)), min_size=2, max_size=8, unique=True), st.booleans())
@settings(max_examples=80, deadline=None)
def test_dashes_lie_on_their_line_and_reach_its_ends(points: list[tuple[float, float]], is_closed: bool) -> None:
    path = straight(*points, is_closed=is_closed and len(points) > 2)
    whole = flattened(path)
    dashes = inked(strokes_of([chain(path, C.CENTRE_LINE)], STYLE))
    assert max(farthest(dash, whole) for dash in dashes) < 1e-6
    assert sum(map(length, dashes)) <= length(whole) + 1e-6
    if not path.is_closed:
        ends = np.vstack([dash[[0, -1]] for dash in dashes])
        for tip in whole[[0, -1]]:
            assert np.hypot(*(ends - tip).T).min() < 1e-6

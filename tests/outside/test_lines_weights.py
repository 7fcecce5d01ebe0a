"""Line weights, dashes and projected circles against ISO 128-2, ISO 128-3 and ISO 5456-3, measured on the strokes.

ISO 128-2:2022 replaces ISO 128-20:1996 and ISO 128-24:1999, whose clauses are named beside the numbers.
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from platewright.backend.contract import NARROW, LineClass, Style
from platewright.backend.drawing import Arc, Path, Stroke
from platewright.backend.lines.joining import chains_of
from platewright.backend.lines.pen import strokes_of
from support.flattened import farthest, flattened, length
from support.line_pieces import TOLERANCE, Sheet

C = LineClass
SERIES = (0.13, 0.18, 0.25, 0.35, 0.5, 0.7, 1.0, 1.4, 2.0)  # ISO 128-20:1996 4.2
GROUPS = ((0.25, 0.13), (0.35, 0.18), (0.5, 0.25), (0.7, 0.35), (1.0, 0.5), (1.4, 0.7), (2.0, 1.0))  # 128-24 table 2
CONTINUOUS_NARROW = (C.IMAGINARY_INTERSECTION, C.DIMENSION, C.EXTENSION, C.LEADER, C.HATCHING, C.THREAD_ROOT,
                     C.DETAIL_FRAME)  # fmt: skip
CONTINUOUS_WIDE = (C.VISIBLE_OUTLINE, C.THREAD_CREST)
HIDDEN = {C.HIDDEN_EDGE: C.VISIBLE_EDGE, C.HIDDEN_OUTLINE: C.VISIBLE_OUTLINE}


def drawn(line_class: LineClass, style: Style, size: float = 100.0) -> tuple[Stroke, ...]:
    """The strokes of one straight line of a class, `size` mm long."""
    sheet = Sheet()
    sheet.line([(0, 50), (size, 50)], HIDDEN.get(line_class, line_class), is_visible=line_class not in HIDDEN)
    return strokes_of(chains_of(*sheet.pieces(), TOLERANCE, style), style)


@pytest.mark.parametrize(("wide", "narrow"), GROUPS)
@pytest.mark.parametrize("is_pictorial", [False, True])
def test_one_wide_and_one_narrow_width_of_the_line_group(wide: float, narrow: float, is_pictorial: bool) -> None:
    """ISO 128-24:1999 clause 5 and table 2; 128-20:1996 4.2: 2 to 1 within the standard's own rounding, 8 %."""
    style = Style(wide=wide, is_pictorial=is_pictorial, hidden=True)
    widths = {stroke.width for line_class in LineClass for stroke in drawn(line_class, style)}
    assert widths == {wide, narrow} and widths <= set(SERIES) and NARROW[wide] == narrow
    assert wide / narrow == pytest.approx(2.0, rel=0.08)


@pytest.mark.parametrize("line_class", CONTINUOUS_NARROW)
def test_continuous_narrow_lines(line_class: LineClass) -> None:
    """ISO 128-24:1999 table 1, type 01.1."""
    strokes = drawn(line_class, Style())
    assert [stroke.width for stroke in strokes] == [0.18]


@pytest.mark.parametrize("line_class", CONTINUOUS_WIDE)
def test_continuous_wide_lines(line_class: LineClass) -> None:
    """ISO 128-24:1999 table 1, type 01.2."""
    assert [stroke.width for stroke in drawn(line_class, Style())] == [0.35]


@pytest.mark.parametrize("wide", NARROW)
@pytest.mark.parametrize(
    ("line_class", "elements"),
    [
        (C.HIDDEN_EDGE, (12.0,)),  # type 02.1
        (C.HIDDEN_OUTLINE, (12.0,)),
        (C.CENTRE_LINE, (24.0, 0.5)),  # type 04.1
        (C.ADJACENT_PART, (24.0, 0.5, 0.5)),  # type 05.1
        (C.EXTREME_POSITION, (24.0, 0.5, 0.5)),
    ],
)
def test_elements_of_broken_lines(wide: float, line_class: LineClass, elements: tuple[float, ...]) -> None:
    """ISO 128-20:1996 table 3 (the dash of 12 d from memory), on a line that whole periods fit: to 0.1 d."""
    style = Style(wide=wide, hidden=True)
    d = style.narrow
    period = sum(elements) + 3.0 * len(elements)
    strokes = drawn(line_class, style, (7 * period + elements[0]) * d)
    spans = sorted((flattened(stroke.path)[:, 0].min(), flattened(stroke.path)[:, 0].max()) for stroke in strokes)
    sizes = [(high - low) / d for low, high in spans]
    gaps = [(after[0] - before[1]) / d for before, after in itertools.pairwise(spans)]
    assert len(strokes) == 7 * len(elements) + 1
    assert sizes == pytest.approx([elements[k % len(elements)] for k in range(len(sizes))], abs=0.1)
    assert gaps == pytest.approx([3.0] * len(gaps), abs=0.1)
    assert {stroke.width for stroke in strokes} == {d} and not any(stroke.is_round for stroke in strokes)


def test_a_short_centre_line_is_continuous() -> None:
    """ISO 128-24:1999 table 1, 01.1.7."""
    assert len(drawn(C.CENTRE_LINE, Style(), 3.0)) == 1


def test_a_cutting_plane_is_long_dashed_dotted_with_wide_ends() -> None:
    """ISO 128-24:1999 table 1, 04.1 with ends as 04.2."""
    strokes = sorted(drawn(C.CUTTING_PLANE, Style()), key=lambda stroke: float(flattened(stroke.path)[0, 0]))
    assert [stroke.width for stroke in strokes] == [0.35] + [0.18] * (len(strokes) - 2) + [0.35]


def test_imaginary_lines_leave_the_clear_space() -> None:
    """ISO 128-20:1996 4.4: never less than 0.7 mm between parallel lines; they end short of outlines (ISO 128-3)."""
    sheet = Sheet()
    sheet.line([(0, 0), (40, 0), (40, 30), (0, 30), (0, 0)], C.VISIBLE_OUTLINE)
    for k in range(12):
        sheet.line([(0, 5 + 0.25 * k), (40, 5 + 0.3 * k)], C.IMAGINARY_INTERSECTION)
    found = [
        flattened(chain.path)
        for chain in chains_of(*sheet.pieces(), TOLERANCE, Style())
        if chain.line_class is C.IMAGINARY_INTERSECTION
    ]
    assert len(found) >= 3
    for k, line in enumerate(found):
        dense = line[0] + np.linspace(0, 1, 500)[:, None] * (line[-1] - line[0])
        assert dense[:, 0].min() > 0.99 and dense[:, 0].max() < 39.01
        for other in found[:k]:
            assert min(farthest(place[None], other) for place in dense) >= 0.7 - 1e-6


@pytest.mark.parametrize("scale", [1.0, 1.5**0.5])
def test_an_isometric_circle_is_the_ellipse_of_iso_5456(scale: float) -> None:
    """A circle in a coordinate plane: axes as 1 to the square root of 3, the long one the true diameter (closed form).

    The rim is cut into as many chords as a chord error of 0.02 mm asks for, and given in pieces.
    """
    radius = 12.0 * scale
    n = int(np.ceil(np.pi / np.arccos(1 - 0.02 / radius)))
    angle = np.arange(n + 1) * 2 * np.pi / n + 0.4
    rim = np.column_stack([60 + radius * np.cos(angle), 60 + radius * np.sin(angle) / 3**0.5])
    sheet = Sheet()
    sheet.line(rim, C.VISIBLE_OUTLINE)
    (chain,) = chains_of(*sheet.pieces(), TOLERANCE, Style())
    arcs = [piece for piece in chain.path.pieces if isinstance(piece, Arc)]
    assert chain.path.is_closed and len(arcs) == len(chain.path.pieces) == 2
    long, short = arcs[0].half_axes
    assert long == pytest.approx(radius, abs=5e-4) and short / long == pytest.approx(0.5773503, abs=1e-5)
    true = np.column_stack([60 + radius * np.cos(angle / 7), 60 + radius * np.sin(angle / 7) / 3**0.5])
    assert farthest(true, flattened(chain.path)) < 0.005


def test_the_length_of_an_ellipse_is_ramanujans() -> None:
    """Ramanujan 1914, second approximation: right to 1e-9 here."""
    a, b = 20.0, 9.0
    angle = np.linspace(0, 2 * np.pi, 120)
    sheet = Sheet()
    sheet.line(np.column_stack([50 + a * np.cos(angle), 50 + b * np.sin(angle)]))
    (chain,) = chains_of(*sheet.pieces(), TOLERANCE, Style())
    h = ((a - b) / (a + b)) ** 2
    perimeter = np.pi * (a + b) * (1 + 3 * h / (10 + (4 - 3 * h) ** 0.5))
    assert chain.length == pytest.approx(perimeter, abs=1e-3)
    assert length(flattened(Path(chain.path.start, chain.path.pieces, True))) == pytest.approx(perimeter, abs=1e-2)

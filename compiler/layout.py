"""Several views on one sheet: columns and rows at one scale, aligned where they share an axis, with gaps between."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from math import inf

from msgspec import Struct

Point = tuple[float, float, float]

GAP_MM = 10.0
"""Paper between the contents of neighbouring views."""

_ROUNDS = 64


class Box(Struct, frozen=True):
    """What one view takes, on a page of scale 1: mm to the right and down of wherever the world's origin lands.

    `column` and `row` say where it stands. `axes` are the world directions to the right and up, None for a view that
    lines up with none: views in one column that share the first lie over each other point by point, views in one row
    that share the second side by side. `around` is paper kept free on the left, above, on the right and below.
    """

    low: tuple[float, float]
    high: tuple[float, float]
    column: int = 0
    row: int = 0
    axes: tuple[Point, Point] | None = None
    around: tuple[float, float, float, float] = (0.0, 0.0, 0.0, 0.0)


class Spot(Struct, frozen=True):
    """Where a view stands: the page point, mm, of its world origin, and its rectangle (left, top, width, height)."""

    origin: tuple[float, float]
    place: tuple[float, float, float, float]


class _Run(Struct, frozen=True):
    """Views of one line that lie on a common axis: their common stretch, and the paper before and behind it."""

    low: float
    high: float
    before: float
    behind: float


class Lines(Struct, frozen=True):
    """The columns of a sheet, or its rows: for each line the runs of views that stand in it."""

    runs: tuple[tuple[_Run, ...], ...]
    of_box: tuple[tuple[int, int], ...]

    def length(self, scale: float) -> float:
        """Paper that all lines take at a scale, with the gaps between them."""
        slope, constant = self._needs(scale)
        return slope * scale + constant

    def scale_for(self, length: float) -> float:
        """The scale at which the lines take just this much paper; 0 or less where gaps and words leave none.

        Cost: a few rounds; the length is a convex, piecewise linear function of the scale.
        """
        scale = length / max(run.high - run.low for line in self.runs for run in line)
        for _ in range(_ROUNDS):
            slope, constant = self._needs(scale)
            better = (length - constant) / slope
            if better <= 0 or better >= scale:
                return better
            scale = better
        return scale

    def _needs(self, scale: float) -> tuple[float, float]:
        slope = constant = 0.0
        for line in self.runs:
            for each in (_reach(line, scale, lambda run: run.before), _reach(line, scale, lambda run: run.behind)):
                slope, constant = slope + each[0], constant + each[1]
        return slope, constant + GAP_MM * (len(self.runs) - 1)

    def middles(self, scale: float, start: float) -> list[tuple[float, float, float]]:
        """For each line its middle, where it begins and where it ends on paper, the first beginning at `start`."""
        found: list[tuple[float, float, float]] = []
        for line in self.runs:
            before = _reach(line, scale, lambda run: run.before)
            behind = _reach(line, scale, lambda run: run.behind)
            middle = start + before[0] * scale + before[1]
            end = middle + behind[0] * scale + behind[1]
            found.append((middle, start, end))
            start = end + GAP_MM
        return found


def _reach(line: tuple[_Run, ...], scale: float, side: Callable[[_Run], float]) -> tuple[float, float]:
    """Slope and constant, over the scale, of how far a line reaches to one side of its middle."""
    return max(
        (((run.high - run.low) / 2, side(run)) for run in line), key=lambda pair: (pair[0] * scale + pair[1], pair[0])
    )


def columns(boxes: Sequence[Box]) -> Lines:
    """The columns that boxes stand in, from the left."""
    return _lines(
        [
            (box.column, box.axes[0] if box.axes else None, box.low[0], box.high[0], box.around[0], box.around[2])
            for box in boxes
        ]
    )


def rows(boxes: Sequence[Box]) -> Lines:
    """The rows that boxes stand in, from the top."""
    return _lines(
        [
            (box.row, box.axes[1] if box.axes else None, box.low[1], box.high[1], box.around[1], box.around[3])
            for box in boxes
        ]
    )


def _lines(boxes: Sequence[tuple[int, Point | None, float, float, float, float]]) -> Lines:
    numbers = sorted({box[0] for box in boxes})
    runs: list[list[_Run]] = [[] for _ in numbers]
    known: dict[tuple[int, Point], int] = {}
    of_box: list[tuple[int, int]] = []
    for number, axis, low, high, before, behind in boxes:
        line = numbers.index(number)
        joined = known.get((line, axis)) if axis is not None else None
        if joined is None:
            joined = len(runs[line])
            runs[line].append(_Run(low, high, before, behind))
            if axis is not None:
                known[line, axis] = joined
        else:
            run = runs[line][joined]
            runs[line][joined] = _Run(
                min(run.low, low), max(run.high, high), max(run.before, before), max(run.behind, behind)
            )
        of_box.append((line, joined))
    return Lines(tuple(tuple(line) for line in runs), tuple(of_box))


def spots(boxes: Sequence[Box], scale: float, width: float, height: float) -> tuple[Spot, ...]:
    """Where the boxes stand at a scale, the whole of them in the middle of a page of this size, mm.

    The rectangles of views meet half-way between their lines and reach to the edge of the page.
    """
    across, down = columns(boxes), rows(boxes)
    middles_x = across.middles(scale, (width - across.length(scale)) / 2)
    middles_y = down.middles(scale, (height - down.length(scale)) / 2)
    found: list[Spot] = []
    for in_column, in_row in zip(across.of_box, down.of_box, strict=True):
        run_x, run_y = across.runs[in_column[0]][in_column[1]], down.runs[in_row[0]][in_row[1]]
        x = middles_x[in_column[0]][0] - scale * (run_x.low + run_x.high) / 2
        y = middles_y[in_row[0]][0] - scale * (run_y.low + run_y.high) / 2
        left, right = _between(middles_x, in_column[0], width)
        top, bottom = _between(middles_y, in_row[0], height)
        found.append(Spot((x, y), (left, top, right - left, bottom - top)))
    return tuple(found)


def _between(middles: Sequence[tuple[float, float, float]], line: int, page: float) -> tuple[float, float]:
    start = 0.0 if line == 0 else middles[line][1] - GAP_MM / 2
    end = page if line == len(middles) - 1 else middles[line][2] + GAP_MM / 2
    return start, end


def scale_that_fits(boxes: Sequence[Box], width: float, height: float | None) -> float:
    """The largest scale at which boxes fit into free paper of this width, and height if any; 0 or less if none."""
    scale = columns(boxes).scale_for(width)
    return min(scale, rows(boxes).scale_for(height) if height is not None else inf)


def size(boxes: Sequence[Box], scale: float) -> tuple[float, float]:
    """Paper, width and height in mm, that boxes take at a scale."""
    return columns(boxes).length(scale), rows(boxes).length(scale)

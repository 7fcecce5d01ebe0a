"""From a drawing to the flat arrays that kernels take: paths, marks in painting order, clips, pictures."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field

import numpy as np

from ..contract import F64, U8
from ..drawing import Arc, Colour, Drawing, Fill, Group, Image, Lines, Mark, Path, Stroke, Words
from ..outlines import Letters, outlined, standard_letters, without_arcs

LINE, CUBIC = 0, 1
ROUND, FLAT, EVEN_ODD, NONZERO = 0, 1, 2, 3


@dataclass(slots=True)
class Gathered:
    """Marks in painting order, as `stroking.edges_of` and `coverage.paint_strip` take them, still as lists.

    points, codes: runs of path points, mm; path_points: rows of points a path; path_closed; mark_paths: paths a mark;
    kinds, widths (mm), colours, clip rows and picture rows (-1 for none) a mark; clips (k,2) mm; pictures.
    """

    points: list[F64] = field(default_factory=list)
    codes: list[tuple[int, int]] = field(default_factory=list)
    path_points: list[int] = field(default_factory=list)
    path_closed: list[bool] = field(default_factory=list)
    mark_paths: list[int] = field(default_factory=list)
    kinds: list[int] = field(default_factory=list)
    widths: list[float] = field(default_factory=list)
    colours: list[Colour] = field(default_factory=list)
    mark_clips: list[int] = field(default_factory=list)
    mark_images: list[int] = field(default_factory=list)
    clips: list[F64] = field(default_factory=list)
    images: list[Image] = field(default_factory=list)

    def add_path(self, path: Path) -> None:
        """Append a path without arcs."""
        self.points.append(np.array((path.start,)))
        self.codes.append((LINE, 1))
        n_points = 1
        for piece in path.pieces:
            assert not isinstance(piece, Arc)
            self.points.append(piece.points)
            self.codes.append((LINE if isinstance(piece, Lines) else CUBIC, len(piece.points)))
            n_points += len(piece.points)
        self.path_points.append(n_points)
        self.path_closed.append(path.is_closed)

    def add(
        self, paths: Iterable[Path], kind: int, colour: Colour, clip: int, width: float = 0.0, image: int = -1
    ) -> None:
        """Append a mark of some paths."""
        n_paths = len(self.path_points)
        for path in paths:
            self.add_path(without_arcs(path) if any(isinstance(piece, Arc) for piece in path.pieces) else path)
        self.mark_paths.append(len(self.path_points) - n_paths)
        self.kinds.append(kind)
        self.widths.append(width)
        self.colours.append(colour)
        self.mark_clips.append(clip)
        self.mark_images.append(image)


def gathered(drawing: Drawing, letters: Letters | None = None) -> Gathered:
    """All marks of a drawing. Cost: about 5 us a mark, under 100 us an arc."""
    letters = letters or standard_letters()
    found = Gathered()
    for mark, clip in _marks(drawing.groups, None, found):
        match mark:
            case Stroke():
                found.add((mark.path,), ROUND if mark.is_round else FLAT, mark.colour, clip, mark.width)
            case Fill():
                found.add(mark.paths, EVEN_ODD, mark.colour, clip)
            case Words():
                found.add(outlined(mark, letters), NONZERO, mark.colour, clip)
            case Image():
                found.images.append(mark)
                found.add((_rectangle(mark),), NONZERO, (0, 0, 0), clip, image=len(found.images) - 1)
    return found


def _marks(
    items: Iterable[Group | Mark], clip: F64 | None, found: Gathered, row: int = -1
) -> Iterator[tuple[Mark, int]]:
    """Marks in order with the rows of their clips; a clip within a clip is the part common to both."""
    for item in items:
        if not isinstance(item, Group):
            yield item, row
        elif item.clip is None:
            yield from _marks(item.items, clip, found, row)
        else:
            inner = item.clip if clip is None else common(clip, item.clip)
            if len(inner) >= 3:
                found.clips.append(inner)
                yield from _marks(item.items, inner, found, len(found.clips) - 1)


def common(one: F64, other: F64) -> F64:
    """The part common to two convex polygons (k,2), wound either way: one cut to each side of the other in turn."""
    left, after = other, np.roll(other, -1, axis=0)
    area = float(np.sum(left[:, 0] * after[:, 1] - left[:, 1] * after[:, 0]))
    sign = 1.0 if area > 0.0 else -1.0
    polygon = [(float(x), float(y)) for x, y in one]
    for (ax, ay), (bx, by) in zip(left.tolist(), after.tolist(), strict=True):
        inside = [sign * ((bx - ax) * (y - ay) - (by - ay) * (x - ax)) for x, y in polygon]
        kept = []
        for k, (x, y) in enumerate(polygon):
            to = (k + 1) % len(polygon)
            if inside[k] >= 0.0:
                kept.append((x, y))
            if inside[k] * inside[to] < 0.0:
                share = inside[k] / (inside[k] - inside[to])
                kept.append((x + share * (polygon[to][0] - x), y + share * (polygon[to][1] - y)))
        polygon = kept
    return np.array(polygon).reshape(-1, 2)


def inks(colours: list[Colour]) -> U8:
    """Colours as (m,3) uint8."""
    return np.array(colours, np.uint8).reshape(-1, 3)


def _rectangle(image: Image) -> Path:
    left, top, width, height = image.place
    corners = np.array(((left + width, top), (left + width, top + height), (left, top + height)))
    return Path((left, top), (Lines(corners),), True)

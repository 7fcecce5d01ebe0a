"""View sets of ISO 5456-2: where the views of one object stand round its front view."""

from __future__ import annotations

from typing import Literal

from msgspec import Struct
from platewright.lang.source import Span

from .projections import SIDES, Parallel, Viewpoint

Method = Literal["first angle", "third angle"]

_SIDE_CELLS: dict[str, tuple[int, int]] = {"top": (0, -1), "bottom": (0, 1), "left": (-1, 0), "right": (1, 0)}
"""Column and row of a view in third-angle projection, where it stands on the side it is seen from; else opposite."""


class Placed(Struct, frozen=True):
    """One view of a set: what it is called, where it is taken from, its column and row; the front view has 0 and 0."""

    name: str
    viewpoint: Viewpoint
    column: int
    row: int


class Look(Struct, frozen=True):
    """A view by reference arrow and letter (ISO 128-3); its window is the middle, world mm, and diameter of a piece.

    Its arrow points at `aim` where there is one. `holder` is the path within the subject of what both are marks of.
    """

    letter: str
    viewpoint: Parallel
    window: tuple[tuple[float, float, float], float] | None
    span: Span
    aim: tuple[float, float, float] | None = None
    holder: str = ""


class ViewSet(Struct, frozen=True):
    """Views of one object on one sheet, the front view first."""

    method: Method
    views: tuple[Placed, ...]


def arranged(method: Method, views: tuple[tuple[str, Viewpoint], ...]) -> ViewSet:
    """The views placed as the method asks (ISO 5456-2:1996, 5.1), the front view among them.

    First angle: the view from above stands below the front view, that from the left to its right, and so on; third
    angle: above, to the left. The rear view stands outermost on the right in both. A view that is none of the six
    stands in the corner next to the views from the top and the right: above them in third angle, below in first.
    """
    sign = 1 if method == "third angle" else -1
    cells = {name: (sign * x, sign * y) for name, (x, y) in _SIDE_CELLS.items()}
    said = [name for name, _ in views]
    last = max([0, *(cells[name][0] for name in said if name in cells)])
    if "rear" in said:
        last += 1
        cells["rear"] = (last, 0)
    corner = 1
    found: list[Placed] = []
    for name, viewpoint in sorted(views, key=lambda view: view[0] != "front"):
        if name == "front":
            column, row = 0, 0
        elif name in SIDES:
            column, row = cells[name]
        else:
            column, row = corner, -sign
            corner += 1
        found.append(Placed(name, viewpoint, column, row))
    return ViewSet(method, tuple(found))

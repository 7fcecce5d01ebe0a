"""Sections: where a figure cuts its subject open, what that takes away, and how it shows in other views.

The side toward the eye goes unless `keeping` says otherwise. Whatever the section, what goes is one straight prism
(`solids.cut.Cutter`): a half space, a quarter, the space before a stepped plane, or a patch broken out round a mark.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Sequence
from itertools import pairwise
from math import cos, pi, sin
from typing import Literal

import numpy as np
from msgspec import Struct
from platewright.backend.contract import F64, FaceOrigin, Mesh
from platewright.lang.source import Span

from .graph import Entry, Point, Solid
from .mistakes import Problems, mistake
from .solids.cut import Cutter, cut_mesh, half_space
from .solids.surfaces import cross
from .solids.transform import dot, heights

LENGTHWISE = 0.5
"""A cut runs along an axis where its unit normal and the axis have a product below this: at less than 30 degrees."""

EDGE_ON = 1e-6
"""A plane is seen edge-on where its unit normal and the line of sight have a product below this."""

LETTERS = "ABCDEFGHJKLMNPRSTUVWXYZ"
"""Letters of sections, in the order of the source; I, O and Q are left out (common practice)."""

_CAP, _BREAK, _STEP = int(FaceOrigin.SECTION_CAP), int(FaceOrigin.BREAK), int(FaceOrigin.STEP)


Shown = Literal["in view", "removed", "revolved"]


class Plane(Struct, frozen=True):
    """A plane by its unit normal and a point of it, mm in the frame of the figure's subject."""

    normal: Point
    through: Point


class Cut(Struct, frozen=True):
    """One section as written.

    full: `plane`. half: what also lies on the side of `beside` that its normal points to. stepped: planes through
    `corners` along the axis `plane.normal`. local: within `diameter` of `plane.through`. `keeping` is the direction of
    the side that stays, where it is stated. `shown` tells whether a view is cut open, or the cut face is drawn alone:
    in a view of its own, or turned into the plane of the main view.
    """

    kind: Literal["full", "half", "stepped", "local"]
    plane: Plane
    span: Span
    beside: Plane | None = None
    corners: tuple[Point, ...] = ()
    diameter: float = 0.0
    keeping: Point | None = None
    shown: Shown = "in view"


def letter_of(number: int) -> str:
    """The letter of a figure's section, counted from 0: A … Z, then AA, AB …"""
    more, rest = divmod(number, len(LETTERS))
    return (LETTERS[more - 1] if more else "") + LETTERS[rest]


def away_of(cut: Cut, sight: Point) -> Point:
    """The unit direction from the cut into what goes, for a unit direction of sight. Raises Mistake if edge-on."""
    normal = facing(cut)
    toward = -dot(normal, sight) if cut.keeping is None else -dot(normal, cut.keeping)
    if abs(toward) < EDGE_ON:
        seen = "seen edge-on" if cut.keeping is None else "square to the side to be kept"
        hint = "say which side stays, such as `keeping y`, or take another viewpoint"
        raise mistake("edge-on-section", cut.span, f"the cutting plane is {seen}", hint)
    return normal if toward > 0 else (-normal[0], -normal[1], -normal[2])


def cutter_of(cut: Cut, away: Point, vertices: F64) -> Cutter:
    """The prism that takes away what lies `away` from the cut, large enough for world vertices (n,3)."""
    low, high = vertices.min(axis=0), vertices.max(axis=0)
    middle, reach = (low + high) / 2.0, float(np.sqrt(((high - low) ** 2).sum())) + 1.0
    match cut.kind:
        case "full":
            return half_space(away, dot(away, cut.plane.through), middle, reach)
        case "half":
            return _quarter(cut, away, middle, reach)
        case "stepped":
            return _stepped(cut, away, middle, reach)
        case "local":
            return _patch(cut, away, reach)


class Opening:
    """Cuts copies open while a scene is flattened, and notes what became of them.

    `aways` are the directions into what goes, one for each of `cutters`. `whole` are the paths of what stays whole,
    with all below it, besides parts that say so of themselves; `open` are parts that have no inside to cut.
    """

    def __init__(self, cutters: tuple[Cutter, ...], aways: tuple[Point, ...], whole: Collection[str]) -> None:
        self.cutters, self.aways, self.whole = cutters, aways, whole
        self.n_cut = self.n_left = 0
        self.open: list[Entry] = []

    def alter(self, entry: Entry, placement: F64, mesh: Mesh) -> Mesh | None:
        """The mesh that is left of one copy; see `flatten.Alter`."""
        is_whole = self.is_whole(entry, placement)
        if not mesh.closed:
            self.n_left += 1
            if not is_whole:
                self.open.append(entry)
            return mesh
        left: Mesh | None = mesh
        for cutter in self.cutters:
            left = cut_mesh(left, placement, cutter) if left is not None else None
        if is_whole and left is not None:
            # What lies in front of the cut altogether goes with the rest of it.
            left = mesh
        self.n_cut += left is not None and bool((left.face_origin == FaceOrigin.SECTION_CAP).any())
        self.n_left += left is not None
        return left

    def is_whole(self, entry: Entry, placement: F64) -> bool:
        """Whether a copy stays whole: it, or something it is in, is listed, or its part says so.

        A part that is itself the figure's subject is cut whatever it says.
        """
        if any(each in self.whole for each in _and_above(entry.path)):
            return True
        if not isinstance(entry.thing, Solid) or entry.thing.uncut is None or entry.parent < 0:
            return False
        axis = entry.thing.uncut.axis
        if axis is None:
            return True
        a, b, c = (float(row[0] * axis[0] + row[1] * axis[1] + row[2] * axis[2]) for row in placement[:3])
        return all(abs(dot(_unit((a, b, c)), away)) < LENGTHWISE for away in self.aways)

    def rows_whole(self, entries: Sequence[Entry], placements: F64) -> tuple[int, ...]:
        """Rows of the entries that stay whole; placements (n,4,4)."""
        return tuple(row for row, entry in enumerate(entries) if self.is_whole(entry, placements[row]))

    def judge(self, cuts: tuple[Cut, ...], problems: Problems) -> None:
        """Report what came of the cuts: nothing left, nothing met, or parts that could not be cut."""
        for entry in self.open:
            sentence = f"`{entry.path}` is not closed, so a section through it has no inside to show"
            problems.error("open-part", entry.span, sentence, "close it, or leave it whole with `uncut`")
        if not self.cutters or self.open:
            return
        if not self.n_left:
            problems.error("nothing-in-view", cuts[-1].span, "the section takes everything away", "keep the other side")
        elif not self.n_cut:
            sentence = "the section meets no part that may be cut"
            problems.error("section-misses", cuts[-1].span, sentence, "move it, or look at what is `uncut`")


def is_edge_on(cut: Cut, sight: Point) -> bool:
    """Whether a view along a unit direction sees the cut as a line: of a stepped one, with its steps."""
    if cut.kind == "stepped":
        return abs(dot(cut.plane.normal, sight)) > 1.0 - EDGE_ON
    return abs(dot(facing(cut), sight)) < EDGE_ON


def trace_of(cut: Cut, away: Point, sight: Point, vertices: F64, past: float) -> F64:
    """World points (k,3) of the cutting-plane line in a view along `sight` that sees the cut edge-on.

    It runs `past` mm beyond all vertices (n,3) at either end.
    """
    along = _unit(cross(away, sight))
    reach = heights(vertices, along)
    low, high = float(reach.min()) - past, float(reach.max()) + past
    corners = cut.corners or (cut.plane.through,)
    first, last = (corners[0], corners[-1])
    if dot(first, along) > dot(last, along):
        first, last, corners = last, first, corners[::-1]
    ends = (_slid(first, along, low), *corners[1:-1], _slid(last, along, high))
    return np.array(ends, np.float64)


def _and_above(path: str) -> Iterator[str]:
    """A part path, the paths of all it is in, and each of them for all copies: `a.b[2].c`, `a.b[2]`, `a.b`, `a`."""
    while path:
        yield path
        if path.endswith("]"):
            path = path[: path.rindex("[")]
        else:
            path = path.rpartition(".")[0]


def _quarter(cut: Cut, away: Point, middle: F64, reach: float) -> Cutter:
    assert cut.beside is not None
    side = cut.beside.normal
    if abs(dot(side, away)) > EDGE_ON:
        raise mistake("wrong-form", cut.span, "the two planes of a half section stand square to each other")
    corner = _met(cut.plane, cut.beside, cross(side, away), middle)
    wide = 2.0 * reach + float(np.abs(middle - corner).max())
    x, y, z = (float(each) for each in corner)
    profile = ((0.0, 0.0), (wide, 0.0), (wide, wide), (0.0, wide))
    return Cutter(profile, (x, y, z), side, away, -wide, wide, (_CAP, _BREAK, _BREAK, _CAP, _BREAK, _BREAK))


def _met(one: Plane, other: Plane, along: Point, near: F64) -> F64:
    """The point nearest to `near` of the line in which two planes meet."""
    rows = np.array((one.normal, other.normal, along), np.float64)
    x, y, z = (float(each) for each in near)
    right = np.array((dot(one.normal, one.through), dot(other.normal, other.through), dot(along, (x, y, z))))
    crosses = np.stack((np.cross(rows[1], rows[2]), np.cross(rows[2], rows[0]), np.cross(rows[0], rows[1])))
    size = float((rows[0] * crosses[0]).sum())
    return np.asarray((right[:, None] * crosses).sum(axis=0) / size)


def _stepped(cut: Cut, away: Point, middle: F64, reach: float) -> Cutter:
    axis = cut.plane.normal
    u = _unit(cross(away, axis))
    x, y, z = (float(each) for each in middle)
    flat = [(dot(_minus(each, (x, y, z)), u), dot(_minus(each, (x, y, z)), away)) for each in cut.corners]
    if flat[0][0] > flat[-1][0]:
        flat.reverse()
    if any(b[0] < a[0] - 1e-9 for a, b in pairwise(flat)):
        raise mistake("wrong-form", cut.span, "a stepped section may not turn back on itself")
    wide = 2.0 * reach + max(abs(each) for corner in flat for each in corner)
    line = [(-wide, flat[0][1]), *flat, (wide, flat[-1][1])]
    origins = [_STEP if abs(b[0] - a[0]) < 1e-9 else _CAP for a, b in pairwise(line)]
    # u, away: their product is the axis or its opposite; the prism reaches as far both ways.
    profile = (*line, (wide, wide), (-wide, wide))
    return Cutter(profile, (x, y, z), u, away, -wide, wide, (*origins, _BREAK, _BREAK, _BREAK, _BREAK, _BREAK))


_N_FREEHAND = 96


def _patch(cut: Cut, away: Point, reach: float) -> Cutter:
    """Material broken out within an outline that looks drawn by hand, the same every time."""
    u = _unit(cross(away, (1.0, 0.0, 0.0) if abs(away[0]) < 0.9 else (0.0, 1.0, 0.0)))
    v = cross(away, u)
    profile = []
    for k in range(_N_FREEHAND):
        angle = 2.0 * pi * k / _N_FREEHAND
        wave = 0.045 * sin(3 * angle + 0.7) + 0.035 * sin(5 * angle + 2.1) + 0.025 * sin(8 * angle)
        radius = cut.diameter / 2.0 * (1.0 + wave)
        profile.append((radius * cos(angle), radius * sin(angle)))
    sides = (_BREAK,) * _N_FREEHAND
    return Cutter(tuple(profile), cut.plane.through, u, v, 0.0, 4.0 * reach, (*sides, _CAP, _BREAK))


def facing(cut: Cut) -> Point:
    """A unit normal of the cut; of a stepped one, that of a plane through its ends along its axis."""
    if cut.kind != "stepped":
        return cut.plane.normal
    first, second = cut.corners[0], cut.corners[1]
    return _unit(cross(_minus(second, first), cut.plane.normal))


def _minus(a: Point, b: Point) -> Point:
    return (a[0] - b[0], a[1] - b[1], a[2] - b[2])


def _unit(a: Point) -> Point:
    size = dot(a, a) ** 0.5
    return (a[0] / size, a[1] / size, a[2] / size)


def _slid(point: Point, along: Point, to: float) -> Point:
    """The point moved along a unit direction until its coordinate along it is `to`."""
    by = to - dot(point, along)
    return (point[0] + by * along[0], point[1] + by * along[1], point[2] + by * along[2])

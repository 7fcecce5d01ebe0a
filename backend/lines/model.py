"""The values that pass between the stages of a line drawing, all arrays of one row a segment, piece or region.

A point of a view is (x, y, depth): mm on the page, y down, and the depth of `contract.Projection`, which is affine over
any plane in central and parallel projection alike, so straight lines stay straight and planes stay planes.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..contract import F32, F64, I32, U8, Geometry, LineClass, Projection

Bools = NDArray[np.bool_]
I8 = NDArray[np.int8]

CLASSES: tuple[LineClass, ...] = tuple(LineClass)
"""Line classes by the number they have in arrays."""


@dataclass(frozen=True, slots=True)
class Tolerance:
    """All tolerances of one view, stated in the output.

    depth_mm: model mm by which a line may lie behind a surface and still be seen; sideways_mm: mm on paper by which
    parts hide beyond their rim, other parts than the line's own only; shortest_mm: pieces of a line shorter than this
    on paper that join nothing are left out; joint_mm: ends nearer than this on paper are one point.
    """

    depth_mm: float
    sideways_mm: float
    shortest_mm: float = 0.2
    joint_mm: float = 1e-3


@dataclass(frozen=True, eq=False, slots=True)
class View:
    """A geometry as one panel sees it: displaced, hidden parts left out, cut at the near plane, mapped to the page.

    points (n,3) float64 view points; world (n,3) float64 the same in world mm, displaced; faces (m,3) int32 rows of
    points, wound as in the world; face_row (m,) int32 row of `geometry.faces`; face_node, face_patch (m,) int32;
    corner_normals (m,3,3) float32 world; edge_kind (m,3) uint8 `EdgeKind`; facing (m,) int8: 1 toward the viewer, -1
    away, 0 edge-on, decided for planar patches by the patch, so that slivers of one flat face never disagree;
    is_occluder (m,) bool: the triangle hides what is behind it; neighbour (m,3) int32 the face across side k, or -1.
    """

    geometry: Geometry
    projection: Projection
    points: F64
    world: F64
    faces: I32
    face_row: I32
    face_node: I32
    face_patch: I32
    corner_normals: F32
    edge_kind: U8
    facing: I8
    is_occluder: Bools
    neighbour: I32
    tolerance: Tolerance


@dataclass(frozen=True, eq=False, slots=True)
class Candidates:
    """Straight segments that may be drawn, before it is known what hides them.

    start, end (s,3) float64 view points; line_class (s,) uint8 row of `CLASSES`; node (s,) int32 row of geometry nodes
    or -1; chain (s,) int32: segments of one smooth curve share it and stand in its order, -1 for one alone;
    faces (s,2) int32 view faces that meet in it (or that it runs in), -1 for none; vertices (s,2) int32 rows of
    `View.points` at its ends, -1 where it ends elsewhere; patch (s,) int32 the smooth patch it is the contour of, or
    -1; allowance (s,) float64 model mm by which `patch` may stand before it without hiding it; is_drawn (s,) bool:
    otherwise it only closes regions; is_plain (s,) bool: drawn whole, whatever stands before it.
    """

    start: F64
    end: F64
    line_class: U8
    node: I32
    chain: I32
    faces: I32
    vertices: I32
    patch: I32
    allowance: F64
    is_drawn: Bools
    is_plain: Bools

    def __len__(self) -> int:
        return len(self.start)


@dataclass(frozen=True, eq=False, slots=True)
class Pieces:
    """Stretches of candidates, each wholly seen or wholly hidden, in the order of the candidates and along them.

    segment (p,) int32 row of the candidates; span (p,2) float64 from 0 at start to 1 at end; is_visible (p,) bool;
    start, end (p,3) float64 view points.
    """

    segment: I32
    span: F64
    is_visible: Bools
    start: F64
    end: F64


@dataclass(frozen=True, eq=False, slots=True)
class Region:
    """A part of the page on which one patch of one part is seen.

    rings: closed polygons (k,2) float64 mm, the outer one first; node; patch (-1 where several patches of the part were
    taken together); is_cap: it is a face of a section; area in mm2.
    """

    rings: tuple[F64, ...]
    node: int
    patch: int
    is_cap: bool
    area: float


def number_of(line_class: LineClass) -> int:
    """The number a line class has in arrays."""
    return CLASSES.index(line_class)


def joined(parts: tuple[Candidates, ...]) -> Candidates:
    """Candidates of several sources in one, chains renumbered so that none are mixed up."""
    chains: list[I32] = []
    used = 0
    for part in parts:
        chains.append(np.where(part.chain >= 0, part.chain + used, -1).astype(np.int32))
        used += int(part.chain.max(initial=-1)) + 1

    def stacked(name: str) -> NDArray[np.generic]:
        return np.concatenate([getattr(part, name) for part in parts])

    names = ("start", "end", "line_class", "node", "faces", "vertices", "patch", "allowance", "is_drawn", "is_plain")
    return Candidates(chain=np.concatenate(chains), **{name: stacked(name) for name in names})  # type: ignore[arg-type]

"""A bounding volume hierarchy of eight children a node over triangles in space.

Wald, Benthin and Boulos 2008 (wide nodes), Wald 2007 (binned building). Corners are kept as float32 counted from the
middle of the model, every copy of a vertex with the same bits, so that surfaces closed before stay closed.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..contract import F32, F64, I32, Geometry
from . import splitting
from .blocks import for_all, in_blocks
from .lanes import BLOCK, EMPTY, LEAF, LINKS, NODE, WIDE
from .splitting import RANGE

_BOX_PAD = 2.0**-20  # of the model's radius: twelve float32 roundings more than what `tracing` allows a triangle
_RUN = 1 << 16  # triangles boxed at a time
_SMALL = 4096  # triangles of a tree that is built in one go

_Subtree = tuple[F32, F32, I32]  # nodes, corners, numbers
_LINE = 64  # bytes of a line of the processor's cache


@dataclass(frozen=True, eq=False, slots=True)
class Tree:
    """A hierarchy ready to be asked; its arrays are read-only. About 57 bytes a triangle (`n_bytes`).

    centre (3,) float64 and radius, mm: a ball round all corners. low, high (3,) float64: their box, world mm.
    nodes (n*64,) float32: of each node the boxes of its eight children, from the centre, and links to them, as `lanes`
    describes; corners (m*36,) float32: of each leaf x, y, z of the first corners of four triangles, of the second, of
    the third, NaN where there is none; numbers (m*4,) int32: their rows, or -1. Without triangles there is no node.
    """

    centre: F64
    radius: float
    low: F64
    high: F64
    nodes: F32
    corners: F32
    numbers: I32

    @property
    def n_bytes(self) -> int:
        """Memory of the arrays in bytes."""
        return self.nodes.nbytes + self.corners.nbytes + self.numbers.nbytes

    @property
    def skin(self) -> float:
        """How far off a surface, in mm, a ray must start so as not to meet that surface itself.

        32 float32 roundings at the model's radius: corners and origins are rounded by one at most.
        """
        return self.radius * 2.0**-19


def build_over(geometry: Geometry, threads: int | None = None) -> Tree:
    """The hierarchy over all triangles of a geometry; see `build`."""
    return build(geometry.vertices, geometry.faces, threads)


def build(vertices: F64, faces: I32, threads: int | None = None) -> Tree:
    """The hierarchy over triangles: vertices (n,3) float64 mm, faces (m,3) int32.

    The same bytes whatever `threads` (default: all processors). Vertices that no face uses at most
    widen the box. Triangles without area are kept and never met. Time m log m. Memory meanwhile: 36 bytes a triangle,
    12 a vertex, what subtrees under way need (up to 130 bytes for each of their triangles), and in the end the tree
    twice.
    """
    if not len(faces):
        none = np.zeros(3)
        return _tree(none, 0.0, (none, none), (_aligned(0), _aligned(0), np.empty(0, np.int32)))
    used = vertices if len(vertices) <= 3 * len(faces) else vertices[np.unique(faces)]
    low, high = used.min(axis=0), used.max(axis=0)
    centre = 0.5 * (low + high)
    radius = float(np.linalg.norm(high - centre)) or 1.0
    points = (vertices - centre).astype(np.float32)
    rows, chosen = np.empty(8 * len(faces), np.float32), np.empty(len(faces), np.int32)
    whole = _enclose(points, faces, np.float32(radius * _BOX_PAD), rows, chosen, threads)
    parts = _grow(points, np.ascontiguousarray(faces), rows, chosen, whole, threads)
    return _tree(centre, radius, (low, high), parts)


def _tree(centre: F64, radius: float, box: tuple[F64, F64], parts: _Subtree) -> Tree:
    for array in (centre, *box, *parts):
        array.flags.writeable = False
    nodes, corners, numbers = parts
    return Tree(centre, radius, *box, nodes, corners, numbers)


def _enclose(
    points: F32, faces: I32, pad: np.float32, rows: F32, chosen: I32, threads: int | None
) -> F32:  # fmt: skip
    spans = np.full((-(-len(faces) // _RUN), RANGE), 3e38, np.float32)

    def box(begin: int, end: int) -> None:
        splitting.enclose(points, faces, pad, begin, end, rows, chosen, spans[begin // _RUN])

    in_blocks(box, len(faces), _RUN, threads)
    return np.asarray(spans.min(axis=0))


@dataclass(frozen=True, eq=False, slots=True)
class _Range:
    """Triangles low .. high of the order, how often they were split, and their boxes (RANGE,)."""

    low: int
    high: int
    depth: int
    span: F32


def _grow(points: F32, faces: I32, rows: F32, chosen: I32, whole: F32, threads: int | None) -> _Subtree:
    """Split the top by hand into up to 64 ranges, two levels of nodes, and build each range's subtree by itself."""

    def subtree(part: _Range) -> _Subtree:
        grown = splitting.grow(points, faces, rows, chosen, part.low, part.high, part.depth, part.span)
        return grown[0], grown[1], grown[2]

    def in_two(part: _Range) -> list[_Range]:
        return _in_two(rows, chosen, part)

    root = _Range(0, len(faces), 0, whole)
    if len(faces) <= _SMALL:
        return _joined([], [], [subtree(root)])
    groups = [[root]]
    for _ in range(2):
        for _ in range(3):
            flat = [part for group in groups for part in group]
            halves = iter(for_all(in_two, flat, threads))
            groups = [[half for _ in group for half in next(halves)] for group in groups]
        if len(groups) == 1:
            top = groups[0]
            groups = [[part] for part in top]
    parts = [part for group in groups for part in group]
    return _joined(top, groups, for_all(subtree, parts, threads))


def _in_two(rows: F32, chosen: I32, part: _Range) -> list[_Range]:
    if part.high - part.low <= LEAF:
        return [part]
    left, right = np.empty(RANGE, np.float32), np.empty(RANGE, np.float32)
    scratch, counts = np.empty(splitting.SCRATCH, np.float32), np.empty(3 * splitting.BINS, np.int32)
    middle = splitting.split(
        rows, chosen, part.low, part.high, part.depth, part.span, left, right, scratch, counts
    )  # fmt: skip
    return [_Range(part.low, middle, part.depth + 1, left), _Range(middle, part.high, part.depth + 1, right)]


def _joined(top: list[_Range], groups: list[list[_Range]], subtrees: list[_Subtree]) -> _Subtree:
    """One tree: a root over the ranges of `top`, a node over each group, and the subtrees of the groups' ranges."""
    n_tops = 1 + len(groups) if top else 0
    nodes_before = np.cumsum([n_tops, *(len(part[0]) // NODE for part in subtrees)])
    leaves_before = np.cumsum([0, *(len(part[2]) // LEAF for part in subtrees)])
    nodes, corners = _aligned(NODE * nodes_before[-1]), _aligned(BLOCK * leaves_before[-1])
    numbers = np.empty(LEAF * leaves_before[-1], np.int32)
    if top:
        _write_node(nodes, 0, top, range(1, n_tops))
    first = 0
    for k, group in enumerate(groups):
        _write_node(nodes, 1 + k, group, nodes_before[first : first + len(group)])
        first += len(group)
    for k, (from_nodes, from_corners, from_numbers) in enumerate(subtrees):
        begin, end = leaves_before[k], leaves_before[k + 1]
        splitting.join(nodes, from_nodes, nodes_before[k], begin)
        corners[BLOCK * begin : BLOCK * end] = from_corners
        numbers[LEAF * begin : LEAF * end] = from_numbers
    return nodes, corners, numbers


def _aligned(n: int) -> F32:
    """An empty array that starts with a line of the cache: a node is then four of them."""
    raw = np.empty(4 * n + _LINE, np.uint8)
    first = -raw.ctypes.data % _LINE
    return raw[first : first + 4 * n].view(np.float32)


def _write_node(nodes: F32, node: int, ranges: list[_Range], below: range | NDArray[np.int64]) -> None:
    lines = nodes[NODE * node : NODE * (node + 1)].reshape(-1, WIDE)
    lines[0:6:2], lines[1:6:2], lines[6:] = np.float32(3e38), np.float32(-3e38), 0.0
    links = lines.view(np.int32)[LINKS // WIDE]
    links[:] = EMPTY
    for lane, part in enumerate(ranges):
        splitting.write_child(nodes, node, lane, part.span, 0)
        links[lane] = below[lane]

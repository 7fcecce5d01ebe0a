"""A geometry as one panel sees it: displaced, hidden parts left out, cut at the near plane, mapped to the page."""

from __future__ import annotations

import os
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from itertools import pairwise
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from ..contract import F32, F64, I32, U8, Emphasis, Geometry, Page, Panel, PatchKind, Projection
from .facing import face_patches, map_points, settle, tilt_faces
from .model import Bools, Tolerance, View
from .near import NEAR, Triangles, cut_near
from .topology import Topology, neighbours, topology_of

_T = TypeVar("_T")
_BLOCK = 1 << 15

PAPER_DEPTH = 1e-4  # mm on paper: no eye and no printer tells apart what stands out by less
PART_DEPTH = 1e-6  # of the diagonal of what is shown: what float32 data round away
SIDEWAYS = 1e-5  # mm on paper: flush parts of data rounded to float32 gape by no more at 100 mm print size
ROUNDING = 2.0**-46  # of the largest coordinate: 64 units in the last place of a float64


def see_view(
    geometry: Geometry, panel: Panel, page: Page, topology: Topology | None = None, threads: int | None = None
) -> View:
    """What lines are taken from in one panel.

    `topology` is that of the geometry if it is known already. Parts in `Emphasis.HIDE` are left out, those in GHOST
    hide nothing but themselves. In central projection triangles are cut at `near.NEAR` mm before the eye. Cost: a few
    passes over the triangles, in threads; arrays that nothing changes are those of the geometry.
    """
    known = topology_of(geometry) if topology is None else topology
    world = _displaced(geometry, panel)
    shown = _shown(geometry, panel)
    mesh = _triangles(geometry, world, shown, known)
    points, weight, least = _mapped(mesh.world, panel.projection, threads)
    if panel.projection.kind == "central" and least < NEAR:
        mesh = cut_near(mesh, weight)
        mesh = mesh.with_neighbour(neighbours(mesh.faces, len(mesh.world)))
        points, weight, _ = _mapped(mesh.world, panel.projection, threads)
        points[weight < 0.5 * NEAR] = 0.0
    rows = mesh.row
    face_node, face_patch = _taken(geometry.face_node, rows), _taken(geometry.face_patch, rows)
    facing, is_occluder = _facing(geometry, panel, mesh, face_node, face_patch, threads)
    everything = np.arange(len(geometry.faces), dtype=np.int32) if rows is None else rows
    return View(
        geometry, panel.projection, points, mesh.world, mesh.faces, everything, face_node, face_patch,
        mesh.corner_normals, mesh.edge_kind, facing, is_occluder, mesh.neighbour,
        tolerance_of(mesh, panel.projection),
    )  # fmt: skip


def tolerance_of(mesh: Triangles, projection: Projection) -> Tolerance:
    """The tolerances of a view, from the resolution of paper and the size of what is shown.

    Depth: the lesser of `PAPER_DEPTH` on paper and `PART_DEPTH` of the diagonal of what is shown, so that neither a
    huge part nor a small scale swallows detail that paper could show; but never less than float64 rounds away.
    """
    used = mesh.world[mesh.faces.ravel()] if len(mesh.faces) < len(mesh.world) // 3 else mesh.world
    if not len(used):
        return Tolerance(PAPER_DEPTH / projection.scale, SIDEWAYS)
    low, high = used.min(axis=0), used.max(axis=0)
    diagonal = float(np.sqrt(((high - low) ** 2).sum()))
    largest = float(max(np.abs(low).max(), np.abs(high).max()))
    depth = max(min(PAPER_DEPTH / projection.scale, PART_DEPTH * diagonal), ROUNDING * largest)
    return Tolerance(depth, SIDEWAYS)


def toward_viewer(projection: Projection) -> F64:
    """(4,) float64: the projection centre and 1, or the unit direction toward the viewer in world and 0.

    The direction is the one that the matrix maps to a single page point, so it holds in oblique projection too.
    """
    if projection.eye is not None:
        return np.array((*projection.eye, 1.0))
    (a, b, c), (d, e, f) = projection.world_to_page[0, :3], projection.world_to_page[1, :3]
    along = np.array((b * f - c * e, c * d - a * f, a * e - b * d))
    depth = projection.world_to_page[2, :3]
    grows = depth[0] * along[0] + depth[1] * along[1] + depth[2] * along[2]
    size = float(np.sqrt(along[0] * along[0] + along[1] * along[1] + along[2] * along[2]))
    return np.append(along * ((-1.0 if grows > 0.0 else 1.0) / size), 0.0)


def in_blocks(work: Callable[[int, int], _T], n: int, threads: int | None, block: int = _BLOCK) -> list[_T]:
    """Run work(begin, end) over blocks of n things on a pool of threads; the results in the order of the blocks."""
    spans = [(begin, min(n, begin + block)) for begin in range(0, n, block)]
    workers = min(threads or os.cpu_count() or 1, len(spans))
    if workers <= 1:
        return [work(*span) for span in spans]
    with ThreadPoolExecutor(workers) as pool:
        return list(pool.map(lambda span: work(*span), spans))


def _displaced(geometry: Geometry, panel: Panel) -> F64:
    moved = panel.displacement
    if moved is None or not moved.any():
        return geometry.vertices
    world = geometry.vertices.copy()
    for row, node in enumerate(geometry.nodes):
        if node.mesh >= 0 and moved[row].any():
            world[slice(*node.vertex_range)] += moved[row]
    return world


def _shown(geometry: Geometry, panel: Panel) -> I32 | None:
    """Rows of the faces that are shown, None for all."""
    if panel.emphasis is None or not (panel.emphasis == Emphasis.HIDE).any():
        return None
    return np.flatnonzero(panel.emphasis[geometry.face_node] != Emphasis.HIDE).astype(np.int32)


def _taken(values: NDArray[np.int32], rows: I32 | None) -> I32:
    return values if rows is None else values[rows]


def _triangles(geometry: Geometry, world: F64, rows: I32 | None, topology: Topology) -> Triangles:
    if rows is None:
        return Triangles(
            world, geometry.faces, geometry.corner_normals, geometry.edge_kind, None, topology.neighbour
        )  # fmt: skip
    place = np.full(len(geometry.faces) + 1, -1, np.int32)
    place[rows] = np.arange(len(rows), dtype=np.int32)
    normals: F32 = geometry.corner_normals[rows]
    kinds: U8 = geometry.edge_kind[rows]
    return Triangles(world, geometry.faces[rows], normals, kinds, rows, place[topology.neighbour[rows]])


def _mapped(world: F64, projection: Projection, threads: int | None) -> tuple[F64, F64, float]:
    """View points (n,3), weights (n,) and the least weight."""
    points, weight = np.empty((len(world), 3)), np.empty(len(world))
    matrix = projection.world_to_page
    least = in_blocks(lambda begin, end: map_points(world, matrix, begin, end, points, weight), len(world), threads)
    return points, weight, min(least, default=1.0)


def _facing(
    geometry: Geometry, panel: Panel, mesh: Triangles, face_node: I32, face_patch: I32, threads: int | None
) -> tuple[NDArray[np.int8], Bools]:
    """Facing (m,) int8 and which triangles hide what is behind them (m,) bool."""
    eye = toward_viewer(panel.projection)
    is_planar = geometry.patches.kind == PatchKind.PLANE
    n, n_patches = len(mesh.faces), len(is_planar)
    facing, is_occluder = np.empty(n, np.int8), np.empty(n, np.bool_)
    normals, moments = np.zeros((n_patches, 3)), np.zeros((n_patches, 4))

    def tilt(begin: int, end: int) -> None:
        tilt_faces(mesh.world, mesh.faces, face_patch, is_planar, eye, begin, end, facing, normals, moments)

    _by_node(tilt, face_node, threads)
    is_open = np.array([not node.closed for node in geometry.nodes], np.bool_)
    emphasis = np.zeros(len(geometry.nodes), np.uint8) if panel.emphasis is None else panel.emphasis
    is_ghost = emphasis == Emphasis.GHOST
    of_patch = np.zeros(n_patches, np.int8)
    face_patches(normals, moments, eye, of_patch)

    def finish(begin: int, end: int) -> None:
        settle(face_patch, face_node, is_planar, of_patch, is_open, is_ghost, begin, end, facing, is_occluder)

    in_blocks(finish, n, threads)
    return facing, is_occluder


def _by_node(work: Callable[[int, int], None], face_node: I32, threads: int | None) -> None:
    """Run work(begin, end) over blocks that end where a node ends, so that no patch is shared by two of them."""
    ends = np.append(np.flatnonzero(np.diff(face_node)) + 1, len(face_node))
    cuts = [0]
    for end in ends[np.searchsorted(ends, np.arange(_BLOCK, len(face_node) + _BLOCK, _BLOCK)).clip(max=len(ends) - 1)]:
        if end > cuts[-1]:
            cuts.append(int(end))
    spans = list(pairwise(cuts))

    def run(begin: int, end: int) -> None:
        for span in spans[begin:end]:
            work(*span)

    in_blocks(run, len(spans), threads, 1)

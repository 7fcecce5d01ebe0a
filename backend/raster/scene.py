"""A panel made ready for drawing: what is shown, in which order, mapped to which pixels.

Order decides ties. The faces of a node are drawn in the order of its mesh and nodes in the order of their paths,
and a face replaces another only if it is strictly nearer. So where faces of several parts lie in one place, the part
whose path sorts first is seen, in every view, whatever the order of declaration or the number of threads. To make
such depths equal bit for bit, triangles of patches that lie in one plane take their depth from that plane rather
than from their own corners. Elsewhere depth is accurate to 2^-24 of itself (central) or of the model's extent
along the sight (parallel), plus the slope over 1/512 px.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..contract import F64, I32, Emphasis, Geometry, Page, Panel, PatchKind
from .window import Window, window

I64 = NDArray[np.int64]
_PLANE_ANGLE, _PLANE_DISTANCE = 1e-8, 1e-7  # two planes are one: radians; share of the model's size


@dataclass(frozen=True, eq=False, slots=True)
class Scene:
    """What the kernels read.

    to_pixel (4,4) float64: world to page pixels (not window pixels) and depth less `depth_shift`.
    spans (k,5) int64, one row a shown node with triangles: first and last+1 vertex, first and last+1 face, node.
    vertex_first, face_first (k+1,) int64: where each span starts in the run of all.
    node_shift (n_nodes,4) float64: homogeneous pixel coordinates added by the node's displacement.
    patch_plane (p,) int32: row of `planes` or -1; planes (q,3) float64: depth = g . (x, y, 1) in page pixels.
    """

    geometry: Geometry
    panel: Panel
    window: Window
    to_pixel: F64
    depth_shift: float
    spans: I64
    vertex_first: I64
    face_first: I64
    node_shift: F64
    patch_plane: I32
    planes: F64


def prepare(geometry: Geometry, panel: Panel, page: Page) -> Scene:
    """Make `panel` ready. Cost: the nodes and the patches, not the triangles (planar ones are read once)."""
    place = window(panel.place, page)
    spans = _spans(geometry, panel)
    to_pixel = panel.projection.world_to_page.copy()
    to_pixel[:2] *= place.pixels_per_mm
    shift = _depth_shift(geometry, panel, to_pixel, spans)
    to_pixel[2] -= shift * to_pixel[3]
    moved = np.zeros((len(geometry.nodes), 3)) if panel.displacement is None else panel.displacement
    patch_plane, planes = _planes(geometry, spans, to_pixel, moved)
    return Scene(
        geometry, panel, place, to_pixel, shift, spans, _starts(spans[:, 1] - spans[:, 0]),
        _starts(spans[:, 3] - spans[:, 2]), np.ascontiguousarray(moved @ to_pixel[:, :3].T), patch_plane, planes,
    )  # fmt: skip


def _spans(geometry: Geometry, panel: Panel) -> I64:
    hidden = np.zeros(len(geometry.nodes), bool) if panel.emphasis is None else panel.emphasis == Emphasis.HIDE
    shown = [row for row, node in enumerate(geometry.nodes) if node.mesh >= 0 and not hidden[row]]
    shown.sort(key=lambda row: (geometry.nodes[row].path, row))
    rows = [(*geometry.nodes[row].vertex_range, *geometry.nodes[row].face_range, row) for row in shown]
    return np.array(rows, np.int64).reshape(-1, 5)


def _starts(counts: I64) -> I64:
    return np.concatenate([np.zeros(1, np.int64), np.cumsum(counts)])


def _depth_shift(geometry: Geometry, panel: Panel, to_pixel: F64, spans: I64) -> float:
    """Depth near the middle of the model, from which parallel depths are counted: float32 is finest near 0."""
    if panel.projection.kind == "central" or not len(spans):
        return 0.0
    some = geometry.vertices[:: max(1, len(geometry.vertices) // 1000)]
    depth = some @ to_pixel[2, :3] + to_pixel[2, 3]
    return float((depth.min() + depth.max()) / 2.0)


def _planes(geometry: Geometry, spans: I64, to_pixel: F64, moved: F64) -> tuple[I32, F64]:
    """Depth planes of the shown planar patches; patches in one plane share the row of the first in drawing order."""
    patches = geometry.patches
    patch_plane = np.full(len(patches.kind), -1, np.int32)
    rank, node_of = _patch_order(geometry, spans)
    planar = np.flatnonzero((patches.kind == PatchKind.PLANE) & (rank >= 0))
    if not len(planar):
        return patch_plane, np.zeros((0, 3))
    planar = planar[np.argsort(rank[planar], kind="stable")]
    centre, size = _middle(geometry)
    normal = patches.frame[planar, 3]
    distance = np.einsum("ij,ij->i", normal, patches.frame[planar, 0] + moved[node_of[planar]] - centre)
    keys = _keys(normal, distance, size)
    _, first, row = np.unique(keys, axis=0, return_index=True, return_inverse=True)
    covector = np.column_stack([normal[first], -(distance[first] + normal[first] @ centre)]) @ np.linalg.inv(to_pixel)
    edge_on = np.abs(covector[:, 2]) <= 1e-12 * np.abs(covector).max(axis=1)
    divisor = np.where(edge_on, 1.0, -covector[:, 2])
    patch_plane[planar] = np.where(edge_on[row], -1, row)
    _drop_uneven(geometry, patch_plane, size)
    return patch_plane, np.ascontiguousarray(covector[:, [0, 1, 3]] / divisor[:, None])


def _keys(normal: F64, distance: F64, size: float) -> F64:
    """Rounded plane coordinates, the same for both sides of a plane. Cells are centred on 0 and on round numbers."""
    rounded = np.round(normal / _PLANE_ANGLE)
    leading = np.where(rounded[:, 0] != 0, rounded[:, 0], np.where(rounded[:, 1] != 0, rounded[:, 1], rounded[:, 2]))
    sign = np.where(leading < 0, -1.0, 1.0)
    cell = size * _PLANE_DISTANCE
    return np.column_stack([rounded * sign[:, None], np.round(distance * sign / cell)]) + 0.0


def _patch_order(geometry: Geometry, spans: I64) -> tuple[I64, I64]:
    """Drawing order and node of every patch, -1 for patches not shown."""
    n_patches = len(geometry.patches.kind)
    rank, node_of = np.full(n_patches, -1, np.int64), np.zeros(n_patches, np.int64)
    count = 0
    for node in spans[:, 4]:
        start = int(geometry.patch_start[node])
        end = start + len(geometry.meshes[geometry.nodes[node].mesh].patches.kind)
        rank[start:end] = np.arange(count, count + end - start)
        node_of[start:end] = node
        count += end - start
    return rank, node_of


def _middle(geometry: Geometry) -> tuple[F64, float]:
    low, high = geometry.vertices.min(axis=0), geometry.vertices.max(axis=0)
    return (low + high) / 2.0, max(float(np.max(high - low)), 1e-9)


def _drop_uneven(geometry: Geometry, patch_plane: I32, size: float) -> None:
    """Give up the plane of any patch whose triangles leave it: its depth then comes from the corners."""
    patches = geometry.patches
    faces = np.flatnonzero(patch_plane[geometry.face_patch] >= 0)
    for start in range(0, len(faces), 1 << 16):
        some = faces[start : start + (1 << 16)]
        frame = patches.frame[geometry.face_patch[some]]
        corners = geometry.vertices[geometry.faces[some]] - frame[:, None, 0]
        off = np.abs(np.einsum("ijk,ik->ij", corners, frame[:, 3])).max(axis=1)
        patch_plane[geometry.face_patch[some[off > 1e-6 * size]]] = -1

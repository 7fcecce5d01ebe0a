"""A part path and all below it, as a geometry of its own."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace

import numpy as np

from ..contract import I32, Geometry, Node


def rows_below(geometry: Geometry, path: str) -> tuple[int, ...]:
    """The row of the node with that path, then the rows of all its descendants, rising. Empty if there is none."""
    kept: set[int] = set()
    for row, node in enumerate(geometry.nodes):
        if node.path == path or node.parent in kept:
            kept.add(row)
    return tuple(sorted(kept))


def subset(geometry: Geometry, rows: Iterable[int]) -> Geometry:
    """The geometry with only these nodes and their triangles, in the order of the nodes, still in world millimetres.

    A node whose parent is left out becomes a root; nothing moves. Meshes, patches and sources stay whole. Raises
    IndexError on a row that is not there. Cost: one copy of the triangles kept.
    """
    kept = sorted(set(rows))
    nodes = [geometry.nodes[row] for row in kept]
    face_rows, face_starts = _spans([node.face_range for node in nodes])
    vertex_rows, vertex_starts = _spans([node.vertex_range for node in nodes])
    new_row = np.full(len(geometry.nodes) + 1, -1, dtype=np.int32)
    new_row[kept] = np.arange(len(kept), dtype=np.int32)
    face_node = new_row[geometry.face_node[face_rows]]
    old_starts = np.array([node.vertex_range[0] for node in nodes], dtype=np.int32)
    vertex_shift = (vertex_starts[:-1] - old_starts).astype(np.int32)
    return replace(
        geometry,
        key=f"{geometry.key}/{','.join(map(str, kept))}",
        vertices=geometry.vertices[vertex_rows],
        faces=geometry.faces[face_rows] + vertex_shift[face_node][:, None],
        corner_normals=geometry.corner_normals[face_rows],
        face_node=face_node,
        face_patch=geometry.face_patch[face_rows],
        face_origin=geometry.face_origin[face_rows],
        face_source=geometry.face_source[face_rows],
        edge_kind=geometry.edge_kind[face_rows],
        patch_start=geometry.patch_start[kept],
        nodes=tuple(
            _moved(node, int(new_row[node.parent]), face_starts[k], face_starts[k + 1], vertex_starts[k : k + 2])
            for k, node in enumerate(nodes)
        ),
    )


def _spans(ranges: list[tuple[int, int]]) -> tuple[I32, I32]:
    """The rows of all ranges one after the other, and where each range starts in them, with the end."""
    starts = np.cumsum([0, *(stop - start for start, stop in ranges)], dtype=np.int32)
    rows = [np.arange(start, stop, dtype=np.int32) for start, stop in ranges]
    return np.concatenate([np.empty(0, dtype=np.int32), *rows]), starts


def _moved(node: Node, parent: int, first_face: np.int32, end_face: np.int32, vertices: I32) -> Node:
    return replace(
        node,
        parent=parent,
        face_range=(int(first_face), int(end_face)),
        vertex_range=(int(vertices[0]), int(vertices[1])),
    )

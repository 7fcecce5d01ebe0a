"""Views put together without the stage that makes them: no part hidden, no near plane, for tests of what reads one."""

from __future__ import annotations

import numpy as np
from platewright.backend.contract import F64, Geometry, Mesh, Projection
from platewright.backend.lines.model import Candidates, Tolerance, View
from platewright.backend.lines.segments import to_view
from support.geometries import flattened, leaf


def geometry_of(*meshes: Mesh) -> Geometry:
    """One part a mesh, each at the origin."""
    return flattened([leaf(f"part_{k}", -1, k, 0, np.eye(4)) for k in range(len(meshes))], meshes)


def view_of(geometry: Geometry, projection: Projection, displacement: F64 | None = None) -> View:
    """A geometry as a projection shows it, parts displaced by (n_nodes,3) mm."""
    world = geometry.vertices.copy()
    if displacement is not None:
        for row, node in enumerate(geometry.nodes):
            world[slice(*node.vertex_range)] += displacement[row]
    points = to_view(projection, world)
    corners = points[geometry.faces][:, :, :2]
    a, b = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    m = len(geometry.faces)
    return View(
        geometry, projection, points, world, geometry.faces, np.arange(m, dtype=np.int32), geometry.face_node,
        geometry.face_patch, geometry.corner_normals, geometry.edge_kind,
        -np.sign(a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]).astype(np.int8), np.ones(m, np.bool_),
        np.full((m, 3), -1, np.int32), Tolerance(1e-4, 1e-5),
    )  # fmt: skip


def runs_of(found: Candidates) -> list[F64]:
    """The view points (k,3) of each chain in order; consecutive segments must share their ends bit for bit."""
    runs = []
    for chain in range(int(found.chain.max(initial=-1)) + 1):
        rows = np.flatnonzero(found.chain == chain)
        assert len(rows) and (np.diff(rows) == 1).all()
        assert np.array_equal(found.end[rows[:-1], :2], found.start[rows[1:], :2])
        runs.append(np.concatenate((found.start[rows], found.end[rows[-1:]])))
    return runs

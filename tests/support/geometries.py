"""Small contract geometries made by hand, for tests of what reads the contract."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from platewright.backend.contract import F64, EdgeKind, Geometry, Material, Mesh, Node, Patches, PatchKind

BRASS = Material("brass", (0.0, 0.0, 0.0), (0.91, 0.73, 0.42), 0.4, True, (201, 164, 92), 8.5)
HOUSING = Material("housing", (0.69, 0.71, 0.64), (0.04, 0.04, 0.04), 0.6, False, (216, 220, 210), 1.2)
WEISS = Material("weiß matt", (0.8, 0.8, 0.8), (0.04, 0.04, 0.04), 1.0, False, (231, 231, 231))
MATERIALS = (BRASS, HOUSING, WEISS)


def shifted(x: float, y: float, z: float, linear: F64 | None = None) -> F64:
    """A (4,4) placement: the linear part (identity if none), then the shift in mm."""
    placement = np.eye(4)
    if linear is not None:
        placement[:3, :3] = linear
    placement[:3, 3] = x, y, z
    return placement


def turned(degrees: float, axis: int = 2) -> F64:
    """A (3,3) turn about a coordinate axis, by the right hand."""
    cosine, sine = np.cos(np.radians(degrees)), np.sin(np.radians(degrees))
    turn = np.eye(3)
    a, b = (axis + 1) % 3, (axis + 2) % 3
    turn[a, a], turn[a, b], turn[b, a], turn[b, b] = cosine, -sine, sine, cosine
    return turn


def flat_mesh(key: str, vertices: F64, faces: Sequence[Sequence[int]], patch_of: Sequence[int]) -> Mesh:
    """A closed mesh of plane patches; faces of one patch share their normal, sides between patches are sharp."""
    rows = np.array(faces, dtype=np.int32)
    patches = np.array(patch_of, dtype=np.int32)
    normals, frames = _planes(vertices[rows], patches)
    return Mesh(
        key=key,
        vertices=vertices,
        faces=rows,
        corner_normals=np.repeat(normals[:, None, :], 3, axis=1).astype(np.float32),
        face_patch=patches,
        face_origin=np.zeros(len(rows), dtype=np.uint8),
        face_source=np.full(len(rows), -1, dtype=np.int32),
        edge_kind=_side_kinds(rows, patches),
        patches=_plane_patches(frames),
        closed=True,
    )


def unit_cube() -> Mesh:
    """The cube from (0,0,0) to (1,1,1) mm, two triangles a side."""
    vertices = np.array([[x, y, z] for z in (0.0, 1.0) for y in (0.0, 1.0) for x in (0.0, 1.0)])
    quads = [(0, 2, 3, 1), (4, 5, 7, 6), (0, 1, 5, 4), (2, 6, 7, 3), (0, 4, 6, 2), (1, 3, 7, 5)]
    faces = [face for a, b, c, d in quads for face in ((a, b, c), (a, c, d))]
    return flat_mesh("cube", vertices, faces, [row // 2 for row in range(12)])


def corner_block() -> Mesh:
    """A tetrahedron with no symmetry, legs 3, 2 and 1 mm along x, y and z: volume 1 mm3."""
    vertices = np.array([[0.0, 0.0, 0.0], [3.0, 0.0, 0.0], [0.0, 2.0, 0.0], [0.0, 0.0, 1.0]])
    return flat_mesh("corner", vertices, [(0, 2, 1), (0, 1, 3), (0, 3, 2), (1, 2, 3)], [0, 1, 2, 3])


def sheet(n: int) -> Mesh:
    """A smooth open surface z = sin x cos y over n by n squares of a 10 mm field: 2 n n triangles, (n+1)^2 vertices."""
    x, y = (axis.reshape(-1) for axis in np.meshgrid(*[np.linspace(0.0, 10.0, n + 1)] * 2))
    normals = np.column_stack([-np.cos(x) * np.cos(y), np.sin(x) * np.sin(y), np.ones_like(x)])
    normals /= np.linalg.norm(normals, axis=1, keepdims=True)
    a = (np.arange(n)[:, None] * (n + 1) + np.arange(n)).reshape(-1).astype(np.int32)
    b, c, d = a + 1, a + n + 2, a + n + 1
    faces = np.stack([np.stack([a, b, c], axis=1), np.stack([a, c, d], axis=1)], axis=1).reshape(-1, 3)
    n_faces = len(faces)
    return Mesh(
        key="sheet",
        vertices=np.column_stack([x, y, np.sin(x) * np.cos(y)]),
        faces=faces,
        corner_normals=normals[faces].astype(np.float32),
        face_patch=np.zeros(n_faces, dtype=np.int32),
        face_origin=np.zeros(n_faces, dtype=np.uint8),
        face_source=np.full(n_faces, -1, dtype=np.int32),
        edge_kind=np.zeros((n_faces, 3), dtype=np.uint8),
        patches=replace(
            _plane_patches(np.concatenate([np.zeros((1, 3)), np.eye(3)])[None]),
            kind=np.array([PatchKind.FREE], dtype=np.uint8),
        ),
        closed=False,
    )


def leaf(path: str, parent: int, mesh: int, material: int, placement: F64) -> Node:
    """A node with triangles; its name is the last step of its path."""
    return Node(path, path.rsplit(".", 1)[-1], parent, placement, mesh, material)


def group(path: str, parent: int, placement: F64) -> Node:
    """A node without triangles."""
    return Node(path, path.rsplit(".", 1)[-1], parent, placement, closed=False)


def flattened(nodes: Sequence[Node], meshes: Sequence[Mesh]) -> Geometry:
    """A geometry of these nodes, whose ranges are filled in here; triangles stand in the order of the nodes."""
    placed, parts, patch_start = [], [], []
    n_faces = n_vertices = n_patches = 0
    for row, node in enumerate(nodes):
        patch_start.append(n_patches)
        if node.mesh < 0:
            placed.append(node)
            continue
        mesh = meshes[node.mesh]
        parts.append((row, n_vertices, n_patches, _placed_mesh(mesh, node.placement)))
        ends = n_faces + len(mesh.faces), n_vertices + len(mesh.vertices)
        placed.append(replace(node, face_range=(n_faces, ends[0]), vertex_range=(n_vertices, ends[1])))
        n_faces, n_vertices = ends
        n_patches += len(mesh.patches.kind)
    solids = [mesh for *_, mesh in parts]
    return Geometry(
        key="hand-made",
        vertices=np.concatenate([mesh.vertices for mesh in solids]),
        faces=np.concatenate([mesh.faces + np.int32(start) for _, start, _, mesh in parts]),
        corner_normals=np.concatenate([mesh.corner_normals for mesh in solids]),
        face_node=np.concatenate([np.full(len(mesh.faces), row, dtype=np.int32) for row, _, _, mesh in parts]),
        face_patch=np.concatenate([mesh.face_patch + np.int32(start) for _, _, start, mesh in parts]),
        face_origin=np.concatenate([mesh.face_origin for mesh in solids]),
        face_source=np.concatenate([mesh.face_source for mesh in solids]),
        edge_kind=np.concatenate([mesh.edge_kind for mesh in solids]),
        patches=Patches(
            kind=np.concatenate([mesh.patches.kind for mesh in solids]),
            frame=np.concatenate([mesh.patches.frame for mesh in solids]),
            size=np.concatenate([mesh.patches.size for mesh in solids]),
            inward=np.concatenate([mesh.patches.inward for mesh in solids]),
        ),
        patch_start=np.array(patch_start, dtype=np.int32),
        nodes=tuple(placed),
        meshes=tuple(meshes),
        sources=(),
    )


def one_cube() -> Geometry:
    """A unit cube, alone."""
    return flattened([leaf("cube", -1, 0, 0, np.eye(4))], [unit_cube()])


def two_of_a_kind() -> Geometry:
    """Two instances of one mesh in a two-level tree whose groups are turned and shifted, and a cube of its own."""
    stand = shifted(100.0, 20.0, -5.0, turned(30.0))
    arm = stand @ shifted(0.0, 0.0, 40.0, turned(90.0, 0))
    return flattened(
        [
            group("stand", -1, stand),
            group("stand.arm", 0, arm),
            leaf("stand.arm.foot[1]", 1, 0, 0, arm @ shifted(5.0, 0.0, 0.0)),
            leaf("stand.arm.foot[2]", 1, 0, 0, arm @ shifted(-5.0, 0.0, 0.0, turned(180.0))),
            leaf("stand.base", 0, 1, 1, stand @ shifted(0.0, 0.0, -1.0, 10.0 * np.eye(3))),
        ],
        [corner_block(), unit_cube()],
    )


def mirrored() -> Geometry:
    """A block with no symmetry and its mirror image across x, two instances of one mesh."""
    return flattened(
        [
            group("pair", -1, np.eye(4)),
            leaf("pair.right", 0, 0, 0, shifted(1.0, 0.0, 0.0)),
            leaf("pair.left", 0, 0, 0, shifted(-1.0, 0.0, 0.0, np.diag([-1.0, 1.0, 1.0]))),
        ],
        [corner_block()],
    )


def stretched() -> Geometry:
    """An unevenly scaled group with a turned part in it: a shear no chain of turns and even scalings can hold."""
    outer = shifted(2.0, 3.0, 4.0, np.diag([1.0, 2.0, -0.5]))
    return flattened(
        [group("rack", -1, outer), leaf("rack.bar", 0, 0, 1, outer @ shifted(1.0, 0.0, 0.0, turned(33.0)))],
        [corner_block()],
    )


def awkward_names() -> Geometry:
    """Names with spaces, quotes, commas, backslashes and letters outside ASCII; three materials."""
    return flattened(
        [
            group("Prüfstand 2", -1, np.eye(4)),
            leaf('Prüfstand 2.Düse "A", links', 0, 0, 2, shifted(0.0, 0.0, 0.0)),
            leaf("Prüfstand 2.шкала", 0, 0, 1, shifted(2.0, 0.0, 0.0)),
            leaf("Prüfstand 2.箱[M4 lang]", 0, 1, 0, shifted(4.0, 0.0, 0.0)),
            leaf("Prüfstand 2.b\\n", 0, 0, 2, shifted(6.0, 0.0, 0.0)),
        ],
        [unit_cube(), corner_block()],
    )


def _planes(corners: F64, patch_of: np.ndarray) -> tuple[F64, F64]:
    """Unit normals (m,3) of the faces, and a frame (p,4,3) for each patch."""
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    normals /= np.linalg.norm(normals, axis=1, keepdims=True)
    frames = np.empty((int(patch_of.max()) + 1, 4, 3))
    for row in range(len(frames)):
        face = int(np.flatnonzero(patch_of == row)[0])
        x = corners[face, 1] - corners[face, 0]
        x /= np.linalg.norm(x)
        frames[row] = corners[face, 0], x, np.cross(normals[face], x), normals[face]
    return normals, frames


def _plane_patches(frames: F64) -> Patches:
    n = len(frames)
    kinds = np.full(n, PatchKind.PLANE, dtype=np.uint8)
    return Patches(kinds, frames, np.zeros((n, 2)), np.zeros(n, dtype=np.bool_))


def _side_kinds(faces: np.ndarray, patch_of: np.ndarray) -> np.ndarray:
    owner = {(int(f[k]), int(f[(k + 1) % 3])): row for row, f in enumerate(faces) for k in range(3)}
    kinds = np.empty(faces.shape, dtype=np.uint8)
    for row, face in enumerate(faces):
        for k in range(3):
            other = owner.get((int(face[(k + 1) % 3]), int(face[k])), -1)
            is_same = other >= 0 and patch_of[other] == patch_of[row]
            kinds[row, k] = EdgeKind.BORDER if other < 0 else EdgeKind.INSIDE if is_same else EdgeKind.SHARP
    return kinds


def _placed_mesh(mesh: Mesh, placement: F64) -> Mesh:
    """The mesh in world millimetres, turned over if the placement mirrors.

    Its plane patches are moved along, which is right for turns, shifts and mirrors.
    """
    linear, shift = placement[:3, :3], placement[:3, 3]
    normals = mesh.corner_normals.astype(np.float64) @ np.linalg.inv(linear)
    normals /= np.linalg.norm(normals, axis=-1, keepdims=True)
    faces, kinds = mesh.faces, mesh.edge_kind
    if np.linalg.det(linear) < 0:
        faces, normals, kinds = faces[:, ::-1], normals[:, ::-1], kinds[:, [1, 0, 2]]
    frame = mesh.patches.frame @ linear.T
    frame[:, 0] += shift
    return replace(
        mesh,
        vertices=mesh.vertices @ linear.T + shift,
        faces=np.ascontiguousarray(faces),
        corner_normals=np.ascontiguousarray(normals.astype(np.float32)),
        edge_kind=np.ascontiguousarray(kinds),
        patches=replace(mesh.patches, frame=frame),
    )

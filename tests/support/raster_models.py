"""Geometry for the rasteriser's tests: a few meshes with exact normals, put together without the compiler."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from platewright.backend import camera
from platewright.backend.contract import (
    F64,
    Geometry,
    Light,
    Lighting,
    Material,
    Mesh,
    Node,
    Page,
    Panel,
    Patches,
    PatchKind,
    Projection,
    Style,
)

PAINT = Material("paint", (0.6, 0.6, 0.6), (0.04, 0.04, 0.04), 0.5, False, (200, 200, 200))
MATT = Material("matt", (0.8, 0.8, 0.8), (0.0, 0.0, 0.0), 1.0, False, (220, 220, 220))


@dataclass(frozen=True, eq=False, slots=True)
class Part:
    """One node to be: corners (n,3), faces (m,3), normals (m,3,3), patch of each face, patches, material row."""

    path: str
    vertices: F64
    faces: np.ndarray
    normals: np.ndarray
    face_patch: np.ndarray
    patches: Patches
    material: int = 0
    closed: bool = True


def free_patch() -> Patches:
    return Patches(
        np.array([PatchKind.FREE], np.uint8),
        np.zeros((1, 4, 3)) + np.eye(4, 3, -1),
        np.zeros((1, 2)),
        np.zeros(1, bool),
    )


def triangles(path: str, vertices, faces, normals=None, material: int = 0, closed: bool = False) -> Part:
    """A part of one free patch; flat normals if none are given per vertex (n,3)."""
    vertices, faces = np.asarray(vertices, np.float64), np.asarray(faces, np.int32).reshape(-1, 3)
    if normals is None:
        a, b, c = (vertices[faces[:, k]] for k in range(3))
        cross = np.cross(b - a, c - a)
        flat = cross / np.maximum(np.linalg.norm(cross, axis=1, keepdims=True), 1e-300)
        corner_normals = np.repeat(flat[:, None], 3, axis=1)
    else:
        corner_normals = np.asarray(normals)[faces]
    patch = np.zeros(len(faces), np.int32)
    return Part(path, vertices, faces, corner_normals.astype(np.float32), patch, free_patch(), material, closed)


def block(path: str, low, high, material: int = 0, flip: bool = False) -> Part:
    """A block of six planar patches; `flip` turns the diagonal of every side."""
    low, high = np.asarray(low, float), np.asarray(high, float)
    vertices, faces, normals, patch, frames = [], [], [], [], []
    for axis in range(3):
        for side in (0, 1):
            u, v = (axis + 1) % 3, (axis + 2) % 3
            normal = np.zeros(3)
            normal[axis] = 1.0 if side else -1.0
            corners = np.tile(low, (4, 1))
            corners[:, axis] = high[axis] if side else low[axis]
            order = ((0, 0), (1, 0), (1, 1), (0, 1)) if side else ((0, 0), (0, 1), (1, 1), (1, 0))
            for k, (i, j) in enumerate(order):
                corners[k, u], corners[k, v] = (high[u] if i else low[u]), (high[v] if j else low[v])
            base = 4 * len(frames)
            quads = ((1, 2, 3), (1, 3, 0)) if flip else ((0, 1, 2), (0, 2, 3))
            faces += [[base + k for k in quad] for quad in quads]
            normals += [np.tile(normal, (3, 1))] * 2
            patch += [len(frames)] * 2
            x = np.roll(np.abs(normal), 1)
            frames.append(np.array([corners[0], x, np.cross(normal, x), normal]))
            vertices.append(corners)
    patches = Patches(np.full(6, PatchKind.PLANE, np.uint8), np.array(frames), np.zeros((6, 2)), np.zeros(6, bool))
    return Part(
        path, np.concatenate(vertices), np.array(faces, np.int32), np.array(normals, np.float32),
        np.array(patch, np.int32), patches, material,
    )  # fmt: skip


def _grid(n_u: int, n_v: int) -> np.ndarray:
    i, j = (k.ravel() for k in np.meshgrid(np.arange(n_u), np.arange(n_v), indexing="ij"))
    a = i * (n_v + 1) + j
    b, c, d = a + n_v + 1, a + n_v + 2, a + 1
    return np.concatenate([np.column_stack([a, b, c]), np.column_stack([a, c, d])]).astype(np.int32)


def sphere(path: str, radius: float, centre=(0, 0, 0), n: int = 48, material: int = 0) -> Part:
    u, v = np.meshgrid(np.linspace(0, 2 * np.pi, 2 * n + 1), np.linspace(np.pi, 0, n + 1), indexing="ij")
    normal = np.stack([np.cos(u) * np.sin(v), np.sin(u) * np.sin(v), np.cos(v)], -1).reshape(-1, 3)
    part = triangles(path, radius * normal + np.asarray(centre, float), _grid(2 * n, n), normal, material, True)
    return part


def torus(path: str, radius: float, tube: float, centre=(0, 0, 0), n: int = 48, material: int = 0) -> Part:
    u, v = np.meshgrid(np.linspace(0, 2 * np.pi, 2 * n + 1), np.linspace(0, 2 * np.pi, n + 1), indexing="ij")
    normal = np.stack([np.cos(u) * np.cos(v), np.sin(u) * np.cos(v), np.sin(v)], -1).reshape(-1, 3)
    ring = np.stack([np.cos(u) * radius, np.sin(u) * radius, 0 * u], -1).reshape(-1, 3)
    return triangles(path, ring + tube * normal + np.asarray(centre, float), _grid(2 * n, n), normal, material, True)


def cylinder(path: str, radius: float, low: float, high: float, n: int = 96, material: int = 0) -> Part:
    """Upright on the z axis, its wall smooth, its ends flat."""
    angle = np.linspace(0, 2 * np.pi, n + 1)
    ring = np.column_stack([np.cos(angle), np.sin(angle), 0 * angle])
    wall = np.stack([radius * ring + (0, 0, low), radius * ring + (0, 0, high)], 1).reshape(-1, 3)
    k = np.arange(n)
    side = np.concatenate(
        [np.column_stack([2 * k, 2 * k + 2, 2 * k + 3]), np.column_stack([2 * k, 2 * k + 3, 2 * k + 1])]
    )
    caps = [np.vstack([[[0, 0, z]], radius * ring + (0, 0, z)]) for z in (low, high)]
    base, top = len(wall), len(wall) + n + 2
    bottom_faces = np.column_stack([np.full(n, base), base + 2 + k, base + 1 + k])
    top_faces = np.column_stack([np.full(n, top), top + 1 + k, top + 2 + k])
    normals = np.concatenate([np.repeat(ring, 2, 0), np.tile((0, 0, -1), (n + 2, 1)), np.tile((0, 0, 1), (n + 2, 1))])
    return triangles(
        path, np.concatenate([wall, *caps]), np.concatenate([side, bottom_faces, top_faces]), normals, material, True
    )


def assemble(parts: Sequence[Part]) -> Geometry:
    """Flatten parts under one root node, in the order given."""
    identity = np.eye(4)
    nodes, meshes = [Node("", "root", -1, identity)], []
    n_vertices = n_faces = n_patches = 0
    patch_start = [0]
    for part in parts:
        n, m = len(part.vertices), len(part.faces)
        edge_kind, zeros = np.zeros((m, 3), np.uint8), np.zeros(m, np.uint8)
        meshes.append(
            Mesh(
                part.path, part.vertices, part.faces, part.normals, part.face_patch, zeros, np.full(m, -1, np.int32),
                edge_kind, part.patches, part.closed,
            )
        )  # fmt: skip
        nodes.append(
            Node(
                part.path, part.path, 0, identity, len(meshes) - 1, part.material, (n_faces, n_faces + m),
                (n_vertices, n_vertices + n), part.closed,
            )
        )  # fmt: skip
        patch_start.append(n_patches)
        n_vertices, n_faces, n_patches = n_vertices + n, n_faces + m, n_patches + len(part.patches.kind)
    starts = [node.vertex_range[0] for node in nodes[1:]]
    all_patches = Patches(*(np.concatenate([getattr(p.patches, f) for p in parts]) for f in Patches.__slots__))
    return Geometry(
        "test",
        np.concatenate([part.vertices for part in parts]),
        np.concatenate([part.faces + start for part, start in zip(parts, starts, strict=True)]).astype(np.int32),
        np.concatenate([part.normals for part in parts]),
        np.concatenate([np.full(len(p.faces), k + 1, np.int32) for k, p in enumerate(parts)]),
        np.concatenate([p.face_patch + s for p, s in zip(parts, patch_start[1:], strict=True)]).astype(np.int32),
        np.zeros(n_faces, np.uint8),
        np.full(n_faces, -1, np.int32),
        np.zeros((n_faces, 3), np.uint8),
        all_patches,
        np.array(patch_start, np.int32),
        tuple(nodes),
        tuple(meshes),
        (),
    )


def upper_left_lighting(view: camera.Axes | Projection, key: float = 0.75, ambient: float = 0.3) -> Lighting:
    return Lighting((
        Light("directional", camera.upper_left(view), (key, key, key)),
        Light("ambient", (0.0, 0.0, 0.0), (ambient, ambient, ambient)),
    ))  # fmt: skip


def panel(projection: Projection, page: Page, samples: int = 4, drawn_as: str = "tone", **more) -> Panel:
    """The whole page as one panel lit from the upper left."""
    more.setdefault("lighting", upper_left_lighting(projection))
    more.setdefault("place", (0.0, 0.0, page.width, page.height))
    return Panel("view", 0, projection, style=Style(drawn_as, samples), **more)


def plan(page: Page, magnification: float = 1.0) -> Projection:
    """Seen from the top: world (0, 0) at the page's top left corner, x to the right, -y down."""
    return camera.parallel(camera.orthographic("top"), magnification, (0.0, 0.0))

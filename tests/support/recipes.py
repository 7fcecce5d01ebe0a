"""Short ways to write recipes in tests, and the checks that every mesh must pass."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import EdgeKind, Mesh, PatchKind
from platewright.compiler import measure
from platewright.compiler.solids.build import build
from platewright.compiler.solids.recipe import Affine, Placed, Primitive, Recipe, Step
from platewright.compiler.solids.transform import IDENTITY


def add(shape: Primitive | Recipe, *placements: Affine, source: int = 0, centred: bool = False) -> Step:
    return Step("add", (Placed(shape, placements or (IDENTITY,), source, centred),))


def cut(shape: Primitive | Recipe, *placements: Affine, source: int = 1, centred: bool = False) -> Step:
    return Step("cut", (Placed(shape, placements or (IDENTITY,), source, centred),))


def keep(shape: Primitive | Recipe, *placements: Affine, source: int = 2, centred: bool = False) -> Step:
    return Step("keep", (Placed(shape, placements or (IDENTITY,), source, centred),))


def made(*steps: Step, rung: float = 0.02) -> Mesh:
    """The mesh of a recipe that has no flaw at all."""
    mesh, flaws = build(Recipe(steps), rung)
    assert flaws == ()
    assert mesh is not None
    return mesh


def surface_distance(mesh: Mesh, patch: int, points: NDArray[np.float64]) -> NDArray[np.float64]:
    """How far points (k,3) lie outside (+) or inside (-) the analytic surface of a patch, from its descriptor alone."""
    origin, x, y, z = mesh.patches.frame[patch]
    size = mesh.patches.size[patch]
    local = (points - origin) @ np.stack((x, y, z)).T
    radius, height = np.hypot(local[:, 0], local[:, 1]), local[:, 2]
    kind = PatchKind(int(mesh.patches.kind[patch]))
    if kind == PatchKind.PLANE:
        return height
    if kind == PatchKind.CYLINDER:
        return radius - size[0]
    if kind == PatchKind.CONE:
        half = np.radians(size[0])
        return radius * np.cos(half) - height * np.sin(half)
    if kind == PatchKind.SPHERE:
        return np.hypot(radius, height) - size[0]
    assert kind == PatchKind.TORUS
    return np.hypot(radius - size[0], height) - size[1]


def check_mesh(mesh: Mesh, rung: float, tolerance: float = 1e-9) -> None:
    """The promises of the contract that hold for every mesh built at a rung.

    Closed, finite, sides paired, no sheet without thickness; frames right-handed and orthonormal; every vertex of a
    patch within the rung of its surface (twice where it is curved both ways); normals unit and to the face's side.
    """
    check_arrays(mesh)
    assert mesh.closed
    # A piece may be small, as where a ridge just reaches through, but it has a thickness: its volume over its area.
    thickness = np.abs(component_volumes(mesh)) / component_areas(mesh)
    assert (thickness > 1e-9 * np.ptp(mesh.vertices, axis=0).max()).all()
    assert np.isfinite(mesh.vertices).all()
    assert np.isfinite(mesh.corner_normals).all()
    assert not (mesh.edge_kind == EdgeKind.BORDER).any()
    lengths = np.linalg.norm(mesh.corner_normals, axis=2)
    assert np.abs(lengths - 1.0).max() < 1e-6
    axes = mesh.patches.frame[:, 1:]
    assert np.abs(axes @ axes.transpose(0, 2, 1) - np.eye(3)).max() < 1e-12
    assert (np.linalg.det(axes) > 0.0).all()
    size = np.abs(mesh.vertices).max()
    for patch in range(len(mesh.patches.kind)):
        faces = mesh.faces[mesh.face_patch == patch]
        assert len(faces)
        kind = PatchKind(int(mesh.patches.kind[patch]))
        if kind == PatchKind.FREE:
            continue
        points = mesh.vertices[np.unique(faces)]
        off = surface_distance(mesh, patch, points)
        if kind == PatchKind.PLANE:
            assert np.abs(off).max() <= tolerance * size
        else:
            both = 2.0 if kind in (PatchKind.SPHERE, PatchKind.TORUS) else 1.0
            assert np.abs(off).max() <= both * rung * (1.0 + 1e-4) + tolerance * size
    check_normals(mesh)


def check_arrays(mesh: Mesh) -> None:
    """Shapes, dtypes and ranges as the contract states them."""
    n, m, p = len(mesh.vertices), len(mesh.faces), len(mesh.patches.kind)
    expected = {
        "vertices": (np.float64, (n, 3)),
        "faces": (np.int32, (m, 3)),
        "corner_normals": (np.float32, (m, 3, 3)),
        "face_patch": (np.int32, (m,)),
        "face_origin": (np.uint8, (m,)),
        "face_source": (np.int32, (m,)),
        "edge_kind": (np.uint8, (m, 3)),
    }
    for name, (dtype, shape) in expected.items():
        array = getattr(mesh, name)
        assert (array.dtype, array.shape) == (dtype, shape), name
    patches = mesh.patches
    assert [a.dtype for a in (patches.kind, patches.frame, patches.size, patches.inward)] == [
        np.uint8,
        np.float64,
        np.float64,
        np.bool_,
    ]
    assert (patches.frame.shape, patches.size.shape, patches.inward.shape) == ((p, 4, 3), (p, 2), (p,))
    assert mesh.faces.min() >= 0
    assert np.array_equal(np.unique(mesh.faces), np.arange(n))
    assert np.array_equal(np.unique(mesh.face_patch), np.arange(p))


def component_volumes(mesh: Mesh) -> NDArray[np.float64]:
    """Of every connected surface: negative for a cavity, zero for a sheet that no regularised solid has."""
    a, b, c = (mesh.vertices[mesh.faces[:, k]] - mesh.vertices.mean(axis=0) for k in range(3))
    six = np.einsum("ij,ij->i", a, np.cross(b, c))
    return np.bincount(measure.components(mesh.faces, len(mesh.vertices)), six) / 6.0


def component_areas(mesh: Mesh) -> NDArray[np.float64]:
    """Of every connected surface, mm2."""
    a, b, c = (mesh.vertices[mesh.faces[:, k]] for k in range(3))
    doubled = np.linalg.norm(np.cross(b - a, c - a), axis=1)
    return np.bincount(measure.components(mesh.faces, len(mesh.vertices)), doubled) / 2.0


def check_normals(mesh: Mesh) -> None:
    """Every triangle that is no sliver looks the way its corner normals do."""
    corners = mesh.vertices[mesh.faces]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    doubled = np.linalg.norm(normal, axis=1)
    longest = np.linalg.norm(corners - np.roll(corners, 1, axis=1), axis=2).max(axis=1)
    fair = doubled > 1e-3 * longest**2
    facing = np.einsum("mj,mkj->mk", normal[fair], mesh.corner_normals[fair].astype(float)) / doubled[fair, None]
    assert facing.min() > 0.0
    assert np.median(facing) > 0.8

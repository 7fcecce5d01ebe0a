"""Exports read back by reference libraries: trimesh, and plyfile where it is installed.

The demand is that of handing geometry on: all names, colours and parent links, vertices within 1e-6 relative, equal
triangle counts, stable order.
"""

from __future__ import annotations

import io

import numpy as np
import pytest
import trimesh
from platewright.backend.contract import F64, Geometry
from platewright.backend.write.exports import export
from support import geometries
from support.geometries import MATERIALS
from trimesh.resolvers import Resolver

ALL = [
    geometries.one_cube,
    geometries.two_of_a_kind,
    geometries.mirrored,
    geometries.stretched,
    geometries.awkward_names,
]
RELATIVE = 1e-6


@pytest.fixture(params=ALL, ids=lambda make: make.__name__)
def geometry(request: pytest.FixtureRequest) -> Geometry:
    made: Geometry = request.param()
    return made


class Files(Resolver):
    """Hands trimesh the files that stand beside an OBJ."""

    def __init__(self, files: dict[str, bytes]) -> None:
        self.files = files

    def get(self, name: str) -> bytes:
        return self.files[name]

    def write(self, name: str, data: bytes) -> None:
        raise PermissionError(name)

    def namespaced(self, namespace: str) -> Resolver:
        raise NotImplementedError(namespace)

    def keys(self) -> list[str]:
        return list(self.files)


def corners(geometry: Geometry) -> F64:
    return geometry.vertices[geometry.faces]


def volume(triangles: F64) -> float:
    """Signed volume by the divergence theorem."""
    return float(np.einsum("ij,ij->", triangles[:, 0], np.cross(triangles[:, 1], triangles[:, 2])) / 6)


def test_the_hand_made_volumes_are_right() -> None:
    """Closed forms: a cube of 1 mm, tetrahedra of 3 * 2 * 1 / 6 mm3, a cube of 10 mm, stretched by 1 * 2 * 0.5."""
    for make, expected in zip(ALL, (1.0, 2 + 1000.0, 2.0, 1.0, 3 + 1.0), strict=True):
        assert abs(volume(corners(make())) - expected) < 1e-9 * expected


def assert_same_triangles(found: F64, expected: F64) -> None:
    size = np.abs(expected).max()
    assert found.shape == expected.shape
    assert np.abs(found - expected).max() <= RELATIVE * size


def test_stl(geometry: Geometry) -> None:
    mesh = trimesh.load_mesh(io.BytesIO(export(geometry, MATERIALS, "stl")["stl"]), file_type="stl", process=False)
    assert_same_triangles(np.asarray(mesh.triangles), corners(geometry))
    assert np.allclose(mesh.face_normals, geometry.corner_normals[:, 0], atol=1e-5)
    mesh.merge_vertices()
    assert abs(mesh.volume / volume(corners(geometry)) - 1) < 1e-5
    assert mesh.is_watertight and mesh.is_winding_consistent


def test_ply(geometry: Geometry) -> None:
    mesh = trimesh.load_mesh(io.BytesIO(export(geometry, MATERIALS, "ply")["ply"]), file_type="ply", process=False)
    assert np.array_equal(mesh.vertices, geometry.vertices)
    assert np.array_equal(mesh.faces, geometry.faces)
    materials = [geometry.nodes[row].material for row in geometry.face_node]
    assert np.array_equal(mesh.visual.face_colors[:, :3], [MATERIALS[row].flat for row in materials])
    raw = mesh.metadata["_ply_raw"]["face"]["data"]
    assert np.array_equal(np.asarray(raw["part_index"]).reshape(-1), geometry.face_node)
    assert np.array_equal(np.asarray(raw["material_index"]).reshape(-1), materials)
    assert mesh.is_watertight and abs(mesh.volume / volume(corners(geometry)) - 1) < 1e-9


def test_ply_by_a_second_reader(geometry: Geometry) -> None:
    plyfile = pytest.importorskip("plyfile", reason="plyfile is not installed")
    read = plyfile.PlyData.read(io.BytesIO(export(geometry, MATERIALS, "ply")["ply"]))
    face = read["face"].data
    assert np.array_equal(np.stack(face["vertex_indices"]), geometry.faces)
    assert np.array_equal(face["part_index"], geometry.face_node)
    assert np.array_equal(np.stack([read["vertex"][axis] for axis in "xyz"], axis=1), geometry.vertices)
    assert any("Not a manufacturing drawing" in comment for comment in read.comments)


def test_obj(geometry: Geometry) -> None:
    files = export(geometry, MATERIALS, "obj", name="teil")
    scene = trimesh.load_scene(
        io.BytesIO(files["obj"]),
        file_type="obj",
        resolver=Files({"teil.mtl": files["mtl"]}),
        split_objects=True,
        group_material=False,
        process=False,
    )
    for node in geometry.nodes:
        if node.mesh < 0:
            assert node.path not in scene.geometry
            continue
        mesh = scene.geometry[node.path]
        assert_same_triangles(np.asarray(mesh.triangles), corners(geometry)[slice(*node.face_range)])
        assert mesh.visual.material.name == MATERIALS[node.material].name
        assert np.array_equal(mesh.visual.material.main_color[:3], MATERIALS[node.material].flat)
    assert len(scene.geometry) == sum(node.mesh >= 0 for node in geometry.nodes)


def glb_scene(geometry: Geometry) -> trimesh.Scene:
    data = export(geometry, MATERIALS, "glb")["glb"]
    return trimesh.load_scene(io.BytesIO(data), file_type="glb", process=False)


def test_glb_names_and_parents(geometry: Geometry) -> None:
    scene = glb_scene(geometry)
    parents = scene.graph.transforms.parents
    paths = [node.path for node in geometry.nodes]
    assert set(paths) <= set(scene.graph.nodes)
    for node in geometry.nodes:
        assert parents[node.path] == (paths[node.parent] if node.parent >= 0 else scene.graph.base_frame)


def test_glb_triangles_in_the_world(geometry: Geometry) -> None:
    """x right, y up, z toward the viewer, metres (glTF 2.0 section 3.4): (x, y, z) mm is (x, z, -y) / 1000 m."""
    scene = glb_scene(geometry)
    for node in geometry.nodes:
        if node.mesh < 0:
            continue
        matrix, name = scene.graph[node.path]
        mesh = scene.geometry[name]
        world = trimesh.transform_points(mesh.vertices, matrix)
        faces = mesh.faces if np.linalg.det(matrix[:3, :3]) > 0 else mesh.faces[:, ::-1]
        x, y, z = np.moveaxis(corners(geometry)[slice(*node.face_range)], -1, 0)
        expected = np.stack([x, z, -y], axis=-1) / 1000
        assert (
            np.abs(sorted_corners(world[faces]) - sorted_corners(expected)).max() <= RELATIVE * np.abs(expected).max()
        )
        assert abs(volume(world[faces]) / volume(expected) - 1) < 1e-4
        normals = mesh.vertex_normals @ np.linalg.inv(matrix[:3, :3])
        normals /= np.linalg.norm(normals, axis=1, keepdims=True)
        flat = trimesh.Trimesh(world, faces, process=False).face_normals
        assert np.allclose(normals[faces], flat[:, None], atol=1e-5)


def sorted_corners(triangles: F64) -> F64:
    """Triangles begun at their first corner in the order of x, then y, then z; cyclic order, so winding, is kept."""
    rounded = np.round(triangles * 1e5)
    first = [min(range(3), key=lambda k, t=triangle: tuple(t[k])) for triangle in rounded]  # type: ignore[misc]
    return np.stack([np.roll(triangle, -k, axis=0) for triangle, k in zip(triangles, first, strict=True)])


def test_glb_colours_and_instances(geometry: Geometry) -> None:
    scene = glb_scene(geometry)
    owners: dict[str, set[tuple[int, int]]] = {}
    for node in geometry.nodes:
        if node.mesh < 0:
            continue
        name = scene.graph[node.path][1]
        material = scene.geometry[name].visual.material
        wanted = MATERIALS[node.material]
        base = wanted.normal_reflectance if wanted.metal else wanted.colour
        assert material.name == wanted.name
        assert np.allclose(np.asarray(material.baseColorFactor)[:3] / 255, base, atol=0.5 / 255)
        assert material.metallicFactor == (1.0 if wanted.metal else 0.0)
        assert material.roughnessFactor == wanted.roughness
        owners.setdefault(name, set()).add((node.mesh, node.material))
    assert all(len(pairs) == 1 for pairs in owners.values())
    assert len(owners) == len({pair for pairs in owners.values() for pair in pairs})


def test_a_long_ring_of_instances_keeps_one_mesh() -> None:
    nodes = [
        geometries.leaf(
            f"bolt[{k + 1}]",
            -1,
            0,
            0,
            geometries.shifted(0, 0, 0, geometries.turned(0.09 * k)) @ geometries.shifted(50.0, 0, 0),
        )
        for k in range(4000)
    ]
    data = export(geometries.flattened(nodes, [geometries.corner_block()]), MATERIALS, "glb")["glb"]
    assert len(data) < 4000 * 400
    scene = trimesh.load_scene(io.BytesIO(data), file_type="glb", process=False)
    assert len(scene.geometry) == 1 and len(scene.graph.nodes_geometry) == 4000

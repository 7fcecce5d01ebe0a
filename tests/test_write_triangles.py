"""Triangle lists: structure, order, names, subsets and repeatability, read with no more than the standard library."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import os
import struct
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from platewright.backend.contract import Geometry, verify_geometry
from platewright.backend.write.corners import split_corners
from platewright.backend.write.exports import KINDS, export
from platewright.backend.write.glb import glb_bytes
from platewright.backend.write.obj import obj_bytes
from platewright.backend.write.ply import ply_bytes
from platewright.backend.write.stl import facet_normals, stl_bytes
from platewright.backend.write.subset import rows_below, subset
from platewright.backend.write.table import COLUMNS, csv_bytes
from support import geometries
from support.geometries import MATERIALS

ALL = [
    geometries.one_cube,
    geometries.two_of_a_kind,
    geometries.mirrored,
    geometries.stretched,
    geometries.awkward_names,
]


@pytest.fixture(params=ALL, ids=lambda make: make.__name__)
def geometry(request: pytest.FixtureRequest) -> Geometry:
    made: Geometry = request.param()
    verify_geometry(made, len(MATERIALS))
    return made


def glb_parts(data: bytes) -> tuple[dict[str, list[dict[str, object]]], bytes]:
    """The JSON and the buffer, the container checked (glTF 2.0 section 4.4)."""
    assert struct.unpack_from("<III", data) == (0x46546C67, 2, len(data))
    length, kind = struct.unpack_from("<II", data, 12)
    assert kind == 0x4E4F534A and length % 4 == 0
    body, kind = struct.unpack_from("<II", data, 20 + length)
    assert kind == 0x004E4942 and 28 + length + body == len(data)
    return json.loads(data[20 : 20 + length]), data[28 + length :]


def test_csv_is_one_triangle_a_row(geometry: Geometry) -> None:
    data = csv_bytes(geometry, MATERIALS)
    assert b"\r" not in data and data.endswith(b"\n")
    header, *rows = csv.reader(io.StringIO(data.decode(), newline=""))
    assert tuple(header) == COLUMNS
    assert [(row[0], row[1]) for row in rows] == [
        (geometry.nodes[row].path, MATERIALS[geometry.nodes[row].material].name) for row in geometry.face_node
    ]
    corners = np.array([row[2:] for row in rows], dtype=np.float64).reshape(-1, 3, 3)
    assert np.array_equal(corners, geometry.vertices[geometry.faces])


def test_csv_of_a_known_triangle() -> None:
    block = geometries.flattened([geometries.leaf('a "b", c', -1, 0, 1, np.eye(4))], [geometries.corner_block()])
    assert csv_bytes(block, MATERIALS).decode().splitlines()[:2] == [
        "part,material,x1 mm,y1 mm,z1 mm,x2 mm,y2 mm,z2 mm,x3 mm,y3 mm,z3 mm",
        '"a ""b"", c",housing,0,0,0,0,2,0,3,0,0',
    ]


def test_stl_layout_and_normals(geometry: Geometry) -> None:
    """80 bytes that do not begin with "solid", a count, 50 bytes a facet (3D Systems, October 1989)."""
    data = stl_bytes(geometry)
    assert len(data) == 84 + 50 * len(geometry.faces)
    assert not data.lower().startswith(b"solid") and b"Not a manufacturing drawing" in data[:80]
    assert struct.unpack_from("<I", data, 80) == (len(geometry.faces),)
    facets = np.frombuffer(data, dtype=[("f", "<f4", (4, 3)), ("attribute", "<u2")], offset=84)
    assert not facets["attribute"].any()
    assert np.allclose(facets["f"][:, 1:], geometry.vertices[geometry.faces], rtol=1e-7, atol=0)
    assert np.allclose(facets["f"][:, 0], geometry.corner_normals[:, 0], atol=1e-6)


def test_a_facet_without_area_has_no_normal() -> None:
    assert np.array_equal(facet_normals(np.zeros((1, 3, 3))), np.zeros((1, 3)))


def test_ply_header_names_parts_and_materials() -> None:
    geometry = geometries.awkward_names()
    header = ply_bytes(geometry, MATERIALS).split(b"end_header\n")[0].decode("ascii").splitlines()
    assert header[:3] == ["ply", "format binary_little_endian 1.0", "comment unit mm"]
    assert header[3].startswith("comment Not a manufacturing drawing: check dimensions")
    materials = [line.split(" ", 3) for line in header if line.startswith("comment material")]
    assert [json.loads(words[3]) for words in materials] == [material.name for material in MATERIALS]
    parts = [line.split(" ", 8) for line in header if line.startswith("comment part")]
    assert [json.loads(words[8]) for words in parts] == [node.path for node in geometry.nodes]
    assert [int(words[4]) for words in parts] == [node.parent for node in geometry.nodes]
    assert [(int(words[6]), int(words[7])) for words in parts] == [node.face_range for node in geometry.nodes]


def test_obj_keeps_parts_materials_and_order(geometry: Geometry) -> None:
    obj, mtl = obj_bytes(geometry, MATERIALS, "teil eins.mtl")
    vertices, normals, rows, part, material = [], [], [], "", ""
    for line in obj.decode().splitlines():
        word, _, rest = line.partition(" ")
        match word:
            case "mtllib":
                assert rest == "teil eins.mtl"
            case "o":
                part = rest
            case "usemtl":
                material = rest
            case "v":
                vertices.append(list(map(float, rest.split())))
            case "vn":
                normals.append(list(map(float, rest.split())))
            case "f":
                rows.append((part, material, [tuple(map(int, corner.split("//"))) for corner in rest.split()]))
            case _:
                assert word == "#"
    assert np.array_equal(vertices, geometry.vertices)
    leaves = [geometry.nodes[row] for row in geometry.face_node]
    assert [row[:2] for row in rows] == [(node.path, MATERIALS[node.material].name) for node in leaves]
    corners = np.array([row[2] for row in rows]) - 1
    assert np.array_equal(corners[..., 0], geometry.faces)
    assert np.allclose(np.array(normals)[corners[..., 1]], geometry.corner_normals, atol=1e-6)
    used = [line[7:] for line in mtl.decode().splitlines() if line.startswith("newmtl ")]
    assert used == [MATERIALS[row].name for row in sorted({node.material for node in leaves})]


def test_mtl_colours_are_the_flat_ones() -> None:
    _, mtl = obj_bytes(geometries.awkward_names(), MATERIALS, "x.mtl")
    lines = mtl.decode().splitlines()
    assert lines[0].startswith("# Not a manufacturing drawing")
    assert lines[1:5] == ["newmtl brass", "Kd 0.788235 0.643137 0.360784", "Ks 0.788235 0.643137 0.360784", "illum 2"]
    assert lines[5:9] == ["newmtl housing", "Kd 0.847059 0.862745 0.823529", "Ks 0 0 0", "illum 1"]


def test_a_line_break_in_a_name_cannot_break_an_obj_line() -> None:
    block = geometries.flattened([geometries.leaf("a\nb\u2028c", -1, 0, 1, np.eye(4))], [geometries.corner_block()])
    assert "\no a_b_c\n" in obj_bytes(block, MATERIALS, "x.mtl")[0].decode()


def test_glb_keeps_tree_and_instances() -> None:
    geometry = geometries.two_of_a_kind()
    document, _ = glb_parts(glb_bytes(geometry, MATERIALS))
    assert [node["name"] for node in document["nodes"]] == [node.path for node in geometry.nodes]
    parents = [-1] * len(geometry.nodes)
    for row, node in enumerate(document["nodes"]):
        for child in node.get("children", []):  # type: ignore[attr-defined]
            parents[child] = row
    assert parents == [node.parent for node in geometry.nodes]
    assert [node.get("mesh") for node in document["nodes"]] == [None, None, 0, 0, 1]
    assert len(document["meshes"]) == 2 and len(document["accessors"]) == 6


def test_glb_stores_one_mesh_for_its_mirror_image_and_for_another_material() -> None:
    document, _ = glb_parts(glb_bytes(geometries.mirrored(), MATERIALS))
    assert [node.get("mesh") for node in document["nodes"]] == [None, 0, 0]
    cubes = geometries.flattened(
        [geometries.leaf(f"cube[{k}]", -1, 0, k, geometries.shifted(2.0 * k, 0, 0)) for k in range(3)],
        [geometries.unit_cube()],
    )
    document, _ = glb_parts(glb_bytes(cubes, MATERIALS))
    assert len(document["meshes"]) == 3 and len(document["accessors"]) == 3


def test_glb_splits_a_vertex_only_where_normals_differ() -> None:
    """A cube has 8 vertices with three normals each; a smooth sheet keeps its vertices."""
    cube, smooth = geometries.unit_cube(), geometries.sheet(6)
    assert len(split_corners(cube.faces, cube.corner_normals).first) == 24
    split = split_corners(smooth.faces, smooth.corner_normals)
    assert np.array_equal(split.of, smooth.faces.reshape(-1))


def test_glb_colours_are_linear_and_metal_is_metal() -> None:
    document, _ = glb_parts(glb_bytes(geometries.awkward_names(), MATERIALS))
    surfaces = {entry["name"]: entry["pbrMetallicRoughness"] for entry in document["materials"]}
    assert surfaces["housing"] == {
        "baseColorFactor": [0.69, 0.71, 0.64, 1],
        "metallicFactor": 0,
        "roughnessFactor": 0.6,
    }
    assert surfaces["brass"] == {"baseColorFactor": [0.91, 0.73, 0.42, 1], "metallicFactor": 1, "roughnessFactor": 0.4}
    assert list(surfaces) == ["weiß matt", "housing", "brass"]


def test_glb_of_groups_alone_is_a_bare_tree() -> None:
    group = subset(geometries.two_of_a_kind(), [0, 1])
    data = glb_bytes(group, MATERIALS)
    (length,) = struct.unpack_from("<I", data, 12)
    document = json.loads(data[20:])
    assert len(data) == 20 + length and set(document) == {"asset", "scene", "scenes", "nodes"}


def test_a_path_and_all_below_it() -> None:
    geometry = geometries.two_of_a_kind()
    assert rows_below(geometry, "stand.arm") == (1, 2, 3)
    assert rows_below(geometry, "stand") == (0, 1, 2, 3, 4)
    assert rows_below(geometry, "stand.base") == (4,)
    assert rows_below(geometry, "stan") == ()


@pytest.mark.parametrize("rows", [(1, 2, 3), (4,), (3, 0), ()])
def test_a_subset_holds_the_same_triangles(rows: tuple[int, ...]) -> None:
    geometry = geometries.two_of_a_kind()
    part = subset(geometry, rows)
    verify_geometry(part, len(MATERIALS))
    kept = sorted(rows)
    assert [node.path for node in part.nodes] == [geometry.nodes[row].path for row in kept]
    assert [node.parent for node in part.nodes] == [
        kept.index(geometry.nodes[row].parent) if geometry.nodes[row].parent in kept else -1 for row in kept
    ]
    old = np.isin(geometry.face_node, kept)
    assert np.array_equal(part.vertices[part.faces], geometry.vertices[geometry.faces][old])
    for node in part.nodes:
        span = slice(*node.face_range)
        assert {part.nodes[row].path for row in part.face_node[span]} <= {node.path}
        assert node.mesh < 0 or part.faces[span].min() == node.vertex_range[0]


def test_a_subset_of_all_is_the_whole(geometry: Geometry) -> None:
    for kind in KINDS:
        assert export(geometry, MATERIALS, kind, range(len(geometry.nodes))) == export(geometry, MATERIALS, kind)


def test_nothing_chosen_gives_files_without_triangles() -> None:
    files = {kind: export(geometries.one_cube(), MATERIALS, kind, ()) for kind in KINDS}
    assert files["csv"]["csv"].decode() == ",".join(COLUMNS) + "\n"
    assert len(files["stl"]["stl"]) == 84
    assert b"element face 0\n" in files["ply"]["ply"] and files["ply"]["ply"].endswith(b"end_header\n")
    assert b"\nf " not in files["obj"]["obj"] and b"newmtl" not in files["obj"]["mtl"]
    assert set(json.loads(files["glb"]["glb"][20:])) == {"asset"}


def test_exports_by_kind(geometry: Geometry) -> None:
    files = {kind: export(geometry, MATERIALS, kind, name="teil") for kind in KINDS}
    assert {kind: sorted(made) for kind, made in files.items()} == {
        "csv": ["csv"],
        "stl": ["stl"],
        "ply": ["ply"],
        "obj": ["mtl", "obj"],
        "glb": ["glb"],
    }
    assert b"mtllib teil.mtl\n" in files["obj"]["obj"]
    with pytest.raises(ValueError, match="no export of kind 'step'"):
        export(geometry, MATERIALS, "step")


def all_digest() -> str:
    """One digest of every export of every geometry here."""
    digest = hashlib.sha256()
    for make in ALL:
        for kind in KINDS:
            for suffix, data in export(make(), MATERIALS, kind).items():
                digest.update(suffix.encode() + data)
    return digest.hexdigest()


def test_bytes_do_not_depend_on_hash_seed_zone_locale_or_folder(tmp_path: Path) -> None:
    here = Path(__file__)
    code = f"import runpy; print(runpy.run_path({str(here)!r})['all_digest']())"
    for seed, zone, locale in (("1", "Asia/Tokyo", "C"), ("2", "America/Lima", "tr_TR.UTF-8")):
        surroundings = os.environ | {
            "PYTHONHASHSEED": seed,
            "TZ": zone,
            "LC_ALL": locale,
            "PYTHONPATH": str(here.parent),
            "OMP_NUM_THREADS": seed,
        }
        run = subprocess.run(
            [sys.executable, "-c", code], env=surroundings, cwd=tmp_path, capture_output=True, text=True, check=True
        )
        assert run.stdout.strip() == all_digest()


def test_the_documentation_names_every_kind_and_column() -> None:
    readme = (Path(__file__).parents[1] / "backend" / "write" / "README.md").read_text(encoding="utf-8")
    assert all(f"`{column}`" in readme for column in COLUMNS)
    assert all(f"## {kind.upper()}" in readme for kind in KINDS)
    assert "not manufacturing drawings. Check dimensions before making anything, and follow\n> local codes" in readme

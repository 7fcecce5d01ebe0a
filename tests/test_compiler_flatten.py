"""Flattening: every copy placed once, patches and sources carried, winding outward however copies are mirrored."""

from __future__ import annotations

import math
import re
from collections import defaultdict

import numpy as np
import pytest
from platewright.backend.contract import F64, FaceOrigin, Geometry, PatchKind
from platewright.compiler import scene
from platewright.compiler.measure import is_closed, volume
from support.scenes import Run, built, exported, planned

SHAPES = {
    "can": "add cylinder diameter 20 mm length 30 mm\n    cut cylinder diameter 6 mm length 40 mm centred",
    "spout": "add cone diameter 20 mm top 8 mm length 12 mm\n    cut cone diameter 10 mm length 8 mm",
    "ball": "add sphere diameter 18 mm\n    cut sphere diameter 9 mm at (8 mm, 0, 0)",
    "tyre": "add torus diameter 30 mm tube 6 mm\n    cut block (9 mm, 9 mm, 9 mm) centred at (15 mm, 0, 0)",
    "nut": "add prism sides 6 across 13 mm length 8 mm\n    cut cylinder diameter 8 mm length 8 mm",
}
PARTS = "".join(f"part {name}\n    {lines}\n" for name, lines in SHAPES.items())
PLACINGS = (
    "at (100 mm, 20 mm, -7 mm)",
    "turn 37 deg about x turn 21 deg about z at (5 mm, 0, 9 mm)",
    "mirrored across x turn 50 deg about y at (0, 40 mm, 0)",
    "scaled 2.5 mirrored across z at (0, 0, 60 mm)",
    "mirrored across x mirrored across y scaled 0.5",
)


def placed(name: str, clauses: str) -> scene.Exported:
    return exported(PARTS + f"assembly a\n    place {name} {clauses}\n", "a", 0.05)


def faces_of(geometry: Geometry, row: int) -> tuple[F64, np.ndarray]:
    node = geometry.nodes[row]
    return geometry.vertices, geometry.faces[slice(*node.face_range)]


@pytest.mark.parametrize("clauses", PLACINGS)
@pytest.mark.parametrize("name", SHAPES)
def test_a_placed_copy_is_closed_and_outward_and_its_normals_look_outward(name: str, clauses: str) -> None:
    geometry = placed(name, clauses).geometry
    plain = placed(name, "").geometry
    vertices, faces = faces_of(geometry, 1)
    assert is_closed(faces, len(vertices))
    scale = abs(np.linalg.det(geometry.nodes[1].placement[:3, :3]))
    assert volume(vertices, faces) > 0
    if scale == pytest.approx(1.0):
        assert volume(vertices, faces) == pytest.approx(volume(*faces_of(plain, 1)), rel=1e-9)
    a, b, c = (vertices[faces[:, k]] for k in range(3))
    across = np.cross(b - a, c - a)
    area = np.linalg.norm(across, axis=1)
    flat = across / area[:, None]
    normals = geometry.corner_normals[slice(*geometry.nodes[1].face_range)].astype(np.float64)
    assert np.abs(np.linalg.norm(normals, axis=2) - 1).max() < 1e-5
    thick = area > 1e-6
    assert (np.einsum("fj,fkj->fk", flat, normals)[thick] > 0.5).all()


@pytest.mark.parametrize("clauses", PLACINGS)
@pytest.mark.parametrize("name", SHAPES)
def test_every_vertex_of_a_patch_lies_on_its_surface_in_the_world(name: str, clauses: str) -> None:
    geometry = placed(name, clauses).geometry
    seen = set()
    for patch in range(len(geometry.patches.kind)):
        corners = geometry.faces[geometry.face_patch == patch]
        points = geometry.vertices[np.unique(corners)]
        origin, x, y, z = geometry.patches.frame[patch]
        assert np.allclose([x @ x, y @ y, z @ z, x @ y, y @ z, z @ x], [1, 1, 1, 0, 0, 0], atol=1e-9)
        assert np.allclose(np.cross(x, y), z, atol=1e-9)
        across, along = np.linalg.norm(np.cross(points - origin, z), axis=1), (points - origin) @ z
        size = geometry.patches.size[patch]
        kind = PatchKind(int(geometry.patches.kind[patch]))
        seen.add(kind)
        off = {
            PatchKind.PLANE: along,
            PatchKind.CYLINDER: across - size[0],
            PatchKind.CONE: across * math.cos(math.radians(size[0])) - along * math.sin(math.radians(size[0])),
            PatchKind.SPHERE: np.linalg.norm(points - origin, axis=1) - size[0],
            PatchKind.TORUS: np.hypot(across - size[0], along) - size[1],
        }[kind]
        # Where two surfaces cut, the cut of their facets lies off both by no more than the chord error.
        assert np.abs(off).max() < 0.051 * max(1.0, 2.5), (kind, np.abs(off).max())
        assert np.median(np.abs(off)) < 1e-6 or kind in (PatchKind.SPHERE, PatchKind.TORUS, PatchKind.CONE)
    assert seen - {PatchKind.FREE}


def test_a_cylinders_vertices_lie_on_it_exactly() -> None:
    geometry = placed("can", PLACINGS[3]).geometry
    for patch in np.flatnonzero(geometry.patches.kind == PatchKind.CYLINDER):
        points = geometry.vertices[np.unique(geometry.faces[geometry.face_patch == patch])]
        origin, _, _, z = geometry.patches.frame[patch]
        across = np.linalg.norm(np.cross(points - origin, z), axis=1)
        assert np.abs(across - geometry.patches.size[patch][0]).max() < 1e-9


def test_the_wall_of_a_cut_answers_with_the_cutting_line() -> None:
    text = (
        "part plate\n    add block (40 mm, 40 mm, 5 mm)\n    cut cylinder diameter 8 mm length 5 mm\n"
        "part lid\n    add\n        block (9 mm, 9 mm, 2 mm)\n        sphere diameter 4 mm at (0, 0, 2 mm)\n"
        "part both\n    add plate\n    add lid at (15 mm, 0, 4 mm)\n"
        "assembly a\n    place plate mirrored across x\n    place both at (90 mm, 0, 0) ring 2\n"
    )
    geometry = exported(text, "a", 0.1).geometry
    lines = {source: geometry.sources[source].line for source in np.unique(geometry.face_source)}
    for row, wanted in ((1, {2, 3}), (2, {2, 3, 6, 7}), (3, {2, 3, 6, 7})):
        assert geometry.nodes[row].mesh >= 0
        sources = geometry.face_source[slice(*geometry.nodes[row].face_range)]
        assert {lines[source] for source in sources} <= wanted | {9, 10}
    walls = geometry.patches.kind[geometry.face_patch] == PatchKind.CYLINDER
    assert walls.any() and {lines[source] for source in geometry.face_source[walls]} == {3}
    assert (geometry.patches.inward[geometry.face_patch[walls]]).all()
    assert (geometry.face_origin == FaceOrigin.SURFACE).all()


def test_every_triangle_leads_to_its_node_and_the_nodes_to_their_triangles() -> None:
    text = PARTS + "assembly a\n    place can ring 1\n    place nut at (50 mm, 0, 0) ring 5 mirrored across x\n"
    geometry = exported(text, "a", 0.2).geometry
    for row, node in enumerate(geometry.nodes):
        first, last = node.face_range
        assert (geometry.face_node[first:last] == row).all()
        if node.mesh < 0:
            assert first == last
            continue
        mesh = geometry.meshes[node.mesh]
        assert last - first == len(mesh.faces)
        assert node.source is not None and node.source.file == "scene.plate"
        patches = geometry.face_patch[first:last] - geometry.patch_start[row]
        assert (patches == mesh.face_patch).all()
        moved = mesh.vertices @ node.placement[:3, :3].T + node.placement[:3, 3]
        assert np.allclose(geometry.vertices[slice(*node.vertex_range)], moved, atol=1e-9)
    assert geometry.nodes[-1].face_range[1] == len(geometry.faces)


def test_the_kinds_of_edges_keep_to_their_sides_in_a_mirrored_copy() -> None:
    text = PARTS + "assembly a\n    place nut\n    place nut as other mirrored across x at (50 mm, 0, 0)\n"
    geometry = exported(text, "a", 0.2).geometry
    plain, mirrored = (geometry.faces[slice(*geometry.nodes[row].face_range)] for row in (1, 2))
    kinds = [geometry.edge_kind[slice(*geometry.nodes[row].face_range)] for row in (1, 2)]
    start = [geometry.nodes[row].vertex_range[0] for row in (1, 2)]

    def sides(faces: np.ndarray, kind: np.ndarray, first: int) -> dict[frozenset[int], int]:
        found = {}
        for corners, each in zip(faces - first, kind, strict=True):
            for k in range(3):
                found[frozenset((int(corners[k]), int(corners[(k + 1) % 3])))] = int(each[k])
        return found

    assert sides(plain, kinds[0], start[0]) == sides(mirrored, kinds[1], start[1])


def dumped(run: Run, stage: str) -> str:
    assert run.project is not None
    text, problems = scene.dump(run.project, run.model, stage, run.meshes)
    assert problems == ()
    return text


def test_the_signed_volumes_of_the_dump_are_those_of_the_list() -> None:
    names = ("can", "nut", "spout")
    text = PARTS + "assembly a\n" + "".join(f"    place {name} {PLACINGS[k + 1]}\n" for k, name in enumerate(names))
    run = built(text)
    assert run.model is not None and run.project is not None
    totals: dict[str, float] = defaultdict(float)
    for line in dumped(run, "triangles").splitlines():
        path, *_ = line.split(" ")
        (ax, ay, az), (bx, by, bz), (cx, cy, cz) = zip(*[map(float, line.split(" ")[-9:])] * 3, strict=True)
        totals[path] += (ax * (by * cz - bz * cy) + ay * (bz * cx - bx * cz) + az * (bx * cy - by * cx)) / 6
    listing, _ = scene.listing(run.model, run.project, run.meshes)
    volumes = {row.path: row.volume for row in listing.parts}
    assert set(totals) == set(volumes) - {"a"} and len(totals) == 5
    for path, total in totals.items():
        assert total == pytest.approx(volumes[path], rel=1e-9)
    inside = sum(total for path, total in totals.items() if path.startswith("a."))
    assert volumes["a"] == pytest.approx(inside, rel=1e-9)


def test_the_dump_names_materials_lines_and_sides() -> None:
    text = 'material red\n    colour "#ff0000"\npart p\n    made of red\n    add block (1 mm, 2 mm, 3 mm)\n'
    lines = dumped(built(text), "triangles").splitlines()
    assert len(lines) == 12
    for line in lines:
        assert re.match(r"p red \d surface scene\.plate:5 (inside|sharp),(inside|sharp),(inside|sharp) ", line)


def test_the_graph_names_paths_places_marks_and_features() -> None:
    text = "part p\n    add sphere diameter 4 mm as ball\n    mark tip at (0, 0, 2 mm) along z\n"
    text += "assembly a\n    place p at (9 mm, 0, 0) ring 2\n"
    lines = dumped(built(text), "graph").splitlines()
    assert lines[0] == "a  a, assembly"
    assert "a.p[2]  p, part of plain white, 1 steps" in lines
    assert "    mark tip 0 0 2 along 0 0 1" in lines
    assert "    feature ball[1] centre 0 0 0 axis 0 0 1 diameter 4" in lines
    assert "    at -1 0 0 -9  0 -1 0 0  0 0 1 0" in lines


def test_two_runs_give_the_same_keys_arrays_and_dumps() -> None:
    text = PARTS + "assembly a\n" + "".join(f"    place {name} {PLACINGS[k]}\n" for k, name in enumerate(SHAPES))
    one, other = (exported(text, "a").geometry for _ in range(2))
    assert one.key == other.key
    for name in ("vertices", "faces", "corner_normals", "face_node", "face_patch", "face_source", "edge_kind"):
        assert getattr(one, name).tobytes() == getattr(other, name).tobytes(), name
    assert [mesh.key for mesh in one.meshes] == [mesh.key for mesh in other.meshes]
    assert one.patches.frame.tobytes() == other.patches.frame.tobytes()
    assert dumped(built(text), "graph") == dumped(built(text), "graph")


def test_a_figure_meshes_each_part_once_and_a_scaled_copy_finer() -> None:
    text = "part ball\n    add sphere diameter 20 mm\n"
    text += "assembly a\n    place ball\n    place ball as big scaled 3 at (90 mm, 0, 0)\n"
    job = planned(text + "figure f\n    show a\n", "f")
    geometry = job.geometries[0]
    assert len(geometry.meshes) == 2
    assert len(geometry.meshes[1].faces) > len(geometry.meshes[0].faces)


def test_the_chord_error_in_the_world_keeps_to_the_tolerance() -> None:
    text = "part ball\n    add cylinder diameter 20 mm length 5 mm\nassembly a\n    place ball scaled 3\n"
    for tolerance in (0.5, 0.1, 0.02):
        geometry = exported(text, "a", tolerance).geometry
        n = len(np.unique(np.round(geometry.vertices[:, :2], 6), axis=0))
        sagitta = 30 * (1 - math.cos(math.pi / n))
        assert tolerance / 8 < sagitta <= tolerance

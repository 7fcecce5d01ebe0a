"""From the scene graph to world-space triangles: every part meshed once a rung, every copy placed once."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Sequence
from typing import Protocol, TypeVar

import numpy as np
from msgspec import Struct
from numpy.typing import NDArray
from platewright.backend import contract
from platewright.backend.contract import F64, I32, Geometry, Material, Mesh, Patches, PatchKind
from platewright.lang.problems import Problem, Severity
from platewright.lang.source import Span

from . import limits
from .graph import Assembly, Entry, Solid, Thing, bracketed, walk
from .materials import Surface, linear
from .mistakes import Problems, mistake
from .solids.bounds import facts_rung
from .solids.coarse import coarse_surfaces
from .solids.flaw import Flaw
from .solids.ladder import COARSEST, first_at_most
from .solids.recipe import Affine, Point3, Recipe
from .solids.transform import determinant, largest_scale, matrix

_T = TypeVar("_T", bound=np.generic)

Mesher = Callable[[Recipe, float], "tuple[Mesh | None, tuple[Flaw, ...]]"]
"""Builds the mesh of a recipe at a rung; a session puts its cache here."""

Alter = Callable[[Entry, F64, Mesh], "Mesh | None"]
"""What becomes of one placed copy's mesh, its placement (4,4) given: another mesh, the same, or nothing."""


class Prover(Protocol):
    """A mesher that can also tell less of a recipe, for less."""

    def __call__(self, recipe: Recipe, rung: float) -> tuple[Mesh | None, tuple[Flaw, ...]]:
        """The mesh at a chord error in mm, or None; and the flaws."""

    def flaws(self, recipe: Recipe, rung: float) -> tuple[Flaw, ...]:
        """The flaws alone."""

    def box(self, recipe: Recipe) -> tuple[Point3, Point3]:
        """The box round the solid, `solids.bounds.bounds`."""


PROOF_PARTS = 200.0
"""A part is proved at a chord error of its largest side over this."""


class Flattened(Struct, frozen=True, eq=False):
    """World-space triangles, the materials their nodes refer to, and the surfaces that these were made from."""

    geometry: Geometry
    materials: tuple[Material, ...]
    surfaces: tuple[Surface, ...]


def flatten(
    thing: Thing, name: str, rung: float | None, sources: Sequence[Span], mesher: Mesher, alter: Alter | None = None
) -> tuple[Flattened | None, tuple[Problem, ...]]:
    """Flatten a thing and all below it, root path `name`, with a chord error of at most `rung` mm in the world.

    Without a rung each part is taken at its own rung of facts, which no figure changes. `alter` may put other meshes in
    the place of those of single copies; a node whose mesh it takes away stays, without triangles.

    None where a part has no mesh; the problems say why. Cost: one mesh for each part and rung, one pass over the
    placed triangles.
    """
    found = Problems()
    with found.collecting():
        entries, placements = walked(thing, name)
    if found.has_errors:
        return None, found.all()
    meshes, of_entry, problems = _meshes(entries, rung, sources, mesher)
    if any(problem.severity is Severity.ERROR for problem in problems):
        return None, problems
    if alter is not None:
        meshes, of_entry = _altered(entries, placements, meshes, of_entry, alter)
    surfaces = list(dict.fromkeys(entry.thing.surface for entry in entries if isinstance(entry.thing, Solid)))
    nodes = _nodes(entries, placements, meshes, of_entry, surfaces)
    geometry = _placed(nodes, placements, meshes, of_entry, sources)
    return Flattened(geometry, tuple(map(material_of, surfaces)), tuple(surfaces)), problems


def material_of(surface: Surface) -> Material:
    """The backend's material for a surface: roughness is what gloss leaves; a metal has no diffuse part."""
    colour = (0.0, 0.0, 0.0) if surface.is_metal else linear(surface.colour)
    return Material(
        surface.name,
        colour,
        surface.reflectance,
        1.0 - surface.gloss,
        surface.is_metal,
        surface.colour,
        surface.density,
    )


def source_span(span: Span) -> contract.SourceSpan:
    """A span in the contract's terms."""
    return contract.SourceSpan(span.file, span.line, span.column, span.end_line, span.end_column)


def problem_of(flaw: Flaw, solid: Solid, sources: Sequence[Span]) -> Problem:
    """A flaw of a recipe as a located problem, at the line it comes from or at the part."""
    span = sources[flaw.source] if flaw.source >= 0 else solid.span
    severity = Severity.ERROR if flaw.is_error else Severity.WARNING
    return Problem(flaw.code, severity, span, f"part `{solid.name}`: {flaw.sentence}", flaw.hint)


def walked(thing: Thing, name: str) -> tuple[tuple[Entry, ...], F64]:
    """All entries below a thing and their world placements, (n,4,4) float64.

    Raises Mistake where one stands too far off, or is scaled too much, to be held.
    """
    entries = tuple(walk(thing, name))
    known: dict[int, F64] = {}
    placements = np.empty((len(entries), 4, 4))
    for row, entry in enumerate(entries):
        key = id(entry.placement)
        if key not in known:
            known[key] = matrix(entry.placement)
        placements[row] = known[key]
    scales = np.abs(_determinants(placements))
    is_far = np.abs(placements[:, :3, 3]).max(axis=1) > limits.LARGEST_MM
    is_odd = (scales > limits.SCALE**3 * 1.001) | (scales < limits.SCALE**-3 / 1.001)
    if is_far.any():
        first = entries[int(np.argmax(is_far))]
        sentence = f"`{first.path}` stands further than {limits.LARGEST_MM:g} mm from the origin, the limit"
        raise mistake("out-of-range", first.span, sentence)
    if is_odd.any():
        first = entries[int(np.argmax(is_odd))]
        sentence = f"`{first.path}` is scaled by more than {limits.SCALE:g} in all, or by less than its inverse"
        raise mistake("out-of-range", first.span, f"{sentence}, the limit")
    return entries, placements


def _meshes(
    entries: Sequence[Entry], rung: float | None, sources: Sequence[Span], mesher: Mesher
) -> tuple[list[Mesh], dict[int, int], tuple[Problem, ...]]:
    """Each solid's mesh once; rows of meshes by entry; problems, each once. A scaled copy takes a finer rung."""
    meshes: list[Mesh] = []
    rows: dict[tuple[int, float], int | None] = {}
    own_rung = _own_rungs(rung)
    of_entry: dict[int, int] = {}
    problems: dict[Problem, None] = {}
    for number, entry in enumerate(entries):
        solid = entry.thing
        if not isinstance(solid, Solid):
            continue
        key = (id(solid), own_rung(solid, entry.placement))
        if key not in rows:
            mesh, flaws = _meshed(solid, key[1], mesher)
            problems.update((problem_of(flaw, solid, sources), None) for flaw in flaws)
            rows[key] = None if mesh is None else len(meshes)
            if mesh is not None:
                meshes.append(mesh)
        row = rows[key]
        if row is not None:
            of_entry[number] = row
    return meshes, of_entry, tuple(problems)


def _meshed(solid: Solid, rung: float, mesher: Mesher) -> tuple[Mesh | None, tuple[Flaw, ...]]:
    """The mesh of a solid at a rung and its flaws, those among them that a coarser rung does not show."""
    coarse = coarse_surfaces(solid.recipe, rung)
    if any(flaw.is_error for flaw in coarse):
        return None, coarse
    mesh, flaws = mesher(solid.recipe, rung)
    return mesh, (*flaws, *coarse)


def _altered(
    entries: Sequence[Entry], placements: F64, meshes: Sequence[Mesh], of_entry: dict[int, int], alter: Alter
) -> tuple[list[Mesh], dict[int, int]]:
    """Meshes still in use after an alteration, in the order of their first copies, and their rows by entry."""
    rows: dict[str, int] = {}
    kept: list[Mesh] = []
    altered: dict[int, int] = {}
    for number, row in of_entry.items():
        mesh = alter(entries[number], placements[number], meshes[row])
        if mesh is None:
            continue
        if mesh.key not in rows:
            rows[mesh.key] = len(kept)
            kept.append(mesh)
        altered[number] = rows[mesh.key]
    return kept, altered


def _own_rungs(rung: float | None) -> Callable[[Solid, Affine], float]:
    """The rung of one placed copy: that of facts, or the one asked for, finer where the placement enlarges."""
    scales: dict[tuple[tuple[float, ...], ...], float] = {}
    facts: dict[int, float] = {}

    def own(solid: Solid, placement: Affine) -> float:
        if rung is None:
            if id(solid) not in facts:
                facts[id(solid)] = facts_rung(solid.recipe)
            return facts[id(solid)]
        linear_part = tuple(row[:3] for row in placement)
        if linear_part not in scales:
            scales[linear_part] = largest_scale(placement)
        scale = scales[linear_part]
        return rung if scale == 1.0 else first_at_most(rung / scale)

    return own


def _nodes(
    entries: Sequence[Entry],
    placements: F64,
    meshes: Sequence[Mesh],
    of_entry: dict[int, int],
    surfaces: Sequence[Surface],
) -> tuple[contract.Node, ...]:
    material_rows = {surface: row for row, surface in enumerate(surfaces)}
    nodes: list[contract.Node] = []
    n_faces = n_vertices = 0
    for number, entry in enumerate(entries):
        mesh_row = of_entry.get(number, -1)
        material, closed = -1, True
        faces, vertices = (n_faces, n_faces), (n_vertices, n_vertices)
        if mesh_row >= 0 and isinstance(entry.thing, Solid):
            mesh = meshes[mesh_row]
            faces = (n_faces, n_faces + len(mesh.faces))
            vertices = (n_vertices, n_vertices + len(mesh.vertices))
            n_faces, n_vertices = faces[1], vertices[1]
            material, closed = material_rows[entry.thing.surface], mesh.closed
        nodes.append(
            contract.Node(
                entry.path,
                entry.name,
                entry.parent,
                placements[number],
                mesh_row,
                material,
                faces,
                vertices,
                closed,
                source_span(entry.span),
                _marks(entry),
                _threads(entry),
            )
        )
    return tuple(nodes)


def _marks(entry: Entry) -> tuple[contract.Mark, ...]:
    thing = entry.thing
    found = [
        contract.Mark(mark.name, moved(entry.placement, mark.point), _turned(entry.placement, mark.axis))
        for mark in thing.marks
    ]
    if isinstance(thing, Solid):
        for feature in thing.features:
            for number, copy in enumerate(feature.copies, 1):
                label = str(number) if len(feature.copies) > 1 else ""
                axis = _turned(entry.placement, copy.axis)
                across = None if copy.diameter is None else copy.diameter * largest_scale(entry.placement)
                found.append(
                    contract.Mark(bracketed(feature.name, label), moved(entry.placement, copy.centre), axis, across)
                )
    return tuple(found)


def _threads(entry: Entry) -> tuple[contract.Thread, ...]:
    if not isinstance(entry.thing, Solid) or not entry.thing.threads:
        return ()
    place, scale = entry.placement, largest_scale(entry.placement)
    is_mirrored = determinant(place) < 0.0
    found = []
    for thread in entry.thing.threads:
        axis = _turned(place, thread.axis)
        assert axis is not None
        found.append(
            contract.Thread(
                moved(place, thread.start),
                axis,
                thread.length * scale,
                thread.major * scale,
                thread.minor * scale,
                thread.pitch * scale,
                thread.internal,
                thread.left != is_mirrored,
            )
        )
    return tuple(found)


def moved(placement: Affine, point: tuple[float, float, float]) -> tuple[float, float, float]:
    """A point through a placement."""
    x, y, z = (row[0] * point[0] + row[1] * point[1] + row[2] * point[2] + row[3] for row in placement)
    return (x, y, z)


def _turned(placement: Affine, axis: tuple[float, float, float] | None) -> tuple[float, float, float] | None:
    if axis is None:
        return None
    x, y, z = (row[0] * axis[0] + row[1] * axis[1] + row[2] * axis[2] for row in placement)
    size = (x * x + y * y + z * z) ** 0.5
    return (x / size, y / size, z / size)


def _placed(
    nodes: tuple[contract.Node, ...],
    placements: F64,
    meshes: Sequence[Mesh],
    of_entry: dict[int, int],
    sources: Sequence[Span],
) -> Geometry:
    n_faces, n_vertices = nodes[-1].face_range[1], nodes[-1].vertex_range[1]
    patch_counts = np.array([len(meshes[node.mesh].patches.kind) if node.mesh >= 0 else 0 for node in nodes])
    patch_start = np.concatenate(([0], np.cumsum(patch_counts)[:-1])).astype(np.int32)
    n_patches = int(patch_counts.sum())
    geometry = Geometry(
        _key(nodes, placements, meshes),
        np.empty((n_vertices, 3)),
        np.empty((n_faces, 3), np.int32),
        np.empty((n_faces, 3, 3), np.float32),
        np.empty(n_faces, np.int32),
        np.empty(n_faces, np.int32),
        np.empty(n_faces, np.uint8),
        np.empty(n_faces, np.int32),
        np.empty((n_faces, 3), np.uint8),
        Patches(
            np.empty(n_patches, np.uint8),
            np.empty((n_patches, 4, 3)),
            np.empty((n_patches, 2)),
            np.empty(n_patches, np.bool_),
        ),
        patch_start,
        nodes,
        tuple(meshes),
        tuple(source_span(span) for span in sources),
    )
    by_mesh: dict[int, list[int]] = {}
    for number, row in of_entry.items():
        by_mesh.setdefault(row, []).append(number)
    for row, numbers in by_mesh.items():
        _place_copies(geometry, meshes[row], np.array(numbers), placements)
    return geometry


_BATCH_FACES = 200_000


def _place_copies(geometry: Geometry, mesh: Mesh, numbers: I32, placements: F64) -> None:
    """Write all copies of one mesh into the flattened arrays, in batches so that memory stays bounded."""
    step = max(1, _BATCH_FACES // max(1, len(mesh.faces)))
    for start in range(0, len(numbers), step):
        _place_batch(geometry, mesh, numbers[start : start + step], placements)


def _place_batch(geometry: Geometry, mesh: Mesh, numbers: I32, placements: F64) -> None:
    placed = placements[numbers]
    turned_over = _determinants(placed) < 0
    vertex_start = np.array([geometry.nodes[k].vertex_range[0] for k in numbers])
    face_start = np.array([geometry.nodes[k].face_range[0] for k in numbers])
    vertex_rows = (vertex_start[:, None] + np.arange(len(mesh.vertices))).ravel()
    face_rows = (face_start[:, None] + np.arange(len(mesh.faces))).ravel()
    geometry.vertices[vertex_rows] = _mapped(placed, mesh.vertices).reshape(-1, 3)
    geometry.faces[face_rows] = _turned_over(mesh.faces + vertex_start[:, None, None], turned_over, (0, 2, 1)).reshape(
        -1, 3
    )
    normals = _normals(placed, mesh.corner_normals.reshape(-1, 3)).reshape(len(numbers), -1, 3, 3)
    geometry.corner_normals[face_rows] = _turned_over(normals, turned_over, (0, 2, 1)).reshape(-1, 3, 3)
    edges = np.broadcast_to(mesh.edge_kind, (len(numbers), *mesh.edge_kind.shape))
    geometry.edge_kind[face_rows] = _turned_over(edges, turned_over, (2, 1, 0)).reshape(-1, 3)
    geometry.face_node[face_rows] = np.repeat(numbers, len(mesh.faces))
    geometry.face_patch[face_rows] = (geometry.patch_start[numbers][:, None] + mesh.face_patch).ravel()
    geometry.face_origin[face_rows] = np.tile(mesh.face_origin, len(numbers))
    geometry.face_source[face_rows] = np.tile(mesh.face_source, len(numbers))
    _place_patches(geometry, mesh.patches, numbers, placed)


def _place_patches(geometry: Geometry, patches: Patches, numbers: I32, placed: F64) -> None:
    rows = (geometry.patch_start[numbers][:, None] + np.arange(len(patches.kind))).ravel()
    scales = np.abs(_determinants(placed)) ** (1 / 3)
    frame = np.empty((len(numbers), len(patches.kind), 4, 3))
    frame[:, :, 0] = _mapped(placed, patches.frame[:, 0])
    for axis in (1, 3):
        frame[:, :, axis] = _mapped(placed, patches.frame[:, axis], with_shift=False) / scales[:, None, None]
    frame[:, :, 2] = np.cross(frame[:, :, 3], frame[:, :, 1])
    size = np.broadcast_to(patches.size, (len(numbers), *patches.size.shape)) * scales[:, None, None]
    is_cone = patches.kind == PatchKind.CONE
    size[:, is_cone] = patches.size[is_cone]
    geometry.patches.frame[rows] = frame.reshape(-1, 4, 3)
    geometry.patches.size[rows] = size.reshape(-1, 2)
    geometry.patches.kind[rows] = np.tile(patches.kind, len(numbers))
    geometry.patches.inward[rows] = np.tile(patches.inward, len(numbers))


def _mapped(placed: F64, points: F64, with_shift: bool = True) -> F64:
    """Points (n,3) through k placements: (k,n,3). Sums are spelt out so that their order is the same everywhere."""
    x, y, z = points[:, 0], points[:, 1], points[:, 2]
    result = np.empty((len(placed), len(points), 3))
    for axis in range(3):
        row = placed[:, axis]
        total = row[:, 0:1] * x + row[:, 1:2] * y + row[:, 2:3] * z
        result[:, :, axis] = total + row[:, 3:4] if with_shift else total
    return result


def _normals(placed: F64, normals: contract.F32) -> contract.F32:
    """Unit normals (n,3) through k placements that turn, mirror and scale alike in all directions: (k,n,3)."""
    size = np.cbrt(np.abs(_determinants(placed)))
    linear_part = (placed[:, :3, :3] / size[:, None, None]).astype(np.float32)
    x, y, z = normals[:, 0], normals[:, 1], normals[:, 2]
    result = np.empty((len(placed), len(normals), 3), np.float32)
    for axis in range(3):
        row = linear_part[:, axis]
        result[:, :, axis] = row[:, 0:1] * x + row[:, 1:2] * y + row[:, 2:3] * z
    return result


def _determinants(placed: F64) -> F64:
    a, b, c = placed[:, 0, :3], placed[:, 1, :3], placed[:, 2, :3]
    cross = np.stack(
        (
            b[:, 1] * c[:, 2] - b[:, 2] * c[:, 1],
            b[:, 2] * c[:, 0] - b[:, 0] * c[:, 2],
            b[:, 0] * c[:, 1] - b[:, 1] * c[:, 0],
        ),
        axis=1,
    )
    return a[:, 0] * cross[:, 0] + a[:, 1] * cross[:, 1] + a[:, 2] * cross[:, 2]


def _turned_over(values: NDArray[_T], which: NDArray[np.bool_], order: tuple[int, int, int]) -> NDArray[_T]:
    """Corners (k,n,3,...) reordered for those copies that a mirror has turned over."""
    if not which.any():
        return values
    result = values.copy()
    result[which] = values[which][:, :, order]
    return result


def _key(nodes: Sequence[contract.Node], placements: F64, meshes: Sequence[Mesh]) -> str:
    content = hashlib.sha256()
    for mesh in meshes:
        content.update(mesh.key.encode())
    for node in nodes:
        content.update(f"{node.path} {node.mesh} {node.material}\n".encode())
    content.update(placements.tobytes())
    return content.hexdigest()


def prove(things: Sequence[Thing], sources: Sequence[Span], prover: Prover) -> tuple[Problem, ...]:
    """Problems of every solid below `things`, found by putting each together once at a coarse rung of its own size.

    Cost: a coarse boolean for each solid; nothing is placed, no mesh is finished.
    """
    problems: dict[Problem, None] = {}
    for solid in _solids(things):
        rung = proof_rung(solid.recipe, prover)
        flaws = coarse_surfaces(solid.recipe, rung)
        if not any(flaw.is_error for flaw in flaws):
            flaws = (*prover.flaws(solid.recipe, rung), *flaws)
        problems.update((problem_of(flaw, solid, sources), None) for flaw in flaws)
    return tuple(problems)


def proof_rung(recipe: Recipe, prover: Prover) -> float:
    """The chord error in mm at which a part is proved."""
    low, high = prover.box(recipe)
    reach = max(b - a for a, b in zip(low, high, strict=True))
    return first_at_most(reach / PROOF_PARTS) if reach > 0 else COARSEST


def _solids(things: Sequence[Thing]) -> list[Solid]:
    """Every solid that can be reached, each once, in the order met."""
    seen: dict[int, Thing] = {}
    pending = list(reversed(things))
    while pending:
        thing = pending.pop()
        if id(thing) in seen:
            continue
        seen[id(thing)] = thing
        if isinstance(thing, Assembly):
            pending.extend(copy.thing for each in reversed(thing.occurrences) for copy in reversed(each.copies))
    return [thing for thing in seen.values() if isinstance(thing, Solid)]

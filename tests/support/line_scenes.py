"""Geometry for the tests of line drawings: parts from recipes, put together, with views of them and the view's stages.

`mechanical` is a plate with holes on which cylinders and hexagon nuts stand flush, with tori and spheres, one of them
sunk into the plate; `smooth` is one dense bumpy body. Sizes are in mm.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from platewright.backend import camera
from platewright.backend.contract import F64, EdgeKind, Geometry, Mesh, Node, Page, Panel, Projection, Style
from platewright.backend.lines.edges import edges_of
from platewright.backend.lines.model import Candidates, Pieces, View
from platewright.backend.lines.topology import neighbours
from platewright.backend.lines.view import see_view
from platewright.backend.lines.visibility import cut
from platewright.compiler.solids.recipe import Block, Cone, Cylinder, Prism, Sphere, Torus
from platewright.compiler.solids.transform import translate
from support.geometries import flattened, leaf, shifted
from support.raster_models import free_patch, panel
from support.recipes import add, made
from support.recipes import cut as cut_away

PAGE = Page(120.0, 120.0)
Placed = tuple[str, Mesh, F64]

VIEWS: dict[str, tuple[float, float, float]] = {
    "top": (0.0, 0.0, -1.0),
    "front": (0.0, 1.0, 0.0),
    "isometric": (-1.0, 1.0, -1.0),
    "dimetric": (-0.35, 0.87, -0.35),
    "oblique": (-0.61, 0.72, -0.33),
}
"""Directions of sight that the rules were found with."""

HELD_OUT: dict[str, tuple[float, float, float]] = {
    "right": (-1.0, 0.0, 0.0),
    "rear from above": (0.0, -1.0, -1.0),
    "second isometric": (1.0, -1.0, -1.0),
    "forty-five": (-1.0, 1.0, 0.0),
    "trimetric": (0.29, 0.81, -0.51),
}
"""Directions of sight kept for one check at the end."""


@dataclass(frozen=True, eq=False, slots=True)
class Seen:
    """A scene in one view, with all candidates of `edges_of` and their pieces."""

    geometry: Geometry
    view: View
    candidates: Candidates
    pieces: Pieces


def scene(parts: Sequence[Placed]) -> Geometry:
    """A geometry of parts: path, mesh, placement (4,4). Equal meshes are shared."""
    meshes: list[Mesh] = []
    rows: dict[int, int] = {}
    nodes: list[Node] = []
    for path, mesh, placement in parts:
        if id(mesh) not in rows:
            rows[id(mesh)] = len(meshes)
            meshes.append(mesh)
        nodes.append(replace(leaf(path, -1, rows[id(mesh)], 0, placement), closed=mesh.closed))
    return flattened(nodes, meshes)


def turned_about(axis: Sequence[float], degrees: float) -> F64:
    """A (3,3) turn about an axis (Rodrigues' formula)."""
    x, y, z = np.asarray(axis, float) / np.linalg.norm(axis)
    skew = np.array([[0.0, -z, y], [z, 0.0, -x], [-y, x, 0.0]])
    angle = np.radians(degrees)
    return np.asarray(np.eye(3) + np.sin(angle) * skew + (1.0 - np.cos(angle)) * skew @ skew)


def placed_at(x: float, y: float, z: float, turn: F64 | None = None) -> F64:
    return shifted(x, y, z, turn)


def moved(geometry: Geometry, turn: F64 | None = None, shift: Sequence[float] = (0.0, 0.0, 0.0)) -> Geometry:
    """The geometry turned (3,3), then shifted."""
    linear = np.eye(3) if turn is None else turn
    frame = geometry.patches.frame @ linear.T
    frame[:, 0] += shift
    return replace(
        geometry,
        vertices=geometry.vertices @ linear.T + np.asarray(shift),
        corner_normals=(geometry.corner_normals.astype(float) @ linear.T).astype(np.float32),
        patches=replace(geometry.patches, frame=frame),
    )


def rounded_to_float32(geometry: Geometry) -> Geometry:
    """The geometry with its vertices as a file of 32-bit numbers holds them."""
    return replace(geometry, vertices=geometry.vertices.astype(np.float32).astype(np.float64))


def fitted(geometry: Geometry, sight: Sequence[float], size: float = 100.0) -> Projection:
    """A parallel projection along `sight` that shows the geometry `size` mm large, in the middle of `PAGE`."""
    view = camera.axes(sight)
    low, high = camera.extents(view, geometry.vertices)
    magnification = size / float(max(high[0] - low[0], high[1] - low[1]))
    right, up, away = (np.array(v) for v in (view.right, view.up, view.sight))
    middle = (low + high) / 2.0
    anchor = middle[0] * right + middle[1] * up + middle[2] * away
    return camera.parallel(view, magnification, (PAGE.width / 2, PAGE.height / 2), anchor)


def fitted_central(
    geometry: Geometry, sight: Sequence[float], distance: float = 1.5, size: float = 100.0
) -> Projection:
    """A central projection along `sight` from `distance` diagonals away, the geometry about `size` mm large."""
    low, high = geometry.vertices.min(axis=0), geometry.vertices.max(axis=0)
    diagonal = float(np.linalg.norm(high - low))
    middle = (low + high) / 2.0
    eye = middle - np.asarray(sight, float) / np.linalg.norm(sight) * distance * diagonal
    return camera.central(eye, middle, size * distance, (PAGE.width / 2, PAGE.height / 2))


def line_panel(projection: Projection, **more: object) -> Panel:
    return panel(projection, PAGE, **more)


def seen(
    geometry: Geometry, projection: Projection, style: Style | None = None, threads: int | None = None, **more: object
) -> Seen:
    """All stages up to pieces."""
    view = see_view(geometry, line_panel(projection, **more), PAGE)
    candidates = edges_of(view, style or Style())
    return Seen(geometry, view, candidates, cut(view, candidates, threads))


def holed_plate(side: float, thickness: float, holes: int, diameter: float, rung: float) -> Mesh:
    """A square plate from the origin, its top at z = 0, with a square field of holes."""
    pitch = side / holes
    at = [translate((pitch * (i + 0.5), pitch * (j + 0.5), -2 * thickness)) for i in range(holes) for j in range(holes)]
    body = add(Block((side, side, thickness)), translate((side / 2, side / 2, -thickness)))
    return made(body, cut_away(Cylinder(diameter, 4 * thickness), *at), rung=rung)


def nut(across: float, bore: float, height: float, rung: float) -> Mesh:
    return made(
        add(Prism(6, across, height)), cut_away(Cylinder(bore, 4 * height), translate((0, 0, -height))), rung=rung
    )


def mechanical(columns: int = 1, rows: int = 1, rung: float = 0.05, seed: int = 0) -> Geometry:
    """Modules of 26 parts, about 21 000 triangles each at the rung of 0.05 mm, 40 000 at 0.02 mm."""
    return scene(mechanical_parts(columns, rows, rung, seed))


def mechanical_parts(columns: int = 1, rows: int = 1, rung: float = 0.05, seed: int = 0) -> list[Placed]:
    """The parts of `mechanical`."""
    plate = holed_plate(200.0, 10.0, 10, 8.0, rung)
    hexagon = nut(16.0, 10.0, 8.0, rung)
    ring = made(add(Torus(22.0, 7.0)), rung=rung)
    ball = made(add(Sphere(18.6)), rung=rung)
    bars = [made(add(Cylinder(14.0, length)), rung=rung) for length in (15.0, 24.0, 33.0, 42.0, 51.0, 60.0)]
    random = np.random.default_rng(seed)
    parts: list[Placed] = []
    for i in range(columns):
        for j in range(rows):
            base = np.array((215.0 * i, 215.0 * j, 20.0 * ((7 * i + 3 * j) % 4)))
            name = f"module[{rows * i + j + 1}]"
            parts.append((f"{name}.plate", plate, placed_at(*base)))
            spots = [(20.0 + 40.0 * k, 20.0 + 40.0 * m) for k in range(5) for m in range(5)]
            random.shuffle(spots)
            for k, (x, y) in enumerate(spots):
                turn = turned_about((0, 0, 1), random.uniform(0, 360))
                lift = 0.0
                mesh = bars[k % len(bars)] if k < 8 else hexagon if k < 17 else ring if k < 21 else ball
                if k >= 17:
                    turn = turned_about(random.normal(size=3), random.uniform(0, 360))
                    lift = random.uniform(20.0, 50.0) if k < 24 else 3.1
                parts.append((f"{name}.part[{k + 1}]", mesh, placed_at(*(base + np.array((x, y, lift))), turn)))
    return parts


def tiny_in_huge(rung: float = 0.05) -> Geometry:
    """Twelve modules on a plate a hundred times the size of one."""
    reach = 20_000.0
    huge = made(add(Block((2 * reach, 2 * reach, 10.0)), translate((0.0, 0.0, -60.0))), rung=rung)
    return scene([*mechanical_parts(3, 4, rung), ("floor", huge, placed_at(0.0, 0.0, 0.0))])


def smooth(n_triangles: int, seed: int = 3) -> Geometry:
    """One dense bumpy body, a star-shaped surface of 40 bumps about 100 mm across, one free patch."""
    random = np.random.default_rng(seed)
    middles = random.normal(size=(40, 3))
    middles /= np.linalg.norm(middles, axis=1, keepdims=True)
    sharpness, height = random.uniform(6, 30, 40), random.uniform(-0.22, 0.3, 40)
    rings = round(np.sqrt(n_triangles / 4))
    around = 2 * rings
    polar, azimuth = np.meshgrid(
        np.pi * np.arange(1, rings) / rings, 2 * np.pi * np.arange(around) / around, indexing="ij"
    )
    unit = np.stack([np.sin(polar) * np.cos(azimuth), np.sin(polar) * np.sin(azimuth), np.cos(polar)], -1).reshape(
        -1, 3
    )
    unit = np.concatenate([unit, [[0.0, 0.0, 1.0], [0.0, 0.0, -1.0]]])
    radius = np.full(len(unit), 50.0)
    for k in range(40):
        radius += 50.0 * height[k] * np.exp(sharpness[k] * (unit @ middles[k] - 1.0))
    i, j = (k.ravel() for k in np.meshgrid(np.arange(rings - 2), np.arange(around), indexing="ij"))
    a, b = i * around + j, (i + 1) * around + j
    c, d = (i + 1) * around + (j + 1) % around, i * around + (j + 1) % around
    ring, north, south = np.arange(around), len(unit) - 2, len(unit) - 1
    last = (rings - 2) * around
    faces = np.concatenate([
        np.stack([np.column_stack([a, b, c]), np.column_stack([a, c, d])], 1).reshape(-1, 3),
        np.column_stack([np.full(around, north), ring, (ring + 1) % around]),
        np.column_stack([np.full(around, south), last + (ring + 1) % around, last + ring]),
    ]).astype(np.int32)  # fmt: skip
    vertices = unit * radius[:, None]
    return scene([("body", free_mesh("smooth", vertices, faces), placed_at(0.0, 0.0, 0.0))])


def free_mesh(key: str, vertices: F64, faces: np.ndarray, closed: bool = True) -> Mesh:
    """A mesh of one free patch, its normals at the vertices those of the faces about them, weighted by area."""
    corners = vertices[faces]
    flat = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    normals = np.stack([np.bincount(faces.ravel(), np.repeat(flat[:, k], 3), len(vertices)) for k in range(3)], 1)
    normals /= np.linalg.norm(normals, axis=1, keepdims=True)
    n = len(faces)
    kinds = np.zeros((n, 3), np.uint8)
    if not closed:
        kinds[neighbours(faces, len(vertices)) < 0] = EdgeKind.BORDER
    return Mesh(
        key, vertices, faces, normals[faces].astype(np.float32), np.zeros(n, np.int32), np.zeros(n, np.uint8),
        np.full(n, -1, np.int32), kinds, free_patch(), closed,
    )  # fmt: skip


# --- traps: contact, penetration, thin sheets, many holes


def touching_cubes() -> Geometry:
    """Six cubes that touch by faces, one of them by part of a face, and one that stands alone."""
    cube = made(add(Block((20.0, 20.0, 20.0))))
    corners = ((0, 0, 0), (20, 0, 0), (0, 20, 0), (0, 0, 20), (33, 27, 0), (20, -5, 20))
    return scene([(f"cube[{k + 1}]", cube, placed_at(*at)) for k, at in enumerate(corners)])


def flush_pins(rung: float = 0.02) -> Geometry:
    """A plate with nine holes, filled by pins that share its facets; every other one stands out."""
    plate = holed_plate(60.0, 10.0, 3, 10.0, rung)
    pins = [made(add(Cylinder(10.0, length)), rung=rung) for length in (25.0, 10.0)]
    spots = [(10.0 + 20.0 * (k // 3), 10.0 + 20.0 * (k % 3)) for k in range(9)]
    filled = [(f"pin[{k + 1}]", pins[k % 2], placed_at(x, y, -10.0)) for k, (x, y) in enumerate(spots)]
    return scene([("plate", plate, placed_at(0, 0, 0)), *filled])


def fastened(rung: float = 0.02) -> Geometry:
    """A bolt through two washers and a plate with a nut on it, all flush."""
    washer = made(add(Cylinder(24.0, 2.0)), cut_away(Cylinder(10.0, 8.0), translate((0, 0, -3.0))), rung=rung)
    bolt = made(add(Cylinder(10.0, 40.0)), add(Prism(6, 16.0, 7.0), translate((0, 0, -7.0))), rung=rung)
    return scene([
        ("plate", holed_plate(40.0, 8.0, 1, 10.0, rung), placed_at(-20, -20, 8)),
        ("lower", washer, placed_at(0, 0, -2)),
        ("bolt", bolt, placed_at(0, 0, -2)),
        ("upper", washer, placed_at(0, 0, 8)),
        ("nut", nut(16.0, 10.0, 8.0, rung), placed_at(0, 0, 10)),
    ])  # fmt: skip


def penetrating(seed: int = 5, n: int = 10, rung: float = 0.05) -> Geometry:
    """Blocks, cylinders, prisms, spheres and cones at random, most of them in others."""
    random = np.random.default_rng(seed)
    shapes = (
        Block((30.0, 20.0, 10.0)),
        Cylinder(12.0, 40.0),
        Prism(6, 14.0, 30.0),
        Sphere(22.0),
        Cone(20.0, 6.0, 30.0),
    )
    meshes = [made(add(shape), rung=rung) for shape in shapes]
    return scene([
        (
            f"part[{k + 1}]", meshes[k % 5],
            placed_at(*random.uniform(-20, 20, 3), turned_about(random.normal(size=3), random.uniform(0, 360))),
        )
        for k in range(n)
    ])  # fmt: skip


def thin_sheets() -> Geometry:
    """Eight sheets 0.05 mm thick, 0.05 mm apart, each turned a little."""
    sheet = made(add(Block((40.0, 30.0, 0.05))))
    return scene([
        (f"sheet[{k + 1}]", sheet, placed_at(3.0 * k, 2.0 * k, 0.1 * k, turned_about((0, 0, 1), 7.0 * k)))
        for k in range(8)
    ])  # fmt: skip


def holed_lids(rung: float = 0.02) -> Geometry:
    """Lids 60 mm across with 6, 12 and 24 holes on a circle of 48 mm."""

    def lid(n: int) -> Mesh:
        angles = 0.1 + 2.0 * np.pi * np.arange(n) / n
        at = [translate((24.0 * float(np.cos(a)), 24.0 * float(np.sin(a)), -4.0)) for a in angles]
        return made(add(Cylinder(60.0, 4.0)), cut_away(Cylinder(4.0, 12.0), *at), rung=rung)

    return scene([
        (f"lid[{k + 1}]", lid(n), placed_at(62.0 * k, 0, 0, turned_about((0, 0, 1), 11.0 * k)))
        for k, n in enumerate((6, 12, 24))
    ])  # fmt: skip


TRAPS: dict[str, Callable[[], Geometry]] = {
    "touching cubes": touching_cubes,
    "flush pins": flush_pins,
    "fastened": fastened,
    "penetrating": penetrating,
    "thin sheets": thin_sheets,
    "holed lids": holed_lids,
}

FORMS = ("as built", "central", "rotated", "rotated, float32", "float32", "far off")
_TURN = (0.3, -0.5, 0.81), 37.0
_HELD_OUT_TURN = (-0.62, 0.27, 0.4), 118.0


def trap(name: str, form: str, sight: Sequence[float], is_held_out: bool = False) -> tuple[Geometry, Projection]:
    """A trap in one of `FORMS`, and a projection that sees it from the same side in all of them."""
    geometry, direction = TRAPS[name](), np.asarray(sight, float)
    if form.startswith("rotated"):
        turn = turned_about(*(_HELD_OUT_TURN if is_held_out else _TURN))
        geometry, direction = moved(geometry, turn), turn @ direction
    if form == "far off":
        geometry = moved(geometry, shift=(3.4e5, -2.1e5, 1.7e5))
    if form.endswith("float32"):
        geometry = rounded_to_float32(geometry)
    fit = fitted_central if form == "central" else fitted
    return geometry, fit(geometry, tuple(direction))

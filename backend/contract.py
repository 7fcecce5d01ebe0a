"""The contract between compiler and backend: what a drawing job says, in plain frozen values.

Lengths are millimetres, angles degrees, frames right-handed with z up; triangles run counter-clockwise
seen from outside. Colours are linear RGB with the sRGB primaries and the D65 white. Arrays are
read-only once a job has passed `verify`. The compiler fills these values and the backend reads them;
neither knows more of the other than this file. `VERSION` changes with any change of meaning.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import IntEnum, StrEnum
from typing import Literal, TypeVar

import numpy as np
from numpy.typing import NDArray

VERSION = 2

F64 = NDArray[np.float64]
F32 = NDArray[np.float32]
I32 = NDArray[np.int32]
U8 = NDArray[np.uint8]
_T = TypeVar("_T")


class EdgeKind(IntEnum):
    """What the surface does across one side of a triangle."""

    INSIDE = 0  # both triangles lie on one patch
    TANGENT = 1  # two patches meet and share their normal
    SHARP = 2  # two patches meet at an angle
    BORDER = 3  # no triangle on the other side


class PatchKind(IntEnum):
    """The surface that one patch is a piece of."""

    PLANE = 0
    CYLINDER = 1
    CONE = 2
    SPHERE = 3
    TORUS = 4
    FREE = 5


class FaceOrigin(IntEnum):
    """Where a triangle comes from."""

    SURFACE = 0
    SECTION_CAP = 1  # a cut face: hatched, and its rim is a section outline
    BREAK = 2  # a face where material was broken away, as round a local section: its rim is a break line
    STEP = 3  # the riser between two planes of a stepped section: its rim is not drawn (ISO 128-3)


@dataclass(frozen=True, eq=False, slots=True)
class Patches:
    """Descriptors of smooth or coplanar surfaces, one row each.

    frame (p,4,3) float64: origin, then unit x, y, z axes. A plane's z is its outward normal; a cylinder,
    cone and torus turn about z; a cone's origin is its apex and z points from the apex into the cone.
    size (p,2) float64: cylinder (radius, 0), cone (half angle in degrees, 0), sphere (radius, 0),
    torus (radius of the centre circle, radius of the tube), otherwise zeros.
    inward (p,) bool: the solid lies outside the surface (the wall of a hole).
    """

    kind: U8
    frame: F64
    size: F64
    inward: NDArray[np.bool_]


@dataclass(frozen=True, eq=False, slots=True)
class Mesh:
    """One solid in its own frame, shared by every part that is a copy of it.

    vertices (n,3) float64 mm; faces (m,3) int32; corner_normals (m,3,3) float32, unit, outward;
    face_patch (m,) int32 row of `patches`; face_origin (m,) uint8 `FaceOrigin`;
    face_source (m,) int32 index of the recipe line that made it (`compiler.solids`), or -1;
    edge_kind (m,3) uint8 `EdgeKind` of the side from corner k to corner k+1.
    `closed` is computed from the triangles, never assumed. `key` names the content.
    """

    key: str
    vertices: F64
    faces: I32
    corner_normals: F32
    face_patch: I32
    face_origin: U8
    face_source: I32
    edge_kind: U8
    patches: Patches
    closed: bool


@dataclass(frozen=True, slots=True)
class SourceSpan:
    """A stretch of the author's text: 1-based lines and columns, columns in code points."""

    file: str
    line: int
    column: int
    end_line: int
    end_column: int


@dataclass(frozen=True, slots=True)
class Mark:
    """A named point or axis of a part, world millimetres."""

    name: str
    point: tuple[float, float, float]
    axis: tuple[float, float, float] | None = None
    diameter: float | None = None


@dataclass(frozen=True, slots=True)
class Thread:
    """A screw thread that stands in the geometry as a plain cylinder: by drawing convention (ISO 6410-1).

    World millimetres. The axis runs from `start`, the middle of one end, along the unit vector `axis` for `length`.
    `major` and `minor` are diameters; the cylinder in the geometry is the crest: the major one, or the minor one of an
    internal thread, whose material lies outside. `left` is the hand.
    """

    start: tuple[float, float, float]
    axis: tuple[float, float, float]
    length: float
    major: float
    minor: float
    pitch: float
    internal: bool
    left: bool = False


@dataclass(frozen=True, eq=False, slots=True)
class Node:
    """One entry of the part tree, parents before children.

    `path` is unique and stable. Only leaves hold triangles: `mesh` is a row of `Geometry.meshes`,
    `placement` (4,4) float64 maps the mesh's frame to the world, and `face_range`, `vertex_range` say
    where its triangles and vertices stand in the flattened arrays. A `placement` of a node without a mesh is that
    of its own frame. `material` is a row of `Job.materials`, -1 for nodes without a mesh. `threads` are those drawn by
    convention.
    """

    path: str
    name: str
    parent: int
    placement: F64
    mesh: int = -1
    material: int = -1
    face_range: tuple[int, int] = (0, 0)
    vertex_range: tuple[int, int] = (0, 0)
    closed: bool = True
    source: SourceSpan | None = None
    marks: tuple[Mark, ...] = ()
    threads: tuple[Thread, ...] = ()


@dataclass(frozen=True, eq=False, slots=True)
class Geometry:
    """A model flattened to world-space triangles, with the part tree that explains them.

    vertices (n,3) float64; faces (m,3) int32; corner_normals (m,3,3) float32; face_node (m,) int32 row of
    `nodes`; face_patch (m,) int32, unique over the geometry: patch k of a node stands at
    `patch_start[node] + k`; face_origin (m,) uint8; face_source (m,) int32 row of `sources` or -1;
    edge_kind (m,3) uint8. The triangles of one node are contiguous and in the order of its mesh.
    A placement that mirrors has its triangles turned over, so winding stays outward.
    """

    key: str
    vertices: F64
    faces: I32
    corner_normals: F32
    face_node: I32
    face_patch: I32
    face_origin: U8
    face_source: I32
    edge_kind: U8
    patches: Patches
    patch_start: I32
    nodes: tuple[Node, ...]
    meshes: tuple[Mesh, ...]
    sources: tuple[SourceSpan, ...]


@dataclass(frozen=True, slots=True)
class Material:
    """How a surface answers light.

    colour: diffuse reflectance, linear RGB; normal_reflectance: specular reflectance at normal incidence,
    linear RGB (0.04 for a dielectric of index 1.5); roughness: 0 mirror .. 1 matt (the microfacet alpha is its square).
    A metal has colour 0. `flat` is the declared colour of flat tints and exports, 8-bit sRGB. density in g/cm3, 0
    unknown.
    """

    name: str
    colour: tuple[float, float, float]
    normal_reflectance: tuple[float, float, float]
    roughness: float
    metal: bool
    flat: tuple[int, int, int]
    density: float = 0.0


@dataclass(frozen=True, eq=False, slots=True)
class Projection:
    """World to page.

    `world_to_page` (4,4) float64 takes (x, y, z, 1) to (X, Y, Z, W): X/W is mm to the right of the page's left edge,
    Y/W mm below its top edge, Z/W a depth that grows away from the viewer and is affine over any plane.
    Parallel: W = 1 and Z is mm along the line of sight. Central: W is the distance from the
    projection centre's plane in mm and Z = -1, so depth is -1/distance.
    `eye` is the projection centre, None in parallel projection; `sight` the unit direction of sight in world (for a
    central projection that of the principal axis); `right` and `up` the unit axes of the picture plane in world.
    `scale` is mm on paper for one model mm along the axes (parallel) or in the plane through `target` (central).
    """

    kind: Literal["central", "parallel"]
    world_to_page: F64
    eye: tuple[float, float, float] | None
    sight: tuple[float, float, float]
    right: tuple[float, float, float]
    up: tuple[float, float, float]
    scale: float


@dataclass(frozen=True, slots=True)
class Light:
    """One source in world coordinates.

    directional: `vector` is the unit direction toward the light, `power` the linear RGB irradiance (pi times radiance
    of a white Lambert surface that faces it, so 1 gives white) ; lamp: `vector` is its place in mm, `power` the
    linear RGB
    intensity in irradiance at 1 m; ambient: `vector` unused, `power` the irradiance from all round.
    """

    kind: Literal["directional", "lamp", "ambient"]
    vector: tuple[float, float, float]
    power: tuple[float, float, float]


Pair = tuple[float, float, float, float, float, float]


@dataclass(frozen=True, slots=True)
class Lighting:
    """All sources and the exposure: the number that linear colour is multiplied by before encoding.

    `pairs` says what each material sends back of each light, where their spectra are known: rows as `lights`, in each
    one entry for each of `Job.materials`, of six numbers. They stand for the products of `Light.power` with
    `Material.colour` and `Material.normal_reflectance`, linear RGB each, which three channels give only nearly.
    Empty: the products themselves.
    """

    lights: tuple[Light, ...]
    exposure: float = 1.0
    pairs: tuple[tuple[Pair, ...], ...] = ()


class LineClass(StrEnum):
    """What a line stands for, in the words of ISO 128-2, 128-3 and ISO 129-1. The value names groups in files."""

    VISIBLE_OUTLINE = "visible-outline"  # only one of the two surfaces at it is seen
    VISIBLE_EDGE = "visible-edge"  # both surfaces at it are seen
    HIDDEN_OUTLINE = "hidden-outline"
    HIDDEN_EDGE = "hidden-edge"
    IMAGINARY_INTERSECTION = "imaginary-line-of-intersection"  # a tangent edge
    THREAD_CREST = "crest-of-thread"
    THREAD_ROOT = "root-of-thread"
    SECTION_OUTLINE = "section-outline"
    CUTTING_PLANE = "cutting-plane"
    HATCHING = "hatching"
    CENTRE_LINE = "centre-line"
    ADJACENT_PART = "adjacent-part"
    EXTREME_POSITION = "extreme-position"
    BREAK_LINE = "break-line"
    DETAIL_FRAME = "frame-of-detail"
    TRACE_LINE = "trace-line"
    LEADER = "leader"
    DIMENSION = "dimension-line"
    EXTENSION = "extension-line"
    SHADING = "shading"  # strokes and dots that stand for tone
    PART_SEEN_THROUGH = "part-seen-through"  # a line of a part that is drawn as a ghost
    REVOLVED_SECTION = "outline-of-revolved-section"


DrawnAs = Literal["lines", "tints", "lines and tone", "stipple", "tone", "survey part", "survey depth", "survey facing"]


@dataclass(frozen=True, slots=True)
class Style:
    """How a panel is drawn.

    `samples` per pixel edge the tone picture; a survey takes one. The rest is for line drawings: `wide` is the width
    in mm of the line group's wide line, the narrow one is half of it (ISO 128-2); two surfaces that meet at
    `sharp_angle` degrees or more between their normals have an edge; `hidden` draws hidden edges dashed; `tangent` the
    imaginary lines of intersection; `is_pictorial` draws narrow the edges of which both surfaces are seen, otherwise
    both kinds are wide; `gap` is the mm left free where a line passes behind another, 0 for none; `shade_lines` makes
    outlines heavier on the side away from the light.
    """

    drawn_as: DrawnAs = "tone"
    samples: Literal[1, 4] = 4
    wide: float = 0.35
    sharp_angle: float = 30.0
    hidden: bool = False
    tangent: bool = True
    centre_lines: bool = False
    is_pictorial: bool = True
    gap: float = 0.0
    shade_lines: bool = False

    @property
    def is_of_lines(self) -> bool:
        """Whether lines are drawn at all."""
        return self.drawn_as in ("lines", "tints", "lines and tone", "stipple")

    @property
    def narrow(self) -> float:
        """Width in mm of the narrow line."""
        return NARROW.get(self.wide, self.wide / 2)


NARROW = {0.25: 0.13, 0.35: 0.18, 0.5: 0.25, 0.7: 0.35, 1.0: 0.5, 1.4: 0.7, 2.0: 1.0}
"""Wide to narrow widths of the line groups of ISO 128-2, in mm."""


class Emphasis(IntEnum):
    """The stress a part carries in one panel."""

    PLAIN = 0
    HIGHLIGHT = 1
    MUTE = 2
    GHOST = 3
    HIDE = 4


@dataclass(frozen=True, eq=False, slots=True)
class Section:
    """A cutting plane: the side its normal points to is gone. `uncut` are rows of `Geometry.nodes` left whole.

    The geometry has been cut already; its cut faces are `FaceOrigin.SECTION_CAP`, one patch for each plane of the cut.
    Of a removed section they alone are drawn; so of a revolved one, in narrow lines over another panel (ISO 128-3).
    """

    point: tuple[float, float, float]
    normal: tuple[float, float, float]
    uncut: tuple[int, ...] = ()
    letter: str = ""
    drawn: Literal["all", "removed", "revolved"] = "all"


@dataclass(frozen=True, eq=False, slots=True)
class SpaceCurve:
    """A polyline in world mm, points (k,3) float64, to be drawn with its visibility and line class.

    With `is_hidden_by_parts` only what can be seen of it is drawn (a trace line), otherwise all of it (a centre line).
    """

    points: F64
    line_class: LineClass
    node: int = -1
    is_hidden_by_parts: bool = True


@dataclass(frozen=True, slots=True)
class Annotation:
    """A text already worded, its anchors in world mm, and what it is (item, label, dimension ...)."""

    kind: str
    text: str
    anchors: tuple[tuple[float, float, float], ...]
    node: int = -1


@dataclass(frozen=True, eq=False, slots=True)
class CuttingPlaneLine:
    """The trace of a cutting plane in the view it is seen edge-on in.

    points (k,3) float64 world mm: its ends and, for a stepped plane, its corners; `sight` the unit direction of viewing
    in world, along which the arrows point; `letter` stands at both ends.
    """

    points: F64
    sight: tuple[float, float, float]
    letter: str


@dataclass(frozen=True, slots=True)
class DetailFrame:
    """A circle round what a detail shows: centre in world mm, diameter in mm on the page of this panel, letter."""

    centre: tuple[float, float, float]
    diameter: float
    letter: str


@dataclass(frozen=True, slots=True)
class ViewArrow:
    """A reference arrow of a view (ISO 128-3): tip in world mm, unit direction of viewing in world, letter."""

    tip: tuple[float, float, float]
    sight: tuple[float, float, float]
    letter: str


@dataclass(frozen=True, slots=True)
class ExtremePosition:
    """Parts drawn once more as another setting has them: `nodes` of another geometry, a row of `Job.geometries`.

    They are hidden by nothing but themselves and hide nothing.
    """

    geometry: int
    nodes: tuple[int, ...]


@dataclass(frozen=True, eq=False, slots=True)
class Panel:
    """One view on the sheet.

    `geometry` is a row of `Job.geometries`; `place` (left, top, width, height) is its rectangle on the page in mm, y
    down;
    `displacement` (n_nodes,3) float64 mm moves each node's triangles before projection, None for none;
    `emphasis` (n_nodes,) uint8 `Emphasis`, None for plain throughout. `clip` (k,2) float64 is a convex polygon on the
    page in mm that the view is cut to, besides its `place`; None for none.
    """

    name: str
    geometry: int
    projection: Projection
    place: tuple[float, float, float, float]
    style: Style
    lighting: Lighting
    displacement: F64 | None = None
    emphasis: U8 | None = None
    section: Section | None = None
    curves: tuple[SpaceCurve, ...] = ()
    annotations: tuple[Annotation, ...] = ()
    clip: F64 | None = None
    cutting_planes: tuple[CuttingPlaneLine, ...] = ()
    detail_frames: tuple[DetailFrame, ...] = ()
    arrows: tuple[ViewArrow, ...] = ()
    extremes: tuple[ExtremePosition, ...] = ()


@dataclass(frozen=True, slots=True)
class Link:
    """Ties two panels: a cutting plane to its section, a frame to its detail, steps in register."""

    kind: Literal["section", "detail", "step"]
    parent: int
    child: int
    letter: str = ""


FileKind = Literal["svg", "pdf", "eps", "png", "tiff"]


@dataclass(frozen=True, slots=True)
class Page:
    """Paper size in mm and raster resolution in dots per inch. Pixel k spans mm k*25.4/dpi to (k+1)*25.4/dpi."""

    width: float
    height: float
    resolution: float = 600.0

    @property
    def pixels(self) -> tuple[int, int]:
        """Columns and rows: the paper size times the resolution, rounded half up, at least 1."""
        sides = (self.width, self.height)
        columns, rows = (max(1, int(np.floor(side / 25.4 * self.resolution + 0.5))) for side in sides)
        return columns, rows


@dataclass(frozen=True, slots=True)
class Inscription:
    """A text on the page that belongs to no part: a view's name, its scale, a letter.

    `place` is mm on the page: the middle of the base line's stretch with `align` middle, else its left or right end;
    `height` is that of capitals in mm.
    """

    text: str
    place: tuple[float, float]
    height: float
    align: Literal["left", "middle", "right"] = "middle"


@dataclass(frozen=True, slots=True)
class ProjectionSymbol:
    """The truncated cone that tells first-angle from third-angle projection (ISO 5456-2).

    `place` is the left top corner in mm on the page, `height` that of the larger circle in mm.
    """

    method: Literal["first angle", "third angle"]
    place: tuple[float, float]
    height: float


@dataclass(frozen=True, slots=True)
class MeasureWanted:
    """Ask for the visible area of a node and all below it in one panel."""

    panel: int
    node: int


@dataclass(frozen=True, slots=True)
class Measure:
    """What one part shows: areas on paper in mm2, box (left, top, right, bottom) in mm on the page or None if unseen.

    `unoccluded` is the area the part would cover with nothing in front of it, within the panel.
    """

    panel: int
    node: int
    visible: float
    unoccluded: float
    box: tuple[float, float, float, float] | None


@dataclass(frozen=True, slots=True)
class Sheet:
    """One deliverable: the page, its panels in painting order, the ties between them, the words that go with it.

    `letters` is the height in mm of the capitals that name sections, details and views.
    """

    name: str
    page: Page
    panels: tuple[Panel, ...]
    files: tuple[FileKind, ...] = ("png",)
    links: tuple[Link, ...] = ()
    title: str = ""
    alt: str = ""
    description: str = ""
    language: str = ""
    measures: tuple[MeasureWanted, ...] = ()
    letters: float = 3.5
    inscriptions: tuple[Inscription, ...] = ()
    symbols: tuple[ProjectionSymbol, ...] = ()


@dataclass(frozen=True, eq=False, slots=True)
class Job:
    """All that one figure needs: geometry shared by its panels, materials, and the sheet."""

    geometries: tuple[Geometry, ...]
    materials: tuple[Material, ...]
    sheet: Sheet
    version: int = field(default=VERSION)


class ContractError(ValueError):
    """The job breaks the contract: a fault in the compiler, never the author's."""


def verify(job: Job) -> None:
    """Check a job at the door and make its arrays read-only.

    Raises ContractError. Cost: one pass over the triangles.
    """
    if job.version != VERSION:
        raise ContractError(f"job version {job.version}, backend version {VERSION}")
    for geometry in job.geometries:
        verify_geometry(geometry, len(job.materials))
    for panel in job.sheet.panels:
        _verify_panel(panel, job)
    for wanted in job.sheet.measures:
        panel = _row(job.sheet.panels, wanted.panel, "measure's panel")
        _row(job.geometries[panel.geometry].nodes, wanted.node, "measure's node")


def verify_geometry(geometry: Geometry, n_materials: int) -> None:
    """Check one geometry's shapes, dtypes, ranges and finiteness, and freeze its arrays. Raises ContractError."""
    n_faces, n_nodes = len(geometry.faces), len(geometry.nodes)
    _array(geometry.vertices, np.float64, (None, 3), "vertices")
    _array(geometry.faces, np.int32, (n_faces, 3), "faces")
    _array(geometry.corner_normals, np.float32, (n_faces, 3, 3), "corner_normals")
    _array(geometry.edge_kind, np.uint8, (n_faces, 3), "edge_kind")
    _array(geometry.face_origin, np.uint8, (n_faces,), "face_origin")
    _array(geometry.patch_start, np.int32, (n_nodes,), "patch_start")
    for name, rows, least in (
        ("face_node", n_nodes, 0),
        ("face_patch", len(geometry.patches.kind), 0),
        ("face_source", len(geometry.sources), -1),
    ):
        array = getattr(geometry, name)
        _array(array, np.int32, (n_faces,), name)
        _within(array, least, rows, name)
    _within(geometry.faces, 0, len(geometry.vertices), "faces")
    for name in ("vertices", "corner_normals"):
        if not np.isfinite(getattr(geometry, name)).all():
            raise ContractError(f"{name}: not finite")
    for row, node in enumerate(geometry.nodes):
        if not -1 <= node.parent < row:
            raise ContractError(f"node {node.path}: parent {node.parent} does not stand before it")
        if node.mesh >= 0:
            _row(geometry.meshes, node.mesh, f"mesh of {node.path}")
            if not 0 <= node.material < n_materials:
                raise ContractError(f"node {node.path}: material {node.material}")


def _verify_panel(panel: Panel, job: Job) -> None:
    geometry = _row(job.geometries, panel.geometry, f"geometry of panel {panel.name}")
    _array(panel.projection.world_to_page, np.float64, (4, 4), "world_to_page")
    if not np.isfinite(panel.projection.world_to_page).all():
        raise ContractError("world_to_page: not finite")
    if panel.displacement is not None:
        _array(panel.displacement, np.float64, (len(geometry.nodes), 3), "displacement")
    lighting = panel.lighting
    if lighting.pairs and [len(row) for row in lighting.pairs] != [len(job.materials)] * len(lighting.lights):
        raise ContractError(f"pairs: expected {len(lighting.lights)} x {len(job.materials)}")
    if panel.emphasis is not None:
        _array(panel.emphasis, np.uint8, (len(geometry.nodes),), "emphasis")
    if panel.clip is not None:
        _array(panel.clip, np.float64, (None, 2), "clip")
    for extreme in panel.extremes:
        other = _row(job.geometries, extreme.geometry, f"extreme position's geometry in panel {panel.name}")
        for node in extreme.nodes:
            _row(other.nodes, node, "extreme position's node")
    for curve in panel.curves:
        _array(curve.points, np.float64, (None, 3), "curve")
    for plane in panel.cutting_planes:
        _array(plane.points, np.float64, (None, 3), "cutting plane line")


def _array(array: NDArray[np.generic], dtype: type[np.generic], shape: tuple[int | None, ...], name: str) -> None:
    if array.dtype != dtype or array.ndim != len(shape):
        raise ContractError(f"{name}: {array.dtype} {array.shape}, expected {np.dtype(dtype)} {shape}")
    if any(want is not None and want != have for want, have in zip(shape, array.shape, strict=True)):
        raise ContractError(f"{name}: shape {array.shape}, expected {shape}")
    array.flags.writeable = False


def _within(array: I32, least: int, below: int, name: str) -> None:
    if array.size and (array.min() < least or array.max() >= below):
        raise ContractError(f"{name}: rows outside {least} .. {below - 1}")


def _row(rows: tuple[_T, ...], index: int, name: str) -> _T:
    if not 0 <= index < len(rows):
        raise ContractError(f"{name}: row {index} of {len(rows)}")
    return rows[index]

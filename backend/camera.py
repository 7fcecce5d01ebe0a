"""Where a view is taken from: axes of the picture plane, world to page, page to world.

Words of ISO 5456: central and parallel projection, orthographic and axonometric representation. The world
is right-handed with z up; page points are mm to the right of the left edge and mm below the top edge.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from math import atan, cos, radians, sin, sqrt, tan
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from .contract import F64, Projection

Vector = tuple[float, float, float]
Drawn = tuple[float, float]
Side = Literal["front", "rear", "left", "right", "top", "bottom"]

TRUE_ISOMETRIC_ELEVATION = float(np.degrees(atan(1.0 / sqrt(2.0))))
ISOMETRIC_FORESHORTENING = sqrt(2.0 / 3.0)
_VERTICAL = 1e-9
_SQUARE = 1e-12  # singular values this near to each other, relatively, make a projection square to its picture plane

# Sight and up. The bottom view keeps +x to the right, as the third-angle arrangement (ISO 5456-2) asks when it
# stands below the front view; its up is then -y, the front of the object at the top.
_SIDES: dict[Side, tuple[Vector, Vector]] = {
    "front": ((0.0, 1.0, 0.0), (0.0, 0.0, 1.0)),
    "rear": ((0.0, -1.0, 0.0), (0.0, 0.0, 1.0)),
    "left": ((1.0, 0.0, 0.0), (0.0, 0.0, 1.0)),
    "right": ((-1.0, 0.0, 0.0), (0.0, 0.0, 1.0)),
    "top": ((0.0, 0.0, -1.0), (0.0, 1.0, 0.0)),
    "bottom": ((0.0, 0.0, 1.0), (0.0, -1.0, 0.0)),
}


@dataclass(frozen=True, slots=True)
class Axes:
    """Unit vectors in world: right and up in the picture plane, sight away from the viewer; right = sight x up."""

    right: Vector
    up: Vector
    sight: Vector


def axes(sight: ArrayLike, up: ArrayLike | None = None) -> Axes:
    """Picture axes for a direction of sight of any length.

    `up` is the world direction that stands upright; by default world z, and along a vertical sight that of
    the top view (+y up) or the bottom view (-y up): +x points right in both. Raises ValueError for a zero
    sight or an `up` along it.
    """
    forward = _unit(sight)
    if up is None:
        is_vertical = float(np.hypot(forward[0], forward[1])) < _VERTICAL
        up = (0.0, -np.sign(forward[2]), 0.0) if is_vertical else (0.0, 0.0, 1.0)
    right = _unit(np.cross(forward, np.asarray(up, np.float64)))
    return Axes(_vector(right), _vector(_unit(np.cross(right, forward))), _vector(forward))


def orthographic(side: Side) -> Axes:
    """Return one of the six views: front is seen along +y, right is the side at +x, top the side at +z."""
    sight, up = _SIDES[side]
    return axes(sight, up)


def isometric(
    depth: Literal["front", "rear"] = "front",
    side: Literal["left", "right"] = "right",
    height: Literal["above", "below"] = "above",
) -> Axes:
    """Return the isometric view from one of eight corners: equal angles between the sight and all axes (ISO 5456-3)."""
    x = -1.0 if side == "right" else 1.0
    y = 1.0 if depth == "front" else -1.0
    z = -1.0 if height == "above" else 1.0
    return axes((x, y, z))


def direction(azimuth: float, elevation: float) -> Axes:
    """Return the view from a bearing, degrees: azimuth 0 is the front, 90 the right; elevation above the horizon."""
    a, e = radians(azimuth), radians(elevation)
    return axes((-sin(a) * cos(e), cos(a) * cos(e), -sin(e)))


def drawn_axes(x: Drawn, y: Drawn, z: Drawn, origin: tuple[float, float] = (0.0, 0.0)) -> Projection:
    """Parallel projection by where units along the world axes are drawn: mm on paper to the right and up.

    Whether it is square to the picture plane or oblique follows from the six numbers (Pohlke's theorem): projectors run
    along the direction that is drawn as a point. Two planes are drawn in their true shape, at the lesser of the map's
    singular values; the picture plane is the one more nearly square to y.
    Depth is 0 at the world's origin, which lands on page point `origin` (mm), and is measured along the projectors.
    `scale` is 1. Raises ValueError where the axes are drawn along one line, or mirrored.
    """
    across, upward = np.array((x[0], y[0], z[0])), np.array((x[1], y[1], z[1]))
    sight = -_unit(np.cross(across, upward))
    matrix = np.zeros((4, 4))
    matrix[0, :3], matrix[1, :3], matrix[3, 3] = across, -upward, 1.0
    matrix[0, 3], matrix[1, 3] = origin
    plane = _picture_plane(across, upward, sight)
    normal = np.array(plane.sight)
    matrix[2, :3] = normal / float(normal @ sight)
    return Projection("parallel", matrix, None, _vector(sight), plane.right, plane.up, 1.0)


def _picture_plane(across: F64, upward: F64, sight: F64) -> Axes:
    """Axes of the plane that a map with these rows draws in its true shape, and its normal away from the viewer.

    With the map's singular values s1 >= s2, vectors v1, v2 and the null direction n, that plane holds v2 and a unit
    vector of the span of v1 and n whose part along v1 is s2/s1.
    """
    right, up = across, upward
    a, d, mixed = float(across @ across), float(upward @ upward), float(across @ upward)
    lesser = (a + d) / 2 - sqrt(((a - d) / 2) ** 2 + mixed * mixed)
    greater = (a + d) / 2 + sqrt(((a - d) / 2) ** 2 + mixed * mixed)
    if greater - lesser <= _SQUARE * greater:
        return axes(sight, upward)
    turn = 0.5 * float(np.arctan2(2 * mixed, a - d))
    first, second = cos(turn) * right + sin(turn) * up, -sin(turn) * right + cos(turn) * up
    long, short = _unit(first), _unit(second)
    share = sqrt(lesser / greater)
    planes = []
    for side in (1.0, -1.0):
        leaning = share * long + side * sqrt(1.0 - share * share) * sight
        right, up = cos(turn) * leaning - sin(turn) * short, sin(turn) * leaning + cos(turn) * short
        planes.append((abs(float(np.cross(right, up)[1])), right, up))
    _, right, up = max(planes, key=lambda each: each[0])
    return Axes(_vector(right), _vector(up), _vector(-np.cross(right, up)))


def oblique(plane: Axes, depth: Drawn) -> Projection:
    """Oblique projection onto a picture plane that is drawn undistorted (ISO 5456-3: cavalier, cabinet, planometric).

    `depth` is where a unit away from the viewer is drawn, mm to the right and up at scale 1. Depth is measured along
    the projectors, 0 in the plane through the world's origin, which lands on page point (0, 0).
    """
    right, up, away = (np.array(each) for each in (plane.right, plane.up, plane.sight))
    sight = _unit(away - depth[0] * right - depth[1] * up)
    matrix = np.zeros((4, 4))
    matrix[0, :3], matrix[1, :3] = right + depth[0] * away, -(up + depth[1] * away)
    matrix[2, :3] = away / float(away @ sight)
    matrix[3, 3] = 1.0
    return Projection("parallel", matrix, None, _vector(sight), plane.right, plane.up, 1.0)


def foreshortening(view: Axes) -> Vector:
    """Length on the picture plane of a unit along world x, y and z in a parallel projection."""
    x, y, z = (sqrt(max(0.0, 1.0 - s * s)) for s in view.sight)
    return x, y, z


def along_axes(view: Axes) -> float:
    """Magnification that makes a parallel view measure 1 along the world axes.

    Isometric: sqrt(3/2), the drawing office's scale along the axes. Where the axes are not equally
    foreshortened, 1: the scale then holds in the picture plane.
    """
    x, y, z = foreshortening(view)
    return 1.0 / x if max(abs(x - y), abs(y - z)) < 1e-12 else 1.0


def parallel(
    view: Axes,
    magnification: float,
    origin: tuple[float, float],
    anchor: ArrayLike = (0.0, 0.0, 0.0),
    scale: float | None = None,
) -> Projection:
    """Parallel projection at right angles to the picture plane.

    `magnification` is mm on paper for one model mm in the picture plane (the true projection); for a scale
    along the axes pass `scale * along_axes(view)`. World point `anchor` (mm) lands on page point `origin`
    (mm) at depth 0. `scale` is what the projection declares, by default magnification / along_axes.
    """
    right, up, sight = (np.array(v) for v in (view.right, view.up, view.sight))
    matrix = np.zeros((4, 4))
    matrix[0, :3], matrix[1, :3], matrix[2, :3] = magnification * right, -magnification * up, sight
    matrix[:3, 3] = (origin[0], origin[1], 0.0) - matrix[:3, :3] @ np.asarray(anchor, np.float64)
    matrix[3, 3] = 1.0
    declared = magnification / along_axes(view) if scale is None else scale
    return Projection("parallel", matrix, None, view.sight, view.right, view.up, declared)


def enlarged(projection: Projection, factor: float, origin: tuple[float, float] = (0.0, 0.0)) -> Projection:
    """The same picture `factor` times as large, its page point (0, 0) moved to `origin` (mm)."""
    matrix = projection.world_to_page.copy()
    for row in (0, 1):
        matrix[row] = factor * matrix[row] + origin[row] * matrix[3]
    return replace(projection, world_to_page=matrix, scale=factor * projection.scale)


def central(
    eye: ArrayLike,
    toward: ArrayLike,
    principal_distance: float,
    origin: tuple[float, float],
    up: ArrayLike | None = None,
) -> Projection:
    """Central projection from `eye` with the principal axis through `toward` (world mm).

    `principal_distance` is the distance of the picture plane from the eye, mm on paper: a thing of size 1
    at distance d is principal_distance / d on paper. The principal point lands on page point `origin` (mm).
    Raises ValueError if eye and target coincide.
    """
    position, target = np.asarray(eye, np.float64), np.asarray(toward, np.float64)
    view = axes(target - position, up)
    right, upward, sight = (np.array(v) for v in (view.right, view.up, view.sight))
    matrix = np.zeros((4, 4))
    matrix[0, :3] = principal_distance * right + origin[0] * sight
    matrix[1, :3] = -principal_distance * upward + origin[1] * sight
    matrix[3, :3] = sight
    matrix[:, 3] = -matrix[:, :3] @ position
    matrix[2, 3] = -1.0
    scale = principal_distance / float(np.linalg.norm(target - position))
    return Projection("central", matrix, _vector(position), view.sight, view.right, view.up, scale)


def principal_distance_of_lens(lens: float, film_width: float, picture_width: float) -> float:
    """Principal distance on paper of a lens (mm) whose film of `film_width` is enlarged to `picture_width` (mm)."""
    return lens * picture_width / film_width


def principal_distance_of_angle(angle: float, picture_width: float) -> float:
    """Principal distance on paper when `picture_width` (mm) is seen under `angle` degrees."""
    return 0.5 * picture_width / tan(radians(angle) / 2.0)


def magnification(projection: Projection) -> float:
    """The most that one model mm is enlarged to, mm on paper; of a central projection, in the plane through its target.

    Parallel: the larger singular value of the map, in closed form.
    """
    if projection.kind == "central":
        return projection.scale
    across, down = projection.world_to_page[0, :3], projection.world_to_page[1, :3]
    (ax, ay, az), (dx, dy, dz) = across, down
    a, d, mixed = ax * ax + ay * ay + az * az, dx * dx + dy * dy + dz * dz, ax * dx + ay * dy + az * dz
    return float(sqrt((a + d) / 2 + sqrt(((a - d) / 2) ** 2 + mixed * mixed)))


def upper_left(view: Axes | Projection) -> Vector:
    """Unit direction toward the light from the upper left: (-1, 1, 1)/sqrt(3) in (right, up, toward the viewer)."""
    right, up, sight = (np.array(v) for v in (view.right, view.up, view.sight))
    return _vector(_unit(up - right - sight))


def extents(view: Axes, points: F64) -> tuple[F64, F64]:
    """Least and greatest (right, up, sight) coordinates, mm, of world points (n,3): two arrays (3,).

    Raises ValueError for no points. Cost: one pass.
    """
    if not len(points):
        raise ValueError("extents of no points")
    coordinates = points @ np.array((view.right, view.up, view.sight)).T
    return coordinates.min(axis=0), coordinates.max(axis=0)


def to_page(projection: Projection, points: F64) -> tuple[F64, F64]:
    """Page points (n,2) in mm and depths (n,) of world points (n,3); NaN where a point is not in front of the eye."""
    homogeneous = points @ projection.world_to_page[:, :3].T + projection.world_to_page[:, 3]
    weight = np.where(homogeneous[:, 3] > 0.0, homogeneous[:, 3], np.nan)
    return homogeneous[:, :2] / weight[:, None], homogeneous[:, 2] / weight


def rays(projection: Projection, page_points: F64) -> tuple[F64, F64]:
    """Lines of sight through page points (n,2) in mm: world origins (n,3) and unit directions (n,3).

    Central: all start at the eye. Parallel: they start where depth is 0.
    """
    inverse = np.linalg.inv(projection.world_to_page)
    columns = np.ones((len(page_points), 4))
    columns[:, :2], columns[:, 2] = page_points, 0.0 if projection.eye is None else -1.0
    world = columns @ inverse.T
    if projection.eye is None:
        return world[:, :3], np.tile(np.array(projection.sight), (len(page_points), 1))
    towards = world[:, :3] / world[:, 3:] - np.array(projection.eye)
    origins = np.tile(np.array(projection.eye), (len(page_points), 1))
    return origins, towards / np.linalg.norm(towards, axis=1, keepdims=True)


def _unit(vector: ArrayLike) -> F64:
    array = np.asarray(vector, np.float64)
    length = float(np.linalg.norm(array))
    if not length > 0.0:
        raise ValueError("a direction of no length")
    return np.asarray(array / length)


def _vector(array: F64) -> Vector:
    x, y, z = (float(v) + 0.0 for v in array)
    return x, y, z

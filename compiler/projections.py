"""The standard projections by name: orthographic, axonometric and oblique representations after ISO 5456-2 and -3."""

from __future__ import annotations

from math import sqrt
from typing import Literal, TypeAlias

from msgspec import Struct
from platewright.backend import camera
from platewright.backend.camera import Drawn
from platewright.backend.contract import Projection

from .trigonometry import cos_deg, sin_deg

Point = tuple[float, float, float]

FILM_MM = 36.0
"""Width of the film when none is stated."""

TURNED_DEG, RAISED_DEG = 35.0, 20.0
"""Where a trimetric view stands when nothing is said: our own choice, with clearly different axes."""

RECEDING_DEG, PLAN_DEG = 45.0, 45.0

SHORTENED = 2 / 3
"""Heights of a shortened planometric projection (ISO 5456-3)."""

SIDES = ("front", "rear", "left", "right", "top", "bottom")
AXONOMETRIC = ("isometric", "dimetric", "trimetric", "cavalier", "cabinet", "planometric")


class Parallel(Struct, frozen=True):
    """Parallel projection square to the picture plane.

    `ratio` is the magnification in the picture plane that makes a scale hold along the axes. With `is_pictorial` no
    side of the object is seen square on (ISO 5456-3), otherwise the view is orthographic (ISO 5456-2).
    """

    axes: camera.Axes
    ratio: float = 1.0
    is_pictorial: bool = True


class Oblique(Struct, frozen=True):
    """Oblique projection: a plane drawn undistorted, and where a unit away from the viewer is drawn."""

    plane: camera.Axes
    depth: Drawn


class Conventional(Struct, frozen=True):
    """Parallel projection by where units along x, y and z are drawn."""

    x: Drawn
    y: Drawn
    z: Drawn


class Central(Struct, frozen=True):
    """Central projection. `angle` or `lens` on `film` hold the field of view; without them the figure is fitted.

    `plane` is the normal of the picture plane where it is not square to the line from the eye to its target; `shift`
    moves the picture plane on the film, mm to the right and up.
    """

    eye: Point
    toward: Point
    lens: float | None = None
    film: float = FILM_MM
    angle: float | None = None
    plane: Point | None = None
    shift: tuple[float, float] = (0.0, 0.0)

    @property
    def is_held(self) -> bool:
        """Whether the field of view is stated."""
        return self.angle is not None or self.lens is not None

    @property
    def distance(self) -> float:
        """Distance in mm of the target from the eye, along the principal axis."""
        sight = self._sight()
        return sum((b - a) * s for a, b, s in zip(self.eye, self.toward, sight, strict=True))

    def projection(self) -> Projection:
        """At a scale of 1 in the plane through the target, which lands on (0, 0)."""
        sight, distance = self._sight(), self.distance
        along = tuple(a + distance * s for a, s in zip(self.eye, sight, strict=True))
        view = camera.central(self.eye, along, distance, (0.0, 0.0))
        target = tuple(b - a for a, b in zip(self.eye, self.toward, strict=True))
        across, upward = (sum(a * b for a, b in zip(target, axis, strict=True)) for axis in (view.right, view.up))
        return camera.enlarged(view, 1.0, (-across, upward))

    def _sight(self) -> Point:
        toward = [b - a for a, b in zip(self.eye, self.toward, strict=True)]
        if self.plane is None:
            size = sum(each * each for each in toward) ** 0.5
            return (toward[0] / size, toward[1] / size, toward[2] / size)
        x, y, z = self.plane
        return self.plane if x * toward[0] + y * toward[1] + z * toward[2] > 0 else (-x, -y, -z)


Viewpoint: TypeAlias = Parallel | Oblique | Conventional | Central


class Corner(Struct, frozen=True):
    """Which three sides of the object an axonometric view shows."""

    side: Literal["front", "rear"] = "front"
    hand: Literal["left", "right"] = "right"
    height: Literal["above", "below"] = "above"

    @property
    def signs(self) -> Point:
        """The signs of the direction of sight."""
        x = -1.0 if self.hand == "right" else 1.0
        y = 1.0 if self.side == "front" else -1.0
        return (x, y, -1.0 if self.height == "above" else 1.0)


def orthographic(side: str) -> Parallel:
    """One of the six views of ISO 5456-2."""
    return Parallel(camera.orthographic(_side(side)), is_pictorial=False)


def along(sight: Point) -> Parallel:
    """The view along any direction: axonometric where it is square to no axis, else orthographic (ISO 5456-2, -3)."""
    view = camera.axes(sight)
    return Parallel(view, camera.along_axes(view), min(abs(each) for each in view.sight) > 1e-9)


def square_to(sight: Point) -> Parallel:
    """The orthographic view along a direction: a principal or an auxiliary one."""
    return Parallel(camera.axes(sight), is_pictorial=False)


def isometric(corner: Corner) -> Parallel:
    """All axes equally foreshortened, drawn at 30, 30 and 90 degrees."""
    view = camera.axes(corner.signs)
    return Parallel(view, camera.along_axes(view))


def exact_dimetric(corner: Corner) -> Parallel:
    """The projection square to the picture plane that halves y: axes at 7.18 and 41.41 degrees.

    Foreshortened as 1 : 1/2 : 1, so a unit sight has x and z parts of 1/3 and a y part of root 7 over 3.
    """
    x, y, z = corner.signs
    return Parallel(camera.axes((x, sqrt(7.0) * y, z)), 3.0 / sqrt(8.0))


def dimetric(corner: Corner) -> Conventional:
    """Axes drawn at 7 and 42 degrees, y halved, by the convention of ISO 5456-3."""
    view = exact_dimetric(corner).axes

    def drawn(axis: int, angle: float, length: float) -> Drawn:
        right = length * cos_deg(angle) * (1.0 if view.right[axis] > 0 else -1.0)
        return (right, length * sin_deg(angle) * (1.0 if view.up[axis] > 0 else -1.0))

    return Conventional(drawn(0, 7.0, 1.0), drawn(1, 42.0, 0.5), (0.0, 1.0))


def trimetric(corner: Corner, turned: float = TURNED_DEG, raised: float = RAISED_DEG) -> Parallel:
    """The view turned from the front or rear and raised above the horizon, degrees; the scale is that of its plane."""
    x, y, z = corner.signs
    level = cos_deg(raised)
    return Parallel(camera.axes((x * sin_deg(turned) * level, y * cos_deg(turned) * level, z * sin_deg(raised))))


def cavalier(corner: Corner, receding: float = RECEDING_DEG, length: float = 1.0) -> Oblique:
    """Oblique, the front or rear undistorted; lines away from the viewer recede at an angle, in full or in part."""
    plane = camera.orthographic(corner.side)
    x, _, z = corner.signs
    aside = 1.0 if plane.right[0] * x < 0 else -1.0
    return Oblique(plane, (aside * length * cos_deg(receding), -z * length * sin_deg(receding)))


def planometric(corner: Corner, turned: float = PLAN_DEG, height: float = 1.0) -> Oblique:
    """Oblique, the plan undistorted, x drawn `turned` degrees off the horizontal, heights upright."""
    x, y, z = corner.signs
    is_right_in_picture = x * y < 0
    angle = (-turned if is_right_in_picture else turned) * -z + (0.0 if y > 0 else 180.0)
    # Axes of the plan on paper: where the plan's own right and up (of the top or bottom view) are drawn.
    right_x, right_y = cos_deg(angle), sin_deg(angle)
    # Picture axes in the world are the inverse of that turn.
    flip = 1.0 if z < 0 else -1.0
    right = (right_x, -right_y * flip, 0.0)
    up = (right_y, right_x * flip, 0.0)
    return Oblique(camera.Axes(right, up, (0.0, 0.0, z)), (0.0, z * height))


def standard(name: str) -> Viewpoint | None:
    """A viewpoint that exists without being declared.

    The six sides; and each axonometric projection by its word, from front right above, or with the three sides it
    shows: `isometric_front_left_above`.
    """
    if name in SIDES:
        return orthographic(name)
    word, *sides = name.split("_")
    if word not in AXONOMETRIC or len(sides) not in (0, 3):
        return None
    corner = Corner()
    if sides:
        found = corner_of(sides[0], sides[1], sides[2])
        if found is None:
            return None
        corner = found
    return by_name(word, corner)


def by_name(word: str, corner: Corner) -> Viewpoint:
    """An axonometric projection by its word, with nothing more said."""
    match word:
        case "dimetric":
            return dimetric(corner)
        case "trimetric":
            return trimetric(corner)
        case "cavalier":
            return cavalier(corner)
        case "cabinet":
            return cavalier(corner, length=0.5)
        case "planometric":
            return planometric(corner)
        case _:
            return isometric(corner)


def corner_of(side: str, hand: str, height: str) -> Corner | None:
    """The corner that three words name, None if they name none."""
    if side not in ("front", "rear") or hand not in ("left", "right") or height not in ("above", "below"):
        return None
    return Corner(
        "rear" if side == "rear" else "front",
        "left" if hand == "left" else "right",
        "below" if height == "below" else "above",
    )


def standard_names() -> tuple[str, ...]:
    """The standard viewpoints tried where another would fill a page better, and meant where one is misspelt."""
    corners = ("", "_front_left_above")
    return (*SIDES, *(word + corner for word in AXONOMETRIC for corner in corners))


def unit_projection(viewpoint: Viewpoint, factor: float = 1.0, is_true: bool = False) -> Projection:
    """The projection at a scale of `factor`, the world's origin or, in central projection, the target at (0, 0).

    The scale holds along the axes, or with `is_true` in the picture plane; in central projection in the plane through
    the target.
    """
    match viewpoint:
        case Central():
            return camera.enlarged(viewpoint.projection(), factor)
        case Oblique():
            return camera.enlarged(camera.oblique(viewpoint.plane, viewpoint.depth), factor)
        case Conventional():
            return camera.enlarged(camera.drawn_axes(viewpoint.x, viewpoint.y, viewpoint.z), factor)
        case Parallel():
            ratio = 1.0 if is_true else viewpoint.ratio
            return camera.parallel(viewpoint.axes, factor * ratio, (0.0, 0.0), scale=factor)


def is_pictorial(viewpoint: Viewpoint) -> bool:
    """Whether a view is axonometric or central rather than orthographic."""
    return not isinstance(viewpoint, Parallel) or viewpoint.is_pictorial


def _side(name: str) -> camera.Side:
    match name:
        case "rear" | "left" | "right" | "top" | "bottom":
            return name
        case _:
            return "front"

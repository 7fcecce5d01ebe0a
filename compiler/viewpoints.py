"""Viewpoints: a projection and where it is taken from, declared or standard (ISO 5456)."""

from __future__ import annotations

from typing import Literal, TypeAlias

from msgspec import Struct
from platewright.backend import camera
from platewright.backend.contract import Projection
from platewright.lang import tree
from platewright.lang.problems import Related
from platewright.lang.units import ANGLE

from .expressions import quantity
from .mistakes import Problems, mistake
from .placement import direction, point, positive_length
from .readings import LATER, expression, optional, word
from .scope import Scope

FILM_MM = 36.0
"""Width of the film when none is stated."""


class Parallel(Struct, frozen=True):
    """Parallel projection square to the picture plane."""

    axes: camera.Axes


class Central(Struct, frozen=True):
    """Central projection. `angle` or `lens` on `film` hold the field of view; without them the figure is fitted."""

    eye: tuple[float, float, float]
    toward: tuple[float, float, float]
    lens: float | None = None
    film: float = FILM_MM
    angle: float | None = None


Viewpoint: TypeAlias = Parallel | Central

STANDARD_SIDES = ("front", "rear", "left", "right", "top", "bottom")


def standard(name: str) -> Viewpoint | None:
    """A viewpoint that exists without being declared: six sides, and `isometric` from front right above."""
    for side in STANDARD_SIDES:
        if name == side:
            return Parallel(camera.orthographic(_side(side)))
    return Parallel(camera.isometric()) if name == "isometric" else None


def unit_projection(viewpoint: Viewpoint, factor: float = 1.0, is_true: bool = False) -> Projection:
    """The projection at a scale of `factor`, the world's origin or, in central projection, the target at (0, 0).

    The scale holds along the axes, or with `is_true` in the picture plane; in central projection in the plane through
    the target.
    """
    if isinstance(viewpoint, Central):
        distance = sum((a - b) ** 2 for a, b in zip(viewpoint.toward, viewpoint.eye, strict=True)) ** 0.5
        return camera.enlarged(camera.central(viewpoint.eye, viewpoint.toward, distance, (0.0, 0.0)), factor)
    ratio = 1.0 if is_true else camera.along_axes(viewpoint.axes)
    return camera.parallel(viewpoint.axes, factor * ratio, (0.0, 0.0), scale=factor)


def read_viewpoint(line: tree.Line, scope: Scope, problems: Problems) -> Viewpoint | None:
    """The viewpoint that a declaration describes; None where it describes none and the problems say why."""
    known = [each for each in line.lines if each.head.row not in LATER]
    projections = [each for each in known if each.word not in ("lens", "angle of view")]
    if not projections:
        hint = "such as `isometric from front right above` or `eye (900 mm, -1200 mm, 700 mm) toward (0, 0, 0)`"
        problems.error("no-projection", line.span, "this viewpoint states no projection", hint)
        return None
    first = projections[0]
    for other in projections[1:]:
        if other.head.row == first.head.row:
            continue  # said twice, which reading has reported
        related = (Related(first.head.word_span, "the first of them"),)
        problems.error("said-twice", other.head.word_span, "a viewpoint has one projection", "leave one out", related)
    viewpoint: Viewpoint | None = None
    with problems.collecting():
        viewpoint = _projection(first.head, scope)
    if isinstance(viewpoint, Central):
        return _field_of_view(viewpoint, line, scope, problems)
    for each in known:
        if each.word in ("lens", "angle of view") and viewpoint is not None:
            problems.error("wrong-form", each.span, f"`{each.word}` belongs to a central projection", "state an `eye`")
    return viewpoint


def _projection(reading: tree.Reading, scope: Scope) -> Viewpoint | None:
    match reading.word:
        case "eye":
            eye, toward = point(expression(reading, "eye"), scope), point(expression(reading, "toward"), scope)
            if max(abs(a - b) for a, b in zip(eye, toward, strict=True)) < 1e-6:
                raise mistake("eye-on-target", reading.span, "the eye stands on the point it looks toward")
            return Central(eye, toward)
        case "orthographic from":
            return Parallel(camera.orthographic(_side(word(reading, "side"))))
        case "isometric from":
            return Parallel(
                camera.isometric(
                    "rear" if word(reading, "side") == "rear" else "front",
                    "left" if word(reading, "hand") == "left" else "right",
                    "below" if word(reading, "height") == "below" else "above",
                )
            )
        case "parallel along":
            return Parallel(camera.axes(direction(expression(reading, "direction"), scope)))
    return None


def _side(name: str) -> Literal["front", "rear", "left", "right", "top", "bottom"]:
    match name:
        case "rear" | "left" | "right" | "top" | "bottom":
            return name
        case _:
            return "front"


def _field_of_view(central: Central, line: tree.Line, scope: Scope, problems: Problems) -> Viewpoint:
    lens, film, angle = None, FILM_MM, None
    said: tree.Reading | None = None
    for each in line.lines:
        if each.word not in ("lens", "angle of view"):
            continue
        if said is not None and said.row != each.head.row:
            related = (Related(said.word_span, "the first of them"),)
            problems.error(
                "said-twice", each.head.word_span, "the field of view is stated twice", "leave one out", related
            )
        said = each.head
        with problems.collecting():
            if each.word == "lens":
                lens = positive_length(expression(each.head, "lens"), scope, "lens")
                written = optional(each.head, "film")
                film = positive_length(written, scope, "film") if written is not None else FILM_MM
            else:
                written = expression(each.head, "angle")
                angle = quantity(written, scope, ANGLE)
                if not 0 < angle < 170:
                    sentence = f"expected an angle of view between 0 and 170 deg, found {angle:g} deg"
                    raise mistake("out-of-range", written.span, sentence)
    return Central(central.eye, central.toward, lens, film, angle)

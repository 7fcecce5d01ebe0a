"""Declared viewpoints: from the lines of a `viewpoint` to a projection and where it is taken from (ISO 5456)."""

from __future__ import annotations

from msgspec.structs import replace
from platewright.lang import tree
from platewright.lang.problems import Related
from platewright.lang.units import ANGLE, LENGTH

from . import projections
from .expressions import quantity
from .mistakes import Problems, mistake
from .placement import direction, point, positive_length
from .projections import Central, Viewpoint
from .readings import LATER, expression, optional, word
from .scope import Scope

FIELD_WORDS = ("lens", "angle of view")
CENTRAL_WORDS = (*FIELD_WORDS, "shift", "picture plane")
"""Lines that go with an eye."""


def read_viewpoint(line: tree.Line, scope: Scope, problems: Problems) -> Viewpoint | None:
    """The viewpoint that a declaration describes; None where it describes none and the problems say why."""
    known = [each for each in line.lines if each.head.row not in LATER]
    projections = [each for each in known if each.word not in CENTRAL_WORDS]
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
        return _picture_plane(_field_of_view(viewpoint, line, scope, problems), known, scope, problems)
    for each in known:
        if each.word in CENTRAL_WORDS and viewpoint is not None:
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
            return projections.orthographic(word(reading, "side"))
        case "parallel along":
            return projections.along(direction(expression(reading, "direction"), scope))
    return _axonometric(reading, scope)


def _axonometric(reading: tree.Reading, scope: Scope) -> Viewpoint | None:
    corner = projections.corner_of(word(reading, "side"), word(reading, "hand"), word(reading, "height"))
    if corner is None:
        return None
    match reading.word:
        case "isometric from":
            return projections.isometric(corner)
        case "dimetric from":
            return (
                projections.exact_dimetric(corner)
                if word(reading, "angles") == "exact"
                else projections.dimetric(corner)
            )
        case "trimetric from":
            turned = _acute(reading, "turned", scope, projections.TURNED_DEG)
            return projections.trimetric(corner, turned, _acute(reading, "raised", scope, projections.RAISED_DEG))
        case "cavalier from" | "cabinet from":
            length = 1.0 if reading.word == "cavalier from" else 0.5
            return projections.cavalier(corner, _acute(reading, "angle", scope, projections.RECEDING_DEG), length)
        case "planometric from":
            height = projections.SHORTENED if word(reading, "heights") == "shortened" else 1.0
            return projections.planometric(corner, _acute(reading, "turned", scope, projections.PLAN_DEG), height)
    return None


def _acute(reading: tree.Reading, slot: str, scope: Scope, default: float) -> float:
    """An angle above 0 and below 90 degrees. Raises Mistake."""
    written = optional(reading, slot)
    if written is None:
        return default
    angle = quantity(written, scope, ANGLE)
    if not 0 < angle < 90:
        raise mistake("out-of-range", written.span, f"expected an angle between 0 and 90 deg, found {angle:g} deg")
    return angle


def _picture_plane(central: Central, known: list[tree.Line], scope: Scope, problems: Problems) -> Central:
    """The central projection with its picture plane set up and shifted as its lines say."""
    for each in known:
        with problems.collecting():
            if each.word == "picture plane":
                written = optional(each.head, "normal")
                if written is None:
                    x, y = (b - a for a, b in zip(central.eye[:2], central.toward[:2], strict=True))
                    size = (x * x + y * y) ** 0.5
                    if size < 1e-6:
                        sentence = "the eye looks straight up or down, so no upright picture plane faces it"
                        raise mistake("eye-on-target", each.head.span, sentence, "state the plane's normal")
                    central = replace(central, plane=(x / size, y / size, 0.0))
                else:
                    central = replace(central, plane=direction(written, scope))
                if central.distance < 1e-6:
                    sentence = "the picture plane is seen edge-on from the eye"
                    raise mistake("eye-on-target", each.head.span, sentence, "take another direction, or move the eye")
            elif each.word == "shift":
                across, up = (quantity(expression(each.head, slot), scope, LENGTH) for slot in ("across", "up"))
                if max(abs(across), abs(up)) > 10 * central.film:
                    sentence = f"a shift of more than ten times the film's {central.film:g} mm leads off the picture"
                    raise mistake("out-of-range", each.head.span, sentence)
                central = replace(central, shift=(across, up))
    return central


def _field_of_view(central: Central, line: tree.Line, scope: Scope, problems: Problems) -> Central:
    lens, film, angle = None, projections.FILM_MM, None
    said: tree.Reading | None = None
    for each in line.lines:
        if each.word not in FIELD_WORDS:
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
                film = positive_length(written, scope, "film") if written is not None else projections.FILM_MM
            else:
                written = expression(each.head, "angle")
                angle = quantity(written, scope, ANGLE)
                if not 0 < angle < 170:
                    sentence = f"expected an angle of view between 0 and 170 deg, found {angle:g} deg"
                    raise mistake("out-of-range", written.span, sentence)
    return Central(central.eye, central.toward, lens, film, angle)

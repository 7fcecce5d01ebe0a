"""Lighting: declared sources to world-space lights for one view, with a repeatable exposure."""

from __future__ import annotations

from math import pi

from msgspec import Struct
from platewright.backend import contract
from platewright.backend.contract import Light
from platewright.lang import tree
from platewright.lang.units import ANGLE, ILLUMINANCE, LUMINOUS_FLUX, NUMBER

from .expressions import quantity
from .mistakes import Problems, mistake
from .placement import point
from .readings import LATER, expression, optional, word
from .scope import Scope
from .trigonometry import cos_deg, sin_deg

Point = tuple[float, float, float]

KEY_LUX, SUN_LUX, AMBIENT_LUX = 1000.0, 100_000.0, 600.0
"""Illuminance where none is stated.

Full daylight of about 100 klx is common practice; the others are our own choice.
"""

WHITE = 0.82
"""Linear value that the automatic exposure gives a white matt surface that faces the light: short of paper white."""


class Source(Struct, frozen=True):
    """One source. `vector`: for `picture` the direction toward the light in (right, up, toward the viewer), for `sun`
    in the world, for `lamp` its place in mm. `strength`: lux, for a lamp candela."""

    kind: str
    vector: Point
    strength: float


class Sources(Struct, frozen=True):
    """A lighting, and the factor on its automatic exposure."""

    sources: tuple[Source, ...]
    exposure: float = 1.0


CORNERS: dict[str, Point] = {
    "upper left": (-1.0, 1.0, 1.0),
    "upper right": (1.0, 1.0, 1.0),
    "lower left": (-1.0, -1.0, 1.0),
    "lower right": (1.0, -1.0, 1.0),
    "left": (-1.0, 0.0, 1.0),
    "right": (1.0, 0.0, 1.0),
    "above": (0.0, 1.0, 1.0),
    "eye": (0.0, 0.0, 1.0),
}

DEFAULT = Sources((Source("picture", CORNERS["upper left"], KEY_LUX), Source("ambient", (0.0, 0.0, 0.0), AMBIENT_LUX)))
"""Light from the upper left front, 45 degrees in the picture, when nothing is said."""


def read_lighting(line: tree.Line, scope: Scope, problems: Problems) -> Sources:
    """The sources that a `lighting` declaration states."""
    sources: list[Source] = []
    exposure = 1.0
    before = problems.n_mistakes
    for each in line.lines:
        if each.head.row in LATER:
            continue
        with problems.collecting():
            if each.word == "exposure":
                exposure = _positive(expression(each.head, "exposure"), scope)
            else:
                sources.append(_source(each.head, scope))
    if not sources and problems.n_mistakes == before:
        hint = "such as `light from upper left`"
        problems.error("no-light", line.span, "this lighting has no source of light", hint)
    return Sources(tuple(sources), exposure)


def lights_for(sources: Sources, projection: contract.Projection, target: Point) -> contract.Lighting:
    """World-space lights for one view.

    The exposure makes white, facing the strongest light at `target`, equal `WHITE`.
    """
    lights: list[Light] = []
    for source in sources.sources:
        power = (source.strength,) * 3
        match source.kind:
            case "picture":
                lights.append(Light("directional", _in_world(source.vector, projection), power))
            case "sun":
                lights.append(Light("directional", source.vector, power))
            case "lamp":
                lights.append(Light("lamp", source.vector, power))
            case _:
                lights.append(Light("ambient", source.vector, power))
    return contract.Lighting(tuple(lights), sources.exposure * WHITE / _strongest(lights, target))


def _strongest(lights: list[Light], target: Point) -> float:
    """The greatest illuminance, in lux, on a surface at `target` that faces one of the lights."""
    ambient = sum(light.power[0] for light in lights if light.kind == "ambient")
    aimed: list[tuple[Point, float]] = []
    for light in lights:
        if light.kind == "directional":
            aimed.append((light.vector, light.power[0]))
        elif light.kind == "lamp":
            away = tuple(a - b for a, b in zip(light.vector, target, strict=True))
            distance = max(sum(each * each for each in away) ** 0.5, 1.0)
            x, y, z = (each / distance for each in away)
            aimed.append(((x, y, z), light.power[0] * (1000.0 / distance) ** 2))
    best = max((_facing(direction, aimed) for direction, _ in aimed), default=0.0)
    return max(ambient + best, 1e-9)


def _facing(normal: Point, aimed: list[tuple[Point, float]]) -> float:
    total = 0.0
    for direction, lux in aimed:
        total += lux * max(0.0, sum(a * b for a, b in zip(normal, direction, strict=True)))
    return total


def _in_world(vector: Point, projection: contract.Projection) -> Point:
    size = sum(each * each for each in vector) ** 0.5
    right, up, toward = (each / size for each in vector)
    x, y, z = (
        right * r + up * u - toward * s
        for r, u, s in zip(projection.right, projection.up, projection.sight, strict=True)
    )
    return (x, y, z)


def _source(reading: tree.Reading, scope: Scope) -> Source:
    match reading.word:
        case "light from":
            return Source("picture", CORNERS[word(reading, "corner")], _lux(reading, scope, KEY_LUX))
        case "sun":
            return _sun(reading, scope)
        case "lamp":
            flux = expression(reading, "flux")
            lumens = quantity(flux, scope, LUMINOUS_FLUX)
            if lumens <= 0:
                raise mistake("out-of-range", flux.span, f"expected a flux above 0, found {lumens:g} lm")
            # An even source spreads its flux over 4 pi steradians; the lux it gives at 1 m equal its candela.
            return Source("lamp", point(expression(reading, "point"), scope), lumens / (4 * pi))
    return Source("ambient", (0.0, 0.0, 0.0), _lux(reading, scope, AMBIENT_LUX))


def _sun(reading: tree.Reading, scope: Scope) -> Source:
    written = expression(reading, "elevation")
    elevation = quantity(written, scope, ANGLE)
    if not 0 < elevation <= 90:
        sentence = f"expected the sun between 0 and 90 deg above the horizon, found {elevation:g} deg"
        raise mistake("out-of-range", written.span, sentence)
    azimuth = quantity(expression(reading, "azimuth"), scope, ANGLE)
    level = cos_deg(elevation)
    toward = (level * sin_deg(azimuth), level * cos_deg(azimuth), sin_deg(elevation))
    return Source("sun", toward, _lux(reading, scope, SUN_LUX))


def _lux(reading: tree.Reading, scope: Scope, default: float) -> float:
    written = optional(reading, "illuminance")
    if written is None:
        return default
    lux = quantity(written, scope, ILLUMINANCE) * 1e6  # the base unit is lm/mm2
    if lux <= 0:
        raise mistake("out-of-range", written.span, f"expected an illuminance above 0, found {lux:g} lx")
    return lux


def _positive(written: tree.Expression, scope: Scope) -> float:
    value = quantity(written, scope, NUMBER)
    if value <= 0:
        raise mistake("out-of-range", written.span, f"expected a number above 0, found {value:g}")
    return value

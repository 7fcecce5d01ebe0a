"""Lighting: declared sources to world-space lights for one view, with a repeatable exposure."""

from __future__ import annotations

from collections.abc import Sequence
from math import asin, degrees, pi
from typing import TYPE_CHECKING

from msgspec import Struct, structs
from platewright.backend import contract
from platewright.backend.contract import F64, Light
from platewright.lang import tree
from platewright.lang.units import ANGLE, ILLUMINANCE, LATITUDE, LONGITUDE, LUMINOUS_FLUX, NUMBER

from .expressions import evaluate, quantity
from .materials import RGB, Surface
from .mistakes import Problems, mistake
from .placement import point
from .readings import LATER, expression, optional, word
from .scope import Scope
from .trigonometry import cos_deg, sin_deg
from .values import Day, Proportion

if TYPE_CHECKING:
    from .spectra import Tabled

Point = tuple[float, float, float]

KEY_LUX, AMBIENT_LUX = 1000.0, 600.0
"""Illuminance where none is stated: our own choice. That of the sun and of the sky follows from the sun's elevation."""

SURROUND = 1.65
"""By how much even light is brighter on what faces the upper left of the picture than on the average."""

UNSEEN_SUN = 45.0
"""Elevation in degrees of the sun that lights a clear sky where the lighting has no sun."""

WHITE = 0.82
"""Linear value that the automatic exposure gives a white matt surface that faces the light: short of paper white."""


class Source(Struct, frozen=True):
    """One source. `vector`: for `picture` the direction toward the light in (right, up, toward the viewer), for `sun`
    in the world, for `lamp` its place in mm. `strength`: lux, for a lamp candela. `spectrum`: relative, by nm from 360
    to 830; empty for white light. `haze`: the turbidity of the air that the sun shines through."""

    kind: str
    vector: Point
    strength: float
    spectrum: tuple[float, ...] = ()
    haze: float = 0.0


class Sources(Struct, frozen=True):
    """A lighting, the factor on its automatic exposure, and its white point in K, 0 where none is stated."""

    sources: tuple[Source, ...]
    exposure: float = 1.0
    white_point: float = 0.0

    @property
    def has_spectra(self) -> bool:
        """Whether any source has one."""
        return any(source.spectrum for source in self.sources)


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


def read_lighting(line: tree.Line, scope: Scope, tabled: Tabled, problems: Problems) -> Sources:
    """The sources that a `lighting` declaration states; `tabled` finds the table that a reading names."""
    sources: list[Source] = []
    exposure, white_point = 1.0, 0.0
    before = problems.n_mistakes
    skies: list[tuple[int, tree.Reading]] = []
    for each in line.lines:
        if each.head.row in LATER:
            continue
        with problems.collecting():
            match each.word:
                case "exposure":
                    exposure = _positive(expression(each.head, "exposure"), scope)
                case "white point":
                    from . import spectra

                    white_point = spectra.temperature(expression(each.head, "temperature"), scope)
                case "sky":
                    skies.append((len(sources), each.head))
                    sources.append(Source("sky", (0.0, 0.0, 0.0), 0.0))
                case _:
                    sources.append(_source(each.head, scope, tabled, problems))
    for row, reading in skies:
        with problems.collecting():
            sources[row] = _sky(reading, scope, sources)
    found = Sources(tuple(sources), exposure, white_point)
    if not sources and problems.n_mistakes == before:
        hint = "such as `light from upper left`"
        problems.error("no-light", line.span, "this lighting has no source of light", hint)
    elif white_point and not found.has_spectra:
        (said,) = (each for each in line.lines if each.word == "white point")
        sentence = "every source of this lighting is white, so a white point changes nothing"
        problems.warn("no-effect", said.span, sentence, "give a lamp its `temperature`, or leave the white point out")
    return found


def lights_for(sources: Sources, projection: contract.Projection, target: Point) -> contract.Lighting:
    """World-space lights for one view.

    The exposure makes white, facing the strongest light at `target`, equal `WHITE` in its brightest channel.
    """
    lights: list[Light] = []
    for source, colour in zip(sources.sources, _colours(sources), strict=True):
        red, green, blue = (_steady(source.strength * each) for each in colour)
        power = (red, green, blue) if source.spectrum else (source.strength,) * 3
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


def paired(sheet: contract.Sheet, sources: Sources, surfaces: Sequence[Surface]) -> contract.Sheet:
    """A sheet whose panels know what each surface, a row of the job's materials, sends back of each source."""
    if not sources.has_spectra:
        return sheet
    from . import spectra

    lights = [(source.spectrum, source.strength) for source in sources.sources]
    return spectra.with_pairs(sheet, lights, _white(sources), surfaces)


def _colours(sources: Sources) -> list[RGB]:
    """Linear RGB of each source at luminance 1."""
    if not sources.has_spectra:
        return [(1.0, 1.0, 1.0)] * len(sources.sources)
    from . import spectra

    to_rgb = _white(sources)
    return [spectra.colour_of(source.spectrum, to_rgb) for source in sources.sources]


def _steady(value: float) -> float:
    """A value without the last digits, in which sums over a spectrum differ between processors."""
    return float(f"{value:.7g}")


def _white(sources: Sources) -> F64:
    from . import spectra

    return spectra.white_matrix(sources.white_point, any(each.kind == "sun" for each in sources.sources))


def _strongest(lights: list[Light], target: Point) -> float:
    """The greatest illuminance in lux, of any channel, on a surface at `target` that faces one of the lights."""
    return max(_strongest_in(channel, lights, target) for channel in range(3))


def _strongest_in(channel: int, lights: list[Light], target: Point) -> float:
    ambient = sum(light.power[channel] for light in lights if light.kind == "ambient")
    aimed: list[tuple[Point, float]] = []
    for light in lights:
        if light.kind == "directional":
            aimed.append((light.vector, light.power[channel]))
        elif light.kind == "lamp":
            away = tuple(a - b for a, b in zip(light.vector, target, strict=True))
            distance = max(sum(each * each for each in away) ** 0.5, 1.0)
            x, y, z = (each / distance for each in away)
            aimed.append(((x, y, z), light.power[channel] * (1000.0 / distance) ** 2))
    if not aimed:
        return max(ambient * SURROUND, 1e-9)
    return max(ambient + max(_facing(direction, aimed) for direction, _ in aimed), 1e-9)


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


def _source(reading: tree.Reading, scope: Scope, tabled: Tabled, problems: Problems) -> Source:
    match reading.word:
        case "sun":
            return _sun(reading, scope)
        case "sun on":
            return _sun_on(reading, scope)
        case "light from":
            source = Source("picture", CORNERS[word(reading, "corner")], _lux(reading, scope, KEY_LUX))
        case "lamp":
            flux = expression(reading, "flux")
            lumens = quantity(flux, scope, LUMINOUS_FLUX)
            if lumens <= 0:
                raise mistake("out-of-range", flux.span, f"expected a flux above 0, found {lumens:g} lm")
            # An even source spreads its flux over 4 pi steradians; the lux it gives at 1 m equal its candela.
            source = Source("lamp", point(expression(reading, "point"), scope), lumens / (4 * pi))
        case _:
            source = Source("ambient", (0.0, 0.0, 0.0), _lux(reading, scope, AMBIENT_LUX))
    if all(reading.get(slot) is None for slot in ("temperature", "illuminant", "table")):
        return source
    from . import spectra  # loads tables and what reads them, which few scenes need

    return structs.replace(source, spectrum=spectra.radiated(reading, scope, tabled, problems))


def _sun(reading: tree.Reading, scope: Scope) -> Source:
    written = expression(reading, "elevation")
    elevation = quantity(written, scope, ANGLE)
    if not 0 < elevation <= 90:
        sentence = f"expected the sun between 0 and 90 deg above the horizon, found {elevation:g} deg"
        raise mistake("out-of-range", written.span, sentence)
    return _shining(reading, scope, elevation, quantity(expression(reading, "azimuth"), scope, ANGLE))


def _sun_on(reading: tree.Reading, scope: Scope) -> Source:
    from platewright.backend.spectra import sun

    day, clock = evaluate(expression(reading, "date"), scope), expression(reading, "clock")
    time = evaluate(clock, scope)
    if not isinstance(day, Day):
        raise mistake("wrong-kind", expression(reading, "date").span, "expected a date like `2026-06-21`")
    if not isinstance(time, Proportion) or not (0 <= time.first < 24 and 0 <= time.second < 60):
        raise mistake("out-of-range", clock.span, "expected a time of day in UTC from 0:00 to 23:59")
    north = quantity(expression(reading, "latitude"), scope, LATITUDE)
    east = quantity(expression(reading, "longitude"), scope, LONGITUDE)
    if abs(north) > 90 or abs(east) > 180:
        sentence = "a latitude lies between 90 degS and 90 degN, a longitude between 180 degW and 180 degE"
        raise mistake("out-of-range", expression(reading, "latitude").span, sentence)
    year, month, number = (int(part) for part in day.text.split("-"))
    found = sun.sun_position(sun.julian_day(year, month, number, time.first + time.second / 60), north, east)
    if found.elevation <= 0:
        sentence = f"the sun stands {-found.elevation:.1f} deg below the horizon at that time"
        raise mistake("out-of-range", clock.span, sentence, "the time of day is UTC")
    return _shining(reading, scope, round(found.elevation, 6), round(found.azimuth, 6), found.distance)


def _shining(reading: tree.Reading, scope: Scope, elevation: float, azimuth: float, distance: float = 1.0) -> Source:
    """The sun at a place in the sky, in degrees, as the air lets it through."""
    from . import spectra

    haze = spectra.turbidity(reading, scope)
    light = spectra.sunshine(elevation, haze, distance)
    level = cos_deg(elevation)
    toward = (level * sin_deg(azimuth), level * cos_deg(azimuth), sin_deg(elevation))
    return Source("sun", toward, _lux(reading, scope, light.lux), light.spectrum, haze)


def _sky(reading: tree.Reading, scope: Scope, sources: Sequence[Source]) -> Source:
    """The sky that goes with the first sun of a lighting."""
    from . import spectra

    suns = [source for source in sources if source.kind == "sun"]
    elevation = degrees(asin(min(1.0, suns[0].vector[2]))) if suns else UNSEEN_SUN
    light = spectra.skylight(word(reading, "state") == "clear", elevation, suns[0].haze if suns else spectra.CLEAR)
    return Source("sky", (0.0, 0.0, 0.0), _lux(reading, scope, light.lux), light.spectrum)


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

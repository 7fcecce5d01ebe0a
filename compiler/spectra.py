"""Spectra in a scene: what sources radiate, what surfaces reflect, and the colours that both have together.

White is what the lighting's white point says; without one daylight of 5 500 K where the sun shines, as daylight
photographs are balanced (ISO 7589), else D65. A source of which no spectrum is stated shines white. Colours
outside the gamut move toward the grey of their luminance (`backend.spectra.tristimulus`).
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from msgspec import Struct
from platewright.backend import contract
from platewright.backend.contract import F64
from platewright.backend.spectra import air, grid, illuminants, optics, sky, tristimulus, upsampling
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.units import NUMBER, TEMPERATURE, WAVELENGTH

from .expressions import quantity, text
from .materials import RGB, Surface, linear
from .mistakes import Problems, mistake
from .readings import optional
from .scope import Scope, did_you_mean
from .tables import Table
from .values import Quantity, shortened

Spectrum = tuple[float, ...]
"""One value for every nanometre of `backend.spectra.grid`; none where no spectrum is stated."""

Tabled = Callable[[tree.Reading], Table]

COLDEST, HOTTEST = 1000.0, 25000.0
CLEAR, MOST_TURBID = 3.0, 10.0
OVERCAST_LUX = 10_000.0
"""Illuminance under an overcast sky where none is stated: common practice for a bright one."""


class Radiation(Struct, frozen=True):
    """What a source sends out: a relative spectrum, and the lux it gives by itself."""

    spectrum: Spectrum
    lux: float


def tabulated(table: Table, is_share: bool, problems: Problems) -> Spectrum:
    """The spectrum in a table of wavelengths and values, or none after reporting what is wrong with it."""
    at, values = (_numbers(table, number, unit) for number, unit in enumerate((WAVELENGTH, NUMBER)))
    faults = grid.faults_of(at, values, is_share)
    for fault in faults:
        span = table.cell_spans[fault.row][0] if fault.row < len(table.cell_spans) else table.header[0]
        if fault.is_error:
            problems.error("bad-table", span, fault.sentence, fault.hint)
        else:
            problems.warn("coarse-spectrum", span, fault.sentence, fault.hint)
    return () if any(fault.is_error for fault in faults) else _frozen(grid.on_grid(at, values))


def _numbers(table: Table, number: int, dimension: object) -> F64:
    """One of the two columns. Raises Mistake."""
    hint = "such as `wavelength nm,reflectance`"
    if len(table.columns) != 2:
        sentence = f"expected a column of wavelengths and one of values, found {len(table.columns)} columns"
        raise mistake("bad-table", table.header[0].to(table.header[-1]), sentence, hint)
    found: list[float] = []
    for row, spans in zip(table.rows, table.cell_spans, strict=True):
        value = row[number]
        if value is None:
            raise mistake("bad-table", spans[number], "this cell is empty", "fill it, or leave the row out")
        if not isinstance(value, Quantity) or value.dimension != dimension:
            sentence = "this column holds no wavelengths" if number == 0 else "this column holds no plain numbers"
            raise mistake("bad-table", table.header[number], sentence, hint)
        found.append(value.value)
    return np.array(found, np.float64)


def radiated(reading: tree.Reading, scope: Scope, tabled: Tabled, problems: Problems) -> Spectrum:
    """The relative spectrum that a lamp's colour temperature, illuminant or table states; none where it has none."""
    written = optional(reading, "temperature")
    if written is not None:
        return _frozen(illuminants.reference(temperature(written, scope)))
    written = optional(reading, "illuminant")
    if written is not None:
        name = text(written, scope)
        if name not in illuminants.names():
            hint = did_you_mean(nearest(name, illuminants.names())) or "it knows A, D50, D65, E, FL2, FL11, LED-B3 …"
            raise mistake("unknown-name", written.span, f'no illuminant is called "{shortened(name)}"', hint)
        return _frozen(illuminants.illuminant(name))
    return tabulated(tabled(reading), False, problems) if reading.get("table") is not None else ()


def temperature(written: tree.Expression, scope: Scope) -> float:
    """A colour temperature in K. Raises Mistake where no light has it."""
    kelvin = quantity(written, scope, TEMPERATURE)
    if not COLDEST <= kelvin <= HOTTEST:
        sentence = f"expected a colour temperature from {COLDEST:g} K to {HOTTEST:g} K, found {kelvin:g} K"
        raise mistake("out-of-range", written.span, sentence)
    return kelvin


def turbidity(reading: tree.Reading, scope: Scope) -> float:
    """The turbidity of the air: 2 very clear, 3 clear, 10 thick haze."""
    written = optional(reading, "turbidity")
    value = CLEAR if written is None else quantity(written, scope, NUMBER)
    if written is not None and not sky.CLEAR_FROM <= value <= MOST_TURBID:
        raise mistake("out-of-range", written.span, f"expected a turbidity from 2 to 10, found {value:g}")
    return value


def sunshine(elevation: float, haze: float, distance: float = 1.0) -> Radiation:
    """Direct light of the sun at an elevation in degrees as it is seen, through air of a turbidity."""
    light = air.direct_sunlight(air.air_of(haze), elevation, distance)
    return Radiation(_frozen(light), tristimulus.illuminance_of(light, tristimulus.observer()))


def skylight(is_clear: bool, elevation: float, haze: float) -> Radiation:
    """Light of the whole sky without the sun: a clear one by the sun's elevation, an overcast one like D65."""
    if not is_clear:
        return Radiation(_frozen(illuminants.illuminant("D65")), OVERCAST_LUX)
    light = air.diffuse_skylight(air.air_of(haze), elevation)
    return Radiation(_frozen(light), tristimulus.illuminance_of(light, tristimulus.observer()))


def white_matrix(white_point: float, has_sun: bool) -> F64:
    """The matrix from tristimulus values to linear RGB in which white is (1, 1, 1); a white point of 0 is unstated."""
    if white_point:
        white = illuminants.reference(white_point)
    else:
        white = illuminants.illuminant("D55" if has_sun else "D65")
    return tristimulus.rgb_under(white @ tristimulus.observer())


def colour_of(spectrum: Spectrum, to_rgb: F64) -> RGB:
    """Linear RGB of a source at luminance 1."""
    if not spectrum:
        return 1.0, 1.0, 1.0
    seen = tristimulus.source_colour(np.array(spectrum), tristimulus.observer(), to_rgb)
    red, green, blue = tristimulus.into_gamut(seen).tolist()
    return red, green, blue


def daylight_colour(spectrum: Spectrum) -> RGB:
    """Linear RGB of a surface under D65, no channel outside 0 .. 1."""
    matching, source = tristimulus.observer(), illuminants.illuminant("D65")
    to_rgb = tristimulus.rgb_under(source @ matching)
    seen = tristimulus.pair_colour(source, np.array(spectrum), matching, to_rgb)
    red, green, blue = tristimulus.into_gamut(seen, 1.0).tolist()
    return red, green, blue


def with_pairs(
    sheet: contract.Sheet, lights: Sequence[tuple[Spectrum, float]], to_rgb: F64, surfaces: Sequence[Surface]
) -> contract.Sheet:
    """A sheet whose panels in tone know the colour of every pair of a light and a surface.

    `lights` are spectra and strengths in the order of the panels' lights. Cost: a fit for each colour without spectrum.
    """
    if not any(spectrum for spectrum, _ in lights):
        return sheet
    matching = tristimulus.observer()
    colours = {each.colour for each in surfaces if not each.is_metal and not each.spectrum}
    fitted = {each: upsampling.reflectance_of(linear(each), matching) for each in sorted(colours)}
    even, gloss = np.zeros((2, len(surfaces), grid.N))
    for row, surface in enumerate(surfaces):
        if surface.metal:
            gloss[row] = optics.normal_reflectance(optics.metal_index(surface.metal))
        else:
            even[row] = np.array(surface.spectrum) if surface.spectrum else fitted[surface.colour]
            gloss[row] = surface.reflectance[0]
    rows: list[tuple[contract.Pair, ...]] = []
    for spectrum, strength in lights:
        if spectrum:
            seen = tristimulus.pair_colours(np.array(spectrum)[None], np.concatenate([even, gloss]), matching, to_rgb)
            answers = np.hstack(np.split(tristimulus.into_gamut(seen[0]), 2))
        else:
            answers = np.array([_in_three_channels(surface) for surface in surfaces])
        rows.append(tuple(_pair(row) for row in (strength * answers).tolist()))
    pairs = tuple(rows)
    panels = tuple(
        replace(panel, lighting=replace(panel.lighting, pairs=pairs)) if "tone" in panel.style.drawn_as else panel
        for panel in sheet.panels
    )
    return replace(sheet, panels=panels)


def _in_three_channels(surface: Surface) -> contract.Pair:
    colour = (0.0, 0.0, 0.0) if surface.is_metal else linear(surface.colour)
    return (*colour, *surface.reflectance)


def _pair(row: list[float]) -> contract.Pair:
    a, b, c, d, e, f = row
    return a, b, c, d, e, f


def _frozen(spectrum: F64) -> Spectrum:
    return tuple(spectrum.tolist())

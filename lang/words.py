"""The vocabulary: one row a word, with where it may stand, what it takes, one sentence and one example.

A pattern reads `turn <by:angle> [about <axis:axis>]`: words stand for themselves, `<slot:kind>` for one value,
`[...]` for what may be left out, `{A / B}` for alternatives, `<slot:a|b c>` for one of the words given.
Parsing, messages, the reference, and later completion and highlighting all read this table.

A *context* is the name of a place where lines or clauses may start. `stands` lists a row's contexts, `lines` is the
context of the lines indented under it, `clauses` are the contexts whose clauses may follow it. The rows stand in
rows_model.py and rows_page.py.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from msgspec import Struct

from .row import Row as Row
from .rows_model import (
    ASSEMBLY_ROWS,
    CURVE_ROWS,
    DECLARATION_ROWS,
    MATERIAL_ROWS,
    PART_ROWS,
    PLACING_ROWS,
    SHAPE_ROWS,
)
from .rows_page import PAGE_ROWS

ROWS: tuple[Row, ...] = (
    *DECLARATION_ROWS,
    *MATERIAL_ROWS,
    *CURVE_ROWS,
    *PART_ROWS,
    *SHAPE_ROWS,
    *PLACING_ROWS,
    *ASSEMBLY_ROWS,
    *PAGE_ROWS,
)

CONSTANTS: tuple[str, ...] = ("pi",)

SHAPE_WORDS: frozenset[str] = frozenset(
    row.pattern.split()[0] for row in ROWS if "shape" in row.stands and not row.pattern.startswith("<")
)

# What people call a shape in everyday speech, and the word of the language for it.
EVERYDAY_SHAPES: Mapping[str, str] = MappingProxyType(
    {
        "ball": "sphere",
        "box": "block",
        "brick": "block",
        "coil": "spring",
        "cube": "block",
        "cuboid": "block",
        "disc": "cylinder",
        "disk": "cylinder",
        "helix": "spring",
        "pipe": "tube",
        "ramp": "wedge",
        "rod": "cylinder",
    }
)

STANDARD_VIEWPOINTS: tuple[str, ...] = (
    *("front", "rear", "left", "right", "top", "bottom"),
    *("isometric", "dimetric", "trimetric", "cavalier", "cabinet", "planometric"),
)

# What a slot of each kind takes, for messages and the reference.
KINDS: Mapping[str, str] = MappingProxyType(
    {
        "any": "a value",
        "angle": "an angle like `30 deg`",
        "axis": "an axis: `x`, `y`, `z`, a mark or a direction `(x, y, z)`",
        "clock": "a time of day like `12:30`",
        "colour": 'a colour like `"#d8dcd2"`',
        "count": "a whole number",
        "date": "a date like `2026-06-21`",
        "density": "a density like `8.5 g/cm3`",
        "direction": "a direction: `(x, y, z)`, an axis or a mark",
        "flux": "a luminous flux like `800 lm`",
        "illuminance": "an illuminance like `500 lx`",
        "latitude": "a latitude like `52.5 degN`",
        "length": "a length like `12 mm`",
        "list": "values joined by commas",
        "longitude": "a longitude like `13.4 degE`",
        "luminance": "a luminance like `5000 cd/m2`",
        "names": "names joined by commas",
        "new": "a new name",
        "number": "a number like `0.5` or `60 %`",
        "path": "a name or a path like `gauge.funnel`",
        "point": "a point `(x, y, z)`",
        "point2": "a point of the plane, `(x, y)`",
        "range": "a range like `1 mm .. 5 mm`",
        "ratio": "a scale like `1:2`",
        "settings": "settings like `rim = 160 mm`",
        "shape": "a shape or a part",
        "signature": "a new name, or one with parameters, `screw(d = 4 mm)`",
        "temperature": "a temperature like `5600 K`",
        "text": "a text in double quotes",
        "thing": "a name, perhaps with values for its parameters",
        "time": "a time like `2 s`",
        "truth": "a condition, `yes` or `no`",
        "vector": "a vector `(x, y, z)`",
    }
)

# Where lines and clauses stand, for messages and the reference.
PLACES: Mapping[str, str] = MappingProxyType(
    {
        "scene": "at the top of a file",
        "given": "under `given`",
        "derived": "under `derived`",
        "material": "in a material",
        "outline": "in an outline",
        "hole": "under `hole`",
        "path": "in a path",
        "part": "in a part",
        "group": "under `add`, `cut` or `keep`",
        "shape": "behind `add`, `cut` or `keep`",
        "assembly": "in an assembly",
        "placing": "behind a shape or a placed thing",
        "repeating": "behind a shape or a placed thing",
        "feature": "behind `add` or `cut`",
        "corner": "behind a point of an outline",
        "edges": "behind a shape",
        "step": "in a step of a sequence",
        "texts": "under `language` in a wording",
        "placed": "behind `place`",
        "lighting": "in a lighting",
        "viewpoint": "in a viewpoint",
        "figure": "in a figure",
        "sequence": "in a sequence",
        "variants": "under `variants`",
        "wording": "in a wording",
        "receiver": "in a receiver",
        "expect": "under `expect`",
    }
)


class Function(Struct, frozen=True):
    """A function that expressions may call, with its arguments and result as people read them.

    `place` is `"values"` for those that stand everywhere, `"facts"` for measures, which stand under `expect` alone.
    """

    name: str
    arguments: tuple[str, ...]
    result: str
    place: str
    sentence: str
    example: str


FUNCTIONS: tuple[Function, ...] = (
    Function("sin", ("angle",), "number", "values", "the sine of an angle", "sin(30 deg)"),
    Function("cos", ("angle",), "number", "values", "the cosine of an angle", "cos(60 deg)"),
    Function("tan", ("angle",), "number", "values", "the tangent of an angle", "tan(45 deg)"),
    Function("arcsin", ("number",), "angle", "values", "the angle from -90 to 90 deg with this sine", "arcsin(0.5)"),
    Function("arccos", ("number",), "angle", "values", "the angle from 0 to 180 deg with this cosine", "arccos(0.5)"),
    Function(
        "arctan",
        ("number",),
        "angle",
        "values",
        "the angle from -90 to 90 deg with this tangent; of a rise and a run, the angle round the full turn",
        "arctan(1)",
    ),
    Function("root", ("value",), "its root", "values", "the square root; of an area it is a length", "root(2)"),
    Function("abs", ("value",), "the same", "values", "the value without its sign", "abs(-3 mm)"),
    Function("min", ("value", "value", "..."), "the same", "values", "the least of two or more values", "min(2, 3)"),
    Function("max", ("value", "value", "..."), "the same", "values", "the greatest of two or more values", "max(2, 3)"),
    Function(
        "floor",
        ("number",),
        "number",
        "values",
        "the whole number at or below; with a step, the multiple of it",
        "floor(7 mm, 5 mm)",
    ),
    Function(
        "ceiling",
        ("number",),
        "number",
        "values",
        "the whole number at or above; with a step, the multiple of it",
        "ceiling(2.5)",
    ),
    Function(
        "round",
        ("number",),
        "number",
        "values",
        "the nearest whole number, halves to the even one; with a step, the multiple of it",
        "round(2.4)",
    ),
    Function("length", ("vector",), "length", "values", "the length of a vector", "length((3 mm, 4 mm, 0))"),
    Function(
        "distance", ("thing", "thing"), "length", "facts", "between two marks, features or parts", "distance(a, b)"
    ),
    Function("clearance", ("thing", "thing"), "length", "facts", "the least gap between two parts", "clearance(a, b)"),
    Function("width", ("thing",), "length", "facts", "the size along x of the box round a thing", "width(a)"),
    Function("depth", ("thing",), "length", "facts", "the size along y of the box round a thing", "depth(a)"),
    Function("height", ("thing",), "length", "facts", "the size along z of the box round a thing", "height(a)"),
    Function("volume", ("thing",), "volume", "facts", "how much space a thing fills", "volume(a)"),
    Function("area", ("thing",), "area", "facts", "the area of a thing's whole surface", "area(a)"),
    Function("mass", ("thing",), "mass", "facts", "volume times the density of the material", "mass(a)"),
    Function(
        "visible", ("thing", "figure"), "number", "facts", "the part of a thing's view left unhidden", "visible(a, f)"
    ),
)

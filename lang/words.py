"""The vocabulary: one row a word, with where it may stand, what it takes, one sentence and one example.

A pattern reads `turn <by:angle> [about <axis:axis>]`: words stand for themselves, `<slot:kind>` for one value,
`[...]` for what may be left out, `{A / B}` for alternatives, `<slot:a|b c>` for one of the words given.
Parsing, messages, the reference, and later completion and highlighting all read this table.

A *context* is the name of a place where lines or clauses may start. `stands` lists a row's contexts, `lines` is the
context of the lines indented under it, `clauses` are the contexts whose clauses may follow it.
A row with `later` is read in full and then reported as not drawn yet.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType


@dataclass(frozen=True, slots=True)
class Row:
    """One word of the language."""

    key: str
    pattern: str
    stands: tuple[str, ...]
    sentence: str
    example: str = ""
    clauses: tuple[str, ...] = ()
    lines: str = ""
    later: bool = False


PLACED = ("placing", "repeating")

ROWS: tuple[Row, ...] = (
    # --- declarations
    Row("platewright", "platewright <version:count>", ("scene",), "states the version of the language"),
    Row(
        "see",
        "see <file:text> as <prefix:new>",
        ("scene",),
        "brings names from another file of the project, under a prefix",
    ),
    Row("given", "given", ("scene",), "declares parameters that can be set from outside", lines="given"),
    Row(
        "given setting",
        "<name:new> = <default:any> [range <range:range>] [one of <choices:list>]",
        ("given",),
        "one parameter: its default and what it may be",
    ),
    Row(
        "derived",
        "derived",
        ("scene", "part", "assembly", "outline"),
        "declares values and functions computed from others",
        lines="derived",
    ),
    Row(
        "derived value", "<name:signature> = <value:any>", ("derived",), "one value, or one function of its parameters"
    ),
    Row("material", "material <name:new>", ("scene",), "declares how a surface answers light", lines="material"),
    Row("outline", "outline <name:signature>", ("scene",), "declares a closed plane curve with holes", lines="outline"),
    Row("path", "path <name:signature>", ("scene",), "declares a curve in space", lines="path", later=True),
    Row("part", "part <name:signature>", ("scene",), "declares one solid of one material", lines="part"),
    Row(
        "assembly",
        "assembly <name:signature>",
        ("scene",),
        "declares a tree of placed parts and assemblies",
        lines="assembly",
    ),
    Row("lighting", "lighting <name:new>", ("scene",), "declares sources of light", lines="lighting"),
    Row(
        "viewpoint",
        "viewpoint <name:new>",
        ("scene",),
        "declares a projection and where it is taken from",
        lines="viewpoint",
    ),
    Row("figure", "figure <name:new>", ("scene",), "declares one deliverable", lines="figure"),
    Row(
        "sequence",
        "sequence <name:new>",
        ("scene",),
        "declares a run of figures over one model",
        lines="sequence",
        later=True,
    ),
    Row(
        "variants",
        "variants <name:new> [over <table:text>]",
        ("scene",),
        "names settings of the parameters",
        lines="variants",
    ),
    Row("variant", "<name:new> [<settings:settings>]", ("variants",), "one variant and what it sets"),
    Row(
        "wording",
        "wording <name:new> [over <table:text>]",
        ("scene",),
        "declares texts by key and language",
        lines="wording",
        later=True,
    ),
    Row(
        "receiver",
        "receiver <name:new>",
        ("scene",),
        "declares what the one who receives figures demands",
        lines="receiver",
        later=True,
    ),
    Row("expect", "expect <subject:path>", ("scene",), "states facts that must hold", lines="expect"),
    Row("fact", "<measure:any> [= <value:any>] [within <tolerance:any>]", ("expect",), "one measure compared"),
    # --- material
    Row("colour", "colour <colour:colour>", ("material",), "the colour under daylight, as #rrggbb"),
    Row(
        "metal",
        "metal <metal:aluminium|chromium|copper|copper_zinc|gold|iron|nickel|silver|titanium>",
        ("material",),
        "a bare metal surface, by its chemical name",
    ),
    Row("gloss", "gloss <gloss:number>", ("material",), "from 0 %, matt, to 100 %, a mirror"),
    Row("density", "density <density:density>", ("material",), "mass by volume"),
    Row(
        "glass",
        "glass <index:number> [tint <colour:colour> at <thickness:length>]",
        ("material",),
        "a clear body by refractive index",
        later=True,
    ),
    Row("reflectance", "reflectance over <table:text>", ("material",), "the reflectance by wavelength", later=True),
    Row("tint", "tint <tint:number>", ("material",), "the grey of the drawing class", later=True),
    Row("hatch", "hatch <hatch:any>", ("material",), "the hatch of the drawing class", later=True),
    # --- outline
    Row("from", "from <point:point2>", ("outline", "hole"), "where an outline starts"),
    Row("to", "to <point:point2>", ("outline", "hole"), "a straight stretch"),
    Row(
        "round to",
        "round to <point:point2> {radius <radius:length> <side:left|right> / through <through:point2>}",
        ("outline", "hole"),
        "a circular stretch: turning left or right, or through a point",
    ),
    Row(
        "circle",
        "circle diameter <diameter:length> [at <centre:point2>]",
        ("outline", "hole"),
        "a full circle as the whole loop",
    ),
    Row("hole", "hole", ("outline",), "a hole in the outline, its loop on the lines below", lines="hole"),
    Row(
        "curve through",
        "curve through <points:list>",
        ("outline", "hole", "path"),
        "a smooth stretch through points",
        later=True,
    ),
    Row("points over", "points over <table:text>", ("outline", "hole", "path"), "points from a table", later=True),
    # --- part
    Row("made of", "made of <material:path>", ("part",), "the material of the part"),
    Row(
        "add",
        "add [<shape:shape>]",
        ("part",),
        "joins a shape, or the shapes on the lines below",
        clauses=("placing", "repeating", "feature"),
        lines="group",
    ),
    Row(
        "cut",
        "cut [<shape:shape>]",
        ("part",),
        "takes a shape away",
        clauses=("placing", "repeating", "feature"),
        lines="group",
    ),
    Row(
        "keep",
        "keep [<shape:shape>]",
        ("part",),
        "keeps only what lies inside a shape",
        clauses=("placing", "repeating", "feature"),
        lines="group",
    ),
    Row(
        "grouped shape",
        "<shape:shape>",
        ("group",),
        "one of several shapes that act together",
        clauses=("placing", "repeating", "feature"),
    ),
    Row(
        "mark",
        "mark <name:new> at <point:point> [along <axis:direction>]",
        ("part", "assembly"),
        "names a point or an axis",
    ),
    # --- shapes
    Row("block", "block <size:point>", ("shape",), "a box by its sides along x, y and z"),
    Row("wedge", "wedge <size:point> [top <top:length>]", ("shape",), "a box whose +x side slopes to a shorter top"),
    Row(
        "cylinder",
        "cylinder diameter <diameter:length> length <length:length>",
        ("shape",),
        "a right circular cylinder",
    ),
    Row(
        "cone",
        "cone diameter <diameter:length> [top <top:length>] length <length:length>",
        ("shape",),
        "a right circular cone, truncated where a top diameter is given",
    ),
    Row("sphere", "sphere diameter <diameter:length>", ("shape",), "a ball"),
    Row("ellipsoid", "ellipsoid <axes:point>", ("shape",), "an ellipsoid by its full axes"),
    Row(
        "torus",
        "torus diameter <diameter:length> tube <tube:length>",
        ("shape",),
        "a ring by the diameter of its centre circle and of its tube",
    ),
    Row(
        "prism",
        "prism sides <sides:count> across <across:length> length <length:length>",
        ("shape",),
        "a regular prism by its width across flats",
    ),
    Row(
        "pyramid",
        "pyramid sides <sides:count> across <across:length> [top <top:length>] length <length:length>",
        ("shape",),
        "a regular pyramid, truncated where a top width is given",
    ),
    Row("extrude", "extrude <outline:thing> by <length:length>", ("shape",), "an outline drawn up along z"),
    Row("revolve", "revolve <outline:thing>", ("shape",), "an outline turned about z"),
    Row("solid", "<part:thing>", ("shape",), "another part"),
    # --- placing and repeating
    Row("at", "at <point:point>", ("placing",), "moves the thing's origin to a point"),
    Row(
        "turn", "turn <by:angle> [about <axis:axis>]", ("placing",), "turns the thing about an axis through its origin"
    ),
    Row("facing", "facing <direction:direction>", ("placing",), "tips the thing's z axis toward a direction"),
    Row("mirrored across", "mirrored across <axis:x|y|z>", ("placing",), "mirrors the thing"),
    Row("scaled", "scaled <by:number>", ("placing",), "enlarges the thing"),
    Row("centred", "centred", ("placing",), "puts the middle of the shape's height at the origin"),
    Row("ring", "ring <count:count> [about <axis:axis>] [over <over:angle>]", ("repeating",), "copies around an axis"),
    Row("row", "row <count:count> by <step:vector>", ("repeating",), "copies along a vector"),
    Row(
        "for",
        "for <variable:new> {from <first:count> to <last:count> / over <table:text>}",
        ("repeating",),
        "one copy for each number or table row",
    ),
    Row("when", "when <condition:truth>", ("repeating",), "keeps the line only where a condition holds"),
    Row("as", "as <name:new>", ("feature", "placed"), "names what the line makes"),
    # --- assembly
    Row(
        "place",
        "place <thing:thing>",
        ("assembly",),
        "places a part or an assembly",
        clauses=("placing", "repeating", "placed"),
    ),
    Row("explodes", "explodes <by:any>", ("placed",), "how far it moves in an exploded view"),
    # --- lighting
    Row(
        "light from",
        "light from <corner:upper left|upper right|lower left|lower right|left|right|above|eye> [illuminance <illuminance:illuminance>]",
        ("lighting",),
        "a distant light that keeps its place in the picture",
    ),
    Row(
        "sun",
        "sun elevation <elevation:angle> azimuth <azimuth:angle> [illuminance <illuminance:illuminance>]",
        ("lighting",),
        "the sun; azimuth clockwise from north, which is +y",
    ),
    Row(
        "sun on",
        "sun on <date:date> at <clock:clock> place <place:any>",
        ("lighting",),
        "the sun by date, time and place",
        later=True,
    ),
    Row("lamp", "lamp at <point:point> flux <flux:flux>", ("lighting",), "a small lamp that shines all round"),
    Row("ambient", "ambient <illuminance:illuminance>", ("lighting",), "even light from all round"),
    Row("exposure", "exposure <exposure:number>", ("lighting",), "replaces the automatic exposure's 1"),
    # --- viewpoint
    Row("eye", "eye <eye:point> toward <toward:point>", ("viewpoint",), "central projection from a point"),
    Row("lens", "lens <lens:length> [on <film:length>]", ("viewpoint",), "the focal length and the width of the film"),
    Row("angle of view", "angle of view <angle:angle>", ("viewpoint",), "the horizontal angle of view"),
    Row(
        "orthographic from",
        "orthographic from <side:front|rear|left|right|top|bottom>",
        ("viewpoint",),
        "a view square to one side",
    ),
    Row(
        "isometric from",
        "isometric from <side:front|rear> <hand:left|right> <height:above|below>",
        ("viewpoint",),
        "three axes equally foreshortened",
    ),
    Row(
        "parallel along",
        "parallel along <direction:direction>",
        ("viewpoint",),
        "parallel projection along any line of sight",
    ),
    # --- figure
    Row(
        "show",
        "show <subject:thing> [from <viewpoint:path>] [under <lighting:path>]",
        ("figure",),
        "what is shown, from where, in which light",
    ),
    Row(
        "width",
        "width <width:length> [at most <height:length>]",
        ("figure", "receiver"),
        "the width on paper; the height follows the content",
    ),
    Row("size", "size <width:length> by <height:length>", ("figure", "receiver"), "width and height on paper"),
    Row("scale", "scale {standard / <scale:ratio>}", ("figure",), "the scale along the axes"),
    Row("true projection", "true projection", ("figure",), "takes the scale as that of the projection itself"),
    Row("margin", "margin <margin:length>", ("figure",), "white paper round the content"),
    Row(
        "drawn as", "drawn as <style:tone|survey part|survey depth|survey facing>", ("figure",), "the manner of drawing"
    ),
    Row(
        "drawn as lines",
        "drawn as <style:lines|lines and tone|tints|stipple>",
        ("figure",),
        "drawing by lines",
        later=True,
    ),
    Row("with", "with <settings:settings>", ("figure",), "sets parameters for this figure"),
    Row("files", "files <files:names>", ("figure",), "the kinds of file wanted"),
    Row("title", "title <text:text>", ("figure",), "the figure's title"),
    Row("alt", "alt <text:text>", ("figure",), "the short text alternative"),
    Row("description", "description <text:text>", ("figure",), "the long text alternative"),
    Row("exploded", "exploded [<factor:number>]", ("figure",), "moves everything by its explodes", later=True),
    Row(
        "section across",
        "section across <plane:any> [at <at:any>] [keeping <keeping:any>]",
        ("figure",),
        "cuts the subject by a plane",
        later=True,
    ),
    Row("item", "item <number:count> <part:path>", ("figure",), "numbers a part", later=True),
    Row("items", "items", ("figure",), "numbers every part", later=True),
    Row("dimension", "dimension from <from:path> to <to:path>", ("figure",), "measures between two marks", later=True),
)

CONSTANTS: tuple[str, ...] = ("pi",)

SHAPE_WORDS: frozenset[str] = frozenset(
    row.pattern.split()[0] for row in ROWS if "shape" in row.stands and not row.pattern.startswith("<")
)

STANDARD_VIEWPOINTS: tuple[str, ...] = ("front", "rear", "left", "right", "top", "bottom", "isometric")

# What a slot of each kind takes, for messages and the reference.
KINDS: Mapping[str, str] = MappingProxyType(
    {
        "any": "a value",
        "angle": "an angle, such as `30 deg`",
        "axis": "an axis: `x`, `y`, `z`, a mark or a direction `(x, y, z)`",
        "clock": "a time of day, such as `12:30`",
        "colour": 'a colour, such as `"#d8dcd2"`',
        "count": "a whole number",
        "date": "a date, such as `2026-06-21`",
        "density": "a density, such as `8.5 g/cm3`",
        "direction": "a direction: `(x, y, z)`, an axis or a mark",
        "flux": "a luminous flux, such as `800 lm`",
        "illuminance": "an illuminance, such as `500 lx`",
        "latitude": "a latitude, such as `52.5 degN`",
        "length": "a length, such as `12 mm`",
        "list": "values joined by commas",
        "longitude": "a longitude, such as `13.4 degE`",
        "luminance": "a luminance, such as `5000 cd/m2`",
        "names": "names joined by commas",
        "new": "a new name",
        "number": "a number, such as `0.5` or `60 %`",
        "path": "a name or a path, such as `gauge.funnel`",
        "point": "a point `(x, y, z)`",
        "point2": "a point of the plane, `(x, y)`",
        "range": "a range, such as `1 mm .. 5 mm`",
        "ratio": "a scale, such as `1:2`",
        "settings": "settings, such as `rim = 160 mm`",
        "shape": "a shape or a part",
        "signature": "a new name, or one with parameters, `screw(d = 4 mm)`",
        "temperature": "a temperature, such as `5600 K`",
        "text": "a text in double quotes",
        "thing": "a name, perhaps with values for its parameters",
        "time": "a time, such as `2 s`",
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


@dataclass(frozen=True, slots=True)
class Function:
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
    Function("arctan", ("number",), "angle", "values", "the angle from -90 to 90 deg with this tangent", "arctan(1)"),
    Function("root", ("value",), "its root", "values", "the square root; of an area it is a length", "root(2)"),
    Function("abs", ("value",), "the same", "values", "the value without its sign", "abs(-3 mm)"),
    Function("min", ("value", "value", "..."), "the same", "values", "the least of two or more values", "min(2, 3)"),
    Function("max", ("value", "value", "..."), "the same", "values", "the greatest of two or more values", "max(2, 3)"),
    Function("floor", ("number",), "number", "values", "the whole number at or below", "floor(2.5)"),
    Function("ceiling", ("number",), "number", "values", "the whole number at or above", "ceiling(2.5)"),
    Function(
        "round", ("number",), "number", "values", "the nearest whole number; halves go to the even one", "round(2.4)"
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

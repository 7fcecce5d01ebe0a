"""Careless and hostile scenes: each gives located problems in good sentences, in bounded time, one for each mistake."""

from __future__ import annotations

import re
import time
from dataclasses import dataclass

import pytest
from platewright.lang.codes import CODES
from platewright.lang.problems import is_error
from support.scenes import Texts, checked

SECONDS = 10.0
"""No scene may take longer; on an idle core the slowest takes a tenth of that."""


@dataclass(frozen=True)
class Hostile:
    name: str
    text: str | bytes
    codes: tuple[str, ...]
    """Codes of the errors expected, in order: one for each mistake."""
    says: str = ""
    hints: str = ""
    files: Texts | None = None
    line: int | None = None


def _part(*lines: str) -> str:
    return "part p\n" + "".join(f"    {line}\n" for line in lines)


def _given(*lines: str) -> str:
    return "given\n" + "".join(f"    {line}\n" for line in lines)


BALL = _part("add sphere diameter 4 mm")
_DOUBLING = "assembly a0\n    place p row 2 by (5 mm, 0, 0)\n" + "".join(
    f"assembly a{k}\n    place a{k - 1} row 2 by ({2**k * 5 if k < 20 else 999} mm, 0, 0)\n" for k in range(1, 40)
)
_PARTS_DOUBLING = "part q0\n    add sphere diameter 4 mm\n" + "".join(
    f"part q{k}\n    add q{k - 1} row 2 by ({k} mm, 0, 0)\n" for k in range(1, 40)
)
_SEES = {f"f{k}.plate": f'see "f{k + 1}.plate" as a\nsee "f{k + 1}.plate" as b\n' for k in range(60)}
_SEES["f60.plate"] = BALL
_TEXT_DOUBLING = 'derived\n    t0 = "xxxxxxxxxx"\n' + "".join(
    f'    t{k} = "{{t{k - 1}}}{{t{k - 1}}}"\n' for k in range(1, 60)
)
_CALLS_DOUBLING = "derived\n    f0(x) = x\n" + "".join(
    f"    f{k}(x) = f{k - 1}(x) + f{k - 1}(x)\n" for k in range(1, 50)
)
_CHAIN = "derived\n" + "".join(f"    v{k} = v{k + 1} + 1\n" for k in range(300)) + "    v300 = 1\n"
_CIRCLE = "derived\n" + "".join(f"    v{k} = v{(k + 1) % 300} + 1\n" for k in range(300))
_NEST = "part q0\n    add sphere diameter 4 mm\n" + "".join(
    f"part q{k}\n    add q{k - 1} at (1 mm, 0, 0)\n" for k in range(1, 60)
)
_POWERS = "derived\n    d0 = 1 mm\n" + "".join(f"    d{k} = d{k - 1} ^ 9\n" for k in range(1, 40))

SCENES = [
    Hostile("empty", "", ()),
    Hostile("only comments", "# nothing\n", ()),
    Hostile("a billion copies", _part("add sphere diameter 4 mm ring 1000000000"), ("too-much",), "limit"),
    Hostile(
        "a billion by for",
        _part("add sphere diameter 4 mm at (i * 9 mm, 0, 0) for i from 1 to 1000000000"),
        ("too-much",),
        "limit",
    ),
    Hostile(
        "a billion by two fors",
        _part("add sphere diameter 4 mm at (i * 9 mm, j * 9 mm, 0) for i from 1 to 40000 for j from 1 to 40000"),
        ("too-much",),
        "limit",
    ),
    Hostile(
        "a billion by ring and row",
        _part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 30000 row 30000 by (0, 0, 9 mm)"),
        ("too-much",),
        "limit",
    ),
    Hostile(
        "many lines of many copies",
        "assembly a\n" + "".join(f"    place p as p{k} row 90000 by ({k + 1} mm, 0, 0)\n" for k in range(40)) + BALL,
        ("too-much",),
        "limit",
    ),
    Hostile(
        "many assemblies of many copies",
        BALL + "".join(f"assembly a{k}\n    place p row 90000 by ({k + 1} mm, 0, 0)\n" for k in range(40)),
        ("too-much",),
        "limit",
    ),
    Hostile("assemblies that double 40 times", BALL + _DOUBLING, ("too-much",), "limit"),
    Hostile("parts that double 40 times", _PARTS_DOUBLING, ("too-much",), "limit"),
    Hostile("a chain of 60 parts", _NEST, ("too-deep",), "limit"),
    Hostile("files that see each other 2^60 ways", 'see "f0.plate" as f\n' + BALL, (), files=_SEES),
    Hostile("an exponent bomb", _given("n = 1e999999999"), ("bad-number",), "power of ten", line=2),
    Hostile("a small exponent bomb", _given("n = 1e-999999999"), ("bad-number",), "power of ten", line=2),
    Hostile("an infinite number", _given("n = 1e400"), ("bad-number",), "power of ten", line=2),
    Hostile("an infinite length", _given("n = 9e300 km ^ 2"), ("out-of-range",), "too large", line=2),
    Hostile("a number below all floats", _given("n = 1e-400"), ("bad-number",), "power of ten", line=2),
    Hostile("a scale of bombs", BALL + "figure f\n    scale 1:1e99999999\n", ("unexpected-character",)),
    Hostile(
        "an exponent bomb in a table",
        'variants v over "t.csv"\n' + _given("n = 1") + _part("add sphere diameter n * 1 mm"),
        ("out-of-range",),
        "too large",
        files={"t.csv": "name,n\na,1e999999999\n"},
    ),
    Hostile("powers of powers", _given("n = 9 ^ 9 ^ 9"), ("out-of-range",), "too large", line=2),
    Hostile("a power under all floats", _given("n = 1 / 0.1 ^ -400"), ("out-of-range",), "too large", line=2),
    Hostile("dimensions without end", _POWERS, ("out-of-range",), "limit"),
    Hostile("texts that double", _TEXT_DOUBLING, ("too-much",), "100,000 characters"),
    Hostile("calls that double", _CALLS_DOUBLING + _given("n = f49(1)"), ("too-much",), "limit"),
    Hostile("a chain of 300 values in reverse order", _CHAIN + _given("n = v0"), ("unused",)[:0]),
    Hostile("a circle of 300 values", _CIRCLE, ("circular-value",), "needs itself"),
    Hostile("a circle of functions", "derived\n    ff(x) = gg(x)\n    gg(x) = ff(x)\n", ("circular-value",), "needs"),
    Hostile("a value that needs itself", "derived\n    a = a + 1\n", ("circular-value",), "`a` needs itself"),
    Hostile("a part in itself", _part("add p at (1 mm, 0, 0)"), ("recursion",), "cannot hold itself"),
    Hostile(
        "a part in itself with fewer",
        "part p(n = 5)\n    add sphere diameter 4 mm\n    add p(n - 1)\n",
        ("recursion",),
        "cannot hold itself",
    ),
    Hostile(
        "two assemblies in each other",
        "assembly a\n    place b\nassembly b\n    place a\n",
        ("recursion",),
        "cannot hold itself",
    ),
    Hostile("a file that sees itself", 'see "scene.plate" as me\n' + BALL, ("circular-see",), "sees itself"),
    Hostile(
        "a circle of files",
        'see "a.plate" as a\n' + BALL,
        ("circular-see",),
        "circle",
        files={"a.plate": 'see "b.plate" as b\n', "b.plate": 'see "scene.plate" as c\n'},
    ),
    Hostile(
        "a file that is not there",
        'see "nowhere.plate" as n\n' + _part("add n.ball", "cut n.pin"),
        ("no-such-file",),
        "there is no file `nowhere.plate`",
        line=1,
    ),
    Hostile(
        "a value of a file that is not there",
        'see "nowhere.plate" as n\n' + _part("add sphere diameter n.size"),
        ("no-such-file",),
    ),
    Hostile(
        "a function of a file that is not there",
        'see "nowhere.plate" as n\n' + _part("add sphere diameter n.size(1)"),
        ("no-such-file",),
    ),
    Hostile("a file outside", 'see "../../etc/passwd" as n\n' + BALL, ("no-such-file",), "outside the project"),
    Hostile("an absolute file", 'see "/etc/passwd" as n\n' + BALL, ("no-such-file",), "outside the project"),
    Hostile("a file with a computed name", 'see "{x}.plate" as n\n' + BALL, ("computed-file-name",), "written out"),
    Hostile(
        "a text that is not UTF-8",
        b"part p\n    # caf\xe9\n    add sphere diameter 4 mm\n",
        ("not-utf-8",),
        "byte 0xe9",
        "UTF-8",
        line=2,
    ),
    Hostile(
        "a seen file that is not UTF-8",
        'see "a.plate" as a\n' + _part("add a.b"),
        ("not-utf-8",),
        files={"a.plate": b"\xff\xfe"},
    ),
    Hostile("300 nested parentheses", _given("n = " + "(" * 300 + "1" + ")" * 300), ("nested-too-deep",), "limit"),
    Hostile(
        "100 operations within 45 parentheses",
        _given("n = " + "(" * 45 + "1" + ")" * 45 + " + 1" * 99),
        ("unused",)[:0],
    ),
    Hostile("calls within calls", _given("n = " + "abs(" * 45 + "-1" + ")" * 45), ("unused",)[:0]),
    Hostile(
        "functions through functions, 300 deep",
        "derived\n    f0(x) = x\n"
        + "".join(f"    f{k}(x) = f{k - 1}(x)\n" for k in range(1, 300))
        + _given("n = f299(1)"),
        ("too-deep",),
        "limit",
    ),
    Hostile("a division by zero", _given("n = 1 / (2 - 2)"), ("division-by-zero",), "divides by 0", line=2),
    Hostile("zero to a negative power", _given("n = 0 ^ -1"), ("division-by-zero",), "negative power"),
    Hostile("a root of a negative", _given("n = root(-1)"), ("wrong-parameters",), "no value below 0"),
    Hostile("a root of a length", _given("n = root(4 mm)"), ("wrong-parameters",), "no square"),
    Hostile("a negative number to a broken power", _given("n = (0 - 8) ^ 0.5"), ("out-of-range",), "whole power"),
    Hostile("millimetres and degrees", _given("n = 1 mm + 1 deg"), ("wrong-kind",), "a length and an angle"),
    Hostile("a latitude doubled", _given("n = 2 * (1 degN, 2 degN)"), ("wrong-kind",), "takes no part in arithmetic"),
    Hostile("negative zero sizes", _part("add cylinder diameter -0 mm length 4 mm"), ("out-of-range",), "more than 0"),
    Hostile("a zero block", _part("add block (4 mm, 0, 4 mm)"), ("out-of-range",), "along y"),
    Hostile("a negative block", _part("add block (4 mm, 4 mm, -1 mm)"), ("out-of-range",), "along z"),
    Hostile("an atom", _part("add sphere diameter 1e-9 mm"), ("out-of-range",), "limit"),
    Hostile("a planet", _part("add sphere diameter 13000 km"), ("out-of-range",), "limit"),
    Hostile(
        "a place beyond the moon", _part("add sphere diameter 4 mm at (400000 km, 0, 0)"), ("out-of-range",), "limit"
    ),
    Hostile(
        "scales upon scales",
        BALL + "assembly a\n    place p scaled 1e6\nassembly b\n    place a scaled 1e6\n",
        ("out-of-range",),
        "limit",
    ),
    Hostile(
        "scales under scales",
        BALL + "assembly a\n    place p scaled 1e-6\nassembly b\n    place a scaled 1e-6\n",
        ("out-of-range",),
        "limit",
    ),
    Hostile(
        "rows upon rows",
        BALL
        + "assembly a\n    place p row 2 by (900 km, 0, 0)\nassembly b\n    place a row 2 by (0, 900 km, 0)\n"
        + "assembly c\n    place b row 3 by (900 km, 0, 0)\n",
        ("out-of-range",),
        "limit",
    ),
    Hostile("scaled by zero", BALL + "assembly a\n    place p scaled 0\n", ("out-of-range",), "above 0"),
    Hostile(
        "scaled by less than zero",
        BALL + "assembly a\n    place p scaled -1\n",
        ("out-of-range",),
        "above 0",
        "mirrored across",
    ),
    Hostile("a prism of two sides", _part("add prism sides 2 across 4 mm length 4 mm"), ("out-of-range",), "3 or more"),
    Hostile(
        "a prism of two and a half sides",
        _part("add prism sides 3.5 across 4 mm length 4 mm"),
        ("not-whole",),
        "whole number",
    ),
    Hostile("half a copy", _part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 2.5"), ("not-whole",), "whole number"),
    Hostile("no copies", _part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 0"), ("out-of-range",), "1 or more"),
    Hostile(
        "a ring over too much",
        _part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 3 over 400 deg"),
        ("out-of-range",),
        "between 0 and 360",
    ),
    Hostile("a ring of itself", _part("add sphere diameter 4 mm ring 4"), ("coincident-copies",), "one place"),
    Hostile("a row without a step", _part("add sphere diameter 4 mm row 4 by (0, 0, 0)"), ("coincident-copies",)),
    Hostile(
        "a for that runs backward",
        _part("add sphere diameter 4 mm at (i * 1 mm, 0, 0) for i from 5 to 1"),
        ("out-of-range",),
        "upward",
    ),
    Hostile(
        "a ring about nothing",
        _part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 4 about (0, 0, 0)"),
        ("out-of-range",),
        "needs a length",
    ),
    Hostile("a torus through itself", _part("add torus diameter 4 mm tube 5 mm"), ("out-of-range",), "cut itself"),
    Hostile("a wedge that hangs over", _part("add wedge (4 mm, 4 mm, 4 mm) top 5 mm"), ("out-of-range",), "top"),
    Hostile("an empty part", "part p\n", ("empty-part",), "adds nothing"),
    Hostile("a part that only cuts", _part("cut sphere diameter 4 mm"), ("empty-part",), "begins with `add`"),
    Hostile(
        "a part whose condition never holds", _part("add sphere diameter 4 mm when no"), ("empty-part",), "adds nothing"
    ),
    Hostile("an empty assembly", BALL + "assembly a\n", ("empty-assembly",), "places nothing"),
    Hostile(
        "an assembly whose condition never holds",
        BALL + "assembly a\n    place p when no\nfigure f\n    show a\n",
        ("nothing-to-show",),
        "holds no parts",
    ),
    Hostile("an empty outline", "outline o\npart p\n    add extrude o by 4 mm\n", ("open-outline",), "no lines"),
    Hostile(
        "an outline of one stretch",
        "outline o\n    from (0, 0)\n    to (4 mm, 0)\n",
        ("open-outline",),
        "encloses nothing",
    ),
    Hostile(
        "an outline that goes back",
        "outline o\n    from (0, 0)\n    to (4 mm, 0)\n    to (0, 0)\npart p\n    add extrude o by 4 mm\n",
        ("no-area",),
        "area",
    ),
    Hostile(
        "an outline that crosses itself",
        "outline o\n    from (0, 0)\n    to (4 mm, 4 mm)\n    to (4 mm, 0)\n    to (0, 9 mm)\n"
        "part p\n    add extrude o by 4 mm\n",
        ("outline-crosses-itself",),
        "crosses",
    ),
    Hostile(
        "a hole outside",
        "outline o\n    circle diameter 9 mm\n    hole\n        circle diameter 2 mm at (99 mm, 0)\n"
        "part p\n    add extrude o by 4 mm\n",
        ("hole-outside",),
    ),
    Hostile(
        "an arc that cannot reach",
        "outline o\n    from (0, 0)\n    round to (9 mm, 0) radius 1 mm left\n",
        ("out-of-range",),
        "cannot reach",
    ),
    Hostile(
        "an arc through a line",
        "outline o\n    from (0, 0)\n    round to (9 mm, 0) through (4 mm, 0)\n    to (0, 3 mm)\n",
        ("no-arc",),
        "one line",
    ),
    Hostile(
        "a circle and more", "outline o\n    circle diameter 4 mm\n    to (4 mm, 0)\n", ("open-outline",), "whole loop"
    ),
    Hostile(
        "revolved through the axis",
        "outline o\n    from (-4 mm, 0)\n    to (4 mm, 0)\n    to (0, 4 mm)\npart p\n    add revolve o\n",
        ("negative-radius",),
        "radius",
    ),
    Hostile(
        "cut to nothing",
        _part("add sphere diameter 4 mm", "cut block (9 mm, 9 mm, 9 mm) centred"),
        ("empty-part",),
        "nothing is left",
        line=3,
    ),
    Hostile(
        "wrong kinds of everything",
        _part(
            "add cylinder diameter 4 deg length 4 mm",
            'cut sphere diameter "four"',
            "keep block (4 mm, 4 mm)",
            "add sphere diameter yes",
            "add sphere diameter (1 mm, 2 mm, 3 mm)",
            "add sphere diameter 1 mm .. 2 mm",
            "add sphere diameter 2026-06-21",
        ),
        ("wrong-form",) * 6 + ("wrong-kind",),
    ),
    Hostile(
        "a text where a length is wanted, by name",
        _given('d = "four"') + _part("add sphere diameter d"),
        ("wrong-kind",),
        "expected a length, found a text",
    ),
    Hostile(
        "a number where a length is wanted",
        _given("d = 4") + _part("add sphere diameter d"),
        ("wrong-kind",),
        "expected a length, found a number",
    ),
    Hostile(
        "an unknown name, swapped",
        _given("rim = 4 mm") + _part("add sphere diameter rmi"),
        ("unknown-name",),
        "`rmi`",
        "did you mean `rim`?",
    ),
    Hostile(
        "an unknown name in a body never used",
        _given("rim = 4 mm") + "part q(d)\n    add sphere diameter d + rmi\n" + _part("add sphere diameter rim"),
        ("unknown-name",),
        "`rmi`",
        "did you mean `rim`?",
    ),
    Hostile("an unknown name in a branch never taken", _given("n = 1 if yes else 2 * m") + BALL, ("unused",)[:0]),
    Hostile(
        "an unknown name in a function never called", "derived\n    f(x) = x + yy\n" + BALL, ("unknown-name",), "`yy`"
    ),
    Hostile("a name declared twice", _given("a = 1", "a = 2"), ("duplicate-name",), "declared twice"),
    Hostile(
        "a name hidden inside",
        _given("a = 1 mm") + "part q(a)\n    add sphere diameter a\n",
        ("duplicate-name",),
        "declared outside already",
    ),
    Hostile(
        "a variable that hides a name",
        _given("i = 1 mm") + _part("add sphere diameter i at (i * 9 mm, 0, 0) for i from 1 to 3"),
        ("duplicate-name",),
        "declared outside already",
    ),
    Hostile("a function's name taken", _given("sin = 1"), ("duplicate-name",), "a function of the language"),
    Hostile("a constant's name taken", _given("pi = 3"), ("reserved-name",), "a constant of the language"),
    Hostile("a mark called x", _part("add sphere diameter 4 mm", "mark x at (0, 0, 0)"), ("reserved-name",), "axis"),
    Hostile(
        "two features of one name",
        _part("add block (9 mm, 9 mm, 9 mm)", "cut sphere diameter 1 mm as a", "cut sphere diameter 2 mm as a"),
        ("duplicate-name",),
        "two things here",
    ),
    Hostile(
        "two copies of one name",
        BALL + "assembly a\n    place p\n    place p at (9 mm, 0, 0)\n",
        ("duplicate-name",),
        "two things here",
        "`as`",
    ),
    Hostile(
        "outside its range",
        _given("d = 9 mm range 1 mm .. 5 mm") + _part("add sphere diameter d"),
        ("out-of-range",),
        "outside its range",
    ),
    Hostile(
        "a range that runs back",
        _given("d = 3 mm range 5 mm .. 1 mm") + _part("add sphere diameter d"),
        ("out-of-range",),
        "ends before it starts",
    ),
    Hostile(
        "a range of another kind",
        _given("d = 3 mm range 1 deg .. 5 deg") + _part("add sphere diameter d"),
        ("wrong-kind",),
        "does not fit",
    ),
    Hostile(
        "choices of two kinds", _given("d = 3 mm one of 3 mm, 4 deg") + _part("add sphere diameter d"), ("wrong-kind",)
    ),
    Hostile(
        "no choice of these",
        _given('k = "rond" one of "round", "square"')
        + _part('add sphere diameter 4 mm when k is "round"', 'add sphere diameter 3 mm when k is "square"'),
        ("out-of-range",),
        "expected one of",
        'did you mean "round"?',
    ),
    Hostile(
        "a huge text not among the choices",
        _given(f'k = "{"x" * 5000}" one of "round", "square"') + _part('add sphere diameter 4 mm when k is "round"'),
        ("out-of-range",),
        "…",
    ),
    Hostile(
        "a thing without its values",
        "part p(d)\n    add sphere diameter d\nassembly a\n    place p\n",
        ("wrong-parameters",),
        "needs `d`",
    ),
    Hostile(
        "a thing with too many values",
        "part p(d)\n    add sphere diameter d\nassembly a\n    place p(1 mm, 2 mm)\n",
        ("wrong-parameters",),
        "one parameter, found 2 values",
    ),
    Hostile(
        "a thing with an unknown value",
        "part p(d)\n    add sphere diameter d\nassembly a\n    place p(b = 1 mm)\n",
        ("unknown-name",),
        "no parameter `b`",
    ),
    Hostile(
        "a thing with a value twice",
        "part p(d)\n    add sphere diameter d\nassembly a\n    place p(1 mm, d = 1 mm)\n",
        ("wrong-parameters",),
        "given twice",
    ),
    Hostile(
        "a material placed",
        "material brass\n    gloss 4 %\nassembly a\n    place brass\n",
        ("wrong-kind",),
        "expected a part or assembly",
    ),
    Hostile(
        "an assembly added", BALL + "assembly a\n    place p\npart q\n    add a\n", ("wrong-kind",), "expected a part"
    ),
    Hostile(
        "a part as material",
        BALL + "part q\n    made of p\n    add sphere diameter 4 mm\n",
        ("wrong-kind",),
        "expected a material",
    ),
    Hostile("a gloss of 140 %", "material brass\n    gloss 140 %\n" + BALL, ("out-of-range",), "100 %"),
    Hostile(
        "a colour by name", 'material brass\n    colour "red"\n' + BALL, ("wrong-kind",), "expected a colour", "#rrggbb"
    ),
    Hostile("a density of nothing", "material brass\n    density 0 g/cm3\n" + BALL, ("out-of-range",), "more than 0"),
    Hostile(
        "a viewpoint without a view",
        BALL + "viewpoint v\n    lens 85 mm\nfigure f\n    show p from v\n",
        ("no-projection",),
        "no projection",
    ),
    Hostile("an unused viewpoint without a view", BALL + "viewpoint v\n    lens 85 mm\n", ("no-projection",)),
    Hostile(
        "an eye on its target",
        BALL + "viewpoint v\n    eye (0, 0, 9 mm) toward (0, 0, 9 mm)\nfigure f\n    show p from v\n",
        ("eye-on-target",),
        "eye",
    ),
    Hostile(
        "a subject behind the eye",
        BALL + "viewpoint v\n    eye (0, -99 mm, 0) toward (0, -199 mm, 0)\nfigure f\n    show p from v\n",
        ("nothing-in-view",),
        "behind the eye",
    ),
    Hostile(
        "a subject out of the picture",
        BALL + "viewpoint v\n    eye (0, -99 mm, 0) toward (99 mm, 0, 0)\n    lens 200 mm\nfigure f\n"
        "    show p from v\n    size 40 mm by 40 mm\n",
        ("nothing-in-view",),
        "nothing of the subject",
    ),
    Hostile(
        "a lens and an angle",
        BALL + "viewpoint v\n    eye (0, -99 mm, 0) toward (0, 0, 0)\n    lens 50 mm\n    angle of view 30 deg\n"
        "figure f\n    show p from v\n",
        ("said-twice",),
        "twice",
    ),
    Hostile(
        "a lens on a parallel view",
        BALL + "viewpoint v\n    orthographic from front\n    lens 50 mm\nfigure f\n    show p from v\n",
        ("wrong-form",),
        "central projection",
    ),
    Hostile(
        "a lighting without light",
        BALL + "lighting noon\n    exposure 2\nfigure f\n    show p under noon\n",
        ("no-light",),
        "no source",
    ),
    Hostile(
        "a sun under the horizon",
        BALL + "lighting noon\n    sun elevation -4 deg azimuth 0 deg\nfigure f\n    show p under noon\n",
        ("out-of-range",),
        "horizon",
    ),
    Hostile("a figure of nothing", "figure f\n", ("nothing-to-show",), "no part or assembly"),
    Hostile(
        "a figure that cannot choose",
        BALL + "part q\n    add sphere diameter 2 mm\nfigure f\n    width 9 mm\n",
        ("nothing-to-show",),
        "which of these",
        "show p",
    ),
    Hostile(
        "a figure of a mark",
        _part("add sphere diameter 4 mm", "mark tip at (0, 0, 0)") + "figure f\n    show p.tip\n",
        ("wrong-kind",),
        "mark or feature",
    ),
    Hostile(
        "a figure of an unknown copy",
        BALL + "assembly a\n    place p at (9 mm, 0, 0) ring 4\nfigure f\n    show a.p[5]\n",
        ("which-copy",),
        "run from [1] to [4]",
    ),
    Hostile(
        "a figure of all copies at once",
        BALL + "assembly a\n    place p at (9 mm, 0, 0) ring 4\nfigure f\n    show a.p\n",
        ("which-copy",),
        "brackets say which",
        "`p[1]`",
    ),
    Hostile(
        "a figure from nowhere",
        BALL + "figure f\n    show p from frnt\n",
        ("unknown-name",),
        "no viewpoint",
        "did you mean `front`?",
    ),
    Hostile("a page of a kilometre", BALL + "figure f\n    width 1 km\n", ("out-of-range",), "limit"),
    Hostile("a page of no width", BALL + "figure f\n    width 0 mm\n", ("out-of-range",), "more than 0"),
    Hostile("a page all margin", BALL + "figure f\n    width 9 mm\n    margin 5 mm\n", ("does-not-fit",), "no paper"),
    Hostile(
        "a tower on a narrow page",
        _part("add cylinder diameter 1 mm length 5 m") + "figure f\n    show p from front\n",
        ("out-of-range",),
        "limit",
        "at most",
    ),
    Hostile("a scale too large", BALL + "figure f\n    scale 100:1\n    width 20 mm\n", ("does-not-fit",), "paper"),
    Hostile("a scale of zero", BALL + "figure f\n    scale 0:1\n", ("out-of-range",), "above 0"),
    Hostile("too many pixels", BALL + "figure f\n    width 4 m\n", ("too-much",), "pixels"),
    Hostile(
        "a kind of file unheard of", BALL + "figure f\n    files png, jpgg\n", ("unknown-name",), "no kind of file"
    ),
    Hostile("a file not drawn yet", BALL + "figure f\n    files pdf\n", ("not-drawn-yet",), "not drawn yet"),
    Hostile(
        "a figure with a parameter that is none",
        BALL + "figure f\n    with size = 4 mm\n",
        ("unknown-name",),
        "no parameter `size`",
    ),
    Hostile(
        "a figure that sets a derived value",
        "derived\n    d = 4 mm\n" + _part("add sphere diameter d") + "figure f\n    with d = 5 mm\n",
        ("unknown-name",),
        "derived",
    ),
    Hostile(
        "a figure that sets twice",
        _given("d = 4 mm") + _part("add sphere diameter d") + "figure f\n    with d = 5 mm, d = 6 mm\n",
        ("said-twice",),
        "set twice",
    ),
    Hostile(
        "a figure that sets out of range",
        _given("d = 4 mm range 1 mm .. 5 mm") + _part("add sphere diameter d") + "figure f\n    with d = 9 mm\n",
        ("out-of-range",),
        "outside its range",
    ),
    Hostile(
        "a figure that empties its part",
        _given("d = 4 mm") + _part("add sphere diameter d") + "figure f\n    with d = 0 mm\n",
        ("out-of-range",),
        "more than 0",
    ),
    Hostile(
        "a variant of a parameter that is none",
        BALL + "variants v\n    a size = 4 mm\n",
        ("unknown-name",),
        "no parameter `size`",
    ),
    Hostile(
        "two variants of one name",
        _given("d = 4 mm") + _part("add sphere diameter d") + "variants v\n    a d = 5 mm\n    a d = 6 mm\n",
        ("duplicate-name",),
        "two variants",
    ),
    Hostile(
        "a table with a column that is no parameter",
        BALL + 'variants v over "t.csv"\n',
        ("unknown-name",),
        "no parameter `size`",
        files={"t.csv": "name,size mm\na,1\nb,2\nc,3\n"},
    ),
    Hostile("an empty table", BALL + 'variants v over "t.csv"\n', ("bad-table",), "empty", files={"t.csv": "\n\n"}),
    Hostile("a table that is not there", BALL + 'variants v over "t.csv"\n', ("no-such-file",), "`t.csv`"),
    Hostile(
        "a table that is not UTF-8",
        BALL + 'variants v over "t.csv"\n',
        ("not-utf-8",),
        files={"t.csv": b"name,n\n\xfc,1\n"},
    ),
    Hostile(
        "a table of semicolons",
        BALL + 'variants v over "t.csv"\n',
        ("bad-table",),
        "name of a column",
        "commas",
        files={"t.csv": "name;size mm\na;1\n"},
    ),
    Hostile(
        "a table with an unknown unit",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("unknown-unit",),
        "`mmm` is no unit",
        "`mm`",
        files={"t.csv": "name,d mmm\na,1\n"},
    ),
    Hostile(
        "a table with a ragged row",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "expected 2 values in this row, found 3",
        files={"t.csv": "name,d mm\na,1,2\n"},
    ),
    Hostile(
        "a table with open quotes",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "do not pair up",
        files={"t.csv": 'name,d mm\n"a,1\n'},
    ),
    Hostile(
        "a table with a unit in a cell",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "expected a number in column `d`",
        "header",
        files={"t.csv": "name,d mm\na,1 mm\n"},
    ),
    Hostile(
        "a table with a decimal comma",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "found 3",
        files={"t.csv": "name,d mm\na,1,5\n"},
    ),
    Hostile(
        "a table with two rows of one name",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("duplicate-name",),
        "two rows",
        files={"t.csv": "name,d mm\na,1\na,2\n"},
    ),
    Hostile(
        "a table with two columns of one name",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("duplicate-name",),
        "two columns",
        files={"t.csv": "name,d mm,d mm\na,1,2\n"},
    ),
    Hostile(
        "a table with a nameless row",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "first column",
        files={"t.csv": "name,d mm\n,1\n"},
    ),
    Hostile(
        "a table with a name of brackets",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "brackets",
        files={"t.csv": "name,d mm\na[1],1\n"},
    ),
    Hostile(
        "a table with a wrong kind",
        _given("d = 1 mm") + _part("add sphere diameter d") + 'variants v over "t.csv"\n',
        (),
        files={"t.csv": "name,d mm\na,1\n"},
    ),
    Hostile(
        "a copy of a row's empty cell",
        'part q(d)\n    add sphere diameter d\nassembly a\n    place q(row.d) at (row.x, 0, 0) for row over "t.csv"\n',
        ("bad-table",),
        "is empty",
        files={"t.csv": "name,x mm,d mm\na,1,2\nb,9,\n"},
    ),
    Hostile(
        "a copy of an unknown column",
        'part q(d)\n    add sphere diameter d\nassembly a\n    place q(row.e) at (row.x, 0, 0) for row over "t.csv"\n',
        ("unknown-name",),
        "no column `e`",
        files={"t.csv": "name,x mm,d mm\na,1,2\n"},
    ),
    Hostile(
        "a row as a value",
        'part q(d)\n    add sphere diameter d\nassembly a\n    place q(row) at (row.x, 0, 0) for row over "t.csv"\n',
        ("wrong-kind",),
        "row of the table",
        files={"t.csv": "name,x mm\na,1\n"},
    ),
    Hostile(
        "a table named twice that is not there",
        BALL + "assembly a\n"
        '    place p at (row.x, 0, 0) for row over "t.csv"\n'
        '    place p as q at (row.x, 9 mm, 0) for row over "t.csv"\n',
        ("no-such-file",),
    ),
    Hostile(
        "an expectation of nothing known",
        BALL.replace("p\n", "pin\n") + "expect pni\n    height(pni) = 4 mm\n",
        ("unknown-name",),
        "`pni`",
        "did you mean `pin`?",
    ),
    Hostile(
        "an expectation without comparison",
        BALL + "expect p\n    height(p)\n",
        ("wrong-kind",),
        "a fact compares",
        "height(p)",
    ),
    Hostile(
        "an expectation of another kind",
        BALL + "expect p\n    height(p) = 4 deg\n",
        ("wrong-kind",),
        "a length and an angle",
    ),
    Hostile(
        "a tolerance below zero", BALL + "expect p\n    height(p) = 4 mm within -1 mm\n", ("out-of-range",), "0 or more"
    ),
    Hostile(
        "a tolerance of another kind",
        BALL + "expect p\n    height(p) = 4 mm within 1 deg\n",
        ("wrong-kind",),
        "tolerance",
    ),
    Hostile(
        "a tolerance without equality",
        BALL + "expect p\n    height(p) >= 4 mm within 1 mm\n",
        ("wrong-form",),
        "`within`",
    ),
    Hostile("a mass without density", BALL + "expect p\n    mass(p) >= 1 g\n", ("no-density",), "no density"),
    Hostile("a clearance to itself", BALL + "expect p\n    clearance(p, p) >= 0\n", ("wrong-parameters",), "no gap"),
    Hostile(
        "a distance to a thing",
        BALL + "assembly a\n    place p\nexpect a\n    distance(p, p) = 0\n",
        ("wrong-kind",),
        "thing, not a value",
    ),
    Hostile(
        "a measure of nothing",
        BALL + "assembly a\n    place p when no\nexpect a\n    height(a) = 0\n" + "figure f\n    show p\n",
        ("nothing-to-measure",),
        "no parts",
    ),
    Hostile(
        "a measure not drawn yet",
        BALL + "figure f\n    show p\nexpect p\n    visible(p, f) >= 20 %\n",
        ("not-drawn-yet",),
        "not drawn yet",
    ),
    Hostile("a measure outside expect", _given("v = volume(p)") + BALL, ("unknown-name",), "`volume`"),
    Hostile("a broken line in a part", _part("add sphere diametre 4 mm"), ("unknown-word",), hints="diameter"),
    Hostile("a broken parameter used", _given("d = 4 mm +") + _part("add sphere diameter d"), ("broken-value",)),
    Hostile(
        "a broken line in an assembly", BALL + "assembly a\n    palce p\nfigure f\n    show a\n", ("unknown-word",)
    ),
    Hostile(
        "a broken outline used",
        "outline o\n    form (0, 0)\n    to (4 mm, 0)\n    to (0, 4 mm)\npart p\n    add extrude o by 4 mm\n",
        ("unknown-word",),
    ),
    Hostile(
        "a broken viewpoint used",
        BALL + "viewpoint v\n    orthografic from front\nfigure f\n    show p from v\n",
        ("unknown-word",),
    ),
    Hostile(
        "a shape not drawn yet",
        "outline o\n    circle diameter 4 mm\npart p\n    add extrude o by 4 mm taper 5 deg\n",
        ("not-drawn-yet",),
    ),
    Hostile(
        "two mistakes and what hangs on them",
        _given("d = 4 mm + 1 deg", "e = 5 mm + 1 deg")
        + _part("add sphere diameter d", "add sphere diameter e")
        + "assembly a\n    place p\n    place pp\nfigure f\n    show a\n",
        ("unknown-name", "wrong-kind", "wrong-kind"),
    ),
]


@pytest.mark.parametrize("hostile", SCENES, ids=lambda each: each.name)
def test_scene(hostile: Hostile) -> None:
    start = time.perf_counter()
    run = checked(hostile.text, hostile.files)
    taken = time.perf_counter() - start
    errors = run.errors
    assert tuple(problem.code for problem in errors) == hostile.codes, [
        (each.code, each.span.line, each.sentence) for each in errors
    ]
    assert len({(each.code, each.span) for each in run.problems}) == len(run.problems)
    texts = " / ".join(each.sentence for each in errors)
    assert hostile.says in texts, texts
    assert hostile.hints in " / ".join(each.hint for each in errors), [each.hint for each in errors]
    if hostile.line is not None:
        assert errors[0].span.line == hostile.line
    for problem in run.problems:
        _well_put(problem.sentence)
        assert len(problem.sentence) < 400, problem.sentence
        assert problem.code in CODES, problem.code
        assert problem.span.line >= 1 and problem.span.column >= 1
        assert (problem.span.end_line, problem.span.end_column) >= (problem.span.line, problem.span.column)
    assert taken < SECONDS


def _well_put(sentence: str) -> None:
    """House style: begins small or with what the author wrote, no period at the end, no words of the host language."""
    assert re.match(r"[a-z`\d]", sentence), sentence
    assert not sentence.endswith("."), sentence
    assert not re.search(r"\b(None|NoneType|float|int|str|tuple|object|Exception|Error)\b", sentence), sentence


def test_there_are_many() -> None:
    assert len(SCENES) >= 150
    assert len({each.name for each in SCENES}) == len(SCENES)
    assert sum(1 for each in SCENES if each.codes) >= 80
    assert any(is_error(problem) for problem in checked("part p\n").problems)

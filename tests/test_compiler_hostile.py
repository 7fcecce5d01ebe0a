"""Scenes that ask for too much, stand in circles, or hold values and tables that make no sense."""

from __future__ import annotations

import pytest
from support.hostile import BALL, Hostile, given, judge, part

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
    Hostile("a billion copies", part("add sphere diameter 4 mm ring 1000000000"), ("too-much",), "limit"),
    Hostile(
        "a billion by for",
        part("add sphere diameter 4 mm at (i * 9 mm, 0, 0) for i from 1 to 1000000000"),
        ("too-much",),
        "limit",
    ),
    Hostile(
        "a billion by two fors",
        part("add sphere diameter 4 mm at (i * 9 mm, j * 9 mm, 0) for i from 1 to 40000 for j from 1 to 40000"),
        ("too-much",),
        "limit",
    ),
    Hostile(
        "a billion by ring and row",
        part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 30000 row 30000 by (0, 0, 9 mm)"),
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
    Hostile("an exponent bomb", given("n = 1e999999999"), ("bad-number",), "power of ten", line=2),
    Hostile("a small exponent bomb", given("n = 1e-999999999"), ("bad-number",), "power of ten", line=2),
    Hostile("an infinite number", given("n = 1e400"), ("bad-number",), "power of ten", line=2),
    Hostile("an infinite length", given("n = 9e300 km ^ 2"), ("out-of-range",), "too large", line=2),
    Hostile("a number below all floats", given("n = 1e-400"), ("bad-number",), "power of ten", line=2),
    Hostile("a scale of bombs", BALL + "figure f\n    scale 1:1e99999999\n", ("unexpected-character",)),
    Hostile(
        "an exponent bomb in a table",
        'variants v over "t.csv"\n' + given("n = 1") + part("add sphere diameter n * 1 mm"),
        ("out-of-range",),
        "too large",
        files={"t.csv": "name,n\na,1e999999999\n"},
    ),
    Hostile("powers of powers", given("n = 9 ^ 9 ^ 9"), ("out-of-range",), "too large", line=2),
    Hostile("a power under all floats", given("n = 1 / 0.1 ^ -400"), ("out-of-range",), "too large", line=2),
    Hostile("dimensions without end", _POWERS, ("out-of-range",), "limit"),
    Hostile("texts that double", _TEXT_DOUBLING, ("too-much",), "100,000 characters"),
    Hostile("calls that double", _CALLS_DOUBLING + given("n = f49(1)"), ("too-much",), "limit"),
    Hostile("a chain of 300 values in reverse order", _CHAIN + given("n = v0"), ("unused",)[:0]),
    Hostile("a circle of 300 values", _CIRCLE, ("circular-value",), "needs itself"),
    Hostile("a circle of functions", "derived\n    ff(x) = gg(x)\n    gg(x) = ff(x)\n", ("circular-value",), "needs"),
    Hostile("a value that needs itself", "derived\n    a = a + 1\n", ("circular-value",), "`a` needs itself"),
    Hostile("a part in itself", part("add p at (1 mm, 0, 0)"), ("recursion",), "cannot hold itself"),
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
        'see "nowhere.plate" as n\n' + part("add n.ball", "cut n.pin"),
        ("no-such-file",),
        "there is no file `nowhere.plate`",
        line=1,
    ),
    Hostile(
        "a value of a file that is not there",
        'see "nowhere.plate" as n\n' + part("add sphere diameter n.size"),
        ("no-such-file",),
    ),
    Hostile(
        "a function of a file that is not there",
        'see "nowhere.plate" as n\n' + part("add sphere diameter n.size(1)"),
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
        'see "a.plate" as a\n' + part("add a.b"),
        ("not-utf-8",),
        files={"a.plate": b"\xff\xfe"},
    ),
    Hostile("300 nested parentheses", given("n = " + "(" * 300 + "1" + ")" * 300), ("nested-too-deep",), "limit"),
    Hostile(
        "100 operations within 45 parentheses",
        given("n = " + "(" * 45 + "1" + ")" * 45 + " + 1" * 99),
        ("unused",)[:0],
    ),
    Hostile("calls within calls", given("n = " + "abs(" * 45 + "-1" + ")" * 45), ("unused",)[:0]),
    Hostile(
        "functions through functions, 300 deep",
        "derived\n    f0(x) = x\n"
        + "".join(f"    f{k}(x) = f{k - 1}(x)\n" for k in range(1, 300))
        + given("n = f299(1)"),
        ("too-deep",),
        "limit",
    ),
    Hostile("a division by zero", given("n = 1 / (2 - 2)"), ("division-by-zero",), "divides by 0", line=2),
    Hostile("zero to a negative power", given("n = 0 ^ -1"), ("division-by-zero",), "negative power"),
    Hostile("a root of a negative", given("n = root(-1)"), ("wrong-parameters",), "no value below 0"),
    Hostile("a root of a length", given("n = root(4 mm)"), ("wrong-parameters",), "no square"),
    Hostile("a negative number to a broken power", given("n = (0 - 8) ^ 0.5"), ("out-of-range",), "whole power"),
    Hostile("millimetres and degrees", given("n = 1 mm + 1 deg"), ("wrong-kind",), "a length and an angle"),
    Hostile("a latitude doubled", given("n = 2 * (1 degN, 2 degN)"), ("wrong-kind",), "takes no part in arithmetic"),
    Hostile("negative zero sizes", part("add cylinder diameter -0 mm length 4 mm"), ("out-of-range",), "more than 0"),
    Hostile("a zero block", part("add block (4 mm, 0, 4 mm)"), ("out-of-range",), "along y"),
    Hostile("a negative block", part("add block (4 mm, 4 mm, -1 mm)"), ("out-of-range",), "along z"),
    Hostile("an atom", part("add sphere diameter 1e-9 mm"), ("out-of-range",), "limit"),
    Hostile("a planet", part("add sphere diameter 13000 km"), ("out-of-range",), "limit"),
    Hostile(
        "a place beyond the moon", part("add sphere diameter 4 mm at (400000 km, 0, 0)"), ("out-of-range",), "limit"
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
    Hostile("a prism of two sides", part("add prism sides 2 across 4 mm length 4 mm"), ("out-of-range",), "3 or more"),
    Hostile(
        "a prism of two and a half sides",
        part("add prism sides 3.5 across 4 mm length 4 mm"),
        ("not-whole",),
        "whole number",
    ),
    Hostile("half a copy", part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 2.5"), ("not-whole",), "whole number"),
    Hostile("no copies", part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 0"), ("out-of-range",), "1 or more"),
    Hostile(
        "a ring over too much",
        part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 3 over 400 deg"),
        ("out-of-range",),
        "between 0 and 360",
    ),
    Hostile("a ring of itself", part("add sphere diameter 4 mm ring 4"), ("coincident-copies",), "one place"),
    Hostile("a row without a step", part("add sphere diameter 4 mm row 4 by (0, 0, 0)"), ("coincident-copies",)),
    Hostile(
        "a for that runs backward",
        part("add sphere diameter 4 mm at (i * 1 mm, 0, 0) for i from 5 to 1"),
        ("out-of-range",),
        "upward",
    ),
    Hostile(
        "a ring about nothing",
        part("add sphere diameter 4 mm at (9 mm, 0, 0) ring 4 about (0, 0, 0)"),
        ("out-of-range",),
        "needs a length",
    ),
    Hostile("a torus through itself", part("add torus diameter 4 mm tube 5 mm"), ("out-of-range",), "cut itself"),
    Hostile("a wedge that hangs over", part("add wedge (4 mm, 4 mm, 4 mm) top 5 mm"), ("out-of-range",), "top"),
    Hostile(
        "a part of too many shapes",
        part("add block (1 mm, 1 mm, 1 mm) row 90000 by (3 mm, 0, 0)"),
        ("too-much",),
        "shapes, the limit",
    ),
    Hostile(
        "a placed thing that is centred",
        BALL + "assembly a\n    place p centred\n",
        ("wrong-form",),
        "`centred` goes with shapes",
    ),
]


@pytest.mark.parametrize("hostile", SCENES, ids=lambda each: each.name)
def test_scene(hostile: Hostile) -> None:
    judge(hostile)


def test_each_has_a_name_of_its_own() -> None:
    assert len({each.name for each in SCENES}) == len(SCENES) >= 60

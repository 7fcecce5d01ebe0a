"""Scenes whose parts, outlines, names, tables, figures and facts are wrong as an author in haste writes them."""

from __future__ import annotations

import pytest
from support.hostile import BALL, Hostile, given, judge, part

SCENES = [
    Hostile("an empty part", "part p\n", ("empty-part",), "adds nothing"),
    Hostile(
        "a shape with a slip in it, its parenthesis touching",
        part("add blok(3 mm, 1 mm, 1 mm)"),
        ("unknown-name",),
        "`blok`",
        "did you mean `block`?",
    ),
    Hostile("a shape by its everyday name", part("add box"), ("unknown-name",), "`box`", "did you mean `block`?"),
    Hostile("a shape unheard of", part("add gromlet"), ("unknown-name",), "`gromlet`", "`part gromlet`"),
    Hostile("a part that only cuts", part("cut sphere diameter 4 mm"), ("empty-part",), "begins with `add`"),
    Hostile(
        "a part whose condition never holds", part("add sphere diameter 4 mm when no"), ("empty-part",), "adds nothing"
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
        part("add sphere diameter 4 mm", "cut block (9 mm, 9 mm, 9 mm) centred"),
        ("empty-part",),
        "nothing is left",
        line=3,
    ),
    Hostile(
        "wrong kinds of everything",
        part(
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
        given('d = "four"') + part("add sphere diameter d"),
        ("wrong-kind",),
        "expected a length, found a text",
    ),
    Hostile(
        "a number where a length is wanted",
        given("d = 4") + part("add sphere diameter d"),
        ("wrong-kind",),
        "expected a length, found a number",
    ),
    Hostile(
        "an unknown name, swapped",
        given("rim = 4 mm") + part("add sphere diameter rmi"),
        ("unknown-name",),
        "`rmi`",
        "did you mean `rim`?",
    ),
    Hostile(
        "an unknown name in a body never used",
        given("rim = 4 mm") + "part q(d)\n    add sphere diameter d + rmi\n" + part("add sphere diameter rim"),
        ("unknown-name",),
        "`rmi`",
        "did you mean `rim`?",
    ),
    Hostile("an unknown name in a branch never taken", given("n = 1 if yes else 2 * m") + BALL, ("unused",)[:0]),
    Hostile(
        "an unknown name in a function never called", "derived\n    f(x) = x + yy\n" + BALL, ("unknown-name",), "`yy`"
    ),
    Hostile("a name declared twice", given("a = 1", "a = 2"), ("duplicate-name",), "declared twice"),
    Hostile(
        "a name hidden inside",
        given("a = 1 mm") + "part q(a)\n    add sphere diameter a\n",
        ("duplicate-name",),
        "declared outside already",
    ),
    Hostile(
        "a variable that hides a name",
        given("i = 1 mm") + part("add sphere diameter i at (i * 9 mm, 0, 0) for i from 1 to 3"),
        ("duplicate-name",),
        "declared outside already",
    ),
    Hostile("a function's name taken", "derived\n    sin(x) = x\n", ("duplicate-name",), "a function of the language"),
    Hostile("a constant's name taken", given("pi = 3"), ("reserved-name",), "a constant of the language"),
    Hostile("a mark called x", part("add sphere diameter 4 mm", "mark x at (0, 0, 0)"), ("reserved-name",), "axis"),
    Hostile(
        "two features of one name",
        part("add block (9 mm, 9 mm, 9 mm)", "cut sphere diameter 1 mm as a", "cut sphere diameter 2 mm as a"),
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
        given("d = 9 mm range 1 mm .. 5 mm") + part("add sphere diameter d"),
        ("out-of-range",),
        "outside its range",
    ),
    Hostile(
        "a range that runs back",
        given("d = 3 mm range 5 mm .. 1 mm") + part("add sphere diameter d"),
        ("out-of-range",),
        "ends before it starts",
    ),
    Hostile(
        "a range of another kind",
        given("d = 3 mm range 1 deg .. 5 deg") + part("add sphere diameter d"),
        ("wrong-kind",),
        "does not fit",
    ),
    Hostile(
        "choices of two kinds", given("d = 3 mm one of 3 mm, 4 deg") + part("add sphere diameter d"), ("wrong-kind",)
    ),
    Hostile(
        "no choice of these",
        given('k = "rond" one of "round", "square"')
        + part('add sphere diameter 4 mm when k is "round"', 'add sphere diameter 3 mm when k is "square"'),
        ("out-of-range",),
        "expected one of",
        'did you mean "round"?',
    ),
    Hostile(
        "a huge text not among the choices",
        given(f'k = "{"x" * 5000}" one of "round", "square"') + part('add sphere diameter 4 mm when k is "round"'),
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
        part("add sphere diameter 4 mm", "mark tip at (0, 0, 0)") + "figure f\n    show p.tip\n",
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
        part("add cylinder diameter 1 mm length 5 m") + "figure f\n    show p from front\n",
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
    Hostile("a word not drawn yet", BALL + "figure f\n    scale bar 50 mm\n", ("not-drawn-yet",), "not drawn yet"),
    Hostile(
        "a figure with a parameter that is none",
        BALL + "figure f\n    with size = 4 mm\n",
        ("unknown-name",),
        "no parameter `size`",
    ),
    Hostile(
        "a figure that sets a derived value",
        "derived\n    d = 4 mm\n" + part("add sphere diameter d") + "figure f\n    with d = 5 mm\n",
        ("unknown-name",),
        "derived",
    ),
    Hostile(
        "a figure that sets twice",
        given("d = 4 mm") + part("add sphere diameter d") + "figure f\n    with d = 5 mm, d = 6 mm\n",
        ("said-twice",),
        "set twice",
    ),
    Hostile(
        "a figure that sets out of range",
        given("d = 4 mm range 1 mm .. 5 mm") + part("add sphere diameter d") + "figure f\n    with d = 9 mm\n",
        ("out-of-range",),
        "outside its range",
    ),
    Hostile(
        "a figure that empties its part",
        given("d = 4 mm") + part("add sphere diameter d") + "figure f\n    with d = 0 mm\n",
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
        given("d = 4 mm") + part("add sphere diameter d") + "variants v\n    a d = 5 mm\n    a d = 6 mm\n",
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
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("unknown-unit",),
        "`mmm` is no unit",
        "`mm`",
        files={"t.csv": "name,d mmm\na,1\n"},
    ),
    Hostile(
        "a table with a ragged row",
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "expected 2 values in this row, found 3",
        files={"t.csv": "name,d mm\na,1,2\n"},
    ),
    Hostile(
        "a table with open quotes",
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "do not pair up",
        files={"t.csv": 'name,d mm\n"a,1\n'},
    ),
    Hostile(
        "a table with a unit in a cell",
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "expected a number in column `d`",
        "header",
        files={"t.csv": "name,d mm\na,1 mm\n"},
    ),
    Hostile(
        "a table with a decimal comma",
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "found 3",
        files={"t.csv": "name,d mm\na,1,5\n"},
    ),
    Hostile(
        "a table with two rows of one name",
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("duplicate-name",),
        "two rows",
        files={"t.csv": "name,d mm\na,1\na,2\n"},
    ),
    Hostile(
        "a table with two columns of one name",
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("duplicate-name",),
        "two columns",
        files={"t.csv": "name,d mm,d mm\na,1,2\n"},
    ),
    Hostile(
        "a table with a nameless row",
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "first column",
        files={"t.csv": "name,d mm\n,1\n"},
    ),
    Hostile(
        "a table with a name of brackets",
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
        ("bad-table",),
        "brackets",
        files={"t.csv": "name,d mm\na[1],1\n"},
    ),
    Hostile(
        "a table with a wrong kind",
        given("d = 1 mm") + part("add sphere diameter d") + 'variants v over "t.csv"\n',
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
    Hostile("a measure outside expect", given("v = volume(p)") + BALL, ("unknown-name",), "`volume`"),
    Hostile("a broken line in a part", part("add sphere diametre 4 mm"), ("unknown-word",), hints="diameter"),
    Hostile("a broken parameter used", given("d = 4 mm +") + part("add sphere diameter d"), ("broken-value",)),
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
        part('add mesh "casting.stl" unit mm'),
        ("not-drawn-yet",),
    ),
    Hostile(
        "two mistakes and what hangs on them",
        given("d = 4 mm + 1 deg", "e = 5 mm + 1 deg")
        + part("add sphere diameter d", "add sphere diameter e")
        + "assembly a\n    place p\n    place pp\nfigure f\n    show a\n",
        ("unknown-name", "wrong-kind", "wrong-kind"),
    ),
]


@pytest.mark.parametrize("careless", SCENES, ids=lambda each: each.name)
def test_scene(careless: Hostile) -> None:
    judge(careless)


def test_each_has_a_name_of_its_own() -> None:
    assert len({each.name for each in SCENES}) == len(SCENES) >= 60

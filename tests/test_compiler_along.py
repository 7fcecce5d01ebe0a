"""Paths and what runs along them in the language: what they mean, where they stand, and mistakes at their lines."""

from __future__ import annotations

import math

import pytest
from platewright.compiler import scene
from platewright.compiler.graph import FeatureCopy, Solid
from platewright.compiler.solids.recipe import (
    Bellows,
    Helix,
    Primitive,
    Recipe,
    SpaceArcTo,
    SpaceLineTo,
    SpacePath,
    SpaceSplineTo,
    Spring,
    Sweep,
    Transition,
    Tube,
)
from support.scenes import built, clean

STRIP = (
    "outline strip(wide = 6 mm)\n    from (-wide/2, -1 mm)\n    to (wide/2, -1 mm)\n"
    "    to (wide/2, 1 mm)\n    to (-wide/2, 1 mm)\n"
)
HOSE = "path hose(r = 10 mm)\n    from (0, 0, 0)\n    to (0, 0, 50 mm) bend r\n    to (40 mm, 0, 50 mm)\n"


def solid(text: str, line: str, **files: str) -> Solid:
    """The part with one `add` line, behind the declarations of a text."""
    run = built(f"{text}part p\n    add {line}\n", {name.replace("_", "."): content for name, content in files.items()})
    assert run.problems == [], run.sentences
    assert run.model is not None
    part = run.model.built.things["p"]
    assert isinstance(part, Solid)
    return part


def shape(text: str, line: str, **files: str) -> Primitive:
    (step,) = solid(text, line, **files).recipe.steps
    found = step.placed[0].shape
    assert not isinstance(found, Recipe)
    return found


def test_every_kind_of_stretch() -> None:
    text = (
        "path way\n    derived\n        up = 50 mm\n    from (0, 0, 0)\n    to (0, 0, up) bend 10 mm\n"
        "    to (60 mm, 0, up)\n"
        "    curve through (80 mm, 0, up), (100 mm, 20 mm, up)\n"
    )
    found = shape(text, "tube along way diameter 4 mm")
    assert found == Tube(
        SpacePath(
            (0.0, 0.0, 0.0),
            (
                SpaceLineTo((0.0, 0.0, 50.0), 10.0),
                SpaceLineTo((60.0, 0.0, 50.0)),
                SpaceSplineTo(((80.0, 0.0, 50.0), (100.0, 20.0, 50.0))),
            ),
        ),
        4.0,
    )
    arc = shape(
        "path bow\n    from (0, 0, 0)\n    round to (20 mm, 0, 0) through (10 mm, 10 mm, 0)\n",
        "tube along bow diameter 4 mm bore 2 mm",
    )
    assert arc == Tube(SpacePath((0.0, 0.0, 0.0), (SpaceArcTo((10.0, 10.0, 0.0), (20.0, 0.0, 0.0)),)), 4.0, 2.0)
    coil = shape(
        STRIP + "path coil\n    helix diameter 40 mm pitch 9 mm turns 3 left\n", "sweep strip along coil twist 45 deg"
    )
    assert isinstance(coil, Sweep)
    assert (coil.path, coil.twist) == (SpacePath((20.0, 0.0, 0.0), (Helix(40.0, 9.0, 3.0, True),)), 45.0)


def test_paths_over_tables() -> None:
    table = "x mm,y cm,z inch\n0,0,0\n10,1,0\n10,1,1\n"
    found = shape('path way\n    points over "t.csv"\n', "tube along way diameter 2 mm", t_csv=table)
    ends = ((10.0, 10.0, 0.0), (10.0, 10.0, 25.4))
    assert found == Tube(SpacePath((0.0, 0.0, 0.0), tuple(map(SpaceLineTo, ends))), 2.0)
    found = shape(
        'path way\n    from (0, -20 mm, 0)\n    curve over "t.csv"\n', "tube along way diameter 2 mm", t_csv=table
    )
    assert found == Tube(SpacePath((0.0, -20.0, 0.0), (SpaceSplineTo(((0.0, 0.0, 0.0), *ends)),)), 2.0)


def test_shapes_in_a_line() -> None:
    found = shape("", "tube through (0, 0, 0), (0, 0, 50 mm), (40 mm, 0, 50 mm) bend 9 mm diameter 8 mm bore 5 mm")
    path = SpacePath((0.0, 0.0, 0.0), (SpaceLineTo((0.0, 0.0, 50.0), 9.0), SpaceLineTo((40.0, 0.0, 50.0))))
    assert found == Tube(path, 8.0, 5.0)
    assert shape("", "spring diameter 20 mm wire 2 mm turns 12 length 60 mm left") == Spring(
        20.0, 2.0, 12.0, 60.0, True
    )
    line = "bellows diameter 60 mm bore 40 mm convolutions 6 length 80 mm wall 1 mm"
    assert shape("", line) == Bellows(60.0, 40.0, 6, 80.0, 1.0)
    found = shape(STRIP, "transition from strip to strip(wide = 9 mm) length 30 mm")
    assert isinstance(found, Transition) and found.length == 30.0 and found.lower != found.upper


def features(text: str, line: str) -> tuple[FeatureCopy, ...]:
    (feature,) = solid(text, f"{line} as f").features
    return feature.copies


def test_features_hold_on_to_the_ends_of_a_hose() -> None:
    (copy,) = features(HOSE, "tube along hose(r = 20 mm) diameter 8 mm at (5 mm, 0, 0) turn 90 deg about x")
    assert copy.centre == pytest.approx((5.0, 0.0, 0.0))
    assert copy.axis == pytest.approx((0.0, -1.0, 0.0))
    assert copy.top == pytest.approx((45.0, -50.0, 0.0))
    assert copy.diameter == pytest.approx(8.0)
    (spring,) = features("", "spring diameter 20 mm wire 2 mm turns 5 length 30 mm centred at (0, 0, 7 mm)")
    assert (spring.centre, spring.axis, spring.top) == ((0.0, 0.0, 7.0), (0.0, 0.0, 1.0), (0.0, 0.0, 22.0))


def test_facts_about_a_hose() -> None:
    length = 40.0 + 30.0 + 10.0 * math.pi / 2
    volume = math.pi / 4 * (64.0 - 25.0) * length
    run = clean(
        f"{HOSE}part p\n    add tube along hose diameter 8 mm bore 5 mm as run\n    mark end at (40 mm, 0, 50 mm)\n"
        f"expect p\n    volume(p) = {volume} mm3 within {volume / 100} mm3\n    height(p) = 54 mm within 0.01 mm\n"
        "    distance(run.top, end) = 0 mm within 0.000001 mm\n"
    )
    assert run.problems == []


BAD = [
    ("path w\n    from (0, 0, 0)\n    to (0, 0, 0)\n", "tube along w diameter 2 mm", "no-length", 3, "stands still"),
    ("path w\n    to (0, 0, 9 mm)\n", "tube along w diameter 2 mm", "open-path", 2, "expected `from` first"),
    ("path w\n    from (0, 0, 0)\n", "tube along w diameter 2 mm", "open-path", 1, "leads nowhere"),
    (HOSE, "tube along hose(r = 45 mm) diameter 2 mm", "bend-does-not-fit", 3, "a straight stretch of 40 mm"),
    (
        "path w\n    from (0, 0, 0)\n    to (9 mm, 0, 0)\n    round to (20 mm, 9 mm, 0) through (10 mm, 5 mm, 0)\n",
        "tube along w diameter 1 mm",
        "path-has-corner",
        3,
        "(9 mm, 0 mm, 0 mm)",
    ),
    (
        "path w\n    helix diameter 9 mm pitch 2 mm turns 3\n    to (0, 0, 99 mm)\n",
        "tube along w diameter 1 mm",
        "open-path",
        3,
        "a helix is a whole path",
    ),
    ("", "tube through (0, 0, 0), (9 mm, 0, 0), (9 mm, 0, 0) diameter 1 mm", "no-length", 2, "(9 mm, 0 mm, 0 mm)"),
    ("", "tube through (0, 0, 0) diameter 1 mm", "open-path", 2, "two points or more"),
    (HOSE, "tube along hose diameter 4 mm bore 4 mm", "out-of-range", 6, "bore: expected less than"),
    ("", "spring diameter 20 mm wire 2 mm turns 5 length 2 mm", "out-of-range", 2, "length: expected more than"),
    ("", "spring diameter 20 mm wire 2 mm turns 0 length 20 mm", "out-of-range", 2, "turns: expected more than 0"),
    (HOSE, "sweep hose along hose", "wrong-kind", 6, "expected an outline, but `hose` is a path"),
    (STRIP, "tube along strip diameter 2 mm", "wrong-kind", 7, "expected a path, but `strip` is an outline"),
]


@pytest.mark.parametrize(("text", "line", "code", "at", "says"), BAD)
def test_mistakes_stand_at_their_lines(text: str, line: str, code: str, at: int, says: str) -> None:
    run = built(f"{text}part p\n    add {line}\n")
    assert [problem.code for problem in run.errors] == [code], run.sentences
    assert run.errors[0].span.line == at
    assert says in run.errors[0].sentence


def test_a_tube_that_cuts_itself_is_found_by_check_at_its_line() -> None:
    from support.scenes import checked

    run = checked(HOSE + "part p\n    add block (1 mm, 1 mm, 1 mm)\n    add tube along hose diameter 24 mm\n")
    assert run.codes == ["cuts-itself"]
    assert run.errors[0].span.line == 7
    assert "bends round a radius of 10 mm" in run.errors[0].sentence


CEE = """outline cee
    from (0, 0)
    to (20 mm, 0)
    to (20 mm, 5 mm)
    to (5 mm, 5 mm)
    to (5 mm, 15 mm)
    to (20 mm, 15 mm)
    to (20 mm, 20 mm)
    to (0, 20 mm)
"""
LARGER = CEE.replace("cee", "other").replace("(20 mm", "(24 mm")
TURNED = """outline other
    from (20 mm, 0)
    to (20 mm, 20 mm)
    to (0, 20 mm)
    to (0, 15 mm)
    to (15 mm, 15 mm)
    to (15 mm, 5 mm)
    to (0, 5 mm)
    to (0, 0)
"""


@pytest.mark.parametrize(("other", "codes"), [(LARGER, []), (TURNED, ["cuts-itself"])], ids=["larger", "turned"])
def test_a_transition_between_outlines_that_are_not_convex_may_not_cut_itself(other: str, codes: list[str]) -> None:
    text = CEE + other + "part p\n    add transition from cee to other length 30 mm\n"
    run = built(text)
    assert run.model is not None
    found = scene.prove(run.model, run.meshes)
    assert [problem.code for problem in found] == codes
    assert all("near (" in problem.sentence for problem in found)

"""Facts: every measure, compared in every way, with the measured value in the message."""

from __future__ import annotations

import math

import pytest
from platewright.compiler import scene
from support.scenes import Run, checked, clean

MODEL = (
    "material steel\n    metal iron\n    density 7.85 g/cm3\n"
    "given\n    long = 40 mm\n"
    "part bar\n    made of steel\n    add block (long, 20 mm, 10 mm)\n"
    "    cut cylinder diameter 8 mm length 10 mm at (-10 mm, 0, 0) as bore\n"
    "    mark left at (-20 mm, 0, 0)\n    mark right at (20 mm, 0, 0) along x\n"
    "part ball\n    made of steel\n    add sphere diameter 10 mm\n"
    "assembly set\n    place bar\n    place ball at (0, 0, 30 mm)\n"
    "    place bar as other turn 90 deg at (100 mm, 0, 0)\n"
)
BORED = 40 * 20 * 10 - math.pi * 16 * 10


def facts(*lines: str, subject: str = "set") -> Run:
    return checked(MODEL + f"expect {subject}\n" + "".join(f"    {line}\n" for line in lines))


@pytest.mark.parametrize(
    "fact",
    [
        "distance(bar.left, bar.right) = long",
        "distance(bar.left, other.left) = distance(other.left, bar.left)",
        "distance(bar.bore, bar.bore.top) = 5 mm",
        "distance(bar.left, (0, 0, 0)) = 20 mm",
        "bar.bore.diameter = 8 mm",
        "bar.bore.axis is (0, 0, 1)",
        "bar.right is (20 mm, 0, 0)",
        "width(bar) = 40 mm",
        "depth(bar) = 20 mm",
        "height(bar) = 10 mm",
        "width(other) = 20 mm",
        "depth(other) = 40 mm",
        "width(set) = 130 mm",
        "height(set) = 35 mm within 0.01 mm",
        f"volume(bar) = {BORED!r} mm3 within 0.1 %",
        f"volume(ball) = {4 / 3 * math.pi * 125!r} mm3 within 0.2 %",
        "volume(set) = 2 * volume(bar) + volume(ball)",
        f"area(ball) = {4 * math.pi * 25!r} mm2 within 0.2 %",
        f"mass(bar) = {BORED * 7.85e-3!r} g within 0.1 %",
        "mass(bar) / volume(bar) = 7.85 g/cm3",
        "clearance(bar, ball) = 15 mm within 0.02 mm",
        "clearance(bar, other) = 70 mm",
        "height(bar) < width(bar)",
        "height(bar) <= 10 mm",
        "width(bar) > 0",
        "width(bar) >= long",
        "height(bar) is depth(bar) / 2",
        "height(bar) is not 0",
        "width(bar) > 30 mm and width(bar) < 50 mm",
        "not width(bar) > 50 mm",
        "min(width(bar), height(bar)) = 10 mm",
        "width(bar) = 41 mm within 1 mm",
        "width(bar) = 41 mm within 2.5 %",
    ],
)
def test_a_fact_that_holds_is_silent(fact: str) -> None:
    assert facts(fact).problems == []


@pytest.mark.parametrize(
    ("fact", "sentence"),
    [
        ("distance(bar.left, bar.right) = 41 mm", "`distance(bar.left, bar.right)` is 40 mm, expected 41 mm"),
        ("width(bar) = 41 mm within 0.5 mm", "`width(bar)` is 40 mm, expected 41 mm within 0.5 mm"),
        ("width(bar) = 41 mm within 2 %", "`width(bar)` is 40 mm, expected 41 mm within 2 %"),
        ("width(bar) < 40 mm", "`width(bar)` is 40 mm, expected < 40 mm"),
        ("width(bar) <= 0", "`width(bar)` is 40 mm, expected <= 0 mm"),
        ("width(bar) is 41 mm", "`width(bar)` is 40 mm, expected is 41 mm"),
        ("width(bar) is not 40 mm", "`width(bar)` is 40 mm, expected is not 40 mm"),
        ("bar.right is (1 mm, 0, 0)", "`bar.right` is (20 mm, 0 mm, 0 mm), expected is (1 mm, 0 mm, 0 mm)"),
        ("no", "`no` does not hold"),
        ("width(bar) > 50 mm or no", "`width(bar) > 50 mm or no` does not hold"),
        ("clearance(bar, other) >= 80 mm", "`clearance(bar, other)` is 70 mm, expected >= 80 mm"),
    ],
)
def test_a_fact_that_does_not_hold_says_what_was_measured(fact: str, sentence: str) -> None:
    (error,) = facts(fact).errors
    assert (error.code, error.sentence) == ("broken-fact", sentence)
    assert error.span.line == MODEL.count("\n") + 2


@pytest.mark.parametrize(
    ("fact", "code", "sentence"),
    [
        ("width(bra) = 1 mm", "unknown-name", "`set` has nothing called `bra`"),
        ("width(bar.left) = 1 mm", "wrong-kind", "`width` takes a part or assembly, found a point"),
        ("width(3 mm) = 1 mm", "wrong-kind", "`width` takes the path of a part or assembly"),
        ("width(bar, ball) = 1 mm", "wrong-parameters", "`width` takes a part or assembly"),
        ("distance(bar.left) = 1 mm", "wrong-parameters", "`distance` takes two points"),
        ("distance(bar, ball) = 1 mm", "wrong-kind", "`bar` is a thing, not a value"),
        ("distance(bar.left, 3 mm) = 1 mm", "wrong-kind", "`distance` takes two points, found a length"),
        ("clearance(bar, set) = 1 mm", "wrong-parameters", "one of these is part of the other"),
        ("wdith(bar) = 1 mm", "unknown-name", "nothing here is called `wdith`"),
        ("width(bar) = 1 mm2", "wrong-kind", "the two sides of a fact are of one kind, found a length and an area"),
        ('width(bar) = "wide"', "wrong-kind", "only values of one kind can be compared"),
        ("bar.left.axis = (0, 0, 1)", "unknown-name", "the mark `left` has no `axis`"),
        ("visible(bar, f) >= 20 %", "not-drawn-yet", "the measure `visible` is a word of the language"),
    ],
)
def test_a_fact_that_makes_no_sense_says_why(fact: str, code: str, sentence: str) -> None:
    (error,) = facts(fact).errors
    assert error.code == code
    assert sentence in error.sentence


def test_each_fact_is_judged_by_itself() -> None:
    run = facts("width(bar) = 1 mm", "width(bra) = 1 mm", "width(bar) = 40 mm", "height(bar) = 1 mm")
    assert [error.code for error in run.errors] == ["broken-fact", "unknown-name", "broken-fact"]


@pytest.mark.parametrize("subject", ["bar", "set.bar", "set.other"])
def test_paths_start_at_the_subject_or_with_its_name(subject: str) -> None:
    last = subject.split(".")[-1]
    lines = ("distance(left, right) = 40 mm", f"height({last}) = 10 mm", f"distance({last}.left, right) = 40 mm")
    assert facts(*lines, subject=subject).problems == []


def test_facts_follow_the_variant() -> None:
    text = MODEL + "variants v\n    wide long = 60 mm\nexpect bar\n    width(bar) = 40 mm\n"
    assert checked(text).problems == []
    (error,) = checked(text, variant="wide").errors
    assert error.sentence == "`width(bar)` is 60 mm, expected 40 mm"


def test_a_fact_never_depends_on_a_figure() -> None:
    fact = "expect ball\n    volume(ball) = 1 mm3\n"
    words = set()
    for figure in ("", "figure f\n    show ball\n    width 20 mm\n", "figure f\n    show ball\n    width 400 mm\n"):
        run = checked(MODEL + fact + figure)
        words.add(next(error.sentence for error in run.errors))
    assert len(words) == 1


def test_the_list_counts_and_measures() -> None:
    text = MODEL.replace("place ball at (0, 0, 30 mm)", "place ball at (0, 0, 30 mm) row 3 by (0, 50 mm, 0)")
    run = clean(text + "variants v\n    wide long = 60 mm\nfigure f\n    show set\n")
    assert run.model is not None and run.project is not None
    found, problems = scene.listing(run.model, run.project, run.meshes)
    assert problems == ()
    assert [(row.path, row.copies, row.is_assembly) for row in found.parts] == [
        ("set", 1, True), ("set.bar", 1, False), ("set.ball", 3, False), ("set.other", 1, False),
    ]  # fmt: skip
    ball = found.parts[2]
    assert ball.size == pytest.approx((10, 10, 10), abs=0.01)
    assert found.parts[0].volume == pytest.approx(2 * found.parts[1].volume + 3 * ball.volume, rel=1e-9)
    assert [(row.name, row.value, row.allowed) for row in found.parameters] == [("long", "40 mm", "")]
    assert (found.figures, found.variants) == (("f",), ("wide",))


def test_the_list_of_an_assembly_that_holds_nothing() -> None:
    run = clean("part p\n    add sphere diameter 1 mm\nassembly a\n    place p when no\nfigure f\n    show p\n")
    assert run.model is not None and run.project is not None
    found, problems = scene.listing(run.model, run.project, run.meshes)
    assert problems == ()
    assert [(row.path, row.size, row.volume) for row in found.parts] == [("a", (0.0, 0.0, 0.0), 0.0)]
    exported, (problem,) = scene.geometry(run.model, "a", run.meshes)
    assert exported is None and problem.code == "nothing-to-show"


def test_a_path_to_export_is_checked_like_one_in_the_text() -> None:
    run = clean(MODEL)
    assert run.model is not None
    for path, code, sentence in (
        ("sett", "unknown-name", "nothing here is called `sett`"),
        ("set.bra", "unknown-name", "`set` has nothing called `bra`"),
        ("set.bar.left", "wrong-kind", "is a mark or feature"),
        ("1 + 2", "wrong-form", "expected the path"),
        ("steel", "wrong-kind", "expected a part or assembly"),
        ("set.", "broken-value", ""),
    ):
        exported, problems = scene.geometry(run.model, path, run.meshes)
        assert exported is None and len(problems) == 1, path
        assert problems[0].code == code, (path, problems)
        assert sentence in problems[0].sentence
        assert problems[0].span.file == "--of"

"""Highlight, mute, ghost, hide: which parts they reach, and that nothing else moves."""

from __future__ import annotations

import pytest
from platewright.backend import contract
from platewright.backend.contract import Emphasis
from platewright.lang.problems import Problem
from support.scenes import checked, planned

MODEL = """part box
    add block (60 mm, 60 mm, 30 mm)
    mark edge at (30 mm, 0, 0)

part screw
    add cylinder diameter 6 mm length 12 mm

assembly side
    place screw as upper at (0, 0, 20 mm)
    place screw as lower

assembly chest
    place box
    place screw as screws at (20 mm, 0, 30 mm) ring 4
    place side as sides at (45 mm, 0, 0) ring 2
"""


def planned_with(*lines: str, show: str = "show chest") -> contract.Job:
    return planned(MODEL + "figure f\n" + "".join(f"    {line}\n" for line in (show, *lines)), "f")


def stressed(*lines: str, show: str = "show chest") -> dict[str, Emphasis]:
    job = planned_with(*lines, show=show)
    emphasis = job.sheet.panels[0].emphasis
    assert emphasis is not None
    return {
        node.path: Emphasis(int(each)) for node, each in zip(job.geometries[0].nodes, emphasis, strict=True) if each
    }


def the_problem(*lines: str) -> Problem:
    (problem,) = checked(MODEL + "figure f\n    show chest\n" + "".join(f"    {line}\n" for line in lines)).problems
    return problem


@pytest.mark.parametrize(
    ("written", "reached"),
    [
        ("box", ["chest.box"]),
        ("chest.box", ["chest.box"]),
        ("screws[2]", ["chest.screws[2]"]),
        ("screws", [f"chest.screws[{k}]" for k in range(1, 5)]),
        ("sides[1]", ["chest.sides[1]", "chest.sides[1].lower", "chest.sides[1].upper"]),
        ("sides.upper", ["chest.sides[1].upper", "chest.sides[2].upper"]),
        ("sides[2].lower", ["chest.sides[2].lower"]),
        ("box, screws[1]", ["chest.box", "chest.screws[1]"]),
    ],
)
def test_paths_reach_one_copy_all_copies_and_all_that_lies_below(written: str, reached: list[str]) -> None:
    assert sorted(stressed(f"highlight {written}")) == reached


@pytest.mark.parametrize("word", ["highlight", "mute", "ghost", "hide"])
def test_each_word_gives_its_emphasis(word: str) -> None:
    assert stressed(f"{word} box") == {"chest.box": Emphasis[word.upper()]}


def test_the_subject_itself_is_all_of_it() -> None:
    assert len(stressed("mute chest")) == 12


def test_what_is_said_of_a_part_goes_before_what_is_said_of_its_holder_in_any_order() -> None:
    for lines in (("mute chest", "highlight sides[1].upper"), ("highlight sides[1].upper", "mute chest")):
        found = stressed(*lines)
        assert found["chest.sides[1].upper"] is Emphasis.HIGHLIGHT
        assert {each for path, each in found.items() if path != "chest.sides[1].upper"} == {Emphasis.MUTE}


def test_without_a_word_there_is_no_emphasis() -> None:
    assert planned_with().sheet.panels[0].emphasis is None


def test_a_subject_within_the_assembly_has_paths_of_its_own() -> None:
    assert stressed("ghost upper", show="show chest.sides[2]") == {"chest.sides[2].upper": Emphasis.GHOST}


def test_every_view_of_a_set_has_the_emphasis() -> None:
    job = planned_with("third angle front, top, right", "hide screws", "width 120 mm")
    assert {panel.emphasis.tobytes() for panel in job.sheet.panels if panel.emphasis is not None} == {
        job.sheet.panels[0].emphasis.tobytes()  # type: ignore[union-attr]
    }


@pytest.mark.parametrize("line", ["highlight screws", "mute box", "ghost sides", "hide box", "hide sides, screws"])
def test_nothing_moves(line: str) -> None:
    for size in ("width 84 mm", "size 60 mm by 60 mm", "scale standard"):
        plain, other = planned_with(size), planned_with(size, line)
        assert plain.sheet.page == other.sheet.page
        one, two = plain.sheet.panels[0].projection, other.sheet.panels[0].projection
        assert one.world_to_page.tobytes() == two.world_to_page.tobytes()
        assert plain.geometries[0].key == other.geometries[0].key


@pytest.mark.parametrize(
    ("lines", "code", "says", "hint"),
    [
        (("highlight bix",), "unknown-name", "nothing placed in `chest` is called `bix`", "`box`"),
        (("mute screws[5]",), "which-copy", "no such copy of `screws`", ""),
        (("mute box[1]",), "which-copy", "takes no brackets", ""),
        (("ghost sides.middle",), "unknown-name", "`middle`", "`upper`"),
        (("hide box.edge",), "wrong-kind", "a mark", ""),
        (("hide 3 mm",), "wrong-form", "path of a part", ""),
        (("highlight box", "mute box"), "said-twice", "highlight and mute", "leave one out"),
        (("highlight screws", "mute screws[2]"), "said-twice", "highlight and mute", "leave one out"),
        (("highlight box, box",), "said-twice", "again", "leave one out"),
        (("hide chest",), "nothing-to-show", "everything", "hide less"),
    ],
)
def test_mistakes_are_located(lines: tuple[str, ...], code: str, says: str, hint: str) -> None:
    problem = the_problem(*lines)
    assert (problem.code, problem.within) == (code, "f")
    assert says in problem.sentence and hint in problem.hint
    assert problem.span.line == len(MODEL.splitlines()) + 2 + len(lines)

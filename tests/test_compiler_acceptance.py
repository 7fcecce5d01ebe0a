"""Warnings for what stands oddly, and accepting them by name."""

from __future__ import annotations

import io
from pathlib import Path

import pytest
from platewright.compiler import scene
from platewright.compiler.driver.commands import check
from platewright.compiler.driver.crash import Trace
from platewright.compiler.driver.report import Report
from support.scenes import built, loader

HEAD = """platewright 1

part plate
    add block (40 mm, 40 mm, 4 mm)

part pin
    add cylinder diameter 4 mm length 20 mm

"""


def said(text: str, tmp_path: Path, figures: bool = False) -> list[tuple[int, str]]:
    """Lines and codes of all that `check` says."""
    path = tmp_path / "a.plate"
    path.write_text(text, encoding="utf-8")
    out, err = io.StringIO(), io.StringIO()
    check(path, None, figures, "text", None, Trace(), Report(out, err, False, False))
    found = [line for line in err.getvalue().splitlines() if line.startswith("a.plate:")]
    return [(int(line.split(":")[1]), line.rpartition("[")[2].rstrip("]")) for line in found]


@pytest.mark.parametrize(
    ("place", "floats"),
    [
        ("at (0, 0, 4 mm)", False),
        ("at (0, 0, 2 mm)", False),
        ("at (0, 0, -20 mm)", False),
        ("at (22 mm, 0, 0)", False),
        ("at (22.5 mm, 0, 0)", True),
        ("at (0, 0, 4.5 mm)", True),
        ("at (21 mm, 21 mm, 0)", False),
        # The boxes meet, the pin passes the corner.
        ("at (21.8 mm, 21.8 mm, 0)", True),
    ],
)
def test_a_part_that_touches_nothing(place: str, floats: bool, tmp_path: Path) -> None:
    text = f"{HEAD}assembly a\n    place plate\n    place plate as base at (0, 0, -4 mm)\n    place pin {place}\n"
    assert said(text, tmp_path) == ([(12, "floating-part")] if floats else [])


def test_copies_that_float_are_counted_on_their_line(tmp_path: Path) -> None:
    text = f"{HEAD}assembly a\n    place plate\n    place pin at (0, 0, 4 mm) row 5 by (9 mm, 0, 0)\n"
    path = tmp_path / "a.plate"
    assert said(text, tmp_path) == [(11, "floating-part")]
    run = built(path.read_text(encoding="utf-8"))
    assert run.model is not None
    assert [p.sentence for p in scene.prove(run.model, run.meshes)] == [
        "2 of the 5 copies of `pin` touch nothing else in `a`"
    ]


def test_what_stands_apart_altogether_is_said_once(tmp_path: Path) -> None:
    text = f"{HEAD}assembly a\n    place plate\n    place pin at (0, 0, 40 mm) row 5 by (9 mm, 0, 0)\n"
    assert said(text, tmp_path) == [(9, "floating-part")]


def test_assemblies_within_touch_by_their_parts(tmp_path: Path) -> None:
    inner = "assembly stack\n    place plate\n    place pin at (0, 0, 4 mm)\n\n"
    # The boxes of the stacks overlap while only the pin of one comes near the plate of the other.
    near = f"{HEAD}{inner}assembly a\n    place stack\n    place stack as other at (15 mm, 0, 24 mm)\n"
    assert said(near, tmp_path) == []
    far = f"{HEAD}{inner}assembly a\n    place stack\n    place stack as other at (30 mm, 0, 20 mm)\n"
    assert said(far, tmp_path) == [(13, "floating-part")]


@pytest.mark.parametrize(
    ("size", "code"),
    [("0.2 mm", ""), ("0.05 mm", "tiny-model"), ("90 m", ""), ("101 m", "huge-model"), ("1 km", "huge-model")],
)
def test_a_model_of_an_unlikely_size(size: str, code: str, tmp_path: Path) -> None:
    text = f"platewright 1\n\npart p\n    add block ({size}, {size}, {size})\n"
    assert said(text, tmp_path) == ([(3, code)] if code else [])


def test_the_same_thing_twice_by_two_lines(tmp_path: Path) -> None:
    first = f"{HEAD}assembly a\n    place plate\n    place pin at (0, 0, 4 mm)\n"
    text = first + "    place pin as second turn 30 deg at (0, 0, 4 mm)\n"
    assert said(text, tmp_path) == [(12, "coincident-copies")]
    ball = "    add sphere diameter 9 mm\n"
    within = f"platewright 1\n\npart p\n{ball}    add block (1 mm, 1 mm, 9 mm)\n{ball}"
    assert said(within, tmp_path) == [(6, "coincident-copies")]
    refilled = within.replace("add block", "cut block")
    assert said(refilled, tmp_path) == []


FLOATING = (
    f"{HEAD}assembly a\n    place plate\n    place plate as base at (0, 0, -4 mm)\n    place pin at (0, 0, 9 mm)\n"
)


@pytest.mark.parametrize(
    "text",
    [
        FLOATING + '    accept "floating-part"\n',
        FLOATING + '\naccept "floating-part"\n',
        FLOATING.replace("part plate", 'accept "floating-part"\n\npart plate'),
    ],
)
def test_a_warning_is_accepted_by_name(text: str, tmp_path: Path) -> None:
    assert said(text, tmp_path) == []


def test_an_accept_elsewhere_accepts_nothing(tmp_path: Path) -> None:
    text = FLOATING.replace("length 20 mm\n", 'length 20 mm\n    accept "floating-part"\n')
    assert said(text, tmp_path) == [(8, "accepts-nothing"), (13, "floating-part")]


def test_an_accept_of_what_is_not_there(tmp_path: Path) -> None:
    text = FLOATING + '    accept "floating-part", "several-pieces"\n'
    assert said(text, tmp_path) == [(13, "accepts-nothing")]


def test_an_accept_of_no_code(tmp_path: Path) -> None:
    assert (13, "unknown-name") in said(FLOATING + '    accept "floating-parts"\n', tmp_path)


def test_an_error_cannot_be_accepted(tmp_path: Path) -> None:
    text = 'platewright 1\n\naccept "empty-part"\n\npart p\n    accept "empty-part"\n'
    assert (5, "empty-part") in said(text, tmp_path)


def test_an_accept_for_a_figure(tmp_path: Path) -> None:
    viewpoint = "\nviewpoint near\n    eye (0, -60 mm, 40 mm) toward (0, 0, 0)\n    lens 200 mm\n"
    figure = f"{viewpoint}\nfigure f\n    show plate from near\n    size 20 mm by 20 mm\n"
    text = HEAD.replace("\npart pin\n    add cylinder diameter 4 mm length 20 mm\n", "") + figure
    assert [code for _, code in said(text, tmp_path, True)] == ["cropped"]
    assert said(text + '    accept "cropped"\n', tmp_path, True) == []
    # Without laying figures out, nothing can be said of it.
    assert said(text + '    accept "cropped"\n', tmp_path) == []


def test_a_scene_accepts_for_what_it_sees() -> None:
    other = "platewright 1\n\npart pair\n    add sphere diameter 1 mm row 2 by (9 mm, 0, 0)\n"
    main = 'platewright 1\n\nsee "b.plate" as b\naccept "several-pieces"\n\nassembly a\n    place b.pair\n'
    project, problems = scene.open_scene("a.plate", loader({"a.plate": main, "b.plate": other}))
    assert project is not None and problems == ()
    run = scene.build(project)[0]
    assert run is not None
    from support.scenes import Meshes

    (found,) = scene.prove(run, Meshes())
    assert found.code == "several-pieces" and found.span.file == "b.plate"
    assert [each.covers(found) for each in project.acceptances] == [True]


RIM = """platewright 1

outline rim
    from (10 mm, 0)
    to (18 mm, 0)
    to (18 mm, 6 mm)
    to (10 mm, 6 mm)

part segment
    add revolve rim through 120 deg rounded 1 mm
"""


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (RIM, [(10, "sharp-ends")]),
        (RIM.replace("rounded", "chamfered"), [(10, "sharp-ends")]),
        (RIM.replace("through 120 deg ", ""), []),
        (RIM.replace("120 deg", "360 deg"), []),
        (RIM.replace(" rounded 1 mm", ""), []),
        (RIM + '    accept "sharp-ends"\n', []),
    ],
)
def test_plane_ends_of_a_part_of_a_turn_stay_sharp_and_it_is_said(
    text: str, expected: list[tuple[int, str]], tmp_path: Path
) -> None:
    assert said(text, tmp_path) == expected


RELIEF = """platewright 1

part hill
    add relief z = 5 mm + (3 mm if x > 3.3333 mm else 0) over (40 mm, 30 mm)
"""


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (RELIEF, [(4, "coarse-surface")]),
        (RELIEF.replace("(3 mm if x > 3.3333 mm else 0)", "x / 10"), []),
        (RELIEF + '    accept "coarse-surface"\n', []),
    ],
)
def test_a_relief_that_no_grid_follows_is_said(text: str, expected: list[tuple[int, str]], tmp_path: Path) -> None:
    assert said(text, tmp_path) == expected


FIELD = """platewright 1

part tray
    add block (1000 mm, 1000 mm, 4 mm)

part pin
    add cylinder diameter 4 mm length 10 mm

part post
    add cylinder diameter 20 mm length 30 mm

assembly bed
    place tray
    place post at (0, 0, 4 mm)
    place pin at (i * 10 mm + 15 mm, -455 mm, 4 mm) row 90 by (0, 10 mm, 0) for i from 1 to 20
"""


def test_in_a_model_of_many_copies_what_is_lost_is_found_and_what_is_not_judged_is_said(tmp_path: Path) -> None:
    """1 800 pins on a tray are more gaps than are measured; but those of single things come first, and that nothing
    is near the one above takes none.
    """
    beside = "    place pin as beside at (9 mm, 9 mm, 4.5 mm)\n"
    lost = "    place pin as lost at (0, 0, 100 mm)\n"
    expected = [(12, "unjudged-contacts"), (16, "floating-part"), (17, "floating-part")]
    assert said(FIELD + beside + lost, tmp_path) == expected
    assert said(FIELD + '    accept "unjudged-contacts"\n', tmp_path) == []
    assert said(FIELD.replace("row 90", "row 9"), tmp_path) == []

"""Names: what is reported of names that are unknown, hidden, unused, or stand in other files."""

from __future__ import annotations

from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st
from platewright.compiler import scene
from platewright.compiler.ordering import order
from platewright.compiler.project import beside
from platewright.lang.problems import Severity
from support.scenes import MAIN, built, checked, clean, loader

BALL = "part ball\n    add sphere diameter 4 mm\n"
SCREWS = (
    "given\n    pitch = 1 mm\nderived\n    half(x) = x / 2\n    twice = 2 * pitch\n"
    "outline disc(d)\n    circle diameter d\n"
    "part screw(d = 4 mm)\n    add cylinder diameter d length 10 * pitch\n    mark head at (0, 0, 10 mm)\n"
    "assembly pair\n    place screw as one\n    place screw as two at (9 mm, 0, 0)\n"
    "viewpoint side\n    orthographic from right\n"
)


def test_names_of_a_seen_file_stand_under_its_prefix() -> None:
    text = 'see "parts/screws.plate" as screws\npart plate\n    made of steel\n'
    text += "    add extrude screws.disc(d = 20 mm) by 2 mm\n"
    text += "    cut cylinder diameter screws.half(screws.twice) length 9 mm centred\nmaterial steel\n    metal iron\n"
    text += (
        "assembly a\n    place plate\n    place screws.screw(d = 3 mm) at (0, 0, 2 mm)\n    place screws.pair as pair\n"
    )
    text += "figure f\n    show a from screws.side\n"
    text += "expect a\n    distance(screw.head, pair.two.head) >= screws.pitch\n"
    text += "expect screws.pair\n    width(one) = 4 * screws.pitch within 1 %\n"
    run = clean(text, {"parts/screws.plate": SCREWS})
    assert run.model is not None and run.project is not None
    assert [row.path for row in scene.listing(run.model, run.project, run.meshes)[0].parts] == [
        "a", "a.plate", "a.screw", "a.pair", "a.pair.one", "a.pair.two",
    ]  # fmt: skip
    found, problems = scene.geometry(run.model, "screws.pair.one", run.meshes)
    assert problems == () and found is not None and len(found.geometry.nodes) == 1


def test_a_seen_file_keeps_its_defaults_whatever_is_set() -> None:
    text = 'see "screws.plate" as screws\ngiven\n    pitch = 9 mm\nassembly a\n    place screws.screw\n'
    text += "    place screws.screw as far at (0, 0, pitch * 9)\n"
    run = built(text, {"screws.plate": SCREWS}, settings=(("pitch", "7 mm"),))
    assert run.problems == [] and run.model is not None and run.project is not None
    rows = {row.path: row.size for row in scene.listing(run.model, run.project, run.meshes)[0].parts}
    assert rows["a.screw"] == pytest.approx((4, 4, 10))


def test_files_see_each_other_in_steps_and_relative_to_themselves() -> None:
    files = {
        "lib/a.plate": 'see "b.plate" as b\nsee "../c.plate" as c\npart x\n    add b.y\n    add c.z at (0, 0, 9 mm)\n'
        "    add block (2 mm, 2 mm, 9 mm)\n",
        "lib/b.plate": "part y\n    add sphere diameter 4 mm\n",
        "c.plate": "part z\n    add sphere diameter 3 mm\n",
    }
    run = clean('see "lib/a.plate" as a\nassembly s1\n    place a.x\n', files)
    assert run.project is not None and set(run.project.texts) == {MAIN, *files}


@pytest.mark.parametrize(
    ("wanted", "target"),
    [
        ("a.plate", "d/a.plate"),
        ("./a.plate", "d/a.plate"),
        ("../a.plate", "a.plate"),
        ("x/../a.plate", "d/a.plate"),
        ("..a.plate", "d/..a.plate"),
        ("../../a.plate", None),
        ("/a.plate", None),
        ("", None),
        ("c:/a.plate", None),
        ("a\\b.plate", None),
        ("a\0b", None),
    ],
)
def test_a_file_is_named_from_the_one_that_sees_it_and_stays_in_the_project(wanted: str, target: str | None) -> None:
    assert beside("d/e.plate", wanted) == target


def test_each_file_is_asked_for_once() -> None:
    asked: list[str] = []
    files = {
        MAIN: 'see "a.plate" as a\nsee "b.plate" as b\n' + BALL,
        "a.plate": 'see "c.plate" as c\n',
        "c.plate": BALL,
    }
    files["b.plate"] = 'see "c.plate" as c\nsee "a.plate" as a\n'
    answer = loader(files)

    def load(name: str) -> bytes | scene.Refusal:
        asked.append(name)
        return answer(name)

    project, problems = scene.open_scene(MAIN, load)
    assert project is not None and problems == ()
    assert sorted(asked) == sorted(files)


def test_an_unreadable_main_file_gives_one_problem_and_no_project() -> None:
    for reason, words in (("missing", "there is no file"), ("too large", "limit"), ("surprising", "cannot be read")):
        project, (problem,) = scene.open_scene("s.plate", lambda name, reason=reason: scene.Refusal(reason))
        assert project is None and words in problem.sentence and "`s.plate`" in problem.sentence


def test_warnings_for_what_is_never_used() -> None:
    text = (
        "given\n    used = 4 mm\n    idle = 5 mm\n" + BALL + "part disc\n    add cylinder diameter used length 2 mm\n"
    )
    text += "assembly a\n    place disc\n"
    run = checked(text)
    assert [(each.code, each.severity, each.span.line) for each in run.problems] == [
        ("unused-parameter", Severity.WARNING, 3),
        ("never-placed", Severity.WARNING, 4),
    ]


def test_a_misspelt_use_is_a_use() -> None:
    run = checked(BALL + "figure f\n    show bal\n")
    assert [(each.code, each.hint) for each in run.problems] == [("unknown-name", "did you mean `ball`?")]


def test_a_part_is_used_by_a_figure_by_another_part_or_by_an_assembly() -> None:
    parts = BALL + "part shown\n    add sphere diameter 5 mm\npart inner\n    add sphere diameter 3 mm\n"
    text = parts + "part outer\n    add inner\nassembly a\n    place ball\n    place outer at (9 mm, 0, 0)\n"
    assert clean(text + "figure f\n    show shown\n").problems == []


def test_a_lone_part_needs_no_assembly() -> None:
    assert clean(BALL).model is not None


def test_a_parameter_is_used_by_a_text_a_variant_or_a_default() -> None:
    text = 'given\n    tall = 4 mm\n    name = "ball"\n' + "part p(d = tall)\n    add sphere diameter d\n"
    text += "figure f\n    show p\n" + '    title "{name}, {tall}"\n'
    run = clean(text)
    assert run.model is not None
    job, _ = scene.plan(run.model, "f", run.meshes)
    assert job is not None and job.sheet.title == "ball, 4 mm"


@pytest.mark.parametrize("slip", ["flnage", "flang", "flangee", "flamge", "Flange"])
def test_a_slip_of_a_name_is_hinted(slip: str) -> None:
    run = built(f"given\n    flange = 4 mm\npart p\n    add sphere diameter {slip}\n")
    (error,) = run.errors
    assert error.sentence == f"nothing here is called `{slip}`"
    assert error.hint == "did you mean `flange`?"


def test_names_in_reach_count_parameters_values_and_functions() -> None:
    text = "derived\n    pitch(d) = 0.2 * d\npart p(span = 9 mm)\n    derived\n        height = span / 3\n"
    for slip, near in (("hieght", "height"), ("sapn", "span"), ("ptich(1 mm)", "pitch"), ("rooot(4) * 1 mm", "root")):
        (error,) = built(text + f"    add sphere diameter {slip}\n").errors
        assert error.hint == f"did you mean `{near}`?"


@pytest.mark.parametrize(
    "body",
    [
        "part q(d)\n    add sphere diameter d + nowhere\n",
        "part q(d)\n    derived\n        e = d + nowhere\n    add sphere diameter e\n",
        "part q(d)\n    add sphere diameter d at (nowhere, 0, 0)\n",
        "part q(d)\n    add sphere diameter d when nowhere\n",
        "part q(d)\n    mark tip at (0, 0, nowhere)\n    add sphere diameter d\n",
        "part q(d)\n    add nowhere\n    add sphere diameter d\n",
        "part q(d)\n    made of nowhere\n    add sphere diameter d\n",
        "part q(d)\n    add extrude nowhere by d\n",
        "part q(d)\n    add\n        sphere diameter d\n        sphere diameter nowhere\n",
        "part q(d)\n    add sphere diameter i * d at (i * d, 0, 0) for i from 1 to nowhere\n",
        "part q(d, e = nowhere)\n    add sphere diameter d + e\n",
        "assembly q(d)\n    place ball at (0, 0, d)\n    place nowhere\n",
        "assembly q(d)\n    place ball at (0, 0, d) turn nowhere about x\n",
        "outline q(d)\n    circle diameter d + nowhere\n",
        "derived\n    f(x) = x + nowhere\n",
        "derived\n    f(x) = nowhere(x)\n",
    ],
)
def test_an_unknown_name_is_found_in_a_body_that_is_never_evaluated(body: str) -> None:
    run = built(BALL + body)
    (error,) = run.errors
    assert error.code == "unknown-name"
    assert error.sentence == "nothing here is called `nowhere`"


def test_names_that_are_known_in_a_body_are_left_alone() -> None:
    text = "part q(d)\n    derived\n        half(x) = x / 2\n    mark axle at (0, 0, d) along x\n"
    text += "    add sphere diameter half(d) turn 90 deg about axle facing -y ring 4 about axle\n"
    text += "    cut sphere diameter i * d at (i * d, 0, 0) for i from 1 to 3 when i is not 2\n"
    text += '    cut sphere diameter row.d at (row.x, 0, pi * d) for row over "t.csv"\n'
    run = built(BALL + text, {"t.csv": "name,x mm,d mm\na,1,2\n"})
    assert run.problems == []


def test_all_independent_mistakes_come_in_one_run_and_nothing_that_follows_from_them() -> None:
    text = (
        "given\n    d = 4 mm range 5 mm .. 9 mm\n    e = 4 mm +\n"
        "part p\n    add sphere diameter d\n    add sphere diameter e\n    add sphere diametre 3 mm\n"
        "part q\n    add block (1 mm, 2 mm, 3 deg)\n"
        "part s1\n    add sphere diameter 2 mm\n"
        "assembly a\n    place p\n    place s1 at (0, 0, 9)\n    place r\n"
        "figure f\n    show a\n    width 9 deg\n"
        "expect a\n    height(p) = 4 mm\n"
    )
    run = checked(text)
    assert [(each.span.line, each.code) for each in run.errors] == [
        (3, "broken-value"), (7, "unknown-word"), (15, "unknown-name"), (2, "out-of-range"), (9, "wrong-kind"),
        (14, "wrong-kind"), (18, "wrong-kind"),
    ]  # fmt: skip


graphs = st.dictionaries(st.integers(0, 12), st.lists(st.integers(0, 12), max_size=4), max_size=13).map(
    lambda found: {str(key): [str(each) for each in values] for key, values in found.items()}
)


@given(graphs)
def test_an_order_puts_everything_behind_what_it_depends_on(depends: dict[str, list[str]]) -> None:
    sequence, circles = order(depends)
    place = {name: k for k, name in enumerate(sequence)}
    assert len(place) == len(sequence)
    for name in sequence:
        assert all(place[each] < place[name] for each in depends[name] if each in depends)
    for circle in circles:
        assert circle[0] == circle[-1]
        assert all(after in depends[before] for before, after in pairwise(circle))
        assert not set(circle) & set(sequence)
    assert bool(circles) == (len(sequence) < len(depends))

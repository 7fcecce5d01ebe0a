"""Parameters, variants and settings: what may be set from outside, from where, and to what."""

from __future__ import annotations

import pytest
from platewright.compiler import scene
from platewright.lang.problems import Problem
from support.scenes import Run, built, checked, planned

PART = "part p\n    add cylinder diameter d length 10 mm\n"


def given(*lines: str) -> str:
    return "given\n" + "".join(f"    {line}\n" for line in lines)


def listed(run: Run, name: str) -> str:
    assert run.model is not None and run.project is not None, run.sentences
    found, problems = scene.listing(run.model, run.project, run.meshes)
    assert problems == ()
    return next(row.value for row in found.parameters if row.name == name)


def error_of(run: Run) -> Problem:
    (error,) = run.errors
    return error


def test_a_setting_from_outside_replaces_the_default_and_what_follows_from_it() -> None:
    text = given("d = 4 mm") + "derived\n    e = 2 * d\n" + PART.replace("diameter d", "diameter e")
    assert listed(built(text), "d") == "4 mm"
    run = built(text, settings=(("d", "1/2 inch"),))
    assert listed(run, "d") == "12.7 mm"
    assert run.model is not None and run.project is not None
    rows = scene.listing(run.model, run.project, run.meshes)[0].parts
    assert rows[0].size == pytest.approx((25.4, 25.4, 10.0))


def test_settings_are_evaluated_and_their_mistakes_located_in_the_option() -> None:
    text = given("d = 4 mm") + PART
    assert listed(built(text, settings=(("d", "2 * 3 mm"),)), "d") == "6 mm"
    problem = error_of(built(text, settings=(("d", "4 deg"),)))
    assert (problem.code, problem.span.file) == ("wrong-kind", "--set d")
    assert problem.sentence == "`d` is a length, found an angle"
    problem = error_of(built(text, settings=(("d", "4"),)))
    assert problem.hint == "give it a unit, such as `4 mm`"
    assert error_of(built(text, settings=(("d", "(4"),))).span.file == "--set d"
    problem = error_of(built(text, settings=(("dd", "4 mm"),)))
    assert problem.sentence == "there is no parameter `dd` to set"
    assert error_of(built(text, settings=(("d", "4 mm"), ("d", "5 mm")))).code == "said-twice"


@pytest.mark.parametrize("inside", ["1 mm", "3 mm", "5 mm", "1/8 inch"])
def test_a_range_includes_both_its_ends(inside: str) -> None:
    run = built(given("d = 2 mm range 1 mm .. 5 mm") + PART, settings=(("d", inside),))
    assert run.errors == []


@pytest.mark.parametrize("outside", ["0.999 mm", "5.001 mm", "0", "-3 mm"])
def test_a_value_outside_its_range_is_refused_and_both_are_named(outside: str) -> None:
    problem = error_of(built(given("d = 2 mm range 1 mm .. 5 mm") + PART, settings=(("d", outside),)))
    assert problem.code == "out-of-range"
    assert "outside its range 1 mm .. 5 mm" in problem.sentence
    assert [each.words for each in problem.related] == ["declared here"]


def test_a_range_may_use_other_values() -> None:
    text = given("d = 4 mm range least .. 2 * least", "least = 3 mm") + PART
    assert built(text).errors == []
    assert "outside its range 5 mm .. 10 mm" in error_of(built(text, settings=(("least", "5 mm"),))).sentence


def test_a_bare_zero_takes_the_dimension_of_its_range() -> None:
    text = given("gap = 0 range 0 mm .. 5 mm") + "part p\n    add cylinder diameter 4 mm + gap length 10 mm\n"
    assert listed(built(text), "gap") == "0 mm"
    assert listed(built(text, settings=(("gap", "2 mm"),)), "gap") == "2 mm"
    assert error_of(built(text, settings=(("gap", "2 deg"),))).code == "wrong-kind"


def test_choices_of_texts_and_of_numbers() -> None:
    text = given('kind = "round" one of "round", "square"', "n = 4 one of 3, 4, 6", "d = 25.4 mm one of 0, 1 inch") + (
        'part p\n    add cylinder diameter d length 4 mm when kind is "round"\n'
        '    add prism sides n across d length 4 mm when kind is "square"\n'
    )
    assert built(text).errors == []
    assert built(text, settings=(("kind", '"square"'), ("n", "6"))).errors == []
    problem = error_of(built(text, settings=(("kind", '"sqare"'),)))
    assert problem.sentence == '`kind` is "sqare", expected one of "round", "square"'
    assert problem.hint == 'did you mean "square"?'
    problem = error_of(built(text, settings=(("n", "5"),)))
    assert problem.sentence == "`n` is 5, expected one of 3, 4, 6"
    assert error_of(built(text, settings=(("n", '"4"'),))).sentence == "`n` is a number, found a text"
    assert listed(built(text, settings=(("d", "1 inch"),)), "d") == "25.4 mm"
    assert "more than 0" in error_of(built(text, settings=(("d", "0"),))).sentence


def test_one_wrong_default_is_one_problem_however_often_it_is_used() -> None:
    text = given("d = 1 mm + 1 deg", "e = 2 * d") + PART + "part q\n    add sphere diameter e\n"
    assert error_of(built(text)).span.line == 2


def test_variants_inline_and_over_a_table_are_the_same() -> None:
    body = given("d = 4 mm", "opened = no", 'kind = "round"') + PART + "part q\n    add sphere diameter d when opened\n"
    body += '    add sphere diameter 1 mm when kind is "round"\n    add sphere diameter 2 mm when kind is "flat"\n'
    inline = body + 'variants v\n    small d = 5 mm, kind = "flat"\n    large d = 1 inch, opened = yes\n    plain\n'
    table = "name,d mm,opened,kind\nsmall,5,,flat\nlarge,25.4,yes,\nplain,,,\n"
    over = body + 'variants v over "sizes.csv"\n'
    for name, d, opened, kind in (
        ("small", "5 mm", "no", '"flat"'),
        ("large", "25.4 mm", "yes", '"round"'),
        ("plain", "4 mm", "no", '"round"'),
    ):
        for run in (built(inline, variant=name), built(over, {"sizes.csv": table}, name)):
            assert [listed(run, each) for each in ("d", "opened", "kind")] == [d, opened, kind]


def test_variants_keep_the_order_of_the_text_and_say_where_they_stand() -> None:
    text = given("d = 4 mm") + PART + 'variants one\n    b d = 5 mm\n    a\nvariants two over "t.csv"\n'
    run = built(text, {"t.csv": "name,d mm\nz,1\ny,2\n"})
    assert run.project is not None
    assert [(each.name, each.set_name) for each in run.project.variants] == [
        ("b", "one"), ("a", "one"), ("z", "two"), ("y", "two"),
    ]  # fmt: skip
    assert [(each.span.file, each.span.line) for each in run.project.variants[1:3]] == [
        ("scene.plate", 7),
        ("t.csv", 2),
    ]


def test_a_setting_on_top_of_a_variant_wins() -> None:
    text = given("d = 4 mm") + PART + "variants v\n    wide d = 9 mm\n"
    assert listed(built(text, variant="wide"), "d") == "9 mm"
    assert listed(built(text, variant="wide", settings=(("d", "7 mm"),)), "d") == "7 mm"


def test_a_wrong_cell_is_located_at_the_cell() -> None:
    text = given("d = 4 mm range 1 mm .. 6 mm") + PART + 'variants v over "t.csv"\n'
    problem = error_of(built(text, {"t.csv": "name,note,d mm\n".replace("note,", "") + "\nbig,  9\n"}, "big"))
    assert (problem.span.file, problem.span.line, problem.span.column) == ("t.csv", 3, 7)
    problem = error_of(built(text, {"t.csv": "name,d deg\na,1\n"}, "a"))
    assert problem.sentence == "`d` is a length, found an angle"


@pytest.mark.parametrize(
    ("cells", "kind", "row"),
    [
        ("1,2", "a number", 0),
        ("yes,no", "yes or no", 0),
        ("round,flat", "a text", 1),
        ("4,flat", "a text", 0),
        ("yes,maybe", "a text", 0),
    ],
)
def test_a_column_without_unit_is_of_one_kind_throughout(cells: str, kind: str, row: int) -> None:
    first, second = cells.split(",")
    text = given("k = (1, 2, 3)") + "part p\n    add sphere diameter length(k) * 1 mm\n" + 'variants v over "t.csv"\n'
    run = built(text, {"t.csv": f"name,k\na,{first}\nb,{second}\n"}, "ab"[row])
    assert error_of(run).sentence == f"`k` is a direction, found {kind}"


def test_a_table_may_have_quotes_a_byte_order_mark_and_carriage_returns() -> None:
    text = given("d = 4 mm", 'kind = "a"') + PART.replace("length 10 mm", 'length 10 mm when kind is not "x"')
    text += 'variants v over "t.csv"\n'
    table = '\ufeffname,d mm,kind\r\n"first, of two",1e1,"say ""so"""\r\n'
    run = built(text, {"t.csv": table}, "first, of two")
    assert listed(run, "d") == "10 mm"
    assert listed(run, "kind") == '"say "so""'


def test_a_figure_with_settings_shows_a_model_of_its_own() -> None:
    text = (
        given("d = 4 mm", "wide = no") + "part p\n    add block (d, d, d)\n    add block (9 mm, 1 mm, 1 mm) when wide\n"
    )
    text += "figure a\n    show p from front\n    scale 1:1\n    margin 0 mm\n    drawn as tone\n"
    text += "figure b\n    show p from front\n    scale 1:1\n    margin 0 mm\n    drawn as tone\n"
    text += "    with d = 2 * d, wide = yes\n"
    for figure, size in (("a", (4.0, 4.0)), ("b", (9.0, 8.0))):
        page = planned(text, figure).sheet.page
        assert (page.width, page.height) == pytest.approx(size)


def test_a_mistake_in_a_figures_settings_is_confined_to_the_figure() -> None:
    text = given("d = 4 mm range 1 mm .. 5 mm") + PART + "figure a\n    with d = 9 mm\nfigure b\n    width 50 mm\n"
    run = checked(text)
    problem = error_of(run)
    assert problem.within == "a" and problem.code == "out-of-range"
    assert run.model is not None
    assert scene.plan(run.model, "b", run.meshes)[0] is not None
    job, problems = scene.plan(run.model, "a", run.meshes)
    assert job is None and problems == (problem,)
    with pytest.raises(KeyError):
        scene.plan(run.model, "c", run.meshes)


def test_things_take_values_by_place_and_by_name() -> None:
    text = "part screw(d = 4 mm, l = 10 mm)\n".replace("l =", "long =") + "    add cylinder diameter d length long\n"
    text += "assembly a\n    place screw\n    place screw(6 mm) as thick at (20 mm, 0, 0)\n"
    text += "    place screw(long = 20 mm) as tall at (40 mm, 0, 0)\n"
    run = checked(text)
    assert run.problems == [] and run.model is not None and run.project is not None
    rows = {row.path: row.size for row in scene.listing(run.model, run.project, run.meshes)[0].parts}
    assert rows["a.screw"] == pytest.approx((4, 4, 10))
    assert rows["a.thick"] == pytest.approx((6, 6, 10))
    assert rows["a.tall"] == pytest.approx((4, 4, 20))


def test_a_default_may_use_the_parameters_before_it() -> None:
    text = "part p(d = 4 mm, e = 2 * d)\n    add cylinder diameter d length e\nassembly a\n    place p(3 mm)\n"
    run = checked(text)
    assert run.problems == [] and run.model is not None and run.project is not None
    rows = {row.path: row.size for row in scene.listing(run.model, run.project, run.meshes)[0].parts}
    assert rows["a.p"] == pytest.approx((3, 3, 6))


def test_a_bare_zero_given_to_a_thing_is_the_zero_it_wants() -> None:
    text = "part p(gap = 1 mm)\n    add cylinder diameter 4 mm length 4 mm + gap\nassembly a\n    place p(0)\n"
    text += "    place p(0 mm) as q at (9 mm, 0, 0)\n"
    run = checked(text)
    assert run.problems == [] and run.model is not None
    (root,) = (run.model.built.things["a"],)
    assert root.occurrences[0].copies[0].thing is root.occurrences[1].copies[0].thing  # type: ignore[union-attr]


def test_values_inside_a_part_follow_its_parameters() -> None:
    text = "part bucket(span = 90 mm)\n    derived\n        tall = wide / 3\n        wide = half(span)\n"
    text += "        half(x) = x / 2\n    add block (span, wide, tall)\n"
    run = checked(text)
    assert run.problems == [] and run.model is not None and run.project is not None
    assert scene.listing(run.model, run.project, run.meshes)[0].parts[0].size == pytest.approx((90, 45, 15))


def test_an_inch_and_its_millimetres_give_identical_jobs() -> None:
    text = (
        given("d = 1 inch") + "part p\n    add cylinder diameter d length 2 * d\n"
        "    cut sphere diameter d at (0, 0, d)\n"
    )
    text += "figure f\n    show p\n    width 3 inch\n"
    other = text.replace("1 inch", "25.4 mm").replace("3 inch", "76.2 mm")
    first, second = planned(text, "f"), planned(other, "f")
    for one, two in zip(first.geometries, second.geometries, strict=True):
        assert one.key == two.key
        assert one.vertices.tobytes() == two.vertices.tobytes()
        assert one.faces.tobytes() == two.faces.tobytes()
    assert first.sheet.page == second.sheet.page
    matrices = [job.sheet.panels[0].projection.world_to_page.tobytes() for job in (first, second)]
    assert matrices[0] == matrices[1]
    assert first.sheet.panels[0].lighting == second.sheet.panels[0].lighting

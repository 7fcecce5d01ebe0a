"""Problems as text, JSON and SARIF."""

from __future__ import annotations

import json
from typing import Any

import pytest
from platewright.lang.codes import CODES
from platewright.lang.problems import Problem, Related, Severity, is_error
from platewright.lang.reader import read_scene
from platewright.lang.render import render_json, render_sarif, render_text
from platewright.lang.source import Span

TEXT = "part can\n    add sphere diameter (3 mm\nfigure f\n    width 3 mm\n    width 4 mm\n    items\n"


def test_text_shows_the_line_a_caret_the_hint_and_related_places() -> None:
    problems = read_scene("can.plate", TEXT)[1]
    assert (
        render_text(problems, {"can.plate": TEXT})
        == """\
can.plate:2:30: error: expected `)`: brackets close on their line [unclosed-bracket]
 2 |     add sphere diameter (3 mm
   |                              ^
    hint: put `)` where the value ends
    can.plate:2:25: opened here
 2 |     add sphere diameter (3 mm
   |                         ^

can.plate:5:5: error: `width` is said twice [said-twice]
 5 |     width 4 mm
   |     ^^^^^
    hint: keep one of the two
    can.plate:4:5: said here first
 4 |     width 3 mm
   |     ^^^^^

can.plate:6:5: error: `items` is a word of the language that is not drawn yet [not-drawn-yet]
 6 |     items
   |     ^^^^^
    in the figure f
"""
    )


def test_text_of_nothing_is_empty() -> None:
    assert render_text((), {}) == ""


def problem_at(span: Span) -> Problem:
    return Problem("tab", Severity.WARNING, span, "a sentence")


def test_text_without_the_source_and_with_long_or_odd_lines() -> None:
    assert render_text([problem_at(Span("gone", 1, 1, 1, 2))], {}) == "gone:1:1: warning: a sentence [tab]\n"
    long_line = "x" * 500 + "HERE" + "y" * 500
    shown = render_text([problem_at(Span("a", 1, 501, 1, 505))], {"a": long_line}).split("\n")
    assert len(shown[1]) < 160 and shown[1][shown[2].index("^") :][:4] == "HERE" and shown[2].count("^") == 4
    odd = render_text([problem_at(Span("a", 1, 2, 1, 3))], {"a": "\ufeffx\x1b[31m\r\n"})
    assert "\x1b" not in odd and "\r" not in odd
    beyond = render_text([problem_at(Span("a", 9, 1, 9, 2))], {"a": "x"})
    assert beyond == "a:9:1: warning: a sentence [tab]\n"


def test_json_carries_every_field() -> None:
    problems = read_scene("can.plate", TEXT)[1]
    document = json.loads(render_json(problems))
    assert document["schema"] == 1 and len(document["problems"]) == 3
    first = document["problems"][0]
    assert (first["file"], first["line"], first["column"], first["end_column"]) == ("can.plate", 2, 30, 30)
    assert first["code"] == "unclosed-bracket" and first["severity"] == "error" and first["hint"]
    assert first["related"][0]["words"] == "opened here" and document["problems"][2]["within"] == "f"


def test_sarif_has_the_shape_of_its_standard() -> None:
    # SARIF 2.1.0 (OASIS, 27 March 2020): 3.13 version and runs, 3.14.17 columnKind, 3.19 tool component, 3.27 result,
    # 3.30 region with lines and columns from 1 and an exclusive end column, 3.49 reporting descriptor.
    related = Related(Span("b é.plate", 1, 1, 1, 2), "here")
    note = Problem("x-other", Severity.NOTE, Span("b é.plate", 3, 4, 3, 9), "said", "do", (related,), "f")
    log: dict[str, Any] = json.loads(render_sarif([*read_scene("can.plate", TEXT)[1], note], "1.2", {**CODES}))
    assert log["version"] == "2.1.0" and len(log["runs"]) == 1
    run = log["runs"][0]
    assert run["columnKind"] == "unicodeCodePoints"
    rules = run["tool"]["driver"]["rules"]
    assert [rule["id"] for rule in rules] == sorted({result["ruleId"] for result in run["results"]})
    for result in run["results"]:
        assert rules[result["ruleIndex"]]["id"] == result["ruleId"]
        assert result["level"] in ("error", "warning", "note") and result["message"]["text"]
        region = result["locations"][0]["physicalLocation"]["region"]
        assert min(region.values()) >= 1
    last = run["results"][-1]
    assert last["locations"][0]["physicalLocation"]["artifactLocation"]["uri"] == "b%20%C3%A9.plate"
    assert last["level"] == "note" and last["relatedLocations"][0]["message"]["text"] == "here"
    assert "version" not in json.loads(render_sarif([]))["runs"][0]["tool"]["driver"]


@pytest.mark.parametrize(
    ("severity", "stops"), [(Severity.ERROR, True), (Severity.WARNING, False), (Severity.NOTE, False)]
)
def test_only_errors_stop_output(severity: Severity, stops: bool) -> None:
    assert is_error(Problem("tab", severity, Span("a", 1, 1, 1, 1), "s")) is stops

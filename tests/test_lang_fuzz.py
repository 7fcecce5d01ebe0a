"""No text makes the language raise or hang, and what it reports lies inside the text."""

from __future__ import annotations

import random
import re

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.lang.layout import PROBLEMS_LIMIT
from platewright.lang.printer import format_text
from platewright.lang.reader import read_scene, read_value
from platewright.lang.render import render_json, render_sarif, render_text
from platewright.lang.words import ROWS
from support.scene_texts import SAMPLE, framed

FRAGMENTS = [
    *re.findall(r"\w+|\s+|[^\w\s]", SAMPLE),
    *("(", ")", "[", "]", ",", "..", "#", '"', "{", "}", "\\", "-", "=", "\n", "\n    ", "\t", " "),
    *("is", "not", "if", "else", "yes", "1/2", "0.5in", "degC", "1e9", "2026-06-21", "1:2", "é", "\x00", "\u2028"),
]
SEEDS = [SAMPLE, *(framed(row, row.stands[0]) for row in ROWS)]


def survives(text: str) -> None:
    scene, problems = read_scene("a.plate", text)
    lines = text.removeprefix("\ufeff").split("\n")
    for problem in problems:
        span = problem.span
        assert 1 <= span.line <= span.end_line <= len(lines)
        assert 1 <= span.column <= max(len(line) for line in lines) * 4 + 2
        assert problem.sentence and "\n" not in problem.sentence
    assert read_scene("a.plate", text) == (scene, problems)
    assert render_text(problems, {"a.plate": text}).count("[") >= len(problems)
    render_json(problems)
    render_sarif(problems)
    formatted, _ = format_text("a.plate", text)
    if formatted is not None:
        assert format_text("a.plate", formatted) == (formatted, ())


@given(st.lists(st.sampled_from(FRAGMENTS), max_size=60).map("".join))
@settings(derandomize=True, deadline=None, max_examples=250)
def test_fragments_of_scenes_in_any_order(text: str) -> None:
    survives(text)
    read_value("set", text)


@given(st.text(max_size=200))
@settings(derandomize=True, deadline=None, max_examples=100)
def test_any_characters(text: str) -> None:
    survives(text)
    read_value("set", text)


@given(st.binary(max_size=300))
@settings(derandomize=True, deadline=None, max_examples=60)
def test_any_bytes_that_a_loader_might_let_through(data: bytes) -> None:
    survives(data.decode("utf-8", errors="replace"))
    survives(data.decode("latin-1"))


@pytest.mark.parametrize("seed", range(120))
def test_scenes_with_slips_of_the_hand(seed: int) -> None:
    r = random.Random(seed)
    text = r.choice(SEEDS)
    for _ in range(r.randrange(1, 5)):
        at = r.randrange(len(text) + 1)
        match r.randrange(4):
            case 0:
                text = text[:at] + text[at + r.randrange(1, 4) :]
            case 1:
                text = text[:at] + r.choice(FRAGMENTS) + text[at:]
            case 2:
                text = text[:at] + text[at : at + 2][::-1] + text[at + 2 :]
            case _:
                other = r.choice(SEEDS)
                start = r.randrange(len(other))
                text = text[:at] + other[start : start + r.randrange(1, 40)] + text[at:]
    survives(text)


@pytest.mark.parametrize(
    "text",
    [
        "(" * 400_000,
        "\n" * 199_999,
        "x\n" * 199_999,
        "#\n" * 199_999,
        "part a\n" * 40_000,
        '"' + "\\" * 9_000,
        "a" * 9_999,
        "1." * 4_999,
        "- " * 4_999,
        " " * 9_000 + "#",
        '"{' * 3_000,
        "\n".join(" " * (i % 60) + "x" for i in range(20_000)),
        "variants v\n" + "    a b = 1, c = 2\n" * 5_000,
    ],
    ids=lambda text: repr(text[:8]),
)
def test_large_and_hostile_texts_come_to_an_end_with_few_problems(text: str) -> None:
    problems = read_scene("a.plate", text)[1]
    assert len(problems) <= PROBLEMS_LIMIT + 1
    assert bool(problems) == bool(text.strip() and not text.startswith(("variants", "part a", " ", "#")))

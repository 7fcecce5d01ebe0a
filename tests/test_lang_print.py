"""Printing: reading what was printed gives the same tree, formatting is idempotent, and no comment is lost."""

from __future__ import annotations

import random
import re

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from platewright.lang import printer, values
from platewright.lang.items import Place
from platewright.lang.parser import value_parser
from platewright.lang.printer import format_text, print_expression
from platewright.lang.reader import read_scene, read_value
from platewright.lang.row import Row
from platewright.lang.scanner import split_items
from platewright.lang.source import Span
from platewright.lang.tree import (
    Binary,
    Call,
    Choice,
    Date,
    Expression,
    Number,
    Path,
    Range,
    Ratio,
    Setting,
    Step,
    Text,
    Truth,
    Tuple,
    Unary,
)
from platewright.lang.words import ROWS
from support.scene_texts import SAMPLE, framed, without_places

S = Span("set", 1, 1, 1, 1)
NAMES = st.sampled_from(["a", "rim", "throat_2", "x", "mm2_", "tilt"])
NUMBERS = st.builds(
    Number,
    st.sampled_from(["0", "1", "2.50", "1e-3", "12"]),
    st.sampled_from(["", "", "mm", "inch", "deg", "%", "g/cm3", "degC"]),
    st.just(S),
) | st.builds(Number, st.just("1/2"), st.sampled_from(["inch", "mm", "%"]), st.just(S))
STRETCHES = st.text(alphabet='ab {}"\\\n#,', min_size=1, max_size=6)


PLAIN_PATHS = st.builds(
    Path, st.lists(NAMES.map(lambda name: Step(name, None, S)), min_size=1, max_size=2).map(tuple), st.just(S)
)


def not_celsius(node: Expression) -> bool:
    """A sign before a literal in degC belongs to the literal, so no tree holds one apart from it."""
    return not (isinstance(node, Number) and node.unit == "degC")


def paths(inner: st.SearchStrategy[Expression]) -> st.SearchStrategy[Path]:
    steps = st.builds(Step, NAMES, st.none() | inner, st.just(S))
    return st.builds(Path, st.lists(steps, min_size=1, max_size=3).map(tuple), st.just(S))


def merged(parts: list[str | Expression]) -> tuple[str | Expression, ...]:
    """Parts of a text as reading makes them: no two stretches side by side."""
    kept: list[str | Expression] = []
    for part in parts:
        if isinstance(part, str) and kept and isinstance(kept[-1], str):
            kept[-1] += part
        else:
            kept.append(part)
    return tuple(kept)


def grow(inner: st.SearchStrategy[Expression]) -> st.SearchStrategy[Expression]:
    operators = st.sampled_from(["+", "-", "*", "/", "^", "is", "is not", "<", "<=", ">", ">=", "and", "or"])
    named = st.lists(st.builds(Setting, NAMES, inner, st.just(S), st.just(S)), max_size=2).map(tuple)
    return st.one_of(
        st.builds(Binary, operators, inner, inner, st.just(S)),
        st.builds(Unary, st.just("-"), inner.filter(not_celsius), st.just(S)),
        st.builds(Unary, st.just("not"), inner, st.just(S)),
        st.builds(Choice, inner, inner, inner, st.just(S)),
        st.builds(Range, inner, inner, st.just(S)),
        st.builds(Tuple, st.lists(inner, min_size=2, max_size=3).map(tuple), st.just(S)),
        st.builds(Call, PLAIN_PATHS, st.lists(inner, max_size=2).map(tuple), named, st.just(S)),
        paths(inner),
    )


LEAVES = st.one_of(
    NUMBERS,
    NUMBERS.filter(lambda node: node.unit == "degC").map(lambda node: Number("-" + node.text, "degC", S)),
    st.builds(Truth, st.booleans(), st.just(S)),
    st.builds(Date, st.just("2026-06-21"), st.just(S)),
    st.builds(Ratio, st.just("1"), st.sampled_from(["2", "2.5"]), st.just(S)),
    st.builds(Path, NAMES.map(lambda name: (Step(name, None, S),)), st.just(S)),
    st.builds(Text, st.lists(STRETCHES | NUMBERS, max_size=3).map(merged), st.just(S)),
)
EXPRESSIONS = st.recursive(LEAVES, grow, max_leaves=12)


@given(EXPRESSIONS)
@settings(derandomize=True, deadline=None, max_examples=400)
def test_printing_an_expression_and_reading_it_gives_the_same_tree(node: Expression) -> None:
    printed = print_expression(node)
    read, problems = read_value("set", printed)
    assert not problems, (printed, [problem.sentence for problem in problems])
    assert without_places(read) == without_places(node), printed


@given(EXPRESSIONS | st.lists(LEAVES, min_size=2, max_size=4).map(lambda leaves: Tuple(tuple(leaves), S)))
@settings(derandomize=True, deadline=None, max_examples=150)
def test_values_read_early_are_what_the_grammar_makes_of_them(node: Expression) -> None:
    printed = print_expression(node)
    place = Place("set", 1)
    for text in (printed, f"a = {printed}", f"({printed}, 0)"):
        pieces, _ = split_items(text)
        for item in pieces:
            early = values._flat_node(value_parser(), place, text, item)
            if early is not None:
                assert early == values._parse(value_parser(), place, text, item)


def test_frequent_values_are_read_early() -> None:
    for text in ("a + b * 2 mm", "a = -b", "(0, a/2 + 3 mm, -1)", "(a, b)", "not a and b", "1 .. 2", "a if b else c"):
        pieces, _ = split_items(text)
        assert values._flat_node(value_parser(), Place("a", 1), text, pieces[0]) is not None, text


@pytest.mark.parametrize(
    ("written", "printed"),
    [
        ("(rim / 2, 0)", "(rim/2, 0)"),
        ("rim/10", "rim / 10"),
        ("rim/2+14mm", "rim/2 + 14 mm"),
        ("(rim - 3 mm)*2", "(rim - 3 mm) * 2"),
        ("f( 1,  2 )", "f(1, 2)"),
        ("(4 mm*2, 0)", "(4 mm * 2, 0)"),
        ("(a)", "a"),
        ("0.5in", "0.5 inch"),
        ("-( a + b )", "-(a + b)"),
        ("a  if  b  else c", "a if b else c"),
        ("(a is b) and not (c or d)", "a is b and not (c or d)"),
    ],
)
def test_canonical_form_of_expressions(written: str, printed: str) -> None:
    node, _ = read_value("set", written.replace(",  ", ", "))
    assert node is not None and print_expression(node) == printed


def test_the_sample_is_in_canonical_form() -> None:
    assert format_text("a", SAMPLE) == (SAMPLE, ())


def disturbed(text: str, seed: int) -> str:
    """The same scene as a hasty author might lay it out: other indents, gaps, blank lines, comments."""
    r = random.Random(seed)
    width = r.choice([1, 2, 3, 8])
    lines = []
    for line in text.split("\n"):
        body = line.lstrip(" ")
        if r.random() < 0.2:
            lines += [""] * r.randrange(1, 4)
        if r.random() < 0.15:
            lines.append(" " * r.randrange(9) + f"#comment {r.random()}")
        gaps = "".join(
            piece if piece.startswith('"') else re.sub(" ", lambda _: " " * r.randrange(1, 4), piece)
            for piece in re.split(r'("(?:[^"\\]|\\.)*")', body)
        )
        if body.startswith("##"):
            gaps = body
        elif body and r.random() < 0.5:
            gaps += " " * r.randrange(1, 5) + "#" * r.randrange(1, 3) + f" k{r.random()}  "
        lines.append(" " * (width * ((len(line) - len(body)) // 4)) + gaps)
    return r.choice(["", "\ufeff"]) + r.choice(["\n", "\r\n"]).join(lines)


@pytest.mark.parametrize("seed", range(25))
def test_formatting_keeps_tree_and_comments_and_is_idempotent(seed: int) -> None:
    text = disturbed(SAMPLE, seed)
    formatted, problems = format_text("a", text)
    assert formatted is not None and not problems
    assert without_places(read_scene("a", formatted)[0].lines) == without_places(read_scene("a", SAMPLE)[0].lines)
    assert re.findall(r"#.*\d", formatted) == [found.rstrip() for found in re.findall(r"#.*\d", text)]
    assert format_text("a", formatted) == (formatted, ())
    assert "\n\n\n" not in formatted and not re.search(r"[ \r]\n", formatted) and formatted.endswith('%"\n'[-1])


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row.key)
def test_a_comment_behind_every_line_survives(row: Row) -> None:
    text = framed(row, row.stands[0])
    marked = "".join(f"{line} # k\n" for line in text.splitlines())
    assert format_text("a", marked) == (marked, ())


def test_comments_keep_their_level() -> None:
    text = "# top\npart a\n    # first\n    made of c\n    # last\n# of b\npart b\n    made of c\n    # end\n"
    assert format_text("a", text) == (text, ())
    narrow = text.replace("    ", "  ")
    assert format_text("a", narrow)[0] == text


def test_formatting_mends_tabs_and_refuses_broken_lines() -> None:
    assert format_text("a", "part a\n\tmade\tof b\n")[0] == "part a\n    made of b\n"
    formatted, problems = format_text("a", "part a\n    made of (\n")
    assert formatted is None and [problem.code for problem in problems] == ["unclosed-bracket"]
    assert format_text("a", "prat  a\n   mode  of 3\n")[0] == "prat a\n    mode of 3\n"
    assert format_text("a", "")[0] == "" and format_text("a", "\n\n")[0] == ""


@pytest.mark.parametrize(
    "value",
    [
        "1 ^ " * 99 + "1",
        "-" * 99 + "f(" * 49 + "1" + ")" * 49,
        "1 if yes else " * 49 + "a[" * 49 + "1" + "]" * 49,
        "(" * 40 + "1 ^ " * 99 + "f(a = " * 9 + "1" + ")" * 49,
        "f(1, 1 ^ -1 ^ " * 33 + "1" + ")" * 33,
        "f(not (1 < " * 24 + "1" + "))" * 24,
    ],
)
def test_what_is_nested_to_the_limits_is_formatted_all_the_same(value: str) -> None:
    text = "derived\n" + "    b = " + value + "\n"
    formatted, problems = format_text("a", text)
    assert not problems and formatted is not None and format_text("a", formatted) == (formatted, ())


def test_what_would_grow_beyond_the_limits_of_size_is_a_problem(monkeypatch: pytest.MonkeyPatch) -> None:
    wide = "derived\n b = f(" + "1+1, " * 1_900 + "1)\n"
    assert [p.code for p in format_text("a", wide.replace("1+1, ", "a, "))[1]] == []
    lists = "figure h1\n hide " + ", ".join(["a+b"] * 1_900) + "\n"
    assert [p.code for p in format_text("a", lists)[1]] == ["line-too-long"]
    monkeypatch.setattr(printer, "FILE_LIMIT", 16)
    assert [p.code for p in format_text("a", "a\n b\n c\n d\n")[1]] == ["file-too-long"]
    assert format_text("a", "a\n b\n c\n")[0] == "a\n    b\n    c\n"


def test_a_printer_that_changed_the_meaning_would_be_caught(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(printer, "print_item", lambda item: item.word or "0")
    with pytest.raises(RuntimeError, match="changed"):
        format_text("a", "part a\n    add sphere diameter 3 mm\n")
    monkeypatch.undo()
    kept = printer._print_asides
    monkeypatch.setattr(printer, "_print_asides", lambda asides, printed: kept([], printed))
    with pytest.raises(RuntimeError, match="comment"):
        format_text("a", "# lost\npart a\n    add sphere diameter 3 mm\n")

"""What a text becomes: nodes, their places, and the limits that keep any text from exhausting the machine."""

from __future__ import annotations

import gc
from typing import Any

import pytest
from msgspec import Struct
from platewright.lang import layout, scanner
from platewright.lang.problems import Problem
from platewright.lang.reader import read_scene, read_value
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
    Text,
    Truth,
    Tuple,
    Unary,
)
from support.scene_texts import SAMPLE


def value(text: str) -> Expression:
    node, problems = read_value("set", text)
    assert node is not None and not problems, [problem.sentence for problem in problems]
    return node


def codes(text: str) -> list[str]:
    return [problem.code for problem in read_scene("a.plate", text)[1]]


def shown(node: Any) -> str:
    """An expression with every operation in brackets, independent of the printer."""
    match node:
        case Number():
            return node.text + node.unit
        case Path():
            return node.dotted
        case Unary():
            return f"[{node.operator} {shown(node.operand)}]"
        case Binary():
            return f"[{shown(node.left)} {node.operator} {shown(node.right)}]"
        case Choice():
            return f"[{shown(node.then)} if {shown(node.condition)} else {shown(node.otherwise)}]"
        case Range():
            return f"[{shown(node.low)} .. {shown(node.high)}]"
        case Truth():
            return str(node.value)
    return type(node).__name__


@pytest.mark.parametrize(
    ("text", "tree"),
    [
        ("a + b * c", "[a + [b * c]]"),
        ("a - b - c", "[[a - b] - c]"),
        ("a / b / c", "[[a / b] / c]"),
        ("(a + b) * c", "[[a + b] * c]"),
        ("a ^ b ^ c", "[a ^ [b ^ c]]"),
        ("-a ^ 2", "[- [a ^ 2]]"),
        ("-a * b", "[[- a] * b]"),
        ("2 ^ -1", "[2 ^ [- 1]]"),
        ("not a and b", "[[not a] and b]"),
        ("not a is b", "[not [a is b]]"),
        ("a is not b", "[a is not b]"),
        ("a or b and c", "[a or [b and c]]"),
        ("a + 1 < b or c >= 2", "[[[a + 1] < b] or [c >= 2]]"),
        ("(a < b) is yes", "[[a < b] is True]"),
        ("a if b else c if d else e", "[a if b else [c if d else e]]"),
        ("a + 1 if b < 2 else c - 1", "[[a + 1] if [b < 2] else [c - 1]]"),
        ("1 mm .. a + 2 mm", "[1mm .. [a + 2mm]]"),
        ("a-b", "[a - b]"),
        ("a - -b", "[a - [- b]]"),
        ("1/2 inch + 3 mm", "[1/2inch + 3mm]"),
        ("rim/2 inch", "[rim / 2inch]"),
        ("1/2", "[1 / 2]"),
        ("5 g/cm3 * 2", "[5g/cm3 * 2]"),
        ("0.5in", "0.5inch"),
        ("25%", "25%"),
        ("12  mm", "12mm"),
        ("-5 degC", "-5degC"),
    ],
)
def test_operators_bind_as_the_table_says(text: str, tree: str) -> None:
    assert shown(value(text)) == tree


def test_literals() -> None:
    date = value("2026-06-21")
    assert isinstance(date, Date) and date.text == "2026-06-21"
    ratio = value("1:2.5")
    assert isinstance(ratio, Ratio) and (ratio.first, ratio.second) == ("1", "2.5")
    point = value("(0, -1 mm, a.b[3].c)")
    assert isinstance(point, Tuple)
    path = point.items[2]
    assert isinstance(path, Path) and path.dotted == "a.b.c" and path.steps[1].index is not None
    call = value("screw(8 mm, d = 4 mm)")
    assert isinstance(call, Call) and len(call.positional) == 1 and call.named[0].name == "d"


def test_text_escapes_and_values_in_braces() -> None:
    text = value(r'"a \"b\" \\ \n {rim / 2} \{c\}"')
    assert isinstance(text, Text)
    assert text.parts[0] == 'a "b" \\ \n '
    assert isinstance(text.parts[1], Binary)
    assert text.parts[2] == " {c}"
    assert text.parts[1].span == Span("set", 1, 17, 1, 24)


def test_texts_on_indented_lines_are_joined() -> None:
    scene, problems = read_scene("a", 'figure a\n    alt "one"\n        "two "\n        "three"\n')
    assert not problems
    text = scene.lines[0].lines[0].head.get("text")
    assert isinstance(text, Text) and text.parts == ("one two three",)
    assert text.span == Span("a", 2, 9, 4, 16)


def test_clauses_on_indented_lines_are_folded() -> None:
    text = "assembly a\n    place b at (0, 0, 1 mm)\n        turn 3 deg\n        ring 4\n        as c\n"
    scene, problems = read_scene("a", text)
    assert not problems
    line = scene.lines[0].lines[0]
    assert [clause.word for clause in line.clauses] == ["at", "turn", "ring", "as"]
    assert not line.lines and line.span.end_line == 5


def test_sample_reads_clean_and_whole() -> None:
    scene, problems = read_scene("a.plate", SAMPLE)
    assert problems == ()
    assert scene.version == 1
    words = "platewright see given derived material outline part assembly figure variants expect"
    assert [line.word for line in scene.lines] == words.split()
    given = scene.lines[2].lines
    assert given[0].note == "inside diameter of the rim" and given[0].head.row == "given setting"


def check_spans(node: Any, parent: Span) -> int:
    """Checks every node below, and returns how many there are."""
    if isinstance(node, tuple):
        return sum(check_spans(part, parent) for part in node)
    if not isinstance(node, Struct) or isinstance(node, Span):
        return 0
    span = node.span  # type: ignore[attr-defined]
    start, end = (span.line, span.column), (span.end_line, span.end_column)
    assert (parent.line, parent.column) <= start <= end <= (parent.end_line, parent.end_column), (node, parent)
    return 1 + sum(check_spans(getattr(node, field), span) for field in node.__struct_fields__)


def test_every_span_lies_inside_its_parents() -> None:
    scene, _ = read_scene("a.plate", SAMPLE)
    assert check_spans(scene.lines, scene.span) > 300


def test_spans_hold_the_text_they_stand_for() -> None:
    scene, _ = read_scene("a.plate", SAMPLE)
    lines = SAMPLE.split("\n")
    checked = 0
    stack: list[Any] = [scene]
    while stack:
        node = stack.pop()
        if isinstance(node, tuple):
            stack.extend(node)
        elif isinstance(node, Struct) and not isinstance(node, Span):
            if isinstance(node, Number):
                written = lines[node.span.line - 1][node.span.column - 1 : node.span.end_column - 1]
                assert written.startswith(node.text) and written.endswith(node.unit)
                checked += 1
            elif isinstance(node, Path) and all(step.index is None for step in node.steps):
                assert lines[node.span.line - 1][node.span.column - 1 : node.span.end_column - 1] == node.dotted
                checked += 1
            stack.extend(getattr(node, field) for field in node.__struct_fields__)
    assert checked > 60


def test_indentation_may_be_any_that_is_consistent() -> None:
    assert codes("part a\n  add sphere diameter 1 mm\n    at (0, 0, 0)\n  made of b\n") == []
    assert codes("part a\n        add sphere diameter 1 mm\n    made of b\n") == ["odd-indentation"]


def test_carriage_returns_and_a_byte_order_mark_are_no_mistake() -> None:
    scene, problems = read_scene("a", "\ufeffpart a\r\n    add sphere diameter 1 mm\r\n")
    assert not problems and scene.lines[0].span.column == 1


def test_tabs_are_one_problem() -> None:
    problems = read_scene("a", "part a\n\tadd sphere diameter 1 mm\n\tmade of\tb\n")[1]
    assert [(p.code, p.span.line, p.span.column) for p in problems] == [("tab", 2, 1)]


@pytest.mark.parametrize("bracket", ["(", "f(", "a["])
def test_ten_thousand_nested_brackets_are_a_located_problem(bracket: str) -> None:
    problems = read_scene("a", f"derived\n    b = {bracket * 10_000}\n    c = (\n")[1]
    assert [p.code for p in problems] == ["line-too-long", "unclosed-bracket"]
    deep = f"b = {bracket * 200}1"
    problem = read_scene("a", f"derived\n    {deep}\n")[1][0]
    assert problem.code == "nested-too-deep" and str(scanner.NESTING_LIMIT) in problem.sentence


def test_long_runs_of_operations_are_a_located_problem() -> None:
    for run in ("1 + " * 500 + "1", "-" * 500 + "1", "not " * 500 + "yes", "1 if yes else " * 500 + "1"):
        problem = read_scene("a", f"derived\n    b = {run}\n")[1][0]
        assert problem.code == "too-many-operations" and str(scanner.OPERATIONS_LIMIT) in problem.sentence
    assert codes("derived\n    b = " + "1 + " * (scanner.OPERATIONS_LIMIT) + "1\n") == []


def test_limits_of_size_are_named() -> None:
    long_line = read_scene("a", "x" * (layout.LINE_LIMIT + 1))[1][0]
    assert long_line.code == "line-too-long" and str(layout.LINE_LIMIT) in long_line.sentence
    long_line = "#" * 9_999 + "\n"
    for text in (long_line * (layout.FILE_LIMIT // 10_000 + 1), "\n" * layout.LINES_LIMIT):
        long_file = read_scene("a", text)[1][0]
        assert long_file.code == "file-too-long"
        assert str(layout.FILE_LIMIT) in long_file.sentence and str(layout.LINES_LIMIT) in long_file.sentence
    deep = "\n".join(" " * i + "part a" for i in range(layout.LEVELS_LIMIT + 5))
    assert "nested-lines-too-deep" in codes(deep)
    many = read_scene("a", "(\n" * (layout.PROBLEMS_LIMIT * 3))[1]
    assert len(many) == layout.PROBLEMS_LIMIT + 1 and many[-1].code == "too-many-problems"


def test_numbers_that_would_take_for_ever_are_refused() -> None:
    assert codes("derived\n    a = 1e999999999 mm\n") == ["bad-number"]
    assert codes(f"derived\n    a = {'9' * 5000} mm\n") == ["bad-number"]
    assert codes("derived\n    a = 1/0 mm\n") == ["bad-number"]


def test_a_broken_line_stays_in_its_line() -> None:
    text = (
        "part a\n    add sphere diameter (3 mm\n    add sphere diametre 3 mm\n    made of b\npart c(\n    made off d\n"
    )
    scene, problems = read_scene("a", text)
    assert [(p.code, p.span.line) for p in problems] == [
        ("unclosed-bracket", 2),
        ("unknown-word", 3),
        ("unclosed-bracket", 5),
        ("unknown-word", 6),
    ]
    assert [line.word for line in scene.lines[0].lines] == ["made of"]
    assert scene.broken == ("c",)


def test_names_of_broken_lines_are_kept() -> None:
    scene, _ = read_scene("a", "given\n    rim = 3 furlong\npart b 3\n    add sphere diameter rim\n")
    assert scene.broken == ("rim", "b")


def test_not_drawn_yet_is_confined_to_its_figure() -> None:
    text = "sequence cleaning\n    step open\nfigure f\n    items\nfigure h1\n    drawn as tone\n"
    problems = read_scene("a", text)[1]
    assert [(p.code, p.span.line, p.within) for p in problems] == [("not-drawn-yet", 1, ""), ("not-drawn-yet", 4, "f")]


def test_problems_come_in_the_order_of_the_text() -> None:
    problems = read_scene("a", "part m\n    add (\nfigure f\n    items\n    foo\n")[1]
    assert [p.span for p in problems] == sorted(p.span for p in problems) and len(problems) == 4


def test_value_reading_takes_one_value() -> None:
    assert value("12 mm") == Number("12", "mm", Span("set", 1, 1, 1, 6))
    for text in ("", "1 mm 2 mm", "a = 3", "1, 2", "(", '"', "1\n2", "\t1", "# no"):
        node, problems = read_value("set", text)
        assert node is None and len(problems) == 1 and isinstance(problems[0], Problem), text


def test_the_garbage_collector_is_left_as_it_was() -> None:
    assert gc.isenabled()
    read_scene("a", SAMPLE)
    assert gc.isenabled()
    gc.disable()
    try:
        read_scene("a", SAMPLE)
        assert not gc.isenabled()
    finally:
        gc.enable()

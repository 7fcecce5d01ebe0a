"""The vocabulary table: whole, consistent, and read as its examples say."""

from __future__ import annotations

import ast
import re
from pathlib import Path

import platewright.lang.words as words
import pytest
from platewright.lang.codes import CODES
from platewright.lang.nearest import distance, nearest
from platewright.lang.patterns import Either, Element, Equals, Optional, Slot, parse_pattern, vocabulary
from platewright.lang.printer import format_text
from platewright.lang.reader import read_scene
from platewright.lang.row import Row
from platewright.lang.units import UNITS
from support.scene_texts import framed, framed_rows, readings

ROOT = Path(__file__).parents[1]


@pytest.mark.parametrize(("row", "context"), framed_rows(), ids=lambda value: getattr(value, "key", value))
def test_the_example_of_a_row_is_read_by_that_row(row: Row, context: str) -> None:
    scene, problems = read_scene("a.plate", framed(row, context))
    other = [p for p in problems if p.code not in ("not-drawn-yet", "missing-value")]
    missing = [p for p in problems if p.code == "missing-value"]
    assert not other and len(missing) == (row.key in ("add", "cut", "keep") and row.example == row.key)
    read = {reading.row for reading in readings(scene.lines)}
    assert row.key in read or row.key == "platewright"
    if row.later:
        assert "not-drawn-yet" in {p.code for p in problems}


@pytest.mark.parametrize("row", words.ROWS, ids=lambda row: row.key)
def test_the_example_of_a_row_is_in_canonical_form(row: Row) -> None:
    text = framed(row, row.stands[0])
    assert format_text("a.plate", text) == (text, ())


def test_rows_have_keys_of_their_own_and_sentences() -> None:
    keys = [row.key for row in words.ROWS]
    assert len(set(keys)) == len(keys)
    assert all(row.sentence and row.example and row.stands for row in words.ROWS)


def slots(elements: tuple[Element, ...]) -> list[Slot]:
    found: list[Slot] = []
    for element in elements:
        match element:
            case Slot():
                found.append(element)
            case Equals():
                found += [element.left, element.right]
            case Optional():
                found += slots(element.elements)
            case Either():
                found += [slot for branch in element.branches for slot in slots(branch)]
    return found


def test_kinds_and_places_are_described() -> None:
    kinds = {slot.kind for row in words.ROWS for slot in slots(parse_pattern(row.pattern))} - {"words"}
    assert kinds <= set(words.KINDS)
    places = {place for row in words.ROWS for place in (*row.stands, *row.clauses, row.lines) if place}
    assert places == set(words.PLACES)
    starts = {place for row in words.ROWS for place in row.stands}
    assert {row.lines for row in words.ROWS if row.lines} <= starts


def test_no_word_of_the_language_is_a_unit_or_reserved() -> None:
    firsts = set(vocabulary().homes)
    assert not firsts & set(UNITS)
    assert not firsts & {"and", "or", "not", "is", "if", "else", "yes", "no", "in"}


def test_a_slot_has_one_name_in_its_row() -> None:
    for row in words.ROWS:
        branches = {slot.name for slot in slots(parse_pattern(row.pattern))}
        assert all(re.fullmatch(r"[a-z]\w*", name) for name in branches), row.key


def test_malformed_patterns_are_refused() -> None:
    for pattern in ("a ]", "= <b:any>"):
        with pytest.raises((ValueError, IndexError)):
            parse_pattern(pattern)


def test_functions_are_listed_once() -> None:
    names = [function.name for function in words.FUNCTIONS]
    assert len(set(names)) == len(names)
    assert {function.place for function in words.FUNCTIONS} == {"values", "facts"}
    assert not set(names) & set(words.CONSTANTS)


REPORTERS = {"Problem", "Slip", "Flaw", "OutlineFlaw", "mistake", "error", "warn", "add", "make", "slip_at"}


def codes_in(source: str) -> set[str]:
    """The codes in a module: constants handed to what makes problems, among the first two arguments or as `code`."""
    found = set()
    for node in ast.walk(ast.parse(source)):
        if not isinstance(node, ast.Call):
            continue
        name = node.func.id if isinstance(node.func, ast.Name) else getattr(node.func, "attr", "")
        if name in REPORTERS:
            given = [*node.args[:2], *(keyword.value for keyword in node.keywords if keyword.arg == "code")]
            constants = {value.value for value in given if isinstance(value, ast.Constant)}
            found |= {value for value in constants if isinstance(value, str) and re.fullmatch(CODE, value)}
    return found


CODE = r"[a-z0-9]+(-[a-z0-9]+)+|tab|version"


@pytest.mark.parametrize("package", ["lang", "compiler", "backend"])
def test_every_code_used_is_described(package: str) -> None:
    files = sorted((ROOT / package).rglob("*.py"))
    used = set().union(*(codes_in(file.read_text(encoding="utf-8")) for file in files))
    assert used <= set(CODES), used - set(CODES)
    assert len(used) >= 25 or package != "lang"


def test_codes_are_stable_words_with_sentences() -> None:
    for code, sentence in CODES.items():
        assert re.fullmatch(r"[a-z0-9]+(-[a-z0-9]+)*", code) and sentence and not sentence.endswith(".")
    with pytest.raises(TypeError):
        CODES["x"] = "y"  # type: ignore[index]


@pytest.mark.parametrize(
    ("a", "b", "slips"),
    [("", "", 0), ("ab", "ba", 1), ("lenght", "length", 1), ("abc", "", 3), ("kitten", "sitting", 3), ("ca", "abc", 3)],
)
def test_slips_between_words(a: str, b: str, slips: int) -> None:
    # kitten/sitting: the usual example of Levenshtein's distance; ca/abc: 3 in the restricted form (common practice).
    assert distance(a, b) == slips and distance(b, a) == slips


def test_nearest_word() -> None:
    known = ["cylinder", "cone", "sphere"]
    assert nearest("cylnder", known) == "cylinder" and nearest("shpere", known) == "sphere"
    assert nearest("cune", ["cube", "cone"], is_ranked=True) == "cube" and nearest("cune", ["cube", "cone"]) == "cone"
    assert nearest("Cone", known) == "cone" and nearest("wedge", known) == "" and nearest("x" * 1000, known) == ""

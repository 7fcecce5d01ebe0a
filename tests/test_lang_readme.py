"""The language reference: every word, unit and function stands in it, and its examples are right."""

from __future__ import annotations

import io
import re
from pathlib import Path

import pytest
from platewright.compiler.driver.commands import check
from platewright.compiler.driver.crash import Trace
from platewright.compiler.driver.report import Report
from platewright.lang import layout, scanner, values
from platewright.lang.patterns import written
from platewright.lang.printer import format_text
from platewright.lang.reader import read_scene, read_value
from platewright.lang.row import Row
from platewright.lang.units import UNITS
from platewright.lang.words import CONSTANTS, FUNCTIONS, ROWS, STANDARD_VIEWPOINTS, Function

README = (Path(__file__).parents[1] / "lang" / "README.md").read_text(encoding="utf-8")
EXAMPLES = re.findall(r"^```plate( later)?\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)
BESIDE = {
    "fasteners.plate": "platewright 1\n\npart screw(d = 5 mm)\n    add cylinder diameter d length 3 * d\n",
    "holes.csv": "name,outside mm,bore mm\nsmall,20,5\nlarge,30,8.4\n",
    "heights.csv": "x mm,y mm,z mm\n0,0,2\n20,0,4\n40,0,3\n0,30,5\n20,30,2\n40,30,6\n",
    "paint.csv": "wavelength nm,reflectance %\n" + "".join(f"{nm},{nm // 10}\n" for nm in range(380, 781, 20)),
    "sizes.csv": "name,rim mm,opened\nsmall,120,no\nlarge,300,yes\n",
    "route.csv": "x mm,y mm,z mm\n0,0,0\n40,0,0\n40,30,0\n40,30,40\n80,30,40\n",
    "profile.csv": "x mm,y mm\n12,0\n5,10\n-9,8\n-9,-8\n5,-10\n12,0\n",
}


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row.key)
def test_every_row_of_the_vocabulary_stands_in_the_reference(row: Row) -> None:
    assert f"| `{written(row)}` | {row.sentence} | `{row.example}` |" in README


@pytest.mark.parametrize("function", FUNCTIONS, ids=lambda function: function.name)
def test_every_function_stands_in_the_reference_with_a_right_example(function: Function) -> None:
    assert f"| `{function.name}({', '.join(function.arguments)})` | {function.result} | {function.sentence} |" in README
    assert f"| `{function.example}` |" in README
    node, problems = read_value("a", function.example)
    assert node is not None and not problems


def test_every_unit_constant_and_standard_viewpoint_stands_in_the_reference() -> None:
    for name in (*UNITS, *CONSTANTS, *STANDARD_VIEWPOINTS, *scanner.RESERVED):
        assert f"`{name}`" in README, name


def test_the_limits_are_those_that_hold() -> None:
    limits = README[README.index("## Limits") :].replace("0 000", "0000").replace("4 million", "4000000")
    held = {layout.FILE_LIMIT, layout.LINES_LIMIT, layout.LINE_LIMIT, layout.LEVELS_LIMIT, layout.PROBLEMS_LIMIT}
    held |= {scanner.NESTING_LIMIT, scanner.OPERATIONS_LIMIT, values.NUMBER_LENGTH_LIMIT}
    assert {int(number) for number in re.findall(r"\d+", limits)} == held


def test_links_lead_to_headings() -> None:
    headings = {heading.lower().replace(" ", "-") for heading in re.findall(r"^## (.*)$", README, re.MULTILINE)}
    links = set(re.findall(r"\]\(#([^)]*)\)", README))
    assert links <= headings and len(links) > 10


@pytest.mark.parametrize(("later", "text"), EXAMPLES, ids=lambda value: value[:20].split("\n")[0])
def test_every_example_is_in_canonical_form(later: str, text: str) -> None:
    assert format_text("example.plate", text) == (text, ())


@pytest.mark.parametrize(("later", "text"), EXAMPLES, ids=lambda value: value[:20].split("\n")[0])
def test_every_example_is_right(later: str, text: str, tmp_path: Path) -> None:
    for name, content in BESIDE.items():
        (tmp_path / name).write_text(content, encoding="utf-8")
    scene = tmp_path / "example.plate"
    scene.write_text(text, encoding="utf-8")
    if later:
        assert {problem.code for problem in read_scene("example.plate", text)[1]} == {"not-drawn-yet"}
        return
    out, err = io.StringIO(), io.StringIO()
    code = check(scene, None, True, "text", None, Trace(), Report(out, err, False, False))
    assert (code, err.getvalue()) == (0, "")


def test_the_reference_has_examples() -> None:
    assert len(EXAMPLES) >= 12 and sum(bool(later) for later, _ in EXAMPLES) == 1

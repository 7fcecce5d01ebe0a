"""Careless and hostile scenes, and what is demanded of the problems they give."""

from __future__ import annotations

import re
import time
from dataclasses import dataclass

from platewright.lang.codes import CODES

from .scenes import Texts, checked

SECONDS = 10.0
"""No scene may take longer; on an idle core the slowest takes a tenth of that."""


@dataclass(frozen=True)
class Hostile:
    name: str
    text: str | bytes
    codes: tuple[str, ...]
    """Codes of the errors expected, in order: one for each mistake."""
    says: str = ""
    hints: str = ""
    files: Texts | None = None
    line: int | None = None


def part(*lines: str) -> str:
    return "part p\n" + "".join(f"    {line}\n" for line in lines)


def given(*lines: str) -> str:
    return "given\n" + "".join(f"    {line}\n" for line in lines)


BALL = part("add sphere diameter 4 mm")


def judge(hostile: Hostile) -> None:
    """One problem for each mistake, located, in a good sentence, in bounded time."""
    start = time.perf_counter()
    run = checked(hostile.text, hostile.files)
    taken = time.perf_counter() - start
    errors = run.errors
    assert tuple(problem.code for problem in errors) == hostile.codes, [
        (each.code, each.span.line, each.sentence) for each in errors
    ]
    assert len({(each.code, each.span) for each in run.problems}) == len(run.problems)
    texts = " / ".join(each.sentence for each in errors)
    assert hostile.says in texts, texts
    assert hostile.hints in " / ".join(each.hint for each in errors), [each.hint for each in errors]
    if hostile.line is not None:
        assert errors[0].span.line == hostile.line
    for problem in run.problems:
        _well_put(problem.sentence)
        assert len(problem.sentence) < 400, problem.sentence
        assert problem.code in CODES, problem.code
        assert problem.span.line >= 1 and problem.span.column >= 1
        assert (problem.span.end_line, problem.span.end_column) >= (problem.span.line, problem.span.column)
    assert taken < SECONDS


def _well_put(sentence: str) -> None:
    """House style: begins small or with what the author wrote, no period at the end, no words of the host language."""
    assert re.match(r"[a-z`\d]", sentence), sentence
    assert not sentence.endswith("."), sentence
    assert not re.search(r"\b(None|NoneType|float|int|str|tuple|object|Exception|Error)\b", sentence), sentence

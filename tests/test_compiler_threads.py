"""Threads by designation in scenes, what of them reaches the backend, and rows of tables by name."""

from __future__ import annotations

import math

import pytest
from support.scenes import built, checked, clean, exported

HEAD = "platewright 1\n\npart bolt\n"


def threads(text: str, path: str = "bolt") -> list[tuple[object, ...]]:
    """Every thread of every node: start, axis, length, major, minor, pitch, internal, left."""
    found = []
    for node in exported(text, path, 0.1).geometry.nodes:
        for each in node.threads:
            sizes = (each.length, each.major, each.minor, each.pitch, each.internal, each.left)
            found.append((each.start, each.axis, *sizes))
    return found


def near(*values: object) -> list[object]:
    return [pytest.approx(each, abs=1e-9) if isinstance(each, tuple | float) else each for each in values]


# Minor diameter of M20: 20 - 1.082531755 · 2.5 (ISO 68-1).
MINOR = 20 - 5 / 4 * math.sqrt(3) / 2 * 2.5


def test_a_thread_by_convention_is_a_cylinder_that_knows_its_thread() -> None:
    text = HEAD + "    add thread M20 length 40 mm at (1 mm, 2 mm, 3 mm)\n"
    (found,) = threads(text)
    assert list(found) == near((1.0, 2.0, 3.0), (0.0, 0.0, 1.0), 40.0, 20.0, MINOR, 2.5, False, False)
    vertices = exported(text, "bolt", 0.1).geometry.vertices
    assert vertices[:, 0].max() == pytest.approx(11.0)


def test_a_thread_that_is_cut_is_internal_and_a_hole_over_its_crests() -> None:
    text = HEAD + "    add block (40 mm, 40 mm, 10 mm)\n    cut thread M20 length 10 mm left as hole\n"
    (found,) = threads(text)
    assert list(found) == near((0.0, 0.0, 0.0), (0.0, 0.0, 1.0), 10.0, 20.0, MINOR, 2.5, True, True)
    geometry = exported(text, "bolt", 0.01).geometry
    inner = geometry.vertices[abs(geometry.vertices[:, 0]) < 15]
    assert (inner[:, 0] ** 2 + inner[:, 1] ** 2).min() ** 0.5 == pytest.approx(MINOR / 2, abs=0.01)
    (mark,) = geometry.nodes[0].marks
    assert mark.diameter == 20.0


def test_threads_follow_parts_within_parts_copies_scales_and_mirrors() -> None:
    text = (
        HEAD
        + "    add thread M20 length 10 mm\n\n"
        + "part pair\n    add bolt row 2 by (50 mm, 0, 0)\n    add block (90 mm, 9 mm, 9 mm)\n\n"
        + "assembly a\n    place pair scaled 2 turn 90 deg about y at (0, 0, 7 mm)\n"
        + "    place pair as other mirrored across x at (0, 200 mm, 0)\n"
    )
    found = threads(text, "a")
    assert [list(each[2:]) for each in found[:2]] == [near(20.0, 40.0, 2 * MINOR, 5.0, False, False)] * 2
    assert [each[:2] for each in found[:2]] == [tuple(near((0.0, 0.0, z), (1.0, 0.0, 0.0))) for z in (7.0, -93.0)]
    assert [each[7] for each in found] == [False, False, True, True]
    assert list(found[3][:2]) == near((-50.0, 200.0, 0.0), (0.0, 0.0, 1.0))


def test_a_real_thread_is_no_convention() -> None:
    text = HEAD + "    add thread M6 length 5 mm real\n"
    assert threads(text) == []
    assert len(exported(text, "bolt", 0.1).geometry.faces) > 200


@pytest.mark.parametrize(
    ("designation", "major", "pitch"),
    [
        ("M3", 3.0, 0.5),
        ('"M20x1.5"', 20.0, 1.5),
        ('"M1.6"', 1.6, 0.35),
        ('"M{4 + 4}"', 8.0, 1.25),
        ("size", 12.0, 1.75),
    ],
)
def test_designations(designation: str, major: float, pitch: float) -> None:
    given = 'given\n    size = "M12"\n\n'
    text = f"platewright 1\n\n{given}part bolt\n    add thread {designation} length 9 mm\n"
    run = built(text)
    assert run.errors == []
    assert threads(text)[0][3] == major and threads(text)[0][5] == pitch


@pytest.mark.parametrize(
    ("designation", "code", "word"),
    [
        ("M21", "out-of-range", "coarse series"),
        ('"20"', "out-of-range", "no designation"),
        ('"M4x4"', "out-of-range", "does not fit"),
        ("N20", "unknown-name", "`N20`"),
        ("20 mm", "wrong-kind", "a text"),
    ],
)
def test_wrong_designations(designation: str, code: str, word: str) -> None:
    found = checked(f"{HEAD}    add thread {designation} length 9 mm\n").errors
    assert [(problem.code, problem.span.line) for problem in found] == [(code, 4)]
    assert word in found[0].sentence


TABLE = "name,across mm,kind\nsmall,8,flat\nlarge,20,\n"


def rows(*lines: str, within: str = "add sphere diameter bolt.across") -> str:
    body = "".join(f"    {line}\n" for line in lines)
    return f"platewright 1\n\nderived\n{body}\npart p\n    {within}\n"


def test_a_row_by_name_stands_wherever_values_do() -> None:
    files = {"t.csv": TABLE, "b.plate": 'platewright 1\n\nderived\n    row big over "t.csv" for "large"\n'}
    text = rows('row bolt over "t.csv" for which', 'which = "small"', "twice = 2 * bolt.across")
    assert clean(text, files).model is not None
    seen = 'platewright 1\n\nsee "b.plate" as b\n\npart p\n    add sphere diameter b.big.across\n'
    geometry = exported(seen, "p", 0.01, files).geometry
    assert geometry.vertices[:, 2].max() == pytest.approx(10.0)


@pytest.mark.parametrize(
    ("text", "code", "word"),
    [
        (rows('row bolt over "t.csv" for "smal"'), "unknown-name", "`smal`"),
        (rows('row bolt over "t.csv" for "small"', within="add sphere diameter bolt"), "wrong-kind", "a row"),
        (
            rows('row bolt over "t.csv" for "small"', within="add sphere diameter bolt.along"),
            "unknown-name",
            "no column",
        ),
        (rows('row bolt over "t.csv" for "small"', within="add sphere diameter bolt(1)"), "wrong-kind", "a row"),
        (rows('row bolt over "t.csv" for "large"', "kind = bolt.kind"), "bad-table", "is empty"),
        (rows('row bolt over "gone.csv" for "small"'), "no-such-file", "gone.csv"),
        (rows('row bolt over "t.csv" for bolt.kind'), "circular-value", "needs itself"),
    ],
)
def test_mistakes_with_rows(text: str, code: str, word: str) -> None:
    found = built(text, {"t.csv": TABLE}).errors
    assert [problem.code for problem in found] == [code]
    assert word in found[0].sentence

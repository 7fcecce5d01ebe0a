"""Lengths and angles as they stand in a vector file, against ISO 5456-3:1996 and ISO 5455:1979."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator

import pytest
from platewright.backend import sheet
from support.scenes import planned

CUBE = "part cube\n    add block (100 mm, 100 mm, 100 mm)\n"


def edges(view: str, *lines: str) -> list[tuple[float, float]]:
    """Length in mm and angle in degrees, from 0 up to 180, of every straight stroke of a cube's drawing."""
    body = "".join(f"    {line}\n" for line in (f"show cube from {view}", *lines))
    job = planned(CUBE + f"figure f\n{body}", "f")
    text = sheet.encode(sheet.draw(job, ("svg",)), job, "svg").decode()
    assert re.search(r'width="([\d.]+)mm" height="([\d.]+)mm" viewBox="0 0 \1 \2"', text), "user units are mm"
    # Strokes are what is measured: fills reach a little under them.
    groups = re.findall(r'<g id="panel[^>]*class="visible-(?:edge|outline)"[^>]*>(.*?)</g>', text, re.DOTALL)
    found = [each for path in re.findall(r' d="([^"]*)"', "".join(groups)) for each in _segments(path)]
    return [(math.hypot(x, y), math.degrees(math.atan2(-y, x)) % 180) for x, y in found]


def _segments(path: str) -> Iterator[tuple[float, float]]:
    """The straight stretches of path data (SVG 1.1, 8.3) made of M, L, H, V and Z in either case."""
    x = y = first_x = first_y = 0.0
    for word, rest in re.findall(r"([MLHVZmlhvz])([^A-Za-z]*)", path):
        numbers = [float(each) for each in re.findall(r"-?(?:\d+\.?\d*|\.\d+)", rest)]
        is_relative = word.islower()
        if word in "Zz":
            if (x, y) != (first_x, first_y) and math.hypot(first_x - x, first_y - y) > 1e-3:
                yield first_x - x, first_y - y
            x, y = first_x, first_y
            continue
        step = 1 if word in "HVhv" else 2
        for k in range(0, len(numbers), step):
            across = 0.0 if word in "Vv" else numbers[k]
            down = 0.0 if word in "Hh" else numbers[k + step - 1]
            new_x = x + across if is_relative or word == "V" else across
            new_y = y + down if is_relative or word == "H" else down
            if word in "Mm" and k == 0:
                first_x, first_y = new_x, new_y
            else:
                yield new_x - x, new_y - y
            x, y = new_x, new_y


@pytest.mark.parametrize(
    ("view", "lengths", "angles"),
    [
        ("isometric", (50, 50, 50), (150, 30, 90)),
        ("dimetric", (50, 25, 50), (173, 42, 90)),
        ("cavalier", (50, 50, 50), (0, 45, 90)),
        ("cabinet", (50, 25, 50), (0, 45, 90)),
        ("planometric", (50, 50, 50), (135, 45, 90)),
    ],
)
def test_edges_of_100_mm_at_1_to_2(view: str, lengths: tuple[float, ...], angles: tuple[float, ...]) -> None:
    found = edges(view, "scale 1:2")
    assert len(found) == 9
    for length, angle in zip(lengths, angles, strict=True):
        alike = [each for each in found if abs((each[1] - angle + 90) % 180 - 90) < 0.05]
        assert len(alike) == 3
        assert [each[0] for each in alike] == pytest.approx([length] * 3, abs=0.02)


def test_the_same_scale_stands_in_every_view_of_a_set() -> None:
    found = edges("front", "third angle front, top, right, isometric", "scale 1:5")
    assert len(found) == 3 * 4 + 9
    assert [length for length, _ in found] == pytest.approx([20] * len(found), abs=0.02)

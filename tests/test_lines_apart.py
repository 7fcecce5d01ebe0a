"""Parts seen through: narrow lines of their own, and everything else as if they were not there."""

from __future__ import annotations

from dataclasses import replace

import pytest
from platewright.backend import contract, sheet
from platewright.backend.contract import ContractError, ExtremePosition, LineClass, Style
from platewright.backend.lines.joining import PRECEDENCE
from platewright.backend.lines.weights import weight_of
from platewright.backend.write.record import DrawnLine
from support.scenes import planned

POT = """part pan
    add cylinder diameter 60 mm length 40 mm
    cut cylinder diameter 54 mm length 37 mm at (0, 0, 3 mm)

part core
    add prism sides 6 across 24 mm length 30 mm

part foot
    add block (80 mm, 80 mm, 5 mm) at (0, 0, -5 mm)

assembly pot
    place pan
    place core at (0, 0, 3 mm)
    place foot
"""


def lines_of(*lines: str, show: str = "show pot") -> tuple[DrawnLine, ...]:
    text = POT + "figure f\n" + "".join(f"    {line}\n" for line in (show, "drawn as lines", "scale 1:1", *lines))
    job = planned(text, "f")
    return sheet.line_list(sheet.draw(job, ("svg",)), job)


def lengths(lines: tuple[DrawnLine, ...], part: str) -> dict[LineClass, float]:
    found: dict[LineClass, float] = {}
    for each in lines:
        if each.part == part:
            found[each.line_class] = found.get(each.line_class, 0.0) + each.length
    return found


@pytest.mark.parametrize("show", ["show pot", "show pot from front"])
def test_ghosts_have_lines_of_their_own_class_and_hide_nothing(show: str) -> None:
    through, without = (lines_of(line, "centre lines off", show=show) for line in ("ghost pan", "hide pan"))
    assert set(lengths(through, "pot.pan")) == {LineClass.PART_SEEN_THROUGH}
    assert all(each.is_visible for each in through)
    for part in ("pot.core", "pot.foot"):
        assert lengths(through, part) == pytest.approx(lengths(without, part), rel=1e-6)


def test_hidden_lines_of_ghosts_are_not_drawn() -> None:
    lines = lines_of("ghost pan", "hidden edges dashed")
    assert set(lengths(lines, "pot.pan")) == {LineClass.PART_SEEN_THROUGH}
    assert LineClass.HIDDEN_OUTLINE in lengths(lines, "pot.foot")


def test_edges_that_face_away_are_drawn_as_hidden_ones() -> None:
    model = "part b\n    add block (40 mm, 30 mm, 20 mm)\n"
    pocket = "    cut block (14 mm, 10 mm, 8 mm) at (0, 12 mm, 6 mm)\n"
    rest = "figure f\n    show b from front\n    scale 1:1\n    hidden edges dashed\n"
    job = planned(model + pocket + rest, "f")
    lines = sheet.line_list(sheet.draw(job, ("svg",)), job)
    # A pocket in the back: its rim of 14 mm by 8 mm, its floor straight before it.
    hidden = [each.length for each in lines if each.line_class is LineClass.HIDDEN_EDGE]
    assert sum(hidden) == pytest.approx(44, abs=1e-6) and not any(
        each.is_visible for each in lines if each.line_class is LineClass.HIDDEN_EDGE
    )
    plain = planned(model + rest.replace("from front", ""), "f")
    cube = sheet.line_list(sheet.draw(plain, ("svg",)), plain)
    scale = plain.sheet.panels[0].projection.scale
    back = [each.length for each in cube if each.line_class is LineClass.HIDDEN_EDGE]
    # In an isometric view the three edges at the far corner, along the axes at the scale stated.
    assert sum(back) == pytest.approx((40 + 30 + 20) * scale, abs=1e-6)


@pytest.mark.parametrize("is_pictorial", [False, True])
def test_lines_apart_are_narrow_and_continuous(is_pictorial: bool) -> None:
    style = Style(wide=0.5, is_pictorial=is_pictorial)
    for line_class in (LineClass.PART_SEEN_THROUGH, LineClass.REVOLVED_SECTION):
        weight = weight_of(line_class, style)
        assert (weight.width, weight.line_type, weight.end_width) == (0.25, None, 0.25)


def test_every_class_has_its_weight_and_its_precedence() -> None:
    assert set(PRECEDENCE) == set(LineClass) and len(PRECEDENCE) == len(LineClass)
    assert all(weight_of(each, Style()).width > 0 for each in LineClass)


@pytest.mark.parametrize("extreme", [ExtremePosition(5, (0,)), ExtremePosition(0, (99,))])
def test_an_extreme_position_is_of_a_geometry_that_is_there(extreme: ExtremePosition) -> None:
    job = planned(POT + "figure f\n    show pot\n", "f")
    panel = replace(job.sheet.panels[0], extremes=(extreme,))
    with pytest.raises(ContractError, match="extreme position"):
        contract.verify(replace(job, sheet=replace(job.sheet, panels=(panel,))))

"""Flat fills: the colour declared to the level, what emphasis makes of it, and outlines that reach under the lines."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
import shapely
from platewright.backend import colour
from platewright.backend.contract import Emphasis, Node, Style
from platewright.backend.drawing import WHITE, Fill, Group, Lines
from platewright.backend.lines.fills import ACCENT, HAIR_MM, colour_of, fills_of
from platewright.backend.lines.model import Region
from support.geometries import BRASS, HOUSING, MATERIALS, WEISS

# Machado, Oliveira and Fernandes 2009, severity 1: protanopia, deuteranopia, tritanopia, on linear RGB.
DEFICIENCIES = (
    np.eye(3),
    np.array([[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]]),
    np.array([[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]]),
    np.array([[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]]),
)
NODES = tuple(Node(path, path, -1, np.eye(4), 0, row) for row, path in enumerate(("gauge.cap", "gauge.rim", "stand")))


def square(left: float, node: int, is_cap: bool = False) -> Region:
    ring = np.array([[left, 0.0], [left + 10.0, 0.0], [left + 10.0, 10.0], [left, 10.0]])
    return Region((ring,), node, 0, is_cap, 100.0)


REGIONS = (square(0.0, 0), square(10.0, 1), square(20.0, 2))


def fills(groups: tuple[Group, ...]) -> dict[str, list[Fill]]:
    found: dict[str, list[Fill]] = {}
    for group in groups:
        assert group.kind == "part"
        found[group.name] = [item for item in group.items if isinstance(item, Fill)]
        assert len(found[group.name]) == len(group.items)
    return found


def lab(linear: np.ndarray) -> np.ndarray:
    """CIELAB of linear sRGB under D65 (CIE 15; the matrix of IEC 61966-2-1)."""
    matrix = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
    xyz = matrix @ np.clip(linear, 0.0, 1.0) / matrix.sum(axis=1)
    f = np.where(xyz > (6 / 29) ** 3, np.cbrt(xyz), xyz / (3 * (6 / 29) ** 2) + 4 / 29)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


def test_tints_are_the_declared_colour() -> None:
    found = fills(fills_of(REGIONS, NODES, MATERIALS, Style("tints")))
    assert {path: [fill.colour for fill in items] for path, items in found.items()} == {
        "gauge.cap": [BRASS.flat],
        "gauge.rim": [HOUSING.flat],
        "stand": [WEISS.flat],
    }


@pytest.mark.parametrize("drawn_as", ["lines", "stipple"])
def test_lines_and_stipple_are_filled_white(drawn_as: str) -> None:
    regions = (*REGIONS, square(0.0, 0, is_cap=True))
    found = fills(fills_of(regions, NODES, MATERIALS, Style(drawn_as)))  # type: ignore[arg-type]
    assert {fill.colour for items in found.values() for fill in items} == {WHITE}
    assert len(found["gauge.cap"]) == 2  # the cap apart from the rest


def test_nothing_is_filled_over_a_tone_image() -> None:
    assert fills_of(REGIONS, NODES, MATERIALS, Style("lines and tone")) == ()


def test_emphasis_highlights_pales_and_leaves_out() -> None:
    emphasis = np.array([Emphasis.HIGHLIGHT, Emphasis.MUTE, Emphasis.GHOST], np.uint8)
    found = fills(fills_of(REGIONS, NODES, MATERIALS, Style("tints"), emphasis))
    assert set(found) == {"gauge.cap", "gauge.rim"}
    assert found["gauge.cap"][0].colour == ACCENT
    assert found["gauge.rim"][0].colour == (242, 243, 240)  # 216, 220, 210 two thirds of the way to 255
    white = fills(fills_of(REGIONS, NODES, MATERIALS, Style("lines"), emphasis))
    assert [white[path][0].colour for path in ("gauge.cap", "gauge.rim")] == [ACCENT, WHITE]


def test_a_muted_colour_is_never_darker() -> None:
    for material in MATERIALS:
        plain, muted = (colour_of(material, True, stress) for stress in (Emphasis.PLAIN, Emphasis.MUTE))
        assert plain is not None and muted is not None
        assert all(b >= a for a, b in zip(plain, muted, strict=True))


def test_fills_reach_a_hair_beyond_their_border_and_no_more() -> None:
    (cap, *_), _, _ = fills(fills_of(REGIONS, NODES, MATERIALS, Style("lines"))).values()
    (path,) = cap.paths
    (piece,) = path.pieces
    assert path.is_closed and isinstance(piece, Lines)
    outline = shapely.Polygon([path.start, *piece.points])
    assert outline.equals_exact(shapely.box(-HAIR_MM, -HAIR_MM, 10 + HAIR_MM, 10 + HAIR_MM).normalize(), 1e-9) or (
        outline.symmetric_difference(shapely.box(-HAIR_MM, -HAIR_MM, 10 + HAIR_MM, 10 + HAIR_MM)).area < 1e-9
    )
    assert HAIR_MM < 0.13 / 2 / 2  # a quarter of the narrowest line of ISO 128-2 in use


def test_the_accent_is_apart_from_common_tints_for_every_kind_of_colour_vision() -> None:
    """Palette pairs stay 10 apart in CIE 1976 colour difference under simulated deficiencies."""
    greys = [(level, level, level) for level in (255, 230, 200, 160, 120, 80)]
    for matrix, other in itertools.product(DEFICIENCIES, [*greys, BRASS.flat, HOUSING.flat, (184, 115, 81)]):
        accent, tint = (lab(matrix @ colour.from_bytes(each)) for each in (ACCENT, other))
        assert np.linalg.norm(accent - tint) > 20.0
    assert np.abs(sum(DEFICIENCIES[1:]).sum(axis=1) - 3.0).max() < 1e-5  # greys stay what they are


def test_black_lines_on_the_accent_have_contrast() -> None:
    """WCAG 2.1, 1.4.11: contrast (L1 + 0.05) / (L2 + 0.05), at least 3 for graphics."""
    assert (colour.luminance(colour.from_bytes(ACCENT)) + 0.05) / 0.05 > 9.0

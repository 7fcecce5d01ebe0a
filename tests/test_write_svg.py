"""SVG: sizes, names, ids, words, attributes once a group, and points as exact as stated."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ElementTree

import numpy as np
import pytest
from platewright.backend.contract import F64, LineClass
from platewright.backend.drawing import Arc, Drawing, Fill, Group, Image, Lines, Path, Stroke
from platewright.backend.outlines import arc_steps, end_of
from platewright.backend.write.strokes import Decimals, in_units
from platewright.backend.write.svg import svg_bytes
from support.drawings import SAMPLES, chain, clipped, ellipse, line, nested, page, picture, wording
from support.svg_paths import SVG, flattened, read_paths

_NUMBER = r"-?(?:\d+\.?\d*|\.\d+)"


@pytest.mark.parametrize("name", sorted(SAMPLES))
def test_files_are_plain_and_repeat(name: str) -> None:
    data = svg_bytes(SAMPLES[name]())
    assert data == svg_bytes(SAMPLES[name]())
    assert b"\r" not in data and data.endswith(b"</svg>\n")
    text = data.decode()
    without_images = re.sub(r"base64,[^\"]*", "", text)
    assert not re.search(r"-0(?![.\d])|(?<![\d])-?0\.\d|\d\.0(?!\d)|e[-+]\d|nan|inf", without_images.split("\n", 2)[2])
    ids = re.findall(r' id="([^"]*)"', text)
    assert len(ids) == len(set(ids))
    assert all(re.fullmatch(r"[A-Za-z_][A-Za-z0-9._-]*", each) for each in ids)


def test_the_page_is_in_millimetres() -> None:
    root = ElementTree.fromstring(svg_bytes(Drawing(123.4567, 80.0, ())))
    assert (root.attrib["width"], root.attrib["height"]) == ("123.4567mm", "80mm")
    assert root.attrib["viewBox"] == "0 0 123.4567 80"


def test_words_of_the_figure_are_there_for_those_who_do_not_see_it() -> None:
    drawing = Drawing(9, 9, (), "A <title>", 'It "is" & it shows', "Long\ndescription \x07", "en-GB")
    root = ElementTree.fromstring(svg_bytes(drawing))
    assert root.attrib["role"] == "img"
    assert root.attrib["aria-label"] == drawing.alt
    assert root.attrib["{http://www.w3.org/XML/1998/namespace}lang"] == "en-GB"
    assert root.findtext(f"{SVG}title") == drawing.title
    description = root.find(f"{SVG}desc")
    assert description is not None and description.attrib["id"] == root.attrib["aria-describedby"]
    assert description.text == "Long\ndescription \ufffd"  # XML 1.0, 2.2: no such control character
    bare = ElementTree.fromstring(svg_bytes(Drawing(9, 9, ())))
    assert bare.find(f"{SVG}title") is None and "aria-label" not in bare.attrib


def test_groups_bear_their_names_and_ids_that_say_where_they_are() -> None:
    data = svg_bytes(nested())
    names = [
        element.attrib["data-name"] for element in ElementTree.fromstring(data).iter() if "data-name" in element.attrib
    ]
    assert "gauge.cap_screws[3].head" in names and "gauge.ö & <x>" in names
    paths = read_paths(data)
    assert paths[1].ids[-1] == "panel.A_part.gauge.cap_screws-3-.head_class.visible-outline"
    assert paths[-1].ids[0] == "panel.A-2"


def test_ids_stay_when_something_is_added() -> None:
    drawing = nested()
    first = drawing.groups[0]
    more = Group("part", "new", (line([(1, 1), (2, 2)]),))
    grown = Drawing(drawing.width, drawing.height, (Group("panel", "A", (more, *first.items)), drawing.groups[1]))
    before, after = ({path.ids for path in read_paths(svg_bytes(each))} for each in (drawing, grown))
    assert after - before == {("panel.A", "panel.A_part.new")} and before < after


def test_attributes_stand_once_a_group() -> None:
    strokes = tuple(line([(k, 1), (k, 5)], 0.35) for k in range(1, 30))
    text = svg_bytes(Drawing(40, 9, (Group("class", "visible-edge", strokes),))).decode()
    assert text.count("stroke-width") == 1 and text.count("<g ") == 1 and text.count("<path") == 29
    mixed = (*strokes, line([(2, 7), (30, 7)], 0.7, line_class=LineClass.VISIBLE_OUTLINE), *strokes)
    text = svg_bytes(Drawing(40, 9, (Group("part", "a", mixed),))).decode()
    assert text.count("stroke-width") == 3
    read = read_paths(text.encode())
    assert [path.attributes["stroke-width"] for path in read] == [".35"] * 29 + [".7"] + [".35"] * 29
    assert read[29].attributes["class"] == "visible-outline"


def test_strokes_say_their_ends_and_colour() -> None:
    drawing = page(line([(1, 1), (2, 2)], 0.25, False, (170, 0, 255)), line([(1, 1), (2, 2)], 0.25))
    flat, rounded = (path.attributes for path in read_paths(svg_bytes(drawing)))
    assert flat["stroke"] == "#a0f" and rounded["stroke"] == "#000"
    assert "stroke-linecap" not in flat and "stroke-linejoin" not in flat  # SVG 1.1: butt and miter are what is meant
    assert (rounded["stroke-linecap"], rounded["stroke-linejoin"], rounded["fill"]) == ("round", "round", "none")


def test_points_are_right_to_half_of_the_last_decimal_however_many_they_are() -> None:
    """Relative steps must not add their roundings up: 5 000 random points of one path, each within 5e-5 mm."""
    points = np.random.default_rng(2).uniform(0, 200, (5000, 2))
    stroke = Stroke(
        Path((float(points[0, 0]), float(points[0, 1])), (Lines(points[1:]),)), 0.35, LineClass.VISIBLE_EDGE
    )
    (path,) = read_paths(svg_bytes(page(stroke)))
    assert np.abs(path.runs[0] - points).max() <= 0.5e-4 + 1e-9


@pytest.mark.parametrize("n_arcs", [1, 2, 3, 4, 7])
@pytest.mark.parametrize(
    ("a", "b", "turn"), [(9.0, 9.0, 0.0), (31.7, 31.7, 0.0), (12.0, 5.0, 33.0), (40.0, 0.9, -71.0)]
)
def test_arcs_as_rounded_stay_on_their_ellipse(n_arcs: int, a: float, b: float, turn: float) -> None:
    """Arcs of the file against the implicit ellipse: 0.001 mm, read by our reading of them, which fontTools confirms.

    One arc of nearly a whole turn, and halves, are the hard ones: their centre hangs on how their ends are rounded.
    fontTools makes each arc cubics of up to a quarter, which stray by 2.7e-4 of the radius.
    """
    centre = np.array((57.12345, 61.98765))
    path = ellipse((float(centre[0]), float(centre[1])), a, b, turn, max(n_arcs, 2))
    if n_arcs == 1:
        degrees = ellipse((float(centre[0]), float(centre[1])), a, b, turn, 360)
        path = Path(path.start, (Arc((a, b), turn, True, True, end_of(degrees.pieces[-2])),), True)
    text = svg_bytes(page(Stroke(path, 0.35, LineClass.VISIBLE_OUTLINE), width=120, height=120))
    (read,) = read_paths(text)
    data = re.findall(r'<path[^>]* d="([^"]*)"', text.decode())[0]
    at = np.array([float(number) for number in re.findall(_NUMBER, data.split("a")[0])])
    found = []
    for command in data.split("a")[1:]:
        rx, ry, angle, large, sweep, dx, dy = map(float, re.findall(_NUMBER, command)[:7])
        end = (float(at[0] + dx), float(at[1] + dy))
        steps = arc_steps((float(at[0]), float(at[1])), Arc((rx, ry), angle, large == 1, sweep == 1, end), 0.1)
        assert steps is not None and large == 0
        found.append(steps.points)
        at = np.array(end)
    assert _off_ellipse(np.concatenate(found) - centre, a, b, turn).max() < 1e-3
    assert _off_ellipse(read.runs[0] - centre, a, b, turn).max() < 1e-3 + 2.8e-4 * a
    assert len(found) >= 4


def _off_ellipse(offset: F64, a: float, b: float, turn: float) -> F64:
    """Distance of points from an ellipse about the origin, to first order."""
    cos, sin = np.cos(np.radians(turn)), np.sin(np.radians(turn))
    x, y = offset @ (cos, sin), offset @ (-sin, cos)
    value = (x / a) ** 2 + (y / b) ** 2 - 1.0
    return np.abs(value) / (2.0 * np.hypot(x / a**2, y / b**2))


def test_lines_and_lengths_measure_what_was_asked() -> None:
    """A 50 mm line, a dash of 3 mm, a width: read from the file."""
    drawing = page(line([(3.3333, 4), (53.3333, 4)]), line([(5, 5), (5 + 3 * 0.6, 5 + 3 * 0.8)], 0.18, False), width=60)
    long, dash = read_paths(svg_bytes(drawing))
    assert np.hypot(*(long.runs[0][1] - long.runs[0][0])) == pytest.approx(50.0, abs=1e-4)
    assert np.hypot(*(dash.runs[0][1] - dash.runs[0][0])) == pytest.approx(3.0, abs=1.5e-4)
    assert float(dash.attributes["stroke-width"]) == 0.18


def test_words_are_outlines_that_keep_their_text() -> None:
    read = read_paths(svg_bytes(wording()))
    assert [path.attributes["aria-label"] for path in read] == ["Section A–A", "Ωμέγα 1:2", "turned 30°", "8 & <9>"]
    first = np.concatenate(read[0].runs)
    capital = read[0].runs[0]
    assert first[:, 0].min() > 4.0 and first[:, 1].max() < 8.2
    assert np.ptp(capital[:, 1]) == pytest.approx(3.5, rel=0.05)  # S overshoots base line and height
    assert b"<text" not in svg_bytes(wording())


def test_a_clip_is_told_with_its_group() -> None:
    root = ElementTree.fromstring(svg_bytes(clipped()))
    clips = {clip.attrib["id"]: clip[0].attrib["d"] for clip in root.iter(f"{SVG}clipPath")}
    assert len(clips) == 2
    used = [element.attrib["clip-path"] for element in root.iter(f"{SVG}g") if "clip-path" in element.attrib]
    assert sorted(used) == sorted(f"url(#{each})" for each in clips)
    polygon = clipped().groups[0].clip
    assert polygon is not None
    assert np.allclose(flattened(clips["panel.A_clip"])[0][:4], polygon)


def test_a_picture_stands_in_the_file_pixel_by_pixel() -> None:
    import base64
    import io

    from PIL import Image as Picture

    (image,) = ElementTree.fromstring(svg_bytes(picture())).iter(f"{SVG}image")
    data = image.attrib["{http://www.w3.org/1999/xlink}href"].removeprefix("data:image/png;base64,")
    mark = picture().groups[0].items[0]
    assert isinstance(mark, Image)
    with Picture.open(io.BytesIO(base64.b64decode(data))) as read:
        assert np.array_equal(np.asarray(read), mark.pixels)
        assert not set(read.info) - {"srgb", "dpi"}
    assert [float(image.attrib[key]) for key in ("x", "y", "width", "height")] == list(mark.place)
    assert image.attrib["preserveAspectRatio"] == "none"


def test_fills_that_abut_reach_over_one_another() -> None:
    areas = (Fill((chain([(1, 1), (5, 1), (5, 5)], True),), (200, 200, 200)),)
    spread, plain = (read_paths(svg_bytes(Drawing(9, 9, (Group(kind, "", areas),))))[0] for kind in ("fills", "part"))
    assert spread.attributes["stroke"] == spread.attributes["fill"] == "#c8c8c8"
    assert float(spread.attributes["stroke-width"]) == 0.05
    assert "stroke" not in plain.attributes


def test_lengths_are_spelled_shortest() -> None:
    decimals = Decimals()
    spelled = [
        decimals[int(units)] for units in in_units((0.0, -0.00004, 0.5, -0.5, 12.0, 1.23456, 100.00004, -3.0001))
    ]
    assert spelled == ["0", "0", ".5", "-.5", "12", "1.2346", "100", "-3.0001"]


def test_many_lines_take_few_bytes() -> None:
    """2 000 short polylines of six points: under 17 bytes a point, its share of the element included."""
    random = np.random.default_rng(4)
    strokes = []
    for start in random.uniform(5, 200, (2_000, 2)):
        points = start + np.cumsum(random.normal(size=(6, 2)), axis=0)
        strokes.append(Stroke(Path(tuple(points[0]), (Lines(points[1:]),)), 0.35, LineClass.VISIBLE_EDGE))
    data = svg_bytes(Drawing(210, 210, (Group("class", "visible-edge", tuple(strokes)),)))
    assert len(data) / 12_000 < 17

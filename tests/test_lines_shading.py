"""Shading by numbers: dots inside what is seen and clear of lines, spacing that follows tone, marks that stay put."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
import pytest
import shapely
from platewright.backend.contract import F64, Emphasis, Geometry, Light, Lighting, LineClass, Panel
from platewright.backend.drawing import BLACK, Arc, Fill, Group, Lines, Stroke
from platewright.backend.lines.dots import N_POINTS, SIDE, scatter
from platewright.backend.lines.queries import front_face
from platewright.backend.lines.regions import polygon_of
from platewright.backend.lines.shading import Marks, direction_of, fullness, line_shading_of, stipple_of
from platewright.backend.lines.tone import darkness
from platewright.compiler.solids.recipe import Block, Cylinder, Sphere
from support.line_scenes import VIEWS, fitted, line_panel, placed_at, scene
from support.penetrating import Arranged, arranged
from support.recipes import add, made


def upper_left(panel: Panel, key: float = 0.5, ambient: float = 0.3) -> Lighting:
    """Light from the upper left front, 45 degrees in the picture, and some from all round."""
    right, up, sight = (
        np.array(axis) for axis in (panel.projection.right, panel.projection.up, panel.projection.sight)
    )
    toward = (-right + up - sight) / np.sqrt(3.0)
    return Lighting(
        (Light("directional", tuple(toward.tolist()), (key,) * 3), Light("ambient", (0, 0, 0), (ambient,) * 3))
    )


@dataclass(frozen=True, eq=False, slots=True)
class Lit:
    """A scene arranged, and the panel it is drawn in."""

    found: Arranged
    panel: Panel


def lit(geometry: Geometry, sight: str = "isometric", size: float = 60.0, **more: object) -> Lit:
    projection = fitted(geometry, VIEWS[sight], size)
    lighting = upper_left(line_panel(projection))
    panel = line_panel(projection, drawn_as="stipple", lighting=lighting, **more)
    return Lit(arranged(geometry, projection), panel)


@cache
def still_life() -> Lit:
    parts = [
        ("ball", made(add(Sphere(20.0))), placed_at(14, -8, 9.9)),
        ("pin", made(add(Cylinder(12.0, 30.0))), placed_at(-10, 10, 0)),
        ("slab", made(add(Block((60.0, 50.0, 6.0)))), placed_at(0, 0, -6)),
    ]
    return lit(scene(parts))


def stipple(drawn: Lit, marks: Marks | None = None, panel: Panel | None = None) -> tuple[Group, ...]:
    found = drawn.found
    return stipple_of(found.view, found.pieces, found.candidates, found.occluders, panel or drawn.panel, marks)


def centres(group: Group) -> F64:
    """Centres (k,2) of a group's dots, after checking that they are discs of one size."""
    (fill,) = group.items
    assert isinstance(fill, Fill) and fill.colour == BLACK
    found = []
    for path in fill.paths:
        assert path.is_closed and all(isinstance(piece, Arc) for piece in path.pieces)
        (first, second) = path.pieces
        assert isinstance(first, Arc) and isinstance(second, Arc) and second.end == pytest.approx(path.start)
        assert first.half_axes == second.half_axes == (0.125, 0.125)
        assert first.end[0] - path.start[0] == pytest.approx(0.25)
        found.append(((path.start[0] + first.end[0]) / 2, path.start[1]))
    return np.array(found)


def region_of(found: Arranged, path: str) -> shapely.Geometry:
    return shapely.union_all(
        [polygon_of(region) for region in found.regions if found.geometry.nodes[region.node].path == path]
    )


def test_the_scatter_is_even_at_every_count() -> None:
    """The least distance of n points over that of n points in a hexagonal lattice: 0.6 and more looks even."""
    points = scatter().points
    assert len(np.unique(points, axis=0)) == N_POINTS and points.min() >= 0 and points.max() < SIDE
    for n in (48, 200, 700, N_POINTS):
        apart = np.abs(points[:n, None] - points[None, :n])
        square = (np.minimum(apart, SIDE - apart) ** 2).sum(axis=-1)
        np.fill_diagonal(square, SIDE * SIDE)
        assert np.sqrt(square.min()) / np.sqrt(2.0 / np.sqrt(3.0) * SIDE * SIDE / n) > 0.6
    assert scatter().least_distance == pytest.approx(np.sqrt(square.min()))


def test_dots_lie_in_the_region_of_their_part_and_clear_of_lines() -> None:
    drawn = still_life()
    found = drawn.found
    rows = np.flatnonzero(found.pieces.is_visible & found.candidates.is_drawn[found.pieces.segment])
    lines = shapely.union_all(
        shapely.linestrings(np.stack([found.pieces.start[rows, :2], found.pieces.end[rows, :2]], axis=1))
    )
    groups = stipple(drawn)
    assert [group.name for group in groups] == ["ball", "pin", "slab"]
    for group in groups:
        points = shapely.points(centres(group))
        assert len(points) > 30
        assert shapely.contains(region_of(found, group.name).buffer(-0.125), points).all()
        # Radius, half a dot of air, half a wide line.
        assert shapely.distance(points, lines).min() >= 0.125 + 0.125 + 0.175 - 1e-9


def test_dots_keep_their_distance() -> None:
    points = np.concatenate([centres(group) for group in stipple(still_life())])
    apart = np.hypot(*(points[:, None] - points[None]).transpose(2, 0, 1))
    np.fill_diagonal(apart, np.inf)
    assert apart.min() >= 0.25 + 0.4 - 1e-9


def test_the_density_of_dots_follows_the_tone() -> None:
    """On a ball lit from the upper left: hardly any toward the light, ever more toward the lower right."""
    geometry = scene([("ball", made(add(Sphere(20.0)), rung=0.005), placed_at(0, 0, 0))])
    drawn = lit(geometry, "front", 80.0)
    (group,) = stipple(drawn)
    from_middle = (centres(group) - 60.0) / 40.0
    along, beside = (from_middle @ np.array([[1.0, 1.0], [1.0, -1.0]]) / np.sqrt(2.0)).T
    count = np.histogram(along[np.abs(beside) < 0.4], np.linspace(-0.9, 0.9, 7))[0]
    assert count[0] == 0 and count[1] <= 1 and (np.diff(count[1:]) > 0).all() and count[-1] > 20
    assert abs(np.mean((centres(group) - 60.0) @ (np.array([1.0, -1.0])))) < 2.0  # even across the light


def test_darkness_is_that_of_a_matt_white_surface() -> None:
    """Lambert's cosine law on the three faces of a block, where normals are known."""
    geometry = scene([("block", made(add(Block((10.0, 10.0, 10.0)))), placed_at(0, 0, 0))])
    drawn = lit(geometry)
    view, light = drawn.found.view, drawn.panel.lighting
    toward = np.array(light.lights[0].vector)
    for normal in ((0.0, 0.0, 1.0), (0.0, -1.0, 0.0), (1.0, 0.0, 0.0)):
        face = int(np.flatnonzero(np.abs(view.corner_normals[:, 0] - normal).max(axis=1) < 1e-6)[0])
        middle = view.points[view.faces[face], :2].mean(axis=0)
        found = darkness(view, np.array([face], np.int32), middle[None], light)
        assert found == pytest.approx(1.0 - np.sqrt(0.5 * max(0.0, float(toward @ normal)) + 0.3), abs=1e-6)


def test_a_lamp_falls_off_with_the_square_of_the_distance() -> None:
    """E = I / d^2 head-on: 0.64 of an irradiance at 1 m, seen from 1 m, has the root 0.8."""
    geometry = scene([("block", made(add(Block((10.0, 10.0, 10.0)))), placed_at(0, 0, -10))])
    view = lit(geometry, "top").found.view
    face = front_face(view, lit(geometry, "top").found.occluders, np.array([[60.0, 60.0]]))
    lamps = [Lighting((Light("lamp", (0.0, 0.0, height), (0.64,) * 3),)) for height in (1000.0, 2000.0)]
    near, far = (float(darkness(view, face, np.array([[60.0, 60.0]]), lamp)[0]) for lamp in lamps)
    assert near == pytest.approx(0.2, abs=1e-6) and far == pytest.approx(0.6, abs=1e-6)


def test_fullness_rises_from_white_to_all_marks() -> None:
    steps = fullness(np.linspace(0.0, 1.0, 101))
    assert steps[0] == 0.0 and steps[-1] == 1.0 and (np.diff(steps) >= 0.0).all()


def test_muted_parts_and_caps_have_no_marks() -> None:
    drawn = still_life()
    emphasis = np.array([Emphasis.MUTE, Emphasis.HIGHLIGHT, Emphasis.PLAIN], np.uint8)
    panel = line_panel(drawn.panel.projection, lighting=drawn.panel.lighting, drawn_as="stipple", emphasis=emphasis)
    assert [group.name for group in stipple(drawn, panel=panel)] == ["pin", "slab"]
    found = drawn.found
    assert [group.name for group in line_shading_of(found.view, found.regions, found.occluders, panel)] == ["pin"]


def test_marks_of_other_parts_stay_where_they_are() -> None:
    """Steps in register: with the ball taken away, every dot of the others stays, and more of them show."""
    parts = [
        ("ball", made(add(Sphere(20.0))), placed_at(14, -8, 9.9)),
        ("slab", made(add(Block((60.0, 50.0, 6.0)))), placed_at(0, 0, -6)),
    ]
    with_ball = lit(scene(parts))
    alone = Lit(arranged(scene(parts[1:]), with_ball.panel.projection), with_ball.panel)
    before, after = ({tuple(p) for p in centres(stipple(drawn)[-1]).round(9)} for drawn in (with_ball, alone))
    assert before < after and len(before) > 100


def strokes(groups: tuple[Group, ...], name: str) -> F64:
    (group,) = (each for each in groups if each.name == name)
    found = []
    for stroke in group.items:
        assert isinstance(stroke, Stroke) and (stroke.width, stroke.line_class) == (0.18, LineClass.SHADING)
        (piece,) = stroke.path.pieces
        assert isinstance(piece, Lines)
        found.append((*stroke.path.start, *piece.points[0]))
    return np.array(found)


def test_strokes_of_a_cylinder_run_along_it_and_crowd_on_the_dark_side() -> None:
    drawn = still_life()
    found = drawn.found
    groups = line_shading_of(found.view, found.regions, found.occluders, drawn.panel)
    assert [group.name for group in groups] == ["ball", "pin"]
    lines = strokes(groups, "pin")
    assert np.abs(lines[:, 0] - lines[:, 2]).max() < 1e-6  # upright, as the axis is
    x = np.unique(lines[:, 0].round(6))
    gaps = np.diff(x)
    assert gaps.min() >= 0.4 + 0.18 - 1e-6
    outline = region_of(found, "pin").bounds
    middle = (outline[0] + outline[2]) / 2
    assert gaps[x[1:] > middle].min() < gaps[x[:-1] < middle].max()
    assert np.count_nonzero(x > middle) > 2 * np.count_nonzero(x < middle)


def test_strokes_keep_a_gap_from_outlines_and_stay_inside() -> None:
    drawn = still_life()
    found = drawn.found
    groups = line_shading_of(found.view, found.regions, found.occluders, drawn.panel, flat_faces=True)
    assert {group.name for group in groups} == {"ball", "pin", "slab"}
    for group in groups:
        lines = shapely.linestrings(strokes(groups, group.name).reshape(-1, 2, 2))
        region = region_of(found, group.name)
        assert shapely.contains(region, lines).all()
        assert shapely.distance(lines, region.boundary).min() >= 0.175 + 0.4 - 1e-6
        assert shapely.length(lines).min() >= 1.0


def test_directions_follow_the_surface() -> None:
    view = still_life().found.view
    kinds = {int(kind): patch for patch, kind in enumerate(view.geometry.patches.kind)}
    assert direction_of(view, kinds[1]) == 90.0 and direction_of(view, kinds[3]) == 45.0
    is_top = (view.face_node == 2) & (view.corner_normals[:, 0, 2] > 0.99)
    top = int(view.face_patch[np.flatnonzero(is_top)[0]])
    assert direction_of(view, top) in (30.0, 150.0)  # level, as the x axis is drawn (ISO 5456-3)

"""Threads by convention, centre lines, curves of a panel."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest
from platewright.backend import camera
from platewright.backend.contract import F64, Geometry, LineClass, Mesh, Projection, SpaceCurve, Style, Thread
from platewright.backend.lines.centre_lines import BEYOND_MM
from platewright.backend.lines.conventions import conventions_of, curves_of
from platewright.backend.lines.model import Candidates, View, number_of
from platewright.backend.lines.near import NEAR
from platewright.backend.lines.occluders import occluders_of
from platewright.backend.lines.visibility import cut as seen_pieces
from platewright.compiler.solids.cut import cut_mesh, half_space
from platewright.compiler.solids.recipe import Block, Cylinder, Edged, Prism, Sphere, Torus
from platewright.compiler.solids.transform import translate
from support.geometries import flattened, leaf, shifted, turned
from support.plain_views import geometry_of, view_of
from support.recipes import add, cut, made

MAJOR, MINOR, PITCH = 12.0, 10.1, 1.75
EXTERNAL = Thread((0.0, 0.0, 0.0), (0.0, 0.0, 1.0), 26.0, MAJOR, MINOR, PITCH, False)
INTERNAL = Thread((0.0, 0.0, 6.0), (0.0, 0.0, 1.0), 18.0, MAJOR, MINOR, PITCH, True)
BOLT = made(add(Cylinder(MAJOR, 40.0)), add(Prism(6, 19.0, 8.0), translate((0, 0, 40))))
TAPPED = made(
    add(Block((40.0, 40.0, 24.0))),
    cut(Cylinder(MINOR, 30.0), translate((0, 0, 2))),
)
PLAIN, CENTRED = Style("lines"), Style("lines", centre_lines=True)
ROOT, CREST, CENTRE = (
    number_of(each) for each in (LineClass.THREAD_ROOT, LineClass.THREAD_CREST, LineClass.CENTRE_LINE)
)


def side(name, magnification: float = 1.0) -> Projection:
    return camera.parallel(camera.orthographic(name), magnification, (0.0, 0.0))


def threaded(mesh: Mesh, thread: Thread) -> Geometry:
    return flattened([replace(leaf("part", -1, 0, 0, np.eye(4)), threads=(thread,))], [mesh])


def halved(mesh: Mesh, normal: tuple[float, float, float], offset: float = 0.0) -> Mesh:
    left = cut_mesh(mesh, np.eye(4), half_space(normal, offset, np.zeros(3), 500.0))
    assert left is not None
    return left


def lines_of(view: View, found: Candidates, of_class: int) -> list[tuple[F64, F64, bool]]:
    """Ends on the page and whether seen, of the pieces of a class."""
    pieces = seen_pieces(view, found)
    rows = np.flatnonzero(found.line_class[pieces.segment] == of_class)
    return [(pieces.start[k, :2], pieces.end[k, :2], bool(pieces.is_visible[k])) for k in rows]


def boxed(lines: Sequence[tuple[F64, F64, bool]], seen: bool = True) -> list[list[float]]:
    """Boxes (left, top, right, bottom) of lines, rounded, in order."""
    return sorted(
        np.round(np.concatenate((np.minimum(a, b), np.maximum(a, b))), 6).tolist()
        for a, b, is_seen in lines
        if is_seen == seen
    )


def test_the_root_of_an_external_thread_is_two_lines_at_its_minor_diameter():
    view = view_of(threaded(BOLT, EXTERNAL), side("front"))
    found = conventions_of(view, PLAIN)
    root = boxed(lines_of(view, found, ROOT))
    assert root == [[x, -26.0, x, 0.0] for x in (-MINOR / 2, MINOR / 2)]
    # The thread ends part of the way: a line from crest to crest, nothing at its free end.
    limit = np.array(boxed(lines_of(view, found, CREST)))
    assert np.abs(limit[:, [1, 3]] + 26.0).max() < 1e-9
    assert limit[:, 0].min() == pytest.approx(-MAJOR / 2, abs=1e-6) and limit[:, 2].max() == pytest.approx(MAJOR / 2)


def test_the_root_ends_where_the_thread_does_and_a_hole_across_breaks_it():
    mesh = made(add(Cylinder(MAJOR, 40.0)), cut(Cylinder(4.0, 40.0), ((1, 0, 0, 0), (0, 0, -1, 20), (0, 1, 0, 10))))
    view = view_of(threaded(mesh, EXTERNAL), side("right"))
    root = boxed(lines_of(view, conventions_of(view, PLAIN), ROOT))
    assert [line[0] for line in root] == [-MINOR / 2, MINOR / 2]
    front = view_of(threaded(mesh, EXTERNAL), side("front"))
    assert len(boxed(lines_of(front, conventions_of(front, PLAIN), ROOT))) == 2
    hole = made(
        add(Cylinder(MAJOR, 40.0)), cut(Cylinder(4.0, 40.0), ((1, 0, 0, MINOR / 2), (0, 0, -1, 20), (0, 1, 0, 10)))
    )
    broken = view_of(threaded(hole, EXTERNAL), side("front"))
    spans = [line for line in boxed(lines_of(broken, conventions_of(broken, PLAIN), ROOT)) if line[0] > 0.0]
    assert len(spans) == 2
    assert spans[0][3] == pytest.approx(-12.0, abs=0.03) and spans[1][1] == pytest.approx(-8.0, abs=0.03)


@pytest.mark.parametrize(("mesh", "thread", "name"), [(BOLT, EXTERNAL, "bottom"), (TAPPED, INTERNAL, "top")])
def test_from_its_axis_the_root_is_three_quarters_of_a_circle(mesh, thread, name):
    view = view_of(threaded(mesh, thread), side(name))
    found = conventions_of(view, PLAIN)
    pieces = seen_pieces(view, found)
    root = found.line_class[pieces.segment] == ROOT
    assert pieces.is_visible[root].all()
    start, end = pieces.start[root, :2], pieces.end[root, :2]
    radius = (MAJOR if thread.internal else MINOR) / 2
    assert np.abs(np.linalg.norm(start, axis=1) - radius).max() < 1e-9
    assert np.linalg.norm(end - start, axis=1).sum() == pytest.approx(1.5 * np.pi * radius, rel=1e-3)
    # Open in the upper right quadrant, y being down: common practice.
    middle = 0.5 * (start + end)
    is_open = (middle[:, 0] > 0.2 * radius) & (middle[:, 1] < -0.2 * radius)
    assert not is_open.any()
    quadrants = {(bool(x > 0), bool(y > 0)) for x, y in middle}
    assert {(False, False), (False, True), (True, True)} <= quadrants


def test_an_internal_thread_is_hidden_until_it_is_cut_open():
    view = view_of(threaded(TAPPED, INTERNAL), side("front"))
    root = lines_of(view, conventions_of(view, PLAIN), ROOT)
    assert boxed(root, False) == [[x, -24.0, x, -6.0] for x in (-MAJOR / 2, MAJOR / 2)] and boxed(root) == []
    opened = view_of(threaded(halved(TAPPED, (0.0, -1.0, 0.0)), INTERNAL), side("front"))
    found = conventions_of(opened, PLAIN)
    assert boxed(lines_of(opened, found, ROOT))[::2] == [[x, -24.0, x, -6.0] for x in (-MAJOR / 2, MAJOR / 2)]
    # Where it ends within the part, a line from crest to root on the face of the cut.
    ticks = [line for line in boxed(lines_of(opened, found, CREST)) if line[2] - line[0] == pytest.approx(0.95)]
    assert sorted((line[0], line[1]) for line in ticks) == [(-MAJOR / 2, -6.0), (MINOR / 2, -6.0)]


def test_a_cut_beside_the_axis_meets_the_root_nearer_together():
    view = view_of(threaded(halved(BOLT, (0.0, -1.0, 0.0), -3.0), EXTERNAL), side("front"))
    seen = boxed(lines_of(view, conventions_of(view, PLAIN), ROOT))
    half = float(np.sqrt(MINOR**2 / 4 - 9.0))
    assert np.allclose([line[0] for line in seen], (-half, half), atol=1e-6)


def test_a_cut_across_a_thread_shows_its_root_there_and_none_where_it_was():
    view = view_of(
        threaded(halved(TAPPED, (0.0, 0.0, 1.0), 14.0), INTERNAL), camera.parallel(camera.isometric(), 1.0, (0.0, 0.0))
    )
    found = conventions_of(view, PLAIN)
    arc = found.start[(found.line_class == ROOT) & (found.chain == found.chain[found.line_class == ROOT].max())]
    inverse = np.linalg.inv(view.projection.world_to_page)
    ends = np.concatenate((found.start, found.end))
    world = np.column_stack((ends, np.ones(len(ends)))) @ inverse.T
    assert world[:, 2].max() <= 14.0 + 1e-9 and len(arc) > 20


def test_root_lines_of_a_bolt_follow_it_into_pictorial_and_central_views():
    for projection in (
        camera.parallel(camera.isometric(), 1.0, (0.0, 0.0)),
        camera.central((-80.0, -120.0, 40.0), (0.0, 0.0, 20.0), 100.0, (0.0, 0.0)),
    ):
        view = view_of(threaded(BOLT, EXTERNAL), projection)
        found = conventions_of(view, PLAIN)
        lines = found.line_class == ROOT
        assert lines.sum() == 2 and seen_pieces(view, found).is_visible[: lines.sum()].all()
        # On paper each lies where lines of sight touch the cylinder of the root.
        for points in (found.start[lines], found.end[lines]):
            origins, sight = camera.rays(projection, points[:, :2])
            off = np.cross(sight, (0.0, 0.0, 1.0))
            apart = np.abs((off * origins).sum(axis=1)) / np.linalg.norm(off, axis=1)
            assert np.abs(apart - MINOR / 2).max() < 1e-6


def test_a_thread_whose_cylinder_is_gone_draws_nothing():
    view = view_of(threaded(made(add(Block((5.0, 5.0, 5.0)))), EXTERNAL), side("front"))
    assert len(conventions_of(view, PLAIN)) == 0


# --- centre lines


def centre(mesh_or_geometry: Mesh | Geometry, projection: Projection, **more) -> list[list[float]]:
    geometry = mesh_or_geometry if isinstance(mesh_or_geometry, Geometry) else geometry_of(mesh_or_geometry)
    view = view_of(geometry, projection)
    occluders = occluders_of(view) if more.pop("seen_only", False) else None
    found = conventions_of(view, replace(CENTRED, **more), occluders)
    assert found.is_plain.all() and (found.line_class == CENTRE).all()
    return boxed([(a[:2], b[:2], True) for a, b in zip(found.start, found.end, strict=True)])


FLANGED = made(add(Cylinder(20.0, 50.0)), add(Cylinder(40.0, 5.0), translate((0, 0, 45))), cut(Cylinder(8.0, 80.0)))


@pytest.mark.parametrize("magnification", [0.5, 1.0, 2.0])
def test_coaxial_surfaces_share_one_line_two_mm_beyond_the_outline(magnification):
    lines = centre(FLANGED, side("front", magnification))
    assert lines == [[0.0, -50.0 * magnification - BEYOND_MM, 0.0, BEYOND_MM]]


def test_a_circle_seen_from_its_axis_is_crossed_two_mm_past_it():
    assert centre(FLANGED, side("top")) == [[-22.0, 0.0, 22.0, 0.0], [0.0, -22.0, 0.0, 22.0]]


def test_nothing_is_drawn_unless_the_style_asks():
    assert len(conventions_of(view_of(geometry_of(FLANGED), side("front")), PLAIN)) == 0


def test_rounded_edges_and_corners_have_no_axes():
    assert centre(made(add(Edged(Block((40.0, 30.0, 20.0)), "rounded", 3.0))), side("front")) == []


def test_a_slot_has_the_axes_of_its_round_ends():
    ends = [translate((x, 0.0, -5.0)) for x in (-10.0, 10.0)]
    slot = made(
        add(Block((60.0, 30.0, 8.0))),
        cut(Block((20.0, 8.0, 20.0)), translate((0, 0, -5))),
        cut(Cylinder(8.0, 20.0), *ends),
    )
    upright = [line for line in centre(slot, side("top")) if line[0] == line[2]]
    assert [line[0] for line in upright] == [-10.0, 10.0]
    assert all(line[3] - line[1] == pytest.approx(12.0) for line in upright)


def test_balls_and_rings():
    assert centre(made(add(Sphere(20.0))), side("front")) == [[-12.0, 0.0, 12.0, 0.0], [0.0, -12.0, 0.0, 12.0]]
    ring = centre(made(add(Torus(40.0, 10.0))), side("front"))
    assert np.allclose(ring, [[0.0, -7.0, 0.0, 7.0]], atol=0.02)


def test_what_is_too_small_to_see_round_has_none():
    plate = made(add(Block((40.0, 30.0, 2.0))), cut(Cylinder(1.0, 10.0), translate((0, 0, -5))))
    assert centre(plate, side("top")) == [] and len(centre(plate, side("top", 2.0))) == 2


def test_parts_on_one_axis_share_a_line_and_far_ones_do_not():
    pin = made(add(Cylinder(10.0, 20.0)))

    def stacked(*heights: float, order: Sequence[int]) -> Geometry:
        nodes = [leaf(f"pin_{k}", -1, 0, 0, shifted(0.0, 0.0, heights[k], turned(7.0 * k))) for k in order]
        return flattened(nodes, [pin])

    assert centre(stacked(0.0, 20.0, order=(0, 1)), side("front")) == [[0.0, -42.0, 0.0, 2.0]]
    assert centre(stacked(0.0, 20.0, order=(1, 0)), side("front")) == [[0.0, -42.0, 0.0, 2.0]]
    assert len(centre(stacked(0.0, 60.0, order=(0, 1)), side("front"))) == 2


def test_the_axis_of_what_is_hidden_altogether_is_left_out_unless_hidden_edges_are_drawn():
    blind = made(
        add(Block((40.0, 30.0, 20.0))), cut(Cylinder(8.0, 10.0), ((1, 0, 0, 0), (0, 0, 1, 10), (0, -1, 0, 10)))
    )
    assert len(centre(blind, side("rear"), seen_only=True)) == 2
    assert centre(blind, side("front"), seen_only=True) == []
    assert len(centre(blind, side("front"), seen_only=True, hidden=True)) == 2


# --- curves


def test_curves_come_as_chains_in_their_class():
    curves = (
        SpaceCurve(
            np.array(((0.0, 0.0, 0.0), (10.0, 0.0, 0.0), (10.0, 0.0, 0.0), (10.0, 0.0, 5.0))), LineClass.TRACE_LINE, 0
        ),
        SpaceCurve(np.array(((0.0, 0.0, -5.0), (0.0, 0.0, 5.0))), LineClass.CENTRE_LINE, is_hidden_by_parts=False),
        SpaceCurve(np.zeros((1, 3)), LineClass.TRACE_LINE),
    )
    found = curves_of(view_of(geometry_of(made(add(Sphere(2.0)))), side("front")), curves)
    assert found.chain.tolist() == [0, 0, 1] and found.node.tolist() == [0, 0, -1]
    assert found.is_plain.tolist() == [False, False, True]
    assert found.line_class.tolist() == [number_of(LineClass.TRACE_LINE)] * 2 + [CENTRE]
    assert np.array_equal(found.end[0], found.start[1]) and found.end[1, :2].tolist() == [10.0, -5.0]


def test_curves_are_cut_before_the_eye():
    projection = camera.central((0.0, -50.0, 0.0), (0.0, 0.0, 0.0), 50.0, (0.0, 0.0))
    curve = SpaceCurve(np.array(((1.0, 0.0, 0.0), (1.0, -100.0, 0.0), (1.0, -80.0, 0.0))), LineClass.TRACE_LINE)
    found = curves_of(view_of(geometry_of(made(add(Sphere(2.0)))), projection), (curve,))
    assert len(found) == 1 and found.start[0, 0] == pytest.approx(1.0)
    assert -1.0 / found.end[0, 2] == pytest.approx(NEAR, rel=1e-3)

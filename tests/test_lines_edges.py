"""Which sides of triangles are lines, of what class, and in what chains."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from platewright.backend import camera
from platewright.backend.contract import F64, FaceOrigin, Geometry, LineClass, Mesh, Style
from platewright.backend.lines.edges import edges_of
from platewright.backend.lines.model import CLASSES, Candidates, View
from platewright.backend.lines.view import see_view
from platewright.compiler.solids.recipe import Block, Cylinder, Edged, Prism
from platewright.compiler.solids.transform import translate
from support.geometries import flat_mesh, one_cube
from support.line_scenes import (
    HELD_OUT,
    PAGE,
    VIEWS,
    fitted,
    fitted_central,
    free_mesh,
    holed_lids,
    line_panel,
    mechanical,
    moved,
    placed_at,
    rounded_to_float32,
    scene,
    smooth,
    turned_about,
)
from support.recipes import add, made
from support.recipes import cut as cut_away

FRONT, ISOMETRIC = (0.0, 1.0, 0.0), (-1.0, 1.0, -1.0)


def edges(geometry: Geometry, sight: tuple[float, float, float], style: Style | None = None) -> tuple[View, Candidates]:
    view = see_view(geometry, line_panel(fitted(geometry, sight)), PAGE)
    return view, edges_of(view, style or Style())


def lengths(candidates: Candidates) -> F64:
    return np.asarray(np.hypot(*(candidates.end - candidates.start)[:, :2].T))


def by_class(candidates: Candidates) -> dict[str, int]:
    """How many drawn segments there are of each class."""
    rows, counts = np.unique(candidates.line_class[candidates.is_drawn], return_counts=True)
    return {CLASSES[row].value: int(n) for row, n in zip(rows, counts, strict=True)}


def alone(mesh: Mesh) -> Geometry:
    return scene([("part", mesh, placed_at(0, 0, 0))])


def test_a_cube_has_nine_edges_in_sight() -> None:
    _, found = edges(one_cube(), ISOMETRIC)
    assert by_class(found) == {"visible-outline": 6, "visible-edge": 3}
    np.testing.assert_allclose(lengths(found), lengths(found)[0])
    _, found = edges(one_cube(), ISOMETRIC, Style(hidden=True))
    assert by_class(found) == {"visible-outline": 6, "visible-edge": 3, "hidden-edge": 3}


def test_a_cube_from_the_front_is_a_square() -> None:
    """Sides seen edge-on give no line of their own, and edges seen end-on none at all."""
    for geometry in (one_cube(), moved(one_cube(), turned_about((1, 1, 0), 33.0))):
        sight = (
            FRONT if geometry is not None and geometry.vertices.max() == 1.0 else turned_about((1, 1, 0), 33.0) @ FRONT
        )
        _, found = edges(geometry, tuple(sight))
        assert by_class(found) == {"visible-outline": 4}


def test_hollow_edges_are_lines_only_where_both_faces_are_seen() -> None:
    """A block with a step: from above and in front both faces of the hollow edge are seen, from the rear neither."""
    step = alone(made(add(Block((20.0, 20.0, 20.0))), cut_away(Block((30.0, 10.0, 10.0)), translate((0, -5.0, 10.0)))))
    hollow = np.array((0.0, 0.0, 10.0))

    def at_hollow(sight: tuple[float, float, float]) -> list[LineClass]:
        view, found = edges(step, sight)
        middle = (view.world[found.vertices[:, 0]] + view.world[found.vertices[:, 1]]) / 2
        return [CLASSES[k] for k in found.line_class[np.abs(middle - hollow).max(axis=1) < 1e-9]]

    assert at_hollow((-0.5, 1.0, -0.7)) == [LineClass.VISIBLE_EDGE]
    assert at_hollow((-0.5, -1.0, -0.7)) == []
    assert at_hollow((-0.5, 1.0, 0.7)) == []


@pytest.mark.parametrize("form", ["as built", "rotated", "rotated, float32"])
def test_no_line_inside_a_flat_face(form: str) -> None:
    """A lid with 6, 12 or 24 holes has no edges but the rims of its holes and its own, from any side.

    The flat faces fall into slivers; a rule that judges slivers one by one draws false lines here.
    """
    geometry = holed_lids()
    turn = np.eye(3) if form == "as built" else turned_about((0.3, -0.5, 0.81), 37.0)
    shown = moved(geometry, turn)
    shown = rounded_to_float32(shown) if form.endswith("float32") else shown
    first = np.zeros(len(geometry.vertices))
    for node in geometry.nodes:
        at = geometry.vertices[slice(*node.vertex_range)] - node.placement[:3, 3]
        first[slice(*node.vertex_range)] = np.round(np.hypot(at[:, 0], at[:, 1]) - 30.0, 6)
    for sight in {**VIEWS, **HELD_OUT}.values():
        for fit in (fitted, fitted_central):
            view = see_view(shown, line_panel(fit(shown, tuple(turn @ sight))), PAGE)
            found = edges_of(view, Style(hidden=True))
            start, end = (geometry.vertices[found.vertices[found.is_drawn, k]] for k in (0, 1))
            # A rim runs level, and no further than one facet of a 60 mm circle at 0.02 mm chord error: 3.1 mm.
            assert np.abs(start[:, 2] - end[:, 2]).max() == 0.0
            assert np.linalg.norm(start - end, axis=1).max() < 3.2
            on_rim = first[found.vertices[found.is_drawn]] == 0.0
            assert (on_rim[:, 0] == on_rim[:, 1]).all()


@pytest.mark.parametrize("sight", [*VIEWS.values(), *HELD_OUT.values()])
def test_no_facet_line_on_smooth_surfaces(sight: tuple[float, float, float]) -> None:
    for geometry in (mechanical(rung=0.2), smooth(5000)):
        view, found = edges(geometry, sight)
        drawn = found.faces[found.is_drawn]
        assert (view.face_patch[drawn[:, 0]] != view.face_patch[drawn[:, 1]]).all()


def test_the_angle_of_edges_is_measured_between_normals() -> None:
    """A prism of 24 sides has edges of 15 degrees."""
    prism = alone(made(add(Prism(24, 20.0, 10.0))))
    sight = (0.05, 1.0, -0.4)
    soft, sharp = (edges(prism, sight, Style(sharp_angle=angle))[1] for angle in (15.5, 14.5))
    upright = by_class(sharp)["visible-edge"] - by_class(soft)["visible-edge"]
    # Twelve or so of its 24 sides are seen, with edges between them; the first and last are outlines in both.
    assert 10 <= upright <= 12
    assert by_class(sharp)["visible-outline"] == by_class(soft)["visible-outline"]


def test_tangent_edges_are_imaginary_lines_of_intersection() -> None:
    rounded = alone(made(add(Edged(Block((30.0, 20.0, 10.0)), "rounded", 3.0))))
    _, found = edges(rounded, ISOMETRIC)
    assert set(by_class(found)) == {"imaginary-line-of-intersection"}
    _, without = edges(rounded, ISOMETRIC, Style(tangent=False))
    assert by_class(without) == {}
    assert (~without.is_drawn).sum() == (~found.is_drawn).sum() > 0


def test_a_rounded_block_from_the_front_keeps_its_outline() -> None:
    """The flat sides are seen edge-on; their tangent edges with the rounded front edges are the outline."""
    rounded = alone(made(add(Edged(Block((30.0, 20.0, 10.0)), "rounded", 3.0))))
    _, found = edges(rounded, FRONT)
    outline = found.is_drawn & (found.line_class == CLASSES.index(LineClass.VISIBLE_OUTLINE))
    x, y = np.concatenate([found.start[outline], found.end[outline]])[:, :2].T
    assert np.ptp(x) == pytest.approx(100.0) and np.ptp(y) == pytest.approx(100.0 / 3.0)
    # Two long sides of 24 mm and two short ones of 4 mm at 100 mm for 30 mm.
    straight = lengths(found)[outline]
    assert sorted(np.round(straight[straight > 10.0], 6)) == pytest.approx([40 / 3, 40 / 3, 80.0, 80.0])


def test_borders_of_open_meshes_are_outlines() -> None:
    square = np.array([[0.0, 0, 0], [10, 0, 0], [10, 10, 0], [0, 10, 0]])
    flat = free_mesh("flat", square, np.array([[0, 1, 2], [0, 2, 3]], np.int32), closed=False)
    for sight in (ISOMETRIC, (-1.0, 1.0, 1.0)):
        assert by_class(edges(alone(flat), sight)[1]) == {"visible-outline": 4}


def test_an_open_fold_is_an_outline_from_both_sides() -> None:
    """Two squares at a right angle: the fold is an edge where one side of both is seen, else an outline."""
    points = np.array([[0.0, 0, 0], [10, 0, 0], [10, 10, 0], [0, 10, 0], [0, 10, 10], [10, 10, 10]])
    rows = [(0, 1, 2), (0, 2, 3), (3, 2, 5), (3, 5, 4)]
    folded = replace(flat_mesh("fold", points, rows, [0, 0, 1, 1]), closed=False)
    into, over = (edges(alone(folded), sight)[1] for sight in ((0.2, 1.0, -0.5), (0.2, 1.0, 0.5)))
    assert by_class(into) == {"visible-outline": 6, "visible-edge": 1}
    assert by_class(over) == {"visible-outline": 7}


def test_rims_of_cut_faces_are_section_outlines() -> None:
    """The front face of a cube taken as a cap, then as a face of a break, then as a riser of a stepped section."""
    cube = one_cube()
    front = cube.corner_normals[:, 0, 1] == -1.0
    for origin, expected in (
        (FaceOrigin.SECTION_CAP, {"visible-outline": 4, "visible-edge": 1, "section-outline": 4}),
        (FaceOrigin.BREAK, {"visible-outline": 4, "visible-edge": 1, "break-line": 4}),
        (FaceOrigin.STEP, {"visible-outline": 4, "visible-edge": 1}),
    ):
        cut = replace(cube, face_origin=np.where(front, origin, FaceOrigin.SURFACE).astype(np.uint8))
        assert by_class(edges(cut, ISOMETRIC)[1]) == expected


def test_a_rim_is_one_chain_in_its_order() -> None:
    bar = alone(made(add(Cylinder(20.0, 30.0)), rung=0.05))
    view, found = edges(bar, ISOMETRIC)
    chains = found.chain[found.is_drawn]
    assert sorted(np.unique(chains)) == sorted(set(chains)) and len(set(chains)) == 2 and (chains >= 0).all()
    for chain in set(chains):
        rows = np.flatnonzero(found.chain == chain)
        assert (np.diff(rows) == 1).all()
        assert (found.vertices[rows[1:], 0] == found.vertices[rows[:-1], 1]).all()
        np.testing.assert_array_equal(found.start[rows[1:]], found.end[rows[:-1]])
        np.testing.assert_array_equal(found.end[rows], view.points[found.vertices[rows, 1]])
    top = [c for c in set(chains) if found.vertices[found.chain == c][0, 0] == found.vertices[found.chain == c][-1, 1]]
    assert len(top) == 1  # the whole rim of the top; of the bottom one only what is seen


def test_straight_edges_stand_alone() -> None:
    assert (edges(one_cube(), ISOMETRIC)[1].chain == -1).all()


def test_threads_do_not_matter() -> None:
    view = see_view(mechanical(rung=0.1), line_panel(fitted(mechanical(rung=0.1), ISOMETRIC)), PAGE)
    one, three = edges_of(view, Style(), 1), edges_of(view, Style(), 3)
    for name in ("start", "end", "line_class", "chain", "faces", "vertices", "is_drawn"):
        assert getattr(one, name).tobytes() == getattr(three, name).tobytes()


def test_a_skewed_cone_of_many_sides_is_no_trouble() -> None:
    """Hundreds of edges at one point are lines, and no chain."""
    n = 400
    angle = 2 * np.pi * np.arange(n) / n
    rim = np.column_stack([10 * np.cos(angle), 10 * np.sin(angle) * (1 + 0.2 * (-1.0) ** np.arange(n)), 0 * angle])
    points = np.vstack([rim, [[0, 0, 8.0]], [[0, 0, 0.0]]])
    k = np.arange(n)
    sides = np.column_stack([k, (k + 1) % n, np.full(n, n)])
    base = np.column_stack([(k + 1) % n, k, np.full(n, n + 1)])
    star = flat_mesh("star", points, [*sides.tolist(), *base.tolist()], [*range(n), *[n] * n])
    _, found = edges(alone(star), (0.0, 0.0, -1.0))
    assert len(found) > n and (found.chain == -1).all()


def test_nothing_to_see() -> None:
    projection = camera.central((0.0, 10.0, 0.0), (0.0, 20.0, 0.0), 80.0, (50.0, 50.0))
    view = see_view(one_cube(), line_panel(projection), PAGE)
    assert len(edges_of(view, Style())) == 0

"""Cutting of lines where they pass behind surfaces: places known in closed form, contact, order, threads."""

from __future__ import annotations

import dataclasses
from collections import defaultdict

import numpy as np
import pytest
from numpy.typing import NDArray
from platewright.backend import camera
from platewright.backend.compiled import kernel
from platewright.backend.contract import Emphasis, Geometry, LineClass, Mesh, Projection, Style
from platewright.backend.lines.block import lowest, meet, plain_meet
from platewright.backend.lines.edges import edges_of
from platewright.backend.lines.model import CLASSES, Pieces, number_of
from platewright.backend.lines.occluders import occluders_of
from platewright.backend.lines.view import see_view
from platewright.backend.lines.visibility import cut
from platewright.compiler.solids.recipe import Block
from support.geometries import one_cube
from support.line_scenes import (
    PAGE,
    VIEWS,
    Seen,
    fitted,
    fitted_central,
    free_mesh,
    line_panel,
    mechanical,
    mechanical_parts,
    penetrating,
    placed_at,
    scene,
    seen,
    tiny_in_huge,
)
from support.recipes import add, made

ISOMETRIC = (-1.0, 1.0, -1.0)


def block(x: float, y: float, z: float) -> Mesh:
    return made(add(Block((x, y, z))))


def visible_length(found: Seen, node: int | None = None) -> float:
    """Mm on paper of drawn lines that are seen, of one node or of all."""
    pieces, candidates = found.pieces, found.candidates
    is_wanted = pieces.is_visible & candidates.is_drawn[pieces.segment]
    if node is not None:
        is_wanted &= candidates.node[pieces.segment] == node
    return float(np.hypot(*(pieces.end - pieces.start)[is_wanted, :2].T).sum())


def front(scale: float = 1.0) -> Projection:
    """The front view about the middle of the page, y = 0 at depth 0."""
    return camera.parallel(camera.orthographic("front"), scale, (60.0, 60.0))


def test_pieces_tile_their_segments() -> None:
    for fit in (fitted, fitted_central):
        geometry = penetrating(rung=0.2)
        found = seen(geometry, fit(geometry, ISOMETRIC), Style(hidden=True))
        pieces, candidates = found.pieces, found.candidates
        assert (np.diff(pieces.segment) >= 0).all() and len(np.unique(pieces.segment)) == len(candidates)
        for segment in range(len(candidates)):
            rows = pieces.segment == segment
            span, is_visible = pieces.span[rows], pieces.is_visible[rows]
            assert span[0, 0] == 0.0 and span[-1, 1] == 1.0
            assert (span[1:, 0] == span[:-1, 1]).all() and (span[:, 1] > span[:, 0]).all()
            assert (is_visible[1:] != is_visible[:-1]).all()
        whole = pieces.span[:, 1] == 1.0
        np.testing.assert_array_equal(pieces.end[whole], candidates.end[pieces.segment[whole]])


def test_a_bar_behind_a_plate_is_cut_where_the_plate_ends() -> None:
    """From the front, a plate of 20 x 20 mm stands before a bar 60 mm long: its long edges are cut at ±10 mm."""
    geometry = scene([("plate", block(20, 2, 20), placed_at(0, 0, 0)), ("bar", block(60, 2, 4), placed_at(0, 20, 8))])
    found = seen(geometry, front(1.5))
    hidden = ~found.pieces.is_visible & (found.candidates.node[found.pieces.segment] == 1)
    x = np.sort(np.stack([found.pieces.start[hidden, 0], found.pieces.end[hidden, 0]], axis=1), axis=1)
    np.testing.assert_allclose(x, np.tile([60.0 - 15.0, 60.0 + 15.0], (len(x), 1)), atol=1e-4)
    assert len(x) == 2


def test_places_in_central_projection_are_exact() -> None:
    """The eye 100 mm before the plate, the bar 20 mm behind it: the plate's half width of 10 mm hides 12 mm of it."""
    geometry = scene(
        [("plate", block(20, 2, 20), placed_at(0, 1, -10)), ("bar", block(60, 2, 4), placed_at(0, 21, -2))]
    )
    projection = camera.central((0.0, -100.0, 0.0), (0.0, 0.0, 0.0), 150.0, (60.0, 60.0))
    found = seen(geometry, projection)
    hidden = ~found.pieces.is_visible & (found.candidates.node[found.pieces.segment] == 1)
    ends = np.concatenate([found.pieces.start[hidden, 0], found.pieces.end[hidden, 0]])
    np.testing.assert_allclose(np.abs(ends - 60.0), 12.0 * 150.0 / 120.0, atol=1e-4)


def test_parts_that_penetrate_are_cut_at_the_surface() -> None:
    """An upright bar of 4 x 4 mm through a plate: of its edges in sight what lies above the plate's top is seen."""
    geometry = scene([("plate", block(40, 40, 4), placed_at(0, 0, 0)), ("bar", block(4, 4, 40), placed_at(0, 0, -15))])
    projection = fitted(geometry, ISOMETRIC)
    found = seen(geometry, projection)
    upright = np.array([found.view.world[v][0, 2] != found.view.world[v][1, 2] for v in found.candidates.vertices])
    upright &= found.candidates.node == 1
    pieces = found.pieces
    heights = [
        sorted(found.view.world[found.candidates.vertices[s], 2] @ [[1 - a, 1 - b], [a, b]])
        for s, (a, b), is_visible in zip(pieces.segment, pieces.span, pieces.is_visible, strict=True)
        if upright[s] and is_visible
    ]
    assert len(heights) >= 3
    np.testing.assert_allclose([top for _, top in heights if top > 4.0], 25.0)
    assert [bottom for bottom, top in heights if top > 4.0] == pytest.approx([4.0] * 3, abs=1e-3)


def test_flush_plates_show_one_seam_from_two_hundred_viewpoints() -> None:
    """Two equal plates side by side: from every viewpoint the lines seen are those of one plate, and the seam, whole on
    every side that is seen (both plates have an edge there) and nowhere else."""
    plate = block(30, 20, 4)
    pair = scene([("left", plate, placed_at(-15, 0, 0)), ("right", plate, placed_at(15, 0, 0))])
    single = scene([("whole", block(60, 20, 4), placed_at(0, 0, 0))])
    random = np.random.default_rng(7)
    for sight in random.normal(size=(200, 3)):
        projection = fitted(pair, tuple(sight))
        found, whole = seen(pair, projection), seen(single, projection)
        on_seam = np.array([np.abs(found.view.world[v, 0]).max() < 1e-9 for v in found.candidates.vertices])
        pieces = found.pieces
        lengths = np.hypot(*(pieces.end - pieces.start)[:, :2].T)
        is_seam = on_seam[pieces.segment]
        rest = lengths[pieces.is_visible & ~is_seam].sum()
        assert rest == pytest.approx(visible_length(whole), abs=1e-3)
        seam = defaultdict(float)
        for k in np.flatnonzero(is_seam & pieces.is_visible):
            segment = pieces.segment[k]
            middle = (found.candidates.start[segment] + found.candidates.end[segment])[:2] / 2
            seam[tuple(np.round(middle, 3))] += lengths[k]
        full = np.hypot(*(found.candidates.end - found.candidates.start)[on_seam, :2].T)
        # Whatever is seen of the seam is a whole edge of it; no stray piece.
        assert all(min(abs(total / n - full).min() for n in (1, 2)) < 1e-3 for total in seam.values())
        sides = {int(np.argmax(np.abs(n))) for n in whole.view.corner_normals[whole.view.facing > 0, 0]} - {0}
        assert len(seam) == len(sides)


def test_the_back_edge_of_a_thin_gap_is_absent_at_a_small_scale() -> None:
    """Two plates 0.05 mm apart at 1:20, seen from the front and above: of the plate behind, as large, the lower edge is
    hidden over its whole length, though the gap is 0.0025 mm on paper."""
    plate = block(400, 2, 300)
    geometry = scene([("front", plate, placed_at(0, 0, 0)), ("rear", plate, placed_at(0, 2.05, 0))])
    for elevation in (0.5, 5.0, 40.0):
        view = camera.direction(0.0, elevation)
        found = seen(geometry, camera.parallel(view, 1.0 / 20.0, (60.0, 60.0)))
        candidates, pieces = found.candidates, found.pieces
        ends = found.view.world[candidates.vertices]
        is_back = (candidates.node == 1) & (ends[:, :, 1] < 1.06).all(axis=1) & (ends[:, :, 2] < 1.0).all(axis=1)
        behind = np.flatnonzero(is_back)
        assert len(behind) >= 1
        assert not pieces.is_visible[np.isin(pieces.segment, behind)].any()


def test_order_of_declaration_does_not_matter() -> None:
    parts = mechanical_parts(rung=0.2)
    for fit in (fitted, fitted_central):
        totals = []
        for order in (range(len(parts)), reversed(range(len(parts))), np.random.default_rng(2).permutation(len(parts))):
            geometry = scene([parts[k] for k in order])
            found = seen(geometry, fit(scene(parts), ISOMETRIC))
            by_path = {node.path: visible_length(found, row) for row, node in enumerate(geometry.nodes)}
            totals.append([by_path[path] for path in sorted(by_path)])
        np.testing.assert_allclose(totals[1], totals[0], atol=1e-9)
        np.testing.assert_allclose(totals[2], totals[0], atol=1e-9)


def test_threads_do_not_matter() -> None:
    geometry = mechanical(rung=0.1)
    found = [seen(geometry, fitted(geometry, ISOMETRIC), threads=n).pieces for n in (1, 2, 5)]
    for name in Pieces.__slots__:
        assert len({getattr(pieces, name).tobytes() for pieces in found}) == 1


def test_a_tiny_part_on_a_huge_plate_keeps_its_lines() -> None:
    """Modules alone, and on a floor that reaches two hundred times as far, at the same scale: the same lines of theirs.

    The floor lies 50 mm below and is seen beside them only, so it hides nothing of them.
    """
    alone, beside = mechanical(3, 4, rung=0.5), tiny_in_huge(rung=0.5)
    projection = fitted(alone, ISOMETRIC)
    found = [seen(geometry, projection) for geometry in (alone, beside)]
    lengths = [[visible_length(each, row) for row in range(len(alone.nodes))] for each in found]
    np.testing.assert_allclose(lengths[1], lengths[0], atol=2e-3)


def test_ghosts_hide_themselves_only() -> None:
    geometry = scene([("near", block(20, 2, 20), placed_at(0, 0, 0)), ("far", block(10, 2, 10), placed_at(0, 20, 5))])
    plain, ghost = np.zeros(2, np.uint8), np.array([Emphasis.GHOST, 0], np.uint8)
    sight = (-0.1, 1.0, -0.1)
    solid, through = (seen(geometry, fitted(geometry, sight), emphasis=e) for e in (plain, ghost))
    assert visible_length(solid, 1) < 0.5 * visible_length(through, 1)
    assert visible_length(solid, 0) == visible_length(through, 0)


def test_hidden_and_plain_candidates_are_not_cut() -> None:
    geometry = scene([("near", block(20, 2, 20), placed_at(0, 0, 0)), ("far", block(10, 2, 10), placed_at(0, 20, 5))])
    found = seen(geometry, front(2.0), Style(hidden=True))
    pieces = found.pieces
    of_hidden = found.candidates.line_class[pieces.segment] == number_of(LineClass.HIDDEN_EDGE)
    assert of_hidden.sum() > 0 and not pieces.is_visible[of_hidden].any()
    plain = dataclasses.replace(found.candidates, is_plain=np.ones(len(found.candidates), np.bool_))
    whole = cut(found.view, plain)
    is_edge = plain.line_class[whole.segment] != number_of(LineClass.HIDDEN_EDGE)
    assert whole.is_visible[is_edge].all() and len(whole.segment) == len(plain)


def test_the_allowance_holds_for_one_patch_only() -> None:
    """A line 1 mm inside a cube is seen with an allowance of 2 mm on that face, and not with one on another."""
    geometry = one_cube()
    view = see_view(geometry, line_panel(front(50.0)), PAGE)
    found = edges_of(view, Style())
    near_face = int(np.flatnonzero(view.facing > 0)[0])
    one = dataclasses.replace(
        found,
        **{name: getattr(found, name)[:1].copy() for name in type(found).__slots__},
    )
    middle, step = view.points.mean(axis=0), np.array((5.0, 0.0, 0.0))
    one.start[0], one.end[0] = middle - step, middle + step
    one.faces[0], one.vertices[0] = -1, -1
    for patch, allowance, is_visible in ((view.face_patch[near_face], 1.0, True), (-1, 1.0, False), (0, 1.0, False)):
        one.patch[0], one.allowance[0] = patch, allowance
        if patch == 0 and view.face_patch[near_face] == 0:
            continue
        assert cut(view, one).is_visible.tolist() == [is_visible]


def test_open_meshes_hide_with_both_sides() -> None:
    square = np.array([[-10.0, 0, -10], [10, 0, -10], [10, 0, 10], [-10, 0, 10]])
    for order in ((0, 1, 2, 3), (3, 2, 1, 0)):
        a, b, c, d = order
        flat = free_mesh("flat", square, np.array([[a, b, c], [a, c, d]], np.int32), closed=False)
        geometry = scene([("screen", flat, placed_at(0, 0, 0)), ("bar", block(30, 2, 2), placed_at(0, 20, 0))])
        found = seen(geometry, front(2.0))
        hidden = ~found.pieces.is_visible
        x = np.sort(np.abs(np.concatenate([found.pieces.start[hidden, 0], found.pieces.end[hidden, 0]]) - 60.0))
        np.testing.assert_allclose(x, 20.0, atol=1e-4)


def test_an_empty_view_has_no_pieces() -> None:
    projection = camera.central((0.0, 10.0, 0.0), (0.0, 20.0, 0.0), 80.0, (50.0, 50.0))
    found = seen(one_cube(), projection)
    assert len(occluders_of(found.view)) == 0 and len(found.pieces.segment) == 0


@kernel
def _met(boxes: NDArray[np.float32], q: int, box: NDArray[np.float32]) -> int:
    return meet(boxes, q, box[0], box[1], box[2], box[3], box[4])  # type: ignore[no-any-return]


@kernel
def _lowest(bits: int) -> int:
    return lowest(bits)  # type: ignore[no-any-return]


def test_boxes_met_as_vectors_are_those_of_the_plain_loop() -> None:
    random = np.random.default_rng(4)
    boxes = np.round(random.uniform(0, 8, (200, 5, 8)), 0).astype(np.float32)
    boxes[:50, 0] = np.inf
    for q in range(200):
        box = np.round(random.uniform(0, 8, 5), 0).astype(np.float32)
        assert _met(boxes, q, box) == plain_meet(boxes, q, *box)
    assert [_lowest(bits) for bits in (1, 2, 3, 12, 128, 255)] == [0, 1, 0, 2, 7, 0]


def test_classes_keep_their_numbers() -> None:
    assert [CLASSES[number_of(each)] for each in LineClass] == list(LineClass)


@pytest.mark.parametrize("sight", list(VIEWS.values()))
def test_every_corner_of_the_picture_is_reached(sight: tuple[float, float, float]) -> None:
    """The ends of what is seen reach the picture's own extent: nothing at the rim is lost."""
    geometry: Geometry = mechanical(rung=0.2)
    found = seen(geometry, fitted(geometry, sight))
    ends = np.concatenate([found.pieces.start[found.pieces.is_visible], found.pieces.end[found.pieces.is_visible]])
    for axis in (0, 1):
        for extreme in (np.min, np.max):
            assert extreme(ends[:, axis]) == pytest.approx(extreme(found.view.points[:, axis]), abs=1e-6)

"""Bodies along paths: sound meshes, exact surfaces where there are any, mistakes found and none invented."""

from __future__ import annotations

import math

import numpy as np
import pytest
from platewright.backend.contract import EdgeKind, PatchKind
from platewright.compiler.solids.along import ALONG
from platewright.compiler.solids.bounds import bounds
from platewright.compiler.solids.build import build
from platewright.compiler.solids.crossing import crossing
from platewright.compiler.solids.recipe import (
    Bellows,
    Block,
    Cylinder,
    Helix,
    Outline,
    Primitive,
    Recipe,
    SpaceArcTo,
    SpaceLineTo,
    SpacePath,
    SpaceSplineTo,
    Spring,
    Sweep,
    Transition,
    Tube,
)
from platewright.compiler.solids.spine import length_of, position, reach_of
from platewright.compiler.solids.tessellate import count_triangles, problems_of, tessellate
from platewright.compiler.solids.transform import compose, mirror, scale, translate, turn
from support.bodies import HOSE, LOOP, MIXED, SQUARE, STRIP, bent, circle, flaw, ring_path, traced
from support.recipes import add, check_mesh, cut, made

P = PatchKind
HELIX = SpacePath((10.0, 0.0, 0.0), (Helix(20.0, 6.0, 5.0),))
FRAME = bent((0.0, 0.0, 0.0), (100.0, 0.0, 0.0), (100.0, 80.0, 0.0), (0.0, 80.0, 0.0), (0.0, 0.0, 0.0))
GOOD: list[Primitive] = [
    Tube(HOSE, 12.0, 8.0),
    Tube(HOSE, 43.0),
    Tube(LOOP, 8.0, 4.0),
    Tube(MIXED, 6.0, 5.0),
    Tube(ring_path(), 8.0, 4.0),
    Tube(FRAME, 6.0),
    Tube(HELIX, 5.5, 3.0),
    Tube(bent((0.0, 0.0, 0.0), (0.0, 0.0, 40.0), (40.0, 0.0, 40.0), (40.0, 0.0, 0.0), radius=20.0), 30.0),
    Tube(bent((0.0, 0.0, 0.0), (0.0, 0.0, 40.0), (30.0, 0.0, 5.0)), 10.0, 6.0),
    Tube(bent((0.0, 0.0, 0.0), (60.0, 0.0, 0.0), (60.0, 13.0, 0.0), (0.0, 13.0, 0.0), radius=6.5), 12.5),
    Spring(20.0, 2.0, 12.0, 60.0),
    Spring(20.0, 2.0, 12.0, 27.0, True),
    Sweep(STRIP, HOSE),
    Sweep(STRIP, LOOP),
    Sweep(STRIP, LOOP, -360.0),
    Sweep(STRIP, MIXED),
    Sweep(STRIP, FRAME),
    Sweep(STRIP, SpacePath((10.0, 0.0, 0.0), (Helix(20.0, 12.0, 3.0),)), 90.0),
    Sweep(Outline(STRIP.outer, (circle(1.0).outer,)), HOSE),
    Bellows(60.0, 40.0, 6, 80.0, 1.0),
    Bellows(46.0, 40.0, 3, 80.0, 1.0),
    Transition(SQUARE, circle(20.0), 80.0),
    Transition(circle(20.0), circle(30.0, 10.0, 5.0), 80.0),
]


@pytest.mark.parametrize("shape", GOOD)
def test_good_ones_are_sound_and_none_is_refused(shape: Primitive) -> None:
    assert problems_of(shape) == ()
    mesh = made(add(shape), rung=0.1)
    check_mesh(mesh, 0.1)
    assert len(mesh.faces) <= count_triangles(shape, 0.1)
    shell = tessellate(shape, 0.1)
    assert crossing(shell.vertices, shell.faces) is None
    low, high = bounds(Recipe((add(shape),)))
    size = max(b - a for a, b in zip(low, high, strict=True))
    assert (mesh.vertices.min(axis=0) >= np.array(low) - 2e-3 * size).all()
    assert (mesh.vertices.max(axis=0) <= np.array(high) + 2e-3 * size).all()
    # The box is that of the solid: no side of it stands off by more than the chord error and a share of the size.
    assert (mesh.vertices.min(axis=0) <= np.array(low) + 0.15 + 1e-2 * size).all()


def test_at_least_twenty_good_ones() -> None:
    assert len(GOOD) >= 20 and all(isinstance(shape, ALONG) for shape in GOOD)


CROSSED = ((0.0, 0.0, 0.0), (0.0, 0.0, 100.0), (100.0, 0.0, 100.0), (100.0, 0.0, 30.0), (-50.0, 3.0, 30.0))
TIGHT = SpaceSplineTo(((10.0, 0.0, 0.0), (12.0, 6.0, 0.0), (2.0, 6.0, 0.0), (0.0, 20.0, 0.0)))
CUTS: list[tuple[Primitive, str]] = [
    (Tube(bent(*CROSSED[:3], radius=5.0), 12.0), "bends round a radius of 5"),
    (Tube(bent(*CROSSED, radius=15.0), 12.0), "(0 mm, 0.956 mm, 30 mm)"),
    (Spring(20.0, 4.0, 12.0, 45.0), "far stretches"),
    (Tube(SpacePath((0.0, 0.0, 0.0), (TIGHT,)), 6.0), "bends round a radius of 3.3"),
    (Tube(bent((0.0, 0.0, 0.0), (30.0, 0.0, 0.0), (30.0, 5.0, 0.0), (0.0, 5.0, 0.0)), 8.0), "corners"),
    (Sweep(STRIP, SpacePath((10.0, 0.0, 0.0), (Helix(20.0, 3.0, 4.0),))), "far stretches"),
    (Bellows(60.0, 40.0, 40, 80.0, 1.0), "cannot be folded"),
]


@pytest.mark.parametrize(("shape", "place"), CUTS)
def test_a_body_that_would_cut_itself_is_refused_with_the_place(shape: Primitive, place: str) -> None:
    mesh, flaws = build(Recipe((add(shape),)), 0.1)
    assert mesh is None
    assert [found.code for found in flaws] == ["cuts-itself"]
    assert place in flaws[0].sentence
    assert "mm" in flaws[0].sentence and flaws[0].hint


@pytest.mark.parametrize(
    ("twist", "closes"), [(0.0, True), (360.0, True), (-720.0, True), (45.0, False), (180.0, False)]
)
def test_a_twist_along_a_closed_path_takes_whole_turns(twist: float, closes: bool) -> None:
    """Anything else would leave a jump where the path closes, or a fold."""
    codes = [found.code for found in problems_of(Sweep(STRIP, LOOP, twist))]
    assert codes == ([] if closes else ["twist-does-not-close"])
    assert problems_of(Sweep(STRIP, HOSE, twist)) == ()


def test_a_twist_does_not_go_round_a_mitred_corner() -> None:
    """Stations close behind a mitre would lie within what leans over it: a fold at fine rungs, none at coarse ones."""
    corners = ((0.0, 0.0, 0.0), (0.0, 0.0, 60.0), (50.0, 0.0, 20.0))
    (found,) = problems_of(Sweep(STRIP, bent(*corners), 90.0))
    assert found.code == "twisted-corner" and "(0 mm, 0 mm, 60 mm)" in found.sentence
    assert problems_of(Sweep(STRIP, bent(*corners), 0.0)) == ()
    assert problems_of(Sweep(STRIP, bent(*corners, radius=12.0), 90.0)) == ()


@pytest.mark.parametrize("rung", [0.1, 0.01])
def test_triangles_of_twisted_sweeps_are_not_counted_many_times_over(rung: float) -> None:
    shape = Sweep(STRIP, SpacePath((10.0, 0.0, 0.0), (Helix(20.0, 12.0, 3.0),)), 90.0)
    made_of = len(tessellate(shape, rung).faces)
    assert made_of <= count_triangles(shape, rung) <= 1.5 * made_of


@pytest.mark.parametrize("gap", [0.2, 0.05, -0.2, -1.0])
def test_tubes_that_pass_each_other_are_told_from_those_that_meet(gap: float) -> None:
    """Two crossing runs of one hose, `gap` between their walls."""
    high = 12.0 + gap
    there = ((-60.0, 0.0, 0.0), (60.0, 0.0, 0.0), (60.0, 60.0, 0.0), (60.0, 60.0, 40.0))
    back = ((0.0, 60.0, 40.0), (0.0, 60.0, high), (0.0, -60.0, high))
    path = bent(*there, *back, radius=6.05)
    codes = [found.code for found in problems_of(Tube(path, 12.0))]
    assert codes == ([] if gap > 0.0 else ["cuts-itself"])


def test_straight_runs_are_cylinders_and_bends_are_tori() -> None:
    mesh = made(add(Tube(HOSE, 12.0)), rung=0.05)
    kinds = [PatchKind(int(kind)) for kind in mesh.patches.kind]
    assert kinds.count(P.CYLINDER) == 7 and kinds.count(P.TORUS) == 6 and kinds.count(P.PLANE) == 2 and len(kinds) == 15
    tori = mesh.patches.kind == P.TORUS
    assert mesh.patches.size[tori] == pytest.approx(np.tile((22.0, 6.0), (6, 1)), abs=1e-9)
    # Only the two rims are sharp; cylinders and tori meet smoothly.
    n = len(tessellate(Cylinder(12.0, 1.0), 0.05).vertices) // 2
    assert (mesh.edge_kind == EdgeKind.SHARP).sum() == 2 * 2 * n
    assert (mesh.edge_kind == EdgeKind.TANGENT).sum() == 12 * 2 * n


def test_curves_are_one_free_patch_without_facet_lines() -> None:
    mesh = made(add(Spring(20.0, 2.0, 12.0, 60.0)))
    assert sorted(mesh.patches.kind.tolist()) == [P.PLANE, P.PLANE, P.FREE]
    mesh = made(add(Tube(MIXED, 6.0)))
    assert (mesh.patches.kind == P.FREE).sum() == 1
    tangent = (mesh.edge_kind == EdgeKind.TANGENT).sum()
    sharp = (mesh.edge_kind == EdgeKind.SHARP).sum()
    assert tangent == 2 * sharp, "four joints, two rims"


def test_a_straight_tube_shares_the_vertices_of_a_cylinder() -> None:
    tube = tessellate(Tube(bent((0.0, 0.0, 0.0), (0.0, 0.0, 8.0)), 12.0), 0.02)
    cylinder = tessellate(Cylinder(12.0, 8.0), 0.02)
    assert set(map(tuple, tube.vertices.tolist())) == set(map(tuple, cylinder.vertices.tolist()))


@pytest.mark.parametrize(
    "placement",
    [
        translate((5.0, 0.0, 0.0)),
        turn(30.0, (1.0, 1.0, 0.0)),
        compose(translate((1.0, 2.0, 3.0)), turn(70.0, (0.0, 1.0, 1.0)), mirror((1.0, 0.0, 0.0)), scale(1.5)),
    ],
)
def test_cut_and_placed_free_surfaces_keep_exact_normals(placement: tuple) -> None:
    """On a spring every normal points from the wire's middle line; booleans and placements leave that as it is."""
    spring = Spring(20.0, 4.0, 3.0, 30.0)
    mesh, _ = build(Recipe((add(spring, placement), cut(Block((6.0, 40.0, 40.0)), placement))), 0.01)
    assert mesh is not None and mesh.closed
    free = mesh.face_patch == np.flatnonzero(mesh.patches.kind == P.FREE)[0]
    for patch in np.flatnonzero(mesh.patches.kind == P.FREE):
        free |= mesh.face_patch == patch
    matrix = np.vstack((np.array(placement), (0.0, 0.0, 0.0, 1.0)))
    points = mesh.vertices[mesh.faces[free]].reshape(-1, 3)
    local = (np.column_stack((points, np.ones(len(points)))) @ np.linalg.inv(matrix).T)[:, :3]
    rise = (30.0 - 4.0) / 3.0 / math.tau
    # The foot on the helix: a few steps of Newton from the angle about z and the height.
    angle = np.arctan2(local[:, 1], local[:, 0])
    angle += math.tau * np.round(((local[:, 2] - 2.0) / rise - angle) / math.tau)
    for _ in range(30):
        foot = np.column_stack((10.0 * np.cos(angle), 10.0 * np.sin(angle), 2.0 + rise * angle))
        along = np.column_stack((-10.0 * np.sin(angle), 10.0 * np.cos(angle), np.full(len(angle), rise)))
        angle += ((local - foot) * along).sum(axis=1) / (along**2).sum(axis=1)
    normal = np.linalg.inv(matrix[:3, :3]).T @ (local - foot).T
    normal = (normal / np.linalg.norm(normal, axis=0)).T
    found = mesh.corner_normals[free].reshape(-1, 3).astype(float)
    assert np.einsum("ij,ij->i", normal, found).min() > math.cos(math.radians(2.0))
    assert np.median(np.einsum("ij,ij->i", normal, found)) > 1.0 - 1e-6


def test_a_sleeve_meets_its_hose_without_a_skin() -> None:
    hose = Tube(HOSE, 12.0, 8.0)
    mesh = made(add(hose), cut(Cylinder(8.0, 10.0)), add(Cylinder(16.0, 20.0)), cut(Cylinder(8.0, 20.0)), rung=0.05)
    check_mesh(mesh, 0.05)


FLAWS: list[tuple[SpacePath, str, int]] = [
    (SpacePath((0.0, 0.0, 0.0), (SpaceLineTo((0.0, 0.0, 0.0)),)), "no-length", 0),
    (SpacePath((0.0, 0.0, 0.0), ()), "open-path", 0),
    (bent((0.0, 0.0, 0.0), (0.0, 0.0, 20.0), (20.0, 0.0, 20.0), radius=25.0), "bend-does-not-fit", 0),
    (
        bent((0.0, 0.0, 0.0), (0.0, 0.0, 50.0), (20.0, 0.0, 50.0), (20.0, 50.0, 50.0), radius=15.0),
        "bend-does-not-fit",
        1,
    ),
    (bent((0.0, 0.0, 0.0), (0.0, 0.0, 50.0), (0.0, 0.0, 20.0), radius=5.0), "path-turns-back", 0),
    (bent((0.0, 0.0, 0.0), (0.0, 0.0, 50.0), (0.0, 0.0, 20.0)), "path-turns-back", 0),
    (SpacePath((0.0, 0.0, 0.0), (SpaceArcTo((1.0, 0.0, 0.0), (2.0, 0.0, 0.0)),)), "no-arc", 0),
    (
        SpacePath((0.0, 0.0, 0.0), (SpaceLineTo((0.0, 0.0, 9.0)), SpaceArcTo((5.0, 5.0, 9.0), (9.0, 0.0, 9.0)))),
        "path-has-corner",
        0,
    ),
    (SpacePath((0.0, 0.0, 0.0), (SpaceSplineTo(((5.0, 0.0, 0.0), (5.0, 0.0, 0.0))),)), "no-length", 0),
    (SpacePath((0.0, 0.0, 0.0), (SpaceLineTo((9.0, 0.0, 0.0)), Helix(9.0, 1.0, 1.0))), "open-path", 1),
]


@pytest.mark.parametrize(("path", "code", "stretch"), FLAWS)
def test_mistakes_of_paths(path: SpacePath, code: str, stretch: int) -> None:
    found = flaw(path)
    assert (found.code, found.stretch) == (code, stretch)
    assert not found.sentence.endswith(".")


def test_the_same_recipe_gives_the_same_bytes() -> None:
    one, other = (made(add(Sweep(STRIP, ring_path())), rung=0.05) for _ in range(2))
    assert one.vertices.tobytes() == other.vertices.tobytes()
    assert one.corner_normals.tobytes() == other.corner_normals.tobytes()


def wandering(seed: int) -> tuple[Tube, float]:
    """A tube along edges of a grid of 20 mm, bent round 8 mm, and the least distance of far points of its axis, less
    its diameter: below 0 it cuts itself."""
    random = np.random.default_rng(seed)
    points, way = [np.zeros(3)], np.array([1.0, 0.0, 0.0])
    for _ in range(14):
        points.append(points[-1] + 20.0 * way)
        turned = np.roll(way, int(random.integers(1, 3))) * random.choice((-1.0, 1.0))
        way = turned if random.random() < 0.7 else way
    path = bent(*((float(x), float(y), float(z)) for x, y, z in points), radius=8.0)
    at, places, so_far = [], [], 0.0
    for stretch in traced(path).stretches:
        steps = np.linspace(0.0, reach_of(stretch), max(2, int(2 * length_of(stretch))))
        places.append(position(stretch, steps))
        at.append(so_far + steps / reach_of(stretch) * length_of(stretch))
        so_far += length_of(stretch)
    axis, along = np.concatenate(places), np.concatenate(at)
    apart = np.sqrt(((axis[:, None] - axis[None]) ** 2).sum(axis=2))
    far = np.abs(along[:, None] - along[None]) > math.pi * 8.0 + 1.0
    diameter = float(random.uniform(4.0, 15.0))
    return Tube(path, diameter), float(apart[far].min()) - diameter


def test_far_stretches_that_meet_are_found_on_random_paths_and_no_others() -> None:
    """Judged against distances between sampled points of the axis; cases within a quarter of a millimetre of touching
    are left out, and so are those whose flat ends decide."""
    found = {True: 0, False: 0}
    for seed in range(44):
        tube, gap = wandering(seed)
        if abs(gap) < 0.25 or -tube.diameter / 2 < gap < 0.0:
            continue
        codes = [each.code for each in problems_of(tube)]
        assert codes == (["cuts-itself"] if gap < 0.0 else []), (seed, gap)
        found[gap < 0.0] += 1
    assert found[True] >= 5 and found[False] >= 20, found

"""Originals that serve several lines, blanks that are kept between parts, and sides paired two ways."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend.contract import Mesh, PatchKind
from platewright.compiler.solids import topology, transform
from platewright.compiler.solids.blank import Blank, blank
from platewright.compiler.solids.build import build, combine
from platewright.compiler.solids.recipe import Block, Cylinder, Placed, Primitive, Recipe, Sphere, Step
from support.recipes import add, check_mesh, cut

RUNG = 0.05
move = transform.translate
PLATE, HOLE = Block((40.0, 20.0, 3.0)), Cylinder(4.0, 9.0)


class Kept:
    """Blanks that are kept, and how often one was made."""

    def __init__(self) -> None:
        self.kept: dict[tuple[Primitive, float], Blank] = {}
        self.n_made = 0

    def __call__(self, shape: Primitive, rung: float) -> Blank:
        if (shape, rung) not in self.kept:
            self.kept[shape, rung] = blank(shape, rung)
            self.n_made += 1
        return self.kept[shape, rung]


def made_with(blanks: Kept, recipe: Recipe) -> Mesh:
    unfinished, flaws = combine(recipe, RUNG, blanks)
    assert unfinished is not None and not any(flaw.is_error for flaw in flaws)
    return unfinished.mesh()


def alike(one: Mesh | None, other: Mesh) -> bool:
    assert one is not None
    names = ("vertices", "faces", "corner_normals", "face_patch", "face_source", "edge_kind")
    same = all(getattr(one, name).tobytes() == getattr(other, name).tobytes() for name in names)
    return same and one.key == other.key and one.patches.frame.tobytes() == other.patches.frame.tobytes()


def line_of_hole(mesh: Mesh, x: float) -> set[int]:
    """The lines that the wall of the hole at x answers with."""
    walls = np.flatnonzero((mesh.patches.kind == PatchKind.CYLINDER) & (np.abs(mesh.patches.frame[:, 0, 0] - x) < 1e-9))
    return set(mesh.face_source[np.isin(mesh.face_patch, walls)].tolist())


def test_lines_that_cut_the_same_shape_keep_their_walls() -> None:
    recipe = Recipe((
        add(PLATE),
        cut(HOLE, move((-10.0, 0.0, -3.0)), source=5),
        cut(HOLE, move((10.0, 0.0, -3.0)), source=3),
        cut(HOLE, move((0.0, 0.0, -3.0)), move((15.0, 0.0, -3.0)), source=4),
    ))  # fmt: skip
    mesh, _ = build(recipe, RUNG)
    assert mesh is not None
    check_mesh(mesh, RUNG)
    assert [line_of_hole(mesh, x) for x in (-10.0, 10.0, 0.0, 15.0)] == [{5}, {3}, {4}, {4}]


def test_lines_that_place_the_same_shape_alike_both_count() -> None:
    here = move((-20.0, 0.0, -3.0))
    recipe = Recipe((
        Step("add", (Placed(HOLE, (here,), 1),)),
        cut(PLATE, move((0.0, 0.0, -9.0)), source=2),
        add(PLATE, source=3),
        cut(HOLE, here, source=4),
    ))  # fmt: skip
    mesh, _ = build(recipe, RUNG)
    assert mesh is not None
    assert line_of_hole(mesh, -20.0) == {4}


def test_a_shape_inside_a_part_and_beside_it() -> None:
    """The inner hole stands where the outer one would be if its part were not turned."""
    inner = Recipe((add(PLATE, source=1), cut(HOLE, move((10.0, 0.0, -3.0)), source=2)))
    turned = transform.turn(180.0, (0.0, 0.0, 1.0))
    recipe = Recipe((add(inner, turned, source=3), cut(HOLE, move((10.0, 0.0, -3.0)), source=4)))
    mesh, _ = build(recipe, RUNG)
    assert mesh is not None
    check_mesh(mesh, RUNG)
    assert line_of_hole(mesh, -10.0) == {2}
    assert line_of_hole(mesh, 10.0) == {4}


def test_kept_blanks_change_no_byte() -> None:
    """Whichever part is first to ask for a shape, in whatever order."""
    recipes = [
        Recipe((add(PLATE), cut(HOLE, move((x, 0.0, -3.0)), source=1), cut(Sphere(6.0), move((0.0, y, 0.0)), source=2)))
        for x, y in ((-10.0, 3.0), (4.0, -5.0))
    ]
    recipes.append(Recipe((add(Sphere(6.0)), cut(HOLE, move((0.0, 0.0, -5.0)), source=1), add(PLATE, source=2))))
    recipes.append(Recipe((add(HOLE, move((1.0, 2.0, 3.0))),)))
    fresh = [build(recipe, RUNG)[0] for recipe in recipes]
    for order in ((0, 1, 2, 3), (3, 2, 1, 0), (2, 0, 3, 1)):
        blanks = Kept()
        for k in order:
            assert alike(fresh[k], made_with(blanks, recipes[k]))
        assert blanks.n_made == 3


def test_the_mesh_may_be_asked_for_later_and_again() -> None:
    recipe = Recipe((add(PLATE), cut(HOLE, move((0.0, 0.0, -3.0)))))
    unfinished, flaws = combine(recipe, RUNG, blank)
    assert unfinished is not None and flaws == ()
    build(Recipe((add(Sphere(6.0)), cut(HOLE))), RUNG)
    expected, _ = build(recipe, RUNG)
    assert alike(expected, unfinished.mesh()) and alike(expected, unfinished.mesh())


@pytest.mark.parametrize("shape", [PLATE, HOLE, Sphere(5.0)])
def test_sides_are_paired_alike_by_either_way(shape: Primitive) -> None:
    """The faces of a closed shell by values; with another shell whose one side has a third face, by places."""
    shell = blank(shape, RUNG).shell
    n = len(shell.vertices)
    one, other, closed = topology.paired_sides(shell.faces, n)
    assert closed and len(one) == len(other) == 3 * len(shell.faces) / 2
    start, end = shell.faces.ravel(), shell.faces[:, [1, 2, 0]].ravel()
    assert (start[one] == end[other]).all() and (end[one] == start[other]).all()
    fin = np.array([[*shell.faces[0, :2], n]], np.int32)
    some, mates, closed = topology.paired_sides(np.concatenate((shell.faces, fin)), n + 1)
    assert not closed
    shared = {tuple(sorted(pair)) for pair in zip(one.tolist(), other.tolist(), strict=True)}
    left = {tuple(sorted(pair)) for pair in zip(some.tolist(), mates.tolist(), strict=True)}
    assert shared - left == {pair for pair in shared if 0 in pair}
    assert left < shared

"""Lettering as a solid: the letters that figures are lettered with, raised, cut and placed like other shapes."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend.contract import EdgeKind, PatchKind
from platewright.backend.lettering.type import Lettering
from platewright.compiler.lettering import nested
from platewright.compiler.scene import Exported, geometry
from platewright.compiler.solids.outline import closed, extent
from platewright.compiler.solids.recipe import LineTo, Loop
from support.scenes import built, checked, exported

PLATE = "part p\n    add block (60 mm, 20 mm, 3 mm)\n"


def solid(*lines: str, head: str = "") -> Exported:
    run = built(head + "part p\n" + "".join(f"    {line}\n" for line in lines))
    assert run.errors == [] and run.model is not None
    found, problems = geometry(run.model, "p", run.meshes, 0.001)
    assert {problem.code for problem in problems} <= {"several-pieces"} and found is not None
    return found


def volume(made: Exported) -> float:
    triangles = made.geometry
    a, b, c = (triangles.vertices[triangles.faces[:, k]] for k in range(3))
    return float((a * np.cross(b, c)).sum() / 6.0)


def area_of(text: str, height: float) -> float:
    """The area of a text by Green's theorem on a fine division of its contours, where none of them overlap."""
    total = 0.0
    share = np.linspace(0.0, 1.0, 4001)[:, None]
    for contour in Lettering().contours(text, height):
        points = [contour.start[None]]
        for kind, run in contour.runs:
            if kind == "lines":
                points.append(run)
                continue
            for k in range(0, len(run), 3):
                a, (b, c, d) = points[-1][-1], run[k : k + 3]
                s = 1.0 - share[1:]
                t = share[1:]
                points.append(s**3 * a + 3 * s * s * t * b + 3 * s * t * t * c + t**3 * d)
        ring = np.concatenate(points)
        x, y = ring.T
        total += float((x * np.roll(y, -1) - np.roll(x, -1) * y).sum()) / 2.0
    return abs(total)


def test_height_is_that_of_capitals_and_the_base_line_runs_along_x_about_the_middle() -> None:
    made = solid('add lettering "HEH" capitals 10 mm depth 2 mm').geometry.vertices
    low, high = made.min(axis=0), made.max(axis=0)
    assert low[1:] == pytest.approx((0.0, 0.0), abs=1e-12) and high[1:] == pytest.approx((10.0, 2.0))
    assert low[0] == pytest.approx(-high[0], abs=0.02)  # H stands in the middle of its width
    advance = Lettering().width_of("HEH", 10.0)
    assert 0.8 * advance < high[0] - low[0] < advance


@pytest.mark.parametrize("text", ["HELP", "O8&%", "Ж Ωé", "Sag je"])
def test_volume_is_the_area_of_the_letters_times_the_depth(text: str) -> None:
    made = solid(f'add lettering "{text}" capitals 10 mm depth 2 mm')
    assert all(mesh.closed for mesh in made.geometry.meshes)
    assert volume(made) == pytest.approx(2.0 * area_of(text, 10.0), rel=1e-3)


def test_engraving_takes_away_what_embossing_adds() -> None:
    def plate(*lines: str) -> float:
        return volume(solid("add block (60 mm, 20 mm, 3 mm)", *lines))

    raised = plate('add lettering "B52" capitals 8 mm depth 0.5 mm at (0, -4 mm, 3 mm)')
    engraved = plate('cut lettering "B52" capitals 8 mm depth 0.5 mm at (0, -4 mm, 2.5 mm)')
    through = plate('cut lettering "B52" capitals 8 mm depth 9 mm centred at (0, -4 mm, 0)')
    letters = area_of("B52", 8.0)
    assert raised - 3600 == pytest.approx(0.5 * letters, rel=1e-3)
    assert 3600 - engraved == pytest.approx(0.5 * letters, rel=1e-3)
    assert 3600 - through == pytest.approx(3.0 * letters, rel=1e-3)


def test_stands_on_any_face() -> None:
    made = solid(
        "add block (60 mm, 20 mm, 12 mm)",
        'add lettering "HH" capitals 5 mm depth 1 mm turn 90 deg about x at (0, -10 mm, 3 mm)',
    ).geometry
    off = made.vertices[made.vertices[:, 1] < -10.0 - 1e-9]
    assert off[:, 1] == pytest.approx(-11.0) and off[:, 2].min() == pytest.approx(3.0)
    assert off[:, 2].max() == pytest.approx(8.0)


def test_overlapping_strokes_of_a_sign_join() -> None:
    # The sign is a ring and a bar across it, and a text font draws neither.
    one = solid('add lettering "⌀" capitals 10 mm depth 1 mm')
    assert all(mesh.closed for mesh in one.geometry.meshes)
    assert volume(one) < 0.97 * area_of("⌀", 10.0)


def test_smooth_walls_are_one_patch_and_facets_have_no_edge() -> None:
    made = solid('add lettering "O" capitals 10 mm depth 2 mm').geometry
    kinds = made.patches.kind[np.unique(made.face_patch)]
    assert sorted(kinds.tolist()) == [PatchKind.PLANE, PatchKind.PLANE, PatchKind.FREE, PatchKind.FREE]
    wall = made.patches.kind[made.face_patch] == PatchKind.FREE
    # Walls have no edges but their rims, two to every chord.
    assert np.count_nonzero(made.edge_kind[wall] != EdgeKind.INSIDE) == np.count_nonzero(wall)
    flat = solid('add lettering "L" capitals 10 mm depth 2 mm').geometry
    assert (flat.patches.kind[flat.face_patch] == PatchKind.PLANE).all() and len(np.unique(flat.face_patch)) == 8


def test_finer_rungs_divide_finer() -> None:
    text = 'part p\n    add lettering "S" capitals 10 mm depth 2 mm\n'
    coarse, fine = (len(exported(text, "p", rung).geometry.faces) for rung in (0.1, 0.001))
    assert coarse < fine / 3


def test_text_may_be_a_value() -> None:
    head = 'given\n    word = "TOP"\n'
    by_value = solid('add lettering "{word}" capitals 4 mm depth 1 mm', head=head).geometry
    written = solid('add lettering "TOP" capitals 4 mm depth 1 mm').geometry
    assert np.array_equal(by_value.vertices, written.vertices)


@pytest.mark.parametrize(
    ("words", "code", "says"),
    [
        ('"" capitals 4 mm depth 1 mm', "wrong-form", "nothing to letter"),
        ('"  " capitals 4 mm depth 1 mm', "wrong-form", "nothing to letter"),
        ('"A漢" capitals 4 mm depth 1 mm', "missing-letter", "`漢`"),
        ('"A\\nB" capitals 4 mm depth 1 mm', "missing-letter", "U+000A"),
        ('"A" capitals 0 mm depth 1 mm', "out-of-range", "capitals"),
        ('"A" capitals 4 mm depth -1 mm', "out-of-range", "depth"),
        (f'"{"A" * 501}" capitals 4 mm depth 1 mm', "too-much", "501 letters"),
        ("4 mm capitals 4 mm depth 1 mm", "wrong-form", "text"),
    ],
)
def test_mistakes_are_located(words: str, code: str, says: str) -> None:
    (error,) = checked(PLATE + f"    add lettering {words}\n").errors
    assert error.code == code and says in error.sentence and error.span.line == 3


def test_holes_go_to_the_smallest_loop_round_them() -> None:
    def square(side: float, left: bool) -> Loop:
        corners = [(side, -side), (side, side), (-side, side)]
        return Loop((-side, -side), tuple(LineTo(each) for each in (corners if left else corners[::-1])))

    loops = [square(10, True), square(8, False), square(6, True), square(4, False)]
    for some in (loops, loops[::-1]):
        found = {extent(closed(each.outer))[1][0]: each.holes for each in nested(some)}
        assert {size: [extent(closed(hole))[1][0] for hole in holes] for size, holes in found.items()} == {
            10: [8],
            6: [4],
        }

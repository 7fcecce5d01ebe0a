"""Which sample belongs to which face: the vector block, watertight seams, ties, clipping, giant triangles, threads."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from platewright.backend import camera, raster
from platewright.backend.contract import Emphasis, Geometry, Page, Panel, Patches, PatchKind
from support.raster_models import assemble, block, panel, plan, sphere, triangles

PAGE = Page(25.4, 19.05, 96.0)  # 96 x 72 px
MM = 25.4 / 96.0


def see_plan(geometry: Geometry, samples: int, threads: int = 2, page: Page = PAGE) -> raster.Visibility:
    return raster.see(geometry, panel(plan(page), page, samples), page, threads)


def pixel_points(xy: np.ndarray, z: np.ndarray | float = 0.0) -> np.ndarray:
    """World points seen at page pixels xy (n,2) in the plan view."""
    xy = np.asarray(xy, float)
    return np.column_stack([xy[:, 0] * MM, -xy[:, 1] * MM, np.broadcast_to(z, len(xy))])


@pytest.mark.parametrize("samples", [1, 4])
def test_vector_block_equals_the_plain_loop(samples: int) -> None:
    from platewright.backend.compiled import kernel
    from platewright.backend.raster.block import LANES, cover_1, cover_4, plain_cover

    vector = cover_4 if samples == 4 else cover_1

    def run(depth, face, e, a, b, z, tag):
        vector(depth, face, 8, e[0], e[1], e[2], a[0], a[1], a[2], b[0], b[1], b[2], z[0], z[1], z[2], tag)

    run_vector, plain = kernel(run), plain_cover(samples)
    random = np.random.default_rng(samples)
    n_covered = 0
    for _ in range(400):
        depth = random.normal(size=3 * LANES).astype(np.float32)
        face = random.integers(0, 99, 3 * LANES).astype(np.int32)
        e, a, b = (random.integers(-s, s, 3).astype(np.int32) for s in (9000, 100, 100))
        e += 5000
        z = (random.normal(size=3) * (1, 0.01, 0.01)).astype(np.float32)
        depth[9] = z[0] + (z[1] * np.float32(22 if samples == 1 else 14) + z[2] * np.float32(8 if samples == 1 else 6))
        expected_depth, expected_face = depth.copy(), face.copy()
        plain(expected_depth, expected_face, 8, *e, *a, *b, *z, np.int32(777))
        run_vector(depth, face, e, a, b, z, np.int32(777))
        assert (depth == expected_depth).all() and (face == expected_face).all()
        n_covered += (face == 777).sum()
    assert n_covered > 500


@pytest.mark.parametrize("samples", [1, 4])
@pytest.mark.parametrize("seed", range(4))
def test_jittered_grid_is_watertight_and_independent_of_order(samples: int, seed: int) -> None:
    random = np.random.default_rng(seed)
    n = (5, 19, 60, 5)[seed]
    u, v = np.meshgrid(np.linspace(-16, 112, n + 1), np.linspace(-16, 88, n + 1), indexing="ij")
    xy = np.column_stack([u.ravel(), v.ravel()])
    step = min(128, 104) / n
    if seed == 3:
        xy = np.round(xy)  # corners and edges that run through samples and pixel centres
    else:
        xy += random.uniform(-0.3, 0.3, xy.shape) * step
    quad = (np.arange(n)[:, None] * (n + 1) + np.arange(n)).ravel()
    faces = np.concatenate([
        np.column_stack([quad, quad + n + 1, quad + n + 2]),
        np.column_stack([quad, quad + n + 2, quad + 1]),
    ])  # fmt: skip
    turned = random.random(len(faces)) < 0.5
    faces[turned] = faces[turned][:, ::-1]
    corners = pixel_points(xy)
    order = random.permutation(len(faces))
    first = see_plan(assemble([triangles("a", corners, faces)]), samples)
    second = see_plan(assemble([triangles("a", corners, np.roll(faces[order], 1, axis=1))]), samples)
    assert (first.face >= 0).all()
    assert (order[second.face] == first.face).all()


def test_each_sample_is_inside_its_triangle_or_on_its_border() -> None:
    from platewright.backend.raster.block import SAMPLE_X, SAMPLE_Y

    random = np.random.default_rng(8)
    xy = random.uniform(-30, 120, (3, 2))
    seen = see_plan(assemble([triangles("a", pixel_points(xy), [[0, 1, 2]])]), 4)
    x = np.arange(96)[None, :, None] + np.array(SAMPLE_X) / 16
    y = np.arange(72)[:, None, None] + np.array(SAMPLE_Y) / 16
    signs = []
    for k in range(3):
        (ax, ay), (bx, by) = xy[k], xy[(k + 1) % 3]
        signs.append(((bx - ax) * (y - ay) - (by - ay) * (x - ax)) / np.hypot(bx - ax, by - ay))
    inside = np.maximum(np.minimum.reduce(signs), np.minimum.reduce([-sign for sign in signs]))
    # Corners move by at most half of 1/256 px each way when they are snapped.
    clear = np.abs(inside) > 0.75 / 256
    assert ((seen.face >= 0) == (inside > 0))[clear].all()
    assert (seen.face >= 0).any() and (seen.face < 0).any()


def test_flush_faces_show_the_part_whose_path_sorts_first() -> None:
    from platewright.backend.raster.block import SAMPLE_X, SAMPLE_Y

    random = np.random.default_rng(2)
    a = block("a", (0, -15, 0), (17, -2, 9))
    b = block("b", (5, -12, 3), (23, -1, 9), flip=True)  # its top lies in the plane of a's
    for view in (camera.direction(*angles) for angles in random.uniform((0, 15), (360, 85), (12, 2))):
        low, high = camera.extents(view, np.concatenate([a.vertices, b.vertices]))
        middle = (low + high)[:2] / 2
        anchor = middle[0] * np.array(view.right) + middle[1] * np.array(view.up)
        projection = camera.parallel(view, 0.6, (12.7, 9.5), anchor)
        drawn = panel(projection, PAGE, 4)
        one, two = assemble([a, b]), assemble([b, a])
        seen_one, seen_two = raster.see(one, drawn, PAGE), raster.see(two, drawn, PAGE)
        names = [
            np.where(s.face >= 0, np.array([n.path for n in g.nodes])[g.face_node[s.face]], "")
            for g, s in ((one, seen_one), (two, seen_two))
        ]
        assert (names[0] == names[1]).all()
        # Where the two tops overlap only a is seen: look the samples up on the common plane z = 9.
        rows, columns, sample = np.nonzero(seen_one.face >= 0)
        at = np.column_stack([np.take(SAMPLE_X, sample), np.take(SAMPLE_Y, sample)]) / 16
        page = (np.column_stack([columns, rows]) + at) * MM
        origins, directions = camera.rays(projection, page)
        hit = origins + directions * ((9 - origins[:, 2]) / directions[:, 2])[:, None]
        in_both = (hit[:, 0] > 5.1) & (hit[:, 0] < 16.9) & (hit[:, 1] > -11.9) & (hit[:, 1] < -2.1)
        assert in_both.sum() > 50
        assert (names[0][seen_one.face >= 0][in_both] == "a").all()


def test_planes_that_do_not_fit_their_triangles_are_not_used() -> None:
    part = block("a", (0, -15, 0), (17, -2, 9))
    frames = part.patches.frame.copy()
    frames[:, 0] += 400.0
    wrong = replace(part, patches=Patches(part.patches.kind, frames, part.patches.size, part.patches.inward))
    ball = sphere("b", 4.0, (8, -8, 9), 12)
    right, strange = see_plan(assemble([part, ball]), 4), see_plan(assemble([wrong, ball]), 4)
    assert (part.patches.kind == PatchKind.PLANE).all()
    assert (right.face == strange.face).all()


def test_nearer_part_hides_the_farther() -> None:
    low, high = pixel_points([(0, 0), (96, 0), (0, 72)], 0.0), pixel_points([(0, 0), (96, 0), (0, 72)], 1.0)
    for parts, top in (((low, high), 1), ((high, low), 0)):
        seen = see_plan(assemble([triangles(name, p, [[0, 1, 2]]) for name, p in zip("ab", parts, strict=True)]), 1)
        assert set(np.unique(seen.face)) == {-1, top}
        covered = seen.face >= 0
        assert np.abs(seen.depth[covered] + seen.depth_shift - (-1.0)).max() < 1e-6


@pytest.mark.parametrize("samples", [1, 4])
def test_thread_counts_agree(samples: int) -> None:
    geometry = assemble([sphere(name, 5, (5 + 3 * k, -6 - k, k), 24) for k, name in enumerate("abcd")])
    one, three = see_plan(geometry, samples, 1), see_plan(geometry, samples, 3)
    assert (one.face == three.face).all() and one.depth.tobytes() == three.depth.tobytes()


def test_a_window_cuts_the_page_without_moving_samples() -> None:
    geometry = assemble([sphere("a", 8, (12, -9, 0), 24)])
    whole = see_plan(geometry, 4)
    part = replace(panel(plan(PAGE), PAGE), place=(20 * MM, 11 * MM, 41 * MM, 37 * MM))
    seen = raster.see(geometry, part, PAGE)
    assert (seen.window.left, seen.window.top, seen.window.columns, seen.window.rows) == (20, 11, 41, 37)
    assert (seen.face == whole.face[11:48, 20:61]).all()


def test_bands_do_not_change_the_picture(monkeypatch: pytest.MonkeyPatch) -> None:
    from platewright.backend.raster import picture

    geometry = assemble([sphere(name, 5, (5 + 3 * k, -6 - k, k), 24) for k, name in enumerate("abcd")])
    whole = see_plan(geometry, 4)
    monkeypatch.setattr(picture, "BAND_PIXELS", 96 * 32)
    assert (see_plan(geometry, 4).face == whole.face).all()
    monkeypatch.setattr(picture, "BAND_PIXELS", 4_000_000)
    monkeypatch.setattr(picture, "BAND_ENTRIES", 10)
    assert (see_plan(geometry, 4).face == whole.face).all()


def test_hidden_and_displaced_nodes() -> None:
    geometry = assemble([block("a", (2, -9, 0), (8, -3, 5)), block("b", (12, -9, 0), (18, -3, 5))])
    drawn = panel(plan(PAGE), PAGE)
    emphasis = np.array([0, Emphasis.HIDE, 0], np.uint8)
    assert set(
        geometry.face_node[np.unique(raster.see(geometry, replace(drawn, emphasis=emphasis), PAGE).face)[1:]]
    ) == {2}
    displacement = np.array([(0, 0, 0), (10, 0, 1), (0, 0, 0)], float)
    moved = raster.see(geometry, replace(drawn, displacement=displacement), PAGE)
    assert set(geometry.face_node[np.unique(moved.face)[1:]]) == {1}
    assert (moved.face >= 0).sum() == (raster.see(geometry, drawn, PAGE).face >= 0).sum() // 2


def central_panel(eye: tuple[float, float, float], samples: int = 4) -> Panel:
    view = camera.central(eye, (eye[0], eye[1] + 10.0, eye[2]), 20.0, (PAGE.width / 2, PAGE.height / 2))
    return panel(view, PAGE, samples)


@pytest.mark.parametrize("samples", [1, 4])
def test_a_floor_that_passes_under_the_eye_reaches_the_horizon(samples: int) -> None:
    # The floor of a central view ends at the horizon, the page's middle, up to its far edge: 2 / 1e6 * 20 mm there.
    floor = triangles(
        "floor", [(-1e6, -1e6, -2), (1e6, -1e6, -2), (1e6, 1e6, -2), (-1e6, 1e6, -2)], [[0, 1, 2], [0, 2, 3]]
    )
    seen = raster.see(assemble([floor]), central_panel((0, 0, 0), samples), PAGE)
    assert (seen.face[:36] == -1).all() and (seen.face[36:] >= 0).all()


def test_near_clipping_leaves_the_rest_in_place() -> None:
    # The same wall, once whole and reaching behind the eye, once only its part before the eye.
    # No edge runs through samples, where a shift of 1/256 px by clipping would show.
    whole, part = (
        triangles("w", [(3, y, -8.7), (3, 400, -8.7), (3, 400, 8.7), (3, y, 8.7)], [[0, 1, 2], [0, 2, 3]])
        for y in (-50, 1)
    )
    a, b = (raster.see(assemble([p]), central_panel((0, 0, 0)), PAGE) for p in (whole, part))
    assert ((a.face >= 0) == (b.face >= 0)).all() and (a.face >= 0).sum() > 1000
    covered = a.face >= 0
    assert np.abs(a.depth[covered] / b.depth[covered] - 1).max() < 1e-3


def test_nothing_behind_the_eye_is_seen() -> None:
    behind = triangles("w", [(-5, -9, -5), (5, -9, -5), (0, -9, 5)], [[0, 1, 2]])
    assert (raster.see(assemble([behind]), central_panel((0, 0, 0)), PAGE).face == -1).all()


@pytest.mark.parametrize("size", [1e3, 1e5, 1e7])
@pytest.mark.parametrize("samples", [1, 4])
def test_one_giant_triangle(size: float, samples: int) -> None:
    # The long side runs through the page at 45 degrees; above it everything is covered.
    giant = pixel_points([(-size, -size + 20), (size, -size + 20), (size, size + 20)])
    seen = see_plan(assemble([triangles("g", giant, [[0, 1, 2]])]), samples)
    y, x = np.mgrid[:72, :96]
    inside = np.broadcast_to((y - x < 20 - 1)[..., None], seen.face.shape)
    outside = np.broadcast_to((y - x > 20 + 1)[..., None], seen.face.shape)
    assert (seen.face[inside] == 0).all() and (seen.face[outside] == -1).all()


def test_clipped_pieces_keep_their_place_in_the_order() -> None:
    # Two faces in one plane: the one drawn first wins, though it alone is clipped.
    big = replace(block("a", (-1e5, -1e5, 0), (1e5, 1e5, 5)))
    small = block("b", (2, -15, 0), (17, -2, 5))
    seen = see_plan(assemble([big, small]), 4)
    assert (assemble([big, small]).face_node[seen.face] == 1).all()
    other = see_plan(assemble([replace(big, path="c"), small]), 4)
    assert (assemble([big, small]).face_node[other.face] == 2).any()


def test_a_triangle_in_very_many_tiles() -> None:
    # More than 62 tiles across: the packed box does not hold it.
    page = Page(25.4 * 22.0, 1.0, 100.0)
    corners = [(0, 0, 0), (25.4 * 22, 0, 0), (25.4 * 22, -1, 0), (0, -1, 0)]
    seen = see_plan(assemble([triangles("a", corners, [[0, 1, 2], [0, 2, 3]])]), 1, page=page)
    assert seen.face.shape == (4, 2200, 1) and (seen.face >= 0).all()


def test_pick_finds_the_face_of_a_pixel() -> None:
    seen = see_plan(
        assemble([triangles("a", pixel_points([(0, 0), (50, 0), (50, 50), (0, 50)]), [[0, 1, 2], [0, 2, 3]])]), 4
    )
    assert raster.pick(seen, 40, 10) == 0 and raster.pick(seen, 10, 40) == 1
    assert raster.pick(seen, 90, 60) == -1 and raster.pick(seen, 500, 1) == -1


def test_degenerate_triangles_and_empty_panels() -> None:
    line = triangles("a", pixel_points([(3, 3), (50, 50), (80, 80)]), [[0, 1, 2], [0, 0, 1]])
    geometry = assemble([line])
    assert (see_plan(geometry, 4).face == -1).all()
    hidden = replace(panel(plan(PAGE), PAGE), emphasis=np.full(2, Emphasis.HIDE, np.uint8))
    assert (raster.see(geometry, hidden, PAGE).face == -1).all()
    outside = replace(panel(plan(PAGE), PAGE), place=(500.0, 0.0, 10.0, 10.0))
    assert raster.see(geometry, outside, PAGE).face.size == 0


def test_stored_code_is_dropped_when_any_kernel_changes() -> None:
    from platewright.backend.compiled import sources_digest
    from platewright.backend.raster import bins

    digest = sources_digest(Path(bins.__file__).parent)
    bins.tile_starts(np.zeros((1, 1), np.int32), np.zeros(2, np.int64))
    stored = bins.tile_starts._cache._cache_file
    assert stored._source_stamp == digest and stored._load_index()
    stored._source_stamp = "another digest"
    try:
        assert not stored._load_index()
    finally:
        stored._source_stamp = digest

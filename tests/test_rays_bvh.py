"""The hierarchy against every triangle tried in turn, on soups, slivers, duplicates and other hard cases."""

from __future__ import annotations

import numba
import numpy as np
import pytest
from platewright.backend.contract import F64, I32
from platewright.backend.rays import bvh, lanes, splitting, tracing
from support.raster_models import sphere


def unit(vectors: F64) -> F64:
    return vectors / np.linalg.norm(vectors, axis=1, keepdims=True)


def soup(n: int, seed: int, size: float = 1.0, spread: float = 10.0) -> tuple[F64, I32]:
    random = np.random.default_rng(seed)
    corners = random.normal(size=(n, 1, 3)) * spread + random.normal(size=(n, 3, 3)) * size
    return corners.reshape(-1, 3), np.arange(3 * n, dtype=np.int32).reshape(-1, 3)


def slivers() -> tuple[F64, I32]:
    vertices, faces = soup(600, 5, 4.0)
    vertices[2::3] = vertices[1::3] + 1e-4 * np.random.default_rng(6).normal(size=(600, 3))
    return vertices, faces


def twice() -> tuple[F64, I32]:
    """Every triangle three times: as it is, turned about, and its corners moved on."""
    vertices, faces = soup(300, 7, 2.0)
    return vertices, np.concatenate([faces[::-1], faces[:, ::-1], np.roll(faces, 1, axis=1)]).astype(np.int32)


def giant() -> tuple[F64, I32]:
    """Many small triangles, one that is larger than all of them together, and some without area."""
    vertices, faces = soup(5000, 8, 0.1, 1.0)
    big = np.array([[-4e4, -4e4, -5.0], [4e4, -4e4, -5.0], [0.0, 6e4, -5.0]])
    flat = np.array([[15000, 15000, 15000], [15000, 15001, 15000], [0, 0, 1]])
    return np.concatenate([vertices, big]), np.concatenate(
        [faces[:2000], [[15000, 15001, 15002]], flat, faces[2000:]]
    ).astype(np.int32)


def stacked() -> tuple[F64, I32]:
    """Triangles round one middle, which no plane can part, and a run that shrinks towards a corner."""
    random = np.random.default_rng(9)
    half = random.normal(size=(200, 3, 3))
    half[:, 2] = -half[:, :2].min(axis=1) - half[:, :2].max(axis=1) + half[:, 2] * 0.0
    run = np.array([[[1.0, 0, 0], [1, 1, 0], [1, 0, 1]]]) * 0.5 ** np.arange(100)[:, None, None]
    corners = np.concatenate([half, run])
    return corners.reshape(-1, 3), np.arange(3 * len(corners), dtype=np.int32).reshape(-1, 3)


def ball() -> tuple[F64, I32]:
    """A sphere whose seam and poles are one vertex each."""
    part = sphere("ball", 7.0, (100.0, -30.0, 5.0), 40)
    vertices, row = np.unique(part.vertices.round(9), axis=0, return_inverse=True)
    return vertices, row[part.faces].astype(np.int32)


SCENES = {
    "one": lambda: soup(1, 1, 5.0),
    "four": lambda: soup(4, 2, 5.0),
    "few": lambda: soup(40, 3, 4.0),
    "soup": lambda: soup(6000, 4),
    "slivers": slivers,
    "twice": twice,
    "giant": giant,
    "stacked": stacked,
    "ball": ball,
}


def rays(tree: bvh.Tree, vertices: F64, n: int = 600, seed: int = 1) -> tuple[F64, F64]:
    """From afar at random places, at corners and along axes, and from within."""
    random = np.random.default_rng(seed)
    radius = min(tree.radius, 40.0)
    middle = np.median(vertices, axis=0)
    aims = np.concatenate(
        [middle + random.normal(size=(n, 3)) * radius / 3, vertices[random.integers(0, len(vertices), n)]]
    )
    origins = middle + unit(random.normal(size=(2 * n, 3))) * radius * random.choice([0.1, 1.5, 300.0], (2 * n, 1))
    axes = np.eye(3)[random.integers(0, 3, n)] * random.choice([-1.0, 1.0], (n, 1))
    some = aims[random.integers(0, 2 * n, n)]
    return np.concatenate([origins, some - 3 * radius * axes]), np.concatenate([unit(aims - origins), axes])


@numba.njit(error_model="numpy")
def all_leaves(corners, numbers, frame, pad, origins, directions, face, distance):
    """Every triangle of every leaf for each ray, by the plain twin of the vector code and without any box."""
    for i in range(len(origins)):
        ox, oy, oz = origins[i, 0], origins[i, 1], origins[i, 2]
        dx, dy, dz = directions[i, 0], directions[i, 1], directions[i, 2]
        start = tracing.approach(frame, ox, oy, oz, dx, dy, dz, np.inf)
        if start < 0.0:
            continue
        x = np.float32(ox + start * dx - frame[6])
        y = np.float32(oy + start * dy - frame[7])
        z = np.float32(oz + start * dz - frame[8])
        u, v, w = np.float32(dx), np.float32(dy), np.float32(dz)
        least = np.float32(np.inf)
        for leaf in range(len(numbers) // lanes.LEAF):
            met = lanes.plain_pierce(corners, leaf * lanes.BLOCK, *tracing.across(x, y, z, u, v, w))
            for lane in range(lanes.LEAF):
                if met >> lane & 1:
                    at, row = leaf * lanes.BLOCK + lane, numbers[leaf * lanes.LEAF + lane]
                    t = tracing.meeting(
                        corners, at, pad, np.float64(x), np.float64(y), np.float64(z),
                        np.float64(u), np.float64(v), np.float64(w),
                    )  # fmt: skip
                    short = np.float32(t)
                    if t > 0.0 and (short < least or (short == least and row < face[i])):
                        least = short
                        face[i], distance[i] = row, start + t


def tried_in_turn(tree: bvh.Tree, origins: F64, directions: F64) -> tuple[I32, F64]:
    face, distance = np.full(len(origins), -1, np.int32), np.full(len(origins), np.inf)
    frame = tracing.arrays(tree)[4]
    pad = tree.radius * tracing.FACE_PAD
    all_leaves(tree.corners, tree.numbers, frame, pad, origins, directions, face, distance)
    return face, distance


def moeller_trumbore(vertices: F64, faces: I32, origins: F64, directions: F64) -> tuple[F64, F64]:
    """Distances (n,m) in float64 and how far within its edges each hit is, below 0 outside (Moeller, Trumbore 1997)."""
    a, b, c = (vertices[faces[:, k]] for k in range(3))
    e, g = b - a, c - a
    with np.errstate(divide="ignore", invalid="ignore"):
        p = np.cross(directions[:, None], g[None])
        inverse = 1.0 / np.einsum("nmk,mk->nm", p, e)
        s = origins[:, None] - a[None]
        u = np.einsum("nmk,nmk->nm", s, p) * inverse
        q = np.cross(s, e[None])
        v = np.einsum("nk,nmk->nm", directions, q) * inverse
        t = np.einsum("mk,nmk->nm", g, q) * inverse
        within = np.minimum(np.minimum(u, v), 1.0 - u - v)
    return t, np.where(np.isfinite(t) & (t > 0.0), within, -1.0)


@pytest.mark.parametrize("name", SCENES)
def test_every_triangle_tried_in_turn_gives_the_same(name: str) -> None:
    vertices, faces = SCENES[name]()
    tree = bvh.build(vertices, faces)
    origins, directions = rays(tree, vertices, 300)
    hits = tracing.nearest(tree, origins, directions)
    face, distance = tried_in_turn(tree, origins, directions)
    assert np.array_equal(hits.face, face)
    assert np.array_equal(hits.distance, distance)
    assert (face >= 0).any()
    assert np.array_equal(tracing.is_stopped(tree, origins, directions), face >= 0)


@pytest.mark.parametrize("name", SCENES)
def test_every_triangle_is_in_one_leaf_and_within_all_boxes_above_it(name: str) -> None:
    vertices, faces = SCENES[name]()
    tree = bvh.build(vertices, faces)
    assert np.array_equal(np.sort(tree.numbers[tree.numbers >= 0]), np.arange(len(faces)))
    nodes, links = tree.nodes.reshape(-1, lanes.NODE), tree.nodes.view(np.int32).reshape(-1, lanes.NODE)
    everything = np.array([[-np.inf, np.inf] * 3])
    seen, stack = 0, [(0, everything[0], 1)]
    while stack:
        node, within, depth = stack.pop()
        seen += 1
        assert depth * 7 + 1 <= splitting.STACK
        for lane in range(lanes.WIDE):
            link, box = links[node, lanes.LINKS + lane], nodes[node, : lanes.LINKS].reshape(6, 8)[:, lane]
            if link == lanes.EMPTY:
                assert (box[0::2] > box[1::2]).all()
                continue
            assert (box[0::2] >= within[0::2]).all() and (box[1::2] <= within[1::2]).all()
            if link >= 0:
                stack.append((int(link), box, depth + 1))
                continue
            leaf = -1 - int(link)
            held = tree.corners[lanes.BLOCK * leaf : lanes.BLOCK * (leaf + 1)].reshape(3, 3, 4)
            pad = tree.radius * 2.0**-21
            assert (np.nanmin(held, axis=(0, 2)) - box[0::2] > pad).all()
            assert (box[1::2] - np.nanmax(held, axis=(0, 2)) > pad).all()
    assert seen == len(nodes)


@pytest.mark.parametrize("name", ["soup", "ball", "few"])
def test_double_precision_agrees_away_from_edges(name: str) -> None:
    vertices, faces = SCENES[name]()
    tree = bvh.build(vertices, faces)
    origins, directions = rays(tree, vertices, 60)
    hits = tracing.nearest(tree, origins, directions)
    t, within = moeller_trumbore(vertices, faces, origins, directions)
    near_edge = (np.abs(within) < 1e-3).any(axis=1)
    t = np.where(within > 0.0, t, np.inf)
    best = t.argmin(axis=1)
    none = ~np.isfinite(t.min(axis=1))
    best[none] = -1
    assert np.array_equal(hits.face[~near_edge], best[~near_edge])
    assert (~near_edge).mean() > 0.15
    met = ~near_edge & ~none
    away = np.abs(hits.distance[met] - t.min(axis=1)[met])
    slope = np.abs(np.einsum("nk,nk->n", unit(normals(vertices, faces)[best[met]]), directions[met]))
    assert (away * slope).max() < 4e-7 * tree.radius


def normals(vertices: F64, faces: I32) -> F64:
    a, b, c = (vertices[faces[:, k]] for k in range(3))
    return np.cross(b - a, c - a)


def test_weights_lead_back_to_the_point() -> None:
    vertices, faces = soup(2000, 11, 3.0)
    tree = bvh.build(vertices, faces)
    origins, directions = rays(tree, vertices)
    hits = tracing.nearest(tree, origins, directions)
    met = (hits.face >= 0) & (hits.distance < 100.0)
    v, w = hits.barycentric[met].T[:, :, None]
    a, b, c = (vertices[faces[hits.face[met], k]] for k in range(3))
    points = origins[met] + hits.distance[met, None] * directions[met]
    apart = np.linalg.norm((1 - v - w) * a + v * b + w * c - points, axis=1)
    assert np.quantile(apart, 0.99) < 1e-5 * tree.radius


def test_of_equals_the_lowest_row_is_met() -> None:
    vertices, faces = twice()
    tree = bvh.build(vertices, faces)
    origins, directions = rays(tree, vertices)
    face = tracing.nearest(tree, origins, directions).face
    assert (face >= 0).sum() > 100
    assert (face[face >= 0] < 300).mean() > 0.999  # two float64 roundings of one distance may part at a float32 step


def test_no_ray_slips_through_a_closed_surface() -> None:
    """From within a ball to its vertices, to points on its edges, and anywhere."""
    vertices, faces = ball()
    tree = bvh.build(vertices, faces)
    a, b = vertices[faces[:, 0]], vertices[faces[:, 1]]
    share = np.random.default_rng(2).random((len(faces), 1))
    aims = np.concatenate([vertices, a + share * (b - a), 0.5 * (a + b)])
    for start in ((100.0, -30.0, 5.0), (103.0, -28.0, 3.0), (100.0, -30.0, 11.9)):
        directions = unit(aims - np.array(start))
        assert tracing.is_stopped(tree, np.tile(start, (len(aims), 1)), directions).all()


def test_the_reach_is_kept() -> None:
    vertices, faces = soup(3000, 12)
    tree = bvh.build(vertices, faces)
    origins, directions = rays(tree, vertices)
    hits = tracing.nearest(tree, origins, directions)
    for share, expected in ((0.999, False), (1.001, True)):
        reach = np.where(hits.face >= 0, hits.distance * share, 1.0)
        near = hits.distance < 100.0
        stopped = tracing.is_stopped(tree, origins, directions, reach)
        assert (stopped[near] == expected).all()
        assert np.array_equal(tracing.nearest(tree, origins, directions, reach).face >= 0, stopped)


def test_threads_and_blocks_leave_no_trace() -> None:
    vertices, faces = soup(20_000, 13)
    one, four = bvh.build(vertices, faces, threads=1), bvh.build(vertices, faces, threads=4)
    for name in ("nodes", "corners", "numbers", "centre", "low", "high"):
        assert getattr(one, name).tobytes() == getattr(four, name).tobytes()
    origins, directions = rays(one, vertices, 6000)
    whole = tracing.nearest(one, origins, directions, threads=3)
    apart = [tracing.nearest(one, origins[k::7], directions[k::7], threads=1) for k in range(7)]
    for k, part in enumerate(apart):
        assert whole.face[k::7].tobytes() == part.face.tobytes()
        assert whole.distance[k::7].tobytes() == part.distance.tobytes()
        assert whole.barycentric[k::7].tobytes() == part.barycentric.tobytes()


def test_nothing_is_met_where_there_is_nothing() -> None:
    none = bvh.build(np.zeros((0, 3)), np.zeros((0, 3), np.int32))
    point = bvh.build(np.ones((3, 3)), np.array([[0, 1, 2]], np.int32))
    origins, directions = np.zeros((5, 3)), unit(np.ones((5, 3)))
    for tree in (none, point):
        assert (tracing.nearest(tree, origins, directions).face == -1).all()
        assert not tracing.is_stopped(tree, origins, directions).any()
    assert none.n_bytes == 0


def test_memory_is_what_is_stated() -> None:
    part = sphere("ball", 7.0, n=100)
    tree = bvh.build(part.vertices, part.faces)
    assert tree.n_bytes / len(part.faces) < 75


@pytest.mark.parametrize("seed", range(3))
def test_the_vector_steps_and_their_plain_twins_agree(seed: int) -> None:
    vertices, faces = soup(200, seed, 5.0)
    tree = bvh.build(vertices, faces)
    random = np.random.default_rng(seed)
    near, other = np.zeros(8, np.float32), np.zeros(8, np.float32)
    for _ in range(300):
        o, d = random.normal(size=3).astype(np.float32) * 10, unit(random.normal(size=(1, 3)))[0].astype(np.float32)
        leaf, node = random.integers(0, len(tree.corners) // 36), random.integers(0, len(tree.nodes) // 64)
        assert pierce(tree.corners, leaf * 36, o, d) == plain_pierce(tree.corners, leaf * 36, o, d)
        i = np.float32(1.0) / d
        side = [8 if v < 0 else 0 for v in d]
        ray = (node * 64, *side, *(o * i), *i, np.float32(30.0))
        assert enter(tree.nodes, near, *ray) == lanes.plain_enter(tree.nodes, other, *ray)
        assert np.allclose(near, other, rtol=1e-4, atol=1e-3)


@numba.njit
def pierce(corners, first, o, d):
    return lanes.pierce(corners, first, *tracing.across(o[0], o[1], o[2], d[0], d[1], d[2]))


@numba.njit
def plain_pierce(corners, first, o, d):
    return lanes.plain_pierce(corners, first, *tracing.across(o[0], o[1], o[2], d[0], d[1], d[2]))


@numba.njit
def enter(nodes, near, first, sx, sy, sz, px, py, pz, ix, iy, iz, reach):
    return lanes.enter(nodes, near, first, sx, sy, sz, px, py, pz, ix, iy, iz, reach)

"""The face each pixel shows against rays cast through it, everywhere but next to an edge.

Oracles: Embree (through embreex, where it installs) and a plain Moeller-Trumbore loop (Moeller and Trumbore 1997).
"""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend import camera, raster
from platewright.backend.contract import F64, Geometry, Page, Projection
from support.raster_models import assemble, block, cylinder, panel, sphere, torus, triangles

PAGE = Page(30.0, 24.0, 84.66666666666667)  # 100 x 80 px
MM = 0.3
MIDDLE = (15.0, 12.0)


def scene(seed: int = 4) -> Geometry:
    random = np.random.default_rng(seed)
    soup = random.normal(size=(40, 1, 3)) * 14 + random.normal(size=(40, 3, 3)) * 4
    return assemble([
        sphere("ball", 6, (3, 2, 4), 12),
        torus("ring", 9, 2, (-4, 0, 1), 12),
        block("block", (-6, -13, -3), (9, -7, 3)),
        cylinder("pin", 2.5, -9, 14, 20),
        triangles("soup", soup.reshape(-1, 3), np.arange(120).reshape(-1, 3)),
    ])  # fmt: skip


VIEWS = {
    "isometric": camera.parallel(camera.isometric(), 0.6, MIDDLE),
    "front": camera.parallel(camera.orthographic("front"), 0.6, MIDDLE),
    "oblique sight": camera.parallel(camera.direction(200, -35), 0.6, MIDDLE),
    "central": camera.central((30, -60, 25), (0, 0, 0), 40.0, MIDDLE),
    "inside": camera.central((2, -20, 8), (0, 0, 2), 12.0, MIDDLE),
}


def pixel_rays(projection: Projection) -> tuple[F64, F64]:
    columns, rows = PAGE.pixels
    x, y = np.meshgrid((np.arange(columns) + 0.5) * MM, (np.arange(rows) + 0.5) * MM)
    origins, directions = camera.rays(projection, np.column_stack([x.ravel(), y.ravel()]))
    if projection.eye is None:
        origins = origins - 200.0 * directions
    return origins, directions


def first_hits(geometry: Geometry, origins: F64, directions: F64) -> np.ndarray:
    """Nearest face along each ray or -1, all triangles against all rays, in blocks."""
    a, b, c = (geometry.vertices[geometry.faces[:, k]] for k in range(3))
    e1, e2 = b - a, c - a
    hits = np.full(len(origins), -1)
    for start in range(0, len(origins), 500):
        o, d = origins[start : start + 500, None], directions[start : start + 500, None]
        p = np.cross(d, e2)
        det = np.einsum("rtk,tk->rt", p, e1)
        with np.errstate(divide="ignore", invalid="ignore"):
            s = o - a
            u = np.einsum("rtk,rtk->rt", s, p) / det
            q = np.cross(s, e1)
            v = np.einsum("rtk,rtk->rt", np.broadcast_to(d, q.shape), q) / det
            t = np.einsum("rtk,tk->rt", q, e2) / det
            inside = (u >= 0) & (v >= 0) & (u + v <= 1) & (t > 0)
        t = np.where(inside, t, np.inf)
        best = np.argmin(t, axis=1)
        hits[start : start + 500] = np.where(np.isfinite(t[np.arange(len(t)), best]), best, -1)
    return hits


def away_from_edges(face: np.ndarray) -> np.ndarray:
    """Pixels whose 3 x 3 neighbourhood shows one face (the picture's border counts as inside)."""
    wide = np.pad(face, 1, mode="edge")
    same = np.ones(face.shape, bool)
    for i in range(3):
        for j in range(3):
            same &= wide[i : i + face.shape[0], j : j + face.shape[1]] == face
    return same


def assert_shown_within_a_pixel(
    geometry: Geometry, projection: Projection, pixels: np.ndarray, shown: np.ndarray
) -> None:
    """What pixels (k,2) of row and column show (k,) must be met by a ray within one pixel of the centre."""
    offsets = np.stack(np.meshgrid(*[np.linspace(-1, 1, 41)] * 2), -1).reshape(-1, 2)
    for (row, column), part in zip(pixels, shown, strict=True):
        origins, directions = camera.rays(projection, (np.array([column, row]) + 0.5 + offsets) * MM)
        back = 0.0 if projection.kind == "central" else 200.0
        near = np.append(geometry.face_node, -1)[first_hits(geometry, origins - back * directions, directions)]
        assert part in near


@pytest.mark.parametrize("name", ["isometric", "inside"])
def test_visible_faces_equal_brute_force_rays(name: str) -> None:
    geometry, projection = scene(), VIEWS[name]
    seen = raster.see(geometry, panel(projection, PAGE, 1), PAGE).face[:, :, 0]
    rays = first_hits(geometry, *pixel_rays(projection)).reshape(seen.shape)
    clear = away_from_edges(rays)
    assert clear.mean() > 0.3 and (seen[clear] == rays[clear]).all()
    # Near an edge the pixel may differ only by who wins within a fraction of a pixel.
    assert (seen == rays).mean() > 0.99


@pytest.mark.parametrize("name", sorted(VIEWS))
def test_visible_parts_equal_embree(name: str) -> None:
    embree = pytest.importorskip("embreex.rtcore_scene", reason="embreex has no wheel for this platform")
    from embreex.mesh_construction import TriangleMesh

    geometry, projection = scene(), VIEWS[name]
    tracer = embree.EmbreeScene()
    TriangleMesh(tracer, geometry.vertices[geometry.faces].astype(np.float32))
    origins, directions = pixel_rays(projection)
    found = tracer.run(origins.astype(np.float32), directions.astype(np.float32))
    seen = raster.see(geometry, panel(projection, PAGE, 1), PAGE).face[:, :, 0]
    part_rays = np.append(geometry.face_node, -1)[found.reshape(seen.shape)]
    part_seen = np.append(geometry.face_node, -1)[seen]
    clear = away_from_edges(part_rays)
    assert clear.mean() > 0.6 and (part_seen == part_rays).mean() > 0.99
    # Tips of triangles thinner than a pixel do not show as an edge among the rays: look again, closer.
    other = np.argwhere(clear & (part_seen != part_rays))
    assert len(other) <= 5
    assert_shown_within_a_pixel(geometry, projection, other, part_seen[tuple(other.T)])


def test_depth_equals_the_distance_of_the_hit() -> None:
    geometry = scene()
    for projection in (VIEWS["isometric"], VIEWS["central"]):
        seen = raster.see(geometry, panel(projection, PAGE, 1), PAGE)
        origins, directions = pixel_rays(projection)
        face = seen.face[:, :, 0].ravel()
        shown = np.flatnonzero(face >= 0)
        corners = geometry.vertices[geometry.faces[face[shown]]]
        normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        slope = np.einsum("ij,ij->i", directions[shown], normal)
        t = np.einsum("ij,ij->i", corners[:, 0] - origins[shown], normal) / slope
        hit = origins[shown] + t[:, None] * directions[shown]
        expected = camera.to_page(projection, hit)[1]
        found = seen.depth[:, :, 0].ravel()[shown] + seen.depth_shift
        cosine = np.abs(slope) / np.linalg.norm(normal, axis=1)
        error = np.abs(found - expected) * (1.0 if projection.kind == "parallel" else expected**-2.0)
        # Snapping to 1/256 px moves a corner by up to 0.7/256 px: about 0.001 mm of model, over the slope.
        assert np.quantile(error[cosine > 0.3], 0.99) < 0.01

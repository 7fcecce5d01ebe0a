"""Samples and what is seen by them repeat, however the work is cut up."""

from __future__ import annotations

import numpy as np
import pytest
from platewright.backend.rays import bvh, sampling, seeing
from support.raster_models import sphere


@pytest.mark.parametrize("power", [2, 4, 7, 8])
def test_every_elementary_box_holds_one_point(power: int) -> None:
    """The defining property of a (0, m, 2)-net in base 2 (Niederreiter 1987), and of each further run."""
    n = 1 << power
    for first in (0, n, 5 * n):
        for at in sampling.points(np.array([0, 1, 12345, 2**32 - 1], np.uint32), first, n):
            for across in range(power + 1):
                cell = np.floor(at * (2.0**across, 2.0 ** (power - across))).astype(int)
                assert len(np.unique(cell[:, 0] * n + cell[:, 1])) == n


def test_keys_scramble_differently_and_evenly() -> None:
    keys = sampling.keys_of(*(side.ravel() for side in np.indices((64, 64))))
    assert len(np.unique(keys)) == 64 * 64
    assert (
        len(np.unique(np.concatenate([keys, sampling.keys_of(*(s.ravel() for s in np.indices((64, 64))), 1)]))) == 8192
    )
    first = sampling.points(keys, 0, 1)[:, 0]
    assert (first >= 0).all() and (first < 1).all()
    counts = np.histogram2d(first[:, 0], first[:, 1], 8, [[0, 1], [0, 1]])[0]
    assert ((counts - 64.0) ** 2 / 64.0).sum() < 103.4  # chi-squared, 63 degrees of freedom, one in a thousand
    assert abs(np.corrcoef(first.T)[0, 1]) < 0.05


def test_points_do_not_depend_on_where_a_run_starts() -> None:
    keys = np.array([3, 99], np.uint32)
    whole = sampling.points(keys, 0, 64)
    assert np.array_equal(whole[:, 10:20], sampling.points(keys, 10, 10))
    assert np.array_equal(whole[1:], sampling.points(keys[1:], 0, 64))


def test_one_band_or_sixteen_give_the_same_bytes() -> None:
    """A ball over points in 64 rows: seen in one call and in sixteen, on one thread and on three."""
    ball = sphere("ball", 1.0, (0.0, 0.0, 1.2), 12)
    tree = bvh.build(ball.vertices, ball.faces)
    row, column = (side.ravel() for side in np.indices((64, 20)))
    points = np.column_stack([column / 5.0 - 2.0, row / 16.0 - 2.0, np.zeros(len(row))])
    normals, keys = np.tile([0.0, 0.0, 1.0], (len(row), 1)), sampling.keys_of(column, row)
    sun = seeing.Distant((0.3, 0.2, 0.933), 5.0)

    def ask(part: slice, threads: int) -> list[bytes]:
        answers = (
            seeing.sky_seen(tree, points[part], normals[part], keys[part], threads=threads),
            seeing.light_seen(tree, points[part], normals[part], sun, keys[part], threads=threads),
        )
        return [getattr(a, name).tobytes() for a in answers for name in ("fraction", "factor", "error", "samples")]

    whole = ask(slice(None), 3)
    bands = [ask(slice(80 * k, 80 * k + 80), 1) for k in range(16)]
    assert whole == [b"".join(parts) for parts in zip(*bands, strict=True)]


def test_a_surface_does_not_hide_the_light_from_itself() -> None:
    """Points on the outside of a far-off ball, toward the light: all of it seen. On the other side: nothing."""
    ball = sphere("ball", 5.0, (3000.0, -2000.0, 100.0), 24)
    tree = bvh.build(ball.vertices, ball.faces)
    a, b, c = (ball.vertices[ball.faces[:, k]] for k in range(3))
    normals = np.cross(b - a, c - a)
    size = np.linalg.norm(normals, axis=1)
    keep = size > 1e-6
    points, normals = ((a + b + c) / 3)[keep], (normals / np.maximum(size, 1e-300)[:, None])[keep]
    keys = sampling.keys_of(np.arange(len(points)), np.zeros(len(points), int))
    light = np.array([0.48, 0.64, 0.6])
    seen = seeing.light_seen(tree, points, normals, seeing.Distant(tuple(light)), keys)
    assert np.array_equal(seen.fraction, (normals @ light > 0.0).astype(float))
    assert seeing.sky_seen(tree, points, normals, keys, most=64).fraction.min() == 1.0

"""An oracle of visibility that shares nothing with the engine: rays in world space against all triangles, both sides.

Moeller and Trumbore 1997, float64, no tree, no projection, no topology. Five rays a sample: one as it is, four turned
by 3e-6 rad off the sight and moved sideways by the stated tolerance of the view. Where they disagree the line grazes
something, or shows through a gap no wider, and the sample is set apart as ambiguous.
"""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numba
import numpy as np
from platewright.backend.contract import F64, Projection
from platewright.backend.lines.model import Candidates, Pieces, View

TURN = 3e-6
_BATCH = 256
_ASIDE = ((0.0, 0.0), (1.0, 0.31), (-0.31, 1.0), (-1.0, -0.31), (0.31, -1.0))


@numba.njit(nogil=True, cache=True, error_model="numpy")
def _first_hits(corners, spheres, origin, toward, reach, offset, begin, end, is_hit):  # type: ignore[no-untyped-def]
    for i in range(begin, end):
        ox, oy, oz = origin[i, 0], origin[i, 1], origin[i, 2]
        dx, dy, dz = toward[i, 0], toward[i, 1], toward[i, 2]
        is_hit[i] = False
        for t in range(len(corners)):
            wx, wy, wz = spheres[t, 0] - ox, spheres[t, 1] - oy, spheres[t, 2] - oz
            s = wx * dx + wy * dy + wz * dz
            if wx * wx + wy * wy + wz * wz - s * s > spheres[t, 3]:
                continue
            c = corners[t]
            ex, ey, ez = c[3] - c[0], c[4] - c[1], c[5] - c[2]
            gx, gy, gz = c[6] - c[0], c[7] - c[1], c[8] - c[2]
            hx, hy, hz = dy * gz - dz * gy, dz * gx - dx * gz, dx * gy - dy * gx
            det = ex * hx + ey * hy + ez * hz
            if det == 0.0:
                continue
            sx, sy, sz = ox - c[0], oy - c[1], oz - c[2]
            u = (sx * hx + sy * hy + sz * hz) / det
            if u < 0.0 or u > 1.0:
                continue
            qx, qy, qz = sy * ez - sz * ey, sz * ex - sx * ez, sx * ey - sy * ex
            v = (dx * qx + dy * qy + dz * qz) / det
            if v < 0.0 or u + v > 1.0:
                continue
            far = (gx * qx + gy * qy + gz * qz) / det
            if offset < far < reach[i]:
                is_hit[i] = True
                break


@dataclass(frozen=True, eq=False, slots=True)
class Triangles:
    """All triangles, corners (m,9), and a sphere about each: centre and radius squared (m,4)."""

    corners: F64
    spheres: F64


def triangles_of(world: F64, faces: np.ndarray) -> Triangles:
    corners = world[faces]
    centre = (corners.min(axis=1) + corners.max(axis=1)) / 2.0
    radius = ((corners - centre[:, None]) ** 2).sum(axis=2).max(axis=1)
    return Triangles(corners.reshape(-1, 9), np.column_stack([centre, radius * (1 + 1e-9) + 1e-12]))


def hits(triangles: Triangles, origin: F64, toward: F64, reach: F64, offset: float) -> np.ndarray:
    """Whether rays meet a triangle further than `offset` and nearer than `reach`."""
    is_hit = np.empty(len(origin), np.bool_)

    def work(begin: int) -> None:
        end = min(len(origin), begin + _BATCH)
        _first_hits(triangles.corners, triangles.spheres, origin, toward, reach, offset, begin, end, is_hit)

    with ThreadPoolExecutor(2) as pool:
        list(pool.map(work, range(0, len(origin), _BATCH)))
    return is_hit


def world_points(projection: Projection, page: F64) -> F64:
    """World points of view points (x, y, depth), by the inverse of the projection's matrix."""
    homogeneous = np.column_stack([page, np.ones(len(page))]) @ np.linalg.inv(projection.world_to_page).T
    return np.asarray(homogeneous[:, :3] / homogeneous[:, 3:])


def verdicts(
    triangles: Triangles, projection: Projection, world: F64, offset: float, sideways: float = 0.0
) -> np.ndarray:
    """1 where a point is seen, 0 where it is hidden, -1 where its rays disagree. `sideways` is in mm on paper."""
    n = len(world)
    if projection.eye is None:
        sight = np.linalg.inv(projection.world_to_page)[:3, 2]  # the world direction of growing depth at one page point
        toward = np.tile(-sight / np.linalg.norm(sight), (n, 1))
        reach = np.full(n, np.inf)
    else:
        toward = np.asarray(projection.eye) - world
        reach = np.linalg.norm(toward, axis=1)
        toward = toward / reach[:, None]
    right, up = np.asarray(projection.right), np.asarray(projection.up)
    votes = np.zeros(n, np.int64)
    for i, j in _ASIDE:
        aside = i * right + j * up
        ray = toward + TURN * aside
        ray /= np.linalg.norm(ray, axis=1, keepdims=True)
        votes += hits(triangles, world + (sideways / projection.scale) * aside, ray, reach, offset)
    return np.where(votes == 0, 1, np.where(votes == len(_ASIDE), 0, -1))


@dataclass(frozen=True, eq=False, slots=True)
class Score:
    """Samples, those set apart, and those judged wrong: candidate, share, mm from the nearest end of a piece."""

    n: int
    ambiguous: int
    segment: np.ndarray
    share: F64
    is_seen: np.ndarray
    from_end: F64
    longest_run: float

    @property
    def wrong(self) -> int:
        return len(self.segment)

    @property
    def right(self) -> float:
        """Share of the samples that are not judged wrong."""
        return 1.0 - self.wrong / max(self.n, 1)

    def __str__(self) -> str:
        far = int((self.from_end > 1e-3).sum())
        return (
            f"{self.n} samples, {self.ambiguous} ambiguous, {self.wrong} wrong ({int(self.is_seen.sum())} drawn though "
            f"hidden, {far} more than 0.001 mm from an end), longest run {self.longest_run:.4f} mm"
        )


def score(
    view: View, candidates: Candidates, pieces: Pieces, n: int = 20_000, seed: int = 1, side: float = np.inf
) -> Score:
    """Judge n points spread evenly over the length of all candidates that lie on sides of triangles.

    Of a candidate only what lies in a square page of this side is judged.
    """
    rows = np.flatnonzero((candidates.vertices >= 0).all(axis=1))
    low, high = _within(candidates.start[rows, :2], candidates.end[rows, :2], side)
    lengths = np.hypot(*(candidates.end - candidates.start)[rows, :2].T) * np.maximum(high - low, 0.0)
    sums = np.cumsum(lengths)
    if not len(rows) or sums[-1] <= 0.0:
        nothing = np.empty(0)
        return Score(0, 0, nothing.astype(int), nothing, nothing.astype(bool), nothing, 0.0)
    place = (np.arange(n) + np.random.default_rng(seed).random(n)) / n * sums[-1]
    which = np.minimum(np.searchsorted(sums, place), len(rows) - 1)
    along = np.clip(1.0 - (sums[which] - place) / np.maximum(lengths[which], 1e-300), 0.0, 1.0)
    share = low[which] + along * (high - low)[which]
    triangles = triangles_of(view.world, view.faces)
    verdict = _judged(view, candidates, triangles, rows[which], share)
    drawn, from_end = status(candidates, pieces, rows[which], share)
    wrong = np.flatnonzero((verdict >= 0) & (drawn != (verdict == 1)))
    segment = rows[which[wrong]]
    run = _longest_run(view, candidates, pieces, triangles, np.unique(segment)[:200])
    return Score(n, int((verdict < 0).sum()), segment, share[wrong], drawn[wrong], from_end[wrong], run)


def _within(start: F64, end: F64, side: float) -> tuple[F64, F64]:
    """From what share to what share segments lie in the square from (0, 0) to (side, side); all of it for infinity."""
    low, high = np.zeros(len(start)), np.ones(len(start))
    if np.isinf(side):
        return low, high
    for axis in (0, 1):
        step = end[:, axis] - start[:, axis]
        safe = np.where(step == 0.0, 1.0, step)
        at = np.sort(np.stack([-start[:, axis] / safe, (side - start[:, axis]) / safe]), axis=0)
        is_level = step == 0.0
        is_out = is_level & ((start[:, axis] < 0.0) | (start[:, axis] > side))
        low = np.maximum(low, np.where(is_level, 0.0, at[0]))
        high = np.where(is_out, 0.0, np.minimum(high, np.where(is_level, 1.0, at[1])))
    return low, high


def status(candidates: Candidates, pieces: Pieces, segment: np.ndarray, share: F64) -> tuple[np.ndarray, F64]:
    """Whether points of candidates lie on a seen piece, and mm on paper to the nearest place where that changes."""
    length = np.hypot(*(candidates.end - candidates.start)[:, :2].T)
    low, high = np.searchsorted(pieces.segment, segment), np.searchsorted(pieces.segment, segment, side="right")
    is_seen, near = np.zeros(len(segment), bool), np.full(len(segment), np.inf)
    for k in range(int((high - low).max(initial=0))):
        is_one = low + k < high
        row = np.minimum(low + k, len(pieces.segment) - 1)
        is_seen |= is_one & pieces.is_visible[row] & (pieces.span[row, 0] <= share) & (share <= pieces.span[row, 1])
        for end in pieces.span[row].T:
            inner = is_one & (end > 0.0) & (end < 1.0)
            near = np.where(inner, np.minimum(near, np.abs(end - share) * length[segment]), near)
    return is_seen, near


def _judged(view: View, candidates: Candidates, triangles: Triangles, segment: np.ndarray, share: F64) -> np.ndarray:
    start, end = candidates.start[segment], candidates.end[segment]
    world = world_points(view.projection, start + (end - start) * share[:, None])
    return verdicts(triangles, view.projection, world, view.tolerance.depth_mm, view.tolerance.sideways_mm)


def _longest_run(
    view: View, candidates: Candidates, pieces: Pieces, triangles: Triangles, segments: np.ndarray
) -> float:
    """The longest stretch in mm on paper that is wrong throughout, along these candidates."""
    longest, steps = 0.0, 401
    for segment in segments:
        share = (np.arange(steps) + 0.5) / steps
        rows = np.full(steps, segment)
        verdict = _judged(view, candidates, triangles, rows, share)
        is_wrong = (verdict >= 0) & (status(candidates, pieces, rows, share)[0] != (verdict == 1))
        length = float(np.hypot(*(candidates.end - candidates.start)[segment, :2]))
        edges = np.flatnonzero(np.diff(np.concatenate([[0], is_wrong.astype(int), [0]])))
        runs = edges[1::2] - edges[::2]
        longest = max(longest, float(runs.max(initial=0)) * length / steps)
    return longest

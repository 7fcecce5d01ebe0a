"""Where lines of sight touch surfaces of known shape, in parallel and central projection.

With n the outward normal and v the line of sight, a surface turns away where n.v = 0. On a sphere, cylinder or cone
these points lie in a plane, the polar plane of the eye or the diametral plane of the direction of sight; the function
of that plane is linear, so it is exact along chords too. On a torus n.v is evaluated at the foot of the normal.
Coordinates are of the patch's frame, world mm. Source: the quadrics' polar form (projective geometry, in any textbook).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..contract import F64, PatchKind
from .segments import dot, length, unit

ZERO = 1e-9
"""Of n.v over its greatest value: a value this small is a touch, so that noise decides nothing."""
_END_ON = 1e-6
"""Sine of the angle between sight and axis below which a cylinder is seen end-on and has no outline."""


@dataclass(frozen=True, eq=False, slots=True)
class Touched:
    """Patches of curved kinds as they are seen, one row for each thing asked about.

    kind (k,); origin, x, y, z (k,3) the frame; size (k,2) of `contract.Patches`, of a cone the tangent of its half
    angle; side (k,) -1 where the solid lies outside, else 1; sight (k,3) the unit direction of sight, or in central
    projection the eye seen from the origin, mm; is_central.
    """

    kind: NDArray[np.uint8]
    origin: F64
    z: F64
    size: F64
    side: F64
    sight: F64
    is_central: bool

    def take(self, rows: NDArray[np.integer] | NDArray[np.bool_]) -> Touched:
        """The rows asked for, in that order."""
        columns = (self.kind, self.origin, self.z, self.size, self.side, self.sight)
        return Touched(*(column[rows] for column in columns), self.is_central)


def turning(touched: Touched, points: F64) -> F64:
    """A multiple of n.v (k,) for points (k,3) on or near each patch: above zero where it faces away, 0 at a touch.

    Linear in the point but on a torus. Between -1 and 1 or so.
    """
    q = points - touched.origin
    height = dot(q, touched.z)
    across = q - height[:, None] * touched.z
    along = dot(touched.sight, touched.z)
    sight_across = touched.sight - along[:, None] * touched.z
    result = np.ones(len(q))
    for kind, of_kind in (
        (PatchKind.CYLINDER, _of_cylinder),
        (PatchKind.CONE, _of_cone),
        (PatchKind.SPHERE, _of_sphere),
        (PatchKind.TORUS, _of_torus),
    ):
        rows = np.flatnonzero(touched.kind == kind)
        if len(rows):
            arrays = (q[rows], height[rows], across[rows], along[rows], sight_across[rows])
            result[rows] = of_kind(touched.take(rows), *arrays)
    return np.where(np.abs(result) < ZERO, 0.0, result * touched.side)


def _of_cylinder(touched: Touched, q: F64, height: F64, across: F64, along: F64, sight: F64) -> F64:
    radius, size = touched.size[:, 0], length(sight)
    value = dot(across, sight)
    if touched.is_central:
        # An eye inside the cylinder sees all of its wall from one side.
        return np.where(size > radius, (radius * radius - value) / (radius * np.where(size > radius, size, 1.0)), 1.0)
    return np.where(size > _END_ON, value / (radius * np.where(size > _END_ON, size, 1.0)), 1.0)


def _of_cone(touched: Touched, q: F64, height: F64, across: F64, along: F64, sight: F64) -> F64:
    slope = touched.size[:, 0]
    value = dot(across, sight) - slope * slope * height * along
    # All tangent planes pass through the apex, so the eye counts as a direction from there.
    scale = length(q) * slope * length(touched.sight)
    value = np.where(np.abs(value) <= ZERO * scale, 0.0, value)
    return (-value if touched.is_central else value) / _mean_scale(touched)


def _mean_scale(touched: Touched) -> F64:
    """A length that is the same for all points of a patch, so that its function stays linear."""
    return touched.size[:, 0] * length(touched.sight)


def _of_sphere(touched: Touched, q: F64, height: F64, across: F64, along: F64, sight: F64) -> F64:
    radius, value = touched.size[:, 0], dot(q, touched.sight)
    if not touched.is_central:
        return value / radius
    far = length(touched.sight)
    return np.where(far > radius, (radius * radius - value) / (radius * np.where(far > radius, far, 1.0)), 1.0)


def _of_torus(touched: Touched, q: F64, height: F64, across: F64, along: F64, sight: F64) -> F64:
    normal, foot = _torus_normal(touched, height, across)
    if not touched.is_central:
        return dot(normal, touched.sight)
    return dot(normal, unit(foot - touched.sight))


def _torus_normal(touched: Touched, height: F64, across: F64) -> tuple[F64, F64]:
    """Unit normal of the tube and the point of the torus nearest to a point, from the origin."""
    ring = touched.size[:, 0, None] * unit(across)
    normal = unit(across - ring + height[:, None] * touched.z)
    return normal, ring + touched.size[:, 1, None] * normal


def chord_crossing(touched: Touched, low: F64, high: F64, at_low: F64, at_high: F64) -> F64:
    """Points (k,3) where the function is zero on chords from low to high, whose ends lie on either side of it."""
    share = at_low / (at_low - at_high)
    rows = np.flatnonzero(touched.kind == PatchKind.TORUS)
    if len(rows):
        share[rows] = _torus_root(touched.take(rows), low[rows], high[rows], at_low[rows], at_high[rows])
    return low + share[:, None] * (high - low)


_STEPS = 40


def _torus_root(touched: Touched, low: F64, high: F64, at_low: F64, at_high: F64) -> F64:
    """Bracketed secant steps, the value of an end that stays halved (the Illinois rule; Dowell and Jarratt 1971)."""
    a, b = np.zeros(len(low)), np.ones(len(low))
    fa, fb = at_low.copy(), at_high.copy()
    root = a
    for _ in range(_STEPS):
        root = a + (b - a) * (fa / (fa - fb))
        value = turning(touched, low + root[:, None] * (high - low))
        is_low = (value >= 0.0) == (fa >= 0.0)
        fa, fb = np.where(is_low, value, 0.5 * fa), np.where(is_low, 0.5 * fb, value)
        a, b = np.where(is_low, root, a), np.where(is_low, b, root)
        if (np.abs(value) <= ZERO).all():
            break
    return root


def lifted(touched: Touched, points: F64) -> F64:
    """The points (k,3) of the exact outline near points on chords: on spheres and tori, others are left alone."""
    result = points.copy()
    rows = np.flatnonzero(touched.kind == PatchKind.SPHERE)
    if len(rows):
        result[rows] = _on_circle(touched.take(rows), points[rows])
    rows = np.flatnonzero(touched.kind == PatchKind.TORUS)
    if len(rows):
        result[rows] = _on_torus(touched.take(rows), points[rows])
    return result


def _on_circle(touched: Touched, points: F64) -> F64:
    radius, q = touched.size[:, 0], points - touched.origin
    axis, size = unit(touched.sight), length(touched.sight)
    share = radius / size if touched.is_central else np.zeros(len(radius))
    centre = (radius * share)[:, None] * axis
    q = q - centre
    flat = q - dot(q, axis)[:, None] * axis
    return touched.origin + centre + (radius * np.sqrt(1.0 - share * share))[:, None] * unit(flat)


_NEWTON_STEPS = 5


def _on_torus(touched: Touched, points: F64) -> F64:
    """Newton's steps within the surface, against the gradient of n.v, which is the shape operator times v."""
    q = points - touched.origin
    reach = touched.size[:, 1]
    for _ in range(_NEWTON_STEPS):
        seen = _seen_on_torus(touched, q)
        gradient = seen.gradient
        steepness = dot(gradient, gradient)
        is_fair = steepness > 1e-12 / (reach * reach)
        step = np.where(is_fair, -seen.value / np.where(is_fair, steepness, 1.0), 0.0)
        step = np.clip(step * np.sqrt(steepness), -0.5 * reach, 0.5 * reach)
        q = seen.foot + step[:, None] * unit(gradient)
    return touched.origin + _seen_on_torus(touched, q).foot


@dataclass(frozen=True, eq=False, slots=True)
class _Seen:
    foot: F64
    value: F64
    gradient: F64
    curvature: F64


def _seen_on_torus(touched: Touched, q: F64) -> _Seen:
    """At the foot of q: n.v, its gradient in the surface, and the normal curvature along v (a torus has the curvatures
    1/r round its tube and (rho - R)/(r rho) along its parallels).
    """
    height = dot(q, touched.z)
    across = q - height[:, None] * touched.z
    normal, foot = _torus_normal(touched, height, across)
    v = unit(foot - touched.sight) if touched.is_central else touched.sight
    foot_height = dot(foot, touched.z)
    outward = unit(foot - foot_height[:, None] * touched.z)
    rho, ring, tube = dot(foot, outward), touched.size[:, 0], touched.size[:, 1]
    parallel = np.cross(touched.z, outward)
    value = dot(normal, v)
    v_parallel = dot(v, parallel)
    v_round = v - value[:, None] * normal - v_parallel[:, None] * parallel
    bend = (rho - ring) / (tube * np.where(np.abs(rho) > ZERO * ring, rho, ZERO * ring))
    gradient = v_round / tube[:, None] + (v_parallel * bend)[:, None] * parallel
    return _Seen(foot, value, gradient, dot(v_round, v_round) / tube + v_parallel * v_parallel * bend)


def bends_away(touched: Touched, points: F64) -> NDArray[np.bool_]:
    """Whether the surface falls behind the line of sight that touches it at outline points (k,3), so that the solid it
    bounds does not hide the touch. Cylinders, cones, spheres: where the solid lies inside.
    """
    result = touched.side > 0.0
    rows = np.flatnonzero(touched.kind == PatchKind.TORUS)
    if len(rows):
        torus = touched.take(rows)
        result[rows] = _seen_on_torus(torus, points[rows] - torus.origin).curvature * torus.side >= 0.0
    return result


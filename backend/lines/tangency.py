"""Where lines of sight touch surfaces of known shape, in parallel and central projection.

With n the outward normal and v the line of sight, a surface turns away where n.v = 0. On a sphere, cylinder or cone
these points lie in a plane, the polar plane of the eye or the diametral plane of the direction of sight; the function
of that plane is linear, so it is exact along chords too. On a torus n.v is evaluated at the foot of the normal.
Coordinates are of the patch's frame, world mm. Source: the quadrics' polar form (projective geometry, in any textbook).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..contract import F64, I32, U8, Patches, PatchKind, Projection
from .model import Bools
from .segments import dot, length, unit

ZERO = 1e-9
"""Of n.v over its greatest value: a value this small is a touch, so that noise decides nothing."""
_END_ON = 1e-6
"""Sine of the angle between sight and axis below which a cylinder is seen end-on and has no outline."""


@dataclass(frozen=True, eq=False, slots=True)
class Surfaces:
    """Patches as they are seen, one row each.

    kind (p,) `PatchKind`; origin, z (p,3) of the frame; size (p,2) of `contract.Patches`, of a cone the tangent of its
    half angle; side (p,) -1 where the solid lies outside, else 1; sight (p,3) the unit direction of sight, or in
    central projection the eye seen from the origin, mm; is_central.
    """

    kind: U8
    origin: F64
    z: F64
    size: F64
    side: F64
    sight: F64
    is_central: bool


def surfaces_of(patches: Patches, shift: F64, projection: Projection) -> Surfaces:
    """The surfaces of patches displaced by `shift` (p,3) mm."""
    origin = patches.frame[:, 0] + shift
    size = patches.size.copy()
    is_cone = patches.kind == PatchKind.CONE
    size[is_cone, 0] = np.tan(np.radians(size[is_cone, 0]))
    eye = projection.eye
    sight = np.broadcast_to(np.array(projection.sight), origin.shape) if eye is None else np.array(eye) - origin
    side = np.where(patches.inward, -1.0, 1.0)
    return Surfaces(patches.kind, origin, patches.frame[:, 3], size, side, sight, eye is not None)


def turning(surfaces: Surfaces, row: I32, points: F64) -> F64:
    """A multiple of n.v (k,) for points (k,3) on or near surface `row` (k,): above zero where it faces away, 0 at a
    touch, 1 on planes and free surfaces. Linear in the point but on a torus. Between -1 and 1 or so.
    """
    result = np.ones(len(row))
    kind = surfaces.kind[row]
    for each, of_kind in (
        (PatchKind.CYLINDER, _of_cylinder),
        (PatchKind.CONE, _of_cone),
        (PatchKind.SPHERE, _of_sphere),
        (PatchKind.TORUS, _of_torus),
    ):
        some = np.flatnonzero(kind == each)
        if len(some):
            result[some] = of_kind(surfaces, row[some], points[some] - surfaces.origin[row[some]])
    return np.where(np.abs(result) < ZERO, 0.0, result * surfaces.side[row])


def _split(surfaces: Surfaces, row: I32, q: F64) -> tuple[F64, F64]:
    """Height along the axis (k,) and what is across it (k,3)."""
    axis = surfaces.z[row]
    height = dot(q, axis)
    return height, q - height[:, None] * axis


def _of_cylinder(surfaces: Surfaces, row: I32, q: F64) -> F64:
    radius = surfaces.size[row, 0]
    _, sight = _split(surfaces, row, surfaces.sight[row])
    size, value = length(sight), dot(q, sight)
    if surfaces.is_central:
        # An eye inside the cylinder sees all of its wall from one side.
        return np.where(size > radius, (radius * radius - value) / (radius * np.where(size > radius, size, 1.0)), 1.0)
    return np.where(size > _END_ON, value / (radius * np.where(size > _END_ON, size, 1.0)), 1.0)


def _of_cone(surfaces: Surfaces, row: I32, q: F64) -> F64:
    slope = surfaces.size[row, 0]
    along, sight = _split(surfaces, row, surfaces.sight[row])
    value = dot(q, sight) - slope * slope * dot(q, surfaces.z[row]) * along
    # All tangent planes pass through the apex, so the eye counts as a direction from there. The divisor is the same
    # for all points of a patch, so that its function stays linear.
    scale = slope * length(surfaces.sight[row])
    value = np.where(np.abs(value) <= ZERO * scale * length(q), 0.0, value)
    return np.asarray((-value if surfaces.is_central else value) / scale)


def _of_sphere(surfaces: Surfaces, row: I32, q: F64) -> F64:
    radius, value = surfaces.size[row, 0], dot(q, surfaces.sight[row])
    if not surfaces.is_central:
        return np.asarray(value / radius)
    far = length(surfaces.sight[row])
    return np.where(far > radius, (radius * radius - value) / (radius * np.where(far > radius, far, 1.0)), 1.0)


def _of_torus(surfaces: Surfaces, row: I32, q: F64) -> F64:
    normal, foot, _ = _on_tube(surfaces, row, q)
    sight = surfaces.sight[row]
    return dot(normal, unit(foot - sight) if surfaces.is_central else sight)


def _on_tube(surfaces: Surfaces, row: I32, q: F64) -> tuple[F64, F64, F64]:
    """Of a torus, near points from its origin: unit normal, foot of the normal, unit direction away from the axis."""
    height, across = _split(surfaces, row, q)
    outward = unit(across)
    ring = surfaces.size[row, 0, None] * outward
    normal = unit(across - ring + height[:, None] * surfaces.z[row])
    return normal, ring + surfaces.size[row, 1, None] * normal, outward


def chord_crossing(surfaces: Surfaces, row: I32, low: F64, high: F64, at_low: F64, at_high: F64) -> F64:
    """Points (k,3) where the function is zero on chords from low to high, whose ends lie on either side of it."""
    share = at_low / (at_low - at_high)
    some = np.flatnonzero(surfaces.kind[row] == PatchKind.TORUS)
    if len(some):
        share[some] = _torus_root(surfaces, row[some], low[some], high[some], at_low[some], at_high[some])
    return low + share[:, None] * (high - low)


_STEPS = 40


def _torus_root(surfaces: Surfaces, row: I32, low: F64, high: F64, at_low: F64, at_high: F64) -> F64:
    """Bracketed secant steps, the value of an end that stays halved (the Illinois rule; Dowell and Jarratt 1971)."""
    a, b = np.zeros(len(low)), np.ones(len(low))
    fa, fb = at_low, at_high
    root = a
    for _ in range(_STEPS):
        root = a + (b - a) * (fa / (fa - fb))
        value = turning(surfaces, row, low + root[:, None] * (high - low))
        is_low = (value >= 0.0) == (fa >= 0.0)
        fa, fb = np.where(is_low, value, 0.5 * fa), np.where(is_low, 0.5 * fb, value)
        a, b = np.where(is_low, root, a), np.where(is_low, b, root)
        if (np.abs(value) <= ZERO).all():
            break
    return root


def lifted(surfaces: Surfaces, row: I32, points: F64) -> F64:
    """The points (k,3) of the exact outline near points on chords: on spheres and tori, others are left alone."""
    result = points.copy()
    kind = surfaces.kind[row]
    for each, onto in ((PatchKind.SPHERE, _on_circle), (PatchKind.TORUS, _on_torus)):
        some = np.flatnonzero(kind == each)
        if len(some):
            origin = surfaces.origin[row[some]]
            result[some] = origin + onto(surfaces, row[some], points[some] - origin)
    return result


def _on_circle(surfaces: Surfaces, row: I32, q: F64) -> F64:
    radius, sight = surfaces.size[row, 0], surfaces.sight[row]
    axis = unit(sight)
    share = radius / length(sight) if surfaces.is_central else np.zeros(len(radius))
    centre = (radius * share)[:, None] * axis
    flat = q - centre - dot(q - centre, axis)[:, None] * axis
    return np.asarray(centre + (radius * np.sqrt(1.0 - share * share))[:, None] * unit(flat))


_NEWTON_STEPS = 4


def _on_torus(surfaces: Surfaces, row: I32, q: F64) -> F64:
    """Newton's steps within the surface, against the gradient of n.v, which is the shape operator times v."""
    reach = 0.5 * surfaces.size[row, 1]
    for _ in range(_NEWTON_STEPS):
        seen = _seen_on_torus(surfaces, row, q)
        steepness = dot(seen.gradient, seen.gradient)
        is_fair = steepness * reach * reach > 1e-12
        share = np.where(is_fair, -seen.value / np.where(is_fair, steepness, 1.0), 0.0)
        size = np.abs(share) * np.sqrt(steepness)
        share = share * np.where(size > reach, reach / np.where(size > reach, size, 1.0), 1.0)
        q = seen.foot + share[:, None] * seen.gradient
    return _on_tube(surfaces, row, q)[1]


@dataclass(frozen=True, eq=False, slots=True)
class _Seen:
    foot: F64
    value: F64
    gradient: F64
    curvature: F64


def _seen_on_torus(surfaces: Surfaces, row: I32, q: F64) -> _Seen:
    """At the foot of q: n.v, its gradient in the surface, and the normal curvature along v (a torus has the curvatures
    1/r round its tube and (rho - R)/(r rho) along its parallels).
    """
    normal, foot, outward = _on_tube(surfaces, row, q)
    sight = surfaces.sight[row]
    v = unit(foot - sight) if surfaces.is_central else sight
    ring, tube = surfaces.size[row, 0], surfaces.size[row, 1]
    rho = dot(foot, outward)
    parallel = np.cross(surfaces.z[row], outward)
    value, v_parallel = dot(normal, v), dot(v, parallel)
    v_round = v - value[:, None] * normal - v_parallel[:, None] * parallel
    bend = (rho - ring) / (tube * np.where(np.abs(rho) > ZERO * ring, rho, ZERO * ring))
    gradient = v_round / tube[:, None] + (v_parallel * bend)[:, None] * parallel
    return _Seen(foot, value, gradient, dot(v_round, v_round) / tube + v_parallel * v_parallel * bend)


def bends_away(surfaces: Surfaces, row: I32, points: F64) -> Bools:
    """Whether the surface falls behind the line of sight that touches it at outline points (k,3), so that the solid it
    bounds does not hide the touch. Cylinders, cones, spheres: where the solid lies inside.
    """
    result = surfaces.side[row] > 0.0
    some = np.flatnonzero(surfaces.kind[row] == PatchKind.TORUS)
    if len(some):
        seen = _seen_on_torus(surfaces, row[some], points[some] - surfaces.origin[row[some]])
        result[some] = seen.curvature * surfaces.side[row[some]] >= 0.0
    return result

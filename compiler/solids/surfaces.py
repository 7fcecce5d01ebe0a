"""Analytic surfaces: what a patch is a piece of, its exact normals, and how it answers to a placement.

Every surface is the affine image of a canonical one, so any placement, even a skew one, only changes the affine map
and the normal follows from the gradient g of the canonical equation as A^-T g. Canonical surfaces:

plane z = 0; cylinder x² + y² = 1; cone x² + y² = z², z > 0; sphere x² + y² + z² = 1;
torus (rho - q)² + z² = 1 with rho = hypot(x, y) and q the ratio of the radii.
A FREE surface has no equation: its normals are kept with its triangles (`Shell.normals`).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from platewright.backend.contract import Patches, PatchKind

F64 = NDArray[np.float64]
I32 = NDArray[np.int32]

SAME_SURFACE = 1e-9
"""Two surfaces within this angle (radians) and this part of the size of the solid are one."""
_WEIGHTS = {int(PatchKind.CYLINDER): (1.0, 1.0, 0.0), int(PatchKind.SPHERE): (1.0, 1.0, 1.0)}


@dataclass(frozen=True, eq=False, slots=True)
class Surfaces:
    """Analytic surfaces, one row each.

    kind (p,) uint8 `PatchKind` of the canonical surface; affine (p,3,4) float64 canonical to solid;
    ratio (p,) float64, for a torus the radius of the centre circle over that of the tube, otherwise 0;
    flipped (p,) bool, the solid lies on the side that the gradient points to.
    """

    kind: NDArray[np.uint8]
    affine: F64
    ratio: F64
    flipped: NDArray[np.bool_]

    def __len__(self) -> int:
        return len(self.kind)

    def take(self, rows: NDArray[np.integer]) -> Surfaces:
        """The rows asked for, in that order."""
        return Surfaces(self.kind[rows], self.affine[rows], self.ratio[rows], self.flipped[rows])


def concatenate(parts: Sequence[Surfaces]) -> Surfaces:
    """All rows, one list after the other."""
    return Surfaces(
        np.concatenate([part.kind for part in parts]),
        np.concatenate([part.affine for part in parts]),
        np.concatenate([part.ratio for part in parts]),
        np.concatenate([part.flipped for part in parts]),
    )


def surfaces(rows: Sequence[tuple[PatchKind, F64, float, bool]]) -> Surfaces:
    """From rows of kind, (3,4) affine, ratio, flipped."""
    return Surfaces(
        np.array([row[0] for row in rows], np.uint8),
        np.array([row[1] for row in rows], np.float64).reshape(len(rows), 3, 4),
        np.array([row[2] for row in rows], np.float64),
        np.array([row[3] for row in rows], np.bool_),
    )


def free() -> tuple[PatchKind, F64, float, bool]:
    """The row of a surface without equation."""
    return PatchKind.FREE, np.eye(3, 4), 0.0, False


def plane(origin: Sequence[float], normal: Sequence[float], x_axis: Sequence[float]) -> F64:
    """The (3,4) affine of a plane from its outward unit normal and a unit vector in it."""
    # Plain numbers: for single vectors they are many times faster than arrays.
    y_axis = cross(normal, x_axis)
    return np.array([(x_axis[k], y_axis[k], normal[k], origin[k]) for k in range(3)], np.float64)


def cross(a: Sequence[float], b: Sequence[float]) -> tuple[float, float, float]:
    """The vector product of two vectors."""
    return (a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0])


def upright(radius: float, height: float, origin: Sequence[float]) -> F64:
    """The (3,4) affine with axes (radius, radius, height) along x, y, z; a negative height looks down, still turned
    right-handed about it.
    """
    x, y = radius, radius if height > 0.0 else -radius
    return np.array([[x, 0.0, 0.0, origin[0]], [0.0, y, 0.0, origin[1]], [0.0, 0.0, height, origin[2]]])


def place(local: Surfaces, affine: F64) -> Surfaces:
    """The surfaces after a placement, `affine` (3,4) for all or (p,3,4) one each."""
    linear, shift = affine[..., :3], affine[..., 3]
    moved = linear @ local.affine
    moved[..., 3] += shift
    return Surfaces(local.kind, moved, local.ratio, local.flipped)


def plane_normals(planes: Surfaces) -> F64:
    """Outward unit normals (p,3) of planes: the cross product of the mapped x and y axes, turned by the handedness."""
    linear = planes.affine[:, :, :3]
    normal = np.cross(linear[:, :, 0], linear[:, :, 1])
    normal *= np.sign(np.linalg.det(linear))[:, None]
    normal = _unit(normal)
    return np.where(planes.flipped[:, None], -normal, normal)


def normals(all_surfaces: Surfaces, row: I32, points: F64) -> F64:
    """Outward unit normals (k,3) at points (k,3) that belong to surfaces `row` (k,).

    Zero where the surface has none (the apex of a cone, the axis of a torus that reaches it).
    """
    linear = np.linalg.inv(all_surfaces.affine[:, :, :3])
    inverse = np.concatenate((linear, -(linear @ all_surfaces.affine[:, :, 3:])), axis=2)
    side = np.where(all_surfaces.flipped, -1.0, 1.0)[:, None, None]
    # The gradient of a quadric is linear: back, weights of x, y, z, and forward make one matrix.
    weights = np.array([_WEIGHTS.get(int(kind), (0.0, 0.0, 0.0)) for kind in all_surfaces.kind]).reshape(-1, 3, 1)
    quadric = side * (linear.transpose(0, 2, 1) @ (weights * inverse))
    xyz = tuple(np.ascontiguousarray(points[:, k]) for k in range(3))
    result = np.stack(_mapped(quadric, row, xyz), axis=1)
    kind = all_surfaces.kind[row]
    rest = np.flatnonzero((kind != PatchKind.CYLINDER) & (kind != PatchKind.SPHERE))
    if len(rest):
        some = row[rest]
        q = np.stack(_mapped(inverse, some, tuple(x[rest] for x in xyz)), axis=1)
        gradient = _gradients(kind[rest], q, all_surfaces.ratio[some])
        forward = np.concatenate((side * linear.transpose(0, 2, 1), np.zeros((len(linear), 3, 1))), axis=2)
        result[rest] = np.stack(_mapped(forward, some, tuple(gradient[:, k] for k in range(3))), axis=1)
    return _unit(result)


def describe(all_surfaces: Surfaces) -> Patches:
    """The contract's descriptors. A surface that a skew placement has robbed of its kind is FREE."""
    n = len(all_surfaces)
    frame = np.zeros((n, 4, 3))
    frame[:, 1:] = np.eye(3)
    kind = np.full(n, PatchKind.FREE, np.uint8)
    size = np.zeros((n, 2))
    inward = all_surfaces.flipped & (all_surfaces.kind != PatchKind.PLANE)
    for each in (PatchKind.PLANE, PatchKind.CYLINDER, PatchKind.CONE, PatchKind.SPHERE, PatchKind.TORUS):
        chosen = np.flatnonzero(all_surfaces.kind == each)
        if len(chosen):
            some = all_surfaces.take(chosen)
            keeps = (
                _describe_plane(some, frame, chosen)
                if each == PatchKind.PLANE
                else _describe(some, frame, size, chosen)
            )
            kind[chosen[keeps]] = each
            lost = chosen[~keeps]
            frame[lost] = np.concatenate((np.zeros((1, 3)), np.eye(3)))
            size[lost] = 0.0
    return Patches(kind, frame + 0.0, size, inward)


def placed_normals(affine: F64, normals: F64) -> F64:
    """Unit normals (...,3) under placements (...,3,4) or one (3,4): A^-T n; zeros stay zeros."""
    turned = np.linalg.inv(affine[..., :3]).swapaxes(-1, -2)
    return _unit((turned @ normals[..., None])[..., 0])


def _describe_plane(some: Surfaces, frame: F64, chosen: NDArray[np.intp]) -> NDArray[np.bool_]:
    z = plane_normals(some)
    x = _unit(some.affine[:, :, 0])
    frame[chosen] = np.stack((some.affine[:, :, 3], x, np.cross(z, x), z), axis=1)
    return np.ones(len(chosen), np.bool_)


def _describe(some: Surfaces, frame: F64, size: F64, chosen: NDArray[np.intp]) -> NDArray[np.bool_]:
    """Fill frame and size of surfaces of one curved kind; False where the placement made it another surface."""
    each = PatchKind(int(some.kind[0]))
    a, b, c = (some.affine[:, :, k] for k in range(3))
    z = _unit(c)
    if each == PatchKind.CYLINDER:
        # Only the part across the axis shapes a cylinder: the axis may be stretched or skew.
        a, b = a - _dot(a, z)[:, None] * z, b - _dot(b, z)[:, None] * z
    radius = np.sqrt(_dot(a, a))
    x = _unit(a)
    frame[chosen] = np.stack((some.affine[:, :, 3], x, np.cross(z, x), z), axis=1)
    close = SAME_SURFACE * radius**2
    keeps = (np.abs(_dot(a, b)) <= close) & (np.abs(_dot(b, b) - radius**2) <= close)
    if each != PatchKind.CYLINDER:
        keeps &= (np.abs(_dot(a, c)) <= SAME_SURFACE * radius * np.sqrt(_dot(c, c))) & (
            np.abs(_dot(b, c)) <= SAME_SURFACE * radius * np.sqrt(_dot(c, c))
        )
    if each in (PatchKind.SPHERE, PatchKind.TORUS):
        keeps &= np.abs(_dot(c, c) - radius**2) <= close
    if each == PatchKind.CONE:
        size[chosen, 0] = np.degrees(np.arctan2(radius, np.sqrt(_dot(c, c))))
    elif each == PatchKind.TORUS:
        size[chosen, 0], size[chosen, 1] = some.ratio * radius, radius
        keeps &= some.ratio > 0.0
    else:
        size[chosen, 0] = radius
    return np.asarray(keeps)


def _gradients(kind: NDArray[np.uint8], q: F64, ratio: F64) -> F64:
    """Gradients of the canonical equations at canonical points, turned round the axis where a chord lies inside."""
    gradient = q.copy()
    rho = np.hypot(q[:, 0], q[:, 1])
    on_axis = rho <= 1e-9
    gradient[kind == PatchKind.PLANE] = (0.0, 0.0, 1.0)
    gradient[kind == PatchKind.CYLINDER, 2] = 0.0
    cone, torus = kind == PatchKind.CONE, kind == PatchKind.TORUS
    gradient[cone, 2] = -rho[cone]
    gradient[torus, :2] *= (1.0 - ratio / np.where(on_axis, 1.0, rho))[torus, None]
    gradient[on_axis & (cone | torus)] = 0.0
    return gradient


def _mapped(affines: F64, row: I32, xyz: tuple[F64, ...]) -> tuple[F64, ...]:
    """Each point under the affine (3,4) of its row, component by component: small tables, long sums."""
    x, y, z = xyz
    return tuple(
        affines[:, k, 0].take(row) * x
        + affines[:, k, 1].take(row) * y
        + affines[:, k, 2].take(row) * z
        + affines[:, k, 3].take(row)
        for k in range(3)
    )


def _dot(a: F64, b: F64) -> F64:
    product: F64 = (a * b).sum(axis=-1)
    return product


def _unit(vectors: F64) -> F64:
    x, y, z = vectors[..., 0], vectors[..., 1], vectors[..., 2]
    length = np.sqrt(x * x + y * y + z * z)
    length[length == 0.0] = 1.0
    unit: F64 = vectors / length[..., None]
    return unit

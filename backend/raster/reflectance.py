"""How materials answer light, as rows of numbers for the kernels.

The surface: Lambert reflection, and above it microfacets with the GGX distribution, height-correlated Smith masking
(Walter, Marschner, Li and Torrance 2007, equations 20, 23, 33, 34; Heitz 2014, equation 99) and Schlick's Fresnel term
(Schlick 1994). What the microfacets reflect the Lambert layer does not get: it is dimmed by 1 minus their
directional albedo, so that no surface gives back more than it receives from a uniform surround.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..contract import F32, F64, Lighting, Material, Projection

DEGREE = 6  # of the polynomials in n.v that stand for the directional albedo
ROW = 5 + 2 * (DEGREE + 1)
LIGHT = 12
LEAST_ALPHA = 0.01  # a smoother surface would show the point that a directional light is

# The surround that ambient light stands for: radiance 1 + CONTRAST * s(d . axis), s(t) = t / sqrt(t^2 + width^2), whose
# mean over all directions is 1. The width grows with the roughness that blurs it. A matt surface receives
# 1 + CONTRAST * (n . axis) from it: the half that is brighter fills (1 + n . axis) / 2 of its view.
CONTRAST, SHARPEST = 0.65, 0.12


def material_rows(materials: Sequence[Material]) -> F32:
    """Rows (n, ROW) float32: normal reflectance 3, alpha squared, width of the surround, albedo A and B."""
    table = np.zeros((len(materials), ROW), np.float32)
    albedos: dict[float, tuple[F64, F64]] = {}
    for row, material in enumerate(materials):
        alpha = max(material.roughness**2, LEAST_ALPHA)
        width = SHARPEST + alpha
        if alpha not in albedos:
            albedos[alpha] = albedo(alpha)
        scale, bias = albedos[alpha]
        table[row] = (*material.normal_reflectance, alpha**2, width, *scale, *bias)
    return table


def albedo(alpha: float) -> tuple[F64, F64]:
    """Polynomials in n.v, (DEGREE + 1,) lowest power first: albedo = A(n.v) * normal reflectance + B(n.v).

    Integrated over the normals that each sight sees, on a fixed grid, and fitted by least squares.
    Cost: about 12 000 evaluations.
    """
    cosine = ((np.arange(32) + 0.5) / 32)[:, None]
    half_x, half_z = _visible_normals(cosine, alpha)
    across = np.maximum(half_x * np.sqrt(1.0 - cosine**2) + half_z * cosine, 0.0)
    light = 2.0 * across * half_z - cosine
    mask_light, mask_view = (_smith(np.maximum(c, 1e-6), alpha) for c in (light, cosine))
    weight = np.where(light > 0.0, (1.0 + mask_view) / (1.0 + mask_view + mask_light), 0.0)
    schlick = (1.0 - across) ** 5
    values = np.column_stack([np.mean(weight * (1.0 - schlick), axis=1), np.mean(weight * schlick, axis=1)])
    fitted = np.linalg.lstsq(np.vander(cosine[:, 0], DEGREE + 1, increasing=True), values, rcond=None)[0]
    return fitted[:, 0], fitted[:, 1]


def _smith(cosine: F64, alpha: float) -> F64:
    """Lambda of the Smith masking function for GGX (Heitz 2014, equation 72)."""
    return np.asarray((np.sqrt(1.0 + alpha**2 * (1.0 / cosine**2 - 1.0)) - 1.0) / 2.0)


def _visible_normals(cosine: F64, alpha: float) -> tuple[F64, F64]:
    """x and z of microfacet normals (k, n) seen in the xz plane at n.v = cosine (k, 1) (Heitz 2018, listing 1)."""
    steps = (np.arange(20) + 0.5) / 20
    radius, angle = (grid.ravel() for grid in np.meshgrid(np.sqrt(steps), 2.0 * np.pi * steps))
    x, z = alpha * np.sqrt(1.0 - cosine**2), cosine
    length = np.hypot(x, z)
    x, z = x / length, z / length
    across, along = radius * np.cos(angle), radius * np.sin(angle)
    share = 0.5 * (1.0 + z)
    along = (1.0 - share) * np.sqrt(1.0 - across**2) + share * along
    out = np.sqrt(np.maximum(0.0, 1.0 - across**2 - along**2))
    half_x, half_y, half_z = alpha * (out * x - along * z), alpha * across, out * z + along * x
    length = np.sqrt(half_x**2 + half_y**2 + half_z**2)
    return half_x / length, half_z / length


def light_rows(lighting: Lighting, materials: Sequence[Material]) -> tuple[F32, F32, F32]:
    """What each material meets: directional lights and lamps (n,k,LIGHT), the sum of ambient light (n,LIGHT), float32.

    A row holds the vector, then linear RGB that the material sends back evenly, that it sends back as gloss at normal
    incidence, and that shines on it. The exposure is multiplied in. Lamp vectors are world mm, their power is at 1 m.
    """
    answers = np.array([(*each.colour, *each.normal_reflectance) for each in materials]).reshape(-1, 6)
    rows = {kind: [np.zeros((len(materials), LIGHT))] for kind in ("directional", "lamp", "ambient")}
    for k, light in enumerate(lighting.lights):
        power = np.array(light.power)
        row = np.empty((len(materials), LIGHT))
        row[:, :3], row[:, 9:] = light.vector, power
        row[:, 3:9] = lighting.pairs[k] if lighting.pairs else answers * np.tile(power, 2)
        row[:, 3:] *= lighting.exposure
        rows[light.kind].append(row)
    far, near = (np.stack(rows[kind], axis=1)[:, 1:] for kind in ("directional", "lamp"))
    ambient = np.sum(rows["ambient"], axis=0)
    return tuple(np.ascontiguousarray(each, np.float32) for each in (far, near, ambient))  # type: ignore[return-value]


def surround_axis(projection: Projection) -> F32:
    """World direction the surround is brightest in: the upper left, toward the viewer, of every picture."""
    right, up, sight = (np.array(v) for v in (projection.right, projection.up, projection.sight))
    return np.asarray((up - right - sight) / np.sqrt(3.0), np.float32)

"""Light on surfaces: where a sphere is brightest, how lamps fall off, energy, both paths of shading, encoding."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from platewright.backend import camera, colour, raster
from platewright.backend.contract import Geometry, Light, Lighting, Material, Page, Panel, Projection
from platewright.backend.raster import reflectance
from support.raster_models import (
    MATT,
    PAINT,
    assemble,
    block,
    cylinder,
    panel,
    plan,
    sphere,
    torus,
    triangles,
    upper_left_lighting,
)

PAGE = Page(20.0, 20.0, 254.0)  # 200 x 200 px
GLOSS = Material("gloss", (0.35, 0.05, 0.04), (0.04, 0.04, 0.04), 0.2, False, (150, 60, 50))
STEEL = Material("steel", (0.0, 0.0, 0.0), (0.56, 0.57, 0.58), 0.35, True, (150, 150, 150))
MIRROR = Material("mirror", (0.0, 0.0, 0.0), (1.0, 1.0, 1.0), 0.1, True, (255, 255, 255))
NOWHERE = (0.0, 0.0, 0.0)


def painted(geometry: Geometry, drawn: Panel, materials: tuple[Material, ...], threads: int = 2) -> np.ndarray:
    columns, rows = PAGE.pixels
    image = np.zeros((rows, columns, 3), np.uint8)
    raster.paint(geometry, drawn, PAGE, materials, image, threads)
    return image


def lit(*lights: Light, exposure: float = 1.0) -> Lighting:
    return Lighting(lights, exposure)


def ball_view(azimuth: float, elevation: float) -> Projection:
    return camera.parallel(camera.direction(azimuth, elevation), 1.0, (10.0, 10.0))


@pytest.mark.parametrize("material", [MATT, PAINT, GLOSS, STEEL], ids=lambda m: m.name)
@pytest.mark.parametrize("view", [(0, 0), (40, 35.26), (200, -20)])
def test_a_sphere_is_brightest_at_135_degrees(material: Material, view: tuple[float, float]) -> None:
    # 37 CFR 1.84(m): light from the upper left at 45 degrees. The centre of the brightest spot is taken.
    ball = assemble([sphere("ball", 9.0, (0, 0, 0), 96)])
    lighting = upper_left_lighting(camera.direction(*view), key=0.5, ambient=0.15)
    image = painted(ball, panel(ball_view(*view), PAGE, 4, lighting=lighting), (material,))
    light = colour.luminance(colour.from_bytes(image))
    y, x = np.mgrid[:200, :200] + 0.5
    inside = np.hypot(x - 100, y - 100) < 85
    bright = np.where(inside, light, 0.0)
    # A highlight may clip: weigh the upper tail so that the centre of the spot is found to a fraction of a pixel.
    weight = np.maximum(bright - 0.9 * bright.max(), 0.0)
    angle = np.degrees(np.arctan2(-((y - 100) * weight).sum(), ((x - 100) * weight).sum()))
    assert abs(angle - 135.0) < 1.0


def test_painting_equals_seeing_and_shading_for_any_number_of_threads() -> None:
    geometry = assemble([
        sphere("a", 5, (-3, 0, 2), 24), torus("b", 5, 2, (3, 1, 0), 24, material=1),
        block("c", (-8, 3, -4), (2, 8, 3), 2), cylinder("d", 2, -6, 9, 24, material=3),
    ])  # fmt: skip
    materials = (PAINT, GLOSS, MATT, STEEL)
    for samples in (1, 4):
        lamp = Light("lamp", (-30.0, -40.0, 50.0), (0.002, 0.002, 0.001))
        for view in (ball_view(35, 25), camera.central((30, -60, 25), NOWHERE, 60.0, (10, 10))):
            lighting = upper_left_lighting(view)
            drawn = panel(view, PAGE, samples, lighting=replace(lighting, lights=(*lighting.lights, lamp)))
            one, three = painted(geometry, drawn, materials, 1), painted(geometry, drawn, materials, 3)
            assert one.tobytes() == three.tobytes()
            seen = raster.see(geometry, drawn, PAGE)
            assert raster.shade(seen, geometry, drawn, PAGE, materials).tobytes() == one.tobytes()


def test_a_white_lambert_surface_that_faces_unit_irradiance_is_white() -> None:
    # The contract: power is pi times the radiance of a white Lambert surface that faces the light.
    floor = triangles("f", [(0, 0, 0), (20, 0, 0), (20, -20, 0), (0, -20, 0)], [[0, 2, 1], [0, 3, 2]])
    white = Material("white", (1.0, 1.0, 1.0), (0.0, 0.0, 0.0), 1.0, False, (255, 255, 255))
    lambert = replace(white, colour=(0.5, 0.25, 1.0))
    drawn = panel(plan(PAGE), PAGE, 4, lighting=lit(Light("directional", (0.0, 0.0, 1.0), (1.0, 1.0, 1.0))))
    assert (painted(assemble([floor]), drawn, (white,)) >= 254).all()
    # A coat that reflects nothing head on still takes a little by Schlick's term at a rough surface: under 1 %.
    pixel = painted(assemble([floor]), drawn, (lambert,))[100, 100]
    assert np.abs(colour.from_bytes(pixel) / (0.5, 0.25, 1.0) - 1).max() < 0.01
    half = replace(drawn, lighting=replace(drawn.lighting, exposure=0.5))
    assert np.abs(colour.from_bytes(painted(assemble([floor]), half, (white,))[100, 100]) - 0.5).max() < 0.01


def test_lamp_follows_the_inverse_square_and_the_cosine() -> None:
    floor = assemble([triangles("f", [(0, 0, 0), (20, 0, 0), (20, -20, 0), (0, -20, 0)], [[0, 2, 1], [0, 3, 2]])])
    dull = Material("dull", (0.8, 0.8, 0.8), (0.0, 0.0, 0.0), 1.0, False, (230, 230, 230))
    place = np.array((10.05, -10.05, 12.0))
    drawn = panel(plan(PAGE), PAGE, 4, lighting=lit(Light("lamp", tuple(place), (1e-4, 1e-4, 1e-4))))
    light = colour.from_bytes(painted(floor, drawn, (dull,)))[:, :, 0]
    y, x = np.mgrid[:200, :200] * 0.1 + 0.05
    offset = place - np.stack([x, -y, 0 * x], -1)
    distance = np.linalg.norm(offset, axis=2)
    expected = 0.8 * 1e-4 * 1e6 / distance**2 * (12.0 / distance)
    # Encoded in 8 bits; the Schlick share of a rough coat is under 1 % where the light stands high.
    assert np.abs(light / expected - 1)[distance < 15].max() < 0.03


@pytest.mark.parametrize("roughness", [0.1, 0.35, 0.7, 1.0])
def test_no_surface_returns_more_than_a_uniform_surround_gives(roughness: float) -> None:
    # A sphere under ambient light 1: what leaves it is at most 1 but for the contrast of the surround.
    scale, bias = reflectance.albedo(max(roughness**2, reflectance.LEAST_ALPHA))
    cosine = np.linspace(0.02, 1, 200)
    a, b = np.polyval(scale[::-1], cosine), np.polyval(bias[::-1], cosine)
    assert (a > -0.02).all() and (b > -0.03).all() and (a + b < 1.02).all()


@pytest.mark.parametrize("alpha", [0.09, 0.3, 0.6, 1.0])
def test_albedo_equals_the_integral_of_the_lobe(alpha: float) -> None:
    # Walter et al. 2007, equations 20 and 33, and Heitz 2014, equation 99, integrated plainly over half vectors.
    scale, bias = reflectance.albedo(alpha)
    theta = (np.arange(2000) + 0.5) / 2000 * np.pi / 2
    phi = (np.arange(180) + 0.5) / 180 * np.pi
    t, p = np.meshgrid(theta, phi, indexing="ij")
    solid = np.sin(t) * (np.pi / 2 / 2000) * (np.pi / 180) * 2
    for cosine in (0.35, 0.7, 0.95):
        view = np.array([np.sqrt(1 - cosine**2), 0, cosine])
        h = np.stack([np.sin(t) * np.cos(p), np.sin(t) * np.sin(p), np.cos(t)], -1)
        vh = np.maximum(h @ view, 0)
        nl = np.maximum(2 * vh * h[..., 2] - cosine, 0)
        d = alpha**2 / (np.pi * (np.cos(t) ** 2 * (alpha**2 - 1) + 1) ** 2)

        def smith(c, alpha=alpha):
            return c * 0 + np.sqrt(alpha**2 + (1 - alpha**2) * c**2)

        mask = np.where(nl > 0, 2 * nl * cosine / (cosine * smith(nl) + nl * smith(np.float64(cosine)) + 1e-30), 0)
        lobe = np.where(nl > 0, d * mask * vh / cosine, 0) * solid
        schlick = (1 - vh) ** 5
        assert abs((lobe * (1 - schlick)).sum() - np.polyval(scale[::-1], cosine)) < 0.012
        assert abs((lobe * schlick).sum() - np.polyval(bias[::-1], cosine)) < 0.012


@pytest.mark.parametrize("roughness", [0.3, 0.6, 1.0])
def test_highlight_equals_the_formula(roughness: float) -> None:
    # The same closed forms, evaluated in double precision at every pixel of a flat coat under one lamp.
    floor = assemble([triangles("f", [(0, 0, 0), (20, 0, 0), (20, -20, 0), (0, -20, 0)], [[0, 2, 1], [0, 3, 2]])])
    coat = Material("coat", (0.0, 0.0, 0.0), (0.9, 0.5, 0.2), roughness, True, (200, 150, 90))
    eye, place = np.array((4.0, -14.0, 30.0)), np.array((14.0, -5.0, 25.0))
    view = camera.central(eye, (4.0, -14.0, 0.0), 30.0, (4.0, 14.0))
    drawn = panel(view, PAGE, 4, lighting=lit(Light("lamp", tuple(place), (3e-4, 3e-4, 3e-4))))
    light = colour.from_bytes(painted(floor, drawn, (coat,)))
    y, x = np.mgrid[:200, :200] * 0.1 + 0.05
    at = np.stack([x, -y, 0 * x], -1)
    to_light, to_eye = place - at, eye - at
    distance = np.linalg.norm(to_light, axis=2, keepdims=True)
    to_light, to_eye = to_light / distance, to_eye / np.linalg.norm(to_eye, axis=2, keepdims=True)
    half = to_light + to_eye
    half /= np.linalg.norm(half, axis=2, keepdims=True)
    a2 = roughness**4
    nl, nv, nh, vh = to_light[..., 2], to_eye[..., 2], half[..., 2], (half * to_eye).sum(2)
    d = a2 / (nh**2 * (a2 - 1) + 1) ** 2
    masks = 0.5 / (nl * np.sqrt(a2 + (1 - a2) * nv**2) + nv * np.sqrt(a2 + (1 - a2) * nl**2))
    reflectance_0 = np.array(coat.normal_reflectance)
    fresnel = reflectance_0 + (1 - reflectance_0) * ((1 - vh) ** 5)[..., None]
    expected = np.clip((d * masks * nl)[..., None] * fresnel * 3e-4 * 1e6 / distance**2, 0, 1)
    assert np.abs(colour.encode(light) - colour.encode(expected)).max() * 255 < 1.01


def test_metal_is_not_black_and_brighter_toward_the_upper_left() -> None:
    ball = assemble([sphere("ball", 9.0, NOWHERE, 64)])
    drawn = panel(ball_view(0, 0), PAGE, 4, lighting=lit(Light("ambient", NOWHERE, (0.4, 0.4, 0.4))))
    light = colour.luminance(colour.from_bytes(painted(ball, drawn, (STEEL,))))
    assert light[100, 100] > 0.1 and light[145, 145] > 0.05
    assert light[60, 60] > 2 * light[145, 145]


def test_a_matt_sphere_under_ambient_light_turns_with_the_surround() -> None:
    # A surround of two even halves gives a Lambert surface the mean 1 + contrast * cosine of its tilt to the axis.
    ball = assemble([sphere("ball", 9.0, NOWHERE, 96)])
    drawn = panel(ball_view(0, 0), PAGE, 4, lighting=lit(Light("ambient", NOWHERE, (0.5, 0.5, 0.5))))
    light = colour.from_bytes(painted(ball, drawn, (MATT,)))[..., 0]
    y, x = np.mgrid[:200, :200] + 0.5
    right, up = (x - 100) / 90, (100 - y) / 90
    inside = np.hypot(right, up) < 0.8
    toward = np.sqrt(np.maximum(1 - right**2 - up**2, 0))
    expected = 0.8 * 0.5 * (1 + reflectance.CONTRAST * (up - right + toward) / np.sqrt(3))
    # What the rough coat takes and gives back by Schlick's term stays under 1.5 % at these angles.
    assert np.abs(light / expected - 1)[inside].max() < 0.02


def test_inner_sides_of_open_surfaces_are_lit_from_the_viewers_side() -> None:
    floor = triangles("f", [(0, 0, 0), (20, 0, 0), (20, -20, 0), (0, -20, 0)], [[0, 2, 1], [0, 3, 2]])
    turned = replace(floor, faces=floor.faces[:, ::-1].copy(), normals=-floor.normals)
    drawn = panel(plan(PAGE), PAGE, 4)
    one, other = painted(assemble([floor]), drawn, (PAINT,)), painted(assemble([turned]), drawn, (PAINT,))
    assert one[100, 100, 0] > 100 and (one == other).all()


def test_samples_are_averaged_in_linear_light() -> None:
    # A white page half covered by black in a pixel column shows 0.5 of white in linear light: level 188.
    black = Material("black", (0.0, 0.0, 0.0), (0.0, 0.0, 0.0), 1.0, False, (0, 0, 0))
    sheet = triangles("f", [(0, 0, 0), (10.05, 0, 0), (10.05, -20, 0), (0, -20, 0)], [[0, 2, 1], [0, 3, 2]])
    dark = panel(plan(PAGE), PAGE, 4, lighting=Lighting(()))
    image = painted(assemble([sheet]), dark, (black,))
    assert (image[:, :100] == 0).all() and (image[:, 101:] == 255).all()
    assert (image[:, 100] == 188).all()


def test_normals_are_interpolated_in_perspective() -> None:
    # A long floor whose normals turn along it: the tone at a page point depends on its place on the floor, not on how
    # the floor is cut into triangles.
    def strip(n: int) -> Geometry:
        y = np.linspace(0, 300, n + 1)
        corners = np.concatenate([np.column_stack([np.full(n + 1, x), y, np.full(n + 1, -10.0)]) for x in (-40, 40)])
        share = y / 300
        normal = np.column_stack([0 * y, -share, np.ones(n + 1) * 1.0])
        k = np.arange(n)
        faces = np.concatenate([np.column_stack([k, k + n + 1, k + n + 2]), np.column_stack([k, k + n + 2, k + 1])])
        return assemble([triangles("f", corners, faces, np.concatenate([normal, normal]))])

    view = camera.central((0, -30, 10), (0, 100, -10), 15.0, (10, 10))
    drawn = panel(view, PAGE, 1, lighting=lit(Light("directional", (0.0, -0.8, 0.6), (1.0, 1.0, 1.0))))
    coarse, fine = (painted(strip(n), drawn, (MATT,)).astype(int) for n in (1, 60))
    assert np.ptp(coarse[coarse < 255]) > 30
    assert np.abs(coarse - fine).max() <= 2


def test_pairs_of_light_and_material_stand_for_the_products_of_their_channels() -> None:
    """Pairs equal to the products change nothing; others tint what each light gives to each material, and only that."""
    materials = (GLOSS, STEEL)
    lights = (
        Light("directional", (-0.6, 0.0, 0.8), (0.5, 0.4, 0.3)), Light("ambient", NOWHERE, (0.3, 0.3, 0.4)),
        Light("lamp", (30.0, -40.0, 50.0), (0.002, 0.002, 0.001)),
    )  # fmt: skip
    products = tuple(
        tuple(
            tuple(np.tile(light.power, 2) * (*each.colour, *each.normal_reflectance)) for each in materials
        )
        for light in lights
    )  # fmt: skip
    balls = assemble([sphere("a", 4.0, (-5, 0, 0), 48), sphere("b", 4.0, (5, 0, 0), 48, material=1)])
    drawn = panel(ball_view(0.0, 35.0), PAGE, 1, lighting=Lighting(lights))
    plain = painted(balls, drawn, materials).astype(int)
    same = painted(balls, replace(drawn, lighting=Lighting(lights, 1.0, products)), materials).astype(int)
    assert np.abs(plain - same).max() <= 1 and (plain < 250).any()
    dark = (0.0,) * 6
    off = tuple((dark, row[1]) for row in products)
    changed = painted(balls, replace(drawn, lighting=Lighting(lights, 1.0, off)), materials).astype(int)
    left, right = np.s_[:, :100], np.s_[:, 100:]
    assert np.abs(changed[right] - same[right]).max() == 0
    assert (changed[left][plain[left] < 200] < plain[left][plain[left] < 200]).mean() > 0.9

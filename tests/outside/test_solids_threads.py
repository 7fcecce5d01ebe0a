"""Real threads against the basic profile of ISO 68-1, cut through their axis by the boolean kernel's own slicing.

ISO 68-1 (from memory): H = 0,866 025 404 P; D2 = d2 = d - 0,649 519 053 P; D1 = d1 = d - 1,082 531 755 P; flats of P/8
at the crest of the external thread and P/4 at its root; flanks at 60° to each other. The coarse pitches are those of
ISO 261 (from memory, listed again here in another form than in the code).
"""

from __future__ import annotations

import math

import manifold3d
import numpy as np
import pytest
from platewright.backend.contract import EdgeKind, Mesh, PatchKind
from platewright.compiler import measure
from platewright.compiler.solids import transform
from platewright.compiler.solids.recipe import Block, Cylinder, Thread
from platewright.compiler.solids.thread import count_triangles, minor_diameter
from platewright.compiler.threads import COARSE
from support.recipes import add, check_mesh, cut, made

SIZES = [(3.0, 0.5), (8.0, 1.25), (20.0, 2.5), (64.0, 6.0)]


def profiles(mesh: Mesh, heights: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Radii at heights along the axis, at 0° and at 180° round it, in the plane y = 0."""
    solid = manifold3d.Manifold(manifold3d.Mesh64(mesh.vertices, mesh.faces.astype(np.uint64)))
    # The plane y = 0 becomes z = 0: x stays, the axis becomes y.
    section = solid.transform([[1, 0, 0, 0], [0, 0, 1, 0], [0, -1, 0, 0]]).slice(0.0)
    right, left = np.zeros(len(heights)), np.zeros(len(heights))
    for polygon in section.to_polygons():
        for (x1, y1), (x2, y2) in zip(polygon, np.roll(polygon, -1, axis=0), strict=True):
            if y1 == y2:
                continue
            met = (heights >= min(y1, y2)) & (heights <= max(y1, y2))
            x = x1 + (heights[met] - y1) * (x2 - x1) / (y2 - y1)
            right[met] = np.maximum(right[met], x)
            left[met] = np.maximum(left[met], -x)
    return right, left


@pytest.mark.parametrize(("major", "pitch"), SIZES)
@pytest.mark.parametrize("left", [False, True])
def test_a_section_shows_the_profile_of_iso_68_1(major: float, pitch: float, left: bool) -> None:
    mesh = made(add(Thread(major, pitch, 6 * pitch, left, real=True)), rung=0.01)
    heights = np.linspace(1.0, 5.0, 4001)[:-1] * pitch
    here, opposite = profiles(mesh, heights)
    close = 1e-6 * major
    assert here.max() == pytest.approx(major / 2, abs=close)
    assert here.min() == pytest.approx((major - 1.082531755 * pitch) / 2, abs=close)
    # Flats, as parts of the four pitches looked at; one sample is a thousandth of a pitch.
    assert np.mean(here > major / 2 - close) == pytest.approx(1 / 8, abs=0.002)
    assert np.mean(here < (major - 1.082531755 * pitch) / 2 + close) == pytest.approx(1 / 4, abs=0.002)
    # On the pitch diameter, ridge and groove are equally wide.
    assert np.mean(here > (major - 0.649519053 * pitch) / 2) == pytest.approx(1 / 2, abs=0.002)
    # On the flanks the radius changes by cot 30° for each mm along the axis.
    slope = np.abs(np.diff(here)) / np.diff(heights)
    assert np.median(slope[slope > 0.1]) == pytest.approx(1 / math.tan(math.radians(30)), rel=1e-6)
    # Half a turn is half a pitch: 500 samples.
    assert np.abs(np.roll(here, 500) - opposite).max() < 2e-3 * pitch
    assert np.abs(here - opposite).max() > 0.5 * pitch


@pytest.mark.parametrize("left", [False, True])
def test_a_right_hand_thread_rises_counter_clockwise(left: bool) -> None:
    """Looking down the axis, the crest of a right-hand thread comes toward the viewer as it turns counter-clockwise."""
    mesh = made(add(Thread(20.0, 2.5, 20.0, left, real=True)), rung=0.02)
    radius = np.hypot(mesh.vertices[:, 0], mesh.vertices[:, 1])
    turn = np.arctan2(mesh.vertices[:, 1], mesh.vertices[:, 0]) / (2 * math.pi)
    crest = (radius > 10.0 - 1e-9) & (mesh.vertices[:, 2] > 0.1) & (mesh.vertices[:, 2] < 19.9)
    phase = (mesh.vertices[crest, 2] / 2.5 - (-1 if left else 1) * turn[crest] + 0.5) % 1.0 - 0.5
    assert np.abs(phase).max() < 1 / 16 + 1e-9


@pytest.mark.parametrize(("major", "pitch"), SIZES)
@pytest.mark.parametrize("turns", [0.4, 1.0, 3.0, 7.3])
def test_real_threads_are_sound_at_every_length(major: float, pitch: float, turns: float) -> None:
    for rung in (0.05, 0.01):
        shape = Thread(major, pitch, turns * pitch, real=True)
        mesh = made(add(shape), rung=rung)
        check_mesh(mesh, rung)
        assert len(mesh.faces) <= count_triangles(shape, rung)
        assert sorted(mesh.patches.kind.tolist())[-1] == PatchKind.FREE
        # No facet line inside a flank, none along a crest: sharp sides lie between patches alone.
        apart = mesh.edge_kind != EdgeKind.INSIDE
        assert (mesh.edge_kind[apart] == EdgeKind.SHARP).all()


@pytest.mark.parametrize("rung", [0.05, 0.02, 0.01])
def test_no_facet_departs_from_the_helicoid_by_more_than_the_chord_error(rung: float) -> None:
    """Middles of flank triangles and of their sides, against the equation of the profile."""
    mesh = made(add(Thread(20.0, 2.5, 12.0, real=True)), rung=rung)
    corners = mesh.vertices[mesh.faces[mesh.patches.kind[mesh.face_patch] == PatchKind.FREE]]
    for weights in ((1 / 3, 1 / 3, 1 / 3), (0.5, 0.5, 0), (0, 0.5, 0.5), (0.5, 0, 0.5)):
        x, y, z = np.einsum("k,mkj->jm", np.array(weights), corners)
        rho, turn = np.hypot(x, y), np.arctan2(y, x) / (2 * math.pi)
        u = np.abs((z / 2.5 - turn + 0.5) % 1.0 - 0.5)
        off = np.abs((10.0 - rho) - (u - 1 / 16) * 2.5 / math.tan(math.radians(30))) * math.sin(math.radians(30))
        assert off.max() <= rung


def test_volume_agrees_with_the_profile() -> None:
    """A whole number of turns has the mean cross-section: the mean of pi r² over the profile, by Simpson's rule."""
    u = np.linspace(0.0, 0.5, 80001)
    r = 10.0 - 0.541265877 * 2.5 * np.clip((u - 1 / 16) * 16 / 5, 0.0, 1.0)
    exact = math.pi * float(np.mean((r[:-1] ** 2 + 4 * ((r[:-1] + r[1:]) / 2) ** 2 + r[1:] ** 2) / 6)) * 25.0
    errors = []
    for rung in (0.05, 0.02, 0.01, 0.005):
        mesh = made(add(Thread(20.0, 2.5, 25.0, real=True)), rung=rung)
        errors.append(abs(1 - measure.volume(mesh.vertices, mesh.faces) / exact))
    slope = np.polyfit(np.log((0.05, 0.02, 0.01, 0.005)), np.log(errors), 1)[0]
    assert errors[-1] < 1e-3 and slope == pytest.approx(1.0, abs=0.15)


def test_coarse_pitches() -> None:
    listing = """0.35: 1.6 1.8 | 0.4: 2 | 0.45: 2.2 2.5 | 0.5: 3 | 0.6: 3.5 | 0.7: 4 | 0.8: 5 | 1: 6 7 | 1.25: 8
        | 1.5: 10 | 1.75: 12 | 2: 14 16 | 2.5: 18 20 22 | 3: 24 27 | 3.5: 30 33 | 4: 36 39 | 4.5: 42 45 | 5: 48 52
        | 5.5: 56 60 | 6: 64"""
    expected = {}
    for part in listing.split("|"):
        pitch, diameters = part.split(":")
        expected.update({f"M{diameter}": float(pitch) for diameter in diameters.split()})
    assert dict(COARSE) == expected


def test_minor_diameter_of_m20() -> None:
    """D1 of M20 is 17,294 in ISO 724 (from memory)."""
    assert minor_diameter(Thread(20.0, 2.5, 10.0)) == pytest.approx(17.294, abs=5e-4)


def test_a_bolt_fills_its_hole() -> None:
    """An external thread in the internal one of its size leaves nothing, wherever the pitch lets both start."""
    through = Thread(12.0, 1.75, 10.0, internal=True, real=True)
    plate = made(add(Block((30.0, 30.0, 10.0))), cut(through), rung=0.02)
    check_mesh(plate, 0.02)
    bolt = made(add(Thread(12.0, 1.75, 10.0, real=True)), rung=0.02)
    whole = measure.volume(plate.vertices, plate.faces) + measure.volume(bolt.vertices, bolt.faces)
    assert whole == pytest.approx(30.0 * 30.0 * 10.0, rel=1e-12)


def test_a_thread_joins_its_shank() -> None:
    shank = transform.translate((0.0, 0.0, -10.0))
    mesh = made(add(Thread(20.0, 2.5, 30.0, real=True)), add(Cylinder(20.0, 10.0), shank), rung=0.02)
    check_mesh(mesh, 0.02)
    assert measure.count_pieces(mesh.vertices, mesh.faces) == 1

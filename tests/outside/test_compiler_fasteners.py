"""The fasteners of the library against a listing of their own: nominal sizes of ISO 4014, 4032, 7089 and 4762.

The numbers stand here by kind of size, not by fastener, written down anew from memory of the standards' tables and not
copied from the library's. `measure` reads them off the triangles.
"""

from __future__ import annotations

import math
import zipfile
from pathlib import Path

import numpy as np
import pytest
from platewright.backend.contract import Geometry
from platewright.compiler import measure
from platewright.compiler.scene import Refusal, build, geometry, open_scene
from platewright.compiler.solids.build import build as build_solid

SIZES = (3, 4, 5, 6, 8, 10, 12, 14, 16, 18, 20)
ACROSS_FLATS = dict(zip(SIZES, (5.5, 7, 8, 10, 13, 16, 18, 21, 24, 27, 30), strict=True))  # ISO 4014, 4017, 4032: s
BOLT_HEADS = dict(zip(SIZES, (2, 2.8, 3.5, 4, 5.3, 6.4, 7.5, 8.8, 10, 11.5, 12.5), strict=True))  # ISO 4014: k
NUT_HEIGHTS = dict(zip(SIZES, (2.4, 3.2, 4.7, 5.2, 6.8, 8.4, 10.8, 12.8, 14.8, 15.8, 18), strict=True))  # ISO 4032: m
WASHER_BORES = dict(zip(SIZES, (3.2, 4.3, 5.3, 6.4, 8.4, 10.5, 13, 15, 17, 19, 21), strict=True))  # ISO 7089: d1
WASHERS = dict(zip(SIZES, (7, 9, 10, 12, 16, 20, 24, 28, 30, 34, 37), strict=True))  # ISO 7089: d2
WASHER_HEIGHTS = dict(zip(SIZES, (0.5, 0.8, 1, 1.6, 1.6, 2, 2.5, 2.5, 3, 3, 3), strict=True))  # ISO 7089: h
SCREW_SIZES = (3, 4, 5, 6, 8, 10, 12, 14, 16, 20)
SCREW_HEADS = dict(zip(SCREW_SIZES, (5.5, 7, 8.5, 10, 13, 16, 18, 21, 24, 30), strict=True))  # ISO 4762: dk
SOCKETS = dict(zip(SCREW_SIZES, (2.5, 3, 4, 5, 6, 8, 10, 12, 14, 17), strict=True))  # ISO 4762: s


def scene(*lines: str) -> Geometry:
    """Triangles of an assembly of these lines, at a chord error of 0.005 mm."""
    text = 'platewright 1\n\nsee library "fasteners" as fasteners\n\nassembly tray\n' + "".join(
        f"    {line}\n" for line in lines
    )
    project, problems = open_scene("a.plate", lambda name: text.encode() if name == "a.plate" else Refusal("missing"))
    assert project is not None and problems == ()
    model, problems = build(project)
    assert model is not None and problems == ()
    exported, problems = geometry(model, "tray", build_solid, 0.005)
    assert exported is not None and problems == ()
    return exported.geometry


def vertices(found: Geometry, k: int = 1) -> np.ndarray:
    low, high = found.nodes[k].vertex_range
    return found.vertices[low:high]


def across_flats(points: np.ndarray) -> float:
    """Of a hexagon with flats toward ±y."""
    return float(np.ptp(points[:, 1]))


@pytest.mark.parametrize("size", SIZES)
def test_hexagon_bolts(size: int) -> None:
    points = vertices(scene(f'place fasteners.hexagon_bolt("M{size}", {6 * size} mm)'))
    assert points[:, 2].max() == pytest.approx(BOLT_HEADS[size], abs=1e-9)
    assert points[:, 2].min() == pytest.approx(-6 * size, abs=1e-9)
    head = points[points[:, 2] > -1e-9]
    assert across_flats(head) == pytest.approx(ACROSS_FLATS[size], abs=1e-9)
    # The corners reach 2/√3 times as far as the flats, less nothing on the bearing side.
    assert np.ptp(head[:, 0]) == pytest.approx(ACROSS_FLATS[size] * 2 / math.sqrt(3), abs=1e-9)
    shank = points[points[:, 2] < -1e-9]
    assert np.hypot(shank[:, 0], shank[:, 1]).max() == pytest.approx(size / 2, abs=1e-9)


@pytest.mark.parametrize("size", SIZES)
def test_hexagon_nuts(size: int) -> None:
    found = scene(f'place fasteners.hexagon_nut("M{size}")')
    points = vertices(found)
    assert (points[:, 2].min(), points[:, 2].max()) == pytest.approx((0.0, NUT_HEIGHTS[size]), abs=1e-9)
    assert across_flats(points) == pytest.approx(ACROSS_FLATS[size], abs=1e-9)
    (thread,) = found.nodes[1].threads
    assert (thread.major, thread.internal, thread.length) == pytest.approx((size, True, NUT_HEIGHTS[size]))
    # The hole's crest; some of its vertices stand within its chords.
    assert np.hypot(points[:, 0], points[:, 1]).min() == pytest.approx(thread.minor / 2, abs=0.005)


@pytest.mark.parametrize("size", SIZES)
def test_plain_washers(size: int) -> None:
    points = vertices(scene(f'place fasteners.plain_washer("M{size}")'))
    radius = np.hypot(points[:, 0], points[:, 1])
    assert 2 * radius.max() == pytest.approx(WASHERS[size], abs=1e-9)
    assert 2 * radius.min() == pytest.approx(WASHER_BORES[size], abs=1e-9)
    assert (points[:, 2].min(), points[:, 2].max()) == pytest.approx((0.0, WASHER_HEIGHTS[size]), abs=1e-12)


@pytest.mark.parametrize("size", SCREW_SIZES)
def test_socket_screws(size: int) -> None:
    points = vertices(scene(f'place fasteners.socket_screw("M{size}", {5 * size} mm)'))
    top = points[points[:, 2] > size - 1e-9]
    assert points[:, 2].max() == pytest.approx(size, abs=1e-9)  # ISO 4762: k is d
    assert 2 * np.hypot(top[:, 0], top[:, 1]).max() == pytest.approx(SCREW_HEADS[size], abs=1e-9)
    corners = top[np.hypot(top[:, 0], top[:, 1]) < SCREW_HEADS[size] / 2 - 1e-6]
    assert across_flats(corners) == pytest.approx(SOCKETS[size], abs=1e-9)


@pytest.mark.parametrize(
    ("size", "length", "reach"), [("M8", 60, 22), ("M10", 150, 32), ("M12", 220, 49), ("M8", 20, 20)]
)
def test_lengths_of_threads_on_bolts(size: str, length: float, reach: float) -> None:
    """ISO 4014 (from memory): b = 2d + 6 up to 125 mm, 2d + 12 up to 200 mm, 2d + 25 above; all of it at most."""
    (thread,) = scene(f'place fasteners.hexagon_bolt("{size}", {length} mm)').nodes[1].threads
    assert thread.length == pytest.approx(reach)
    assert thread.start == pytest.approx((0, 0, -length))
    assert thread.axis == pytest.approx((0, 0, 1)) and not thread.internal


def test_real_threads_on_request() -> None:
    found = scene(
        'place fasteners.hexagon_screw("M6", 16 mm, real = yes)',
        'place fasteners.hexagon_nut("M6", real = yes) at (30 mm, 0, 0)',
    )
    assert [node.threads for node in found.nodes] == [(), (), ()]
    for node in found.nodes[1:]:
        (low, high), (first, last) = node.face_range, node.vertex_range
        faces = found.faces[low:high] - first
        assert high - low > 1000 and measure.is_closed(faces, last - first)


def test_a_size_that_is_not_in_the_table() -> None:
    text = 'platewright 1\n\nsee library "fasteners" as f\n\nassembly tray\n    place f.hexagon_nut("M7")\n'
    project, _ = open_scene("a.plate", lambda name: text.encode())
    assert project is not None
    _, problems = build(project)
    assert [(p.code, p.span.file, p.span.line) for p in problems] == [("unknown-name", "a.plate", 6)]
    assert "`M7`" in problems[0].sentence and problems[0].related[0].span.file.endswith("fasteners.plate")


def test_a_library_that_does_not_exist() -> None:
    text = 'platewright 1\n\nsee library "../fasteners" as f\n\npart p\n    add sphere diameter 1 mm\n'
    _, problems = open_scene("a.plate", lambda name: text.encode())
    assert [(p.code, p.span.line) for p in problems] == [("no-such-file", 3)]


@pytest.mark.slow
def test_the_library_is_in_the_wheel(tmp_path: Path) -> None:
    """A wheel built from the tree holds every file of the library, byte for byte."""
    import shutil
    import subprocess
    import sys

    root = Path(__file__).parents[2]
    ignored = shutil.ignore_patterns("__pycache__", ".*", "*.egg-info", "tests", "examples", "build")
    shutil.copytree(root, tmp_path / "tree", ignore=ignored)
    command = [sys.executable, "-m", "pip", "wheel", "--quiet", "--no-deps", "--wheel-dir", str(tmp_path)]
    subprocess.run([*command, str(tmp_path / "tree")], check=True, capture_output=True)
    (wheel,) = tmp_path.glob("*.whl")
    with zipfile.ZipFile(wheel) as packed:
        for file in (root / "compiler" / "library").iterdir():
            assert packed.read(f"platewright/compiler/library/{file.name}") == file.read_bytes()

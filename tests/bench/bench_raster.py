"""Times of the rasteriser beside a yardstick from the same run: `python tests/bench/bench_raster.py [rows]`.

Frames of ours and of the yardstick alternate, and medians are compared. Ours is `raster.paint` as a figure uses it:
preparing the panel, exact coverage, three lights with microfacets, the surround, 8-bit sRGB, float64 vertices. The
yardstick gets the same triangles, camera and size, three lights with a power-law highlight, no sRGB.
"""

from __future__ import annotations

import subprocess
import sys
import time
from pathlib import Path

import numpy as np
from platewright.backend import camera, raster
from platewright.backend.contract import Light, Lighting, Material, Page, Panel, Style

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
from bench.llvmpipe import Yardstick
from support.raster_models import assemble, sphere, torus, triangles

COLUMNS, ROWS = 1920, 1440
PAGE = Page(COLUMNS * 25.4 / 600.0, ROWS * 25.4 / 600.0, 600.0)
EYE = np.array((0.0, -120.0, 0.0))
FIELD = np.radians(40.0)
LIGHTS = np.array([[0.4, -0.6, 0.7], [-0.7, -0.6, 0.2], [0.1, -0.5, -0.8]])
LIGHTS /= np.linalg.norm(LIGHTS, axis=1, keepdims=True)
POWERS = np.array([[0.8, 0.78, 0.75], [0.3, 0.32, 0.4], [0.2, 0.18, 0.15]])
MUST = {"10k": 0.45, "100k": 0.45, "1M": 0.28, "5M": 0.28, "huge": 0.22}


def objects(n_triangles: int, seed: int = 1):
    """24 spheres and tori in two layers, depth complexity about 2.5; parts, and a colour for each."""
    random = np.random.default_rng(seed)
    cells = [(layer, column, row) for layer in range(2) for column in range(4) for row in range(3)]
    random.shuffle(cells)
    n = max(3, round(np.sqrt(n_triangles / len(cells) / 4)))
    parts = []
    for k, (layer, column, row) in enumerate(cells):
        make = torus("", 10.5, 5.2, n=n) if (column + row + layer) % 2 else sphere("", 15.0, n=n)
        turn = np.linalg.qr(random.normal(size=(3, 3)))[0]
        turn *= np.sign(np.linalg.det(turn))
        at = np.array(((column - 1.5) * 27.5 + 6 * layer, 30.0 * layer, (row - 1) * 27.5 - 5 * layer))
        at += random.normal(size=3)
        corners, first = np.unique(make.faces.ravel(), return_index=True)
        normals = np.zeros_like(make.vertices)
        normals[corners] = make.normals.reshape(-1, 3)[first]
        parts.append(triangles(f"part{k:02}", make.vertices @ turn.T + at, make.faces, normals @ turn.T, k))
    return parts, random.uniform(0.2, 0.95, (len(parts), 3))


def huge(n: int = 200, seed: int = 2):
    """Triangles as large as a third of the picture, depth complexity above 10."""
    random = np.random.default_rng(seed)
    half_height = np.tan(FIELD / 2) * 120.0
    corners = []
    for _ in range(n):
        depth = random.uniform(-30.0, 60.0)
        s = (120.0 + depth) / 120.0
        x, z = random.uniform(-0.8, 0.8, 2) * (half_height * COLUMNS / ROWS, half_height) * s
        angle = random.uniform(0, 2 * np.pi) + np.array([0, 2, 4]) * np.pi / 3 + random.uniform(-0.4, 0.4, 3)
        r = random.uniform(17.0, 30.0) * s
        corners.append(
            np.column_stack([x + r * np.cos(angle), depth + random.uniform(-25, 25, 3), z + r * np.sin(angle)])
        )
    parts = [triangles(f"part{k:03}", c, [[0, 1, 2]], None, k) for k, c in enumerate(corners)]
    return parts, random.uniform(0.2, 0.95, (n, 3))


def scene(name: str):
    counts = {"10k": 10_000, "100k": 100_000, "1M": 1_000_000, "5M": 5_000_000}
    parts, colours = huge() if name == "huge" else objects(counts[name])
    materials = tuple(Material(f"m{k}", tuple(c), (0.04,) * 3, 0.4, False, (0, 0, 0)) for k, c in enumerate(colours))
    return assemble(parts), materials, colours


def panel(samples: int) -> Panel:
    focal = camera.principal_distance_of_angle(np.degrees(FIELD), PAGE.height)
    projection = camera.central(EYE, (0.0, 0.0, 0.0), focal, (PAGE.width / 2, PAGE.height / 2))
    lights = [Light("directional", tuple(v), tuple(p)) for v, p in zip(LIGHTS, POWERS, strict=True)]
    lighting = Lighting((*lights, Light("ambient", (0.0, 0.0, 0.0), (0.08,) * 3)))
    return Panel("bench", 0, projection, (0.0, 0.0, PAGE.width, PAGE.height), Style("tone", samples), lighting)


def yardstick(geometry, colours, samples: int) -> Yardstick:
    near, far, t = 5.0, 600.0, 1.0 / np.tan(FIELD / 2)
    look = np.array([[1, 0, 0, 0], [0, 0, 1, 0], [0, -1, 0, -120.0], [0, 0, 0, 1]])
    lens = np.zeros((4, 4))
    lens[0, 0], lens[1, 1], lens[3, 2] = t * ROWS / COLUMNS, t, -1.0
    lens[2, 2], lens[2, 3] = (far + near) / (near - far), 2 * far * near / (near - far)
    normals = np.zeros_like(geometry.vertices)
    normals[geometry.faces.ravel()] = geometry.corner_normals.reshape(-1, 3)
    tint = np.zeros_like(geometry.vertices)
    for node in geometry.nodes[1:]:
        tint[slice(*node.vertex_range)] = colours[node.material]
    size = (COLUMNS, ROWS)
    return Yardstick(size, samples, geometry.vertices, normals, tint, geometry.faces, lens @ look, EYE, LIGHTS, POWERS)


def frame(geometry, view, materials, image, threads=None) -> float:
    start = time.perf_counter()
    raster.paint(geometry, view, PAGE, materials, image, threads)
    return time.perf_counter() - start


def against_llvmpipe(names, repeats: int = 7) -> None:
    image = np.zeros((ROWS, COLUMNS, 3), np.uint8)
    for name in names:
        geometry, materials, colours = scene(name)
        for samples in (4, 1):
            view, other = panel(samples), yardstick(geometry, colours, samples)
            frame(geometry, view, materials, image), other.frame(), other.frame()
            times = np.array(
                [
                    (frame(geometry, view, materials, image), other.frame())
                    for _ in range(repeats if name != "5M" else 5)
                ]
            )
            ours, theirs = np.median(times, axis=0)
            must = MUST[name] if samples == 4 else 0.9
            print(
                f"frame / {other.name}, {name}, {samples} samples: {ours / theirs:.2f} (must {must})"
                f"   {ours * 1e3:.0f} ms / {theirs * 1e3:.0f} ms, {len(geometry.faces)} triangles",
                flush=True,
            )
            other.release()


def threads(name: str = "100k") -> None:
    image = np.zeros((ROWS, COLUMNS, 3), np.uint8)
    geometry, materials, _ = scene(name)
    view = panel(4)
    frame(geometry, view, materials, image)
    times = np.array([[frame(geometry, view, materials, image, n) for n in (1, 2)] for _ in range(11)])
    one, two = np.median(times, axis=0)
    print(
        f"two threads / one thread, {name}, 4 samples: {two / one:.2f} (must 0.62)"
        f"   {two * 1e3:.0f} / {one * 1e3:.0f} ms"
    )


def memory() -> None:
    """Peak of a fresh process that holds and draws 5 M triangles, less the same with 10 k, over their arrays."""
    peaks = [
        [int(word) for word in subprocess.check_output([sys.executable, __file__, "--peak", name]).split()]
        for name in ("10k", "5M")
    ]
    (small, _), (large, own) = peaks
    print(f"peak memory of a 5M frame / the triangles' own arrays: {(large - small) / own:.2f} (must 2.5)")


def peak(name: str) -> None:
    """Print the growth of the resident peak in bytes by drawing, with the triangles, and the size of their arrays."""
    geometry, materials, _ = scene(name)
    fields = (
        "vertices",
        "faces",
        "corner_normals",
        "face_node",
        "face_patch",
        "face_origin",
        "face_source",
        "edge_kind",
    )
    own = sum(getattr(geometry, field).nbytes for field in fields)
    Path("/proc/self/clear_refs").write_text("5")
    image = np.zeros((ROWS, COLUMNS, 3), np.uint8)
    frame(geometry, panel(4), materials, image)
    high = next(line for line in Path("/proc/self/status").read_text().splitlines() if line.startswith("VmHWM"))
    print(int(high.split()[1]) * 1024, own)


if __name__ == "__main__":
    if sys.argv[1:2] == ["--peak"]:
        peak(sys.argv[2])
    else:
        wanted = sys.argv[1:] or ["10k", "100k", "1M", "5M", "huge", "threads", "memory"]
        against_llvmpipe([name for name in wanted if name in MUST])
        if "threads" in wanted:
            threads()
        if "memory" in wanted:
            memory()

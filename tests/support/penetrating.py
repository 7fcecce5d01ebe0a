"""Scenes whose parts penetrate each other, and what is seen of them taken through all stages up to regions."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from platewright.backend.contract import Geometry, Mesh, Projection, Style
from platewright.backend.lines.contours import contours_of
from platewright.backend.lines.edges import edges_of
from platewright.backend.lines.model import Candidates, Pieces, Region, View, joined
from platewright.backend.lines.occluders import Occluders, occluders_of
from platewright.backend.lines.penetrations import penetrations_of
from platewright.backend.lines.regions import regions_of
from platewright.backend.lines.view import see_view
from platewright.backend.lines.visibility import cut
from platewright.compiler.solids.recipe import Block, Cylinder, Prism, Sphere, Torus
from support.line_scenes import PAGE, line_panel, nut, placed_at, scene, turned_about
from support.recipes import add, made


@dataclass(frozen=True, eq=False, slots=True)
class Arranged:
    """A scene in one view with its visible regions."""

    geometry: Geometry
    view: View
    candidates: Candidates
    pieces: Pieces
    occluders: Occluders
    regions: tuple[Region, ...]


def arranged(geometry: Geometry, projection: Projection, **more: object) -> Arranged:
    """All stages from the geometry to its regions."""
    view = see_view(geometry, line_panel(projection, **more), PAGE)
    candidates = joined((edges_of(view, Style()), contours_of(view), penetrations_of(view)))
    occluders = occluders_of(view)
    pieces = cut(view, candidates, None, occluders)
    regions = regions_of(view, pieces, candidates, occluders)
    return Arranged(geometry, view, candidates, pieces, occluders, regions)


@cache
def shapes() -> tuple[Mesh, ...]:
    """Six meshes of 10 to 26 mm."""
    return (
        made(add(Block((14.0, 20.0, 8.0)))),
        made(add(Sphere(14.0))),
        made(add(Torus(16.0, 5.0))),
        made(add(Cylinder(8.0, 26.0))),
        made(add(Prism(5, 11.0, 18.0))),
        nut(16.0, 8.0, 9.0, 0.02),
    )


def tangle() -> Geometry:
    """A slab and four parts sunk into it and into each other."""
    slab = made(add(Block((40.0, 40.0, 4.0))))
    ball, ring = made(add(Sphere(14.0))), made(add(Torus(20.0, 5.0)))
    pin, bar = made(add(Cylinder(6.0, 40.0))), made(add(Block((12.0, 30.0, 8.0))))
    return scene(
        [
            ("slab", slab, placed_at(0, 0, -4)),
            ("ball", ball, placed_at(8, -5, 3, turned_about((1, 2, 3), 33))),
            ("ring", ring, placed_at(-6, 2, 3, turned_about((1, 0, 0), 50))),
            ("pin", pin, placed_at(2, -9, -6, turned_about((1, 1, 0), 25))),
            ("bar", bar, placed_at(-10, -4, -1, turned_about((0, 1, 1), 20))),
        ]
    )


def thrown(seed: int, n_parts: int = 7) -> Geometry:
    """Parts thrown together at random, most of them penetrating others."""
    random = np.random.default_rng(seed)
    meshes = shapes()
    return scene(
        [
            (
                f"part_{k}",
                meshes[random.integers(len(meshes))],
                placed_at(*random.uniform(-14, 14, 3), turned_about(random.normal(size=3), random.uniform(0, 360))),
            )
            for k in range(n_parts)
        ]
    )

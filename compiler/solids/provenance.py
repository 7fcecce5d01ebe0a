"""From what the boolean kernel gives back to a finished mesh: every triangle with its surface and its line.

The kernel gives triangles in runs, each a piece of one placed copy of one original. An original is a shell, which may
serve several lines of a recipe: then their copies tell it by where they stand.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import manifold3d
import numpy as np
from manifold3d import Manifold
from numpy.typing import NDArray
from platewright.backend.contract import Mesh

from .finish import finish
from .flaw import SolidError
from .shell import Shell
from .surfaces import Surfaces, concatenate, place, placed_normals
from .topology import in_use, without_specks

F64 = NDArray[np.float64]
I32 = NDArray[np.int32]
I64 = NDArray[np.int64]


@dataclass(frozen=True, eq=False, slots=True)
class Leaf:
    """What one line places of one shape: the kernel's number of the original, the line, the shell, and where the
    copies (n,3,4) stand in the frame of the line's part.
    """

    number: int
    source: int
    shell: Shell
    placements: F64


def stand_apart(leaf: Leaf, others: Sequence[Leaf]) -> bool:
    """Whether no copy stands where one of another leaf does."""
    places = _places(leaf)
    return all(places.isdisjoint(_places(other)) for other in others)


def traced(key: str, solid: Manifold, leaves: Sequence[Leaf], has_specks: bool) -> Mesh:
    """The mesh of a solid made of leaves, which are in the order their shapes were met; faces are in that order too.

    Leaves of one number stand apart, and are placed in the frame of the solid. SolidError for a face of none of them.
    """
    mesh = solid.to_mesh64()
    runs = _Runs(mesh, leaves)
    faces = np.asarray(mesh.tri_verts).astype(np.int32)
    vertices = np.ascontiguousarray(mesh.vert_properties[:, :3]) + 0.0
    free = None
    if np.shape(mesh.vert_properties)[1] > 3:
        free = runs.placed_normals(np.asarray(mesh.vert_properties)[:, 3:6][faces])
        same = np.arange(len(mesh.vert_properties), dtype=np.int32)
        same[np.asarray(mesh.merge_from_vert, np.int64)] = np.asarray(mesh.merge_to_vert, np.int32)
        vertices, faces = in_use(vertices, same[faces])
    rows, surfaces = runs.surfaces(np.asarray(mesh.face_id).astype(np.int64))
    sources = runs.sources()
    if runs.order is not None:
        faces, rows, sources = faces[runs.order], rows[runs.order], sources[runs.order]
        free = None if free is None else free[runs.order]
    if has_specks:
        kept = without_specks(vertices, faces)
        vertices, faces, rows, sources = *in_use(vertices, faces[kept]), rows[kept], sources[kept]
        free = None if free is None else free[kept]
    return finish(key, vertices, faces, rows, sources, surfaces, free)


class _Runs:
    """The runs that have triangles: how many (r,), the leaf of each (r,), its placement (r,3,4), and whether the solid
    lies behind it (r,). `order` puts the faces (m,) into the order of the leaves; None where they are.
    """

    def __init__(self, mesh: manifold3d.Mesh64, leaves: Sequence[Leaf]) -> None:
        starts = np.array(mesh.run_index, np.int64) // 3
        lengths = starts[1:] - starts[:-1]
        # A run without triangles may be that of the box round what is kept.
        has_faces = np.flatnonzero(lengths)
        self._leaves = leaves
        self._lengths = lengths[has_faces]
        self._placements = np.ascontiguousarray(np.asarray(mesh.run_transform)[has_faces].transpose(0, 2, 1))
        self._behind = (np.array(mesh.run_flags, np.uint8)[has_faces] & 1).astype(np.bool_)
        self._leaf = _leaf_of(np.array(mesh.run_original_id, np.int64)[has_faces], self._placements, leaves)
        self.order: I64 | None = None
        if (self._leaf[1:] < self._leaf[:-1]).any():
            self.order = np.argsort(np.repeat(self._leaf, self._lengths), kind="stable")

    def sources(self) -> I32:
        """The line of every face (m,)."""
        return np.repeat(np.array([leaf.source for leaf in self._leaves], np.int32)[self._leaf], self._lengths)

    def surfaces(self, row_in_leaf: I64) -> tuple[I32, Surfaces]:
        """For every face (m,) its row among the placed surfaces, of which only those in use are returned."""
        sizes = np.array([len(leaf.shell.surfaces) for leaf in self._leaves], np.int64)
        # One row for every run and every surface of its original, the runs in the order of their leaves.
        by_leaf = np.argsort(self._leaf, kind="stable")
        counts = sizes[self._leaf[by_leaf]]
        first_of_run = np.empty(len(by_leaf), np.int64)
        first_of_run[by_leaf] = np.cumsum(counts) - counts
        rows = np.repeat(first_of_run, self._lengths) + row_in_leaf
        used = np.zeros(int(counts.sum()), np.bool_)
        used[rows] = True
        kept = np.flatnonzero(used)
        run = by_leaf[np.searchsorted(first_of_run[by_leaf], kept, side="right") - 1]
        number = np.cumsum(used, dtype=np.int32) - np.int32(1)
        first_of_leaf = np.cumsum(sizes) - sizes
        every = concatenate([leaf.shell.surfaces for leaf in self._leaves])
        local = every.take(first_of_leaf[self._leaf[run]] + kept - first_of_run[run])
        placed = place(local, self._placements[run])
        return number[rows], Surfaces(placed.kind, placed.affine, placed.ratio, placed.flipped ^ self._behind[run])

    def placed_normals(self, normals: F64) -> F64:
        """Normals (m,3,3) of originals as they stand in the solid, outward."""
        run = np.repeat(np.arange(len(self._lengths)), self._lengths)
        side = np.where(self._behind, -1.0, 1.0)[run]
        return placed_normals(self._placements[run][:, None], normals) * side[:, None, None]


def _leaf_of(numbers: I64, placements: F64, leaves: Sequence[Leaf]) -> I64:
    """The leaf (r,) of each run."""
    of_number: dict[int, list[int]] = {}
    for row, leaf in enumerate(leaves):
        of_number.setdefault(leaf.number, []).append(row)
    at_place = {
        (leaves[row].number, place): row
        for rows in of_number.values()
        if len(rows) > 1
        for row in rows
        for place in _places(leaves[row])
    }
    found = []
    for run, number in enumerate(numbers.tolist()):
        rows = of_number.get(number, [])
        leaf_row = rows[0] if len(rows) == 1 else at_place.get((number, _place(placements[run])))
        if leaf_row is None:
            raise SolidError("a face of no shape of the recipe")
        found.append(leaf_row)
    return np.array(found, np.int64)


def _places(leaf: Leaf) -> set[bytes]:
    return {_place(placement) for placement in leaf.placements}


def _place(placement: F64) -> bytes:
    # Zeros of either sign are one place.
    return (placement + 0.0).tobytes()

"""Primitives ready to be put together: their triangles, their measures, and how the boolean kernel has them."""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property
from typing import TypeAlias

import manifold3d
import numpy as np
from manifold3d import Manifold
from numpy.typing import NDArray

from .flaw import SolidError
from .levels import axis_planes
from .recipe import Primitive
from .shell import Shell
from .tessellate import tessellate

F64 = NDArray[np.float64]
I64 = NDArray[np.int64]


class Blank:
    """A shell with all that follows from it, worked out when first asked for."""

    def __init__(self, shell: Shell) -> None:
        self.shell = shell

    @cached_property
    def volume(self) -> float:
        """The volume enclosed, mm3."""
        a, b, c = (self.shell.vertices.take(self.shell.faces[:, k], axis=0).T for k in range(3))
        x = a[0] * (b[1] * c[2] - b[2] * c[1])
        y = a[1] * (b[2] * c[0] - b[0] * c[2])
        z = a[2] * (b[0] * c[1] - b[1] * c[0])
        return float((x + y + z).sum() / 6.0)

    @cached_property
    def box(self) -> F64:
        """The box (2,3), mm."""
        return np.array((self.shell.vertices.min(axis=0), self.shell.vertices.max(axis=0)))

    @cached_property
    def planes(self) -> F64:
        """Its flat faces (k,6), as `levels.axis_planes` has them."""
        return axis_planes(self.shell.surfaces)

    @cached_property
    def solid(self) -> tuple[Manifold, int]:
        """The shell as the kernel has it, and the number of the original."""
        number = Manifold.reserve_ids(1)
        return imported(self.shell, number), number


Blanks: TypeAlias = Callable[[Primitive, float], Blank]
"""Gives the blank of a primitive at a chord error in mm, as `blank` or from what has been kept of it."""


def blank(shape: Primitive, rung: float) -> Blank:
    """The blank of a primitive at a chord error in mm. SolidError as `tessellate`."""
    return Blank(tessellate(shape, rung))


def imported(shell: Shell, number: int) -> Manifold:
    """A shell as an original of that number; the face numbers are rows of its surfaces. SolidError if it is open."""
    properties, faces, copies = _with_normals(shell)
    apart = np.flatnonzero(copies != np.arange(len(copies)))
    mesh = manifold3d.Mesh64(
        vert_properties=properties,
        tri_verts=faces.astype(np.uint64),
        merge_from_vert=apart.astype(np.uint64),
        merge_to_vert=copies[apart].astype(np.uint64),
        run_index=np.array([0, faces.size], np.uint64),
        run_original_id=np.array([number], np.uint32),
        face_id=shell.face_surface.astype(np.uint64),
    )
    solid = Manifold(mesh)
    if solid.status() != manifold3d.Error.NoError:
        raise SolidError(f"a shell is not closed: {solid.status()}")
    return solid


def _with_normals(shell: Shell) -> tuple[F64, NDArray[np.integer], I64]:
    """Vertices as the kernel takes them (n,3), or (n,6) with normals that it carries over cuts; the faces in them; and
    for each the first that stands at its place. A vertex where free patches meet stands once for each normal.
    """
    if shell.normals is None:
        return shell.vertices, shell.faces, np.arange(len(shell.vertices))
    corner = shell.faces.astype(np.int64).ravel()
    normals = np.round(shell.normals.reshape(-1, 3), 12) + 0.0
    order = np.lexsort((normals[:, 2], normals[:, 1], normals[:, 0], corner))
    ordered, by_vertex = normals[order], corner[order]
    is_new = np.ones(len(order), np.bool_)
    is_new[1:] = (by_vertex[1:] != by_vertex[:-1]) | (ordered[1:] != ordered[:-1]).any(axis=1)
    faces = np.empty(len(order), np.int64)
    faces[order] = np.cumsum(is_new) - 1
    vertex = by_vertex[is_new]
    first = np.searchsorted(vertex, vertex)
    return np.concatenate((shell.vertices[vertex], ordered[is_new]), axis=1), faces.reshape(-1, 3), first

"""From world millimetres to candidates: how points are seen, and rows filled with what most segments have."""

from __future__ import annotations

from typing import TypeVar

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ..contract import F64, LineClass, Projection
from .model import Candidates, View, number_of
from .near import NEAR

_T = TypeVar("_T", bound=np.generic)


def fixed(array: NDArray[_T]) -> NDArray[_T]:
    """The same array, contiguous and read-only: kernels are compiled once, whoever made their arguments."""
    result = np.ascontiguousarray(array).view()
    result.flags.writeable = False
    return result


def to_view(projection: Projection, world: F64) -> F64:
    """View points (k,3) of world points (k,3) mm, all in front of the eye. Sums are spelt out, the same everywhere."""
    matrix = projection.world_to_page
    x, y, z = world[:, 0], world[:, 1], world[:, 2]
    rows = [row[0] * x + row[1] * y + row[2] * z + row[3] for row in matrix]
    return np.stack([row / rows[3] for row in rows[:3]], axis=1)


def on_page(projection: Projection, world: F64) -> F64:
    """Page points (k,2) mm of world points (k,3) mm, all in front of the eye."""
    return to_view(projection, world)[:, :2]


def weight(projection: Projection, world: F64) -> F64:
    """W of `contract.Projection` (k,) of world points (k,3): in central projection mm before the eye, else 1."""
    row = projection.world_to_page[3]
    return np.asarray(row[0] * world[:, 0] + row[1] * world[:, 1] + row[2] * world[:, 2] + row[3])


def along_sight(projection: Projection, world: F64) -> F64:
    """Lines of sight (k,3) to world points (k,3): from the eye, in mm; in parallel projection the unit projector."""
    if projection.eye is None:
        return np.broadcast_to(np.array(projection.sight), world.shape)
    return np.asarray(world - np.array(projection.eye))


def dot(a: F64, b: F64) -> F64:
    """Inner products of rows, summed in the order x, y, z."""
    return np.asarray(a[..., 0] * b[..., 0] + a[..., 1] * b[..., 1] + a[..., 2] * b[..., 2])


def length(a: F64) -> F64:
    """Lengths of rows."""
    return np.asarray(np.sqrt(dot(a, a)))


def unit(a: F64) -> F64:
    """Rows of length 1; zeros stay zeros."""
    size = length(a)
    return np.asarray(a / np.where(size > 0.0, size, 1.0)[..., None])


def candidates(
    start: F64,
    end: F64,
    line_class: LineClass,
    node: ArrayLike = -1,
    chain: ArrayLike = -1,
    faces: ArrayLike = -1,
    vertices: ArrayLike = -1,
    patch: ArrayLike = -1,
    allowance: ArrayLike = 0.0,
    is_plain: ArrayLike = False,
) -> Candidates:
    """Drawn candidates from view points (s,3); what is given once holds for all rows."""
    n = len(start)

    def column(value: ArrayLike, dtype: type[_T], width: tuple[int, ...] = ()) -> NDArray[_T]:
        return np.array(np.broadcast_to(np.asarray(value, dtype), (n, *width)))

    return Candidates(
        start=np.ascontiguousarray(start, np.float64),
        end=np.ascontiguousarray(end, np.float64),
        line_class=column(number_of(line_class), np.uint8),
        node=column(node, np.int32),
        chain=column(chain, np.int32),
        faces=column(faces, np.int32, (2,)),
        vertices=column(vertices, np.int32, (2,)),
        patch=column(patch, np.int32),
        allowance=column(allowance, np.float64),
        is_drawn=column(True, np.bool_),
        is_plain=column(is_plain, np.bool_),
    )


def none() -> Candidates:
    """No candidates."""
    return candidates(np.empty((0, 3)), np.empty((0, 3)), LineClass.VISIBLE_OUTLINE)


def placed(view: View, start: F64, end: F64, line_class: LineClass, **columns: ArrayLike) -> Candidates:
    """Candidates from world points (s,3); columns as in `candidates`. What comes too near the eye is left out whole."""
    is_before = (weight(view.projection, start) >= NEAR) & (weight(view.projection, end) >= NEAR)
    if not is_before.all():
        kept = np.flatnonzero(is_before)
        columns = {name: np.asarray(column)[kept] if np.ndim(column) else column for name, column in columns.items()}
        start, end = start[kept], end[kept]
    return candidates(to_view(view.projection, start), to_view(view.projection, end), line_class, **columns)


def shifts(view: View) -> F64:
    """How far each node is displaced (n_nodes,3), mm: read off its first vertex, which a view keeps in its row."""
    geometry = view.geometry
    first = np.array([node.vertex_range[0] for node in geometry.nodes], np.intp)
    result = np.zeros((len(first), 3))
    rows = np.flatnonzero([node.mesh >= 0 for node in geometry.nodes])
    result[rows] = view.world[first[rows]] - geometry.vertices[first[rows]]
    return result

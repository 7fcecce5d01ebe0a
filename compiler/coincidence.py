"""Copies that lie on each other: the same thing at the same place, counting that round shapes may turn in place."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from .graph import Solid, Thing
from .solids.recipe import Affine, Cone, Cylinder, Edged, Primitive, Recipe, Revolve, Sphere, Thread, Torus

Symmetry = Literal["ball", "round", "none"]
"""What leaves a shape as it is: any turn about its origin, turns about its z axis, nothing."""


def symmetry(shape: Primitive | Recipe) -> Symmetry:
    """How a shape may turn and stay as it is. Regular prisms count as what has to stand still."""
    match shape:
        case Sphere():
            return "ball"
        case Edged():
            return symmetry(shape.shape)
        case Revolve() if shape.angle < 360.0:
            return "none"
        case Cylinder() | Cone() | Torus() | Revolve():
            return "round"
        case Thread(real=False):
            return "round"
        case Recipe():
            placed = [each for step in shape.steps for each in step.placed]
            kinds = {symmetry(each.shape) for each in placed}
            places = [place for each in placed for place in each.placements]
            if kinds == {"ball"} and all(_shift(place) == (0.0, 0.0, 0.0) for place in places):
                return "ball"
            return "round" if "none" not in kinds and all(map(_keeps_z, places)) else "none"
        case _:
            return "none"


def of_thing(thing: Thing) -> Symmetry:
    """How a part may turn and stay as it is; assemblies are not looked into."""
    return symmetry(thing.recipe) if isinstance(thing, Solid) else "none"


def coincide(placements: Sequence[Affine], kind: Symmetry) -> bool:
    """Whether any two of the placements put a thing of this symmetry in one place, to a millionth of a millimetre."""
    return len(placements) > 1 and len({row.tobytes() for row in _keys(placements, kind)}) < len(placements)


def shared_lines(placed: Sequence[tuple[int, Affine]], kind: Symmetry) -> list[tuple[int, int]]:
    """Pairs of lines, the earlier first, that put a thing of this symmetry in one place; `placed` are line and place.

    Each line is named once, with the first that it shares a place with. Copies of one line are left to `coincide`.
    """
    if len({line for line, _ in placed}) < 2:
        return []
    first: dict[bytes, int] = {}
    found: dict[int, int] = {}
    for (line, _), key in zip(placed, _keys([place for _, place in placed], kind), strict=True):
        earlier = first.setdefault(key.tobytes(), line)
        if earlier != line:
            found.setdefault(line, earlier)
    return [(earlier, line) for line, earlier in found.items()]


def _keys(placements: Sequence[Affine], kind: Symmetry) -> NDArray[np.float64]:
    """One row for each placement, equal where the thing stands in one place."""
    places = np.array(placements)
    linear, shifts = np.round(places[:, :, :3], 9), np.round(places[:, :, 3], 6)
    if kind == "ball":
        linear = np.round((places[:, :, :3] ** 2).sum(axis=1), 9)[:, None, :]
    elif kind == "round":
        linear = linear[:, :, 2:]
    return np.ascontiguousarray(np.concatenate((linear.reshape(len(places), -1), shifts), axis=1) + 0.0)


def _shift(placement: Affine) -> tuple[float, float, float]:
    x, y, z = (row[3] for row in placement)
    return (x, y, z)


def _keeps_z(placement: Affine) -> bool:
    """Whether a placement leaves the z axis on itself."""
    (_, _, x, shift_x), (_, _, y, shift_y), _ = placement
    return x == 0.0 and y == 0.0 and shift_x == 0.0 and shift_y == 0.0

"""The triangle lists by kind of file."""

from __future__ import annotations

from collections.abc import Iterable

from ..contract import Geometry, Material
from .glb import glb_bytes
from .obj import obj_bytes
from .ply import ply_bytes
from .stl import stl_bytes
from .subset import subset
from .table import csv_bytes

KINDS = ("csv", "stl", "ply", "obj", "glb")


def export(
    geometry: Geometry,
    materials: tuple[Material, ...],
    kind: str,
    node_rows: Iterable[int] | None = None,
    name: str = "triangles",
) -> dict[str, bytes]:
    """The files of one kind of `KINDS`, suffix to bytes: one file, or for "obj" also its "mtl".

    `node_rows` are the nodes to export (`subset.rows_below` gives a path and all below it), None for all. `name`
    is the stem under which the files will be kept, needed where one file names another. Raises ValueError on
    another kind.
    """
    chosen = geometry if node_rows is None else subset(geometry, node_rows)
    match kind:
        case "csv":
            return {kind: csv_bytes(chosen, materials)}
        case "stl":
            return {kind: stl_bytes(chosen)}
        case "ply":
            return {kind: ply_bytes(chosen, materials)}
        case "obj":
            obj, mtl = obj_bytes(chosen, materials, f"{name}.mtl")
            return {"obj": obj, "mtl": mtl}
        case "glb":
            return {kind: glb_bytes(chosen, materials)}
    raise ValueError(f"no export of kind {kind!r}, only {', '.join(KINDS)}")

"""Triangle lists as OBJ with its MTL: an object per part, materials by name, corner normals.

The format is lines of text. Libraries that write it merge parts of one material, rename objects or stamp their name,
so the few lines are our own.
"""

from __future__ import annotations

from itertools import chain

import numpy as np

from ..contract import I32, Geometry, Material
from .caution import CAUTION
from .corners import unique_normals
from .numbers import number_text, row_texts

_NORMAL_DECIMALS = 6
_COLOUR_DECIMALS = 6
_FACE_FORM = "f %d//%d %d//%d %d//%d\n"
_FACES_AT_A_TIME = 65_536


def obj_bytes(geometry: Geometry, materials: tuple[Material, ...], mtl_name: str) -> tuple[bytes, bytes]:
    """The OBJ and the MTL, UTF-8; `mtl_name` is the file name under which the caller will keep the MTL.

    World millimetres, z up, exact; normals with six decimals. Objects come in the order of the nodes, `o` holding
    the part path, and within one the order of triangles is kept. The MTL holds the materials in use. Control
    characters in names become `_`, as a name ends with its line. Cost: about 5 s a million triangles.
    """
    normals, normal_of = _normals(geometry)
    references = np.stack([geometry.faces, normal_of], axis=-1).astype(np.int32) + 1
    parts: list[str] = []
    for node in geometry.nodes:
        first, end = node.face_range
        if first < end:
            parts.append(f"o {_name(node.path)}\nusemtl {_name(materials[node.material].name)}\n")
            parts.extend(_face_lines(references[first:end]))
    head = f"# {CAUTION}\n# unit mm, z up\nmtllib {_name(mtl_name)}\n"
    vertices = _lines("v ", row_texts(geometry.vertices, " "))
    obj = "".join([head, vertices, normals, *parts]).encode()
    return obj, _mtl_text(_used(geometry, materials)).encode()


def _normals(geometry: Geometry) -> tuple[str, I32]:
    """The `vn` lines, and the row (m,3) of each corner's normal in them."""
    every = geometry.corner_normals.reshape(-1, 3)
    rows = unique_normals(every)
    lines = _lines("vn ", row_texts(every[rows.first].astype(np.float64), " ", _NORMAL_DECIMALS))
    return lines, rows.of.reshape(-1, 3).astype(np.int32)


def _lines(word: str, texts: list[str]) -> str:
    return "".join(f"{word}{text}\n" for text in texts)


def _face_lines(references: I32) -> list[str]:
    """`f` lines of 1-based (k,3,2) vertex and normal rows."""
    starts = range(0, len(references), _FACES_AT_A_TIME)
    blocks = (references[start : start + _FACES_AT_A_TIME] for start in starts)
    return [_FACE_FORM * len(block) % tuple(block.reshape(-1).tolist()) for block in blocks]


def _used(geometry: Geometry, materials: tuple[Material, ...]) -> list[Material]:
    rows = {node.material for node in geometry.nodes if node.mesh >= 0}
    return [materials[row] for row in sorted(rows)]


def _mtl_text(materials: list[Material]) -> str:
    return "".join([f"# {CAUTION}\n", *chain.from_iterable(map(_material_lines, materials))])


def _material_lines(material: Material) -> list[str]:
    flat = " ".join(number_text(channel / 255, _COLOUR_DECIMALS) for channel in material.flat)
    lines = [f"newmtl {_name(material.name)}\n", f"Kd {flat}\n"]
    return [*lines, f"Ks {flat}\n", "illum 2\n"] if material.metal else [*lines, "Ks 0 0 0\n", "illum 1\n"]


def _name(text: str) -> str:
    return "".join(character if character.isprintable() else "_" for character in text)

"""The part tree as binary glTF 2.0 (ISO/IEC 12113): metres, y up, with hierarchy, names, instances and colours.

Vertices and placements are converted, rather than put under a turned and scaled root, so a reader finds the part
tree as it is and every length in metres. A mesh is stored once however many nodes place it; a mirrored placement is
a matrix with a negative determinant, for which glTF turns the winding over (section 3.7.4).

Own writer: the libraries at hand either rebuild the scene and stamp their version into it, or hold no more than the
JSON that is built here in a page, and would be one more package at run time.
"""

from __future__ import annotations

import struct
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from ..contract import F64, Geometry, Material, Mesh, Node
from .caution import CAUTION
from .corners import split_corners
from .numbers import JsonValue, json_text

_MAGIC, _VERSION, _JSON_CHUNK, _BIN_CHUNK = 0x46546C67, 2, 0x4E4F534A, 0x004E4942
_FLOAT, _USHORT, _UINT = 5126, 5123, 5125
_VERTEX_BUFFER, _INDEX_BUFFER = 34962, 34963
_USHORT_ROWS = 65_535  # 65 535 itself would restart the primitive
_TURN = np.array([[1.0, 0.0, 0.0], [0.0, 0.0, 1.0], [0.0, -1.0, 0.0]])
_METRES = 0.001
_MATRIX_DECIMALS = 12
_SIMILAR = 1e-9

_Array = NDArray[np.generic]
_Object = dict[str, JsonValue]


def glb_bytes(geometry: Geometry, materials: tuple[Material, ...]) -> bytes:
    """The whole geometry as one GLB; node names are part paths, in the order of the part tree.

    A placement that is neither turn, shift, mirror nor even scaling (glTF has no shear) is worked into a copy
    of the mesh. Matrices have 12 decimals, vertices are float32 in the part's own frame. Cost: 2 s a million
    triangles, counted once for each mesh.
    """
    store = _Store()
    frames = [_frame(node) for node in geometry.nodes]
    nodes: list[_Object] = []
    for node, frame in zip(geometry.nodes, frames, strict=True):
        entry: _Object = {"name": node.path}
        matrix = _matrix(frame, frames[node.parent] if node.parent >= 0 else None)
        if matrix is not None:
            entry["matrix"] = matrix
        if node.mesh >= 0 and len(geometry.meshes[node.mesh].faces):
            entry["mesh"] = store.mesh(node, geometry.meshes[node.mesh], _rest(node, frame))
        nodes.append(entry)
    for row, children in enumerate(_children(geometry.nodes)):
        if children:
            nodes[row]["children"] = children
    return _container(_document(geometry, materials, store, nodes), b"".join(store.chunks))


@dataclass(slots=True)
class _Store:
    """The meshes written so far and the buffer behind them."""

    chunks: list[bytes] = field(default_factory=list)
    length: int = 0
    views: list[_Object] = field(default_factory=list)
    accessors: list[_Object] = field(default_factory=list)
    meshes: list[_Object] = field(default_factory=list)
    materials: list[int] = field(default_factory=list)
    primitives: dict[tuple[int, bytes], _Object] = field(default_factory=dict)
    mesh_rows: dict[tuple[int, int, bytes], int] = field(default_factory=dict)

    def mesh(self, node: Node, mesh: Mesh, rest: F64 | None) -> int:
        """The row of the glTF mesh for a node: shared by nodes with equal mesh, material and rest."""
        rest_key = b"" if rest is None else rest.tobytes()
        key = (node.mesh, node.material, rest_key)
        if key not in self.mesh_rows:
            if (node.mesh, rest_key) not in self.primitives:
                self.primitives[node.mesh, rest_key] = self._primitive(mesh, rest)
            if node.material not in self.materials:
                self.materials.append(node.material)
            primitive = {**self.primitives[node.mesh, rest_key], "material": self.materials.index(node.material)}
            self.mesh_rows[key] = len(self.meshes)
            self.meshes.append({"name": node.path, "primitives": [primitive]})
        return self.mesh_rows[key]

    def _primitive(self, mesh: Mesh, rest: F64 | None) -> _Object:
        split = split_corners(mesh.faces, mesh.corner_normals)
        points = mesh.vertices[mesh.faces.reshape(-1)[split.first]]
        normals = mesh.corner_normals.reshape(-1, 3)[split.first].astype(np.float64)
        corners = split.of.reshape(-1, 3)
        if rest is not None:
            points, normals = points @ rest.T, _turned_normals(normals, rest)
            corners = corners[:, ::-1] if np.linalg.det(rest) < 0 else corners
        positions = (points @ _TURN.T * _METRES + 0.0).astype("<f4")
        attributes: _Object = {
            "POSITION": self._accessor(positions, _FLOAT, _VERTEX_BUFFER, with_bounds=True),
            "NORMAL": self._accessor((normals @ _TURN.T + 0.0).astype("<f4"), _FLOAT, _VERTEX_BUFFER),
        }
        component, dtype = (_USHORT, "<u2") if len(points) <= _USHORT_ROWS else (_UINT, "<u4")
        indices = self._accessor(corners.reshape(-1).astype(dtype), component, _INDEX_BUFFER)
        return {"attributes": attributes, "indices": indices, "mode": 4}

    def _accessor(self, array: _Array, component: int, target: int, with_bounds: bool = False) -> int:
        data = array.tobytes()
        self.views.append({"buffer": 0, "byteOffset": self.length, "byteLength": len(data), "target": target})
        padded = data + b"\0" * (-len(data) % 4)
        self.chunks.append(padded)
        self.length += len(padded)
        kind = "VEC3" if array.ndim == 2 else "SCALAR"
        entry: _Object = {
            "bufferView": len(self.views) - 1,
            "componentType": component,
            "count": len(array),
            "type": kind,
        }
        if with_bounds:
            entry |= {"min": array.min(axis=0).tolist(), "max": array.max(axis=0).tolist()}
        self.accessors.append(entry)
        return len(self.accessors) - 1


def _frame(node: Node) -> F64:
    """The world frame a node gets in the file: its placement, or only the shift of one that glTF cannot hold."""
    linear = node.placement[:3, :3]
    square = linear.T @ linear
    size = np.trace(square) / 3
    if size > 0 and np.abs(square - size * np.eye(3)).max() <= _SIMILAR * size:
        return node.placement
    frame = np.eye(4)
    frame[:3, 3] = node.placement[:3, 3]
    return frame


def _rest(node: Node, frame: F64) -> F64 | None:
    """The (3,3) part of a placement that its frame leaves out, to be worked into the mesh."""
    return None if frame is node.placement else node.placement[:3, :3]


def _turned_normals(normals: F64, linear: F64) -> F64:
    """Outward unit normals (n,3) of a surface mapped by `linear`: its cofactors, with the sign of its determinant."""
    cofactors = np.stack([np.cross(linear[(k + 1) % 3], linear[(k + 2) % 3]) for k in range(3)])
    turned: F64 = normals @ cofactors.T * np.sign(np.linalg.det(linear))
    lengths: F64 = np.linalg.norm(turned, axis=1, keepdims=True)
    return turned / lengths


def _matrix(frame: F64, parent: F64 | None) -> list[JsonValue] | None:
    """The node's matrix in its parent's frame, metres and y up, column by column; None for the identity."""
    linear, shift = frame[:3, :3], frame[:3, 3]
    if parent is not None:
        back = parent[:3, :3].T / (np.trace(parent[:3, :3].T @ parent[:3, :3]) / 3)  # a similarity's inverse
        linear, shift = back @ linear, back @ (shift - parent[:3, 3])
    local = np.eye(4)
    local[:3, :3] = _TURN @ linear @ _TURN.T
    local[:3, 3] = _TURN @ shift * _METRES
    local = np.round(local, _MATRIX_DECIMALS)
    return None if np.array_equal(local, np.eye(4)) else [*local.T.reshape(-1).tolist()]


def _children(nodes: tuple[Node, ...]) -> list[list[JsonValue]]:
    children: list[list[JsonValue]] = [[] for _ in nodes]
    for row, node in enumerate(nodes):
        if node.parent >= 0:
            children[node.parent].append(row)
    return children


def _document(geometry: Geometry, materials: tuple[Material, ...], store: _Store, nodes: list[_Object]) -> _Object:
    roots: list[JsonValue] = [row for row, node in enumerate(geometry.nodes) if node.parent < 0]
    document: _Object = {"asset": {"version": "2.0", "generator": f"platewright. {CAUTION}"}}
    if nodes:
        document |= {"scene": 0, "scenes": [{"nodes": roots}], "nodes": nodes}
    if store.meshes:
        document |= {
            "meshes": store.meshes,
            "materials": [_material(materials[row]) for row in store.materials],
            "accessors": store.accessors,
            "bufferViews": store.views,
            "buffers": [{"byteLength": store.length}],
        }
    return document


def _material(material: Material) -> _Object:
    base = material.normal_reflectance if material.metal else material.colour
    factors: list[JsonValue] = [min(max(channel, 0.0), 1.0) for channel in base]
    surface: _Object = {
        "baseColorFactor": [*factors, 1.0],
        "metallicFactor": 1.0 if material.metal else 0.0,
        "roughnessFactor": material.roughness,
    }
    return {"name": material.name, "pbrMetallicRoughness": surface}


def _container(document: _Object, binary: bytes) -> bytes:
    text = json_text(document).encode("ascii")
    text += b" " * (-len(text) % 4)
    chunks = [struct.pack("<II", len(text), _JSON_CHUNK), text]
    if binary:
        chunks += [struct.pack("<II", len(binary), _BIN_CHUNK), binary]
    length = 12 + sum(map(len, chunks))
    if length >= 1 << 32:
        raise ValueError("a GLB holds less than 4 GiB")
    return b"".join([struct.pack("<III", _MAGIC, _VERSION, length), *chunks])

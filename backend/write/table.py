"""Triangle lists as CSV (RFC 4180): one triangle a row, in the order of the geometry.

Python's csv module would print floats with `repr` and take minus zero as it comes. Only its quoting rule is needed,
and a shared vertex is spelled once, which makes a million triangles a matter of seconds.
"""

from __future__ import annotations

from ..contract import Geometry, Material
from .numbers import row_texts

COLUMNS = ("part", "material", "x1 mm", "y1 mm", "z1 mm", "x2 mm", "y2 mm", "z2 mm", "x3 mm", "y3 mm", "z3 mm")
_MUST_QUOTE = frozenset('",\r\n')
_FACES_AT_A_TIME = 65_536


def csv_bytes(geometry: Geometry, materials: tuple[Material, ...]) -> bytes:
    """UTF-8 text: a header row of `COLUMNS`, then a row a triangle: part path, material, three corners.

    Corners are world millimetres, exact, counter-clockwise seen from outside. Lines end in LF, which RFC 4180 readers
    take as well as CR LF. Cost: about 4 s a million triangles.
    """
    corners = row_texts(geometry.vertices, ",")
    heads = [
        f"{_field(node.path)},{_field(materials[node.material].name)}" if node.mesh >= 0 else ""
        for node in geometry.nodes
    ]
    blocks = [(",".join(COLUMNS) + "\n").encode()]
    for start in range(0, len(geometry.faces), _FACES_AT_A_TIME):
        block = slice(start, start + _FACES_AT_A_TIME)
        columns = zip(geometry.face_node[block].tolist(), *geometry.faces[block].T.tolist(), strict=True)
        lines = (f"{heads[node]},{corners[a]},{corners[b]},{corners[c]}\n" for node, a, b, c in columns)
        blocks.append("".join(lines).encode())
    return b"".join(blocks)


def _field(text: str) -> str:
    if _MUST_QUOTE.isdisjoint(text):
        return text
    return '"' + text.replace('"', '""') + '"'

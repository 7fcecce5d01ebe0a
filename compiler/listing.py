"""What a scene holds: parameters, parts with counts, sizes and volumes, figures, variants."""

from __future__ import annotations

import numpy as np
from msgspec import Struct
from platewright.backend.contract import Geometry
from platewright.lang import tree
from platewright.lang.problems import Problem

from .build import Model
from .expressions import evaluate
from .flatten import Flattened, Mesher, flatten
from .measure import volume
from .mistakes import Problems
from .readings import optional
from .scope import Failed, Formula, Record
from .values import Value, spell


class ParameterRow(Struct, frozen=True):
    """One parameter: its value in this variant, what it may be (`""` for anything), and its note."""

    name: str
    value: str
    allowed: str
    note: str


class PartRow(Struct, frozen=True):
    """One path, brackets left out: how many copies there are, and of one copy the box (mm) and volume (mm3)."""

    path: str
    copies: int
    size: tuple[float, float, float]
    volume: float
    is_assembly: bool


class Listing(Struct, frozen=True):
    """All of it, in the order of the text. Sizes and volumes are taken at the rung of facts."""

    parameters: tuple[ParameterRow, ...]
    parts: tuple[PartRow, ...]
    figures: tuple[str, ...]
    variants: tuple[str, ...]


def list_scene(model: Model, variants: tuple[str, ...], mesher: Mesher) -> tuple[Listing, tuple[Problem, ...]]:
    """List a model. Cost: every part meshed at the rung of facts, one flattening of everything."""
    problems = Problems()
    rows: list[PartRow] = []
    for root in model.roots:
        flattened, found = flatten(model.things[root], root, None, model.sources, mesher)
        problems.extend(found)
        if flattened is not None:
            rows += _parts(flattened)
    figures = tuple(model.modules[model.files.main].figures)
    return Listing(_parameters(model), tuple(rows), figures, variants), problems.all()


def _parameters(model: Model) -> tuple[ParameterRow, ...]:
    scope = model.scopes[model.files.main]
    rows = []
    for declaration in model.modules[model.files.main].names.values():
        if declaration.kind != "given":
            continue
        value = scope.find(declaration.name)
        head = declaration.line.head
        allowed = ""
        written, choices = optional(head, "range"), head.get("choices")
        if written is not None:
            allowed = spell(evaluate(written, scope))
        elif isinstance(choices, tuple):
            allowed = " or ".join(
                spell(evaluate(each, scope)) for each in choices if not isinstance(each, (tree.Setting, tree.Parameter))
            )
        rows.append(ParameterRow(declaration.name, _spelt(value), allowed, declaration.line.note))
    return tuple(rows)


def _spelt(value: Value | Formula | Record | Failed | None) -> str:
    return "" if value is None or isinstance(value, (Formula, Record, Failed)) else spell(value)


def _parts(flattened: Flattened) -> list[PartRow]:
    geometry = flattened.geometry
    paths: dict[tuple[str, int], list[int]] = {}
    for row, node in enumerate(geometry.nodes):
        paths.setdefault((unbracketed(node.path), node.mesh), []).append(row)
    below: dict[int, list[int]] = {row: [row] for row, node in enumerate(geometry.nodes) if node.mesh >= 0}
    for row in range(len(geometry.nodes) - 1, 0, -1):
        below.setdefault(geometry.nodes[row].parent, []).extend(below.get(row, []))
    of_mesh = [volume(mesh.vertices, mesh.faces) for mesh in geometry.meshes]
    volumes = [
        of_mesh[node.mesh] * abs(float(np.linalg.det(node.placement[:3, :3]))) if node.mesh >= 0 else 0.0
        for node in geometry.nodes
    ]
    rows = []
    for (path, mesh), copies in paths.items():
        solids = below.get(copies[0], [])
        size = _size(geometry, solids) if solids else (0.0, 0.0, 0.0)
        rows.append(PartRow(path, len(copies), size, sum(volumes[row] for row in solids), mesh < 0))
    return rows


def _size(geometry: Geometry, solids: list[int]) -> tuple[float, float, float]:
    """The sides of the box round some solids, mm."""
    ranges = [geometry.nodes[row].vertex_range for row in solids]
    x, y, z = (
        max(float(geometry.vertices[a:b, k].max()) for a, b in ranges)
        - min(float(geometry.vertices[a:b, k].min()) for a, b in ranges)
        for k in range(3)
    )
    return (x, y, z)


def unbracketed(path: str) -> str:
    """A path without what stands in brackets."""
    kept, depth = [], 0
    for letter in path:
        depth += letter == "["
        if not depth:
            kept.append(letter)
        depth -= letter == "]"
    return "".join(kept)

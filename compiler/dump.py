"""Plain-text dumps of each stage: the tree, the scene graph, the triangles."""

from __future__ import annotations

from collections.abc import Iterator

from platewright.backend.contract import EdgeKind, FaceOrigin
from platewright.lang import tree

from .build import Model
from .flatten import Flattened
from .graph import Entry, Solid, walk
from .values import spell_number


def dump_tree(scene: tree.Scene) -> str:
    """One line a node: depth by indentation, the word, its values, and where it stands."""
    return "".join(f"{line}\n" for each in scene.lines for line in _tree_line(each, 0))


def _tree_line(line: tree.Line, depth: int) -> Iterator[str]:
    indent = "    " * depth
    yield f"{indent}{_reading(line.head)}  @{line.span.line}:{line.span.column}"
    for clause in line.clauses:
        yield f"{indent}  + {_reading(clause)}"
    for below in line.lines:
        yield from _tree_line(below, depth + 1)


def _reading(reading: tree.Reading) -> str:
    values = " ".join(f"{slot}={_value(value)}" for slot, value in reading.values)
    return f"{reading.row} {values}".rstrip()


def _value(value: object) -> str:
    match value:
        case tree.Number():
            return f"{value.text}{value.unit}"
        case tree.Text():
            return '"' + "".join(part if isinstance(part, str) else f"{{{_value(part)}}}" for part in value.parts) + '"'
        case tree.Truth():
            return "yes" if value.value else "no"
        case tree.Path():
            return ".".join(f"{s.name}[{_value(s.index)}]" if s.index is not None else s.name for s in value.steps)
        case tree.Call():
            inside = [*map(_value, value.positional), *map(_value, value.named)]
            return f"{value.path.dotted}({', '.join(inside)})"
        case tree.Tuple():
            return f"({', '.join(map(_value, value.items))})"
        case tree.Unary():
            return f"({value.operator} {_value(value.operand)})"
        case tree.Binary():
            return f"({_value(value.left)} {value.operator} {_value(value.right)})"
        case tree.Choice():
            return f"({_value(value.then)} if {_value(value.condition)} else {_value(value.otherwise)})"
        case tree.Range():
            return f"({_value(value.low)} .. {_value(value.high)})"
        case tree.Ratio():
            return f"{value.first}:{value.second}"
        case tree.Date() | tree.Name() | tree.Word():
            return value.text
        case tree.Setting():
            return f"{value.name}={_value(value.value)}"
        case tree.Parameter():
            return value.name if value.default is None else f"{value.name}={_value(value.default)}"
        case tree.Reading():
            return f"<{_reading(value)}>"
        case tuple():
            return f"[{', '.join(map(_value, value))}]"
    raise AssertionError(f"no dump of {value!r}")


def dump_graph(model: Model) -> str:
    """One line a placed thing: its path, what it is, its material, and its placement's twelve numbers.

    Marks below it.
    """
    lines: list[str] = []
    for root in model.roots:
        for entry in walk(model.things[root], root):
            lines += _graph_lines(entry)
    return "".join(f"{line}\n" for line in lines)


def _graph_lines(entry: Entry) -> Iterator[str]:
    thing = entry.thing
    what = "assembly"
    if isinstance(thing, Solid):
        what = f"part of {thing.surface.name or 'plain white'}, {len(thing.recipe.steps)} steps"
    yield f"{entry.path}  {thing.name}, {what}"
    yield "    at " + "  ".join(" ".join(spell_number(value) for value in row) for row in entry.placement)
    for mark in thing.marks:
        axis = "" if mark.axis is None else " along " + " ".join(map(spell_number, mark.axis))
        yield f"    mark {mark.name} {' '.join(map(spell_number, mark.point))}{axis}"
    for feature in thing.features if isinstance(thing, Solid) else ():
        for number, copy in enumerate(feature.copies, 1):
            across = "" if copy.diameter is None else f" diameter {spell_number(copy.diameter)}"
            centre, axis = (" ".join(map(spell_number, each)) for each in (copy.centre, copy.axis))
            yield f"    feature {feature.name}[{number}] centre {centre} axis {axis}{across}"


def dump_triangles(flattened: Flattened) -> str:
    """One line a triangle: path, material, patch, where it comes from, source line, kinds of its three sides, and nine
    coordinates in mm that read back exactly."""
    geometry = flattened.geometry
    where = [f"{source.file}:{source.line}" for source in geometry.sources]
    heads = [f"{node.path} {_material(flattened, node.material)}" for node in geometry.nodes]
    columns = (geometry.face_node, geometry.face_patch, geometry.face_origin, geometry.face_source)
    places = (geometry.vertices[geometry.faces].reshape(-1, 9) + 0.0).tolist()
    rows = zip(*(column.tolist() for column in columns), geometry.edge_kind.tolist(), places, strict=True)
    lines = []
    for node, patch, origin, source, kinds, nine in rows:
        sides = ",".join([_SIDES[kind] for kind in kinds])
        made = where[source] if source >= 0 else "-"
        lines.append(f"{heads[node]} {patch} {_ORIGINS[origin]} {made} {sides} {' '.join(map(repr, nine))}\n")
    return "".join(lines)


_SIDES = {int(kind): kind.name.lower() for kind in EdgeKind}
_ORIGINS = {int(origin): origin.name.lower() for origin in FaceOrigin}


def _material(flattened: Flattened, row: int) -> str:
    return "" if row < 0 else flattened.materials[row].name or "plain"

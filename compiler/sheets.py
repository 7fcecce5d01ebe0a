"""Reliefs and sheets: from their words to shapes of a recipe."""

from __future__ import annotations

from platewright.lang import tree
from platewright.lang.units import LENGTH

from .expressions import evaluate
from .fields import read_field
from .mistakes import mistake
from .outlines import point2
from .placement import positive_length
from .readings import expression
from .records import Tables, table_of
from .scope import Scope
from .solids.recipe import Grid, ParametricSurface, Relief
from .tables import Table
from .values import Interval, Quantity, kind_of

SHEETS = ("relief", "surface")
"""Words of these shapes."""


def read_sheet(reading: tree.Reading, scope: Scope, tables: Tables, file: str) -> Relief | ParametricSurface:
    """The relief or sheet that a reading describes. Raises Mistake."""
    if reading.word == "surface":
        return _surface(reading, scope)
    if reading.get("table") is not None:
        return _over_table(reading, table_of(reading, tables, file))
    written = expression(reading, "size")
    wide, deep = point2(written, scope)
    if wide <= 0.0 or deep <= 0.0:
        raise mistake("out-of-range", written.span, f"a relief needs sides above 0, found {min(wide, deep):g} mm")
    ranges = {name: _lengths(-side / 2, side / 2) for name, side in (("x", wide), ("y", deep))}
    return Relief(read_field(expression(reading, "height"), ranges, scope, LENGTH, "height"), (wide, deep))


def _surface(reading: tree.Reading, scope: Scope) -> ParametricSurface:
    ranges = {name: _range(expression(reading, name), scope) for name in ("u", "v")}
    written = expression(reading, "point")
    if not isinstance(written, tree.Tuple) or len(written.items) != 3:
        raise mistake("wrong-form", written.span, "expected a point `(x, y, z)` written as a function of u and v")
    x, y, z = (read_field(item, ranges, scope, LENGTH, axis) for axis, item in zip("xyz", written.items, strict=True))
    thickness = positive_length(expression(reading, "thickness"), scope, "thickness")
    (u0, u1), (v0, v1) = ((each.low.value, each.high.value) for each in ranges.values())
    return ParametricSurface((x, y, z), (u0, u1), (v0, v1), thickness)


def _range(written: tree.Expression, scope: Scope) -> Interval:
    value = evaluate(written, scope)
    if not isinstance(value, Interval):
        raise mistake("wrong-kind", written.span, f"expected a range such as `0 .. 360 deg`, found {kind_of(value)}")
    if value.low.value == value.high.value:
        raise mistake("out-of-range", written.span, "this range is empty: it ends where it starts")
    return value


def _lengths(low: float, high: float) -> Interval:
    return Interval(Quantity(low, LENGTH), Quantity(high, LENGTH))


def _over_table(reading: tree.Reading, table: Table) -> Relief:
    """Heights at the corners of a rectangular grid, in any order: columns x, y and z. Raises Mistake."""
    missing = [name for name in ("x", "y", "z") if name not in table.columns]
    if missing:
        sentence = f"the table of a relief has columns `x`, `y` and `z`; it has no `{missing[0]}`"
        raise mistake("bad-table", table.header[0], sentence)
    rows: dict[tuple[float, float], float] = {}
    columns = [table.columns.index(name) for name in ("x", "y", "z")]
    for cells, spans in zip(table.rows, table.cell_spans, strict=True):
        found: list[float] = []
        for column in columns:
            value = cells[column]
            if not isinstance(value, Quantity) or value.dimension != LENGTH:
                what = "nothing" if value is None else kind_of(value)
                raise mistake("bad-table", spans[column], f"expected a length in this cell, found {what}")
            found.append(value.value)
        x, y, z = found
        if (x, y) in rows:
            raise mistake("bad-table", spans[0], f"two rows give the height at ({x:g} mm, {y:g} mm)")
        rows[x, y] = z
    xs, ys = sorted({x for x, _ in rows}), sorted({y for _, y in rows})
    if len(xs) < 2 or len(ys) < 2 or len(rows) != len(xs) * len(ys):
        sentence = f"the table gives {len(rows)} heights for {len(xs)} values of x and {len(ys)} of y"
        raise mistake("bad-table", reading.span, sentence, "give one for every pair of at least two of each")
    middle_x, middle_y = (xs[0] + xs[-1]) / 2, (ys[0] + ys[-1]) / 2
    heights = tuple(tuple(rows[x, y] for x in xs) for y in ys)
    grid = Grid(tuple(x - middle_x for x in xs), tuple(y - middle_y for y in ys), heights)
    return Relief(grid, (xs[-1] - xs[0], ys[-1] - ys[0]))

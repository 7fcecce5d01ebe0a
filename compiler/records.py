"""Rows of tables by name: what `for row over` and a derived row stand for."""

from __future__ import annotations

from collections.abc import Mapping

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Related
from platewright.lang.source import Span

from .expressions import evaluate
from .mistakes import Mistake, mistake
from .project import beside
from .readings import expression, name
from .scope import Record, Scope, did_you_mean
from .tables import Table
from .values import Value, spell

Tables = Mapping[str, Table]
_MOST_LISTED = 24


def table_of(clause: tree.Reading, tables: Tables, file: str) -> Table:
    """The table that a reading names. Raises Mistake, without a problem, where it could not be read."""
    written = clause.get("table")
    assert isinstance(written, tree.Text)
    target = beside(file, "".join(part for part in written.parts if isinstance(part, str)))
    table = tables.get(target) if target else None
    if table is None:
        raise Mistake(None)
    return table


def read_record(reading: tree.Reading, scope: Scope, tables: Tables, file: str, asked: Span | None) -> Record:
    """The row that a derived row names. Raises Mistake.

    `asked` is where the thing whose lines these are was asked for: a row that is not there is the fault of that line.
    """
    table = table_of(reading, tables, file)
    written = expression(reading, "label")
    value = evaluate(written, scope)
    label = value if isinstance(value, str) else spell(value)
    if label not in table.labels:
        base = table.file.rpartition("/")[2]
        known = ", ".join(table.labels[:_MOST_LISTED]) + (" …" if len(table.labels) > _MOST_LISTED else "")
        is_elsewhere = asked is not None and asked.file != file
        at = asked if asked is not None and is_elsewhere else written.span
        related = (Related(reading.span, "looked up here"),) if is_elsewhere else ()
        hint = did_you_mean(nearest(label, table.labels)) or f"it has {known}"
        raise mistake("unknown-name", at, f"`{base}` has no row `{label}`", hint, related)
    return Record(RowPaths(name(reading).text, table, table.labels.index(label)).cell)


class RowPaths(Struct, frozen=True):
    """`row.column` on a line with `for row over` a table, and wherever a derived row is in reach."""

    variable: str
    table: Table
    row: int

    def value(self, path: tree.Path) -> Value | None:
        """The cell, None for a path that does not begin with the variable. Raises Mistake."""
        return self.cell(path) if path.steps[0].name == self.variable else None

    def cell(self, path: tree.Path) -> Value:
        """The cell at a path that begins with the variable. Raises Mistake."""
        columns = self.table.columns
        if len(path.steps) != 2:
            listed = ", ".join(f"`{self.variable}.{column}`" for column in columns)
            sentence = f"`{self.variable}` is a row of the table"
            raise mistake("wrong-kind", path.span, sentence, f"its values are {listed}")
        column = path.steps[1].name
        if column not in columns:
            hint = f"it has {', '.join(f'`{each}`' for each in columns)}"
            raise mistake("unknown-name", path.steps[1].span, f"the table has no column `{column}`", hint)
        number = columns.index(column)
        value = self.table.rows[self.row][number]
        if value is None:
            related = (Related(self.table.cell_spans[self.row][number], "this cell"),)
            sentence = f"the cell `{column}` of row `{self.table.labels[self.row]}` is empty"
            raise mistake("bad-table", path.span, sentence, "fill it, or leave the row out", related)
        return value

    def call(self, call: tree.Call) -> Value | None:
        """None: a row has no measures."""
        return None

    def names(self) -> tuple[str, ...]:
        """The variable."""
        return (self.variable,)

"""Tables from CSV files: a header of names and units, then rows of values."""

from __future__ import annotations

import csv
import io
import re
from dataclasses import dataclass

from platewright.lang import units
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, Related
from platewright.lang.source import Span

from . import limits
from .mistakes import Problems, mistake
from .values import Quantity, Value


@dataclass(frozen=True, slots=True)
class Table:
    """Columns by name in order, and rows of values; None where a cell is empty. The first column names the row."""

    file: str
    columns: tuple[str, ...]
    rows: tuple[tuple[Value | None, ...], ...]
    labels: tuple[str, ...]
    row_spans: tuple[Span, ...]


_NUMBER = re.compile(r"-?\d{1,40}(\.\d{1,40})?(e[+-]?\d{1,3})?")


def read_table(file: str, text: str) -> tuple[Table | None, tuple[Problem, ...]]:
    """Read a CSV text (RFC 4180) whose header gives each column a name and, after a space, its unit: `length mm`.

    A column without unit holds numbers, yes and no, or texts. Cost: linear in the text.
    """
    problems = Problems()
    try:
        lines = _lines(text)
    except csv.Error as error:
        problems.error("bad-table", Span(file, 1, 1, 1, 1), f"this is no CSV table: {error}")
        return None, problems.all()
    if not lines:
        problems.error("bad-table", Span(file, 1, 1, 1, 1), "the table is empty; its first line names the columns")
        return None, problems.all()
    if len(lines) > limits.TABLE_ROWS:
        sentence = f"the table has more than {limits.TABLE_ROWS:,} rows, the limit"
        problems.error("too-much", Span(file, limits.TABLE_ROWS, 1, limits.TABLE_ROWS, 1), sentence)
        return None, problems.all()
    number, header = lines[0]
    columns = _header(file, number, header, problems)
    rows, labels, spans = [], [], []
    for number, cells in lines[1:]:
        span = Span(file, number, 1, number, 1 + sum(map(len, cells)) + len(cells) - 1)
        if len(cells) != len(columns):
            problems.error("bad-table", span, f"expected {len(columns)} values in this row, found {len(cells)}")
            continue
        row: list[Value | None] = []
        for (name, unit), cell in zip(columns, cells, strict=True):
            with problems.collecting():
                row.append(_cell(cell.strip(), name, unit, span))
        if len(row) == len(columns):
            rows.append(tuple(row))
            labels.append(cells[0].strip())
            spans.append(span)
    _unlike(labels, spans, problems)
    if problems.has_errors:
        return None, problems.all()
    return Table(file, tuple(name for name, _ in columns), tuple(rows), tuple(labels), tuple(spans)), problems.all()


def _lines(text: str) -> list[tuple[int, list[str]]]:
    reader = csv.reader(io.StringIO(text.removeprefix("\ufeff"), newline=""), strict=True)
    found: list[tuple[int, list[str]]] = []
    for cells in reader:
        if any(cell.strip() for cell in cells):
            found.append((reader.line_num, cells))
        if len(found) > limits.TABLE_ROWS:
            break
    return found


def _header(file: str, number: int, cells: list[str], problems: Problems) -> list[tuple[str, str]]:
    columns: list[tuple[str, str]] = []
    span = Span(file, number, 1, number, 1 + sum(map(len, cells)) + len(cells) - 1)
    for cell in cells:
        name, _, unit = cell.strip().partition(" ")
        unit = unit.strip()
        if not name.isidentifier() or not name.isascii():
            problems.error("bad-table", span, f"expected a column name in the header, found `{cell.strip()}`")
        if unit and unit not in units.UNITS:
            near = nearest(unit, list(units.UNITS))
            problems.error("unknown-unit", span, f"`{unit}` is no unit", f"did you mean `{near}`?" if near else "")
            unit = ""
        if name in [known for known, _ in columns]:
            problems.error("duplicate-name", span, f"two columns are called `{name}`")
        columns.append((name, unit))
    return columns


def _cell(cell: str, name: str, unit: str, span: Span) -> Value | None:
    if not cell:
        return None
    if _NUMBER.fullmatch(cell):
        value, dimension = units.quantity(cell, unit)
        return Quantity(value + 0.0, dimension, value == 0 and not unit)
    if unit:
        hint = "the header states the unit; the cell holds the number alone"
        raise mistake("bad-table", span, f"expected a number in column `{name}`, found `{cell}`", hint)
    if cell in ("yes", "no"):
        return cell == "yes"
    return cell


def _unlike(labels: list[str], spans: list[Span], problems: Problems) -> None:
    first: dict[str, Span] = {}
    for label, span in zip(labels, spans, strict=True):
        if label in first:
            related = (Related(first[label], "the first of them"),)
            problems.error("duplicate-name", span, f"two rows are called `{label}`", related=related)
        first.setdefault(label, span)

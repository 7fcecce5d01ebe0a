"""Tables from CSV files: a header of names and units, then rows of values."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterator, Sequence

from msgspec import Struct
from platewright.lang import units
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, Related
from platewright.lang.source import Span
from platewright.lang.units import LENGTH

from . import limits
from .expressions import literal
from .mistakes import Mistake, Problems, mistake
from .scope import did_you_mean
from .values import Quantity, Value, shortened


class Table(Struct, frozen=True):
    """Columns by name in order, and rows of values; None where a cell is empty.

    `labels` are the first cells as written, which name the rows; `cell_spans` has a span for each cell, `header` one
    for each column.
    """

    file: str
    columns: tuple[str, ...]
    rows: tuple[tuple[Value | None, ...], ...]
    labels: tuple[str, ...]
    header: tuple[Span, ...]
    cell_spans: tuple[tuple[Span, ...], ...]


class _Record(Struct, frozen=True):
    cells: list[str]
    spans: list[Span]


_NUMBER = re.compile(r"[+-]?\d{1,40}(\.\d{1,40})?([eE][+-]?\d{1,9})?")
_NUMBERS = {2: "two", 3: "three"}
_UNFIT = re.compile(r'[\[\]"]')


def read_table(file: str, text: str, is_labelled: bool = True) -> tuple[Table | None, tuple[Problem, ...]]:
    """Read a CSV text (RFC 4180) whose header gives each column a name and, after a space, its unit: `length mm`.

    A column without unit holds numbers throughout, or yes and no throughout, or else texts. The first column names the
    rows unless the table is not labelled. Cost: linear in the text.
    """
    problems = Problems()
    table: Table | None = None
    with problems.collecting():
        table = _table(file, _read(file, text), problems, is_labelled)
    return (None if problems.has_errors else table), problems.all()


def points_in(table: Table, axes: tuple[str, ...]) -> list[tuple[float, ...]]:
    """The points, mm, of a table with a column of lengths for each axis. Raises Mistake."""
    if len(table.columns) != len(axes):
        sentence = f"expected {_NUMBERS[len(axes)]} columns of lengths, found {len(table.columns)}"
        hint = f"such as `{','.join(f'{axis} mm' for axis in axes)}`"
        raise mistake("bad-table", table.header[0].to(table.header[-1]), sentence, hint)
    points = [
        tuple(_length(*cell) for cell in zip(row, spans, table.header, axes, strict=True))
        for row, spans in zip(table.rows, table.cell_spans, strict=True)
    ]
    if not points:
        raise mistake("bad-table", table.header[0], "the table has no points")
    return points


def _length(value: Value | None, span: Span, header: Span, axis: str) -> float:
    if value is None:
        raise mistake("bad-table", span, "this cell is empty, and a point needs all its lengths")
    if not isinstance(value, Quantity) or value.dimension != LENGTH:
        raise mistake("bad-table", header, "this column is no length", f"write the unit behind its name: `{axis} mm`")
    if abs(value.value) > limits.LARGEST_MM:
        raise mistake("out-of-range", span, f"this lies further than {limits.LARGEST_MM:g} mm, the limit")
    return value.value


def _table(file: str, records: tuple[_Record, ...], problems: Problems, is_labelled: bool) -> Table:
    """The table of a header and rows. Raises Mistake where the header is no header."""
    header, body = records[0], records[1:]
    columns = _header(header, problems)
    whole: list[_Record] = []
    for record in body:
        if len(record.cells) != len(columns):
            span = record.spans[0].to(record.spans[-1])
            sentence = f"expected {len(columns)} values in this row, found {len(record.cells)}"
            problems.error("bad-table", span, sentence)
        else:
            whole.append(record)
    values = [_column(name, unit, number, whole, problems) for number, (name, unit) in enumerate(columns)]
    if is_labelled:
        _label(whole, problems)
    names, labels = tuple(name for name, _ in columns), tuple(record.cells[0] for record in whole)
    spans = tuple(tuple(record.spans) for record in whole)
    return Table(file, names, tuple(zip(*values, strict=True)), labels, tuple(header.spans), spans)


def _read(file: str, text: str) -> tuple[_Record, ...]:
    records = tuple(_records(file, text))
    if not records:
        raise mistake("bad-table", Span(file, 1, 1, 1, 1), "the table is empty; its first line names the columns")
    return records


def _records(file: str, text: str) -> Iterator[_Record]:
    """Rows that hold anything, their cells stripped. Raises Mistake."""
    reader = csv.reader(io.StringIO(text.removeprefix("\ufeff"), newline=""), strict=True)
    lines = text.split("\n")
    before, n_rows = 0, 0
    while True:
        try:
            cells = next(reader, None)
        except csv.Error:
            at = Span(file, before + 1, 1, before + 1, 2)
            hint = "a value with commas or quotes in it stands in quotes, and a quote in it is doubled"
            raise mistake("bad-table", at, "the quotes of this row do not pair up", hint) from None
        if cells is None:
            return
        line, before = before + 1, reader.line_num
        if not any(cell.strip() for cell in cells):
            continue
        n_rows += 1
        if n_rows > limits.TABLE_ROWS + 1:
            sentence = f"the table has more than {limits.TABLE_ROWS:,} rows, the limit"
            raise mistake("too-much", Span(file, line, 1, line, 2), sentence)
        yield _Record([cell.strip() for cell in cells], _cell_spans(file, line, cells, '"' in lines[line - 1]))


def _cell_spans(file: str, line: int, cells: Sequence[str], is_quoted: bool) -> list[Span]:
    """Where each cell stands; in a row with quotes, its start has to do."""
    if is_quoted:
        return [Span(file, line, 1, line, 2)] * len(cells)
    spans, start = [], 1
    for cell in cells:
        indent = len(cell) - len(cell.lstrip()) if cell.strip() else 0
        end = start + max(1, len(cell.rstrip()))
        spans.append(Span(file, line, start + indent, line, end))
        start += len(cell) + 1
    return spans


def _header(header: _Record, problems: Problems) -> list[tuple[str, str]]:
    """Names and units of the columns, `""` where a column has none. Raises Mistake after reporting what is wrong."""
    before = problems.n_mistakes
    columns: list[tuple[str, str]] = []
    for cell, span in zip(header.cells, header.spans, strict=True):
        name, _, unit = (part.strip() for part in cell.partition(" "))
        if not name.isidentifier() or not name.isascii():
            sentence = f"expected the name of a column and perhaps a unit, found `{shortened(cell)}`"
            problems.error("bad-table", span, sentence, _header_hint(header.cells, cell))
        elif unit and unit not in units.UNITS:
            problems.error("unknown-unit", span, f"`{unit}` is no unit", did_you_mean(nearest(unit, units.UNITS)))
        if name and name in [known for known, _ in columns]:
            problems.error("duplicate-name", span, f"two columns are called `{name}`", "rename one")
        columns.append((name, unit))
    if problems.n_mistakes > before:
        raise Mistake(None)
    return columns


def _header_hint(cells: Sequence[str], cell: str) -> str:
    if len(cells) == 1 and (";" in cell or "\t" in cell):
        return "columns are separated by commas, and decimals are written with a point"
    return "write letters, digits and `_`, then a space and the unit: `length mm`"


def _column(name: str, unit: str, number: int, records: Sequence[_Record], problems: Problems) -> list[Value | None]:
    """The values of one column, None where a cell is empty."""
    cells = [record.cells[number] for record in records]
    filled = [cell for cell in cells if cell]
    if not unit and not all(map(_NUMBER.fullmatch, filled)):
        is_truths = all(cell in ("yes", "no") for cell in filled)
        return [None if not cell else (cell == "yes") if is_truths else cell for cell in cells]
    values: list[Value | None] = []
    for cell, record in zip(cells, records, strict=True):
        value: Value | None = None
        with problems.collecting():
            value = _number(cell, name, unit, record.spans[number]) if cell else None
        values.append(value)
    return values


def _number(cell: str, name: str, unit: str, span: Span) -> Value:
    if not _NUMBER.fullmatch(cell):
        hint = "the header states the unit; the cell holds the number alone, with a decimal point"
        raise mistake("bad-table", span, f"expected a number in column `{name}`, found `{shortened(cell)}`", hint)
    return literal(cell, unit, span)


def _label(records: Sequence[_Record], problems: Problems) -> None:
    """The first cell names its row: it is there, fits into brackets, and stands once."""
    first: dict[str, Span] = {}
    for record in records:
        label, span = record.cells[0], record.spans[0]
        if not label:
            hint = "the first column names the rows"
            problems.error("bad-table", span, "this row has no value in the first column", hint)
        elif _UNFIT.search(label) or not label.isprintable():
            sentence = "the first column names the rows, and a name has no brackets, quotes or line breaks"
            problems.error("bad-table", span, sentence)
        elif label in first:
            hint = "the first column names the rows; put a column of different names first"
            related = (Related(first[label], "the first of them"),)
            problems.error("duplicate-name", span, f"two rows are called `{shortened(label)}`", hint, related)
        first.setdefault(label, span)

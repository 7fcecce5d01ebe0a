"""The copies one line makes: the turns of its `for`, those its `when` lets through, and where each stands."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from platewright.lang import tree
from platewright.lang.problems import Related
from platewright.lang.units import NUMBER

from . import limits
from .expressions import count, truth
from .mistakes import Mistake, mistake
from .placement import Marks, place, repeat
from .project import beside
from .readings import expression, name
from .scope import Scope
from .solids.recipe import Affine
from .solids.transform import IDENTITY, compose
from .tables import Table
from .values import Quantity, Value

Tables = Mapping[str, Table]


@dataclass(frozen=True, slots=True)
class Turn:
    """One turn of a line's `for`: the scope in which the line is read, and the name of the copy (`""` for a count)."""

    label: str
    scope: Scope


def turns(line: tree.Line, scope: Scope, tables: Tables, file: str) -> list[Turn]:
    """One scope for each turn of the line's `for` clauses that its `when` lets through. Raises Mistake.

    A line with one `for` names its copies by the turn, or by the table's first column; with more they are counted.
    """
    found = [Turn("", scope)]
    clauses = [clause for clause in line.clauses if clause.word == "for"]
    for clause in clauses:
        found = [inner for outer in found for inner in _turns(clause, outer.scope, tables, file, len(found))]
    if len(clauses) > 1:
        found = [Turn("", turn.scope) for turn in found]
    conditions = [expression(clause, "condition") for clause in line.clauses if clause.word == "when"]
    return [turn for turn in found if _holds(conditions, turn.scope)]


def _holds(conditions: list[tree.Expression], scope: Scope) -> bool:
    return all(truth(condition, scope) for condition in conditions)


def placements(line: tree.Line, scope: Scope, around: Marks, own: Marks) -> tuple[Affine, ...]:
    """Where a line's copies stand in one turn: placed about the thing's own axes, repeated about those around it.

    Raises Mistake.
    """
    base = place(line.clauses, scope, own)
    copies = repeat(line.clauses, scope, around)
    scope.budget.copy(1, line.span)
    return copies if base is IDENTITY else tuple([compose(each, base) for each in copies])


def repeats(line: tree.Line) -> bool:
    """Whether a line may make several copies, so that their paths have brackets."""
    return any(clause.word in ("ring", "row", "for") for clause in line.clauses)


def labels(line: tree.Line, label: str, n_placements: int, n_before: int) -> list[str]:
    """What stands in brackets behind the copies of one turn: its label where it makes one copy, else a count."""
    if not repeats(line):
        return [""] * n_placements
    if label and n_placements == 1:
        return [label]
    return [str(n_before + k + 1) for k in range(n_placements)]


def _turns(clause: tree.Reading, scope: Scope, tables: Tables, file: str, n_outer: int) -> Iterator[Turn]:
    written = name(clause, "variable")
    variable = written.text
    if scope.find(variable) is not None or (scope.paths is not None and variable in scope.paths.names()):
        sentence = f"`{variable}` is declared outside already; inside it would mean something else"
        raise mistake("duplicate-name", written.span, sentence, "rename it")
    if clause.get("table") is not None:
        table = _table(clause, tables, file)
        _affordable(len(table.rows), n_outer, clause)
        for row, label in enumerate(table.labels):
            yield Turn(label, scope.inside({}, RowPaths(variable, table, row)))
        return
    first = count(expression(clause, "first"), scope, least=-limits.COPIES)
    last = count(expression(clause, "last"), scope, least=-limits.COPIES)
    if last < first:
        sentence = f"`for` counts upward, and {last} comes before {first}"
        raise mistake("out-of-range", expression(clause, "last").span, sentence, "add a `when` to leave the line out")
    _affordable(last - first + 1, n_outer, clause)
    for number in range(first, last + 1):
        inner = scope.inside({variable: Quantity(float(number), NUMBER)})
        yield Turn(str(number - first + 1), inner)


def _affordable(n_turns: int, n_outer: int, clause: tree.Reading) -> None:
    if n_turns * n_outer > limits.COPIES:
        sentence = f"{n_turns * n_outer:,} copies are more than {limits.COPIES:,}, the limit"
        raise mistake("too-much", clause.span, sentence)


def _table(clause: tree.Reading, tables: Tables, file: str) -> Table:
    written = clause.get("table")
    assert isinstance(written, tree.Text)
    target = beside(file, "".join(part for part in written.parts if isinstance(part, str)))
    table = tables.get(target) if target else None
    if table is None:
        raise Mistake(None)
    return table


@dataclass(frozen=True, slots=True)
class RowPaths:
    """`row.column` on a line with `for row over` a table."""

    variable: str
    table: Table
    row: int

    def value(self, path: tree.Path) -> Value | None:
        """The cell, None for a path that does not begin with the variable. Raises Mistake."""
        if path.steps[0].name != self.variable:
            return None
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

"""The copies one line makes: the turns of its `for`, those its `when` lets through, and where each stands."""

from __future__ import annotations

from collections.abc import Iterator

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.units import NUMBER

from . import limits
from .expressions import count, truth
from .mistakes import mistake
from .placement import Marks, place, repeat
from .readings import expression, name
from .records import RowPaths, Tables, table_of
from .scope import Scope
from .solids.recipe import Affine
from .solids.transform import IDENTITY, compose
from .values import Quantity


class Turn(Struct, frozen=True):
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
        table = table_of(clause, tables, file)
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

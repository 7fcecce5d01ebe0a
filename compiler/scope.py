"""Scopes: what names stand for while expressions are evaluated, and the budget of one evaluation."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Protocol, TypeAlias

from msgspec import Struct, field
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.source import Span

from . import limits
from .functions import FUNCTIONS
from .mistakes import Mistake, mistake
from .values import Quantity, Value


class Formula(Struct, frozen=True):
    """A function an author has defined: its parameters and body, and the scope it sees."""

    name: str
    parameters: tuple[str, ...]
    body: tree.Expression
    scope: Scope


class Record(Struct, frozen=True):
    """A row of a table that a name stands for: `cell` gives the value at a path that starts with the name.

    It may raise Mistake.
    """

    cell: Callable[[tree.Path], Value]


class Failed:
    """Stands for a name whose value has been reported as wrong already."""


Named: TypeAlias = "Value | Formula | Record | Failed"


class Paths(Protocol):
    """Values that stand behind a path of several names: marks, features, measures."""

    def value(self, path: tree.Path) -> Value | None:
        """The value at the path; None if its first name means nothing here. Raises Mistake."""

    def call(self, call: tree.Call) -> Value | None:
        """The value of a measure; None if there is none of that name. Raises Mistake."""

    def names(self) -> tuple[str, ...]:
        """The names a path may start with."""


class Budget(Struct):
    """What one evaluation may still compute and place, and the literals it has read."""

    steps: int = limits.STEPS
    copies: int = limits.ALL_COPIES
    is_used_up: bool = False
    literals: dict[tuple[str, str], Quantity] = field(default_factory=dict)

    def step(self, span: Span) -> None:
        """Take one value off the budget. Raises Mistake where it is used up."""
        self.steps -= 1
        if self.steps < 0:
            self._used_up(span, f"this scene computes more than {limits.STEPS:,} values, the limit")

    def copy(self, number: int, span: Span) -> None:
        """Take copies off the budget. Raises Mistake where it is used up."""
        self.copies -= number
        if self.copies < 0:
            self._used_up(span, f"this scene makes more than {limits.ALL_COPIES:,} copies, the limit")

    def _used_up(self, span: Span, sentence: str) -> None:
        """Raise Mistake, the first time with the problem."""
        was_used_up, self.is_used_up = self.is_used_up, True
        raise Mistake(None) if was_used_up else mistake("too-much", span, sentence)


class Scope(Struct, frozen=True):
    """Names and what they stand for, inside an enclosing scope. `prefixes` leads to the scopes of files seen."""

    names: Mapping[str, Named]
    outer: Scope | None = None
    prefixes: Mapping[str, Scope] = field(default_factory=dict)
    paths: Paths | None = None
    budget: Budget = field(default_factory=Budget)

    def inside(self, names: Mapping[str, Named], paths: Paths | None = None) -> Scope:
        """A scope within this one."""
        return Scope(names, self, {}, paths, self.budget)

    def find(self, name: str) -> Named | None:
        """What a name stands for, here or outside."""
        scope: Scope | None = self
        while scope is not None:
            if name in scope.names:
                return scope.names[name]
            scope = scope.outer
        return None

    def prefix(self, name: str) -> Scope | None:
        """The scope of a file seen under that prefix."""
        scope: Scope | None = self
        while scope is not None:
            if name in scope.prefixes:
                return scope.prefixes[name]
            scope = scope.outer
        return None

    def path_value(self, path: tree.Path) -> Value | None:
        """What stands behind a path in the nearest scope that has paths and knows its first name. Raises Mistake."""
        scope: Scope | None = self
        while scope is not None:
            found = scope.paths.value(path) if scope.paths is not None else None
            if found is not None:
                return found
            scope = scope.outer
        return None

    def measured(self, call: tree.Call) -> Value | None:
        """The value of a measure in the nearest scope that has one of that name. Raises Mistake."""
        scope: Scope | None = self
        while scope is not None:
            found = scope.paths.call(call) if scope.paths is not None else None
            if found is not None:
                return found
            scope = scope.outer
        return None

    def known(self) -> list[str]:
        """All names in reach, nearest scope first."""
        found: list[str] = []
        scope: Scope | None = self
        while scope is not None:
            found += [*scope.names, *scope.prefixes, *(scope.paths.names() if scope.paths else ())]
            scope = scope.outer
        return found


def unknown_name(name: str, span: Span, scope: Scope) -> Mistake:
    """The mistake of using a name that nothing declares, with the nearest name in reach."""
    near = nearest(name, [*scope.known(), *FUNCTIONS])
    return mistake("unknown-name", span, f"nothing here is called `{name}`", did_you_mean(near))


def did_you_mean(near: str) -> str:
    """The hint that names the nearest known word; empty if none is near."""
    return f"did you mean `{near}`?" if near else ""

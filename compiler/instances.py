"""Parts, assemblies, outlines and materials with their parameters fixed, each made once for each set of values."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import TypeVar

from msgspec import Struct, field
from platewright.backend.lettering.type import Lettering
from platewright.lang import tree
from platewright.lang.problems import Related
from platewright.lang.source import Span

from . import limits
from .assemblies import make_assembly
from .curves import read_path
from .graph import Thing
from .materials import Surface, read_material
from .mistakes import Mistake, Problems, mistake
from .modules import THINGS, Declaration, Module, Modules, find_kind
from .outlines import Around, read_outline
from .parameters import arguments, local_scope
from .parts import make_part
from .records import table_of
from .scope import Scope
from .solids.recipe import Outline, SpacePath
from .tables import Table

_Key = tuple[str, str, object]
_Made = TypeVar("_Made")


class Instances(Struct):
    """Makes things on demand and keeps them for one evaluation; problems are collected on the way.

    `placed` are the things that another holds, by file and name; `sources` the lines that recipes refer to by row.
    """

    modules: Modules
    tables: Mapping[str, Table]
    scopes: Mapping[str, Scope]
    problems: Problems
    placed: set[tuple[str, str]] = field(default_factory=set)
    sources: list[Span] = field(default_factory=list)
    lettering: Lettering = field(default_factory=Lettering)
    _source_rows: dict[Span, int] = field(default_factory=dict)
    _things: dict[_Key, Thing | None] = field(default_factory=dict)
    _outlines: dict[_Key, Outline | None] = field(default_factory=dict)
    _paths: dict[_Key, SpacePath | None] = field(default_factory=dict)
    _surfaces: dict[tuple[str, str], Surface] = field(default_factory=dict)
    _under_way: list[Declaration] = field(default_factory=list)

    def surface(self, module: Module, declaration: Declaration) -> Surface:
        """The surface of a material."""
        key = (module.file, declaration.name)
        if key not in self._surfaces:
            self._surfaces[key] = read_material(
                declaration.line,
                self.scopes[module.file],
                lambda reading: table_of(reading, self.tables, module.file),
                self.problems,
            )
        return self._surfaces[key]

    def resolve(self, module: Module, written: tree.Path | tree.Call, scope: Scope) -> Thing:
        """The part or assembly that a path or call names. Raises Mistake."""
        here, declaration = find_kind(self.modules, module, path_of(written), THINGS)
        return self.thing(here, declaration, call_of(written), scope, written.span)

    def thing(
        self, module: Module, declaration: Declaration, call: tree.Call | None, scope: Scope, span: Span
    ) -> Thing:
        """A part or assembly with its parameters. Raises Mistake."""
        if declaration in self._under_way:
            start = self._under_way.index(declaration)
            circle = " holds ".join(f"`{each.name}`" for each in (*self._under_way[start:], declaration))
            related = (Related(declaration.span, "declared here"),)
            raise mistake("recursion", span, f"a thing cannot hold itself: {circle}", "", related)
        if len(self._under_way) >= limits.NESTING:
            raise mistake("too-deep", span, f"things hold each other more than {limits.NESTING} deep, the limit")

        def make(inner: Scope) -> Thing:
            self._under_way.append(declaration)
            try:
                local = local_scope(declaration.line.lines, inner, self.problems, self.tables, module.file, span)
                if declaration.kind == "part":
                    return make_part(self, module, declaration, local)
                return make_assembly(self, module, declaration, local)
            finally:
                self._under_way.pop()

        return self._once(self._things, module, declaration, call, scope, span, make)

    def outline(self, module: Module, written: tree.Path | tree.Call, scope: Scope) -> Outline:
        """The outline that a path or call names, with its parameters. Raises Mistake."""
        here, declaration = find_kind(self.modules, module, path_of(written), ("outline",))
        return self.declared_outline(here, declaration, call_of(written), scope, written.span)

    def declared_outline(
        self, module: Module, declaration: Declaration, call: tree.Call | None, scope: Scope, span: Span
    ) -> Outline:
        """An outline with its parameters. Raises Mistake."""
        if declaration.is_faulty:
            raise Mistake(None)

        if declaration in self._under_way:
            raise mistake("recursion", span, f"the outline `{declaration.name}` cannot be parallel to itself")
        around = Around(
            lambda reading: table_of(reading, self.tables, module.file),
            lambda other, inner: self.outline(module, other, inner),
        )

        def make(inner: Scope) -> Outline:
            self._under_way.append(declaration)
            try:
                lines = declaration.line.lines
                local = local_scope(lines, inner, self.problems, self.tables, module.file, span)
                return read_outline(declaration.line, local, around)
            finally:
                self._under_way.pop()

        return self._once(self._outlines, module, declaration, call, scope, span, make)

    def path(self, module: Module, written: tree.Path | tree.Call, scope: Scope) -> SpacePath:
        """The path that a path or call names, with its parameters. Raises Mistake."""
        here, declaration = find_kind(self.modules, module, path_of(written), ("path",))
        return self.declared_path(here, declaration, call_of(written), scope, written.span)

    def declared_path(
        self, module: Module, declaration: Declaration, call: tree.Call | None, scope: Scope, span: Span
    ) -> SpacePath:
        """A path with its parameters. Raises Mistake."""
        if declaration.is_faulty:
            raise Mistake(None)

        def make(inner: Scope) -> SpacePath:
            local = local_scope(declaration.line.lines, inner, self.problems, self.tables, module.file, span)
            return read_path(declaration.line, local, lambda reading: table_of(reading, self.tables, module.file))

        return self._once(self._paths, module, declaration, call, scope, span, make)

    def _once(
        self,
        made: dict[_Key, _Made | None],
        module: Module,
        declaration: Declaration,
        call: tree.Call | None,
        scope: Scope,
        span: Span,
        make: Callable[[Scope], _Made],
    ) -> _Made:
        """What `make` gives for this set of values. Raises Mistake, once with a problem and then without."""
        home = self.scopes[module.file]
        named = arguments(declaration, call, scope, home, span)
        key = (module.file, declaration.name, tuple(named.items()))
        if key not in made:
            made[key] = None
            before = self.problems.n_mistakes
            with self.problems.collecting():
                found = make(home.inside(named) if named else home)
                if self.problems.n_mistakes == before and not declaration.is_faulty:
                    made[key] = found
        kept = made[key]
        if kept is None:
            raise Mistake(None)
        return kept

    def note_placed(self, module: Module, written: tree.Path | tree.Call) -> None:
        """Remember that something holds the thing named, so that it is no root. Raises Mistake."""
        here, declaration = find_kind(self.modules, module, path_of(written), THINGS)
        self.placed.add((here.file, declaration.name))

    def source(self, span: Span) -> int:
        """The row of a line in the table of sources."""
        if span not in self._source_rows:
            self._source_rows[span] = len(self.sources)
            self.sources.append(span)
        return self._source_rows[span]


def path_of(written: tree.Path | tree.Call) -> tree.Path:
    """The path of a thing named with or without values for its parameters."""
    return written.path if isinstance(written, tree.Call) else written


def call_of(written: tree.Path | tree.Call) -> tree.Call | None:
    """The call, where a thing is named with values for its parameters."""
    return written if isinstance(written, tree.Call) else None

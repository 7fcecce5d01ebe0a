"""One variant of a scene, evaluated: its values, its parts and assemblies, its viewpoints and lightings."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from functools import partial
from typing import Generic, TypeVar

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.problems import Problem
from platewright.lang.source import Span

from .graph import Thing
from .instances import Instances
from .lightings import Sources, read_lighting
from .mistakes import Problems
from .modules import THINGS, Declaration, Module, Modules
from .parameters import Setting, module_scope, outermost
from .project import Files
from .projections import Viewpoint
from .readings import parameters
from .records import Tables, table_of
from .scope import Scope
from .viewpoints import read_viewpoint

_Read = TypeVar("_Read")


class Described(Struct, Generic[_Read], frozen=True):
    """What a viewpoint or lighting says, None where its problems forbid its use."""

    value: _Read | None
    problems: tuple[Problem, ...]


class Model(Struct, frozen=True, eq=False):
    """One variant of a scene, evaluated.

    `things` are the parts and assemblies of the main file that have all parameters, `roots` the names of those that
    nothing else places. `viewpoints` and `lightings` stand by file and name, with problems that are not yet reported:
    they concern the figures that use them. `is_whole` says that nothing has been reported but in figures. `sources` are
    the lines that recipes refer to by row.
    `instantiate` gives the thing that a path or call of the main file names, raises Mistake, and adds what is wrong in
    its lines; it may add to `sources`.
    """

    files: Files
    modules: Modules
    scopes: Mapping[str, Scope]
    things: Mapping[str, Thing]
    roots: tuple[str, ...]
    viewpoints: Mapping[tuple[str, str], Described[Viewpoint]]
    lightings: Mapping[tuple[str, str], Described[Sources]]
    is_whole: bool
    sources: Sequence[Span]
    instantiate: Callable[[tree.Path | tree.Call, Problems], Thing]

    @property
    def module(self) -> Module:
        """The names of the main file."""
        return self.modules[self.files.main]

    @property
    def scope(self) -> Scope:
        """The values of the main file."""
        return self.scopes[self.files.main]


def build_model(files: Files, modules: Modules, settings: tuple[Setting, ...]) -> tuple[Model, tuple[Problem, ...]]:
    """Evaluate all that a scene declares and that has all its parameters, used or not.

    Cost: linear in the lines and the copies they make.
    """
    problems = Problems()
    scopes = _scopes(files.main, modules, settings, problems, files.tables)
    instances = Instances(modules, files.tables, scopes, problems)
    things: dict[str, Thing] = {}
    viewpoints: dict[tuple[str, str], Described[Viewpoint]] = {}
    lightings: dict[tuple[str, str], Described[Sources]] = {}
    for module in modules.values():
        scope = scopes[module.file]
        for declaration in module.names.values():
            key = (module.file, declaration.name)
            if declaration.kind == "material":
                instances.surface(module, declaration)
            elif declaration.kind == "viewpoint":
                viewpoints[key] = _described(read_viewpoint, declaration, scope)
            elif declaration.kind == "lighting":
                read = partial(_lighting, files.tables, module.file)
                lightings[key] = _described(read, declaration, scope)
            elif _has_defaults(declaration):
                with problems.collecting():
                    if declaration.kind == "outline":
                        instances.declared_outline(module, declaration, None, scope, declaration.span)
                    elif declaration.kind == "path":
                        instances.declared_path(module, declaration, None, scope, declaration.span)
                    elif declaration.kind in THINGS:
                        thing = instances.thing(module, declaration, None, scope, declaration.span)
                        if module.file == files.main:
                            things[declaration.name] = thing
    roots = tuple(each for each in things if (files.main, each) not in instances.placed)

    def instantiate(written: tree.Path | tree.Call, found: Problems) -> Thing:
        before = len(problems.all())
        try:
            return instances.resolve(modules[files.main], written, scopes[files.main])
        finally:
            found.extend(problems.all()[before:])

    is_whole = not problems.n_mistakes and files.is_readable
    sources = instances.sources
    model = Model(files, modules, scopes, things, roots, viewpoints, lightings, is_whole, sources, instantiate)
    return model, problems.all()


def _lighting(tables: Tables, file: str, line: tree.Line, scope: Scope, problems: Problems) -> Sources:
    return read_lighting(line, scope, lambda reading: table_of(reading, tables, file), problems)


def _described(
    read: Callable[[tree.Line, Scope, Problems], _Read | None], declaration: Declaration, scope: Scope
) -> Described[_Read]:
    """What a declaration says. That it says too little is no problem where a line of it could not be read."""
    own = Problems()
    found = read(declaration.line, scope, own)
    problems = own.all()
    if declaration.is_faulty:
        problems = tuple(each for each in problems if each.code not in ("no-projection", "no-light"))
    return Described(None if own.n_mistakes or declaration.is_faulty else found, problems)


def _has_defaults(declaration: Declaration) -> bool:
    return all(parameter.default is not None for parameter in parameters(declaration.line))


def _scopes(
    main: str, modules: Modules, settings: tuple[Setting, ...], problems: Problems, tables: Tables
) -> dict[str, Scope]:
    """The values of every file; settings are those of the main one."""
    scopes: dict[str, Scope] = {}
    outer = outermost()
    for file in _seen_first(main, modules):
        module = modules[file]
        prefixes = {name: scopes[seen] for name, seen in module.prefixes.items() if seen in scopes}
        scopes[file] = module_scope(module, prefixes, settings if file == main else (), problems, outer, tables)
    return scopes


def _seen_first(main: str, modules: Modules) -> list[str]:
    """Files so that each stands after those it sees; the loader has reported circles."""
    sequence: list[str] = []
    entered: set[str] = set()
    pending: list[tuple[str, bool]] = [(main, False)]
    while pending:
        file, is_done = pending.pop()
        if is_done:
            sequence.append(file)
        elif file not in entered and file in modules:
            entered.add(file)
            pending.append((file, True))
            pending.extend((seen, False) for seen in reversed(tuple(modules[file].prefixes.values())))
    return sequence

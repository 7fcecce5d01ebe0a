"""What can be said of names before anything is evaluated: used where nothing declares them, hidden, never used."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TypeAlias

from platewright.lang import tree
from platewright.lang.meant import shape_hint
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, Related

from .functions import CONSTANTS, FUNCTIONS
from .mistakes import Problems
from .modules import THINGS, Declaration, Module, Modules, declare, names_in
from .placement import AXES
from .readings import LATER, parameters
from .readings import name as declared_name
from .scope import did_you_mean
from .threads import is_designation

Users: TypeAlias = Mapping[str, Mapping[str, None]]

VARIABLES = {"relief": {"x", "y"}, "surface": {"u", "v"}}
"""Names that a shape's words bring with them."""

BODIES = ("derived", "outline", "path", *THINGS)
"""Declarations whose lines are evaluated only where they are used with values for their parameters."""


def check_names(modules: Modules, main: str) -> tuple[Problem, ...]:
    """Problems of names in all files, and warnings for parameters and parts that the main file never uses.

    Cost: linear in the texts.
    """
    problems = Problems()
    for module in modules.values():
        for declaration in module.names.values():
            inner = _inner_names(declaration, module, problems)
            if declaration.kind in BODIES:
                _unknown_names(declaration, module, inner, problems)
    # A name that nothing declares may be meant for one that then looks unused.
    if not modules[main].has_faults and not problems.has_errors:
        _unused(modules[main], _users(modules)[main], problems)
    return problems.all()


def _inner_names(declaration: Declaration, module: Module, problems: Problems) -> dict[str, Declaration]:
    """The parameters and derived values of a declaration. No name is declared twice in nested scopes."""
    inner: dict[str, Declaration] = {}
    own = [Declaration("given", each.name, each.span, declaration.line) for each in parameters(declaration.line)]
    if declaration.kind not in ("given", "derived"):
        for line in declaration.line.lines:
            if line.word == "derived":
                names = ((declared_name(below.head), below) for below in line.lines)
                own += [Declaration("derived", name.text, name.span, below) for name, below in names]
    for each in own:
        outer = module.names.get(each.name)
        if outer is not None:
            related = (Related(outer.span, "declared here first"),)
            sentence = f"`{each.name}` is declared outside already; inside it would mean something else"
            problems.error("duplicate-name", each.span, sentence, "rename one", related)
            inner.setdefault(each.name, each)
        else:
            declare(each, inner, problems)
    return inner


def _unknown_names(
    declaration: Declaration, module: Module, inner: Mapping[str, Declaration], problems: Problems
) -> None:
    """Report first names that nothing declares, in lines that may never be evaluated."""
    known = {*module.names, *module.broken, *inner, *CONSTANTS, *FUNCTIONS}
    if declaration.kind == "derived":
        _report_unknown(declaration.line.head, known, problems)
        return
    known.update(AXES, _mark_names(declaration.line))
    if declaration.line.head.get("parameters") is not None:
        _report_unknown(declaration.line.head, known, problems)
    for line in declaration.line.lines:
        _unknown_in_line(line, known, problems)


def _mark_names(line: tree.Line) -> Iterator[str]:
    return (declared_name(below.head).text for below in line.lines if below.word == "mark")


def _unknown_in_line(line: tree.Line, known: set[str], problems: Problems) -> None:
    variables = {declared_name(clause, "variable").text for clause in line.clauses if clause.word == "for"}
    if line.word == "derived":
        for below in line.lines:
            variables |= {each.name for each in parameters(below)}
    reach = known | variables if variables else known
    for reading in (line.head, *line.clauses):
        if reading.row not in LATER:
            _report_unknown(reading, reach, problems)
    for below in line.lines:
        _unknown_in_line(below, reach, problems)


def _report_unknown(reading: tree.Reading, known: set[str], problems: Problems) -> None:
    shape = reading.get("shape")
    if isinstance(shape, tree.Reading) and shape.row in LATER:
        return
    # A thing is turned about an axis of its own, whose name its own lines declare.
    values = tuple(value for slot, value in reading.values if (reading.row, slot) != ("turn", "axis"))
    is_thread = isinstance(shape, tree.Reading) and shape.row == "thread"
    if isinstance(shape, tree.Reading) and shape.row in VARIABLES:
        known = known | VARIABLES[shape.row]
    named = _named_part(shape)
    for path in names_in(values, into_brackets=False):
        first = path.steps[0]
        if first.name not in known and not (is_thread and is_designation(path)):
            sentence = f"nothing here is called `{first.name}`"
            if path is named:
                hint = shape_hint(first.name, known.difference(FUNCTIONS, CONSTANTS, AXES))
            else:
                hint = did_you_mean(nearest(first.name, known))
            problems.error("unknown-name", first.span, sentence, hint)


def _named_part(shape: tree.Value | None) -> tree.Path | None:
    """The plain name that stands as a part where a shape's word might: a shape with a slip in it is read so."""
    if not isinstance(shape, tree.Reading) or shape.row != "solid":
        return None
    written = shape.get("part")
    path = written.path if isinstance(written, tree.Call) else written
    return path if isinstance(path, tree.Path) and len(path.steps) == 1 else None


def _users(modules: Modules) -> dict[str, dict[str, dict[str, None]]]:
    """For each file, the names used anywhere and the names of the declarations that use them."""
    users: dict[str, dict[str, dict[str, None]]] = {file: {} for file in modules}

    known: dict[tuple[str, str], str] = {}

    def meant(module: Module, name: str) -> str:
        if (module.file, name) not in known:
            known[module.file, name] = nearest(name, module.names)
        return known[module.file, name]

    def note(module: Module, path: tree.Path, user: str) -> None:
        here = module
        for step in path.steps:
            # A name that nothing declares may be meant for the one nearest to it, which is then not unused.
            name = step.name if step.name in here.names else meant(here, step.name)
            users[here.file].setdefault(name, {})[user] = None
            target = here.prefixes.get(step.name)
            if target is None or target not in modules:
                return
            here = modules[target]

    for module in modules.values():
        for declaration in module.declarations:
            for path in names_in(declaration.line):
                note(module, path, declaration.name)
        for line in module.expectations:
            for path in names_in(line):
                note(module, path, "")
    return users


def _unused(module: Module, users: Users, problems: Problems) -> None:
    """Warn of what is never used."""
    shows = bool(module.figures) or any(each.kind == "assembly" for each in module.names.values())
    for declaration in module.names.values():
        used_by = [user for user in users.get(declaration.name, ()) if user != declaration.name]
        if declaration.kind == "given" and not used_by:
            sentence = f"the parameter `{declaration.name}` is never used"
            problems.warn("unused-parameter", declaration.span, sentence, "use it or take it out")
        if declaration.kind == "part" and shows and not any(used_by):
            sentence = f"the part `{declaration.name}` is never placed"
            hint = "place it in an assembly, show it, or take it out"
            problems.warn("never-placed", declaration.span, sentence, hint)

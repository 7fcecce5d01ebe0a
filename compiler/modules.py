"""Names of a file: what it declares, what it uses, and in which order its values can be computed."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, Related
from platewright.lang.source import Span

from .functions import CONSTANTS, FUNCTIONS
from .mistakes import Mistake, Problems, mistake
from .project import Files
from .readings import name as declared_name
from .readings import parameters

DECLARED = (
    "material",
    "outline",
    "path",
    "part",
    "assembly",
    "lighting",
    "viewpoint",
    "sequence",
    "wording",
    "receiver",
)
"""Declarations whose names share one space with parameters, derived values and prefixes."""

THINGS = ("part", "assembly")


@dataclass(frozen=True, slots=True)
class Declaration:
    """One declared name. `kind` is the word that declares it: `given`, `derived`, `see`, `part` ..."""

    kind: str
    name: str
    span: Span
    line: tree.Line


@dataclass(frozen=True, slots=True)
class Module:
    """The names one file declares. Figures and variants name files and folders, so each has a space of its own."""

    file: str
    names: Mapping[str, Declaration]
    figures: Mapping[str, Declaration]
    variants: Mapping[str, Declaration]
    prefixes: Mapping[str, str]
    expectations: tuple[tree.Line, ...]


Modules = Mapping[str, Module]


def gather(files: Files) -> tuple[Modules, tuple[Problem, ...]]:
    """The modules of all files, with problems for names declared twice and for parameters and parts never used."""
    problems = Problems()
    modules = {file: _module(files, scene, problems) for file, scene in files.scenes.items()}
    used = _used(modules)
    for module in modules.values():
        _nested_names(module, problems)
    _unused(modules[files.main], used[files.main], problems)
    return modules, problems.all()


def find(modules: Modules, module: Module, path: tree.Path) -> tuple[Module, Declaration]:
    """The declaration a path leads to, through prefixes. Raises Mistake with the nearest name."""
    here = module
    for step in path.steps[:-1]:
        declaration = here.names.get(step.name)
        if declaration is None:
            raise _unknown(step, here, "")
        if declaration.kind != "see":
            raise mistake("unknown-name", step.span, f"`{step.name}` is no prefix of a file seen")
        file = here.prefixes.get(step.name)
        if file is None or file not in modules:
            raise Mistake(None)
        here = modules[file]
    last = path.steps[-1]
    found = here.names.get(last.name)
    if found is None:
        raise _unknown(last, here, "")
    return here, found


def find_kind(modules: Modules, module: Module, path: tree.Path, kinds: tuple[str, ...]) -> tuple[Module, Declaration]:
    """As `find`, for a declaration of one of `kinds`. Raises Mistake."""
    here, found = find(modules, module, path)
    if found.kind not in kinds:
        wanted = " or ".join(kinds)
        article = "an" if wanted[0] in "aeiou" else "a"
        sentence = f"expected {article} {wanted}, but `{path.dotted}` is {_described(found.kind)}"
        names = [name for name, each in here.names.items() if each.kind in kinds]
        near = nearest(path.steps[-1].name, names)
        related = (Related(found.span, "declared here"),)
        raise mistake("wrong-kind", path.span, sentence, f"did you mean `{near}`?" if near else "", related)
    return here, found


def _described(kind: str) -> str:
    return {
        "given": "a parameter",
        "derived": "a derived value",
        "see": "the prefix of a file seen",
        "outline": "an outline",
        "assembly": "an assembly",
        "lighting": "a lighting",
    }.get(kind, f"a {kind}")


def _unknown(step: tree.Step, module: Module, wanted: str) -> Mistake:
    near = nearest(step.name, list(module.names))
    return mistake(
        "unknown-name",
        step.span,
        f"nothing here is called `{step.name}`",
        f"did you mean `{near}`?" if near else wanted,
    )


def _module(files: Files, scene: tree.Scene, problems: Problems) -> Module:
    names: dict[str, Declaration] = {}
    figures: dict[str, Declaration] = {}
    variants: dict[str, Declaration] = {}
    for declaration in _declarations(scene):
        space = {"figure": figures, "variants": variants}.get(declaration.kind, names)
        declare(declaration, space, problems)
    prefixes = {prefix: target for prefix, target, _ in files.sees.get(scene.file, ())}
    expectations = tuple(line for line in scene.lines if line.word == "expect")
    return Module(scene.file, names, figures, variants, prefixes, expectations)


def _declarations(scene: tree.Scene) -> Iterator[Declaration]:
    for line in scene.lines:
        if line.word in ("given", "derived"):
            for below in line.lines:
                name = declared_name(below.head)
                yield Declaration(line.word, name.text, name.span, below)
        elif line.word == "see":
            name = declared_name(line.head, "prefix")
            yield Declaration("see", name.text, name.span, line)
        elif line.word in (*DECLARED, "figure", "variants"):
            name = declared_name(line.head)
            yield Declaration(line.word, name.text, name.span, line)


def declare(declaration: Declaration, space: dict[str, Declaration], problems: Problems) -> None:
    """Take a name into a space; report it if it stands there already or hides a function or constant."""
    known = space.get(declaration.name)
    if known is not None:
        related = (Related(known.span, "declared here first"),)
        problems.error(
            "duplicate-name", declaration.span, f"`{declaration.name}` is declared twice", "rename one", related
        )
        return
    if declaration.name in FUNCTIONS or declaration.name in CONSTANTS:
        what = "a function" if declaration.name in FUNCTIONS else "a constant"
        problems.error(
            "duplicate-name", declaration.span, f"`{declaration.name}` is {what} of the language", "rename it"
        )
    space[declaration.name] = declaration


def _nested_names(module: Module, problems: Problems) -> None:
    """No name is declared twice in nested scopes."""
    for declaration in module.names.values():
        inner: dict[str, Declaration] = {}
        for parameter in parameters(declaration.line):
            _declare_inside(
                Declaration("given", parameter.name, parameter.span, declaration.line), module, inner, problems
            )
        if declaration.kind not in ("given", "derived"):
            for line in declaration.line.lines:
                if line.word == "derived":
                    for below in line.lines:
                        name = declared_name(below.head)
                        _declare_inside(Declaration("derived", name.text, name.span, below), module, inner, problems)


def _declare_inside(
    declaration: Declaration, module: Module, inner: dict[str, Declaration], problems: Problems
) -> None:
    outer = module.names.get(declaration.name)
    if outer is not None:
        related = (Related(outer.span, "declared here first"),)
        sentence = f"`{declaration.name}` is declared outside already; inside it would mean something else"
        problems.error("duplicate-name", declaration.span, sentence, "rename one", related)
    else:
        declare(declaration, inner, problems)


def order(depends: Mapping[str, Sequence[str]]) -> tuple[list[str], list[list[str]]]:
    """Names so that each stands after those it depends on, and the circles that make that impossible.

    Names in a circle, and names that depend on one, are left out of the order. Cost: linear.
    """
    done: dict[str, bool] = {}
    sequence: list[str] = []
    circles: list[list[str]] = []
    for start in depends:
        if start in done:
            continue
        trail: list[str] = [start]
        pending = [iter(depends[start])]
        inside = {start: 0}
        sound = [True]
        while pending:
            following = next(pending[-1], None)
            if following is None:
                finished = trail.pop()
                pending.pop()
                del inside[finished]
                is_sound = sound.pop()
                done[finished] = is_sound
                if is_sound:
                    sequence.append(finished)
                elif sound:
                    sound[-1] = False
            elif following in inside:
                circles.append([*trail[inside[following] :], following])
                sound[-1] = False
            elif following in done:
                sound[-1] = sound[-1] and done[following]
            elif following in depends:
                inside[following] = len(trail)
                trail.append(following)
                pending.append(iter(depends[following]))
                sound.append(True)
    return sequence, circles


def names_in(node: object) -> Iterator[tree.Path]:
    """Every path in an expression, a reading or a line, however deep, in the order of the text."""
    pending: list[object] = [node]
    while pending:
        found = pending.pop()
        if isinstance(found, tree.Path):
            yield found
        pending.extend(reversed(_parts(found)))


def _parts(node: object) -> list[object]:
    match node:
        case tree.Path():
            return [step.index for step in node.steps if step.index is not None]
        case tree.Call():
            return [node.path, *node.positional, *(setting.value for setting in node.named)]
        case tree.Tuple():
            return list(node.items)
        case tree.Text():
            return [part for part in node.parts if not isinstance(part, str)]
        case tree.Unary():
            return [node.operand]
        case tree.Binary():
            return [node.left, node.right]
        case tree.Choice():
            return [node.condition, node.then, node.otherwise]
        case tree.Range():
            return [node.low, node.high]
        case tree.Setting():
            return [node.value]
        case tree.Parameter():
            return [node.default]
        case tree.Reading():
            return [value for _, value in node.values]
        case tree.Line():
            return [node.head, *node.clauses, *node.lines]
        case tuple():
            return list(node)
    return []


def _used(modules: Modules) -> dict[str, dict[str, dict[str, None]]]:
    """For each file, the names used anywhere and the names of the declarations that use them."""
    used: dict[str, dict[str, dict[str, None]]] = {file: {} for file in modules}

    def note(module: Module, path: tree.Path, user: str) -> None:
        here = module
        for step in path.steps:
            used[here.file].setdefault(step.name, {})[user] = None
            target = here.prefixes.get(step.name)
            if target is None or target not in modules:
                return
            here = modules[target]

    for module in modules.values():
        spaces = (*module.names.values(), *module.figures.values(), *module.variants.values())
        for declaration in spaces:
            for path in names_in(declaration.line):
                note(module, path, declaration.name)
        for line in module.expectations:
            for path in names_in(line):
                note(module, path, "")
    return used


def _unused(module: Module, used: Mapping[str, Mapping[str, None]], problems: Problems) -> None:
    shows = bool(module.figures) or any(each.kind == "assembly" for each in module.names.values())
    for declaration in module.names.values():
        users = [user for user in used.get(declaration.name, ()) if user != declaration.name]
        if declaration.kind == "given" and not users:
            sentence = f"the parameter `{declaration.name}` is never used"
            problems.warn("unused-parameter", declaration.span, sentence, "use it or take it out")
        if declaration.kind == "part" and shows and not users:
            sentence = f"the part `{declaration.name}` is never placed"
            problems.warn(
                "never-placed", declaration.span, sentence, "place it in an assembly, show it, or take it out"
            )

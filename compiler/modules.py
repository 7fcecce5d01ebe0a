"""Names of a file: what it declares, and the way from a path to a declaration."""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Iterator, Mapping, Sequence

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Problem, Related
from platewright.lang.source import Span

from .functions import CONSTANTS, FUNCTIONS
from .mistakes import Mistake, Problems, mistake
from .project import Files
from .readings import name as declared_name
from .readings import parameters
from .scope import did_you_mean

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


class Declaration(Struct, frozen=True):
    """One declared name. `kind` is the word that declares it: `given`, `derived`, `see`, `part` ...

    `is_faulty` if lines of it could not be read: what is left may be checked, but is not what was meant.
    """

    kind: str
    name: str
    span: Span
    line: tree.Line
    is_faulty: bool = False


class Module(Struct, frozen=True):
    """The names one file declares. Figures and variants name files and folders, so each has a space of its own.

    `broken` are names that lines which could not be read would have declared; `has_faults` says there are such lines.
    """

    file: str
    names: Mapping[str, Declaration]
    figures: Mapping[str, Declaration]
    variants: Mapping[str, Declaration]
    prefixes: Mapping[str, str]
    expectations: tuple[tree.Line, ...]
    broken: frozenset[str]
    has_faults: bool

    @property
    def declarations(self) -> Iterator[Declaration]:
        """All that the file declares: names, figures, variants."""
        yield from (*self.names.values(), *self.figures.values(), *self.variants.values())


Modules = Mapping[str, Module]


def gather(files: Files) -> tuple[Modules, tuple[Problem, ...]]:
    """The modules of all files, with problems for names declared twice in one space."""
    problems = Problems()
    return {file: _module(files, scene, problems) for file, scene in files.scenes.items()}, problems.all()


def find(modules: Modules, module: Module, path: tree.Path) -> tuple[Module, Declaration]:
    """The declaration a path leads to, through prefixes. Raises Mistake with the nearest name."""
    here = module
    for step in path.steps[:-1]:
        declaration = here.names.get(step.name)
        if declaration is None:
            raise _unknown(step, here)
        if declaration.kind != "see":
            raise mistake("unknown-name", step.span, f"`{step.name}` is no prefix of a file seen")
        file = here.prefixes.get(step.name)
        if file is None or file not in modules:
            raise Mistake(None)
        here = modules[file]
    last = path.steps[-1]
    found = here.names.get(last.name)
    if found is None:
        raise _unknown(last, here)
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
        raise mistake("wrong-kind", path.span, sentence, did_you_mean(near), related)
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


def _unknown(step: tree.Step, module: Module) -> Mistake:
    if step.name in module.broken:
        return Mistake(None)
    near = nearest(step.name, module.names)
    return mistake("unknown-name", step.span, f"nothing here is called `{step.name}`", did_you_mean(near))


def _module(files: Files, scene: tree.Scene, problems: Problems) -> Module:
    names: dict[str, Declaration] = {}
    figures: dict[str, Declaration] = {}
    variants: dict[str, Declaration] = {}
    for declaration in _declarations(scene, sorted(files.faults.get(scene.file, ()))):
        space = {"figure": figures, "variants": variants}.get(declaration.kind, names)
        declare(declaration, space, problems)
    prefixes = {prefix: target for prefix, target, _ in files.sees.get(scene.file, ())}
    expectations = tuple(line for line in scene.lines if line.word == "expect")
    broken, has_faults = frozenset(scene.broken), bool(files.faults.get(scene.file))
    return Module(scene.file, names, figures, variants, prefixes, expectations, broken, has_faults)


def _declarations(scene: tree.Scene, faults: Sequence[int]) -> Iterator[Declaration]:
    ends = [*(line.span.line for line in scene.lines[1:]), scene.span.end_line + 1]
    for line, end in zip(scene.lines, ends, strict=False):
        # A line that could not be read belongs to the declaration above it.
        is_faulty = bisect_left(faults, line.span.line) < bisect_left(faults, end)
        if line.word in ("given", "derived"):
            for below in line.lines:
                name = declared_name(below.head)
                yield Declaration(line.word, name.text, name.span, below)
        elif line.word in ("see", "see library"):
            name = declared_name(line.head, "prefix")
            yield Declaration("see", name.text, name.span, line)
        elif line.word in (*DECLARED, "figure", "variants"):
            name = declared_name(line.head)
            yield Declaration(line.word, name.text, name.span, line, is_faulty)


def declare(declaration: Declaration, space: dict[str, Declaration], problems: Problems) -> None:
    """Take a name into a space; report it if it stands there already or hides a function or constant."""
    known = space.get(declaration.name)
    if known is not None:
        related = (Related(known.span, "declared here first"),)
        problems.error(
            "duplicate-name", declaration.span, f"`{declaration.name}` is declared twice", "rename one", related
        )
        return
    # A call's parenthesis touches its name, so a value may be called `length`; a second function may not.
    hides_function = declaration.name in FUNCTIONS and declaration.kind == "derived" and parameters(declaration.line)
    if hides_function or declaration.name in CONSTANTS:
        what = "a function" if hides_function else "a constant"
        problems.error(
            "duplicate-name", declaration.span, f"`{declaration.name}` is {what} of the language", "rename it"
        )
    space[declaration.name] = declaration


def names_in(node: object, into_brackets: bool = True) -> Iterator[tree.Path]:
    """Every path in an expression, a reading or a line, however deep, in the order of the text.

    Those in the brackets of others are left out where asked: they may be names of copies.
    """
    pending: list[object] = [node]
    while pending:
        found = pending.pop()
        if isinstance(found, tree.Path):
            yield found
            if not into_brackets:
                continue
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

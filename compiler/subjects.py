"""What a figure, an expectation or an export is about: a thing by name, or something placed in one."""

from __future__ import annotations

from msgspec import Struct
from platewright.lang import tree

from .build import Model
from .graph import Thing
from .mistakes import Problems, mistake
from .modules import THINGS, find_kind
from .paths import Placed, follow


class Subject(Struct, frozen=True):
    """A thing in its own frame, the path it goes by, and the last name of that path without brackets."""

    thing: Thing
    path: str
    name: str


def find_subject(model: Model, written: tree.Path | tree.Call, problems: Problems) -> Subject:
    """The thing written: `gauge`, `bucket(span = 90 mm)`, `fasteners.screw`, `gauge.cap_screws[3]`. Raises Mistake.

    What is wrong in the lines of a thing made for this goes to `problems`.
    """
    if isinstance(written, tree.Call):
        return Subject(model.instantiate(written, problems), written.path.dotted, written.path.steps[-1].name)
    whole, below = _declared(model, written)
    find_kind(model.modules, model.module, whole, THINGS)
    start = model.instantiate(whole, problems)
    target = follow(start, below, model.scope)
    if not isinstance(target, Placed):
        sentence = f"`{written.dotted}` is a mark or feature of a part, not a part or assembly"
        raise mistake("wrong-kind", written.span, sentence)
    path = f"{whole.dotted}.{target.path}" if target.path else whole.dotted
    return Subject(target.thing, path, written.steps[-1].name)


def _declared(model: Model, path: tree.Path) -> tuple[tree.Path, tuple[tree.Step, ...]]:
    """The steps of a path that lead through prefixes to a declaration, and those below it."""
    module, length = model.module, 1
    for step in path.steps[:-1]:
        file = module.prefixes.get(step.name)
        declared = module.names.get(step.name)
        if declared is None or declared.kind != "see":
            break
        length += 1
        if file is None or file not in model.modules:
            break
        module = model.modules[file]
    first = path.steps[:length]
    return tree.Path(first, first[0].span.to(first[-1].span)), path.steps[length:]

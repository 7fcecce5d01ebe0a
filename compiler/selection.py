"""Parts that a figure speaks of by their paths: one copy, all copies of a name, and all that lies below."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from platewright.lang import tree
from platewright.lang.nearest import nearest

from .graph import Assembly, Thing, bracketed
from .mistakes import mistake
from .paths import label_of
from .scope import Scope, did_you_mean


def parts_named(written: tree.Expression, subject: Thing, path: str, scope: Scope) -> tuple[str, ...]:
    """The paths of what is written: `funnel`, `cap_screws[2]`, `cap_screws` for all its copies, `gauge.funnel`.

    A path starts in the subject or with the subject's own path, `path`. Brackets left out stand for every copy, at any
    level. Raises Mistake.
    """
    if not isinstance(written, tree.Path):
        raise mistake("wrong-form", written.span, "expected the path of a part, such as `funnel` or `cap_screws[2]`")
    steps = _within(written, path)
    found: list[tuple[str, Thing]] = [(path, subject)]
    for step in steps:
        below = [each for above in found for each in _below(*above, step, scope)]
        if not below:
            raise _unknown(step, [thing for _, thing in found], scope)
        found = below
    return tuple(each for each, _ in found)


def _within(written: tree.Path, path: str) -> tuple[tree.Step, ...]:
    """The steps of a path below the subject, whose own path may stand before them."""
    own = path.split(".")
    plain = [step.name for step in written.steps[: len(own)] if step.index is None]
    return written.steps[len(own) :] if plain == own else written.steps


def _below(path: str, thing: Thing, step: tree.Step, scope: Scope) -> Iterator[tuple[str, Thing]]:
    if not isinstance(thing, Assembly):
        return
    for occurrence in thing.occurrences:
        if occurrence.name != step.name:
            continue
        labels = [copy.label for copy in occurrence.copies]
        wanted = None if step.index is None else label_of(step.index, labels, scope)
        for copy in occurrence.copies:
            if wanted is None or copy.label == wanted:
                yield f"{path}.{bracketed(occurrence.name, copy.label)}", copy.thing


def _unknown(step: tree.Step, things: Sequence[Thing], scope: Scope) -> Exception:
    """Why a step leads nowhere: no such name, or no such copy."""
    occurrences = [each for thing in things if isinstance(thing, Assembly) for each in thing.occurrences]
    names = list(dict.fromkeys(each.name for each in occurrences))
    holder = things[0].name
    copies = [copy.label for each in occurrences if each.name == step.name for copy in each.copies]
    if step.name not in names:
        marks = {each.name for thing in things for each in thing.marks}
        if step.name in marks:
            return mistake("wrong-kind", step.span, f"`{step.name}` is a mark, not a part")
        listed = ", ".join(f"`{name}`" for name in names[:8]) + (" and more" if len(names) > 8 else "")
        hint = did_you_mean(nearest(step.name, names)) or (f"it holds {listed}" if names else "it holds nothing placed")
        return mistake("unknown-name", step.span, f"nothing placed in `{holder}` is called `{step.name}`", hint)
    if not copies:
        sentence = f"no copy of `{step.name}` is there: its `when` or `for` leaves none"
        return mistake("which-copy", step.span, sentence)
    if copies == [""]:
        return mistake("which-copy", step.span, f"there is one `{step.name}`, so it takes no brackets")
    sentence = (
        f"there is no such copy of `{step.name}`; its {len(copies)} copies run from [{copies[0]}] to [{copies[-1]}]"
    )
    return mistake("which-copy", step.span, sentence)

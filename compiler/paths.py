"""Following a path down the scene graph: placed things, marks, features and what is known of a feature."""

from __future__ import annotations

from collections.abc import Sequence

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.units import LENGTH, NUMBER

from .expressions import evaluate
from .graph import Assembly, Copy, Feature, Mark, Occurrence, Solid, Thing, bracketed
from .mistakes import mistake
from .scope import Scope, did_you_mean
from .solids.recipe import Affine
from .solids.transform import IDENTITY, compose, largest_scale
from .values import Quantity, Value, Vector, kind_of, shortened, spell_number

FEATURE_VALUES = ("centre", "axis", "top", "diameter")


class Placed(Struct, frozen=True):
    """A thing, its path below where the search began, and its place in that frame."""

    thing: Thing
    path: str
    placement: Affine


def follow(start: Thing, steps: Sequence[tree.Step], scope: Scope) -> Placed | Value:
    """The placed thing, or the point, direction or size, that `steps` lead to from `start`. Raises Mistake.

    A mark gives its point; a feature its centre, or with a further step its centre, axis, top or diameter.
    """
    here = Placed(start, "", IDENTITY)
    for number, step in enumerate(steps):
        found = _below(here.thing, step)
        if isinstance(found, Occurrence):
            copy = _copy(found, step, scope)
            path = (
                f"{here.path}.{bracketed(found.name, copy.label)}" if here.path else bracketed(found.name, copy.label)
            )
            here = Placed(copy.thing, path, compose(here.placement, copy.placement))
        elif isinstance(found, Mark):
            return _mark_value(found, here.placement, steps[number:])
        else:
            return _feature_value(found, here.placement, steps[number:], scope)
    return here


def _below(thing: Thing, step: tree.Step) -> Occurrence | Mark | Feature:
    """What a name means in a thing. Raises Mistake with the nearest name there."""
    inside: dict[str, Occurrence | Mark | Feature] = {mark.name: mark for mark in thing.marks}
    if isinstance(thing, Assembly):
        inside.update((occurrence.name, occurrence) for occurrence in thing.occurrences)
    elif isinstance(thing, Solid):
        inside.update((feature.name, feature) for feature in thing.features)
    if step.name in inside:
        return inside[step.name]
    hint = did_you_mean(nearest(step.name, inside)) or _listed(list(inside))
    raise mistake("unknown-name", step.span, f"`{thing.name}` has nothing called `{step.name}`", hint)


def _listed(names: list[str]) -> str:
    if not names:
        return "it has no marks, features or placed things"
    shown = ", ".join(f"`{name}`" for name in names[:8])
    return f"it has {shown}" + (" and more" if len(names) > 8 else "")


def _copy(occurrence: Occurrence, step: tree.Step, scope: Scope) -> Copy:
    known = [copy.label for copy in occurrence.copies]
    return occurrence.copies[_which(occurrence.name, known, step, scope)]


def _which(name: str, labels: Sequence[str], step: tree.Step, scope: Scope) -> int:
    """The row of the copy that a step's brackets name, or of the only one. Raises Mistake."""
    if not labels:
        sentence = f"no copy of `{name}` is there: its `when` or `for` leaves none"
        raise mistake("which-copy", step.span, sentence)
    if step.index is None:
        if len(labels) == 1:
            return 0
        hint = f"such as `{bracketed(name, labels[0])}`"
        raise mistake("which-copy", step.span, f"there are {len(labels)} of `{name}`; brackets say which", hint)
    label = label_of(step.index, labels, scope)
    if label in labels:
        return labels.index(label)
    if labels == [""]:
        raise mistake("which-copy", step.span, f"there is one `{name}`, so it takes no brackets")
    sentence = f"there is no `{name}[{shortened(label)}]`; the {len(labels)} copies run from [{labels[0]}] to "
    near = nearest(label, labels)
    raise mistake("which-copy", step.span, f"{sentence}[{labels[-1]}]", did_you_mean(f"{name}[{near}]" if near else ""))


def label_of(index: tree.Expression, labels: Sequence[str], scope: Scope) -> str:
    """What the brackets say: the name of a table row as it stands, or a value."""
    if isinstance(index, tree.Path) and (index.dotted in labels or scope.find(index.dotted) is None):
        return index.dotted
    value = evaluate(index, scope)
    if isinstance(value, str):
        return value
    if isinstance(value, Quantity) and value.dimension == NUMBER:
        return spell_number(value.value)
    raise mistake("wrong-kind", index.span, f"brackets take a count or the name of a row, found {kind_of(value)}")


def _mark_value(mark: Mark, placement: Affine, steps: Sequence[tree.Step]) -> Value:
    if steps[0].index is not None:
        raise mistake("which-copy", steps[0].span, f"`{mark.name}` is a mark; brackets count copies")
    if len(steps) > 2:
        raise mistake("unknown-name", steps[2].span, f"nothing can follow `{steps[1].name}`")
    if len(steps) == 1 or steps[1].name == "point":
        return _point(mark.point, placement)
    if steps[1].name == "axis" and mark.axis is not None:
        return _direction(mark.axis, placement)
    hint = "a mark has a `point`, and an `axis` if it is set `along` one"
    raise mistake("unknown-name", steps[1].span, f"the mark `{mark.name}` has no `{steps[1].name}`", hint)


def _feature_value(feature: Feature, placement: Affine, steps: Sequence[tree.Step], scope: Scope) -> Value:
    copy = feature.copies[_which(feature.name, [each.label for each in feature.copies], steps[0], scope)]
    wanted = steps[1] if len(steps) > 1 else None
    if len(steps) > 2:
        raise mistake("unknown-name", steps[2].span, f"nothing can follow `{steps[1].name}`")
    match wanted.name if wanted else "centre":
        case "centre":
            return _point(copy.centre, placement)
        case "top":
            return _point(copy.top, placement)
        case "axis":
            return _direction(copy.axis, placement)
        case "diameter" if copy.diameter is not None:
            return Quantity(copy.diameter * largest_scale(placement), LENGTH)
    assert wanted is not None
    hint = "a feature has " + ", ".join(f"`{each}`" for each in FEATURE_VALUES)
    if wanted.name == "diameter":
        hint = "only round features have one"
    raise mistake("unknown-name", wanted.span, f"the feature `{feature.name}` has no `{wanted.name}`", hint)


def _point(point: tuple[float, float, float], placement: Affine) -> Vector:
    return Vector(
        tuple(row[0] * point[0] + row[1] * point[1] + row[2] * point[2] + row[3] for row in placement), LENGTH
    )


def _direction(axis: tuple[float, float, float], placement: Affine) -> Vector:
    turned = tuple(row[0] * axis[0] + row[1] * axis[1] + row[2] * axis[2] for row in placement)
    size = sum(each * each for each in turned) ** 0.5
    return Vector(tuple(each / size for each in turned), NUMBER)

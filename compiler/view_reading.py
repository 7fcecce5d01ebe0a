"""What a figure says of its views: where it is seen from, view sets, and views by reference arrow and letter."""

from __future__ import annotations

from collections.abc import Sequence

from msgspec import Struct
from platewright.lang import tree
from platewright.lang.nearest import nearest
from platewright.lang.problems import Related

from .build import Model
from .graph import Thing
from .mistakes import Mistake, Problems, mistake
from .modules import find_kind
from .placement import positive_length
from .pointing import holder_of, point_in, sight_in
from .projections import Central, Viewpoint, square_to, standard, standard_names
from .readings import expression, listed, name, optional
from .scope import Scope, did_you_mean
from .view_sets import Look, Method, ViewSet, arranged

SETS: dict[str, Method] = {"first angle": "first angle", "third angle": "third angle"}


class Views(Struct, frozen=True):
    """The set of views, and the views by reference arrow."""

    of_set: ViewSet | None = None
    looks: tuple[Look, ...] = ()


def find_viewpoint(model: Model, path: tree.Path, problems: Problems) -> Viewpoint:
    """The viewpoint of a name: a declared one, else a standard one. Raises Mistake."""
    module = model.module
    declared_here = module.names.get(path.dotted)
    # Other things may be called `top` or `left`: only a viewpoint of that name goes before the standard one.
    if declared_here is None or declared_here.kind != "viewpoint":
        found = standard(path.dotted)
        if found is not None:
            return found
    if len(path.steps) == 1 and declared_here is None:
        if path.dotted in module.broken:
            raise Mistake(None)
        declared = (each for each, declaration in module.names.items() if declaration.kind == "viewpoint")
        near = nearest(path.dotted, [*declared, *standard_names()])
        hint = did_you_mean(near) or "declare it with `viewpoint`, or take front, top, isometric …"
        raise mistake("unknown-name", path.span, f"there is no viewpoint `{path.dotted}`", hint)
    here, declaration = find_kind(model.modules, module, path, ("viewpoint",))
    described = model.viewpoints[here.file, declaration.name]
    problems.extend(described.problems)
    if described.value is None:
        raise Mistake(None)
    return described.value


def read_views(model: Model, lines: Sequence[tree.Line], subject: Thing, problems: Problems) -> Views:
    """The view set and the reference-arrow views among a figure's lines."""
    views = Views()
    sets = [line for line in lines if line.head.row in SETS]
    if sets:
        with problems.collecting():
            _check_alone(sets, lines)
            views = Views(_view_set(model, sets[0].head, problems))
    looks: list[Look] = []
    for line in lines:
        if line.head.row == "view along":
            with problems.collecting():
                look = _look(line.head, subject, model.scope)
                _report_letter_twice(look, looks, problems)
                looks.append(look)
    return Views(views.of_set, tuple(looks))


def _check_alone(sets: Sequence[tree.Line], lines: Sequence[tree.Line]) -> None:
    """Raises Mistake where two lines say which views are shown."""
    first = sets[0].head
    if len(sets) > 1 and sets[1].head.row != first.row:
        related = (Related(first.word_span, "the first of them"),)
        raise mistake("said-twice", sets[1].head.word_span, "a figure has one set of views", "leave one out", related)
    show = next((line.head for line in lines if line.head.row == "show"), None)
    seen = optional(show, "viewpoint") if show is not None else None
    if isinstance(seen, tree.Path) and seen.dotted != "front":
        related = (Related(first.word_span, "the set of views"),)
        sentence = f"the `{first.row}` set says which views are shown, and so does `from {seen.dotted}`"
        raise mistake("said-twice", seen.span, sentence, "leave one out", related)


def _view_set(model: Model, head: tree.Reading, problems: Problems) -> ViewSet:
    written = [each for each in listed(head, "views") if isinstance(each, tree.Path)]
    found: dict[str, tuple[Viewpoint, tree.Path]] = {}
    for each in written:
        viewpoint = find_viewpoint(model, each, problems)
        if each.dotted in found:
            related = (Related(found[each.dotted][1].span, "first here"),)
            sentence = f"the view `{each.dotted}` stands twice in this set"
            raise mistake("said-twice", each.span, sentence, "leave one out", related)
        if isinstance(viewpoint, Central) and viewpoint.is_held:
            sentence = f"the field of view of `{each.dotted}` says what a page takes in, and a set shares its page"
            raise mistake("does-not-fit", each.span, sentence, "leave out its `lens` or `angle of view`")
        found[each.dotted] = (viewpoint, each)
    if "front" not in found:
        sentence = "a set of views stands round its front view, which is not among these"
        raise mistake("wrong-form", head.span, sentence, f"such as `{head.row} front, top, left`")
    return arranged(SETS[head.row], tuple((each, viewpoint) for each, (viewpoint, _) in found.items()))


def _look(head: tree.Reading, subject: Thing, scope: Scope) -> Look:
    letter = name(head, "letter")
    if not letter.text.isupper() or len(letter.text) > 2:
        sentence = f"a view is named by a capital letter, found `{letter.text}`"
        raise mistake("wrong-form", letter.span, sentence, "such as `A`")
    sight, aim = sight_in(expression(head, "direction"), subject, scope)
    mark, across = optional(head, "mark"), optional(head, "diameter")
    window, holder = None, holder_of(expression(head, "direction"), subject, scope) if aim is not None else ""
    if mark is not None and across is not None:
        holder = holder_of(mark, subject, scope)
        window = (point_in(mark, subject, scope), positive_length(across, scope, "diameter"))
    return Look(letter.text, square_to(sight), window, head.span, aim, holder)


def _report_letter_twice(look: Look, looks: Sequence[Look], problems: Problems) -> None:
    for other in looks:
        if other.letter == look.letter:
            related = (Related(other.span, "the first of them"),)
            sentence = f"two views have the letter {look.letter}"
            problems.error("said-twice", look.span, sentence, "take another letter", related)
            return

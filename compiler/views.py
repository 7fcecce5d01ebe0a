"""The views of a figure: what each shows, from where, at which part of the sheet's scale, and where it stands."""

from __future__ import annotations

from typing import Literal

from msgspec import Struct
from msgspec.structs import replace

from .mistakes import mistake
from .projections import Viewpoint, square_to, unit_projection
from .sections import EDGE_ON, LETTERS, Cut, facing, is_edge_on, letter_of
from .solids.transform import dot
from .specs import Spec

Point = tuple[float, float, float]


_UPRIGHT = 0.5  # a normal steeper than 30 degrees is looked along from above


class Window(Struct, frozen=True):
    """A round piece of a view: its middle in world mm, its diameter in model mm, its letter."""

    centre: Point
    diameter: float
    letter: str = ""


class View(Struct, frozen=True):
    """One view, which becomes one panel.

    `factor` is its scale over the sheet's. `column` and `row` place it beside the others: the main view stands at 0
    and 0, negative numbers left of it and above. With a `window` no more than that is shown. `title` stands above it.
    `cuts` are rows of the spec's cuts that open what it shows, `traces` those whose cutting-plane line it has. Of a
    removed or revolved section it `shows` the cut faces alone.
    """

    name: str
    viewpoint: Viewpoint
    column: int = 0
    row: int = 0
    factor: float = 1.0
    window: Window | None = None
    title: str = ""
    is_main: bool = False
    cuts: tuple[int, ...] = ()
    traces: tuple[int, ...] = ()
    shows: Literal["all", "removed", "revolved"] = "all"


def views_of(spec: Spec) -> tuple[View, ...]:
    """The views that a figure asks for, the main one first. Raises Mistake."""
    views = _of_set(spec) if spec.view_set is not None else (View(spec.path, spec.viewpoint, is_main=True),)
    return detailed((*sectioned(views, spec), *_looks(views, spec)), spec)


def _of_set(spec: Spec) -> tuple[View, ...]:
    """The views of a set, the front view first; where they stand says which they are."""
    assert spec.view_set is not None
    return tuple(
        View(f"{spec.path} {each.name}", each.viewpoint, each.column, each.row, is_main=each.name == "front")
        for each in spec.view_set.views
    )


def _looks(views: tuple[View, ...], spec: Spec) -> tuple[View, ...]:
    """Views by reference arrow, to the right of the others, each under its letter."""
    column = max(view.column for view in views) + 1
    found: list[View] = []
    taken = {letter_of(number) for number, cut in enumerate(spec.cuts) if cut.shown != "revolved"}
    taken |= {detail_letter(number) for number in range(len(spec.details))}
    for number, look in enumerate(spec.looks):
        if look.letter in taken:
            sentence = f"the letter {look.letter} stands for a section or a detail of this figure already"
            raise mistake("said-twice", look.span, sentence, "take another letter for the view")
        window = None if look.window is None else Window(look.window[0], look.window[1])
        name = f"{spec.path} {look.letter}"
        found.append(View(name, look.viewpoint, column + number, 0, 1.0, window, look.letter))
    return tuple(found)


def detailed(views: tuple[View, ...], spec: Spec) -> tuple[View, ...]:
    """Views with those of a figure's details beside them, in a column; each shows what the main view does."""
    main, column = views[0], max(view.column for view in views) + 1
    found = list(views)
    for row, detail in enumerate(spec.details):
        letter = detail_letter(row)
        name = f"{main.name} {letter}"
        window = Window(detail.centre, detail.diameter, letter)
        found.append(
            replace(
                main,
                name=name,
                column=column,
                row=row,
                factor=main.factor * detail.times,
                is_main=False,
                window=window,
                title=letter,
                traces=(),
            )
        )
    return tuple(found)


def detail_letter(number: int) -> str:
    """The letter of a figure's detail, counted from 0: from the end of the alphabet (common practice)."""
    return letter_of(len(LETTERS) - 1 - number) if number < len(LETTERS) else letter_of(number)


def sectioned(views: tuple[View, ...], spec: Spec) -> tuple[View, ...]:
    """Views with a figure's sections dealt out to them, and those of removed sections to their right.

    A view alone is cut by all. Of several, the one that looks along a cut's normal is cut, under the cut's letters, and
    the first that sees it edge-on has its cutting-plane line. Raises Mistake where no view looks along it.
    """
    in_view = tuple(number for number, cut in enumerate(spec.cuts) if cut.shown == "in view")
    if len(views) == 1:
        return _with_removed((replace(views[0], cuts=in_view),), spec)
    found = list(views)
    sights = [unit_projection(view.viewpoint, 1.0, False).sight for view in views]
    for number in in_view:
        cut = spec.cuts[number]
        products = [abs(dot(facing(cut), sight)) for sight in sights]
        if max(products) < 1.0 - EDGE_ON:
            hint = "a view along its normal shows it; or give it a figure of one view"
            raise mistake("edge-on-section", cut.span, "no view of this figure looks squarely at this section", hint)
        shown = products.index(max(products))
        letter = letter_of(number)
        title = f"{letter}\u2013{letter}"
        found[shown] = replace(found[shown], cuts=(*found[shown].cuts, number), title=found[shown].title or title)
        parents = [row for row, sight in enumerate(sights) if is_edge_on(cut, sight)]
        if parents:
            found[parents[0]] = replace(found[parents[0]], traces=(*found[parents[0]].traces, number))
    return _with_removed(tuple(found), spec)


def _with_removed(views: tuple[View, ...], spec: Spec) -> tuple[View, ...]:
    """Views and, to their right, one for each removed section; the first that sees it edge-on has its line."""
    found, column = list(views), max(view.column for view in views) + 1
    sights = [unit_projection(view.viewpoint, 1.0, False).sight for view in views]
    for number, cut in enumerate(spec.cuts):
        if cut.shown != "removed":
            continue
        letter, viewpoint = letter_of(number), square_to(_looking(cut))
        name, title = f"{spec.path} {letter}", f"{letter}\u2013{letter}"
        found.append(View(name, viewpoint, column, 0, title=title, cuts=(number,), shows="removed"))
        column += 1
        parents = [row for row, sight in enumerate(sights) if is_edge_on(cut, sight)]
        if parents:
            found[parents[0]] = replace(found[parents[0]], traces=(*found[parents[0]].traces, number))
    return tuple(found)


def _looking(cut: Cut) -> Point:
    """The direction in which a removed section is looked at: to the side that stays, or along its axis, from above."""
    x, y, z = cut.plane.normal
    toward = z if cut.keeping is None and abs(z) > _UPRIGHT else 0.0
    if cut.keeping is not None:
        toward = -(x * cut.keeping[0] + y * cut.keeping[1] + z * cut.keeping[2])
    return (-x, -y, -z) if toward > 0 else (x, y, z)


def cuts_of(view: View, spec: Spec) -> tuple[Cut, ...]:
    """The cuts that open what a view shows."""
    return tuple(spec.cuts[number] for number in view.cuts)

"""The views of a figure: what each shows, from where, at which part of the sheet's scale, and where it stands."""

from __future__ import annotations

from msgspec import Struct
from msgspec.structs import replace

from .mistakes import mistake
from .projections import Viewpoint, unit_projection
from .sections import EDGE_ON, Cut, facing, letter_of
from .specs import Spec

Point = tuple[float, float, float]


class Window(Struct, frozen=True):
    """A round piece of a view: its middle in world mm and its diameter in model mm."""

    centre: Point
    diameter: float


class View(Struct, frozen=True):
    """One view, which becomes one panel.

    `factor` is its scale over the sheet's. `column` and `row` place it beside the others: the main view stands at 0
    and 0, negative numbers left of it and above. With a `window` no more than that is shown. `title` stands above it.
    `cuts` are rows of the spec's cuts that open what it shows, `traces` those whose cutting-plane line it has.
    """

    name: str
    viewpoint: Viewpoint
    column: int = 0
    row: int = 0
    factor: float = 1.0
    window: Window | None = None
    title: str = ""
    cuts: tuple[int, ...] = ()
    traces: tuple[int, ...] = ()


def views_of(spec: Spec) -> tuple[View, ...]:
    """The views that a figure asks for, the main one first. Raises Mistake."""
    return sectioned((View(spec.path, spec.viewpoint),), spec)


def sectioned(views: tuple[View, ...], spec: Spec) -> tuple[View, ...]:
    """Views with a figure's sections dealt out to them.

    A view alone is cut by all. Of several, the one that looks along a cut's normal is cut, under the cut's letters, and
    the first that sees it edge-on has its cutting-plane line. Raises Mistake where no view looks along it.
    """
    if len(views) == 1:
        return (replace(views[0], cuts=tuple(range(len(spec.cuts)))),)
    found = list(views)
    sights = [unit_projection(view.viewpoint, 1.0, False).sight for view in views]
    for number, cut in enumerate(spec.cuts):
        products = [abs(sum(a * b for a, b in zip(facing(cut), sight, strict=True))) for sight in sights]
        if max(products) < 1.0 - EDGE_ON:
            hint = "a view along its normal shows it; or give it a figure of one view"
            raise mistake("edge-on-section", cut.span, "no view of this figure looks squarely at this section", hint)
        shown = products.index(max(products))
        letter = letter_of(number)
        title = f"{letter}\u2013{letter}"
        found[shown] = replace(found[shown], cuts=(*found[shown].cuts, number), title=found[shown].title or title)
        parents = [row for row, product in enumerate(products) if product < EDGE_ON]
        if parents:
            found[parents[0]] = replace(found[parents[0]], traces=(*found[parents[0]].traces, number))
    return tuple(found)


def cuts_of(view: View, spec: Spec) -> tuple[Cut, ...]:
    """The cuts that open what a view shows."""
    return tuple(spec.cuts[number] for number in view.cuts)

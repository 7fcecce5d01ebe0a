"""The views of a figure: what each shows, from where, at which part of the sheet's scale, and where it stands."""

from __future__ import annotations

from msgspec import Struct

from .specs import Spec
from .viewpoints import Viewpoint

Point = tuple[float, float, float]


class Window(Struct, frozen=True):
    """A round piece of a view: its middle in world mm and its diameter in model mm."""

    centre: Point
    diameter: float


class View(Struct, frozen=True):
    """One view, which becomes one panel.

    `factor` is its scale over the sheet's. `column` and `row` place it beside the others: the main view stands at 0
    and 0, negative numbers left of it and above. With a `window` no more than that is shown. `title` stands above it.
    """

    name: str
    viewpoint: Viewpoint
    column: int = 0
    row: int = 0
    factor: float = 1.0
    window: Window | None = None
    title: str = ""


def views_of(spec: Spec) -> tuple[View, ...]:
    """The views that a figure asks for, the main one first."""
    return (View(spec.path, spec.viewpoint),)

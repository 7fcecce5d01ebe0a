"""What a figure says, with its values fixed and its defaults filled in."""

from __future__ import annotations

from typing import Literal

from msgspec import Struct
from platewright.backend.contract import FileKind
from platewright.lang.source import Span

from .emphasis import Stress
from .extremes import Extreme
from .graph import Thing
from .interruptions import Interruption
from .lightings import Sources
from .projections import Viewpoint
from .sections import Cut
from .styles import Manner
from .view_sets import Look, ViewSet

MARGIN_MM = 2.0


class Detail(Struct, frozen=True):
    """What one detail shows, enlarged by `times`: a circle in the view's plane, world mm.

    `holder` is the path within the subject of what the centre is a mark of, and moves with; empty for the subject.
    """

    centre: tuple[float, float, float]
    diameter: float
    times: float
    span: Span
    holder: str = ""


class Exploded(Struct, frozen=True):
    """How far everything is moved, in parts of its `explodes`."""

    factor: float
    span: Span


class Spec(Struct, frozen=True):
    """One figure. Lengths are mm on paper.

    `uncut` are paths of what sections leave whole, with all below it.
    """

    name: str
    subject: Thing
    path: str
    viewpoint: Viewpoint
    sources: Sources
    span: Span
    width: float | None = None
    at_most: float | None = None
    height: float | None = None
    scale: float | Literal["standard"] | None = None
    true_projection: bool = False
    margin: float = MARGIN_MM
    manner: Manner = Manner()
    files: tuple[FileKind, ...] = ("png",)
    title: str = ""
    alt: str = ""
    description: str = ""
    cuts: tuple[Cut, ...] = ()
    uncut: tuple[str, ...] = ()
    exploded: Exploded | None = None
    stresses: tuple[Stress, ...] = ()
    view_set: ViewSet | None = None
    looks: tuple[Look, ...] = ()
    details: tuple[Detail, ...] = ()
    interruptions: tuple[Interruption, ...] = ()
    extremes: tuple[Extreme, ...] = ()

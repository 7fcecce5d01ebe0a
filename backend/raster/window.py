"""The pixels of a panel on its page."""

from __future__ import annotations

from dataclasses import dataclass
from math import floor

from ..contract import ContractError, Page

# Edge functions of a triangle as long as this stay inside 32 bits over a block of 8 x 8 px (see `tiles`).
LARGEST_SIDE = 31_000


@dataclass(frozen=True, slots=True)
class Window:
    """A rectangle of page pixels: `left`, `top` of its first pixel, its size, and pixels per mm."""

    left: int
    top: int
    columns: int
    rows: int
    pixels_per_mm: float


def window(place: tuple[float, float, float, float], page: Page) -> Window:
    """Pixels of `page` whose centres lie in `place` (left, top, width, height in mm), ties as `Page.pixels` rounds.

    Raises ContractError if a side has more than `LARGEST_SIDE` pixels.
    """
    density = page.resolution / 25.4
    columns, rows = page.pixels
    left, right = (_clamp(floor(x * density + 0.5), columns) for x in (place[0], place[0] + place[2]))
    top, bottom = (_clamp(floor(y * density + 0.5), rows) for y in (place[1], place[1] + place[3]))
    if max(right - left, bottom - top) > LARGEST_SIDE:
        raise ContractError(f"a panel of {right - left} x {bottom - top} px: more than {LARGEST_SIDE} a side")
    return Window(left, top, max(0, right - left), max(0, bottom - top), density)


def _clamp(value: int, limit: int) -> int:
    return min(max(value, 0), limit)

"""What an author meant by a word that stands where a shape is wanted."""

from __future__ import annotations

from collections.abc import Iterable

from .nearest import nearest
from .words import EVERYDAY_SHAPES, SHAPE_WORDS


def shape_meant(word: str, names: Iterable[str] = ()) -> str:
    """The shape, or the one of `names`, that is nearest to a word in letters or else in everyday speech, or ""."""
    return nearest(word, (*names, *SHAPE_WORDS)) or EVERYDAY_SHAPES.get(word.lower(), "")


def shape_hint(word: str, names: Iterable[str] = ()) -> str:
    """The way out for a word that is no shape and no part: what was meant, or the first of the shapes."""
    near = shape_meant(word, names)
    if near:
        return f"did you mean `{near}`?"
    return (
        f"shapes are {', '.join(f'`{shape}`' for shape in _FREQUENT)} and others; a part is declared by `part {word}`"
    )


_FREQUENT = ("block", "cylinder", "cone", "sphere", "extrude", "revolve")

"""The list of what a scene holds, as text for people and as JSON for machines."""

from __future__ import annotations

import json
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from platewright.compiler.listing import Listing

SCHEMA = 1
"""Number of the JSON form; it changes when a key changes its meaning or goes."""

_DECIMALS = 3


def as_text(listing: Listing) -> str:
    """Four tables, those that would be empty left out. Lengths in mm and volumes in mm3, to a thousandth."""
    parameters = [(row.name, row.value, row.allowed, row.note.replace("\n", " ")) for row in listing.parameters]
    parts = [
        (row.path, str(row.copies), " x ".join(map(_rounded, row.size)), _rounded(row.volume)) for row in listing.parts
    ]
    figures = [(name,) for name in listing.figures]
    variants = [(name,) for name in listing.variants]
    tables = (
        _table(("parameter", "value", "allowed", "note"), parameters),
        _table(("part", "copies", "size mm", "volume mm3"), parts),
        _table(("figure",), figures),
        _table(("variant",), variants),
    )
    return "\n".join("".join(f"{line}\n" for line in table) for table in map(list, tables) if table)


def _table(head: Sequence[str], rows: Sequence[Sequence[str]]) -> Iterator[str]:
    if not rows:
        return
    table = [head, *rows]
    widths = [max(len(row[column]) for row in table) for column in range(len(head))]
    for row in table:
        yield "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip()


def _rounded(number: float) -> str:
    text = f"{number:.{_DECIMALS}f}".rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def as_json(listing: Listing) -> str:
    """One JSON object with a schema number; numbers in full, UTF-8, keys in a fixed order."""
    document = {
        "schema": SCHEMA,
        "parameters": [
            {"name": row.name, "value": row.value, "allowed": row.allowed, "note": row.note}
            for row in listing.parameters
        ],
        "parts": [
            {
                "path": row.path,
                "copies": row.copies,
                "size_mm": list(row.size),
                "volume_mm3": row.volume,
                "is_assembly": row.is_assembly,
            }
            for row in listing.parts
        ],
        "figures": list(listing.figures),
        "variants": list(listing.variants),
    }
    return json.dumps(document, ensure_ascii=False, indent=2) + "\n"

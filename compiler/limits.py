"""Limits that no text may exceed, so that none can exhaust the machine.

Each is named in the message that enforces it.
"""

from __future__ import annotations

COPIES = 1_000_000
"""Copies that one line may make, and placed things in one model."""

NESTING = 60
"""Assemblies within assemblies, parts within parts, functions within functions."""

FILES = 500
"""Files that one scene may see."""

FILE_BYTES = 16_000_000
"""Size of one file."""

STEPS = 5_000_000
"""Values computed for one variant of a scene."""

TEXT = 100_000
"""Characters of one text."""

TABLE_ROWS = 200_000
"""Rows of one table."""

LARGEST_MM = 1e9
"""Largest length that geometry may reach."""

PAPER_MM = 5_000.0
"""Largest side of a page."""

PIXELS = 400_000_000
"""Pixels of one picture."""

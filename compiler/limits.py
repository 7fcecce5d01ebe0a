"""Limits that no text may exceed, so that none can exhaust the machine.

Each is named in the message that enforces it.
"""

from __future__ import annotations

TRACES = 5_000
"""Things of one exploded figure that move by themselves, each with a trace line."""

EXTREMES = 20
"""Extreme positions of one figure, each of which builds the scene once more."""

TURNS = 500
"""Turns of a helix or a spring."""

COPIES = 100_000
"""Copies that one line may make, and things placed in one model."""

SHAPES = 3_000
"""Shapes of one part, with all copies: all of them meet in one boolean evaluation."""

NESTING = 32
"""Assemblies within assemblies, parts within parts."""

LEVELS = 160
"""Operations within operations, with those of the functions called."""

ALL_COPIES = 200_000
"""Copies that all lines of one variant make together."""

STEPS = 1_000_000
"""Values computed for one variant of a scene."""

FILES = 500
"""Files that one scene may see."""

FILE_BYTES = 16_000_000
"""Size of one file."""

TEXT = 100_000
"""Characters of one text."""

TABLE_ROWS = 200_000
"""Rows of one table."""

EXPONENT = 400
"""Power of ten of a written number; floats end before it."""

POWERS = 99
"""Exponent of a base dimension in the dimension of a value."""

LARGEST_MM = 1e9
"""Largest length that geometry may reach."""

SMALLEST_MM = 1e-6
"""Smallest size of a shape: a nanometre, far below the finest chord error."""

SCALE = 1e6
"""Largest factor of `scaled`; its inverse is the smallest."""

PAPER_MM = 5_000.0
"""Largest side of a page."""

PIXELS = 400_000_000
"""Pixels of one picture."""

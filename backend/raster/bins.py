"""Which triangles touch which tiles of 32 x 32 px, in drawing order.

A triangle's tiles are kept in one uint32: 10 bits for the first column, 10 for the first row, 6 and 6 for how
many more there are. Three codes with 63 in both counts say that there are none, that the counts do not fit (the
box is then computed again), or that the triangle was clipped and its pieces stand for it.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from ..compiled import inner, kernel

TILE = 32
NOTHING, WIDE, CLIPPED = np.uint32(0xFFFFFFFF), np.uint32(0xFFFFFFFE), np.uint32(0xFFFFFFFD)


@inner
def _pixel_box(
    x: Any, y: Any, a: int, b: int, c: int, columns: int, rows: int, samples: int
) -> tuple[int, int, int, int]:
    """First and last pixel column and row whose samples the triangle's box holds; last < first if none."""
    ax, bx, cx, ay, by, cy = x[a], x[b], x[c], y[a], y[b], y[c]
    x0, x1 = min(ax, min(bx, cx)), max(ax, max(bx, cx))
    y0, y1 = min(ay, min(by, cy)), max(ay, max(by, cy))
    if samples == 4:
        if ((x1 - 32) >> 6) < ((x0 + 31) >> 6) or ((y1 - 32) >> 6) < ((y0 + 31) >> 6):
            return 0, -1, 0, -1
        x0, x1, y0, y1 = (x0 + 31) >> 8, (x1 - 32) >> 8, (y0 + 31) >> 8, (y1 - 32) >> 8
    else:
        x0, x1, y0, y1 = (x0 + 127) >> 8, (x1 - 128) >> 8, (y0 + 127) >> 8, (y1 - 128) >> 8
    return max(x0, 0), min(x1, columns - 1), max(y0, 0), min(y1, rows - 1)


@inner
def _box(x: Any, y: Any, a: int, b: int, c: int, columns: int, rows: int, samples: int) -> Any:
    x0, x1, y0, y1 = _pixel_box(x, y, a, b, c, columns, rows, samples)
    if x1 < x0 or y1 < y0:
        return NOTHING
    if (np.int64(x[b]) - x[a]) * (np.int64(y[c]) - y[a]) == (np.int64(x[c]) - x[a]) * (np.int64(y[b]) - y[a]):
        return NOTHING
    left, top, wide, high = x0 >> 5, y0 >> 5, (x1 >> 5) - (x0 >> 5), (y1 >> 5) - (y0 >> 5)
    if wide > 62 or high > 62:
        return WIDE
    return np.uint32(left | (top << 10) | (wide << 20) | (high << 26))


@kernel
def box_faces(
    faces: Any, x: Any, y: Any, outside: Any, spans: Any, first: Any, columns: int, rows: int, samples: int,
    begin: int, end: int, boxes: Any,
) -> None:  # fmt: skip
    """Write the tile boxes (uint32) of positions begin .. end of the run of all shown faces."""
    for s in range(len(spans)):
        low, high = max(begin, first[s]), min(end, first[s + 1])
        for position in range(low, high):
            t = spans[s, 2] + position - first[s]
            a, b, c = faces[t, 0], faces[t, 1], faces[t, 2]
            if outside[a] | outside[b] | outside[c]:
                boxes[position] = CLIPPED
            else:
                boxes[position] = _box(x, y, a, b, c, columns, rows, samples)


@kernel
def box_pieces(pieces: Any, x: Any, y: Any, columns: int, rows: int, samples: int, boxes: Any) -> None:
    """Write the tile boxes of clipped pieces."""
    for k in range(len(pieces)):
        boxes[k] = _box(x, y, pieces[k, 0], pieces[k, 1], pieces[k, 2], columns, rows, samples)


@inner
def _visit(
    box: Any, tag: Any, a: Any, b: Any, c: Any, x: Any, y: Any, columns: int, rows: int, samples: int,
    top: int, bottom: int, n_columns: int, at: Any, entries: Any,
) -> None:  # fmt: skip
    """Count, or once `entries` has room store, one triangle in its tiles of tile rows top .. bottom."""
    if box == WIDE:
        x0, x1, y0, y1 = _pixel_box(x, y, a, b, c, columns, rows, samples)
        left, right, first, last = x0 >> 5, x1 >> 5, y0 >> 5, y1 >> 5
    else:
        bits: Any = np.int64(box)
        left, first = bits & 1023, (bits >> 10) & 1023
        right, last = left + ((bits >> 20) & 63), first + (bits >> 26)
    for tile_row in range(max(first, top), min(last, bottom - 1) + 1):
        for tile in range((tile_row - top) * n_columns + left, (tile_row - top) * n_columns + right + 1):
            if len(entries):
                entries[at[tile]] = tag
            at[tile] += 1


@kernel
def sort_into_tiles(
    faces: Any, x: Any, y: Any, spans: Any, first: Any, boxes: Any,
    pieces: Any, piece_position: Any, piece_boxes: Any, columns: int, rows: int, samples: int,
    begin: int, end: int, top: int, bottom: int, n_columns: int, at: Any, entries: Any,
) -> None:  # fmt: skip
    """Go through positions begin .. end in drawing order for the band of tile rows top .. bottom.

    With empty `entries`: add to at[tile] the number of triangles. Else write each into entries[at[tile]] and step
    on. A face is entered by its row, a clipped piece by len(faces) + its row.
    """
    k: Any = np.searchsorted(piece_position, begin)
    for s in range(len(spans)):
        low, high = max(begin, first[s]), min(end, first[s + 1])
        for position in range(low, high):
            box = boxes[position]
            if box == NOTHING:
                continue
            if box == CLIPPED:
                while k < len(piece_position) and piece_position[k] <= position:
                    a, b, c = pieces[k, 0], pieces[k, 1], pieces[k, 2]
                    if piece_boxes[k] != NOTHING:
                        tag = len(faces) + k
                        _visit(
                            piece_boxes[k], tag, a, b, c, x, y, columns, rows, samples,
                            top, bottom, n_columns, at, entries,
                        )  # fmt: skip
                    k += 1
                continue
            t = spans[s, 2] + position - first[s]
            _visit(
                box, t, faces[t, 0], faces[t, 1], faces[t, 2], x, y, columns, rows, samples,
                top, bottom, n_columns, at, entries,
            )  # fmt: skip


@kernel
def tile_starts(counts: Any, starts: Any) -> int:
    """Turn counts (chunks, tiles) into the place where each chunk writes; starts (tiles + 1,) per tile; the total."""
    total = 0
    for tile in range(counts.shape[1]):
        starts[tile] = total
        for chunk in range(counts.shape[0]):
            count = counts[chunk, tile]
            counts[chunk, tile] = total
            total += count
    starts[counts.shape[1]] = total
    return total

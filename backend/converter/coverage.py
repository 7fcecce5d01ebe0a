"""Kernels from edges to pixels: the exact area that each mark shows in each pixel, above hiding what is below.

A row of pixels is cut into slabs at every end and crossing of edges. Within a slab edges do not cross, so going along
it from left to right the mark on top is known from edge to edge, and every change of it adds its signed area to the
pixels to the right, by the sums of running areas that are common practice for glyphs. Two marks that share a side
therefore leave no seam, and a pixel does not depend on what is hidden in it. Areas are whole numbers of 2^-30 pixel,
so sums have no order.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ..compiled import inner, kernel
from ..contract import F64, I32, U8

I64 = NDArray[np.int64]

TILE_WIDTH, TILE_ROWS = 128, 32
WHOLE = 1 << 30
EVEN_ODD = 1
MOST_SLABS = 512
MOST_VISITS = 50_000
"""Most slabs of a row, and visits of edges in the slabs of a row of a tile: beyond, slabs are of equal height, edges in
them are ordered by their middles, and areas are no longer exact where edges begin, end or cross.
"""

_NEAR = 1e-7  # pixels: edges nearer than this over a whole slab are not said to cross


@kernel
def mark_boxes(edges: F64, mark_edges: I64) -> F64:
    """Left, top, right, bottom of each mark's edges (m,4), pixels; an empty box where it has none."""
    boxes = np.empty((len(mark_edges) - 1, 4))
    for mark in range(len(boxes)):
        left, top, right, bottom = np.inf, np.inf, -np.inf, -np.inf
        for row in range(mark_edges[mark], mark_edges[mark + 1]):
            x0, y0, x1, y1 = edges[row, 0], edges[row, 1], edges[row, 2], edges[row, 3]
            left, right = min(left, x0, x1), max(right, x0, x1)
            top, bottom = min(top, y0, y1), max(bottom, y0, y1)
        boxes[mark, 0], boxes[mark, 1], boxes[mark, 2], boxes[mark, 3] = left, top, right, bottom
    return boxes


@inner
def _edges_of_strip(edges: F64, mark_edges: I64, boxes: F64, top: float, bottom: float) -> tuple[F64, I64, I64, F64]:
    """Edges within rows top to bottom as (x0, y0, x1, y1, winding), downward; their marks, first rows, reach in x."""
    n_marks, n_edges = 0, 0
    for mark in range(len(boxes)):
        if boxes[mark, 1] < bottom and boxes[mark, 3] > top:
            n_marks += 1
            n_edges += mark_edges[mark + 1] - mark_edges[mark]
    found = np.empty((n_edges, 5))
    marks, firsts = np.empty(n_marks, np.int64), np.zeros(n_marks + 1, np.int64)
    reach = np.empty((n_marks, 2))
    n_marks, n_edges = 0, 0
    for mark in range(len(boxes)):
        if not (boxes[mark, 1] < bottom and boxes[mark, 3] > top):
            continue
        left, right = np.inf, -np.inf
        for row in range(mark_edges[mark], mark_edges[mark + 1]):
            x0, y0, x1, y1 = edges[row, 0], edges[row, 1], edges[row, 2], edges[row, 3]
            winding = 1.0
            if y0 > y1:
                x0, y0, x1, y1, winding = x1, y1, x0, y0, -1.0
            if y1 <= top or y0 >= bottom:
                continue
            # Cut from the whole edge, never from a part of it: where rows are divided must not show.
            slope = (x1 - x0) / (y1 - y0)
            xa, ya, xb, yb = x0, y0, x1, y1
            if ya < top:
                xa, ya = x0 + (top - y0) * slope, top
            if yb > bottom:
                xb, yb = x0 + (bottom - y0) * slope, bottom
            if yb > ya:
                found[n_edges, 0], found[n_edges, 1] = xa, ya
                found[n_edges, 2], found[n_edges, 3] = xb, yb
                found[n_edges, 4] = winding
                left, right = min(left, xa, xb), max(right, xa, xb)
                n_edges += 1
        if n_edges > firsts[n_marks]:
            marks[n_marks] = mark
            reach[n_marks, 0], reach[n_marks, 1] = left, right
            n_marks += 1
            firsts[n_marks] = n_edges
    return found[:n_edges], marks[:n_marks], firsts[: n_marks + 1], reach[:n_marks]


@inner
def _put(tile: F64, n: int, xa: float, ya: float, xb: float, yb: float, winding: float, slot: int) -> int:
    if yb > ya:
        tile[n, 0], tile[n, 1], tile[n, 2], tile[n, 3], tile[n, 4], tile[n, 5] = xa, ya, xb, yb, winding, slot
        return n + 1
    return n


@inner
def _edges_of_tile(strip: F64, first: int, last: int, left: float, width: float, slot: int, tile: F64, n: int) -> int:
    """Append a mark's edges as seen from a tile: what lies left of it moved to its rim, what lies right dropped.

    Rows (x0, y0, x1, y1, winding, slot), x from the tile's left side.
    """
    for row in range(first, last):
        x0, y0, x1, y1, winding = (
            strip[row, 0] - left,
            strip[row, 1],
            strip[row, 2] - left,
            strip[row, 3],
            strip[row, 4],
        )
        if x0 <= 0.0 and x1 <= 0.0:
            n = _put(tile, n, 0.0, y0, 0.0, y1, winding, slot)
            continue
        if x0 >= width and x1 >= width:
            continue
        if x0 >= 0.0 and x1 >= 0.0 and x0 <= width and x1 <= width:
            n = _put(tile, n, x0, y0, x1, y1, winding, slot)
            continue
        slope = (y1 - y0) / (x1 - x0)
        y_left = min(max(y0 - x0 * slope, y0), y1)
        y_right = min(max(y0 + (width - x0) * slope, y0), y1)
        ya, yb, xa, xb = y0, y1, x0, x1
        if x0 < 0.0:
            n = _put(tile, n, 0.0, y0, 0.0, y_left, winding, slot)
            xa, ya = 0.0, y_left
        elif x0 > width:
            xa, ya = width, y_right
        if x1 < 0.0:
            n = _put(tile, n, 0.0, y_left, 0.0, y1, winding, slot)
            xb, yb = 0.0, y_left
        elif x1 > width:
            xb, yb = width, y_right
        n = _put(tile, n, xa, ya, xb, yb, winding, slot)
    return n


@inner
def _covers(tile: F64, first: int, last: int, top: float, bottom: float, rule: int) -> bool:
    """Whether a mark's edges in a tile are nothing but its left rim from top to bottom, with ink to the right."""
    winding = 0
    for row in range(first, last):
        if tile[row, 0] != 0.0 or tile[row, 2] != 0.0 or tile[row, 1] != top or tile[row, 3] != bottom:
            return False
        winding += int(tile[row, 4])
    return winding % 2 != 0 if rule == EVEN_ODD else winding != 0


@inner
def _add(sums: I64, xa: float, xb: float, height: int, change: I64) -> None:
    """Add `change` times the area right of an edge from xa to xb, `height` 2^-30 of a row, to the pixels it meets."""
    if xa > xb:
        xa, xb = xb, xa
    first, last = int(xa), int(xb)
    if first == last or xb - xa < 1e-9:
        right = int(np.rint(((xa + xb) / 2.0 - first) * height))
        for k in range(len(change)):
            sums[first, k] += change[k] * (height - right)
            sums[first + 1, k] += change[k] * right
        return
    per_pixel = height / (xb - xa)
    done = 0
    for column in range(first, last + 1):
        enter, leave = max(xa, float(column)), min(xb, float(column + 1))
        if column == last:
            share = height - done
        else:
            share = int(np.rint((leave - xa) * per_pixel)) - done
        done += share
        right = int(np.rint(((enter + leave) / 2.0 - column) * share))
        for k in range(len(change)):
            sums[column, k] += change[k] * (share - right)
            sums[column + 1, k] += change[k] * right


@inner
def _walk(
    xs: F64,
    order: I64,
    n: int,
    active: I64,
    tile: F64,
    rules: I64,
    inks: I64,
    height: int,
    sums: I64,
    wound: I64,
    change: I64,
) -> None:
    """Go along one slab from left to right and add what every change of the mark on top changes.

    xs (k,2) where each of the `active` edges enters and leaves the slab, `order` its n edges from left to right.
    """
    top = -1
    for place in range(n):
        k = order[place]
        edge = active[k]
        slot = int(tile[edge, 5])
        was = wound[slot] % 2 != 0 if rules[slot] == EVEN_ODD else wound[slot] != 0
        wound[slot] += int(tile[edge, 4])
        now = wound[slot] % 2 != 0 if rules[slot] == EVEN_ODD else wound[slot] != 0
        if was == now:
            continue
        before = top
        if now:
            top = max(top, slot)
        elif slot == top:
            top = slot - 1
            while top >= 0 and not (wound[top] % 2 != 0 if rules[top] == EVEN_ODD else wound[top] != 0):
                top -= 1
        if top != before:
            is_other = False
            for channel in range(len(change)):
                change[channel] = inks[top + 1, channel] - inks[before + 1, channel]
                is_other = is_other or change[channel] != 0
            if is_other:
                _add(sums, xs[k, 0], xs[k, 1], height, change)
    for place in range(n):
        wound[int(tile[active[order[place]], 5])] = 0


@inner
def _sort_values(values: F64, n: int) -> None:
    for k in range(1, n):
        value = values[k]
        place = k - 1
        while place >= 0 and values[place] > value:
            values[place + 1] = values[place]
            place -= 1
        values[place + 1] = value


@inner
def _sort(keys: F64, column: int, order: I64, n: int) -> None:
    """Insertion sort of order[:n] by a column of keys, stable; edges come nearly in order from the row above."""
    for k in range(1, n):
        item = order[k]
        key = keys[item, column]
        place = k - 1
        while place >= 0 and keys[order[place], column] > key:
            order[place + 1] = order[place]
            place -= 1
        order[place + 1] = item


@inner
def _crossings(xs: F64, order: I64, n: int, top: float, height: float, cuts: F64, most: int) -> int:
    """Put the heights at which edges of a slab cross into `cuts`, at most so many, sorting by where they leave."""
    n_cuts = 0
    for k in range(1, n):
        item = order[k]
        place = k - 1
        while place >= 0 and xs[order[place], 1] > xs[item, 1]:
            other = order[place]
            above, below = xs[item, 0] - xs[other, 0], xs[other, 1] - xs[item, 1]
            if above > _NEAR and below > _NEAR and n_cuts < most:
                cuts[n_cuts] = top + height * (above / (above + below))
                n_cuts += 1
            order[place + 1] = other
            place -= 1
        order[place + 1] = item
    return n_cuts


@inner
def _across(tile: F64, active: I64, n: int, top: float, bottom: float, xs: F64, order: I64) -> int:
    """Find the edges across a slab: their x at its top and bottom and the sum into `xs`, their places into `order`."""
    middle = (top + bottom) / 2.0
    n_here = 0
    for k in range(n):
        x0, y0, x1, y1 = tile[active[k], 0], tile[active[k], 1], tile[active[k], 2], tile[active[k], 3]
        if y0 <= middle < y1:
            slope = (x1 - x0) / (y1 - y0)
            low, high = min(x0, x1), max(x0, x1)
            xs[k, 0] = min(max(x0 + (top - y0) * slope, low), high)
            xs[k, 1] = min(max(x0 + (bottom - y0) * slope, low), high)
            xs[k, 2] = xs[k, 0] + xs[k, 1]
            order[n_here] = k
            n_here += 1
    return n_here


@inner
def _ends(tile: F64, active: I64, n: int, y: float, most: int, cuts: F64) -> int:
    """Heights within row y to y + 1 at which edges begin or end, and its two sides; equal steps if over `most`."""
    n_cuts = 2
    cuts[0], cuts[1] = y, y + 1.0
    for k in range(n):
        for end in (tile[active[k], 1], tile[active[k], 3]):
            if y < end < y + 1.0:
                if n_cuts < most:
                    cuts[n_cuts] = end
                n_cuts += 1
    if n_cuts > most:
        n_cuts = most
        for k in range(n_cuts):
            cuts[k] = y + k / (n_cuts - 1)
    _sort_values(cuts, n_cuts)
    return n_cuts


@inner
def _row(
    tile: F64,
    active: I64,
    n: int,
    y: float,
    rules: I64,
    inks: I64,
    sums: I64,
    wound: I64,
    xs: F64,
    order: I64,
    cuts: F64,
    change: I64,
) -> None:
    """Add the row of pixels from y to y + 1 of a tile with n `active` edges. `cuts` (2, c) is room for heights."""
    most = min(MOST_SLABS, max(16, MOST_VISITS // n))
    n_ends = _ends(tile, active, n, y, most, cuts[0])
    finer = cuts[1]
    most = 2 + most // n_ends
    for slab in range(n_ends - 1):
        top, bottom = cuts[0, slab], cuts[0, slab + 1]
        if np.rint((bottom - y) * WHOLE) == np.rint((top - y) * WHOLE):
            continue
        n_here = _across(tile, active, n, top, bottom, xs, order)
        _sort(xs, 0, order, n_here)
        n_finer = _crossings(xs, order, n_here, top, bottom - top, finer, most)
        if n_finer == 0:
            height = int(np.rint((bottom - y) * WHOLE)) - int(np.rint((top - y) * WHOLE))
            _walk(xs, order, n_here, active, tile, rules, inks, height, sums, wound, change)
            continue
        finer[n_finer], finer[n_finer + 1] = top, bottom
        n_finer += 2
        _sort_values(finer, n_finer)
        for part in range(n_finer - 1):
            low, high = finer[part], finer[part + 1]
            height = int(np.rint((high - y) * WHOLE)) - int(np.rint((low - y) * WHOLE))
            if height > 0:
                n_here = _across(tile, active, n, low, high, xs, order)
                _sort(xs, 2, order, n_here)
                _walk(xs, order, n_here, active, tile, rules, inks, height, sums, wound, change)


@inner
def _image_level(
    pixels: U8, firsts: I64, shapes: I32, places: F64, image: int, x: float, y: float, channel: int, n_channels: int
) -> float:
    """Mean level of a picture under the page pixel at column x, row y. Arrays as in `paint_strip`."""
    first, rows, columns = firsts[image], shapes[image, 0], shapes[image, 1]
    across, down = columns / places[image, 2], rows / places[image, 3]
    u0, u1 = (x - places[image, 0]) * across, (x + 1.0 - places[image, 0]) * across
    v0, v1 = (y - places[image, 1]) * down, (y + 1.0 - places[image, 1]) * down
    u0, u1 = min(max(u0, 0.0), float(columns)), min(max(u1, 0.0), float(columns))
    v0, v1 = min(max(v0, 0.0), float(rows)), min(max(v1, 0.0), float(rows))
    total, weight = 0.0, 0.0
    for row in range(int(v0), min(int(np.ceil(v1)), rows)):
        tall = min(v1, row + 1.0) - max(v0, float(row))
        for column in range(int(u0), min(int(np.ceil(u1)), columns)):
            wide = min(u1, column + 1.0) - max(u0, float(column))
            total += tall * wide * pixels[first + (row * columns + column) * n_channels + channel]
            weight += tall * wide
    return total / weight if weight > 0.0 else 0.0


@inner
def _tile(
    strip: F64,
    marks: I64,
    firsts: I64,
    reach: F64,
    mark_rule: U8,
    left: float,
    width: int,
    top: float,
    bottom: float,
    tile: F64,
    used: I64,
    slots: I64,
) -> tuple[int, int]:
    """Collect the edges of one tile in painting order into `tile`; slots[:n] are its marks. Returns edges and marks.

    A mark that covers the tile makes it forget all marks below. used (marks,) is room for the rule of each slot.
    """
    n, n_slots = 0, 0
    for k in range(len(marks)):
        if reach[k, 0] >= left + width or reach[k, 1] <= left:
            continue
        before = n
        n = _edges_of_tile(strip, firsts[k], firsts[k + 1], left, float(width), n_slots, tile, n)
        if n == before:
            continue
        mark = marks[k]
        used[n_slots], slots[n_slots] = mark_rule[mark], mark
        if _covers(tile, before, n, top, bottom, used[n_slots]):
            used[0], slots[0] = used[n_slots], mark
            for row in range(before, n):
                for column in range(5):
                    tile[row - before, column] = tile[row, column]
                tile[row - before, 5] = 0.0
            n -= before
            n_slots = 0
        n_slots += 1
    return n, n_slots


@kernel
def paint_strip(
    edges: F64,
    mark_edges: I64,
    boxes: F64,
    mark_rule: U8,
    mark_ink: I64,
    mark_image: I32,
    image_pixels: U8,
    image_first: I64,
    image_shape: I32,
    image_place: F64,
    paper: I64,
    first_row: int,
    out: U8,
) -> None:
    """Paint rows of a page, `out` (rows, columns, channels) from row `first_row` on, at most TILE_ROWS of them.

    Edges (n,4) in pixels, those of mark k from row mark_edges[k] to mark_edges[k+1], `boxes` (m,4) as of `mark_boxes`;
    mark_rule (m,) EVEN_ODD or 0 for nonzero; mark_ink (m,c) levels 0 to 255 a channel, `paper` (c,) those of the page;
    mark_image (m,) the picture that shows in the mark instead of an ink, or -1: its pixels, as many channels as `out`
    has, lie in image_pixels from image_first on, its shape is (rows, columns), its place (left, top, width, height) in
    pixels of the page. A row comes out the same whatever rows are painted with it, as long as first_row is a multiple
    of TILE_ROWS.
    """
    rows, columns = out.shape[0], out.shape[1]
    top, bottom = float(first_row), float(first_row + rows)
    strip, marks, firsts, reach = _edges_of_strip(edges, mark_edges, boxes, top, bottom)
    most = 3 * len(strip) + 1
    tile, xs, cuts = np.empty((most, 6)), np.empty((most, 3)), np.empty((2, MOST_SLABS + 2))
    active, order, waiting = np.empty(most, np.int64), np.empty(most, np.int64), np.empty(most, np.int64)
    heads = np.empty(rows, np.int64)
    rules, slots = np.empty(len(marks) + 1, np.int64), np.empty(len(marks) + 1, np.int64)
    wound = np.zeros(len(marks) + 1, np.int64)
    for left in range(0, columns, TILE_WIDTH):
        width = min(TILE_WIDTH, columns - left)
        n, n_slots = _tile(strip, marks, firsts, reach, mark_rule, float(left), width, top, bottom, tile, rules, slots)
        inks, images = _inks(slots, n_slots, mark_ink, mark_image, paper)
        total = inks.shape[1]
        sums, change = np.zeros((width + 2, total), np.int64), np.empty(total, np.int64)
        _queue(tile, n, top, heads, waiting)
        n_active = 0
        for row in range(rows):
            y = top + row
            n_active = _turn_over(tile, active, n_active, y, heads[row], waiting, xs)
            if n_active == 0:
                for column in range(left, left + width):
                    for channel in range(len(paper)):
                        out[row, column, channel] = paper[channel]
                continue
            _row(tile, active, n_active, y, rules, inks, sums, wound, xs, order, cuts, change)
            _finish(sums, paper, images, image_pixels, image_first, image_shape, image_place, left, y, out, row, width)


@inner
def _inks(slots: I64, n_slots: int, mark_ink: I64, mark_image: I32, paper: I64) -> tuple[I64, I64]:
    """Levels of the paper and of each slot (n_slots + 1, c), one more channel for each picture, and those pictures."""
    n_channels, n_images = len(paper), 0
    for slot in range(n_slots):
        if mark_image[slots[slot]] >= 0:
            n_images += 1
    inks, images = np.zeros((n_slots + 1, n_channels + n_images), np.int64), np.empty(n_images, np.int64)
    for channel in range(n_channels):
        inks[0, channel] = paper[channel]
    n_images = 0
    for slot in range(n_slots):
        mark = slots[slot]
        if mark_image[mark] >= 0:
            inks[slot + 1, n_channels + n_images] = 1
            images[n_images] = mark_image[mark]
            n_images += 1
        else:
            for channel in range(n_channels):
                inks[slot + 1, channel] = mark_ink[mark, channel]
    return inks, images


@inner
def _queue(tile: F64, n: int, top: float, heads: I64, waiting: I64) -> None:
    """List the edges of a tile by the row they begin in: heads (rows,) the first or -1, waiting (n,) the next or -1."""
    for row in range(len(heads)):
        heads[row] = -1
    for k in range(n - 1, -1, -1):
        row = int(tile[k, 1] - top)
        waiting[k] = heads[row]
        heads[row] = k


@inner
def _turn_over(tile: F64, active: I64, n: int, y: float, head: int, waiting: I64, keys: F64) -> int:
    """Drop edges that ended above row y from `active`, add those that begin in it, order them from left to right."""
    kept = 0
    for k in range(n):
        if tile[active[k], 3] > y:
            active[kept] = active[k]
            kept += 1
    while head >= 0:
        active[kept] = head
        kept += 1
        head = waiting[head]
    for k in range(kept):
        edge = active[k]
        x0, y0, x1, y1 = tile[edge, 0], tile[edge, 1], tile[edge, 2], tile[edge, 3]
        middle = min(max(y + 0.5, y0), y1)
        keys[edge, 0] = x0 + (middle - y0) * ((x1 - x0) / (y1 - y0))
    _sort(keys, 0, active, kept)
    return kept


@inner
def _finish(
    sums: I64,
    paper: I64,
    images: I64,
    image_pixels: U8,
    image_first: I64,
    image_shape: I32,
    image_place: F64,
    left: int,
    y: float,
    out: U8,
    row: int,
    width: int,
) -> None:
    """Sum up a row of a tile, write its levels to the nearest, halves up, and clear the sums."""
    n_channels = out.shape[2]
    for column in range(width):
        if column > 0:
            for k in range(sums.shape[1]):
                sums[column, k] += sums[column - 1, k]
        for channel in range(n_channels):
            level = paper[channel] * WHOLE + sums[column, channel]
            for k in range(len(images)):
                seen = sums[column, n_channels + k]
                if seen > 0:
                    image = images[k]
                    mean = _image_level(
                        image_pixels,
                        image_first,
                        image_shape,
                        image_place,
                        image,
                        float(left + column),
                        y,
                        channel,
                        n_channels,
                    )
                    level += int(np.rint(mean * seen))
            out[row, left + column, channel] = min(max((level + WHOLE // 2) >> 30, 0), 255)
    for column in range(width + 2):
        for k in range(sums.shape[1]):
            sums[column, k] = 0

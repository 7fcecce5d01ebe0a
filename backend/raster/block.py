"""Eight samples at once: cover, compare depth, store. As vector code and as a plain loop with the same results.

A block is 8 consecutive samples of a tile: 2 pixels of 4 samples or 8 pixels of 1. Positions are in 1/16 px
from the block's first pixel. The 4 samples stand on a rotated grid, each alone in its row and column of quarters.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from llvmlite import ir
from numba import types
from numba.core import cgutils
from numba.extending import intrinsic

from ..compiled import kernel

LANES = 8
SAMPLE_X, SAMPLE_Y = (6, 14, 2, 10), (2, 6, 10, 14)


def lane_positions(samples: int) -> tuple[list[int], list[int]]:
    """Positions of the 8 lanes in 1/16 px, for 1 or 4 samples a pixel."""
    if samples == 1:
        return [16 * lane + 8 for lane in range(LANES)], [8] * LANES
    return [16 * (lane // 4) + SAMPLE_X[lane % 4] for lane in range(LANES)], [SAMPLE_Y[k % 4] for k in range(LANES)]


def _vector_block(samples: int) -> Callable[..., Any]:
    columns, rows = lane_positions(samples)

    def cover(
        _context: Any, depth: Any, face: Any, offset: Any, e0: Any, e1: Any, e2: Any, a0: Any, a1: Any, a2: Any,
        b0: Any, b1: Any, b2: Any, z: Any, zx: Any, zy: Any, tag: Any,
    ) -> Any:  # fmt: skip
        arguments = [depth, face, types.intp, *[types.int32] * 9, *[types.float32] * 3, types.int32]
        return types.void(*arguments), generate

    def generate(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        depths, faces, offset, e0, e1, e2, a0, a1, a2, b0, b1, b2, z, zx, zy, tag = arguments
        word, real = ir.IntType(32), ir.FloatType()
        words, reals = ir.VectorType(word, LANES), ir.VectorType(real, LANES)
        zeros = ir.Constant(words, [0] * LANES)

        def splat(value: Any, vector: Any) -> Any:
            undefined = ir.Constant(vector, ir.Undefined)
            first = builder.insert_element(undefined, value, ir.Constant(word, 0))
            return builder.shuffle_vector(first, undefined, zeros)

        x, y = ir.Constant(words, columns), ir.Constant(words, rows)
        xf, yf = (ir.Constant(reals, [float(v) for v in values]) for values in (columns, rows))

        def edge(start: Any, a: Any, b: Any) -> Any:
            step = builder.add(builder.mul(splat(a, words), x), builder.mul(splat(b, words), y))
            return builder.add(splat(start, words), step)

        outside = builder.or_(builder.or_(edge(e0, a0, b0), edge(e1, a1, b1)), edge(e2, a2, b2))
        slope = builder.fadd(builder.fmul(splat(zx, reals), xf), builder.fmul(splat(zy, reals), yf))
        new_depth = builder.fadd(splat(z, reals), slope)

        def pointer(array: int, value: Any, vector: Any) -> Any:
            data = context.make_array(signature.args[array])(context, builder, value=value).data
            return builder.bitcast(builder.gep(data, [offset]), vector.as_pointer())

        depth_at, face_at = pointer(0, depths, reals), pointer(1, faces, words)
        old_depth, old_face = builder.load(depth_at, align=4), builder.load(face_at, align=4)
        is_inside = builder.icmp_signed(">=", outside, zeros)
        # The lesser depth, rather than a choice by mask, keeps the compiler from masked stores: they are slow on some
        # processors. Depths are never NaN: areas are not zero and planes are finite.
        new_depth = builder.select(is_inside, new_depth, ir.Constant(reals, [float("inf")] * LANES))
        wins = builder.fcmp_ordered("<", new_depth, old_depth)
        lesser_type = ir.FunctionType(reals, [reals, reals])
        insert: Any = cgutils.get_or_insert_function
        lesser = insert(builder.module, lesser_type, f"llvm.minnum.v{LANES}f32")
        builder.store(builder.call(lesser, [new_depth, old_depth], fastmath=("nnan",)), depth_at, align=4)
        builder.store(builder.select(wins, splat(tag, words), old_face), face_at, align=4)
        return context.get_dummy_value()

    return cover


def _plain_block(samples: int) -> Callable[..., None]:
    columns, rows = (np.array(values, np.int32) for values in lane_positions(samples))

    def cover(
        depth: Any, face: Any, offset: int, e0: int, e1: int, e2: int, a0: int, a1: int, a2: int,
        b0: int, b1: int, b2: int, z: Any, zx: Any, zy: Any, tag: int,
    ) -> None:  # fmt: skip
        for lane in range(LANES):
            x, y = columns[lane], rows[lane]
            is_inside = (e0 + a0 * x + b0 * y) | (e1 + a1 * x + b1 * y) | (e2 + a2 * x + b2 * y)
            new_depth = z + (zx * np.float32(x) + zy * np.float32(y))
            if is_inside >= 0 and new_depth < depth[offset + lane]:
                depth[offset + lane] = new_depth
                face[offset + lane] = tag

    return cover


# cover(depth, face, offset, e, a, b per edge, depth at the block, its slopes, tag): e + a x + b y >= 0 is inside, the
# smaller depth wins, and on equal depth the one drawn first.
cover_1, cover_4 = intrinsic(_vector_block(1)), intrinsic(_vector_block(4))


def plain_cover(samples: int) -> Callable[..., None]:
    """Return the plain-loop twin of `cover_1` or `cover_4`, for tests."""
    return kernel(_plain_block(samples))

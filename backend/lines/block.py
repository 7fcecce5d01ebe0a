"""Eight boxes against one at once: as vector code, and as a plain loop with the same results."""

from __future__ import annotations

from typing import Any

from llvmlite import ir
from numba import types
from numba.core import cgutils
from numba.extending import intrinsic

from ..compiled import kernel

WIDE = 8


def _meet(
    _context: Any, boxes: Any, q: Any, left: Any, top: Any, right: Any, bottom: Any, far: Any
) -> Any:  # fmt: skip
    return types.int32(boxes, types.intp, *[types.float32] * 5), _generate_meet


def _generate_meet(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
    boxes, q, left, top, right, bottom, far = arguments
    word, reals = ir.IntType(32), ir.VectorType(ir.FloatType(), WIDE)
    data = context.make_array(signature.args[0])(context, builder, value=boxes).data
    first = builder.mul(q, ir.Constant(q.type, 5 * WIDE))

    def splat(value: Any) -> Any:
        undefined = ir.Constant(reals, ir.Undefined)
        one = builder.insert_element(undefined, value, ir.Constant(word, 0))
        return builder.shuffle_vector(one, undefined, ir.Constant(ir.VectorType(word, WIDE), [0] * WIDE))

    def side(k: int) -> Any:
        offset = builder.add(first, ir.Constant(q.type, k * WIDE))
        return builder.load(builder.bitcast(builder.gep(data, [offset]), reals.as_pointer()), align=4)

    is_met = builder.fcmp_ordered("<=", side(0), splat(right))
    for k, order, value in ((1, "<=", bottom), (2, ">=", left), (3, ">=", top), (4, "<=", far)):
        is_met = builder.and_(is_met, builder.fcmp_ordered(order, side(k), splat(value)))
    return builder.zext(builder.bitcast(is_met, ir.IntType(WIDE)), word)


def _lowest(_context: Any, bits: Any) -> Any:
    def generate(_context: Any, builder: Any, _signature: Any, arguments: Any) -> Any:
        word, flag = ir.IntType(32), ir.IntType(1)
        insert: Any = cgutils.get_or_insert_function
        count = insert(builder.module, ir.FunctionType(word, [word, flag]), "llvm.cttz.i32")
        return builder.zext(builder.call(count, [arguments[0], ir.Constant(flag, 1)]), ir.IntType(64))

    return types.int64(types.int32), generate


# meet(boxes, q, left, top, right, bottom, far): bits of the eight boxes of block q, (q,5,8) float32, that meet a box on
# the page and begin before a depth. Boxes are least x, y, greatest x, y, least depth; what only touches meets.
# lowest(bits): the place of the lowest bit that is set; there must be one.
meet: Any = intrinsic(_meet)
lowest: Any = intrinsic(_lowest)


@kernel
def plain_meet(boxes: Any, q: int, left: Any, top: Any, right: Any, bottom: Any, far: Any) -> int:
    """The plain twin of `meet`, for tests."""
    bits = 0
    for k in range(WIDE):
        if (
            boxes[q, 0, k] <= right and boxes[q, 1, k] <= bottom and boxes[q, 2, k] >= left
            and boxes[q, 3, k] >= top and boxes[q, 4, k] <= far
        ):  # fmt: skip
            bits |= 1 << k
    return bits

"""Vector steps: eight boxes against a ray, four triangles against a ray, eight bounds widened at once.

Each is there as vector code and as a plain loop that gives the same bits (boxes apart: there a multiplication and an
addition may be fused where the processor can, which nothing but the number of boxes visited depends on).
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

WIDE = 8  # children of a node
NODE = 8 * WIDE  # numbers of a node: least x of each child, greatest x, least y and so on, links to them, and 8 unused
LINKS = 6 * WIDE  # where the links stand, int32: a node, -1 less a leaf, or `EMPTY`
EMPTY = np.int32(-(2**31))  # in place of a child that is not there
LEAF = 4  # triangles of a leaf
BLOCK = 9 * LEAF  # numbers of a leaf: x of each first corner, y, z, x of each second corner ...

_WORD, _REAL = ir.IntType(32), ir.FloatType()


def _splat(builder: Any, value: Any, lanes: int) -> Any:
    undefined = ir.Constant(ir.VectorType(_REAL, lanes), ir.Undefined)
    one = builder.insert_element(undefined, value, ir.Constant(_WORD, 0))
    return builder.shuffle_vector(one, undefined, ir.Constant(ir.VectorType(_WORD, lanes), [0] * lanes))


def _pointer(context: Any, builder: Any, kind: Any, array: Any, offset: Any, lanes: int) -> Any:
    data = context.make_array(kind)(context, builder, value=array).data
    return builder.bitcast(builder.gep(data, [offset]), ir.VectorType(_REAL, lanes).as_pointer())


def _called(builder: Any, name: str, lanes: int, *values: Any) -> Any:
    vector = ir.VectorType(_REAL, lanes)
    declared = ir.FunctionType(vector, [vector] * len(values))
    insert: Any = cgutils.get_or_insert_function
    return builder.call(insert(builder.module, declared, f"llvm.{name}.v{lanes}f32"), values)


def _least(builder: Any, a: Any, b: Any) -> Any:
    return builder.select(builder.fcmp_ordered("<", a, b), a, b)


def _greatest(builder: Any, a: Any, b: Any) -> Any:
    return builder.select(builder.fcmp_ordered(">", a, b), a, b)


def _enter(
    _context: Any, boxes: Any, near: Any, first: Any, sx: Any, sy: Any, sz: Any, px: Any, py: Any, pz: Any,
    ix: Any, iy: Any, iz: Any, reach: Any,
) -> Any:  # fmt: skip
    return types.int32(boxes, near, *[types.intp] * 4, *[types.float32] * 7), _generate_enter


def _generate_enter(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
    boxes, near, first, sx, sy, sz, px, py, pz, ix, iy, iz, reach = arguments
    enter, leave = _splat(builder, ir.Constant(_REAL, 0.0), WIDE), _splat(builder, reach, WIDE)
    for axis, (side, place, inverse) in enumerate(((sx, px, ix), (sy, py, iy), (sz, pz, iz))):
        start = builder.add(first, ir.Constant(first.type, 2 * WIDE * axis))
        offset = (builder.add(start, side), builder.sub(builder.add(start, ir.Constant(first.type, WIDE)), side))
        low, high = (
            builder.load(_pointer(context, builder, signature.args[0], boxes, at, WIDE), align=4) for at in offset
        )
        slope, shift = _splat(builder, inverse, WIDE), builder.fneg(_splat(builder, place, WIDE))
        enter = _greatest(builder, _called(builder, "fmuladd", WIDE, low, slope, shift), enter)
        leave = _least(builder, _called(builder, "fmuladd", WIDE, high, slope, shift), leave)
    zero = ir.Constant(first.type, 0)
    builder.store(enter, _pointer(context, builder, signature.args[1], near, zero, WIDE), align=4)
    met = builder.fcmp_ordered("<=", enter, leave)
    return builder.zext(builder.bitcast(met, ir.IntType(WIDE)), _WORD)


# enter(boxes, near, first, side of x, y, z, origin / direction of x, y, z, 1 / direction of x, y, z, reach): mask of
# the children of the node at boxes[first] that the ray meets within its reach; writes where it enters each to near.
# A side is 0, or WIDE for an axis that the ray runs down.
enter: Any = intrinsic(_enter)


@kernel
def plain_enter(
    boxes: Any, near: Any, first: int, sx: int, sy: int, sz: int, px: Any, py: Any, pz: Any, ix: Any, iy: Any, iz: Any,
    reach: Any,
) -> Any:  # fmt: skip
    """Twin of `enter`, for tests."""
    met: Any = 0
    sides, places, inverses = (sx, sy, sz), (px, py, pz), (ix, iy, iz)
    for lane in range(WIDE):
        low, high = np.float32(0.0), np.float32(reach)
        for axis in range(3):
            at = first + 2 * WIDE * axis + lane
            low = max(low, boxes[at + sides[axis]] * inverses[axis] - places[axis])
            high = min(high, boxes[at + WIDE - sides[axis]] * inverses[axis] - places[axis])
        near[lane] = low
        met |= (low <= high) << lane
    return np.int32(met)


def _pierce(
    _context: Any, corners: Any, first: Any, u: Any, v: Any, w: Any, ou: Any, ov: Any, ow: Any, su: Any, sv: Any
) -> Any:  # fmt: skip
    return types.int32(corners, *[types.intp] * 4, *[types.float32] * 5), _generate_pierce


def _generate_pierce(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
    corners, first, u, v, w, *rest = arguments
    ou, ov, ow, su, sv = (_splat(builder, value, LEAF) for value in rest)

    def along(k: int, axis: Any, origin: Any) -> Any:
        at = builder.add(builder.add(first, ir.Constant(first.type, 3 * LEAF * k)), axis)
        value = builder.load(_pointer(context, builder, signature.args[0], corners, at, LEAF), align=4)
        return builder.fsub(value, origin)

    def aside(k: int) -> Any:
        far = along(k, w, ow)
        return tuple(
            builder.fsub(along(k, axis, origin), builder.fmul(slope, far))
            for axis, origin, slope in ((u, ou, su), (v, ov, sv))
        )

    def turn(p: Any, q: Any) -> Any:
        return builder.fsub(builder.fmul(p[0], q[1]), builder.fmul(p[1], q[0]))

    a, b, c = aside(0), aside(1), aside(2)
    sides = (turn(c, b), turn(a, c), turn(b, a))
    zero = _splat(builder, ir.Constant(_REAL, 0.0), LEAF)
    both = []
    for order in (">=", "<="):
        tests = [builder.fcmp_ordered(order, side, zero) for side in sides]
        both.append(builder.and_(builder.and_(tests[0], tests[1]), tests[2]))
    return builder.zext(builder.bitcast(builder.or_(*both), ir.IntType(LEAF)), _WORD)


# pierce(corners, first, axes u, v, w times LEAF, origin along them, slopes u / w, v / w of the direction): mask of the
# triangles of the leaf at corners[first] whose three sides the ray passes on one hand. w is the direction's longest
# axis. Corners are sheared into the plane across the ray, each with the same roundings in every triangle, and a
# difference of two rounded products never has the wrong sign, at worst it is 0, which passes on either hand. So no ray
# slips through between triangles, not at a corner either (Woop, Benthin and Wald 2013). Lanes of NaN are not met.
pierce: Any = intrinsic(_pierce)


@kernel
def plain_pierce(
    corners: Any, first: int, u: int, v: int, w: int, ou: Any, ov: Any, ow: Any, su: Any, sv: Any
) -> Any:  # fmt: skip
    """Twin of `pierce`, for tests."""
    met = 0
    x, y, side = np.empty(3, np.float32), np.empty(3, np.float32), np.empty(3, np.float32)
    for lane in range(LEAF):
        for k in range(3):
            at = first + 3 * LEAF * k + lane
            far = corners[at + w] - ow
            x[k], y[k] = (corners[at + u] - ou) - su * far, (corners[at + v] - ov) - sv * far
        for k in range(3):
            p, q = (k + 2) % 3, (k + 1) % 3
            side[k] = x[p] * y[q] - y[p] * x[q]
        left, right = side[0] >= 0 and side[1] >= 0 and side[2] >= 0, side[0] <= 0 and side[1] <= 0 and side[2] <= 0
        met |= (left or right) << lane
    return np.int32(met)


def _lowest(_context: Any, mask: Any) -> Any:
    def generate(_context: Any, builder: Any, _signature: Any, arguments: Any) -> Any:
        return builder.cttz(arguments[0], ir.IntType(1)(1))

    return types.int32(types.int32), generate


# lowest(mask): number of the lowest bit that is set; the mask is not 0.
lowest: Any = intrinsic(_lowest)


def _fetch(_context: Any, array: Any, first: Any) -> Any:
    def generate(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        data = context.make_array(signature.args[0])(context, builder, value=arguments[0]).data
        byte = ir.IntType(8).as_pointer()
        declared = ir.FunctionType(ir.VoidType(), [byte, _WORD, _WORD, _WORD])
        insert: Any = cgutils.get_or_insert_function
        call = insert(builder.module, declared, "llvm.prefetch.p0i8")
        for line in range(4):
            offset = builder.add(arguments[1], ir.Constant(arguments[1].type, 16 * line))
            place = builder.bitcast(builder.gep(data, [offset]), byte)
            builder.call(call, [place, ir.Constant(_WORD, 0), ir.Constant(_WORD, 3), ir.Constant(_WORD, 1)])
        return context.get_dummy_value()

    return types.void(array, types.intp), generate


# fetch(array, first): ask for the 256 bytes from array[first] on, which will be needed soon. Without it rays that run
# in all directions are a third slower.
fetch: Any = intrinsic(_fetch)


def _widening(of_middles: bool) -> Callable[..., Any]:
    def widen(_context: Any, bounds: Any, at: Any, rows: Any, row: Any) -> Any:
        return types.void(bounds, types.intp, rows, types.intp), generate

    def generate(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        bounds, at, rows, row = arguments
        place = _pointer(context, builder, signature.args[0], bounds, at, 8)
        start = builder.mul(row, ir.Constant(row.type, 8))
        value = builder.load(_pointer(context, builder, signature.args[2], rows, start, 8), align=4)
        if of_middles:
            swap = ir.Constant(ir.VectorType(_WORD, 8), [4, 5, 6, 7, 0, 1, 2, 3])
            value = builder.fsub(value, builder.shuffle_vector(value, ir.Constant(value.type, ir.Undefined), swap))
        builder.store(_least(builder, value, builder.load(place, align=4)), place, align=4)
        return context.get_dummy_value()

    return widen


# widen(bounds, at, rows, row): bounds[at : at + 8] become the least of themselves and the row, a box written as least
# x, y, z, 0, negative greatest x, y, z, 0. widen_middles does the same with the box of one point: twice the row's
# middle.
widen: Any = intrinsic(_widening(False))
widen_middles: Any = intrinsic(_widening(True))

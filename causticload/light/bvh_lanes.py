"""Eight boxes against one ray at once, in the processor's vector registers.

Numba gives no vector types, and its compiler unrolls a loop over eight boxes before it would put
them side by side. So these two functions write the compiler's own intermediate code. It holds for
every processor: where registers are narrower the compiler takes several.
"""

from __future__ import annotations

from typing import Any

from llvmlite import ir  # type: ignore[import-untyped, unused-ignore]
from numba import types
from numba.extending import intrinsic

WIDTH = 8  # boxes in a node
_FLOAT, _INDEX = ir.FloatType(), ir.IntType(32)
_LANES = ir.VectorType(_FLOAT, WIDTH)


def _to_all(builder: Any, value: Any) -> Any:
    """One number in every lane."""
    empty = ir.Constant(_LANES, ir.Undefined)
    first = builder.insert_element(empty, value, ir.Constant(_INDEX, 0))
    same = ir.Constant(ir.VectorType(_INDEX, WIDTH), [0] * WIDTH)
    return builder.shuffle_vector(first, empty, same)


@intrinsic  # type: ignore[misc, untyped-decorator, unused-ignore]
def slabs(typing, box, rows, origin, inverse, reach, entered):  # type: ignore[no-untyped-def]
    """Write where the ray enters each box, and return a bit for each box it enters by ``reach``.

    ``box`` holds float32 planes; ``rows`` says where the near planes x, y, z of the eight boxes
    start in it, and where the far ones do; ``origin`` and ``inverse`` are the ray's for each of
    these six. A nan anywhere enters nothing.
    """

    def write(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        planes, start, o, i, limit, out = args
        data = context.make_array(signature.args[0])(context, builder, planes).data
        result = context.make_array(signature.args[5])(context, builder, out).data

        def distance(k: int) -> Any:
            place = builder.gep(data, [builder.extract_value(start, k)])
            plane = builder.load(builder.bitcast(place, _LANES.as_pointer()), align=4)
            way = builder.fsub(plane, _to_all(builder, builder.extract_value(o, k)))
            return builder.fmul(way, _to_all(builder, builder.extract_value(i, k)))

        near, far = ir.Constant(_LANES, [0.0] * WIDTH), _to_all(builder, limit)
        for axis in range(3):
            t = distance(axis)
            # a nan stays: it fails the comparison, and is taken
            near = builder.select(builder.fcmp_ordered(">", near, t), near, t)
            t = distance(3 + axis)
            far = builder.select(builder.fcmp_ordered("<", far, t), far, t)
        builder.store(near, builder.bitcast(result, _LANES.as_pointer()), align=4)
        inside = builder.fcmp_ordered("<=", near, far)
        return builder.zext(builder.bitcast(inside, ir.IntType(WIDTH)), ir.IntType(64))

    return types.uint64(box, rows, origin, inverse, reach, entered), write


@intrinsic  # type: ignore[misc, untyped-decorator, unused-ignore]
def lowest(typing, bits):  # type: ignore[no-untyped-def]
    """Number of the lowest bit that is set in ``bits``, a uint64 other than 0."""

    def write(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.cttz(args[0], ir.Constant(ir.IntType(1), 1))

    return types.uint64(bits), write

"""Rows of 8 numbers that stay in one register of the processor.

`distinct`, first in a function, promises that the arrays it gets do not overlap where it
writes, and asks for the widest vectors. `row_at` reads a row from an array, `put_row` writes
it, `filled` has one number in all places; `fused` is a·b + c place by place, rounded once,
`total` the sum of a row, always added in the same order. Uncompiled (NUMBA_DISABLE_JIT=1) a
row is a small numpy array.
"""

import numba
import numpy as np
from llvmlite import ir
from numba.core import cgutils, types
from numba.core.datamodel import PrimitiveModel
from numba.extending import intrinsic, register_model

from swirlight.forces.kernels.lowlevel import FUNCTION_HINTS

LANES = 8


class RowType(types.Type):
    """8 numbers of one kind, known to the compiler as a vector."""

    def __init__(self, dtype):
        self.dtype = dtype
        super().__init__(name=f"row({dtype})")


@register_model(RowType)
class _RowModel(PrimitiveModel):
    def __init__(self, manager, kind):
        lane = manager.lookup(kind.dtype).get_value_type()
        super().__init__(manager, kind, ir.VectorType(lane, LANES))


def _place(context, builder, kind, array, index_kind, index):
    """Pointer to the row that begins at an index, which is not negative."""
    view = context.make_array(kind)(context, builder, array)
    index = [context.cast(builder, i, k, types.intp)
             for i, k in zip(cgutils.unpack_tuple(builder, index), index_kind, strict=True)]
    start = cgutils.get_item_pointer(context, builder, kind, view, index)
    return builder.bitcast(start, context.get_value_type(RowType(kind.dtype)).as_pointer())


def _size(context, kind):
    return context.get_abi_sizeof(context.get_value_type(kind.dtype))


@intrinsic
def _distinct(typing_context):
    def codegen(context, builder, signature, args):
        function = builder.function
        for hint in FUNCTION_HINTS:
            set.add(function.attributes, hint)
        # The first two arguments are where numba returns the value and the exception.
        for argument in function.args[2:]:
            if isinstance(argument.type, ir.PointerType):
                argument.attributes.add("noalias")
        return context.get_dummy_value()

    return types.none(), codegen


@intrinsic
def _row_at(typing_context, array, index):
    def codegen(context, builder, signature, args):
        start = _place(context, builder, array, args[0], index, args[1])
        return builder.load(start, align=_size(context, array))

    return RowType(array.dtype)(array, index), codegen


@intrinsic
def _put_row(typing_context, array, index, row):
    def codegen(context, builder, signature, args):
        start = _place(context, builder, array, args[0], index, args[1])
        builder.store(args[2], start, align=_size(context, array))
        return context.get_dummy_value()

    return types.none(array, index, row), codegen


@intrinsic
def _filled(typing_context, number):
    def codegen(context, builder, signature, args):
        kind = context.get_value_type(signature.return_type)
        first = builder.insert_element(ir.Constant(kind, ir.Undefined), args[0],
                                       ir.Constant(ir.IntType(32), 0))
        places = ir.Constant(ir.VectorType(ir.IntType(32), LANES), [0] * LANES)
        return builder.shuffle_vector(first, ir.Constant(kind, ir.Undefined), places)

    return RowType(number)(number), codegen


@intrinsic
def _fused(typing_context, a, b, c):
    def codegen(context, builder, signature, args):
        kind = context.get_value_type(a)
        name = f"llvm.fma.v{LANES}f{a.dtype.bitwidth}"
        function = ir.FunctionType(kind, [kind] * 3)
        return builder.call(cgutils.get_or_insert_function(builder.module, function, name), args)

    return a(a, a, a), codegen


@intrinsic
def _total(typing_context, row):
    def codegen(context, builder, signature, args):
        whole, width = args[0], LANES
        while width > 1:  # halves onto each other
            width //= 2
            parts = [ir.Constant(ir.VectorType(ir.IntType(32), width),
                                 list(range(k * width, (k + 1) * width))) for k in (0, 1)]
            low, high = (builder.shuffle_vector(whole, whole, part) for part in parts)
            whole = builder.fadd(low, high)
        return builder.extract_element(whole, ir.Constant(ir.IntType(32), 0))

    return row.dtype(row), codegen


if numba.config.DISABLE_JIT:
    def distinct():
        return None

    def row_at(array, index):
        return array[index[:-1]][index[-1]:index[-1] + LANES].copy()

    def put_row(array, index, row):
        array[index[:-1]][index[-1]:index[-1] + LANES] = row

    def filled(number):
        return np.full(LANES, number)

    def fused(a, b, c):
        return a * b + c

    def total(row):
        while len(row) > 1:
            row = row[:len(row) // 2] + row[len(row) // 2:]
        return row[0]
else:
    distinct, row_at, put_row, filled, fused, total = (
        _distinct, _row_at, _put_row, _filled, _fused, _total)

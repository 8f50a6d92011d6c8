"""What plain numba cannot say to the compiler, and the same in plain Python.

`at` reads an array at a 32-bit index without numba's test for negative indices, so that a
loop over neighbours becomes 32-bit gathers. `streamlined` promises the compiler that the
arrays a function gets do not overlap where it writes, and asks for the widest vectors in
its first innermost loop.
`pick` copies those of 16 integers that pass a test: newer processors do it in one instruction.
Uncompiled (NUMBA_DISABLE_JIT=1) the plain forms at the end stand in.
"""

import numba
from llvmlite import ir
from numba.core import cgutils, types
from numba.extending import intrinsic

# Wide vectors on processors that would rather not, a stack that holds them aligned, and no
# inlining, which would lose both.
FUNCTION_HINTS = ('"prefer-vector-width"="512"', '"stackrealign"', "noinline")


@intrinsic
def _at(typing_context, array, offset, index):
    def codegen(context, builder, signature, args):
        data = context.make_array(signature.args[0])(context, builder, args[0]).data
        start = builder.gep(data, [args[1]])
        wide = builder.sext(args[2], context.get_value_type(types.intp))
        return builder.load(builder.gep(start, [wide]))

    return array.dtype(array, types.intp, types.int32), codegen


def _loop_hint(module, width):
    """Metadata that asks for `width` lanes and one copy of the loop body."""
    width = module.add_metadata(["llvm.loop.vectorize.width", ir.Constant(ir.IntType(32), width)])
    single = module.add_metadata(["llvm.loop.interleave.count", ir.Constant(ir.IntType(32), 1)])
    loop = module.add_metadata([width, single])
    loop.operands = (loop, width, single)  # a loop is named by a node that begins with itself
    return loop


@intrinsic
def _fused(typing_context, a, b, c):
    def codegen(context, builder, signature, args):
        return builder.fma(*args)

    return a(a, a, a), codegen


def _streamlining(lanes):
    """The intrinsic that prepares a function for loops of `lanes` neighbours at once."""

    @intrinsic
    def streamlined(typing_context):
        def codegen(context, builder, signature, args):
            function = builder.function
            for hint in FUNCTION_HINTS:
                set.add(function.attributes, hint)  # llvmlite's own `add` knows only plain names
            # The first two arguments are where numba returns the value and the exception.
            for argument in function.args[2:]:
                if isinstance(argument.type, ir.PointerType):
                    argument.attributes.add("noalias")
            plain_branch = builder.branch

            def branch(target):
                jump = plain_branch(target)
                if target.is_terminated:  # already written, so this jump closes a loop
                    jump.set_metadata("llvm.loop", _loop_hint(builder.module, lanes))
                    del builder.branch  # the loops around it stay as they are
                return jump

            builder.branch = branch
            return context.get_dummy_value()

        return types.none(), codegen

    return streamlined


@intrinsic
def _pick(typing_context, source, start, count, value, low, high, factor, target, place):
    def codegen(context, builder, signature, args):
        kinds = signature.args
        data = [context.make_array(kinds[k])(context, builder, args[k]).data for k in (0, 3, 7)]
        integer, real = ir.IntType(32), context.get_value_type(kinds[3].dtype)

        def lanes(kind, scalar):
            first = builder.insert_element(ir.Constant(ir.VectorType(kind, 16), ir.Undefined),
                                           scalar, ir.Constant(integer, 0))
            return builder.shuffle_vector(first, first,
                                          ir.Constant(ir.VectorType(integer, 16), [0] * 16))

        def load(pointer, kind):
            pointer = builder.gep(pointer, [args[1]])
            pointer = builder.bitcast(pointer, ir.VectorType(kind, 16).as_pointer())
            return builder.load(pointer, align=4)

        left = builder.trunc(builder.sub(args[2], args[1]), integer)
        order = ir.Constant(ir.VectorType(integer, 16), list(range(16)))
        values = load(data[1], real)
        chosen = builder.icmp_signed("<", order, lanes(integer, left))
        chosen = builder.and_(chosen, builder.fcmp_ordered(">=", values, lanes(real, args[4])))
        chosen = builder.and_(chosen, builder.fcmp_ordered("<", values, lanes(real, args[5])))
        numbers = builder.mul(load(data[0], integer), lanes(integer, args[6]))
        spot = builder.gep(data[2], [args[8]])
        store = cgutils.get_or_insert_function(
            builder.module,
            ir.FunctionType(ir.VoidType(), [numbers.type, spot.type, chosen.type]),
            "llvm.masked.compressstore.v16i32")
        builder.call(store, [numbers, spot, chosen])
        taken = builder.ctpop(builder.bitcast(chosen, ir.IntType(16)))
        return builder.add(args[8], builder.zext(taken, context.get_value_type(types.intp)))

    real = value.dtype
    arguments = (source, types.intp, types.intp, value, real, real, types.int32, target, types.intp)
    return types.intp(*arguments), codegen


if numba.config.DISABLE_JIT:
    def at(array, offset, index):
        return array[offset + index]

    def fused(a, b, c):
        return a * b + c

    def streamlined16():
        return None

    streamlined8 = streamlined16

    def pick(source, start, count, value, low, high, factor, target, place):
        for k in range(start, min(start + 16, count)):
            if low <= value[k] < high:
                target[place] = source[k] * factor
                place += 1
        return place
else:
    at, fused, pick = _at, _fused, _pick
    streamlined8, streamlined16 = _streamlining(8), _streamlining(16)

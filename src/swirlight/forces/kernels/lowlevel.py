"""What plain numba cannot say to the compiler, and the same in plain Python.

`at` reads an array at a 32-bit index without numba's test for negative indices, so that a
loop over neighbours becomes 32-bit gathers. `streamlined` promises the compiler that the
arrays a function gets do not overlap where it writes, and asks for the widest vectors in
its first innermost loop, 8 or 16 numbers where the processor has them and half as many if not.
`pick` copies those of 16 integers whose values are negative: newer processors do it in one
instruction, and for others the plain form is compiled.
Uncompiled (NUMBA_DISABLE_JIT=1) the plain forms at the end stand in.
"""

import numba
from llvmlite import ir
from numba.core import cgutils, types
from numba.extending import intrinsic

from swirlight.compiled import kernel

# Wide vectors on processors that would rather not, a stack that holds them aligned, and no
# inlining, which would lose both.
FUNCTION_HINTS = ('"prefer-vector-width"="512"', '"stackrealign"', "noinline")


@intrinsic
def _at(typing_context, array, offset, index):
    def codegen(context, builder, signature, args):
        data = context.make_array(signature.args[0])(context, builder, args[0]).data
        start = builder.gep(data, [args[1]])
        wide = context.cast(builder, args[2], signature.args[2], types.intp)
        return builder.load(builder.gep(start, [wide]))

    return array.dtype(array, types.intp, index), codegen


def _loop_hint(module, width):
    """Metadata that asks for `width` lanes and one copy of the loop body."""
    width = module.add_metadata(["llvm.loop.vectorize.width", ir.Constant(ir.IntType(32), width)])
    single = module.add_metadata(["llvm.loop.interleave.count", ir.Constant(ir.IntType(32), 1)])
    rolled = module.add_metadata(["llvm.loop.unroll.disable"])
    loop = module.add_metadata([width, single, rolled])
    # A loop is named by a node that begins with itself.
    loop.operands = (loop, width, single, rolled)
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
def _pick(typing_context, source, start, value, value_start, target, place):
    def codegen(context, builder, signature, args):
        kinds = signature.args
        data = [context.make_array(kinds[k])(context, builder, args[k]).data for k in (0, 2, 4)]
        integer, real = ir.IntType(32), context.get_value_type(kinds[2].dtype)

        def load(pointer, first, kind):
            pointer = builder.gep(pointer, [first])
            pointer = builder.bitcast(pointer, ir.VectorType(kind, 16).as_pointer())
            return builder.load(pointer, align=4)

        nought = ir.Constant(ir.VectorType(real, 16), [0.0] * 16)
        chosen = builder.fcmp_ordered("<", load(data[1], args[3], real), nought)
        numbers = load(data[0], args[1], integer)
        spot = builder.gep(data[2], [args[5]])
        store = cgutils.get_or_insert_function(
            builder.module,
            ir.FunctionType(ir.VoidType(), [numbers.type, spot.type, chosen.type]),
            "llvm.masked.compressstore.v16i32")
        builder.call(store, [numbers, spot, chosen])
        taken = builder.ctpop(builder.bitcast(chosen, ir.IntType(16)))
        return builder.add(args[5], builder.zext(taken, context.get_value_type(types.intp)))

    return types.intp(source, types.intp, value, types.intp, target, types.intp), codegen


def _plain_pick(source, start, value, value_start, target, place):
    for k in range(16):
        target[place] = source[start + k]  # overwritten unless it counts
        place += value[value_start + k] < 0
    return place


def _wide():
    """Whether vectors have 512 bits; such processors also pack the lanes that pass a test."""
    features = numba.config.CPU_FEATURES
    if features is None:
        features = numba.core.codegen.get_host_cpu_features()
    return "+avx512f" in features.split(",")


if numba.config.DISABLE_JIT:
    def at(array, offset, index):
        return array[offset + index]

    def fused(a, b, c):
        return a * b + c

    def streamlined16():
        return None

    streamlined8 = streamlined16

    pick = _plain_pick
else:
    at, fused = _at, _fused
    if _wide():
        pick, streamlined8, streamlined16 = _pick, _streamlining(8), _streamlining(16)
    else:
        pick, streamlined8, streamlined16 = kernel(_plain_pick), _streamlining(4), _streamlining(8)

"""Two hints to the compiler that plain numba cannot express, and their plain fallback.

`at` reads an array at a 32-bit index without numba's test for negative indices, so that a
loop over neighbours becomes 32-bit gathers. `streamlined` promises the compiler that the
arrays a function gets do not overlap where it writes, and asks for the widest vectors.
Uncompiled (NUMBA_DISABLE_JIT=1) `at` is an ordinary subscript and `streamlined` does nothing.
"""

import numba
from llvmlite import ir
from numba.core import types
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
                return jump

            builder.branch = branch
            return context.get_dummy_value()

        return types.none(), codegen

    return streamlined


if numba.config.DISABLE_JIT:
    def at(array, offset, index):
        return array[offset + index]

    def streamlined16():
        return None

    streamlined8 = streamlined16
else:
    at, streamlined8, streamlined16 = _at, _streamlining(8), _streamlining(16)

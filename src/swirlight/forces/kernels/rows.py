"""Hints to the compiler for loops over one short row of numbers inside other loops.

`unaliased`, first in a function, promises that the arrays it gets do not overlap where it
writes, and asks for the widest vectors. `eight_lanes`, just before an innermost loop of 8 turns,
makes that loop one vector operation. Uncompiled (NUMBA_DISABLE_JIT=1) they do nothing.
"""

import numba
from llvmlite import ir
from numba.core import types
from numba.extending import intrinsic

from swirlight.forces.kernels.lowlevel import FUNCTION_HINTS

LANES = 8


def _row_hint(module):
    """Metadata for a loop of LANES turns: one vector, and not unrolled before it can become one."""
    def entry(name, *value):
        return module.add_metadata([name, *(ir.Constant(ir.IntType(32), v) for v in value)])

    hints = (entry("llvm.loop.vectorize.width", LANES), entry("llvm.loop.interleave.count", 1),
             entry("llvm.loop.unroll.disable"))
    loop = module.add_metadata(list(hints))
    loop.operands = (loop, *hints)  # a loop is named by a node that begins with itself
    return loop


@intrinsic
def _unaliased(typing_context):
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
def _eight_lanes(typing_context):
    def codegen(context, builder, signature, args):
        plain_branch = builder.branch

        def branch(target):
            jump = plain_branch(target)
            if target.is_terminated:  # already written: this jump closes the innermost loop
                jump.set_metadata("llvm.loop", _row_hint(builder.module))
                builder.branch = plain_branch
            return jump

        builder.branch = branch
        return context.get_dummy_value()

    return types.none(), codegen


if numba.config.DISABLE_JIT:
    def unaliased():
        return None

    eight_lanes = unaliased
else:
    unaliased, eight_lanes = _unaliased, _eight_lanes

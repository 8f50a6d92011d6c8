"""One compiled function called by another through its address.

numba copies the code of a kernel into every kernel that calls it, and those into their callers,
and optimises each copy again. For a long one that many call this takes seconds at the first
start: `callback` compiles it once, and `call_address` calls it. Uncompiled
(NUMBA_DISABLE_JIT=1) the address is the function itself.
"""

import numba
from llvmlite import ir
from numba.core import cgutils, types
from numba.extending import intrinsic

from swirlight.compiled import FAST

# Settings of a kernel that only other kernels call: it needs no door for Python.
INNER = {"no_cpython_wrapper": True, "no_cfunc_wrapper": True}


@intrinsic
def _call_address(typing_context, address, arguments):
    def codegen(context, builder, signature, args):
        values = []
        for kind, value in zip(arguments, cgutils.unpack_tuple(builder, args[1]), strict=True):
            if isinstance(kind, types.Array):
                value = context.make_array(kind)(context, builder, value).data
            else:
                value = context.cast(builder, value, kind, types.int64)
            values.append(value)
        function = ir.FunctionType(ir.VoidType(), [value.type for value in values])
        builder.call(builder.inttoptr(args[0], function.as_pointer()), values)
        return context.get_dummy_value()

    return types.none(types.intp, arguments), codegen


if numba.config.DISABLE_JIT:
    def callback(signature, function):
        return function

    def call_address(address, arguments):
        address(*arguments)

    def array_at(pointer, size):
        return pointer
else:
    _kept = []  # compiled functions live as long as somebody holds them

    def callback(signature, function):
        """Address of a function of pointers and whole numbers that returns nothing."""
        settings = {"fastmath": FAST, "error_model": "numpy"}
        try:
            compiled = numba.cfunc(signature, cache=True, **settings)(function)
        except RuntimeError:  # nowhere to keep a cache, of which `kernel` has warned
            compiled = numba.cfunc(signature, **settings)(function)
        _kept.append(compiled)
        return _kept[-1].address

    call_address, array_at = _call_address, numba.carray

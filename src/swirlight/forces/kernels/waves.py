"""Rows of complex numbers, as wide as the processor's registers, for Fourier transforms.

An array keeps real and imaginary parts apart: `complex_at(array, i, imaginary)` reads a row of
real parts from place i on and the imaginary ones from `imaginary` places further, `put_complex`
writes one. Rows are added, subtracted and multiplied by real and complex numbers;
`clockwise` is −i times a row. `turn_block` writes a square of an array on its side.
Uncompiled (NUMBA_DISABLE_JIT=1) a row is a small numpy array.
"""

import operator

import numba
import numpy as np
from llvmlite import ir
from numba.core import types
from numba.core.datamodel import PrimitiveModel
from numba.extending import intrinsic, lower_builtin, register_model, type_callable

REGISTER = 64  # bytes
SIDE = 8  # of the square that is turned


def lanes_of(dtype):
    """How many numbers a row has."""
    return REGISTER // np.dtype(dtype).itemsize


class WaveType(types.Type):
    """Two registers, of real and of imaginary parts."""

    def __init__(self, dtype):
        self.dtype = dtype
        super().__init__(name=f"wave({dtype})")


@register_model(WaveType)
class _WaveModel(PrimitiveModel):
    def __init__(self, manager, kind):
        row = ir.VectorType(manager.lookup(kind.dtype).get_value_type(),
                            8 * REGISTER // kind.dtype.bitwidth)
        super().__init__(manager, kind, ir.LiteralStructType([row, row]))


def _parts(builder, wave):
    return builder.extract_value(wave, 0), builder.extract_value(wave, 1)


def _join(builder, re, im):
    whole = ir.Constant(ir.LiteralStructType([re.type, im.type]), ir.Undefined)
    return builder.insert_value(builder.insert_value(whole, re, 0), im, 1)


def _pointer(context, builder, kind, array, index, row):
    """Pointer to a row that begins at an index, and how it is aligned."""
    data = context.make_array(kind)(context, builder, array).data
    return builder.bitcast(builder.gep(data, [index]), row.as_pointer()), kind.dtype.bitwidth // 8


@intrinsic
def _complex_at(typing_context, array, index, imaginary):
    def codegen(context, builder, signature, args):
        row = context.get_value_type(signature.return_type).elements[0]
        rows = []
        for place in (args[1], builder.add(args[1], args[2])):
            start, align = _pointer(context, builder, array, args[0], place, row)
            rows.append(builder.load(start, align=align))
        return _join(builder, *rows)

    return WaveType(array.dtype)(array, types.intp, types.intp), codegen


@intrinsic
def _put_complex(typing_context, array, index, imaginary, wave):
    def codegen(context, builder, signature, args):
        places = args[1], builder.add(args[1], args[2])
        for place, row in zip(places, _parts(builder, args[3]), strict=True):
            start, align = _pointer(context, builder, array, args[0], place, row.type)
            builder.store(row, start, align=align)
        return context.get_dummy_value()

    return types.none(array, types.intp, types.intp, wave), codegen


@intrinsic
def _clockwise(typing_context, wave):
    def codegen(context, builder, signature, args):
        re, im = _parts(builder, args[0])
        return _join(builder, im, builder.fneg(re))

    return wave(wave), codegen


@intrinsic
def _turn_block(typing_context, source, start, step, target, to, stride):
    def codegen(context, builder, signature, args):
        row = ir.VectorType(context.get_value_type(source.dtype), SIDE)
        step, stride = args[2], args[5]
        place, rows = args[1], []
        for _ in range(SIDE):
            pointer, align = _pointer(context, builder, source, args[0], place, row)
            rows.append(builder.load(pointer, align=align))
            place = builder.add(place, step)
        apart = SIDE // 2
        while apart:  # rows that far apart change the halves of each stretch twice that long
            for n in range(SIDE):
                if not n & apart:
                    low, high = rows[n], rows[n + apart]
                    first = [k if not k & apart else SIDE + k - apart for k in range(SIDE)]
                    rows[n] = _shuffled(builder, low, high, first)
                    rows[n + apart] = _shuffled(builder, low, high, [
                        k + apart if not k & apart else SIDE + k for k in range(SIDE)])
            apart //= 2
        place = args[4]
        for turned in rows:
            pointer, align = _pointer(context, builder, target, args[3], place, row)
            builder.store(turned, pointer, align=align)
            place = builder.add(place, stride)
        return context.get_dummy_value()

    whole = types.intp
    return types.none(source, whole, whole, target, whole, whole), codegen


def _shuffled(builder, low, high, order):
    return builder.shuffle_vector(low, high, ir.Constant(ir.VectorType(ir.IntType(32), len(order)),
                                                         order))


def _filled(context, builder, number, kind, row):
    """A row with one number, of any real kind, in all places."""
    number = context.cast(builder, number, kind[0], kind[1])
    first = builder.insert_element(ir.Constant(row, ir.Undefined), number,
                                   ir.Constant(ir.IntType(32), 0))
    return _shuffled(builder, first, first, [0] * row.count)


@type_callable(operator.add)
@type_callable(operator.sub)
def _type_of_sum(context):
    def typer(a, b):
        return a if isinstance(a, WaveType) and a == b else None

    return typer


@type_callable(operator.mul)
def _type_of_product(context):
    def typer(a, b):
        number = isinstance(b, types.Float | types.Complex)
        return a if isinstance(a, WaveType) and number else None

    return typer


def _part_by_part(operation):
    def codegen(context, builder, signature, args):
        a, b = (_parts(builder, wave) for wave in args)
        combine = getattr(builder, operation)
        return _join(builder, combine(a[0], b[0]), combine(a[1], b[1]))

    return codegen


lower_builtin(operator.add, WaveType, WaveType)(_part_by_part("fadd"))
lower_builtin(operator.sub, WaveType, WaveType)(_part_by_part("fsub"))


@lower_builtin(operator.mul, WaveType, types.Float)
def _stretched(context, builder, signature, args):
    wave, number = signature.args
    re, im = _parts(builder, args[0])
    factor = _filled(context, builder, args[1], (number, wave.dtype), re.type)
    return _join(builder, builder.fmul(re, factor), builder.fmul(im, factor))


@lower_builtin(operator.mul, WaveType, types.Complex)
def _twisted(context, builder, signature, args):
    wave, number = signature.args
    re, im = _parts(builder, args[0])
    turn = context.make_complex(builder, number, args[1])
    kinds = number.underlying_float, wave.dtype
    cosine, sine = (_filled(context, builder, part, kinds, re.type)
                    for part in (turn.real, turn.imag))
    return _join(builder,
                 builder.fsub(builder.fmul(re, cosine), builder.fmul(im, sine)),
                 builder.fadd(builder.fmul(re, sine), builder.fmul(im, cosine)))


if numba.config.DISABLE_JIT:
    def complex_at(array, index, imaginary):
        width = lanes_of(array.dtype)
        return (array[index:index + width]
                + 1j * array[index + imaginary:index + imaginary + width])

    def put_complex(array, index, imaginary, wave):
        array[index:index + len(wave)] = wave.real
        array[index + imaginary:index + imaginary + len(wave)] = wave.imag

    def clockwise(wave):
        return -1j * wave

    def turn_block(source, start, step, target, to, stride):
        rows = [source[start + k * step:][:SIDE].copy() for k in range(SIDE)]
        for k in range(SIDE):
            target[to + k * stride:][:SIDE] = [row[k] for row in rows]
else:
    complex_at, put_complex, clockwise, turn_block = (
        _complex_at, _put_complex, _clockwise, _turn_block)

"""Asking for memory before it is needed.

Tallies are larger than the cache next to the processor, and samples fall all over them: a sum that is fetched only when
something is added to it keeps the processor waiting. What a number is or becomes doesn't depend on it.
"""

from llvmlite import ir
from numba.core import types
from numba.extending import intrinsic, overload


def fetch_early(array, index):
    """Have the processor fetch `array[index]`, to be written to, while it goes on; an index for each axis, >= 0."""


def _fetch(array_type, rank):
    def generate(context, builder, signature, arguments):
        array = context.make_array(array_type)(context, builder, arguments[0])
        strides = [builder.extract_value(array.strides, axis) for axis in range(rank)]
        indices = [builder.extract_value(arguments[1], axis) for axis in range(rank)]
        offset = ir.Constant(ir.IntType(64), 0)
        for index, stride in zip(indices, strides, strict=True):
            offset = builder.add(offset, builder.mul(index, stride))
        byte = ir.IntType(8).as_pointer()
        address = builder.gep(builder.bitcast(array.data, byte), [offset])
        number = ir.IntType(32)
        kind = ir.FunctionType(ir.VoidType(), [byte, number, number, number])
        function = builder.module.declare_intrinsic("llvm.prefetch", [byte], kind)
        # For writing, to be kept in all caches, data.
        builder.call(function, [address, number(1), number(3), number(1)])
        return context.get_dummy_value()

    return generate


@intrinsic
def _prefetch(typing_context, array, index):
    wanted = types.UniTuple(types.intp, array.ndim)
    return types.void(array, wanted), _fetch(array, array.ndim)


@overload(fetch_early)
def _compiled_fetch_early(array, index):
    return lambda array, index: _prefetch(array, index)

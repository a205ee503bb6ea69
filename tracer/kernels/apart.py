"""Lanes and tables, with the promise that the one never overlap the other.

A loop that reads tables at places that it computes and writes to lanes can only be turned into vector operations if
the compiler knows that no write changes what is read. Numba has no way to say so for an array, LLVM has.
"""

from llvmlite import ir
from numba.core import types
from numba.extending import intrinsic, overload

LANES = "lanes"
TABLES = "tables"


def lane_value(lanes, index):
    """Return `lanes[index]`; `index` >= 0."""
    return lanes[index]


def set_lane_value(lanes, index, value):
    """Set `lanes[index]`; `index` >= 0."""
    lanes[index] = value


def set_lane_bits(lanes, index, whole):
    """Set `lanes[index]` to the bits of a `whole` number; `index` >= 0."""
    lanes[index : index + 1].view("int64")[0] = whole


def lane_bits(lanes, index):
    """Return the bits of `lanes[index]` as a whole number; `index` >= 0."""
    return lanes[index : index + 1].view("int64")[0]


def promise(access, own, other):
    """Mark a load or store as one to `own`, which doesn't overlap `other`."""
    module = access.module
    domain = module.add_metadata([ir.MetaDataString(module, "tracer.kernels.apart")])

    def scopes(name):
        return module.add_metadata([module.add_metadata([ir.MetaDataString(module, name), domain])])

    access.set_metadata("alias.scope", scopes(own))
    access.set_metadata("noalias", scopes(other))
    return access


def pointer_to(context, builder, array_type, array, index):
    """Return the pointer to a number of an array, `index` >= 0."""
    data = context.make_array(array_type)(context, builder, array).data
    return builder.gep(data, [index], inbounds=True)


@intrinsic
def _load_lane(typing_context, lanes, index):
    def generate(context, builder, signature, arguments):
        return promise(
            builder.load(pointer_to(context, builder, signature.args[0], *arguments)), LANES, TABLES
        )

    return types.float64(lanes, types.intp), generate


@intrinsic
def _load_bits(typing_context, lanes, index):
    def generate(context, builder, signature, arguments):
        place = pointer_to(context, builder, signature.args[0], *arguments)
        whole = builder.load(builder.bitcast(place, ir.IntType(64).as_pointer()))
        return promise(whole, LANES, TABLES)

    return types.int64(lanes, types.intp), generate


def _store(context, builder, signature, arguments):
    array, at, number = arguments
    place = pointer_to(context, builder, signature.args[0], array, at)
    promise(builder.store(builder.bitcast(number, ir.DoubleType()), place), LANES, TABLES)
    return context.get_dummy_value()


@intrinsic
def _store_lane(typing_context, lanes, index, value):
    return types.void(lanes, types.intp, types.float64), _store


@intrinsic
def _store_bits(typing_context, lanes, index, whole):
    return types.void(lanes, types.intp, types.int64), _store


@overload(lane_value)
def _compiled_lane_value(lanes, index):
    return lambda lanes, index: _load_lane(lanes, index)


@overload(lane_bits)
def _compiled_lane_bits(lanes, index):
    return lambda lanes, index: _load_bits(lanes, index)


@overload(set_lane_value)
def _compiled_set_lane_value(lanes, index, value):
    return lambda lanes, index, value: _store_lane(lanes, index, value)


@overload(set_lane_bits)
def _compiled_set_lane_bits(lanes, index, whole):
    return lambda lanes, index, whole: _store_bits(lanes, index, whole)

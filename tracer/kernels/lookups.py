"""Straight lines looked up in a table for four lanes at a time.

Where processors read numbers from scattered places slowly, a compiler that meets such reads among other arithmetic of a
loop turns none of it into vector operations. So the loops over lanes leave what they want looked up in rows, and this
reads it: value and rise of a line lie beside each other, come in one read, and are sorted by lane in registers.
"""

from llvmlite import ir
from numba.core import types
from numba.core.cgutils import get_or_insert_function
from numba.extending import intrinsic, overload

from tracer.kernels.apart import LANES, TABLES, pointer_to, promise

FOUR = 4
"""Lanes at a time: as many numbers as the vectors of most processors hold; longer ones gain nothing here."""


def look_up_four(lanes, tables, knots, steps, result):
    """Set four numbers at `lanes[result]` to value + step rise.

    `lanes[knots]` and the next three hold, as the bits of whole numbers, where in `tables` the value is; the rise is
    behind it. `lanes[steps]` and the next three are the steps.
    """
    for i in range(FOUR):
        at = int(lanes[knots + i : knots + i + 1].view("int64")[0])
        lanes[result + i] = tables[at] + lanes[steps + i] * tables[at + 1]


@intrinsic
def _look_up_four(typing_context, lanes, tables, knots, steps, result):
    def generate(context, builder, signature, arguments):
        lanes_type, tables_type = signature.args[:2]
        lanes, tables, knots, steps, result = arguments
        number, whole = ir.DoubleType(), ir.IntType(64)
        four, pair = ir.VectorType(number, FOUR), ir.VectorType(number, 2)

        def four_at(at):
            return builder.bitcast(pointer_to(context, builder, lanes_type, lanes, at), four.as_pointer())

        def picked(first, second, order):
            mask = ir.Constant(ir.VectorType(ir.IntType(32), len(order)), list(order))
            return builder.shuffle_vector(first, second, mask)

        pairs = []
        first = builder.bitcast(pointer_to(context, builder, lanes_type, lanes, knots), whole.as_pointer())
        for i in range(FOUR):
            place = builder.gep(first, [ir.Constant(whole, i)], inbounds=True)
            knot = promise(builder.load(place), LANES, TABLES)
            entry = pointer_to(context, builder, tables_type, tables, knot)
            line = builder.load(builder.bitcast(entry, pair.as_pointer()))
            line.align = 8
            pairs.append(promise(line, TABLES, LANES))
        both = [picked(pairs[i], pairs[i + 1], range(4)) for i in (0, 2)]
        value, rise = (picked(*both, order) for order in ((0, 2, 4, 6), (1, 3, 5, 7)))
        step = builder.load(four_at(steps))
        step.align = 8
        kind = ir.FunctionType(four, [four, four, four])
        fused = get_or_insert_function(builder.module, kind, f"llvm.fma.v{FOUR}f64")
        found = builder.call(fused, [promise(step, LANES, TABLES), rise, value])
        stored = builder.store(found, four_at(result))
        stored.align = 8
        promise(stored, LANES, TABLES)
        return context.get_dummy_value()

    return types.void(lanes, tables, types.intp, types.intp, types.intp), generate


@overload(look_up_four)
def _compiled_look_up_four(lanes, tables, knots, steps, result):
    return lambda lanes, tables, knots, steps, result: _look_up_four(lanes, tables, knots, steps, result)

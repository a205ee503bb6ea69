"""a b + c rounded once, which processors do in one operation.

Rounding once gives the same sum on every processor, so a product stays the same to the last bit; leaving it to the
compiler which products to fuse with which sums would not.
"""

from llvmlite import ir
from numba.core import types
from numba.extending import intrinsic, overload


def fused(a, b, c):
    """Return `a` `b` + `c`; compiled, rounded once."""
    return a * b + c


@intrinsic
def _fused_multiply_add(typing_context, a, b, c):
    signature = types.float64(types.float64, types.float64, types.float64)

    def generate(context, builder, _signature, arguments):
        double = ir.DoubleType()
        kind = ir.FunctionType(double, [double, double, double])
        return builder.call(builder.module.declare_intrinsic("llvm.fma", [double], kind), arguments)

    return signature, generate


@overload(fused)
def _compiled_fused(a, b, c):
    return lambda a, b, c: _fused_multiply_add(a, b, c)

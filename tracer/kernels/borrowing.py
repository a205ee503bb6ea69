"""Arrays inside kernels without counting references.

numba counts a reference at each function that an array passes through, by an atomic addition: in the
innermost loop that cost more than the arithmetic. A borrowed view has no owner to count; the caller's array
outlives it.
"""

from llvmlite.ir import Constant
from numba.extending import intrinsic, overload


def borrowed(array):
    """Return a view of `array` that is valid as long as `array` itself; plain Python returns the array."""
    return array


@intrinsic
def _without_owner(_typing, array):
    def build(context, builder, signature, arguments):
        view = context.make_array(signature.return_type)(context, builder, arguments[0])
        view.meminfo = Constant(view.meminfo.type, None)
        return view._getvalue()

    return array(array), build


@overload(borrowed)
def _borrowed(array):
    return lambda array: _without_owner(array)

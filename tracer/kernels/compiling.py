"""The compiler options of all kernels, in one place.

No `fastmath`: with it other CPU features give other sums, and a product must be the same to the last bit for any
number of workers. `error_model="numpy"` lets divisions vectorise; `nogil` lets threads run side by side.
"""

import numba

from tracer.kernels import code_cache

OPTIONS = {"nogil": True, "error_model": "numpy"}


def kernel(function):
    """Compile `function` on its first call with the project's options and keep the machine code between starts."""
    return code_cache.attach(numba.njit(**OPTIONS)(function))

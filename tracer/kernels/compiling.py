"""The compiler options of all kernels, in one place.

No `fastmath`: with it other CPU features give other sums, and a product must be the same to the last bit for any
number of workers. `error_model="numpy"` lets divisions vectorise; `nogil` lets threads run side by side. Kernels that
allocate nothing also do without numba's reference counts: counted atomically for every array of every NamedTuple at
every call, they took more time than the flights themselves.
"""

from typing import Any

import numba

from tracer.kernels import code_cache

OPTIONS = {"nogil": True, "error_model": "numpy"}

INLINED = {**OPTIONS, "_nrt": False, "forceinline": True}
"""Options of what numba chooses by the types of its arguments, see `orbit`."""


def field_type(record: Any, name: str) -> Any:
    """Return numba's type of a field of a NamedTuple's type `record`."""
    return record.types[record.fields.index(name)]


def kernel(function):
    """Compile `function`, which allocates nothing, on its first call and keep the machine code between starts."""
    return code_cache.attach(numba.njit(**OPTIONS, _nrt=False)(function))


def inlined(function):
    """Compile `function` like `kernel`, always into its callers: for formulas of the innermost loop."""
    return code_cache.attach(numba.njit(**OPTIONS, _nrt=False, forceinline=True)(function))


def merged(function):
    """Compile `function` like `kernel`, as part of the text of its callers: for what is called from one place."""
    return code_cache.attach(numba.njit(**OPTIONS, _nrt=False, inline="always")(function))


def allocating_kernel(function):
    """Compile `function`, which makes arrays, on its first call and keep the machine code between starts."""
    return code_cache.attach(numba.njit(**OPTIONS)(function))

"""The compiler options of all kernels, in one place."""

from numba import njit

kernel = njit(nogil=True, error_model="numpy")

inlined = njit(nogil=True, error_model="numpy", forceinline=True)

"""Quantiles of a density that is straight between the points of a table."""

import math

import numpy as np

from tracer.kernels.compiling import allocating_kernel
from tracer.kernels.intervals import find_intervals


@allocating_kernel
def trapezoid_quantiles(places, density, sums, u):
    """Return the quantiles, (n,), at `u` (n,) of a density that is straight between `places` (m,), 0 outside.

    `density` (m,) is given at the places, with any normalisation; `sums` (m,) is its integral from the first of them.
    """
    last = sums.shape[0] - 1
    result = u * sums[last]
    begins = np.zeros(u.shape[0], np.int64)
    find_intervals(sums, last, result, begins)
    for i in range(u.shape[0]):
        k = begins[i]
        start, rest = density[k], result[i] - sums[k]
        slope = (density[k + 1] - start) / (places[k + 1] - places[k])
        # The root of slope/2 d^2 + start d = rest in the form that stays exact for a small slope.
        divisor = start + math.sqrt(max(start * start + 2.0 * slope * rest, 0.0))
        distance = 2.0 * rest / divisor if divisor > 0.0 else 0.0
        result[i] = min(places[k] + distance, places[k + 1])
    return result

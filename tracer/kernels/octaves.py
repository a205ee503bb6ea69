"""The inverse of a distribution as polynomials over parts of octaves, to the last digits but two.

An octave holds the numbers from one power of 2 to the next. Below the middle of a distribution octaves are those of the
even number u, above it those of 1 - u: only at 0 and at 1 are quantiles not smooth, and however near to them, a part of
an octave lies many times its own length away. The bits of a float64 say in which part it lies.
"""

from typing import NamedTuple

import numpy as np

from tracer.kernels.compiling import allocating_kernel
from tracer.kernels.fused import fused

PARTS = 8
"""Parts of an octave, a power of 2."""

COEFFICIENTS = 8
"""Of each polynomial: with so many it leaves out less than 1e-13 of a quantile, measured."""

LOWER_OCTAVES, UPPER_OCTAVES = 80, 53
"""Octaves of u, from 2^-81 to 1/2, and of 1 - u, from 2^-53 to 1; of the last the number 1/2 alone is looked up.

No float64 below 1 lies nearer to it.
"""

LEAST = 0.5 ** (LOWER_OCTAVES + 1)
"""Below it a quantile is a power of u."""

PART_BITS = 52 - (PARTS.bit_length() - 1)
"""Bits of a float64 behind those that tell its octave and part."""

WITHIN_PART = (1 << PART_BITS) - 1
ONE_BITS = 0x3FF << 52
MIDDLE = 1.0 + 0.5 / PARTS
"""Middle of a part of the octave from 1 to 2, into which all are moved."""

FIRST_LOWER = (0x3FF - LOWER_OCTAVES - 1) * PARTS
FIRST_UPPER = (0x3FF - UPPER_OCTAVES - LOWER_OCTAVES) * PARTS
"""Parts of all octaves of float64 before row 0, for u and for 1 - u, whose rows follow those of u."""


class OctaveTable(NamedTuple):
    """The quantiles of a distribution.

    `coefficients`, flat, has a row of COEFFICIENTS for each part: of the powers of the place in the part, from
    -1/(2 PARTS) to 1/(2 PARTS), parts of u first. Below LEAST a quantile is `bottom` u^`power`, at 1 it is `top`.
    """

    coefficients: np.ndarray
    bottom: float
    power: float
    top: float


@allocating_kernel
def octave_quantiles(table, u):
    """Return the quantiles, (n,), of the distribution of an `OctaveTable` at `u`, (n,), from 0 to 1."""
    c = table.coefficients
    result = np.empty(u.shape[0])
    for i in range(u.shape[0]):
        upper = u[i] >= 0.5
        rest = min(u[i], 1.0 - u[i])
        # What is not a number, or outside of 0 to 1, must not be looked up either.
        if not rest >= LEAST:
            result[i] = table.top if upper else table.bottom * u[i] ** table.power
            continue
        bits = np.float64(rest).view(np.int64)
        x = np.int64((bits & WITHIN_PART) | ONE_BITS).view(np.float64) - MIDDLE
        k = COEFFICIENTS * ((bits >> PART_BITS) - (FIRST_UPPER if upper else FIRST_LOWER))
        value = fused(x, c[k + 7], c[k + 6])
        value = fused(x, value, c[k + 5])
        value = fused(x, value, c[k + 4])
        value = fused(x, value, c[k + 3])
        value = fused(x, value, c[k + 2])
        value = fused(x, value, c[k + 1])
        result[i] = fused(x, value, c[k])
    return result

"""Survival over a short time."""

import math

from tracer.kernels.compiling import inlined

SHORT = 1.0 / 32.0
"""Hazard below which the power series of seventh order is exact to the last bit: its next term is u^8/8! = 2e-17."""


@inlined
def decay(u):
    """Return exp(-`u`); without a call for the small hazard `u` >= 0 of one step."""
    if u < SHORT:
        tail = 1.0 - u * (1.0 / 5.0) * (1.0 - u * (1.0 / 6.0) * (1.0 - u * (1.0 / 7.0)))
        return 1.0 - u * (1.0 - u * 0.5 * (1.0 - u * (1.0 / 3.0) * (1.0 - u * 0.25 * tail)))
    return math.exp(-u)

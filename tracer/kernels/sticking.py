"""How likely a landing atom is adsorbed."""

import math
from typing import NamedTuple

from tracer.kernels.compiling import kernel

LARGEST_EXPONENT = 700.0
"""Of a power of e that is still a number; a value of 0 stays 0 at any temperature."""


class Sticking(NamedTuple):
    """`value` of the probability at temperature `at` [K], falling by a factor e with each `e_folding` [K].

    An infinite `e_folding` means `value` everywhere.
    """

    value: float
    at: float
    e_folding: float


@kernel
def sticking_probability(sticking, kelvin):
    """Return value exp(-(T - at)/e_folding), not above 1, at the ground's temperature T = `kelvin`."""
    if sticking.e_folding == math.inf:
        return sticking.value
    exponent = min((sticking.at - kelvin) / sticking.e_folding, LARGEST_EXPONENT)
    return min(1.0, sticking.value * math.exp(exponent))

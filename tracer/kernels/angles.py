"""Sines and cosines to the last digits without branches or calls, for loops over lanes and launches."""

import math

import numpy as np

from tracer.kernels.compiling import inlined
from tracer.kernels.fused import fused

_HALF_PI = 0.5 * math.pi
_HALF_PI_REST = 6.123233995736766e-17
"""What pi/2 is more than the float64 next to it."""


@inlined
def sine_and_cosine(angle):
    """Return sine and cosine of an `angle` [rad], to 2e-16 up to 1e6 rad.

    Quarters of a turn are taken off with two parts of pi/2; of the rest, at most pi/4, the power series leave out
    (pi/4)^17/17! = 5e-17 and (pi/4)^18/18! = 2e-18.
    """
    quarters = np.floor(fused(angle, 1.0 / _HALF_PI, 0.5))
    x = fused(-quarters, _HALF_PI_REST, fused(-quarters, _HALF_PI, angle))
    q = x * x
    sine = fused(-q, 1.0 / 1307674368000.0, 1.0 / 6227020800.0)
    sine = fused(-q, sine, 1.0 / 39916800.0)
    sine = fused(-q, sine, 1.0 / 362880.0)
    sine = fused(-q, sine, 1.0 / 5040.0)
    sine = fused(-q, sine, 1.0 / 120.0)
    sine = fused(-q, sine, 1.0 / 6.0)
    sine = fused(-(x * q), sine, x)
    cosine = fused(-q, 1.0 / 20922789888000.0, 1.0 / 87178291200.0)
    cosine = fused(-q, cosine, 1.0 / 479001600.0)
    cosine = fused(-q, cosine, 1.0 / 3628800.0)
    cosine = fused(-q, cosine, 1.0 / 40320.0)
    cosine = fused(-q, cosine, 1.0 / 720.0)
    cosine = fused(-q, cosine, 1.0 / 24.0)
    cosine = fused(-q, cosine, 0.5)
    cosine = fused(-q, cosine, 1.0)
    quarter = quarters - 4.0 * np.floor(0.25 * quarters)
    odd = (quarter == 1.0) | (quarter == 3.0)
    found_sine, found_cosine = cosine if odd else sine, sine if odd else cosine
    return (
        -found_sine if quarter >= 2.0 else found_sine,
        -found_cosine if (quarter == 1.0) | (quarter == 2.0) else found_cosine,
    )

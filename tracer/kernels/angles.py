"""Angles, sines and cosines to the last digits without branches or calls, for loops over lanes."""

import math

import numpy as np

from tracer.kernels.compiling import inlined
from tracer.kernels.fused import fused

_SIXTEENTH = math.pi / 16.0
_TANGENTS = math.tan(_SIXTEENTH), math.tan(2.0 * _SIXTEENTH), math.tan(3.0 * _SIXTEENTH)

_HALF_PI = 0.5 * math.pi
_HALF_PI_REST = 6.123233995736766e-17
"""What pi/2 is more than the float64 next to it."""


@inlined
def angle_above(x, y):
    """Return atan2(`y`, `x`) [rad] for `y` >= 0, from 0 to pi, to three units of the last place.

    Not a number at the origin. The tangent in the first octant is brought near 0 by turning back by 0, pi/8 or pi/4:
    tan(a - b) = (tan a - tan b)/(1 + tan a tan b). Of what is left, below tan(pi/16) = 0.199, the series of the
    arctangent, u - u^3/3 + u^5/5 - ..., alternates: it leaves out less than 0.199^23/23 = 3e-18.
    """
    a = abs(x)
    low, high = min(a, y), max(a, y)
    middle, upper = low > _TANGENTS[0] * high, low > _TANGENTS[2] * high
    tangent = 1.0 if upper else (_TANGENTS[1] if middle else 0.0)
    turned = 4.0 * _SIXTEENTH if upper else (2.0 * _SIXTEENTH if middle else 0.0)
    u = fused(-tangent, high, low) / fused(tangent, low, high)
    q = u * u
    series = fused(q, 1.0 / 21.0, -1.0 / 19.0)
    series = fused(q, series, 1.0 / 17.0)
    series = fused(q, series, -1.0 / 15.0)
    series = fused(q, series, 1.0 / 13.0)
    series = fused(q, series, -1.0 / 11.0)
    series = fused(q, series, 1.0 / 9.0)
    series = fused(q, series, -1.0 / 7.0)
    series = fused(q, series, 1.0 / 5.0)
    series = fused(q, series, -1.0 / 3.0)
    angle = turned + fused(u * q, series, u)
    angle = _HALF_PI - angle if y > a else angle
    return math.pi - angle if x < 0.0 else angle


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

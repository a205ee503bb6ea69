"""Logarithm and arcs to a few digits, in a fraction of the time: enough to say which cell, unless an edge is near.

Polynomials by Abramowitz & Stegun (1964), Handbook of Mathematical Functions, equations 4.4.45 and 4.4.49.
"""

import math

import numpy as np

from tracer.kernels.compiling import inlined

ANGLE_ERROR = 1.2e-5
"""Greatest error of `rough_angle` [rad]."""

ARCSINE_ERROR = 7e-5
"""Greatest error of `rough_arcsine` [rad]."""

LOGARITHM_ERROR = 6e-3
"""Greatest error of `rough_logarithm`."""

MANTISSA = (1 << 52) - 1
ONE = 1023 << 52
"""Bits of a float64: those of the digits, and the number 1."""


@inlined
def rough_angle(x, y):
    """Return atan2(y, x) [rad] to `ANGLE_ERROR`; not a number at the origin."""
    ax, ay = abs(x), abs(y)
    t = min(ax, ay) / max(ax, ay)
    t2 = t * t
    angle = t * (0.9998660 + t2 * (-0.3302995 + t2 * (0.1801410 + t2 * (-0.0851330 + t2 * 0.0208351))))
    angle = 0.5 * math.pi - angle if ay > ax else angle
    angle = math.pi - angle if x < 0.0 else angle
    return -angle if y < 0.0 else angle


@inlined
def rough_arcsine(sine):
    """Return asin(`sine`) [rad] to `ARCSINE_ERROR`; not a number beyond -1 to 1."""
    s = abs(sine)
    below = math.sqrt(1.0 - s) * (1.5707288 + s * (-0.2121144 + s * (0.0742610 - s * 0.0187293)))
    return math.copysign(0.5 * math.pi - below, sine)


@inlined
def rough_logarithm(value):
    """Return the natural logarithm of a positive `value` to `LOGARITHM_ERROR`, from its bits."""
    bits = np.float64(value).view(np.int64)
    part = np.int64((bits & MANTISSA) | ONE).view(np.float64) - 1.0
    binary = (bits >> 52) - 1023 + part + 0.3437 * part * (1.0 - part)
    return math.log(2.0) * binary

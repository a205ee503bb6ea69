"""Kepler motion in universal variables: one set of formulas for ellipse, parabola, hyperbola and straight line.

The independent variable is the universal anomaly s with dt = r ds. With beta = 2 gm/r0 - v0^2, eta = r0 . v0 and
zeta = gm - beta r0 the motion is

    r = r0 + eta G1 + zeta G2,   t = r0 G1 + eta G2 + gm G3,

where G1 = sin(w s)/w, G2 = (1 - cos(w s))/w^2, G3 = (s - G1)/beta, w = sqrt(beta), continued through beta = 0 to
hyperbolic functions (Stumpff 1959; Danby 1988, Fundamentals of Celestial Mechanics, section 6.9).
"""

import math

from tracer.kernels.compiling import kernel

SERIES_LIMIT = 1.0
"""Below this |beta| s^2 the power series is used: nearer to zero the closed forms lose digits."""

INVERSION_STEPS = 80
"""More than any safeguarded Newton iteration on t(s) has needed; bisection alone would need 60."""


@kernel
def g_functions(beta, s):
    """Return G1 [s-scaled], G2 and G3 of universal anomaly `s` [s m-1] and `beta` [m2 s-2]."""
    z = beta * s * s
    if abs(z) < SERIES_LIMIT:
        c2, c3 = _stumpff_series(z)
        g2 = s * s * c2
        g3 = s * s * s * c3
        return s - beta * g3, g2, g3
    if beta > 0.0:
        w = math.sqrt(beta)
        half = math.sin(0.5 * w * s)
        g1 = math.sin(w * s) / w
        g2 = 2.0 * half * half / beta
    else:
        w = math.sqrt(-beta)
        half = math.sinh(0.5 * w * s)
        g1 = math.sinh(w * s) / w
        g2 = -2.0 * half * half / beta
    return g1, g2, (s - g1) / beta


@kernel
def _stumpff_series(z):
    """Return c2 = 1/2! - z/4! + z^2/6! - ... and c3 = 1/3! - z/5! + ..., exact to rounding for |z| < 1."""
    c2 = 1.0 / 2.0 - z * (
        1.0 / 24.0
        - z
        * (
            1.0 / 720.0
            - z * (1.0 / 40320.0 - z * (1.0 / 3628800.0 - z * (1.0 / 479001600.0 - z / 87178291200.0)))
        )
    )
    c3 = 1.0 / 6.0 - z * (
        1.0 / 120.0
        - z
        * (
            1.0 / 5040.0
            - z * (1.0 / 362880.0 - z * (1.0 / 39916800.0 - z * (1.0 / 6227020800.0 - z / 1307674368000.0)))
        )
    )
    return c2, c3


@kernel
def anomaly_from_half_tangent(beta, numerator, denominator):
    """Return s in [0, one period) from tan(w s/2)/w = numerator/denominator, `numerator` >= 0."""
    if beta > 0.0:
        w = math.sqrt(beta)
        angle = math.atan2(w * numerator, denominator)
        # Towards the parabola the angle is small and the quotient loses nothing.
        return 2.0 * angle / w
    ratio = numerator / denominator
    if beta == 0.0:
        return 2.0 * ratio
    w = math.sqrt(-beta)
    return 2.0 * math.atanh(w * ratio) / w


@kernel
def time_at(gm, r0, eta, beta, s):
    """Return the time [s] since launch at universal anomaly `s`."""
    g1, g2, g3 = g_functions(beta, s)
    return r0 * g1 + eta * g2 + gm * g3


@kernel
def anomaly_at_time(gm, r0, eta, beta, time, s_high):
    """Return the universal anomaly at `time` [s], known to lie in [0, `s_high`].

    Newton's iteration on t(s), kept inside a shrinking bracket; t(s) grows monotonically because dt/ds = r > 0.
    """
    zeta = gm - beta * r0
    low = 0.0
    high = s_high
    s = min(time / r0, s_high)
    for _ in range(INVERSION_STEPS):
        g1, g2, g3 = g_functions(beta, s)
        excess = r0 * g1 + eta * g2 + gm * g3 - time
        if excess > 0.0:
            high = s
        else:
            low = s
        step = -excess / (r0 + eta * g1 + zeta * g2)
        trial = s + step
        if not low <= trial <= high:
            trial = 0.5 * (low + high)
        if abs(trial - s) <= 1e-16 * s_high or trial == s:
            return trial
        s = trial
    return s

"""One trial step of an embedded Runge-Kutta pair of orders 5 and 4 with its dense output.

The nodes are even, and the weights of the solution those of Boole's rule, as in the fifth-order formula of Butcher
(1964), J. Austral. Math. Soc. 4, 179 (memory). The push of lines has a kink at each knot of their tables, several in
a step: even nodes see them, so that the same accuracy takes three quarters of the steps that the pair of Dormand &
Prince (1980), J. Comput. Appl. Math. 6, 19, takes, whose nodes leave half a step unseen. As there, the slope at a
step's end serves as the next one's first, and with it an estimate of the error; the dense output has fourth order,
and of all such the least error of fifth order over the step. All numbers are exact solutions of the conditions for
these orders (e.g. Hairer, Norsett & Wanner 1993, Solving Ordinary Differential Equations I, sections II.2 and II.6).

Each function below is a row of the tableau for one component: `y` its value, `h` the step [s], `k1`, `k2`, ... its
slopes. The newest slope is added last and by itself: the next stage waits for nothing else.
"""

import numpy as np

from tracer.kernels.compiling import inlined
from tracer.kernels.fused import fused
from tracer.kernels.motion import rates_beside

NODES = (0.0, 1.0 / 8.0, 1.0 / 4.0, 1.0 / 2.0, 3.0 / 4.0, 1.0, 1.0)
"""When in the step each stage is."""

TABLEAU = np.array(
    (
        (1.0 / 8.0, 0.0, 0.0, 0.0, 0.0, 0.0),
        (0.0, 1.0 / 4.0, 0.0, 0.0, 0.0, 0.0),
        (1.0 / 2.0, -1.0, 1.0, 0.0, 0.0, 0.0),
        (3.0 / 16.0, 0.0, 0.0, 9.0 / 16.0, 0.0, 0.0),
        (-5.0 / 7.0, 4.0 / 7.0, 12.0 / 7.0, -12.0 / 7.0, 8.0 / 7.0, 0.0),
        (7.0 / 90.0, 0.0, 16.0 / 45.0, 2.0 / 15.0, 16.0 / 45.0, 7.0 / 90.0),
    )
)
"""The same rows, from the second stage to the seventh, whose is the solution's, for a single lane."""


@inlined
def second_row(y, h, k1):
    return fused(1.0 / 8.0 * h, k1, y)


@inlined
def third_row(y, h, k2):
    return fused(1.0 / 4.0 * h, k2, y)


@inlined
def fourth_row(y, h, k1, k2, k3):
    return fused(h, k3, fused(h, fused(0.5, k1, -k2), y))


@inlined
def fifth_row(y, h, k1, k4):
    return fused(9.0 / 16.0 * h, k4, fused(3.0 / 16.0 * h, k1, y))


@inlined
def sixth_row(y, h, k1, k2, k3, k4, k5):
    older = fused(4.0 / 7.0, k2, -5.0 / 7.0 * k1)
    older = fused(-12.0 / 7.0, k4, fused(12.0 / 7.0, k3, older))
    return fused(8.0 / 7.0 * h, k5, fused(h, older, y))


@inlined
def solution_row(h, k1, k3, k4, k5, k6):
    older = fused(2.0 / 15.0, k4, fused(16.0 / 45.0, k3, 7.0 / 90.0 * k1))
    return fused(7.0 / 90.0 * h, k6, h * fused(16.0 / 45.0, k5, older))


@inlined
def error_row(h, k1, k3, k4, k5, k6, k7):
    older = fused(-1.0 / 75.0, k4, fused(2.0 / 225.0, k3, -1.0 / 450.0 * k1))
    older = fused(-49.0 / 1800.0, k6, fused(2.0 / 225.0, k5, older))
    return h * fused(1.0 / 40.0, k7, older)


@inlined
def quartic_row(h, k1, k3, k4, k5, k6, k7):
    older = fused(292832.0 / 117555.0, k3, -50526.0 / 39185.0 * k1)
    older = fused(-111376.0 / 39185.0, k5, fused(10324.0 / 39185.0, k4, older))
    return h * fused(15721.0 / 7837.0, k7, fused(-73913.0 / 117555.0, k6, older))


@inlined
def second(y, h, k1):
    return second_row(y[0], h, k1[0]), second_row(y[1], h, k1[1]), second_row(y[2], h, k1[2])


@inlined
def third(y, h, k2):
    return third_row(y[0], h, k2[0]), third_row(y[1], h, k2[1]), third_row(y[2], h, k2[2])


@inlined
def fourth(y, h, k1, k2, k3):
    return (
        fourth_row(y[0], h, k1[0], k2[0], k3[0]),
        fourth_row(y[1], h, k1[1], k2[1], k3[1]),
        fourth_row(y[2], h, k1[2], k2[2], k3[2]),
    )


@inlined
def fifth(y, h, k1, k4):
    return (
        fifth_row(y[0], h, k1[0], k4[0]),
        fifth_row(y[1], h, k1[1], k4[1]),
        fifth_row(y[2], h, k1[2], k4[2]),
    )


@inlined
def sixth(y, h, k1, k2, k3, k4, k5):
    return (
        sixth_row(y[0], h, k1[0], k2[0], k3[0], k4[0], k5[0]),
        sixth_row(y[1], h, k1[1], k2[1], k3[1], k4[1], k5[1]),
        sixth_row(y[2], h, k1[2], k2[2], k3[2], k4[2], k5[2]),
    )


@inlined
def solution(h, k1, k3, k4, k5, k6):
    return (
        solution_row(h, k1[0], k3[0], k4[0], k5[0], k6[0]),
        solution_row(h, k1[1], k3[1], k4[1], k5[1], k6[1]),
        solution_row(h, k1[2], k3[2], k4[2], k5[2], k6[2]),
    )


@inlined
def _error(h, k1, k3, k4, k5, k6, k7):
    return (
        error_row(h, k1[0], k3[0], k4[0], k5[0], k6[0], k7[0]),
        error_row(h, k1[1], k3[1], k4[1], k5[1], k6[1], k7[1]),
        error_row(h, k1[2], k3[2], k4[2], k5[2], k6[2], k7[2]),
    )


@inlined
def quartic(h, k1, k3, k4, k5, k6, k7):
    return (
        quartic_row(h, k1[0], k3[0], k4[0], k5[0], k6[0], k7[0]),
        quartic_row(h, k1[1], k3[1], k4[1], k5[1], k6[1], k7[1]),
        quartic_row(h, k1[2], k3[2], k4[2], k5[2], k6[2], k7[2]),
    )


@inlined
def trial_step(sky, tables, zone, bodies, h, p, v, slopes):
    """Try one step of `h` [s] within shadow `zone` from position `p` [m] and velocity `v` [m s-1] with their `slopes`.

    `slopes` are acceleration and loss rates as `rates_beside` returns them, `bodies` (7,) is the body at each of the
    `NODES`. Returns (growth, end slopes, error, quartic): the growth of
    position, velocity and both hazards; the slopes at the end, which are the next step's first; the squared errors of
    position, velocity and hazard; the fourth-order coefficients of the dense output.
    """
    a1, l1 = slopes
    v2 = second(v, h, a1)
    a2, _ = rates_beside(sky, tables, zone, bodies[1], second(p, h, v), v2)
    v3 = third(v, h, a2)
    a3, l3 = rates_beside(sky, tables, zone, bodies[2], third(p, h, v2), v3)
    v4 = fourth(v, h, a1, a2, a3)
    a4, l4 = rates_beside(sky, tables, zone, bodies[3], fourth(p, h, v, v2, v3), v4)
    v5 = fifth(v, h, a1, a4)
    a5, l5 = rates_beside(sky, tables, zone, bodies[4], fifth(p, h, v, v4), v5)
    v6 = sixth(v, h, a1, a2, a3, a4, a5)
    a6, l6 = rates_beside(sky, tables, zone, bodies[5], sixth(p, h, v, v2, v3, v4, v5), v6)
    growth = (
        solution(h, v, v3, v4, v5, v6),
        solution(h, a1, a3, a4, a5, a6),
        _hazards(h, l1, l3, l4, l5, l6),
    )
    v7 = _sum(v, growth[1])
    a7, l7 = rates_beside(sky, tables, zone, bodies[6], _sum(p, growth[0]), v7)
    error = (
        _square(_error(h, v, v3, v4, v5, v6, v7)),
        _square(_error(h, a1, a3, a4, a5, a6, a7)),
        _hazard_error(h, l1, l3, l4, l5, l6, l7) ** 2,
    )
    bent = (
        quartic(h, v, v3, v4, v5, v6, v7),
        quartic(h, a1, a3, a4, a5, a6, a7),
        _hazard_quartic(h, l1, l3, l4, l5, l6, l7),
    )
    return growth, (a7, l7), error, bent


@inlined
def _hazards(h, k1, k3, k4, k5, k6):
    return solution_row(h, k1[0], k3[0], k4[0], k5[0], k6[0]), solution_row(
        h, k1[1], k3[1], k4[1], k5[1], k6[1]
    )


@inlined
def _hazard_quartic(h, k1, k3, k4, k5, k6, k7):
    return quartic_row(h, k1[0], k3[0], k4[0], k5[0], k6[0], k7[0]), quartic_row(
        h, k1[1], k3[1], k4[1], k5[1], k6[1], k7[1]
    )


@inlined
def _hazard_error(h, k1, k3, k4, k5, k6, k7):
    return error_row(
        h, k1[0] + k1[1], k3[0] + k3[1], k4[0] + k4[1], k5[0] + k5[1], k6[0] + k6[1], k7[0] + k7[1]
    )


@inlined
def _sum(a, b):
    return a[0] + b[0], a[1] + b[1], a[2] + b[2]


@inlined
def _square(a):
    return a[0] * a[0] + a[1] * a[1] + a[2] * a[2]

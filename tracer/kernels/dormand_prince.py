"""One trial step of the Dormand-Prince 5(4) pair with its dense output.

Dormand & Prince (1980), J. Comput. Appl. Math. 6, 19, the seven-stage pair RK5(4)7M; dense output of fourth
order by Hairer, Norsett & Wanner (1993), Solving Ordinary Differential Equations I, section II.6. Each
function below is a row of the tableau for one component: `y` its value, `h` the step [s], `k1`, `k2`, ... its
slopes. The newest slope is added last and by itself: the next stage waits for nothing else.
"""

import numpy as np

from tracer.kernels.compiling import inlined
from tracer.kernels.fused import fused
from tracer.kernels.motion import rates_of_change

TABLEAU = np.array(
    (
        (1.0 / 5.0, 0.0, 0.0, 0.0, 0.0, 0.0),
        (3.0 / 40.0, 9.0 / 40.0, 0.0, 0.0, 0.0, 0.0),
        (44.0 / 45.0, -56.0 / 15.0, 32.0 / 9.0, 0.0, 0.0, 0.0),
        (19372.0 / 6561.0, -25360.0 / 2187.0, 64448.0 / 6561.0, -212.0 / 729.0, 0.0, 0.0),
        (9017.0 / 3168.0, -355.0 / 33.0, 46732.0 / 5247.0, 49.0 / 176.0, -5103.0 / 18656.0, 0.0),
        (35.0 / 384.0, 0.0, 500.0 / 1113.0, 125.0 / 192.0, -2187.0 / 6784.0, 11.0 / 84.0),
    )
)
"""The same rows, from the second stage to the seventh, whose is the solution's, for a single lane."""


@inlined
def second_row(y, h, k1):
    return fused(0.2 * h, k1, y)


@inlined
def third_row(y, h, k1, k2):
    return fused(9.0 / 40.0 * h, k2, fused(3.0 / 40.0 * h, k1, y))


@inlined
def fourth_row(y, h, k1, k2, k3):
    older = fused(44.0 / 45.0, k1, -56.0 / 15.0 * k2)
    return fused(32.0 / 9.0 * h, k3, fused(h, older, y))


@inlined
def fifth_row(y, h, k1, k2, k3, k4):
    older = fused(64448.0 / 6561.0, k3, fused(-25360.0 / 2187.0, k2, 19372.0 / 6561.0 * k1))
    return fused(-212.0 / 729.0 * h, k4, fused(h, older, y))


@inlined
def sixth_row(y, h, k1, k2, k3, k4, k5):
    older = fused(-355.0 / 33.0, k2, 9017.0 / 3168.0 * k1)
    older = fused(49.0 / 176.0, k4, fused(46732.0 / 5247.0, k3, older))
    return fused(-5103.0 / 18656.0 * h, k5, fused(h, older, y))


@inlined
def solution_row(h, k1, k3, k4, k5, k6):
    older = fused(125.0 / 192.0, k4, fused(500.0 / 1113.0, k3, 35.0 / 384.0 * k1))
    return fused(11.0 / 84.0 * h, k6, h * fused(-2187.0 / 6784.0, k5, older))


@inlined
def error_row(h, k1, k3, k4, k5, k6, k7):
    older = fused(71.0 / 1920.0, k4, fused(-71.0 / 16695.0, k3, 71.0 / 57600.0 * k1))
    older = fused(22.0 / 525.0, k6, fused(-17253.0 / 339200.0, k5, older))
    return h * fused(-1.0 / 40.0, k7, older)


@inlined
def quartic_row(h, k1, k3, k4, k5, k6, k7):
    older = fused(87487479700.0 / 32700410799.0, k3, -12715105075.0 / 11282082432.0 * k1)
    older = fused(701980252875.0 / 199316789632.0, k5, fused(-10690763975.0 / 1880347072.0, k4, older))
    return h * fused(69997945.0 / 29380423.0, k7, fused(-1453857185.0 / 822651844.0, k6, older))


@inlined
def second(y, h, k1):
    return second_row(y[0], h, k1[0]), second_row(y[1], h, k1[1]), second_row(y[2], h, k1[2])


@inlined
def third(y, h, k1, k2):
    return (
        third_row(y[0], h, k1[0], k2[0]),
        third_row(y[1], h, k1[1], k2[1]),
        third_row(y[2], h, k1[2], k2[2]),
    )


@inlined
def fourth(y, h, k1, k2, k3):
    return (
        fourth_row(y[0], h, k1[0], k2[0], k3[0]),
        fourth_row(y[1], h, k1[1], k2[1], k3[1]),
        fourth_row(y[2], h, k1[2], k2[2], k3[2]),
    )


@inlined
def fifth(y, h, k1, k2, k3, k4):
    return (
        fifth_row(y[0], h, k1[0], k2[0], k3[0], k4[0]),
        fifth_row(y[1], h, k1[1], k2[1], k3[1], k4[1]),
        fifth_row(y[2], h, k1[2], k2[2], k3[2], k4[2]),
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
def trial_step(sky, tables, zone, h, p, v, slopes):
    """Try one step of `h` [s] within shadow `zone` from position `p` [m] and velocity `v` [m s-1] with their `slopes`.

    `slopes` are acceleration and loss rates as `rates_of_change` returns them. Returns (growth, end slopes, error,
    quartic): the growth of position, velocity and both hazards; the slopes at the end, which are the next step's
    first; the squared errors of position, velocity and hazard; the fourth-order coefficients of the dense output.
    """
    a1, l1 = slopes
    v2 = second(v, h, a1)
    a2, _ = rates_of_change(sky, tables, zone, second(p, h, v), v2)
    v3 = third(v, h, a1, a2)
    a3, l3 = rates_of_change(sky, tables, zone, third(p, h, v, v2), v3)
    v4 = fourth(v, h, a1, a2, a3)
    a4, l4 = rates_of_change(sky, tables, zone, fourth(p, h, v, v2, v3), v4)
    v5 = fifth(v, h, a1, a2, a3, a4)
    a5, l5 = rates_of_change(sky, tables, zone, fifth(p, h, v, v2, v3, v4), v5)
    v6 = sixth(v, h, a1, a2, a3, a4, a5)
    a6, l6 = rates_of_change(sky, tables, zone, sixth(p, h, v, v2, v3, v4, v5), v6)
    growth = (
        solution(h, v, v3, v4, v5, v6),
        solution(h, a1, a3, a4, a5, a6),
        _hazards(h, l1, l3, l4, l5, l6),
    )
    v7 = _sum(v, growth[1])
    a7, l7 = rates_of_change(sky, tables, zone, _sum(p, growth[0]), v7)
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

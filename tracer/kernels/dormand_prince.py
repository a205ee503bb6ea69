"""One trial step of the Dormand-Prince 5(4) pair with its dense output.

Dormand & Prince (1980), J. Comput. Appl. Math. 6, 19, the seven-stage pair RK5(4)7M; dense output of fourth
order by Hairer, Norsett & Wanner (1993), Solving Ordinary Differential Equations I, section II.6. Each
function below is a row of the tableau for one component: `y` its value, `h` the step [s], `k1`, `k2`, ... its
slopes.
"""

from tracer.kernels.compiling import inlined
from tracer.kernels.motion import rates_of_change


@inlined
def _second(y, h, k1):
    return y + h * (0.2 * k1)


@inlined
def _third(y, h, k1, k2):
    return y + h * (3.0 / 40.0 * k1 + 9.0 / 40.0 * k2)


@inlined
def _fourth(y, h, k1, k2, k3):
    return y + h * (44.0 / 45.0 * k1 - 56.0 / 15.0 * k2 + 32.0 / 9.0 * k3)


@inlined
def _fifth(y, h, k1, k2, k3, k4):
    return y + h * (
        19372.0 / 6561.0 * k1 - 25360.0 / 2187.0 * k2 + 64448.0 / 6561.0 * k3 - 212.0 / 729.0 * k4
    )


@inlined
def _sixth(y, h, k1, k2, k3, k4, k5):
    return y + h * (
        9017.0 / 3168.0 * k1
        - 355.0 / 33.0 * k2
        + 46732.0 / 5247.0 * k3
        + 49.0 / 176.0 * k4
        - 5103.0 / 18656.0 * k5
    )


@inlined
def _solution(h, k1, k3, k4, k5, k6):
    return h * (
        35.0 / 384.0 * k1 + 500.0 / 1113.0 * k3 + 125.0 / 192.0 * k4 - 2187.0 / 6784.0 * k5 + 11.0 / 84.0 * k6
    )


@inlined
def _error(h, k1, k3, k4, k5, k6, k7):
    return h * (
        71.0 / 57600.0 * k1
        - 71.0 / 16695.0 * k3
        + 71.0 / 1920.0 * k4
        - 17253.0 / 339200.0 * k5
        + 22.0 / 525.0 * k6
        - 1.0 / 40.0 * k7
    )


@inlined
def _quartic(h, k1, k3, k4, k5, k6, k7):
    return h * (
        -12715105075.0 / 11282082432.0 * k1
        + 87487479700.0 / 32700410799.0 * k3
        - 10690763975.0 / 1880347072.0 * k4
        + 701980252875.0 / 199316789632.0 * k5
        - 1453857185.0 / 822651844.0 * k6
        + 69997945.0 / 29380423.0 * k7
    )


@inlined
def trial_step(sky, tables, zone, h, place, slopes):
    """Try one step of `h` [s] within shadow `zone` from `place` (x, y, z, vx, vy, vz) with its `slopes`.

    `slopes` are accelerations and loss rates as `rates_of_change` returns them. Returns (growth, end slopes,
    error, quartic): the growth of the six coordinates and the two hazards; the slopes at the end, which are
    the next step's first; the estimated error of position [m], velocity [m s-1] and hazard, squared; and the
    fourth-order coefficients of the dense output, eight components.
    """
    x, y, z, u, v, w = place
    a1, b1, c1, i1, o1 = slopes
    u2, v2, w2 = _second(u, h, a1), _second(v, h, b1), _second(w, h, c1)
    a2, b2, c2, _, _ = rates_of_change(
        sky, tables, zone, _second(x, h, u), _second(y, h, v), _second(z, h, w), u2, v2, w2
    )
    u3, v3, w3 = _third(u, h, a1, a2), _third(v, h, b1, b2), _third(w, h, c1, c2)
    a3, b3, c3, i3, o3 = rates_of_change(
        sky, tables, zone, _third(x, h, u, u2), _third(y, h, v, v2), _third(z, h, w, w2), u3, v3, w3
    )
    u4, v4, w4 = _fourth(u, h, a1, a2, a3), _fourth(v, h, b1, b2, b3), _fourth(w, h, c1, c2, c3)
    a4, b4, c4, i4, o4 = rates_of_change(
        sky,
        tables,
        zone,
        _fourth(x, h, u, u2, u3),
        _fourth(y, h, v, v2, v3),
        _fourth(z, h, w, w2, w3),
        u4,
        v4,
        w4,
    )
    u5, v5, w5 = _fifth(u, h, a1, a2, a3, a4), _fifth(v, h, b1, b2, b3, b4), _fifth(w, h, c1, c2, c3, c4)
    a5, b5, c5, i5, o5 = rates_of_change(
        sky,
        tables,
        zone,
        _fifth(x, h, u, u2, u3, u4),
        _fifth(y, h, v, v2, v3, v4),
        _fifth(z, h, w, w2, w3, w4),
        u5,
        v5,
        w5,
    )
    u6 = _sixth(u, h, a1, a2, a3, a4, a5)
    v6 = _sixth(v, h, b1, b2, b3, b4, b5)
    w6 = _sixth(w, h, c1, c2, c3, c4, c5)
    a6, b6, c6, i6, o6 = rates_of_change(
        sky,
        tables,
        zone,
        _sixth(x, h, u, u2, u3, u4, u5),
        _sixth(y, h, v, v2, v3, v4, v5),
        _sixth(z, h, w, w2, w3, w4, w5),
        u6,
        v6,
        w6,
    )
    dx, dy, dz = (
        _solution(h, u, u3, u4, u5, u6),
        _solution(h, v, v3, v4, v5, v6),
        _solution(h, w, w3, w4, w5, w6),
    )
    du, dv, dw = (
        _solution(h, a1, a3, a4, a5, a6),
        _solution(h, b1, b3, b4, b5, b6),
        _solution(h, c1, c3, c4, c5, c6),
    )
    di, do = _solution(h, i1, i3, i4, i5, i6), _solution(h, o1, o3, o4, o5, o6)
    u7, v7, w7 = u + du, v + dv, w + dw
    a7, b7, c7, i7, o7 = rates_of_change(sky, tables, zone, x + dx, y + dy, z + dz, u7, v7, w7)
    ex, ey, ez = (
        _error(h, u, u3, u4, u5, u6, u7),
        _error(h, v, v3, v4, v5, v6, v7),
        _error(h, w, w3, w4, w5, w6, w7),
    )
    eu, ev, ew = (
        _error(h, a1, a3, a4, a5, a6, a7),
        _error(h, b1, b3, b4, b5, b6, b7),
        _error(h, c1, c3, c4, c5, c6, c7),
    )
    eh = _error(h, i1 + o1, i3 + o3, i4 + o4, i5 + o5, i6 + o6, i7 + o7)
    quartic = (
        _quartic(h, u, u3, u4, u5, u6, u7),
        _quartic(h, v, v3, v4, v5, v6, v7),
        _quartic(h, w, w3, w4, w5, w6, w7),
        _quartic(h, a1, a3, a4, a5, a6, a7),
        _quartic(h, b1, b3, b4, b5, b6, b7),
        _quartic(h, c1, c3, c4, c5, c6, c7),
        _quartic(h, i1, i3, i4, i5, i6, i7),
        _quartic(h, o1, o3, o4, o5, o6, o7),
    )
    error = (ex * ex + ey * ey + ez * ez, eu * eu + ev * ev + ew * ew, eh * eh)
    return (dx, dy, dz, du, dv, dw, di, do), (a7, b7, c7, i7, o7), error, quartic

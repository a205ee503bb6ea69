"""One flight on a closed-form Kepler arc: from the launch on the surface to landing, outer sphere or a given time."""

import math
from typing import NamedTuple

from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.universal import anomaly_from_half_tangent, g_functions


class Arc(NamedTuple):
    """Kepler motion from a launch point: position [m], velocity [m s-1] and the constants of universal variables."""

    gm: float
    x: float
    y: float
    z: float
    vx: float
    vy: float
    vz: float
    r0: float
    eta: float
    beta: float
    zeta: float


@inlined
def make_arc(gm, x, y, z, vx, vy, vz):
    """Return the `Arc` through position (x, y, z) with velocity (vx, vy, vz), both in a frame that does not turn."""
    r0 = math.sqrt(x * x + y * y + z * z)
    eta = x * vx + y * vy + z * vz
    beta = 2.0 * gm / r0 - (vx * vx + vy * vy + vz * vz)
    return Arc(gm, x, y, z, vx, vy, vz, r0, eta, beta, gm - beta * r0)


@kernel
def crossing(arc, outer_radius):
    """Return (crosses, s): whether the arc reaches `outer_radius` [m] outwards, and its universal anomaly there."""
    rise = outer_radius - arc.r0
    # (r v_r)^2 at the outer sphere; its root is real exactly where the arc gets there.
    squared = arc.eta * arc.eta + rise * (2.0 * arc.zeta - arc.beta * rise)
    if squared <= 0.0:
        return False, 0.0
    return True, anomaly_from_half_tangent(arc.beta, rise, arc.eta + math.sqrt(squared))


@kernel
def landing(arc):
    """Return the universal anomaly at which a bound arc comes back to its launch radius.

    A horizontal launch may have a negative climb by rounding, which would land it one period before its launch.
    """
    return anomaly_from_half_tangent(arc.beta, max(0.0, arc.eta), -arc.zeta)


@kernel
def highest(arc, s_end):
    """Return the universal anomaly of the arc's greatest distance from the centre between launch and `s_end`."""
    if arc.beta > 0.0:
        # An arc is symmetric about its apex: half-way to where it would land.
        return min(0.5 * landing(arc), s_end)
    return s_end


@kernel
def state_at(arc, s):
    """Return (time, r, x, y, z, vx, vy, vz) at universal anomaly `s`, SI units."""
    g1, g2, g3 = g_functions(arc.beta, s)
    r = arc.r0 + arc.eta * g1 + arc.zeta * g2
    g = arc.r0 * g1 + arc.eta * g2
    f = 1.0 - arc.gm * g2 / arc.r0
    f_rate = -arc.gm * g1 / (arc.r0 * r)
    g_rate = 1.0 - arc.gm * g2 / r
    return (
        g + arc.gm * g3,
        r,
        f * arc.x + g * arc.vx,
        f * arc.y + g * arc.vy,
        f * arc.z + g * arc.vz,
        f_rate * arc.x + g_rate * arc.vx,
        f_rate * arc.y + g_rate * arc.vy,
        f_rate * arc.z + g_rate * arc.vz,
    )


@kernel
def position_at(arc, s):
    """Return (time, r, x, y, z) at universal anomaly `s`, SI units; cheaper than `state_at`."""
    g1, g2, g3 = g_functions(arc.beta, s)
    r = arc.r0 + arc.eta * g1 + arc.zeta * g2
    g = arc.r0 * g1 + arc.eta * g2
    f = 1.0 - arc.gm * g2 / arc.r0
    return g + arc.gm * g3, r, f * arc.x + g * arc.vx, f * arc.y + g * arc.vy, f * arc.z + g * arc.vz

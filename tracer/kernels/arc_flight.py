"""A flight on a closed-form arc in the Sun-fixed frame: where it ends and what it leaves in the cells.

The arc is drawn in a frame that does not turn and coincides with the Sun-fixed one at launch; positions are turned
back by frame_rate times t.
"""

import math

from tracer.kernels.angles import angle_above
from tracer.kernels.arc import crossing, landing, make_arc, position_at, state_at
from tracer.kernels.compiling import inlined, kernel, merged
from tracer.kernels.endings import AGED, CROSSED, LANDED, UNRESOLVED
from tracer.kernels.scoring import score_sample
from tracer.kernels.universal import anomaly_at_time, time_at

FAR_SAMPLES = 16
"""Samples of a flight that is no closed hop."""

LEAST_BINDING = 1e-3
"""Binding energy in units of gm/(2 r0) from which on a hop is closed in w s: nearer to the parabola digits are lost."""


@kernel
def turned(x, y, angle):
    """Return (x, y) in axes turned by `angle` [rad] about +z."""
    if angle == 0.0:
        return x, y
    c = math.cos(angle)
    s = math.sin(angle)
    return c * x + s * y, c * y - s * x


@kernel
def launch_arc(motion, x, y, z, vx, vy, vz):
    """Return the arc of a launch at (x, y, z) [m] with velocity (vx, vy, vz) [m s-1] in the Sun-fixed frame."""
    rate = motion.frame_rate
    return make_arc(motion.gm, x, y, z, vx - rate * y, vy + rate * x, vz)


@kernel
def arc_end(motion, arc, time_left):
    """Return (ending, s): how the flight ends and at which universal anomaly; `time_left` [s] to the age limit."""
    crosses, s = crossing(arc, motion.outer_radius)
    ending = CROSSED
    if not crosses:
        s = landing(arc)
        ending = LANDED
    duration = time_at(arc.gm, arc.r0, arc.eta, arc.beta, s)
    if not duration < math.inf:
        return UNRESOLVED, 0.0
    if duration > time_left:
        return AGED, anomaly_at_time(arc.gm, arc.r0, arc.eta, arc.beta, time_left, s)
    return ending, s


@kernel
def arc_state(motion, arc, s):
    """Return (time, x, y, z, vx, vy, vz) at universal anomaly `s` in the Sun-fixed frame, SI units."""
    t, _r, x, y, z, vx, vy, vz = state_at(arc, s)
    rate = motion.frame_rate
    x, y = turned(x, y, rate * t)
    vx, vy = turned(vx, vy, rate * t)
    return t, x, y, z, vx + rate * y, vy - rate * x, vz


@inlined
def closed_hop(arc, outer_radius, time_left):
    """Return (closed, (duration, w, 1/beta, w s, G1, G2 at landing)): whether a well bound hop lands in time.

    Without branches, for many arcs at once; what belongs to one that is not closed means nothing. With h^2 = zeta^2 +
    beta eta^2 the half-angle w s/2 of the landing has the sine w eta/h and the cosine -zeta/h.
    """
    rise = outer_radius - arc.r0
    stays = arc.eta * arc.eta + rise * (2.0 * arc.zeta - arc.beta * rise) <= 0.0
    # A launch along the ground may have a negative climb by rounding.
    bound = (arc.beta * arc.r0 > LEAST_BINDING * arc.gm) & (arc.eta > 0.0)
    beta, eta = arc.beta if bound else 1.0, arc.eta if bound else 1.0
    w, per_beta = math.sqrt(beta), 1.0 / beta
    angle = 2.0 * angle_above(-arc.zeta, w * eta)
    per_square = 2.0 * eta / (arc.zeta * arc.zeta + beta * eta * eta)
    g1, g2 = -arc.zeta * per_square, eta * per_square
    duration = arc.r0 * g1 + eta * g2 + arc.gm * per_beta * (angle * (w * per_beta) - g1)
    return bound & stays & (duration <= time_left), (duration, w, per_beta, angle, g1, g2)


@inlined
def hop_end(arc, hop):
    """Return (x, y, z, vx, vy, vz) of the landing of `hop` (see `closed_hop`) in the frame of the arc."""
    _t, _w, _per_beta, _angle, g1, g2 = hop
    per_r0 = 1.0 / arc.r0
    f = 1.0 - arc.gm * g2 * per_r0
    g = arc.r0 * g1 + arc.eta * g2
    f_rate = -arc.gm * g1 * (per_r0 * per_r0)
    return (
        f * arc.x + g * arc.vx,
        f * arc.y + g * arc.vy,
        f * arc.z + g * arc.vz,
        f_rate * arc.x + f * arc.vx,
        f_rate * arc.y + f * arc.vy,
        f_rate * arc.z + f * arc.vz,
    )


@merged
def score_arc(world, tally, arc, s_end, weight, shine, rng):
    """Count the flight from launch to `s_end` by residence time, one random sample in each equal stratum of s.

    A sample stands for the time r ds that the atom spends in its stratum, so its content is weight times survival
    times r ds. Even strata of s, not of time, put more of the samples near the body, where cells are small.
    """
    motion = world.motion
    width = s_end / FAR_SAMPLES
    for k in range(FAR_SAMPLES):
        s = (k + rng.random()) * width
        t, r, x, y, z = position_at(arc, s)
        x, y = turned(x, y, motion.frame_rate * t)
        velocity = (0.0, 0.0, 0.0)
        if world.images.velocities.resolved:
            _t, _x, _y, _z, vx, vy, vz = arc_state(motion, arc, s)
            velocity = (vx, vy, vz)
        content = weight * r * width
        if motion.hazard > 0.0:
            content *= math.exp(-motion.hazard * t)
        # Arcs are for scenes in which nothing depends on light: nothing shines, nothing is ionised.
        score_sample(tally, world.cells, world.images, x, y, z, r, velocity, content, 0.0, shine[:0])

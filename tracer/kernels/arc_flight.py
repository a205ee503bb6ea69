"""A flight on a closed-form arc in the Sun-fixed frame: where it ends and what it leaves in the cells.

The arc is drawn in a frame that does not turn and coincides with the Sun-fixed one at launch; positions are turned
back by frame_rate times t.
"""

import math

from tracer.kernels.arc import crossing, landing, make_arc, position_at, state_at
from tracer.kernels.compiling import kernel, merged
from tracer.kernels.endings import AGED, CROSSED, LANDED, UNRESOLVED
from tracer.kernels.scoring import score_sample
from tracer.kernels.universal import anomaly_at_time, time_at

SAMPLES_PER_FLIGHT = 6
"""Strata of a flight, one sample each: more gain less than the time they cost."""


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


@merged
def score_arc(world, tally, arc, s_end, weight, shine, rng):
    """Count the flight from launch to `s_end` by residence time, one random sample in each equal stratum of s.

    A sample stands for the time r ds that the atom spends in its stratum, so its content is weight times survival
    times r ds. Even strata of s, not of time, put more of the samples near the body, where cells are small.
    """
    motion = world.motion
    width = s_end / SAMPLES_PER_FLIGHT
    for k in range(SAMPLES_PER_FLIGHT):
        t, r, x, y, z = position_at(arc, (k + rng.random()) * width)
        x, y = turned(x, y, motion.frame_rate * t)
        content = weight * r * width
        if motion.hazard > 0.0:
            content *= math.exp(-motion.hazard * t)
        # Arcs are for scenes in which nothing depends on light: nothing shines, nothing is ionised.
        score_sample(tally, world.cells, world.images, x, y, z, r, content, 0.0, shine[:0])

"""A flight on a closed-form arc in the Sun-fixed frame: where it ends and what it leaves in the cells.

The arc is drawn in a frame that does not turn and coincides with the Sun-fixed one at launch; positions are turned
back by frame_rate times t.
"""

import math

from tracer.fate import Fate
from tracer.kernels.arc import crossing, landing, make_arc, position_at, state_at
from tracer.kernels.compiling import inlined, kernel, merged
from tracer.kernels.endings import AGED, CROSSED, LANDED, UNRESOLVED
from tracer.kernels.resume import AGE
from tracer.kernels.scoring import mean_survival_time, score_sample
from tracer.kernels.universal import anomaly_at_time, time_at

LEAST_SAMPLES = 3
SAMPLES_PER_ANGLE = 4.0
"""Samples of a hop, and more for each radian of w s between launch and landing: the higher, the more cells it meets."""

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


@merged
def fly_arc(world, tally, atom, alive, shine, rng):
    """Return (ending, survival, time, position, velocity) of one flight on a closed-form arc, and count it.

    `atom` (see `resume`) is at its launch, of which `alive` [s-1] flies.
    """
    motion = world.motion
    arc = launch_arc(motion, atom[0], atom[1], atom[2], atom[3], atom[4], atom[5])
    time_left = motion.age_limit - atom[AGE]
    hops, hop = closed_hop(arc, motion.outer_radius, time_left)
    if hops:
        ending = LANDED
        score_hop(world, tally, arc, hop, alive, shine, rng)
        t, x, y, z, vx, vy, vz = hop_end(motion, arc, hop)
    else:
        ending, s_end = arc_end(motion, arc, time_left)
        score_arc(world, tally, arc, s_end, alive, shine, rng)
        t, x, y, z, vx, vy, vz = arc_state(motion, arc, s_end)
    kept = math.exp(-motion.hazard * t) if motion.hazard > 0.0 else 1.0
    tally.life[0] += alive * mean_survival_time(motion.hazard, t)
    tally.ledger[Fate.OTHER_LOSS] += alive - alive * kept
    return ending, kept, t, x, y, z, vx, vy, vz


@merged
def closed_hop(arc, outer_radius, time_left):
    """Return (hops, (duration, w, w s, G1, G2 at landing)): whether the arc is a well bound hop that lands in time.

    With h^2 = zeta^2 + beta eta^2 the half-angle w s/2 of the landing has the sine w eta/h and the cosine -zeta/h.
    """
    rise = outer_radius - arc.r0
    crosses = arc.eta * arc.eta + rise * (2.0 * arc.zeta - arc.beta * rise) > 0.0
    # A launch along the ground may have a negative climb by rounding.
    if crosses or not (arc.beta * arc.r0 > LEAST_BINDING * arc.gm and arc.eta > 0.0):
        return False, (0.0, 0.0, 0.0, 0.0, 0.0)
    w = math.sqrt(arc.beta)
    angle = 2.0 * math.atan2(w * arc.eta, -arc.zeta)
    per_square = 2.0 * arc.eta / (arc.zeta * arc.zeta + arc.beta * arc.eta * arc.eta)
    g1, g2 = -arc.zeta * per_square, arc.eta * per_square
    duration = arc.r0 * g1 + arc.eta * g2 + arc.gm * (angle / w - g1) / arc.beta
    return duration <= time_left, (duration, w, angle, g1, g2)


@merged
def hop_end(motion, arc, hop):
    """Return (time, x, y, z, vx, vy, vz) of the landing of `hop` (see `closed_hop`) in the Sun-fixed frame."""
    t, _w, _angle, g1, g2 = hop
    f = 1.0 - arc.gm * g2 / arc.r0
    g = arc.r0 * g1 + arc.eta * g2
    f_rate = -arc.gm * g1 / (arc.r0 * arc.r0)
    rate = motion.frame_rate
    x, y = turned(f * arc.x + g * arc.vx, f * arc.y + g * arc.vy, rate * t)
    vx, vy = turned(f_rate * arc.x + f * arc.vx, f_rate * arc.y + f * arc.vy, rate * t)
    return t, x, y, f * arc.z + g * arc.vz, vx + rate * y, vy - rate * x, f_rate * arc.z + f * arc.vz


@inlined
def short_sine(x):
    """Return sin x to 1e-13 for |x| < 0.15, by its series."""
    q = x * x
    return x * (1.0 - q * (1.0 / 6.0 - q * (1.0 / 120.0 - q * (1.0 / 5040.0))))


@merged
def score_hop(world, tally, arc, hop, weight, shine, rng):
    """Count a hop by residence time as `score_arc` does, with samples in steps of w s from one random start.

    Each sample is even in its stratum. Sine and cosine of the next come from those of the one before by turning.
    """
    motion = world.motion
    _t, w, angle, _g1, _g2 = hop
    per_w, per_beta = 1.0 / w, 1.0 / arc.beta
    samples = LEAST_SAMPLES + int(SAMPLES_PER_ANGLE * angle)
    step = angle / samples
    phase = rng.random() * step
    half = short_sine(0.5 * phase)
    sine, versine = 2.0 * half * math.sqrt(1.0 - half * half), 2.0 * half * half
    half = short_sine(0.5 * step)
    turn_sine, turn_versine = 2.0 * half * math.sqrt(1.0 - half * half), 2.0 * half * half
    radial, swing = arc.eta * per_w, arc.zeta * per_beta
    fall, along, rest = arc.gm * per_beta / arc.r0, arc.r0 * per_w, arc.eta * per_beta
    lasting = weight * step * per_w
    for _ in range(samples):
        r = arc.r0 + radial * sine + swing * versine
        f = 1.0 - fall * versine
        g = along * sine + rest * versine
        x, y, z = f * arc.x + g * arc.vx, f * arc.y + g * arc.vy, f * arc.z + g * arc.vz
        content = lasting * r
        t = g + arc.gm * per_beta * per_w * (phase - sine)
        if motion.hazard > 0.0 or motion.frame_rate != 0.0:
            x, y = turned(x, y, motion.frame_rate * t)
            content *= math.exp(-motion.hazard * t)
        velocity = (0.0, 0.0, 0.0)
        if world.images.velocities.resolved:
            f_rate = -arc.gm * per_w * sine / (arc.r0 * r)
            g_rate = 1.0 - arc.gm * per_beta * versine / r
            vx, vy = f_rate * arc.x + g_rate * arc.vx, f_rate * arc.y + g_rate * arc.vy
            vx, vy = turned(vx, vy, motion.frame_rate * t)
            vz = f_rate * arc.z + g_rate * arc.vz
            velocity = (vx + motion.frame_rate * y, vy - motion.frame_rate * x, vz)
        score_sample(tally, world.cells, world.images, x, y, z, r, velocity, content, 0.0, shine[:0])
        cosine = 1.0 - versine
        sine, versine = (
            sine - sine * turn_versine + cosine * turn_sine,
            versine + cosine * turn_versine + sine * turn_sine,
        )
        phase += step


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

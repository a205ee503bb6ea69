"""Closed hops side by side: where each lands and what it leaves in the budget, then sample after sample of them all.

A lane's arc is that from row `START`, in a frame that does not turn and coincides with the Sun-fixed one at launch.
Loops over lanes become vector operations, see `lanes`.
"""

import math

import numpy as np

from tracer.kernels.angles import sine_and_cosine
from tracer.kernels.apart import lane_value, set_lane_value
from tracer.kernels.arc import make_arc
from tracer.kernels.arc_flight import closed_hop, hop_end
from tracer.kernels.cell_tables import column_place, layer_ratio, row_place, turn
from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.endings import FLYING, LANDED
from tracer.kernels.fused import fused
from tracer.kernels.lane_sample import golden_step, survival
from tracer.kernels.lane_step import lane_place
from tracer.kernels.lanes import (
    ALIVE,
    COLUMN,
    CONTENT,
    DRAWN,
    END,
    HOP,
    KEPT,
    LAYER,
    ROW,
    SAMPLE,
    SAMPLE_R,
    SAMPLE_VELOCITY,
    SAMPLES,
    STANDING,
    START,
    SUM_LIFE,
    SUM_LOST,
    TIME,
    TIME_LIMIT,
    VELOCITY,
    WIDTH,
    Y,
    Z,
)

LEAST_SAMPLES = 3.0
SAMPLES_PER_ANGLE = 4.0
"""Samples of a hop, and more for each radian of w s between launch and landing: the higher, the more cells it meets."""

R0, RADIAL, SWING, FALL, ALONG, REST, DRIFT = (HOP + rows * WIDTH for rows in range(7))
"""With S = sin(w s) and V = 1 - cos(w s): r = r0 + radial S + swing V, f = 1 - fall V, g = along S + rest V,
t = g + drift (w s - S), all in SI units."""

PHASE, PHASE_STEP, SINE, VERSINE, TURN_SINE, TURN_VERSINE = (HOP + rows * WIDTH for rows in range(7, 13))
"""w s [rad] of the next sample and from one to the next; sine and 1 - cosine of both."""

LASTING, GROUND_CONTENT, LATITUDE_SINE, TURN = (HOP + rows * WIDTH for rows in range(13, 17))
"""Content of a sample for each metre of r; of the sample its content scaled by (R/r)^2, sin(latitude), and `turn`."""

WHOLE = float(1 << 52)
"""Added to a whole number, it leaves that in the low bits of the sum."""


@inlined
def launch_on_arc(lanes, lane, frame_rate, time_limit, atom):
    """Launch an `atom` (see `resume`) to fly for `time_limit` [s] in a frame that turns at `frame_rate` [rad s-1]."""
    x, y = atom[0], atom[1]
    set_lane_value(lanes, START + lane, x)
    set_lane_value(lanes, START + Y + lane, y)
    set_lane_value(lanes, START + Z + lane, atom[2])
    set_lane_value(lanes, START + VELOCITY + lane, atom[3] - frame_rate * y)
    set_lane_value(lanes, START + VELOCITY + Y + lane, atom[4] + frame_rate * x)
    set_lane_value(lanes, START + VELOCITY + Z + lane, atom[5])
    set_lane_value(lanes, TIME_LIMIT + lane, time_limit)
    set_lane_value(lanes, STANDING + lane, FLYING)


@kernel
def fly_hops(lanes, motion):
    """Land all lanes that fly closed hops, count them in the lanes' sums and make their samples ready.

    Other lanes get no samples; what flies in them is still to be flown.
    """
    for lane in range(WIDTH):
        _land(lanes, lane, motion)
    if motion.frame_rate != 0.0:
        _turn_ends(lanes, motion.frame_rate)


@inlined
def _land(lanes, lane, motion):
    arc = make_arc(motion.gm, *lane_place(lanes, START, lane))
    closed, hop = closed_hop(arc, motion.outer_radius, lane_value(lanes, TIME_LIMIT + lane))
    standing = lane_value(lanes, STANDING + lane)
    hops = closed & (standing == FLYING)
    t = hop[0]
    x, y, z, vx, vy, vz = hop_end(arc, hop)
    alive = lane_value(lanes, ALIVE + lane)
    mean, kept = survival(motion.hazard * t)
    life = alive * t * mean if hops else 0.0
    set_lane_value(lanes, END + lane, x)
    set_lane_value(lanes, END + Y + lane, y)
    set_lane_value(lanes, END + Z + lane, z)
    set_lane_value(lanes, END + VELOCITY + lane, vx)
    set_lane_value(lanes, END + VELOCITY + Y + lane, vy)
    set_lane_value(lanes, END + VELOCITY + Z + lane, vz)
    set_lane_value(lanes, TIME + lane, t)
    set_lane_value(lanes, KEPT + lane, kept)
    set_lane_value(lanes, STANDING + lane, LANDED if hops else standing)
    set_lane_value(lanes, SUM_LIFE + lane, lane_value(lanes, SUM_LIFE + lane) + life)
    set_lane_value(lanes, SUM_LOST + lane, lane_value(lanes, SUM_LOST + lane) + motion.hazard * life)
    _prepare_samples(lanes, lane, arc, hop, hops, alive)


@inlined
def _prepare_samples(lanes, lane, arc, hop, hops, alive):
    """Set the rows `HOP`: samples stand in even steps of w s from one start, each even in its stratum."""
    _t, w, per_beta, angle, _g1, _g2 = hop
    samples = LEAST_SAMPLES + np.floor(SAMPLES_PER_ANGLE * angle)
    step = angle / samples
    drawn = lane_value(lanes, DRAWN + lane)
    phase = drawn * step
    per_w = w * per_beta
    pull = arc.gm * per_beta
    sine, versine = _short_arc(phase)
    turn_sine, turn_versine = _short_arc(step)
    set_lane_value(lanes, SAMPLES + lane, samples if hops else 0.0)
    set_lane_value(lanes, R0 + lane, arc.r0)
    set_lane_value(lanes, RADIAL + lane, arc.eta * per_w)
    set_lane_value(lanes, SWING + lane, arc.zeta * per_beta)
    set_lane_value(lanes, FALL + lane, pull * (1.0 / arc.r0))
    set_lane_value(lanes, ALONG + lane, arc.r0 * per_w)
    set_lane_value(lanes, REST + lane, arc.eta * per_beta)
    set_lane_value(lanes, DRIFT + lane, pull * per_w)
    set_lane_value(lanes, PHASE + lane, phase)
    set_lane_value(lanes, PHASE_STEP + lane, step)
    set_lane_value(lanes, SINE + lane, sine)
    set_lane_value(lanes, VERSINE + lane, versine)
    set_lane_value(lanes, TURN_SINE + lane, turn_sine)
    set_lane_value(lanes, TURN_VERSINE + lane, turn_versine)
    set_lane_value(lanes, LASTING + lane, alive * step * per_w)
    set_lane_value(lanes, DRAWN + lane, golden_step(drawn))


@inlined
def _short_arc(angle):
    """Return sine and 1 - cosine of an `angle` [rad] below 0.3 to 1e-15, by the sine of its half as a series."""
    half = 0.5 * angle
    q = half * half
    sine = fused(q, 1.0 / 362880.0, -1.0 / 5040.0)
    sine = fused(q, sine, 1.0 / 120.0)
    sine = fused(q, sine, -1.0 / 6.0)
    sine = fused(half * q, sine, half)
    square = sine * sine
    return 2.0 * sine * math.sqrt(1.0 - square), 2.0 * square


@kernel
def _turn_ends(lanes, rate):
    for lane in range(WIDTH):
        sine, cosine = sine_and_cosine(rate * lane_value(lanes, TIME + lane))
        _turn(lanes, END + lane, sine, cosine)
        _turn_velocity(lanes, END + lane, END + VELOCITY + lane, rate, sine, cosine)


@inlined
def _turn(lanes, at, sine, cosine):
    """Turn the vector at `at` into axes that are turned about +z by the angle with this sine and cosine."""
    x, y = lane_value(lanes, at), lane_value(lanes, at + Y)
    set_lane_value(lanes, at, fused(cosine, x, sine * y))
    set_lane_value(lanes, at + Y, fused(cosine, y, -(sine * x)))


@inlined
def _turn_velocity(lanes, place, velocity, rate, sine, cosine):
    """Turn the velocity of a turned place into the frame that turns at `rate` [rad s-1]."""
    _turn(lanes, velocity, sine, cosine)
    set_lane_value(lanes, velocity, fused(rate, lane_value(lanes, place + Y), lane_value(lanes, velocity)))
    vy = lane_value(lanes, velocity + Y)
    set_lane_value(lanes, velocity + Y, fused(-rate, lane_value(lanes, place), vy))


@kernel
def sample_hops(lanes, motion, cells, moving):
    """Set the next sample of every lane and go on to the one after it; velocities are set only if `moving`.

    Where its cell is looked up is left in rows `LAYER`, `ROW` and `COLUMN`: what `layer_entry` takes, and entries of
    tables in the low bits of the others.
    """
    for lane in range(WIDTH):
        _sample(lanes, lane)
    if moving:
        _set_velocities(lanes, motion.gm)
    if motion.hazard > 0.0:
        _decay(lanes, motion.hazard)
    if motion.frame_rate != 0.0:
        _turn_samples(lanes, motion.frame_rate, moving)
    for lane in range(WIDTH):
        _place_in_cells(lanes, lane, cells)
        _go_on(lanes, lane)


@inlined
def _sample(lanes, lane):
    sine, versine = lane_value(lanes, SINE + lane), lane_value(lanes, VERSINE + lane)
    r = fused(lane_value(lanes, RADIAL + lane), sine, lane_value(lanes, R0 + lane))
    r = fused(lane_value(lanes, SWING + lane), versine, r)
    f = fused(-lane_value(lanes, FALL + lane), versine, 1.0)
    g = _lever(lanes, lane)
    x, y, z, vx, vy, vz = lane_place(lanes, START, lane)
    set_lane_value(lanes, SAMPLE + lane, fused(f, x, g * vx))
    set_lane_value(lanes, SAMPLE + Y + lane, fused(f, y, g * vy))
    set_lane_value(lanes, SAMPLE + Z + lane, fused(f, z, g * vz))
    set_lane_value(lanes, SAMPLE_R + lane, r)
    set_lane_value(lanes, CONTENT + lane, lane_value(lanes, LASTING + lane) * r)


@inlined
def _lever(lanes, lane):
    """Return what a sample's place has of the velocity at launch [s], g of `arc.state_at`."""
    rest = lane_value(lanes, REST + lane) * lane_value(lanes, VERSINE + lane)
    return fused(lane_value(lanes, ALONG + lane), lane_value(lanes, SINE + lane), rest)


@inlined
def _time(lanes, lane):
    """Return the time [s] from launch to the sample."""
    excess = lane_value(lanes, PHASE + lane) - lane_value(lanes, SINE + lane)
    return fused(lane_value(lanes, DRIFT + lane), excess, _lever(lanes, lane))


@kernel
def _set_velocities(lanes, gm):
    """Set the samples' velocities in the frame that does not turn."""
    for lane in range(WIDTH):
        r0, r = lane_value(lanes, R0 + lane), lane_value(lanes, SAMPLE_R + lane)
        x, y, z, vx, vy, vz = lane_place(lanes, START, lane)
        # 1/sqrt(beta) is along/r0, and gm/beta is r0 fall.
        f_rate = -gm * lane_value(lanes, ALONG + lane) * lane_value(lanes, SINE + lane) / (r0 * r0 * r)
        g_rate = 1.0 - r0 * lane_value(lanes, FALL + lane) * lane_value(lanes, VERSINE + lane) / r
        set_lane_value(lanes, SAMPLE_VELOCITY + lane, fused(f_rate, x, g_rate * vx))
        set_lane_value(lanes, SAMPLE_VELOCITY + Y + lane, fused(f_rate, y, g_rate * vy))
        set_lane_value(lanes, SAMPLE_VELOCITY + Z + lane, fused(f_rate, z, g_rate * vz))


@kernel
def _decay(lanes, hazard):
    """Take from the samples' contents what is lost by then."""
    for lane in range(WIDTH):
        _, kept = survival(hazard * _time(lanes, lane))
        set_lane_value(lanes, CONTENT + lane, lane_value(lanes, CONTENT + lane) * kept)


@kernel
def _turn_samples(lanes, rate, moving):
    for lane in range(WIDTH):
        sine, cosine = sine_and_cosine(rate * _time(lanes, lane))
        _turn(lanes, SAMPLE + lane, sine, cosine)
    if moving:
        for lane in range(WIDTH):
            sine, cosine = sine_and_cosine(rate * _time(lanes, lane))
            _turn_velocity(lanes, SAMPLE + lane, SAMPLE_VELOCITY + lane, rate, sine, cosine)


@inlined
def _place_in_cells(lanes, lane, cells):
    r, content = lane_value(lanes, SAMPLE_R + lane), lane_value(lanes, CONTENT + lane)
    per_r = 1.0 / r
    shrink = cells.radius * per_r
    sine = lane_value(lanes, SAMPLE + Z + lane) * per_r
    turned = turn(lane_value(lanes, SAMPLE + lane), lane_value(lanes, SAMPLE + Y + lane))
    set_lane_value(lanes, LATITUDE_SINE + lane, sine)
    set_lane_value(lanes, TURN + lane, turned)
    set_lane_value(lanes, LAYER + lane, max(1.0, layer_ratio(r - cells.radius, cells.first_altitude)))
    set_lane_value(lanes, ROW + lane, _entry(cells.tables.rows, row_place(cells.tables, sine)))
    set_lane_value(lanes, COLUMN + lane, _entry(cells.tables.columns, column_place(cells.tables, turned)))
    set_lane_value(lanes, GROUND_CONTENT + lane, content * (shrink * shrink))


@inlined
def _entry(table, place):
    """Return a number whose low bits are the entry at `place` of a table."""
    return np.floor(min(max(place, 0.0), table.shape[0] - 1.0)) + WHOLE


@inlined
def _go_on(lanes, lane):
    """Turn sine and cosine on to the next sample."""
    sine, versine = lane_value(lanes, SINE + lane), lane_value(lanes, VERSINE + lane)
    turn_sine, turn_versine = lane_value(lanes, TURN_SINE + lane), lane_value(lanes, TURN_VERSINE + lane)
    cosine = 1.0 - versine
    set_lane_value(lanes, SINE + lane, fused(cosine, turn_sine, fused(-sine, turn_versine, sine)))
    set_lane_value(lanes, VERSINE + lane, fused(sine, turn_sine, fused(cosine, turn_versine, versine)))
    set_lane_value(
        lanes, PHASE + lane, lane_value(lanes, PHASE + lane) + lane_value(lanes, PHASE_STEP + lane)
    )

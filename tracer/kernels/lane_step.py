"""One trial step in every lane at once: `runge_kutta.trial_step`, stage by stage.

A loop for each stage rather than one for all: while one group of lanes waits for its stage's last number, the processor
is at work on the next group.
"""

import math

import numpy as np
from numba.extending import overload

from tracer.kernels.apart import lane_value, set_lane_value
from tracer.kernels.compiling import INLINED, inlined, kernel
from tracer.kernels.endings import FLYING
from tracer.kernels.fused import fused
from tracer.kernels.host import (
    DARK,
    approach,
    host_neared,
    nearest,
    past_host,
    shade_and_nearness,
    without_host,
)
from tracer.kernels.host import PARTIAL as PARTLY_SHADED
from tracer.kernels.integrated_flight import (
    MOST_TRIALS,
    SHORTEST_STEP,
    longest_step,
    longest_step_in_penumbra,
)
from tracer.kernels.lane_rates import (
    arrive,
    extra_push,
    grid_of,
    lane_vector,
    leave,
    nearness,
    set_lane_vector,
)
from tracer.kernels.lanes import (
    ACCELERATION,
    ACCEPTED,
    APART,
    CHANGE,
    END,
    ERROR_SQUARED,
    EXTRA,
    FIFTH,
    FLAGGED,
    FLOWN,
    FOURTH,
    GROWTH,
    HOST_STEP,
    LAST,
    LENGTH,
    LIGHT,
    LIT,
    MOST_GRIDS,
    NEARNESS,
    OTHER,
    OTHER_ERROR,
    PARTIAL,
    PER_ALLOWED,
    PER_R3,
    PLACE,
    QUARTIC,
    SECOND,
    SERIES,
    SEVENTH,
    SHADE,
    SIXTH,
    STAGE_ACCELERATION,
    STAGE_LIGHT,
    STAGE_OTHER,
    STAGE_ROWS,
    STANDING,
    START,
    STEP,
    THIRD,
    TIME,
    TIME_LIMIT,
    TRIALS,
    VELOCITY,
    WIDTH,
    ZONE,
    Y,
    Z,
)
from tracer.kernels.orbit import body_in_series, longest_on_orbit, set_series
from tracer.kernels.runge_kutta import (
    NODES,
    TABLEAU,
    error_row,
    fifth,
    fourth,
    quartic,
    quartic_row,
    second,
    sixth,
    solution,
    solution_row,
    third,
)
from tracer.kernels.shadow import (
    ANTUMBRA,
    NO_SHADOW,
    PENUMBRA,
    lit_fraction,
    shadow_behind,
    with_widening,
)
from tracer.kernels.shadow import LIT as FULL_LIGHT
from tracer.kernels.step_control import far_out, step_change

LANDS, DOUBTFUL = 1.0, 2.0
"""Flags of a step: it starts well above ground, ends below it and meets nothing else; it wants to be looked at."""

STAGE = STAGE_ROWS * WIDTH
"""From a stage's first row to that of the next."""

ALOFT = 1.0 + 1e-6
"""Square of the least distance from the centre, in radii, that is well above ground."""


@kernel
def try_steps(lanes, sky, tables):
    """Try the next step in every lane, say whether it is accepted, and flag what needs a closer look.

    Lanes without a flight make a step of no length.
    """
    grids = grid_of(tables, 0), grid_of(tables, 1)
    shade_lanes(lanes, sky.forces)
    apart = prepare_apart(lanes, sky, tables)
    _choose_lengths(lanes, sky.forces)
    # Counted rather than named stage by stage: numba would compile what is passed a literal for each of these, to the
    # same machine code.
    node, stage = np.int64(1), np.int64(SECOND)
    if apart > 0:
        look_apart(lanes, apart, node, sky, tables)
    for lane in range(WIDTH):
        h, p, v, a = _begin(lanes, lane)
        arrive(lanes, stage, lane, sky, grids, node, second(p, h, v), second(v, h, a))
    leave(lanes, stage, sky, tables, node)
    node, stage = node + 1, stage + STAGE
    if apart > 0:
        look_apart(lanes, apart, node, sky, tables)
    for lane in range(WIDTH):
        h, p, v, a = _begin(lanes, lane)
        v2, a2 = _stage(lanes, SECOND + lane)
        arrive(lanes, stage, lane, sky, grids, node, third(p, h, v2), third(v, h, a2))
    leave(lanes, stage, sky, tables, node)
    node, stage = node + 1, stage + STAGE
    if apart > 0:
        look_apart(lanes, apart, node, sky, tables)
    for lane in range(WIDTH):
        h, p, v, a = _begin(lanes, lane)
        v2, a2 = _stage(lanes, SECOND + lane)
        v3, a3 = _stage(lanes, THIRD + lane)
        p4 = fourth(p, h, v, v2, v3)
        arrive(lanes, stage, lane, sky, grids, node, p4, fourth(v, h, a, a2, a3))
    leave(lanes, stage, sky, tables, node)
    node, stage = node + 1, stage + STAGE
    if apart > 0:
        look_apart(lanes, apart, node, sky, tables)
    for lane in range(WIDTH):
        h, p, v, a = _begin(lanes, lane)
        v4, a4 = _stage(lanes, FOURTH + lane)
        arrive(lanes, stage, lane, sky, grids, node, fifth(p, h, v, v4), fifth(v, h, a, a4))
    leave(lanes, stage, sky, tables, node)
    node, stage = node + 1, stage + STAGE
    if apart > 0:
        look_apart(lanes, apart, node, sky, tables)
    for lane in range(WIDTH):
        h, p, v, a = _begin(lanes, lane)
        v2, a2 = _stage(lanes, SECOND + lane)
        v3, a3 = _stage(lanes, THIRD + lane)
        v4, a4 = _stage(lanes, FOURTH + lane)
        v5, a5 = _stage(lanes, FIFTH + lane)
        p6 = sixth(p, h, v, v2, v3, v4, v5)
        arrive(lanes, stage, lane, sky, grids, node, p6, sixth(v, h, a, a2, a3, a4, a5))
    leave(lanes, stage, sky, tables, node)
    node, stage = node + 1, stage + STAGE
    if apart > 0:
        look_apart(lanes, apart, node, sky, tables)
    for lane in range(WIDTH):
        h, p, v, a = _begin(lanes, lane)
        v3, a3 = _stage(lanes, THIRD + lane)
        v4, a4 = _stage(lanes, FOURTH + lane)
        v5, a5 = _stage(lanes, FIFTH + lane)
        v6, a6 = _stage(lanes, SIXTH + lane)
        moved = solution(h, v, v3, v4, v5, v6)
        turned = solution(h, a, a3, a4, a5, a6)
        v7 = (v[0] + turned[0], v[1] + turned[1], v[2] + turned[2])
        p7 = (p[0] + moved[0], p[1] + moved[1], p[2] + moved[2])
        arrive(lanes, stage, lane, sky, grids, node, p7, v7)
        set_lane_vector(lanes, GROWTH + lane, moved)
        set_lane_vector(lanes, GROWTH + VELOCITY + lane, turned)
        set_lane_vector(lanes, END + lane, p7)
        set_lane_vector(lanes, END + VELOCITY + lane, v7)
    leave(lanes, stage, sky, tables, node)
    for lane in range(WIDTH):
        set_lane_vector(
            lanes, END + ACCELERATION + lane, lane_vector(lanes, SEVENTH + STAGE_ACCELERATION + lane)
        )
        set_lane_value(lanes, END + LIGHT + lane, lane_value(lanes, SEVENTH + STAGE_LIGHT + lane))
        set_lane_value(lanes, END + OTHER + lane, lane_value(lanes, SEVENTH + STAGE_OTHER + lane))
        per_r3 = lane_value(lanes, PER_R3 + lane)
        set_lane_value(lanes, END + NEARNESS + lane, nearness(lane_vector(lanes, PLACE + lane), per_r3))
    _judge(lanes, sky)
    _flag(lanes, sky)


@kernel
def prepare_apart(lanes, sky, tables):
    """List the lanes that need `look_apart` and return their number.

    Those in part of the light are marked, and their steps limited.
    """
    apart = 0
    for lane in range(WIDTH):
        zone = lanes[ZONE + lane]
        in_part = zone in (PENUMBRA, ANTUMBRA) or partly_shaded(sky.forces, lanes, lane)
        partial = in_part and lanes[STANDING + lane] == FLYING
        lanes[PARTIAL + lane] = 1.0 if partial else 0.0
        if partial and zone == PENUMBRA:
            shadow = shadow_behind(sky.shadow, body_in_series(sky.forces, lanes, SERIES + lane, WIDTH, 0.0))
            longest = longest_step_in_penumbra(shadow, lane_place(lanes, START, lane))
            lanes[STEP + lane] = min(lanes[STEP + lane], longest)
        if partial or tables[0] > MOST_GRIDS:
            lanes[APART + apart] = lane
            apart += 1
    return apart


@inlined
def lane_place(lanes, row, lane):
    """Return (x, y, z, vx, vy, vz) of the state whose x is at `row`."""
    at = row + lane
    x, y, z = lane_value(lanes, at), lane_value(lanes, at + Y), lane_value(lanes, at + Z)
    at += VELOCITY
    return x, y, z, lane_value(lanes, at), lane_value(lanes, at + Y), lane_value(lanes, at + Z)


@kernel
def look_apart(lanes, apart, node, sky, tables):
    """Set the light and the push of a stage in the first `apart` listed lanes.

    They see part of the Sun or are pushed by many lines. `node` is the stage's number in `NODES`; its place is known
    before its rates are.
    """
    forces, stage = sky.forces, node - 1
    for i in range(apart):
        lane = int(lanes[APART + i])
        partial = lanes[PARTIAL + lane] > 0.0
        body = body_in_series(forces, lanes, SERIES + lane, WIDTH, NODES[node] * lanes[LENGTH + lane])
        x, y, z = _moved(lanes, stage, lane, START, START + VELOCITY, 0)
        if partial:
            zone = int(lanes[ZONE + lane])
            lit = lit_fraction(sky.shadow, zone, x, y, z, body.distance)
            lanes[LIT + lane] = past_host(body, lit, x, y, z)
        if tables[0] > MOST_GRIDS:
            v = _moved(lanes, stage, lane, START + VELOCITY, START + ACCELERATION, STAGE_ACCELERATION)
            lanes[EXTRA + lane] = extra_push(body, tables, (x, y, z), v)


@inlined
def _moved(lanes, stage, lane, start, slope, later):
    """Return the vector at row `start` moved to a stage by slopes at row `slope` and, in the stages, `later`."""
    h = lanes[LENGTH + lane]
    dx = TABLEAU[stage, 0] * lanes[slope + lane]
    dy = TABLEAU[stage, 0] * lanes[slope + Y + lane]
    dz = TABLEAU[stage, 0] * lanes[slope + Z + lane]
    for k in range(1, stage + 1):
        at = SECOND + (k - 1) * STAGE + later + lane
        dx += TABLEAU[stage, k] * lanes[at]
        dy += TABLEAU[stage, k] * lanes[at + Y]
        dz += TABLEAU[stage, k] * lanes[at + Z]
    return (
        lanes[start + lane] + h * dx,
        lanes[start + Y + lane] + h * dy,
        lanes[start + Z + lane] + h * dz,
    )


@inlined
def _begin(lanes, lane):
    """Return the step's length and place, velocity and acceleration at its start."""
    return (
        lane_value(lanes, LENGTH + lane),
        lane_vector(lanes, START + lane),
        lane_vector(lanes, START + VELOCITY + lane),
        lane_vector(lanes, START + ACCELERATION + lane),
    )


@inlined
def _stage(lanes, row):
    """Return velocity and acceleration of the stage whose vx is at `row`."""
    return lane_vector(lanes, row), lane_vector(lanes, row + STAGE_ACCELERATION)


@inlined
def _choose_lengths(lanes, forces):
    for lane in range(WIDTH):
        _, _, v, a = _begin(lanes, lane)
        per_r = lane_value(lanes, START + NEARNESS + lane)
        longest = longest_step(per_r, v[0] * v[0] + v[1] * v[1] + v[2] * v[2], a)
        set_series(forces, lanes, SERIES + lane, WIDTH)
        longest = longest_on_orbit(forces, lanes, SERIES + lane, WIDTH, longest)
        longest = longest_beside_host_in_lane(forces, lanes, lane, longest)
        h = min(lane_value(lanes, STEP + lane), longest)
        left = lane_value(lanes, TIME_LIMIT + lane) - lane_value(lanes, TIME + lane)
        last = h >= left
        h = left if last else h
        set_lane_value(lanes, LENGTH + lane, h if lane_value(lanes, STANDING + lane) == FLYING else 0.0)
        set_lane_value(lanes, LAST + lane, 1.0 if last else 0.0)
        lit = 1.0 if lane_value(lanes, ZONE + lane) == FULL_LIGHT else 0.0
        set_lane_value(lanes, LIT + lane, unless_dark(forces, lanes, lane, lit))


@inlined
def _judge(lanes, sky):
    """Weigh the error of every step, and set the length of the next one."""
    forces, losses, _ = sky
    per_light = losses.ionizing + losses.other_sunlight
    if losses.other_lit > 0.0 or losses.other_distance > 0.0:
        for lane in range(WIDTH):
            h = lane_value(lanes, LENGTH + lane)
            set_lane_value(lanes, OTHER_ERROR + lane, _integrate(lanes, lane, h, OTHER, STAGE_OTHER))
    for lane in range(WIDTH):
        h, _, v, a = _begin(lanes, lane)
        v3, a3 = _stage(lanes, THIRD + lane)
        v4, a4 = _stage(lanes, FOURTH + lane)
        v5, a5 = _stage(lanes, FIFTH + lane)
        v6, a6 = _stage(lanes, SIXTH + lane)
        v7, a7 = _stage(lanes, SEVENTH + lane)
        set_lane_vector(lanes, QUARTIC + lane, quartic(h, v, v3, v4, v5, v6, v7))
        set_lane_vector(lanes, QUARTIC + VELOCITY + lane, quartic(h, a, a3, a4, a5, a6, a7))
        light_error = _integrate(lanes, lane, h, LIGHT, STAGE_LIGHT)
        of_hazard = fused(per_light, light_error, lane_value(lanes, OTHER_ERROR + lane))
        per_r = lane_value(lanes, START + NEARNESS + lane)
        v_squared = v[0] * v[0] + v[1] * v[1] + v[2] * v[2]
        body = body_in_series(forces, lanes, SERIES + lane, WIDTH, 0.0)
        x, y, z = lane_vector(lanes, START + lane)
        per_centre, per_far = nearest(body, forces.radius, per_r, x, y, z)
        squared = (lane_value(lanes, PER_ALLOWED + lane) * far_out(forces.radius, per_far)) * (
            _squared_error(h, v, v3, v4, v5, v6, v7) * (per_centre * per_centre)
            + _squared_error(h, a, a3, a4, a5, a6, a7) / fused(forces.gm, per_r, v_squared)
            + of_hazard * of_hazard
        )
        set_lane_value(lanes, ERROR_SQUARED + lane, squared)
    # Apart, since what a change takes waits on itself: here the processor is at work on many lanes at a time.
    for lane in range(WIDTH):
        squared, h = lane_value(lanes, ERROR_SQUARED + lane), lane_value(lanes, LENGTH + lane)
        accepted = squared <= 1.0
        change = step_change(squared)
        flown = 1.0 if accepted & (lane_value(lanes, STANDING + lane) == FLYING) else 0.0
        set_lane_value(lanes, CHANGE + lane, change)
        set_lane_value(lanes, STEP + lane, h * (change if accepted else min(change, 1.0)))
        set_lane_value(lanes, TRIALS + lane, lane_value(lanes, TRIALS + lane) + 1.0)
        set_lane_value(lanes, ACCEPTED + lane, flown)
        set_lane_value(lanes, FLOWN + lane, flown)


@inlined
def _integrate(lanes, lane, h, rate, later):
    """Set growth and quartic of the integral of what is at `rate` in a state, `later` in a stage; return its error."""
    k1 = lane_value(lanes, START + rate + lane)
    k3, k4 = lane_value(lanes, THIRD + later + lane), lane_value(lanes, FOURTH + later + lane)
    k5, k6 = lane_value(lanes, FIFTH + later + lane), lane_value(lanes, SIXTH + later + lane)
    k7 = lane_value(lanes, SEVENTH + later + lane)
    set_lane_value(lanes, GROWTH + later + lane, solution_row(h, k1, k3, k4, k5, k6))
    set_lane_value(lanes, QUARTIC + later + lane, quartic_row(h, k1, k3, k4, k5, k6, k7))
    return error_row(h, k1, k3, k4, k5, k6, k7)


@inlined
def _flag(lanes, sky):
    """Flag lanes whose step may have met a surface, is the last one, or is stuck."""
    forces, _, shadow = sky
    lowest = forces.radius * forces.radius
    highest = forces.outer_radius * forces.outer_radius
    edges = shadow.kind != NO_SHADOW
    for lane in range(WIDTH):
        x, y, z = lane_vector(lanes, START + lane)
        vx, vy, vz = lane_vector(lanes, START + VELOCITY + lane)
        end_x, end_y, end_z = lane_vector(lanes, END + lane)
        end_vx, end_vy, end_vz = lane_vector(lanes, END + VELOCITY + lane)
        r2 = x * x + y * y + z * z
        end_r2 = end_x * end_x + end_y * end_y + end_z * end_z
        climb = x * vx + y * vy + z * vz
        end_climb = end_x * end_vx + end_y * end_vy + end_z * end_vz
        dips = (climb < 0.0) & (end_climb > 0.0)
        turns = (climb > 0.0) & (end_climb < 0.0) & (4.0 * max(r2, end_r2) > highest)
        # The surface that bounds full light or umbra, see `shadow`: passed, or neared and then left.
        lit = lane_value(lanes, ZONE + lane) == FULL_LIGHT
        sign = 1.0 if lit else -1.0
        h = lane_value(lanes, LENGTH + lane)
        here = body_in_series(forces, lanes, SERIES + lane, WIDTH, 0.0)
        there = body_in_series(forces, lanes, SERIES + lane, WIDTH, h)
        _, rate = _cone(shadow, here, lit, x, y, z, vx, vy, vz)
        end_above, end_rate = _cone(shadow, there, lit, end_x, end_y, end_z, end_vx, end_vy, end_vz)
        neared = (sign * rate <= 0.0) & (sign * end_rate >= 0.0)
        edge = edges & ((sign * end_above < 0.0) | neared | (lane_value(lanes, PARTIAL + lane) > 0.0))
        start, end = (x, y, z, vx, vy, vz), (end_x, end_y, end_z, end_vx, end_vy, end_vz)
        other = (end_r2 > highest) | turns | edge | host_neared(here, there, start, end)
        met = (end_r2 < lowest) | dips | other
        accepted = lane_value(lanes, ACCEPTED + lane) > 0.0
        too_short = not (lane_value(lanes, STEP + lane) > SHORTEST_STEP * lane_value(lanes, TIME + lane))
        stuck = (lane_value(lanes, TRIALS + lane) >= MOST_TRIALS) | ((not accepted) & too_short)
        last = lane_value(lanes, LAST + lane) > 0.0
        flagged = (stuck | (accepted & (met | last))) & (lane_value(lanes, STANDING + lane) == FLYING)
        lands = accepted & (end_r2 < lowest) & (r2 > ALOFT * lowest) & (not other)
        set_lane_value(lanes, FLAGGED + lane, (LANDS if lands else DOUBTFUL) if flagged else 0.0)


@inlined
def _cone(shadow, body, lit, x, y, z, vx, vy, vz):
    """Return the height [m] over a cone that touches the body, or over its base, and a number with its rate's sign.

    It is the penumbra's cone for an atom in full light, `lit`, else the umbra's.
    """
    shadow = shadow_behind(shadow, body)
    sine = shadow.penumbra_sine if lit else -shadow.umbra_sine
    cosine = shadow.penumbra_cosine if lit else shadow.umbra_cosine
    rho = math.sqrt(y * y + z * z)
    cone = fused(rho, cosine, fused(x, sine, -shadow.radius))
    base = fused(-shadow.radius, sine, x)
    rate = fused(y * vy + z * vz, cosine, (vx * sine) * rho)
    rate = with_widening(body, rho * shadow.widening, sine, cosine, x, rho, rate)
    base_rate = with_widening(body, shadow.widening, sine, cosine, -shadow.radius, 0.0, vx)
    return max(cone, base), rate if cone > base else base_rate


@inlined
def _squared_error(h, k1, k3, k4, k5, k6, k7):
    ex = error_row(h, k1[0], k3[0], k4[0], k5[0], k6[0], k7[0])
    ey = error_row(h, k1[1], k3[1], k4[1], k5[1], k6[1], k7[1])
    ez = error_row(h, k1[2], k3[2], k4[2], k5[2], k6[2], k7[2])
    return fused(ex, ex, fused(ey, ey, ez * ez))


@inlined
def _shade_lanes(lanes, forces):
    for lane in range(WIDTH):
        body = body_in_series(forces, lanes, SERIES + lane, WIDTH, 0.0)
        x, y, z = lane_vector(lanes, START + lane)
        vx, vy, vz = lane_vector(lanes, START + VELOCITY + lane)
        shade, per_way = shade_and_nearness(body.host, x, y, z)
        v2 = approach(body.host, vx * vx + vy * vy + vz * vz)
        set_lane_value(lanes, SHADE + lane, shade)
        a = lane_vector(lanes, START + ACCELERATION + lane)
        set_lane_value(lanes, HOST_STEP + lane, longest_step(per_way, v2, a))


def shade_lanes(lanes, forces):
    """Say in every lane how its next step lies in the host's shadow, and how long it may be beside the host."""
    if forces.host is not None:
        _shade_lanes.py_func(lanes, forces)


def partly_shaded(forces, lanes, lane):
    """Return whether the host may cover part of the Sun during a lane's step."""
    return False if forces.host is None else lanes[SHADE + lane] == PARTLY_SHADED


def unless_dark(forces, lanes, lane, lit):
    """Return the part `lit` of the Sun that is seen, 0 where the lane's step lies in the host's umbra."""
    return lit if forces.host is None or lanes[SHADE + lane] < DARK else 0.0


def longest_beside_host_in_lane(forces, lanes, lane, longest):
    """Return the lesser of a step `longest` [s] and the longest beside the host."""
    return longest if forces.host is None else min(longest, lanes[HOST_STEP + lane])


@overload(shade_lanes, jit_options=INLINED)
def _compiled_shade_lanes(lanes, forces):
    if without_host(forces):
        return lambda lanes, forces: None
    return lambda lanes, forces: _shade_lanes(lanes, forces)


@overload(partly_shaded, jit_options=INLINED)
def _compiled_partly_shaded(forces, lanes, lane):
    if without_host(forces):
        return lambda forces, lanes, lane: False
    return lambda forces, lanes, lane: lane_value(lanes, SHADE + lane) == PARTLY_SHADED


@overload(unless_dark, jit_options=INLINED)
def _compiled_unless_dark(forces, lanes, lane, lit):
    if without_host(forces):
        return lambda forces, lanes, lane, lit: lit
    return lambda forces, lanes, lane, lit: 0.0 if lane_value(lanes, SHADE + lane) == DARK else lit


@overload(longest_beside_host_in_lane, jit_options=INLINED)
def _compiled_longest_beside_host_in_lane(forces, lanes, lane, longest):
    if without_host(forces):
        return lambda forces, lanes, lane, longest: longest
    return lambda forces, lanes, lane, longest: min(longest, lane_value(lanes, HOST_STEP + lane))

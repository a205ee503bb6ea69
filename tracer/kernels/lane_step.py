"""One trial step in every lane at once: `dormand_prince.trial_step`, stage by stage.

A loop for each stage rather than one for all: while one group of lanes waits for its stage's last number, the processor
is at work on the next group.
"""

import math

import numpy as np

from tracer.kernels.apart import lane_value, set_lane_value, table_entry
from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.dormand_prince import (
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
from tracer.kernels.endings import FLYING
from tracer.kernels.fused import fused
from tracer.kernels.integrated_flight import MOST_TRIALS, SHORTEST_STEP, longest_step
from tracer.kernels.lanes import (
    ACCELERATION,
    ACCEPTED,
    CHANGE,
    END,
    FIFTH,
    FLAGGED,
    FLOWN,
    FOURTH,
    GROWTH,
    LAST,
    LENGTH,
    LIT,
    NEARNESS,
    PER_ALLOWED,
    QUARTIC,
    SECOND,
    SEVENTH,
    SIXTH,
    STANDING,
    START,
    STEP,
    THINNING,
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
from tracer.kernels.lines import HEADING, HEADING_SIZE
from tracer.kernels.shadow import LIT as FULL_LIGHT
from tracer.kernels.shadow import NO_SHADOW
from tracer.kernels.step_control import step_change

MOST_GRIDS = 2
"""Tables of pushing lines that a step in lanes looks up; scenes with more fly one atom at a time in the light."""

COUNTING = 6755399441055744.0
"""1.5 2^52: the sum of it and a small number holds that number, rounded to a whole one, in its last bits."""

PUSH = 3 * WIDTH
SLOPE = 6 * WIDTH
"""From the row of a stage's vx to those of its ax and its thinning."""


@kernel
def try_steps(lanes, sky, tables):
    """Try the next step in every lane, say whether it is accepted, and flag what needs a closer look.

    Lanes without a flight make a step of no length.
    """
    numbers = _numbers(sky, tables)
    _choose_lengths(lanes)
    for lane in range(WIDTH):
        h, lit = lane_value(lanes, LENGTH + lane), lane_value(lanes, LIT + lane)
        p, v, a = _vector(lanes, START + lane), _vector(lanes, START + VELOCITY + lane), _first(lanes, lane)
        v2 = second(v, h, a)
        p2 = second(p, h, v)
        _set_stage(lanes, SECOND + lane, v2, _rates(numbers, tables, lit, p2, v2))
    for lane in range(WIDTH):
        h, lit = lane_value(lanes, LENGTH + lane), lane_value(lanes, LIT + lane)
        p, v, a = _vector(lanes, START + lane), _vector(lanes, START + VELOCITY + lane), _first(lanes, lane)
        v2, a2 = _stage(lanes, SECOND + lane)
        v3 = third(v, h, a, a2)
        _set_stage(lanes, THIRD + lane, v3, _rates(numbers, tables, lit, third(p, h, v, v2), v3))
    for lane in range(WIDTH):
        h, lit = lane_value(lanes, LENGTH + lane), lane_value(lanes, LIT + lane)
        p, v, a = _vector(lanes, START + lane), _vector(lanes, START + VELOCITY + lane), _first(lanes, lane)
        v2, a2 = _stage(lanes, SECOND + lane)
        v3, a3 = _stage(lanes, THIRD + lane)
        v4 = fourth(v, h, a, a2, a3)
        _set_stage(lanes, FOURTH + lane, v4, _rates(numbers, tables, lit, fourth(p, h, v, v2, v3), v4))
    for lane in range(WIDTH):
        h, lit = lane_value(lanes, LENGTH + lane), lane_value(lanes, LIT + lane)
        p, v, a = _vector(lanes, START + lane), _vector(lanes, START + VELOCITY + lane), _first(lanes, lane)
        v2, a2 = _stage(lanes, SECOND + lane)
        v3, a3 = _stage(lanes, THIRD + lane)
        v4, a4 = _stage(lanes, FOURTH + lane)
        v5 = fifth(v, h, a, a2, a3, a4)
        _set_stage(lanes, FIFTH + lane, v5, _rates(numbers, tables, lit, fifth(p, h, v, v2, v3, v4), v5))
    for lane in range(WIDTH):
        h, lit = lane_value(lanes, LENGTH + lane), lane_value(lanes, LIT + lane)
        p, v, a = _vector(lanes, START + lane), _vector(lanes, START + VELOCITY + lane), _first(lanes, lane)
        v2, a2 = _stage(lanes, SECOND + lane)
        v3, a3 = _stage(lanes, THIRD + lane)
        v4, a4 = _stage(lanes, FOURTH + lane)
        v5, a5 = _stage(lanes, FIFTH + lane)
        v6 = sixth(v, h, a, a2, a3, a4, a5)
        p6 = sixth(p, h, v, v2, v3, v4, v5)
        _set_stage(lanes, SIXTH + lane, v6, _rates(numbers, tables, lit, p6, v6))
    for lane in range(WIDTH):
        h, lit = lane_value(lanes, LENGTH + lane), lane_value(lanes, LIT + lane)
        p, v, a = _vector(lanes, START + lane), _vector(lanes, START + VELOCITY + lane), _first(lanes, lane)
        v3, a3 = _stage(lanes, THIRD + lane)
        v4, a4 = _stage(lanes, FOURTH + lane)
        v5, a5 = _stage(lanes, FIFTH + lane)
        v6, a6 = _stage(lanes, SIXTH + lane)
        moved = solution(h, v, v3, v4, v5, v6)
        turned = solution(h, a, a3, a4, a5, a6)
        v7 = (v[0] + turned[0], v[1] + turned[1], v[2] + turned[2])
        p7 = (p[0] + moved[0], p[1] + moved[1], p[2] + moved[2])
        slopes = _rates(numbers, tables, lit, p7, v7)
        _set_stage(lanes, SEVENTH + lane, v7, slopes)
        _set_vector(lanes, GROWTH + lane, moved)
        _set_vector(lanes, GROWTH + VELOCITY + lane, turned)
        _set_vector(lanes, END + lane, p7)
        _set_vector(lanes, END + VELOCITY + lane, v7)
        _set_vector(lanes, END + ACCELERATION + lane, slopes[0])
        set_lane_value(lanes, END + THINNING + lane, slopes[1])
        set_lane_value(lanes, END + NEARNESS + lane, slopes[2])
    _judge(lanes, sky)
    _flag(lanes, sky)


@kernel
def lane_slopes(sky, tables, zone, position, velocity):
    """Return ((ax, ay, az) [m s-2], 1/D^2 [m-2], 1/r [m-1]) where a flight enters `zone`, full light or umbra."""
    return _rates(_numbers(sky, tables), tables, 1.0 if zone == FULL_LIGHT else 0.0, position, velocity)


@inlined
def _numbers(sky, tables):
    forces = sky.forces
    return forces, forces.light_distance * forces.light_distance, _grid(tables, 0), _grid(tables, 1)


@inlined
def _grid(tables, line):
    """Return (first velocity, steps per velocity, last step, entry) of a line's table, that of no line if none."""
    if line < int(tables[0]):
        heading = HEADING + HEADING_SIZE * line
        return tables[heading], tables[heading + 1], tables[heading + 2], np.int64(tables[heading + 3])
    return 0.0, 0.0, 0.0, np.int64(tables.shape[0] - 2)


@inlined
def _pushed(tables, grid, velocity):
    """Return what `lines.line_value` does, in operations that several lanes can share."""
    first, per_velocity, last, entry = grid
    step = (velocity - first) * per_velocity
    step = step if step > 0.0 else 0.0
    step = last if step > last else step
    # Rounded to the knot before, or at a knot to either: the straight lines that meet there agree.
    counted = np.float64((step - 0.5) + COUNTING).view(np.int64) - np.float64(COUNTING).view(np.int64)
    knot = entry + 2 * counted
    return fused(step, table_entry(tables, knot + 1), table_entry(tables, knot))


@inlined
def _rates(numbers, tables, lit, position, velocity):
    """Return ((ax, ay, az) [m s-2], 1/D^2 [m-2], 1/r [m-1]), see `motion.rates_of_change`, where `lit` is 0 or 1."""
    forces, full_light, one_grid, other_grid = numbers
    x, y, z = position
    vx, vy, vz = velocity
    w = forces.turning
    r2 = fused(x, x, fused(y, y, z * z))
    sx = forces.distance - x
    s2 = fused(sx, sx, fused(y, y, z * z))
    r3 = r2 * math.sqrt(r2)
    # One division for both distances.
    inverse = 1.0 / (r3 * s2)
    thinning = r3 * inverse
    per_r3 = s2 * inverse
    pull = forces.gm * per_r3
    per_s = math.sqrt(s2) * thinning
    ux, uy, uz = sx * per_s, y * per_s, z * per_s
    light = (lit * full_light) * thinning
    receding = fused(uy, vy, fused(uz, vz, -(ux * (vx - forces.radial_velocity))))
    push = _pushed(tables, one_grid, receding) + _pushed(tables, other_grid, receding)
    sunward = fused(forces.tide_gm, thinning, -(light * (forces.push + push)))
    stay = w * w - pull
    level = forces.tide_gm / (forces.distance * forces.distance)
    return (
        fused(sunward, ux, fused(stay, x, fused(2.0 * w, vy, -level))),
        fused(stay, y, fused(-2.0 * w, vx, -(sunward * uy))),
        -fused(pull, z, sunward * uz),
    ), thinning, r2 * per_r3


@inlined
def _vector(lanes, row):
    return lane_value(lanes, row), lane_value(lanes, row + Y), lane_value(lanes, row + Z)


@inlined
def _set_vector(lanes, row, vector):
    set_lane_value(lanes, row, vector[0])
    set_lane_value(lanes, row + Y, vector[1])
    set_lane_value(lanes, row + Z, vector[2])


@inlined
def _first(lanes, lane):
    return _vector(lanes, START + ACCELERATION + lane)


@inlined
def _stage(lanes, row):
    """Return velocity and acceleration of the stage whose vx is at `row`."""
    return _vector(lanes, row), _vector(lanes, row + PUSH)


@inlined
def _set_stage(lanes, row, velocity, slopes):
    _set_vector(lanes, row, velocity)
    _set_vector(lanes, row + PUSH, slopes[0])
    set_lane_value(lanes, row + SLOPE, slopes[1])


@inlined
def _choose_lengths(lanes):
    for lane in range(WIDTH):
        v = _vector(lanes, START + VELOCITY + lane)
        per_r = lane_value(lanes, START + NEARNESS + lane)
        longest = longest_step(per_r, v[0] * v[0] + v[1] * v[1] + v[2] * v[2], _first(lanes, lane))
        h = min(lane_value(lanes, STEP + lane), longest)
        left = lane_value(lanes, TIME_LIMIT + lane) - lane_value(lanes, TIME + lane)
        last = h >= left
        h = left if last else h
        set_lane_value(lanes, LENGTH + lane, h if lane_value(lanes, STANDING + lane) == FLYING else 0.0)
        set_lane_value(lanes, LAST + lane, 1.0 if last else 0.0)
        set_lane_value(lanes, LIT + lane, 1.0 if lane_value(lanes, ZONE + lane) == FULL_LIGHT else 0.0)


@inlined
def _judge(lanes, sky):
    """Weigh the error of every step, and set the length of the next one."""
    forces, losses, _ = sky
    full_light = forces.light_distance * forces.light_distance
    lit_hazard = full_light * (losses.ionizing + losses.other_sunlight)
    dark_hazard = full_light * losses.other_distance
    for lane in range(WIDTH):
        h = lane_value(lanes, LENGTH + lane)
        v, a = _vector(lanes, START + VELOCITY + lane), _first(lanes, lane)
        u = lane_value(lanes, START + THINNING + lane)
        v3, a3 = _stage(lanes, THIRD + lane)
        v4, a4 = _stage(lanes, FOURTH + lane)
        v5, a5 = _stage(lanes, FIFTH + lane)
        v6, a6 = _stage(lanes, SIXTH + lane)
        v7, a7 = _stage(lanes, SEVENTH + lane)
        u3, u4 = lane_value(lanes, THIRD + SLOPE + lane), lane_value(lanes, FOURTH + SLOPE + lane)
        u5, u6 = lane_value(lanes, FIFTH + SLOPE + lane), lane_value(lanes, SIXTH + SLOPE + lane)
        u7 = lane_value(lanes, SEVENTH + SLOPE + lane)
        _set_vector(lanes, QUARTIC + lane, quartic(h, v, v3, v4, v5, v6, v7))
        _set_vector(lanes, QUARTIC + VELOCITY + lane, quartic(h, a, a3, a4, a5, a6, a7))
        set_lane_value(lanes, QUARTIC + 6 * WIDTH + lane, quartic_row(h, u, u3, u4, u5, u6, u7))
        set_lane_value(lanes, GROWTH + 6 * WIDTH + lane, solution_row(h, u, u3, u4, u5, u6))
        hazard = lane_value(lanes, LIT + lane) * lit_hazard + dark_hazard
        of_hazard = hazard * error_row(h, u, u3, u4, u5, u6, u7)
        per_r = lane_value(lanes, START + NEARNESS + lane)
        v2 = v[0] * v[0] + v[1] * v[1] + v[2] * v[2]
        squared = lane_value(lanes, PER_ALLOWED + lane) * (
            _squared_error(h, v, v3, v4, v5, v6, v7) * (per_r * per_r)
            + _squared_error(h, a, a3, a4, a5, a6, a7) / fused(forces.gm, per_r, v2)
            + of_hazard * of_hazard
        )
        accepted = squared <= 1.0
        change = step_change(squared)
        flown = 1.0 if accepted & (lane_value(lanes, STANDING + lane) == FLYING) else 0.0
        set_lane_value(lanes, CHANGE + lane, change)
        set_lane_value(lanes, STEP + lane, h * (change if accepted else min(change, 1.0)))
        set_lane_value(lanes, TRIALS + lane, lane_value(lanes, TRIALS + lane) + 1.0)
        set_lane_value(lanes, ACCEPTED + lane, flown)
        set_lane_value(lanes, FLOWN + lane, flown)


@inlined
def _flag(lanes, sky):
    """Flag lanes whose step may have met a surface, is the last one, or is stuck."""
    forces, _, shadow = sky
    lowest = forces.radius * forces.radius
    highest = forces.outer_radius * forces.outer_radius
    edges = shadow.kind != NO_SHADOW
    for lane in range(WIDTH):
        x, y, z = _vector(lanes, START + lane)
        vx, vy, vz = _vector(lanes, START + VELOCITY + lane)
        end_x, end_y, end_z = _vector(lanes, END + lane)
        end_vx, end_vy, end_vz = _vector(lanes, END + VELOCITY + lane)
        r2 = x * x + y * y + z * z
        end_r2 = end_x * end_x + end_y * end_y + end_z * end_z
        climb = x * vx + y * vy + z * vz
        end_climb = end_x * end_vx + end_y * end_vy + end_z * end_vz
        dips = (climb < 0.0) & (end_climb > 0.0)
        turns = (climb > 0.0) & (end_climb < 0.0) & (4.0 * max(r2, end_r2) > highest)
        # The surface that bounds full light or umbra, see `shadow`: passed, or neared and then left.
        lit = lane_value(lanes, LIT + lane) > 0.0
        sign = 1.0 if lit else -1.0
        sine = shadow.penumbra_sine if lit else -shadow.umbra_sine
        cosine = shadow.penumbra_cosine if lit else shadow.umbra_cosine
        above, rate = _cone(shadow.radius, sine, cosine, x, y, z, vx, vy, vz)
        end_above, end_rate = _cone(shadow.radius, sine, cosine, end_x, end_y, end_z, end_vx, end_vy, end_vz)
        edge = edges & ((sign * end_above < 0.0) | ((sign * rate <= 0.0) & (sign * end_rate >= 0.0)))
        met = (end_r2 < lowest) | dips | (end_r2 > highest) | turns | edge
        accepted = lane_value(lanes, ACCEPTED + lane) > 0.0
        too_short = not (lane_value(lanes, STEP + lane) > SHORTEST_STEP * lane_value(lanes, TIME + lane))
        stuck = (lane_value(lanes, TRIALS + lane) >= MOST_TRIALS) | ((not accepted) & too_short)
        ends = accepted & (met | (lane_value(lanes, LAST + lane) > 0.0))
        flagged = (stuck | ends) & (lane_value(lanes, STANDING + lane) == FLYING)
        set_lane_value(lanes, FLAGGED + lane, 1.0 if flagged else 0.0)


@inlined
def _cone(radius, sine, cosine, x, y, z, vx, vy, vz):
    """Return the height [m] over a cone that touches the body, or over its base, and a number with its rate's sign."""
    rho = math.sqrt(y * y + z * z)
    cone = fused(rho, cosine, fused(x, sine, -radius))
    base = fused(-radius, sine, x)
    rate = fused(y * vy + z * vz, cosine, (vx * sine) * rho)
    return max(cone, base), rate if cone > base else vx


@inlined
def _squared_error(h, k1, k3, k4, k5, k6, k7):
    ex = error_row(h, k1[0], k3[0], k4[0], k5[0], k6[0], k7[0])
    ey = error_row(h, k1[1], k3[1], k4[1], k5[1], k6[1], k7[1])
    ez = error_row(h, k1[2], k3[2], k4[2], k5[2], k6[2], k7[2])
    return fused(ex, ex, fused(ey, ey, ez * ez))

"""What acts on the atoms of all lanes at a stage of their step: as `motion.rates_beside`, in operations for vectors.

In three rounds: all lanes arrive at the stage, the push of the lines is looked up, and the rates follow. One loop for
all would look lines up in its middle, which keeps a compiler for most processors from making any of it vectors.
"""

import math

import numpy as np

from tracer.kernels.apart import lane_value, set_lane_bits, set_lane_value
from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.fused import fused
from tracer.kernels.host import past_host, with_host_pull, with_slip
from tracer.kernels.lanes import (
    EXTRA,
    LENGTH,
    LINE_ENTRY,
    LINE_PUSH,
    LINE_STEP,
    LIT,
    MOST_GRIDS,
    PER_R3,
    PER_S,
    PER_S2,
    PLACE,
    SERIES,
    STAGE_ACCELERATION,
    STAGE_LIGHT,
    STAGE_OTHER,
    WIDTH,
    Y,
    Z,
)
from tracer.kernels.lines import HEADING, HEADING_SIZE, line_value
from tracer.kernels.lookups import FOUR, look_up_four
from tracer.kernels.motion import radial_velocity
from tracer.kernels.orbit import body_in_series, with_turning_growth
from tracer.kernels.runge_kutta import NODES
from tracer.kernels.shadow import lit_fraction

COUNTING = 6755399441055744.0
"""1.5 2^52: the sum of it and a small number holds that number, rounded to a whole one, in its last bits."""


@inlined
def lane_vector(lanes, row):
    """Return (x, y, z) of the vector whose x is at `row`."""
    return lane_value(lanes, row), lane_value(lanes, row + Y), lane_value(lanes, row + Z)


@inlined
def set_lane_vector(lanes, row, vector):
    """Set the vector whose x is at `row`."""
    set_lane_value(lanes, row, vector[0])
    set_lane_value(lanes, row + Y, vector[1])
    set_lane_value(lanes, row + Z, vector[2])


@inlined
def arrive(lanes, stage, lane, sky, grids, node, position, velocity):
    """Set a stage's velocity, its place and distances, and where the push of light is looked up.

    `stage` is the stage's first row, `node` its number in `NODES`, `grids` what `grid_of` says of the first tables.
    """
    body = _body_at(lanes, lane, sky.forces, node)
    aspect = _aspect(body, position, velocity)
    set_lane_vector(lanes, stage + lane, velocity)
    set_lane_vector(lanes, PLACE + lane, position)
    set_lane_value(lanes, PER_R3 + lane, aspect[0])
    set_lane_value(lanes, PER_S2 + lane, aspect[1])
    set_lane_value(lanes, PER_S + lane, aspect[2])
    step, entry = _line_at(grids[0], aspect[3])
    set_lane_value(lanes, LINE_STEP + lane, step)
    set_lane_bits(lanes, LINE_ENTRY + lane, entry)
    step, entry = _line_at(grids[1], aspect[3])
    set_lane_value(lanes, LINE_STEP + WIDTH + lane, step)
    set_lane_bits(lanes, LINE_ENTRY + WIDTH + lane, entry)


@inlined
def leave(lanes, stage, sky, tables, node):
    """Set the accelerations, the light and the other losses of a stage at which all lanes arrived."""
    for line in range(min(MOST_GRIDS, int(tables[0]))):
        first = line * WIDTH
        for lane in range(0, WIDTH, FOUR):
            at = first + lane
            look_up_four(lanes, tables, LINE_ENTRY + at, LINE_STEP + at, LINE_PUSH + at)
    for lane in range(WIDTH):
        body = _body_at(lanes, lane, sky.forces, node)
        push = lane_value(lanes, LINE_PUSH + lane) + lane_value(lanes, LINE_PUSH + WIDTH + lane)
        aspect = (
            lane_value(lanes, PER_R3 + lane),
            lane_value(lanes, PER_S2 + lane),
            lane_value(lanes, PER_S + lane),
        )
        lit, extra = lane_value(lanes, LIT + lane), lane_value(lanes, EXTRA + lane)
        position, velocity = lane_vector(lanes, PLACE + lane), lane_vector(lanes, stage + lane)
        acceleration, light, other = _rates(sky, lit, extra, push, body, aspect, position, velocity)
        set_lane_vector(lanes, stage + STAGE_ACCELERATION + lane, acceleration)
        set_lane_value(lanes, stage + STAGE_LIGHT + lane, light)
        set_lane_value(lanes, stage + STAGE_OTHER + lane, other)


@kernel
def lane_rates(sky, tables, zone, body, position, velocity):
    """Return ((ax, ay, az) [m s-2], light, other losses [s-1], 1/r [m-1]) of an atom in shadow `zone` of `body`.

    As lanes do. Light is relative to full light at `light_distance`; other losses neither go with it nor are constant.
    """
    x, y, z = position
    lit = past_host(body, lit_fraction(sky.shadow, zone, x, y, z, body.distance), x, y, z)
    extra = extra_push(body, tables, position, velocity)
    per_r3, per_s2, per_s, receding = _aspect(body, position, velocity)
    push = _pushed(tables, grid_of(tables, 0), receding) + _pushed(tables, grid_of(tables, 1), receding)
    aspect = per_r3, per_s2, per_s
    acceleration, light, other = _rates(sky, lit, extra, push, body, aspect, position, velocity)
    return acceleration, light, other, nearness(position, per_r3)


@kernel
def extra_push(body, tables, position, velocity):
    """Return the acceleration [m s-2] at 1 au by lines beyond the first `MOST_GRIDS` tables."""
    push = 0.0
    if int(tables[0]) <= MOST_GRIDS:
        return push
    x, y, z = position
    receding = radial_velocity(body, x, y, z, velocity[0], velocity[1], velocity[2])
    for line in range(MOST_GRIDS, int(tables[0])):
        push += line_value(tables, line, receding)
    return push


@inlined
def grid_of(tables, line):
    """Return (first velocity, steps per velocity, last step, entry) of a line's table, that of no line if none."""
    if line < int(tables[0]):
        heading = HEADING + HEADING_SIZE * line
        return tables[heading], tables[heading + 1], tables[heading + 2], np.int64(tables[heading + 3])
    return 0.0, 0.0, 0.0, np.int64(tables.shape[0] - 2)


@inlined
def _line_at(grid, velocity):
    """Return (step, entry) of the straight line that `lines.line_value` takes, in operations that lanes can share."""
    first, per_velocity, last, entry = grid
    step = (velocity - first) * per_velocity
    step = step if step > 0.0 else 0.0
    step = last if step > last else step
    # Rounded to the knot before, or at a knot to either: the straight lines that meet there agree.
    counted = np.float64((step - 0.5) + COUNTING).view(np.int64) - np.float64(COUNTING).view(np.int64)
    return step, entry + 2 * counted


@inlined
def _pushed(tables, grid, velocity):
    step, entry = _line_at(grid, velocity)
    return fused(step, tables[entry + 1], tables[entry])


@inlined
def _body_at(lanes, lane, forces, node):
    since_start = NODES[node] * lane_value(lanes, LENGTH + lane)
    return body_in_series(forces, lanes, SERIES + lane, WIDTH, since_start)


@inlined
def _aspect(body, position, velocity):
    """Return 1/r^3 [m-3], 1/s^2 [m-2] and 1/s [m-1], s the distance from the Sun, and the velocity from it [m s-1]."""
    x, y, z = position
    vx, vy, vz = velocity
    r2 = fused(x, x, fused(y, y, z * z))
    sx = body.distance - x
    s2 = fused(sx, sx, fused(y, y, z * z))
    r3 = r2 * math.sqrt(r2)
    # One division for both distances.
    inverse = 1.0 / (r3 * s2)
    per_s2 = r3 * inverse
    per_s = math.sqrt(s2) * per_s2
    ux, uy, uz = sx * per_s, y * per_s, z * per_s
    receding = fused(uy, vy, fused(uz, vz, -(ux * (vx - body.radial_velocity))))
    return s2 * inverse, per_s2, per_s, with_slip(body, receding, uy)


@inlined
def _rates(sky, lit, extra, push, body, aspect, position, velocity):
    """Return ((ax, ay, az), light, other losses) of `lane_rates`, for what `_aspect` says.

    The part `lit` of the Sun is seen, the lines push by `extra` and `push`.
    """
    forces, losses, _ = sky
    per_r3, per_s2, per_s = aspect
    x, y, z = position
    vx, vy, _ = velocity
    w = body.turning
    ux, uy, uz = (body.distance - x) * per_s, y * per_s, z * per_s
    pull = forces.gm * per_r3
    dilution = (forces.light_distance * forces.light_distance) * per_s2
    light = lit * dilution
    sunward = fused(forces.tide_gm, per_s2, -(light * ((forces.push + extra) + push)))
    stay = w * w - pull
    level = forces.tide_gm / (body.distance * body.distance)
    ax = fused(sunward, ux, fused(stay, x, fused(2.0 * w, vy, -level)))
    ay = fused(stay, y, fused(-2.0 * w, vx, -(sunward * uy)))
    ax, ay = with_turning_growth(body, ax, ay, x, y)
    acceleration = with_host_pull(body, ax, ay, -fused(pull, z, sunward * uz), x, y, z)
    return acceleration, light, fused(lit, losses.other_lit, dilution * losses.other_distance)


@inlined
def nearness(position, per_r3):
    x, y, z = position
    return fused(x, x, fused(y, y, z * z)) * per_r3

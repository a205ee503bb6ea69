"""What the samples of all lanes leave in the cells and the images."""

from numba.extending import overload

from tracer.kernels.cells import close_layer, column_at, row_at
from tracer.kernels.compiling import INLINED, field_type, inlined, kernel, merged
from tracer.kernels.foresight import fetch_early
from tracer.kernels.host import past_host, without_host
from tracer.kernels.lane_sample import sample_of
from tracer.kernels.lanes import (
    ACCEPTED,
    CELL,
    COLUMN,
    CONTENT,
    LAYER,
    LIT,
    PARTIAL,
    RECEDING,
    RECEIVED,
    ROW,
    SAMPLE,
    SAMPLE_R,
    SAMPLE_VELOCITY,
    SAMPLES,
    WIDTH,
    Y,
    Z,
)
from tracer.kernels.lines import beyond_tables, line_value
from tracer.kernels.motion import radial_velocity
from tracer.kernels.scoring import count_in_cell, count_in_images, scaled_to_ground, score_in_light
from tracer.kernels.shadow import PENUMBRA, lit_fraction, zone_at


@merged
def score_lanes(world, tally, lanes, shine):
    """Count the first sample of every lane that made a step, and return whether any step is worth more of them.

    `shine` (line,) is room for each line's photons.
    """
    more = 0.0
    _find_cells(world, tally, lanes)
    tables, sky = world.light.line_tables, world.light.conditions.sky
    cells = world.cells
    for lane in range(WIDTH):
        if lanes[ACCEPTED + lane] == 0.0:
            continue
        x, y, z = lanes[SAMPLE + lane], lanes[SAMPLE + Y + lane], lanes[SAMPLE + Z + lane]
        content, received = lanes[CONTENT + lane], lanes[RECEIVED + lane]
        if lanes[PARTIAL + lane] > 0.0:
            received *= seen_part(sky, x, y, z)
        for line in range(shine.shape[0]):
            shine[line] = received * line_value(tables, line, lanes[RECEDING + lane])
        if beyond_tables(tables, lanes[RECEDING + lane]):
            tally.beyond[0] += content
        layer = int(lanes[CELL + lane])
        if layer >= 0:
            row, column = int(lanes[CELL + Y + lane]), int(lanes[CELL + Z + lane])
            at_ground = scaled_to_ground(cells.radius, lanes[SAMPLE_R + lane], content)
            ionizing = received * sky.losses.ionizing
            count_in_cell(tally, layer, row, column, content, at_ground, ionizing, shine)
        if world.images.first.shape[0] > 0:
            at = SAMPLE_VELOCITY + lane
            velocity = (lanes[at], lanes[at + Y], lanes[at + Z])
            count_in_images(tally, world.images, cells.radius, x, y, z, velocity, content, shine)
        more = max(more, lanes[SAMPLES + lane])
    return more > 1.0


@kernel
def score_further(world, tally, lanes, shine):
    """Count the further samples of steps that are worth more than one."""
    for lane in range(WIDTH):
        if lanes[SAMPLES + lane] > 1.0 and lanes[ACCEPTED + lane] > 0.0:
            for number in range(1, int(lanes[SAMPLES + lane])):
                _score_one(world, tally, lanes, lane, number, shine)


@inlined
def _score_one(world, tally, lanes, lane, number, shine):
    sky = world.light.conditions.sky
    forces = sky.forces
    x, y, z, velocity, content = sample_of(lanes, lane, sky.losses, number)
    sx = forces.distance - x
    seen = seen_part(sky, x, y, z) if lanes[PARTIAL + lane] > 0.0 else lanes[LIT + lane]
    received = seen * forces.light_distance * forces.light_distance / (sx * sx + y * y + z * z)
    receding = radial_velocity(forces, x, y, z, velocity[0], velocity[1], velocity[2])
    score_in_light(world, tally, x, y, z, velocity, content, received, receding, shine)


@merged
def _find_cells(world, tally, lanes):
    """Set the cell of every lane's sample, and have what will be added to in it fetched."""
    cells, ionizing = world.cells, world.light.conditions.sky.losses.ionizing
    for lane in range(WIDTH):
        if lanes[ACCEPTED + lane] == 0.0:
            continue
        r = lanes[SAMPLE_R + lane]
        layer = close_layer(cells, r, lanes[LAYER + lane])
        lanes[CELL + lane] = layer
        if layer >= 0:
            x, y, z = lanes[SAMPLE + lane], lanes[SAMPLE + Y + lane], lanes[SAMPLE + Z + lane]
            row = row_at(cells, lanes[ROW + lane], z / r)
            column = column_at(cells, lanes[COLUMN + lane], x, y)
            lanes[CELL + Y + lane] = row
            lanes[CELL + Z + lane] = column
            fetch_early(tally.gas, (layer, row, column, 0))
            if ionizing > 0.0:
                fetch_early(tally.ionized, (layer, row, column))


@inlined
def _seen_past_body(sky, x, y, z):
    return lit_fraction(sky.shadow, PENUMBRA, x, y, z, sky.forces.distance)


@inlined
def _seen_past_both(sky, x, y, z):
    own = lit_fraction(sky.shadow, zone_at(sky.shadow, x, y, z), x, y, z, sky.forces.distance)
    return past_host(sky.forces, own, x, y, z)


def seen_part(sky, x, y, z):
    """Return the part of the Sun that an atom at (x, y, z) [m] sees, which is in a penumbra: of a host, of any zone."""
    seen = _seen_past_body if sky.forces.host is None else _seen_past_both
    return seen.py_func(sky, x, y, z)


@overload(seen_part, jit_options=INLINED)
def _compiled_seen_part(sky, x, y, z):
    forces = field_type(sky, "forces")
    if without_host(forces):
        return lambda sky, x, y, z: _seen_past_body(sky, x, y, z)
    return lambda sky, x, y, z: _seen_past_both(sky, x, y, z)

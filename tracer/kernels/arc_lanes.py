"""Flights on arcs side by side: closed hops all at once, other arcs one by one, and what they leave in the tallies."""

import math

import numpy as np

from tracer.kernels.apart import lane_bits, lane_value, set_lane_bits
from tracer.kernels.arc import make_arc
from tracer.kernels.arc_flight import arc_end, arc_state, score_arc
from tracer.kernels.cell_tables import cell_from, layer_entry
from tracer.kernels.compiling import inlined, kernel, merged
from tracer.kernels.endings import FLYING
from tracer.kernels.foresight import fetch_early
from tracer.kernels.hop_lanes import GROUND_CONTENT, LATITUDE_SINE, TURN, fly_hops, sample_hops
from tracer.kernels.lane_step import lane_place
from tracer.kernels.lanes import (
    ALIVE,
    APART,
    CELL,
    COLUMN,
    CONTENT,
    END,
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
    WIDTH,
    Y,
    Z,
)
from tracer.kernels.scoring import count_in_cell, count_in_images, mean_survival_time

LOW = (1 << 32) - 1
"""The low bits, which hold an entry of a table."""


@merged
def fly_arcs(world, tally, lanes, shine, rng):
    """Fly the atoms of all lanes to the ends of their flights and count them; `shine` has no lines on arcs."""
    fly_hops(lanes, world.motion)
    # On arcs nothing depends on light: nothing shines, nothing is ionised.
    dark = shine[:0]
    count, apart = 0, False
    for lane in range(WIDTH):
        set_lane_bits(lanes, APART + count, lane)
        count += 1 if lane_value(lanes, SAMPLES + lane) > 0.0 else 0
        apart |= lane_value(lanes, STANDING + lane) == FLYING
    number = 1.0
    while count > 0:
        sample_hops(lanes, world.motion, world.cells, world.images.velocities.resolved)
        for i in range(count):
            _find_cell(world.cells, tally, lanes, lane_bits(lanes, APART + i))
        listed, count = count, 0
        for i in range(listed):
            lane = lane_bits(lanes, APART + i)
            _count_sample(world, tally, lanes, lane, dark)
            # Lanes that are worth more samples stay on the list.
            set_lane_bits(lanes, APART + count, lane)
            count += 1 if lane_value(lanes, SAMPLES + lane) > number else 0
        number += 1.0
    if apart:
        _fly_apart(world, tally, lanes, shine, rng)


@merged
def _find_cell(cells, tally, lanes, lane):
    """Set the cell of a lane's sample, -1 above the grid, and have what will be added to in it fetched."""
    r = lane_value(lanes, SAMPLE_R + lane)
    if r >= cells.radii[cells.radii.shape[0] - 1]:
        set_lane_bits(lanes, CELL + lane, -1)
        return
    layer, row, column = cell_of_sample(cells, lanes, lane)
    set_lane_bits(lanes, CELL + lane, np.int64(layer))
    set_lane_bits(lanes, CELL + Y + lane, np.int64(row))
    set_lane_bits(lanes, CELL + Z + lane, np.int64(column))
    fetch_early(tally.gas, (layer, row, column, 0))


@inlined
def cell_of_sample(cells, lanes, lane):
    """Return (layer, row, column), without signs, of what `sample_hops` has set, where that is below the grid's top."""
    tables = cells.tables
    layer = np.uint64(layer_entry(lane_value(lanes, LAYER + lane)))
    row, column = _low(lane_bits(lanes, ROW + lane)), _low(lane_bits(lanes, COLUMN + lane))
    return (
        cell_from(cells.radii, tables.layers, layer, lane_value(lanes, SAMPLE_R + lane)),
        cell_from(tables.sines, tables.rows, row, lane_value(lanes, LATITUDE_SINE + lane)),
        cell_from(tables.turns, tables.columns, column, lane_value(lanes, TURN + lane)),
    )


@merged
def _count_sample(world, tally, lanes, lane, dark):
    content = lane_value(lanes, CONTENT + lane)
    layer = lane_bits(lanes, CELL + lane)
    if layer >= 0:
        row = np.uint64(lane_bits(lanes, CELL + Y + lane))
        column = np.uint64(lane_bits(lanes, CELL + Z + lane))
        at_ground = lane_value(lanes, GROUND_CONTENT + lane)
        count_in_cell(tally, np.uint64(layer), row, column, content, at_ground, 0.0, dark)
    if world.images.first.shape[0] > 0:
        x, y, z, vx, vy, vz = _sample(lanes, lane)
        count_in_images(tally, world.images, world.cells.radius, x, y, z, (vx, vy, vz), content, dark)


@inlined
def _low(bits):
    return np.uint64(bits & LOW)


@inlined
def _sample(lanes, lane):
    """Return (x, y, z [m], vx, vy, vz [m s-1]) of a lane's sample."""
    return (
        lane_value(lanes, SAMPLE + lane),
        lane_value(lanes, SAMPLE + Y + lane),
        lane_value(lanes, SAMPLE + Z + lane),
        lane_value(lanes, SAMPLE_VELOCITY + lane),
        lane_value(lanes, SAMPLE_VELOCITY + Y + lane),
        lane_value(lanes, SAMPLE_VELOCITY + Z + lane),
    )


@kernel
def _fly_apart(world, tally, lanes, shine, rng):
    """Fly what is no closed hop."""
    motion = world.motion
    for lane in range(WIDTH):
        if lanes[STANDING + lane] != FLYING:
            continue
        arc = make_arc(motion.gm, *lane_place(lanes, START, lane))
        ending, s_end = arc_end(motion, arc, lanes[TIME_LIMIT + lane])
        alive = lanes[ALIVE + lane]
        score_arc(world, tally, arc, s_end, alive, shine, rng)
        end = arc_state(motion, arc, s_end)
        lanes[STANDING + lane] = ending
        lanes[TIME + lane] = end[0]
        lanes[KEPT + lane] = math.exp(-motion.hazard * end[0])
        for i in range(6):
            lanes[END + i * WIDTH + lane] = end[1 + i]
        life = alive * mean_survival_time(motion.hazard, end[0])
        lanes[SUM_LIFE + lane] += life
        lanes[SUM_LOST + lane] += motion.hazard * life

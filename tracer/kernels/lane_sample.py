"""A sample of the step in every lane at once, what the step leaves in the budget, and the flight as it goes on."""

import math

import numpy as np

from tracer.kernels.apart import lane_value, set_lane_value
from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.first_guess import rough_angle, rough_arcsine, rough_logarithm
from tracer.kernels.fused import fused
from tracer.kernels.host import with_slip
from tracer.kernels.lanes import (
    ACCELERATION,
    ACCEPTED,
    ALIVE,
    COLUMN,
    CONTENT,
    DRAWN,
    END,
    FLOWN,
    GROWTH,
    IONIZED,
    KEPT,
    LAYER,
    LENGTH,
    LIFE,
    LIGHT,
    LIT,
    LOST,
    OTHER,
    PARTIAL,
    QUARTIC,
    RECEDING,
    RECEIVED,
    ROW,
    SAMPLE,
    SAMPLE_R,
    SAMPLE_VELOCITY,
    SAMPLES,
    SERIES,
    SEVENTH,
    STAGE_ACCELERATION,
    STAGE_LIGHT,
    STAGE_OTHER,
    START,
    STATE_ROWS,
    SUM_IONIZED,
    SUM_LIFE,
    SUM_LOST,
    SUM_STEPS,
    TIME,
    VELOCITY,
    WEIGHT,
    WIDTH,
    Y,
    Z,
)
from tracer.kernels.orbit import body_in_series, keep_body

SHORT = 0.5
"""Hazard up to which the power series is exact to the last bit: its next term is u^14/15! = 5e-17."""

HALVINGS = 10
"""A longer hazard is halved as often, and the survival squared."""


GOLDEN = 0.5 * (math.sqrt(5.0) - 1.0)
"""Its multiples' fractional parts lie as evenly as those of a number can (Weyl 1916, Math. Ann. 77, 313: memory)."""


WAY = 0.25
"""Way [radii] for each of which a step is sampled once.

Far out, where steps are long and few, more samples cost little and are what single pixels lack; near the ground, where
nearly all flights are, a second one costs more than it gains.
"""

MOST_SAMPLES = 16.0
"""Samples of a step at the most; each costs about a third of the step."""


@inlined
def survival(u):
    """Return the mean of exp(-`u` t) over t from 0 to 1 and its value at 1, for a hazard `u` >= 0."""
    short = u < SHORT
    v = u if short else min(u * 0.5**HALVINGS, SHORT)
    mean = fused(-v, 1.0 / 87178291200.0, 1.0 / 6227020800.0)
    mean = fused(-v, mean, 1.0 / 479001600.0)
    mean = fused(-v, mean, 1.0 / 39916800.0)
    mean = fused(-v, mean, 1.0 / 3628800.0)
    mean = fused(-v, mean, 1.0 / 362880.0)
    mean = fused(-v, mean, 1.0 / 40320.0)
    mean = fused(-v, mean, 1.0 / 5040.0)
    mean = fused(-v, mean, 1.0 / 720.0)
    mean = fused(-v, mean, 1.0 / 120.0)
    mean = fused(-v, mean, 1.0 / 24.0)
    mean = fused(-v, mean, 1.0 / 6.0)
    mean = fused(-v, mean, 0.5)
    mean = fused(-v, mean, 1.0)
    left = fused(-v, mean, 1.0)
    power = left * left
    for _ in range(HALVINGS - 1):
        power = power * power
    return mean if short else (1.0 - power) / u, left if short else power


@kernel
def sample_steps(lanes, sky, cells):
    """Sample the flown step of every lane at its part DRAWN of the first of its even parts, and book what it takes."""
    forces, losses, _ = sky
    full_light = forces.light_distance * forces.light_distance
    per_light = losses.ionizing + losses.other_sunlight
    per_way = 1.0 / (WAY * cells.radius)
    for lane in range(WIDTH):
        set_lane_value(lanes, SAMPLES + lane, _samples(lanes, lane, per_way))
        _book(lanes, lane, losses, per_light)
    _sum_up(lanes)
    cells_per_turn = cells.local_time_cells / (2.0 * math.pi)
    rows_per_angle = cells.latitude_cells / math.pi
    per_first = 1.0 / cells.first_altitude
    for lane in range(WIDTH):
        x, y, z, (vx, vy, vz) = _state_at(lanes, lane, _part(lanes, lane, 0.0))
        level = fused(x, x, y * y)
        r = math.sqrt(fused(z, z, level))
        sx = forces.distance - x
        s2 = fused(sx, sx, fused(y, y, z * z))
        set_lane_value(lanes, SAMPLE + lane, x)
        set_lane_value(lanes, SAMPLE + Y + lane, y)
        set_lane_value(lanes, SAMPLE + Z + lane, z)
        set_lane_value(lanes, SAMPLE_R + lane, r)
        set_lane_value(lanes, SAMPLE_VELOCITY + lane, vx)
        set_lane_value(lanes, SAMPLE_VELOCITY + Y + lane, vy)
        set_lane_value(lanes, SAMPLE_VELOCITY + Z + lane, vz)
        # What part of the Sun an atom in the penumbra sees is left to `lane_scoring`.
        seen = max(lane_value(lanes, LIT + lane), lane_value(lanes, PARTIAL + lane))
        set_lane_value(lanes, RECEIVED + lane, seen * full_light / s2)
        approach = fused(sx, vx - forces.radial_velocity, -fused(y, vy, z * vz))
        distance = math.sqrt(s2)
        set_lane_value(lanes, RECEDING + lane, with_slip(forces, -approach / distance, y / distance))
        set_lane_value(
            lanes, LAYER + lane, rough_logarithm((r - cells.radius) * per_first) * cells.cells_per_log
        )
        set_lane_value(lanes, ROW + lane, (rough_arcsine(z / r) + 0.5 * math.pi) * rows_per_angle)
        set_lane_value(lanes, COLUMN + lane, (rough_angle(x, y) + math.pi) * cells_per_turn)


@kernel
def go_on(lanes):
    """Go on from the end of every lane's step."""
    for lane in range(WIDTH):
        _go_on(lanes, lane)
        _draw_on(lanes, lane)


@inlined
def sample_of(lanes, lane, losses, number):
    """Return (x, y, z [m], velocity [m s-1], atoms) of a lane's step in its even part of this `number`, from 0."""
    part = _part(lanes, lane, number)
    x, y, z, velocity = _state_at(lanes, lane, part)
    light, other = _integrals(lanes, lane)
    per_light = losses.ionizing + losses.other_sunlight
    hazard = _hazard(losses, per_light, lanes[LENGTH + lane], light, other, part)
    duration = lanes[FLOWN + lane] * lanes[LENGTH + lane] / lanes[SAMPLES + lane]
    return x, y, z, velocity, lanes[WEIGHT + lane] * (math.exp(-hazard) * duration)


@inlined
def _part(lanes, lane, number):
    """Return the part of the step at which it is sampled in its even part of this `number`, from 0."""
    drawn, samples = lane_value(lanes, DRAWN + lane), lane_value(lanes, SAMPLES + lane)
    return lane_value(lanes, FLOWN + lane) * ((number + drawn) / samples)


@inlined
def _state_at(lanes, lane, part):
    """Return (x, y, z [m], (vx, vy, vz) [m s-1]) at a part of the step."""
    h = lane_value(lanes, LENGTH + lane)
    velocity = (
        _velocity(lanes, 0, lane, h, part),
        _velocity(lanes, Y, lane, h, part),
        _velocity(lanes, Z, lane, h, part),
    )
    x, y = _place(lanes, 0, lane, h, part), _place(lanes, Y, lane, h, part)
    return x, y, _place(lanes, Z, lane, h, part), velocity


@inlined
def _hazard(losses, per_light, h, light, other, part):
    """Return the hazard gathered up to a part of a step of length `h` [s], from the integrals of `_integrals`."""
    steady = fused(losses.other_everywhere * h, part, _at(part, 0.0, other))
    return fused(per_light, _at(part, 0.0, light), steady)


@kernel
def book_steps(lanes, sky):
    """Book what the step takes in every lane and go on from its end, the body too; nothing is sampled."""
    forces, losses, _ = sky
    per_light = losses.ionizing + losses.other_sunlight
    for lane in range(WIDTH):
        set_lane_value(lanes, SAMPLES + lane, 1.0)
        _book(lanes, lane, losses, per_light)
    for lane in range(WIDTH):
        duration = lane_value(lanes, FLOWN + lane) * lane_value(lanes, LENGTH + lane)
        keep_body(body_in_series(forces, lanes, SERIES + lane, WIDTH, duration), lanes, SERIES + lane, WIDTH)
        _go_on(lanes, lane)


@inlined
def _samples(lanes, lane, per_way):
    """Return how many samples the step of a lane is worth: one for each `WAY` that it takes the atom."""
    dx = lane_value(lanes, END + lane) - lane_value(lanes, START + lane)
    dy = lane_value(lanes, END + Y + lane) - lane_value(lanes, START + Y + lane)
    dz = lane_value(lanes, END + Z + lane) - lane_value(lanes, START + Z + lane)
    ways = math.sqrt(fused(dx, dx, fused(dy, dy, dz * dz))) * per_way
    return np.floor(min(max(ways, 1.0), MOST_SAMPLES))


@inlined
def _book(lanes, lane, losses, per_light):
    flown = lane_value(lanes, FLOWN + lane)
    h = lane_value(lanes, LENGTH + lane)
    light, other = _integrals(lanes, lane)
    grown = _hazard(losses, per_light, h, light, other, flown)
    half = _hazard(losses, per_light, h, light, other, 0.5 * flown)
    before_sample = _hazard(losses, per_light, h, light, other, _part(lanes, lane, 0.0))
    kept = lane_value(lanes, KEPT + lane)
    alive = lane_value(lanes, ALIVE + lane) * kept
    mean, survives = survival(grown)
    # Simpson's rule for what bends the survival beside a hazard that grows evenly.
    excess = half - 0.5 * grown
    bent = math.sqrt(survives) * excess * fused(0.5, excess, -1.0)
    lost = alive * (grown * mean)
    share = losses.ionizing * _at(flown, 0.0, light) / (grown if grown > 0.0 else 1.0)
    duration = flown * h
    _, sampled = survival(before_sample)
    set_lane_value(lanes, WEIGHT + lane, alive)
    set_lane_value(lanes, CONTENT + lane, alive * sampled * (duration / lane_value(lanes, SAMPLES + lane)))
    set_lane_value(lanes, LIFE + lane, alive * duration * (mean + bent / 1.5))
    set_lane_value(lanes, LOST + lane, lost)
    set_lane_value(lanes, IONIZED + lane, lost * share)
    set_lane_value(lanes, KEPT + lane, kept * survives)
    set_lane_value(lanes, TIME + lane, lane_value(lanes, TIME + lane) + duration)


@inlined
def _go_on(lanes, lane):
    accepted = lane_value(lanes, ACCEPTED + lane) > 0.0
    for row in range(STATE_ROWS):
        at = row * WIDTH + lane
        stands = lane_value(lanes, START + at)
        set_lane_value(lanes, START + at, lane_value(lanes, END + at) if accepted else stands)


@inlined
def _sum_up(lanes):
    """Add what the accepted steps take to the sums of their lanes."""
    for lane in range(WIDTH):
        accepted = lane_value(lanes, ACCEPTED + lane) > 0.0
        _add(lanes, SUM_LIFE + lane, lane_value(lanes, LIFE + lane) if accepted else 0.0)
        _add(lanes, SUM_LOST + lane, lane_value(lanes, LOST + lane) if accepted else 0.0)
        _add(lanes, SUM_IONIZED + lane, lane_value(lanes, IONIZED + lane) if accepted else 0.0)
        _add(lanes, SUM_STEPS + lane, 1.0 if accepted else 0.0)


@inlined
def _add(lanes, at, value):
    set_lane_value(lanes, at, lane_value(lanes, at) + value)


@inlined
def _draw_on(lanes, lane):
    """Set the part at which the next step is sampled.

    One random number a flight, for each further step moved on by the golden ratio: even for each step, as it must be
    for unbiased sums, and spread more evenly over the steps of a flight than numbers drawn for each.
    """
    drawn = lane_value(lanes, DRAWN + lane)
    accepted = lane_value(lanes, ACCEPTED + lane) > 0.0
    set_lane_value(lanes, DRAWN + lane, golden_step(drawn) if accepted else drawn)


@inlined
def golden_step(drawn):
    """Return the fractional part of `drawn`, from 0 to 1, and the golden ratio's part."""
    moved = drawn + GOLDEN
    return moved - 1.0 if moved >= 1.0 else moved


@inlined
def _at(part, start, coefficients):
    """Return `dense_output.component_at`."""
    growth, bend, rest, quartic = coefficients
    left = 1.0 - part
    return fused(part, fused(left, fused(part, fused(left, quartic, rest), bend), growth), start)


@inlined
def _coefficients(h, growth, first_slope, last_slope, quartic):
    """Return what `dense_output.set_component` stores."""
    bend = fused(h, first_slope, -growth)
    return growth, bend, fused(-h, last_slope, growth) - bend, quartic


@inlined
def _place(lanes, axis, lane, h, part):
    coefficients = _coefficients(
        h,
        lane_value(lanes, GROWTH + axis + lane),
        lane_value(lanes, START + VELOCITY + axis + lane),
        lane_value(lanes, SEVENTH + axis + lane),
        lane_value(lanes, QUARTIC + axis + lane),
    )
    return _at(part, lane_value(lanes, START + axis + lane), coefficients)


@inlined
def _velocity(lanes, axis, lane, h, part):
    coefficients = _coefficients(
        h,
        lane_value(lanes, GROWTH + VELOCITY + axis + lane),
        lane_value(lanes, START + ACCELERATION + axis + lane),
        lane_value(lanes, SEVENTH + STAGE_ACCELERATION + axis + lane),
        lane_value(lanes, QUARTIC + VELOCITY + axis + lane),
    )
    return _at(part, lane_value(lanes, START + VELOCITY + axis + lane), coefficients)


@inlined
def _integrals(lanes, lane):
    """Return what `_at` takes of the integrals of light and of other losses over the step."""
    h = lane_value(lanes, LENGTH + lane)
    return (
        _integral(lanes, lane, h, LIGHT, STAGE_LIGHT),
        _integral(lanes, lane, h, OTHER, STAGE_OTHER),
    )


@inlined
def _integral(lanes, lane, h, rate, later):
    return _coefficients(
        h,
        lane_value(lanes, GROWTH + later + lane),
        lane_value(lanes, START + rate + lane),
        lane_value(lanes, SEVENTH + later + lane),
        lane_value(lanes, QUARTIC + later + lane),
    )

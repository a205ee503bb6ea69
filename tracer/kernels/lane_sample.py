"""A sample of the step in every lane at once, what the step leaves in the budget, and the flight as it goes on."""

import math

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
    SERIES,
    SEVENTH,
    STAGE_ACCELERATION,
    STAGE_LIGHT,
    STAGE_OTHER,
    START,
    STATE_ROWS,
    TIME,
    VELOCITY,
    WIDTH,
    Y,
    Z,
)
from tracer.kernels.orbit import body_in_series, keep_body

SHORT = 0.5
"""Hazard up to which the power series is exact to the last bit: its next term is u^14/15! = 5e-17."""

HALVINGS = 10
"""A longer hazard is halved as often, and the survival squared."""


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
    """Sample the flown step of every lane at its part DRAWN, book what the step takes, and go on from its end."""
    forces, losses, _ = sky
    full_light = forces.light_distance * forces.light_distance
    per_light = losses.ionizing + losses.other_sunlight
    for lane in range(WIDTH):
        _book(lanes, lane, losses, per_light)
    cells_per_turn = cells.local_time_cells / (2.0 * math.pi)
    rows_per_angle = cells.latitude_cells / math.pi
    per_first = 1.0 / cells.first_altitude
    for lane in range(WIDTH):
        flown = lane_value(lanes, FLOWN + lane)
        part = flown * lane_value(lanes, DRAWN + lane)
        h = lane_value(lanes, LENGTH + lane)
        x = _place(lanes, 0, lane, h, part)
        y = _place(lanes, Y, lane, h, part)
        z = _place(lanes, Z, lane, h, part)
        vx = _velocity(lanes, 0, lane, h, part)
        vy = _velocity(lanes, Y, lane, h, part)
        vz = _velocity(lanes, Z, lane, h, part)
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
        _go_on(lanes, lane)


@kernel
def book_steps(lanes, sky):
    """Book what the step takes in every lane and go on from its end, the body too; nothing is sampled."""
    forces, losses, _ = sky
    per_light = losses.ionizing + losses.other_sunlight
    for lane in range(WIDTH):
        _book(lanes, lane, losses, per_light)
    for lane in range(WIDTH):
        duration = lane_value(lanes, FLOWN + lane) * lane_value(lanes, LENGTH + lane)
        keep_body(body_in_series(forces, lanes, SERIES + lane, WIDTH, duration), lanes, SERIES + lane, WIDTH)
        _go_on(lanes, lane)


@inlined
def _book(lanes, lane, losses, per_light):
    flown = lane_value(lanes, FLOWN + lane)
    part = flown * lane_value(lanes, DRAWN + lane)
    h = lane_value(lanes, LENGTH + lane)
    light = _integral(lanes, lane, h, LIGHT, STAGE_LIGHT)
    other = _integral(lanes, lane, h, OTHER, STAGE_OTHER)
    steady = losses.other_everywhere * h
    lit_through = _at(flown, 0.0, light)
    grown = fused(per_light, lit_through, fused(steady, flown, _at(flown, 0.0, other)))
    middle = 0.5 * flown
    half = fused(per_light, _at(middle, 0.0, light), fused(steady, middle, _at(middle, 0.0, other)))
    before_sample = fused(per_light, _at(part, 0.0, light), fused(steady, part, _at(part, 0.0, other)))
    kept = lane_value(lanes, KEPT + lane)
    alive = lane_value(lanes, ALIVE + lane) * kept
    mean, survives = survival(grown)
    # Simpson's rule for what bends the survival beside a hazard that grows evenly.
    excess = half - 0.5 * grown
    bent = math.sqrt(survives) * excess * fused(0.5, excess, -1.0)
    lost = alive * (grown * mean)
    share = losses.ionizing * lit_through / (grown if grown > 0.0 else 1.0)
    duration = flown * h
    _, sampled = survival(before_sample)
    set_lane_value(lanes, CONTENT + lane, alive * sampled * duration)
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
def _integral(lanes, lane, h, rate, later):
    return _coefficients(
        h,
        lane_value(lanes, GROWTH + later + lane),
        lane_value(lanes, START + rate + lane),
        lane_value(lanes, SEVENTH + later + lane),
        lane_value(lanes, QUARTIC + later + lane),
    )

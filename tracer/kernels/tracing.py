"""Many atoms, each from its release to its end, in slices that stop and go on."""

import math
from typing import NamedTuple

import numpy as np

from tracer.fate import Fate
from tracer.kernels.arc_flight import arc_end, arc_state, launch_arc, score_arc
from tracer.kernels.bounce import rebound
from tracer.kernels.compiling import kernel, merged
from tracer.kernels.endings import AGED, CROSSED, FLYING, LANDED
from tracer.kernels.integrated_flight import (
    PLACE,
    TIME,
    advance,
    new_curve,
    new_flight,
    start_flight,
)
from tracer.kernels.scoring import Tally, ground_cell, mean_survival_time
from tracer.kernels.step_scoring import book_step, score_step
from tracer.kernels.world import World

ATOM = 0
ALOFT = 1
HOME_ROW = 2
HOME_COLUMN = 3
STEPS = 4
COUNTERS = 5

GRAZING = 0.02
"""Sine of the angle above the horizon below which a launch is integrated with more care."""

LEAST_CARE = 1e-5
"""Smallest part of the tolerance: below it rounding decides anyway."""

SURVIVAL = 6
AGE = 7
STATE_SIZE = 8


class Resume(NamedTuple):
    """What a slice leaves for the next, and room to work in.

    `counters` int64 (COUNTERS,); `state` (STATE_SIZE,): position [m], velocity [m s-1] in the Sun-fixed frame, survival
    and age [s] at a launch. `flight`, `curve` serve the flight under way, `shine` (line,) its samples.
    """

    counters: np.ndarray
    state: np.ndarray
    flight: np.ndarray
    curve: np.ndarray
    shine: np.ndarray


def new_resume(lines: int) -> Resume:
    """Return the start of a batch of atoms with `lines` emission lines."""
    return Resume(
        np.zeros(COUNTERS, np.int64), np.zeros(STATE_SIZE), new_flight(), new_curve(), np.zeros(lines)
    )


def trace_slice(
    world: World,
    positions: np.ndarray,
    velocities: np.ndarray,
    weight: float,
    resume: Resume,
    tally: Tally,
    rng: np.random.Generator,
    most_flights: int,
) -> int:
    """Trace atoms from where `resume` stands for at most `most_flights` launches and return their number.

    `positions` (n, 3) are unit vectors of the places of release, `velocities` (n, 3) [m s-1] relative to the ground,
    `weight` [s-1] is each atom's share of the release rate. Done when counter ATOM equals n.
    """
    trace = trace_integrated if world.integrated else trace_arcs
    return trace(world, positions, velocities, weight, resume, tally, rng, most_flights)


@kernel
def trace_integrated(world, positions, velocities, weight, resume, tally, rng, most_flights):
    """Do what `trace_slice` says with integrated flights; apart from arcs, so that a run compiles one of the two."""
    flights = 0
    while flights < most_flights and resume.counters[ATOM] < positions.shape[0]:
        if resume.counters[ALOFT] == 0:
            _release(world, positions, velocities, weight, resume, tally)
        alive = _take_off(weight, resume, tally)
        end = _fly_integrated(world, resume, tally, alive, rng)
        _come_down(world, resume, tally, alive, end, rng)
        flights += 1
    return flights


@kernel
def trace_arcs(world, positions, velocities, weight, resume, tally, rng, most_flights):
    """Do what `trace_slice` says with flights on closed-form arcs."""
    flights = 0
    while flights < most_flights and resume.counters[ATOM] < positions.shape[0]:
        if resume.counters[ALOFT] == 0:
            _release(world, positions, velocities, weight, resume, tally)
        alive = _take_off(weight, resume, tally)
        end = _fly_arc(world, resume, tally, alive, rng)
        _come_down(world, resume, tally, alive, end, rng)
        flights += 1
    return flights


@merged
def _release(world, positions, velocities, weight, resume, tally):
    i = resume.counters[ATOM]
    nx, ny, nz = positions[i, 0], positions[i, 1], positions[i, 2]
    row, column = ground_cell(world.cells, nx, ny, nz, 1.0)
    tally.released[row, column] += weight
    resume.counters[HOME_ROW] = row
    resume.counters[HOME_COLUMN] = column
    resume.counters[ALOFT] = 1
    resume.state[SURVIVAL] = 1.0
    resume.state[AGE] = 0.0
    _launch(world, resume.state, nx, ny, nz, velocities[i, 0], velocities[i, 1], velocities[i, 2])


@merged
def _launch(world, state, nx, ny, nz, vx, vy, vz):
    """Put an atom at the ground under unit vector n with velocity v relative to the ground, which turns."""
    radius = world.motion.radius
    spin = world.surface.spin
    state[0] = radius * nx
    state[1] = radius * ny
    state[2] = radius * nz
    state[3] = vx - spin * state[1]
    state[4] = vy + spin * state[0]
    state[5] = vz


@merged
def _take_off(weight, resume, tally):
    """Count a launch and return the weight that flies."""
    alive = weight * resume.state[SURVIVAL]
    tally.launches[0] += alive
    return alive


@merged
def _come_down(world, resume, tally, alive, end, rng):
    ending, kept, t, x, y, z, vx, vy, vz = end
    alive *= kept
    resume.state[SURVIVAL] *= kept
    resume.state[AGE] += t
    if ending == LANDED:
        _land(world, resume, tally, alive, x, y, z, vx, vy, vz, rng)
    else:
        _end_aloft(world, resume, tally, ending, alive, x, y, z)


@merged
def _fly_arc(world, resume, tally, alive, rng):
    """Return (ending, survival, time, position, velocity) of one flight on a closed-form arc, and count it."""
    state = resume.state
    motion = world.motion
    arc = launch_arc(motion, state[0], state[1], state[2], state[3], state[4], state[5])
    ending, s_end = arc_end(motion, arc, motion.age_limit - state[AGE])
    score_arc(world, tally, arc, s_end, alive, resume.shine, rng)
    t, x, y, z, vx, vy, vz = arc_state(motion, arc, s_end)
    kept = math.exp(-motion.hazard * t)
    tally.life[0] += alive * mean_survival_time(motion.hazard, t)
    tally.ledger[Fate.OTHER_LOSS] += alive - alive * kept
    return ending, kept, t, x, y, z, vx, vy, vz


@kernel
def _care(state):
    """Return the part of the tolerance that a launch may use: less than all where it leaves along the ground.

    A launch at a small angle above the horizon, faster than a circular orbit, comes back to a pericentre below the
    ground by about the square of that angle: an error as large would carry it over the ground, round and round.
    """
    r = math.sqrt(state[0] * state[0] + state[1] * state[1] + state[2] * state[2])
    speed = math.sqrt(state[3] * state[3] + state[4] * state[4] + state[5] * state[5])
    climb = state[0] * state[3] + state[1] * state[4] + state[2] * state[5]
    if climb >= GRAZING * r * speed:
        return 1.0
    angle = climb / (GRAZING * r * speed)
    return max(angle * angle, LEAST_CARE)


@merged
def _fly_integrated(world, resume, tally, alive, rng):
    """Return (ending, survival, time, position, velocity) of one integrated flight, and count it step by step."""
    state, flight, curve = resume.state, resume.flight, resume.curve
    light = world.light
    tolerance = light.tolerance * _care(state)
    start_flight(
        flight, light.conditions, tolerance, state[0], state[1], state[2], state[3], state[4], state[5]
    )
    time_left = world.motion.age_limit - state[AGE]
    kept = 1.0
    standing = FLYING
    while standing == FLYING:
        standing = advance(flight, curve, light.conditions, tolerance, time_left)
        resume.counters[STEPS] += 1
        score_step(world, tally, curve, alive, resume.shine, rng)
        kept = book_step(tally, curve, alive, kept)
    return (
        standing,
        kept,
        flight[TIME],
        flight[PLACE],
        flight[PLACE + 1],
        flight[PLACE + 2],
        flight[PLACE + 3],
        flight[PLACE + 4],
        flight[PLACE + 5],
    )


@merged
def _land(world, resume, tally, alive, x, y, z, vx, vy, vz, rng):
    r = math.sqrt(x * x + y * y + z * z)
    nx, ny, nz = x / r, y / r, z / r
    row, column = ground_cell(world.cells, nx, ny, nz, 1.0)
    tally.returned[row, column] += alive
    if rng.random() < world.surface.sticking:
        tally.captured[row, column] += alive
        tally.ledger[Fate.CAPTURED] += alive
        _next_atom(resume)
        return
    ux = vx + world.surface.spin * y
    uy = vy - world.surface.spin * x
    out = rebound(rng, world.surface, nx, ny, nz, ux * ux + uy * uy + vz * vz)
    _launch(world, resume.state, nx, ny, nz, out[0], out[1], out[2])


@merged
def _end_aloft(world, resume, tally, ending, alive, x, y, z):
    if ending == CROSSED:
        tally.ledger[Fate.ESCAPED] += alive
        tally.escaped[resume.counters[HOME_ROW], resume.counters[HOME_COLUMN]] += alive
        row, column = ground_cell(world.cells, x, y, z, math.sqrt(x * x + y * y + z * z))
        tally.escaped_by_direction[row, column] += alive
    elif ending == AGED:
        tally.ledger[Fate.AGE_LIMIT] += alive
    else:
        tally.ledger[Fate.UNRESOLVED] += alive
    _next_atom(resume)


@merged
def _next_atom(resume):
    resume.counters[ALOFT] = 0
    resume.counters[ATOM] += 1

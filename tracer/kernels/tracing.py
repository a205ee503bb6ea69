"""Many atoms, each from its release to its end, in slices that stop and go on."""

import numpy as np

from tracer.fate import Fate
from tracer.kernels.apart import lane_value, set_lane_value
from tracer.kernels.arc_lanes import fly_arcs
from tracer.kernels.compiling import kernel, merged
from tracer.kernels.endings import DROPPED, FLYING
from tracer.kernels.ground import come_down, release, take_off
from tracer.kernels.hop_lanes import launch_on_arc
from tracer.kernels.lane_flight import end_in_lane, launch_in_lane, step_lanes
from tracer.kernels.lane_sample import go_on, sample_steps
from tracer.kernels.lane_scoring import score_further, score_lanes
from tracer.kernels.lanes import (
    ALIVE,
    DRAWN,
    END,
    KEPT,
    LEAST,
    STANDING,
    START,
    SUM_IONIZED,
    SUM_LIFE,
    SUM_LOST,
    SUM_STEPS,
    UNDRAWN,
    VACANT,
    WIDTH,
)
from tracer.kernels.launches import Launches
from tracer.kernels.resume import AGE, CURSOR, ENDED, RELEASED, STEPS, SURVIVAL, UNDER_WAY, Resume
from tracer.kernels.roulette import play_roulette
from tracer.kernels.scoring import Tally
from tracer.kernels.snapshot import trace_snapshot
from tracer.kernels.step_control import care
from tracer.kernels.world import World


def trace_slice(
    world: World,
    launches: Launches,
    resume: Resume,
    tally: Tally,
    rng: np.random.Generator,
    most_flights: int,
) -> int:
    """Trace atoms from where `resume` stands for at most `most_flights` flights and return their number.

    Done when counter ENDED equals the number of `launches`.
    """
    trace = trace_arcs
    if world.snapshot is not None:
        trace = trace_snapshot
    elif world.integrated:
        trace = trace_integrated
    return trace(world, launches, resume, tally, rng, most_flights)


@kernel
def trace_integrated(world, launches, resume, tally, rng, most_flights):
    """Do what `trace_slice` says with integrated flights; apart from arcs, so that a run compiles one of the two.

    The flights go side by side, a step each in turn. Where one ends, the atom's next flight or the next atom's first
    takes its lane. A slice may stop amid that, never amid the steps: what the random numbers are drawn for does not
    depend on where slices end.
    """
    flights = 0
    lanes = resume.lanes
    conditions = world.light.conditions
    sky, tables = conditions.sky, conditions.push_tables
    while flights < most_flights and resume.counters[ENDED] < launches.weights.shape[0]:
        for lane in range(resume.counters[CURSOR], WIDTH):
            resume.counters[CURSOR] = lane
            if lanes[STANDING + lane] == FLYING:
                if lanes[KEPT + lane] >= lanes[LEAST + lane]:
                    continue
                if _survives_roulette(world, tally, lanes, lane, rng):
                    continue
            if lanes[STANDING + lane] != VACANT:
                if flights == most_flights:
                    _count_steps(resume)
                    return flights
                _end_flight(world, resume, tally, lane, START, rng)
                flights += 1
            _begin_flight(world, launches, resume, tally, lane, rng)
        resume.counters[CURSOR] = 0
        step_lanes(lanes, sky, tables, resume.curve)
        sample_steps(lanes, sky, world.cells)
        if score_lanes(world, tally, lanes, resume.shine):
            score_further(world, tally, lanes, resume.shine)
        go_on(lanes)
    _count_steps(resume)
    if resume.counters[ENDED] == launches.weights.shape[0]:
        _close_books(resume, tally)
    return flights


@kernel
def _count_steps(resume):
    """Count the steps of all lanes, slice by slice: whole numbers, whose sum is the same wherever slices end."""
    for lane in range(WIDTH):
        resume.counters[STEPS] += int(resume.lanes[SUM_STEPS + lane])
        resume.lanes[SUM_STEPS + lane] = 0.0


@merged
def _close_books(resume, tally):
    """Enter in the budget what the steps of all lanes took, once their last flights have ended.

    Not slice by slice: sums would be rounded differently where slices end elsewhere.
    """
    lanes = resume.lanes
    for lane in range(WIDTH):
        tally.life[0] += lanes[SUM_LIFE + lane]
        tally.ledger[Fate.IONIZED] += lanes[SUM_IONIZED + lane]
        tally.ledger[Fate.OTHER_LOSS] += lanes[SUM_LOST + lane] - lanes[SUM_IONIZED + lane]
        for row in (SUM_LIFE, SUM_IONIZED, SUM_LOST):
            lanes[row + lane] = 0.0


@merged
def _survives_roulette(world, tally, lanes, lane, rng):
    """Play roulette with a flight of which little is left, and return True where it goes on."""
    lanes[KEPT + lane] = play_roulette(
        world.roulette.gain, tally, lanes[ALIVE + lane], lanes[KEPT + lane], lanes[LEAST + lane], rng
    )
    if lanes[KEPT + lane] > 0.0:
        return True
    lanes[STANDING + lane] = DROPPED
    return False


@merged
def _has_atom(world, launches, resume, tally, lane):
    """Return whether the lane's atom is under way, or a new one that is now; else the lane is vacant."""
    if resume.atoms[lane, UNDER_WAY] != 0.0:
        return True
    if resume.counters[RELEASED] == launches.weights.shape[0]:
        resume.lanes[STANDING + lane] = VACANT
        return False
    release(world, launches, resume.counters[RELEASED], resume.atoms[lane], tally)
    resume.counters[RELEASED] += 1
    return True


@merged
def _begin_flight(world, launches, resume, tally, lane, rng):
    """Launch the lane's atom again, or a new one, or leave the lane vacant if there are no more."""
    atom, lanes = resume.atoms[lane], resume.lanes
    if not _has_atom(world, launches, resume, tally, lane):
        return
    lanes[ALIVE + lane] = take_off(atom, tally)
    lanes[DRAWN + lane] = rng.random()
    lanes[LEAST + lane] = world.roulette.aloft / atom[SURVIVAL]
    light = world.light
    launch_in_lane(
        lanes,
        lane,
        light.conditions,
        light.tolerance * care(atom),
        0.0,
        world.motion.age_limit - atom[AGE],
        (atom[0], atom[1], atom[2], atom[3], atom[4], atom[5]),
    )


@merged
def _end_flight(world, resume, tally, lane, state, rng):
    """Enter the end of a lane's flight, whose last state begins at row `state`."""
    lanes = resume.lanes
    atom = resume.atoms[lane]
    come_down(world, atom, tally, lane_value(lanes, ALIVE + lane), end_in_lane(lanes, lane, state), rng)
    if atom[UNDER_WAY] == 0.0:
        resume.counters[ENDED] += 1


@kernel
def trace_arcs(world, launches, resume, tally, rng, most_flights):
    """Do what `trace_slice` says with flights on closed-form arcs.

    The flights of all lanes go side by side from launch to end, then the next ones; a slice may stop amid their ends.
    """
    flights = 0
    lanes = resume.lanes
    while flights < most_flights and resume.counters[ENDED] < launches.weights.shape[0]:
        for lane in range(resume.counters[CURSOR], WIDTH):
            resume.counters[CURSOR] = lane
            if lane_value(lanes, STANDING + lane) != VACANT:
                if flights == most_flights:
                    return flights
                _end_flight(world, resume, tally, lane, END, rng)
                flights += 1
            _begin_arc(world, launches, resume, tally, lane, rng)
        resume.counters[CURSOR] = 0
        fly_arcs(world, tally, lanes, resume.shine, rng)
    if resume.counters[ENDED] == launches.weights.shape[0]:
        _close_books(resume, tally)
    return flights


@merged
def _begin_arc(world, launches, resume, tally, lane, rng):
    """Do what `_begin_flight` does for a flight on an arc."""
    atom, lanes = resume.atoms[lane], resume.lanes
    if not _has_atom(world, launches, resume, tally, lane):
        return
    set_lane_value(lanes, ALIVE + lane, take_off(atom, tally))
    if lane_value(lanes, DRAWN + lane) == UNDRAWN:
        set_lane_value(lanes, DRAWN + lane, rng.random())
    launch_on_arc(lanes, lane, world.motion.frame_rate, world.motion.age_limit - atom[AGE], atom)

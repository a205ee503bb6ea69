"""Many atoms, each from its release to its end, in slices that stop and go on."""

import math

import numpy as np

from tracer.kernels.arc_flight import fly_arc
from tracer.kernels.compiling import kernel, merged
from tracer.kernels.endings import DROPPED, FLYING
from tracer.kernels.ground import come_down, release, take_off
from tracer.kernels.integrated_flight import PLACE, TIME, advance, start_flight
from tracer.kernels.launches import Launches
from tracer.kernels.resume import AGE, ENDED, RELEASED, STEPS, SURVIVAL, UNDER_WAY, Resume
from tracer.kernels.roulette import play_roulette
from tracer.kernels.scoring import Tally
from tracer.kernels.step_scoring import book_step, score_step
from tracer.kernels.world import World

GRAZING = 0.02
"""Sine of the angle above the horizon below which a launch is integrated with more care."""

LEAST_CARE = 1e-5
"""Smallest part of the tolerance: below it rounding decides anyway."""


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
    trace = trace_integrated if world.integrated else trace_arcs
    return trace(world, launches, resume, tally, rng, most_flights)


@kernel
def trace_integrated(world, launches, resume, tally, rng, most_flights):
    """Do what `trace_slice` says with integrated flights; apart from arcs, so that a run compiles one of the two."""
    flights = 0
    while flights < most_flights and resume.counters[ENDED] < launches.weights.shape[0]:
        _begin(world, launches, resume, tally)
        alive = take_off(resume.atom, tally)
        end = _fly_integrated(world, resume, tally, alive, rng)
        _finish(world, resume, tally, alive, end, rng)
        flights += 1
    return flights


@kernel
def trace_arcs(world, launches, resume, tally, rng, most_flights):
    """Do what `trace_slice` says with flights on closed-form arcs."""
    flights = 0
    while flights < most_flights and resume.counters[ENDED] < launches.weights.shape[0]:
        _begin(world, launches, resume, tally)
        alive = take_off(resume.atom, tally)
        end = fly_arc(world, tally, resume.atom, alive, resume.shine, rng)
        _finish(world, resume, tally, alive, end, rng)
        flights += 1
    return flights


@merged
def _begin(world, launches, resume, tally):
    if resume.atom[UNDER_WAY] == 0.0:
        release(world, launches, resume.counters[RELEASED], resume.atom, tally)
        resume.counters[RELEASED] += 1


@merged
def _finish(world, resume, tally, alive, end, rng):
    come_down(world, resume.atom, tally, alive, end, rng)
    if resume.atom[UNDER_WAY] == 0.0:
        resume.counters[ENDED] += 1


@kernel
def _care(atom):
    """Return the part of the tolerance that a launch may use: less than all where it leaves along the ground.

    A launch at a small angle above the horizon, faster than a circular orbit, comes back to a pericentre below the
    ground by about the square of that angle: an error as large would carry it over the ground, round and round.
    """
    r = math.sqrt(atom[0] * atom[0] + atom[1] * atom[1] + atom[2] * atom[2])
    speed = math.sqrt(atom[3] * atom[3] + atom[4] * atom[4] + atom[5] * atom[5])
    climb = atom[0] * atom[3] + atom[1] * atom[4] + atom[2] * atom[5]
    if climb >= GRAZING * r * speed:
        return 1.0
    angle = climb / (GRAZING * r * speed)
    return max(angle * angle, LEAST_CARE)


@merged
def _fly_integrated(world, resume, tally, alive, rng):
    """Return (ending, survival, time, position, velocity) of one integrated flight, and count it step by step."""
    atom, flight, curve = resume.atom, resume.flight, resume.curve
    light = world.light
    tolerance = light.tolerance * _care(atom)
    start_flight(flight, light.conditions, tolerance, atom[0], atom[1], atom[2], atom[3], atom[4], atom[5])
    time_left = world.motion.age_limit - atom[AGE]
    least = world.roulette.aloft / atom[SURVIVAL]
    kept = 1.0
    standing = FLYING
    while standing == FLYING:
        standing = advance(flight, curve, light.conditions, tolerance, time_left)
        resume.counters[STEPS] += 1
        score_step(world, tally, curve, alive, kept, resume.shine, rng)
        kept = book_step(tally, curve, alive, kept)
        if standing == FLYING:
            kept = play_roulette(world.roulette.gain, tally, alive, kept, least, rng)
            if kept == 0.0:
                standing = DROPPED
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

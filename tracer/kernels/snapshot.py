"""The gas about a body that moves: what flies at the stated position, and what happens shortly before.

Each launch is flown several times. First as one of the cohort that is released at the stated position and followed to
its end: that is the particle budget, and tells how long such an atom lives. Then as often as `VISITS_PER_STEP` says as
a visit, released earlier so that it is some age when the body comes to the stated position. There the flight stops: its
place is a sample of density, images and light, and what happened to it in the window before counts for the fluxes.

The ages are drawn from a mixture of even distributions whose ends follow the lives of the same launch and of all, so
that most visits still fly; the weight is one over the mixture's density, so whatever it is nothing is left out.
"""

import math

import numpy as np

from tracer.fate import Fate
from tracer.kernels.compiling import inlined, kernel, merged
from tracer.kernels.endings import AGED, FLYING, UNRESOLVED
from tracer.kernels.ground import come_down, release, take_off
from tracer.kernels.lane_flight import end_in_lane, launch_in_lane, step_lanes
from tracer.kernels.lane_sample import book_steps
from tracer.kernels.lanes import (
    ACCEPTED,
    ALIVE,
    IONIZED,
    KEPT,
    LIFE,
    LOST,
    STANDING,
    START,
    VACANT,
    VELOCITY,
    WIDTH,
    ZONE,
    Y,
    Z,
)
from tracer.kernels.launches import Launches
from tracer.kernels.motion import radial_velocity, sunlight_received
from tracer.kernels.orbit import stated_body
from tracer.kernels.resume import (
    AGE,
    CLOCK,
    CURSOR,
    ENDED,
    LIMIT,
    MEAN,
    NUMBER,
    RELEASED,
    ROLE,
    SPAN,
    STEPS,
    STEPS_MADE,
    SURVIVED,
    UNDER_WAY,
    VISITED,
    VISITS,
    WEIGHT,
    Resume,
)
from tracer.kernels.scoring import Tally, score_in_light
from tracer.kernels.step_control import care
from tracer.kernels.two_body import orbit_state, turning_at
from tracer.kernels.world import World

COHORT = 0.0
"""Released at the stated position and followed to its end."""

OLDER = 1.0
"""One of the cohort behind the limit of age, followed to twice that: what the limit leaves out."""

VISIT = 2.0
"""Released before the stated position, and followed to it."""

VISITS_PER_STEP = 1.0 / 8.0
FEWEST_VISITS = 2.0
MOST_VISITS = 8.0
"""A launch gets visits by the steps that the cohort's flights took: those that go far have more to show."""

SHARES = (0.30, 0.25, 0.15, 0.20, 0.10)
"""Of ages even up to: twice the cohort's time of survival; a little over its life; three times the mean survival of
all; that life and the window; all there is. The last bounds every weight."""

SURVIVALS, LIVES, MEANS = 2.0, 1.25, 3.0


def trace_snapshot(
    world: World,
    launches: Launches,
    resume: Resume,
    tally: Tally,
    rng: np.random.Generator,
    most_flights: int,
) -> int:
    """Do what `tracing.trace_slice` says about a body that moves."""
    cohort, events, scrap = books_of(tally)
    return trace_visits(world, launches, resume, tally, cohort, events, scrap, rng, most_flights)


def books_of(tally: Tally) -> tuple[Tally, Tally, Tally]:
    """Return the tallies that ends of flights are entered in: of the cohort, of events in the window, of no account."""
    numbers = ("ledger", "launches", "roulette", "life", "struck")
    fluxes = ("returned", "captured", "escaped", "escaped_by_direction")
    kept = {"released", *numbers, *fluxes}
    scrap = Tally(
        *(
            np.zeros_like(field) if name in kept else np.zeros((0,) * field.ndim)
            for name, field in zip(Tally._fields, tally, strict=True)
        )
    )
    cohort = tally._replace(**{name: getattr(scrap, name) for name in fluxes})
    events = scrap._replace(**{name: getattr(tally, name) for name in fluxes})
    return cohort, events, scrap


@kernel
def trace_visits(world, launches, resume, tally, cohort, events, scrap, rng, most_flights):
    """Fly the cohort and its visits side by side, a step each in turn, as `tracing.trace_integrated` does."""
    flights = 0
    lanes = resume.lanes
    conditions = world.light.conditions
    sky, tables = conditions.sky, conditions.push_tables
    while flights < most_flights and resume.counters[ENDED] < launches.weights.shape[0]:
        for lane in range(resume.counters[CURSOR], WIDTH):
            resume.counters[CURSOR] = lane
            if lanes[STANDING + lane] == FLYING:
                continue
            if lanes[STANDING + lane] != VACANT:
                if flights == most_flights:
                    return flights
                _end_flight(world, resume, tally, cohort, events, scrap, lane, rng)
                flights += 1
            _begin_flight(world, launches, resume, cohort, scrap, lane, rng)
        resume.counters[CURSOR] = 0
        step_lanes(lanes, sky, tables, resume.curve)
        book_steps(lanes, sky)
        for lane in range(WIDTH):
            if lanes[ACCEPTED + lane] > 0.0:
                resume.counters[STEPS] += 1
                _enter_step(resume.atoms[lane], lanes, lane, tally)
    return flights


@merged
def _enter_step(atom, lanes, lane, tally):
    """Enter what a step takes from the cohort, and how long it lives."""
    atom[STEPS_MADE] += 1.0
    if atom[ROLE] == COHORT:
        atom[SURVIVED] += lanes[LIFE + lane] / atom[WEIGHT]
        tally.life[0] += lanes[LIFE + lane]
        tally.ledger[Fate.IONIZED] += lanes[IONIZED + lane]
        tally.ledger[Fate.OTHER_LOSS] += lanes[LOST + lane] - lanes[IONIZED + lane]
    elif atom[ROLE] == OLDER:
        tally.older[0] += lanes[LIFE + lane]


@merged
def _begin_flight(world, launches, resume, cohort, scrap, lane, rng):
    """Launch the lane's atom again, the same one for its next visit, or a new one, or leave the lane vacant."""
    atom, lanes = resume.atoms[lane], resume.lanes
    if atom[UNDER_WAY] == 0.0:
        if atom[VISITED] < atom[VISITS]:
            _release_visit(world, launches, atom, cohort, scrap, rng)
        elif resume.counters[RELEASED] < launches.weights.shape[0]:
            _release_cohort(world, launches, atom, resume.counters[RELEASED], cohort)
            resume.counters[RELEASED] += 1
        else:
            lanes[STANDING + lane] = VACANT
            return
    lanes[ALIVE + lane] = take_off(atom, cohort if atom[ROLE] == COHORT else scrap)
    light = world.light
    launch_in_lane(
        lanes,
        lane,
        light.conditions,
        light.tolerance * (care(atom) if atom[ROLE] != OLDER else 1.0),
        atom[CLOCK] + atom[AGE],
        atom[LIMIT] - atom[AGE],
        (atom[0], atom[1], atom[2], atom[3], atom[4], atom[5]),
    )


@merged
def _release_cohort(world, launches, atom, number, cohort):
    atom[ROLE] = COHORT
    atom[CLOCK] = 0.0
    atom[NUMBER] = number
    atom[VISITS] = 0.0
    atom[VISITED] = 0.0
    atom[LIMIT] = world.motion.age_limit
    atom[SURVIVED] = 0.0
    atom[STEPS_MADE] = 0.0
    release(world, launches, number, atom, cohort)


@merged
def _release_visit(world, launches, atom, cohort, scrap, rng):
    """Release the same atom earlier, by an age drawn from one of as many even parts of the mixture as it has visits."""
    share = (atom[VISITED] + rng.random()) / atom[VISITS]
    ends = _ends_of_ages(world, atom[SPAN], atom[SURVIVED], atom[MEAN])
    age = _age_drawn(ends, share)
    orbit = world.light.conditions.sky.forces.orbit
    distance, _ = orbit_state(orbit, -age)
    faster = turning_at(orbit, distance) / world.light.conditions.sky.forces.turning
    rate = faster if world.snapshot.follows_distance > 0.0 else 1.0
    atom[ROLE] = VISIT
    atom[CLOCK] = -age
    atom[LIMIT] = min(age, world.motion.age_limit)
    release(world, launches, int(atom[NUMBER]), atom, scrap)
    # Atoms now, no longer atoms a second.
    atom[WEIGHT] *= rate / (atom[VISITS] * _density_of_ages(ends, age))


@inlined
def _ended(cohort):
    """Return the atoms [s-1] of the cohort that have come to an end so far."""
    total = 0.0
    for fate in range(cohort.ledger.shape[0]):
        total += cohort.ledger[fate]
    return total


@inlined
def _ends_of_ages(world, span, survived, mean):
    """Return up to which age [s] each part of the mixture is even."""
    limit, window = world.motion.age_limit, world.snapshot.window
    return (
        min(SURVIVALS * survived, limit),
        min(LIVES * span, limit),
        min(MEANS * mean, limit),
        min(LIVES * span, limit) + window,
        limit + window,
    )


@inlined
def _age_drawn(ends, share):
    """Return the age [s] at `share` (0 to 1) of the mixture, part after part."""
    low = 0.0
    for part in range(len(ends) - 1):
        if share < low + SHARES[part]:
            return ends[part] * (share - low) / SHARES[part]
        low += SHARES[part]
    return ends[-1] * min(1.0, (share - low) / SHARES[-1])


@inlined
def _density_of_ages(ends, age):
    """Return the mixture's probability density [s-1] at `age` [s]."""
    density = SHARES[-1] / ends[-1]
    for part in range(len(ends) - 1):
        if age <= ends[part]:
            density += SHARES[part] / ends[part]
    return density


@merged
def _end_flight(world, resume, tally, cohort, events, scrap, lane, rng):
    atom, lanes = resume.atoms[lane], resume.lanes
    end = end_in_lane(lanes, lane, START)
    alive, role = lanes[ALIVE + lane], atom[ROLE]
    book = cohort if role == COHORT else scrap
    if role == VISIT:
        alive /= world.snapshot.window
        if atom[CLOCK] + atom[AGE] + end[2] >= -world.snapshot.window and end[0] != AGED:
            book = events
        if end[0] == UNRESOLVED:
            # Whoever reads the budget must learn of it.
            cohort.ledger[Fate.UNRESOLVED] += alive
    come_down(world, atom, book, alive, end, rng)
    if role == VISIT:
        if end[0] == AGED and -atom[CLOCK] <= world.motion.age_limit:
            _show(world, tally, atom, lanes, lane, resume.shine)
        if atom[UNDER_WAY] == 0.0:
            atom[VISITED] += 1.0
    elif role == COHORT and (end[0] == AGED or atom[UNDER_WAY] == 0.0):
        atom[SPAN] = atom[AGE]
    if role == COHORT and end[0] == AGED:
        _fly_on(world, atom, end)
    elif role != VISIT and atom[UNDER_WAY] == 0.0:
        # Kept, since the even parts of the mixture make up one whole only if it stays the same from visit to visit.
        atom[MEAN] = cohort.life[0] / _ended(cohort)
        atom[VISITS] = min(max(math.floor(VISITS_PER_STEP * atom[STEPS_MADE]), FEWEST_VISITS), MOST_VISITS)
    if atom[UNDER_WAY] == 0.0 and atom[VISITED] == atom[VISITS]:
        resume.counters[ENDED] += 1


@merged
def _fly_on(world, atom, end):
    """Let one of the cohort that has reached the limit of age fly on, without being counted as one."""
    atom[ROLE] = OLDER
    atom[UNDER_WAY] = 1.0
    atom[LIMIT] = 2.0 * world.motion.age_limit
    atom[0], atom[1], atom[2] = end[3], end[4], end[5]
    atom[3], atom[4], atom[5] = end[6], end[7], end[8]


@merged
def _show(world, tally, atom, lanes, lane, shine):
    """Count an atom where it is at the stated position; `shine` (line,) is room for each line's photons."""
    sky = world.light.conditions.sky
    x, y, z = lanes[START + lane], lanes[START + Y + lane], lanes[START + Z + lane]
    at = START + VELOCITY + lane
    velocity = (lanes[at], lanes[at + Y], lanes[at + Z])
    content = lanes[ALIVE + lane] * lanes[KEPT + lane]
    body = stated_body(sky.forces)
    received = sunlight_received(sky, int(lanes[ZONE + lane]), body, x, y, z)
    receding = radial_velocity(body, x, y, z, *velocity)
    tally.aloft[0] += content
    score_in_light(world, tally, x, y, z, velocity, content, received, receding, shine)

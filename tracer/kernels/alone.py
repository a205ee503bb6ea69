"""Atoms one after another, so that each one's share of a tally can be read: for few of them, as a pilot flies."""

import numpy as np

from tracer.kernels.compiling import allocating_kernel, kernel
from tracer.kernels.lanes import WIDTH
from tracer.kernels.launches import Launches
from tracer.kernels.resume import ATOM_SIZE, STEPS, Resume
from tracer.kernels.scoring import Tally
from tracer.kernels.snapshot import trace_snapshot
from tracer.kernels.tracing import trace_arcs, trace_integrated
from tracer.kernels.world import World


def trace_alone(
    world: World,
    launches: Launches,
    chosen: np.ndarray,
    start: Resume,
    resume: Resume,
    buffer: np.ndarray,
    tally: Tally,
    rng: np.random.Generator,
    most_flights: int,
    found: np.ndarray,
    costs: np.ndarray,
) -> int:
    """Trace launches one by one and return the number of their flights.

    Parameters
    ----------
    world, launches, rng
        As `tracing.trace_slice` takes them.
    chosen : ndarray of int64
        Which launches.
    start, resume : Resume
        How each begins, which is left as it is, and room to work in.
    buffer, tally : ndarray, Tally
        All that an atom leaves, in one piece and as views.
    most_flights : int
        Flights after which an atom is given up.
    found : ndarray, shape (launches, buffer.size)
        Becomes what each chosen one leaves.
    costs : ndarray, shape (launches,)
        Becomes their flights and steps.
    """
    if world.snapshot is not None:
        return _visits_alone(
            world, launches, chosen, start, resume, buffer, tally, rng, most_flights, found, costs
        )
    trace = _integrated_alone if world.integrated else _arcs_alone
    return trace(world, launches, chosen, start, resume, buffer, tally, rng, most_flights, found, costs)


@allocating_kernel
def _integrated_alone(world, launches, chosen, start, resume, buffer, tally, rng, most_flights, found, costs):
    total = 0
    for i in chosen:
        _begin(start, resume, buffer)
        flights = trace_integrated(world, _only(launches, i), resume, tally, rng, most_flights)
        _end(resume, buffer, flights, i, found, costs)
        total += flights
    return total


@allocating_kernel
def _arcs_alone(world, launches, chosen, start, resume, buffer, tally, rng, most_flights, found, costs):
    total = 0
    for i in chosen:
        _begin(start, resume, buffer)
        flights = trace_arcs(world, _only(launches, i), resume, tally, rng, most_flights)
        _end(resume, buffer, flights, i, found, costs)
        total += flights
    return total


def _visits_alone(world, launches, chosen, start, resume, buffer, tally, rng, most_flights, found, costs):
    total = 0
    for i in chosen:
        _begin(start, resume, buffer)
        one = Launches(*(array[i : i + 1] for array in launches))
        flights = trace_snapshot(world, one, resume, tally, rng, most_flights)
        _end(resume, buffer, flights, i, found, costs)
        total += flights
    return total


@allocating_kernel
def _only(launches, i):
    return Launches(
        launches.positions[i : i + 1], launches.velocities[i : i + 1], launches.weights[i : i + 1]
    )


@kernel
def _begin(start, resume, buffer):
    for k in range(buffer.shape[0]):
        buffer[k] = 0.0
    for k in range(resume.counters.shape[0]):
        resume.counters[k] = start.counters[k]
    for k in range(resume.lanes.shape[0]):
        resume.lanes[k] = start.lanes[k]
    for k in range(ATOM_SIZE):
        resume.atom[k] = start.atom[k]
        for lane in range(WIDTH):
            resume.atoms[lane, k] = start.atoms[lane, k]


@kernel
def _end(resume, buffer, flights, i, found, costs):
    """Keep what an atom left and cost."""
    for k in range(buffer.shape[0]):
        found[i, k] = buffer[k]
    costs[i] = flights + float(resume.counters[STEPS])

"""The package's own kernels, timed on their thread."""

from time import thread_time

import numba
import numpy as np
from case import Case, Floats

from tracer.engine.batches import Work
from tracer.kernels.endings import FLYING
from tracer.kernels.integrated_flight import (
    HAZARDS,
    PLACE,
    TIME,
    TRIALS,
    advance,
    new_curve,
    new_flight,
    start_flight,
)
from tracer.kernels.launches import Launches
from tracer.kernels.resume import ENDED, STEPS, new_resume
from tracer.kernels.tracing import trace_slice
from tracer.tally.buffer import tally_views


@numba.njit(error_model="numpy")
def _ends(conditions, tolerance, time_limit, states, flight, curve, ends):
    steps, trials = 0, 0.0
    for i in range(states.shape[0]):
        s = states[i]
        start_flight(flight, conditions, tolerance, s[0], s[1], s[2], s[3], s[4], s[5])
        standing = FLYING
        while standing == FLYING:
            standing = advance(flight, curve, conditions, tolerance, time_limit)
            steps += 1
        trials += flight[TRIALS]
        ends[i, 0] = standing
        ends[i, 1] = flight[TIME]
        ends[i, 2:5] = flight[PLACE : PLACE + 3]
        ends[i, 5] = np.exp(-flight[HAZARDS] - flight[HAZARDS + 1])
    return steps, trials


def kernel_ends(case: Case, tolerance: float, count: int) -> tuple[float, int, float, Floats]:
    """Return (seconds, steps, trial steps, ends) of the integrated kernel alone; `ends` as flight.c writes them."""
    world = case.work.world
    ends = np.zeros((count, 6))
    begin = thread_time()
    steps, trials = _ends(
        world.light.conditions,
        tolerance,
        world.motion.age_limit,
        case.states[:count],
        new_flight(),
        new_curve(),
        ends,
    )
    return thread_time() - begin, steps, trials, ends


def traced(work: Work, launches: Launches) -> tuple[float, int]:
    """Return (seconds, steps) of `trace_slice` over all launches, with all that it counts."""
    buffer = np.empty(work.layout.size)
    # Touches the memory, which the C program reuses from round to round.
    buffer.fill(0.0)
    tally = tally_views(work.layout, buffer)
    resume = new_resume(len(work.scene.lines))
    count = len(launches.positions)
    rng = np.random.default_rng(1)
    begin = thread_time()
    trace_slice(work.world, launches, resume, tally, rng, count)
    spent = thread_time() - begin
    assert resume.counters[ENDED] == count
    return spent, int(resume.counters[STEPS])

"""One batch of one release: launched, traced in slices, counted."""

from collections.abc import Callable
from time import thread_time
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.engine.kernel_world import kernel_world, world_of_release
from tracer.engine.launching import draw_launches, make_launches
from tracer.engine.responses import ResponseWork, response_work, trace_responses
from tracer.engine.scene import Scene
from tracer.errors import Interrupted
from tracer.kernels.launches import Launches
from tracer.kernels.resume import AGE, ENDED, STEPS, UNDER_WAY, Resume, new_resume
from tracer.kernels.scoring import Tally
from tracer.kernels.tracing import trace_slice
from tracer.kernels.world import World
from tracer.physics.release.even_numbers import EvenNumbers
from tracer.physics.release.strata import Strata, draw, one_stratum
from tracer.tally.buffer import BufferLayout, make_layout, tally_views

SLICE_SECONDS = 0.1
"""What a slice aims at: half of the longest time for which Ctrl-C and the progress may have to wait."""

FIRST_SLICE_FLIGHTS = 2_000

BLOCK = 20_000
"""Launches drawn at a time: the memory of a batch, and the wait for Ctrl-C, must not grow with its particles."""

MOST_SLICE_GROWTH = 4.0


class Task(NamedTuple):
    """A unit of work: batch number `batch` of release number `release`, both from 0."""

    release: int
    batch: int


class BatchResult(NamedTuple):
    """What a batch counted, shape (layout.size,), and what it cost.

    `flights`, integration `steps` and `kernel_seconds` of processor time.
    """

    buffer: NDArray[np.float64]
    flights: int
    steps: int
    kernel_seconds: float


class Work(NamedTuple):
    """All that a worker needs to trace any batch of a run.

    `strata` holds each release's; without them a batch is one stratum. `stratified` False draws independent launches
    instead, which only measures what the strata gain. `responses` is None where none are kept by bins of speed.
    """

    scene: Scene
    world: World
    layout: BufferLayout
    seed: int
    particles: int
    strata: tuple[Strata, ...] = ()
    stratified: bool = True
    responses: ResponseWork | None = None

    @property
    def launches(self) -> int:
        """New atoms in a batch of one release, those by bins of speed as well."""
        return self.particles + (0 if self.responses is None else self.responses.launches)


def make_work(scene: Scene, seed: int, particles: int) -> Work:
    """Return the work of a run with `particles` per batch and release."""
    layout = make_layout(
        scene.grid,
        scene.planes,
        len(scene.lines),
        adsorbing=scene.desorption is not None,
        speed_bins=scene.speed_bins,
        hosted=scene.moon is not None,
    )
    responses = response_work(scene, particles)
    return Work(scene, kernel_world(scene), layout, seed, particles, responses=responses)


def trace_batch(
    work: Work, task: Task, tell: Callable[[float, int], None], stopped: Callable[[], bool]
) -> BatchResult:
    """Trace one batch in slices.

    Parameters
    ----------
    work, task
        What to trace. Random numbers depend on seed, release and batch alone.
    tell : callable
        Called after each slice with how many atoms and flights it has finished; an atom under way counts by its age
        over the age limit, so that a life of many slices shows.
    stopped : callable
        Asked after each slice; where it says True the batch is given up.

    Raises
    ------
    Interrupted
        Where `stopped` said True before the batch ended.
    """
    seeds = np.random.SeedSequence(work.seed, spawn_key=(task.release, task.batch))
    rng = np.random.Generator(np.random.PCG64(seeds))
    release = work.scene.releases[task.release]
    buffer = np.zeros(work.layout.size)
    tally = tally_views(work.layout, buffer)
    world = world_of_release(work.world, release)
    supply = EvenNumbers(rng, work.stratified)
    strata = work.strata[task.release] if work.strata else one_stratum(work.particles)
    slices = _Slices(work.scene, tell, stopped)
    for first in range(0, work.particles, BLOCK):
        u, weights = draw(strata, supply, first, min(BLOCK, work.particles - first))
        weights *= release.rate
        slices.fly(world, make_launches(work.scene, release, u, weights), tally, rng)
    if work.responses is not None:
        seed = (work.seed, task.release, task.batch)
        trace_responses(work.scene, work.responses, work.layout, buffer, seed, slices.fly)
    return BatchResult(buffer, slices.flights, slices.steps, slices.seconds)


class _Slices:
    """Flies launches slice by slice and adds up what that costs."""

    def __init__(self, scene: Scene, tell: Callable[[float, int], None], stopped: Callable[[], bool]) -> None:
        self.flights = 0
        self.steps = 0
        self.seconds = 0.0
        self._budget = FIRST_SLICE_FLIGHTS
        self._scene = scene
        self._tell = tell
        self._stopped = stopped

    def fly(self, world: World, launches: Launches, tally: Tally, rng: np.random.Generator) -> None:
        """Trace `launches` to their ends into `tally`."""
        resume = new_resume(len(self._scene.lines))
        followed = 0.0
        while resume.counters[ENDED] < len(launches.weights):
            begin = thread_time()
            made = trace_slice(world, launches, resume, tally, rng, self._budget)
            spent = thread_time() - begin
            self.flights += made
            self.seconds += spent
            # A slice that ended because all atoms had says nothing of how many flights it could have made.
            if made == self._budget or spent > SLICE_SECONDS:
                self._budget = next_budget(made, spent)
            before, followed = followed, _followed(resume, self._scene)
            self._tell(followed - before, made)
            if self._stopped():
                raise Interrupted("interrupted")
        self.steps += int(resume.counters[STEPS])


def _followed(resume: Resume, scene: Scene) -> float:
    """Return the atoms followed so far: those that have ended, and of each under way the share of its longest life.

    About a moving body an atom flies several times, and no share is counted.
    """
    if scene.event_window is not None:
        return float(resume.counters[ENDED])
    ages = (resume.atoms[:, UNDER_WAY] * resume.atoms[:, AGE]).sum()
    return float(resume.counters[ENDED] + ages / scene.age_limit)


def next_budget(budget: int, spent: float) -> int:
    """Return the flights of the next slice after one of `budget` flights took `spent` seconds."""
    growth = SLICE_SECONDS / max(spent, 1e-6)
    return max(1, int(budget * min(growth, MOST_SLICE_GROWTH)))


def compile_kernels(work: Work) -> None:
    """Compile or load what `trace_batch` calls, without flying an atom, so that workers start together."""
    rng = np.random.default_rng(0)
    # Each law has kernels of its own.
    for release in work.scene.releases:
        launches = draw_launches(work.scene, release, 1, rng, 1.0)
    tally = tally_views(work.layout, np.zeros(work.layout.size))
    trace_slice(work.world, launches, new_resume(len(work.scene.lines)), tally, rng, 0)

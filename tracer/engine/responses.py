"""Responses by bins of launch speed: what atoms launched in each bin leave in images and vertical columns.

Beside the launches of the run's own laws, which stay what they are, a batch holds as many again that are spread over
the bins: in each, half by a density of speed that rises through the bin and half by one that falls (`Ramp`). All else
is as the release has it. Their sums are those of unit rates of launch, so that any law of speed can be put together
from them afterwards.
"""

from collections.abc import Callable
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.engine.kernel_world import kernel_world, world_of_release
from tracer.engine.launching import make_launches
from tracer.engine.scene import Release, Scene
from tracer.fate import Fate
from tracer.kernels.launches import Launches
from tracer.kernels.scoring import Tally
from tracer.kernels.temperature import temperatures
from tracer.kernels.world import World
from tracer.physics.release.even_numbers import DIMENSIONS, PLACE, SPEED, TURN, EvenNumbers
from tracer.physics.release.speed.ramp import Ramp
from tracer.physics.release.speed_bins import speed_bin_edges
from tracer.physics.release.strata import Boxes, Strata, draw, shared_out
from tracer.physics.thermal import escape_speed
from tracer.tally.axes import Grid
from tracer.tally.buffer import BufferLayout, make_layout, response_views, tally_views

Floats = NDArray[np.float64]

TRIAL_SPEEDS = 4_096
TRIAL_SEED = 20310601
"""Of the speeds by which bins are laid out: whatever they are, responses are unbiased."""

FASTEST_SHARE = 1e-3
FASTER = 1.5
"""Bins reach this much beyond the speed that this share of a law's launches exceeds."""

EVEN_SHARE = 0.5
"""Share of the launches that goes evenly to all bins; the rest goes by the release's own law."""

LEAST_PER_BIN = 4

BLOCK = 20_000
"""Launches drawn at a time."""

STREAM = 1
"""Last part of the spawn key of a batch's second generator: the first goes to the run's own launches."""

Fly = Callable[[World, Launches, Tally, np.random.Generator], None]


class ResponseWork(NamedTuple):
    """What a worker needs beside `Work`: `edges` (bins + 1,) [m s-1] and how many launches each bin gets in a batch.

    `counts` (release, 2 bins) has the falling and the rising half of each bin in turn; `world` and `layout` are the
    run's with one layer of altitude and images not resolved by velocity, since neither is kept by bins.
    """

    edges: Floats
    counts: NDArray[np.int64]
    world: World
    layout: BufferLayout

    @property
    def launches(self) -> int:
        """Launches in a batch of one release."""
        return int(self.counts[0].sum())


def response_work(scene: Scene, particles: int) -> ResponseWork | None:
    """Return what responses of a run with `particles` per batch need; None where none are kept."""
    bins = scene.speed_bins
    if not bins:
        return None
    speeds = [_own_speeds(scene, release) for release in scene.releases]
    edges = _edges(scene, speeds)
    launches = max(particles, LEAST_PER_BIN * bins)
    counts = [_counts(edges, one, launches) for one in speeds]
    # Without velocities, for which the layout has no room: kernels write where the world says, and check no bounds.
    planes = tuple(plane._replace(velocity_edges=None) for plane in scene.planes)
    flat = scene._replace(grid=_one_layer(scene.grid), planes=planes)
    layout = make_layout(
        flat.grid, (), len(scene.lines), scene.desorption is not None, hosted=scene.moon is not None
    )
    return ResponseWork(edges, np.array(counts), kernel_world(flat), layout)


def trace_responses(
    scene: Scene,
    work: ResponseWork,
    layout: BufferLayout,
    buffer: Floats,
    seeds: tuple[int, int, int],
    fly: Fly,
) -> None:
    """Fly one batch's launches by bins and put what they leave into its `buffer`, laid out as `layout` says.

    `seeds` are the run's seed, the number of the release and that of the batch; `fly` traces launches into a tally.
    """
    seed, number, batch = seeds
    release = scene.releases[number]
    sequence = np.random.SeedSequence(seed, spawn_key=(number, batch, STREAM))
    rng = np.random.Generator(np.random.PCG64(sequence))
    supply = EvenNumbers(rng)
    strata = _strata(work.counts[number])
    world = world_of_release(work.world, release)
    found = response_views(layout, buffer)
    assert found is not None
    own = tally_views(layout, buffer)
    rest = np.zeros(work.layout.size)
    ends = np.cumsum(strata.counts)
    for first in range(0, work.launches, BLOCK):
        count = min(BLOCK, work.launches - first)
        place = np.searchsorted(ends, np.arange(first, first + count), side="right")
        at, half = np.divmod(place, 2)
        u, shares = draw(strata, supply, first, count)
        law = Ramp(work.edges[at], work.edges[at + 1], half == 1)
        launches = make_launches(scene, release._replace(speed=law), u, shares)
        cuts = [0, *(np.flatnonzero(np.diff(place)) + 1), count]
        for start, stop in pairwise(cuts):
            rest[:] = 0.0
            key = at[start], half[start]
            tally = tally_views(work.layout, rest)._replace(
                column_content=found.column_content[key],
                pixels=found.pixels[key],
            )
            fly(world, Launches(*(array[start:stop] for array in launches)), tally, rng)
            # Whoever reads the budget must learn of it.
            own.ledger[Fate.UNRESOLVED] += tally.ledger[Fate.UNRESOLVED]
    for field in found:
        falling, rising = field[:, 0].copy(), field[:, 1].copy()
        field[:, 0] = 0.5 * (rising + falling)
        field[:, 1] = 0.5 * (rising - falling)


def _strata(counts: NDArray[np.int64]) -> Strata:
    """Return strata that are the whole cube each: they tell launches of one bin from those of another, no more."""
    shape = (len(counts), DIMENSIONS)
    return Strata(Boxes(np.zeros(shape), np.ones(shape)), counts)


def _own_speeds(scene: Scene, release: Release) -> Floats:
    """Return speeds [m s-1] of the release's own law, rising."""
    u = EvenNumbers(np.random.default_rng(TRIAL_SEED)).points(np.arange(TRIAL_SPEEDS))
    law = scene.surface_temperature
    kelvin = np.full(len(u), np.nan)
    if law is not None:
        kelvin = temperatures(law, np.ascontiguousarray(release.place.places(u[:, [PLACE, TURN]])))
    return np.sort(release.speed.speeds(u[:, SPEED], kelvin, scene.mass))


def _edges(scene: Scene, speeds: list[Floats]) -> Floats:
    last = round((1.0 - FASTEST_SHARE) * TRIAL_SPEEDS)
    return speed_bin_edges(
        scene.speed_bins,
        escape_speed(scene.body.gm, scene.body.radius),
        min(float(one[len(one) // 2]) for one in speeds),
        FASTER * max(float(one[last]) for one in speeds),
    )


def _counts(edges: Floats, speeds: Floats, launches: int) -> NDArray[np.int64]:
    bins = len(edges) - 1
    own = np.histogram(speeds, edges)[0] / len(speeds)
    own[-1] += 1.0 - own.sum()
    shares = EVEN_SHARE / bins + (1.0 - EVEN_SHARE) * own
    return np.repeat(shared_out(launches // 2, shares / shares.sum()), 2)


def _one_layer(grid: Grid) -> Grid:
    return grid._replace(altitude_edges=grid.altitude_edges[[0, -1]])

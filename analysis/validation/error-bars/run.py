"""Standard errors and replicates against the scatter among 40 seeds, repeated ten times."""

import sys

import numpy as np

from tracer.engine.batches import Task, Work, make_work, trace_batch
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.tally.buffer import tally_views
from tracer.tally.statistics import BatchStatistics

RUN = """
title = "error bars"
[body]
name = "Moon"
rotation_period = "1 d"
[gas]
species = "Ar"
[[gas.loss]]
name = "photons"
rate = "1e-4 s-1"
[[release]]
name = "thermal"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
[surface]
temperature = { law = "uniform", value = "500 K" }
sticking = 0.05
[grid]
altitude = { first_cell = "50 km", top = "400 km", cells = 4 }
latitude_cells = 6
local_time_cells = 8
"""
REPEATS, SEEDS, BATCHES, PARTICLES = 10, 40, 20, 100


def one_run(work: Work) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return mean and standard error of each cell's content, and the replicates of its sums over altitude."""
    statistics = BatchStatistics(work.layout, BATCHES)
    for batch in range(BATCHES):
        statistics.fold(
            trace_batch(work, Task(0, batch), lambda _atoms, _flights: None, lambda: False).buffer
        )
    whole = np.zeros(work.layout.size)
    sums = []
    for row in statistics.replicate_means():
        whole[: work.layout.replicated_size] = row
        sums.append(tally_views(work.layout, whole).content.sum(axis=0))
    mean, error = (
        tally_views(work.layout, flat).content for flat in (statistics.mean, statistics.standard_error())
    )
    return mean, error, np.array(sums)


def ratios(seeds: range) -> tuple[float, float, float]:
    """Return variance among seeds over its estimates: cells, sums by replicates, sums by cells' errors."""
    work = make_work(build_scene(parse_run(RUN, "run file")), 0, PARTICLES)
    mean, error, sums = (
        np.array(part) for part in zip(*(one_run(work._replace(seed=s)) for s in seeds), strict=True)
    )
    well_hit = (mean > 5.0 * error).mean(axis=0) > 0.9
    cells = mean.var(axis=0, ddof=1) / (error**2).mean(axis=0)
    of_sums = mean.sum(axis=1).var(axis=0, ddof=1)
    by_replicates = sums.var(axis=1, ddof=1).mean(axis=0) / BATCHES
    blindly = (error**2).sum(axis=1).mean(axis=0)
    return cells[well_hit].mean(), (of_sums / by_replicates).mean(), (of_sums / blindly).mean()


def main() -> int:
    """Print the ratios of each repeat and return 0 where their means hold."""
    print(f"{'seeds':>10s} {'cells':>8s} {'sums, replicates':>17s} {'sums, blindly':>14s}")
    rows = []
    for repeat in range(REPEATS):
        seeds = range(repeat * SEEDS, (repeat + 1) * SEEDS)
        rows.append(ratios(seeds))
        print(f"{seeds[0]:5d}-{seeds[-1]:4d} {rows[-1][0]:8.3f} {rows[-1][1]:17.3f} {rows[-1][2]:14.3f}")
    mean = np.mean(rows, axis=0)
    print(f"{'mean':>10s} {mean[0]:8.3f} {mean[1]:17.3f} {mean[2]:14.3f}")
    fine = 0.9 < mean[0] < 1.1 and 0.9 < mean[1] < 1.1 and not 0.9 < mean[2] < 1.1
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())

"""Standard errors say how far runs with other seeds lie apart, for cells and, by the replicates, for sums of cells."""

from typing import NamedTuple

import numpy as np
import pytest

from tracer.engine.batches import Task, make_work, trace_batch
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
SEEDS, BATCHES, PARTICLES = 40, 20, 100


class Ensemble(NamedTuple):
    """Per seed: mean and standard error of the content of each cell, and its replicates."""

    mean: np.ndarray
    error: np.ndarray
    replicates: np.ndarray


@pytest.fixture(scope="module")
def ensemble() -> Ensemble:
    work = make_work(build_scene(parse_run(RUN, "run file")), 0, PARTICLES)
    runs = [_statistics(work._replace(seed=seed)) for seed in range(SEEDS)]
    return Ensemble(
        np.array([tally_views(work.layout, one.mean).content for one in runs]),
        np.array([tally_views(work.layout, one.standard_error()).content for one in runs]),
        np.array([[_content(work.layout, row) for row in one.replicate_means()] for one in runs]),
    )


def _statistics(work) -> BatchStatistics:
    statistics = BatchStatistics(work.layout, BATCHES)
    for batch in range(BATCHES):
        result = trace_batch(work, Task(0, batch), lambda _atoms, _flights: None, lambda: False)
        statistics.fold(result.buffer)
    return statistics


def _content(layout, row: np.ndarray) -> np.ndarray:
    whole = np.zeros(layout.size)
    whole[: layout.replicated_size] = row
    return tally_views(layout, whole).content


def test_seeds_scatter_as_the_standard_errors_of_cells_say(ensemble):
    well_hit = (ensemble.mean > 5.0 * ensemble.error).mean(axis=0) > 0.9
    assert well_hit.sum() > 100
    ratio = ensemble.mean.var(axis=0, ddof=1) / (ensemble.error**2).mean(axis=0)
    # A cell's ratio scatters by sqrt(2/39) = 0.23; over more than 100 cells, of which neighbours move together, the
    # mean scatters by 0.04 (analysis/validation/error-bars): 0.9 and 1.1 are 2.5 standard errors, false alarm 1e-2.
    assert 0.9 < ratio[well_hit].mean() < 1.1


def test_replicates_give_the_scatter_of_sums_where_cells_errors_do_not(ensemble):
    # Sums along the altitude over each place on the ground: an atom flies through several of these cells.
    variance = ensemble.mean.sum(axis=1).var(axis=0, ddof=1)
    by_replicates = ensemble.replicates.sum(axis=2).var(axis=1, ddof=1).mean(axis=0) / BATCHES
    blindly = (ensemble.error**2).sum(axis=1).mean(axis=0)
    # 48 sums: the mean ratio scatters by about 0.04, false alarm about 1e-2 (neighbours move together) for 0.9-1.1.
    assert 0.9 < (variance / by_replicates).mean() < 1.1
    assert not 0.9 < (variance / blindly).mean() < 1.1


def test_replicates_of_single_cells_agree_with_their_standard_errors(ensemble):
    # With as many replicates as batches both are the same numbers.
    by_replicates = ensemble.replicates.std(axis=1, ddof=1) / np.sqrt(BATCHES)
    hit = ensemble.mean > 0.0
    np.testing.assert_allclose(by_replicates[hit], ensemble.error[hit], rtol=1e-9)

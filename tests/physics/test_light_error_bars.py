"""Standard errors of columns and brightnesses say how far runs with other seeds lie apart."""

from typing import NamedTuple

import numpy as np
import pytest

from tracer.engine.batches import Task, make_work, trace_batch
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.tally.buffer import tally_views
from tracer.tally.normalizing import product_fields
from tracer.tally.statistics import BatchStatistics

RUN = """
title = "error bars in sunlight"
[body]
name = "Harrow"
radius = "1800 km"
gm = "9500 km3 s-2"
[sun]
distance = "0.4 au"
radial_velocity = "8 km/s"
[gas]
species = "Na"
[[release]]
name = "photon desorption"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "1500 K" }
place = { law = "cosine-power", toward = "sun", power = 1 }
[surface]
temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }
sticking = 0.5
[domain]
outer_radius = "10 radii"
[grid]
altitude = { cells = 1 }
latitude_cells = 1
local_time_cells = 1
[[image]]
name = "dawn"
look_from = "dawn"
horizontal = ["-1.5 radii", "1.5 radii"]
vertical = ["-1.5 radii", "1.5 radii"]
pixels = [12, 12]
"""
SEEDS, BATCHES, PARTICLES = 120, 10, 200


class Ensemble(NamedTuple):
    """Per seed: mean and standard error of each pixel, and its replicates, of one variable."""

    mean: np.ndarray
    error: np.ndarray
    replicates: np.ndarray


@pytest.fixture(scope="module")
def ensembles() -> dict[str, Ensemble]:
    scene = build_scene(parse_run(RUN, "run file"))
    work = make_work(scene, 0, PARTICLES)

    def fields(buffer):
        views = tally_views(work.layout, buffer)
        found = product_fields(views, scene.grid, scene.planes, scene.releases[0].rate)
        return {field.name: field.values * field.scale for field in found if field.name.endswith("_dawn")}

    def replicates(row):
        whole = np.zeros(work.layout.size)
        whole[: work.layout.replicated_size] = row
        return fields(whole)

    runs = [_statistics(work._replace(seed=seed)) for seed in range(SEEDS)]
    means = [fields(one.mean) for one in runs]
    errors = [fields(one.standard_error()) for one in runs]
    kept = [[replicates(row) for row in one.replicate_means()] for one in runs]
    return {
        name: Ensemble(
            np.array([one[name] for one in means]),
            np.array([one[name] for one in errors]),
            np.array([[row[name] for row in rows] for rows in kept]),
        )
        for name in ("column_dawn", "brightness_dawn")
    }


def _statistics(work) -> BatchStatistics:
    statistics = BatchStatistics(work.layout, BATCHES)
    for batch in range(BATCHES):
        result = trace_batch(work, Task(0, batch), lambda _atoms, _flights: None, lambda: False)
        statistics.fold(result.buffer)
    return statistics


@pytest.mark.parametrize("name", ["column_dawn", "brightness_dawn"])
def test_seeds_scatter_as_the_standard_errors_of_pixels_say(ensembles, name):
    ensemble = ensembles[name]
    well_hit = (ensemble.mean > 4.0 * ensemble.error).mean(axis=0) > 0.9
    assert well_hit.sum() > 30
    ratio = ensemble.mean.var(axis=0, ddof=1) / (ensemble.error**2).mean(axis=0)
    # A pixel's ratio scatters by sqrt(2/119) = 0.13; the mean over these pixels, of which neighbours move together, by
    # 0.023, from 0.04 measured over 51 sets of 40 seeds: four of these are let off, false alarm 6e-5.
    assert 0.9 < ratio[well_hit].mean() < 1.1


@pytest.mark.parametrize("name", ["column_dawn", "brightness_dawn"])
def test_replicates_of_single_pixels_agree_with_their_standard_errors(ensembles, name):
    # With as many replicates as batches both are the same numbers.
    ensemble = ensembles[name]
    by_replicates = ensemble.replicates.std(axis=1, ddof=1) / np.sqrt(BATCHES)
    hit = ensemble.mean > 0.0
    np.testing.assert_allclose(by_replicates[hit], ensemble.error[hit], rtol=1e-9)


def test_replicates_give_the_scatter_of_both_lines_together_where_their_errors_do_not(ensembles):
    # The same atoms shine in D2 and D1: their errors add up, their squares do not.
    ensemble = ensembles["brightness_dawn"]
    well_hit = (ensemble.mean > 4.0 * ensemble.error).mean(axis=0).min(axis=0) > 0.9
    variance = ensemble.mean.sum(axis=1).var(axis=0, ddof=1)
    by_replicates = ensemble.replicates.sum(axis=2).var(axis=1, ddof=1).mean(axis=0) / BATCHES
    blindly = (ensemble.error**2).sum(axis=1).mean(axis=0)
    # The mean ratio scatters by 0.023, as above.
    assert 0.9 < (variance / by_replicates)[well_hit].mean() < 1.1
    assert (variance / blindly)[well_hit].mean() > 1.4

"""Even, far and independent launches give the same product within its errors: samples differ, not what they mean."""

from typing import NamedTuple

import numpy as np
import pytest

import tracer.engine.batches as batches
from tracer.engine.batches import Task, make_work, trace_batch
from tracer.engine.emphasis import with_emphasis
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.fate import Fate
from tracer.physics.release.strata import draw
from tracer.tally.buffer import tally_views
from tracer.tally.normalizing import product_fields
from tracer.tally.statistics import BatchStatistics

BATCHES, PARTICLES = 60, 500
SAMPLINGS = ("independent", "even", "far")
RATES = (2e24, 5e23)
"""Of the small runs' releases."""


class Field(NamedTuple):
    mean: np.ndarray
    error: np.ndarray
    hits: np.ndarray
    """In how many batches each number is not 0."""


def traced(text: str, release: int, sampling: str) -> dict[str, Field]:
    scene = build_scene(parse_run(text, "run file"))
    scene = scene._replace(emphasis="far" if sampling == "far" else "even")
    work = with_emphasis(make_work(scene, 8, PARTICLES))._replace(stratified=sampling != "independent")
    statistics = BatchStatistics(work.layout, 0)
    hits = np.zeros(work.layout.size)
    for batch in range(BATCHES):
        buffer = trace_batch(work, Task(release, batch), lambda _a, _f: None, lambda: False).buffer
        statistics.fold(buffer)
        hits += buffer > 0.0

    def fields(buffer):
        views = tally_views(work.layout, buffer)
        rate = scene.releases[release].rate
        return {f.name: f.values * f.scale for f in product_fields(views, scene.grid, scene.planes, rate)}

    means, errors = fields(statistics.mean), fields(statistics.standard_error())
    scales = fields(np.ones(work.layout.size))
    counted = fields(hits)
    return {name: Field(means[name], errors[name], counted[name] / scales[name]) for name in means}


@pytest.fixture(scope="module")
def texts(small_run_file, small_light_run_file) -> dict[str, tuple[str, int]]:
    """Return run files and the release of each that is looked at."""
    gravity = small_run_file.read_text(encoding="utf-8")
    surface_speeds = gravity.replace('temperature = "3500 K"', 'temperature = "surface"')
    surface_speeds = surface_speeds.replace('subsolar = "600 K"', 'subsolar = "2500 K"')
    return {
        "gravity": (gravity, 0),
        "sunlight": (small_light_run_file.read_text(encoding="utf-8"), 1),
        "surface speeds": (surface_speeds, 0),
    }


@pytest.fixture(scope="module", params=["gravity", "sunlight", "surface speeds"])
def samplings(request, texts) -> dict[str, dict[str, Field]]:
    return {sampling: traced(*texts[request.param], sampling) for sampling in SAMPLINGS}


@pytest.mark.parametrize("sampling", ["even", "far"])
def test_all_fields_agree_with_those_of_independent_launches(samplings, sampling):
    ours, theirs = samplings[sampling], samplings["independent"]
    deviations = []
    for name, field in ours.items():
        other = theirs[name]
        # The mean of fewer, or very uneven, numbers is not normal.
        known = (field.hits > 0.9 * BATCHES) & (other.hits > 0.9 * BATCHES)
        error = np.hypot(field.error, other.error)
        # Stratified places of release leave no scatter but rounding.
        floor = 1e-12 * np.abs(field.mean)
        deviations.append(((field.mean - other.mean) / np.maximum(error, floor))[known])
    found = np.concatenate([one.ravel() for one in deviations])
    assert len(found) > 150
    # Up to 500 numbers, of which many move together: 4.5 of Student's t of 60 degrees of freedom, false alarm 2e-2.
    assert np.abs(found).max() < 4.5
    # The mean square of 150 independent numbers scatters by 0.12; neighbours move together.
    assert 0.6 < np.mean(found**2) < 1.5


@pytest.mark.parametrize("sampling", SAMPLINGS)
def test_weights_sum_to_the_rate_and_the_ledger_closes(samplings, sampling):
    total = samplings[sampling]["ledger"].mean.sum()
    rate = min(RATES, key=lambda one: abs(total - one))
    assert total == pytest.approx(rate, rel=1e-12)


def test_emphasis_on_far_pays_where_escape_is_rare(samplings):
    # In gravity and from a hot ground about every tenth atom escapes or fewer; sputtered ones nearly all do.
    escaped = {sampling: fields["ledger"].error[Fate.ESCAPED] for sampling, fields in samplings.items()}
    assert escaped["even"] < escaped["independent"]
    assert escaped["far"] < escaped["independent"]


def test_wrong_weights_would_show(texts, monkeypatch):
    def unweighted(strata, supply, first, count):
        u, shares = draw(strata, supply, first, count)
        return u, np.full_like(shares, 1.0 / PARTICLES)

    right = traced(*texts["gravity"], "far")["ledger"]
    monkeypatch.setattr(batches, "draw", unweighted)
    wrong = traced(*texts["gravity"], "far")["ledger"]
    assert wrong.mean.sum() == pytest.approx(right.mean.sum(), rel=1e-12)
    deviation = np.abs(wrong.mean - right.mean) / np.hypot(wrong.error, right.error)
    assert deviation[Fate.ESCAPED] > 30.0

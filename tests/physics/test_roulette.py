"""Survival weights and roulette against analog atoms, whole or gone, field by field."""

import numpy as np
import pytest

from tracer.engine.batches import Task, Work, make_work, trace_batch
from tracer.engine.launching import draw_launches
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run
from tracer.fate import Fate
from tracer.kernels.launches import Launches
from tracer.kernels.resume import new_resume
from tracer.kernels.roulette import ANALOG, OFF, WEIGHTED, Roulette, play_roulette
from tracer.kernels.tracing import trace_slice
from tracer.tally.buffer import tally_views

RUN = """
title = "Helium over Harrow, small"
body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2", rotation_period = "4 d" }
gas = { species = "He", loss = [{ name = "loss", rate = "2e-4 s-1" }] }
domain = { outer_radius = "6 radii", age_limit = "2 d" }
grid = { altitude = { first_cell = "100 km", top = "3 radii", cells = 3 }, latitude_cells = 3, local_time_cells = 4 }
ensemble = { particles_per_batch = 100, batches = 100 }
[[release]]
name = "ground"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
[surface]
temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }
sticking = 0.02
accommodation = 0.7
"""
SUNLIT = RUN.replace("[surface]", '[sun]\ndistance = "0.1 au"\n[surface]').replace(
    'loss = [{ name = "loss", rate = "2e-4 s-1" }]', 'photoionization_rate = "2e-6 s-1"'
)

EARLY = Roulette(on_ground=0.7, aloft=0.8, gain=2.0)
"""Plays so often that it must show if it were biased."""


def work_of(text: str, roulette: Roulette) -> Work:
    work = make_work(build_scene(parse_run(text, "harrow.toml")), 7, 100)
    return work._replace(world=work.world._replace(roulette=roulette))


def traced_batches(text: str, roulette: Roulette, batches: int, first: int = 0) -> np.ndarray:
    """Return the buffers of many batches, (batches, size)."""
    work = work_of(text, roulette)
    tasks = [Task(0, first + i) for i in range(batches)]
    return np.array([trace_batch(work, task, lambda _a, _f: None, lambda: False).buffer for task in tasks])


def analog_batches(text: str, batches: int) -> np.ndarray:
    """Return the buffers of atoms that are whole until the moment, drawn beforehand, at which the loss takes them.

    The moment is put in as each atom's own age limit: no survival is ever below 1.
    """
    work = work_of(text, OFF)
    motion = work.world.motion
    limit, hazard = motion.age_limit, motion.hazard
    result = np.zeros((batches, work.layout.size))
    for batch in range(batches):
        rng = np.random.default_rng(1_000 + batch)
        tally = tally_views(work.layout, result[batch])
        release = work.scene.releases[0]
        launches = draw_launches(work.scene, release, work.particles, rng, release.rate / work.particles)
        for i, age in enumerate(rng.exponential(1.0 / hazard, work.particles)):
            own = motion._replace(hazard=0.0, age_limit=float(min(age, limit)))
            one = Launches(*(part[i : i + 1] for part in launches))
            before = tally.ledger[Fate.AGE_LIMIT]
            trace_slice(work.world._replace(motion=own), one, new_resume(0), tally, rng, 1_000_000)
            if age < limit:
                tally.ledger[Fate.OTHER_LOSS] += tally.ledger[Fate.AGE_LIMIT] - before
                tally.ledger[Fate.AGE_LIMIT] = before
    return result


def deviations(one: np.ndarray, other: np.ndarray) -> np.ndarray:
    """Return the differences of means in standard errors, where both have hit a field in most batches."""
    hit = ((one != 0.0).mean(axis=0) > 0.5) & ((other != 0.0).mean(axis=0) > 0.5)
    a, b = one[:, hit], other[:, hit]
    variance = a.var(axis=0, ddof=1) / len(a) + b.var(axis=0, ddof=1) / len(b)
    # Where nothing scatters, as the rate of release, the two must agree.
    sure = variance <= 1e-20 * a.mean(axis=0) ** 2
    np.testing.assert_allclose(a[:, sure].mean(axis=0), b[:, sure].mean(axis=0), rtol=1e-9)
    return (a.mean(axis=0) - b.mean(axis=0))[~sure] / np.sqrt(variance[~sure])


def assert_unbiased(found: np.ndarray) -> None:
    # 4.5 standard errors of 100 batches: false alarm 2e-5 a field, 2e-3 for a hundred.
    assert len(found) > 80
    assert np.abs(found).max() < 4.5


@pytest.fixture(scope="module")
def analog():
    return analog_batches(RUN, 100)


@pytest.fixture(scope="module")
def plain():
    return traced_batches(SUNLIT, OFF, 100, first=1000)


@pytest.mark.parametrize("roulette", [OFF, WEIGHTED, EARLY, ANALOG])
def test_every_field_is_that_of_analog_atoms(analog, roulette):
    assert_unbiased(deviations(traced_batches(RUN, roulette, 100), analog))


@pytest.mark.parametrize("roulette", [WEIGHTED, EARLY])
def test_roulette_within_flights_biases_nothing(plain, roulette):
    found = traced_batches(SUNLIT, roulette, 100)
    assert_unbiased(deviations(found, plain))


def test_comparison_sees_a_loss_that_is_a_quarter_faster(analog):
    faster = traced_batches(RUN.replace('"2e-4 s-1"', '"2.5e-4 s-1"'), WEIGHTED, 100)
    assert np.abs(deviations(faster, analog)).max() > 6.0


@pytest.mark.parametrize("text", [RUN, SUNLIT])
def test_balance_is_booked_and_nothing_but_chance(text):
    product = run(parse_run(text, "harrow.toml"), workers=1)
    balance, error = product.roulette_balance.item(), product.roulette_balance_standard_error.item()
    assert balance != 0.0
    # False alarm 1e-4 for 100 batches.
    assert abs(balance) < 4.0 * error
    assert product.ledger.sum().item() - balance == pytest.approx(1e24, rel=1e-9)
    assert product.roulette_balance.dims == ("release",)


def test_no_atom_is_followed_at_negligible_weight():
    # An atom that the loss takes within minutes would fly on for the whole age limit of two days.
    text = SUNLIT.replace('"2e-6 s-1"', '"2e-4 s-1"')
    fast, slow = (
        trace_batch(work_of(text, roulette), Task(0, 0), lambda _a, _f: None, lambda: False)
        for roulette in (WEIGHTED, OFF)
    )
    assert fast.steps < 0.2 * slow.steps


class Balance:
    """Stands for a tally."""

    def __init__(self) -> None:
        self.roulette = np.zeros(1)


def test_roulette_keeps_the_mean_and_books_the_difference():
    rng, tally = np.random.default_rng(3), Balance()
    play = play_roulette.py_func
    assert play(2.0, tally, 5.0, 0.1, 0.1, rng) == 0.1
    assert play(2.0, tally, 5.0, 0.3, 0.0, rng) == 0.3
    assert tally.roulette[0] == 0.0
    found = np.array([play(2.0, tally, 5.0, 0.03, 0.1, rng) for _ in range(20_000)])
    assert set(found) == {0.0, 0.2}
    # Binomial, chance 0.15.
    assert abs((found > 0.0).mean() - 0.15) < 4.0 * np.sqrt(0.15 * 0.85 / 20_000)
    assert tally.roulette[0] == pytest.approx(5.0 * (found.sum() - 0.03 * 20_000), rel=1e-9)
    assert play(2.0, tally, 5.0, 0.0, 0.1, rng) == 0.0

"""The same product to the last bit for any number of workers, order of batches and length of slices."""

import random

import numpy as np
import pytest

import tracer.engine.batches as batches
from tracer.engine.batches import Task, make_work, trace_batch
from tracer.engine.launching import draw_launches
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run
from tracer.kernels.resume import ENDED, UNDER_WAY, new_resume
from tracer.kernels.tracing import trace_slice
from tracer.tally.buffer import tally_views
from tracer.tally.statistics import BatchStatistics


def checksum(product) -> str:
    return product.attrs["data_checksum"]


@pytest.fixture(scope="module")
def spec(small_run_file):
    return load_run(small_run_file)


@pytest.mark.parametrize("workers", [2, 5])
def test_product_does_not_depend_on_the_workers(spec, small_product, workers):
    product = run(spec, workers=workers)
    assert checksum(product) == checksum(small_product)
    assert product.attrs["workers"] == workers
    assert product.attrs["flights"] == small_product.attrs["flights"]


@pytest.mark.parametrize("order", [1, 2, 3])
def test_product_does_not_depend_on_the_order_in_which_batches_end(spec, small_product, order):
    def shuffled(work, tasks, workers, tell, tick):
        results = [
            (task, trace_batch(work, task, tell, lambda: False))
            for task in random.Random(order).sample(tasks, len(tasks))
        ]
        assert [task for task, _ in results] != list(tasks)
        yield from results

    assert checksum(run(spec, executor=shuffled)) == checksum(small_product)


def test_folding_in_another_order_would_show(spec):
    # What the claim above rests on: the sums of floats do depend on the order.
    work = make_work(build_scene(spec), 1, 50)
    buffers = [trace_batch(work, Task(0, b), lambda _a, _f: None, lambda: False).buffer for b in range(5)]
    forth, back = BatchStatistics(work.layout, 0), BatchStatistics(work.layout, 0)
    for one, other in zip(buffers, reversed(buffers), strict=True):
        forth.fold(one)
        back.fold(other)
    np.testing.assert_allclose(forth.mean, back.mean, rtol=1e-12, atol=1e-12 * forth.mean.max())
    assert not np.array_equal(forth.mean, back.mean)


def test_another_seed_gives_another_product(spec, small_run_file, small_product):
    other = run(load_run(small_run_file, ["ensemble.seed=1"]), workers=1)
    assert checksum(other) != checksum(small_product)
    assert other.attrs["scene_hash"] == small_product.attrs["scene_hash"]
    assert other.attrs["run_hash"] != small_product.attrs["run_hash"]


def test_first_batches_do_not_depend_on_how_many_follow(spec):
    work = make_work(build_scene(spec), 1, 50)

    def trace(task):
        return trace_batch(work, task, lambda _a, _f: None, lambda: False).buffer

    first = trace(Task(1, 0))
    trace(Task(0, 0))
    trace(Task(1, 1))
    assert np.array_equal(trace(Task(1, 0)), first)
    assert not np.array_equal(trace(Task(1, 1)), first)
    assert not np.array_equal(trace(Task(0, 0)), first)


def _sliced(spec, budget: int) -> tuple[np.ndarray, int, int]:
    work = make_work(build_scene(spec), 20310601, 120)
    rng = np.random.default_rng(5)
    release = work.scene.releases[0]
    launches = draw_launches(work.scene, release, work.particles, rng, 1.0)
    buffer = np.zeros(work.layout.size)
    tally = tally_views(work.layout, buffer)
    resume = new_resume(0)
    flights = stops_aloft = 0
    while resume.counters[ENDED] < work.particles:
        made = trace_slice(work.world, launches, resume, tally, rng, budget)
        assert 0 < made <= budget
        flights += made
        stops_aloft += int(resume.atoms[:, UNDER_WAY].any())
    return buffer, flights, stops_aloft


def test_slices_of_any_length_count_the_same(spec):
    whole, flights, _ = _sliced(spec, 10**9)
    assert flights > 120
    for budget in (1, 7, 1000):
        buffer, made, stops_aloft = _sliced(spec, budget)
        assert np.array_equal(buffer, whole)
        assert made == flights
        # The short budgets do stop between an atom's bounces: there the state must carry over.
        assert stops_aloft > 0 or budget == 1000


def test_slow_and_fast_machines_give_the_same_batch(spec, monkeypatch):
    work = make_work(build_scene(spec), 3, 200)
    told = []

    def trace():
        told.clear()
        return trace_batch(
            work, Task(0, 0), lambda atoms, flights: told.append((atoms, flights)), lambda: False
        )

    whole = trace()
    monkeypatch.setattr(batches, "next_budget", lambda _budget, _spent: 3)
    monkeypatch.setattr(batches, "FIRST_SLICE_FLIGHTS", 5)
    sliced = trace()
    assert len(told) > 50
    assert np.array_equal(whole.buffer, sliced.buffer)
    assert sum(atoms for atoms, _ in told) == 200
    assert sum(flights for _, flights in told) == sliced.flights == whole.flights

"""Running means, standard errors and replicates against NumPy over all batches at once."""

import numpy as np
import pytest

from tracer.tally.budget import budget_gap
from tracer.tally.buffer import BufferLayout
from tracer.tally.statistics import BatchStatistics

LAYOUT = BufferLayout(((4,), (3,)), 4)


def folded(buffers: np.ndarray, replicates: int = 0) -> BatchStatistics:
    statistics = BatchStatistics(LAYOUT, replicates)
    for buffer in buffers:
        statistics.fold(buffer)
    return statistics


def some_buffers(batches: int = 23) -> np.ndarray:
    return np.random.default_rng(8).gamma(0.5, size=(batches, LAYOUT.size))


def test_mean_and_error_are_those_of_all_batches_at_once():
    buffers = some_buffers()
    statistics = folded(buffers)
    np.testing.assert_allclose(statistics.mean, buffers.mean(axis=0), rtol=1e-13)
    error = buffers.std(axis=0, ddof=1) / np.sqrt(len(buffers))
    np.testing.assert_allclose(statistics.standard_error(), error, rtol=1e-12)


def test_variance_survives_a_large_mean_and_is_never_negative():
    # The sum of squares minus the square of the sum would lose every digit here.
    buffers = 1e9 + some_buffers()
    expected = (buffers - 1e9).std(axis=0, ddof=1) / np.sqrt(len(buffers))
    np.testing.assert_allclose(folded(buffers).standard_error(), expected, rtol=1e-5)
    same = folded(np.full((50, LAYOUT.size), 0.1))
    assert np.all(same.squared_deviation >= 0.0)
    assert np.all(same.standard_error() < 1e-16)


def test_cell_that_was_never_hit_has_no_error():
    buffers = some_buffers()
    buffers[:, 2] = 0.0
    error = folded(buffers).standard_error()
    assert np.isnan(error[2])
    assert np.isfinite(np.delete(error, 2)).all()


def test_one_batch_has_no_error():
    assert np.isnan(folded(some_buffers(1)).standard_error()).all()


@pytest.mark.parametrize("batches", [20, 23])
def test_batch_counts_into_the_replicate_of_its_number(batches):
    buffers = some_buffers(batches)
    replicates = list(folded(buffers, 5).replicate_means())
    expected = [buffers[i::5, :4].mean(axis=0) for i in range(5)]
    np.testing.assert_allclose(replicates, expected, rtol=1e-13)


def test_replicates_average_to_the_mean():
    statistics = folded(some_buffers(20), 5)
    replicates = np.array(list(statistics.replicate_means()))
    np.testing.assert_allclose(replicates.mean(axis=0), statistics.mean[:4], rtol=1e-13)


@pytest.mark.parametrize(("first", "batches"), [(0, 20), (3, 5), (17, 23), (7, 2)])
def test_share_counts_into_the_replicates_of_the_whole_run(first, batches):
    buffers = some_buffers(batches)
    statistics = BatchStatistics(LAYOUT, 5, first)
    for buffer in buffers:
        statistics.fold(buffer)
    numbers = first + np.arange(batches)
    expected = [buffers[numbers % 5 == i, :4].mean(axis=0) for i in range(5) if (numbers % 5 == i).any()]
    assert statistics.groups == len(expected)
    np.testing.assert_allclose(list(statistics.replicate_means()), expected, rtol=1e-13)


def test_budget_gap_is_relative():
    assert budget_gap(10.0, np.array([4.0, 6.0])) == 0.0
    assert budget_gap(10.0, np.array([4.0, 5.9])) == pytest.approx(0.01)
    assert budget_gap(10.0, np.array([4.0, 6.1])) == pytest.approx(0.01)

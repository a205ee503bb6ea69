"""Shares put together are the whole: means, errors, groups."""

import numpy as np
import pytest

from tracer.tally.combining import Part, Replicates, combined_error, combined_mean, regrouped


def share(values: np.ndarray) -> tuple[np.ndarray, np.ndarray, int]:
    batches = len(values)
    mean = values.mean(axis=0)
    with np.errstate(invalid="ignore", divide="ignore"):
        error = np.sqrt(((values - mean) ** 2).sum(axis=0) / np.float64(batches * (batches - 1)))
    error = np.where(mean == 0.0, np.nan, error)
    return mean, error, batches


@pytest.fixture
def batches() -> np.ndarray:
    rng = np.random.default_rng(2)
    values = rng.random((30, 8)) * (rng.random((30, 8)) > 0.7) * np.logspace(-10, 20, 8)
    values[:, 3] = 0.0
    return values


@pytest.mark.parametrize("cuts", [[15], [2, 29], [1, 2, 3, 17], list(range(1, 30))])
def test_shares_of_any_length_make_the_whole(batches, cuts):
    means, errors, counts = zip(*(share(part) for part in np.split(batches, cuts)), strict=True)
    mean, error, _ = share(batches)
    np.testing.assert_allclose(combined_mean(means, counts), mean, rtol=1e-14)
    np.testing.assert_allclose(combined_error(means, errors, counts), error, rtol=1e-12)
    assert np.isnan(combined_error(means, errors, counts)[3])


def test_errors_alone_would_not_do(batches):
    # What the claim above rests on: the shares' means differ, and that scatter counts too.
    means, errors, counts = zip(*(share(part) for part in np.split(batches, [2, 29])), strict=True)
    deaf = combined_error([means[0]] * 3, errors, counts)
    assert not np.allclose(deaf[:3], combined_error(means, errors, counts)[:3], rtol=1e-3)


def test_one_batch_alone_has_no_error():
    assert np.isnan(combined_error([np.array([1.0])], [np.array([np.nan])], [1])).all()


def test_groups_of_equal_number_are_put_together_by_number():
    parts = regrouped([Replicates((2, 1)), Replicates((3, 3))], 2)
    assert parts == [[Part(0, 0, 2), Part(1, 0, 3)], [Part(0, 1, 1), Part(1, 1, 3)]]


def test_single_batches_go_where_one_run_would_have_put_them():
    # Batches 4, 5, 6 in three groups by number modulo 3, and 7, 8: of four groups one run puts 4 and 8 into the first.
    parts = regrouped([Replicates((1, 1, 1), (6, 4, 5)), Replicates((1, 1), (8, 7))], 4)
    assert parts == [
        [Part(0, 1, 1), Part(1, 0, 1)],
        [Part(0, 2, 1)],
        [Part(0, 0, 1)],
        [Part(1, 1, 1)],
    ]


def test_other_groups_go_where_batches_are_fewest():
    parts = regrouped([Replicates((5, 5, 5)), Replicates((1, 1))], 3)
    assert parts == [[Part(0, 0, 5), Part(1, 0, 1)], [Part(0, 1, 5), Part(1, 1, 1)], [Part(0, 2, 5)]]


def test_no_more_groups_are_made_than_there_are():
    assert len(regrouped([Replicates((5, 5)), Replicates((4,))], 20)) == 3
    assert regrouped([Replicates((5, 5)), Replicates(())], 20) == []

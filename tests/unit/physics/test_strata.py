"""Strata of launches: exact probabilities, whole numbers of launches, even points inside."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import kstest, uniform

from tracer.physics.release.boxes import Sample, halved, importance
from tracer.physics.release.even_numbers import SPEED, EvenNumbers
from tracer.physics.release.strata import Boxes, Strata, draw, one_stratum, shared_out


def two_halves(counts: tuple[int, int]) -> Strata:
    """Return the fastest tenth and the rest, in the coordinate that counts from the fast end."""
    low, width = np.zeros((2, 5)), np.ones((2, 5))
    low[1, SPEED], width[:, SPEED] = 0.1, (0.1, 0.9)
    return Strata(Boxes(low, width), np.array(counts))


def test_shares_of_a_stratum_are_its_probability_over_its_count():
    u, shares = draw(two_halves((300, 100)), EvenNumbers(np.random.default_rng(1)), 0, 400)
    assert shares.sum() == pytest.approx(1.0, abs=1e-14)
    np.testing.assert_allclose(shares, np.repeat([0.1 / 300, 0.9 / 100], [300, 100]))
    # u is the quantile of the speed: the fastest tenth has u above 0.9.
    assert u[:300, SPEED].min() > 0.9 > u[300:, SPEED].max()
    assert kstest(u[:300, SPEED], uniform(0.9, 0.1).cdf).pvalue > 1e-3
    assert kstest(u[300:, SPEED], uniform(0.0, 0.9).cdf).pvalue > 1e-3


def test_launches_do_not_depend_on_the_blocks_in_which_they_are_drawn():
    strata, supply = two_halves((300, 100)), EvenNumbers(np.random.default_rng(1))
    whole = draw(strata, supply, 0, 400)
    parts = [draw(strata, supply, first, count) for first, count in ((0, 299), (299, 2), (301, 99))]
    for k in range(2):
        assert np.array_equal(np.concatenate([part[k] for part in parts]), whole[k])


def test_boxes_hold_runs_of_the_sequence_that_begin_at_powers_of_two():
    random = np.random.default_rng(4)
    counts = np.array([1, 300, 5, 64, 1000, 17])
    low, width = 0.5 * random.random((2, 6, 5))
    supply = EvenNumbers(random)
    u, shares = draw(Strata(Boxes(low, width), counts), supply, 0, counts.sum())
    # Written out: the first multiple of the power of 2 that holds the box's launches, behind the box before.
    numbers, end = [], 0
    for count, size in zip(counts, (1, 512, 8, 64, 1024, 32), strict=True):
        begin = next(number for number in range(0, 8192, size) if number >= end)
        end = begin + count
        numbers.append(np.arange(begin, end))
    box = np.repeat(np.arange(6), counts)
    expected = low[box] + width[box] * supply.points(np.concatenate(numbers))
    expected[:, SPEED] = 1.0 - expected[:, SPEED]
    assert np.array_equal(u, expected)
    np.testing.assert_allclose(shares, np.prod(width, axis=1)[box] / counts[box], rtol=1e-15)


def test_independent_launches_have_the_boxes_too():
    strata = two_halves((300, 100))
    u, shares = draw(strata, EvenNumbers(np.random.default_rng(1), stratified=False), 200, 150)
    assert u[:100, SPEED].min() > 0.9 > u[100:, SPEED].max()
    np.testing.assert_allclose(shares, np.repeat([0.1 / 300, 0.9 / 100], [100, 50]))


def test_thinnest_box_has_finite_quantiles():
    low, width = np.zeros((2, 5)), np.ones((2, 5))
    low[1, SPEED], width[:, SPEED] = 1e-17, (1e-17, 1.0 - 1e-17)
    u, _ = draw(Strata(Boxes(low, width), np.array([50, 50])), EvenNumbers(np.random.default_rng(1)), 0, 100)
    assert u[:, SPEED].max() < 1.0


@given(st.integers(1, 5000), st.lists(st.floats(0.0, 1.0), min_size=1, max_size=60))
def test_counts_are_whole_at_least_one_and_sum_up(count, wanted):
    shares = np.array(wanted) + 1e-9
    shares /= shares.sum()
    if count < len(shares):
        with pytest.raises(ValueError, match="too few"):
            shared_out(count, shares)
        return
    counts = shared_out(count, shares)
    assert counts.sum() == count
    assert counts.min() >= 1
    assert np.all(np.abs(counts - 1 - shares * (count - len(shares))) <= 1.0)


def test_one_stratum_is_all_launches_alike():
    u, shares = draw(one_stratum(10), EvenNumbers(np.random.default_rng(3)), 0, 10)
    assert u.shape == (10, 5)
    np.testing.assert_array_equal(shares, 0.1)


def sample_of(score, count: int = 4000) -> tuple[Boxes, Sample]:
    points = EvenNumbers(np.random.default_rng(2)).points(np.arange(count))
    box = np.zeros(count, np.int64)
    boxes = Boxes(np.zeros((1, 5)), np.ones((1, 5)))
    return boxes, Sample(
        box, points, importance(score(points)[:, None], np.full(count, 1.0 / count)), np.ones(count)
    )


def test_boxes_are_cut_where_flights_differ_and_fill_the_cube():
    # Only launches with a high number in coordinate 1 and a low one in coordinate 4 score.
    boxes, sample = sample_of(lambda p: ((p[:, 1] > 0.75) & (p[:, 4] < 0.5)).astype(float))
    cut, wanted = halved(boxes, sample, 40)
    assert cut.probabilities.sum() == pytest.approx(1.0, abs=1e-12)
    assert wanted.sum() == pytest.approx(1.0, abs=1e-12)
    assert np.all(cut.width[:, [0, 2, 3]] == 1.0)
    inside = (cut.low[:, 1] >= 0.75) & (cut.low[:, 4] + cut.width[:, 4] <= 0.5)
    assert cut.probabilities[inside].sum() == pytest.approx(0.125)
    assert wanted[inside].sum() > 0.8


def test_boxes_are_not_cut_where_all_flights_are_alike():
    boxes, sample = sample_of(lambda p: np.ones(len(p)))
    cut, wanted = halved(boxes, sample, 40)
    assert len(cut.low) == 1
    assert wanted.tolist() == [1.0]


def test_wanted_launches_follow_neymans_allocation():
    # Two boxes of 0.5, scores 1 and 3, costs 1 and 4: launches as 0.5 * 1/1 to 0.5 * 3/2 (Neyman 1934).
    low, width = np.zeros((2, 5)), np.ones((2, 5))
    low[1, 0], width[:, 0] = 0.5, 0.5
    box = np.repeat([0, 1], 100)
    points = np.random.default_rng(1).random((200, 5))
    sample = Sample(box, points, np.where(box == 0, 1.0, 9.0), np.where(box == 0, 1.0, 4.0))
    _, wanted = halved(Boxes(low, width), sample, 2)
    np.testing.assert_allclose(wanted, [0.4, 0.6], rtol=1e-12)

"""The even numbers behind launches: each point even, all together stratified, batches independent."""

import numpy as np
import pytest
from scipy.stats import kstest, qmc, uniform

from tracer.kernels.sobol import sobol_digits
from tracer.physics.release.even_numbers import BITS, DIMENSIONS, EvenNumbers, direction_numbers

COUNT = 4096


def points(seed: int, count: int = COUNT, stratified: bool = True) -> np.ndarray:
    return EvenNumbers(np.random.default_rng(seed), stratified).points(np.arange(count))


@pytest.mark.parametrize("place", [0, 1, 777])
def test_each_point_alone_is_even_in_every_coordinate(place):
    # The same point of 1,000 supplies. False alarm 1e-3 a coordinate.
    found = np.array([points(seed, place + 1)[place] for seed in range(1000)])
    for axis in range(DIMENSIONS):
        assert kstest(found[:, axis], uniform.cdf).pvalue > 1e-3
    # Coordinates are independent of each other: a correlation of 1,000 pairs scatters by 0.032.
    off = np.corrcoef(found.T)[~np.eye(DIMENSIONS, dtype=bool)]
    assert np.abs(off).max() < 4.0 / np.sqrt(1000)


def test_a_power_of_two_of_points_leaves_no_stratum_empty():
    found = points(1)
    for axis in range(DIMENSIONS):
        strata = np.floor(found[:, axis] * COUNT).astype(int)
        assert np.array_equal(np.sort(strata), np.arange(COUNT))
    assert not np.array_equal(
        np.sort((points(1, stratified=False)[:, 0] * COUNT).astype(int)), np.arange(COUNT)
    )


def test_means_of_supplies_scatter_less_than_those_of_independent_points():
    def means(stratified: bool) -> np.ndarray:
        # Of a function of all five coordinates that is not smooth.
        return np.array([(points(s, 1000, stratified).sum(axis=1) > 2.5).mean() for s in range(100)])

    even, random = means(True), means(False)
    # The symmetric sum of five exceeds its mean with probability 1/2: four standard errors of 100 means.
    assert abs(even.mean() - 0.5) < 4.0 * even.std(ddof=1) / 10.0
    assert abs(random.mean() - 0.5) < 4.0 * random.std(ddof=1) / 10.0
    # A binomial share of 1,000 independent points has the variance 0.25/1000; a variance of 100 means scatters by 14 %.
    assert random.var(ddof=1) == pytest.approx(0.25 / 1000, rel=0.56)
    assert even.var(ddof=1) < 0.5 * 0.25 / 1000


def test_supplies_do_not_know_of_each_other():
    # The means of neighbouring supplies do not move together: a correlation of 199 pairs scatters by 0.07.
    means = np.array([(points(s, 300).prod(axis=1)).mean() for s in range(200)])
    assert abs(np.corrcoef(means[1:], means[:-1])[0, 1]) < 4.0 / np.sqrt(199)


def test_points_do_not_depend_on_the_portions_in_which_they_are_drawn():
    supply = EvenNumbers(np.random.default_rng(7))
    whole = supply.points(np.arange(600))
    parts = [supply.points(np.arange(*ends)) for ends in ((400, 600), (0, 1), (1, 400))]
    assert np.array_equal(np.concatenate([parts[1], parts[2], parts[0]]), whole)
    jumping = np.array([7, 8, 9, 400, 3, 401])
    assert np.array_equal(supply.points(jumping), whole[jumping])
    assert np.all((whole >= 0.0) & (whole < 1.0))


def test_unscrambled_sequence_is_scipys():
    # scipy.stats.qmc.Sobol, which takes its direction numbers from the same table.
    digits = sobol_digits(direction_numbers(), np.zeros(DIMENSIONS, np.uint64), np.arange(5000))
    expected = qmc.Sobol(DIMENSIONS, scramble=False, bits=BITS).random_base2(13)[:5000]
    np.testing.assert_array_equal(digits * 2.0**-BITS, expected)

"""Means and widths of velocities: put together exactly, with errors that tell how far they scatter."""

from math import sqrt

import numpy as np
import pytest

from tracer.tally.velocity_moments import LEAST_GROUPS, Moments, from_sums, jackknife_errors, joined


def moments_of(velocities: np.ndarray, weights: np.ndarray, origin: float = 0.0) -> Moments:
    v = velocities - origin
    sums = (
        weights.sum(keepdims=True),
        (weights * v).sum(keepdims=True),
        (weights * v * v).sum(keepdims=True),
    )
    return from_sums(*sums, origin)


def test_moments_are_those_of_the_weighted_samples():
    random = np.random.default_rng(1)
    v, w = random.normal(300.0, 40.0, 500), random.random(500)
    found = moments_of(v, w, origin=-1000.0)
    mean = np.average(v, weights=w)
    assert found.mean.item() == pytest.approx(mean, rel=1e-12)
    assert found.width.item() == pytest.approx(sqrt(np.average((v - mean) ** 2, weights=w)), rel=1e-9)


def test_nothing_has_no_mean_and_a_beam_no_width():
    found = from_sums(np.array([0.0, 2.0]), np.array([0.0, 14.0]), np.array([0.0, 98.0]), 5.0)
    assert np.isnan(found.mean[0])
    assert np.isnan(found.width[0])
    assert found.mean[1] == 12.0
    assert found.width[1] == 0.0


def test_a_beam_far_from_the_origin_keeps_its_width():
    # 30 km/s from the origin, 1 m/s wide: the squares are 1e9 times the variance, so 7 of 16 digits are left.
    v = 30_000.0 + np.array([-1.0, 1.0] * 500)
    assert moments_of(v, np.full(1000, 0.1)).width.item() == pytest.approx(1.0, abs=1e-6)


def test_what_rounding_leaves_is_no_width():
    random = np.random.default_rng(5)
    for v in random.uniform(-4000.0, 4000.0, 200):
        # One sample, counted in pieces whose sums are rounded.
        assert moments_of(np.full(7, v), random.random(7)).width.item() == 0.0
    # A centimetre a second is told from none.
    assert moments_of(np.array([2999.99, 3000.01]), np.ones(2)).width.item() == pytest.approx(0.01, rel=1e-2)


def test_parts_put_together_are_the_whole():
    random = np.random.default_rng(2)
    v, w = random.normal(0.0, 500.0, 900), random.random(900)
    v[300:] += 4000.0
    cuts = [slice(0, 100), slice(100, 250), slice(250, 900)]
    batches = [2, 3, 5]
    parts = [moments_of(v[cut], w[cut] / count) for cut, count in zip(cuts, batches, strict=True)]
    whole, found = moments_of(v, w), joined(parts, batches)
    np.testing.assert_allclose(found.weight, whole.weight, rtol=1e-12)
    np.testing.assert_allclose(found.mean, whole.mean, rtol=1e-12)
    np.testing.assert_allclose(found.width, whole.width, rtol=1e-12)
    # An average of the parts' ratios is something else.
    assert abs(np.mean([part.mean for part in parts]) - whole.mean.item()) > 100.0


def test_an_empty_part_changes_nothing():
    full = moments_of(np.array([1.0, 2.0, 4.0]), np.ones(3))
    nothing = from_sums(np.zeros(1), np.zeros(1), np.zeros(1), 0.0)
    found = joined([nothing, full, nothing], [1, 1, 1])
    assert found.mean.item() == pytest.approx(full.mean.item(), rel=1e-15)
    assert found.width.item() == pytest.approx(full.width.item(), rel=1e-14)


@pytest.mark.parametrize("batches", [[1] * 20, [1] * 10 + [3] * 10], ids=["even", "uneven"])
def test_jackknife_errors_are_those_of_many_repetitions(batches):
    # 4,000 places, each its own experiment with the same truth: the scatter between them is the error, known to 1.1 %.
    random = np.random.default_rng(3)
    places, atoms = 4_000, 12
    groups = []
    for count in batches:
        v = random.gamma(2.0, 300.0, (places, atoms * count))
        w = random.exponential(1.0, (places, atoms * count)) / count
        groups.append(from_sums(w.sum(1), (w * v).sum(1), (w * v * v).sum(1), 0.0))
    whole = joined(groups, batches)
    for error, value in zip(jackknife_errors(groups, batches), whole[1:], strict=True):
        assert np.sqrt(np.mean(error**2)) == pytest.approx(value.std(), rel=0.05)


def test_too_few_groups_have_no_error():
    groups = []
    for number in range(6):
        weight = np.array([1.0, 1.0 * (number < LEAST_GROUPS), 1.0 * (number < LEAST_GROUPS - 1), 0.0])
        v = float(number)
        groups.append(from_sums(weight, weight * v, weight * v * v, 0.0))
    mean, width = jackknife_errors(groups, [1] * 6)
    assert np.isfinite(mean).tolist() == np.isfinite(width).tolist() == [True, True, False, False]


def test_jackknife_keeps_the_shape_and_goes_through_blocks():
    random = np.random.default_rng(4)
    weight, v = random.random((5, 100, 101)), random.normal(0.0, 1.0, (5, 100, 101))
    groups = [from_sums(w, w * u, w * u * u, 0.0) for w, u in zip(weight, v, strict=True)]
    mean, width = jackknife_errors(groups, [1.0] * 5)
    assert mean.shape == width.shape == (100, 101)
    corner = [Moments(*(part[-1:, -1:] for part in group)) for group in groups]
    assert jackknife_errors(corner, [1.0] * 5)[0].item() == mean[-1, -1]

"""Where ranges end: on models whose rise of -2 ln L at the truth is known, and against the fit of one profile alone."""

import math

import numpy as np
import pytest
from scipy.optimize import least_squares, nnls
from scipy.stats import chi2

from tracer.observe.fit.calibration import calibrated, quantile
from tracer.observe.fit.curves import Fixed, Lawful, Parameter
from tracer.observe.fit.descent import descend, grid_starts, suited, valleys
from tracer.observe.fit.fitting import fit
from tracer.observe.fit.likelihood import Component, Likelihood, Measured, slots_of
from tracer.observe.fit.ranges import end_of, scan_of
from tracer.observe.fit.sources import Response
from tracer.observe.fit.words import range_words

WILKS = (1.0, 3.841458820694124)


class Bent:
    """A profile of one parameter p, any function of log p with its slope, without error or off by a share `bias`."""

    def __init__(self, points, slopes, low, high, bias=0.0):
        self.parameters = (Parameter("temperature", math.exp(low), math.exp(high)),)
        self._points, self._slopes, self._bias = points, slopes, bias

    def at(self, logs):
        return self._points(logs), self._slopes(logs)[..., np.newaxis, :]

    def replicates_at(self, logs):
        return np.tile(self.at(logs)[0], (3, 1))

    def bias_at(self, logs):
        return self._bias * np.abs(self.at(logs)[0])


def circle():
    return Bent(
        lambda logs: np.concatenate([np.cos(logs), np.sin(logs)], axis=-1),
        lambda logs: np.concatenate([-np.sin(logs), np.cos(logs)], axis=-1),
        -3.14,
        3.14,
    )


def fitted(curve, value, held=None, sigma=1.0, upper=False):
    value = np.asarray(value, dtype=float)
    data = Measured(value, np.full(len(value), sigma), np.full(len(value), False), 0.0)
    if upper:
        data.upper[-1] = True
    component = Component("a", curve, np.ones(3), held)
    return fit(data, [component], slots_of(data, [component], background=False))


def test_rises_of_a_direction_are_those_of_its_own_distribution(monkeypatch):
    """A point measured with unit errors on a circle of radius R, the angle fitted.

    The best angle is that of the point y = (R + z1, z2) itself, so that -2 ln L rises at the truth by |y - R|^2 -
    (|y| - R)^2 = 2 R (|y| - R - z1), which is no chi-square: its mean is 2 R E|y| - 2 R^2, 1 + 1/(4 R^2) for large R.
    """
    # 16 times the draws: their scatter is then 0.014 and 0.11, beside 0.13 and 0.45 from Wilks to what is expected.
    monkeypatch.setattr("tracer.observe.fit.calibration.DRAWS", 4096)
    radius = 1.6
    found = fitted(circle(), [radius * math.cos(0.3), radius * math.sin(0.3)], held=radius)
    z = np.random.default_rng(11).normal(size=(400_000, 2))
    rise = 2.0 * radius * (np.hypot(radius + z[:, 0], z[:, 1]) - radius - z[:, 0])
    expected = np.quantile(rise, chi2.cdf(WILKS, 1))
    np.testing.assert_allclose(expected, [1.13, 4.29], rtol=0.01)
    assert np.all(np.abs(found.calibration.rises[0].T - expected) < [0.05, 0.4])


def test_wide_circle_is_as_good_as_straight():
    found = fitted(circle(), [300.0 * math.cos(0.3), 300.0 * math.sin(0.3)], held=300.0)
    np.testing.assert_allclose(found.calibration.rises[0].T, [WILKS, WILKS], rtol=1e-3)
    estimate = found.ranges[0]
    # The half-width of an angle seen from afar is 1/R.
    assert math.log(estimate.high68 / estimate.best) == pytest.approx(1.0 / 300.0, rel=5e-3)


def test_draws_that_are_those_of_the_linear_fit_change_nothing():
    linear = np.random.default_rng(1).normal(size=200) ** 2
    for rise in WILKS:
        assert quantile(linear, linear, rise) == pytest.approx(rise, rel=1e-3)


@pytest.mark.parametrize("factor", [0.8, 1.2, 1.5])
def test_rises_larger_by_a_factor_move_the_ends_by_it(factor):
    # Bartlett 1937 (Proc. R. Soc. A 160, 268: memory): a ratio larger by a factor throughout.
    linear = np.random.default_rng(2).normal(size=4000) ** 2
    for rise in WILKS:
        assert quantile(factor * linear, linear, rise) == pytest.approx(factor * rise, rel=0.04)


def bounded_rise(true, share):
    """Return what a share of rises at a true p stays below, where p >= 0 is measured with unit error, by quadrature.

    The best is max(x, 0): the rise is (x - p)^2, less x^2 where x is below 0 (Feldman & Cousins 1998, Phys. Rev. D 57,
    3873, section IV.B: memory).
    """
    x = np.linspace(-8.0, 8.0, 400_001) + true
    rise = (x - true) ** 2 - np.minimum(x, 0.0) ** 2
    order = np.argsort(rise)
    below = np.cumsum(np.exp(-0.5 * (x[order] - true) ** 2))
    return rise[order][np.searchsorted(below / below[-1], share)]


def test_rises_near_an_edge_are_those_of_the_end_and_not_of_the_best(monkeypatch):
    monkeypatch.setattr("tracer.observe.fit.calibration.DRAWS", 4096)
    near = Bent(lambda logs: logs + np.zeros(1), lambda logs: 1.0 + 0.0 * logs, 0.0, 20.0)
    measured = 1.3
    ((low68, high68), (low95, high95)) = fitted(near, [measured], held=1.0).calibration.rises[0]
    # Blurred by 0.2 in the root, which a distribution that breaks off shows by up to 0.08 in the root.
    for found, end, rise in ((low68, 0.3, WILKS[0]), (high68, 2.3, WILKS[0]), (high95, 3.26, WILKS[1])):
        expected = bounded_rise(end, chi2.cdf(rise, 1))
        assert math.sqrt(found) == pytest.approx(math.sqrt(expected), abs=0.08)
    # An end that is cut short by the edge is there whatever the rise.
    assert low95 == WILKS[1]
    assert low68 < 0.8
    assert bounded_rise(measured, chi2.cdf(WILKS[0], 1)) > 0.95


def test_range_reaches_over_a_hill_to_the_other_valley():
    # (p^2 - 1) k seen as 0: -2 ln L is k^2 (p^2 - 1)^2, with valleys at -1 and 1 and a hill of k^2 = 9 between them.
    height = 3.0
    curve = Bent(
        lambda logs: np.full(4, 0.5 * height) * (logs**2 - 1.0),
        lambda logs: np.full(4, height) * logs,
        -2.5,
        2.4,
    )
    found = fitted(curve, np.zeros(4), held=1.0)
    estimate = found.ranges[0]
    for ends, roots in zip(
        ((estimate.low68, estimate.high68), (estimate.low95, estimate.high95)),
        found.calibration.rises[0] ** 0.5,
        strict=True,
    ):
        for end, root, sign in zip(ends, roots, (-1.0, 1.0), strict=True):
            assert math.log(end) == pytest.approx(sign * math.sqrt(1.0 + root / height), rel=2e-3)


LATER, TILT, OFF = 2.0, 0.5, -0.3
"""How much higher the second explanation of `two_ways` lies, the angle between the two, and where it is at its best."""


def two_ways():
    """Return -2 ln L of p and q that is p^2 for q < 0 and LATER + (p - OFF)^2 sin^2 TILT for q > 0, at the best q.

    A point is measured as 0 of p itself; q keeps its place below 0, takes most of p away above, and a wall is between.
    """

    def aside(logs):
        upper = 0.5 * (1.0 + np.tanh(20.0 * logs))
        away = 3.0 * (logs - 1.5)
        return np.concatenate(
            [
                upper * (-away * math.cos(TILT) - OFF),
                upper * away * math.sin(TILT),
                (1.0 - upper) * 9.0 * (logs + 1.0),
                math.sqrt(LATER) * upper,
                30.0 * np.exp(-((logs / 0.2) ** 2)),
            ],
            axis=-1,
        )

    first = np.eye(5)[0]
    curves = (
        Bent(lambda logs: logs * first, lambda logs: first + 0.0 * logs, -6.0, 6.0),
        Bent(aside, lambda logs: (aside(logs + 1e-6) - aside(logs - 1e-6)) / 2e-6, -2.0, 4.0),
    )
    data = Measured(np.zeros(5), np.ones(5), np.zeros(5, bool), 0.0)
    components = [Component(name, curve, np.ones(3), 1.0) for name, curve in zip("ab", curves, strict=True)]
    return Likelihood(data, components, slots_of(data, components, background=False))


@pytest.mark.parametrize("width", [1.0, 1.15, 2.0])
def test_end_of_a_range_is_not_where_the_nearest_of_two_explanations_ends(width):
    likelihood = two_ways()
    scan = scan_of(likelihood, valleys(likelihood, grid_starts(likelihood)))
    np.testing.assert_allclose(scan.best, [0.0, -1.0], atol=1e-3)
    # A first step to the end of the nearer, short of the true one, and beyond.
    wider = scan._replace(covariance=width**2 * scan.covariance)
    low, high = (end_of(wider, 0, WILKS[1], sign).place for sign in (-1.0, 1.0))
    half = math.sqrt(WILKS[1] - LATER) / math.sin(TILT)
    assert OFF + half > 1.15 * math.sqrt(WILKS[1]) + 0.2
    assert high == pytest.approx(OFF + half, rel=3e-3)
    assert low == pytest.approx(OFF - half, rel=3e-3)


def decay():
    x = np.linspace(0.2, 8.0, 20)
    return Bent(
        lambda logs: np.exp(-x / np.exp(logs)),
        lambda logs: np.exp(-x / np.exp(logs)) * x / np.exp(logs),
        math.log(0.3),
        math.log(30.0),
    )


def least_of(likelihood, start, free):
    """Return the least sum of squares that SciPy finds (Branch et al. 1999, SIAM J. Sci. Comput. 21, 1: memory)."""

    def residuals(part):
        return likelihood.residuals(whole(part))[0]

    def whole(part):
        at = start.copy()
        at[free] = part
        return at

    bounds = likelihood.low[free], likelihood.high[free]
    inside = np.clip(start[free], bounds[0] + 1e-3, bounds[1] - 1e-3)
    found = least_squares(residuals, inside, bounds=bounds, xtol=1e-12, ftol=1e-12, gtol=1e-12)
    return 2.0 * found.cost


def test_many_descents_arrive_where_a_general_minimiser_does():
    curve, flat = decay(), np.ones(20)
    x = np.linspace(0.2, 8.0, 20)
    components = [
        Component("a", curve, np.ones(3), None),
        Component("b", Fixed(np.exp(-x / 9.0), np.tile(np.exp(-x / 9.0), (3, 1))), np.ones(3), None),
    ]
    rng = np.random.default_rng(5)
    values = 20.0 * np.exp(-x / 2.0) + rng.normal(size=(30, 20))
    data = Measured(values[0], flat, flat < 0.0, 0.0)
    slots = slots_of(data, components, background=True)
    likelihood = Likelihood(data, components, slots)
    start = np.array([1.0, 0.1, 0.0, math.log(2.0)])
    for held in (np.zeros(4, bool), np.array([False, False, False, True])):
        at, least = descend(likelihood, np.tile(start, (30, 1)), held, values)
        assert np.all(at[:, :2] >= 0.0)
        if held[3]:
            assert np.all(at[:, 3] == start[3])
        for one, found in zip(values, least, strict=True):
            alone = Likelihood(data._replace(value=one), components, slots)
            assert found == pytest.approx(descend(alone, start[np.newaxis], held)[1][0], rel=1e-12)
            assert found == pytest.approx(least_of(alone, start, ~held), abs=1e-6)
    # The second rate meets its bound in some of the draws, so that bounds are tried.
    assert np.any(at[:, 1] == 0.0)
    assert np.any(at[:, 1] > 0.0)


@pytest.mark.parametrize("held", [None, 0, 3])
def test_starts_of_many_are_the_best_of_a_grid_with_rates_by_non_negative_least_squares(held):
    x, curve = np.linspace(0.2, 8.0, 20), decay()
    components = [Component(name, curve, np.ones(3), None) for name in "ab"]
    rng = np.random.default_rng(12)
    # Half of the profiles have one release alone, so that rates meet their bound.
    values = np.exp(-x / 2.0) * np.arange(2.0, 22.0)[:, np.newaxis] + rng.normal(size=(20, 20))
    values[10:] += 9.0 * np.exp(-x / 9.0)
    data = Measured(values[0], np.linspace(0.5, 1.5, 20), np.zeros(20, bool), 0.0)
    slots = slots_of(data, components, background=False)
    likelihood = Likelihood(data, components, slots)
    at = np.array([0.7, 0.3, math.log(3.0), math.log(8.0)])
    stay = np.arange(4) == held
    starts = suited(likelihood, values, stay, at)
    found = np.sum(likelihood.residuals(starts, values)[0] ** 2, axis=1)
    assert np.all(starts[:, :2] >= 0.0)
    if held is not None:
        assert np.all(starts[:, held] == at[held])
    count = 25 if held == 3 else 11
    places = likelihood.low[2] + (likelihood.high[2] - likelihood.low[2]) * (np.arange(count) + 0.5) / count
    shapes = np.exp(-x / np.exp(places)[:, np.newaxis]) / data.sigma
    others = np.exp(-x / 8.0)[np.newaxis] / data.sigma if held == 3 else shapes
    for value, least in zip(values / data.sigma, found, strict=True):
        expected = np.inf
        for one in shapes:
            for other in others:
                left, free = value, [one, other]
                if held == 0:
                    left, free = value - at[0] * slots[0].unit * one, [other]
                expected = min(expected, nnls(np.array(free).T, left)[1] ** 2)
        assert least == pytest.approx(expected, abs=0.02)


@pytest.mark.parametrize("upper", [False, True])
def test_residuals_of_many_are_those_of_each(upper):
    response = Response(
        np.linspace(0.0, 6e3, 13),
        3.8e-26,
        3e3,
        np.random.default_rng(6).uniform(size=(12, 2, 5)),
        np.random.default_rng(7).uniform(size=(4, 12, 2, 5)),
    )
    curve = Lawful(response, "maxwell-flux", {}, (Parameter("temperature", 500.0, 3000.0),))
    data = Measured(np.ones(5), np.linspace(0.1, 0.3, 5), np.array([False, upper, False, False, upper]), 0.2)
    components = [Component("a", curve, np.ones(4), None), Component("b", curve, np.ones(4), 0.7)]
    slots = slots_of(data, components, background=False)
    likelihood = Likelihood(data, components, slots)
    rng = np.random.default_rng(8)
    places = np.column_stack([rng.uniform(0.1, 2.0, 6), *np.log(rng.uniform(500.0, 3000.0, (2, 6)))])
    likelihood.take_model_error(places[0])
    values = rng.normal(size=(6, 5))
    many, slopes = likelihood.residuals(places, values)
    for n, place in enumerate(places):
        alone = Likelihood(data._replace(value=values[n]), components, slots)
        alone.take_model_error(places[0])
        residual, slope = alone.residuals(place)
        np.testing.assert_allclose(many[n], residual, rtol=1e-9, atol=1e-9)
        np.testing.assert_allclose(slopes[n], slope, rtol=1e-9, atol=1e-9)
        for k, step in enumerate(1e-5 * np.eye(len(place))):
            ahead, behind = alone.residuals(place + step)[0], alone.residuals(place - step)[0]
            np.testing.assert_allclose(slope[k], (ahead - behind) / 2e-5, rtol=1e-5, atol=1e-5)


def test_noise_has_the_covariance_of_measurement_and_model():
    replicates = np.random.default_rng(9).uniform(0.5, 1.5, (8, 3))
    points = np.array([3.0, 1.0, 2.0])
    # Without Monte Carlo error, but off by up to a tenth for the width of the bins.
    wide = Bent(lambda logs: points + 0.0 * logs, lambda logs: 0.0 * points * logs, -1.0, 1.0, bias=0.1)
    data = Measured(np.ones(3), np.array([0.1, 0.2, 0.3]), np.zeros(3, bool), 0.0)
    components = [
        Component("a", Fixed(replicates.mean(axis=0), replicates), np.ones(8), None),
        Component("b", wide, np.ones(3), 2.0),
    ]
    slots = slots_of(data, components, background=False)
    likelihood = Likelihood(data, components, slots)
    likelihood.take_model_error(np.array([0.5 / slots[0].unit, 0.0]))
    bias = 2.0 * 0.1 * points
    expected = (
        0.5**2 * np.cov(replicates, rowvar=False) / 8
        + 0.5 * (np.outer(bias, bias) + np.diag(bias**2))
        + np.diag(data.sigma**2)
    )
    turned = likelihood.noise(np.eye(3))
    np.testing.assert_allclose(turned.T @ turned, expected, rtol=1e-9)


def test_ranges_are_the_same_each_time():
    x = np.linspace(0.2, 8.0, 20)
    value = 6.0 * np.exp(-x / 2.0) + np.random.default_rng(10).normal(size=20)
    assert fitted(decay(), value).ranges == fitted(decay(), value).ranges


def test_what_is_not_calibrated_says_why():
    x = np.linspace(0.2, 8.0, 20)
    rates = fitted(Fixed(np.exp(-x), np.tile(np.exp(-x), (3, 1))), 9.0 * np.exp(-x))
    limits = fitted(decay(), 9.0 * np.exp(-x / 2.0) + 0.1, upper=True)
    wide = np.ones(501) / math.sqrt(501.0)
    many = fitted(
        Bent(lambda logs: 9.0 * logs * wide, lambda logs: 9.0 * wide + 0.0 * logs, 0.1, 3.0), wide, 1.0
    )
    for found, words in (
        (rates, "enters linearly"),
        (limits, "an upper limit would be a measurement"),
        (many, "profiles of more than 500 points"),
    ):
        assert found.calibration.draws == 0
        for rises in found.calibration.rises:
            np.testing.assert_array_equal(rises.T, [WILKS, WILKS])
        assert words in range_words(found.calibration, ["a: rate", "a: temperature"])
        assert "risen by 1 and 3.84, not calibrated" in range_words(found.calibration, ["a: rate", "b"])
    drawn = fitted(circle(), [1.6, 0.0], held=1.6)
    assert calibrated(drawn.scan).draws == 256
    words = range_words(drawn.calibration, ["angle"])
    assert words.startswith(
        "Ranges are calibrated on 256 profiles drawn about each end: where that changes most, at"
    )
    assert "% of 'angle', -2 ln L has risen by" in words

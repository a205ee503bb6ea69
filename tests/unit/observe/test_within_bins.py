"""What the means of a response in bins of launch speed tell of a law, and the bound of what they do not."""

import numpy as np
import pytest

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.observe.responses import law_doubt, law_weights
from tracer.observe.within_bins import _concave_envelope, bend_weights, bends, bias_bound
from tracer.physics.release.speed_bins import speed_bin_edges

SODIUM = 22.98977 * ATOMIC_MASS
ESCAPE = 3249.0
EDGES = speed_bin_edges(32, ESCAPE, 1206.0, 3000.0)
NODES, SHARES = np.polynomial.legendre.leggauss(200)
MIDDLES, HALVES = 0.5 * (EDGES[1:] + EDGES[:-1]), 0.5 * np.diff(EDGES)
X = np.linspace(-1.0, 1.0, 20)
SPEEDS = MIDDLES[:, None] + HALVES[:, None] * NODES


def means(response):
    """Return R0 and R1 (bins, 2, 1) of a response at `SPEEDS`."""
    return np.stack([0.5 * response @ SHARES, 0.5 * response @ (SHARES * NODES)], axis=1)[:, :, None]


def told(law, known):
    """Return what is told of a law, and its bound."""
    value = np.tensordot(law_weights(law, EDGES, SODIUM, ESCAPE), known, 2)
    return value.squeeze(), bias_bound(law_doubt(law, EDGES, SODIUM), EDGES, ESCAPE, known).squeeze()


def hot(kelvin):
    return {"law": "maxwell-flux", "temperature": kelvin}


def exact(kelvin, response):
    """Return the integral of a flux-weighted Maxwellian times a response, by quadrature in each bin."""
    a = SODIUM / (2.0 * BOLTZMANN * kelvin)
    density = 2.0 * a * a * SPEEDS**3 * np.exp(-a * SPEEDS**2)
    return float(np.sum(density * response * HALVES[:, None] * SHARES))


@pytest.mark.parametrize("number", [0, 1, 5, 20, 22, 31])
def test_bend_of_a_cubic_response_is_told_exactly(number):
    x = SPEEDS / 1000.0
    response = 2.0 - 3.0 * x + 0.7 * x**2 - 0.2 * x**3
    second = np.zeros(32)
    second[number] = 1.0
    found = np.tensordot(bend_weights(second, EDGES, ESCAPE), means(response)[:, :, 0], 2)
    legendre = 0.5 * (3.0 * NODES**2 - 1.0)
    assert found == pytest.approx(5.0 * 0.5 * response[number] @ (SHARES * legendre), rel=1e-9)


def test_all_ways_agree_on_a_parabola_in_even_bins():
    edges = np.arange(7.0)
    parabola = np.array([[n * n + n + 1.0 / 3.0, (2.0 * n + 1.0) / 6.0] for n in range(6)])
    for bend in bends(edges, 3.0):
        known = parabola[bend.first : bend.first + len(bend.chosen)]
        # c = v^2 with v = n + (1 + x)/2: x^2/4 has an R2 of (2/15)/4.
        for way in (bend.chosen, *bend.others):
            assert np.sum(way * known) == pytest.approx(1.0 / 30.0, rel=1e-9)


def test_nothing_is_told_across_the_escape_speed():
    at = int(np.argmin(np.abs(EDGES - ESCAPE)))
    matrix = np.array([bend_weights(one, EDGES, ESCAPE) for one in np.eye(32)])
    assert matrix.any(axis=(1, 2)).all()
    assert not matrix[:at, at:].any()
    assert not matrix[at:, :at].any()


@pytest.mark.parametrize("power", [0.0, 0.5, 1.0, 2.0, 3.0])
@pytest.mark.parametrize("kelvin", [300.0, 600.0, 1200.0, 2400.0])
def test_bound_holds_with_a_threshold_anywhere_in_a_bin(power, kelvin):
    starts = np.linspace(400.0, 5000.0, 61)
    above = [start < SPEEDS for start in starts]
    responses = [
        np.where(at, np.where(at, SPEEDS - start, 1.0) ** power, 0.0)
        for at, start in zip(above, starts, strict=True)
    ]
    value, bound = told(hot(kelvin), np.concatenate([means(one) for one in responses], axis=2))
    true = np.array([exact(kelvin, one) for one in responses])
    # The bound is no theorem: see CARE. Moments are exact to 1e-6.
    assert np.all(np.abs(value - true) < 1.05 * bound + 1e-6 * true)


def test_two_straight_lines_alone_would_not_hold():
    # Atoms that reach a place only above 2.5 km/s, the law of 300 K only by its last 1e-12.
    response = np.maximum(SPEEDS - 2500.0, 0.0)
    known, law = means(response), hot(300.0)
    lines = law_doubt(law, EDGES, SODIUM).moments[:, :2] * (1.0, 3.0)
    value, bound = told(law, known)
    true = exact(300.0, response)
    assert 0.0 < true < 1e-8
    assert abs(value - true) < 0.5 * abs(np.tensordot(lines, known, 2)[0] - true)
    assert abs(value - true) < bound < 30.0 * true


@pytest.mark.parametrize("kelvin", [600.0, 1200.0, 2400.0, 4800.0])
def test_bound_of_a_smooth_response_is_small(kelvin):
    response = np.log1p(np.exp((SPEEDS - 1500.0) / 400.0)) * np.exp(-SPEEDS / 6000.0)
    value, bound = told(hot(kelvin), means(response))
    true = exact(kelvin, response)
    assert abs(value - true) < 1e-5 * true
    assert bound < 1e-3 * true


def test_sputtered_atoms_and_bumps_are_bounded():
    law = {"law": "sigmund-thompson", "binding_energy": "2 eV", "cutoff_energy": "500 eV"}
    fine = np.linspace(0.0, EDGES[-1], 400_001)
    v = 0.5 * (fine[1:] + fine[:-1])
    binding = 2.0 * 1.602176634e-19
    y = 0.5 * SODIUM * v * v / binding
    density = np.where(y < 249.0, y / (1.0 + y) ** 3 * (1.0 - np.sqrt((1.0 + y) / 250.0)) * v, 0.0)
    density /= density.sum()
    for middle in (1500.0, 2900.0, 4000.0):
        for width in (50.0, 200.0, 1000.0):
            known = means(np.exp(-(((SPEEDS - middle) / width) ** 2)))
            value, bound = told(law, known)
            away = abs(value - density @ np.exp(-(((v - middle) / width) ** 2)))
            assert away < 1.5 * bound + 1e-5 * value


def test_envelopes_hold_whatever_is_nowhere_below_zero():
    rng = np.random.default_rng(5)
    law = hot(300.0)
    doubt = law_doubt(law, EDGES, SODIUM)
    a = SODIUM / (2.0 * BOLTZMANN * 300.0)
    places = np.linspace(-1.0, 1.0, doubt.least.shape[1])
    for number in (0, 3, 12, 20):
        for _ in range(50):
            x, weight = rng.uniform(-1.0, 1.0, 3), rng.exponential(size=3)
            v = MIDDLES[number] + HALVES[number] * x
            # Mean 1: weights of points that sum to 1, in a density per x of which the bin holds 2.
            weight /= weight.sum()
            value = 2.0 * HALVES[number] * np.sum(weight * 2.0 * a * a * v**3 * np.exp(-a * v * v))
            centre = float(weight @ x)
            low, high = (np.interp(centre, places, one[number]) for one in (doubt.least, doubt.most))
            # Between its nodes the law is taken as straight.
            assert low * (1.0 - 3e-3) <= value <= high * (1.0 + 3e-3)


@pytest.mark.parametrize("values", [np.random.default_rng(3).normal(size=20), X**2, -(X**2), 3.0 * X])
def test_concave_envelope_is_the_highest_chord(values):
    found = _concave_envelope(values)
    for place in range(20):
        chords = [
            values[i] + (values[j] - values[i]) * (place - i) / max(j - i, 1)
            for i in range(place + 1)
            for j in range(place, 20)
        ]
        assert found[place] == pytest.approx(max(chords), rel=1e-12, abs=1e-12)


def test_bin_without_neighbours_is_bounded_by_positivity():
    edges = np.array([0.0, 1000.0, *np.linspace(1200.0, 9000.0, 15)])
    law = hot(1200.0)
    known = np.zeros((16, 2, 1))
    known[0] = [[1.0], [0.2]]
    doubt = law_doubt(law, edges, SODIUM)
    bound = float(bias_bound(doubt, edges, 1000.0, known)[0])
    assert 0.0 < bound < doubt.most[0].max()


def test_bins_that_were_never_hit_add_nothing():
    bound = bias_bound(law_doubt(hot(600.0), EDGES, SODIUM), EDGES, ESCAPE, np.zeros((32, 2, 3)))
    assert np.array_equal(bound, np.zeros(3))

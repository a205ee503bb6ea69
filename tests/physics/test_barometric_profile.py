"""Only flux-weighted speeds with Lambert's cosine give the barometric profile above the ground.

Schorghofer 2020, arXiv:1810.00165. The body is so heavy that its sphere is flat to the gas: lambda 1e4.
"""

from math import exp, gamma, log, pi, sqrt

import numpy as np
import pytest
from scipy.integrate import quad

from tracer.constants import ATOMIC_MASS, BOLTZMANN

RADIUS, GM, JEANS, RATE = 1e6, 1e12, 1e4, 1e24
HEIGHT = RADIUS / JEANS
HELIUM = 4.002602 * ATOMIC_MASS
KELVIN = GM * HELIUM / (BOLTZMANN * RADIUS * JEANS)
BASE = RATE / (4.0 * pi * RADIUS**2) * sqrt(2.0 * pi * HELIUM / (BOLTZMANN * KELVIN))
"""n_c = Phi sqrt(2 pi m/(kT)) [m-3]: the density at the ground of a barometric gas with the launch flux Phi."""

RUN = """
title = "barometric profile"
[body]
name = "Ball"
radius = "1000 km"
gm = "1000 km3 s-2"
[gas]
species = "He"
[[release]]
name = "thermal"
rate = "1e24 s-1"
speed = {{ law = "{law}", temperature = "{kelvin!r} K" }}
direction = {{ law = "{direction}" }}
[surface]
sticking = 1.0
[domain]
outer_radius = "2 radii"
[grid]
altitude = {{ first_cell = "{first} m", top = "400 m", cells = {cells} }}
latitude_cells = 1
local_time_cells = 1
[ensemble]
particles_per_batch = 2_000
batches = 100
"""


def layers(traced, law: str, direction: str, first: float = 10.0, cells: int = 10):
    """Return edges [H], n/n_c in each layer and its standard error."""
    product = traced(RUN.format(law=law, direction=direction, kelvin=KELVIN, first=first, cells=cells))
    edges = product.altitude_bounds.values / HEIGHT
    density = product.number_density.values[0, :, 0, 0] / BASE
    return edges, density, product.number_density_standard_error.values[0, :, 0, 0] / BASE


def layer_means(edges: np.ndarray, profile) -> np.ndarray:
    return np.array([quad(profile, low, high)[0] / (high - low) for low, high in edges])


def gas_speed_profile(z: float) -> float:
    """Return n/n_c at altitude z [H] of maxwell-gas speeds launched by the cosine law, with e = m v^2/(2kT).

    Each launch passes z twice with vertical speed sqrt(v_z^2 - 2 g z); by the cosine law v_z^2/v^2 is even, so that
    the mean of 1/v_z over angles is 2 sqrt(1 - z/e)/v; pdf(e) = 2/sqrt(pi) sqrt(e) exp(-e).
    """
    shape = quad(lambda e: 2.0 / sqrt(pi) * sqrt(max(0.0, e - z)) * exp(-e) / sqrt(e), z, z + 40.0)[0]
    return shape * 2.0 / sqrt(pi)


# Four standard errors of 100 batches, Student's t of 99 degrees of freedom: false alarm 1.2e-4 a layer.


def test_thermal_launches_give_the_barometric_profile(traced):
    edges, density, error = layers(traced, "maxwell-flux", "cosine")
    # exp(-z/H); at lambda 1e4 the sphere takes 4e-4 from the top layer (z^2/(R H)).
    expected = layer_means(edges, lambda z: exp(-z))
    assert np.all(np.abs(density - expected) < 4.0 * error)
    np.testing.assert_allclose(density, expected, rtol=0.02)


def test_gas_speeds_are_not_barometric_and_follow_their_own_integral(traced):
    # n(H)/n(0) = 0.222 against 0.368 in the flat limit: computed for this project by quadrature.
    assert gas_speed_profile(1.0) / gas_speed_profile(0.0) == pytest.approx(0.222, abs=5e-4)
    edges, density, error = layers(traced, "maxwell-gas", "cosine")
    expected = layer_means(edges, gas_speed_profile)
    assert np.all(np.abs(density - expected) < 4.0 * error)
    np.testing.assert_allclose(density, expected, rtol=0.02)
    barometric = layer_means(edges, lambda z: exp(-z))
    assert np.abs((density - barometric) / error).max() > 20.0


def test_isotropic_launches_are_not_barometric_and_diverge_at_the_ground(traced):
    edges, density, error = layers(traced, "maxwell-flux", "isotropic")
    barometric = layer_means(edges, lambda z: exp(-z))
    assert np.abs((density - barometric) / error).max() > 20.0
    # Near the ground n/n_c ~ <ln(2 sqrt(e/z))/sqrt(e)>/sqrt(pi): a layer ten times thinner holds ln(10)/2 <1/sqrt(e)>/
    # sqrt(pi) more, with <1/sqrt(e)> = Gamma(3/2) for the pdf e exp(-e).
    lowest, errors = [], []
    for first in (10.0, 1.0, 0.1):
        _, layer, error = layers(traced, "maxwell-flux", "isotropic", first, 12)
        lowest.append(layer[0])
        errors.append(error[0])
    steps, step_errors = np.diff(lowest), np.hypot(errors[:-1], errors[1:])
    limit = log(10.0) / 2.0 * gamma(1.5) / sqrt(pi)
    # By quadrature of `profile` below the thicker layers are 1.9 and 0.2 % off the limit.
    assert np.all(np.abs(steps - limit) < 4.0 * step_errors + 0.02 * limit)
    assert np.all(steps > 10.0 * step_errors)


def test_thermal_launches_do_not_diverge_at_the_ground(traced):
    for first in (1.0, 0.1):
        edges, density, error = layers(traced, "maxwell-flux", "cosine", first, 12)
        assert abs(density[0] - layer_means(edges[:1], lambda z: exp(-z))[0]) < 4.0 * error[0]


def test_isotropic_profile_is_that_of_its_integral(traced):
    """Mean of 1/v_z over an isotropic hemisphere: acosh(sqrt(e/z))/v instead of 2 sqrt(1 - z/e)/v."""

    def profile(z: float) -> float:
        shape = quad(lambda e: e * exp(-e) * np.arccosh(sqrt(max(1.0, e / z))) / sqrt(e), z, z + 40.0)[0]
        return shape / sqrt(pi)

    edges, density, error = layers(traced, "maxwell-flux", "isotropic")
    inner = slice(1, None)
    expected = layer_means(edges[inner], profile)
    assert np.all(np.abs(density[inner] - expected) < 4.0 * error[inner])
    np.testing.assert_allclose(density[inner], expected, rtol=0.02)

"""Re-emission from the ground: thermal speeds, cosine law, energy accommodation."""

from math import pi, sqrt

import numpy as np
import pytest
from scipy.stats import gamma, kstest, uniform

from tracer.kernels.bounce import Surface, direction_about, rebound, tangents, thermal_speed_squared
from tracer.kernels.sticking import Sticking
from tracer.kernels.temperature import UNIFORM, SurfaceTemperature

COUNT = 20_000
PER_KELVIN = 4000.0
"""2k/m [m2 s-2 K-1], of an atom of about 4 u."""
KELVIN = 300.0
FALSE_ALARM = 1e-3
"""Of one Kolmogorov-Smirnov test."""
GROUND = np.array([0.48, -0.6, 0.64])


def surface(accommodation: float) -> Surface:
    return Surface(
        SurfaceTemperature(UNIFORM, KELVIN, KELVIN),
        sticking=Sticking(0.0, 0.0, np.inf),
        accommodation=accommodation,
        speed_squared_per_kelvin=PER_KELVIN,
        spin=0.0,
    )


def rebounds(accommodation: float, incoming_speed_squared: float) -> np.ndarray:
    """Return COUNT velocities of rebound, (n, 3)."""
    rng = np.random.default_rng(11)
    ground = surface(accommodation)
    return np.array([rebound(rng, ground, *GROUND, incoming_speed_squared) for _ in range(COUNT)])


def energies(velocities: np.ndarray) -> np.ndarray:
    """Return m v^2/2 in units of kT."""
    return (velocities**2).sum(axis=1) / (PER_KELVIN * KELVIN)


def test_thermal_energies_are_gamma_of_shape_two():
    rng = np.random.default_rng(12)
    found = np.array([thermal_speed_squared(rng, PER_KELVIN, KELVIN) for _ in range(COUNT)])
    assert kstest(found / (PER_KELVIN * KELVIN), gamma(2.0).cdf).pvalue > FALSE_ALARM
    assert kstest(found / (PER_KELVIN * KELVIN), gamma(1.5).cdf).pvalue < 1e-100


def test_full_accommodation_forgets_the_incoming_energy():
    for incoming in (0.0, 1e8):
        assert kstest(energies(rebounds(1.0, incoming)), gamma(2.0).cdf).pvalue > FALSE_ALARM


def test_no_accommodation_keeps_the_energy():
    found = (rebounds(0.0, 1.7e6) ** 2).sum(axis=1)
    np.testing.assert_allclose(found, 1.7e6, rtol=1e-12)


def test_part_accommodation_mixes_the_energies():
    # E_out = alpha E_thermal + (1 - alpha) E_in, Hunten, Morgan & Shemansky 1988 (memory).
    incoming = 3.0 * PER_KELVIN * KELVIN
    thermal = (energies(rebounds(0.3, incoming)) - 0.7 * 3.0) / 0.3
    assert kstest(thermal, gamma(2.0).cdf).pvalue > FALSE_ALARM


def energy_chain(accommodation: float, start: float = 2.0) -> np.ndarray:
    """Return the energies in units of kT of one atom that bounces COUNT times, the first 50 dropped."""
    rng, ground, speed_squared = (
        np.random.default_rng(13),
        surface(accommodation),
        start * PER_KELVIN * KELVIN,
    )
    chain = np.empty(COUNT)
    for i in range(COUNT):
        out = rebound(rng, ground, *GROUND, speed_squared)
        speed_squared = out[0] ** 2 + out[1] ** 2 + out[2] ** 2
        chain[i] = speed_squared / (PER_KELVIN * KELVIN)
    return chain[50:]


@pytest.mark.parametrize("accommodation", [0.2, 0.5, 0.8, 1.0])
def test_stationary_spread_of_energy_is_that_of_the_mixing(accommodation):
    # Repeated bounces: variance alpha/(2 - alpha) of thermal, 2 (kT)^2; mean 2 kT. Of an autoregressive chain the share
    # alpha/(2 - alpha) counts as independent members.
    chain = energy_chain(accommodation)
    share = accommodation / (2.0 - accommodation)
    variance, independent = 2.0 * share, COUNT * share
    assert abs(chain.mean() - 2.0) < 4.0 * sqrt(variance / independent)
    # The fourth moment of a gamma distribution of shape 2 makes its variance scatter by sqrt(5/n) of itself.
    assert abs(chain.var() - variance) < 4.0 * variance * sqrt(5.0 / independent)


@pytest.mark.parametrize("accommodation", [0.3, 0.9, 1.0])
def test_energy_before_and_after_a_bounce_hang_together_by_what_is_kept(accommodation):
    # Correlation 1 - alpha: none at full accommodation. Four standard errors, false alarm 6e-5.
    chain = energy_chain(accommodation)
    found = np.corrcoef(chain[:-1], chain[1:])[0, 1]
    assert abs(found - (1.0 - accommodation)) < 4.0 / sqrt(COUNT)


def test_energy_is_kept_bounce_after_bounce_without_accommodation():
    np.testing.assert_allclose(energy_chain(0.0, 3.7), 3.7, rtol=1e-11)
    np.testing.assert_allclose(np.diff(energy_chain(0.0, 3.7)), 0.0, atol=3.7e-12)


@pytest.mark.parametrize("accommodation", [0.0, 1.0])
def test_rebounds_follow_the_cosine_law_about_the_vertical(accommodation):
    found = rebounds(accommodation, 1e6)
    ways = found / np.linalg.norm(found, axis=1)[:, None]
    cosine = ways @ GROUND
    assert kstest(cosine**2, uniform.cdf).pvalue > FALSE_ALARM
    assert kstest(cosine, uniform.cdf).pvalue < 1e-100
    ax, ay, az, bx, by, bz = tangents(*GROUND)
    azimuth = np.arctan2(ways @ [bx, by, bz], ways @ [ax, ay, az])
    assert kstest(azimuth, uniform(-pi, 2.0 * pi).cdf).pvalue > FALSE_ALARM


@pytest.mark.parametrize(
    "n",
    [
        (0.0, 0.0, 1.0),
        (0.0, 0.0, -1.0),
        (1.0, 0.0, 0.0),
        (0.0, -1.0, 0.0),
        (0.6, 0.0, -0.8),
        (1e-9, 0.0, -1.0),
    ],
)
def test_tangents_complete_a_right_handed_basis_everywhere(n):
    basis = np.array([*tangents(*n)[:3], *tangents(*n)[3:], *n]).reshape(3, 3)
    np.testing.assert_allclose(basis @ basis.T, np.eye(3), atol=1e-14)
    assert np.linalg.det(basis) == pytest.approx(1.0, abs=1e-14)


def test_direction_about_has_its_angle_and_length():
    rng = np.random.default_rng(14)
    for cosine in (0.0, 0.3, 1.0):
        way = np.array(direction_about(*GROUND, cosine, 2.0 * pi * rng.random()))
        assert np.linalg.norm(way) == pytest.approx(1.0, abs=1e-14)
        assert way @ GROUND == pytest.approx(cosine, abs=1e-14)

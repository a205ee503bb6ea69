"""Each speed law against its distribution, written down independently of the package."""

from math import exp, sqrt

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import gammainc, gammaincinv
from scipy.stats import gamma, kstest, maxwell, rv_histogram

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux, energies
from tracer.physics.release.speed.maxwell_gas import MaxwellGas
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson
from tracer.physics.release.speed.single import Single
from tracer.physics.release.speed.table import Table

SODIUM = 22.98976928 * ATOMIC_MASS
KELVIN = 1200.0
ELECTRONVOLT = 1.602176634e-19
"""Exact (SI 2019) [J]."""
BINDING = 2.0 * ELECTRONVOLT
CUTOFF = 2020.75 * ELECTRONVOLT
"""Largest energy that a 4 keV helium ion gives to sodium: E_i 4 m1 m2/(m1 + m2)^2."""

COUNT = 20_000
NO_GROUND = np.full(COUNT, np.nan)
FALSE_ALARM = 1e-3
"""Of one Kolmogorov-Smirnov test; nine of them here, on fixed seeds."""


def sample(law, seed: int = 1) -> np.ndarray:
    return law.speeds(np.random.default_rng(seed).random(COUNT), NO_GROUND, SODIUM)


def thermal_energies(speeds: np.ndarray) -> np.ndarray:
    """Return m v^2/2 in units of kT."""
    return 0.5 * SODIUM * speeds**2 / (BOLTZMANN * KELVIN)


def test_maxwell_flux_energies_are_gamma_of_shape_two():
    # pdf(v) ~ v^3 exp(-m v^2/2kT) means pdf(E) ~ E exp(-E/kT).
    energies = thermal_energies(sample(MaxwellFlux(KELVIN)))
    assert kstest(energies, gamma(2.0).cdf).pvalue > FALSE_ALARM
    # Mean energy 2kT, variance 2 (kT)^2: four standard errors, false alarm 6e-5.
    assert abs(energies.mean() - 2.0) < 4.0 * sqrt(2.0 / COUNT)


def test_maxwell_flux_quantiles_are_scipys():
    # scipy.special.gammaincinv: the inverse of the gamma distribution of shape 2.
    u = np.concatenate(
        (np.geomspace(1e-14, 0.1, 300), np.linspace(0.1, 0.9, 99), 1.0 - np.geomspace(0.1, 1e-14, 300))
    )
    np.testing.assert_allclose(energies(u), gammaincinv(2.0, u), rtol=1e-12)
    assert np.all(np.isfinite(energies(np.array([0.0, np.nextafter(1.0, 0.0)]))))


def test_maxwell_gas_speeds_are_scipys_maxwell():
    speeds = sample(MaxwellGas(KELVIN))
    assert kstest(speeds, maxwell(scale=sqrt(BOLTZMANN * KELVIN / SODIUM)).cdf).pvalue > FALSE_ALARM
    # The tail beyond v_esc is 1 - P(3/2, lambda); at lambda 5 it is 0.018566 by quadrature of the pdf.
    beyond = quad(lambda x: 4.0 / sqrt(np.pi) * x * x * exp(-x * x), sqrt(5.0), np.inf)[0]
    assert beyond == pytest.approx(1.0 - gammainc(1.5, 5.0), rel=1e-9)
    share = np.mean(thermal_energies(speeds) > 5.0)
    assert abs(share - beyond) < 4.0 * sqrt(beyond / COUNT)


def test_gas_and_flux_laws_are_not_mistaken_for_each_other():
    assert kstest(thermal_energies(sample(MaxwellGas(KELVIN))), gamma(2.0).cdf).pvalue < 1e-100
    wrong = maxwell(scale=sqrt(BOLTZMANN * KELVIN / SODIUM)).cdf
    assert kstest(sample(MaxwellFlux(KELVIN)), wrong).pvalue < 1e-100


def test_temperature_wrong_by_three_per_cent_is_noticed():
    assert kstest(thermal_energies(sample(MaxwellFlux(1.03 * KELVIN))), gamma(2.0).cdf).pvalue < 1e-4


@pytest.mark.parametrize("law", [MaxwellFlux, MaxwellGas])
def test_law_without_temperature_takes_the_grounds(law):
    u = np.array([0.1, 0.5, 0.9])
    ground = np.array([100.0, 400.0, 900.0])
    expected = np.sqrt(ground / KELVIN) * law(KELVIN).speeds(u, ground, SODIUM)
    np.testing.assert_allclose(law(None).speeds(u, ground, SODIUM), expected, rtol=1e-14)


def test_single_speed_is_single():
    assert np.all(sample(Single(1234.5)) == 1234.5)


# ---- sputtering


def sputter_cdf(energies: np.ndarray, cutoff: float) -> np.ndarray:
    """Return the distribution of E/(E+U)^3 [1 - sqrt((E+U)/E_max)] by numerical quadrature in ln E."""

    def density(log_energy: float) -> float:
        e = exp(log_energy)
        return e * e / (e + 1.0) ** 3 * max(0.0, 1.0 - sqrt((e + 1.0) / cutoff))

    top = np.log(cutoff - 1.0) if cutoff < np.inf else 60.0
    edges = np.linspace(-25.0, top, 2001)
    nodes, weights = np.polynomial.legendre.leggauss(5)
    half = 0.5 * (edges[1] - edges[0])
    at = edges[:-1, None] + half * (nodes + 1.0)
    steps = half * np.vectorize(density)(at) @ weights
    total = np.concatenate(([0.0], np.cumsum(steps)))
    return np.interp(np.log(energies / BINDING), edges, total / total[-1])


@pytest.mark.parametrize("cutoff", [None, CUTOFF, 5.0 * BINDING, 1.2 * BINDING])
def test_sputtered_energies_follow_the_quadrature_of_their_law(cutoff):
    law = SigmundThompson(BINDING, cutoff)
    energies = 0.5 * SODIUM * sample(law) ** 2
    reduced = np.inf if cutoff is None else cutoff / BINDING
    assert kstest(energies, lambda e: sputter_cdf(e, reduced)).pvalue > FALSE_ALARM
    if cutoff is not None:
        assert energies.max() <= cutoff - BINDING


def test_sputtering_with_a_cut_off_is_not_mistaken_for_one_without():
    energies = 0.5 * SODIUM * sample(SigmundThompson(BINDING, 20.0 * BINDING)) ** 2
    assert kstest(energies, lambda e: sputter_cdf(e, np.inf)).pvalue < 1e-10


@pytest.mark.parametrize(
    ("gm", "radius", "without", "with_cutoff"),
    # P(E > E_esc) for Na, U = 2 eV: without cut-off U(2E + U)/(E + U)^2, with one by quadrature; computed for this
    # project. Moon and Mercury.
    [(4902.800e9, 1737.4e3, 0.93669, 0.9334), (22031.868e9, 2439.4e3, 0.73136, 0.7189)],
)
def test_sputtered_share_above_escape_energy_is_the_known_one(gm, radius, without, with_cutoff):
    escape = gm * SODIUM / radius
    closed = BINDING * (2.0 * escape + BINDING) / (escape + BINDING) ** 2
    assert closed == pytest.approx(without, abs=6e-6)
    assert 1.0 - sputter_cdf(np.array([escape]), CUTOFF / BINDING)[0] == pytest.approx(with_cutoff, abs=6e-5)
    # The law inverts its distribution: its quantile at the share below E_esc is E_esc.
    for law, share in ((SigmundThompson(BINDING, None), closed), (SigmundThompson(BINDING, CUTOFF), None)):
        above = share or 1.0 - sputter_cdf(np.array([escape]), CUTOFF / BINDING)[0]
        assert law.energies(np.array([1.0 - above]))[0] == pytest.approx(escape, rel=2e-4)


def test_sputtering_quantiles_are_exact_and_rise():
    # Without cut-off P(E) = (E/(E + U))^2, so that E = U sqrt(P)/(1 - sqrt(P)).
    u = np.concatenate((np.geomspace(1e-12, 0.1, 50), np.linspace(0.101, 0.999999, 500)))
    energies = SigmundThompson(BINDING, None).energies(u)
    np.testing.assert_allclose(energies, BINDING * np.sqrt(u) / (1.0 - np.sqrt(u)), rtol=1e-9)
    assert np.all(np.diff(energies) > 0.0)


# ---- a table


def test_tabulated_speeds_follow_the_trapezoids_between_the_points():
    speed, pdf = np.array([0.0, 500.0, 900.0, 3000.0]), np.array([0.0, 2.0, 0.5, 0.0])

    def cdf(v: np.ndarray) -> np.ndarray:
        fine = np.linspace(0.0, 3000.0, 30_001)
        rise = np.concatenate(([0.0], np.cumsum(np.interp(0.5 * (fine[1:] + fine[:-1]), speed, pdf))))
        return np.interp(v, fine, rise / rise[-1])

    speeds = sample(Table(speed, pdf))
    assert kstest(speeds, cdf).pvalue > FALSE_ALARM
    # A table read as steps is another law.
    steps = rv_histogram((0.5 * (pdf[1:] + pdf[:-1]), speed), density=True)
    assert kstest(speeds, steps.cdf).pvalue < 1e-10


def test_table_of_the_flux_law_gives_the_flux_law():
    speed = np.linspace(0.0, 6000.0, 2001)
    law = Table(speed, speed**3 * np.exp(-0.5 * SODIUM * speed**2 / (BOLTZMANN * KELVIN)))
    assert kstest(thermal_energies(sample(law)), gamma(2.0).cdf).pvalue > FALSE_ALARM


# ---- means

"""Tables of quantiles give back each launch law to 1e-12, in the middle and in both tails."""

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import erfc, gamma, gammainccinv, gammaincinv

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.kernels.octaves import LEAST, PARTS, octave_quantiles
from tracer.physics.release.octave_table import octave_table
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.maxwell_gas import MaxwellGas
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson

MASS = 23.0 * ATOMIC_MASS
KELVIN = 1200.0
NOWHERE = np.array([np.nan])
RNG = np.random.default_rng(13)
LOWER = np.concatenate((RNG.uniform(0.0, 0.5, 2000), 2.0 ** -RNG.uniform(1.0, 81.0, 2000), [LEAST, 0.25]))
"""Even numbers below the middle, from the last that a table holds."""

ABOVE = np.concatenate(
    (
        np.ceil(2.0 ** (53.0 - RNG.uniform(1.0, 53.0, 2000))) * 2.0**-53,
        RNG.integers(1, 2**52, 2000) * 2.0**-53,
    )
)
"""1 - u above the middle: whole parts of 2^53, so that u itself is a float64."""


def energies(law, u: np.ndarray) -> np.ndarray:
    """Return m v^2/2 in kT."""
    return 0.5 * MASS * law.speeds(u, NOWHERE, MASS) ** 2 / (BOLTZMANN * KELVIN)


def test_flux_weighted_maxwellian_is_scipys_gamma_distribution():
    # scipy.special.gammaincinv and gammainccinv of shape 2: E/kT. The energy's error is twice the speed's.
    law = MaxwellFlux(KELVIN)
    np.testing.assert_allclose(energies(law, LOWER), gammaincinv(2.0, LOWER), rtol=1e-12)
    np.testing.assert_allclose(energies(law, 1.0 - ABOVE), gammainccinv(2.0, ABOVE), rtol=1e-12)
    # No other law's: a shape wrong by 1e-10 is seen.
    assert np.abs(energies(law, LOWER) / gammaincinv(2.0 + 1e-10, LOWER) - 1.0).max() > 1e-11


def test_maxwellian_of_a_gas_solves_its_distribution():
    # P(3/2, x) = x^(3/2) exp(-x) sum x^n/Gamma(n + 5/2) and Q(3/2, x) = erfc(sqrt x) + 2 sqrt(x/pi) exp(-x)
    # (Abramowitz & Stegun 1964, 6.5.29, 6.5.17 with recurrence 6.5.22: memory); all terms are positive.
    law = MaxwellGas(KELVIN)
    x = energies(law, LOWER)
    terms = np.arange(60)[:, np.newaxis]
    below = x**1.5 * np.exp(-x) * np.sum(x**terms / gamma(terms + 2.5), axis=0)
    # P rises as x^(3/2) at most.
    np.testing.assert_allclose(below, LOWER, rtol=1.5e-12)
    x = energies(law, 1.0 - ABOVE)
    above = erfc(np.sqrt(x)) + 2.0 * np.sqrt(x / np.pi) * np.exp(-x)
    # Q falls as exp(-x), x up to 40: its error is x times the energy's.
    assert np.max(np.abs(above / ABOVE - 1.0) / np.maximum(1.0, x)) < 1e-12


@pytest.mark.parametrize("cutoff", [1.2, 5.0, 1010.375, 1e6])
def test_sputtered_energies_solve_the_quadrature_of_their_law(cutoff):
    law = SigmundThompson(1.0, cutoff)

    # In w = (1 + y)^(-1/2), y = E/U: y/(1 + y)^3 [1 - ((1 + y)/c)^(1/2)] dy = 2 w (1 - w^2) [1 - c^(-1/2)/w] dw.
    def integral(low: float, high: float) -> float:
        last = cutoff**-0.5
        return quad(lambda w: 2.0 * (1.0 - w * w) * (w - last), low, high, epsrel=1e-13)[0]

    whole = integral(cutoff**-0.5, 1.0)
    for u in LOWER[(LOWER > 1e-9) & (LOWER < 0.5)][::40]:
        w = (1.0 + law.energies(np.array([u]))[0]) ** -0.5
        # 1 - w loses digits where it is small.
        assert integral(w, 1.0) == pytest.approx(u * whole, rel=1e-12 + 1e-15 / (1.0 - w))
    for above in ABOVE[ABOVE > 1e-9][::40]:
        w = (1.0 + law.energies(np.array([1.0 - above]))[0]) ** -0.5
        left = w - cutoff**-0.5
        assert integral(cutoff**-0.5, w) == pytest.approx(above * whole, rel=1e-12 + 1e-15 / left)


def test_sputtered_energies_without_cut_off_are_the_closed_ones():
    # P(E) = (E/(E + U))^2, so that E/U = r/(1 - r) with r^2 = u; above the middle 1 - r = (1 - u)/(1 + r).
    law = SigmundThompson(1.0, None)
    root = np.sqrt(LOWER)
    np.testing.assert_allclose(law.energies(LOWER), root / (1.0 - root), rtol=1e-12)
    root = np.sqrt(1.0 - ABOVE)
    np.testing.assert_allclose(law.energies(1.0 - ABOVE), root * (1.0 + root) / ABOVE, rtol=1e-12)


@pytest.mark.parametrize(
    ("law", "power"),
    [(MaxwellFlux(KELVIN), 0.25), (MaxwellGas(KELVIN), 1.0 / 3.0), (SigmundThompson(1e-19, 1e-17), 0.25)],
)
def test_ends_are_exact(law, power):
    def speed(u: float) -> float:
        return law.speeds(np.array([u]), NOWHERE, MASS)[0]

    assert speed(0.0) == 0.0
    # Far below all energies a law is a power; the next term is about the root of u.
    for u in (1e-30, 1e-100, 1e-300):
        assert speed(u) == pytest.approx(speed(LEAST) * (u / LEAST) ** power, rel=1e-12)
    fastest = speed(np.nextafter(1.0, 0.0))
    assert speed(1.0 - 2.0**-40) < fastest < np.inf
    if isinstance(law, SigmundThompson):
        assert fastest < speed(1.0) == pytest.approx(np.sqrt(2.0 * (1e-17 - 1e-19) / MASS), rel=1e-14)


def test_what_is_no_even_number_is_not_looked_up():
    table = octave_table(np.sqrt, lambda above: 2.0 - np.sqrt(above), 0.5, 2.0)
    found = octave_quantiles(table, np.array([np.nan, -0.5, 1.0, 1.5, np.inf]))
    assert np.isnan(found[:2]).all()
    assert found[2:].tolist() == [2.0, 2.0, 2.0]


@pytest.mark.parametrize("law", [MaxwellFlux(KELVIN), MaxwellGas(KELVIN), SigmundThompson(1e-19, 1e-17)])
def test_quantiles_rise_across_the_edges_of_parts(law):
    octaves = 2.0 ** -np.arange(1.0, 53.0)[:, np.newaxis] * (1.0 + np.arange(PARTS) / PARTS)
    edges = np.unique(np.concatenate((0.5 * octaves.ravel(), 1.0 - 0.5 * octaves[:-3].ravel())))
    just_below = law.speeds(np.nextafter(edges, 0.0), NOWHERE, MASS)
    # To the next float64 a quantile rises by less than rounding but very near to 1.
    at = law.speeds(edges, NOWHERE, MASS)
    inside = edges < 1.0 - 1e-4
    np.testing.assert_allclose(just_below[inside], at[inside], rtol=2e-13)
    assert np.all(np.diff(at) > 0.0)


def test_compiled_quantiles_are_those_of_the_source():
    table = octave_table(np.sqrt, lambda above: 2.0 - np.sqrt(above), 0.5, 2.0)
    u = np.concatenate((LOWER[:50], 1.0 - ABOVE[:50], [0.0, 0.5, 1e-60]))
    np.testing.assert_allclose(octave_quantiles(table, u), octave_quantiles.py_func(table, u), rtol=1e-15)

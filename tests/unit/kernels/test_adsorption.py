"""How long the ground holds an atom, where the atom is meanwhile, and how it leaves."""

from itertools import pairwise
from math import cos, exp, inf, log, nan, pi, sqrt

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import brentq
from scipy.stats import gamma, kstest

from tracer.constants import AVOGADRO, BOLTZMANN
from tracer.kernels.adsorption import (
    Adsorption,
    desorbed,
    log_hazard,
    photon_residence,
    residence,
    spread_along,
    stay,
)
from tracer.kernels.bounce import Surface
from tracer.kernels.quantiles import drawn_quantile, quantile_nodes
from tracer.kernels.sticking import Sticking
from tracer.kernels.temperature import QUARTER_POWER, UNIFORM, SurfaceTemperature
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson

ELECTRON_VOLT = 1.602176634e-19
"""[J], exact (SI 2019)."""
ARGON = 28e3 / AVOGADRO / BOLTZMANN
"""Energy of desorption of argon, 28 kJ/mol (Kegerreis et al. 2017), over k [K]."""
SODIUM = 1.85 * ELECTRON_VOLT / BOLTZMANN
DAY_AND_NIGHT = SurfaceTemperature(QUARTER_POWER, 390.0, 95.0)
SPIN = 2.0 * pi / (29.53 * 86400.0)
FALSE_ALARM = 1e-3


def held(binding_kelvin: float, photon_rate: float = 0.0, speeds=None, thermal: bool = False) -> Adsorption:
    table = np.zeros(2) if speeds is None else speeds
    return Adsorption(True, binding_kelvin, log(1e13), photon_rate, table, thermal)


def at(angle: float, latitude_cosine: float = 1.0) -> tuple[float, float, float]:
    """Return the unit vector at `angle` [rad] from noon towards dusk."""
    return (
        latitude_cosine * cos(angle),
        latitude_cosine * np.sin(angle),
        sqrt(1.0 - latitude_cosine**2),
    )


# exp(E/kT)/frequency (Frenkel 1924); E of argon 28 kJ/mol as in Kegerreis et al. 2017, of sodium 1.85 eV; own
# evaluation to four digits, frequency 1e13 s-1.
@pytest.mark.parametrize(
    ("binding", "kelvin", "seconds"),
    [(ARGON, 100.0, 42.21), (ARGON, 120.0, 0.1541), (SODIUM, 575.0, 1640.0), (SODIUM, 700.0, 2.086)],
)
@pytest.mark.parametrize("spin", [0.0, SPIN])
def test_residence_time_of_one_temperature_is_the_published_law(binding, kelvin, seconds, spin):
    law = SurfaceTemperature(UNIFORM, kelvin, kelvin)
    found = residence(law, held(binding), spin, at(1.0), 1.0, inf)
    assert found == pytest.approx(seconds, rel=3e-4)
    assert found == pytest.approx(exp(binding / kelvin) * 1e-13, rel=1e-12)
    # One deviate after another: exact for many turns as well as for an instant.
    assert residence(law, held(binding), spin, at(1.0), 1e-9, inf) == pytest.approx(1e-9 * found, rel=1e-9)
    assert residence(law, held(binding), spin, at(1.0), 1e6, inf) == pytest.approx(1e6 * found, rel=1e-9)


def time_by_quadrature(hazard, edges: list[float], gathered: float) -> float:
    """Return when the integral of `hazard` from the first edge on is `gathered`; the last edge if it never is."""
    left = gathered
    for start, end in pairwise(edges):
        # Half an hour of the morning takes argon from hours to microseconds: dense nodes there.
        for a, b in pairwise([start, *(start + (end - start) * np.geomspace(1e-9, 1.0, 40))]):
            grown = quad(hazard, a, b, epsrel=1e-10)[0]
            if grown >= left:
                return brentq(
                    lambda t, a=a, left=left: quad(hazard, a, t, epsrel=1e-10)[0] - left, a, b, xtol=1e-9
                )
            left -= grown
    return edges[-1]


@pytest.mark.parametrize("spin", [SPIN, -SPIN])
@pytest.mark.parametrize("latitude_cosine", [1.0, 0.2])
@pytest.mark.parametrize("angle", [-3.0, -1.7, 1.55, 1.6, 2.9])
@pytest.mark.parametrize(
    "binding", [ARGON, 0.32 * ELECTRON_VOLT / BOLTZMANN, 0.5 * ELECTRON_VOLT / BOLTZMANN]
)
def test_residence_on_turning_ground_is_that_of_quadrature(spin, latitude_cosine, angle, binding):
    adsorption = held(binding)
    turn = 2.0 * pi / abs(spin)

    def hazard(time: float) -> float:
        return exp(log_hazard(DAY_AND_NIGHT, adsorption, *at(angle + spin * time, latitude_cosine)))

    terminators = [(edge - angle) / spin % turn for edge in (-0.5 * pi, 0.5 * pi)]
    edges = sorted([0.0, *terminators, *(turn + time for time in terminators), 2.0 * turn])
    for gathered in (0.05, 1.0, 4.0):
        expected = time_by_quadrature(hazard, edges, gathered)
        found = residence(DAY_AND_NIGHT, adsorption, spin, at(angle, latitude_cosine), gathered, 2.0 * turn)
        assert found == pytest.approx(expected, rel=1e-3, abs=0.3)


def test_ground_that_holds_for_many_turns_is_integrated_once():
    # So cold and so strongly bound that noon gathers a hundredth: turns are skipped whole.
    law = SurfaceTemperature(QUARTER_POWER, 120.0, 40.0)
    adsorption = held(0.5 * ELECTRON_VOLT / BOLTZMANN)
    turn = 2.0 * pi / SPIN

    def hazard(time: float) -> float:
        return exp(log_hazard(law, adsorption, *at(2.0 + SPIN * time)))

    noons = [(k * pi - 2.0) / SPIN % turn for k in (-0.5, 0.0, 0.5)]
    a_turn = sum(quad(hazard, a, b, epsrel=1e-9)[0] for a, b in pairwise(noons))
    assert 0.0 < a_turn < 0.5
    one = residence(law, adsorption, SPIN, at(2.0), 0.5 * a_turn, inf)
    many = residence(law, adsorption, SPIN, at(2.0), 1000.5 * a_turn, inf)
    assert many - one == pytest.approx(1000.0 * turn, rel=1e-3)
    assert residence(law, adsorption, SPIN, at(2.0), 1000.5 * a_turn, 700.2 * turn) == 700.2 * turn


def test_ground_without_any_hazard_holds_to_the_limit():
    law = SurfaceTemperature(QUARTER_POWER, 6.0, 5.0)
    for spin in (0.0, SPIN, -1e-25):
        assert residence(law, held(SODIUM), spin, at(2.0), 1.0, 3e7) == 3e7


@pytest.mark.parametrize("spin", [SPIN, -SPIN])
@pytest.mark.parametrize("angle", [-3.0, -1.0, 0.3, 1.5, 2.0])
def test_desorption_by_sunlight_gathers_the_cosine_of_the_day(spin, angle):
    rate, turn = 3e-6, 2.0 * pi / abs(spin)
    for gathered in (1e-3, 1.0, 7.0):
        found = photon_residence(rate, spin, at(angle, 0.6), gathered, inf)
        turns = np.arange(0.0, found / turn + 1.0)
        edges = np.concatenate([(k * pi - angle) / spin % turn + turns * turn for k in (-0.5, 0.5)])
        edges = np.concatenate([[0.0], np.sort(edges[edges < found]), [found]])
        total = sum(
            quad(lambda t: rate * 0.6 * max(0.0, cos(angle + spin * t)), a, b)[0] for a, b in pairwise(edges)
        )
        assert total == pytest.approx(gathered, rel=1e-9)
    assert photon_residence(rate, spin, (0.0, 0.0, 1.0), 1.0, 5e9) == 5e9
    assert photon_residence(rate, 0.0, at(0.3), 1.0, inf) == pytest.approx(1.0 / (rate * cos(0.3)))
    assert photon_residence(rate, 0.0, at(2.0), 1.0, 5e9) == 5e9


def test_heat_and_sunlight_compete():
    # Still ground: rates h and p give stays of mean 1/(h + p), ended by light in the share p/(h + p).
    law = SurfaceTemperature(UNIFORM, 100.0, 100.0)
    heat = 1.0 / 42.21
    adsorption = held(ARGON, photon_rate=heat)
    rng = np.random.default_rng(5)
    stays = [stay(law, adsorption, 0.0, at(0.0), inf, rng) for _ in range(4000)]
    times, by_light = np.array([one[0] for one in stays]), np.array([one[1] for one in stays])
    assert abs(times.mean() * 2.0 * heat - 1.0) < 4.0 / sqrt(4000)
    assert abs(by_light.mean() - 0.5) < 4.0 * 0.5 / sqrt(4000)
    assert not any(stay(law, held(ARGON), 0.0, at(0.0), 1.0, rng)[1] for _ in range(100))


@pytest.mark.parametrize("way", [0.0, 1e-12, 0.1, 3.0, 29.0, -0.1, -3.0, -29.0])
@pytest.mark.parametrize("angle", [-pi, -1.0, 0.0, 0.26179938779914943, 3.0, pi])
def test_time_at_rest_is_spread_over_the_cells_that_are_passed(angle, way):
    cells = np.zeros(24)
    spread_along(cells, angle, way, 7.0)
    assert cells.sum() == pytest.approx(7.0, rel=1e-12)
    # Many points along the way, each in its cell.
    points = (angle + way * (np.arange(100_000) + 0.5) / 100_000 + pi) / (2.0 * pi) * 24.0
    expected = np.bincount(
        points.astype(int) % 24 if way >= 0.0 else np.floor(points).astype(int) % 24, minlength=24
    )
    if abs(way) > 1e-9:
        np.testing.assert_allclose(cells, 7.0 * expected / 100_000, atol=3e-3)
    else:
        assert cells.max() == 7.0


@pytest.mark.parametrize(
    "law", [MaxwellFlux(1200.0), SigmundThompson(2.0 * ELECTRON_VOLT, 300.0 * ELECTRON_VOLT)]
)
def test_table_of_quantiles_draws_the_law(law):
    mass = 3.8e-26
    table = law.speeds(quantile_nodes(), np.full(len(quantile_nodes()), np.nan), mass)
    rng, same = np.random.default_rng(8), np.random.default_rng(8)
    found = np.array([drawn_quantile(rng, table) for _ in range(5000)])
    np.testing.assert_allclose(found, law.speeds(same.random(5000), np.full(5000, np.nan), mass), rtol=2e-5)


def test_atoms_leave_with_the_temperature_of_the_ground():
    per_kelvin, rng = 416.0, np.random.default_rng(9)
    surface = Surface(
        SurfaceTemperature(UNIFORM, 150.0, 150.0), Sticking(1.0, nan, inf), 1.0, per_kelvin, SPIN
    )
    table = MaxwellFlux(None).speeds(
        quantile_nodes(), np.ones(len(quantile_nodes())), 2.0 * BOLTZMANN / per_kelvin
    )
    for by_light, warmth in ((False, 150.0), (True, 150.0)):
        adsorption = held(ARGON, 1.0, table, True)
        ways = np.array([desorbed(rng, surface, adsorption, 0.6, 0.0, 0.8, by_light) for _ in range(4000)])
        energies = (ways**2).sum(axis=1) / (per_kelvin * warmth)
        assert kstest(energies, gamma(2.0).cdf).pvalue > FALSE_ALARM
        up = ways @ [0.6, 0.0, 0.8] / np.linalg.norm(ways, axis=1)
        assert kstest(up**2, "uniform").pvalue > FALSE_ALARM

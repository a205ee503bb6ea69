"""What crosses the outer radius, bound or not, of a flux-weighted Maxwellian launch by the cosine law.

An atom reaches R_o where its radial speed there is real. With K = R/R_o, u the squared sine of the zenith angle at
launch (even in [0, 1] by the cosine law) that means E/kT > X = lambda (1 - K)/(1 - K^2 u), and E/kT follows the gamma
distribution of shape 2, so that the share is the integral over u of (1 + X) exp(-X). For K -> 0 it is Jeans's
(1 + lambda) exp(-lambda) (Jeans 1916; Chamberlain 1963, Planet. Space Sci. 11, 901).
"""

from math import exp

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import qmc

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.kernels.arc_flight import CROSSED
from tracer.kernels.hops import single_hops
from tracer.kernels.launching import velocities
from tracer.kernels.world import Motion
from tracer.physics.release.direction.cosine import Cosine
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux

RUN = """
title = "crossing fraction"
[body]
{body}
[gas]
species = "He"
[[release]]
name = "thermal"
rate = "1e24 s-1"
speed = {{ law = "maxwell-flux", temperature = "{kelvin!r} K" }}
[surface]
sticking = 1.0
[domain]
age_limit = "1e9 yr"
{outer}
[grid]
altitude = {{ first_cell = "100 km", top = "1 radii", cells = 1 }}
latitude_cells = 1
local_time_cells = 1
[ensemble]
particles_per_batch = {particles}
batches = 20
seed = 4711
"""
OWN = 'name = "Ball"\nradius = "1000 km"\ngm = "1000 km3 s-2"'
HELIUM = 4.002602 * ATOMIC_MASS


def crossing_fraction(jeans: float, ratio: float) -> float:
    def share(u: float) -> float:
        x = jeans * (1.0 - ratio) / (1.0 - ratio * ratio * u)
        return (1.0 + x) * exp(-x)

    return quad(share, 0.0, 1.0, epsabs=0.0, epsrel=1e-12)[0]


def own_body_kelvin(jeans: float) -> float:
    """Return the temperature at which helium on the body of `OWN` has the jeans parameter `jeans`."""
    return 1e12 * HELIUM / (BOLTZMANN * 1e6 * jeans)


def escaped_share(product) -> tuple[float, float]:
    """Return (share, its standard error) of the released atoms that escape."""
    share = product.ledger.sel(fate="escaped").item() / 1e24
    return share, product.ledger_standard_error.sel(fate="escaped").item() / 1e24


def test_formula_gives_the_known_fractions():
    # Jeans fractions (1 + lambda) exp(-lambda), computed for this project: 0.9097960 at 0.5, 0.1991483 at 3,
    # 4.993992e-4 at 10. The outer radius adds 8 % at lambda 3.4655 and 33.47 R, 43 % at 10 and 25 R.
    assert crossing_fraction(0.5, 0.0) == pytest.approx(0.9097960, rel=1e-7)
    assert crossing_fraction(3.0, 0.0) == pytest.approx(0.1991483, rel=3e-7)
    assert crossing_fraction(10.0, 0.0) == pytest.approx(4.993992e-4, rel=2e-7)
    assert crossing_fraction(3.4655, 1.0 / 33.467) / 0.139579 == pytest.approx(1.08, abs=0.005)
    assert crossing_fraction(10.0, 1.0 / 25.0) / 4.993992e-4 == pytest.approx(1.43, abs=0.005)


# Four standard errors of 20 batches, Student's t of 19 degrees of freedom: false alarm 8e-4 for each comparison.
# The standard error is below half a per cent, so that two per cent are four of them.


def test_moon_helium_crosses_the_hill_radius_as_the_integral_says(traced):
    product = traced(RUN.format(body='name = "Moon"', kelvin=392.0, outer="", particles=12_000))
    # Hill radius 384400 km (1 - 0.0549) (4902.800/(3 398600.4418))^(1/3) = 58146 km; JPL constants (memory).
    hill = 384400e3 * (1.0 - 0.0549) * (4902.800 / (3.0 * 398600.4418)) ** (1.0 / 3.0)
    assert hill == pytest.approx(58146e3, rel=1e-5)
    jeans = 4902.800e9 * HELIUM / (BOLTZMANN * 392.0 * 1737.4e3)
    expected = crossing_fraction(jeans, 1737.4e3 / hill)
    share, error = escaped_share(product)
    assert abs(share - expected) < 4.0 * error
    assert share == pytest.approx(expected, rel=0.02)
    # Without the outer radius (Chamberlain 1963) the share would be 8 % lower: refused.
    assert abs(share - crossing_fraction(jeans, 0.0)) > 8.0 * error


@pytest.mark.parametrize(("jeans", "particles"), [(1.0, 1_000), (3.0, 10_000), (5.0, 50_000)])
def test_far_outer_radius_gives_the_jeans_fraction(traced, jeans, particles):
    outer = 'outer_radius = "1e6 radii"'
    product = traced(RUN.format(body=OWN, kelvin=own_body_kelvin(jeans), outer=outer, particles=particles))
    share, error = escaped_share(product)
    # Jeans 1916; Chamberlain 1963; an outer radius of 1e6 R adds less than 1e-5 of it. An age limit of 1,000 years
    # would take 1e-3 of it, which the errors of stratified launches show: atoms that barely escape need longer.
    expected = (1.0 + jeans) * exp(-jeans)
    assert abs(share - expected) < 4.0 * error
    assert share == pytest.approx(expected, rel=0.02)


def test_bound_atoms_that_cross_count_as_escaped(traced):
    # One in 1,400 crosses, so that 2 % in a whole run needs 60 million launches (analysis/validation/
    # crossing-fractions); here four standard errors of about 3 % tell the integral from Jeans's 43 % less.
    outer = 'outer_radius = "25 radii"'
    product = traced(RUN.format(body=OWN, kelvin=own_body_kelvin(10.0), outer=outer, particles=80_000))
    share, error = escaped_share(product)
    assert abs(share - crossing_fraction(10.0, 1.0 / 25.0)) < 4.0 * error
    assert abs(share - crossing_fraction(10.0, 0.0)) > 6.0 * error


@pytest.mark.parametrize(("jeans", "outer"), [(3.4655, 33.467), (10.0, 25.0), (1.0, 2.0)])
def test_each_launch_crosses_exactly_where_the_integral_counts_it(jeans, outer):
    # A Sobol sequence of energy and angle above X(u = 0), the least energy that may cross, in place of chance:
    # its error is below 1e-3 of the share.
    ratio = 1.0 / outer
    least = jeans * (1.0 - ratio)
    above = (1.0 + least) * exp(-least)
    u = qmc.Sobol(2, seed=7).random_base2(16)
    speeds = MaxwellFlux(own_body_kelvin(jeans)).speeds(1.0 - above * (1.0 - u[:, 0]), np.zeros(1), HELIUM)
    ups = np.tile([0.0, 0.6, 0.8], (len(u), 1))
    motion = Motion(1e12, 1e6, 1e6 * outer, 0.0, 1e20, 0.0)
    launches = velocities(ups, speeds, Cosine(1.0).zenith_cosines(u[:, 1]), np.zeros(len(u)))
    endings = single_hops(motion, ups, launches)[0]
    assert above * np.mean(endings == CROSSED) == pytest.approx(crossing_fraction(jeans, ratio), rel=1e-3)

"""Ranges and times of thermal hops: flux-weighted Maxwellian, cosine law, on a sphere and in the flat limit.

The table was computed for this project by quadrature; here it is recomputed from the orbit formulas of a hop. Its arcs
are those that a flight sweeps about the centre, also beyond half a turn: for helium on the Moon the short way round
would take 11 % off the mean. On a sphere the mean time of bound hops diverges, period ~ (-E)^(-3/2): it is taken
over the hops whose apex stays inside the Hill radius.
"""

from collections.abc import Callable
from math import exp, pi, sqrt
from typing import NamedTuple

import numpy as np
import pytest
from scipy.special import gammainc, gammaincinv

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.kernels.arc_flight import CROSSED, LANDED
from tracer.kernels.hops import single_hops
from tracer.kernels.launching import velocities
from tracer.kernels.world import Motion
from tracer.physics.release.direction.cosine import Cosine
from tracer.physics.release.direction.isotropic import Isotropic
from tracer.physics.release.laws import DirectionLaw
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux

BATCHES, LAUNCHES = 100, 2_000
NODES = 1_000

Floats = np.ndarray


class Case(NamedTuple):
    """A thermal gas on a body, SI; `hill` is the Hill radius from the centre."""

    gm: float
    radius: float
    hill: float
    mass: float
    kelvin: float

    @property
    def jeans(self) -> float:
        return self.gm * self.mass / (BOLTZMANN * self.kelvin * self.radius)


MOON, MERCURY = (4902.800e9, 1737.4e3, 58_146e3), (22031.868e9, 2439.4e3, 175_297e3)
HE, H2O, AR, NA = (u * ATOMIC_MASS for u in (4.002602, 18.015, 39.9623831, 22.98976928))

# Mean, median and rms arc [km], mean time inside the Hill radius and median time [s], escape fraction: computed for
# this project by quadrature.
TABLE = {
    "Moon He 250 K": (Case(*MOON, HE, 250.0), (1680.4, 1071.2, 2421.9, 6184.0, 1993.5), 2.809e-2),
    "Moon H2O 250 K": (Case(*MOON, H2O, 250.0), (256.25, 191.79, 346.71, 633.7, 559.0), 6.1e-10),
    "Moon Ar 100 K": (Case(*MOON, AR, 100.0), (41.16, 32.59, 52.82, 229.4, 213.8), 0.0),
    "Mercury Na 1200 K": (Case(*MERCURY, NA, 1200.0), (434.98, 320.43, 599.04, 561.7, 487.1), 2.0e-8),
    "Mercury Na 3000 K": (Case(*MERCURY, NA, 3000.0), (1435.4, 909.2, 2184.7, 2089.0, 999.2), 2.262e-3),
}


class Hops(NamedTuple):
    """Launches, each (n,): ending, time [s], swept arc [rad], apex altitude [m], energy at launch [kT]."""

    ending: Floats
    time: Floats
    arc: Floats
    apex: Floats
    energy: Floats


def hops(case: Case, direction: DirectionLaw) -> Hops:
    count = BATCHES * LAUNCHES
    u = np.random.default_rng(20310601).random((count, 3))
    speed = MaxwellFlux(case.kelvin).speeds(u[:, 0], np.zeros(1), case.mass)
    cosine = direction.zenith_cosines(u[:, 1])
    up = np.tile([0.36, 0.48, -0.8], (count, 1))
    motion = Motion(case.gm, case.radius, 1e9 * case.radius, 0.0, np.inf, 0.0)
    ending, time, arc, apex = single_hops(motion, up, velocities(up, speed, cosine, 2.0 * pi * u[:, 2]))
    energy = 0.5 * case.mass * speed**2 / (BOLTZMANN * case.kelvin)
    return Hops(ending, time, arc, apex, energy)


def figures(case: Case, found: Hops) -> Floats:
    """Return the five figures of the table."""
    landed = found.ending == LANDED
    km = found.arc[landed] * case.radius / 1e3
    time = found.time[landed]
    inside = found.apex[landed] + case.radius < case.hill
    return np.array([km.mean(), np.median(km), sqrt((km**2).mean()), time[inside].mean(), np.median(time)])


def with_error(found: Hops, statistic: Callable[[Hops], Floats]) -> tuple[Floats, Floats]:
    """Return a statistic of all hops and its standard error from the scatter among BATCHES batches."""
    batches = [statistic(Hops(*(part[i::BATCHES] for part in found))) for i in range(BATCHES)]
    return statistic(found), np.std(batches, axis=0, ddof=1) / sqrt(BATCHES)


def quadrature(case: Case) -> Floats:
    """Return the five figures by the midpoint rule over energy and zenith angle of the bound launches."""
    t = (np.arange(NODES) + 0.5) / NODES
    # Nodes crowd towards the escape energy, where the time grows without bound.
    quantile, share = 1.0 - (1.0 - t) ** 6, 6.0 * (1.0 - t) ** 5
    energy = gammaincinv(2.0, quantile * gammainc(2.0, case.jeans))
    x = np.minimum(2.0 * energy / case.jeans, 2.0 * (1.0 - 1e-15))[:, None]  # v^2 R/GM
    sine2 = t[None, :]  # the cosine law makes sin^2 even
    arc = 2.0 * np.arctan2(x * np.sqrt(sine2 * (1.0 - sine2)), 1.0 - x * sine2)
    a = case.radius / (2.0 - x)
    e_sine = np.sqrt(x * (1.0 - sine2) * case.radius / a)
    eccentric = np.arctan2(e_sine, 1.0 - case.radius / a)
    time = 2.0 * np.sqrt(a**3 / case.gm) * (pi - eccentric + e_sine)
    inside = a * (1.0 + np.sqrt(np.maximum(0.0, 1.0 - x * sine2 * (2.0 - x)))) < case.hill
    weight = np.broadcast_to(share[:, None], arc.shape) / share.sum() / NODES
    km = arc * case.radius / 1e3
    return np.array(
        [
            (weight * km).sum(),
            _median(km, weight),
            sqrt((weight * km**2).sum()),
            (weight * time)[inside].sum() / weight[inside].sum(),
            _median(time, weight),
        ]
    )


def _median(values: Floats, weights: Floats) -> float:
    order = np.argsort(values, axis=None)
    reached = np.cumsum(weights.ravel()[order])
    return values.ravel()[order][np.searchsorted(reached, 0.5)]


@pytest.mark.parametrize("name", TABLE)
def test_hops_have_the_tables_statistics(name):
    case, table, escape = TABLE[name]
    expected = quadrature(case)
    np.testing.assert_allclose(expected, table, rtol=1e-3)
    found = hops(case, Cosine(1.0))
    figure, error = with_error(found, lambda some: figures(case, some))
    # 100 batches, Student's t of 99 degrees of freedom: false alarm 1.2e-4 each, 3e-3 for the 25 figures.
    assert np.all(np.abs(figure - expected) < 4.0 * error)
    np.testing.assert_allclose(figure, expected, rtol=0.02)
    # Escape: (1 + lambda) exp(-lambda), Jeans 1916; the table prints two to four digits.
    fraction = (1.0 + case.jeans) * exp(-case.jeans)
    assert fraction == pytest.approx(escape, rel=3e-3, abs=1e-15)
    crossed = np.mean(found.ending == CROSSED)
    assert abs(crossed - fraction) <= 4.0 * sqrt(fraction / len(found.ending))


def test_short_way_round_fails_the_table():
    case, table, _ = TABLE["Moon He 250 K"]
    found = hops(case, Cosine(1.0))
    short = found._replace(arc=np.minimum(found.arc, 2.0 * pi - found.arc))
    figure, error = with_error(short, lambda some: figures(case, some))
    assert table[0] - figure[0] > 20.0 * error[0]


# ---- flat limit: mean range pi H, rms range 4 H, mean time sqrt(2 pi H/g), mean apex H, mean launch energy 2 kT
# (elementary integrals of ballistic hops over the law; computed for this project). At lambda 1e5 the sphere changes
# them by some 1e-5.

FLAT = Case(1e12, 1e6, np.inf, 1e5 * BOLTZMANN * 300.0 * 1e6 / 1e12, 300.0)
FLAT_LIMITS = np.array([pi, 4.0, sqrt(2.0 * pi), 1.0, 2.0])


def flat_figures(found: Hops) -> Floats:
    """Return mean range and rms range [H], mean time [sqrt(H/g)], mean apex [H] and mean launch energy [kT]."""
    height = FLAT.radius / FLAT.jeans
    km = found.arc * FLAT.radius / height
    time = found.time / sqrt(height * FLAT.radius**2 / FLAT.gm)
    return np.array(
        [km.mean(), sqrt((km**2).mean()), time.mean(), found.apex.mean() / height, found.energy.mean()]
    )


def test_flat_limits_of_thermal_hops():
    assert pytest.approx(1e5) == FLAT.jeans
    figure, error = with_error(hops(FLAT, Cosine(1.0)), flat_figures)
    assert np.all(np.abs(figure - FLAT_LIMITS) < 4.0 * error)
    np.testing.assert_allclose(figure, FLAT_LIMITS, rtol=0.02)


def test_isotropic_launches_fail_the_flat_limits():
    figure, error = with_error(hops(FLAT, Isotropic()), flat_figures)
    assert np.all(np.abs(figure[:4] - FLAT_LIMITS[:4]) > 10.0 * error[:4])

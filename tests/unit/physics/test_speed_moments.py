"""Densities of speed laws agree with the speeds that the laws draw, and their moments with sums over quantiles."""

import numpy as np
import pytest

from tracer.constants import ATOMIC_MASS
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.maxwell_gas import MaxwellGas
from tracer.physics.release.speed.ramp import Ramp
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson
from tracer.physics.release.speed.table import Table
from tracer.physics.release.speed_bins import speed_bin_edges
from tracer.physics.release.speed_moments import legendre_moments

SODIUM = 22.98977 * ATOMIC_MASS
EV = 1.602176634e-19
LAWS = (
    MaxwellFlux(1200.0),
    MaxwellGas(1200.0),
    SigmundThompson(2.0 * EV, 2020.75 * EV),
    SigmundThompson(2.0 * EV, None),
    Table(np.array([500.0, 900.0, 1000.0, 4000.0]), np.array([0.0, 3.0, 1.0, 0.0])),
)
EDGES = np.array([0.0, 300.0, 800.0, 950.0, 1500.0, 3000.0, 9000.0, 60_000.0])
QUANTILES = 2_000_000


@pytest.fixture(scope="module", params=LAWS, ids=lambda law: type(law).__name__)
def quantiles(request):
    """Return a law and its speeds at even quantiles."""
    u = (np.arange(QUANTILES) + 0.5) / QUANTILES
    return request.param, request.param.speeds(u, np.full(QUANTILES, np.nan), SODIUM)


def test_moments_are_those_of_the_quantiles(quantiles):
    law, speeds = quantiles
    moments = legendre_moments(law, EDGES, SODIUM, 3)
    place = np.searchsorted(EDGES, speeds, side="right") - 1
    for j in range(len(EDGES) - 1):
        inside = speeds[place == j]
        x = 2.0 * (inside - EDGES[j]) / (EDGES[j + 1] - EDGES[j]) - 1.0
        sums = [np.sum(p) / QUANTILES for p in (np.ones_like(x), x, 1.5 * x * x - 0.5)]
        # A quantile at an edge counts whole.
        assert moments[j] == pytest.approx(sums, abs=3.0 / QUANTILES)


@pytest.mark.parametrize("speed", [0.0, 700.0, 2500.0, 10_000.0])
def test_share_above_is_that_of_the_quantiles(quantiles, speed):
    law, speeds = quantiles
    assert law.share_above(speed, SODIUM) == pytest.approx(np.mean(speeds > speed), abs=1.0 / QUANTILES)


def test_ramps_rise_and_fall_through_their_bin():
    u = (np.arange(100_000) + 0.5) / 100_000
    nowhere = np.full(len(u), np.nan)
    for rising, sign in ((True, 1.0), (False, -1.0)):
        speeds = Ramp(np.array(200.0), np.array(600.0), np.array(rising)).speeds(u, nowhere, SODIUM)
        assert np.all(np.diff(speeds) > 0.0)
        x = (speeds - 400.0) / 200.0
        # Of the density (1 + s x)/2 on (-1, 1): mean s/3, mean square 1/3, mean cube s/5.
        assert [np.mean(x**k) for k in (1, 2, 3)] == pytest.approx([sign / 3, 1 / 3, sign / 5], abs=1e-4)


@pytest.mark.parametrize("bins", [8, 32, 100])
@pytest.mark.parametrize(
    ("escape", "slow"), [(4250.0, 1206.0), (2380.0, 900.0), (9.0, 1000.0), (0.0, 800.0), (5e4, 200.0)]
)
def test_bins_rise_from_zero_with_an_edge_at_escape(bins, escape, slow):
    edges = speed_bin_edges(bins, escape, slow, 3.0 * slow)
    assert len(edges) == bins + 1
    assert edges[0] == 0.0
    assert np.all(np.diff(edges) > 0.0)
    assert escape in edges
    assert edges[-1] >= max(20.0 * escape, 40.0 * slow, 3.0 * slow)


def test_bins_are_narrow_where_the_atoms_are_and_about_escape():
    # Sodium of 1,200 K over Mercury: most probable speed 931 m/s, escape at 4,250 m/s.
    edges = speed_bin_edges(32, 4250.0, 1206.0, 3000.0)
    below = edges[edges <= 4250.0]
    assert np.diff(below).max() < 0.6 * 931.0
    # In units of kT: a Maxwellian falls by less than a factor of 4 through a bin.
    assert np.diff((below / 931.0) ** 2).max() < np.log(4.0)
    at = int(np.flatnonzero(edges == 4250.0)[0])
    assert edges[at + 1] - edges[at] < 0.06 * 4250.0

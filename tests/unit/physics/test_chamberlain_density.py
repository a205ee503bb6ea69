"""Density above an even thermal ground, Chamberlain 1963, Planet. Space Sci. 11, 901, against the phase space."""

from itertools import pairwise
from math import exp, pi, sqrt

import numpy as np
import pytest
from scipy.integrate import quad

from tracer.constants import BOLTZMANN
from tracer.physics.chamberlain import base_density, density_ratio


@pytest.mark.parametrize(
    ("radii", "ballistic", "escaping"),
    [
        (1.1, 0.59231, 6.035e-3),
        (1.5, 0.14573, 3.017e-3),
        (2.0, 0.047686, 1.752e-3),
        (3.0, 0.011803, 8.494e-4),
        (5.0, 0.0024294, 3.478e-4),
    ],
)
def test_chamberlains_density_is_that_of_the_phase_space(radii, ballistic, escaping):
    # lambda_c = 5, after Chamberlain 1963, Planet. Space Sci. 11, 901: own quadrature, five digits.
    assert density_ratio(5.0, radii) == pytest.approx(ballistic + escaping, rel=5e-5)
    lam = 5.0 / radii

    def share(w):
        # A Maxwellian at the ground, followed along energy and angular momentum; bound atoms pass twice.
        reach = min(1.0, (1.0 + 5.0 * (1.0 - 1.0 / radii) / (w * w)) / radii**2)
        passes = 2.0 if w * w < lam else 1.0
        return passes * 2.0 * pi * (1.0 - sqrt(1.0 - reach)) * w * w * exp(-w * w)

    kink = sqrt(5.0 * (1.0 - 1.0 / radii) / (radii**2 - 1.0))
    ends = sorted({0.0, min(kink, sqrt(lam)), sqrt(lam), 30.0})
    total = sum(quad(share, low, high, limit=400)[0] for low, high in pairwise(ends))
    assert density_ratio(5.0, radii) == pytest.approx(exp(lam - 5.0) * pi**-1.5 * total, rel=1e-7)


@pytest.mark.parametrize("jeans", [0.01, 1.0, 30.0, 500.0])
def test_density_falls_from_just_below_the_base_and_never_turns_negative(jeans):
    radii = np.linspace(1.0, 20.0, 400)
    found = density_ratio(jeans, radii)
    assert 0.5 <= found[0] <= 1.0
    assert np.all(found >= 0.0)
    assert np.all(np.diff(found) <= 0.0)


def test_base_density_launches_the_flux():
    # A gas at rest sends n v_mean/4 through a plane: n_c = 4 Phi/v_mean, v_mean = sqrt(8kT/(pi m)).
    mass, kelvin = 6.6e-27, 400.0
    mean_speed = sqrt(8.0 * BOLTZMANN * kelvin / (pi * mass))
    assert base_density(1e12, kelvin, mass) == pytest.approx(4e12 / mean_speed)

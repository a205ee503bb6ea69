"""Flux-weighted Maxwellian: what leaves a surface in thermal equilibrium."""

from typing import NamedTuple

import numpy as np

from tracer.constants import BOLTZMANN
from tracer.physics.release.laws import Floats
from tracer.physics.thermal import most_probable_speed

NEWTON_STEPS = 3
"""From the first guess, at most 1.2 % off, three steps reach rounding."""

SERIES_LIMIT = 1e-3
"""Square root of twice the exponent below which the series is used: Newton's difference would cancel."""


class MaxwellFlux(NamedTuple):
    """pdf(v) ~ v^3 exp(-m v^2 / 2kT); `temperature` [K], or None for the ground's own.

    The energy in units of kT follows the gamma distribution of shape 2. With the cosine law of directions it is the
    only law whose density above the ground is barometric (Schorghofer 2020, arXiv:1810.00165).
    """

    temperature: float | None

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1]; see `SpeedLaw`."""
        kelvin = surface_temperature if self.temperature is None else self.temperature
        return np.asarray(np.sqrt(2.0 * BOLTZMANN * kelvin / mass * energies(u)))

    def density(self, speeds: Floats, mass: float) -> Floats:
        """Return the probability density [s m-1]; see `SpeedDensity`."""
        most_probable = speed_scale(self.temperature, mass)
        w = speeds / most_probable
        return np.asarray(2.0 * w**3 * np.exp(-w * w) / most_probable)

    def share_above(self, speed: float, mass: float) -> float:
        """Return the probability (1 + x) exp(-x) of a speed above `speed` [m s-1], x = m v^2/(2kT)."""
        x = (speed / speed_scale(self.temperature, mass)) ** 2
        return float((1.0 + x) * np.exp(-x))

    def kinks(self) -> Floats:
        """Return no speeds; see `SpeedDensity`."""
        return np.empty(0)


def speed_scale(temperature: float | None, mass: float) -> float:
    """Return sqrt(2kT/m) [m s-1] of a gas; ValueError where the law takes the ground's temperature."""
    if temperature is None:
        raise ValueError("a law that takes the ground's temperature has no density of its own")
    return most_probable_speed(temperature, mass)


def energies(u: Floats) -> Floats:
    """Return the energies x [kT], (n,), at the quantiles `u`, (n,): 1 - u = (1 + x) exp(-x), to 1e-12.

    With y = -ln(1 - u) this is x - ln(1 + x) = y, of which small x is s + s^2/3 + s^3/36 - s^4/270, s^2 = 2 y.
    """
    y = -np.log1p(-u)
    s = np.sqrt(2.0 * y)
    x = y + np.log1p(s + (2.0 / 3.0) * y)
    series = s * (1.0 + s * (1.0 / 3.0 + s * (1.0 / 36.0 - s / 270.0)))
    small = s < SERIES_LIMIT
    x[small] = SERIES_LIMIT
    for _ in range(NEWTON_STEPS):
        x -= (x - np.log1p(x) - y) * (1.0 + x) / x
    x[small] = series[small]
    return np.asarray(x)

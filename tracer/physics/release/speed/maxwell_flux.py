"""Flux-weighted Maxwellian: what leaves a surface in thermal equilibrium."""

from functools import cache
from typing import NamedTuple

import numpy as np

from tracer.constants import BOLTZMANN
from tracer.kernels.octaves import OctaveTable, octave_quantiles
from tracer.physics.release.laws import Floats
from tracer.physics.release.octave_table import octave_table
from tracer.physics.thermal import most_probable_speed

NEWTON_STEPS = 3
"""From the first guess, at most 1.2 % off, three steps reach rounding."""

SERIES = (1.0, 1.0 / 3.0, 1.0 / 36.0, -1.0 / 270.0, 1.0 / 4320.0, 1.0 / 17010.0, -139.0 / 5443200.0)
"""Coefficients of s, s^2, ... of a small energy, see `_energies_at`: they make x - ln(1 + x) = s^2/2 hold."""

SERIES_LIMIT = 0.03
"""Where s is smaller the series is used, good to 1e-16 there: Newton's difference would cancel."""


class MaxwellFlux(NamedTuple):
    """pdf(v) ~ v^3 exp(-m v^2 / 2kT); `temperature` [K], or None for the ground's own.

    The energy in units of kT follows the gamma distribution of shape 2. With the cosine law of directions it is the
    only law whose density above the ground is barometric (Schorghofer 2020, arXiv:1810.00165).
    """

    temperature: float | None

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1]; see `SpeedLaw`."""
        kelvin = surface_temperature if self.temperature is None else self.temperature
        found = np.asarray(octave_quantiles(_root_energies(), np.ascontiguousarray(u)))
        found *= np.sqrt(2.0 * BOLTZMANN * kelvin / mass)
        return found

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
    """Return the energies x [kT], (n,), at the quantiles `u`, (n,): 1 - u = (1 + x) exp(-x)."""
    return _energies_at(-np.log1p(-u))


def _energies_at(y: Floats) -> Floats:
    """Return the energies x [kT], (n,), to 1e-14, where `y`, (n,), is x - ln(1 + x) = -ln(1 - u)."""
    s = np.sqrt(2.0 * y)
    x = y + np.log1p(s + (2.0 / 3.0) * y)
    small = s < SERIES_LIMIT
    x[small] = SERIES_LIMIT
    for _ in range(NEWTON_STEPS):
        x -= (x - np.log1p(x) - y) * (1.0 + x) / x
    x[small] = s[small] * np.polynomial.polynomial.polyval(s[small], SERIES)
    return np.asarray(x)


@cache
def _root_energies() -> OctaveTable:
    """Return the table of sqrt(x), the speed in most probable ones of a gas; near 0 it is (2 u)^(1/4)."""
    return octave_table(
        lambda u: np.sqrt(energies(u)), lambda above: np.sqrt(_energies_at(-np.log(above))), 0.25, np.inf
    )

"""Maxwellian of a gas at rest: the speeds inside a volume, not those that leave a surface."""

from typing import NamedTuple

import numpy as np
from scipy.special import gammaincc, gammaincinv

from tracer.constants import BOLTZMANN
from tracer.physics.release.laws import Floats
from tracer.physics.release.speed.maxwell_flux import speed_scale


class MaxwellGas(NamedTuple):
    """pdf(v) ~ v^2 exp(-m v^2 / 2kT); `temperature` [K], or None for the ground's own.

    Offered because publications launch with it; its density above the ground is not barometric.
    """

    temperature: float | None

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1]; see `SpeedLaw`."""
        kelvin = surface_temperature if self.temperature is None else self.temperature
        return np.asarray(np.sqrt(2.0 * BOLTZMANN * kelvin / mass * gammaincinv(1.5, u)))

    def density(self, speeds: Floats, mass: float) -> Floats:
        """Return the probability density [s m-1]; see `SpeedDensity`."""
        most_probable = speed_scale(self.temperature, mass)
        w = speeds / most_probable
        return np.asarray(4.0 / np.sqrt(np.pi) * w * w * np.exp(-w * w) / most_probable)

    def share_above(self, speed: float, mass: float) -> float:
        """Return the probability of a speed above `speed` [m s-1]: the energy follows a gamma distribution of 3/2."""
        return float(gammaincc(1.5, (speed / speed_scale(self.temperature, mass)) ** 2))

    def kinks(self) -> Floats:
        """Return no speeds; see `SpeedDensity`."""
        return np.empty(0)

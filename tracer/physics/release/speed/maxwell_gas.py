"""Maxwellian of a gas at rest: the speeds inside a volume, not those that leave a surface."""

from typing import NamedTuple

import numpy as np
from scipy.special import gammaincinv

from tracer.constants import BOLTZMANN
from tracer.physics.release.laws import Floats


class MaxwellGas(NamedTuple):
    """pdf(v) ~ v^2 exp(-m v^2 / 2kT); `temperature` [K], or None for the ground's own.

    Offered because publications launch with it; its density above the ground is not barometric.
    """

    temperature: float | None

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1]; see `SpeedLaw`."""
        kelvin = surface_temperature if self.temperature is None else self.temperature
        return np.asarray(np.sqrt(2.0 * BOLTZMANN * kelvin / mass * gammaincinv(1.5, u)))

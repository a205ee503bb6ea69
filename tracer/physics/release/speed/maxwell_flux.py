"""Flux-weighted Maxwellian: what leaves a surface in thermal equilibrium."""

from typing import NamedTuple

import numpy as np
from scipy.special import gammaincinv

from tracer.constants import BOLTZMANN
from tracer.physics.release.laws import Floats


class MaxwellFlux(NamedTuple):
    """pdf(v) ~ v^3 exp(-m v^2 / 2kT); `temperature` [K], or None for the ground's own.

    The energy in units of kT follows the gamma distribution of shape 2. With the cosine law of directions it is the
    only law whose density above the ground is barometric (Schorghofer 2020, arXiv:1810.00165).
    """

    temperature: float | None

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1]; see `SpeedLaw`."""
        kelvin = surface_temperature if self.temperature is None else self.temperature
        return np.asarray(np.sqrt(2.0 * BOLTZMANN * kelvin / mass * gammaincinv(2.0, u)))

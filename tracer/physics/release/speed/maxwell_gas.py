"""Maxwellian of a gas at rest: the speeds inside a volume, not those that leave a surface."""

from functools import cache
from typing import NamedTuple

import numpy as np
from scipy.special import gammaincc, gammainccinv, gammaincinv

from tracer.constants import BOLTZMANN
from tracer.kernels.octaves import OctaveTable, octave_quantiles
from tracer.physics.release.laws import Floats
from tracer.physics.release.octave_table import octave_table
from tracer.physics.release.speed.maxwell_flux import speed_scale


class MaxwellGas(NamedTuple):
    """pdf(v) ~ v^2 exp(-m v^2 / 2kT); `temperature` [K], or None for the ground's own.

    Offered because publications launch with it; its density above the ground is not barometric.
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
        return np.asarray(4.0 / np.sqrt(np.pi) * w * w * np.exp(-w * w) / most_probable)

    def share_above(self, speed: float, mass: float) -> float:
        """Return the probability of a speed above `speed` [m s-1]: the energy follows a gamma distribution of 3/2."""
        return float(gammaincc(1.5, (speed / speed_scale(self.temperature, mass)) ** 2))

    def kinks(self) -> Floats:
        """Return no speeds; see `SpeedDensity`."""
        return np.empty(0)


@cache
def _root_energies() -> OctaveTable:
    """Return the table of the speed in most probable ones; near 0 it is (3 sqrt(pi)/4 u)^(1/3)."""
    return octave_table(
        lambda u: np.sqrt(gammaincinv(1.5, u)),
        lambda above: np.sqrt(gammainccinv(1.5, above)),
        1.0 / 3.0,
        np.inf,
    )

"""Energies of sputtered atoms."""

from functools import lru_cache
from typing import NamedTuple

import numpy as np

from tracer.physics.release.laws import Floats

TABLE_POINTS = 4001
"""Points of the inverse distribution from which the Newton steps start."""

LARGEST = 1e17
"""Energy in binding energies below which the last quantile that a double can name lies, without a cut-off."""

NEWTON_STEPS = 4
"""From the table's interpolation two steps reach rounding; two more cost little."""


class SigmundThompson(NamedTuple):
    """f(E) ~ E/(E + U)^3 [1 - sqrt((E + U)/E_max)] for 0 <= E <= E_max - U, a flux law.

    `binding_energy` U and `cutoff_energy` E_max in joules; E_max None means no cut-off. Sigmund 1969, Phys. Rev. 184,
    383; Thompson 1968, Phil. Mag. 18, 377; cut-off as in Wurz & Lammer 2003, Icarus 164, 1 (memory). The closed
    normalisation often printed with it is off at low cut-off; here the distribution is normalised over its own range.
    """

    binding_energy: float
    cutoff_energy: float | None

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1]; see `SpeedLaw`."""
        return np.sqrt(2.0 * self.energies(u) / mass)

    def energies(self, u: Floats) -> Floats:
        """Return energies [J] at the quantiles `u` in [0, 1), (n,)."""
        return self.binding_energy * _reduced_energies(u, self._cutoff)

    def density(self, speeds: Floats, mass: float) -> Floats:
        """Return the probability density [s m-1]; see `SpeedDensity`."""
        y = 0.5 * mass * speeds * speeds / self.binding_energy
        slope = mass * speeds / self.binding_energy
        inside = y <= self._cutoff - 1.0
        return np.where(inside, _density(y, self._cutoff) * slope / self._total, 0.0)

    def share_above(self, speed: float, mass: float) -> float:
        """Return the probability of a speed above `speed` [m s-1]; see `SpeedDensity`."""
        y = min(0.5 * mass * speed * speed / self.binding_energy, self._cutoff - 1.0)
        return 1.0 - float(cumulative(np.array([y]), self._cutoff)[0]) / self._total

    def kinks(self) -> Floats:
        """Return no speeds; see `SpeedDensity`."""
        return np.empty(0)

    @property
    def _cutoff(self) -> float:
        """Largest energy in binding energies."""
        return np.inf if self.cutoff_energy is None else self.cutoff_energy / self.binding_energy

    @property
    def _total(self) -> float:
        top = np.array([min(self._cutoff - 1.0, LARGEST)])
        return float(cumulative(top, self._cutoff)[0])


def cumulative(y: Floats, cutoff: float) -> Floats:
    """Return the integral from 0 to `y` of y'/(1 + y')^3 [1 - sqrt((1 + y')/c)], y = E/U, c = E_max/U.

    With x = 1 + y the integrand is x^-2 - x^-3 - c^-1/2 (x^-3/2 - x^-5/2), whose antiderivative is elementary.
    """
    root = np.sqrt(1.0 + y)
    # Written with y in front: the plain difference of antiderivatives cancels for small y.
    whole = 0.5 * (y / (1.0 + y)) ** 2
    h = y / (1.0 + root)  # sqrt(1 + y) - 1
    half = 2.0 * h / root - (2.0 / 3.0) * h * (1.0 + root + root * root) / root**3
    return np.asarray(whole - half / np.sqrt(cutoff))


def _density(y: Floats, cutoff: float) -> Floats:
    return y / (1.0 + y) ** 3 * (1.0 - np.sqrt((1.0 + y) / cutoff))


@lru_cache(maxsize=8)
def _table(cutoff: float) -> tuple[Floats, Floats]:
    """Return (probability, y) along the distribution, dense at both ends."""
    top = min(cutoff - 1.0, LARGEST)
    y = np.concatenate(([0.0], np.geomspace(1e-9 * min(1.0, top), top, TABLE_POINTS)))
    probability = cumulative(y, cutoff)
    probability /= probability[-1]
    rising = np.concatenate(([True], np.diff(np.maximum.accumulate(probability)) > 0.0))
    return probability[rising], y[rising]


def _reduced_energies(u: Floats, cutoff: float) -> Floats:
    probability, table = _table(cutoff)
    total = float(cumulative(table[-1:], cutoff)[0])
    above = np.clip(np.searchsorted(probability, u, side="right"), 1, len(table) - 1)
    low, high = table[above - 1], table[above]
    y = np.interp(u, probability, table)
    for _ in range(NEWTON_STEPS):
        slope = np.maximum(_density(y, cutoff), np.finfo(float).tiny)
        y = np.clip(y - (cumulative(y, cutoff) - u * total) / slope, low, high)
    return y

"""Energies of sputtered atoms."""

from functools import lru_cache
from typing import NamedTuple

import numpy as np

from tracer.kernels.octaves import OctaveTable, octave_quantiles
from tracer.physics.release.laws import Floats
from tracer.physics.release.octave_table import octave_table

NEWTON_STEPS = 7
"""From the first guess, at most a third off below a probability of 1/2, five reach rounding."""


class SigmundThompson(NamedTuple):
    """f(E) ~ E/(E + U)^3 [1 - sqrt((E + U)/E_max)] for 0 <= E <= E_max - U, a flux law.

    `binding_energy` U and `cutoff_energy` E_max in joules; E_max None means no cut-off. Sigmund 1969, Phys. Rev. 184,
    383; Thompson 1968, Phil. Mag. 18, 377; cut-off as in Wurz & Lammer 2003, Icarus 164, 1 (memory). The closed
    normalisation often printed with it is off at low cut-off; here the distribution is normalised over its own range.

    With y = E/U, c = E_max/U, w = (1 + y)^-1/2, which falls from 1 to w_c = c^-1/2, and d = 1 - w_c, the integral of
    y/(1 + y)^3 [1 - sqrt((1 + y)/c)] is in proportion to powers of e = (1 - w)/d and f = (w - w_c)/d, both from 0 to 1:

    e^2 [12 - (8 + 4 d) e + 3 d e^2] below y, f^2 [6 (2 - d) - 8 (1 - d) f - 3 d f^2] above it, 4 - d in all.
    """

    binding_energy: float
    cutoff_energy: float | None

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1]; see `SpeedLaw`."""
        found = np.asarray(octave_quantiles(_roots(self._cutoff), np.ascontiguousarray(u)))
        found *= np.sqrt(2.0 * self.binding_energy / mass)
        return found

    def energies(self, u: Floats) -> Floats:
        """Return energies [J] at the quantiles `u` in [0, 1), (n,)."""
        return np.asarray(self.binding_energy * octave_quantiles(_roots(self._cutoff), u) ** 2)

    def density(self, speeds: Floats, mass: float) -> Floats:
        """Return the probability density [s m-1]; see `SpeedDensity`."""
        cutoff = self._cutoff
        y = 0.5 * mass * speeds * speeds / self.binding_energy
        slope = mass * speeds / self.binding_energy
        inside = y <= cutoff - 1.0
        shape = y / (1.0 + y) ** 3 * (1.0 - np.sqrt((1.0 + y) / cutoff))
        depth = _depth(cutoff)
        return np.where(inside, shape * slope / (depth**3 * (4.0 - depth) / 6.0), 0.0)

    def share_above(self, speed: float, mass: float) -> float:
        """Return the probability of a speed above `speed` [m s-1]; see `SpeedDensity`."""
        cutoff = self._cutoff
        y = min(0.5 * mass * speed * speed / self.binding_energy, cutoff - 1.0)
        d = _depth(cutoff)
        f = float((1.0 + y) ** -0.5 - cutoff**-0.5) / d
        return f * f * (6.0 * (2.0 - d) - f * (8.0 * (1.0 - d) + 3.0 * d * f)) / (4.0 - d)

    def kinks(self) -> Floats:
        """Return no speeds; see `SpeedDensity`."""
        return np.empty(0)

    @property
    def _cutoff(self) -> float:
        """Largest energy in binding energies."""
        return np.inf if self.cutoff_energy is None else self.cutoff_energy / self.binding_energy


def _depth(cutoff: float) -> float:
    """Return 1 - c^-1/2, with all digits where the cut-off is low."""
    return 1.0 if np.isinf(cutoff) else (cutoff - 1.0) / (cutoff + np.sqrt(cutoff))


@lru_cache(maxsize=8)
def _roots(cutoff: float) -> OctaveTable:
    """Return the table of sqrt(y), in proportion to the speed; at small u it goes as u^1/4."""
    d = _depth(cutoff)

    def lower(u: Floats) -> Floats:
        risen = d * _inverse((12.0, -(8.0 + 4.0 * d), 3.0 * d), (4.0 - d) * u)
        return np.asarray(np.sqrt(risen * (2.0 - risen)) / (1.0 - risen))

    def upper(above: Floats) -> Floats:
        f = _inverse((6.0 * (2.0 - d), -8.0 * (1.0 - d), -3.0 * d), (4.0 - d) * above)
        w = cutoff**-0.5 + d * f
        return np.asarray(np.sqrt(d * (1.0 - f) * (1.0 + w)) / w)

    return octave_table(lower, upper, 0.25, np.sqrt(cutoff - 1.0))


def _inverse(coefficients: tuple[float, float, float], target: Floats) -> Floats:
    """Return x from 0 to 1 for which x^2 (a + b x + c x^2) is `target`, by Newton's method on the root of both."""
    a, b, c = coefficients
    x = np.sqrt(target / a)
    for _ in range(NEWTON_STEPS):
        p = a + x * (b + c * x)
        x -= (x * p - np.sqrt(target * p)) / (p + x * (0.5 * b + c * x))
    return np.asarray(x)

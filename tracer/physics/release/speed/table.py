"""A launch-speed distribution given as a table."""

from typing import NamedTuple

import numpy as np

from tracer.kernels.trapezoids import trapezoid_quantiles
from tracer.physics.release.laws import Floats


class Table(NamedTuple):
    """A flux pdf, linear between the points (`speed` [m s-1], `pdf`), zero outside; any normalisation."""

    speed: Floats
    pdf: Floats

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1] by inverting the piecewise quadratic distribution exactly; see `SpeedLaw`."""
        steps = 0.5 * np.diff(self.speed) * (self.pdf[1:] + self.pdf[:-1])
        sums = np.concatenate(([0.0], np.cumsum(steps)))
        return np.asarray(trapezoid_quantiles(self.speed, self.pdf, sums, np.ascontiguousarray(u)))

    def density(self, speeds: Floats, mass: float) -> Floats:
        """Return the probability density [s m-1]; see `SpeedDensity`."""
        return np.asarray(
            np.interp(speeds, self.speed, self.pdf, 0.0, 0.0) / np.trapezoid(self.pdf, self.speed)
        )

    def share_above(self, speed: float, mass: float) -> float:
        """Return the probability of a speed above `speed` [m s-1]; see `SpeedDensity`."""
        beyond = self.speed > speed
        v = np.concatenate(([min(max(speed, self.speed[0]), self.speed[-1])], self.speed[beyond]))
        pdf = np.interp(v, self.speed, self.pdf)
        return float(np.trapezoid(pdf, v) / np.trapezoid(self.pdf, self.speed))

    def kinks(self) -> Floats:
        """Return the speeds of the table."""
        return self.speed

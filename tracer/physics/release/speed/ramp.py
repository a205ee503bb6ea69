"""Speeds inside one bin whose density rises or falls evenly through it: what responses are measured with."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.physics.release.laws import Floats


class Ramp(NamedTuple):
    """pdf(v) ~ (1 + x)/2 where `rising`, else (1 - x)/2, with x from -1 at `low` to 1 at `high` [m s-1].

    Each is (n,) for n launches, or one value for all.

    Any density that is straight in the bin is a sum of the two. If atoms leave R+ by the one and R- by the other, the
    mean over the bin is (R+ + R-)/2 and the mean weighted with x is (R+ - R-)/2.
    """

    low: Floats
    high: Floats
    rising: NDArray[np.bool_]

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1]; see `SpeedLaw`."""
        width = self.high - self.low
        # 1 - u is as even as u: launches are fast where u is large, as in all laws.
        return np.where(self.rising, self.low + width * np.sqrt(u), self.high - width * np.sqrt(1.0 - u))

"""One speed for all."""

from typing import NamedTuple

import numpy as np

from tracer.physics.release.laws import Floats


class Single(NamedTuple):
    """Every atom leaves with `speed` [m s-1]."""

    speed: float

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1]; see `SpeedLaw`."""
        return np.full_like(u, self.speed)

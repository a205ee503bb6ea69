"""Release towards a direction, such as the Sun's or the leading side's."""

from typing import NamedTuple

import numpy as np

from tracer.physics.release.laws import Floats
from tracer.physics.release.place.spherical import around_axis


class CosinePower(NamedTuple):
    """Flux ~ cos^power of the angle from unit vector `toward`, zero beyond 90 deg."""

    toward: tuple[float, float, float]
    power: float

    def places(self, u: Floats) -> Floats:
        """Return unit vectors; see `PlaceLaw`."""
        return around_axis(self.toward, np.asarray((1.0 - u[:, 0]) ** (1.0 / (self.power + 1.0))), u[:, 1])

"""Directions by a power of the zenith angle's cosine."""

from typing import NamedTuple

import numpy as np

from tracer.physics.release.laws import Floats


class Cosine(NamedTuple):
    """Flux per solid angle ~ cos^power of the zenith angle; power 1 is Lambert's law, thermal equilibrium's."""

    power: float

    def zenith_cosines(self, u: Floats) -> Floats:
        """Return cosines of the zenith angle; see `DirectionLaw`."""
        # 1 - u lies in (0, 1]: no atom starts along the ground.
        return np.asarray((1.0 - u) ** (1.0 / (self.power + 1.0)))

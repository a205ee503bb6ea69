"""Straight up."""

from typing import NamedTuple

import numpy as np

from tracer.physics.release.laws import Floats


class Normal(NamedTuple):
    """Every atom leaves along the local vertical."""

    def zenith_cosines(self, u: Floats) -> Floats:
        """Return cosines of the zenith angle; see `DirectionLaw`."""
        return np.ones_like(u)

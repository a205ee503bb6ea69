"""Directions even over the hemisphere."""

from typing import NamedTuple

from tracer.physics.release.laws import Floats


class Isotropic(NamedTuple):
    """Flux per solid angle is constant above the horizon."""

    def zenith_cosines(self, u: Floats) -> Floats:
        """Return cosines of the zenith angle; see `DirectionLaw`."""
        return 1.0 - u

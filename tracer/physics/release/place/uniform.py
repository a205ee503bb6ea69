"""Release even over the whole surface."""

from typing import NamedTuple

from tracer.physics.release.laws import Floats
from tracer.physics.release.place.spherical import around_axis


class Uniform(NamedTuple):
    """Flux is the same everywhere."""

    def places(self, u: Floats) -> Floats:
        """Return unit vectors; see `PlaceLaw`."""
        return around_axis((0.0, 0.0, 1.0), 2.0 * u[:, 0] - 1.0, u[:, 1])

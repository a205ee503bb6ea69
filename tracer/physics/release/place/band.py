"""Release even over a band of latitudes."""

from math import radians, sin
from typing import NamedTuple

from tracer.physics.release.laws import Floats
from tracer.physics.release.place.spherical import around_axis


class Band(NamedTuple):
    """Flux is even between latitudes `south` and `north` [deg]."""

    south: float
    north: float

    def places(self, u: Floats) -> Floats:
        """Return unit vectors; see `PlaceLaw`."""
        low, high = sin(radians(self.south)), sin(radians(self.north))
        return around_axis((0.0, 0.0, 1.0), low + (high - low) * u[:, 0], u[:, 1])

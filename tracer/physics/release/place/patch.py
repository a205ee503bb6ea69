"""Release even over a round patch of ground."""

from math import sin
from typing import NamedTuple

from tracer.physics.release.laws import Floats
from tracer.physics.release.place.spherical import around_axis


class Patch(NamedTuple):
    """Flux is even within `angle` [rad] of unit vector `centre`, as seen from the body's centre."""

    centre: tuple[float, float, float]
    angle: float

    def places(self, u: Floats) -> Floats:
        """Return unit vectors; see `PlaceLaw`."""
        # 1 - cos(angle) written with the half angle keeps its digits for a small patch.
        return around_axis(self.centre, 1.0 - u[:, 0] * 2.0 * sin(0.5 * self.angle) ** 2, u[:, 1])

"""What every release law offers."""

from typing import Protocol

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


class SpeedLaw(Protocol):
    """A distribution of launch speeds relative to the ground."""

    def speeds(self, u: Floats, surface_temperature: Floats, mass: float) -> Floats:
        """Return speeds [m s-1], (n,), from even numbers `u`, (n,).

        `surface_temperature` [K], (n,), is the ground's at the place of each launch and serves laws without a
        temperature of their own; `mass` [kg] is one atom's.
        """
        ...


class SpeedDensity(Protocol):
    """A speed law that is the same everywhere and has a density: what responses can be put together for."""

    def density(self, speeds: Floats, mass: float) -> Floats:
        """Return the probability density [s m-1] at `speeds` [m s-1], for atoms of `mass` [kg]."""
        ...

    def share_above(self, speed: float, mass: float) -> float:
        """Return the probability of a speed above `speed` [m s-1]."""
        ...

    def kinks(self) -> Floats:
        """Return the speeds [m s-1], rising, at which the density is not smooth."""
        ...


class DirectionLaw(Protocol):
    """A distribution of launch directions about the local vertical, even in azimuth."""

    def zenith_cosines(self, u: Floats) -> Floats:
        """Return cosines of the zenith angle, (n,), from even numbers `u`, (n,)."""
        ...


class PlaceLaw(Protocol):
    """A distribution of places of release over the sphere."""

    def places(self, u: Floats) -> Floats:
        """Return unit vectors in the Sun-fixed frame, (n, 3), from even numbers `u`, (n, 2)."""
        ...

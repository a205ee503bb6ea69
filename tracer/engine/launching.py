"""Draw the launches of one batch from a release's laws."""

import numpy as np
from numpy.typing import NDArray

from tracer.engine.scene import Release, Scene
from tracer.kernels.launches import Launches
from tracer.kernels.launching import velocities
from tracer.kernels.temperature import temperatures

Floats = NDArray[np.float64]


def draw_launches(
    scene: Scene, release: Release, count: int, rng: np.random.Generator, weight: float
) -> Launches:
    """Return `count` launches of `release`, `weight` [s-1] each.

    Place, speed, zenith angle and azimuth take five even numbers each.
    """
    u = rng.random((count, 5))
    positions = np.ascontiguousarray(release.place.places(u[:, 0:2]))
    law = scene.surface_temperature
    kelvin = np.full(count, np.nan) if law is None else temperatures(law, positions)
    speeds = release.speed.speeds(u[:, 2], kelvin, scene.mass)
    cosines = release.direction.zenith_cosines(u[:, 3])
    flights = velocities(positions, speeds, cosines, 2.0 * np.pi * u[:, 4])
    return Launches(positions, flights, np.full(count, weight))


def ground_velocities(scene: Scene, positions: Floats) -> Floats:
    """Return the ground's velocities (n, 3) [m s-1] in the Sun-fixed frame at unit vectors `positions` (n, 3)."""
    speed = scene.ground_spin * scene.body.radius
    return np.column_stack([-speed * positions[:, 1], speed * positions[:, 0], np.zeros(len(positions))])

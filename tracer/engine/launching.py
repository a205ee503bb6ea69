"""Draw the launches of one batch from a release's laws."""

import numpy as np
from numpy.typing import NDArray

from tracer.engine.scene import Release, Scene
from tracer.kernels.launches import Launches
from tracer.kernels.launching import velocities
from tracer.kernels.temperature import temperatures
from tracer.physics.release.even_numbers import AZIMUTH, PLACE, SPEED, TURN, ZENITH, EvenNumbers
from tracer.physics.release.strata import draw, one_stratum

Floats = NDArray[np.float64]


def draw_launches(
    scene: Scene, release: Release, count: int, rng: np.random.Generator, weight: float
) -> Launches:
    """Return `count` launches of `release`, `weight` [s-1] each, stratified over place, speed and direction."""
    u, _ = draw(one_stratum(count), EvenNumbers(rng), 0, count)
    return make_launches(scene, release, u, np.full(count, weight))


def make_launches(scene: Scene, release: Release, u: Floats, weights: Floats) -> Launches:
    """Return the launches of `release` that even numbers `u` (n, 5) make, with `weights` (n,) [s-1]."""
    positions = release.place.places(u[:, PLACE : TURN + 1])
    law = scene.surface_temperature
    kelvin = np.full(len(u), np.nan) if law is None else temperatures(law, positions)
    speeds = release.speed.speeds(u[:, SPEED], kelvin, scene.mass)
    cosines = release.direction.zenith_cosines(u[:, ZENITH])
    flights = velocities(positions, speeds, cosines, 2.0 * np.pi * u[:, AZIMUTH])
    return Launches(positions, flights, weights)


def ground_velocities(scene: Scene, positions: Floats) -> Floats:
    """Return the ground's velocities (n, 3) [m s-1] in the Sun-fixed frame at unit vectors `positions` (n, 3)."""
    speed = scene.ground_spin * scene.body.radius
    return np.column_stack([-speed * positions[:, 1], speed * positions[:, 0], np.zeros(len(positions))])

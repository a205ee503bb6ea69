"""Surface temperature at a place, [K]."""

import math
from typing import NamedTuple

from tracer.kernels.compiling import allocating_kernel, kernel

UNIFORM = 0
QUARTER_POWER = 1


class SurfaceTemperature(NamedTuple):
    """A temperature law by its code and its numbers; `uniform` reads `subsolar` alone."""

    law: int
    subsolar: float
    night: float


@kernel
def temperature(law, x, y, z):
    """Return the temperature [K] at unit vector (x, y, z); +x is the direction to the Sun."""
    if law.law == UNIFORM:
        return law.subsolar
    # quarter-power: night + (subsolar - night) cos^(1/4) of the solar zenith angle
    if x <= 0.0:
        return law.night
    return law.night + (law.subsolar - law.night) * math.sqrt(math.sqrt(x))


@allocating_kernel
def temperatures(law, positions):
    """Return the temperatures [K], (n,), at unit vectors `positions`, (n, 3)."""
    result = positions[:, 0].copy()
    for i in range(positions.shape[0]):
        result[i] = temperature(law, positions[i, 0], positions[i, 1], positions[i, 2])
    return result

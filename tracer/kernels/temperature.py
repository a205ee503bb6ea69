"""Surface temperature at a place, [K]."""

import math
from typing import NamedTuple

import numpy as np

from tracer.kernels.compiling import allocating_kernel, inlined, kernel
from tracer.kernels.surface_map import SurfaceMap, interpolated

UNIFORM = 0
QUARTER_POWER = 1
EQUILIBRIUM = 2
HURLEY_2015 = 3
MAP = 4
CONDUCTION = 5

NO_TABLE = SurfaceMap(np.array([-45.0, 45.0]), np.array([6.0, 18.0]), np.full((2, 2), np.nan))
"""What laws without a table carry, since one compilation serves all laws."""


class SurfaceTemperature(NamedTuple):
    """A temperature law by its code and its numbers.

    `subsolar` and `night` [K] serve `uniform` (`subsolar` alone), `quarter-power` and `equilibrium`; `table` [K] serves
    `map` and `conduction`.
    """

    law: int
    subsolar: float
    night: float
    table: SurfaceMap = NO_TABLE


@inlined
def temperature(law, x, y, z):
    """Return the temperature [K] at unit vector (x, y, z); +x is the direction to the Sun."""
    if law.law >= MAP:
        return interpolated(law.table, x, y, z)
    if law.law == HURLEY_2015:
        return hurley_2015(x, y, z)
    if law.law == UNIFORM:
        return law.subsolar
    if x <= 0.0:
        return law.night
    quarter_power = math.sqrt(math.sqrt(x))
    if law.law == EQUILIBRIUM:
        return max(law.night, law.subsolar * quarter_power)
    return law.night + (law.subsolar - law.night) * quarter_power


@kernel
def hurley_2015(x, y, z):
    """Return the temperature [K] of the Moon's surface at unit vector (x, y, z).

    With chi the solar zenith angle, by day (chi strictly below 90 deg) 262 sqrt(cos chi) + 130; by night a polynomial
    in phi, the longitude [rad] from the subsolar point through dusk, plus 35 (sin(colatitude) - 1). Hurley et al. 2015,
    Icarus 255, 159 (coefficients from memory; day and night agree within 0.1 K where they meet at dusk on the equator).
    """
    if x > 0.0:
        return 262.0 * math.sqrt(x) + 130.0
    phi = math.atan2(y, x)
    if phi < 0.0:
        phi += 2.0 * math.pi
    # At a pole itself, where no longitude is meant, dusk's.
    phi = max(phi, 0.5 * math.pi)
    polynomial = -63.8844 + phi * (8.34064 + phi * -0.423502)
    polynomial = 444.738 + phi * (-448.937 + phi * (239.668 + phi * polynomial))
    return polynomial + 35.0 * (math.sqrt(x * x + y * y) - 1.0)


@allocating_kernel
def temperatures(law, positions):
    """Return the temperatures [K], (n,), at unit vectors `positions`, (n, 3)."""
    result = np.empty(positions.shape[0])
    for i in range(positions.shape[0]):
        result[i] = temperature(law, positions[i, 0], positions[i, 1], positions[i, 2])
    return result

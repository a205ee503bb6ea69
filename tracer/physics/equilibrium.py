"""The temperature at which ground radiates away what sunlight brings."""

import math

from tracer.constants import ASTRONOMICAL_UNIT, SOLAR_IRRADIANCE, STEFAN_BOLTZMANN


def equilibrium_temperature(
    albedo: float, emissivity: float, distance: float, cosine_zenith: float = 1.0
) -> float:
    """Return [(1 - A) S cos(z) / (eps sigma d^2)]^(1/4) [K] of ground in balance with sunlight.

    No heat is stored or conducted, so this is the hottest that the ground can be at that place.

    Parameters
    ----------
    albedo : float
        Bond albedo A, 0 to 1.
    emissivity : float
        Thermal emissivity eps, above 0 to 1.
    distance : float
        Distance d from the Sun [m], above 0; S is the solar irradiance at 1 au.
    cosine_zenith : float
        Cosine of the solar zenith angle z, 1 at the subsolar point; the night side (below 0) has 0 K.
    """
    irradiance = SOLAR_IRRADIANCE * (ASTRONOMICAL_UNIT / distance) ** 2
    absorbed = (1.0 - albedo) * irradiance * max(0.0, cosine_zenith)
    return math.sqrt(math.sqrt(absorbed / (emissivity * STEFAN_BOLTZMANN)))

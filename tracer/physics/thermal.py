"""Speeds, heights and fractions of a gas in a body's gravity.

Symbols: k Boltzmann, m mass [kg], T temperature [K], R body radius [m], G M = gm [m3 s-2].
"""

from math import exp, inf, pi, sqrt

from tracer.constants import BOLTZMANN


def most_probable_speed(temperature: float, mass: float) -> float:
    """Return v_p = sqrt(2kT/m) [m s-1], where the Maxwellian of a gas at rest peaks."""
    return sqrt(2.0 * BOLTZMANN * temperature / mass)


def mean_speed(temperature: float, mass: float) -> float:
    """Return sqrt(8kT/(pi m)) [m s-1], the mean of the Maxwellian of a gas at rest."""
    return sqrt(8.0 * BOLTZMANN * temperature / (pi * mass))


def rms_speed(temperature: float, mass: float) -> float:
    """Return sqrt(3kT/m) [m s-1], the root of the mean square of the Maxwellian of a gas at rest."""
    return sqrt(3.0 * BOLTZMANN * temperature / mass)


def escape_speed(gm: float, radius: float) -> float:
    """Return sqrt(2 gm/R) [m s-1]."""
    return sqrt(2.0 * gm / radius)


def surface_gravity(gm: float, radius: float) -> float:
    """Return g = gm/R^2 [m s-2]."""
    return gm / (radius * radius)


def jeans_parameter(gm: float, radius: float, temperature: float, mass: float) -> float:
    """Return lambda = gm m/(kTR), the square of escape speed over most probable speed."""
    return gm * mass / (BOLTZMANN * temperature * radius)


def scale_height(gm: float, radius: float, temperature: float, mass: float) -> float:
    """Return H = kT/(mg) [m]; infinite without gravity."""
    if gm == 0.0:
        return inf
    return BOLTZMANN * temperature / (mass * surface_gravity(gm, radius))


def escape_fraction(jeans: float) -> float:
    """Return (1 + lambda) exp(-lambda), the share of a flux-weighted Maxwellian launch above escape speed.

    Jeans 1916, The Dynamical Theory of Gases; Chamberlain 1963, Planet. Space Sci. 11, 901 (memory).
    """
    return (1.0 + jeans) * exp(-jeans)

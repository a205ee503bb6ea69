"""Orbits about the Sun and about a host planet."""

from math import cbrt

from tracer.catalogue.records import Orbit


def hill_radius(orbit: Orbit, gm: float, host_gm: float) -> float:
    """Return a (1 - e) (m/3M)^(1/3) [m] from the centre of a body of `gm` that orbits a host of `host_gm` [m3 s-2]."""
    return orbit.semi_major_axis * (1.0 - orbit.eccentricity) * cbrt(gm / (3.0 * host_gm))

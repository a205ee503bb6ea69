"""Orbits about the Sun and about a host planet, and where on it a body stands."""

import math
from typing import NamedTuple

from tracer.catalogue.records import Orbit
from tracer.constants import GM_SUN
from tracer.kernels import two_body


class Station(NamedTuple):
    """Where a body stands: `distance` [m] from the Sun, `radial_velocity` [m s-1], `orbital_rate` [rad s-1]."""

    distance: float
    radial_velocity: float
    orbital_rate: float


def hill_radius(orbit: Orbit, gm: float, host_gm: float) -> float:
    """Return a (1 - e) (m/3M)^(1/3) [m] from the centre of a body of `gm` that orbits a host of `host_gm` [m3 s-2]."""
    return orbit.semi_major_axis * (1.0 - orbit.eccentricity) * math.cbrt(gm / (3.0 * host_gm))


def mean_motion(orbit: Orbit) -> float:
    """Return n = sqrt(GM_sun / a^3) [rad s-1], the mean angular rate on a heliocentric orbit (Kepler's third law)."""
    return math.sqrt(GM_SUN / orbit.semi_major_axis**3)


def mean_sunlight_distance(orbit: Orbit) -> float:
    """Return a (1 - e^2)^(1/4) [m], where 1/d^2 is that of a heliocentric orbit in the mean over time.

    The mean of 1/d^2 over time is that of Omega/h over a turn: 2 pi/(P h) = 1/(a^2 sqrt(1 - e^2)) (two-body motion).
    """
    return orbit.semi_major_axis * math.sqrt(math.sqrt(1.0 - orbit.eccentricity**2))


def angular_momentum(orbit: Orbit) -> float:
    """Return h = sqrt(GM_sun a (1 - e^2)) [m2 s-1] of a heliocentric orbit, per unit mass."""
    return math.sqrt(GM_SUN * orbit.semi_major_axis * (1.0 - orbit.eccentricity**2))


def station_at_true_anomaly(orbit: Orbit, true_anomaly: float) -> Station:
    """Return where a body stands on a heliocentric `orbit` at `true_anomaly` [deg], 0 at perihelion.

    d = a (1 - e^2) / (1 + e cos f), v_r = (GM_sun / h) e sin f, Omega = h / d^2 (two-body motion).
    """
    f = math.radians(true_anomaly)
    h = angular_momentum(orbit)
    semi_latus_rectum = orbit.semi_major_axis * (1.0 - orbit.eccentricity**2)
    distance = semi_latus_rectum / (1.0 + orbit.eccentricity * math.cos(f))
    return Station(distance, GM_SUN / h * orbit.eccentricity * math.sin(f), h / distance**2)


def station_at_distance(orbit: Orbit | None, distance: float, radial_velocity: float = 0.0) -> Station:
    """Return a station at `distance` [m] that recedes at `radial_velocity` [m s-1].

    Omega = h / d^2 on `orbit`, else sqrt(GM_sun / d^3), the circular rate.

    Raises
    ------
    ValueError
        If `distance` is not positive, or is one that `orbit` never reaches.
    """
    if not distance > 0.0:
        raise ValueError(f"a distance from the Sun must be positive, not {distance!r} m")
    if orbit is None:
        return Station(distance, radial_velocity, math.sqrt(GM_SUN / distance**3))
    perihelion = orbit.semi_major_axis * (1.0 - orbit.eccentricity)
    aphelion = orbit.semi_major_axis * (1.0 + orbit.eccentricity)
    # Relative slack of rounding: perihelion itself, computed in other units, must pass.
    if not perihelion * (1.0 - 1e-12) <= distance <= aphelion * (1.0 + 1e-12):
        raise ValueError(
            f"the distance {distance:.6g} m lies outside the orbit, which runs from {perihelion:.6g} m "
            f"to {aphelion:.6g} m from the Sun"
        )
    return Station(distance, radial_velocity, angular_momentum(orbit) / distance**2)


def orbit_through(station: Station) -> two_body.Orbit:
    """Return the two-body orbit about the Sun of a body that stands at `station` at time 0, as kernels take it.

    With h = Omega d^2: p = h^2/GM, e cos f = p/d - 1, e sin f = h v_r/GM; tan(E/2) = sqrt((1 - e)/(1 + e)) tan(f/2),
    M = E - e sin E (two-body motion).

    Raises
    ------
    ValueError
        If the orbit is not closed.
    """
    h = station.orbital_rate * station.distance**2
    along = h * h / (GM_SUN * station.distance) - 1.0
    across = h * station.radial_velocity / GM_SUN
    e = math.hypot(along, across)
    if not e < 1.0:
        raise ValueError(f"the orbit is not closed: its eccentricity would be {e:.6g}")
    a = h * h / (GM_SUN * (1.0 - e * e))
    f = math.atan2(across, along)
    anomaly = 2.0 * math.atan2(math.sqrt(1.0 - e) * math.sin(0.5 * f), math.sqrt(1.0 + e) * math.cos(0.5 * f))
    return two_body.Orbit(
        gm=float(GM_SUN),
        angular_momentum=float(h),
        semi_major_axis=float(a),
        eccentricity=float(e),
        mean_motion=math.sqrt(GM_SUN / a**3),
        mean_anomaly=float(anomaly - e * math.sin(anomaly)),
    )

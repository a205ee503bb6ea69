"""A moon beside its host planet: where both stand under the Sun, and the host as kernels take it.

Seen from the moon the host stands at the phase angle from the direction to the Sun, counted from +x towards +y: 0 is
full moon as seen from the host, where the moon may be eclipsed; 90 deg last quarter; 180 deg new moon; 270 deg first
quarter, for a moon that goes round its host as the host goes round the Sun. The moon moves about the host on a circle
in the plane of the host's orbit, unless an ephemeris has both.
"""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.catalogue.load import hosts
from tracer.kernels import host as kernels
from tracer.kernels.two_body import Orbit, true_anomaly
from tracer.physics.ephemeris import MoonSighting
from tracer.physics.orbit import Station

Floats = NDArray[np.float64]

FAR_SUN = 1e6
"""Distance of the Sun in units of the moon's from its host where there is none: its direction is the same for both."""


class MoonPlace(NamedTuple):
    """A moon beside its host.

    `host` (3,) [m] is where the host stands in the moon's Sun-fixed frame, `toward_sun` (3,) the unit vector from the
    host to the Sun, along the same axes; `rate` [rad s-1] about +z at which the host's direction turns among the stars;
    `phase_angle` [deg], from 0 to below 360; `host_station` and `station` are where host and moon stand under the Sun.
    """

    host: tuple[float, float, float]
    toward_sun: tuple[float, float, float]
    rate: float
    phase_angle: float
    host_station: Station
    station: Station

    @property
    def distance(self) -> float:
        """Distance [m] of moon and host."""
        return math.hypot(*self.host)


def kepler_period(distance: float, gm: float) -> float:
    """Return 2 pi sqrt(a^3/GM) [s] of a circular orbit, `gm` [m3 s-2] that of both bodies (Kepler's third law)."""
    return 2.0 * math.pi * math.sqrt(distance**3 / gm)


def moon_at_phase(host_station: Station, distance: float, rate: float, phase_angle: float) -> MoonPlace:
    """Return a moon on a circle about its host, in the plane of the host's orbit.

    Parameters
    ----------
    host_station : Station
        Where the host stands under the Sun.
    distance : float
        Of moon and host [m], less than the host's from the Sun.
    rate : float
        At which the moon goes round its host [rad s-1], among the stars, positive as the host goes round the Sun.
    phase_angle : float
        See the head of this file [deg].

    With h the host's place, d x_hat the Sun's and n the rate, both along the moon's axes: |d x_hat - h| is the host's
    distance; the moon's velocity is the host's less n z_hat x h.
    """
    phi = math.radians(phase_angle)
    x, y = distance * math.cos(phi), distance * math.sin(phi)
    d = x + math.sqrt(host_station.distance**2 - y * y)
    ux, uy = (d - x) / host_station.distance, -y / host_station.distance
    # The host recedes along -u and runs along u turned by -90 deg; the moon runs by (n y, -n x) faster.
    orbiting = host_station.orbital_rate * host_station.distance
    vx = -host_station.radial_velocity * ux + orbiting * uy + rate * y
    vy = -host_station.radial_velocity * uy - orbiting * ux - rate * x
    return MoonPlace(
        (x, y, 0.0), (ux, uy, 0.0), rate, phase_angle % 360.0, host_station, Station(d, -vx, -vy / d)
    )


def moon_without_sun(distance: float, rate: float, phase_angle: float) -> MoonPlace:
    """Return a moon where there is no Sun: +x still counts as the Sun's direction."""
    return moon_at_phase(Station(FAR_SUN * distance, 0.0, 0.0), distance, rate, phase_angle)


def moon_as_seen(seen: MoonSighting) -> MoonPlace:
    """Return the moon that an ephemeris has: its own distance, velocity and place beside the host, off the plane."""
    x, y, z = map(float, seen.host)
    gap = np.array([seen.station.distance - x, -y, -z])
    ux, uy, uz = (float(part) for part in gap / np.linalg.norm(gap))
    phase = math.degrees(math.atan2(y, x)) % 360.0
    return MoonPlace((x, y, z), (ux, uy, uz), seen.rate, phase, seen.host_station, seen.station)


def still_host(gm: float, radius: float, moon: MoonPlace, casts: bool) -> kernels.Host:
    """Return a host that keeps its place, in a frame that turns at the moon's rate; `casts` a shadow or not."""
    x, y, z = moon.host
    ux, uy, uz = moon.toward_sun
    return kernels.Host(
        gm=float(gm),
        radius=float(radius),
        x=float(x),
        y=float(y),
        z=float(z),
        per_gap3=moon.distance**-3,
        swing=0.0,
        sun_x=float(ux),
        sun_y=float(uy),
        sun_z=float(uz),
        sun_distance=float(moon.host_station.distance),
        sun_radius=float(hosts()["Sun"].radius),
        casts=float(casts),
        slip=float((moon.rate - moon.station.orbital_rate) * moon.station.distance),
        receding=float(moon.host_station.radial_velocity),
        cosine=0.0,
        sine=0.0,
    )


def moving_host(gm: float, radius: float, moon: MoonPlace, orbit: Orbit, casts: bool) -> kernels.HostOrbit:
    """Return a host that travels on `orbit` about the Sun, while the moon goes round it."""
    ux, uy, _ = moon.toward_sun
    x, y, _ = moon.host
    return kernels.HostOrbit(
        gm=float(gm),
        radius=float(radius),
        distance=float(moon.distance),
        rate=float(moon.rate),
        phase=math.atan2(ux * y - uy * x, ux * x + uy * y),
        true_anomaly=float(true_anomaly(orbit, 0.0)),
        sun_radius=float(hosts()["Sun"].radius),
        casts=float(casts),
    )

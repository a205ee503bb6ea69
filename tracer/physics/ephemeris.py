"""Where a body stood, or will stand, at a moment: the analytic ephemerides of the SOFA routines.

They are what astropy calls its built-in ephemeris: plan94 for the planets (Simon et al. 1994, A&A 282, 663), epv00 for
the Earth, moon98 for the Moon (Meeus 1998, Astronomical Algorithms). Nothing is ever downloaded: the leap seconds are
those of the library, and behind the last known one a second or two of uncertainty moves no planet by a part in 1e6.
"""

import math
import warnings
from datetime import datetime
from typing import Any, NamedTuple

import erfa
import numpy as np
from numpy.typing import NDArray

from tracer.constants import ASTRONOMICAL_UNIT, GM_SUN
from tracer.physics.orbit import Station

Floats = NDArray[np.float64]

DAY = 86400.0
PLANETS = {"Mercury": 1, "Venus": 2, "Mars": 4, "Jupiter": 5, "Saturn": 6, "Uranus": 7, "Neptune": 8}
"""Numbers of the planets in plan94."""

EARTH_MOON = 3
"""Number of the barycentre of Earth and Moon in plan94."""

MOON = "Moon"
KNOWN = (*PLANETS, "Earth", MOON)


class HeliocentricState(NamedTuple):
    """Position [m] and velocity [m s-1] from the Sun's centre, each (3,), along the axes of J2000's equator."""

    position: Floats
    velocity: Floats


class Sighting(NamedTuple):
    """Where a body stands at a moment, and the `true_anomaly` [deg], 0 to 360, of its osculating orbit there."""

    station: Station
    true_anomaly: float


class MoonSighting(NamedTuple):
    """Where the Moon stands at a moment, under the Sun and beside the Earth.

    `host` (3,) [m] is the Earth's place in the Moon's Sun-fixed frame, whose north is that of the orbit of Earth and
    Moon about the Sun; `rate` [rad s-1] about north at which the Earth's direction turns among the stars just then;
    `host_station` and `station` are the Earth's and the Moon's own.
    """

    host: Floats
    rate: float
    host_station: Station
    station: Station


def heliocentric_state(name: str, moment: datetime) -> HeliocentricState:
    """Return where a planet or the Moon is at `moment`, which must be in UTC.

    Raises
    ------
    KeyError
        The body is none of `KNOWN`.
    """
    tt = _terrestrial_time(moment)
    if name in PLANETS:
        return _state(erfa.plan94(*tt, PLANETS[name]))
    if name not in KNOWN:
        raise KeyError(name)
    earth = _state(erfa.epv00(*tt)[0])
    if name != MOON:
        return earth
    moon = _state(erfa.moon98(*tt))
    return HeliocentricState(earth.position + moon.position, earth.velocity + moon.velocity)


def sighting(name: str, moment: datetime) -> Sighting:
    """Return where a planet or the Moon stands at `moment`, which must be in UTC.

    Distance and radial velocity are the body's own; true anomaly and orbital rate are those of the orbit about the Sun
    that osculates its motion. For the Moon that orbit is the one of Earth and Moon together: about the Sun the Moon's
    own osculating orbit changes within days.

    Raises
    ------
    KeyError
        The body is none of `KNOWN`.
    """
    own = heliocentric_state(name, moment)
    distance = float(np.linalg.norm(own.position))
    radial_velocity = float(own.position @ own.velocity) / distance
    orbiting = own
    if name in (MOON, "Earth"):
        orbiting = _state(erfa.plan94(*_terrestrial_time(moment), EARTH_MOON))
    r = float(np.linalg.norm(orbiting.position))
    h = float(np.linalg.norm(np.cross(orbiting.position, orbiting.velocity)))
    receding = float(orbiting.position @ orbiting.velocity) / r
    # e sin f = h v_r / GM and e cos f = h^2 / (GM r) - 1 of a Kepler orbit.
    anomaly = math.degrees(math.atan2(h * receding, h * h / r - GM_SUN)) % 360.0
    return Sighting(Station(distance, radial_velocity, h / r**2), anomaly)


def moon_sighting(moment: datetime) -> MoonSighting:
    """Return where the Moon stands at `moment`, which must be in UTC, beside the Earth and under the Sun."""
    moon, earth = heliocentric_state(MOON, moment), heliocentric_state("Earth", moment)
    orbiting = _state(erfa.plan94(*_terrestrial_time(moment), EARTH_MOON))
    normal = np.cross(orbiting.position, orbiting.velocity)
    distance = float(np.linalg.norm(moon.position))
    x_axis = -moon.position / distance
    z_axis = normal - (normal @ x_axis) * x_axis
    z_axis /= np.linalg.norm(z_axis)
    axes = np.array([x_axis, np.cross(z_axis, x_axis), z_axis])
    host, motion = axes @ (earth.position - moon.position), axes @ (earth.velocity - moon.velocity)
    velocity = axes @ moon.velocity
    return MoonSighting(
        host,
        float((host[0] * motion[1] - host[1] * motion[0]) / (host[0] ** 2 + host[1] ** 2)),
        _own_station(earth),
        Station(distance, float(-velocity[0]), float(-velocity[1]) / distance),
    )


def _own_station(state: HeliocentricState) -> Station:
    distance = float(np.linalg.norm(state.position))
    momentum = float(np.linalg.norm(np.cross(state.position, state.velocity)))
    return Station(distance, float(state.position @ state.velocity) / distance, momentum / distance**2)


def _terrestrial_time(moment: datetime) -> tuple[float, float]:
    """Return the moment in terrestrial time as two parts of a Julian date; dynamical time differs by milliseconds."""
    second = moment.second + moment.microsecond * 1e-6
    with warnings.catch_warnings():
        # Beyond the last known leap second the library warns of a "dubious year".
        warnings.simplefilter("ignore", erfa.ErfaWarning)
        utc = erfa.dtf2d("UTC", moment.year, moment.month, moment.day, moment.hour, moment.minute, second)
        tai = erfa.utctai(*utc)
    first, rest = erfa.taitt(*tai)
    return float(first), float(rest)


def _state(pv: Any) -> HeliocentricState:
    return HeliocentricState(
        np.asarray(pv["p"], np.float64) * ASTRONOMICAL_UNIT,
        np.asarray(pv["v"], np.float64) * (ASTRONOMICAL_UNIT / DAY),
    )

"""Motion on a two-body orbit about the Sun: exactly at any moment, and as a power series about one."""

import math
from typing import NamedTuple

from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.fused import fused

MOST_TRIALS = 60
"""Of Newton's method, which needs five but near the perihelion of a very long orbit."""


class Orbit(NamedTuple):
    """A two-body orbit about the Sun, and where on it the body is at time 0, the stated position.

    `gm` [m3 s-2] of the Sun; `angular_momentum` [m2 s-1] per mass; `semi_major_axis` [m]; `eccentricity` below 1;
    `mean_motion` [rad s-1]; `mean_anomaly` [rad] at time 0.
    """

    gm: float
    angular_momentum: float
    semi_major_axis: float
    eccentricity: float
    mean_motion: float
    mean_anomaly: float


@inlined
def _eccentric_anomaly(orbit, time):
    """Return the eccentric anomaly [rad], from -pi to pi, at `time` [s] after the stated position.

    Kepler's equation E - e sin E = M by Newton's method from Danby's first guess (Danby 1988, Fundamentals of Celestial
    Mechanics, section 6.6: memory).
    """
    e = orbit.eccentricity
    m = orbit.mean_anomaly + orbit.mean_motion * time
    m -= 2.0 * math.pi * math.floor(m / (2.0 * math.pi) + 0.5)
    anomaly = m + math.copysign(0.85 * e, m)
    for _ in range(MOST_TRIALS):
        step = (m - anomaly + e * math.sin(anomaly)) / (1.0 - e * math.cos(anomaly))
        anomaly += step
        if abs(step) < 1e-15 * (1.0 + abs(anomaly)):
            break
    return anomaly


@kernel
def orbit_state(orbit, time):
    """Return distance [m] from the Sun and radial velocity [m s-1] at `time` [s] after the stated position."""
    e = orbit.eccentricity
    anomaly = _eccentric_anomaly(orbit, time)
    distance = orbit.semi_major_axis * (1.0 - e * math.cos(anomaly))
    velocity = math.sqrt(orbit.gm * orbit.semi_major_axis) * e * math.sin(anomaly) / distance
    return distance, velocity


@kernel
def true_anomaly(orbit, time):
    """Return the angle [rad] from the perihelion, from -pi to pi, at `time` [s] after the stated position.

    tan(f/2) = sqrt((1 + e)/(1 - e)) tan(E/2) (two-body motion).
    """
    half = 0.5 * _eccentric_anomaly(orbit, time)
    e = orbit.eccentricity
    return 2.0 * math.atan2(math.sqrt(1.0 + e) * math.sin(half), math.sqrt(1.0 - e) * math.cos(half))


@inlined
def turning_at(orbit, distance):
    """Return the orbital rate [rad s-1] at `distance` [m] from the Sun."""
    return orbit.angular_momentum / (distance * distance)


@inlined
def orbit_series(orbit, d0, d1):
    """Return the coefficients of t^2 to t^8 in the distance of a body at `d0` [m] that recedes at `d1` [m s-1].

    d'' = p q with p = s^2, q = h^2 s - GM and s = 1/d, power by power; s d = 1 gives s's own coefficients.
    """
    h2 = orbit.angular_momentum * orbit.angular_momentum
    s0 = 1.0 / d0
    p0 = s0 * s0
    q0 = fused(h2, s0, -orbit.gm)
    d2 = p0 * q0 * (1.0 / 2.0)
    s1 = -s0 * (d1 * s0)
    p1 = 2.0 * s0 * s1
    q1 = h2 * s1
    d3 = (p0 * q1 + p1 * q0) * (1.0 / 6.0)
    s2 = -s0 * (d1 * s1 + d2 * s0)
    p2 = 2.0 * s0 * s2 + s1 * s1
    q2 = h2 * s2
    d4 = (p0 * q2 + p1 * q1 + p2 * q0) * (1.0 / 12.0)
    s3 = -s0 * (d1 * s2 + d2 * s1 + d3 * s0)
    p3 = 2.0 * (s0 * s3 + s1 * s2)
    q3 = h2 * s3
    d5 = (p0 * q3 + p1 * q2 + p2 * q1 + p3 * q0) * (1.0 / 20.0)
    s4 = -s0 * (d1 * s3 + d2 * s2 + d3 * s1 + d4 * s0)
    p4 = 2.0 * (s0 * s4 + s1 * s3) + s2 * s2
    q4 = h2 * s4
    d6 = (p0 * q4 + p1 * q3 + p2 * q2 + p3 * q1 + p4 * q0) * (1.0 / 30.0)
    s5 = -s0 * (d1 * s4 + d2 * s3 + d3 * s2 + d4 * s1 + d5 * s0)
    p5 = 2.0 * (s0 * s5 + s1 * s4 + s2 * s3)
    q5 = h2 * s5
    d7 = (p0 * q5 + p1 * q4 + p2 * q3 + p3 * q2 + p4 * q1 + p5 * q0) * (1.0 / 42.0)
    s6 = -s0 * (d1 * s5 + d2 * s4 + d3 * s3 + d4 * s2 + d5 * s1 + d6 * s0)
    p6 = 2.0 * (s0 * s6 + s1 * s5 + s2 * s4) + s3 * s3
    q6 = h2 * s6
    d8 = (p0 * q6 + p1 * q5 + p2 * q4 + p3 * q3 + p4 * q2 + p5 * q1 + p6 * q0) * (1.0 / 56.0)
    return d2, d3, d4, d5, d6, d7, d8

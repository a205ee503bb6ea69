"""Where a moving body is on its orbit about the Sun: exactly at any moment, and as a power series within a step.

A body that stands still has no orbit, and then its place is that of its `Forces`: numba compiles the kernels apart for
the two, by the types alone, so that a body that stands still costs nothing.

The series about a step's start is that of `two_body`. It is held in an array as `ORDER` + 1 numbers, one
every `stride` entries from `at` on. A moon with a host has the host's distance there, and two numbers more: cosine and
sine of its phase, see `host.Host`.
"""

import math
from typing import Any, NamedTuple

from numba.core import types
from numba.extending import overload

from tracer.kernels.apart import lane_value, set_lane_value
from tracer.kernels.compiling import INLINED, field_type, inlined, kernel
from tracer.kernels.fused import fused
from tracer.kernels.host import Host, HostOrbit, without_host
from tracer.kernels.step_control import inverse_root
from tracer.kernels.two_body import orbit_series, orbit_state, true_anomaly, turning_at

ORDER = 8
"""Highest power of time in the series."""

LONGEST_STEP = 0.04
"""Longest step in units of the time in which the body's direction and distance change by as much as themselves.

The series converges to 1.3 of these units, at any eccentricity: what it leaves out is below (0.04/1.3)^9 = 3e-14.
"""

HOST_NUMBERS = 2
"""What follows the series where there is a host."""

SERIES_SIZE = ORDER + 1 + HOST_NUMBERS

LONGEST_SWING = 0.1
"""Longest step in units of the time in which the host's direction turns by 1: sine and cosine are then a short series.

It leaves out 0.1^8/8! = 3e-13, and what bends the turning about the Sun a second time.
"""


class MovingBody(NamedTuple):
    """The body at a moment: `distance` [m] from the Sun, `radial_velocity` [m s-1], `turning` [rad s-1] of the frame.

    The turning grows by `turning_growth` [rad s-2]. `host` is None where it is no moon.
    """

    distance: float
    radial_velocity: float
    turning: float
    turning_growth: float
    host: Host | None


@inlined
def series_at(array, at, stride, t):
    """Return distance [m] and radial velocity [m s-1] at `t` [s] behind the series' start."""
    d = lane_value(array, at + ORDER * stride)
    v = 8.0 * d
    for_seven = lane_value(array, at + 7 * stride)
    for_six = lane_value(array, at + 6 * stride)
    for_five = lane_value(array, at + 5 * stride)
    for_four = lane_value(array, at + 4 * stride)
    for_three = lane_value(array, at + 3 * stride)
    for_two = lane_value(array, at + 2 * stride)
    for_one = lane_value(array, at + stride)
    d = fused(d, t, for_seven)
    v = fused(v, t, 7.0 * for_seven)
    d = fused(d, t, for_six)
    v = fused(v, t, 6.0 * for_six)
    d = fused(d, t, for_five)
    v = fused(v, t, 5.0 * for_five)
    d = fused(d, t, for_four)
    v = fused(v, t, 4.0 * for_four)
    d = fused(d, t, for_three)
    v = fused(v, t, 3.0 * for_three)
    d = fused(d, t, for_two)
    v = fused(v, t, 2.0 * for_two)
    d = fused(d, t, for_one)
    v = fused(v, t, for_one)
    return fused(d, t, lane_value(array, at)), v


@inlined
def _moving(orbit, distance, velocity):
    turning = turning_at(orbit, distance)
    return MovingBody(distance, velocity, turning, -2.0 * velocity * turning / distance, None)


@inlined
def _moon(forces, distance, velocity, cosine, sine):
    """Return the moon whose host is at `distance` [m] from the Sun, recedes at `velocity` [m s-1] and has this phase.

    With d the host's distance, a the moon's from it and the phase f, the Sun stands at q = d + a cos f and p = a sin f
    from the moon, along axes of which the first points from the host to the Sun; the frame's own +x points there.
    """
    orbit, host = forces.orbit, forces.host
    a = host.distance
    turning = turning_at(orbit, distance)
    growth = -2.0 * velocity * turning / distance
    fall = turning * turning * distance - orbit.gm / (distance * distance)
    rate = host.rate - turning
    q, p = distance + a * cosine, a * sine
    q1, p1 = velocity - rate * p, rate * (a * cosine)
    q2 = fall - rate * p1 + growth * p
    p2 = -rate * (rate * p) - growth * (a * cosine)
    d2 = q * q + p * p
    d = math.sqrt(d2)
    per_d = 1.0 / d
    d1 = (q * q1 + p * p1) * per_d
    swerve = (q * p1 - p * q1) * (per_d * per_d)
    swerve_growth = (q * p2 - p * q2) * (per_d * per_d) - 2.0 * swerve * d1 * per_d
    return MovingBody(
        d,
        d1,
        turning + swerve,
        growth + swerve_growth,
        Host(
            host.gm,
            host.radius,
            a * (cosine * distance + a) * per_d,
            a * sine * distance * per_d,
            0.0,
            1.0 / (a * a * a),
            rate - swerve,
            q * per_d,
            -p * per_d,
            0.0,
            distance,
            host.sun_radius,
            host.casts,
            0.0,
            velocity,
            cosine,
            sine,
        ),
    )


@inlined
def _moon_in_series(forces, array, at, stride, t):
    distance, velocity = series_at(array, at, stride, t)
    d0, d1 = lane_value(array, at), lane_value(array, at + stride)
    c0, s0 = lane_value(array, at + (ORDER + 1) * stride), lane_value(array, at + (ORDER + 2) * stride)
    turning = turning_at(forces.orbit, d0)
    angle = t * (forces.host.rate - turning + t * (d1 * turning / d0))
    square = angle * angle
    sine = angle * fused(square, fused(square, fused(-square, 1.0 / 5040.0, 1.0 / 120.0), -1.0 / 6.0), 1.0)
    cosine = fused(square, fused(square, fused(-square, 1.0 / 720.0, 1.0 / 24.0), -1.0 / 2.0), 1.0)
    return _moon(forces, distance, velocity, fused(c0, cosine, -(s0 * sine)), fused(s0, cosine, c0 * sine))


@kernel
def _moon_on_orbit(forces, time):
    orbit, host = forces.orbit, forces.host
    distance, velocity = orbit_state(orbit, time)
    phase = host.phase + host.rate * time - (true_anomaly(orbit, time) - host.true_anomaly)
    return _moon(forces, distance, velocity, math.cos(phase), math.sin(phase))


@inlined
def _body_in_series(forces, array, at, stride, t):
    distance, velocity = series_at(array, at, stride, t)
    return _moving(forces.orbit, distance, velocity)


@inlined
def _body_on_orbit(forces, time):
    distance, velocity = orbit_state(forces.orbit, time)
    return _moving(forces.orbit, distance, velocity)


@inlined
def _set_series(forces, array, at, stride):
    d0, d1 = lane_value(array, at), lane_value(array, at + stride)
    d2, d3, d4, d5, d6, d7, d8 = orbit_series(forces.orbit, d0, d1)
    set_lane_value(array, at + 2 * stride, d2)
    set_lane_value(array, at + 3 * stride, d3)
    set_lane_value(array, at + 4 * stride, d4)
    set_lane_value(array, at + 5 * stride, d5)
    set_lane_value(array, at + 6 * stride, d6)
    set_lane_value(array, at + 7 * stride, d7)
    set_lane_value(array, at + 8 * stride, d8)


@inlined
def _keep_body(body, array, at, stride):
    set_lane_value(array, at, body.distance)
    set_lane_value(array, at + stride, body.radial_velocity)


@inlined
def _keep_moon(body, array, at, stride):
    set_lane_value(array, at, body.host.sun_distance)
    set_lane_value(array, at + stride, body.host.receding)
    set_lane_value(array, at + (ORDER + 1) * stride, body.host.cosine)
    set_lane_value(array, at + (ORDER + 2) * stride, body.host.sine)


@inlined
def _longest_on_orbit(forces, array, at, stride, longest):
    orbit = forces.orbit
    per_d = 1.0 / lane_value(array, at)
    per_d2 = per_d * per_d
    turning = orbit.angular_momentum * per_d2
    return min(longest, LONGEST_STEP * inverse_root(fused(orbit.gm, per_d * per_d2, turning * turning)))


@inlined
def _longest_of_moon(forces, array, at, stride, longest):
    swing = LONGEST_SWING / abs(forces.host.rate)
    return min(_longest_on_orbit(forces, array, at, stride, longest), swing)


def body_in_series(forces, array, at, stride, t):
    """Return the body at `t` [s] behind the start of the series at `array[at]`."""
    if forces.orbit is None:
        return forces
    place = _moon_in_series if isinstance(forces.host, HostOrbit) else _body_in_series
    return place.py_func(forces, array, at, stride, t)


def body_on_orbit(forces: Any, time: float) -> Any:
    """Return the body at `time` [s] after the stated position."""
    if forces.orbit is None:
        return forces
    place = _moon_on_orbit if isinstance(forces.host, HostOrbit) else _body_on_orbit
    return place.py_func(forces, time)


def stated_body(forces: Any) -> Any:
    """Return the body at its stated position."""
    return body_on_orbit(forces, 0.0) if isinstance(forces.host, HostOrbit) else forces


def set_series(forces, array, at, stride):
    """Complete the series at `array[at]`, of which distance and radial velocity are known."""
    if forces.orbit is not None:
        _set_series.py_func(forces, array, at, stride)


def keep_body(body, array, at, stride):
    """Set distance and radial velocity of the series at `array[at]` to those of `body`, where it moves."""
    if isinstance(body, MovingBody):
        keep = _keep_body if body.host is None else _keep_moon
        keep.py_func(body, array, at, stride)


def longest_on_orbit(forces, array, at, stride, longest):
    """Return the lesser of a step `longest` [s] and the longest over which the series is exact."""
    if forces.orbit is None:
        return longest
    limit = _longest_of_moon if isinstance(forces.host, HostOrbit) else _longest_on_orbit
    return limit.py_func(forces, array, at, stride, longest)


@inlined
def _turning_pulls(body, ax, ay, x, y):
    return fused(body.turning_growth, y, ax), fused(-body.turning_growth, x, ay)


def with_turning_growth(body, ax, ay, x, y):
    """Return the acceleration (`ax`, `ay`) [m s-2] at (`x`, `y`) [m] with what the growth of the turning adds."""
    return _turning_pulls.py_func(body, ax, ay, x, y) if isinstance(body, MovingBody) else (ax, ay)


@overload(with_turning_growth, jit_options=INLINED)
def _compiled_with_turning_growth(body, ax, ay, x, y):
    if "turning_growth" in body.fields:
        return lambda body, ax, ay, x, y: _turning_pulls(body, ax, ay, x, y)
    return lambda body, ax, ay, x, y: (ax, ay)


def stands_still(forces):
    """Return whether numba's type `forces` is that of a body that stands still."""
    return isinstance(field_type(forces, "orbit"), types.NoneType)


@overload(body_in_series, jit_options=INLINED)
def _compiled_body_in_series(forces, array, at, stride, t):
    if stands_still(forces):
        return lambda forces, array, at, stride, t: forces
    if not without_host(forces):
        return lambda forces, array, at, stride, t: _moon_in_series(forces, array, at, stride, t)
    return lambda forces, array, at, stride, t: _body_in_series(forces, array, at, stride, t)


@overload(body_on_orbit, jit_options=INLINED)
def _compiled_body_on_orbit(forces, time):
    if stands_still(forces):
        return lambda forces, time: forces
    if not without_host(forces):
        return lambda forces, time: _moon_on_orbit(forces, time)
    return lambda forces, time: _body_on_orbit(forces, time)


@overload(stated_body, jit_options=INLINED)
def _compiled_stated_body(forces):
    if stands_still(forces) or without_host(forces):
        return lambda forces: forces
    return lambda forces: _moon_on_orbit(forces, 0.0)


@overload(set_series, jit_options=INLINED)
def _compiled_set_series(forces, array, at, stride):
    if stands_still(forces):
        return lambda forces, array, at, stride: None
    return lambda forces, array, at, stride: _set_series(forces, array, at, stride)


@overload(keep_body, jit_options=INLINED)
def _compiled_keep_body(body, array, at, stride):
    if "turning_growth" in body.fields:
        if not without_host(body):
            return lambda body, array, at, stride: _keep_moon(body, array, at, stride)
        return lambda body, array, at, stride: _keep_body(body, array, at, stride)
    return lambda body, array, at, stride: None


@overload(longest_on_orbit, jit_options=INLINED)
def _compiled_longest_on_orbit(forces, array, at, stride, longest):
    if stands_still(forces):
        return lambda forces, array, at, stride, longest: longest
    if not without_host(forces):
        return lambda forces, array, at, stride, longest: _longest_of_moon(forces, array, at, stride, longest)
    return lambda forces, array, at, stride, longest: _longest_on_orbit(forces, array, at, stride, longest)

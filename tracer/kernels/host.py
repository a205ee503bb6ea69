"""A host planet beside a moon: its pull, its shadow, and the sphere that ends the flights of those that hit it.

A body without a host has None in its place, and numba compiles the kernels apart by that type alone, so that a host
costs nothing where there is none.
"""

import math
from typing import Any, NamedTuple

from numba.core import types
from numba.extending import overload

from tracer.kernels.compiling import INLINED, field_type, inlined, kernel
from tracer.kernels.fused import fused
from tracer.kernels.sunlight import visible_fraction

CLEAR, PARTIAL, DARK = 0.0, 1.0, 2.0
"""How a step lies in the host's shadow: all in full light, where part of the Sun may be covered, all in the umbra."""

LEAST_PART = 0.125
LEAST_RADII = 0.02
"""Longest way of a step where part of the Sun may be covered: of the penumbra's width, and of the host's radius."""

CAREFUL = 0.8
"""Longest way of a step elsewhere, in units of that to the penumbra's surface."""


class Host(NamedTuple):
    """The host at a moment, in the Sun-fixed frame of its moon.

    `gm` [m3 s-2] and `radius` [m]; it stands at (`x`, `y`, `z`) [m], and `per_gap3` [m-3] is one over its distance's
    cube; it goes round the moon at `swing` [rad s-1] about +z in this frame. It stands `sun_distance` [m] from the Sun,
    whose radius is `sun_radius` [m] and whose direction, seen from it, is the unit vector (`sun_x`, `sun_y`, `sun_z`);
    it casts a shadow if `casts` is 1. `slip` [m s-1] is what the radial velocity of an atom off the axis gains for its
    distance from it over that from the Sun, since the frame turns with the host and not about the Sun. Of a moon that
    moves `receding` [m s-1] is the host's radial velocity, and `cosine` and `sine` are its direction's, from the moon,
    along axes of which the first points from the host to the Sun.
    """

    gm: float
    radius: float
    x: float
    y: float
    z: float
    per_gap3: float
    swing: float
    sun_x: float
    sun_y: float
    sun_z: float
    sun_distance: float
    sun_radius: float
    casts: float
    slip: float
    receding: float
    cosine: float
    sine: float


class HostOrbit(NamedTuple):
    """A moon's circular orbit about its host, which itself travels on an orbit about the Sun.

    `gm` [m3 s-2] and `radius` [m] of the host; `distance` [m] of the two, whose direction turns at `rate` [rad s-1]
    about +z among the stars. At time 0 it stands at the angle `phase` [rad], seen from the moon, from the direction in
    which the host sees the Sun, and the host at `true_anomaly` [rad]. `sun_radius` and `casts` as in `Host`.
    """

    gm: float
    radius: float
    distance: float
    rate: float
    phase: float
    true_anomaly: float
    sun_radius: float
    casts: float


@inlined
def _pulled(host, ax, ay, az, x, y, z):
    qx, qy, qz = host.x - x, host.y - y, host.z - z
    q2 = fused(qx, qx, fused(qy, qy, qz * qz))
    pull = host.gm / (q2 * math.sqrt(q2))
    level = host.gm * host.per_gap3
    return (
        fused(pull, qx, fused(-level, host.x, ax)),
        fused(pull, qy, fused(-level, host.y, ay)),
        fused(pull, qz, fused(-level, host.z, az)),
    )


@inlined
def _heights(host, x, y, z):
    """Return places [m] along the shadow's axis, sunward positive, and off it, and over penumbra and umbra."""
    qx, qy, qz = x - host.x, y - host.y, z - host.z
    along = fused(qx, host.sun_x, fused(qy, host.sun_y, qz * host.sun_z))
    off = math.sqrt(max(0.0, fused(qx, qx, fused(qy, qy, fused(qz, qz, -(along * along))))))
    per_distance = 1.0 / host.sun_distance
    wide = (host.sun_radius + host.radius) * per_distance
    narrow = (host.sun_radius - host.radius) * per_distance
    penumbra = max(
        off * math.sqrt(1.0 - wide * wide) + along * wide - host.radius, along - host.radius * wide
    )
    umbra = max(
        off * math.sqrt(1.0 - narrow * narrow) - along * narrow - host.radius, along + host.radius * narrow
    )
    return along, off, penumbra, umbra


@kernel
def shadow_heights(host, x, y, z):
    """Return the heights [m] of (x, y, z) over the surfaces of penumbra and umbra; below 0 inside."""
    _, _, penumbra, umbra = _heights(host, x, y, z)
    return penumbra, umbra


@kernel
def sun_past(host, x, y, z):
    """Return the part of the Sun's disc, 0 to 1, that is seen past the host at (x, y, z) [m]."""
    if host.casts == 0.0:
        return 1.0
    along, off, penumbra, umbra = _heights(host, x, y, z)
    if penumbra >= 0.0:
        return 1.0
    if umbra < 0.0:
        return 0.0
    return visible_fraction(along, off, 0.0, host.sun_distance, host.radius, host.sun_radius)


@inlined
def shade_and_nearness(host, x, y, z):
    """Return how a step from (x, y, z) [m] lies in the host's shadow, and one over the longest way [m-1] it may take.

    So short that it enters no other light than it says, and doesn't pass the host twice.
    """
    _, _, penumbra, umbra = _heights(host, x, y, z)
    least = LEAST_PART * (umbra - penumbra) + LEAST_RADII * host.radius
    lit, dark = (penumbra > least) | (host.casts == 0.0), -umbra > least
    shade = CLEAR if lit else (DARK if dark else PARTIAL)
    way = CAREFUL * penumbra if lit else (CAREFUL * -umbra if dark else least)
    way = way if host.casts > 0.0 else math.inf
    return shade, max(1.0 / way, _per_distance(host, x, y, z))


@inlined
def _per_distance(host, x, y, z):
    qx, qy, qz = x - host.x, y - host.y, z - host.z
    return 1.0 / math.sqrt(fused(qx, qx, fused(qy, qy, qz * qz)))


@inlined
def approach(host, v2):
    """Return the greatest square of the speed [m2 s-2] that an atom of squared speed `v2` may have beside the host."""
    speed = math.sqrt(v2) + abs(host.swing) * math.sqrt(host.x * host.x + host.y * host.y)
    return speed * speed


@inlined
def _height_over(host, place):
    """Return the height [m] over the host's surface and its rate of change [m s-1]."""
    x, y, z, vx, vy, vz = place
    qx, qy, qz = x - host.x, y - host.y, z - host.z
    q = math.sqrt(qx * qx + qy * qy + qz * qz)
    rate = qx * (vx + host.swing * host.y) + qy * (vy - host.swing * host.x) + qz * vz
    return q - host.radius, rate / q


@inlined
def _neared(host, end_host, start, end):
    _, rate = _height_over(host, start)
    end_height, end_rate = _height_over(end_host, end)
    return (end_height < 0.0) | ((rate < 0.0) & (end_rate > 0.0))


@inlined
def _nearest(host, radius, per_r, x, y, z):
    per_q = _per_distance(host, x, y, z)
    return max(per_r, per_q), max(per_r, host.radius / radius * per_q)


def with_host_pull(body: Any, ax: float, ay: float, az: float, x: float, y: float, z: float) -> Any:
    """Return the acceleration [m s-2] at (x, y, z) [m] with the host's pull less its pull on the moon."""
    return (ax, ay, az) if body.host is None else _pulled.py_func(body.host, ax, ay, az, x, y, z)


def with_slip(body: Any, velocity: float, y: float) -> float:
    """Return the radial velocity [m s-1] from the Sun of an atom whose `y` is in units of its distance from the Sun."""
    return velocity if body.host is None else velocity + body.host.slip * y


def past_host(body: Any, lit: float, x: float, y: float, z: float) -> float:
    """Return the part `lit` of the Sun that is seen past the moon, less what the host covers.

    As if the two covered parts of the Sun's disc by chance: exact where one covers all or nothing.
    """
    return lit if body.host is None else lit * sun_past(body.host, x, y, z)


def host_height(body: Any, place: tuple[float, ...]) -> tuple[float, float]:
    """Return the height [m] over the host and its rate of change [m s-1]; infinite without one."""
    return (math.inf, 0.0) if body.host is None else _height_over.py_func(body.host, place)


def host_neared(body: Any, end_body: Any, start: tuple[float, ...], end: tuple[float, ...]) -> bool:
    """Return whether a step between two places may have met the host, which is that of `body`, then of `end_body`."""
    return False if body.host is None else _neared.py_func(body.host, end_body.host, start, end)


def nearest(body: Any, radius: float, per_r: float, x: float, y: float, z: float) -> tuple[float, float]:
    """Return one over the lesser of the distances [m-1] from moon and host.

    That is `per_r` [m-1] without a host. It comes twice, the second time as if each radius of the host were one of the
    moon, `radius` [m].
    """
    return (per_r, per_r) if body.host is None else _nearest.py_func(body.host, radius, per_r, x, y, z)


def without_host(record: Any) -> bool:
    """Return whether numba's type `record`, Forces or a body, has no host."""
    return isinstance(field_type(record, "host"), types.NoneType)


@overload(with_host_pull, jit_options=INLINED)
def _compiled_with_host_pull(body, ax, ay, az, x, y, z):
    if without_host(body):
        return lambda body, ax, ay, az, x, y, z: (ax, ay, az)
    return lambda body, ax, ay, az, x, y, z: _pulled(body.host, ax, ay, az, x, y, z)


@overload(with_slip, jit_options=INLINED)
def _compiled_with_slip(body, velocity, y):
    if without_host(body):
        return lambda body, velocity, y: velocity
    return lambda body, velocity, y: fused(body.host.slip, y, velocity)


@overload(past_host, jit_options=INLINED)
def _compiled_past_host(body, lit, x, y, z):
    if without_host(body):
        return lambda body, lit, x, y, z: lit
    return lambda body, lit, x, y, z: lit * sun_past(body.host, x, y, z)


@overload(host_height, jit_options=INLINED)
def _compiled_host_height(body, place):
    if without_host(body):
        return lambda body, place: (math.inf, 0.0)
    return lambda body, place: _height_over(body.host, place)


@overload(host_neared, jit_options=INLINED)
def _compiled_host_neared(body, end_body, start, end):
    if without_host(body):
        return lambda body, end_body, start, end: False
    return lambda body, end_body, start, end: _neared(body.host, end_body.host, start, end)


@overload(nearest, jit_options=INLINED)
def _compiled_nearest(body, radius, per_r, x, y, z):
    if without_host(body):
        return lambda body, radius, per_r, x, y, z: (per_r, per_r)
    return lambda body, radius, per_r, x, y, z: _nearest(body.host, radius, per_r, x, y, z)

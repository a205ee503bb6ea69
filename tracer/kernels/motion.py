"""Acceleration and losses of one atom in the turning Sun-fixed frame."""

import math
from typing import NamedTuple

import numpy as np

from tracer.kernels.compiling import inlined
from tracer.kernels.host import Host, HostOrbit, past_host, with_host_pull, with_slip
from tracer.kernels.lines import sum_of_lines
from tracer.kernels.orbit import with_turning_growth
from tracer.kernels.shadow import Shadow, lit_fraction
from tracer.kernels.two_body import Orbit


class Forces(NamedTuple):
    """What acts on an atom, and the spheres between which it flies.

    `gm` [m3 s-2] and `radius` [m] of the body, `outer_radius` [m]; `tide_gm` [m3 s-2] is the Sun's, 0 without
    tide; the body stands at `distance` [m] and recedes at `radial_velocity` [m s-1]; the frame turns at
    `turning` [rad s-1] about +z, 0 switches its terms off. `push` [m s-2] away from the Sun, at
    `light_distance` [m] in full light, comes on top of the lines'. A body that moves has an `orbit`, and distance,
    radial velocity and turning are those at time 0; one that stands still has None. A moon has a `host`, a HostOrbit
    where it moves; its distance, radial velocity and turning are then the host's, and `orbit` is the host's too.
    """

    gm: float
    radius: float
    outer_radius: float
    tide_gm: float
    distance: float
    radial_velocity: float
    turning: float
    push: float
    light_distance: float
    orbit: Orbit | None
    host: Host | HostOrbit | None


class Losses(NamedTuple):
    """Rates of loss [s-1], at `light_distance` and in full light where they depend on either.

    `ionizing` and `other_sunlight` go as light received; `other_lit` is constant in sunlight,
    `other_distance` goes with the inverse square of the Sun's distance in light and dark, `other_everywhere`
    is constant.
    """

    ionizing: float
    other_sunlight: float
    other_lit: float
    other_distance: float
    other_everywhere: float


class Sky(NamedTuple):
    """The numbers that govern a flight."""

    forces: Forces
    losses: Losses
    shadow: Shadow


class Conditions(NamedTuple):
    """All that governs a flight; `push_tables` (see `lines`) sum up to the lines' acceleration [m s-2] at 1 au."""

    sky: Sky
    push_tables: np.ndarray


@inlined
def radial_velocity(body, x, y, z, vx, vy, vz):
    """Return the atom's heliocentric radial velocity [m s-1], positive away from the Sun.

    `body` is the Forces of one that stands still, or a MovingBody. The turning of the frame moves atom and origin alike
    about the Sun and drops out, but for the slip of a frame that turns with a host.
    """
    sx = body.distance - x
    s = math.sqrt(sx * sx + y * y + z * z)
    return with_slip(body, (y * vy + z * vz - sx * (vx - body.radial_velocity)) / s, y / s)


@inlined
def sunlight_received(sky, zone, body, x, y, z):
    """Return the light at (x, y, z) [m] relative to full light at `light_distance`."""
    forces = sky.forces
    sx = body.distance - x
    lit = past_host(body, lit_fraction(sky.shadow, zone, x, y, z, body.distance), x, y, z)
    return lit * forces.light_distance * forces.light_distance / (sx * sx + y * y + z * z)


@inlined
def rates_of_change(sky, tables, zone, position, velocity):
    """Return what `rates_beside` does while the body is where its Forces say."""
    return rates_beside(sky, tables, zone, sky.forces, position, velocity)


@inlined
def rates_beside(sky, tables, zone, body, position, velocity):
    """Return ((ax, ay, az) [m s-2], (ionising, other) loss [s-1]) of an atom in shadow `zone` of `body`.

    a = -GM r/r^3 + GM_sun (s/D^3 - x_hat/d^2) - b s/D - 2 W x v + W^2 (x, y, 0) - dW/dt x r, s from the atom to the
    Sun, D = |s|, W the turning and b the radiation acceleration; `body` is the Forces of one that stands still, whose
    W is constant, or a MovingBody. A host at h adds GM_host ((h - r)/|h - r|^3 - h/|h|^3).
    """
    forces, losses = sky.forces, sky.losses
    x, y, z = position
    vx, vy, vz = velocity
    w = body.turning
    r2 = x * x + y * y + z * z
    pull = forces.gm * math.sqrt(r2) / (r2 * r2)
    sx = body.distance - x
    s2 = sx * sx + y * y + z * z
    per_s2 = 1.0 / s2
    per_s = math.sqrt(s2) * per_s2
    ux, uy, uz = sx * per_s, y * per_s, z * per_s
    lit = past_host(body, lit_fraction(sky.shadow, zone, x, y, z, body.distance), x, y, z)
    dilution = forces.light_distance * forces.light_distance * per_s2
    light = lit * dilution
    sunward = forces.tide_gm * per_s2 - light * forces.push
    # A stage's place is known before its velocity: all but the lines' push is ready when that comes.
    ax = sunward * ux - forces.tide_gm / (body.distance * body.distance) + (w * w - pull) * x
    ay = (w * w - pull) * y - sunward * uy
    az = -pull * z - sunward * uz
    ax, ay = with_turning_growth(body, ax, ay, x, y)
    ax, ay, az = with_host_pull(body, ax, ay, az, x, y, z)
    push = 0.0
    if lit > 0.0:
        receding = (uy * vy + uz * vz) - ux * (vx - body.radial_velocity)
        push = sum_of_lines(tables, with_slip(body, receding, uy))
    acceleration = (
        (ax + 2.0 * w * vy) - (light * ux) * push,
        (ay - 2.0 * w * vx) + (light * uy) * push,
        az + (light * uz) * push,
    )
    other = light * losses.other_sunlight + lit * losses.other_lit + dilution * losses.other_distance
    return acceleration, (light * losses.ionizing, other + losses.other_everywhere)

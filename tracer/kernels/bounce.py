"""Re-emission of an atom that comes back to the surface and does not stick."""

import math
from typing import NamedTuple

from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.sticking import Sticking, sticking_probability
from tracer.kernels.temperature import SurfaceTemperature, temperature


class Surface(NamedTuple):
    """What the ground does to a returning atom.

    `sticking` says how likely capture is, `accommodation` the share of its energy that it exchanges with the
    ground, `speed_squared_per_kelvin` = 2 k/m [m2 s-2 K-1], `spin` the ground's angular rate in the Sun-fixed frame
    [rad s-1] about +z.
    """

    temperature: SurfaceTemperature
    sticking: Sticking
    accommodation: float
    speed_squared_per_kelvin: float
    spin: float


@kernel
def sticking_at(surface, nx, ny, nz):
    """Return the probability that an atom that lands at unit vector (nx, ny, nz) is adsorbed."""
    if surface.sticking.e_folding == math.inf:
        return surface.sticking.value
    return sticking_probability(surface.sticking, temperature(surface.temperature, nx, ny, nz))


@inlined
def sticks(surface, nx, ny, nz, rng):
    """Return True where an atom that lands at unit vector (nx, ny, nz) is adsorbed; what is certain draws no number."""
    chance = sticking_at(surface, nx, ny, nz)
    return chance > 0.0 and (chance >= 1.0 or rng.random() < chance)


@kernel
def thermal_speed_squared(rng, speed_squared_per_kelvin, kelvin):
    """Draw v^2 [m2 s-2] of a flux-weighted Maxwellian: pdf(v) ~ v^3 exp(-m v^2/2kT), so v^2 = -(2kT/m) ln(u1 u2)."""
    # 1 - u lies in (0, 1]: the logarithm stays finite.
    return -speed_squared_per_kelvin * kelvin * math.log((1.0 - rng.random()) * (1.0 - rng.random()))


@kernel
def tangents(nx, ny, nz):
    """Return two unit vectors that complete (nx, ny, nz) to a right-handed basis, without a pole where it fails.

    Duff et al. 2017, Journal of Computer Graphics Techniques 6, 1.
    """
    sign = math.copysign(1.0, nz)
    a = -1.0 / (sign + nz)
    b = nx * ny * a
    return 1.0 + sign * nx * nx * a, sign * b, -sign * nx, b, sign + ny * ny * a, -ny


@kernel
def direction_about(nx, ny, nz, cosine, azimuth):
    """Return the unit vector at angle acos(`cosine`) from (nx, ny, nz), turned about it by `azimuth` [rad]."""
    sine = math.sqrt(max(0.0, 1.0 - cosine * cosine))
    along = sine * math.cos(azimuth)
    across = sine * math.sin(azimuth)
    ax, ay, az, bx, by, bz = tangents(nx, ny, nz)
    return (
        cosine * nx + along * ax + across * bx,
        cosine * ny + along * ay + across * by,
        cosine * nz + along * az + across * bz,
    )


@inlined
def rebound(rng, surface, nx, ny, nz, incoming_speed_squared):
    """Return the velocity [m s-1], relative to the ground, of an atom that bounces at unit vector (nx, ny, nz).

    E_out = alpha E_thermal + (1 - alpha) E_in with a fresh flux-weighted Maxwellian E_thermal at the local
    temperature, emitted by the cosine law (Hunten, Morgan & Shemansky 1988, in Mercury, Univ. of Arizona Press:
    memory).
    """
    speed_squared = (1.0 - surface.accommodation) * incoming_speed_squared
    if surface.accommodation > 0.0:
        kelvin = temperature(surface.temperature, nx, ny, nz)
        speed_squared += surface.accommodation * thermal_speed_squared(
            rng, surface.speed_squared_per_kelvin, kelvin
        )
    speed = math.sqrt(speed_squared)
    cosine = math.sqrt(rng.random())
    dx, dy, dz = direction_about(nx, ny, nz, cosine, 2.0 * math.pi * rng.random())
    return speed * dx, speed * dy, speed * dz

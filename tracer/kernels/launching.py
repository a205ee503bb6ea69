"""Launch velocities from speed, zenith angle and azimuth."""

import math

import numpy as np

from tracer.kernels.bounce import tangents
from tracer.kernels.compiling import allocating_kernel, kernel

LEAST_SINE = 1e-6
"""Sine of the distance from the subsolar and antisolar points below which sunward is no direction along the ground."""


@kernel
def sunward_tangents(nx, ny, nz):
    """Return two unit vectors along the ground at unit vector n: sunward, and n x sunward."""
    sine = math.sqrt(ny * ny + nz * nz)
    if sine < LEAST_SINE:
        return tangents(nx, ny, nz)
    return sine, -nx * ny / sine, -nx * nz / sine, 0.0, nz / sine, -ny / sine


@allocating_kernel
def velocities(positions, speeds, cosines, azimuths):
    """Return velocities (n, 3) [m s-1] of launches at unit vectors `positions` (n, 3).

    `speeds` (n,) [m s-1], `cosines` (n,) of the zenith angle, `azimuths` (n,) [rad] about the local vertical from
    sunward: azimuths are even, but strata of them shall mean the same everywhere.
    """
    result = np.empty_like(positions)
    for i in range(positions.shape[0]):
        nx, ny, nz = positions[i, 0], positions[i, 1], positions[i, 2]
        ax, ay, az, bx, by, bz = sunward_tangents(nx, ny, nz)
        sine = math.sqrt(max(0.0, 1.0 - cosines[i] * cosines[i]))
        along, across = sine * math.cos(azimuths[i]), sine * math.sin(azimuths[i])
        result[i, 0] = speeds[i] * (cosines[i] * nx + along * ax + across * bx)
        result[i, 1] = speeds[i] * (cosines[i] * ny + along * ay + across * by)
        result[i, 2] = speeds[i] * (cosines[i] * nz + along * az + across * bz)
    return result

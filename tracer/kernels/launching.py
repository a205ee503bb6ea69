"""Launch velocities from speed, zenith angle and azimuth."""

import math

import numpy as np

from tracer.kernels.angles import sine_and_cosine
from tracer.kernels.bounce import direction_about
from tracer.kernels.compiling import allocating_kernel, kernel

LEAST_SINE = 1e-6
"""Sine of the distance from the subsolar and antisolar points below which sunward is no direction along the ground."""


@allocating_kernel
def velocities(positions, speeds, cosines, azimuths):
    """Return velocities (n, 3) [m s-1] of launches at unit vectors `positions` (n, 3).

    `speeds` (n,) [m s-1], `cosines` (n,) of the zenith angle, `azimuths` (n,) [rad] about the local vertical from
    sunward, the direction (s, -nx ny/s, -nx nz/s) with s^2 = ny^2 + nz^2 at n: azimuths are even, but strata of them
    shall mean the same everywhere.
    """
    result = np.empty((speeds.shape[0], 3))
    # Flat, else the compiler makes no vector operations of the loop.
    ups, found = positions.reshape(-1), result.reshape(-1)
    without_sunward = 0
    for i in range(speeds.shape[0]):
        nx, ny, nz = ups[3 * i], ups[3 * i + 1], ups[3 * i + 2]
        from_axis = math.sqrt(ny * ny + nz * nz)
        without_sunward += 1 if from_axis < LEAST_SINE else 0
        per_axis = 1.0 / (LEAST_SINE if from_axis < LEAST_SINE else from_axis)
        up = speeds[i] * cosines[i]
        flat = speeds[i] * math.sqrt(max(0.0, 1.0 - cosines[i] * cosines[i]))
        sine, cosine = sine_and_cosine(azimuths[i])
        along, across = flat * cosine, flat * sine * per_axis
        outward = up - along * nx * per_axis
        found[3 * i] = up * nx + along * from_axis
        found[3 * i + 1] = outward * ny + across * nz
        found[3 * i + 2] = outward * nz - across * ny
    if without_sunward > 0:
        _launch_near_axis(positions, speeds, cosines, azimuths, result)
    return result


@kernel
def _launch_near_axis(positions, speeds, cosines, azimuths, result):
    """Set the velocities of launches so near to the subsolar or antisolar point that nothing there is sunward."""
    for i in range(speeds.shape[0]):
        nx, ny, nz = positions[i, 0], positions[i, 1], positions[i, 2]
        if math.sqrt(ny * ny + nz * nz) < LEAST_SINE:
            x, y, z = direction_about(nx, ny, nz, cosines[i], azimuths[i])
            result[i, 0], result[i, 1], result[i, 2] = speeds[i] * x, speeds[i] * y, speeds[i] * z

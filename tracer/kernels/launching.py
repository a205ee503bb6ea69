"""Launch velocities from speed, zenith angle and azimuth."""

import numpy as np

from tracer.kernels.bounce import direction_about
from tracer.kernels.compiling import allocating_kernel


@allocating_kernel
def velocities(positions, speeds, cosines, azimuths):
    """Return velocities (n, 3) [m s-1] of launches at unit vectors `positions` (n, 3).

    `speeds` (n,) [m s-1], `cosines` (n,) of the zenith angle, `azimuths` (n,) [rad] about the local vertical, from a
    direction that has no meaning: azimuths here are even.
    """
    result = np.empty_like(positions)
    for i in range(positions.shape[0]):
        x, y, z = direction_about(positions[i, 0], positions[i, 1], positions[i, 2], cosines[i], azimuths[i])
        result[i, 0] = speeds[i] * x
        result[i, 1] = speeds[i] * y
        result[i, 2] = speeds[i] * z
    return result

"""Ends of many single flights, without counting where they went."""

import math

import numpy as np

from tracer.kernels.arc import highest, position_at
from tracer.kernels.arc_flight import arc_end, arc_state, launch_arc
from tracer.kernels.compiling import allocating_kernel


@allocating_kernel
def single_hops(motion, positions, velocities):
    """Return (endings, durations [s], arcs [rad], apexes [m]) of launches, each (n,).

    `positions` (n, 3) are unit vectors, `velocities` (n, 3) [m s-1] in the Sun-fixed frame. An arc is the angle at the
    body's centre between launch and end, the short way where the flight goes round more than half of the body.
    """
    count = positions.shape[0]
    endings = np.empty(count, np.int64)
    durations = np.empty(count)
    arcs = np.empty(count)
    apexes = np.empty(count)
    for i in range(count):
        nx, ny, nz = positions[i, 0], positions[i, 1], positions[i, 2]
        r = motion.radius
        arc = launch_arc(motion, r * nx, r * ny, r * nz, velocities[i, 0], velocities[i, 1], velocities[i, 2])
        endings[i], s_end = arc_end(motion, arc, motion.age_limit)
        t, x, y, z, _vx, _vy, _vz = arc_state(motion, arc, s_end)
        durations[i] = t
        cx, cy, cz = ny * z - nz * y, nz * x - nx * z, nx * y - ny * x
        arcs[i] = math.atan2(math.sqrt(cx * cx + cy * cy + cz * cz), nx * x + ny * y + nz * z)
        apexes[i] = position_at(arc, highest(arc, s_end))[1] - r
    return endings, durations, arcs, apexes

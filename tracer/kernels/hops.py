"""Ends of many single flights, without counting where they went."""

import math

import numpy as np

from tracer.kernels.arc import highest, position_at
from tracer.kernels.arc_flight import arc_end, arc_state, launch_arc
from tracer.kernels.compiling import allocating_kernel, kernel
from tracer.kernels.endings import LANDED


@kernel
def _above_circular_speed(arc):
    """Return True where the horizontal speed at launch exceeds that of a circular orbit there."""
    speed_squared = 2.0 * arc.gm / arc.r0 - arc.beta
    climb = arc.eta / arc.r0
    return (speed_squared - climb * climb) * arc.r0 > arc.gm


@allocating_kernel
def single_hops(motion, positions, velocities):
    """Return (endings, durations [s], arcs [rad], apexes [m]) of launches, each (n,).

    `positions` (n, 3) are unit vectors, `velocities` (n, 3) [m s-1] in the Sun-fixed frame. An arc is the angle that
    the flight sweeps about the body's centre, which may exceed half a turn.
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
        if endings[i] == LANDED and _above_circular_speed(arc):
            # The launch lies in the half of the ellipse about its pericentre: the flight goes round the other half.
            arcs[i] = 2.0 * math.pi - arcs[i]
        apexes[i] = position_at(arc, highest(arc, s_end))[1] - r
    return endings, durations, arcs, apexes

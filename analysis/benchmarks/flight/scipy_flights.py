"""The same flights by SciPy's `solve_ivp` with RK45, the same pair, and events for ground and outer sphere."""

import math
from collections.abc import Callable
from time import thread_time

import numpy as np
from case import Case, Floats
from numba import njit
from scipy.integrate import solve_ivp

from tracer.kernels.endings import CROSSED, LANDED
from tracer.kernels.lines import sum_of_lines
from tracer.kernels.sunlight import visible_fraction

RELATIVE_TOLERANCE = 1e-7


def slopes_of(case: Case) -> Callable[[float, Floats], Floats]:
    """Return the compiled right-hand side for x, y, z, vx, vy, vz and the hazard."""
    conditions = case.work.world.light.conditions
    forces, losses, shadow = conditions.sky
    gm, d, v_r, w, tide = (
        forces.gm,
        forces.distance,
        forces.radial_velocity,
        forces.turning,
        forces.tide_gm,
    )
    au2, rate = forces.light_distance**2, losses.ionizing
    radius, sun_radius, tables = shadow.radius, shadow.sun_radius, conditions.push_tables

    @njit(error_model="numpy")
    def slopes(_time, s):
        x, y, z, vx, vy, vz = s[0], s[1], s[2], s[3], s[4], s[5]
        r2 = x * x + y * y + z * z
        far = math.sqrt((d - x) ** 2 + y * y + z * z)
        pull = gm / (r2 * math.sqrt(r2))
        light = visible_fraction(x, y, z, d, radius, sun_radius) * au2 / (far * far)
        push = light * sum_of_lines(tables, (y * vy + z * vz - (d - x) * (vx - v_r)) / far)
        sunward = (tide / (far * far) - push) / far
        ax = -pull * x + sunward * (d - x) - tide / (d * d) + w * (2.0 * vy + w * x)
        ay = -(pull + sunward) * y + w * (w * y - 2.0 * vx)
        return np.array([vx, vy, vz, ax, ay, -(pull + sunward) * z, light * rate])

    return slopes


def scipy_ends(case: Case, count: int) -> tuple[float, Floats]:
    """Return (seconds, ends) of the first `count` launches; `ends` (n, 6) as flight.c writes them."""
    slopes = slopes_of(case)
    motion = case.work.world.motion

    def over_ground(_time: float, s: Floats) -> float:
        return math.sqrt(s[0] * s[0] + s[1] * s[1] + s[2] * s[2]) - motion.radius

    def under_sphere(_time: float, s: Floats) -> float:
        return motion.outer_radius - math.sqrt(s[0] * s[0] + s[1] * s[1] + s[2] * s[2])

    for event in (over_ground, under_sphere):
        event.terminal, event.direction = True, -1  # type: ignore[attr-defined]
    scale = np.array([motion.radius] * 3 + [math.sqrt(motion.gm / motion.radius)] * 3 + [1.0])
    slopes(0.0, np.append(case.states[0], 0.0))
    ends = np.zeros((count, 6))
    begin = thread_time()
    for i in range(count):
        solution = solve_ivp(
            slopes,
            (0.0, motion.age_limit),
            np.append(case.states[i], 0.0),
            method="RK45",
            rtol=RELATIVE_TOLERANCE,
            atol=RELATIVE_TOLERANCE * scale,
            events=(over_ground, under_sphere),
        )
        ends[i, 0] = LANDED if len(solution.t_events[0]) else CROSSED
        ends[i, 1] = solution.t[-1]
        ends[i, 2:5] = solution.y[:3, -1]
        ends[i, 5] = math.exp(-solution.y[6, -1])
    return thread_time() - begin, ends

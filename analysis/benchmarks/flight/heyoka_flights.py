"""Taylor series by heyoka, one flight at a time, with events for ground and outer sphere.

Its expressions are smooth: no shadow, and for the two tabulated lines one Lorentzian dip in the Doppler velocity. It
flies an easier problem, and its landing error is taken against itself at the smallest tolerance.
"""

from time import thread_time
from typing import Any

import heyoka as hy
import numpy as np
from case import Case, Floats
from scipy.optimize import curve_fit

from tracer.kernels.endings import CROSSED, LANDED
from tracer.kernels.lines import sum_of_lines

TOLERANCE = 1e-7
FASTEST = 40e3
"""The dip is fitted to the tables from 0 to this velocity [m s-1]."""


def dip(velocity: Floats, continuum: float, depth: float, width: float) -> Floats:
    """Return a push with a Lorentzian dip at rest."""
    return np.asarray(continuum * (1.0 - depth / (1.0 + (velocity / width) ** 2)))


def integrator(case: Case, tolerance: float) -> Any:
    """Return a `taylor_adaptive` for lengths in body radii and times in sqrt(R^3/GM)."""
    conditions = case.work.world.light.conditions
    forces, losses, _ = conditions.sky
    length, speed = forces.radius, np.sqrt(forces.gm / forces.radius)
    gravity = forces.gm / length**2
    x, y, z, vx, vy, vz, hazard = hy.make_vars("x", "y", "z", "vx", "vy", "vz", "hazard")
    velocity = np.linspace(0.0, FASTEST, 400)
    push = np.array([sum_of_lines(conditions.push_tables, v) for v in velocity])
    (continuum, depth, width), _ = curve_fit(dip, velocity, push, (push[-1], 0.9, 5e3))
    d, w, tide = forces.distance / length, forces.turning * length / speed, forces.tide_gm / forces.gm
    sx = d - x
    r2, s2 = x**2 + y**2 + z**2, sx**2 + y**2 + z**2
    pull, per_s = r2**-1.5, s2**-0.5
    receding = (y * vy + z * vz - sx * (vx - forces.radial_velocity / speed)) * per_s
    lines = continuum / gravity * (1.0 - depth / (1.0 + (receding * (speed / width)) ** 2))
    light = (forces.light_distance / length) ** 2 / s2
    sunward = (tide / s2 - light * lines) * per_s
    equations = [
        (x, vx),
        (y, vy),
        (z, vz),
        (vx, -pull * x + sunward * sx - tide / d**2 + w * (2.0 * vy + w * x)),
        (vy, -(pull + sunward) * y + w * (w * y - 2.0 * vx)),
        (vz, -(pull + sunward) * z),
        (hazard, light * (losses.ionizing * length / speed)),
    ]
    outer = forces.outer_radius / length
    events = [
        hy.t_event(r2 - 1.0, direction=hy.event_direction.negative),
        hy.t_event(r2 - outer**2, direction=hy.event_direction.positive),
    ]
    return hy.taylor_adaptive(equations, np.zeros(7), tol=tolerance, t_events=events)


def heyoka_ends(case: Case, count: int, tolerance: float = TOLERANCE) -> tuple[float, Floats]:
    """Return (seconds, ends) of the first `count` launches; `ends` (n, 6) as flight.c writes them."""
    motion = case.work.world.motion
    length, speed = motion.radius, np.sqrt(motion.gm / motion.radius)
    flight = integrator(case, tolerance)
    # From a hair above the ground: a root at the very start of a step hides the landing in the same step.
    lift = 1.0 + 1e-9
    scale = np.array([length / lift] * 3 + [speed] * 3)
    starts = np.hstack([case.states / scale, np.zeros((len(case.states), 1))])
    limit = motion.age_limit * speed / length
    ends = np.zeros((count, 6))
    begin = thread_time()
    for i in range(count):
        flight.time = 0.0
        flight.state[:] = starts[i]
        flight.reset_cooldowns()
        outcome = flight.propagate_until(limit)[0]
        ends[i, 0] = CROSSED if int(outcome.value) == -2 else LANDED
        ends[i, 1] = flight.time
        ends[i, 2:6] = flight.state[0], flight.state[1], flight.state[2], flight.state[6]
    spent = thread_time() - begin
    ends[:, 1] *= length / speed
    ends[:, 2:5] *= length
    ends[:, 5] = np.exp(-ends[:, 5])
    return spent, ends

"""Which steps are good enough and how long the next one is."""

import math

from tracer.kernels.compiling import kernel, merged

DEFAULT_TOLERANCE = 1e-6
"""Aimed error of a landing place in radii: half of all lie within it, and all within a thousandfold.

Save some 3 in 100,000, temporary satellites between push and pull, that no step size makes predictable.
"""

STEP_SHARE = 0.3
"""The share of the tolerance that one step may take, in units of the distance from the centre and of the speed."""

FIRST_STEP = 1.5
"""Length of the first step in dynamical times, at a step error of 1; measured."""

SAFETY = 0.9
LEAST_CHANGE = 0.2
GREATEST_CHANGE = 5.0


@merged
def step_error(error, tolerance, distance, speed):
    """Return the square of a step's error in units of what `tolerance` allows; accepted up to 1.

    `error` holds squares: position [m] against `distance` [m] from the centre, velocity [m s-1] against
    `speed`, the hazard, which survival is the exponential of, against 1.
    """
    allowed = STEP_SHARE * tolerance
    return (error[0] / (distance * distance) + error[1] / (speed * speed) + error[2]) / (allowed * allowed)


@merged
def step_change(error):
    """Return the factor by which the next step is longer, for a fifth-order step of squared `error`."""
    if not error < 1e30:
        return LEAST_CHANGE
    if error < 1e-12:
        return GREATEST_CHANGE
    return min(GREATEST_CHANGE, max(LEAST_CHANGE, SAFETY * error**-0.1))


@kernel
def first_step(forces, tolerance, distance, climb, speed):
    """Return a first step [s] at `distance` [m] for a radial speed `climb` and a `speed` [m s-1].

    The error of a step on a Kepler orbit goes with the sixth power of step over dynamical time; a hop shorter
    than that step is tried whole.
    """
    pull = forces.gm / (distance * distance)
    dynamical_time = distance / max(speed, math.sqrt(pull * distance), 1e-300)
    step = FIRST_STEP * (STEP_SHARE * tolerance) ** (1.0 / 6.0) * dynamical_time
    fall = pull - (speed * speed - climb * climb) / distance
    if climb > 0.0 and fall > 0.0:
        step = min(step, 2.2 * climb / fall)
    return step

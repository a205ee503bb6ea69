"""Which steps are good enough and how long the next one is."""

import math

import numpy as np

from tracer.kernels.compiling import inlined, kernel, merged

DEFAULT_TOLERANCE = 1e-6
"""Aimed error of a landing place in radii: half of all lie within it, and all within a thousandfold.

Save some 9 in 100,000, temporary satellites between push and pull, a quarter of which no step size makes predictable.
"""

STEP_SHARE = 0.25
"""The share of the tolerance that one step may take, in units of the distance from the centre and of the speed."""

FAR = 20.0
"""Distance [radii] from which on steps may be less exact, see `far_out`."""

FIRST_STEP = 1.5
"""Length of the first step in dynamical times, at a step error of 1; measured."""

SAFETY = 0.9
LEAST_CHANGE = 0.2
GREATEST_CHANGE = 5.0

GRAZING = 0.02
"""Sine of the angle above the horizon below which a launch is integrated with more care."""

LEAST_CARE = 1e-5
"""Smallest part of the tolerance: below it rounding decides anyway."""

DEFAULT_ROOT = (STEP_SHARE * DEFAULT_TOLERANCE) ** (1.0 / 6.0)
"""What a first step is proportional to at the default tolerance: a power at each launch takes time."""

ROOT_BITS = 5.06766e18 / 2.0**32
"""Of all offsets between the upper bits of a number and of its inverse tenth root the one with the least error."""

HALF_BITS = 0x5FE6EB50C7B537A9
"""The same for the inverse square root."""

WHOLE = 2.0**52
"""The sum of it and a whole number below it holds that number in its last bits."""

WHOLE_BITS = 0x433 << 52


@inlined
def far_out(radius, per_distance):
    """Return the factor, at most 1, by which an error's square counts less far from a body of `radius` [m].

    What a tail's atoms do there no longer decides where they land, and the kinks of the lines' tables would make every
    step a short one: beyond `FAR` radii the allowed error grows with the distance's square. At the default tolerance
    sodium of Mercury was then placed, in the median, to 0.05 radii at 700 and 0.1 to 0.5 at 1,500 radii; measured.
    """
    nearness = min(1.0, FAR * radius * per_distance)
    return (nearness * nearness) * (nearness * nearness)


@merged
def error_scales(tolerance, forces, distance, speed_squared, nearest):
    """Return what squared errors of position [m], velocity [m s-1] and hazard are multiplied by in `step_error`.

    Position counts against the distance from the centre, velocity against the speed and that of a circular orbit at
    `distance` [m], the hazard, which survival is the exponential of, against 1; one means what `tolerance` allows.
    `nearest` holds the distance [m] from the nearer centre, of body or host, and one over [m-1] that which `far_out`
    counts.
    """
    allowed = STEP_SHARE * tolerance
    per_allowed = far_out(forces.radius, nearest[1]) / (allowed * allowed)
    return (
        per_allowed / (nearest[0] * nearest[0]),
        per_allowed / (speed_squared + forces.gm / distance),
        per_allowed,
    )


@merged
def step_error(error, scales):
    """Return the square of a step's error in units of what the tolerance allows; accepted up to 1."""
    return error[0] * scales[0] + error[1] * scales[1] + error[2] * scales[2]


@inlined
def step_change(error):
    """Return the factor by which the next step is longer, for a fifth-order step of squared `error`."""
    known = error if (error > 1e-12) & (error < 1e30) else 1.0
    change = min(GREATEST_CHANGE, max(LEAST_CHANGE, SAFETY * inverse_tenth_root(known)))
    change = GREATEST_CHANGE if error <= 1e-12 else change
    return change if error < 1e30 else LEAST_CHANGE


@inlined
def inverse_tenth_root(value):
    """Return value^(-1/10) of a positive `value` to half a per cent, in a fraction of the time that a power takes.

    The bits of a float64 are, as a whole number, nearly its logarithm: dividing them by -10 is a first guess, good to
    3 %, and one step of Newton's method, y (11 - value y^10) / 10, follows. The upper half of the bits is enough.
    Whole numbers become floats, and back, in the last bits of 2^52, which any processor does for several at once.
    """
    upper = np.float64(value).view(np.int64) >> 32
    guess = ROOT_BITS - 0.1 * (np.int64(upper | WHOLE_BITS).view(np.float64) - WHOLE)
    y = np.int64(np.float64(guess + WHOLE).view(np.int64) << 32).view(np.float64)
    y2 = y * y
    y4 = y2 * y2
    return y * (1.1 - 0.1 * value * (y4 * y4 * y2))


@inlined
def inverse_root(value):
    """Return value^(-1/2) of a positive `value` to two thousandths, in the same way."""
    y = np.int64(HALF_BITS - (np.float64(value).view(np.int64) >> 1)).view(np.float64)
    return y * (1.5 - 0.5 * value * (y * y))


@kernel
def first_step(forces, tolerance, distance, climb, speed):
    """Return a first step [s] at `distance` [m] for a radial speed `climb` and a `speed` [m s-1].

    The error of a step on a Kepler orbit goes with the sixth power of step over dynamical time; a hop shorter
    than that step is tried whole.
    """
    pull = forces.gm / (distance * distance)
    dynamical_time = distance / max(speed, math.sqrt(pull * distance), 1e-300)
    root = DEFAULT_ROOT
    if tolerance != DEFAULT_TOLERANCE:
        root = (STEP_SHARE * tolerance) ** (1.0 / 6.0)
    step = FIRST_STEP * root * dynamical_time
    fall = pull - (speed * speed - climb * climb) / distance
    if climb > 0.0 and fall > 0.0:
        step = min(step, 2.2 * climb / fall)
    return step


@kernel
def care(atom):
    """Return the part of the tolerance that a launch may use: less than all where it leaves along the ground.

    A launch at a small angle above the horizon, faster than a circular orbit, comes back to a pericentre below the
    ground by about the square of that angle: an error as large would carry it over the ground, round and round.
    """
    r = math.sqrt(atom[0] * atom[0] + atom[1] * atom[1] + atom[2] * atom[2])
    speed = math.sqrt(atom[3] * atom[3] + atom[4] * atom[4] + atom[5] * atom[5])
    climb = atom[0] * atom[3] + atom[1] * atom[4] + atom[2] * atom[5]
    if climb >= GRAZING * r * speed:
        return 1.0
    angle = climb / (GRAZING * r * speed)
    return max(angle * angle, LEAST_CARE)

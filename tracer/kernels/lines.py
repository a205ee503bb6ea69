"""Functions of heliocentric radial velocity from tables with even steps, one for each line.

All tables lie in one flat float64 array, because an array in the innermost loop costs time for each one: the
number of lines; four numbers for each line (first velocity [m s-1], steps per velocity [s m-1], last step,
entry of its first knot); then for each knot the straight line to the next one (level at the last), as its value at
step 0 and its rise for each step; at the end two zeros, the straight line of no line.
"""

import numpy as np

from tracer.kernels.compiling import inlined

HEADING = 1
HEADING_SIZE = 4


@inlined
def line_value(tables, line, velocity):
    """Return the value of `line` at `velocity` [m s-1]: linear between knots, the end values held beyond."""
    heading = HEADING + HEADING_SIZE * line
    step = (velocity - tables[heading]) * tables[heading + 1]
    last = tables[heading + 2]
    # Written so that a velocity that is not a number falls on a knot instead of outside the array.
    if not step > 0.0:
        step = 0.0
    if step > last:
        step = last
    knot = int(step)
    # Unsigned, so that no time goes into counting from the array's end.
    entry = np.uintp(int(tables[heading + 3]) + 2 * knot)
    return tables[entry] + step * tables[entry + np.uintp(1)]


@inlined
def sum_of_lines(tables, velocity):
    """Return the sum of all lines' values at `velocity` [m s-1]."""
    total = 0.0
    for line in range(int(tables[0])):
        total += line_value(tables, line, velocity)
    return total


@inlined
def beyond_tables(tables, velocity):
    """Return True where `velocity` [m s-1] lies beyond the end of any line's table that has more than one knot."""
    for line in range(int(tables[0])):
        heading = HEADING + HEADING_SIZE * line
        step = (velocity - tables[heading]) * tables[heading + 1]
        last = tables[heading + 2]
        if last > 0.0 and (step < 0.0 or step > last):
            return True
    return False


def flat_tables(first_velocities, velocity_steps, values) -> np.ndarray:
    """Return the tables of several lines as one array, from each line's first velocity, step and knots' values."""
    headings, knots = [], []
    entry = HEADING + HEADING_SIZE * len(values)
    for first, step, value in zip(first_velocities, velocity_steps, values, strict=True):
        headings += [first, 1.0 / step, len(value) - 1, entry]
        rise = np.append(np.diff(value), 0.0)
        knots.append(np.column_stack([value - np.arange(len(value)) * rise, rise]).ravel())
        entry += 2 * len(value)
    return np.concatenate([[len(values)], headings, *knots, [0.0, 0.0]]).astype(np.float64)

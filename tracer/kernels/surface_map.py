"""Values over the surface, given at the middles of cells: one look-up a place."""

import math
from typing import NamedTuple

import numpy as np

from tracer.kernels.compiling import allocating_kernel, kernel

HOURS_A_TURN = 24.0
HOURS_A_RADIAN = 12.0 / math.pi
DEGREES_A_RADIAN = 180.0 / math.pi


class SurfaceMap(NamedTuple):
    """`values` (L, H) at `latitudes` (L,) [deg] and `local_times` (H,) [h], both rising.

    The middles of cells that cover the sphere: those at the ends reach to the poles, and the last local time has the
    first as its neighbour. Even spacing is quickest, any rising one is right.
    """

    latitudes: np.ndarray
    local_times: np.ndarray
    values: np.ndarray


@kernel
def place_of(x, y, z):
    """Return (latitude [deg], local time [h] in [0, 24]) of the direction (x, y, z), of any length."""
    latitude = math.atan2(z, math.sqrt(x * x + y * y)) * DEGREES_A_RADIAN
    hour = 12.0 + math.atan2(y, x) * HOURS_A_RADIAN
    return latitude, hour


@kernel
def below(axis, value):
    """Return the last position of the rising `axis` that is not above `value`, -1 where all are."""
    last = axis.shape[0] - 1
    # Right at once where the axis is even; else the walk mends it.
    i = int((value - axis[0]) / (axis[last] - axis[0]) * last)
    i = min(max(i, 0), last)
    while i >= 0 and axis[i] > value:
        i -= 1
    while i < last and axis[i + 1] <= value:
        i += 1
    return i


@kernel
def interpolated(table, x, y, z):
    """Return the map's value at unit vector (x, y, z), linear in latitude and in local time.

    Between the last latitude and the pole it is the last latitude's.
    """
    latitude, hour = place_of(x, y, z)
    last = table.latitudes.shape[0] - 1
    south = below(table.latitudes, latitude)
    north = min(south + 1, last)
    south = max(south, 0)
    north_share = 0.0
    if north > south:
        step = table.latitudes[north] - table.latitudes[south]
        north_share = max(0.0, latitude - table.latitudes[south]) / step
    hours = table.local_times.shape[0]
    earlier = below(table.local_times, hour)
    later = earlier + 1
    start = table.local_times[earlier] if earlier >= 0 else table.local_times[hours - 1] - HOURS_A_TURN
    end = table.local_times[later] if later < hours else table.local_times[0] + HOURS_A_TURN
    later_share = (hour - start) / (end - start)
    if earlier < 0:
        earlier = hours - 1
    if later == hours:
        later = 0
    values = table.values
    in_south = values[south, earlier] + later_share * (values[south, later] - values[south, earlier])
    in_north = values[north, earlier] + later_share * (values[north, later] - values[north, earlier])
    return in_south + north_share * (in_north - in_south)


@kernel
def cell_value(table, x, y, z):
    """Return the value of the cell in which unit vector (x, y, z) lies; cells meet halfway between their middles."""
    latitude, hour = place_of(x, y, z)
    row = below(table.latitudes, latitude)
    last = table.latitudes.shape[0] - 1
    if row < 0:
        row = 0
    elif row < last and 2.0 * latitude > table.latitudes[row] + table.latitudes[row + 1]:
        row += 1
    hours = table.local_times.shape[0]
    earlier = below(table.local_times, hour)
    later = earlier + 1
    start = table.local_times[earlier] if earlier >= 0 else table.local_times[hours - 1] - HOURS_A_TURN
    end = table.local_times[later] if later < hours else table.local_times[0] + HOURS_A_TURN
    column = later if 2.0 * hour > start + end else earlier
    if column < 0:
        column = hours - 1
    elif column == hours:
        column = 0
    return table.values[row, column]


@allocating_kernel
def interpolated_at(table, positions):
    """Return `interpolated` values, (n,), at unit vectors `positions`, (n, 3)."""
    result = positions[:, 0].copy()
    for i in range(positions.shape[0]):
        result[i] = interpolated(table, positions[i, 0], positions[i, 1], positions[i, 2])
    return result

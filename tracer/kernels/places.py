"""Places of release from even numbers."""

import math

import numpy as np

from tracer.kernels.angles import sine_and_cosine
from tracer.kernels.compiling import allocating_kernel, inlined
from tracer.kernels.intervals import find_intervals
from tracer.kernels.surface_map import HOURS_A_RADIAN


@allocating_kernel
def places_around(axes, cosines, turns):
    """Return unit vectors, (n, 3), at angle acos(`cosines`) (n,) from an axis, at `turns` (n,), 0 to 1, about it.

    The rows of `axes` (3, 3) are the axis and two unit vectors across it that complete it to a right-handed basis.
    """
    result = np.empty((cosines.shape[0], 3))
    # Flat, else the compiler makes no vector operations of the loop.
    found = result.reshape(-1)
    nx, ny, nz = axes[0, 0], axes[0, 1], axes[0, 2]
    ax, ay, az = axes[1, 0], axes[1, 1], axes[1, 2]
    bx, by, bz = axes[2, 0], axes[2, 1], axes[2, 2]
    for i in range(cosines.shape[0]):
        cosine = cosines[i]
        sine = math.sqrt(max(0.0, 1.0 - cosine * cosine))
        across, along = sine_and_cosine(2.0 * math.pi * turns[i])
        across *= sine
        along *= sine
        found[3 * i] = cosine * nx + along * ax + across * bx
        found[3 * i + 1] = cosine * ny + along * ay + across * by
        found[3 * i + 2] = cosine * nz + along * az + across * bz
    return result


@allocating_kernel
def places_in_cells(sines, hours, rows, columns, even_rows, even_columns):
    """Return unit vectors, (n, 3), even within the cells of a map, of which each has its share.

    `sines` (L + 1,) and `hours` (H + 1,) [h] are the edges of the cells; of all places `rows` (L + 1,) is the share
    south of each edge, of a row's `columns` (L, H + 1) that before each. `even_rows` and `even_columns` (n,) choose.
    """
    count, edges = even_rows.shape[0], hours.shape[0]
    result = np.empty((count, 3))
    row, column = np.zeros(count, np.int64), np.empty(count, np.int64)
    find_intervals(rows, rows.shape[0] - 1, even_rows, row)
    shares = columns.reshape(-1)
    for i in range(count):
        column[i] = row[i] * edges
    find_intervals(shares, edges - 1, even_columns, column)
    for i in range(count):
        z = _within(sines, row[i], rows, row[i], even_rows[i])
        hour = _within(hours, column[i] - row[i] * edges, shares, column[i], even_columns[i])
        sine, cosine = sine_and_cosine((hour - 12.0) / HOURS_A_RADIAN)
        across = math.sqrt(max(0.0, 1.0 - z * z))
        result[i, 0], result[i, 1], result[i, 2] = across * cosine, across * sine, z
    return result


@inlined
def _within(edges, cell, shares, at, u):
    """Return the place between the edges of `cell`, whose shares stand at `at`, that the share `u` has before it."""
    part = (u - shares[at]) / (shares[at + 1] - shares[at])
    return edges[cell] + part * (edges[cell + 1] - edges[cell])

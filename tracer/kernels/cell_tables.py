"""Which of many rising edges lie below a value: a table of first guesses, and comparisons that decide."""

import math
from typing import NamedTuple

import numpy as np

from tracer.kernels.compiling import inlined

GUESSES_PER_CELL = 4
"""Entries of a table for each cell: with more, the next edge is seldom passed."""

LOG_DIGITS = 6
"""Leading binary digits of a ratio, behind its power of 2, that make its entry in a table."""

MANTISSA = 52
ONE = 1023
"""Binary digits of a float64, and the power of 2 that stands in the number 1."""


class CellTables(NamedTuple):
    """Edges and first guesses of the rows and columns of a grid, and the guesses of its layers.

    `sines` are those of the latitudes' edges, `turns` the local times' edges as `turn` gives them; the last of each is
    infinite. `rows` over even sines, `columns` over even turns, `layers` over the leading digits of altitudes in units
    of the first edge hold a cell that is never above that of the value.
    """

    sines: np.ndarray
    rows: np.ndarray
    turns: np.ndarray
    columns: np.ndarray
    layers: np.ndarray


def make_tables(radii: np.ndarray, first_altitude: float, rows: int, columns: int) -> CellTables:
    """Return the tables of a grid with edges `radii` (n + 1,) [m], `rows` of latitude and `columns` of local time."""
    sines = np.sin(np.pi * (np.arange(rows + 1) / rows - 0.5))
    quarters = 4.0 * np.arange(columns + 1) / columns
    turns = np.array([turn(-math.cos(0.5 * math.pi * q), -math.sin(0.5 * math.pi * q)) for q in quarters])
    turns = np.where(quarters % 1.0 == 0.0, quarters, turns)
    sines[-1], turns[-1] = np.inf, np.inf
    ratios = _ratios((radii[-1] - radii[0]) / first_altitude)
    return CellTables(
        sines,
        _guesses(sines, np.linspace(-1.0, 1.0, GUESSES_PER_CELL * rows + 1)),
        turns,
        _guesses(turns, np.linspace(0.0, 4.0, GUESSES_PER_CELL * columns + 1)),
        _guesses(radii[:-1], radii[0] + first_altitude * ratios * (1.0 - 1e-12)),
    )


def _guesses(edges: np.ndarray, values: np.ndarray) -> np.ndarray:
    return np.maximum(0, np.searchsorted(edges, values, side="right") - 1).astype(np.int32)


def _ratios(largest: float) -> np.ndarray:
    """Return the least ratio of every entry of `layers` up to `largest` and one more."""
    count = (math.frexp(largest)[1] + 1) << LOG_DIGITS
    return np.array([math.ldexp(1.0 + (i % 64) / 64.0, i >> LOG_DIGITS) for i in range(count)])


@inlined
def turn(x, y):
    """Return a number from 0 to 4 that grows with local time, 0 at midnight, 1 at dawn, 2 at noon, 3 at dusk."""
    whole = abs(x) + abs(y)
    # On the axis it is noon.
    part = y / whole if whole > 0.0 else 0.0
    if x >= 0.0:
        return 2.0 + part
    return 4.0 - part if y > 0.0 else -part


@inlined
def row_of(tables, sine):
    """Return the row of sin(latitude) = `sine`, from the south pole."""
    last = tables.rows.shape[0] - 1
    row = int(tables.rows[_entry((sine + 1.0) * (0.5 * last), last)])
    while sine >= tables.sines[row + 1]:
        row += 1
    return row


@inlined
def column_of(tables, x, y):
    """Return the column of a place at (x, y) in the Sun-fixed frame, from midnight."""
    turned = turn(x, y)
    last = tables.columns.shape[0] - 1
    column = int(tables.columns[_entry(turned * (0.25 * last), last)])
    while turned >= tables.turns[column + 1]:
        column += 1
    return column


@inlined
def _entry(place, last):
    """Return the entry of `place`; what is not a number has one as well, not one outside the table."""
    return min(last, max(0, int(place)))


@inlined
def layer_of(tables, radii, first_altitude, r):
    """Return the layer of distance `r` [m] from the centre between edges `radii`, -1 above the last."""
    if r >= radii[radii.shape[0] - 1]:
        return -1
    altitude = r - radii[0]
    if altitude < first_altitude:
        return 0
    # The product may round into the entry above: `make_tables` leaves room for that.
    bits = np.float64(altitude * (1.0 / first_altitude)).view(np.int64)
    entry = (bits >> (MANTISSA - LOG_DIGITS)) - (ONE << LOG_DIGITS)
    layer = int(tables.layers[min(entry, tables.layers.shape[0] - 1)])
    while r >= radii[layer + 1]:
        layer += 1
    return layer

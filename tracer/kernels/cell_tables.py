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
    # Ratios, and radii beside a low first edge, are rounded: a guess must not be the cell above.
    entries = radii[0] + first_altitude * ratios * (1.0 - 1e-12) - 2.0 * np.spacing(radii[-1])
    return CellTables(
        sines,
        _guesses(sines, np.linspace(-1.0, 1.0, GUESSES_PER_CELL * rows + 1)),
        turns,
        _guesses(turns, np.linspace(0.0, 4.0, GUESSES_PER_CELL * columns + 1)),
        _guesses(radii[:-1], entries),
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
    part = y / (whole if whole > 0.0 else 1.0)
    night = 4.0 - part if y > 0.0 else -part
    return 2.0 + part if x >= 0.0 else night


@inlined
def row_place(tables, sine):
    """Return where among the `rows` the one of sin(latitude) = `sine` stands, with fractions; perhaps outside."""
    return (sine + 1.0) * (0.5 * (tables.rows.shape[0] - 1))


@inlined
def column_place(tables, turned):
    """Return where among the `columns` the one of `turned`, what `turn` gives, stands; with fractions."""
    return turned * (0.25 * (tables.columns.shape[0] - 1))


@inlined
def layer_ratio(altitude, first_altitude):
    """Return the `altitude` in units of the first edge."""
    # The product may round into the entry above: `make_tables` leaves room for that.
    return altitude * (1.0 / first_altitude)


@inlined
def layer_entry(ratio):
    """Return the entry of `layers` for what `layer_ratio` gives, which is at least 1."""
    return (np.float64(ratio).view(np.int64) >> (MANTISSA - LOG_DIGITS)) - (ONE << LOG_DIGITS)


@inlined
def row_of(tables, sine):
    """Return the row of sin(latitude) = `sine`, from the south pole."""
    row = int(tables.rows[_entry(tables.rows, row_place(tables, sine))])
    while sine >= tables.sines[row + 1]:
        row += 1
    return row


@inlined
def column_of(tables, x, y):
    """Return the column of a place at (x, y) in the Sun-fixed frame, from midnight."""
    turned = turn(x, y)
    column = int(tables.columns[_entry(tables.columns, column_place(tables, turned))])
    while turned >= tables.turns[column + 1]:
        column += 1
    return column


@inlined
def layer_of(tables, radii, first_altitude, r):
    """Return the layer of distance `r` [m] from the centre between edges `radii`, -1 above the last."""
    if r >= radii[radii.shape[0] - 1]:
        return -1
    altitude = r - radii[0]
    if altitude < first_altitude:
        return 0
    entry = layer_entry(layer_ratio(altitude, first_altitude))
    layer = int(tables.layers[min(entry, tables.layers.shape[0] - 1)])
    while r >= radii[layer + 1]:
        layer += 1
    return layer


@inlined
def _entry(table, place):
    """Return the entry at `place`; what is not a number has one as well, not one outside the table."""
    return min(table.shape[0] - 1, max(0, int(place)))


@inlined
def cell_from(edges, guesses, entry, value):
    """Return the cell of `value` between `edges`, by the `entry` of its `guesses` at the place of `value`.

    For many values in a row: numbers without a sign spare numba the look whether an index counts from the end, and the
    first step is no branch, since which of two cells it is nobody can guess. A third one is seldom met. Where one value
    is looked up amid other work, waiting for that step costs more than a wrong guess.
    """
    cell, one = np.uint64(guesses[entry]), np.uint64(1)
    cell += one if value >= edges[cell + one] else np.uint64(0)
    while value >= edges[cell + one]:
        cell += one
    return cell

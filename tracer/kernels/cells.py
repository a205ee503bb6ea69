"""Which grid cell or image pixel a position lies in."""

import math
from typing import NamedTuple

import numpy as np

from tracer.kernels.cell_tables import CellTables, column_of, layer_of, make_tables, row_of
from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.first_guess import ANGLE_ERROR, ARCSINE_ERROR


class Cells(NamedTuple):
    """The spherical grid: `radius` [m] of the ground, `radii` (n + 1,) [m] of the cells' edges from the centre.

    Edges above the first cell are evenly spaced in the logarithm of altitude: `first_altitude` [m] and
    `cells_per_log` describe them for a direct search. Latitude cells are equal in angle, local time cells too.
    """

    radius: float
    radii: np.ndarray
    first_altitude: float
    cells_per_log: float
    latitude_cells: int
    local_time_cells: int
    tables: CellTables


def make_cells(
    radius: float,
    radii: np.ndarray,
    first_altitude: float,
    cells_per_log: float,
    latitude_cells: int,
    local_time_cells: int,
) -> Cells:
    """Return the `Cells` with these numbers and the tables for them."""
    tables = make_tables(radii, first_altitude, latitude_cells, local_time_cells)
    return Cells(radius, radii, first_altitude, cells_per_log, latitude_cells, local_time_cells, tables)


@inlined
def altitude_cell(cells, r):
    """Return the altitude cell of distance `r` [m] from the centre, -1 above the grid's top."""
    return layer_of(cells.tables, cells.radii, cells.first_altitude, r)


@inlined
def close_layer(cells, r, guess):
    """Return the altitude cell of `r` [m], -1 above the grid's top, by a rough `guess` of cells above the first."""
    last = cells.radii.shape[0] - 2
    if r >= cells.radii[last + 1]:
        return -1
    if r - cells.radius < cells.first_altitude:
        return 0
    layer = min(last, max(0, 1 + int(guess)))
    # The edges themselves decide.
    while r < cells.radii[layer]:
        layer -= 1
    while r >= cells.radii[layer + 1]:
        layer += 1
    return layer


@inlined
def latitude_cell(cells, sine):
    """Return the latitude cell, counted from the south pole, of a place with sin(latitude) = `sine`."""
    return row_of(cells.tables, sine)


@inlined
def row_at(cells, place, sine):
    """Return the latitude cell of sin(latitude) = `sine` by its rough `place` in cells."""
    number = cells.latitude_cells
    if not _clear_of_edges(place, ARCSINE_ERROR / math.pi * number):
        place = (math.asin(min(1.0, max(-1.0, sine))) / math.pi + 0.5) * number
    return min(number - 1, max(0, int(place)))


@inlined
def local_time_cell(cells, x, y):
    """Return the local-time cell, counted from midnight, of a place at (x, y) in the Sun-fixed frame."""
    return column_of(cells.tables, x, y)


@inlined
def column_at(cells, place, x, y):
    """Return the local-time cell of (x, y) by its rough `place` in cells."""
    number = cells.local_time_cells
    if not _clear_of_edges(place, ANGLE_ERROR / (2.0 * math.pi) * number):
        place = (0.5 + math.atan2(y, x) / (2.0 * math.pi)) * number
    cell = int(place)
    # atan2 gives +pi and -pi at midnight: both are the first cell.
    return 0 if cell >= number else cell


@inlined
def _clear_of_edges(place, margin):
    """Return True where `place`, in cells, is further than `margin` from the edges of its cell; False if it is NaN."""
    part = place - math.floor(place)
    return margin < part < 1.0 - margin


class Velocities(NamedTuple):
    """How images are resolved by velocity away from the viewer.

    The Sun-fixed frame turns at `turning` [rad s-1] about +z. Per plane `low`, `width` and `middle` [m s-1] of its bins
    and their number, `bins`, 0 where velocities are not resolved; `first` is where its numbers begin in the flat array
    of all planes: one after the other the pixels of every bin, those of what lies outside, and those of the two sums.
    `resolved` tells whether any plane has bins.
    """

    turning: float
    low: np.ndarray
    width: np.ndarray
    middle: np.ndarray
    bins: np.ndarray
    first: np.ndarray
    resolved: bool


class Images(NamedTuple):
    """All image planes: per plane the viewer's direction, right and up (n, 3), lower edges and pixel sizes [m].

    `first` is each plane's first pixel in the flat array that holds all planes, `columns` and `rows` its pixels.
    """

    toward_viewer: np.ndarray
    right: np.ndarray
    up: np.ndarray
    low: np.ndarray
    pixel: np.ndarray
    columns: np.ndarray
    rows: np.ndarray
    first: np.ndarray
    velocities: Velocities


@kernel
def image_pixel(images, i, radius, x, y, z):
    """Return the flat pixel of position (x, y, z) in plane `i`, -1 outside it or behind the disc of `radius`."""
    across = images.right[i, 0] * x + images.right[i, 1] * y + images.right[i, 2] * z
    along = images.up[i, 0] * x + images.up[i, 1] * y + images.up[i, 2] * z
    column = (across - images.low[i, 0]) / images.pixel[i, 0]
    row = (along - images.low[i, 1]) / images.pixel[i, 1]
    if not (0.0 <= column < images.columns[i] and 0.0 <= row < images.rows[i]):
        return -1
    if across * across + along * along < radius * radius:
        n = images.toward_viewer
        if n[i, 0] * x + n[i, 1] * y + n[i, 2] * z < 0.0:
            return -1
    return images.first[i] + int(row) * images.columns[i] + int(column)


@inlined
def recession(images, i, x, y, velocity):
    """Return how fast [m s-1] an atom recedes from the viewer of plane `i`; (`x`, `y`) [m] and `velocity` [m s-1].

    As a spectrograph sees it that moves with the body's centre: the velocity in the Sun-fixed frame, and what the
    turning of that frame adds to it.
    """
    n, turning = images.toward_viewer, images.velocities.turning
    vx, vy, vz = velocity
    return -(n[i, 0] * (vx - turning * y) + n[i, 1] * (vy + turning * x) + n[i, 2] * vz)


@inlined
def velocity_bin(velocities, i, away):
    """Return the bin of plane `i` that holds a velocity `away` [m s-1]; the number of bins where none does."""
    place = (away - velocities.low[i]) / velocities.width[i]
    return int(place) if 0.0 <= place < velocities.bins[i] else velocities.bins[i]

"""Cells of the spherical grid and pixels of the image planes: edges, sizes, directions.

Words and signs: +x to the Sun, +z north, +y dusk; local time 12 h + atan2(y, x) 12 h/pi.
"""

from math import cos, pi, radians, sin, sqrt
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Direction = tuple[float, float, float]

HOURS_A_TURN = 24.0
ORDERS = 2
"""Legendre orders of a response within a bin of launch speed: 0 and 1."""
ROUNDING = 4e-16
"""Direction cosines below this are rounding of a right angle and count as 0."""

VIEWERS: dict[str, Direction] = {
    "north": (0.0, 0.0, 1.0),
    "south": (0.0, 0.0, -1.0),
    "dawn": (0.0, -1.0, 0.0),
    "dusk": (0.0, 1.0, 0.0),
    "sun": (1.0, 0.0, 0.0),
    "midnight": (-1.0, 0.0, 0.0),
}
"""Unit vector from the body to the viewer, by the run file's word."""


class Grid(NamedTuple):
    """Edges of the cells round the body: A x L x H cells."""

    body_radius: float
    """Radius of the body [m]."""
    altitude_edges: Floats
    """Rising from 0 [m], shape (A + 1,)."""
    latitude_edges: Floats
    """Rising from -90 to 90 [deg], shape (L + 1,)."""
    local_time_edges: Floats
    """Rising from 0 to 24 [h] in equal steps, shape (H + 1,)."""


class ImagePlane(NamedTuple):
    """Orthographic sky plane through the body's centre, as the viewer sees it."""

    name: str
    """Name in the product, for example `tail_from_north`."""
    title: str
    """Name as the user wrote it."""
    toward_viewer: Direction
    """Unit vector n from the body to the viewer."""
    up: Direction
    """Unit vector along which `vertical` grows: z - (z.n) n normalised; y for a viewer on the axis."""
    right: Direction
    """Unit vector along which `horizontal` grows: up x n."""
    horizontal_edges: Floats
    """Rising [m] from the body's centre, shape (columns + 1,)."""
    vertical_edges: Floats
    """Rising [m] from the body's centre, shape (rows + 1,)."""


def altitude_edges(first_cell: float, top: float, cells: int) -> Floats:
    """Return 0 and `cells` edges evenly spaced in log altitude from `first_cell` to `top`.

    Parameters
    ----------
    first_cell : float
        Thickness of the lowest cell [m], above 0 and below `top`; a single cell ends at `top` instead.
    top : float
        Altitude of the last edge [m].
    cells : int
        Number of cells, at least 1.

    Returns
    -------
    ndarray, shape (cells + 1,)
        Edges [m], strictly rising.

    Raises
    ------
    ValueError
        Where the edges would not rise.
    """
    if cells < 1:
        raise ValueError(f"altitude needs at least 1 cell, got {cells}")
    if not 0.0 < first_cell < top:
        raise ValueError(
            f"the first cell must end between the surface and the top, got {first_cell} m of {top} m"
        )
    edges = np.zeros(cells + 1)
    edges[1:] = np.geomspace(first_cell, top, cells)
    edges[-1] = top
    if not np.all(np.diff(edges) > 0.0):
        raise ValueError(f"{cells} altitude cells do not fit between {first_cell} m and {top} m")
    return edges


def latitude_edges(cells: int) -> Floats:
    """Return the `cells` + 1 edges [deg] of equal angles from -90 to 90, exactly alike north and south."""
    if cells < 1:
        raise ValueError(f"latitude needs at least 1 cell, got {cells}")
    return 90.0 * (2.0 * np.arange(cells + 1) - cells) / cells


def local_time_edges(cells: int) -> Floats:
    """Return the `cells` + 1 edges [h] of equal steps from 0 to 24."""
    if cells < 1:
        raise ValueError(f"local time needs at least 1 cell, got {cells}")
    return HOURS_A_TURN * np.arange(cells + 1) / cells


def make_grid(
    body_radius: float, first_cell: float, top: float, cells: int, latitude_cells: int, local_time_cells: int
) -> Grid:
    """Return the grid of the run file's `[grid]` table.

    Parameters
    ----------
    body_radius, first_cell, top : float
        Radius of the body, thickness of the lowest cell, altitude of the grid's top [m].
    cells, latitude_cells, local_time_cells : int
        Number of cells along altitude, latitude and local time, each at least 1.

    Raises
    ------
    ValueError
        Where the edges would not rise or the radius is not positive.
    """
    if not body_radius > 0.0:
        raise ValueError(f"the body's radius must be above 0, got {body_radius} m")
    return Grid(
        float(body_radius),
        altitude_edges(first_cell, top, cells),
        latitude_edges(latitude_cells),
        local_time_edges(local_time_cells),
    )


def middles(edges: Floats) -> Floats:
    """Return the middle of each cell, shape (cells,), from edges of shape (cells + 1,)."""
    return 0.5 * (edges[:-1] + edges[1:])


def cell_solid_angle(grid: Grid) -> Floats:
    """Return the solid angle [sr] of one cell at each latitude, shape (L,).

    The difference of sines is written as 2 cos(mean) sin(half difference), so that thin cells near a pole
    keep their digits.
    """
    south, north = np.radians(grid.latitude_edges[:-1]), np.radians(grid.latitude_edges[1:])
    sine_step = 2.0 * np.cos(0.5 * (north + south)) * np.sin(0.5 * (north - south))
    cells = len(grid.local_time_edges) - 1
    return 2.0 * pi / cells * sine_step


def cell_area(grid: Grid) -> Floats:
    """Return the ground area [m2] of one cell at each latitude, shape (L,)."""
    return grid.body_radius**2 * cell_solid_angle(grid)


def cell_volume(grid: Grid) -> Floats:
    """Return the volume [m3] of one cell at each altitude and latitude, shape (A, L).

    The difference of cubes is written as thickness times (a^2 + ab + b^2), with the thickness taken from the
    altitudes, so that thin cells on a large body keep their digits.
    """
    thickness = np.diff(grid.altitude_edges)
    inner, outer = grid.body_radius + grid.altitude_edges[:-1], grid.body_radius + grid.altitude_edges[1:]
    radial = thickness * (outer * outer + outer * inner + inner * inner) / 3.0
    return np.outer(radial, cell_solid_angle(grid))


def direction(latitude: float, local_time: float) -> Direction:
    """Return the unit vector of a latitude [deg] and local time [h] in the Sun-fixed frame."""
    theta, phi = radians(latitude), (local_time - 12.0) * pi / 12.0
    return _clean((cos(theta) * cos(phi), cos(theta) * sin(phi), sin(theta)))


def viewer_direction(look_from: str | tuple[float, float]) -> Direction:
    """Return the unit vector from the body to the viewer.

    Parameters
    ----------
    look_from : str or (float, float)
        "north", "south", "dawn", "dusk", "sun" or "midnight"; or latitude [deg] and local time [h].

    Raises
    ------
    ValueError
        For any other word.
    """
    if not isinstance(look_from, str):
        return direction(*look_from)
    if look_from not in VIEWERS:
        raise ValueError(f"{look_from!r} is no place to look from; allowed: {', '.join(VIEWERS)}")
    return VIEWERS[look_from]


def make_image_plane(
    name: str,
    title: str,
    toward_viewer: Direction,
    horizontal: tuple[float, float],
    vertical: tuple[float, float],
    pixels: tuple[int, int],
) -> ImagePlane:
    """Return the sky plane of one `[[image]]` table.

    Parameters
    ----------
    name, title : str
        Name in the product, and as the user wrote it.
    toward_viewer : (float, float, float)
        Unit vector from the body to the viewer, see `viewer_direction`.
    horizontal, vertical : (float, float)
        Ends of the image [m] from the body's centre, rising.
    pixels : (int, int)
        Columns and rows.

    Raises
    ------
    ValueError
        Where ends do not rise, a direction has no length, or an axis has no pixel.
    """
    n = _clean(_unit(toward_viewer))
    # x^2 + y^2, not 1 - z^2, which near the pole has no digits left.
    off_axis = (-n[2] * n[0], -n[2] * n[1], n[0] * n[0] + n[1] * n[1])
    on_axis = n[0] == 0.0 and n[1] == 0.0
    up = (0.0, 1.0, 0.0) if on_axis else _clean(_unit(off_axis))
    return ImagePlane(
        name,
        title,
        n,
        up,
        _clean(_cross(up, n)),
        _even_edges("horizontal", horizontal, pixels[0]),
        _even_edges("vertical", vertical, pixels[1]),
    )


def _even_edges(axis: str, ends: tuple[float, float], cells: int) -> Floats:
    first, last = ends
    if cells < 1:
        raise ValueError(f"{axis} needs at least 1 pixel, got {cells}")
    if not first < last:
        raise ValueError(f"{axis} must rise, got {first} m to {last} m")
    # Weighing both ends keeps an image that lies evenly about the centre exactly even.
    share = np.arange(cells + 1)
    return (first * (cells - share) + last * share) / cells


def _unit(vector: Direction) -> Direction:
    x, y, z = vector
    length = sqrt(x * x + y * y + z * z)
    if not length > 0.0:
        raise ValueError(f"a direction must have a length, got {vector}")
    return (x / length, y / length, z / length)


def _cross(a: Direction, b: Direction) -> Direction:
    return (a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0])


def _clean(vector: Direction) -> Direction:
    x, y, z = (0.0 if abs(part) < ROUNDING else part for part in vector)
    return (x, y, z)

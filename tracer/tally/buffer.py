"""One flat array holds all that a batch counts, so that folding a batch is one operation."""

from collections.abc import Iterable, Iterator, Sequence
from math import prod
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.fate import Fate
from tracer.kernels.scoring import Tally
from tracer.tally.axes import ORDERS, Grid, ImagePlane

Floats = NDArray[np.float64]


class BufferLayout(NamedTuple):
    """Shapes of the fields of a `Tally`, in its order, and how many leading numbers are kept by replicate.

    `responses` are the shapes of the fields of `Responses`, which stand before the others; empty without them.
    """

    shapes: tuple[tuple[int, ...], ...]
    replicated_size: int
    responses: tuple[tuple[int, ...], ...] = ()

    @property
    def response_size(self) -> int:
        """Number of float64 numbers of the responses."""
        return sum(prod(shape) for shape in self.responses)

    @property
    def size(self) -> int:
        """Number of float64 numbers in a buffer."""
        return self.response_size + sum(prod(shape) for shape in self.shapes)


class Responses(NamedTuple):
    """What unit rates of launches into bins of speed leave, by Legendre order of the speed within the bin.

    `column_content` (bin, order, latitude, local_time) and `pixels` (bin, order, pixel, 1 + lines) as the fields of
    these names of a `Tally`, per launch and second.
    """

    column_content: Floats
    pixels: Floats


def make_layout(
    grid: Grid,
    planes: Sequence[ImagePlane],
    lines: int,
    adsorbing: bool = False,
    speed_bins: int = 0,
    hosted: bool = False,
) -> BufferLayout:
    """Return the layout for a grid, image planes, a number of emission lines and of bins of launch speed.

    Atoms at rest are counted where the ground is `adsorbing`, those that hit the host where the body is `hosted`. What
    is kept by replicate comes first.
    """
    altitudes = len(grid.altitude_edges) - 1
    ground = (len(grid.latitude_edges) - 1, len(grid.local_time_edges) - 1)
    pixels = sum(plane_size(plane) for plane in planes)
    by_velocity = sum(plane_size(plane) * velocity_sums(plane) for plane in planes)
    cells = (altitudes, *ground)
    kept = ((*cells, 1 + lines), ground, (pixels, 1 + lines), (by_velocity,), (lines, by_velocity))
    fluxes = (ground,) * 5
    at_rest = ground if adsorbing else (0, 0)
    numbers = ((len(Fate),), (1,), (1,), (1,), (1,), (1,), (1,), (int(hosted),))
    bins = (speed_bins, ORDERS)
    responses = ((*bins, *ground), (*bins, pixels, 1 + lines)) if speed_bins else ()
    replicated = sum(prod(shape) for shape in (*responses, *kept))
    return BufferLayout((*kept, cells, *fluxes, at_rest, *numbers), replicated, responses)


def plane_shape(plane: ImagePlane) -> tuple[int, int]:
    """Return (rows, columns) of an image plane."""
    return len(plane.vertical_edges) - 1, len(plane.horizontal_edges) - 1


def plane_size(plane: ImagePlane) -> int:
    """Return the number of pixels of an image plane."""
    return prod(plane_shape(plane))


def velocity_sums(plane: ImagePlane) -> int:
    """Return how many numbers a pixel keeps about velocity: its bins, what lies outside, and two sums of powers."""
    return 0 if plane.velocity_edges is None else len(plane.velocity_edges) + 2


def velocity_middle(plane: ImagePlane) -> float:
    """Return the velocity [m s-1] from which the sums of powers count: the middle of the bins, 0 without any."""
    edges = plane.velocity_edges
    return 0.0 if edges is None else 0.5 * float(edges[0] + edges[-1])


def tally_views(layout: BufferLayout, buffer: Floats) -> Tally:
    """Return the `Tally` whose arrays are views into `buffer`, shape (layout.size,)."""
    return Tally(*_views(buffer[layout.response_size :], layout.shapes))


def response_views(layout: BufferLayout, buffer: Floats) -> Responses | None:
    """Return the `Responses` whose arrays are views into `buffer`, shape (layout.size,); None where there are none."""
    return Responses(*_views(buffer, layout.responses)) if layout.responses else None


def _views(buffer: Floats, shapes: Iterable[tuple[int, ...]]) -> Iterator[Floats]:
    start = 0
    for shape in shapes:
        stop = start + prod(shape)
        yield buffer[start:stop].reshape(shape)
        start = stop

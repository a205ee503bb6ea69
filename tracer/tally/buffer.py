"""One flat array holds all that a batch counts, so that folding a batch is one operation."""

from collections.abc import Sequence
from math import prod
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.fate import Fate
from tracer.kernels.scoring import Tally
from tracer.tally.axes import Grid, ImagePlane

Floats = NDArray[np.float64]


class BufferLayout(NamedTuple):
    """Shapes of the fields of a `Tally`, in its order, and how many leading numbers are kept by replicate."""

    shapes: tuple[tuple[int, ...], ...]
    replicated_size: int

    @property
    def size(self) -> int:
        """Number of float64 numbers in a buffer."""
        return sum(prod(shape) for shape in self.shapes)


def make_layout(
    grid: Grid, planes: Sequence[ImagePlane], lines: int, adsorbing: bool = False, hosted: bool = False
) -> BufferLayout:
    """Return the layout for a grid, image planes and a number of emission lines.

    Atoms at rest are counted where the ground is `adsorbing`, those that hit the host where the body is `hosted`. What
    is kept by replicate comes first.
    """
    altitudes = len(grid.altitude_edges) - 1
    ground = (len(grid.latitude_edges) - 1, len(grid.local_time_edges) - 1)
    pixels = sum(plane_size(plane) for plane in planes)
    cells = (altitudes, *ground)
    kept = (cells, ground, (pixels,), (lines, *cells), (lines, pixels))
    fluxes = (ground,) * 5
    at_rest = ground if adsorbing else (0, 0)
    numbers = ((len(Fate),), (1,), (1,), (1,), (1,), (1,), (1,), (int(hosted),))
    return BufferLayout((*kept, cells, *fluxes, at_rest, *numbers), sum(prod(shape) for shape in kept))


def plane_shape(plane: ImagePlane) -> tuple[int, int]:
    """Return (rows, columns) of an image plane."""
    return len(plane.vertical_edges) - 1, len(plane.horizontal_edges) - 1


def plane_size(plane: ImagePlane) -> int:
    """Return the number of pixels of an image plane."""
    return prod(plane_shape(plane))


def tally_views(layout: BufferLayout, buffer: Floats) -> Tally:
    """Return the `Tally` whose arrays are views into `buffer`, shape (layout.size,)."""
    views = []
    start = 0
    for shape in layout.shapes:
        stop = start + prod(shape)
        views.append(buffer[start:stop].reshape(shape))
        start = stop
    return Tally(*views)

"""From raw counts to the product's quantities: densities, columns, fluxes."""

from collections.abc import Iterator, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.kernels.scoring import Tally
from tracer.tally.axes import Grid, ImagePlane, cell_area, cell_solid_angle, cell_volume
from tracer.tally.buffer import plane_shape, plane_size

Floats = NDArray[np.float64]


class ProductField(NamedTuple):
    """Where a product variable comes from: the raw field's values, times `scale` (broadcast)."""

    name: str
    values: Floats
    scale: Floats
    replicated: bool


def product_fields(
    tally: Tally, grid: Grid, planes: Sequence[ImagePlane], release_rate: float
) -> Iterator[ProductField]:
    """Yield the product's variables of one release from raw counts.

    Parameters
    ----------
    tally : Tally
        Raw counts, or their errors: everything here is linear. Leading dimensions are allowed in the contents.
    grid, planes
        Cells and pixels of the counts.
    release_rate : float
        New atoms per second [s-1].

    Yields
    ------
    ProductField
        In SI units of the product, see `tracer.product.layout`.
    """
    per_area = (1.0 / cell_area(grid))[:, np.newaxis]
    per_solid_angle = (1.0 / cell_solid_angle(grid))[:, np.newaxis]
    per_volume = (1.0 / cell_volume(grid))[:, :, np.newaxis]
    per_atom = np.array(1.0 / release_rate)
    one = np.array(1.0)
    yield ProductField("number_density", tally.content, per_volume, True)
    yield ProductField("vertical_column", tally.column_content, per_area, True)
    yield from _image_columns(tally.image_content, planes)
    yield ProductField("release_flux", tally.released, per_area, False)
    yield ProductField("return_flux", tally.returned, per_area, False)
    yield ProductField("capture_flux", tally.captured, per_area, False)
    yield ProductField("escape_flux", tally.escaped, per_area, False)
    yield ProductField("escape_rate_by_direction", tally.escaped_by_direction, per_solid_angle, False)
    yield ProductField("ledger", tally.ledger, one, False)
    yield ProductField("mean_flights", tally.launches[0], per_atom, False)
    yield ProductField("mean_life", tally.life[0], per_atom, False)


def _image_columns(image_content: Floats, planes: Sequence[ImagePlane]) -> Iterator[ProductField]:
    start = 0
    for plane in planes:
        stop = start + plane_size(plane)
        width = plane.horizontal_edges[1] - plane.horizontal_edges[0]
        height = plane.vertical_edges[1] - plane.vertical_edges[0]
        values = image_content[..., start:stop].reshape(*image_content.shape[:-1], *plane_shape(plane))
        yield ProductField(f"column_{plane.name}", values, np.array(1.0 / (width * height)), True)
        start = stop

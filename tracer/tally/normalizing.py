"""From raw counts to the product's quantities: densities, columns, fluxes."""

from collections.abc import Iterator, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.constants import RAYLEIGH
from tracer.kernels.scoring import Tally
from tracer.tally.axes import Grid, ImagePlane, cell_area, cell_solid_angle, cell_volume
from tracer.tally.buffer import plane_shape, plane_size

Floats = NDArray[np.float64]


class ProductField(NamedTuple):
    """Where a product variable comes from: the raw field's values, times `scale` (broadcast).

    `replicated` fields are kept by replicate, `by_line` ones have a leading dimension of lines.
    """

    name: str
    values: Floats
    scale: Floats
    replicated: bool = False
    by_line: bool = False


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
    yield ProductField("number_density", tally.content, per_volume, replicated=True)
    yield ProductField("vertical_column", tally.column_content, per_area, replicated=True)
    for plane, content, per_pixel in _images(tally.image_content, planes):
        yield ProductField(f"column_{plane}", content, per_pixel, replicated=True)
    if len(tally.emission):
        yield ProductField("emission_rate", tally.emission, per_volume, replicated=True, by_line=True)
        for plane, content, per_pixel in _images(tally.image_emission, planes):
            yield ProductField(
                f"brightness_{plane}", content, per_pixel / RAYLEIGH, replicated=True, by_line=True
            )
    yield ProductField("release_flux", tally.released, per_area)
    yield ProductField("return_flux", tally.returned, per_area)
    yield ProductField("capture_flux", tally.captured, per_area)
    yield ProductField("escape_flux", tally.escaped, per_area)
    yield ProductField("escape_rate_by_direction", tally.escaped_by_direction, per_solid_angle)
    if tally.adsorbed.size:
        yield ProductField("adsorbed_column", tally.adsorbed, per_area)
    yield ProductField("ionization_rate", tally.ionized, per_volume)
    yield ProductField("ledger", tally.ledger, one)
    if tally.struck.size:
        yield ProductField("host_impact_rate", tally.struck[0], one)
    yield ProductField("roulette_balance", tally.roulette[0], one)
    yield ProductField("mean_flights", tally.launches[0], per_atom)
    yield ProductField("mean_life", tally.life[0], per_atom)


def _images(contents: Floats, planes: Sequence[ImagePlane]) -> Iterator[tuple[str, Floats, Floats]]:
    """Yield each plane's name, its pixels out of the flat `contents` (..., pixel), and one over a pixel's area."""
    start = 0
    for plane in planes:
        stop = start + plane_size(plane)
        width = plane.horizontal_edges[1] - plane.horizontal_edges[0]
        height = plane.vertical_edges[1] - plane.vertical_edges[0]
        pixels = contents[..., start:stop].reshape(*contents.shape[:-1], *plane_shape(plane))
        yield plane.name, pixels, np.array(1.0 / (width * height))
        start = stop

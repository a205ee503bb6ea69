"""From raw counts to the product's quantities: densities, columns, fluxes."""

from collections.abc import Iterator, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.constants import RAYLEIGH
from tracer.kernels.scoring import Tally
from tracer.tally.axes import Grid, ImagePlane, cell_area, cell_solid_angle, cell_volume
from tracer.tally.buffer import Responses, plane_shape, plane_size, velocity_sums

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
    yield from _by_velocity("column", tally.velocity_content, planes, 1.0)
    if len(tally.emission):
        yield ProductField("emission_rate", tally.emission, per_volume, replicated=True, by_line=True)
        for plane, content, per_pixel in _images(tally.image_emission, planes):
            yield ProductField(
                f"brightness_{plane}", content, per_pixel / RAYLEIGH, replicated=True, by_line=True
            )
        yield from _by_velocity("brightness", tally.velocity_emission, planes, 1.0 / RAYLEIGH, by_line=True)
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


def _by_velocity(
    what: str, contents: Floats, planes: Sequence[ImagePlane], factor: float, by_line: bool = False
) -> Iterator[ProductField]:
    """Yield the bins (..., bin, row, column) of each plane resolved by velocity, and what lies outside them."""
    start = 0
    for plane in planes:
        bins, size = velocity_sums(plane) - 3, plane_size(plane)
        if bins < 0:
            continue
        counts = contents[..., start : start + (bins + 1) * size]
        counts = counts.reshape(*contents.shape[:-1], bins + 1, *plane_shape(plane))
        scale = np.array(factor / _pixel_area(plane))
        inside, outside = counts[..., :bins, :, :], counts[..., bins, :, :]
        yield ProductField(f"{what}_by_velocity_{plane.name}", inside, scale, True, by_line)
        yield ProductField(f"{what}_outside_velocity_{plane.name}", outside, scale, True, by_line)
        start += (bins + 3) * size


def _pixel_area(plane: ImagePlane) -> float:
    """Return the area [m2] of one pixel."""
    width = plane.horizontal_edges[1] - plane.horizontal_edges[0]
    return float(width * (plane.vertical_edges[1] - plane.vertical_edges[0]))


def response_fields(responses: Responses, grid: Grid, planes: Sequence[ImagePlane]) -> Iterator[ProductField]:
    """Yield the product's responses to unit rates of launches, as `product_fields` does its variables."""
    per_area = (1.0 / cell_area(grid))[:, np.newaxis]
    yield ProductField("vertical_column_response", responses.column_content, per_area, replicated=True)
    for plane, content, per_pixel in _images(responses.pixels[..., 0], planes):
        yield ProductField(f"column_response_{plane}", content, per_pixel, replicated=True)
    by_line = np.moveaxis(responses.pixels[..., 1:], -1, 0)
    if len(by_line):
        for plane, content, per_pixel in _images(by_line, planes):
            yield ProductField(
                f"brightness_response_{plane}", content, per_pixel / RAYLEIGH, replicated=True, by_line=True
            )


def _images(contents: Floats, planes: Sequence[ImagePlane]) -> Iterator[tuple[str, Floats, Floats]]:
    """Yield each plane's name, its pixels out of the flat `contents` (..., pixel), and one over a pixel's area."""
    start = 0
    for plane in planes:
        stop = start + plane_size(plane)
        pixels = contents[..., start:stop].reshape(*contents.shape[:-1], *plane_shape(plane))
        yield plane.name, pixels, np.array(1.0 / _pixel_area(plane))
        start = stop

"""Cells of the spherical grid in a plane through the body's centre: which they are, and how they lie."""

from typing import NamedTuple

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from numpy.typing import NDArray

from tracer.plots.colour_scale import Span, log_norm
from tracer.plots.field import Field, mean_over_cells
from tracer.plots.hatching import hatch, runs
from tracer.product.layout import ALTITUDE, BOUNDS, LATITUDE, LOCAL_TIME

NOON, MIDNIGHT, EQUATOR = 12.0, 0.0, 0.0
TURN = 24.0
DEGREES_PER_HOUR = 15.0
LONGEST_CHORD = np.radians(2.0)
"""Largest angle between corners of a cell's outline, so that arcs look round."""


class PlaneCells(NamedTuple):
    """Cells in a plane: edges in body radii and in radians from +x, anticlockwise on paper; A x N cells."""

    radii: NDArray[np.float64]
    angles: NDArray[np.float64]
    field: Field


def equatorial(
    product: xr.Dataset, names: list[str], radius: float, variable: str, factor: float
) -> PlaneCells:
    """Return the cells at latitude 0 as seen from north, Sun at the right and dusk up."""
    cells = cells_at(edges(product, LATITUDE), EQUATOR)
    field = mean_over_cells(product, variable, names, LATITUDE, cells, factor)
    angles = np.radians((edges(product, LOCAL_TIME) - NOON) * DEGREES_PER_HOUR)
    return PlaneCells(1.0 + edges(product, ALTITUDE) / radius, angles, field)


def noon_midnight(
    product: xr.Dataset, names: list[str], radius: float, variable: str, factor: float
) -> PlaneCells:
    """Return the cells at local times 12 h and 0 h as seen from dawn, Sun at the right and north up."""
    hours, latitudes = edges(product, LOCAL_TIME), edges(product, LATITUDE)
    noon, midnight = (
        mean_over_cells(product, variable, names, LOCAL_TIME, cells_at(hours, hour, TURN), factor)
        for hour in (NOON, MIDNIGHT)
    )
    # From the south pole over noon to the north pole, and on over midnight back again.
    angles = np.radians(np.concatenate([latitudes, 180.0 - latitudes[-2::-1]]))
    both = Field(
        *(np.concatenate([day, night[:, ::-1]], axis=1) for day, night in zip(noon, midnight, strict=True))
    )
    return PlaneCells(1.0 + edges(product, ALTITUDE) / radius, angles, both)


def edges(product: xr.Dataset, axis: str) -> NDArray[np.float64]:
    """Return the edges of the product's cells along `axis`, one more than cells."""
    bounds = product[axis + BOUNDS].values
    return np.append(bounds[:, 0], bounds[-1, 1])


def cells_at(ends: NDArray[np.float64], value: float, turn: float | None = None) -> list[int]:
    """Return the cell that holds `value`, or the two that share it as an edge; `turn` closes a circle."""
    low, high = ends[:-1], ends[1:]
    holds = (low <= value) & (value <= high)
    if turn is not None:
        holds |= (low <= value + turn) & (value + turn <= high)
    return [int(cell) for cell in np.flatnonzero(holds)]


def draw_cells(axes: Axes, cells: PlaneCells, span: Span | None, colours: str) -> None:
    """Draw the cells in colour where something was counted, hatched where it says nothing."""
    parts = int(np.ceil(np.diff(cells.angles).max() / LONGEST_CHORD))
    share = np.arange(parts) / parts
    angles = np.append(
        (cells.angles[:-1, np.newaxis] + np.diff(cells.angles)[:, np.newaxis] * share), cells.angles[-1]
    )
    field = cells.field
    if span is not None:
        value = np.ma.masked_where(~field.hit, field.value)
        axes.pcolormesh(
            np.outer(cells.radii, np.cos(angles)),
            np.outer(cells.radii, np.sin(angles)),
            value.repeat(parts, axis=1),
            norm=log_norm(span),
            cmap=colours,
            rasterized=True,
        )
    hatch(
        axes,
        (
            _ring_piece(cells.radii[row : row + 2], angles[first * parts : end * parts + 1])
            for row, first, end in runs(~field.significant)
        ),
    )


def _ring_piece(radii: NDArray[np.float64], angles: NDArray[np.float64]) -> NDArray[np.float64]:
    inner, outer = radii
    # A whole ring is two circles: the inner one runs backwards and stays a hole.
    there, back = np.exp(1j * angles), np.exp(1j * angles[::-1])
    corners = np.concatenate([outer * there, inner * back, outer * there[:1]])
    return np.column_stack([corners.real, corners.imag])

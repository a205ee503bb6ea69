"""Figure: column density above the ground against what varies."""

from collections.abc import Sequence
from functools import partial
from typing import NamedTuple

import numpy as np
import xarray as xr
from matplotlib.figure import Figure
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.plots.curves import release_curve
from tracer.plots.field import Field, released_words, releases
from tracer.plots.planes import TURN, cells_at, edges
from tracer.plots.reading_units import PER_SQUARE_CENTIMETRE
from tracer.plots.style import COLUMN_COLOURS, Width
from tracer.plots.sums import NO_REPLICATES, has_replicates, summed
from tracer.plots.swept.axes import points_of
from tracer.plots.swept.drawing import MARKERS, Line, Words, family_lines, lines_figure, map_figure
from tracer.plots.swept.per_point import of_each_point
from tracer.product.layout import LATITUDE, LOCAL_TIME

COLUMN = "vertical_column"
DAWN, DUSK = 6.0, 18.0
LABEL = "Column density (cm$^{-2}$)"


class Place(NamedTuple):
    """A place on the ground: latitude [deg] and local time [h]."""

    latitude: float
    local_time: float


def swept_column(
    sweep: xr.Dataset, release: str | None = None, place: Place | None = None, width: Width = "full"
) -> Figure:
    """Return the column density above the ground against what varies: means by day and by night, or of one cell.

    Parameters
    ----------
    sweep : xarray.Dataset
        As `open_sweep` gives it; without replicates there are no error bars.
    release : str, optional
        The release to draw; the sum over all if absent.
    place : Place, optional
        The cell to draw; if absent the means over day and night side, or over the day side where two dimensions vary.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.

    Raises
    ------
    InputError
        No such release or place, or more than two swept dimensions.
    """
    names, points = releases(sweep, release), points_of(sweep)
    if place is not None:
        weights, what = _at(sweep, place), [f"at latitude {place.latitude:g} deg, {place.local_time:g} h"]
    else:
        both = _sides(sweep)
        weights, what = (
            (both, ["day side", "night side"]) if points.family is None else (both[:1], ["day side"])
        )
    fields = of_each_point(sweep, points, partial(_columns, names=names, weights=weights))
    caption = "" if place is not None else "Means over the ground."
    if not has_replicates(sweep, COLUMN):
        caption = f"{caption} {NO_REPLICATES}".strip()
    said = Words(f"Column above the ground, {' and '.join(what)}, {released_words(names)}", LABEL, caption)
    if points.as_map:
        return map_figure(sweep, points, Field(*(one[..., 0] for one in fields)), said, COLUMN_COLOURS, width)
    if len(what) == 1:
        return lines_figure(
            sweep, points, family_lines(points, Field(*(one[..., 0] for one in fields))), said, width
        )
    lines = [
        Line(release_curve(i, side), MARKERS[i], Field(*(one[0, :, i] for one in fields)))
        for i, side in enumerate(what)
    ]
    return lines_figure(sweep, points, lines, said, width)


def _columns(product: xr.Dataset, names: Sequence[str], weights: NDArray[np.float64]) -> Field:
    """Return means of one point's columns with `weights` (S, L, H), summed over releases."""
    flat = weights.reshape(len(weights), -1)
    return summed(
        product,
        COLUMN,
        names,
        lambda maps: maps.reshape(*maps.shape[:-2], -1) @ flat.T,
        PER_SQUARE_CENTIMETRE,
    )


def _sides(sweep: xr.Dataset) -> NDArray[np.float64]:
    """Return the weights of cells in the means over day and night side; cells on the terminator count in part."""
    areas = sweep["cell_area"].values[:, np.newaxis]
    hours = edges(sweep, LOCAL_TIME)
    by_day = np.clip(np.minimum(hours[1:], DUSK) - np.maximum(hours[:-1], DAWN), 0.0, None) / np.diff(hours)
    sides = np.stack([areas * by_day, areas * (1.0 - by_day)])
    return np.asarray(sides / sides.sum(axis=(1, 2), keepdims=True))


def _at(sweep: xr.Dataset, place: Place) -> NDArray[np.float64]:
    """Return the weights of cells at a place: one, or equally those that meet there."""
    rows = cells_at(edges(sweep, LATITUDE), place.latitude)
    columns = cells_at(edges(sweep, LOCAL_TIME), place.local_time, TURN)
    if not rows or not columns:
        raise InputError(
            f"there is no place at latitude {place.latitude:g} deg and local time {place.local_time:g} h; latitudes "
            "run from -90 to 90, local times from 0 to 24"
        )
    weights = np.zeros((1, sweep.sizes[LATITUDE], sweep.sizes[LOCAL_TIME]))
    weights[0][np.ix_(rows, columns)] = 1.0 / (len(rows) * len(columns))
    return weights

"""Figure: what an image shows at one place of the sky, against what varies."""

from collections.abc import Sequence
from functools import partial
from typing import NamedTuple

import numpy as np
import xarray as xr
from matplotlib.figure import Figure

from tracer.errors import InputError
from tracer.plots.field import Field, released_words, releases
from tracer.plots.lengths import body_radius
from tracer.plots.planes import edges
from tracer.plots.seen import Seen, of_line, seen_in
from tracer.plots.sky import Sky, sky_of
from tracer.plots.style import Width
from tracer.plots.sums import NO_REPLICATES, has_replicates, summed
from tracer.plots.swept.axes import points_of
from tracer.plots.swept.drawing import Words, family_lines, lines_figure, map_figure
from tracer.plots.swept.per_point import of_each_point
from tracer.product.layout import RELEASE, image_dimensions
from tracer.product.sweeping import sweep_point


class SkyPlace(NamedTuple):
    """A place of an image: rightward and upward from the body's centre [body radii]."""

    right: float
    up: float


class Pixel(NamedTuple):
    """A pixel of an image by its row and column, with its middle."""

    row: int
    column: int
    middle: SkyPlace


def swept_brightness(
    sweep: xr.Dataset,
    name: str | None = None,
    line: str | None = None,
    release: str | None = None,
    place: SkyPlace | None = None,
    width: Width = "full",
) -> Figure:
    """Return what an image shows along one line of sight, against what varies.

    Parameters
    ----------
    sweep : xarray.Dataset
        As `open_sweep` gives it.
    name : str, optional
        The image, by its name in the product or in the run file; may be absent where there is only one.
    line : str, optional
        Emission line: the brightness in it is drawn [kR]; column density [cm-2] if absent.
    release : str, optional
        The release to draw; the sum over all if absent.
    place : SkyPlace, optional
        Where in the image; its pixel is drawn. If absent the brightest pixel of the first point.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.

    Raises
    ------
    InputError
        No such image, line, release or place, or more than two swept dimensions.
    """
    source = of_line(sweep, line)
    names, points, sky = releases(sweep, release), points_of(sweep), sky_of(sweep, name)
    seen = seen_in(sky, line)
    pixel = _brightest(source, sky, seen, names) if place is None else _pixel(sweep, sky, place)
    fields = of_each_point(source, points, partial(_at_pixel, seen=seen, names=names, pixel=pixel))
    where = f"{pixel.middle.right:.3g} right, {pixel.middle.up:.3g} up"
    caption = f"Pixel at {where} of the body's centre, in body radii" + (
        ", the brightest of the first point." if place is None else "."
    )
    if not has_replicates(source, seen.variable):
        caption = f"{caption} {NO_REPLICATES}"
    words = Words(
        f"{sky.title}: {seen.what} along one line of sight, {released_words(names)}", seen.label, caption
    )
    if points.as_map:
        return map_figure(sweep, points, fields, words, seen.colours, width)
    return lines_figure(sweep, points, family_lines(points, fields), words, width)


def _at_pixel(product: xr.Dataset, seen: Seen, names: Sequence[str], pixel: Pixel) -> Field:
    return summed(
        product, seen.variable, names, lambda images: images[..., pixel.row, pixel.column], seen.factor
    )


def _brightest(source: xr.Dataset, sky: Sky, seen: Seen, names: Sequence[str]) -> Pixel:
    first = sweep_point(source, 1)[seen.variable].sel(release=list(names)).sum(RELEASE).values
    row, column = np.unravel_index(int(np.argmax(first)), first.shape)
    right, up = _middles(source, sky)
    return Pixel(int(row), int(column), SkyPlace(float(right[column]), float(up[row])))


def _pixel(sweep: xr.Dataset, sky: Sky, place: SkyPlace) -> Pixel:
    radius = body_radius(sweep)
    rows, columns = (edges(sweep, axis) / radius for axis in image_dimensions(sky.name))
    if not (columns[0] <= place.right <= columns[-1] and rows[0] <= place.up <= rows[-1]):
        raise InputError(
            f'image "{sky.name}" shows nothing at {place.right:g}, {place.up:g}; it goes from {columns[0]:.4g} to '
            f"{columns[-1]:.4g} body radii rightward and from {rows[0]:.4g} to {rows[-1]:.4g} upward"
        )
    right, up = _middles(sweep, sky)
    row, column = int(np.argmin(np.abs(up - place.up))), int(np.argmin(np.abs(right - place.right)))
    return Pixel(row, column, SkyPlace(float(right[column]), float(up[row])))


def _middles(sweep: xr.Dataset, sky: Sky) -> tuple[np.ndarray, np.ndarray]:
    radius = body_radius(sweep)
    up, right = (sweep[axis].values / radius for axis in image_dimensions(sky.name))
    return right, up

"""Figure: an image of the gas, in column density or in the brightness of a line."""

from collections.abc import Iterable
from typing import NamedTuple

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.plots.body import Vector, draw_disc, mark_sun
from tracer.plots.colour_scale import ROOM_BELOW, bar_below, colour_span, draw_colour_bar, log_norm
from tracer.plots.field import Field, listed, released_words, releases, variable
from tracer.plots.hatching import hatch_rectangles
from tracer.plots.lengths import body_radius, kilometres_across, kilometres_up
from tracer.plots.planes import edges
from tracer.plots.reading_units import KILORAYLEIGH, PER_SQUARE_CENTIMETRE
from tracer.plots.significance import note, say_nothing
from tracer.plots.style import (
    BRIGHTNESS_COLOURS,
    COLUMN_COLOURS,
    TEXT_SIZE,
    WIDTHS,
    Box,
    Width,
    axes_in,
    line_height,
    styled,
)
from tracer.plots.words import framed_figure
from tracer.product.layout import HORIZONTAL, IMAGE, LINE, image_dimensions

LEFT, RIGHT, TOP = 12.5, 12.5, 7.0
"""Distances [mm] round the panel."""
LOWEST, HIGHEST, NARROWEST = 18.0, 120.0, 20.0
"""Limits of the panel's height and width [mm]; an image that does not fill the panel stands in its middle."""
ROOM_FOR_LABEL = 38.0
"""Height [mm] above which the label along the vertical fits on one line."""

COLUMN, BRIGHTNESS = "column_", "brightness_"
DISC_WORDS = (
    "Circle: the body, its night side darkened; gas before the disc is counted, gas behind is hidden."
)
SUNWARD_WORDS: dict[Vector, str] = {
    (1.0, 0.0, 0.0): "toward the Sun",
    (-1.0, 0.0, 0.0): "away from the Sun",
    (0.0, 1.0, 0.0): "toward dusk",
    (0.0, -1.0, 0.0): "toward dawn",
    (0.0, 0.0, 1.0): "northward",
}


Edges = NDArray[np.float64]


class Sky(NamedTuple):
    """An image's sky plane: product name, the user's name, directions in the Sun-fixed frame."""

    name: str
    title: str
    toward_viewer: Vector
    up: Vector
    right: Vector


def image(
    product: xr.Dataset,
    name: str | None = None,
    line: str | None = None,
    release: str | None = None,
    width: Width = "full",
) -> Figure:
    """Return one image in logarithmic colours, as its viewer sees it.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it.
    name : str, optional
        The image, by its name in the product or in the run file; may be absent where there is only one.
    line : str, optional
        Emission line: the brightness in it is drawn [kR]; column density [cm-2] if absent.
    release : str, optional
        Name of the release to draw; the sum over all if absent.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.

    Raises
    ------
    InputError
        Where the product has no such image, line or release, or several images and no name is given.
    """
    radius = body_radius(product)
    sky = _sky(product, name)
    names = releases(product, release)
    if line is None:
        field = variable(product, COLUMN + sky.name, names, PER_SQUARE_CENTIMETRE)
        what, label, colours = "column density", "Column density (cm$^{-2}$)", COLUMN_COLOURS
    else:
        shining = _shining(product, line)
        field = variable(shining, BRIGHTNESS + sky.name, names, KILORAYLEIGH)
        what, label, colours = f"brightness in {line}", "Brightness (kR)", BRIGHTNESS_COLOURS
    vertical, horizontal = image_dimensions(sky.name)
    columns, rows = (edges(product, axis) / radius for axis in (horizontal, vertical))
    lit = "no atom counted" if line is None else "no atom in sunlight counted"
    with styled():
        figure, panel, bar = _lay_out(
            width,
            float(np.ptp(rows) / np.ptp(columns)),
            str(product.attrs.get("title", "")),
            f"{sky.title}: {what}, {released_words(names)}",
            " ".join([note([field], names, lit), DISC_WORDS if _has_disc(columns, rows) else ""]).strip(),
        )
        axes = axes_in(figure, panel)
        _draw(axes, columns, rows, field, colours)
        draw_disc(axes, sky.toward_viewer, sky.up, sky.right)
        mark_sun(axes, sky.toward_viewer, sky.up, sky.right)
        axes.set_xlabel(f"{_direction(sky.right, 'rightward in the sky')} (body radii)")
        between = " " if panel.height > ROOM_FOR_LABEL else "\n"
        axes.set_ylabel(f"{_direction(sky.up, 'northward in the sky')}{between}(body radii)")
        kilometres_across(axes, radius)
        kilometres_up(axes, radius)
        draw_colour_bar(axes_in(figure, bar), colour_span([field]), colours, label, [field])
    return figure


def image_names(product: xr.Dataset) -> list[str]:
    """Return the names of the product's images."""
    end = HORIZONTAL.removeprefix(IMAGE)
    return [
        str(axis).removesuffix(end)
        for axis in product.dims
        if str(axis).endswith(end) and COLUMN + str(axis).removesuffix(end) in product
    ]


def _sky(product: xr.Dataset, wanted: str | None) -> Sky:
    skies = [_read_sky(product, name) for name in image_names(product)]
    if not skies:
        raise InputError("the product has no image; add an [[image]] to its run file and run it again")
    allowed = listed([sky.name for sky in skies])
    if wanted is None:
        if len(skies) > 1:
            raise InputError(f"the product has {len(skies)} images, name one of them: {allowed}")
        return skies[0]
    named = [sky for sky in skies if sky.name == wanted] or [sky for sky in skies if sky.title == wanted]
    if not named:
        raise InputError(f'there is no image "{wanted}"; allowed: {allowed}')
    return named[0]


def _read_sky(product: xr.Dataset, name: str) -> Sky:
    attributes = product[COLUMN + name].attrs
    title = str(attributes.get("long_name", name)).partition(", ")[2] or name
    return Sky(name, title, *(_vector(attributes[key]) for key in ("toward_viewer", "up", "right")))


def _vector(parts: Iterable[float]) -> Vector:
    x, y, z = map(float, parts)
    return x, y, z


def _shining(product: xr.Dataset, line: str) -> xr.Dataset:
    known = [str(name) for name in product["line_name"].values] if "line_name" in product else []
    if not known:
        raise InputError(f'there is no line "{line}": the gas of this product has no lines with g')
    if line not in known:
        raise InputError(f'there is no line "{line}"; allowed: {listed(known)}')
    return product.sel({LINE: line})


def _lay_out(width: Width, shape: float, title: str, subtitle: str, caption: str) -> tuple[Figure, Box, Box]:
    low = shape * (WIDTHS[width] - LEFT - RIGHT) < ROOM_FOR_LABEL
    left = LEFT + (line_height(TEXT_SIZE) if low else 0.0)
    room = WIDTHS[width] - left - RIGHT
    height = min(max(room * shape, LOWEST), HIGHEST)
    across = min(max(height / shape, NARROWEST), room)
    figure, box = framed_figure(width, TOP + height + ROOM_BELOW, title, subtitle, caption)
    panel = Box(left + 0.5 * (room - across), box.bottom + ROOM_BELOW, across, height)
    return figure, panel, bar_below(panel)


def _draw(axes: Axes, columns: Edges, rows: Edges, field: Field, colours: str) -> None:
    axes.set(xlim=(columns[0], columns[-1]), ylim=(rows[0], rows[-1]), aspect="equal")
    span = colour_span([field])
    if span is None:
        say_nothing(axes)
    else:
        value = np.ma.masked_where(~field.hit, field.value)
        axes.pcolormesh(columns, rows, value, norm=log_norm(span), cmap=colours, rasterized=True)
    hatch_rectangles(axes, columns, rows, ~field.significant)


def _has_disc(columns: Edges, rows: Edges) -> bool:
    return bool(columns[0] < 1.0 and columns[-1] > -1.0 and rows[0] < 1.0 and rows[-1] > -1.0)


def _direction(vector: Vector, otherwise: str) -> str:
    words = SUNWARD_WORDS.get(vector, otherwise)
    return words[0].upper() + words[1:]

"""Figure: an image of the gas, in column density or in the brightness of a line."""

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from tracer.plots.body import Vector, draw_disc, mark_sun
from tracer.plots.colour_scale import Span, bar_below, colour_span, draw_colour_bar, log_norm, room_below
from tracer.plots.error_contours import contour_words, draw_error_contours
from tracer.plots.field import Field, released_words, releases, variable
from tracer.plots.hatching import hatch_rectangles
from tracer.plots.host import OUTLINED_WORDS, host_in_sky, outline_host
from tracer.plots.lengths import body_radius, kilometres_across, kilometres_up
from tracer.plots.planes import edges
from tracer.plots.seen import of_line, seen_in
from tracer.plots.significance import note, say_nothing
from tracer.plots.sky import sky_of
from tracer.plots.style import (
    TEXT_SIZE,
    WIDTHS,
    Box,
    Width,
    axes_in,
    line_height,
    styled,
)
from tracer.plots.words import framed_figure
from tracer.product.layout import image_dimensions

LEFT, RIGHT, TOP = 12.5, 12.5, 7.0
"""Distances [mm] round the panel."""
LOWEST, HIGHEST, NARROWEST = 18.0, 120.0, 20.0
"""Limits of the panel's height and width [mm]; a flatter image is stretched upwards, a narrower one stands in the
middle."""
LEAST_STRETCH = 1.05
"""Below this an image is as good as high enough, and stays true to scale."""
ROOM_FOR_LABEL = 38.0
"""Height [mm] above which the label along the vertical fits on one line."""

DISC_WORDS = (
    "{shape}: the body, its night side darkened; gas before the disc is counted, gas behind is hidden."
)
STRETCHED_WORDS = "The vertical is drawn {stretch:.2g} times larger than the horizontal."
SUNWARD_WORDS: dict[Vector, str] = {
    (1.0, 0.0, 0.0): "toward the Sun",
    (-1.0, 0.0, 0.0): "away from the Sun",
    (0.0, 1.0, 0.0): "toward dusk",
    (0.0, -1.0, 0.0): "toward dawn",
    (0.0, 0.0, 1.0): "northward",
}


Edges = NDArray[np.float64]


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
    sky = sky_of(product, name)
    names = releases(product, release)
    seen = seen_in(sky, line)
    field = variable(of_line(product, line), seen.variable, names, seen.factor)
    vertical, horizontal = image_dimensions(sky.name)
    columns, rows = (edges(product, axis) / radius for axis in (horizontal, vertical))
    lit = "no atom counted" if line is None else "no atom in sunlight counted"
    shape = float(np.ptp(rows) / np.ptp(columns))
    stretch = _stretch(width, shape)
    span = colour_span([field])
    host = host_in_sky(product, radius, sky.up, sky.right, (columns[0], columns[-1]), (rows[0], rows[-1]))
    caption = [
        STRETCHED_WORDS.format(stretch=stretch) if stretch > 1.0 else "",
        note([field], names, lit),
        contour_words(field),
        DISC_WORDS.format(shape="Ellipse" if stretch > 1.0 else "Circle") if _has_disc(columns, rows) else "",
        host.words(OUTLINED_WORDS) if host else "",
    ]
    with styled():
        figure, panel, bar = _lay_out(
            width,
            stretch * shape,
            room_below(span),
            str(product.attrs.get("title", "")),
            f"{sky.title}: {seen.what}, {released_words(names)}",
            " ".join(words for words in caption if words),
        )
        axes = axes_in(figure, panel)
        axes.set(xlim=(columns[0], columns[-1]), ylim=(rows[0], rows[-1]), aspect=stretch)
        _draw(axes, columns, rows, field, span, seen.colours)
        draw_error_contours(axes, columns, rows, field)
        draw_disc(axes, sky.toward_viewer, sky.up, sky.right)
        outline_host(axes, host, sky.toward_viewer, sky.up, sky.right)
        mark_sun(axes, sky.toward_viewer, sky.up, sky.right, stretch)
        axes.set_xlabel(f"{direction_words(sky.right, 'rightward in the sky')} (body radii)")
        between = " " if panel.height > ROOM_FOR_LABEL else "\n"
        axes.set_ylabel(f"{direction_words(sky.up, 'northward in the sky')}{between}(body radii)")
        kilometres_across(axes, radius)
        kilometres_up(axes, radius)
        draw_colour_bar(axes_in(figure, bar), span, seen.colours, seen.label, [field])
    return figure


def _stretch(width: Width, shape: float) -> float:
    """Return by how much an image of this height over width is stretched upwards to fill the lowest panel."""
    _, room = _left_and_room(width, shape)
    stretch = LOWEST / (room * shape)
    return stretch if stretch > LEAST_STRETCH else 1.0


def _left_and_room(width: Width, shape: float) -> tuple[float, float]:
    low = shape * (WIDTHS[width] - LEFT - RIGHT) < ROOM_FOR_LABEL
    left = LEFT + (line_height(TEXT_SIZE) if low else 0.0)
    return left, WIDTHS[width] - left - RIGHT


def _lay_out(
    width: Width, shape: float, below: float, title: str, subtitle: str, caption: str
) -> tuple[Figure, Box, Box]:
    left, room = _left_and_room(width, shape)
    height = min(room * shape, HIGHEST)
    across = min(max(height / shape, NARROWEST), room)
    figure, box = framed_figure(width, TOP + height + below, title, subtitle, caption)
    panel = Box(left + 0.5 * (room - across), box.bottom + below, across, height)
    return figure, panel, bar_below(panel)


def _draw(axes: Axes, columns: Edges, rows: Edges, field: Field, span: Span | None, colours: str) -> None:
    if span is None:
        say_nothing(axes)
    else:
        value = np.ma.masked_where(~field.hit, field.value)
        axes.pcolormesh(columns, rows, value, norm=log_norm(span), cmap=colours, rasterized=True)
    hatch_rectangles(axes, columns, rows, ~field.significant)


def _has_disc(columns: Edges, rows: Edges) -> bool:
    return bool(columns[0] < 1.0 and columns[-1] > -1.0 and rows[0] < 1.0 and rows[-1] > -1.0)


def direction_words(vector: Vector, otherwise: str) -> str:
    """Return where an axis of an image points, by its unit vector; `otherwise` where it lies aslant."""
    words = SUNWARD_WORDS.get(vector, otherwise)
    return words[0].upper() + words[1:]

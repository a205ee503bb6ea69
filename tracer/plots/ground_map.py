"""Figures over latitude and local time: column density, and fluxes from and to the ground."""

from typing import Literal, NamedTuple

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.plots.colour_scale import Span, bar_below, colour_span, draw_colour_bar, log_norm, room_below
from tracer.plots.field import Field, released_words, releases, variable
from tracer.plots.hatching import hatch_rectangles
from tracer.plots.moving import event_note
from tracer.plots.planes import DEGREES_PER_HOUR, edges
from tracer.plots.reading_units import PER_SQUARE_CENTIMETRE
from tracer.plots.significance import note, say_nothing
from tracer.plots.style import (
    COLUMN_COLOURS,
    DAY_COLOUR,
    FLUX_COLOURS,
    NIGHT_COLOUR,
    SMALL_SIZE,
    WIDTHS,
    Box,
    Width,
    axes_in,
    styled,
)
from tracer.plots.words import framed_figure
from tracer.product.layout import ADSORBED_COLUMN, LATITUDE, LOCAL_TIME

DAWN, DUSK, TURN = 6.0, 18.0, 24.0
LEFT, RIGHT, TOP, STRIP = 11.0, 4.0, 6.5, 3.0
"""Distances [mm] round the panel, and height of the strip of day and night."""
LOCAL_TIMES: tuple[tuple[float, str, Literal["left", "center", "right"]], ...] = (
    (0.0, "midnight", "left"),
    (DAWN, "dawn", "center"),
    (12.0, "noon", "center"),
    (DUSK, "dusk", "center"),
    (TURN, "midnight", "right"),
)
"""Words above the strip, and which part of them stands at their local time."""


class GroundMap(NamedTuple):
    """What a map over the ground shows."""

    variable: str
    words: str
    """What it is, for the title."""
    label: str
    """Of the colour bar, with the unit."""
    factor: float
    """Of the unit."""
    unit: str
    """In plain text."""
    colours: str
    nothing: str = "no atom counted"
    """What it means that a cell has no value."""


FLUX = "(cm$^{-2}$ s$^{-1}$)"
COLUMN = GroundMap(
    "vertical_column",
    "Column density above the ground",
    "Column density (cm$^{-2}$)",
    PER_SQUARE_CENTIMETRE,
    "cm-2",
    COLUMN_COLOURS,
)
RELEASED = GroundMap(
    "release_flux",
    "Flux of new atoms from the ground",
    f"Release flux {FLUX}",
    PER_SQUARE_CENTIMETRE,
    "cm-2 s-1",
    FLUX_COLOURS,
    "no atom released",
)
RETURNED = GroundMap(
    "return_flux",
    "Flux of atoms that land, every landing counted",
    f"Return flux {FLUX}",
    PER_SQUARE_CENTIMETRE,
    "cm-2 s-1",
    FLUX_COLOURS,
    "no landing counted",
)
CAPTURED = GroundMap(
    "capture_flux",
    "Flux of atoms that the ground keeps for good",
    f"Capture flux {FLUX}",
    PER_SQUARE_CENTIMETRE,
    "cm-2 s-1",
    FLUX_COLOURS,
    "no capture counted",
)
ESCAPING = GroundMap(
    "escape_flux",
    "Flux of atoms that escape in the end, by the place of their first release",
    f"Escape flux {FLUX}",
    PER_SQUARE_CENTIMETRE,
    "cm-2 s-1",
    FLUX_COLOURS,
    "no escape counted",
)
DIRECTIONS = GroundMap(
    "escape_rate_by_direction",
    "Rate of escape by the place of crossing on the outer sphere",
    "Escape rate (s$^{-1}$ sr$^{-1}$)",
    1.0,
    "s-1 sr-1",
    FLUX_COLOURS,
    "no escape counted",
)
ADSORBED = GroundMap(
    ADSORBED_COLUMN,
    "Column of atoms at rest on the ground",
    "Atoms at rest (cm$^{-2}$)",
    PER_SQUARE_CENTIMETRE,
    "cm-2",
    COLUMN_COLOURS,
    "no atom at rest counted",
)
MAPS = {
    "column": COLUMN,
    "adsorbed-map": ADSORBED,
    "release-map": RELEASED,
    "return-map": RETURNED,
    "capture-map": CAPTURED,
    "escape-map": ESCAPING,
    "escape-directions": DIRECTIONS,
}
"""All maps by the word that asks for them."""


def ground_map(
    product: xr.Dataset, what: GroundMap, release: str | None = None, width: Width = "full"
) -> Figure:
    """Return a map over latitude and local time in logarithmic colours.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it.
    what : GroundMap
        `COLUMN`, `ADSORBED`, `RELEASED`, `RETURNED`, `CAPTURED`, `ESCAPING` or `DIRECTIONS`.
    release : str, optional
        Name of the release to draw; the sum over all if absent.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.

    Raises
    ------
    InputError
        Where the product has no such release, or no atoms at rest.
    """
    if what.variable not in product:
        raise InputError(f"the product has no {what.variable}: in its run no atom rests on the ground")
    names = releases(product, release)
    field = variable(product, what.variable, names, what.factor)
    hours, latitudes = edges(product, LOCAL_TIME), edges(product, LATITUDE)
    across = WIDTHS[width] - LEFT - RIGHT
    height = across * np.ptp(latitudes) / (TURN * DEGREES_PER_HOUR)
    span = colour_span([field])
    below = room_below(span)
    with styled():
        figure, box = framed_figure(
            width,
            TOP + height + below,
            str(product.attrs.get("title", "")),
            f"{what.words}, {released_words(names)}",
            " ".join(filter(None, [event_note(product, what.variable), note([field], names, what.nothing)])),
        )
        panel = Box(LEFT, box.bottom + below, across, height)
        _draw(axes_in(figure, panel), hours, latitudes, field, span, what.colours)
        _draw_day_and_night(axes_in(figure, panel._replace(bottom=panel.bottom + height, height=STRIP)))
        bar = axes_in(figure, bar_below(panel))
        draw_colour_bar(bar, span, what.colours, what.label, [field])
    return figure


def vertical_column(product: xr.Dataset, release: str | None = None, width: Width = "full") -> Figure:
    """Return the column density above the ground [cm-2]; arguments and errors as those of `ground_map`."""
    return ground_map(product, COLUMN, release, width)


def _draw(
    axes: Axes,
    hours: NDArray[np.float64],
    latitudes: NDArray[np.float64],
    field: Field,
    span: Span | None,
    colours: str,
) -> None:
    if span is None:
        say_nothing(axes)
    else:
        value = np.ma.masked_where(~field.hit, field.value)
        axes.pcolormesh(hours, latitudes, value, norm=log_norm(span), cmap=colours, rasterized=True)
    hatch_rectangles(axes, hours, latitudes, ~field.significant)
    for terminator in (DAWN, DUSK):
        axes.axvline(terminator, color="white", linewidth=1.4, zorder=2.5)
        axes.axvline(terminator, color="black", linewidth=0.6, linestyle="--", zorder=2.6)
    axes.set(
        xlim=(0.0, TURN),
        ylim=(latitudes[0], latitudes[-1]),
        xticks=np.arange(0.0, TURN + 1.0, 3.0),
        yticks=np.arange(-90.0, 91.0, 30.0),
        xlabel="Local time (h)",
        ylabel="Latitude (deg)",
    )


def _draw_day_and_night(axes: Axes) -> None:
    """Draw the strip above the map: what is day, what is night, and the words for local times."""
    axes.set(xlim=(0.0, TURN), ylim=(0.0, 1.0), xticks=[], yticks=[])
    axes.add_patch(Rectangle((0.0, 0.0), TURN, 1.0, facecolor=NIGHT_COLOUR, linewidth=0.0))
    axes.add_patch(Rectangle((DAWN, 0.0), DUSK - DAWN, 1.0, facecolor=DAY_COLOUR, linewidth=0.0))
    for hour, words, ink in ((3.0, "night", "white"), (12.0, "day", "black"), (21.0, "night", "white")):
        axes.text(hour, 0.46, words, color=ink, ha="center", va="center", fontsize=SMALL_SIZE)
    for hour, words, side in LOCAL_TIMES:
        axes.text(hour, 1.15, words, ha=side, va="bottom", fontsize=SMALL_SIZE)
